"""Doubt: how likely an item's consensus label is wrong, under a model of how coders err.

The model is that of Dawid, A. P. & Skene, A. M. (1979). Maximum likelihood estimation of observer
error-rates using the EM algorithm. Applied Statistics 28(1):20–28: every item has one true value,
every coder a table of how they label each true value. Each coder's table is drawn toward the pooled
one, so that a coder with few labels cannot reach certainty; with `SHRINK` 0 the estimates would be
the paper's maximum likelihood ones. Doubt is one minus the posterior of the consensus label. It
orders items; the model takes coders' errors for independent, and where they are not its extremes
promise too much.

The likelihood has several maxima, so the start is fixed: "shares", T_ij = the share of j among the
labels of item i, as in the paper.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from relook.core.agreement import Agreement
from relook.core.consensus import Consensus
from relook.core.differences import Jaccard, Masi
from relook.core.exact import BoolArray, FloatArray, IntArray, tally
from relook.core.labels import CodedLabels
from relook.errors import RelookError

#: Labels that the pooled table adds to each row of a coder's table.
SHRINK = 3.0
#: No T may move by this much in the last step.
TOLERANCE = 1e-6
MOST_STEPS = 500
START = "shares"

#: More numbers than this are not held at once, whatever the variable.
_LARGEST_TABLE = 200_000_000

NO_CODERS = "the labels are counts without coders"
NOT_DISCRETE = "the labels are numbers on a scale, or sets, and not one of a list"
TOO_FEW_CODERS = "fewer than three coders share items, so nothing tells who is right"
NO_THIRD_LABEL = "no item has labels of three coders, so nothing tells who is right"
TOO_LARGE = "there are too many values, coders and items for one table"


@dataclass(frozen=True, slots=True, eq=False)
class CoderModel:
    """Dawid and Skene's estimates.

    Attributes
    ----------
    values : int array of shape (k,)
        The value codes that occur; the tables below have a row or column for each of them.
    posteriors : float array of shape (k, n_items)
        T: the probability of each value, given the item's labels; nan for items without labels.
    class_shares : float array of shape (k,)
        p_j, the estimated share of each true value.
    coder_tables : float array of shape (n_coders, k, k)
        π: by coder, true value (row) and label (column). Rows of coders without labels are the
        pooled ones.
    converged : bool
        Whether the last step moved no T by `TOLERANCE` or more.
    steps : int
    shrink : float
    start : str
    """

    values: IntArray
    posteriors: FloatArray
    class_shares: FloatArray
    coder_tables: FloatArray
    converged: bool
    steps: int
    shrink: float
    start: str = START


@dataclass(frozen=True, slots=True, eq=False)
class Doubt:
    """How likely each item's consensus label is to be wrong.

    Attributes
    ----------
    doubt : float array of shape (n_items,) or None
        1 − T of the consensus label; with a tie 1 − the largest T among the tied. nan for items
        without labels. None where there is no ground for it.
    undefined_because : str or None
        Why, where `doubt` is None.
    tie : bool array of shape (n_items,) or None
    model : CoderModel or None
    """

    doubt: FloatArray | None
    undefined_because: str | None
    tie: BoolArray | None
    model: CoderModel | None

    @property
    def for_ranking(self) -> FloatArray | None:
        """Doubt as it ranks, shape (n_items,): a tie for first place counts as at least ½.

        Among equal ones `doubt` itself decides.
        """
        if self.doubt is None or self.tie is None:
            return None
        return np.where(self.tie, np.maximum(self.doubt, 0.5), self.doubt)


def estimate_doubt(
    agreement: Agreement,
    consensus: Consensus,
    *,
    shrink: float = SHRINK,
    progress: Callable[[int, float], None] | None = None,
) -> Doubt:
    """Estimate the doubt of every item, where there is ground for it.

    Parameters
    ----------
    agreement : Agreement
    consensus : Consensus
        Of its profiles.
    shrink : float
        Labels that the pooled table adds to each row of a coder's table.
    progress : callable, optional
        Called with the number of steps done and the largest move of any T.

    Returns
    -------
    Doubt
        With None and the reason where `no_ground` finds one.
    """
    because = no_ground(agreement)
    if because is not None:
        return Doubt(None, because, None, None)
    model = fit_coders(agreement.labels, shrink=shrink, progress=progress)
    doubt, tie = _of_consensus(agreement, consensus, model)
    return Doubt(doubt, None, tie, model)


def no_ground(agreement: Agreement) -> str | None:
    """Return why doubt cannot be estimated, None where it can.

    Notes
    -----
    It needs labels from a list (differences that need no number of a label, and no sets); three
    coders at least who label an item that another coder labels too; and one item at least with
    labels of three coders. A coder who labels an item twice counts once.
    """
    labels = agreement.labels
    if agreement.function.needs == "number" or isinstance(agreement.function, Jaccard | Masi):
        return NOT_DISCRETE
    if labels.coder_index is None:
        return NO_CODERS
    n_coders = max(1, labels.n_coders)
    item, coder = _once_each(labels, n_coders)
    coders_of_item = tally(item, labels.n_items)
    sharing = coders_of_item[item] >= 2
    if np.count_nonzero(np.bincount(coder[sharing])) < 3:
        return TOO_FEW_CODERS
    if int(coders_of_item.max()) < 3:
        return NO_THIRD_LABEL
    k = int(np.count_nonzero(np.bincount(agreement.profiles.value_index)))
    if k * max(labels.n_items, n_coders * k) > _LARGEST_TABLE:
        return TOO_LARGE
    return None


def _once_each(labels: CodedLabels, n_coders: int) -> tuple[IntArray, IntArray]:
    """Return the pairs of item and coder, each once."""
    item, coder = labels.item_index, labels.coder_index
    assert coder is not None
    # Tables are read by item and coder, without repeats, so there is mostly nothing to be done.
    if all(_ascending(run, n_coders) for run in labels.blocks()):
        return item, coder
    pair = item.astype(np.int64) * n_coders + coder
    pair.sort()
    again = np.concatenate([[False], pair[1:] == pair[:-1]])
    return np.divmod(pair[~again], n_coders)


def _ascending(labels: CodedLabels, n_coders: int) -> bool:
    """Whether each label is of a later item than the last, or of the same by a later coder."""
    assert labels.coder_index is not None
    pair = labels.item_index.astype(np.int64) * n_coders + labels.coder_index
    return bool((pair[1:] > pair[:-1]).all())


def fit_coders(
    labels: CodedLabels,
    *,
    shrink: float = SHRINK,
    tolerance: float = TOLERANCE,
    most_steps: int = MOST_STEPS,
    progress: Callable[[int, float], None] | None = None,
) -> CoderModel:
    """Fit Dawid and Skene's model.

    Parameters
    ----------
    labels : CodedLabels
        With coders. A coder may label an item more than once.
    shrink : float
        0 for the maximum-likelihood estimates of the paper.
    tolerance : float
        Stop when no T moves by so much. With shrinking the log-likelihood need not rise, so it is
        no criterion.
    most_steps : int
    progress : callable, optional

    Returns
    -------
    CoderModel

    Notes
    -----
    M: p_j = mean of T_ij over items with labels, N^k_jl = Σ_i T_ij n^k_il (eq. 2.3, 2.4 of the
    paper), π^k_jl = (N^k_jl + s π_jl)/(Σ_l N^k_jl + s) with π the pooled table and s the shrinking
    weight. E: log T_ij = log p_j + Σ_k Σ_l n^k_il log π^k_jl, less the log of its sum over j
    (eq. 2.5).
    """
    if labels.coder_index is None:
        raise RelookError(NO_CODERS)
    values, value = np.unique(labels.value_index, return_inverse=True)
    k, n_coders = values.size, labels.n_coders
    # Labels are sorted by item, so an item's are one run and gathering T is repeating it.
    per_item = labels.labels_per_item
    labelled = np.flatnonzero(per_item)
    length = per_item[labelled]
    start = np.cumsum(length) - length
    cell = (labels.coder_index.astype(np.int64) * k + value).astype(np.int64)
    posteriors = _shares(value, labelled, per_item, labels.item_index, k)
    shares, tables = _m_step(posteriors, cell, length, n_coders, k, shrink)
    converged, steps = False, 0
    while steps < most_steps and not converged:
        moved = _e_step(posteriors, shares, tables, cell, start)
        steps += 1
        shares, tables = _m_step(posteriors, cell, length, n_coders, k, shrink)
        converged = moved < tolerance
        if progress is not None:
            progress(steps, moved)
    spread = np.full((k, labels.n_items), np.nan)
    spread[:, labelled] = posteriors
    return CoderModel(values, spread, shares, tables, converged, steps, shrink)


def _shares(
    value: IntArray, labelled: IntArray, per_item: IntArray, item_index: IntArray, k: int
) -> FloatArray:
    """The start: T_ij = share of j among the labels of item i, shape (k, n_labelled)."""
    place = np.zeros(per_item.size, dtype=np.int64)
    place[labelled] = np.arange(labelled.size)
    counts = np.bincount(value * labelled.size + place[item_index], minlength=k * labelled.size)
    return np.asarray(counts.reshape(k, labelled.size) / per_item[labelled])


def _m_step(
    posteriors: FloatArray, cell: IntArray, length: IntArray, n_coders: int, k: int, shrink: float
) -> tuple[FloatArray, FloatArray]:
    """Class shares, and coders' tables of shape (n_coders, k, k)."""
    n_items = posteriors.shape[1]
    counts = np.empty((n_coders, k, k))
    for j in range(k):
        of_labels = np.repeat(posteriors[j], length)
        counts[:, j, :] = np.bincount(cell, weights=of_labels, minlength=n_coders * k).reshape(
            n_coders, k
        )
    pooled = counts.sum(axis=0)
    pooled = _rows_to_one(pooled, np.full((k, k), 1.0 / k))
    tables = _rows_to_one(counts + shrink * pooled, np.broadcast_to(pooled, counts.shape))
    return posteriors.sum(axis=1) / max(1, n_items), tables


