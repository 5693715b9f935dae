"""`--engine dask`, for the commands that have it."""

from __future__ import annotations

import contextlib
from collections.abc import Callable, Iterator, Sequence
from typing import TYPE_CHECKING

from relook.cli.terminal import Terminal
from relook.errors import RelookError

if TYPE_CHECKING:
    from relook.project.figures.scoring import Score
    from relook.project.sending.queueing import QueueRequest
    from relook.project.setup.folder import Project
    from relook.project.setup.loading import Loaded
    from relook.project.setup.settings import QueueSettings


def wants_dask(engine: str | None, *, scheduler: str | None, by_item: bool) -> bool:
    """Whether the labels are to be summed up by dask.

    Raises
    ------
    RelookError
        An engine that is not known, or options of dask without it.
    """
    if engine is None:
        if scheduler is not None or by_item:
            raise RelookError(
                "--scheduler and --by-item are of the engine dask", mend="add --engine dask"
            )
        return False
    if engine != "dask":
        raise RelookError(f'"{engine}" is no engine', mend="write --engine dask, or leave it out")
    return True


def refuse_beside_dask(*given: tuple[str, object]) -> None:
    """Refuse options that need every label at once.

    Raises
    ------
    RelookError
        One of them was given.
    """
    for flag, value in given:
        if value:
            raise RelookError(
                f"{flag} needs every label at once, and --engine dask has only their sums",
                mend=f"leave out {flag}, or --engine",
            )


def score_with_dask(
    project: Project,
    queue: QueueSettings,
    terminal: Terminal,
    *,
    scheduler: str | None,
    by_item: bool,
    seed: int,
    only: Sequence[str] | None,
) -> Score:
    """Compute the figures on a cluster that is closed afterwards."""
    from relook.engines.cluster import cluster_at, said_of
    from relook.engines.running import score_in_parts

    with cluster_at(scheduler, by_item=by_item) as cluster:
        terminal.say(said_of(cluster))
        with terminal.doing() as doing:
            doing("summing up the parts")
            return score_in_parts(project, queue, cluster, seed=seed, only=only)


@contextlib.contextmanager
def loader_with_dask(
    request: QueueRequest, terminal: Terminal, *, scheduler: str | None, by_item: bool
) -> Iterator[Callable[[Project], Loaded]]:
    """Give what loads a project on a cluster that is closed afterwards."""
    from relook.engines.cluster import cluster_at, said_of
    from relook.engines.running import load_for_queue

    with cluster_at(scheduler, by_item=by_item) as cluster:
        terminal.say(said_of(cluster))

        def loader(project: Project) -> Loaded:
            return load_for_queue(project, request, cluster)

        yield loader
