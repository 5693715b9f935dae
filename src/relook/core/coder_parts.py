"""Parts of D_o that need every label: of labels one by one, of coders and of their pairs."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from relook.core.agreement import Agreement
from relook.core.contributions import PairParts, Parts, entry_parts, parts_from, shares
from relook.core.exact import FloatArray, IntArray, grouped_sums, numbered
from relook.core.labels import CodedLabels
from relook.core.summed import SummedAgreement
from relook.errors import RelookError

#: Sums of pairs of coders, found run by run, that are added up before more are found.
_MOST_PENDING = 4_000_000


def label_parts(agreement: Agreement) -> FloatArray:
    """Return each label's part of D_o.

    Returns
    -------
    float array of shape (n_labels,)
        In the order of `agreement.labels`; 0 for a label that is not pairable.
    """
    return entry_parts(agreement)[label_entries(agreement)]


def label_entries(agreement: Agreement) -> IntArray:
    """Return the profile entry of each label, shape (n_labels,)."""
    runs = list(_entries_by_block(agreement))
    return np.concatenate([entry for _, entry in runs]) if runs else np.zeros(0, dtype=np.int64)


def coder_index(agreement: Agreement) -> IntArray:
    """Return the coder of each label, shape (n_labels,).

    Raises
    ------
    RelookError
        The labels carry no coders.
    """
    coder = agreement.labels.coder_index
    if coder is None:
        raise RelookError(
            "this table holds counts, so nothing is known of the coders",
            mend="give a table with a row per label, or a column per coder",
        )
    return coder


def coder_entries(agreement: Agreement) -> IntArray:
    """Return how many labels each coder gave of each profile entry.

    Returns
    -------
    int array of shape (n_coders, n_entries)

    Raises
    ------
    RelookError
        The labels carry no coders.
    """
    if isinstance(agreement, SummedAgreement):
        return agreement.given
    coder_index(agreement)
    n_coders, n_entries = agreement.labels.n_coders, agreement.profiles.value_index.size
    given = np.zeros(n_coders * n_entries, dtype=np.int64)
    for run, entry in _entries_by_block(agreement):
        assert run.coder_index is not None
        given += np.bincount(
            run.coder_index.astype(np.int64) * n_entries + entry, minlength=given.size
        )
    return given.reshape(n_coders, n_entries)


def _entries_by_block(agreement: Agreement) -> Iterator[tuple[CodedLabels, IntArray]]:
    """Yield the labels in runs, with the profile entry of each."""
    profiles, labels = agreement.profiles, agreement.labels
    # Within a profile the values ascend, so (profile, value) numbers the entries in order.
    wide = max(1, profiles.n_values)
    keys = profiles.profile_of_entry * wide + profiles.value_index
    lookup = profiles.n_profiles * wide <= 4 * labels.n_labels
    entry_of_key = np.zeros(profiles.n_profiles * wide if lookup else 0, dtype=np.int64)
    if lookup:
        entry_of_key[keys] = np.arange(keys.size)
    for run in labels.blocks():
        key = agreement.profile_of_item[run.item_index] * wide + run.value_index
        yield run, entry_of_key[key] if lookup else np.searchsorted(keys, key)


def coder_parts(agreement: Agreement) -> Parts:
    """Return the part of each coder, arrays of shape (n_coders,).

    Raises
    ------
    RelookError
        The labels carry no coders.
    """
    given = coder_entries(agreement)
    profiles = agreement.profiles
    pairable = profiles.size[profiles.profile_of_entry] >= 2
    contribution = given @ entry_parts(agreement)
    n_labels = given[:, pairable].sum(axis=1)
    # Each of its pairs has its other side elsewhere, so half of what it is involved in is its own.
    return parts_from(agreement, contribution, 2 * contribution, n_labels, n_labels)


def coder_pair_parts(agreement: Agreement) -> PairParts:
    """Return the part of each pair of coders who share an item, by first, then second coder.

    Notes
    -----
    Takes time in proportion to the pairs of labels within items and memory in proportion to the
    labels and to the pairs of coders that occur.
    """
    coder_index(agreement)
    n_coders = agreement.labels.n_coders
    keys: list[IntArray] = []
    parts: list[FloatArray] = []
    counts: list[IntArray] = []
    pending = 0
    for run, first, second, apart, part in _label_pairs(agreement):
        coder = np.asarray(run.coder_index, dtype=np.int64)
        low, high = np.minimum(coder[first], coder[second]), np.maximum(coder[first], coder[second])
        found, which, often = numbered(low * n_coders + high, n_coders**2)
        keys.append(found)
        parts.append(grouped_sums(which[apart], part, found.size))
        counts.append(often)
        pending += found.size
        if pending > _MOST_PENDING:
            key, added, count = _joined(keys, parts, counts)
            keys, parts, counts, pending = [key], [added], [count], 0
    key, part, count = _joined(keys, parts, counts)
    first, second = np.divmod(key, max(1, n_coders))
    return PairParts(first, second, part, shares(agreement, part), count)


def _label_pairs(
    agreement: Agreement,
) -> Iterator[tuple[CodedLabels, IntArray, IntArray, IntArray, FloatArray]]:
    """Yield the pairs of labels of one item, with the part of both ordered pairs together.

    Labels are sorted by item, so the pairs are: each label with the next one, with the one after
    that, and so on for as long as both lie in one item.

    Yields
    ------
    run : CodedLabels
        Some of the labels.
    first, second : int arrays of shape (n_pairs,)
        Positions in them.
    apart : int array of shape (n_apart,)
        Which pairs are of different values; the others have no part.
    part : float array of shape (n_apart,)
    """
    differences, n = agreement.differences, agreement.n_pairable_labels
    for run in agreement.labels.blocks():
        item, value = run.item_index, run.value_index
        others = np.bincount(item - item[0]) - 1
        first = np.arange(run.n_labels)
        step = 1
        while True:
            first = first[: np.searchsorted(first, run.n_labels - step)]
            first = first[item[first] == item[first + step]]
            if first.size == 0:
                break
            second = first + step
            of_first, of_second = value[first], value[second]
            apart = np.flatnonzero(of_first != of_second)
            delta = differences.between(of_first[apart], of_second[apart])
            part = 2 * delta / others[item[first[apart]] - item[0]] / n
            yield run, first, second, apart, part
            step += 1


def _joined(
    keys: list[IntArray], parts: list[FloatArray], counts: list[IntArray]
) -> tuple[IntArray, FloatArray, IntArray]:
    """Add up parts and counts that were found under equal keys."""
    if not keys:
        none = np.zeros(0, dtype=np.int64)
        return none, np.zeros(0), none
    found, which = np.unique(np.concatenate(keys), return_inverse=True)
    count = np.bincount(which, weights=np.concatenate(counts), minlength=found.size)
    return found, grouped_sums(which, np.concatenate(parts), found.size), count.astype(np.int64)
