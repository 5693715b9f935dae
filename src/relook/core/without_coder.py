"""Alpha without each coder in turn.

A coder who leaves takes their labels along; an item that is left with one label is no longer
pairable, and its other label leaves the marginals too.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from relook.core.agreement import Agreement
from relook.core.coder_parts import coder_entries
from relook.core.exact import BoolArray, FloatArray, IntArray, quotients


@dataclass(frozen=True, slots=True, eq=False)
class WithoutCoder:
    """What the figures would be without each coder.

    Attributes
    ----------
    alpha : float array of shape (n_coders,)
        nan where it would be undefined.
    n_pairable_items : int array of shape (n_coders,)
        Items that would still have two labels or more. Alphas over different items differ for that
        reason too.
    n_pairable_labels : int array of shape (n_coders,)
    """

    alpha: FloatArray
    n_pairable_items: IntArray
    n_pairable_labels: IntArray


def alpha_without_coder(agreement: Agreement) -> WithoutCoder:
    """Compute alpha as if each coder in turn had not taken part.

    Returns
    -------
    WithoutCoder

    Raises
    ------
    RelookError
        The labels carry no coders.

    Notes
    -----
    An item u without the label of value c in it has Σ_ck n n δ² smaller by twice the distance of
    that label from the item, over m_u − 2 instead of m_u − 1. So only profiles are visited: the
    time is coders × profile entries, plus the labels.
    """
    labels, profiles = agreement.labels, agreement.profiles
    given = coder_entries(agreement)
    pairable = profiles.size[profiles.profile_of_entry] >= 2
    alpha = np.full(labels.n_coders, np.nan)
    n_items = np.zeros(labels.n_coders, dtype=np.int64)
    n_labels = np.zeros(labels.n_coders, dtype=np.int64)
    for one in range(labels.n_coders):
        touched = given[one] * pairable
        alpha[one], n_items[one], n_labels[one] = _without(agreement, touched, pairable)
    return WithoutCoder(alpha, n_items, n_labels)


def _without(
    agreement: Agreement, touched: IntArray, pairable: BoolArray
) -> tuple[float, int, int]:
    """Alpha, items and labels with `touched[e]` labels of each profile entry taken away."""
    profiles, at = agreement.profiles, agreement.profiles.profile_of_entry
    size, values = profiles.size, profiles.value_index
    left = np.where(size >= 2, profiles.multiplicity, 0) - _per_profile(touched, at, size.size)
    still = touched * (size[at] >= 3)  # items that stay pairable without this label
    still_profile = _per_profile(still, at, size.size)
    # Labels of items not touched, then those of items that lose one label and stay.
    weight = (left + still_profile)[at] * profiles.count - still
    marginals = np.bincount(values, weights=weight, minlength=profiles.n_values).astype(np.int64)
    n = int(marginals.sum())
    n_items = int(left.sum() + still.sum())
    if n == 0:
        return float("nan"), n_items, n

    differences, within = agreement.differences, agreement.within
    if agreement.function.moves_with_marginals:
        differences = agreement.function.bind(agreement.values, marginals)
        within = differences.within(profiles)
    toward = differences.toward_item(profiles)
    denominator = differences.denominator
    whole = quotients(within, denominator) / np.maximum(size - 1, 1)
    fewer = quotients(within[at] - 2 * toward, denominator) / np.maximum(size[at] - 2, 1)
    observed = (float(np.sum(left * whole)) + float(np.sum(still * fewer))) / n
    expected = differences.pair_sum(marginals) / denominator / n / (n - 1)
    if not expected:
        return float("nan"), n_items, n
    return 1 - observed / expected, n_items, n


def _per_profile(per_entry: IntArray, at: IntArray, n_profiles: int) -> IntArray:
    return np.bincount(at, weights=per_entry, minlength=n_profiles).astype(np.int64)
