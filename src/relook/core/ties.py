"""What is tied, and how ties are dealt out: in turn over the pairs of labels that clash."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from relook.core.agreement import Agreement
from relook.core.exact import FloatArray, IntArray

#: Scores closer than this, relative to the larger, are a tie (12 significant digits).
TIE = 1e-12


def tie_levels(scores: FloatArray) -> IntArray:
    """Number scores from 0 for the highest; scores equal to 12 significant digits share a number.

    Parameters
    ----------
    scores : float array of shape (n,)
    """
    if scores.size == 0:
        return np.zeros(0, dtype=np.int64)
    distinct, which = np.unique(scores, return_inverse=True)
    distinct = distinct[::-1]
    size = np.maximum(np.abs(distinct[1:]), np.abs(distinct[:-1]))
    begins = distinct[:-1] - distinct[1:] > TIE * size
    levels = np.concatenate([[0], np.cumsum(begins)])
    return np.asarray(levels[::-1][which])


def tied_blocks(keys: Sequence[FloatArray]) -> tuple[IntArray, IntArray]:
    """Number the runs of items that all keys leave tied, and those that the first leaves tied."""
    first = block = tie_levels(keys[0])
    for key in keys[1:]:
        level = tie_levels(key)
        width = int(level.max(initial=0)) + 1
        if width > 1:
            _, block = np.unique(block * width + level, return_inverse=True)
    return block, first


def dealt_in_turn(block: IntArray, pair_rank: IntArray, item_hash: IntArray) -> IntArray:
    """Order items by block; within a block deal them in turn over their label pairs."""
    by_hash = np.argsort(item_hash, kind="stable")
    width = int(pair_rank.max(initial=0)) + 1
    group = block * width + pair_rank
    # Few groups fit into 16 bits, which numpy sorts by counting.
    group = group.astype(np.uint16) if int(group.max(initial=0)) < 2**16 else group
    by_group = by_hash[np.argsort(group[by_hash], kind="stable")]
    begins = np.flatnonzero(np.diff(group[by_group].astype(np.int64), prepend=-1))
    length = np.diff(np.append(begins, group.size))
    turn = np.empty(group.size, dtype=np.int64)
    turn[by_group] = np.arange(group.size) - np.repeat(begins, length)
    # Items stand by block and pair already, so one stable sort by (block, turn) is enough.
    longest = int(turn.max(initial=0)) + 1
    return by_group[np.argsort((block * longest + turn)[by_group], kind="stable")]


def heaviest_pairs(agreement: Agreement) -> tuple[IntArray, FloatArray]:
    """The pair of labels that contributes most within each profile, and what each pair carries.

    Returns
    -------
    of_profile : int array of shape (n_profiles,)
        Position in `total`, -1 where labels do not differ. Among equal pairs of a profile the one
        that contributes more over all items.
    total : float array of shape (n_pairs,)
        Contribution of each pair to D_o.
    """
    profiles = agreement.profiles
    profile, first, second = profiles.value_pairs()
    low, high = profiles.value_index[first], profiles.value_index[second]
    pair, which = np.unique(low * profiles.n_values + high, return_inverse=True)
    delta = agreement.differences.between(low, high)
    scale = max(1, agreement.n_pairable_labels)
    within = 2.0 * profiles.count[first] * profiles.count[second] * delta
    part = within / (profiles.size[profile] - 1) / scale
    weights = part * profiles.multiplicity[profile]
    total = np.asarray(np.bincount(which, weights=weights, minlength=pair.size), dtype=np.float64)
    of_profile = np.full(profiles.n_profiles, -1, dtype=np.int64)
    if profile.size:
        order = np.lexsort((which, tie_levels(total)[which], tie_levels(part), profile))
        heads = np.flatnonzero(np.diff(profile[order], prepend=-1))
        of_profile[profile[order][heads]] = which[order][heads]
    return of_profile, total
