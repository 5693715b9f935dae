"""Random tables for property tests."""

from __future__ import annotations

from collections.abc import Hashable

from hypothesis import strategies as st

#: How many values the random tables may use.
N_VALUES = 6

Table = dict[Hashable, list[tuple[Hashable, int]]]


@st.composite
def tables(draw: st.DrawFn, *, n_values: int = N_VALUES, most_items: int = 7) -> Table:
    """Tables of up to five coders with gaps; values are codes below `n_values`."""
    n_items = draw(st.integers(0, most_items))
    label = st.one_of(st.none(), st.integers(0, n_values - 1))
    rows = draw(st.lists(st.lists(label, max_size=5), min_size=n_items, max_size=n_items))
    return {
        item: [(coder, value) for coder, value in enumerate(row) if value is not None]
        for item, row in enumerate(rows)
    }
