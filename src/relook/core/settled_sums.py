"""The sums behind settling: D_o and D_e after items became unanimous, for many settlements at once.

`alternatives` settles one item per entry, each from the data as they stand; `sequence` settles one
item after the other. Both return sums over ordered pairs, still to be divided by n and n(n − 1).

Exactness: nominal and interval sums are integers to the end. Ordinal and pairwise sums are floats;
their terms are never negative, and counts of pairs are scaled to integers where that fits.
"""

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
_CELLS = 2_000_000
#: Beyond this, a common denominator of all m − 1 is given up for floats.
_LARGEST_SCALE = 2**40
#: A float sum that fell this far is recomputed from its terms, since it may be 0.
_MAY_BE_NOTHING = 1e-9


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


def alternatives(
    base: Base, profile: IntArray, candidate: IntArray
) -> tuple[FloatArray, FloatArray]:
    """Settle one item per entry, each from the data as they stand.

    Parameters
    ----------
    base : Base
    profile, candidate : int arrays of shape (n,)

    Returns
    -------
    observed, expected : float arrays of shape (n,)
        Σ scale/(m − 1) Σ_ck n_uc n_uk δ²_ck over items, and Σ_ck n_c n_k δ²_ck, both ×
        `differences.denominator`. `expected` is 0 exactly where it is 0.
    """
    if base.moves:
        return _ordinal(base, profile, candidate, cumulative=False)
    parts = _parts(base)
    total = _total(base, parts)
    observed = _minus(total, parts[profile])
    expected = _expected_alternatives(base, profile, candidate)
    return observed, expected


def sequence(base: Base, profile: IntArray, decided: IntArray) -> tuple[FloatArray, FloatArray]:
    """Settle one item after the other.

    Parameters
    ----------
    base : Base
    profile, decided : int arrays of shape (n_steps,)

    Returns
    -------
    observed, expected : float arrays of shape (n_steps + 1,)
        As in `alternatives`, after 0, 1, … n_steps items.
    """
    if base.moves:
        return _ordinal(base, profile, decided, cumulative=True)
    parts = _parts(base)
    gone = _running(parts[profile])
    observed = _minus(_total(base, parts), gone)
    if isinstance(base.differences, NominalDifferences):
        return observed, _nominal_sequence(base, profile, decided)
    if isinstance(base.differences, CoordinateDifferences):
        return observed, _coordinate_sequence(base, base.differences, profile, decided)
    return observed, _pairwise_sequence(base, profile, decided)


# --- observed disagreement where differences stay as they are ---


def _parts(base: Base) -> ExactArray | FloatArray:
    """scale/(m − 1) Σ_ck n_uc n_uk δ²_ck of an item of each profile."""
    if base.within.dtype == np.float64 or base.per_pair.dtype == np.float64:
        return base.within.astype(np.float64) * base.per_pair.astype(np.float64)
    bound = largest(base.within) * largest(base.per_pair)
    return np.asarray(widened(base.within, bound) * widened(base.per_pair, bound))


def _total(base: Base, parts: ExactArray | FloatArray) -> int | float:
    if parts.dtype == np.float64:
        return float(np.sum(base.profiles.multiplicity * parts))
    return dot(base.profiles.multiplicity, parts)


def _running(steps: ExactArray | FloatArray) -> ExactArray | FloatArray:
    """0 and the running sums."""
    if steps.dtype != np.float64:
        steps = widened(steps, largest(steps) * max(1, steps.size))
    return np.asarray(np.concatenate([np.zeros(1, dtype=steps.dtype), np.cumsum(steps)]))


def _minus(total: int | float, gone: ExactArray | FloatArray) -> FloatArray:
    if isinstance(total, float):
        left = total - gone
        # What rounding leaves of a sum that is used up is nothing.
        return np.where(left > 1e-13 * total, left, 0.0)
    return np.asarray((total - widened(gone, 2 * total)).astype(np.float64))


# --- expected disagreement, one item at a time ---