def _rows_to_one(counts: FloatArray, otherwise: FloatArray) -> FloatArray:
    """Rows divided by their sums; rows without a count are taken from `otherwise`."""
    sums = counts.sum(axis=-1, keepdims=True)
    return np.asarray(np.where(sums > 0, counts / np.where(sums > 0, sums, 1.0), otherwise))


def _e_step(
    posteriors: FloatArray, shares: FloatArray, tables: FloatArray, cell: IntArray, start: IntArray
) -> float:
    """Replace the posteriors in place; return the largest move of any of them."""
    k = shares.size
    with np.errstate(divide="ignore"):
        log_shares, log_tables = np.log(shares), np.log(tables)
    new = np.empty_like(posteriors)
    for j in range(k):
        # By (coder, label) for this true value: the cell of each label picks its entry.
        by_cell = np.ascontiguousarray(log_tables[:, j, :]).ravel()
        new[j] = np.add.reduceat(by_cell[cell], start) if start.size else 0.0
        new[j] += log_shares[j]
    new -= new.max(axis=0)
    np.exp(new, out=new)
    new /= new.sum(axis=0)
    np.subtract(posteriors, new, out=posteriors)
    moved = float(np.abs(posteriors).max(initial=0.0))
    posteriors[:] = new
    return moved


