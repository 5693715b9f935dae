"""The sheet that an adjudicator works through: evidence on the left, fields on the right."""

from __future__ import annotations

from openpyxl import Workbook
from openpyxl.utils import get_column_letter
from openpyxl.worksheet.worksheet import Worksheet as OpenpyxlSheet

from relook.cells.writing import MOST_LINKS, is_web_link, put_text
from relook.worksheet import layout, palette
from relook.worksheet.layout import Column, cell_text
from relook.worksheet.lists_sheet import Lists
from relook.worksheet.looks import Look, Looks
from relook.worksheet.model import SheetRow, Worksheet
from relook.worksheet.page import set_height, set_up_page
from relook.worksheet.queue_looks import RowStyles
from relook.worksheet.queue_rules import add_rules

_PADDING = 8.0  # points above and below the text of a row together
_LEAST_HEIGHT = 23.0


def write_queue(book: Workbook, looks: Looks, worksheet: Worksheet, lists: Lists) -> None:
    """Write the queue sheet.

    Parameters
    ----------
    book : openpyxl Workbook
    looks : Looks
        Of the same workbook.
    worksheet : Worksheet
    lists : Lists
        Where the dropdowns' lists are.
    """
    sheet = book.create_sheet(worksheet.fields_sheet)
    columns = layout.columns_of(worksheet)
    _write_header(sheet, looks, columns)
    _write_rows(sheet, looks, worksheet, columns)
    last = max(2, len(worksheet.rows) + 1)
    add_rules(sheet, worksheet, columns, lists, last)
    _set_up_view(sheet, columns, last)
    set_up_page(sheet, f"{worksheet.title} · {worksheet.occasion} · {worksheet.adjudicator}")


def _write_header(sheet: OpenpyxlSheet, looks: Looks, columns: tuple[Column, ...]) -> None:
    evidence = looks[Look(size=9, bold=True, colour=palette.GREY, down="bottom", below="medium")]
    field = looks[Look(size=9, bold=True, fill=palette.FIELD, down="bottom", below="medium")]
    height = 0.0
    for number, column in enumerate(columns, start=1):
        put_text(sheet, 1, number, column.header, evidence if column.is_read else field)
        sheet.column_dimensions[get_column_letter(number)].width = column.width
        # The filter's button takes some of the width.
        height = max(height, layout.text_height(column.header, column.width - 3, 9) * 1.1)
    set_height(sheet, 1, min(120.0, max(28.0, height + 12)))


def _write_rows(
    sheet: OpenpyxlSheet, looks: Looks, worksheet: Worksheet, columns: tuple[Column, ...]
) -> None:
    styles = RowStyles(looks, worksheet)
    coders = layout.coder_columns(worksheet.rows)
    known: dict[tuple[str, float, float], float] = {}  # labels recur, items repeat their text
    links_left = MOST_LINKS
    before: SheetRow | None = None
    for number, row in enumerate(worksheet.rows, start=2):
        repeats = before is not None and before.item == row.item and before.shown == row.shown
        tallest = 0.0
        for at, column in enumerate(columns, start=1):
            text = cell_text(row, column, coders)
            look, size = styles.of(row, column, text, repeats)
            cell = put_text(sheet, number, at, text, look)
            if not text:
                continue
            if column.role == "shown" and links_left and is_web_link(text):
                cell.hyperlink = text
                links_left -= 1
            if column.role == "key":
                continue  # one short line, never wrapped
            measured = (text, column.width, size)
            height = known.get(measured)
            if height is None:
                # The indents of some columns take a little of the width.
                height = known[measured] = layout.text_height(text, column.width - 1, size)
            if repeats and column.role == "shown":
                height = min(height, layout.MOST_REPEAT_LINES * layout.line_height(size))
            tallest = max(tallest, height)
        set_height(sheet, number, max(_LEAST_HEIGHT, tallest + _PADDING))
        before = row


def _set_up_view(sheet: OpenpyxlSheet, columns: tuple[Column, ...], last: int) -> None:
    """Freeze the header and the item's name, and start in the first cell to fill in."""
    sheet.freeze_panes = "C2"
    sheet.auto_filter.ref = f"A1:{get_column_letter(len(columns))}{last}"
    first = next(n for n, column in enumerate(columns, start=1) if not column.is_read)
    where = f"{get_column_letter(first)}2"
    for selection in sheet.sheet_view.selection:
        if selection.pane in (None, "bottomRight"):
            selection.activeCell = selection.sqref = where
