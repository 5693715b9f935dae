"""The machines: a local cluster or one that is named, and the work that is sent there."""

from __future__ import annotations

import contextlib
from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass, replace
from pathlib import Path
from typing import Any

from relook.core.exact import IntArray
from relook.engines.adding import PartedLoaded, add_parts, with_items
from relook.engines.parts import FoundItems, ReducedPart, read_and_find, read_and_reduce
from relook.errors import RelookError
from relook.project.setup.folder import Project
from relook.tables.items import read_items
from relook.tables.reading import find_files

LAYOUTS = ("long", "by-coder")


@dataclass(frozen=True, slots=True)
class Cluster:
    """A dask client, and how the parts are to be seen.

    Attributes
    ----------
    client : distributed.Client
    by_item : bool
        Whether the user promises that each item lies in one file.
    """

    client: Any
    by_item: bool


@contextlib.contextmanager
def cluster_at(scheduler: str | None, *, by_item: bool) -> Iterator[Cluster]:
    """Connect to a scheduler, or start a cluster on this machine, and close it at the end.

    Parameters
    ----------
    scheduler : str or None
        Its address; None for a cluster on this machine.
    by_item : bool

    Raises
    ------
    RelookError
        dask is not installed, or the scheduler does not answer.
    """
    try:
        from distributed import Client, LocalCluster
    except ImportError:
        raise RelookError(
            "the engine dask is not installed", mend="run: pip install 'relook[cluster]'"
        ) from None
    with contextlib.ExitStack() as stack:
        try:
            if scheduler is None:
                local = LocalCluster(  # type: ignore[no-untyped-call]
                    dashboard_address=None, silence_logs=50
                )
                stack.enter_context(local)
                client = Client(local)  # type: ignore[no-untyped-call]
            else:
                client = Client(  # type: ignore[no-untyped-call]
                    scheduler, timeout="10s"
                )
            stack.enter_context(client)
        except (OSError, ValueError, TimeoutError) as error:
            raise RelookError(
                f"the scheduler {scheduler or 'on this machine'} does not answer: {error}",
                mend="check the address, such as tcp://10.0.0.5:8786, and that it runs",
            ) from None
        yield Cluster(client, by_item)


def said_of(cluster: Cluster) -> str:
    """Say what machines there are."""
    workers = cluster.client.scheduler_info(n_workers=-1)["workers"].values()
    memory = sum(int(worker["memory_limit"]) for worker in workers)
    return (
        f"dask: {len(workers)} workers with {memory / 1e9:.1f} GB in all; doubt, pairs of coders "
        "and groups are left to a single machine"
    )


def load_parts(
    project: Project, cluster: Cluster, seed: int, *, only: Sequence[str] | None = None
) -> tuple[PartedLoaded, list[ReducedPart], Callable[[PartedLoaded, IntArray], PartedLoaded]]:
    """Have every part read and reduced, and add up what comes back.

    Parameters
    ----------
    project : Project
    cluster : Cluster
    seed : int
    only : sequence of str, optional
        Names of the variables.

    Returns
    -------
    loaded : PartedLoaded
        Without ids and labels.
    parts : list of ReducedPart
    fetch : callable
        Brings in ids and labels of chosen items.

    Raises
    ------
    RelookError
        Problems in the parts, or a table of counts.
    """
    settings = project.settings
    source = settings.labels
    if source.layout not in LAYOUTS or source.leave_out:
        raise RelookError(
            "the engine dask reads long tables and tables by coder, with every coder in them",
            mend="leave out --engine, or change layout and leave_out in relook.toml",
        )
    names = [settings.variable(name).name for name in only] if only else None
    variables = [each for each in settings.variables if names is None or each.name in names]
    root = project.root.absolute()
    files = [root / path for path in find_files(source.files, project.root)]
    if cluster.by_item or len(files) == 1:
        parts, find = _by_file(cluster, files, source, variables, root, seed)
    else:
        parts, find = _by_shuffle(cluster, files, source, variables, root, seed)
    items = read_items(settings.items, project.root) if settings.items is not None else None
    loaded = add_parts(project, variables, parts, items, seed)

    def fetch(held: PartedLoaded, chosen: IntArray) -> PartedLoaded:
        return with_items(held, parts, chosen, find)

    return loaded, parts, fetch


def _by_file(
    cluster: Cluster, files: Sequence[Path], source: Any, variables: Any, root: Path, seed: int
) -> tuple[list[ReducedPart], Callable[[dict[int, IntArray]], dict[int, FoundItems]]]:
    client = cluster.client
    asked = client.map(
        read_and_reduce, files, source=source, variables=variables, root=root, seed=seed
    )
    parts = _gathered(client, asked)

    def find(places: dict[int, IntArray]) -> dict[int, FoundItems]:
        looked = {
            part: client.submit(read_and_find, files[part], source, variables, root, place)
            for part, place in places.items()
        }
        return dict(zip(looked, _gathered(client, list(looked.values())), strict=True))

    return parts, find


def _by_shuffle(
    cluster: Cluster, files: Sequence[Path], source: Any, variables: Any, root: Path, seed: int
) -> tuple[list[ReducedPart], Callable[[dict[int, IntArray]], dict[int, FoundItems]]]:
    from relook.engines.shuffling import digest_of, find_rows, reduce_rows, shuffled

    client = cluster.client
    frame, _ = shuffled(files, source, variables, root)
    rows = client.compute(frame.to_delayed())
    asked = client.map(reduce_rows, rows, source=source, variables=variables, root=root, seed=seed)
    parts = _gathered(client, asked)
    # The parts are of no file; that of each file is told with the first of them.
    digests = _gathered(client, client.map(digest_of, files))
    names = [file.relative_to(root).as_posix() for file in files]
    parts[0] = replace(parts[0], digests=dict(zip(names, digests, strict=True)))

    def find(places: dict[int, IntArray]) -> dict[int, FoundItems]:
        looked = {
            part: client.submit(find_rows, rows[part], source, variables, root, place)
            for part, place in places.items()
        }
        return dict(zip(looked, _gathered(client, list(looked.values())), strict=True))

    return parts, find


def _gathered(client: Any, asked: Sequence[Any]) -> list[Any]:
    """Wait for all; problems of every part in one error."""
    from distributed import wait

    wait(asked)  # type: ignore[no-untyped-call]
    errors = [future.exception() for future in asked if future.status == "error"]
    ours = [error for error in errors if isinstance(error, RelookError)]
    if ours:
        found = [problem for error in ours for problem in (error.problems or [_problem(error)])]
        # What comes after a part that failed fails for the same reason.
        raise RelookError.from_problems(list(dict.fromkeys(found)))
    if errors:
        raise RelookError(
            f"{len(errors):,} of {len(asked):,} parts could not be done: {errors[0]}",
            mend="check that every worker has this relook installed and can read the files, and "
            "that a part fits into a worker's memory",
        )
    return list(client.gather(list(asked)))


def _problem(error: RelookError) -> Any:
    from relook.errors import Problem

    return Problem(error.message, error.where, error.mend)
