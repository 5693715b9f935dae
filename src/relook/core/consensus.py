"""The consensus label of each profile, by level of measurement.

Plurality where labels only have identity, the median where they have an order, the mean where they
are numbers, the mean direction on a circle, and the majority of each element for sets. A tie is a
tie: it is reported with the labels that share first place, and nothing here breaks it.
"""

from __future__ import annotations

from dataclasses import dataclass
from fractions import Fraction
from math import lcm
from typing import Literal

import numpy as np

from relook.core.differences import Circular, DifferenceFunction, Jaccard, Masi, Values
from relook.core.exact import BoolArray, ExactArray, FloatArray, IntArray, largest, widened
from relook.core.profiles import Profiles
from relook.errors import RelookError

ConsensusKind = Literal["plurality", "median", "mean", "circular mean", "element majority"]

#: A mean direction shorter than this share of the number of labels points nowhere.
_NO_DIRECTION = 1e-9


@dataclass(frozen=True, slots=True, eq=False)
class Consensus:
    """The consensus label of each profile.

    Attributes
    ----------
    kind : {"plurality", "median", "mean", "circular mean", "element majority"}
    values : Values
        What the codes below stand for: the values in use; for sets, then those that nobody gave.
    value_index : int array of shape (n_profiles,)
        The value; -1 where there is no single one: a tie, or a mean that nobody gave.
    number : float array of shape (n_profiles,) or None
        The mean, where labels are numbers; nan where labels around a circle point nowhere.
    numerators, denominators : int arrays of shape (n_profiles,) or None
        The mean as an exact fraction, not reduced; None for words and on a circle.
    tie : bool array of shape (n_profiles,)
    tied_start : int array of shape (n_profiles + 1,)
        Profile p is tied between `tied_value_index[tied_start[p]:tied_start[p + 1]]`; empty where
        there is no tie.
    tied_value_index : int array of shape (n_tied_entries,)
        Ascending within a profile.
    """

    kind: ConsensusKind
    values: Values
    value_index: IntArray
    number: FloatArray | None
    numerators: ExactArray | None
    denominators: IntArray | None
    tie: BoolArray
    tied_start: IntArray
    tied_value_index: IntArray

    def tied_values(self, profile: int) -> IntArray:
        """Return the values that share first place in a profile; none where there is no tie."""
        return self.tied_value_index[self.tied_start[profile] : self.tied_start[profile + 1]]

    def mean(self, profile: int) -> Fraction | None:
        """Return the exact mean of a profile, None where labels are not averaged exactly."""
        if self.numerators is None or self.denominators is None:
            return None
        return Fraction(int(self.numerators[profile]), int(self.denominators[profile]))


def consensus_of(profiles: Profiles, function: DifferenceFunction, values: Values) -> Consensus:
    """Find the consensus label of each profile as the level of measurement defines it.

    Parameters
    ----------
    profiles : Profiles
    function : DifferenceFunction
        The median where it needs an order, the mean where it needs numbers (the mean direction on a
        circle), the majority of each element for sets, else the plurality.
    values : Values

    Returns
    -------
    Consensus
    """
    if isinstance(function, Circular):
        if function.period is None:
            raise RelookError("circular differences need a period")
        return circular_mean(profiles, values, function.period)
    if isinstance(function, Jaccard | Masi):
        return set_majority(profiles, values, function)
    if function.needs == "order":
        return median(profiles, values)
    if function.needs == "number":
        return mean(profiles, values)
    return plurality(profiles, values)


def plurality(profiles: Profiles, values: Values) -> Consensus:
    """Return the most frequent value of each profile; equal counts for first place are a tie."""
    most = _reduce(np.maximum, profiles.count, profiles)
    first = profiles.count == np.repeat(most, profiles.n_distinct)
    return _from_leaders("plurality", profiles, values, first)


def median(profiles: Profiles, values: Values) -> Consensus:
    """Return the middle value of each profile; two different middle values are a tie.

    Notes
    -----
    Value codes are in rank order. With an even number of labels there are two middle ones.
    """
    upto = np.cumsum(profiles.count)
    before = np.repeat(upto[profiles.start[1:] - 1] - profiles.size, profiles.n_distinct)
    upto = upto - before
    size = np.repeat(profiles.size, profiles.n_distinct)
    lower, upper = (size + 1) // 2, size // 2 + 1
    below = upto - profiles.count
    middle = ((below < lower) & (lower <= upto)) | ((below < upper) & (upper <= upto))
    return _from_leaders("median", profiles, values, middle)


