"""`relook rescore`: what the decisions changed, before and after side by side."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

from relook.cli.options import (
    DebugOption,
    DryRunOption,
    ForceOption,
    JsonOption,
    ProjectArgument,
    QuietOption,
    SeedOption,
    VariableOption,
)
from relook.cli.running import running
from relook.errors import RelookError

if TYPE_CHECKING:
    from relook.cli.terminal import Terminal
    from relook.project.setup.loading import Loaded


def rescore(
    project: ProjectArgument = Path(),
    variable: VariableOption = None,
    against: Annotated[
        list[Path] | None,
        typer.Option(
            "--against",
            metavar="TABLE",
            help="Compare with labels that the coders corrected themselves, and keep them as a "
            "label version; may be repeated.",
        ),
    ] = None,
    relabelled: Annotated[
        bool,
        typer.Option(
            "--relabelled",
            help="Go on although label files changed since the first round; alpha is then not "
            "called independent.",
        ),
    ] = False,
    coding: Annotated[
        int | None,
        typer.Option(
            "--coding",
            min=2,
            metavar="N",
            help="Set this fresh coding beside the first; left out: the last one that is back.",
        ),
    ] = None,
    xlsx: Annotated[
        Path | None,
        typer.Option("--xlsx", metavar="FILE", help="Write the same as a workbook with charts."),
    ] = None,
    seed: SeedOption = None,
    dry_run: DryRunOption = False,
    force: ForceOption = False,
    as_json: JsonOption = False,
    quiet: QuietOption = False,
    debug: DebugOption = False,
) -> None:
    """Show alpha before and agreement in the corrected data after, and what the decisions say."""
    with running(quiet=quiet, debug=debug) as terminal:
        from relook.cli.screens.layout import stacked
        from relook.cli.screens.recode import compared_screen
        from relook.cli.screens.rescore import rescore_screen
        from relook.project.archive.record import read_record
        from relook.project.figures.ordering import DEFAULT_SEED
        from relook.project.outcome import rescoring
        from relook.project.outcome.codings_compared import (
            codings_object,
            compare_codings,
            latest_coding_back,
        )
        from relook.project.outcome.rescore_report import report_of
        from relook.project.outcome.rescore_tables import rescore_object
        from relook.project.setup.folder import Project, write_whole
        from relook.project.setup.loading import load
        from relook.worksheet.report import write_report

        opened = Project.open(project)
        loaded = load(opened, only=variable)
        for line in loaded.said:
            terminal.say(line)
        terminal.problems(loaded.problems)
        if against:
            _against(terminal, loaded, against, variable, relabelled, dry_run, as_json, xlsx)
            return
        seed = DEFAULT_SEED if seed is None else seed
        number = latest_coding_back(loaded) if coding is None else coding
        compared = None if number is None else compare_codings(loaded, number, seed=seed)
        if compared is not None and not read_record(opened).decisions and xlsx is None:
            if as_json:
                terminal.json({"project": str(opened.root), "codings": codings_object(compared)})
            else:
                terminal.data(stacked(*compared_screen(compared)))
            return
        held = rescoring.rescore(loaded, seed=seed, relabelled=relabelled)
        if xlsx is not None:
            data = write_report(report_of(held, terminal.now().isoformat(timespec="seconds")))
            if not dry_run:
                write_whole(xlsx, data, force=force)
            terminal.say(f"{'would write' if dry_run else 'wrote'} {xlsx}")
        if as_json:
            codings = None if compared is None else codings_object(compared)
            terminal.json({**rescore_object(held), "codings": codings})
        else:
            terminal.data(rescore_screen(held, compared))


def _against(
    terminal: Terminal,
    loaded: Loaded,
    tables: list[Path],
    only: list[str] | None,
    relabelled: bool,
    dry_run: bool,
    as_json: bool,
    xlsx: Path | None,
) -> None:
    """Compare with corrected tables, and keep them."""
    from relook.cli.screens.correction import correction_screen
    from relook.project.corrections.correcting import (
        compare_with,
        correction_object,
        record_correction,
    )

    if xlsx is not None:
        raise RelookError(
            "--xlsx is for a rescore by decisions, and --against compares label tables",
            mend="leave one of them out; --against --json has every change",
        )
    found = compare_with(loaded, tables, only=only, relabelled=relabelled)
    terminal.problems(found.corrected.problems)
    version = None
    if not dry_run:
        stamp = terminal.now().isoformat(timespec="seconds")
        version, is_new = record_correction(found, stamp)
        if not is_new:
            terminal.say(f"these tables are label version {version.number} already")
    if as_json:
        terminal.json(correction_object(found, version))
    else:
        terminal.data(correction_screen(found, version))
