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
        from dataclasses import asdict

        from relook.cli.screens.why import why_screen
        from relook.cli.targets import open_target
        from relook.project.explaining import explain
        from relook.project.loading import load

        project = open_target(target, terminal, difference=difference)
        explanations = explain(load(project, only=variable), item)
        if as_json:
            terminal.json({"item": item, "variables": [asdict(held) for held in explanations]})
        else:
            terminal.data(why_screen(explanations))
