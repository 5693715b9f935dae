"""Labels of each layout come to the same codes, each with its place."""

from __future__ import annotations

from fractions import Fraction
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from relook.tables.joining import Flat, _sort_on_both, by_item_and_coder
from relook.tables.labels import LabelData, read_labels
from relook.tables.numbers import parse_number
from relook.tables.schema import LabelSource, Variable


def labels_of(root: Path, files: dict[str, str], *variables: Variable, **source: Any) -> LabelData:
    """Write label files and read them."""
    for name, text in files.items():
        (root / name).write_text(text, encoding="utf-8", newline="")
    said: dict[str, Any] = {"item": "item", "coder": "coder", **source}
    paths = tuple(Path(name) for name in files)
    return read_labels(
        LabelSource(files=paths, **said), variables or (Variable(name="label"),), root
    )


def triples(data: LabelData, name: str = "label") -> set[tuple[str, str, str]]:
    """Return (item, coder, label) of every label."""
    held = data.variables[name]
    coder = held.labels.coder_index
    coders = [""] * held.labels.n_labels if coder is None else [data.coders[c] for c in coder]
    return {
        (str(data.items[i]), c, held.texts[v])
        for i, c, v in zip(held.labels.item_index, coders, held.labels.value_index, strict=True)
    }


def test_long_and_by_coder_come_to_the_same(tmp_path: Path) -> None:
    """A row per label and a column per coder hold the same labels."""
    long = labels_of(tmp_path, {"l.csv": "item,coder,label\n01,x,a\n01,y,b\n1,x,NA\n1,y,a\n"})
    wide = labels_of(tmp_path, {"w.csv": "item,x,y\n01,a,b\n1,NA,a\n"}, layout="by-coder")
    assert triples(long) == triples(wide) == {("01", "x", "a"), ("01", "y", "b"), ("1", "y", "a")}
    assert long.variables["label"].n_missing == wide.variables["label"].n_missing == 1
    assert list(long.items) == list(wide.items) == ["01", "1"]


def test_counts_have_labels_and_no_coders(tmp_path: Path) -> None:
    """A count of 2 is two labels without a coder; empty is none."""
    data = labels_of(tmp_path, {"c.csv": "item,yes,no\na,2,\nb,0,1\n"}, layout="counts")
    held = data.variables["label"].labels
    assert (held.n_labels, held.coder_index, data.coders) == (3, None, ())
    assert held.labels_per_item.tolist() == [2, 1]


def test_several_variables_by_pattern_take_the_longest_name(tmp_path: Path) -> None:
    """`tone_main_c1` belongs to `tone_main`, not to `tone` with a coder `main_c1`."""
    text = "item,tone_c1,tone_c2,tone_main_c1,tone_main_c2\na,1,2,3,4\n"
    data = labels_of(
        tmp_path, {"t.csv": text}, Variable(name="tone"), Variable(name="tone_main"),
        layout="by-coder", columns="{variable}_{coder}",
    )  # fmt: skip
    assert triples(data, "tone") == {("a", "c1", "1"), ("a", "c2", "2")}
    assert triples(data, "tone_main") == {("a", "c1", "3"), ("a", "c2", "4")}


def test_each_label_knows_its_place(tmp_path: Path) -> None:
    """File, row and column are kept through sorting."""
    files = {"1.csv": "item,coder,label\nb,x,p\n\na,x,q\n", "2.csv": "item,coder,label\nb,y,r\n"}
    data = labels_of(tmp_path, files)
    held = data.variables["label"]
    places = {
        held.texts[held.labels.value_index[at]]: str(data.place("label", at)) for at in range(3)
    }
    assert places == {
        "p": '1.csv, row 2, column "label"',
        "q": '1.csv, row 4, column "label"',
        "r": '2.csv, row 2, column "label"',
    }


def test_ids_that_look_alike_stay_apart(tmp_path: Path) -> None:
    """Zeros, case, long digit strings, dates and spaces make different items."""
    ids = [
        "7",
        "007",
        "7.0",
        "A",
        "a",
        "12345678901234567890",
        "12345678901234567891",
        "1/2",
        "2/1",
    ]
    text = "item,coder,label\n" + "".join(f"{one},x,p\n" for one in ids)
    assert list(labels_of(tmp_path, {"t.csv": text}).items) == ids


