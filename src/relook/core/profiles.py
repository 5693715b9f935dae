"""Items with the same labels are computed once.

A *profile* is the multiset of labels that an item carries, coders forgotten. Five coders and five
values make 126 of them, however many items there are, so everything that depends on an item's
labels alone (contribution, consensus, resampling, settling) is worked out per profile and weighted
by its multiplicity. Profiles of two parts of the data merge by addition.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from relook.core.exact import IntArray, numbered
from relook.core.labels import CodedLabels

#: Floats add integers of so many bits without rounding; one is left for the sum.
_EXACT_BITS = 52


@dataclass(frozen=True, slots=True, eq=False)
class Profiles:
    """Distinct label profiles, in an order that does not depend on the order of the items.

    Profile p owns the entries `start[p]:start[p + 1]`: one entry per distinct value, ascending.

    Attributes
    ----------
    value_index : int array of shape (n_entries,)
    count : int array of shape (n_entries,)
        How many labels of that value an item of the profile carries, 1 or more.
    start : int array of shape (n_profiles + 1,)
    multiplicity : int array of shape (n_profiles,)
        How many items have the profile.
    n_values : int
    """

    value_index: IntArray
    count: IntArray
    start: IntArray
    multiplicity: IntArray
    n_values: int

    @property
    def n_profiles(self) -> int:
        """The number of profiles."""
        return len(self.start) - 1

    @property
    def size(self) -> IntArray:
        """The number of labels of an item of each profile (m_u), shape (n_profiles,)."""
        if self.n_profiles == 0:
            return np.zeros(0, dtype=np.int64)
        return np.asarray(np.add.reduceat(self.count, self.start[:-1]))

    @property
    def n_distinct(self) -> IntArray:
        """The number of distinct values of each profile, shape (n_profiles,)."""
        return np.diff(self.start)

    @property
    def profile_of_entry(self) -> IntArray:
        """The profile that each entry belongs to, shape (n_entries,)."""
        return np.repeat(np.arange(self.n_profiles), self.n_distinct)

    def pairable_marginals(self) -> IntArray:
        """n_c: the labels of each value in items with two labels or more, shape (n_values,)."""
        profile = self.profile_of_entry
        weight = np.where(self.size >= 2, self.multiplicity, 0)[profile] * self.count
        # bincount adds in floats; they are exact up to 2**53 labels.
        summed = np.bincount(self.value_index, weights=weight, minlength=self.n_values)
        return summed.astype(np.int64)

    def value_pairs(self) -> tuple[IntArray, IntArray, IntArray]:
        """Return every unordered pair of distinct values that meet in a profile.

        Returns
        -------
        profile, first, second : int arrays of shape (n_pairs,)
            `first` and `second` are entry positions with first < second, grouped by profile.
        """
        distinct = self.n_distinct
        profiles, firsts, seconds = [], [], []
        for d in np.unique(distinct[distinct >= 2]).tolist():
            chosen = np.flatnonzero(distinct == d)
            upper, lower = np.triu_indices(d, k=1)
            begin = self.start[chosen][:, None]
            profiles.append(np.repeat(chosen, upper.size))
            firsts.append((begin + upper).ravel())
            seconds.append((begin + lower).ravel())
        if not profiles:
            none = np.zeros(0, dtype=np.int64)
            return none, none, none
        profile = np.concatenate(profiles)
        order = np.argsort(profile, kind="stable")
        return profile[order], np.concatenate(firsts)[order], np.concatenate(seconds)[order]


def merge(parts: Sequence[Profiles], n_values: int) -> tuple[Profiles, list[IntArray]]:
    """Return the profiles of several parts of the data together.

    Parameters
    ----------
    parts : sequence of Profiles
        At least one; all use the same value codes.
    n_values : int

    Returns
    -------
    profiles : Profiles
        Multiplicities added, in the order that `collapse` gives.
    place : list of int arrays
        For each part the place of its profiles among them.
    """
    counts = np.concatenate([part.count for part in parts])
    values = np.concatenate([part.value_index for part in parts])
    begins = np.cumsum([0, *(part.n_profiles for part in parts)])
    each = [part.profile_of_entry + begin for part, begin in zip(parts, begins, strict=False)]
    labels = CodedLabels(
        np.repeat(np.concatenate(each), counts),
        np.repeat(values, counts),
        None,
        n_items=int(begins[-1]),
        n_values=n_values,
        n_coders=0,
    )
    found, place = collapse(labels)
    often = np.zeros(found.n_profiles, dtype=np.int64)
    np.add.at(often, place, np.concatenate([part.multiplicity for part in parts]))
    together = Profiles(found.value_index, found.count, found.start, often, n_values)
    return together, np.split(place, begins[1:-1])


def collapse(labels: CodedLabels) -> tuple[Profiles, IntArray]:
    """Find the distinct profiles of a set of labels.

    Parameters
    ----------
    labels : CodedLabels

    Returns
    -------
    profiles : Profiles
        Ordered by size, then by their sorted values.
    profile_of_item : int array of shape (n_items,)
        -1 for an item without labels.
    """
    per_item = labels.labels_per_item
    bits = int(per_item.max(initial=0)).bit_length()
    if 0 < bits * labels.n_values <= _EXACT_BITS:
        return _of_counts(labels, per_item, bits)
    return _of_sorted(labels, per_item)


def _of_counts(labels: CodedLabels, per_item: IntArray, bits: int) -> tuple[Profiles, IntArray]:
    """Few values: the counts of an item's values side by side are one number, found by adding.

    That needs no sorting of labels, and the numbers that occur are few.
    """
    shift = bits * np.arange(labels.n_values)
    weight = np.ldexp(1.0, shift)
    word = np.zeros(labels.n_items, dtype=np.int64)
    for run in labels.blocks():
        first, last = int(run.item_index[0]), int(run.item_index[-1])
        word[first : last + 1] = np.bincount(
            run.item_index - first, weights=weight[run.value_index]
        )
    distinct, which, often = numbered(word, 2 ** (bits * labels.n_values))
    counts = (distinct[:, None] >> shift) & ((1 << bits) - 1)
    # Of two profiles of one size, the first by sorted values has more of the first value in which
    # they differ.
    order = np.lexsort([*(-counts[:, ::-1].T), counts.sum(axis=1)])
    if order.size and distinct[order[0]] == 0:  # items without labels are no profile
        order = order[1:]
    place = np.full(distinct.size, -1, dtype=np.int64)
    place[order] = np.arange(order.size)
    profile, value = np.nonzero(counts[order])
    start = np.searchsorted(profile, np.arange(order.size + 1))
    found = Profiles(value, counts[order][profile, value], start, often[order], labels.n_values)
    return found, place[which]


def _of_sorted(labels: CodedLabels, per_item: IntArray) -> tuple[Profiles, IntArray]:
    """Any number of values: each item's labels sorted, and the rows that differ numbered."""
    first = np.concatenate([[0], np.cumsum(per_item)])
    profile_of_item = np.full(labels.n_items, -1, dtype=np.int64)
    values, counts, distinct, multiplicities = [], [], [], []
    found = 0
    for m in np.unique(per_item[per_item > 0]).tolist():
        items = np.flatnonzero(per_item == m)
        table = labels.value_index[first[items][:, None] + np.arange(m)]
        table = np.sort(table, axis=1)
        which, example, often = _distinct_rows(table, labels.n_values)
        profile_of_item[items] = found + which
        found += often.size
        multiplicities.append(often)
        rows = table[example]
        begins = np.ones(rows.shape, dtype=bool)
        begins[:, 1:] = rows[:, 1:] != rows[:, :-1]
        at = np.flatnonzero(begins)
        values.append(rows.ravel()[at].astype(np.int64))
        # Each row begins a run, so a run never crosses into the next row.
        counts.append(np.diff(np.append(at, rows.size)))
        distinct.append(begins.sum(axis=1))
    if not values:
        none = np.zeros(0, dtype=np.int64)
        return Profiles(none, none, np.zeros(1, np.int64), none, labels.n_values), profile_of_item
    start = np.concatenate([[0], np.cumsum(np.concatenate(distinct))])
    profiles = Profiles(
        np.concatenate(values),
        np.concatenate(counts),
        start,
        np.concatenate(multiplicities),
        labels.n_values,
    )
    return profiles, profile_of_item


def _distinct_rows(table: IntArray, n_values: int) -> tuple[IntArray, IntArray, IntArray]:
    """Number the distinct rows of a table of value codes in lexicographic order.

    Columns are packed into 63-bit words as long as they fit; the number of the row so far then
    takes the place of the columns already read. That is exact, unlike a hash, and sorts integers
    rather than rows.

    Returns
    -------
    which : int array of shape (n_rows,)
        The number of each row.
    example : int array of shape (n_distinct,)
        A row that has that number.
    often : int array of shape (n_distinct,)
        How many rows have it.
    """
    bits = max(1, (n_values - 1).bit_length())
    word = table[:, 0].astype(np.int64)
    used = bits
    for column in range(1, table.shape[1]):
        if used + bits > 62:
            _, word = np.unique(word, return_inverse=True)
            used = max(1, int(word.max()).bit_length())
        word = (word << bits) | table[:, column]
        used += bits
    _, example, which, often = np.unique(
        word, return_index=True, return_inverse=True, return_counts=True
    )
    return which, example, often
