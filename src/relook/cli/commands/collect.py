"""`relook collect`: read returned worksheets, check every row, keep the decisions."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

from relook.cli.options import (
    DebugOption,
    DryRunOption,
    ForceOption,
    JsonOption,
    ProjectArgument,
    QuietOption,
)
from relook.cli.running import running
from relook.errors import ExitCode, RelookError


def collect(
    project: ProjectArgument = Path(),
    worksheets: Annotated[
        list[Path] | None,
        typer.Argument(
            metavar="[WORKSHEET…]",
            help="Returned files; without any: all in the folders named returned.",
            show_default=False,
        ),
    ] = None,
    strict: Annotated[bool, typer.Option("--strict", help="Take all rows or none.")] = False,
    reinstate: Annotated[
        bool,
        typer.Option(
            "--reinstate", help="Let an older version of a worksheet replace later decisions."
        ),
    ] = False,
    rulings: Annotated[
        Path | None,
        typer.Option(
            "--rulings",
            metavar="FILE.csv",
            help="Rulings made elsewhere: item, variable, label, by, reason.",
        ),
    ] = None,
    mend_sheet: Annotated[
        Path | None,
        typer.Option(
            "--mend-sheet", metavar="FILE.xlsx", help="Write a worksheet of the rows not taken."
        ),
    ] = None,
    rebuild: Annotated[
        bool,
        typer.Option("--rebuild", help="Make lost files of the record anew from kept worksheets."),
    ] = False,
    dry_run: DryRunOption = False,
    force: ForceOption = False,
    as_json: JsonOption = False,
    quiet: QuietOption = False,
    debug: DebugOption = False,
) -> None:
    """Take worksheets and coding sheets back; what cannot be taken is listed with its mend."""
    with running(quiet=quiet, debug=debug) as terminal:
        from relook.cli.screens.collect import collect_screen, rebuild_screen
        from relook.project.returning.collect_table import collected_object
        from relook.project.returning.rebuilding import rebuild as rebuild_record
        from relook.project.returning.rulings_run import run_rulings
        from relook.project.returning.sorting import CollectedAll, collect_all
        from relook.project.sending.mending import mend_worksheet
        from relook.project.setup.folder import Project, write_whole

        if sum((rulings is not None, rebuild, bool(worksheets))) > 1:
            raise RelookError(
                "worksheets, --rulings and --rebuild are three different things",
                mend="ask for one of them at a time",
            )
        opened = Project.open(project)
        if rebuild:
            for area in (opened, opened.codings):
                if any(area.rounds_folder.glob("*/round.json")):
                    terminal.data(rebuild_screen(rebuild_record(area, dry_run=dry_run)))
            return
        if rulings is not None:
            ruled = run_rulings(
                opened,
                rulings,
                strict=strict,
                reinstate=reinstate,
                dry_run=dry_run,
                now=terminal.now(),
            )
            result = CollectedAll(ruled, None)
        else:
            result = collect_all(
                opened,
                worksheets or None,
                strict=strict,
                reinstate=reinstate,
                dry_run=dry_run,
                now=terminal.now(),
            )
        of_rounds = result.rounds
        if mend_sheet is not None and of_rounds is not None and of_rounds.mend_keys:
            data = mend_worksheet(opened, of_rounds.mend_keys, terminal.now())
            if not dry_run:
                write_whole(mend_sheet, data, force=force)
            terminal.say(f"{'would write' if dry_run else 'wrote'} {mend_sheet}")
        if mend_sheet is not None and result.codings is not None and result.codings.mend_keys:
            terminal.say("coding sheets have no mend sheet: send each coder's own back to them")
        if as_json:
            terminal.json(collected_object(result))
        else:
            terminal.data(collect_screen(result, opened))
        if not result.is_complete:
            raise typer.Exit(int(ExitCode.FALLS_SHORT))