@pytest.mark.parametrize(
    ("difference", "texts"),
    [
        ("nominal", ("1", "1.0", "1.50", "1.5")),
        ("interval", ("1", "1.5")),
        ("ordinal", ("1", "1.5")),
    ],
)
def test_numbers_are_one_value_only_where_they_are_numbers(
    tmp_path: Path, difference: str, texts: tuple[str, ...]
) -> None:
    """1.50 and 1.5 differ as words and are equal as numbers."""
    text = "item,coder,label\na,x,1.50\na,y,1.5\nb,x,1\nb,y,1.0\n"
    held = labels_of(tmp_path, {"t.csv": text}, Variable(name="label", difference=difference))
    assert set(held.variables["label"].texts) == set(texts)


def test_numbers_stay_exact(tmp_path: Path) -> None:
    """0.1 is a tenth; labels come in numeric order."""
    text = "item,coder,label\na,x,10\na,y,0.1\nb,x,9\nb,y,-2e1\n"
    held = labels_of(tmp_path, {"t.csv": text}, Variable(name="label", difference="interval"))
    values = held.variables["label"].values
    assert held.variables["label"].texts == ("-2e1", "0.1", "9", "10")
    assert values.numerators is not None
    assert [Fraction(int(x), values.denominator) for x in values.numerators] == [
        -20, Fraction(1, 10), 9, 10,
    ]  # fmt: skip


@pytest.mark.parametrize(
    ("text", "number"),
    [("1", 1), (" 1.50 ", Fraction(3, 2)), ("−2", -2), ("1E5", 100_000), (".5", Fraction(1, 2)),
     ("", None), ("1_0", None), ("inf", None), ("nan", None), ("1,5", None), ("٣", None), ("50%", None),
     ("1e9999", None), ("0x1", None)],
)  # fmt: skip
def test_what_is_a_number(text: str, number: Fraction | None) -> None:
    """Plain decimal notation is; names of floats, marks and other digits are not."""
    assert parse_number(text) == number


def test_a_declared_decimal_comma_is_read(tmp_path: Path) -> None:
    """With decimal "," a comma is the decimal mark."""
    variable = Variable(name="label", difference="interval", decimal=",")
    data = labels_of(tmp_path, {"t.csv": "item;coder;label\na;x;3,5\na;y;4\n"}, variable)
    assert data.variables["label"].values.numbers().tolist() == [3.5, 4.0]


def test_sets_are_the_same_in_any_order(tmp_path: Path) -> None:
    """a;b, b; a and a;b;a are one set."""
    variable = Variable(name="label", difference="jaccard", options={"separator": ";"})
    text = "item,coder,label\n1,x,a;b\n1,y,b; a\n2,x,a;b;a\n2,y,b\n"
    assert labels_of(tmp_path, {"t.csv": text}, variable).variables["label"].texts == ("a;b", "b")


def test_the_same_label_again_counts_once_and_is_noted(tmp_path: Path) -> None:
    """A row entered twice is a note that names both rows."""
    data = labels_of(tmp_path, {"t.csv": "item,coder,label\na,x,p\na,y,q\na,x,p\n"})
    assert data.variables["label"].labels.n_labels == 2
    (note,) = data.problems
    assert (note.severity, note.where.row if note.where else None) == ("note", 2)
    assert "again in row 4" in note.message


@pytest.mark.parametrize(("rule", "kept"), [("first", "p"), ("last", "q")])
def test_of_two_opinions_the_first_or_the_last_counts(tmp_path: Path, rule: str, kept: str) -> None:
    """By setting, with a warning."""
    data = labels_of(
        tmp_path, {"t.csv": "item,coder,label\na,x,p\nb,x,p\na,x,q\n"}, duplicates=rule
    )
    assert ("a", "x", kept) in triples(data)
    assert data.problems[0].severity == "warning"
    assert data.problems[0].message.endswith(f"the {rule} counts")


