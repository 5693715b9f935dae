"""Reading spreadsheet files: typed cells, held to openpyxl's on honest files."""

from __future__ import annotations

import io
import zipfile
from datetime import date, datetime, time

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from openpyxl import Workbook, load_workbook
from openpyxl.packaging.custom import StringProperty

from relook.cells.limits import column_letters
from relook.cells.model import EMPTY, Cell
from relook.cells.opening import open_book
from relook.errors import RelookError


def saved(book: Workbook) -> bytes:
    out = io.BytesIO()
    book.save(out)
    return out.getvalue()


def one_cell(value: object, number_format: str | None = None) -> Cell:
    book = Workbook()
    cell = book.active["A1"]
    cell.value = value
    if number_format is not None:
        cell.number_format = number_format
    return open_book(saved(book), "a.xlsx").sheets[0].rows[0][0]


@pytest.mark.parametrize(
    ("value", "number_format", "kind", "text"),
    [
        ("late", None, "text", "late"),
        ("007", "@", "text", "007"),
        ("a\nb", None, "text", "a\nb"),
        (3, None, "number", "3"),
        (3.0, None, "number", "3"),
        (0.1, None, "number", "0.1"),
        (-2.5, None, "number", "-2.5"),
        (1e22, None, "number", "1e+22"),
        (0.5, "0%", "number", "0.5"),
        (True, None, "bool", "TRUE"),
        (False, None, "bool", "FALSE"),
        (datetime.fromisoformat("2024-01-02"), None, "date", "2024-01-02"),
        (datetime.fromisoformat("2024-01-02T03:04:05"), None, "date", "2024-01-02T03:04:05"),
        (date(2024, 1, 2), None, "date", "2024-01-02"),
        (time(3, 4), None, "date", "03:04:00"),
        ("#N/A", None, "error", "#N/A"),
        ("=1+1", None, "formula", "=1+1"),
        ("=TRUE()", None, "bool", "TRUE"),
    ],
)
def test_kind_and_text(value: object, number_format: str | None, kind: str, text: str) -> None:
    """Every kind of cell comes back as what it is, in its shortest exact text."""
    cell = one_cell(value, number_format)
    assert (cell.kind, cell.text) == (kind, text)


def test_number_format_is_kept() -> None:
    """A percentage can be told from a plain fraction."""
    assert one_cell(0.5, "0%").number_format == "0%"


def test_cached_value_of_a_formula() -> None:
    """The value that the file stores for a formula is read beside the formula."""
    data = saved_with_sheet('<row r="1"><c r="A1"><f>1+1</f><v>2</v></c></row>')
    assert open_book(data, "a.xlsx").sheets[0].rows[0][0] == Cell("formula", "=1+1", "General", "2")


def saved_with_sheet(rows: str, after: str = "") -> bytes:
    """Return a workbook whose one sheet holds the given row elements."""
    source = zipfile.ZipFile(io.BytesIO(saved(Workbook())))
    main = "http://schemas.openxmlformats.org/spreadsheetml/2006/main"
    sheet = f'<worksheet xmlns="{main}"><sheetData>{rows}</sheetData>{after}</worksheet>'
    out = io.BytesIO()
    with zipfile.ZipFile(out, "w", zipfile.ZIP_DEFLATED) as target:
        for info in source.infolist():
            part = source.read(info.filename)
            target.writestr(info.filename, sheet if info.filename.endswith("sheet1.xml") else part)
    return out.getvalue()


@pytest.mark.parametrize(
    ("rows", "expected"),
    [
        ("<row><c><v>1</v></c><c><v>2</v></c></row>", [["1", "2"]]),
        ('<row r="2"><c r="B2"><v>1</v></c></row>', [[], ["", "1"]]),
        ('<row r="1"><c r="A1" t="inlineStr"><is><t>a</t><t>b</t></is></c></row>', [["ab"]]),
        (
            '<row r="1"><c r="A1" t="inlineStr"><is><t>a</t><rPh><t>x</t></rPh><t>b</t></is></c></row>',
            [["ab"]],
        ),
        ('<row r="1"><c r="A1" t="str"><v>a_x000A_b</v></c></row>', [["a\nb"]]),
        ('<row r="1"><c r="A1" t="str"><v>_x005F_x000A_</v></c></row>', [["_x000A_"]]),
        ('<row r="1"><c r="A1" t="b"><v>1</v></c></row>', [["TRUE"]]),
        ('<row r="1"><c r="A1" t="e"><v>#REF!</v></c></row>', [["#REF!"]]),
        ('<row r="1"><c r="A1" t="d"><v>2024-01-02T00:00:00</v></c></row>', [["2024-01-02"]]),
        ('<row r="1"><c r="A1" s="0"/><c r="XFD1"/></row>', []),
        ('<row r="1"><c r="A1"><v>1E5</v></c></row>', [["100000"]]),
        ('<row r="1"><c r="A1"><v>12345678901234567890</v></c></row>', [["12345678901234567890"]]),
    ],
)
def test_ways_to_store_a_cell(rows: str, expected: list[list[str]]) -> None:
    """References may be left out, texts stored in line, characters escaped, empty cells styled."""
    sheet = open_book(saved_with_sheet(rows), "a.xlsx").sheets[0]
    assert [[cell.text for cell in row] for row in sheet.rows] == expected


