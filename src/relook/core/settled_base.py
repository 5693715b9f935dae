"""The data as they stand, prepared for settling, and how settlements move the marginals."""

from __future__ import annotations

from dataclasses import dataclass
from functools import reduce
from math import lcm

import numpy as np

from relook.core.agreement import Agreement
from relook.core.differences import (
    CoordinateDifferences,
    Differences,
    NominalDifferences,
    Values,
)
from relook.core.exact import ExactArray, FloatArray, IntArray, dot, largest, widened
from relook.core.profiles import Profiles

#: Cells of a work array; larger work is done in blocks.
CELLS = 2_000_000
#: Beyond this, a common denominator of all m − 1 is given up for floats.
_LARGEST_SCALE = 2**40


@dataclass(frozen=True, slots=True, eq=False)
class Base:
    """The data as they stand, prepared for settling.

    Attributes
    ----------
    profiles : Profiles
    differences : Differences
        Bound to the values and to the pairable labels as they stand.
    moves : bool
        Whether differences change with the marginals (ordinal).
    marginals : int array of shape (n_values,)
    n : int
        Pairable labels.
    scale : int
        Common denominator of 1/(m − 1) over the disputed profiles, 1 where it would be too large.
    per_pair : array of shape (n_profiles,)
        scale/(m − 1), integers unless scale is 1; 0 for a profile of one label.
    within : array of shape (n_profiles,)
        Σ_ck n_uc n_uk δ²_ck × `differences.denominator`.
    """

    profiles: Profiles
    differences: Differences
    moves: bool
    marginals: IntArray
    n: int
    scale: int
    per_pair: ExactArray | FloatArray
    within: ExactArray | FloatArray


def base_of(agreement: Agreement, values: Values | None = None) -> Base:
    """Prepare the data of one variable for settling.

    Parameters
    ----------
    agreement : Agreement
    values : Values, optional
        An extension of `agreement.values`.
    """
    profiles, size = agreement.profiles, agreement.profiles.size
    marginals, differences = agreement.marginals.astype(np.int64), agreement.differences
    within = agreement.within
    if values is not None and values is not agreement.values:
        marginals = np.concatenate(
            [marginals, np.zeros(values.n_values - marginals.size, dtype=np.int64)]
        )
        differences = agreement.function.bind(values, marginals)
        within = differences.within(profiles)
    below = size - 1
    disputed = np.asarray(within != 0, dtype=bool)
    scale = reduce(lcm, np.unique(below[disputed]).tolist(), 1)
    per_pair: ExactArray | FloatArray
    if scale <= _LARGEST_SCALE:
        # A unanimous profile adds nothing, whatever its weight.
        per_pair = np.where(disputed, scale // np.maximum(below, 1), 0)
    else:
        scale, per_pair = 1, np.where(disputed, 1.0 / np.maximum(below, 1), 0.0)
    return Base(
        profiles,
        differences,
        agreement.function.moves_with_marginals,
        marginals,
        int(marginals.sum()),
        scale,
        per_pair,
        within,
    )


@dataclass(frozen=True, slots=True, eq=False)
class Moves:
    """How each step moves the marginals: `delta` labels of `value` at `step`, in step order."""

    step: IntArray
    value: IntArray
    delta: IntArray
    start: IntArray


def moves_of(base: Base, profile: IntArray, decided: IntArray) -> Moves:
    """The labels that leave their values and the m labels that join the decision, step by step."""
    profiles = base.profiles
    size = profiles.size[profile]
    pairable = (size >= 2).astype(np.int64)
    distinct = profiles.n_distinct[profile]
    n_events = distinct + 1
    start = np.concatenate([[0], np.cumsum(n_events)])
    value = np.empty(int(start[-1]), dtype=np.int64)
    delta = np.empty(int(start[-1]), dtype=np.int64)
    last = start[1:] - 1
    entry = entries_of(profiles, profile)
    leaves = np.ones(value.size, dtype=bool)
    leaves[last] = False
    value[leaves] = profiles.value_index[entry]
    delta[leaves] = -profiles.count[entry] * np.repeat(pairable, distinct)
    value[last] = decided
    delta[last] = size * pairable
    return Moves(np.repeat(np.arange(profile.size), n_events), value, delta, start)


def row_sums(base: Base, at: IntArray) -> ExactArray | FloatArray:
    """Σ_k n_k δ²_ck × denominator for the values asked for."""
    differences, marginals = base.differences, base.marginals
    if isinstance(differences, NominalDifferences):
        return base.n - marginals[at]
    if isinstance(differences, CoordinateDifferences):
        x = differences.coordinates - differences.coordinates.min()
        bound = 4 * base.n * largest(x) ** 2
        x, counts = widened(x, bound), widened(marginals, bound)
        first, second = dot(counts, x), dot(counts, x * x)
        return np.asarray(base.n * x[at] * x[at] - 2 * x[at] * first + second)
    used = np.flatnonzero(marginals)
    weights = marginals[used].astype(np.float64)
    rows = max(1, CELLS // max(1, used.size))
    blocks = [
        differences.numerators(at[begin : begin + rows, None], used[None, :]).astype(np.float64)
        @ weights
        for begin in range(0, at.size, rows)
    ]
    return np.concatenate(blocks) if blocks else np.zeros(0)


def entries_of(profiles: Profiles, profile: IntArray) -> IntArray:
    """The entry positions of the given profiles, one profile after the other."""
    return ranges(profiles.start[profile], profiles.n_distinct[profile])


def ranges(begin: IntArray, length: IntArray) -> IntArray:
    """begin[i], begin[i] + 1, … for length[i] positions, one range after the other."""
    ends = np.cumsum(length)
    total = int(ends[-1]) if ends.size else 0
    return np.asarray(np.arange(total) + np.repeat(begin - (ends - length), length))


def case_sums(entries: ExactArray | FloatArray, length: IntArray) -> ExactArray | FloatArray:
    """The sum of each run of entries; no run is empty."""
    if length.size == 0:
        return np.zeros(0, dtype=entries.dtype)
    return np.asarray(np.add.reduceat(entries, np.cumsum(length) - length))
