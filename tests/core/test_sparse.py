"""Sparse tables of counts, held whole or by their entries."""

import numpy as np
import pytest

from relook.core import sparse
from relook.core.sparse import SparseCounts


@pytest.mark.parametrize("fill", [0.0, 0.01, 0.5])
@pytest.mark.parametrize("most", [0, 4_000_000])
def test_a_product_is_that_of_the_whole_table(fill, most, monkeypatch):
    """Entries in any order, rows without any among them, give what the full table gives."""
    monkeypatch.setattr(sparse, "MOST_DENSE_CELLS", most)
    rng = np.random.default_rng(4)
    whole = np.where(rng.random((30, 20)) < fill, rng.integers(1, 9, (30, 20)), 0).astype(float)
    row, column = np.nonzero(whole)
    order = rng.permutation(row.size)
    entries = (row[order], column[order], whole[row[order], column[order]])
    block = rng.integers(0, 5, (20, 7)).astype(float)
    found = SparseCounts.from_entries(*entries, 30, 20).times(block)
    assert np.array_equal(found, whole @ block)
