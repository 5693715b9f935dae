"""`score` and `queue` on labels in parts: the same functions, on sums and on chosen items."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

import numpy as np

from relook.core.exact import IntArray
from relook.engines.adding import PartedLoaded
from relook.engines.cluster import Cluster, load_parts
from relook.errors import RelookError
from relook.project.archive.history import History
from relook.project.archive.record import read_record
from relook.project.archive.rounds import read_rounds
from relook.project.archive.settlements import settlements
from relook.project.figures.ordering import order_items, overlap_of
from relook.project.figures.scoring import Score, score
from relook.project.sending.queueing import QueueRequest, n_audit_of
from relook.project.sending.round_items import audit_draws, left_out_items
from relook.project.setup.folder import Project
from relook.project.setup.settings import QueueSettings

#: Items of the ranking whose ids and labels a screen shows.
SHOWN = 50


def parted(project: Project) -> Project:
    """Return the project as far as it can be had of labels in parts: without groups of items.

    Raises
    ------
    RelookError
        A column of priorities or of clusters, which would change the ranking or the interval.
    """
    items = project.settings.items
    if items is None:
        return project
    for name in ("priority", "resample_by"):
        if getattr(items, name) is not None:
            raise RelookError(
                f"{name} needs every item's id at once, and the engine dask has them in parts",
                mend=f"leave out --engine, or {name} in relook.toml",
            )
    settings = replace(project.settings, items=replace(items, group_by=()))
    return replace(project, settings=settings)


def score_in_parts(
    project: Project,
    queue: QueueSettings,
    cluster: Cluster,
    *,
    seed: int,
    only: Sequence[str] | None = None,
) -> Score:
    """Compute the figures of a project whose labels lie in parts.

    Parameters
    ----------
    project : Project
    queue : QueueSettings
    cluster : Cluster
    seed : int
    only : sequence of str, optional
        Names of the variables.

    Returns
    -------
    Score
        As `relook.project.figures.scoring.score`, without doubt, pairs of coders and groups.

    Raises
    ------
    RelookError
        As `load_parts` and `parted`.
    """
    project = parted(project)
    bare = replace(project, settings=replace(project.settings, items=None))
    loaded, _, fetch = load_parts(bare, cluster, seed, only=only)
    ordering = order_items(
        loaded,
        queue,
        seed=seed,
        n_audit_items=queue.audit,
        overlap=overlap_of(project.settings),
    )
    head = ordering.ranking.item_index[: max(SHOWN, ordering.selection.n_items)]
    return score(fetch(loaded, head), queue, seed=seed, ordering=ordering)


def load_for_queue(project: Project, request: QueueRequest, cluster: Cluster) -> PartedLoaded:
    """Load a project for a round: all sums, and ids and labels of the items that will be sent.

    Parameters
    ----------
    project : Project
    request : QueueRequest
    cluster : Cluster

    Raises
    ------
    RelookError
        As `load_parts` and `parted`; a request that needs labels of items sent before.
    """
    if request.splits_only or request.reissue is not None or request.queue.include_single:
        raise RelookError(
            "--splits, --reissue and --include-single are of single items, not of all",
            mend="leave out --engine",
        )
    project = parted(project)
    loaded, _, fetch = load_parts(project, cluster, request.seed)
    record = read_record(project)
    rounds = read_rounds(project)
    # Items that were sent before are asked for by their ids, and must then have their labels.
    before = [row.item for held in rounds for row in held.rows]
    known = loaded.item_numbers(before)
    loaded = fetch(loaded, known[known >= 0])
    history = History(rounds, record, settlements(loaded, record))
    left_out = left_out_items(loaded, history, again=request.again)
    n_audit = n_audit_of(request, history)
    ordering = order_items(
        loaded,
        request.queue,
        seed=request.seed,
        leave_out=left_out,
        n_audit_items=n_audit,
        overlap=overlap_of(project.settings),
    )
    sent = {name: np.zeros(len(loaded.labels.items), dtype=bool) for name in loaded.agreements}
    ranking = ordering.ranking
    for position, name in enumerate(ranking.variables):
        sent[name][ranking.items_with(position, ordering.selection.n_items)] = True
    draws = audit_draws(loaded, request.seed, n_audit, left_out, sent)
    chosen: list[IntArray] = [ordering.selection.item_index, known[known >= 0]]
    chosen += [draw.item_index for _, draw in draws]
    return fetch(loaded, np.concatenate(chosen))