def test_merged_ranges() -> None:
    """A merged range has its value in its first cell, and is named."""
    book = Workbook()
    book.active["A2"] = "m"
    book.active.merge_cells("A2:B4")
    sheet = open_book(saved(book), "a.xlsx").sheets[0]
    assert sheet.merged == ((2, 1, 4, 2),)
    assert [[cell.text for cell in row] for row in sheet.rows] == [[], ["m"]]


def test_sheets_properties_and_time_of_saving() -> None:
    """Titles, hidden sheets and custom properties are kept; so is when the file was saved."""
    book = Workbook()
    book.active.title = "One & two"
    book.create_sheet("gone").sheet_state = "veryHidden"
    book.custom_doc_props.append(StringProperty(name="relook project", value="k7"))
    read = open_book(saved(book), "a.xlsx")
    assert [(sheet.title, sheet.hidden) for sheet in read.sheets] == [
        ("One & two", False),
        ("gone", True),
    ]
    assert read.properties["relook project"] == "k7"
    assert read.modified.endswith("Z")


CELLS = st.one_of(
    st.none(),
    st.text(
        st.characters(
            codec="utf-8", exclude_categories=("Cs", "Cc"), exclude_characters="_\ufffe\uffff"
        ),
        min_size=1,
        max_size=12,
    ).filter(lambda text: not text.startswith(("=", "#"))),
    st.integers(-(10**15), 10**15),
    st.floats(-1e300, 1e300),
    st.booleans(),
)


@settings(max_examples=60, deadline=None)
@given(st.lists(st.lists(CELLS, max_size=5), max_size=6))
def test_same_as_openpyxl(table: list[list[object]]) -> None:
    """On any honest table, the cells are those that openpyxl reads."""
    book = Workbook()
    for row in table:
        book.active.append(row)
    data = saved(book)
    ours = open_book(data, "a.xlsx").sheets[0].rows
    sheet = load_workbook(io.BytesIO(data)).active
    for row in sheet.iter_rows():
        for theirs in row:
            held = ours[theirs.row - 1] if theirs.row <= len(ours) else ()
            cell = held[theirs.column - 1] if theirs.column <= len(held) else EMPTY
            assert cell.text == _text(theirs.value)


def _text(value: object) -> str:
    if value is None:
        return ""
    if isinstance(value, bool):
        return str(value).upper()
    if isinstance(value, float):
        return str(int(value)) if value.is_integer() and abs(value) < 1e15 else repr(value)
    return str(value)


def test_csv_says_what_it_was_taken_for() -> None:
    """Encoding and delimiter of a CSV file are guessed, and the guess is said."""
    book = open_book("a;b\n1,5;ü\n".encode("cp1252"), "a.csv")
    assert [[cell.text for cell in row] for row in book.sheets[0].rows] == [
        ["a", "b"],
        ["1,5", "ü"],
    ]
    assert book.notes == ("read as cp1252, delimiter semicolon",)


@pytest.mark.parametrize("encoding", ["utf-8", "utf-8-sig", "utf-16"])
def test_csv_encodings(encoding: str) -> None:
    """Marks of byte order are no part of the first header."""
    book = open_book("a,b\nö,2\n".encode(encoding), "a.csv")
    assert book.sheets[0].rows[0][0].text == "a"
    assert book.sheets[0].rows[1][0].text == "ö"


def test_csv_rows_are_those_of_a_spreadsheet() -> None:
    """A line break within quotes opens no row, an empty line is one, and Excel's `sep=` too."""
    book = open_book(b'sep=;\na;b\n"x\ny";1\n\nz;2\n', "a.csv")
    assert [[cell.text for cell in row] for row in book.sheets[0].rows] == [
        [],
        ["a", "b"],
        ["x\ny", "1"],
        [],
        ["z", "2"],
    ]


def test_csv_with_an_open_quote_is_named() -> None:
    """A cell that never ends is told with its row."""
    with pytest.raises(RelookError, match="cannot be read as CSV") as caught:
        open_book(b'a,b\n1,"' + b"x" * 200_000, "a.csv")
    assert caught.value.where is not None
    assert caught.value.where.row == 2


@pytest.mark.parametrize(("number", "letters"), [(1, "A"), (26, "Z"), (27, "AA"), (16384, "XFD")])
def test_column_letters(number: int, letters: str) -> None:
    """Columns are named as spreadsheet programs name them."""
    assert column_letters(number) == letters
