"""`relook score`: alpha, D_o and D_e per variable, and where the disagreement lives."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated, Any

import typer

from relook.cli.options import (
    ByItemOption,
    DebugOption,
    DifferenceOption,
    EngineOption,
    ForceOption,
    HoursOption,
    JsonOption,
    QuietOption,
    RankByOption,
    SchedulerOption,
    SecondsOption,
    SeedOption,
    ShareOption,
    TargetArgument,
    TopOption,
    VariableOption,
)
from relook.cli.running import running
from relook.errors import ExitCode, RelookError


def score(
    target: TargetArgument = Path(),
    variable: VariableOption = None,
    difference: DifferenceOption = None,
    merge: Annotated[
        list[str] | None,
        typer.Option(
            "--merge",
            metavar="NEW=A,B",
            help="Show alpha with labels A and B taken as one; may be repeated.",
        ),
    ] = None,
    coding: Annotated[
        int | None,
        typer.Option(
            "--coding", min=1, metavar="N", help="Of this coding; 1 is that of the label tables."
        ),
    ] = None,
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
        str | None,
        typer.Option(
            "--require",
            metavar="ALPHA",
            help="Exit with 1 where alpha of independent labels is undefined or lower; "
            "`bar` takes it from relook.toml.",
        ),
    ] = None,
    engine: EngineOption = None,
    scheduler: SchedulerOption = None,
    by_item: ByItemOption = False,
    seed: SeedOption = None,
    force: ForceOption = False,
    as_json: JsonOption = False,
    quiet: QuietOption = False,
    debug: DebugOption = False,
) -> None:
    """Show alpha, observed and expected disagreement, and where the disagreement lives."""
    with running(quiet=quiet, debug=debug) as terminal:
        from relook.cli.parts import refuse_beside_dask, score_with_dask, wants_dask
        from relook.cli.screens.score import score_screen
        from relook.cli.targets import open_target
        from relook.project.archive.codings import FIRST_CODING, coding_numbered, load_coding
        from relook.project.figures import scoring
        from relook.project.figures.item_table import item_table
        from relook.project.figures.label_mergers import parse_merge_group
        from relook.project.figures.ordering import DEFAULT_SEED, settings_of_queue
        from relook.project.figures.requiring import (
            refuse_changed_labels,
            required_alpha,
            shortfalls,
        )
        from relook.project.figures.score_object import changed_warning, score_object
        from relook.project.setup.folder import write_whole
        from relook.project.setup.loading import load, refuse_source
        from relook.tables.results import csv_bytes

        groups = [parse_merge_group(text) for text in merge or []]
        project = open_target(target, terminal, difference=difference)
        bar = None if require is None else required_alpha(require, project.settings)
        overrides: dict[str, Any] = {
            "rank_by": rank_by,
            "top": top,
            "share": share,
            "hours": hours,
            "seconds_per_item": seconds_per_item,
        }
        queue = settings_of_queue(project.settings.queue, overrides)
        if wants_dask(engine, scheduler=scheduler, by_item=by_item):
            refuse_beside_dask(("--items", items), ("--merge", merge), ("--coding", coding))
            loaded = None
        elif coding is None or coding == FIRST_CODING:
            with terminal.doing() as doing:
                loaded = load(project, only=variable, doing=doing)
        else:
            if not project.settings.project:
                raise RelookError("a bare table has one coding alone", mend="name a project folder")
            loaded = load_coding(project, coding_numbered(project, coding), only=variable)
        seed = DEFAULT_SEED if seed is None else seed
        if loaded is None:
            scored = score_with_dask(
                project, queue, terminal, scheduler=scheduler, by_item=by_item, seed=seed,
                only=variable,
            )  # fmt: skip
            loaded = scored.loaded
        else:
            with terminal.doing() as doing:
                scored = scoring.score(
                    loaded,
                    queue,
                    seed=seed,
                    with_doubt=items is not None,
                    merge=groups,
                    doing=doing,
                )
        for line in loaded.said:
            terminal.say(line)
        terminal.problems(loaded.problems)
        if scored.changed_files:
            terminal.warn(changed_warning(scored.changed_files))
        if items is not None:
            refuse_source(loaded, items)
            write_whole(items, csv_bytes(item_table(scored)), force=force)
            terminal.say(f"wrote {items}")
            for held in scored.variables:
                if held.doubt.undefined_because and held.agreement.n_disputed_items:
                    terminal.say(f"{held.name}: no doubt, because {held.doubt.undefined_because}")
        if as_json:
            terminal.json(score_object(scored))
        else:
            terminal.data(score_screen(scored))
        scoring.refuse_nothing_pairable(scored)
        if bar is not None:
            refuse_changed_labels(scored)
            below = shortfalls(scored, bar)
            for said in below:
                terminal.warn(said)
            if below:
                raise typer.Exit(int(ExitCode.FALLS_SHORT))
