"""Finding the queue in a returned workbook, whatever was done to it."""

from __future__ import annotations

import pytest
from openpyxl import Workbook

from reference.small_project import (
    PROJECT_ID,
    THEMES,
    column,
    edited,
    fill,
    header_row,
    make_worksheet,
    queue_of,
)
from relook.cells.model import Book, Cell, Sheet
from relook.cells.opening import open_book
from relook.errors import RelookError
from relook.worksheet.read import ReturnedWorksheet, read_worksheet
from relook.worksheet.write import write_worksheet

SENT = make_worksheet()
FILLED = fill(write_worksheet(SENT), {0: "delay", 3: "price"})


def read(data: bytes) -> ReturnedWorksheet:
    return read_worksheet(open_book(data, "a.xlsx"))


def decisions(data: bytes) -> dict[str, str]:
    return {row.key: row.decision.text for row in read(data).rows if row.decision.text}


EXPECTED = {SENT.rows[0].key: "delay", SENT.rows[3].key: "price"}


def test_as_it_was_sent() -> None:
    """Rows, identity and places of an untouched file."""
    found = read(FILLED)
    assert (found.project, found.worksheet) == (PROJECT_ID, SENT.id)
    assert [row.key for row in found.rows] == [row.key for row in SENT.rows]
    first = found.rows[0]
    assert (first.sheet, first.row, first.decision_column) == ("Queue", 2, "G")
    assert first.evidence["item"] == "remark 01"
    assert decisions(FILLED) == EXPECTED


def _rename(book: Workbook) -> None:
    queue_of(book).title = "Ada's own"


def _insert_rows(book: Workbook) -> None:
    queue_of(book).insert_rows(1, 3)
    queue_of(book)["A1"] = "To do by Friday"


def _insert_column(book: Workbook) -> None:
    sheet = queue_of(book)
    sheet.insert_cols(2)
    sheet.cell(header_row(sheet), 2).value = "mine"


def _swap_columns(book: Workbook) -> None:
    sheet = queue_of(book)
    sheet.move_range(f"A1:A{sheet.max_row}", cols=20)


def _sort_with_header(book: Workbook) -> None:
    sheet = queue_of(book)
    rows = [[cell.value for cell in row] for row in sheet.iter_rows()]
    for number, row in enumerate([*rows[3:], *rows[:3]], start=1):
        for at, value in enumerate(row, start=1):
            sheet.cell(number, at).value = value


def _drop_others(book: Workbook) -> None:
    for title in list(book.sheetnames):
        if title != "Queue":
            del book[title]


def _capitals(book: Workbook) -> None:
    sheet = queue_of(book)
    for cell in sheet[header_row(sheet)]:
        cell.value = f" {str(cell.value).upper()} "


def _lower_keys(book: Workbook) -> None:
    sheet = queue_of(book)
    for number in range(2, sheet.max_row + 1):
        sheet.cell(number, 1).value = str(sheet.cell(number, 1).value).lower().replace("-", "")


def _key_header_gone(book: Workbook) -> None:
    sheet = queue_of(book)
    sheet.cell(header_row(sheet), 1).value = None


def _repeat_header(book: Workbook) -> None:
    sheet = queue_of(book)
    sheet.append([cell.value for cell in sheet[header_row(sheet)]])


@pytest.mark.parametrize(
    "change",
    [
        _rename,
        _insert_rows,
        _insert_column,
        _swap_columns,
        _sort_with_header,
        _drop_others,
        _capitals,
        _lower_keys,
        _key_header_gone,
        _repeat_header,
    ],
)
def test_decisions_are_found(change: object) -> None:
    """Sheets renamed or deleted, rows and columns moved, a header in another place: all found."""
    assert decisions(edited(FILLED, change)) == EXPECTED  # type: ignore[arg-type]


def test_places_move_with_the_rows() -> None:
    """Messages name the row and column that the person sees."""
    moved = edited(edited(FILLED, _insert_rows), _insert_column)
    first = {row.key: row for row in read(moved).rows}[SENT.rows[0].key]
    assert (first.row, first.decision_column) == (5, "H")


def test_identity_without_properties() -> None:
    """The hidden sheet tells whose worksheet it is where the properties were dropped."""

    def drop(book: Workbook) -> None:
        for name in list(book.custom_doc_props.names):
            del book.custom_doc_props[name]

    assert read(edited(FILLED, drop)).worksheet == SENT.id


def test_copied_sheet() -> None:
    """The rows of a copied sheet are read too, and tell which sheet they are on."""
    found = read(edited(FILLED, lambda book: book.copy_worksheet(queue_of(book))))
    assert {row.sheet for row in found.rows} == {"Queue", "Queue Copy"}
    assert len(found.rows) == 2 * len(SENT.rows)


def test_merged_decisions_are_told() -> None:
    """A cell merged into the one above says so."""

    def merge(book: Workbook) -> None:
        sheet = queue_of(book)
        at = column(sheet, "decision")
        sheet.merge_cells(start_row=2, end_row=4, start_column=at, end_column=at)

    assert [row.merged_into for row in read(edited(FILLED, merge)).rows[:4]] == ["", "G2", "G2", ""]


def test_ticks_are_read() -> None:
    """Marks under the labels of a set are read by their headers."""
    data = fill(write_worksheet(make_worksheet(variables=(THEMES,))), {0: "x"}, header="has noise")
    assert read(data).rows[0].ticked == ("noise",)


def test_missing_decision_column_names_the_nearest() -> None:
    """A renamed column is asked for by its name."""

    def rename(book: Workbook) -> None:
        sheet = queue_of(book)
        sheet.cell(header_row(sheet), column(sheet, "decision")).value = "decisions"

    with pytest.raises(RelookError, match='no column is called "decision"') as caught:
        read(edited(FILLED, rename))
    assert caught.value.mend == 'rename the column "decisions" to "decision"'


def test_two_filled_decision_columns_are_refused() -> None:
    """Which of two decision columns holds is not guessed."""

    def double(book: Workbook) -> None:
        sheet = queue_of(book)
        at = sheet.max_column + 1
        sheet.cell(header_row(sheet), at).value = "decision"
        sheet.cell(header_row(sheet) + 1, at).value = "staff"

    with pytest.raises(RelookError, match='2 columns are called "decision": G, J'):
        read(edited(FILLED, double))


def test_no_queue_at_all() -> None:
    """A workbook without a queue is told so, with its sheets."""
    with pytest.raises(RelookError, match='no sheet has the columns "row code" and "decision"'):
        read(edited(FILLED, lambda book: book.remove(queue_of(book))))


def test_newer_format() -> None:
    """A worksheet of a newer version is left to that version."""
    book = Book(
        "a.xlsx", "xlsx", (Sheet("Queue", ((Cell("text", "a"),),)),), {"relook format": "2"}
    )
    with pytest.raises(RelookError, match="newer relook"):
        read_worksheet(book)
