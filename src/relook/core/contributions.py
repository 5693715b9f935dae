"""Parts of observed disagreement, by any grouping, from one exact decomposition.

The ordered pair (i, j) of labels in item u contributes δ²(v_i, v_j)/(n (m_u − 1)). Summed over j it
is label i's part, summed over a whole item the item's contribution; and whichever way the pairs are
grouped (items, coders, pairs of coders, pairs of labels, groups of items, crossings of these), the
parts add up to D_o.

Each pair is shared by its two sides, so a lone dissenter never carries more than half of an item's
part. What a coder or a label is *involved* in counts the pairs in which it is one side, in full;
involvements therefore do not add up to 1.

References
----------
Krippendorff, K. (2004). Content Analysis, 2nd ed., ch. 11, for D_o as the sum over pairs of labels
within items; the parts are its terms in another order.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from relook.core.agreement import Agreement
from relook.core.exact import (
    ExactArray,
    FloatArray,
    IntArray,
    grouped_sums,
    quotients,
    widened,
)
from relook.core.ties import tie_levels
from relook.errors import RelookError


@dataclass(frozen=True, slots=True, eq=False)
class Parts:
    """Parts of D_o of a set of labels each, such as a coder's or a group's.

    Attributes
    ----------
    contribution : float array of shape (n,)
        Adds up to D_o.
    share : float array of shape (n,)
        Contribution over D_o; 0 where D_o is 0.
    n_items : int array of shape (n,)
        Pairable items with a label of this part.
    n_labels : int array of shape (n,)
        Pairable labels.
    share_of_labels : float array of shape (n,)
        n_labels over all pairable labels.
    involved : float array of shape (n,)
        Share of D_o in pairs of which this part is one side or both.
    own_alpha : float array of shape (n,)
        α_i = 1 − (contribution_i/(n_i/n))/D_e; its mean weighted by `n_labels` is alpha. nan where
        there are no labels or alpha is undefined.
    """

    contribution: FloatArray
    share: FloatArray
    n_items: IntArray
    n_labels: IntArray
    share_of_labels: FloatArray
    involved: FloatArray
    own_alpha: FloatArray


@dataclass(frozen=True, slots=True, eq=False)
class PairParts:
    """Parts of D_o of pairs of coders or of labels that meet, unordered.

    Attributes
    ----------
    first, second : int array of shape (n_pairs,)
        Codes of the two sides, first < second.
    contribution : float array of shape (n_pairs,)
        Both ordered pairs together; adds up to D_o.
    share : float array of shape (n_pairs,)
        Contribution over D_o; 0 where D_o is 0.
    n_items : int array of shape (n_pairs,)
        Items in which the two meet.
    """

    first: IntArray
    second: IntArray
    contribution: FloatArray
    share: FloatArray
    n_items: IntArray


def profile_contributions(agreement: Agreement) -> FloatArray:
    """Return d_u = (1/n)(1/(m_u − 1)) Σ_ck n_uc n_uk δ²_ck of an item of each profile.

    Returns
    -------
    float array of shape (n_profiles,)
        0 for a profile of one label.
    """
    return quotients(agreement.within, _bottom(agreement, agreement.profiles.size))


def item_contributions(agreement: Agreement) -> FloatArray:
    """Return the contribution of each item to D_o.

    Returns
    -------
    float array of shape (n_items,)
        0 for an item that is not pairable.
    """
    return _of_items(agreement, profile_contributions(agreement))


def intensity(agreement: Agreement) -> FloatArray:
    """Return the mean δ² over the pairs of labels of each item.

    Returns
    -------
    float array of shape (n_items,)
        0 for an item that is not pairable.
    """
    size = agreement.profiles.size
    pairs = widened(size, 2**62) * np.maximum(size - 1, 1) * agreement.differences.denominator
    return _of_items(agreement, quotients(agreement.within, pairs))


def shares(agreement: Agreement, contribution: FloatArray) -> FloatArray:
    """Return contributions over D_o; all 0 where D_o is 0 or undefined."""
    observed = agreement.observed_disagreement
    return contribution / observed if observed else np.zeros_like(contribution)


def alpha_costs(agreement: Agreement, contribution: FloatArray) -> FloatArray | None:
    """Return contributions over D_e, which sum to 1 − α; None where alpha is undefined."""
    if agreement.alpha is None or not agreement.expected_disagreement:
        return None
    return contribution / agreement.expected_disagreement


def group_parts(agreement: Agreement, group_of_item: IntArray, n_groups: int) -> Parts:
    """Return the part of each group of items, arrays of shape (n_groups,).

    Parameters
    ----------
    agreement : Agreement
    group_of_item : int array of shape (n_items,)
        From 0 to n_groups - 1; items that belong nowhere need a group of their own.
    n_groups : int
    """
    check_groups(agreement, group_of_item, n_groups)
    sizes = agreement.labels.labels_per_item
    pairable = sizes >= 2
    contribution = grouped_sums(group_of_item, item_contributions(agreement), n_groups)
    n_items = np.bincount(group_of_item[pairable], minlength=n_groups)
    weights = np.where(pairable, sizes, 0)
    n_labels = np.bincount(group_of_item, weights=weights, minlength=n_groups).astype(np.int64)
    # Both sides of a pair lie in one item, hence in one group.
    return parts_from(agreement, contribution, contribution, n_items, n_labels)


def label_pair_parts(agreement: Agreement) -> PairParts:
    """Return the part of each pair of labels that differ and meet, heaviest first.

    Contributions equal to 12 significant digits are ties, ordered by first, then second value.
    """
    n_values = agreement.profiles.n_values
    profile, first, second, part = value_pair_parts(agreement)
    values, often = agreement.profiles.value_index, agreement.profiles.multiplicity[profile]
    key = values[first] * n_values + values[second]
    found, which = np.unique(key, return_inverse=True)
    contribution = grouped_sums(which, part * often, found.size)
    n_items = np.bincount(which, weights=often, minlength=found.size).astype(np.int64)
    order = np.lexsort((found, tie_levels(contribution)))
    contribution = contribution[order]
    of_first, of_second = np.divmod(found[order], max(1, n_values))
    return PairParts(
        of_first,
        of_second,
        contribution,
        shares(agreement, contribution),
        n_items[order],
    )


def _bottom(agreement: Agreement, size: IntArray) -> ExactArray:
    """Return n (m − 1) × denominator for items of `size` labels, above 0."""
    scale = max(agreement.n_pairable_labels, 1) * agreement.differences.denominator
    wide = widened(np.maximum(size - 1, 1), scale * int(size.max() if size.size else 1))
    return np.asarray(wide * scale)


def entry_parts(agreement: Agreement) -> FloatArray:
    """Return the part of one label of each profile entry, shape (n_entries,)."""
    profiles = agreement.profiles
    size = profiles.size[profiles.profile_of_entry]
    return quotients(agreement.differences.toward_item(profiles), _bottom(agreement, size))


def _of_items(agreement: Agreement, per_profile: FloatArray) -> FloatArray:
    """Look up a figure of each item's profile, 0 for an item without labels."""
    # The item without labels has profile -1, which is the 0 at the end.
    return np.append(per_profile, 0.0)[agreement.profile_of_item]


