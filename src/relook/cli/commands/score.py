"""`relook score`: alpha, D_o and D_e per variable, and where the disagreement lives."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated, Any

import typer

from relook.cli.options import (
    DebugOption,
    DifferenceOption,
    ForceOption,
    HoursOption,
    JsonOption,
    QuietOption,
    RankByOption,
    SecondsOption,
    SeedOption,
    ShareOption,
    TargetArgument,
    TopOption,
    VariableOption,
)
from relook.cli.running import running
from relook.errors import ExitCode


def score(
    target: TargetArgument = Path(),
    variable: VariableOption = None,
    difference: DifferenceOption = None,
    rank_by: RankByOption = None,
    top: TopOption = None,
    share: ShareOption = None,
    hours: HoursOption = None,
    seconds_per_item: SecondsOption = None,
    items: Annotated[
        Path | None,
        typer.Option("--items", metavar="FILE.csv", help="Write a row per disputed item."),
    ] = None,
    require: Annotated[
        float | None,
        typer.Option(
            "--require",
            metavar="ALPHA",
            help="Exit with 1 where alpha of independent labels is undefined or lower.",
        ),
    ] = None,
    seed: SeedOption = None,
    force: ForceOption = False,
    as_json: JsonOption = False,
    quiet: QuietOption = False,
    debug: DebugOption = False,
) -> None:
    """Show alpha, observed and expected disagreement, and where the disagreement lives."""
    with running(quiet=quiet, debug=debug) as terminal:
        from relook.cli.screens.score import score_screen
        from relook.cli.targets import open_target
        from relook.project import scoring
        from relook.project.folder import write_whole
        from relook.project.item_table import item_table, item_table_csv
        from relook.project.loading import load
        from relook.project.ordering import DEFAULT_SEED, settings_of_queue
        from relook.project.score_tables import score_object

        project = open_target(target, terminal, difference=difference)
        loaded = load(project, only=variable)
        for line in loaded.said:
            terminal.say(line)
        terminal.problems(loaded.problems)
        overrides: dict[str, Any] = {
            "rank_by": rank_by,
            "top": top,
            "share": share,
            "hours": hours,
            "seconds_per_item": seconds_per_item,
        }
        scored = scoring.score(
            loaded,
            settings_of_queue(project.settings.queue, overrides),
            seed=DEFAULT_SEED if seed is None else seed,
            with_doubt=items is not None,
        )
        if items is not None:
            write_whole(items, item_table_csv(item_table(scored)), force=force)
            terminal.say(f"wrote {items}")
        if as_json:
            terminal.json(score_object(scored))
        else:
            terminal.data(score_screen(scored))
        bar = require if require is not None else None
        if bar is not None:
            below = [
                held.name
                for held in scored.variables
                if held.agreement.alpha is None or held.agreement.alpha < bar
            ]
            if below:
                terminal.warn(f"alpha is below {bar:g} or undefined: {', '.join(below)}")
                raise typer.Exit(int(ExitCode.FALLS_SHORT))
        if all(not held.agreement.n_pairable_labels for held in scored.variables):
            raise typer.Exit(int(ExitCode.COULD_NOT))
