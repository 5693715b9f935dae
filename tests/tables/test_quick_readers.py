"""Both quick readers of delimited text see the same cells, whichever is installed."""

import builtins

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from relook.tables import delimited
from relook.tables.delimited import read_delimited

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
        patch.setattr(delimited, "_encoded", lambda data, shape: None)
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

    shape = delimited._choose(b"item,label\na,x\n", "t.csv", None)
    monkeypatch.setattr(builtins, "__import__", refuse)
    assert delimited._encoded(b"item,label\na,x\n", shape) is None
