"""Both quick readers of delimited text see the same cells, whichever is installed."""

import builtins
import datetime
import io

import numpy as np
import pyarrow as pa
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from pyarrow import parquet

from relook.errors import RelookError
from relook.tables import delimited
from relook.tables import labels as labels_module
from relook.tables.delimited import read_delimited
from relook.tables.guessing import guess
from relook.tables.labels import read_labels
from relook.tables.reading import table_from_bytes
from relook.tables.sketches import Sketch

CELL = st.text(
    alphabet=st.characters(
        exclude_characters='",\r\n\0\x1f\x85\u2028\u2029', exclude_categories=("Cs",)
    ),
    max_size=6,
)
FIXED = ["007", "NA", "null", "", " ", "1E5", "NaN", "true", "2031-01-01", "é", "a'b", "#N/A"]


def rows_of(data: bytes) -> list[list[str]]:
    cells = read_delimited(data, "t.csv", ",")
    return [
        [str(cells.frame[column].iloc[row]) for column in cells.frame.columns]
        for row in range(len(cells.frame))
    ]


def without_arrow(data: bytes, monkeypatch: pytest.MonkeyPatch) -> list[list[str]]:
    with monkeypatch.context() as patch:
        patch.setattr(delimited, "read_regular", lambda *_, **__: None)
        return rows_of(data)


@settings(max_examples=60)
@given(rows=st.lists(st.tuples(CELL | st.sampled_from(FIXED), CELL), min_size=1, max_size=8))
def test_categories_hold_the_text_that_plain_reading_gives(rows):
    """Markers, numbers, dates and spaces come through as they are, by either way."""
    data = "item,label\n" + "".join(f"{first},{second}\n" for first, second in rows)
    with pytest.MonkeyPatch.context() as patch:
        plain = without_arrow(data.encode(), patch)
    assert rows_of(data.encode()) == plain


@pytest.mark.parametrize("end", ["\n", "\r\n"])
def test_line_ends_and_a_missing_last_one_do_no_harm(end, monkeypatch):
    """Windows line ends, and a file that ends without one."""
    data = end.join(["item,label", "a,x", "b,", "c,z"]).encode()
    assert rows_of(data) == without_arrow(data, monkeypatch) == [["a", "x"], ["b", ""], ["c", "z"]]


def test_without_the_extra_the_other_reader_serves(monkeypatch):
    """No pyarrow: the same cells, and no complaint."""
    real = builtins.__import__

    def refuse(name, *rest, **named):
        if name.startswith("pyarrow"):
            raise ImportError(name)
        return real(name, *rest, **named)

    monkeypatch.setattr(builtins, "__import__", refuse)
    assert delimited.read_regular(b"item,label\na,x\n", ",", 2) is None


BLANKS = ["item,label\n", "a,x\n", ",\n", " ,\u00a0\n", ",y\n", "b, \n", "\u3000,\t\n"]


def test_blank_rows_are_left_out_and_the_others_keep_their_rows(monkeypatch):
    """Rows of empty cells and of any white space, whichever reader sees them."""
    data = "".join(BLANKS).encode()
    quick = read_delimited(data, "t.csv", ",")
    with monkeypatch.context() as patch:
        patch.setattr(delimited, "read_regular", lambda *_, **__: None)
        plain = read_delimited(data, "t.csv", ",")
    assert quick.rows.tolist() == plain.rows.tolist() == [2, 5, 6]
    assert rows_of(data) == [["a", "x"], ["", "y"], ["b", " "]]
    assert (quick.header, quick.said, quick.delimiter) == (plain.header, plain.said, ",")


