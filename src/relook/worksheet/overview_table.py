"""Tables of the lead's overview: columns declared once, written and formatted alike."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

from openpyxl.utils import get_column_letter
from openpyxl.worksheet.worksheet import Worksheet as OpenpyxlSheet

from relook.cells.writing import put_text
from relook.worksheet import layout, palette
from relook.worksheet.looks import Look, Looks
from relook.worksheet.page import set_height, set_up_page

COUNT, FIGURE, PERCENT = "#,##0", "0.0000", "0.0%"
UNDEFINED = "–"


@dataclass(frozen=True, slots=True)
class TableColumn:
    """A column: its header, its width, and how its numbers are shown ("@" for text)."""

    header: str
    width: float
    shown_as: str = "@"
    bold: bool = False


Value = str | int | float | None


def write_table(
    sheet: OpenpyxlSheet,
    looks: Looks,
    columns: Sequence[TableColumn],
    rows: Sequence[Sequence[Value]],
    *,
    top: int = 1,
) -> int:
    """Write a table with its header in row `top`; return the row of its last line.

    A number keeps its full precision, only its display is rounded. None is written as a dash:
    undefined, which is neither zero nor one.
    """
    header = Look(size=9, bold=True, colour=palette.GREY, down="bottom", below="medium")
    # An indent keeps a text clear of the right-aligned number before it.
    text_header = looks[replace(header, across="left", indent=1)]
    number_header = looks[replace(header, across="right")]
    for at, column in enumerate(columns, start=1):
        look = text_header if column.shown_as == "@" else number_header
        put_text(sheet, top, at, column.header, look)
        letter = get_column_letter(at)
        sheet.column_dimensions[letter].width = max(
            column.width, float(sheet.column_dimensions[letter].width) if top > 1 else 0.0
        )
    lines = max(
        (layout.wrapped_lines(column.header, column.width * 0.9) for column in columns), default=1
    )
    set_height(sheet, top, 12.0 * lines + 12)
    for number, row in enumerate(rows, start=top + 1):
        height = 18.0
        for at, (column, value) in enumerate(zip(columns, row, strict=True), start=1):
            height = max(height, write_value(sheet, looks, number, at, column, value))
        set_height(sheet, number, height)
    return top + len(rows)


def write_value(
    sheet: OpenpyxlSheet,
    looks: Looks,
    row: int,
    at: int,
    column: TableColumn,
    value: Value,
) -> float:
    """Write one value and return the height that it needs, in points."""
    if isinstance(value, str) or column.shown_as == "@":
        text = "" if value is None else str(value)
        look = Look(
            size=10,
            bold=column.bold,
            down="center",
            across="left",
            indent=1,
            quoted=text[:1] in ("=", "+", "-", "@"),
        )
        put_text(sheet, row, at, text, looks[look])
        return layout.text_height(text, column.width - 2, 10) + 6 if text else 0.0
    if value is None:
        look = Look(size=10, colour=palette.GREY, across="right", down="center")
        put_text(sheet, row, at, UNDEFINED, looks[look])
        return 0.0
    shown_as = COUNT if isinstance(value, int) else column.shown_as
    look = Look(size=10, bold=column.bold, across="right", down="center", number_format=shown_as)
    cell = put_text(sheet, row, at, "", looks[look])
    # numpy's numbers are no Python numbers to every writer.
    cell.value = int(value) if isinstance(value, int) else float(value)
    return 0.0


def finish(sheet: OpenpyxlSheet, footer: str, *, freeze: str | None = "A2") -> None:
    """Set the view and the printing of a sheet of the overview."""
    if freeze:
        sheet.freeze_panes = freeze
    set_up_page(sheet, footer, header_row=freeze is not None)


def write_note(
    sheet: OpenpyxlSheet,
    looks: Looks,
    row: int,
    text: str,
    span: tuple[int, int],
    *,
    size: float = 9,
) -> None:
    """Write a sentence across several columns, the first and the last of which are given."""
    look = looks[Look(size=size, colour=palette.GREY, below=None, across="left", indent=1)]
    put_text(sheet, row, span[0], text, look)
    sheet.merge_cells(start_row=row, end_row=row, start_column=span[0], end_column=span[1])
    width = sum(
        sheet.column_dimensions[get_column_letter(at)].width for at in range(span[0], span[1] + 1)
    )
    # Words break earlier in merged cells than their letters alone would tell.
    height = layout.text_height(text, width - 6, size) + 8
    set_height(sheet, row, height)
