"""`relook why`: the arithmetic of one item, term by term."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

from relook.cli.options import (
    DebugOption,
    DifferenceOption,
    JsonOption,
    QuietOption,
    VariableOption,
)
from relook.cli.running import running


def why(
    target: Annotated[
        Path, typer.Argument(metavar="TARGET", help="A project folder, or a label table.")
    ],
    item: Annotated[str, typer.Argument(metavar="ITEM", help="Id of the item.")],
    variable: VariableOption = None,
    difference: DifferenceOption = None,
    as_json: JsonOption = False,
    quiet: QuietOption = False,
    debug: DebugOption = False,
) -> None:
    """Show the arithmetic of one item: its pairs of labels, its contribution, settling."""
    with running(quiet=quiet, debug=debug) as terminal:
        from relook.cli.screens.why import why_screen
        from relook.cli.targets import open_target
        from relook.project.figures.explaining import explain, why_object
        from relook.project.setup.loading import load

        project = open_target(target, terminal, difference=difference)
        loaded = load(project, only=variable)
        for line in loaded.said:
            terminal.say(line)
        terminal.problems(loaded.problems)
        explanations = explain(loaded, item)
        if as_json:
            terminal.json(why_object(item, explanations))
        else:
            terminal.data(why_screen(explanations))