@pytest.mark.parametrize(
    "text",
    [
        "item,label\na,x\nb\n",  # a row too short
        "item,label\na,x,y\n",  # a row too long
        "\nitem,label\na,x\n",  # the header is not in the first row
        "item,label\na,x\n\nb,y\n",  # an empty line
        "item,label\n",  # no rows
        "item\na\n\nb\n",  # one column
        "a;b,c\n1;2,3\n",  # two delimiters to choose from
    ],
)
def test_what_the_quick_reader_leaves_alone_reads_the_same(text, monkeypatch):
    """Cells, rows and errors do not depend on whether the quick reader was tried."""

    def outcome() -> object:
        try:
            cells = read_delimited(text.encode(), "t.csv")
        except RelookError as error:
            return str(error)
        return cells.header, cells.rows.tolist(), cells.frame.to_numpy(dtype=object).tolist()

    quick = outcome()
    monkeypatch.setattr(delimited, "read_regular", lambda *_, **__: None)
    assert quick == outcome()


def test_parquet_values_of_every_kind_become_the_text_of_a_sheet():
    """Numbers, truth values, dates, bytes and missing values, in chunks and as categories."""
    columns = {
        "whole": pa.array([7, None, 7, 12]),
        "float": pa.array([1.0, 2.5, None, float("nan")]),
        "truth": pa.array([True, False, None, True]),
        "day": pa.array([datetime.date(2031, 1, 2), None, datetime.date(2031, 1, 3), None]),
        "bytes": pa.array([b"a", b"\xff", None, b"a"]),
        "category": pa.array(["x", None, "y", "x"]).dictionary_encode(),
        "large": pa.array(["p", "q", None, "p"], pa.large_string()),
        "text": pa.array(["", "s", None, "t"]),
    }
    table = pa.concat_tables([pa.table(columns).slice(0, 1), pa.table(columns).slice(1)])
    held = io.BytesIO()
    parquet.write_table(table, held, row_group_size=2)
    read = table_from_bytes(held.getvalue(), "t.parquet")
    found = {name: read.texts(at).tolist() for at, name in enumerate(read.header)}
    assert found == {
        "whole": ["7", "", "7", "12"],
        "float": ["1", "2.5", "", ""],
        "truth": ["true", "false", "", "true"],
        "day": ["2031-01-02", "", "2031-01-03", ""],
        "bytes": ["a", "\ufffd", "", "a"],
        "category": ["x", "", "y", "x"],
        "large": ["p", "q", "", "p"],
        "text": ["", "s", "", "t"],
    }
    for at in range(len(read.header)):
        codes, texts = read.coded(at)
        assert texts[codes].tolist() == read.texts(at).tolist()
        assert len(set(texts.tolist())) == len(texts)
    assert read.without_cells().texts(0).tolist() == ["7", "", "7", "12"]


def test_a_table_that_was_guessed_is_not_read_again(tmp_path, monkeypatch):
    """The labels are those of a second reading, and there is none."""
    rows = "".join(f"i{at // 3},c{at % 3},{'xyz'[at * at % 3]}\n" for at in range(60))
    file = tmp_path / "labels.csv"
    file.write_text("item,coder,label\n" + rows, encoding="utf-8")
    found = guess([file])
    again = read_labels(found.source, found.variables, tmp_path)
    monkeypatch.setattr(labels_module, "read_table", None)
    known = read_labels(found.source, found.variables, tmp_path, found.tables)
    assert known.digests == again.digests
    assert known.said == again.said
    ours, theirs = known.variables["label"], again.variables["label"]
    for name in ("item_index", "value_index", "coder_index"):
        assert getattr(ours.labels, name).tolist() == getattr(theirs.labels, name).tolist()
    assert ours.rows.tolist() == theirs.rows.tolist()
    assert found.tables == {}


@settings(deadline=None)
@given(pairs=st.lists(st.tuples(st.integers(0, 4), st.integers(0, 2)), min_size=1, max_size=12))
def test_a_column_is_constant_within_groups_where_no_group_has_two_texts(pairs):
    """Against the definition, row by row."""
    groups = np.array([group for group, _ in pairs])
    codes = np.array([code for _, code in pairs])
    one = Sketch(0, "h", codes, np.array(["a", "b", "c"], dtype=object))
    of_group: dict[int, set[int]] = {}
    for group, code in pairs:
        of_group.setdefault(group, set()).add(code)
    expected = len(of_group) < len(pairs) and all(len(held) == 1 for held in of_group.values())
    assert one.constant_within(groups) == expected
