"""Settling ordinal labels, whose differences move with every settlement."""

from __future__ import annotations

import numpy as np

from relook.core import settled_base
from relook.core.exact import FloatArray, IntArray
from relook.core.settled_base import Base, entries_of, moves_of, ranges


def ordinal_sums(
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
    used = np.union1d(used, profiles.value_index[entries_of(profiles, np.unique(profile))])
    place = np.zeros(base.marginals.size, dtype=np.int64)
    place[used] = np.arange(used.size)
    moves = moves_of(base, profile, place[decided])
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
        observed[:1], expected[:1] = _sums_of_rows(
            base.n, marginals[None, :], weights[None, :], low, high
        )
    rows = max(1, settled_base.CELLS // max(1, used.size + pair.size))
    for begin in range(0, profile.size, rows):
        end = min(begin + rows, profile.size)
        own = slice(int(moves.start[begin]), int(moves.start[end]))
        shift = np.zeros((end - begin, used.size))
        np.add.at(shift, (moves.step[own] - begin, value[own]), moves.delta[own])
        chosen = profile[begin:end]
        n_pairs = pair_start[chosen + 1] - pair_start[chosen]
        entry = ranges(pair_start[chosen], n_pairs)
        gone = np.zeros((end - begin, pair.size))
        case = np.repeat(np.arange(end - begin), n_pairs)
        gone[case, pair_of[entry]] = weight[entry]
        if cumulative:
            shift, gone = np.cumsum(shift, axis=0), np.cumsum(gone, axis=0)
        left = weights - gone
        if base.scale == 1 and base.per_pair.dtype == np.float64:
            left[left < 1e-12 * weights] = 0.0
        at = slice(begin + head, end + head)
        observed[at], expected[at] = _sums_of_rows(base.n, marginals + shift, left, low, high)
        if cumulative:
            marginals = marginals + shift[-1]
            weights = left[-1]
    return observed, expected


def _sums_of_rows(
    n: int, marginals: FloatArray, weights: FloatArray, low: IntArray, high: IntArray
) -> tuple[FloatArray, FloatArray]:
    """Observed and expected sums × 4 of rows of marginals and rows of pair weights."""
    below = np.cumsum(marginals, axis=1) - marginals
    ranks = 2 * below + marginals  # doubled midranks less 1, as in `doubled_midranks`
    gap = ranks[:, high] - ranks[:, low]
    observed = np.sum(weights * gap * gap, axis=1)
    expected = 2.0 * n * np.sum(below * marginals * (below + marginals), axis=1)
    return np.asarray(observed), np.asarray(expected)