def parts_from(
    agreement: Agreement,
    contribution: FloatArray,
    involved: FloatArray,
    n_items: IntArray,
    n_labels: IntArray,
) -> Parts:
    """Return parts with their shares and own alphas, from what they contribute.

    Parameters
    ----------
    agreement : Agreement
    contribution, involved : float arrays of shape (n,)
        As the attributes of `Parts`, `involved` in units of D_o.
    n_items, n_labels : int arrays of shape (n,)
    """
    n = max(agreement.n_pairable_labels, 1)
    own = np.full(contribution.size, np.nan)
    if agreement.alpha is not None and agreement.expected_disagreement:
        np.divide(contribution * n, n_labels, out=own, where=n_labels > 0)
        own = 1 - own / agreement.expected_disagreement
    return Parts(
        contribution,
        shares(agreement, contribution),
        n_items,
        n_labels,
        n_labels / n,
        shares(agreement, involved),
        own,
    )


def value_pair_parts(agreement: Agreement) -> tuple[IntArray, IntArray, IntArray, FloatArray]:
    """Return the pairs of values that differ and meet in a profile, and their part of an item.

    Returns
    -------
    profile, first, second : int arrays of shape (n_pairs,)
        `first` and `second` are profile entries.
    part : float array of shape (n_pairs,)
        2 n_uc n_uk δ²_ck/(n (m_u − 1)), above 0.
    """
    profiles = agreement.profiles
    profile, first, second = profiles.value_pairs()
    values, counts = profiles.value_index, profiles.count
    delta = agreement.differences.between(values[first], values[second])
    meetings = 2.0 * counts[first] * counts[second] / (profiles.size[profile] - 1)
    part = meetings * delta / max(agreement.n_pairable_labels, 1)
    apart = part > 0
    return profile[apart], first[apart], second[apart], part[apart]


def check_groups(agreement: Agreement, group_of_item: IntArray, n_groups: int) -> None:
    """Refuse groups that do not cover the items."""
    n_items = agreement.labels.n_items
    if group_of_item.shape != (n_items,):
        raise RelookError(
            f"`group_of_item` must have shape ({n_items},); got {group_of_item.shape}"
        )
    if n_items and not 0 <= int(group_of_item.min()) <= int(group_of_item.max()) < n_groups:
        raise RelookError(f"`group_of_item` must lie between 0 and {n_groups - 1}")
