"""What people wrote in a returned workbook where no decision is read from.

Adjudicators pin comments to cells, write below the table, add a sheet, or put another name on the
first one. None of it is a decision and none of it is taken, so all of it is told.
"""

from __future__ import annotations

from collections.abc import Collection, Iterable

from relook.cells.limits import column_letters
from relook.cells.model import Book, Sheet
from relook.errors import Place, Problem
from relook.worksheet.matching import folded
from relook.worksheet.model import FILLED_IN_BY, SHEET_CODE_BOOK, SHEET_LISTS, SHEET_START

_OURS = (SHEET_START, SHEET_CODE_BOOK, SHEET_LISTS)
_LONGEST_SHOWN = 160
#: Texts beside one table that are quoted; more are counted.
_MOST_QUOTED = 10
_TO_THE_NOTES = "write it into the row's note, if it should stay with the row"


def comments(book: Book) -> list[Problem]:
    """Return a note for each comment that is pinned to a cell of any sheet."""
    return _bounded(
        Problem(
            f'a comment on a cell is not taken: "{_shown(text)}"',
            Place(book.file, sheet.title or None, row, column_letters(column)),
            _TO_THE_NOTES,
            "note",
        )
        for sheet in book.sheets
        for row, column, text in sheet.comments
    )


def beside_table(
    sheet: Sheet, file: str, *, header_row: int, columns: Collection[int], rows: Collection[int]
) -> list[Problem]:
    """Return a note for each text below a table or to the right of it.

    Parameters
    ----------
    sheet : Sheet
    file : str
    header_row : int
        Index of the header row; what stands above it is passed over.
    columns : collection of int
        Indices of the columns with a header.
    rows : collection of int
        Indices of the rows of the table.
    """
    return _bounded(
        Problem(
            f'a text outside the table is not taken: "{_shown(cell.text)}"',
            Place(file, sheet.title or None, number + 1, column_letters(index + 1)),
            _TO_THE_NOTES,
            "note",
        )
        for number, cells in enumerate(sheet.rows)
        if number > header_row
        for index, cell in enumerate(cells)
        if cell.kind != "empty" and cell.text.strip()
        if number not in rows or index not in columns
    )


def other_sheets(book: Book, queues: Collection[Sheet]) -> list[Problem]:
    """Return a note for each sheet that was not sent, and for another name on the first one."""
    found = []
    for sheet in book.sheets:
        if sheet in queues or not any(sheet.rows):
            continue
        if sheet.title not in _OURS:
            said = f'the sheet "{sheet.title}" was not sent with the worksheet and is not read'
            found.append(Problem(said, Place(book.file), _TO_THE_NOTES, "note"))
        name = _filled_in_by(sheet)
        if name:
            found.append(
                Problem(
                    f'the sheet says "{FILLED_IN_BY}" {_shown(name)}; the rows are recorded '
                    "as those of the person it was written for",
                    Place(book.file, sheet.title),
                    "name whoever decides by --adjudicator, when the next round is queued",
                    "note",
                )
            )
    return found


def _filled_in_by(sheet: Sheet) -> str:
    for row in sheet.rows[:50]:
        for index, cell in enumerate(row[:-1]):
            if folded(cell.text) == folded(FILLED_IN_BY):
                return row[index + 1].text.strip()
    return ""


def _bounded(problems: Iterable[Problem]) -> list[Problem]:
    every = list(problems)
    left = len(every) - _MOST_QUOTED
    if left <= 0:
        return every
    last = every[_MOST_QUOTED - 1]
    more = Problem(f"… and {left:,} more such texts", last.where, severity="note")
    return [*every[:_MOST_QUOTED], more]


def _shown(text: str) -> str:
    one_line = " ".join(text.split())
    short = len(one_line) <= _LONGEST_SHOWN
    return one_line if short else f"{one_line[: _LONGEST_SHOWN - 1]}…"
