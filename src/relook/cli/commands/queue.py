"""`relook queue`: rank, select, plan and write a round of worksheets."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

from relook.cli.options import (
    ByItemOption,
    DebugOption,
    DifferenceOption,
    DryRunOption,
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
)
from relook.cli.running import running


def queue(
    target: TargetArgument = Path(),
    top: TopOption = None,
    share: ShareOption = None,
    hours: HoursOption = None,
    seconds_per_item: SecondsOption = None,
    rank_by: RankByOption = None,
    audit: Annotated[
        int | None,
        typer.Option("--audit", min=0, metavar="N", help="Audit items to draw at random."),
    ] = None,
    adjudicator: Annotated[
        list[str] | None,
        typer.Option(
            "--adjudicator",
            metavar="NAME",
            help="Who decides, for a bare table; may be repeated.",
        ),
    ] = None,
    difference: DifferenceOption = None,
    following: Annotated[
        bool,
        typer.Option("--next", help="Plan the next round although nothing of the last is back."),
    ] = False,
    again: Annotated[
        bool, typer.Option("--again", help="Send items again that are settled or still out.")
    ] = False,
    splits: Annotated[
        bool,
        typer.Option("--splits", help="Send only what adjudicators differ on to somebody else."),
    ] = False,
    reissue: Annotated[
        str | None,
        typer.Option(
            "--reissue", metavar="ADJUDICATOR", help="Send this person's open rows once more."
        ),
    ] = None,
    to: Annotated[
        str | None, typer.Option("--to", metavar="OTHER", help="With --reissue: to somebody else.")
    ] = None,
    include_single: Annotated[
        bool, typer.Option("--include-single", help="Send items with a single label too.")
    ] = False,
    engine: EngineOption = None,
    scheduler: SchedulerOption = None,
    by_item: ByItemOption = False,
    seed: SeedOption = None,
    dry_run: DryRunOption = False,
    force: ForceOption = False,
    as_json: JsonOption = False,
    quiet: QuietOption = False,
    debug: DebugOption = False,
) -> None:
    """Rank the items, select those most worth a second look, and write worksheets for them."""
    with running(quiet=quiet, debug=debug) as terminal:
        import contextlib
        from dataclasses import replace

        from relook.cli.parts import loader_with_dask, wants_dask
        from relook.cli.screens.queue import queue_screen
        from relook.cli.targets import project_to_write
        from relook.project.figures.ordering import DEFAULT_SEED, settings_of_queue
        from relook.project.sending.queue_run import queue_object, run_queue
        from relook.project.sending.queueing import QueueRequest

        project, is_new = project_to_write(
            target, terminal, difference=difference, adjudicators=adjudicator, dry_run=dry_run
        )
        overrides = {
            "rank_by": rank_by,
            "top": top,
            "share": share,
            "hours": hours,
            "seconds_per_item": seconds_per_item,
            "include_single": include_single or None,
        }
        wanted = settings_of_queue(project.settings.queue, overrides)
        if is_new:  # what is asked of a bare table is what its project keeps
            project = replace(project, settings=replace(project.settings, queue=wanted))
        request = QueueRequest(
            queue=wanted,
            seed=DEFAULT_SEED if seed is None else seed,
            audit=audit,
            following=following,
            again=again,
            splits_only=splits,
            reissue=reissue,
            reissue_to=to,
        )
        dask = wants_dask(engine, scheduler=scheduler, by_item=by_item)
        with contextlib.ExitStack() as stack:
            loader = None
            if dask:
                loader = stack.enter_context(
                    loader_with_dask(request, terminal, scheduler=scheduler, by_item=by_item)
                )
            doing = stack.enter_context(terminal.doing())
            done = run_queue(
                project,
                request,
                stamp=terminal.now().isoformat(timespec="seconds"),
                new_project=is_new,
                dry_run=dry_run,
                force=force,
                doing=doing,
                loader=loader,
            )
        for line in done.loaded.said:
            terminal.say(line)
        terminal.problems(done.loaded.problems)
        if as_json:
            terminal.json(queue_object(done))
        else:
            terminal.data(queue_screen(done))
