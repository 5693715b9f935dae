"""Files of every format and encoding come to the same text, with the rows that a sheet shows."""

from __future__ import annotations

import csv
import hashlib
import io
import json
from pathlib import Path

import pyarrow as pa
import pyarrow.parquet as pq
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from openpyxl import Workbook

from relook.cells.model import Cell
from relook.errors import RelookError
from relook.tables.formats import shown_text
from relook.tables.reading import Table, display_name, find_files, table_from_bytes

ROWS = [["item", "coder", "label"], ["007", "NA", "1E5"], ["2024-01-02", "1.50", "TRUE"]]


def rows_of(table: Table) -> list[list[str]]:
    """Return a table's cells, header left out."""
    columns = [table.texts(at).tolist() for at in range(len(table.header))]
    return [list(row) for row in zip(*columns, strict=True)]


def as_csv(rows: list[list[str]], delimiter: str = ",") -> str:
    """Return rows as delimited text."""
    out = io.StringIO(newline="")
    csv.writer(out, delimiter=delimiter, lineterminator="\n").writerows(rows)
    return out.getvalue()


@pytest.mark.parametrize("delimiter", [",", ";", "\t", "|"])
def test_text_stays_text_under_each_delimiter(delimiter: str) -> None:
    """Leading zeros, exponents, dates and NA are what they were."""
    table = table_from_bytes(as_csv(ROWS, delimiter).encode(), "t.csv")
    assert rows_of(table) == ROWS[1:]
    assert table.rows.tolist() == [2, 3]


@pytest.mark.parametrize(
    ("encoding", "said"),
    [
        ("utf-8", "utf-8"),
        ("utf-8-sig", "utf-8 with a byte order mark"),
        ("utf-16", "utf-16"),
        ("utf-16-le", "utf-16-le, guessed"),
        ("utf-16-be", "utf-16-be, guessed"),
        ("utf-32", "utf-32"),
        ("cp1252", "windows-1252, guessed"),
        ("latin-1", "windows-1252 or latin-1 (they read alike here), guessed"),
    ],
)
def test_encodings_are_found_and_said(encoding: str, said: str) -> None:
    """Each encoding gives the same text; a guess says that it is one."""
    word = "café €" if encoding == "cp1252" else "café"
    rows = [["item", "label"], ["a", word], ["b", "plain"]]
    table = table_from_bytes(as_csv(rows).encode(encoding), "t.csv")
    assert rows_of(table) == rows[1:]
    assert table.said == f"t.csv: {said}, delimiter comma, 2 rows"


def test_a_named_encoding_is_used_without_guessing() -> None:
    """Bytes that could be Windows-1252 are read as told."""
    table = table_from_bytes("a,b\nж,1\n".encode("cp1251"), "t.csv", encoding="windows-1251")
    assert rows_of(table) == [["ж", "1"]]


def test_rows_count_blank_lines_and_quoted_line_breaks_once() -> None:
    """A cell with line breaks is one row of a sheet; a blank line is one too."""
    text = '\nitem,label\n"a\nb",1\n\n , \nc,"2 ""x"""\n'
    table = table_from_bytes(text.encode(), "t.csv")
    assert rows_of(table) == [["a\nb", "1"], ["c", '2 "x"']]
    assert table.rows.tolist() == [3, 6]


@pytest.mark.parametrize("end", ["\n", "\r\n", "\r"])
def test_line_ends_of_each_kind_are_read(end: str) -> None:
    """Line feeds, both, or carriage returns alone."""
    table = table_from_bytes(end.join(["a,b", "1,2", "", "3,4", ""]).encode(), "t.csv")
    assert rows_of(table) == [["1", "2"], ["3", "4"]]
    assert table.rows.tolist() == [2, 4]


def test_a_quote_within_a_cell_is_a_character() -> None:
    """An inch mark does not open a quoted cell."""
    table = table_from_bytes(b'item,label\na,5" nail\nb,"6"" nail"\n', "t.csv")
    assert rows_of(table) == [["a", '5" nail'], ["b", '6" nail']]


def test_the_delimiter_is_the_one_that_fits_every_row() -> None:
    """Commas within texts do not make a semicolon table a comma table."""
    table = table_from_bytes(b"item;text, long;label\na;x, y;1\nb;z;2\n", "t.csv")
    assert table.header == ("item", "text, long", "label")


NAMES = [
    "with space",
    "it's",
    'a "quoted" one',
    "[bold]x[/bold]",
    "{x}",
    "🐦",
    "=1+1",
    "\u202eabc",
    "a,b",
]


@pytest.mark.parametrize("name", NAMES)
def test_odd_names_pass_through(name: str) -> None:
    """Markup, emoji, quotes and formulas are text like any other."""
    rows = [["item", name], [name, "1"]]
    table = table_from_bytes(as_csv(rows).encode(), "t.csv")
    assert (table.header[1], rows_of(table)[0][0]) == (name, name)
    assert table.find(name) == 1


cells = st.text(st.characters(codec="utf-8", exclude_characters="\r\x00"), max_size=6)


