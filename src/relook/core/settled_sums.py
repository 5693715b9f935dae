"""The sums behind settling: D_o and D_e after items became unanimous, for many settlements at once.

`alternatives` settles one item per entry, each from the data as they stand; `sequence` settles one
item after the other. Both return sums over ordered pairs, still to be divided by n and n(n − 1).

Exactness: nominal and interval sums are integers to the end. Ordinal and pairwise sums are floats;
their terms are never negative, and counts of pairs are scaled to integers where that fits.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from relook.core import settled_base
from relook.core.differences import CoordinateDifferences, NominalDifferences
from relook.core.exact import ExactArray, FloatArray, IntArray, dot, largest, widened
from relook.core.settled_base import Base, case_sums, entries_of, moves_of, row_sums
from relook.core.settled_ordinal import ordinal_sums

#: A float sum that fell this far is recomputed from its terms, since it may be 0.
_MAY_BE_NOTHING = 1e-9
#: Steps of a block where values are many.
_LEAST_STEPS = 512


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
        return ordinal_sums(base, profile, candidate, cumulative=False)
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
        return ordinal_sums(base, profile, decided, cumulative=True)
    parts = _parts(base)
    gone = _running(parts[profile])
    observed = _minus(_total(base, parts), gone)
    if isinstance(base.differences, NominalDifferences):
        return observed, _nominal_sequence(base, profile, decided)
    if isinstance(base.differences, CoordinateDifferences):
        return observed, _coordinate_sequence(base, base.differences, profile, decided)
    return observed, _pairwise_sequence(base, profile, decided)


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


def _expected_alternatives(base: Base, profile: IntArray, candidate: IntArray) -> FloatArray:
    """Σ n'_c n'_k δ²_ck with n' = n + Δ, as S + 2 Σ_c Δ_c y_c + Σ_ck Δ_c Δ_k δ²_ck, y = δ² n.

    Δ is m at the decision less the profile's labels, so its own pairs are the profile's own sum
    less 2 m Σ_c n_uc δ²(c, decision).
    """
    profiles, differences = base.profiles, base.differences
    distinct, size = profiles.n_distinct[profile], profiles.size[profile]
    entry = entries_of(profiles, profile)
    case = np.repeat(np.arange(profile.size), distinct)
    involved = np.unique(np.concatenate([profiles.value_index[entry], candidate]))
    y = row_sums(base, involved)
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
    left = case_sums(counts[entry] * y_at[profiles.value_index[entry]], distinct)
    toward = case_sums(counts[entry] * step, distinct)
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


def _nominal_sequence(base: Base, profile: IntArray, decided: IntArray) -> FloatArray:
    """n² − Σ n_c², following each value's count through the steps that touch it."""
    moves = moves_of(base, profile, decided)
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
    per_step = case_sums(change, np.diff(moves.start))
    return np.asarray((base.n**2 - squares - _running(per_step)).astype(np.float64))


def _coordinate_sequence(
    base: Base, differences: CoordinateDifferences, profile: IntArray, decided: IntArray
) -> FloatArray:
    """2 (n Σ n_c x_c² − (Σ n_c x_c)²), following both moments."""
    moves = moves_of(base, profile, decided)
    x = differences.coordinates - differences.coordinates.min()
    bound = 4 * (base.n * max(1, largest(x))) ** 2
    x = widened(x, bound)
    delta, distinct = widened(moves.delta, bound), np.diff(moves.start)
    at = x[moves.value]
    # Small steps come back narrow, and the totals that they are added to need not be small.
    moved = widened(_running(case_sums(delta * at, distinct)), bound)
    squared = widened(_running(case_sums(delta * at * at, distinct)), bound)
    first, second = dot(base.marginals, x) + moved, dot(base.marginals, x * x) + squared
    return np.asarray((2 * (base.n * second - first * first)).astype(np.float64))


def _pairwise_sequence(base: Base, profile: IntArray, decided: IntArray) -> FloatArray:
    """Any δ²: S + 2 Δ·y + Δ·δ²Δ in blocks of steps, y = δ² n taken anew for each block."""
    moves = moves_of(base, profile, decided)
    marginals = base.marginals.copy()
    total = float(base.differences.pair_sum(marginals))
    expected = np.empty(profile.size + 1)
    expected[0] = current = total
    steps = max(_LEAST_STEPS, settled_base.CELLS // max(1, 8 * marginals.size))
    for begin in range(0, profile.size, steps):
        end = min(begin + steps, profile.size)
        own = slice(int(moves.start[begin]), int(moves.start[end]))
        touched, column = np.unique(moves.value[own], return_inverse=True)
        shift = np.zeros((end - begin, touched.size))
        np.add.at(shift, (moves.step[own] - begin, column), moves.delta[own])
        shift = np.cumsum(shift, axis=0)
        here = replace(base, marginals=marginals)
        y = row_sums(here, touched).astype(np.float64)
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
