"""Texts as numbers: equal for equal texts alone, and codes in the order of appearance."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
import pandas as pd
import pytest
from hypothesis import given
from hypothesis import strategies as st

from relook.tables import arrow_columns
from relook.tables.numbered_texts import (
    MOST_BYTES,
    TextBytes,
    in_order_of_appearance,
    numbers_of_texts,
)


def held(texts: Sequence[str]) -> TextBytes:
    parts = [text.encode() for text in texts]
    bounds = np.cumsum([0, *map(len, parts)])
    return TextBytes(bounds, np.frombuffer(b"".join(parts), dtype=np.uint8))


def coded(parts: Sequence[Sequence[str]], most: int) -> tuple[list[int], list[int]] | None:
    found = numbers_of_texts([held(part) for part in parts], most)
    if found is None:
        return None
    codes, first = in_order_of_appearance(*found)
    return codes.tolist(), first.tolist()


def by_pandas(texts: Sequence[str]) -> tuple[list[int], list[int]]:
    codes, _ = pd.factorize(np.array(texts, dtype=object))
    _, first = np.unique(codes, return_index=True)
    return codes.tolist(), first.tolist()


ids = st.one_of(
    st.integers(0, 3000).map(str),
    st.integers(0, 999).map("r{:04d}".format),
    st.sampled_from(["", "é1", "é2", "ß", "a", "b"]),
)


@given(st.lists(st.lists(ids, max_size=30), min_size=1, max_size=4))
def test_codes_are_those_of_hashing(parts: list[list[str]]) -> None:
    """Ids with and without leading noughts, empty and not ASCII, in several pieces."""
    got = coded(parts, 2**31 - 1)
    every = [text for part in parts for text in part]
    assert got == by_pandas(every)


def test_numbers_are_no_more_than_the_bytes_allow() -> None:
    """Of "a1" to "a3" and "b1" to "b3" there are 2 × 3 places; of "7" there is one."""
    found = numbers_of_texts([held(["a1", "b3", "7"])], 100)
    assert found is not None
    numbers, size = found
    assert size == 2 * 3 + 1
    assert len(set(numbers.tolist())) == 3
    assert int(numbers.max()) < size


@pytest.mark.parametrize(
    "texts",
    [
        ["x" * (MOST_BYTES + 1), "y"],
        ["a0z", "z9a"],
        [f"{at:0{width}d}" for width in range(1, 15) for at in range(3)],
        [f"{at * 7919 % 65536:016x}" for at in range(5000)],
    ],
    ids=["too long", "too many places", "too many lengths", "random"],
)
def test_what_does_not_pay_is_left_to_hashing(texts: list[str]) -> None:
    """None, and nothing is raised."""
    assert coded([texts], 2000) is None


def test_a_column_of_ids_is_coded_by_numbers_as_by_hashing(monkeypatch: pytest.MonkeyPatch) -> None:
    """Over several chunks, one of them a slice; columns of few texts and with blanks are hashed."""
    pa = pytest.importorskip("pyarrow", reason="the extra `fast` is not installed")
    monkeypatch.setattr(arrow_columns, "_MANY", 10)
    rng = np.random.default_rng(4)
    texts = [f"i{at:05d}" for at in rng.integers(0, 9000, 9000)]
    for kind in (pa.string(), pa.large_string()):
        whole = pa.array(texts, kind)
        column = pa.chunked_array([whole.slice(0, 4000), whole.slice(4000, 0), whole.slice(4000)])
        for part, want in ((column, texts), (column.slice(100, 5000), texts[100:5100])):
            assert arrow_columns._coded_by_numbers(part) is not None
            codes, found = arrow_columns.coded_column(part)
            want_codes, want_texts = pd.factorize(np.array(want, dtype=object))
            assert codes.tolist() == want_codes.tolist()
            assert found.tolist() == want_texts.tolist()
    few = pa.chunked_array([pa.array(["yes", "no"] * 5000)])
    assert arrow_columns._coded_by_numbers(few) is None
    assert arrow_columns._coded_by_numbers(pa.chunked_array([pa.array([*texts, None])])) is None
