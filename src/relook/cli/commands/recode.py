"""`relook recode`: a fresh, independent coding of a random sample."""

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
    SeedOption,
    VariableOption,
)
from relook.cli.running import running


def recode(
    project: ProjectArgument = Path(),
    items: Annotated[
        int | None,
        typer.Option(
            "--items",
            min=1,
            metavar="N",
            help="Items to draw; left out: as many as the published rule asks for, where the "
            "labels are nominal.",
        ),
    ] = None,
    by: Annotated[
        str | None,
        typer.Option(
            "--by",
            metavar="COLUMN",
            help="Draw from the groups of this column of the item table in proportion to their "
            "sizes.",
        ),
    ] = None,
    unseen: Annotated[
        bool,
        typer.Option(
            "--unseen", help="Draw only from items that no worksheet or coding has shown yet."
        ),
    ] = False,
    coder: Annotated[
        list[str] | None,
        typer.Option(
            "--coder",
            metavar="NAME",
            help="Who codes; may be repeated. Left out: the coders of the label tables.",
        ),
    ] = None,
    overlap: Annotated[
        int | None,
        typer.Option(
            "--overlap", min=2, metavar="K", help="Coders of each item; left out: all of them."
        ),
    ] = None,
    variable: VariableOption = None,
    seed: SeedOption = None,
    dry_run: DryRunOption = False,
    force: ForceOption = False,
    as_json: JsonOption = False,
    quiet: QuietOption = False,
    debug: DebugOption = False,
) -> None:
    """Draw a random sample and write a blank coding sheet for each coder, to measure alpha anew."""
    with running(quiet=quiet, debug=debug) as terminal:
        from relook.cli.screens.recode import recode_screen
        from relook.project.figures.ordering import DEFAULT_SEED
        from relook.project.recoding.recode_run import RecodeRequest, recode_object, run_recode
        from relook.project.setup.folder import Project

        run = run_recode(
            Project.open(project),
            RecodeRequest(
                n_items=items,
                by=by,
                unseen=unseen,
                coders=tuple(coder or ()),
                overlap=overlap,
                variables=tuple(variable or ()),
                seed=DEFAULT_SEED if seed is None else seed,
            ),
            stamp=terminal.now().isoformat(timespec="seconds"),
            dry_run=dry_run,
            force=force,
        )
        for line in run.loaded.said:
            terminal.say(line)
        terminal.problems(run.loaded.problems)
        if as_json:
            terminal.json(recode_object(run))
        else:
            terminal.data(recode_screen(run))
