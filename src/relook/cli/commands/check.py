"""`relook check`: every problem of the tables in one pass."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

from relook.cli.options import (
    DebugOption,
    DifferenceOption,
    ForceOption,
    JsonOption,
    QuietOption,
    TargetArgument,
)
from relook.cli.running import running
from relook.errors import ExitCode


def check(
    target: TargetArgument = Path(),
    difference: DifferenceOption = None,
    problems: Annotated[
        Path | None,
        typer.Option("--problems", metavar="FILE.csv", help="Write all problems to a table."),
    ] = None,
    force: ForceOption = False,
    as_json: JsonOption = False,
    quiet: QuietOption = False,
    debug: DebugOption = False,
) -> None:
    """Look for anything wrong with the labels and items: errors, warnings and notes."""
    with running(quiet=quiet, debug=debug) as terminal:
        from relook.cli.screens.check import WORKSHEETS_ARE_OUT, check_object, check_screen
        from relook.cli.targets import open_target
        from relook.project.archive.rounds import read_rounds
        from relook.project.setup.folder import write_whole
        from relook.tables.checking import check_tables
        from relook.tables.results import problems_csv

        project = open_target(target, terminal, difference=difference)
        settings = project.settings
        checked = check_tables(settings.labels, settings.variables, settings.items, project.root)
        for line in checked.said:
            terminal.say(line)
        if problems is not None:
            write_whole(problems, problems_csv(checked.problems), force=force)
            terminal.say(f"wrote {problems}")
        if as_json:
            terminal.json(check_object(checked))
        else:
            terminal.data(check_screen(checked))
            if checked.problems and settings.project and read_rounds(project):
                terminal.say(WORKSHEETS_ARE_OUT)
        if any(problem.severity == "error" for problem in checked.problems):
            raise typer.Exit(int(ExitCode.FALLS_SHORT))