@given(st.lists(st.tuples(cells, cells, cells), min_size=1, max_size=8), st.sampled_from(",;\t|"))
@settings(max_examples=150, deadline=None)
def test_written_text_comes_back(rows: list[tuple[str, str, str]], delimiter: str) -> None:
    """Whatever is written as delimited text reads back to the letter, blank rows left out."""
    lines = [["h1", "h2", "h3"], *map(list, rows)]
    table = table_from_bytes(as_csv(lines, delimiter).encode(), "t.csv", delimiter=delimiter)
    kept = [(at, list(row)) for at, row in enumerate(rows, start=2) if any(c.strip() for c in row)]
    assert rows_of(table) == [row for _, row in kept]
    assert table.rows.tolist() == [at for at, _ in kept]


def workbook(sheets: dict[str, list[list[object]]]) -> bytes:
    """Return an .xlsx file."""
    book = Workbook()
    book.remove(book.active)
    for title, rows in sheets.items():
        sheet = book.create_sheet(title)
        for row in rows:
            sheet.append(row)
    buffer = io.BytesIO()
    book.save(buffer)
    return buffer.getvalue()


def test_the_sheet_and_the_header_row_that_fit_are_found() -> None:
    """A title above the header and a sheet of remarks do no harm, and are said."""
    data = workbook(
        {"read me": [["hello"]], "Calls": [["A title"], [], ["Clip ID", "call"], ["a", "x"]]}
    )
    table = table_from_bytes(data, "t.xlsx", wanted=("clip_id", "call"))
    assert (table.sheet, table.header, table.rows.tolist()) == ("Calls", ("Clip ID", "call"), [4])
    assert table.said == 't.xlsx: xlsx, sheet "Calls", header in row 3, 1 row'


@pytest.mark.parametrize(
    ("text", "number_format", "shown", "exact"),
    [
        ("7", "000", "007", True),
        ("-7", "000", "-007", True),
        ("1.5", "0.00", "1.50", True),
        ("0.5", "0%", "50%", True),
        ("1.25", "0.0", "1.25", False),
        ("1204", "#,##0", "1204", False),
        ("3", "General", "3", True),
        ("3", "@", "3", True),
    ],
)
def test_numbers_are_kept_as_the_sheet_shows_them(
    text: str, number_format: str, shown: str, exact: bool
) -> None:
    """Zeros of a plain format are kept; no digit that the cell holds is dropped."""
    assert shown_text(Cell("number", text, number_format)) == (shown, exact)


def test_parquet_keeps_texts_and_plain_numbers() -> None:
    """Whole floats lose their point, missing cells are empty, the first record is row 2."""
    data = {"item": ["007", "b"], "n": [1.0, None], "f": [True, False], "d": [1.25, 2.5]}
    buffer = io.BytesIO()
    pq.write_table(pa.table(data), buffer)
    table = table_from_bytes(buffer.getvalue(), "t.parquet")
    assert rows_of(table) == [["007", "1", "true", "1.25"], ["b", "", "false", "2.5"]]
    assert table.rows.tolist() == [2, 3]


def test_json_lines_keep_the_digits_of_numbers() -> None:
    """1.50 stays 1.50; a missing key and null are empty cells; blank lines count."""
    text = '{"item":"a","n":1.50}\n\n{"item":"b","m":null}\n' + json.dumps({"item": "c", "m": "x"})
    table = table_from_bytes(text.encode(), "t.jsonl")
    assert table.header == ("item", "n", "m")
    assert rows_of(table) == [["a", "1.50", ""], ["b", "", ""], ["c", "", "x"]]
    assert table.rows.tolist() == [1, 3, 4]


def test_the_digest_is_of_the_bytes() -> None:
    """The digest is SHA-256 of the file as it lies on disk, mark included."""
    data = "a,b\n1,2\n".encode("utf-8-sig")
    assert table_from_bytes(data, "t.csv").digest == hashlib.sha256(data).hexdigest()


def test_files_are_found_by_name_then_by_pattern(tmp_path: Path) -> None:
    """A name with brackets is a name; patterns are sorted, lock and hidden files passed over."""
    for name in ("b.csv", "a.csv", "l [v2].csv", "~$a.csv", ".b.csv"):
        (tmp_path / name).write_text("x\n")
    assert find_files(["l [v2].csv"], tmp_path) == (Path("l [v2].csv"),)
    assert [p.name for p in find_files(["*.csv", "a.csv"], tmp_path)] == [
        "a.csv",
        "b.csv",
        "l [v2].csv",
    ]
    assert find_files([str(tmp_path / "a.*")], tmp_path) == (tmp_path / "a.csv",)


def test_files_are_named_from_the_project_where_they_lie_in_it(tmp_path: Path) -> None:
    """A file elsewhere is named as it was given."""
    assert display_name(tmp_path / "labels" / "a.csv", tmp_path) == "labels/a.csv"
    assert display_name(Path("/elsewhere/a.csv"), tmp_path) == "/elsewhere/a.csv"


def test_columns_are_found_despite_case_and_underscores_but_never_two() -> None:
    """The letter-perfect header comes first, then the only loose one."""
    table = table_from_bytes(b"Clip ID,clip_id,Other-Name\n1,2,3\n", "t.csv")
    assert table.find("clip_id") == 1
    assert table.find("other name") == 2
    with pytest.raises(RelookError, match="fits 2 columns"):
        table.find("CLIP ID")
