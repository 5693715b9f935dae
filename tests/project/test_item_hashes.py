"""Ids are found by their hashes as in a dict, those of equal hashes too."""

from __future__ import annotations

import numpy as np
from hypothesis import given
from hypothesis import strategies as st

from relook.project.setup.item_hashes import ItemLookup, hashed_ids

ids = st.text(max_size=3)


@given(st.lists(ids, unique=True, max_size=20), st.lists(ids, max_size=20), st.integers(0, 3))
def test_ids_are_found_as_in_a_dict(items: list[str], wanted: list[str], seed: int) -> None:
    """-1 for those that are not there; no item at all, and nothing wanted, are no fault."""
    texts = np.array(items, dtype=object)
    lookup = ItemLookup(texts, hashed_ids(texts, seed), seed)
    number = {item: at for at, item in enumerate(items)}
    assert lookup.numbers(wanted).tolist() == [number.get(each, -1) for each in wanted]
    assert lookup.numbers(items).tolist() == list(range(len(items)))


def test_ids_of_one_hash_are_told_apart() -> None:
    """Every id given the hash of "b": each is found all the same, and a stranger is not."""
    texts = np.array(["a", "b", "c"], dtype=object)
    same = np.repeat(hashed_ids(np.array(["b"], dtype=object), 1), 3)
    lookup = ItemLookup(texts, same, 1)
    assert lookup.numbers(["b"]).tolist() == [1]
    assert lookup.numbers(["x"]).tolist() == [-1]
    below = ItemLookup(texts[[0, 1]], same[:2], 1)
    assert below.numbers(["b", "b"]).tolist() == [1, 1]
