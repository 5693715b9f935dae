"""The order in which disputed items deserve a second look, and how many of them.

Ties are the rule here: with two coders and one variable every disputed item contributes the same.
They are broken by doubt where it is given, then by intensity, then in turn over the pairs of labels
that clash, heaviest pair first, and last by a keyed hash of the item's id; never by position.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Literal

import numpy as np

from relook.core.agreement import Agreement
from relook.core.contributions import intensity as item_intensities
from relook.core.contributions import profile_contributions
from relook.core.exact import BoolArray, FloatArray, IntArray
from relook.core.ties import TIE, dealt_in_turn, heaviest_pairs, tie_levels, tied_blocks
from relook.errors import RelookError

RankBy = Literal["contribution", "doubt", "intensity"]


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class RankedVariable:
    """One variable as it enters the ranking.

    Attributes
    ----------
    name : str
    agreement : Agreement
        All variables number the items alike.
    weight : float
        0 or more; only tells between several variables.
    doubt : float array of shape (n_items,) or None
        Doubt as it ranks (see `relook.core.doubt.Doubt.for_ranking`); None where it is undefined or
        was not asked for. nan counts as none.
    doubt_within_tie : float array of shape (n_items,) or None
        Tells between items of equal `doubt`.
    leave_out : bool array of shape (n_items,) or None
        Items that need no second look on this variable, such as those decided already.
    """

    name: str
    agreement: Agreement
    weight: float = 1.0
    doubt: FloatArray | None = None
    doubt_within_tie: FloatArray | None = None
    leave_out: BoolArray | None = None


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Ranking:
    """Disputed items, most deserving first, each with the variables to look at.

    Attributes
    ----------
    rank_by : {"contribution", "doubt", "intensity"}
    variables : tuple of str
    item_index : int array of shape (n,)
        Items in rank order: rank r is entry r − 1. Items of priority 0 are not in it.
    score : float array of shape (n,)
        What the items were ranked by, priority included.
    carried : float array of shape (n,)
        One variable: the item's contribution to D_o. Several: the sum of weight × chance-scaled
        contribution over all its variables.
    carried_in_all : float
        Over all items of the data, left-out ones too: D_o, or Σ weight × n (1 − alpha).
    tied : int array of shape (n,)
        Numbers the runs of items whose scores are equal to 12 significant digits.
    row_start : int array of shape (n + 1,)
        Item r owns the rows `row_start[r]:row_start[r + 1]`, heaviest variable first.
    row_variable : int array of shape (n_rows,)
        Position in `variables`.
    row_contribution : float array of shape (n_rows,)
        The item's contribution to D_o of that variable.
    observed_disagreement : float array of shape (n_variables,)
        D_o, nan where nothing is pairable.
    """

    rank_by: RankBy
    variables: tuple[str, ...]
    item_index: IntArray
    score: FloatArray
    carried: FloatArray
    carried_in_all: float
    tied: IntArray
    row_start: IntArray
    row_variable: IntArray
    row_contribution: FloatArray
    observed_disagreement: FloatArray

    @property
    def n_items(self) -> int:
        """How many items are ranked."""
        return int(self.item_index.size)

    def rank_of_item(self, n_items: int) -> IntArray:
        """Return the 1-based rank of each of `n_items` items, 0 for those not ranked."""
        rank = np.zeros(n_items, dtype=np.int64)
        rank[self.item_index] = np.arange(1, self.n_items + 1)
        return rank

    def items_with(self, variable: int, n: int | None = None) -> IntArray:
        """Return, in rank order, the items among the first `n` that have a row for a variable."""
        n = self.n_items if n is None else n
        rows = slice(0, int(self.row_start[n]))
        each = np.repeat(np.arange(n), np.diff(self.row_start[: n + 1]))
        return np.asarray(self.item_index[each[self.row_variable[rows] == variable]])


def rank_items(
    variables: Sequence[RankedVariable],
    item_hash: IntArray,
    *,
    rank_by: RankBy = "contribution",
    priority: FloatArray | None = None,
) -> Ranking:
    """Rank the items that are disputed in at least one variable.

    Parameters
    ----------
    variables : sequence of RankedVariable
        At least one.
    item_hash : int array of shape (n_items,)
        A keyed hash of each item's id, so that the last ties do not follow the file.
    rank_by : {"contribution", "doubt", "intensity"}
        With several variables the score is a weighted sum over the item's disputed variables: of
        chance-scaled contributions n_v d_u,v/D_e,v, of doubts, or of intensities over D_e,v.
    priority : float array of shape (n_items,), optional
        Multiplies the score; 0 keeps an item out.

    Returns
    -------
    Ranking

    Raises
    ------
    RelookError
        A negative priority or weight; `rank_by` doubt where no variable has it.

    Notes
    -----
    An item's rows stay together. It gets a row for each disputed variable to whose disagreement it
    contributes at least what the variable's pairable items contribute on average, and for its
    heaviest variable in any case.
    """
    _check(variables, item_hash, rank_by, priority)
    several = len(variables) > 1
    # Variables by items; the few variables of a project keep this small.
    disputed = np.stack([_disputed_items(v) for v in variables])
    weighted = np.stack([_of_items(v, _carried_by_profile(v, several)) for v in variables])
    intensity = np.stack([_intensity(v, several) for v in variables])
    weighted_disputed = np.where(disputed, weighted, 0.0)
    intensity = np.where(disputed, intensity, 0.0)
    score = _score(variables, rank_by, several, disputed, weighted_disputed, intensity)
    ranked = disputed.any(axis=0)
    if priority is not None:
        score = score * priority
        ranked &= priority > 0
    items = np.flatnonzero(ranked)

    # Where nothing but its labels tells of an item, one item of each profile stands for all.
    examples, stands_for = _examples(variables, priority, items)
    heaviest = np.argmax(np.where(disputed, weighted, -1.0)[:, examples], axis=0)
    pair_rank = _pair_ranks(variables, several, heaviest, examples)[stands_for]
    keys = [score[examples]]
    if rank_by != "doubt":
        keys += _doubt_keys(variables, several, disputed, examples)
    else:
        keys += _doubt_keys(variables, several, disputed, examples)[1:]
    if rank_by != "intensity":
        keys.append(intensity.sum(axis=0)[examples])
    block, tied = (each[stands_for] for each in tied_blocks(keys))
    carried = np.sum(
        [_kept(v, weights) for v, weights in zip(variables, weighted, strict=True)], axis=0
    )
    order = dealt_in_turn(block, pair_rank, item_hash[items])
    items = items[order]
    row_start, row_variable = _rows(variables, disputed[:, items], weighted[:, items])
    contribution = np.stack(
        [_of_items(v, profile_contributions(v.agreement))[items] for v in variables]
    )
    observed = [v.agreement.observed_disagreement for v in variables]
    each = np.repeat(np.arange(items.size), np.diff(row_start))
    return Ranking(
        rank_by=rank_by,
        variables=tuple(v.name for v in variables),
        item_index=items,
        score=score[items],
        carried=np.asarray(carried[items]),
        carried_in_all=float(weighted.sum()),
        tied=tied[order],
        row_start=row_start,
        row_variable=row_variable,
        row_contribution=contribution[row_variable, each],
        observed_disagreement=np.array(
            [np.nan if d_o is None else d_o for d_o in observed], dtype=np.float64
        ),
    )


def _examples(
    variables: Sequence[RankedVariable], priority: FloatArray | None, items: IntArray
) -> tuple[IntArray, IntArray]:
    """Items that stand for all others in the order, and which of them stands for each item.

    Parameters
    ----------
    items : int array of shape (n_ranked,)

    Returns
    -------
    examples : int array of shape (n_examples,)
    stands_for : int array of shape (n_ranked,)
        Positions in `examples`.
    """
    only = variables[0]
    if len(variables) > 1 or priority is not None or only.doubt is not None:
        return items, np.arange(items.size)
    profile = only.agreement.profile_of_item[items]
    example = np.full(only.agreement.profiles.n_profiles, -1, dtype=np.int64)
    example[profile] = items
    used = np.flatnonzero(example >= 0)
    place = np.cumsum(example >= 0) - 1
    return example[used], place[profile]


def _check(
    variables: Sequence[RankedVariable],
    item_hash: IntArray,
    rank_by: RankBy,
    priority: FloatArray | None,
) -> None:
    if not variables:
        raise RelookError("`variables` must hold at least one variable; got none")
    for variable in variables:
        if variable.weight < 0:
            raise RelookError(f'the weight of "{variable.name}" must not be negative')
        if variable.agreement.labels.n_items != item_hash.size:
            raise RelookError(f"`item_hash` must have {variable.agreement.labels.n_items} entries")
    if rank_by == "doubt" and all(variable.doubt is None for variable in variables):
        raise RelookError(
            "no variable has a doubt to rank by", mend="rank by contribution or by intensity"
        )
    if priority is not None and bool(np.any(~(priority >= 0))):
        raise RelookError("a priority must be a number of 0 or more")


def _of_items(variable: RankedVariable, by_profile: FloatArray) -> FloatArray:
    """Spread what profiles have to their items; 0 for an item without labels."""
    return np.asarray(np.append(by_profile, 0.0)[variable.agreement.profile_of_item])


def _disputed_items(variable: RankedVariable) -> BoolArray:
    agreement = variable.agreement
    disputed = np.append(agreement.disputed_profiles, False)[agreement.profile_of_item]
    return np.asarray(disputed if variable.leave_out is None else disputed & ~variable.leave_out)


def _kept(variable: RankedVariable, weights: FloatArray) -> FloatArray:
    """The weights of items that are not left out, 0 for the others."""
    return weights if variable.leave_out is None else np.where(variable.leave_out, 0.0, weights)


def _factor(variable: RankedVariable, several: bool) -> float:
    """What makes d_u of several variables comparable: weight × n/D_e."""
    if not several:
        return 1.0
    d_e = variable.agreement.expected_disagreement
    return variable.weight * variable.agreement.n_pairable_labels / d_e if d_e else 0.0


def _carried_by_profile(variable: RankedVariable, several: bool) -> FloatArray:
    return profile_contributions(variable.agreement) * _factor(variable, several)


def _intensity(variable: RankedVariable, several: bool) -> FloatArray:
    """Mean δ² per pair of each item, over D_e where several variables are to be compared."""
    each = item_intensities(variable.agreement)
    if not several:
        return each
    d_e = variable.agreement.expected_disagreement
    return each * (variable.weight / d_e if d_e else 0.0)


def _score(
    variables: Sequence[RankedVariable],
    rank_by: RankBy,
    several: bool,
    disputed: BoolArray,
    weighted: FloatArray,
    intensity: FloatArray,
) -> FloatArray:
    """The score of each item, shape (n_items,)."""
    if rank_by == "contribution":
        return np.asarray(weighted.sum(axis=0))
    if rank_by == "intensity":
        return np.asarray(intensity.sum(axis=0))
    return _summed_doubt(variables, several, disputed, "doubt")


def _summed_doubt(
    variables: Sequence[RankedVariable],
    several: bool,
    disputed: BoolArray,
    which: Literal["doubt", "doubt_within_tie"],
) -> FloatArray:
    total = np.zeros(disputed.shape[1])
    for at, variable in enumerate(variables):
        doubt: FloatArray | None = getattr(variable, which)
        if doubt is not None:
            weight = variable.weight if several else 1.0
            total += np.where(disputed[at], np.nan_to_num(doubt), 0.0) * weight
    return total


def _doubt_keys(
    variables: Sequence[RankedVariable], several: bool, disputed: BoolArray, items: IntArray
) -> list[FloatArray]:
    """The doubts that break ties, most telling first; none where doubt was not given."""
    names: tuple[Literal["doubt", "doubt_within_tie"], ...] = ("doubt", "doubt_within_tie")
    return [
        _summed_doubt(variables, several, disputed, which)[items]
        for which in names
        if any(getattr(variable, which) is not None for variable in variables)
    ]


def _pair_ranks(
    variables: Sequence[RankedVariable], several: bool, heaviest: IntArray, items: IntArray
) -> IntArray:
    """The rank of each item's heaviest pair of labels among all pairs, 0 the heaviest of all.

    The pair is that of the item's heaviest variable; pairs are weighed by what they contribute over
    all items, on the scale of the score.
    """
    totals, pair_of_profile = [], []
    offset = 0
    for variable in variables:
        of_profile, total = heaviest_pairs(variable.agreement)
        pair_of_profile.append(np.append(of_profile + offset, -1))
        totals.append(total * _factor(variable, several))
        offset += total.size
    every = np.concatenate(totals)
    rank = np.empty(offset, dtype=np.int64)
    rank[np.argsort(tie_levels(every), kind="stable")] = np.arange(offset)
    pair = np.zeros(items.size, dtype=np.int64)
    for at, variable in enumerate(variables):
        own = heaviest == at
        pair[own] = pair_of_profile[at][variable.agreement.profile_of_item[items[own]]]
    return rank[pair] if offset else pair


def _rows(
    variables: Sequence[RankedVariable], disputed: BoolArray, weighted: FloatArray
) -> tuple[IntArray, IntArray]:
    """The variables to look at for each ranked item, heaviest first.

    Parameters
    ----------
    disputed, weighted : arrays of shape (n_variables, n_ranked)
    """
    n = disputed.shape[1]
    if len(variables) == 1:
        return np.arange(n + 1), np.zeros(n, dtype=np.int64)
    mean = np.array([_mean_weighted(variable) for variable in variables])
    # A contribution equal to the mean to 12 digits counts as the mean.
    wanted = disputed & (weighted >= mean[:, None] * (1 - TIE))
    heaviest = np.argmax(np.where(disputed, weighted, -1.0), axis=0)
    wanted[heaviest, np.arange(n)] = True
    order = np.argsort(np.where(wanted, -weighted, np.inf), axis=0, kind="stable")
    n_rows = wanted.sum(axis=0)
    kept = np.arange(len(variables))[:, None] < n_rows[None, :]
    row_start = np.concatenate([[0], np.cumsum(n_rows)])
    return row_start, order.T[kept.T]


def _mean_weighted(variable: RankedVariable) -> float:
    """What a pairable item of the variable contributes on average, on the scale of the score."""
    agreement = variable.agreement
    items = agreement.n_pairable_items
    if not items or agreement.observed_disagreement is None:
        return 0.0
    return agreement.observed_disagreement * _factor(variable, True) / items
