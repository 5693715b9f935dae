"""Reading .ods files: kinds of cells, repeats, protected spaces."""

from __future__ import annotations

import pytest

from reference.ods_files import ods, row, text
from relook.cells.model import Cell
from relook.cells.opening import open_book
from relook.errors import RelookError


def rows_of(data: bytes) -> list[list[str]]:
    return [[cell.text for cell in cells] for cells in open_book(data, "a.ods").sheets[0].rows]


@pytest.mark.parametrize(
    ("cell", "expected"),
    [
        ('office:value-type="float" office:value="3"', Cell("number", "3")),
        ('office:value-type="float" office:value="0.5"', Cell("number", "0.5")),
        ('office:value-type="percentage" office:value="0.5"', Cell("number", "0.5", "0%")),
        ('office:value-type="boolean" office:boolean-value="true"', Cell("bool", "TRUE")),
        (
            'office:value-type="date" office:date-value="2024-01-02"',
            Cell("date", "2024-01-02", "yyyy-mm-dd"),
        ),
        (
            'office:value-type="time" office:time-value="PT03H04M00S"',
            Cell("date", "03:04:00", "hh:mm:ss"),
        ),
        (
            'table:formula="of:=TRUE()" office:value-type="float" office:value="1"',
            Cell("bool", "TRUE"),
        ),
        (
            'table:formula="of:=1+1" office:value-type="float" office:value="2"',
            Cell("formula", "=1+1", "", "2"),
        ),
        (
            'table:formula="of:=#N/A" office:value-type="string" calcext:value-type="error"',
            Cell("error", "#N/A"),
        ),
    ],
)
def test_kinds(cell: str, expected: Cell) -> None:
    """Every kind of cell comes back as what it is."""
    data = ods(row(f"<table:table-cell {cell}><text:p>shown</text:p></table:table-cell>"))
    assert open_book(data, "a.ods").sheets[0].rows[0][0] == expected


def test_repeats_are_unfolded() -> None:
    """Repeated cells and rows are as many as they say; empty ones at the end are none."""
    data = ods(
        row(
            text("a", 'table:number-columns-repeated="2"'),
            attributes='table:number-rows-repeated="2"',
        )
        + row("<table:table-cell/>", attributes='table:number-rows-repeated="3"')
        + row('<table:table-cell table:number-columns-repeated="2"/>', text("b"))
        + row("<table:table-cell/>", attributes='table:number-rows-repeated="1048000"')
    )
    assert rows_of(data) == [["a", "a"], ["a", "a"], [], [], [], ["", "", "b"]]


def test_spaces_breaks_and_asides() -> None:
    """Spaces collapse unless protected, paragraphs are lines, comments are no text."""
    cell = (
        '<table:table-cell office:value-type="string">'
        "<office:annotation><text:p>a comment</text:p></office:annotation>"
        '<text:p>one \n  two<text:s text:c="3"/>three<text:tab/>four</text:p>'
        "<text:p>five<text:line-break/><text:span>six</text:span></text:p></table:table-cell>"
    )
    assert rows_of(ods(row(cell))) == [["one two   three\tfour\nfive\nsix"]]


def test_spans_are_merged_ranges() -> None:
    """A spanning cell and those that it covers are one merged range."""
    data = ods(
        row(text("m", 'table:number-rows-spanned="2" table:number-columns-spanned="1"'), text("x"))
        + row("<table:covered-table-cell/>", text("y"))
    )
    assert open_book(data, "a.ods").sheets[0].merged == ((1, 1, 2, 1),)
    assert rows_of(data) == [["m", "x"], ["", "y"]]


def test_custom_properties() -> None:
    """The worksheet's identity is read from the document's own properties."""
    meta = '<office:meta><meta:user-defined meta:name="relook project">k7</meta:user-defined></office:meta>'
    assert open_book(ods(row(text("a")), meta=meta), "a.ods").properties == {"relook project": "k7"}


@pytest.mark.parametrize(
    "rows",
    [
        row(text("a"), attributes='table:number-rows-repeated="1000000"'),
        row(text("a", 'table:number-columns-repeated="16384"')),
        row("<table:table-cell/>", attributes='table:number-rows-repeated="900000"')
        + row(text("a")),
        row(
            text("a", 'table:number-columns-repeated="4000"'),
            attributes='table:number-rows-repeated="9000"',
        ),
        row(text("a", 'table:number-columns-repeated="0"')),
        row(text("a", 'table:number-columns-repeated="x"')),
    ],
)
def test_unfolding_is_bounded(rows: str) -> None:
    """Repeats that unfold into millions of cells, and repeats that are no numbers, are refused."""
    with pytest.raises(RelookError):
        open_book(ods(rows), "a.ods")


def test_comments_are_kept_apart_from_the_text_of_their_cell() -> None:
    """With row and column; date and author are no part of them, and none is an empty one."""
    note = (
        "<office:annotation><dc:creator>Ada</dc:creator><dc:date>2031-02-01</dc:date>"
        "<text:p>not <text:span>sure</text:span></text:p><text:p>at all</text:p>"
        "</office:annotation>"
    ).replace("dc:", "meta:")
    empty = "<office:annotation><text:p/></office:annotation>"
    data = ods(
        row(text("a", 'table:number-columns-repeated="2"'))
        + row("<table:table-cell/>", attributes='table:number-rows-repeated="3"')
        + row(
            text("b"),
            f"<table:table-cell>{note}</table:table-cell>",
            f'<table:table-cell office:value-type="string">{empty}<text:p>c</text:p>'
            "</table:table-cell>",
        )
    )
    (sheet,) = open_book(data, "a.ods").sheets
    assert sheet.comments == ((5, 2, "not sure\nat all"),)
    assert [cell.text for cell in sheet.rows[4]] == ["b", "", "c"]
