"""Parts of D_o of groups of items crossed with coders or with pairs of labels.

They are the parts of `relook.core.contributions`, grouped twice, and add up to D_o again.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from relook.core.agreement import Agreement
from relook.core.coder_parts import coder_index, label_parts
from relook.core.contributions import check_groups, shares, value_pair_parts
from relook.core.exact import FloatArray, IntArray, grouped_sums
from relook.core.ties import tie_levels


@dataclass(frozen=True, slots=True, eq=False)
class GroupCoderParts:
    """Parts of D_o of each coder within each group of items; only what occurs.

    Attributes
    ----------
    group, coder : int array of shape (n_cells,)
        By group, then coder.
    contribution, share : float array of shape (n_cells,)
        Add up to D_o and to 1.
    n_labels : int array of shape (n_cells,)
        Pairable labels of the coder in the group.
    """

    group: IntArray
    coder: IntArray
    contribution: FloatArray
    share: FloatArray
    n_labels: IntArray


@dataclass(frozen=True, slots=True, eq=False)
class GroupLabelPairParts:
    """Parts of D_o of each pair of labels within each group of items; only what occurs.

    Attributes
    ----------
    group, first, second : int array of shape (n_cells,)
        Heaviest first; ties to 12 significant digits by group, first, second.
    contribution, share : float array of shape (n_cells,)
        Add up to D_o and to 1.
    n_items : int array of shape (n_cells,)
        Items of the group in which the two labels meet.
    """

    group: IntArray
    first: IntArray
    second: IntArray
    contribution: FloatArray
    share: FloatArray
    n_items: IntArray


def group_coder_parts(
    agreement: Agreement, group_of_item: IntArray, n_groups: int
) -> GroupCoderParts:
    """Return the part of each coder within each group of items.

    Parameters
    ----------
    agreement : Agreement
    group_of_item : int array of shape (n_items,)
        From 0 to n_groups - 1.
    n_groups : int

    Raises
    ------
    RelookError
        The labels carry no coders.
    """
    check_groups(agreement, group_of_item, n_groups)
    coder, labels = coder_index(agreement), agreement.labels
    pairable = labels.labels_per_item[labels.item_index] >= 2
    n_coders = max(1, labels.n_coders)
    key = group_of_item[labels.item_index[pairable]] * n_coders + coder[pairable]
    found, which, n_labels = np.unique(key, return_inverse=True, return_counts=True)
    contribution = grouped_sums(which, label_parts(agreement)[pairable], found.size)
    group, of_coder = np.divmod(found, n_coders)
    return GroupCoderParts(group, of_coder, contribution, shares(agreement, contribution), n_labels)


def group_label_pair_parts(
    agreement: Agreement, group_of_item: IntArray, n_groups: int
) -> GroupLabelPairParts:
    """Return the part of each pair of labels within each group of items.

    Parameters
    ----------
    agreement : Agreement
    group_of_item : int array of shape (n_items,)
        From 0 to n_groups - 1.
    n_groups : int
    """
    check_groups(agreement, group_of_item, n_groups)
    profiles, n_values = agreement.profiles, agreement.profiles.n_values
    profile, first, second, part = value_pair_parts(agreement)
    begin = np.searchsorted(profile, np.arange(profiles.n_profiles + 1))
    pairs_of_profile = np.diff(begin)

    # How often each profile occurs in each group, then each occurrence with each of its pairs.
    at = agreement.profile_of_item
    cells, often = np.unique(
        group_of_item[at >= 0] * max(1, profiles.n_profiles) + at[at >= 0], return_counts=True
    )
    group_of_cell, profile_of_cell = np.divmod(cells, max(1, profiles.n_profiles))
    repeats = pairs_of_profile[profile_of_cell]
    ends = np.cumsum(repeats)
    within_cell = np.arange(int(ends[-1]) if ends.size else 0) - np.repeat(ends - repeats, repeats)
    pair = np.repeat(begin[:-1][profile_of_cell], repeats) + within_cell
    times = np.repeat(often, repeats)

    values = profiles.value_index
    of_labels = values[first[pair]] * n_values + values[second[pair]]
    square = max(1, n_values * n_values)
    found, which = np.unique(
        np.repeat(group_of_cell, repeats) * square + of_labels, return_inverse=True
    )
    contribution = grouped_sums(which, part[pair] * times, found.size)
    n_items = np.bincount(which, weights=times, minlength=found.size).astype(np.int64)
    order = np.lexsort((found, tie_levels(contribution)))
    group, of_labels = np.divmod(found[order], square)
    contribution = contribution[order]
    of_first, of_second = np.divmod(of_labels, max(1, n_values))
    return GroupLabelPairParts(
        group,
        of_first,
        of_second,
        contribution,
        shares(agreement, contribution),
        n_items[order],
    )