def _of_consensus(
    agreement: Agreement, consensus: Consensus, model: CoderModel
) -> tuple[FloatArray, BoolArray]:
    """1 − T(consensus) of each item, and whether it is a tie."""
    n_items = agreement.labels.n_items
    profile = agreement.profile_of_item
    known = np.flatnonzero(profile >= 0)
    place = np.full(int(agreement.labels.n_values), -1, dtype=np.int64)
    place[model.values] = np.arange(model.values.size)
    tie = np.zeros(n_items, dtype=bool)
    tie[known] = consensus.tie[profile[known]]
    doubt = np.full(n_items, np.nan)

    single = known[~tie[known]]
    label = place[consensus.value_index[profile[single]]]
    doubt[single] = _all_but(model.posteriors, label, single)
    tied = known[tie[known]]
    if tied.size:
        doubt[tied] = np.inf
        n_tied = np.diff(consensus.tied_start)[profile[tied]]
        for turn in range(int(n_tied.max())):
            some = tied[n_tied > turn]
            label = place[consensus.tied_value_index[consensus.tied_start[profile[some]] + turn]]
            doubt[some] = np.minimum(doubt[some], _all_but(model.posteriors, label, some))
    return doubt, tie


def _all_but(posteriors: FloatArray, label: IntArray, items: IntArray) -> FloatArray:
    """1 − T as the sum of the other T, which keeps its digits where T is close to 1."""
    others = posteriors[:, items]
    others[label, np.arange(items.size)] = 0.0
    return np.asarray(np.minimum(others.sum(axis=0), 1.0))