def test_coders_left_out_are_gone_and_said(tmp_path: Path) -> None:
    """Their labels leave, other codes close up, and a misspelt name is a warning."""
    text = "item,coder,label\na,x,p\na,y,q\na,z,p\nb,x,q\n"
    data = labels_of(tmp_path, {"t.csv": text}, leave_out=("x", "zz"))
    assert data.coders == ("y", "z")
    assert triples(data) == {("a", "y", "q"), ("a", "z", "p")}
    assert data.left_out == {"x": 2}
    assert data.said[-1] == 'coder "x" left out (2 labels)'
    assert '"zz", is not there' in data.problems[0].message


def test_remarks_stay_with_their_labels(tmp_path: Path) -> None:
    """A remark is beside its label after sorting."""
    text = "item,coder,label,why\nb,x,p,one\na,x,q,\nb,y,r,two\n"
    held = labels_of(tmp_path, {"t.csv": text}, remark="why").variables["label"]
    assert held.remarks is not None
    found = {held.texts[v]: r for v, r in zip(held.labels.value_index, held.remarks, strict=True)}
    assert found == {"p": "one", "q": "", "r": "two"}


word = st.text(st.characters(codec="utf-8", exclude_characters="\r\x00"), min_size=1, max_size=5)
word = word.filter(lambda text: text.strip() and text != "NA")


@given(st.dictionaries(st.tuples(word, word), word, min_size=1, max_size=8))
@settings(max_examples=80, deadline=None)
def test_any_labels_come_back_from_a_file(
    tmp_path_factory: pytest.TempPathFactory, labels: dict[tuple[str, str], str]
) -> None:
    """Items, coders and labels of any text are read as they were written."""

    def quoted(text: str) -> str:
        return '"' + text.replace('"', '""') + '"'

    lines = [",".join(map(quoted, (i, c, label))) for (i, c), label in labels.items()]
    text = "item,coder,label\n" + "\n".join(lines) + "\n"
    data = labels_of(tmp_path_factory.mktemp("t"), {"t.csv": text})
    assert triples(data) == {(i, c, label) for (i, c), label in labels.items()}


def test_sorting_is_the_same_by_packed_words_and_by_keys() -> None:
    """Both ways of sorting give item, coder, then the order of reading."""
    rng = np.random.default_rng(5)
    n = 200
    remark = np.array([f"r{at}" for at in range(n)], dtype=object)
    for coder in (rng.integers(0, 4, n), None):
        for row in (np.arange(7, n + 7), np.sort(rng.choice(n * 3, n, replace=False))):
            flat = Flat(
                item=rng.integers(0, 9, n).astype(np.int32),
                coder=coder,
                text=rng.integers(0, 5, n).astype(np.int32),
                file=np.broadcast_to(np.int32(0), n),
                column=np.broadcast_to(np.int32(2), n),
                row=row,
                remark=remark,
                texts=np.array(list("abcde"), dtype=object),
                n_missing=0,
            )
            order = np.lexsort((flat.item,) if coder is None else (coder, flat.item))
            want = flat.take(order)
            for n_items in (9, 2**60):
                got = by_item_and_coder(flat, n_items, 4)
                for name in ("item", "coder", "text", "file", "column", "row", "remark"):
                    held, due = getattr(got, name), getattr(want, name)
                    assert (held is None and due is None) or held.tolist() == due.tolist(), name


def test_many_numbers_are_sorted_on_two_threads_as_on_one() -> None:
    """A million and more, as numpy sorts them."""
    numbers = np.random.default_rng(3).integers(0, 2**62, (1 << 20) + 3)
    got = numbers.copy()
    _sort_on_both(got)
    assert np.array_equal(got, np.sort(numbers))


def test_blank_items_and_coders_leave_no_trace(tmp_path: Path) -> None:
    """A row whose label is missing may lack its item or its coder; neither becomes a name."""
    text = "item,coder,label\na,x,p\n,x,NA\nb,,NA\nb,y,q\n"
    data = labels_of(tmp_path, {"t.csv": text})
    assert list(data.items) == ["a", "b"]
    assert data.coders == ("x", "y")
    assert triples(data) == {("a", "x", "p"), ("b", "y", "q")}