def mean(profiles: Profiles, values: Values) -> Consensus:
    """Return the mean of each profile, exactly; never a tie.

    Raises
    ------
    RelookError
        The labels are words.
    """
    x = _numbers_of(values)
    bound = 2 * largest(x) * max(1, int(profiles.size.max(initial=0)))
    wide = widened(x, bound)[profiles.value_index] * widened(profiles.count, bound)
    sums = _reduce(np.add, wide, profiles)
    size = profiles.size
    numerators = np.asarray(sums)
    denominators = widened(size, int(size.max(initial=0)) * values.denominator) * values.denominator
    whole = np.asarray(numerators % np.maximum(size, 1) == 0, dtype=bool)
    value_index = np.full(profiles.n_profiles, -1, dtype=np.int64)
    value_index[whole] = _codes_of(numerators[whole] // size[whole], x)
    number = np.asarray(
        numerators.astype(np.float64) / denominators.astype(np.float64), dtype=np.float64
    )
    return Consensus(
        "mean",
        values,
        value_index,
        number,
        numerators,
        denominators,
        np.zeros(profiles.n_profiles, dtype=bool),
        np.zeros(profiles.n_profiles + 1, dtype=np.int64),
        np.zeros(0, dtype=np.int64),
    )


def circular_mean(profiles: Profiles, values: Values, period: Fraction | int) -> Consensus:
    """Return the mean direction of each profile, within [0, period).

    Notes
    -----
    The angle of the sum of unit vectors (Fisher, N. I. (1993). Statistical Analysis of Circular
    Data, eq. 2.9). Labels that cancel out have no mean direction: a tie between all of them. A mean
    within 1e-9 of a period from a value is that value.
    """
    length = float(period)
    angle = 2 * np.pi * _floats_of(values)[profiles.value_index] / length
    east = _reduce(np.add, profiles.count * np.cos(angle), profiles)
    north = _reduce(np.add, profiles.count * np.sin(angle), profiles)
    nowhere = np.hypot(east, north) <= _NO_DIRECTION * profiles.size
    number = np.mod(np.arctan2(north, east) / (2 * np.pi) * length, length)
    number[nowhere] = np.nan
    # The value of the profile nearest to the mean direction, where it is that direction.
    gap = np.abs(angle / (2 * np.pi) - np.repeat(number, profiles.n_distinct) / length)
    gap = np.abs(gap - np.round(gap))
    is_value = np.nan_to_num(gap, nan=1.0) <= 1e-9
    value_index = np.full(profiles.n_profiles, -1, dtype=np.int64)
    value_index[profiles.profile_of_entry[is_value]] = profiles.value_index[is_value]
    tied = np.repeat(nowhere, profiles.n_distinct)
    tied_start = np.concatenate([[0], np.cumsum(np.where(nowhere, profiles.n_distinct, 0))])
    return Consensus(
        "circular mean",
        values,
        value_index,
        number,
        None,
        None,
        nowhere,
        tied_start,
        profiles.value_index[tied],
    )


def element_majority(profiles: Profiles, members: BoolArray) -> tuple[BoolArray, BoolArray]:
    """Return which elements most labels of each profile hold, for labels that are sets.

    Parameters
    ----------
    profiles : Profiles
    members : bool array of shape (n_values, n_elements)
        Whether the set that a value code stands for holds the element.

    Returns
    -------
    held, tied : bool arrays of shape (n_profiles, n_elements)
        Held by more than half of the labels; held by exactly half of them.
    """
    votes = profiles.count[:, None] * members[profiles.value_index]
    if profiles.n_profiles == 0:
        none = np.zeros((0, members.shape[1]), dtype=bool)
        return none, none
    held = 2 * np.add.reduceat(votes, profiles.start[:-1], axis=0)
    size = profiles.size[:, None]
    return np.asarray(held > size), np.asarray(held == size)


def set_majority(profiles: Profiles, values: Values, function: Jaccard | Masi) -> Consensus:
    """Return the set of the elements that most labels of each profile hold.

    Notes
    -----
    Elements held by exactly half of the labels make a tie, between the set without any of them and
    the set with all of them. Sets that nobody gave are added to `Consensus.values`, their elements
    in alphabetical order.
    """
    if values.texts is None or function.separator is None:
        raise RelookError("sets need the texts of the labels and their separator")
    parts = [function.parts(text) for text in values.texts]
    names = sorted({name for each in parts for name in each})
    place = {name: i for i, name in enumerate(names)}
    members = np.zeros((len(parts), len(names)), dtype=bool)
    for at, each in enumerate(parts):
        members[at, [place[name] for name in each]] = True
    held, halves = element_majority(profiles, members)
    tie = np.asarray(halves.any(axis=1), dtype=bool)
    rows = np.concatenate([members, held, (held | halves)[tie]])
    distinct, example, which = np.unique(rows, axis=0, return_index=True, return_inverse=True)
    # A set in use keeps its lowest code, as `return_index` names the first row of its kind.
    given = example < len(parts)
    code_of = np.where(given, example, -1)
    code_of[~given] = len(parts) + np.arange(int((~given).sum()))
    new = [
        function.separator.join(name for name, inside in zip(names, row, strict=True) if inside)
        for row in distinct[~given].tolist()
    ]
    code = code_of[which.ravel()]
    value_index = code[len(parts) : len(parts) + profiles.n_profiles].copy()
    both = np.stack([value_index[tie], code[len(parts) + profiles.n_profiles :]], axis=1)
    value_index[tie] = -1
    extended = values if not new else Values.from_texts([*values.texts, *new])
    return Consensus(
        "element majority",
        extended,
        value_index,
        None,
        None,
        None,
        tie,
        np.concatenate([[0], np.cumsum(np.where(tie, 2, 0))]),
        np.sort(both, axis=1).ravel(),
    )


def extend_values(
    values: Values, numerators: ExactArray, denominators: IntArray
) -> tuple[Values, IntArray]:
    """Add numbers that nobody gave, such as means, to the values in use.

    Parameters
    ----------
    values : Values
        Numbers.
    numerators, denominators : int arrays of shape (n,)
        The numbers as fractions.

    Returns
    -------
    extended : Values
        The values in use keep their codes; new numbers follow in numeric order.
    value_index : int array of shape (n,)
        The code of each number in `extended`.
    """
    x = _numbers_of(values)
    common = lcm(values.denominator, *np.unique(denominators).tolist())
    factor = common // values.denominator
    most = common // int(denominators.min()) if denominators.size else 1
    reach = max(largest(x) * factor, largest(numerators) * most)
    old = widened(x, 4 * reach) * factor
    new = widened(numerators, 4 * reach) * widened(common // denominators, 4 * reach)
    found = _codes_of(new, old)
    unseen = np.unique(new[found < 0])
    found[found < 0] = old.size + np.searchsorted(unseen, new[found < 0])
    every = np.concatenate([old, unseen.astype(old.dtype)])
    return Values(every.size, widened(every, 4 * largest(every)), common), found


def _from_leaders(
    kind: ConsensusKind, profiles: Profiles, values: Values, leading: BoolArray
) -> Consensus:
    """A consensus from the entries that hold first place; more than one is a tie."""
    n_leading = _reduce(np.add, leading.astype(np.int64), profiles)
    tie = n_leading > 1
    each = profiles.profile_of_entry
    value_index = np.full(profiles.n_profiles, -1, dtype=np.int64)
    alone = leading & ~tie[each]
    value_index[each[alone]] = profiles.value_index[alone]
    shared = leading & tie[each]
    tied_start = np.concatenate([[0], np.cumsum(np.where(tie, n_leading, 0))])
    return Consensus(
        kind, values, value_index, None, None, None, tie, tied_start, profiles.value_index[shared]
    )


def _reduce(how: np.ufunc, entries: ExactArray, profiles: Profiles) -> ExactArray:
    """Reduce the entries of each profile; no profile is empty."""
    if profiles.n_profiles == 0:
        return np.zeros(0, dtype=entries.dtype)
    return np.asarray(how.reduceat(entries, profiles.start[:-1]))


def _codes_of(wanted: ExactArray, numerators: ExactArray) -> IntArray:
    """The code of each wanted numerator, -1 where no value has it."""
    if numerators.size == 0:
        return np.full(wanted.size, -1, dtype=np.int64)
    order = np.argsort(numerators, kind="stable")
    ranked = numerators[order]
    at = np.minimum(np.searchsorted(ranked, wanted), ranked.size - 1)
    same = np.asarray(ranked[at] == wanted, dtype=bool)
    return np.where(same, order[at], -1).astype(np.int64)


def _numbers_of(values: Values) -> ExactArray:
    if values.numerators is None:
        raise RelookError("a mean needs labels that are numbers")
    return values.numerators


def _floats_of(values: Values) -> FloatArray:
    _numbers_of(values)
    return values.numbers()
