"""Texts as numbers: equal for equal texts alone, and codes in the order of appearance."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path

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
from relook.tables.reading import read_table


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


def test_columns_that_are_codes_already_are_renumbered() -> None:
    """Dictionaries of their own in each chunk, texts that no row has, blanks: as by hashing."""
    pa = pytest.importorskip("pyarrow", reason="the extra `fast` is not installed")
    one = pa.DictionaryArray.from_arrays(pa.array([2, 0, 2], pa.int32()), ["a", "unused", " "])
    other = pa.DictionaryArray.from_arrays(pa.array([1, 0, 1], pa.int32()), ["c", "a"])
    column = pa.chunked_array([one, other])
    codes, texts = arrow_columns.coded_column(column)
    assert [texts[code] for code in codes] == [" ", "a", " ", "a", "c", "a"]
    assert texts.tolist() == [" ", "a", "c"]
    blank = arrow_columns.maybe_blank(column)
    assert blank.tolist() == [True, False, True, False, False, False]
    none = arrow_columns.coded_column(pa.chunked_array([], pa.dictionary(pa.int32(), pa.string())))
    assert [each.size for each in none] == [0, 0]


def test_tables_of_few_texts_are_read_alike(tmp_path: Path) -> None:
    """A Parquet column that is kept as numbers into its texts reads as its CSV does."""
    pa = pytest.importorskip("pyarrow", reason="the extra `fast` is not installed")
    from pyarrow import parquet

    rng = np.random.default_rng(8)
    n = 5000
    columns = {
        "item": [f"i{at % 1700}" for at in range(n)],
        "coder": [f"c{at // 1700}" for at in range(n)],
        "label": rng.choice(["p", "q", "", "NA", "r s"], n).tolist(),
    }
    parquet.write_table(pa.table(columns), tmp_path / "t.parquet")
    pd.DataFrame(columns).to_csv(tmp_path / "t.csv", index=False)
    held, plain = (read_table(Path(f"t.{end}"), tmp_path) for end in ("parquet", "csv"))
    assert str(arrow_columns.arrow_column(held.frame[2]).type).startswith("dictionary")
    for column in range(3):
        codes, texts = held.coded(column)
        want_codes, want_texts = plain.coded(column)
        assert codes.tolist() == want_codes.tolist()
        assert texts.tolist() == want_texts.tolist()
        assert held.texts(column).tolist() == columns[held.header[column]]