def _expected_alternatives(base: Base, profile: IntArray, candidate: IntArray) -> FloatArray:
    """Σ n'_c n'_k δ²_ck with n' = n + Δ, as S + 2 Σ_c Δ_c y_c + Σ_ck Δ_c Δ_k δ²_ck, y = δ² n.

    Δ is m at the decision less the profile's labels, so its own pairs are the profile's own sum
    less 2 m Σ_c n_uc δ²(c, decision).
    """
    profiles, differences = base.profiles, base.differences
    distinct, size = profiles.n_distinct[profile], profiles.size[profile]
    entry = _entries_of(profiles, profile)
    case = np.repeat(np.arange(profile.size), distinct)
    involved = np.unique(np.concatenate([profiles.value_index[entry], candidate]))
    y = _row_sums(base, involved)
    y_at = np.zeros(base.marginals.size, dtype=y.dtype)
    y_at[involved] = y
    step = differences.numerators(profiles.value_index[entry], candidate[case])
    total = differences.pair_sum(base.marginals)
    exact = isinstance(total, int) and y.dtype != np.float64
    most = int(size.max(initial=1))
    if exact:
        bound = 8 * most * most * max(largest(y), largest(step), largest(base.within), 1) + abs(
            int(total)
        )
        y_at, step = widened(y_at, bound), widened(step, bound)
        counts, size = widened(profiles.count, bound), widened(size, bound)
        own = widened(base.within, bound)[profile]
    else:
        counts, own = profiles.count.astype(np.float64), base.within[profile].astype(np.float64)
        y_at, step = y_at.astype(np.float64), step.astype(np.float64)
    left = _case_sums(counts[entry] * y_at[profiles.value_index[entry]], distinct)
    toward = _case_sums(counts[entry] * step, distinct)
    moved = 2 * (size * y_at[candidate] - left) + own - 2 * size * toward
    unpairable = size < 2
    moved[unpairable] = 0
    expected = (total + moved).astype(np.float64)
    if not exact:
        for at in np.flatnonzero(expected <= _MAY_BE_NOTHING * float(total)).tolist():
            expected[at] = differences.pair_sum(
                base.marginals + _shift(base, int(profile[at]), int(candidate[at]))
            )
    return np.asarray(expected)


def _shift(base: Base, profile: int, decided: int) -> IntArray:
    """Δ: how one settlement moves the marginals."""
    shift = np.zeros(base.marginals.size, dtype=np.int64)
    profiles = base.profiles
    own = slice(int(profiles.start[profile]), int(profiles.start[profile + 1]))
    m = int(profiles.count[own].sum())
    if m >= 2:
        shift[profiles.value_index[own]] -= profiles.count[own]
        shift[decided] += m
    return shift


