"""What is quick at scale gives what the plain way gives, on the same labels."""

from __future__ import annotations

from itertools import pairwise

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from relook.core import labels as labels_module
from relook.core.agreement import measure_agreement
from relook.core.coder_parts import coder_entries, coder_pair_parts, coder_parts, label_entries
from relook.core.differences import DIFFERENCE_FUNCTIONS
from relook.core.exact import numbered
from relook.core.labels import CodedLabels
from relook.core.profiles import _of_counts, _of_sorted
from relook.core.ranking import RankedVariable, rank_items
from relook.core.without_coder import alpha_without_coder


def made(n_items: int, n_values: int, seed: int = 3) -> CodedLabels:
    """Labels of one to six coders out of nine on each item, some items without any."""
    rng = np.random.default_rng(seed)
    given_by = rng.random((n_items, 9)) < rng.choice([0.0, 0.3, 0.6], n_items)[:, None]
    item, coder = np.nonzero(given_by)
    value = rng.integers(0, n_values, item.size)
    return CodedLabels.from_codes(
        item, value, coder, n_items=n_items, n_values=n_values, n_coders=9
    )


@settings(max_examples=60, deadline=None)
@given(n_items=st.integers(1, 40), n_values=st.integers(1, 6), seed=st.integers(0, 10_000))
def test_counts_and_sorted_labels_make_the_same_profiles(n_items, n_values, seed):
    """Same profiles in the same order, and the same profile of each item."""
    labels = made(n_items, n_values, seed)
    per_item = labels.labels_per_item
    bits = max(1, int(per_item.max(initial=0)).bit_length())
    quick, of_item = _of_counts(labels, per_item, bits)
    plain, expected = _of_sorted(labels, per_item)
    assert of_item.tolist() == expected.tolist()
    for name in ("value_index", "count", "start", "multiplicity"):
        assert getattr(quick, name).tolist() == getattr(plain, name).tolist()


@settings(deadline=None)
@given(keys=st.lists(st.integers(0, 200)), extra=st.sampled_from([1, 10**9]))
def test_numbering_by_counting_is_numbering_by_sorting(keys, extra):
    """Few possible keys are counted and many are sorted, with one result."""
    array = np.array(keys, dtype=np.int64)
    found = numbered(array, 201 * extra)
    plain = np.unique(array, return_inverse=True, return_counts=True)
    assert [one.tolist() for one in found] == [one.tolist() for one in plain]


@pytest.mark.parametrize("run", [1, 5, 64])
@pytest.mark.parametrize("difference", ["nominal", "ordinal"])
def test_runs_of_any_length_give_the_same_figures(run, difference, monkeypatch):
    """Labels taken a few items at a time, or all at once."""
    labels = made(120, 4)

    def figures() -> list[np.ndarray]:
        agreement = measure_agreement(labels, DIFFERENCE_FUNCTIONS[difference])
        coders, pairs = coder_parts(agreement), coder_pair_parts(agreement)
        without = alpha_without_coder(agreement)
        return [
            agreement.profile_of_item,
            label_entries(agreement),
            coder_entries(agreement),
            coders.contribution,
            coders.n_labels,
            pairs.first,
            pairs.second,
            pairs.contribution,
            pairs.n_items,
            without.alpha,
        ]

    whole = figures()
    monkeypatch.setattr(labels_module, "BLOCK", run)
    runs = [one.item_index for one in labels.blocks()]
    assert len(runs) > 1
    assert np.concatenate(runs).tolist() == labels.item_index.tolist()
    assert all(one[-1] < two[0] for one, two in pairwise(runs))
    for plain, found in zip(whole, figures(), strict=True):
        np.testing.assert_allclose(found, plain, rtol=1e-12, atol=1e-15)


@pytest.mark.parametrize("rank_by", ["contribution", "intensity"])
@pytest.mark.parametrize("difference", ["nominal", "ordinal"])
def test_an_item_of_each_profile_ranks_as_all_items_do(rank_by, difference):
    """The whole order, its ties included, as when each item is looked at by itself."""
    agreement = measure_agreement(made(300, 4), DIFFERENCE_FUNCTIONS[difference])
    hashes = np.random.default_rng(5).permutation(300)
    left_out = np.random.default_rng(6).random(300) < 0.2
    variable = RankedVariable(name="v", agreement=agreement, leave_out=left_out)
    quick = rank_items([variable], hashes, rank_by=rank_by)
    # A priority of its own makes every item stand for itself.
    plain = rank_items([variable], hashes, rank_by=rank_by, priority=np.ones(300))
    for name in ("item_index", "score", "carried", "tied", "row_start", "row_contribution"):
        assert getattr(quick, name).tolist() == getattr(plain, name).tolist()


def test_labels_of_one_item_are_found_whatever_the_type_of_the_codes():
    """Narrow codes and wide ones; an item without labels has an empty place."""
    labels = made(50, 3)
    narrow = CodedLabels(
        labels.item_index.astype(np.int32),
        labels.value_index,
        labels.coder_index,
        n_items=50,
        n_values=3,
        n_coders=9,
    )
    for item in range(50):
        expected = np.flatnonzero(labels.item_index == item).tolist()
        for held in (labels, narrow):
            assert list(range(held.n_labels))[held.of_item(item)] == expected


def test_entries_are_found_where_possible_ones_far_outnumber_labels():
    """Hundreds of values and hardly two items alike: looked for, not looked up."""
    labels = made(40, 400)
    agreement = measure_agreement(labels, DIFFERENCE_FUNCTIONS["nominal"])
    profiles = agreement.profiles
    assert profiles.n_profiles * profiles.n_values > 4 * labels.n_labels
    entry = label_entries(agreement)
    assert profiles.value_index[entry].tolist() == labels.value_index.tolist()
    of_item = agreement.profile_of_item[labels.item_index]
    assert profiles.profile_of_entry[entry].tolist() == of_item.tolist()
