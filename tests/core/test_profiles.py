"""Distinct label profiles and their multiplicities."""

from collections import Counter

import numpy as np
import pytest

from relook.core.labels import CodedLabels
from relook.core.profiles import Profiles, collapse, merge


def labels_of(rows, n_values=None, n_items=None):
    """Labels of items given as lists of value codes."""
    item = np.repeat(np.arange(len(rows)), [len(row) for row in rows])
    value = np.array([v for row in rows for v in row], dtype=np.int64)
    return CodedLabels.from_codes(item, value, n_values=n_values, n_items=n_items or len(rows))


def written_out(profiles: Profiles) -> Counter:
    """Profiles as a counter of sorted tuples of values."""
    out: Counter = Counter()
    for p in range(profiles.n_profiles):
        entries = slice(profiles.start[p], profiles.start[p + 1])
        key = tuple(np.repeat(profiles.value_index[entries], profiles.count[entries]).tolist())
        out[key] = int(profiles.multiplicity[p])
    return out


@pytest.mark.parametrize("n_values", [1, 2, 5, 300, 2**20])
@pytest.mark.parametrize("most", [1, 3, 9])
def test_profiles_are_the_distinct_multisets(n_values, most):
    """Each multiset of labels is found once with its multiplicity, for few and for many values."""
    rng = np.random.default_rng([n_values, most])
    pool = rng.integers(0, n_values, 4)  # so that some come often
    rows = [rng.choice(pool, int(rng.integers(0, most + 1))).tolist() for _ in range(200)]
    profiles, of_item = collapse(labels_of(rows, n_values))
    assert written_out(profiles) == Counter(tuple(sorted(row)) for row in rows if row)
    for row, p in zip(rows, of_item.tolist(), strict=True):
        if not row:
            assert p == -1
            continue
        entries = slice(profiles.start[p], profiles.start[p + 1])
        assert np.repeat(profiles.value_index[entries], profiles.count[entries]).tolist() == sorted(
            row
        )


def test_order_of_items_does_not_matter():
    """The profiles come in the same order, whatever the order of items and of their labels."""
    rows = [[0, 1], [2, 2, 1], [1, 0], [3], [0, 0]]
    first, _ = collapse(labels_of(rows))
    second, _ = collapse(labels_of([row[::-1] for row in rows[::-1]]))
    for name in ("value_index", "count", "start", "multiplicity"):
        assert getattr(first, name).tolist() == getattr(second, name).tolist()


def test_merging_two_parts_is_the_whole():
    """Profiles of two parts of the items, merged, are those of all items."""
    rng = np.random.default_rng(2)
    rows = [rng.integers(0, 4, int(rng.integers(1, 5))).tolist() for _ in range(80)]
    whole, _ = collapse(labels_of(rows, 4))
    one, _ = collapse(labels_of(rows[:30], 4))
    other, _ = collapse(labels_of(rows[30:], 4))
    for parts in ([one, other], [other, one]):
        merged, places = merge(parts, 4)
        for part, place in zip(parts, places, strict=True):
            assert merged.size[place].tolist() == part.size.tolist()
            for own, at in enumerate(place.tolist()):
                held = [
                    profiles.value_index[profiles.start[p] : profiles.start[p + 1]].tolist()
                    for profiles, p in ((merged, at), (part, own))
                ]
                assert held[0] == held[1]
        for name in ("value_index", "count", "start", "multiplicity"):
            assert getattr(merged, name).tolist() == getattr(whole, name).tolist()


def test_merging_with_nothing_changes_nothing():
    """An empty part adds nothing."""
    some, _ = collapse(labels_of([[0, 1], [1]], 2))
    none, _ = collapse(labels_of([], 2))
    assert written_out(merge([some, none], 2)[0]) == written_out(some)
    assert merge([none, none], 2)[0].n_profiles == 0


def test_marginals_count_pairable_labels_only():
    """n_c leaves lone labels out and weighs profiles by their multiplicity."""
    profiles, _ = collapse(labels_of([[0, 1], [0, 1], [2], [1, 1, 1]], 4))
    assert profiles.pairable_marginals().tolist() == [2, 5, 0, 0]


def test_pairs_of_values_within_profiles():
    """Each unordered pair of distinct values of a profile comes once, by profile."""
    profiles, _ = collapse(labels_of([[0, 1, 2], [1, 1], [0, 3]]))
    profile, first, second = profiles.value_pairs()
    values = profiles.value_index
    found = list(
        zip(profile.tolist(), values[first].tolist(), values[second].tolist(), strict=True)
    )
    assert found == [(0, 0, 3), (2, 0, 1), (2, 0, 2), (2, 1, 2)]
    none, _ = collapse(labels_of([[1, 1]]))
    assert none.value_pairs()[0].size == 0