def _row_sums(base: Base, at: IntArray) -> ExactArray | FloatArray:
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
    rows = max(1, _CELLS // max(1, used.size))
    blocks = [
        differences.numerators(at[begin : begin + rows, None], used[None, :]).astype(np.float64)
        @ weights
        for begin in range(0, at.size, rows)
    ]
    return np.concatenate(blocks) if blocks else np.zeros(0)


# --- expected disagreement, one item after the other ---


@dataclass(frozen=True, slots=True, eq=False)
class _Moves:
    """How each step moves the marginals: `delta` labels of `value` at `step`, in step order."""

    step: IntArray
    value: IntArray
    delta: IntArray
    start: IntArray


def _moves(base: Base, profile: IntArray, decided: IntArray) -> _Moves:
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
    entry = _entries_of(profiles, profile)
    leaves = np.ones(value.size, dtype=bool)
    leaves[last] = False
    value[leaves] = profiles.value_index[entry]
    delta[leaves] = -profiles.count[entry] * np.repeat(pairable, distinct)
    value[last] = decided
    delta[last] = size * pairable
    return _Moves(np.repeat(np.arange(profile.size), n_events), value, delta, start)


def _nominal_sequence(base: Base, profile: IntArray, decided: IntArray) -> FloatArray:
    """n² − Σ n_c², following each value's count through the steps that touch it."""
    moves = _moves(base, profile, decided)
    by_value = np.argsort(moves.value, kind="stable")
    value, delta = moves.value[by_value], moves.delta[by_value]
    upto = np.cumsum(delta)
    begins = np.flatnonzero(np.diff(value, prepend=-1))
    runs = np.diff(np.append(begins, value.size))
    offset = np.repeat(upto[begins] - delta[begins], runs)
    before = base.marginals[value] + upto - delta - offset
    change = np.empty(value.size, dtype=np.int64)
    change[by_value] = (2 * before + delta) * delta
    squares = dot(base.marginals, base.marginals)
    per_step = _case_sums(change, np.diff(moves.start))
    return np.asarray((base.n**2 - squares - _running(per_step)).astype(np.float64))


def _coordinate_sequence(
    base: Base, differences: CoordinateDifferences, profile: IntArray, decided: IntArray
) -> FloatArray:
    """2 (n Σ n_c x_c² − (Σ n_c x_c)²), following both moments."""
    moves = _moves(base, profile, decided)
    x = differences.coordinates - differences.coordinates.min()
    bound = 4 * (base.n * max(1, largest(x))) ** 2
    x = widened(x, bound)
    delta, distinct = widened(moves.delta, bound), np.diff(moves.start)
    at = x[moves.value]
    first = dot(base.marginals, x) + _running(_case_sums(delta * at, distinct))
    second = dot(base.marginals, x * x) + _running(_case_sums(delta * at * at, distinct))
    first, second = widened(first, bound), widened(second, bound)
    return np.asarray((2 * (base.n * second - first * first)).astype(np.float64))


def _pairwise_sequence(base: Base, profile: IntArray, decided: IntArray) -> FloatArray:
    """Any δ²: S + 2 Δ·y + Δ·δ²Δ in blocks of steps, y = δ² n taken anew for each block."""
    moves = _moves(base, profile, decided)
    marginals = base.marginals.copy()
    total = float(base.differences.pair_sum(marginals))
    expected = np.empty(profile.size + 1)
    expected[0] = current = total
    steps = max(512, _CELLS // max(1, 8 * marginals.size)) if marginals.size < 512 else 512
    for begin in range(0, profile.size, steps):
        end = min(begin + steps, profile.size)
        own = slice(int(moves.start[begin]), int(moves.start[end]))
        touched, column = np.unique(moves.value[own], return_inverse=True)
        shift = np.zeros((end - begin, touched.size))
        np.add.at(shift, (moves.step[own] - begin, column), moves.delta[own])
        shift = np.cumsum(shift, axis=0)
        here = Base(
            base.profiles,
            base.differences,
            False,
            marginals,
            base.n,
            base.scale,
            base.per_pair,
            base.within,
        )
        y = _row_sums(here, touched).astype(np.float64)
        delta = base.differences.numerators(touched[:, None], touched[None, :])
        sums = current + 2 * (shift @ y) + np.sum((shift @ delta.astype(np.float64)) * shift, 1)
        for at in np.flatnonzero(sums <= _MAY_BE_NOTHING * total).tolist():
            there = marginals.copy()
            there[touched] += shift[at].astype(np.int64)
            sums[at] = base.differences.pair_sum(there)
        expected[begin + 1 : end + 1] = sums
        marginals[touched] += shift[-1].astype(np.int64)
        current = float(sums[-1])
    return expected


# --- ordinal: the differences themselves move ---


def _ordinal(
    base: Base, profile: IntArray, decided: IntArray, *, cumulative: bool
) -> tuple[FloatArray, FloatArray]:
    """Both sums with midranks taken from each step's own marginals.

    Observed: Σ w_ck (r_c − r_k)² over the pairs of values that meet in an item, w their weighted
    number, less those of the settled items. Expected, for doubled midranks r:
    Σ_ck n_c n_k (r_c − r_k)² = 2 n Σ_c B_c n_c (B_c + n_c), B_c the labels below c, because
    Σ n_c (r_c − r̄)² = (n³ − Σ n_c³)/3. No term of either is negative.
    """
    profiles = base.profiles
    used = np.union1d(np.flatnonzero(base.marginals), decided)
    used = np.union1d(used, profiles.value_index[_entries_of(profiles, np.unique(profile))])
    place = np.zeros(base.marginals.size, dtype=np.int64)
    place[used] = np.arange(used.size)
    moves = _moves(base, profile, place[decided])
    value = moves.value.copy()
    joins = moves.start[1:] - 1
    leaves = np.ones(value.size, dtype=bool)
    leaves[joins] = False
    value[leaves] = place[value[leaves]]

    of_profile, first, second = profiles.value_pairs()
    counts = profiles.count
    weight = 2.0 * counts[first] * counts[second] * base.per_pair[of_profile].astype(np.float64)
    low, high = place[profiles.value_index[first]], place[profiles.value_index[second]]
    pair, pair_of = np.unique(low * used.size + high, return_inverse=True)
    low, high = pair // max(1, used.size), pair % max(1, used.size)
    multiplicity = profiles.multiplicity[of_profile]
    summed = np.bincount(pair_of, weights=weight * multiplicity, minlength=pair.size)
    weights = np.asarray(summed, dtype=np.float64)
    pair_start = np.searchsorted(of_profile, np.arange(profiles.n_profiles + 1))

    marginals = base.marginals[used].astype(np.float64)
    head = 1 if cumulative else 0
    observed, expected = np.empty(profile.size + head), np.empty(profile.size + head)
    if cumulative:
        observed[:1], expected[:1] = _ordinal_sums(
            base.n, marginals[None, :], weights[None, :], low, high
        )
    rows = max(1, _CELLS // max(1, used.size + pair.size))
    for begin in range(0, profile.size, rows):
        end = min(begin + rows, profile.size)
        own = slice(int(moves.start[begin]), int(moves.start[end]))
        shift = np.zeros((end - begin, used.size))
        np.add.at(shift, (moves.step[own] - begin, value[own]), moves.delta[own])
        chosen = profile[begin:end]
        n_pairs = pair_start[chosen + 1] - pair_start[chosen]
        entry = _ranges(pair_start[chosen], n_pairs)
        gone = np.zeros((end - begin, pair.size))
        case = np.repeat(np.arange(end - begin), n_pairs)
        gone[case, pair_of[entry]] = weight[entry]
        if cumulative:
            shift, gone = np.cumsum(shift, axis=0), np.cumsum(gone, axis=0)
        left = weights - gone
        if base.scale == 1 and base.per_pair.dtype == np.float64:
            left[left < 1e-12 * weights] = 0.0
        at = slice(begin + head, end + head)
        observed[at], expected[at] = _ordinal_sums(base.n, marginals + shift, left, low, high)
        if cumulative:
            marginals = marginals + shift[-1]
            weights = left[-1]
    return observed, expected


def _ordinal_sums(
    n: int, marginals: FloatArray, weights: FloatArray, low: IntArray, high: IntArray
) -> tuple[FloatArray, FloatArray]:
    """Observed and expected sums × 4 of rows of marginals and rows of pair weights."""
    below = np.cumsum(marginals, axis=1) - marginals
    ranks = 2 * below + marginals  # doubled midranks less 1, as in `doubled_midranks`
    gap = ranks[:, high] - ranks[:, low]
    observed = np.sum(weights * gap * gap, axis=1)
    expected = 2.0 * n * np.sum(below * marginals * (below + marginals), axis=1)
    return np.asarray(observed), np.asarray(expected)


# --- small helpers ---


def _entries_of(profiles: Profiles, profile: IntArray) -> IntArray:
    """The entry positions of the given profiles, one profile after the other."""
    return _ranges(profiles.start[profile], profiles.n_distinct[profile])


def _ranges(begin: IntArray, length: IntArray) -> IntArray:
    """begin[i], begin[i] + 1, … for length[i] positions, one range after the other."""
    ends = np.cumsum(length)
    total = int(ends[-1]) if ends.size else 0
    return np.asarray(np.arange(total) + np.repeat(begin - (ends - length), length))


def _case_sums(entries: ExactArray | FloatArray, length: IntArray) -> ExactArray | FloatArray:
    """The sum of each run of entries; no run is empty."""
    if length.size == 0:
        return np.zeros(0, dtype=entries.dtype)
    return np.asarray(np.add.reduceat(entries, np.cumsum(length) - length))
