"""The sheet that says what each label means."""

from __future__ import annotations

from dataclasses import replace

from openpyxl import Workbook
from openpyxl.worksheet.worksheet import Worksheet as OpenpyxlSheet

from relook.cells.writing import put_text
from relook.worksheet import layout, palette
from relook.worksheet.looks import Look, Looks
from relook.worksheet.model import (
    CANNOT_BE_CODED,
    SHEET_CODE_BOOK,
    CodeBookEntry,
    SheetVariable,
    Worksheet,
)
from relook.worksheet.page import set_height, set_up_page
from relook.worksheet.queue_rules import bounds_in_words

_WIDTHS = {"variable": 16.0, "label": 24.0, "meaning": 58.0, "example": 48.0, "part of": 18.0}


def write_code_book(book: Workbook, looks: Looks, worksheet: Worksheet) -> None:
    """Write the code book: variable, label, meaning, example and, for trees, the parent.

    Columns that nothing stands in are left out, so that a code book of bare labels is a plain list.
    """
    sheet = book.create_sheet(SHEET_CODE_BOOK)
    lines = [
        (variable, entry) for variable in worksheet.variables for entry in entries_of(variable)
    ]
    headers = ["variable"] if len(worksheet.variables) > 1 else []
    headers.append("label")
    headers += [
        header
        for header, used in (
            ("meaning", any(entry.meaning for _, entry in lines)),
            ("example", any(entry.example for _, entry in lines)),
            ("part of", any(entry.parent for _, entry in lines)),
        )
        if used
    ]
    head = Look(size=9, bold=True, colour=palette.GREY, down="bottom", below="medium")
    top = looks[replace(head, across="left", indent=1)]
    for column, header in enumerate(headers, start=1):
        put_text(sheet, 1, column, header, top)
        sheet.column_dimensions["ABCDE"[column - 1]].width = _WIDTHS[header]
    set_height(sheet, 1, 28)
    before = None
    for row, (variable, entry) in enumerate(lines, start=2):
        _write_line(sheet, looks, row, headers, variable, entry, repeats=variable is before)
        before = variable
    sheet.freeze_panes = "A2"
    set_up_page(sheet, f"{worksheet.title} · code book")


def entries_of(variable: SheetVariable) -> tuple[CodeBookEntry, ...]:
    """Return the lines of a variable: the code book's, then labels that it leaves out.

    Free numbers get one line that says their bounds; every variable ends with what to do where
    no label can be given.
    """
    known = {entry.label for entry in variable.code_book}
    lines = [
        *variable.code_book,
        *(CodeBookEntry(label=label) for label in variable.labels if label not in known),
    ]
    if variable.entry == "number" and not variable.code_book:
        bounds = bounds_in_words(variable.low, variable.high)
        lines.append(CodeBookEntry(label=f"a number{bounds}"))
    lines.append(CodeBookEntry(label=CANNOT_BE_CODED, meaning="No label can be given."))
    return tuple(lines)


def _write_line(
    sheet: OpenpyxlSheet,
    looks: Looks,
    row: int,
    headers: list[str],
    variable: SheetVariable,
    entry: CodeBookEntry,
    *,
    repeats: bool,
) -> None:
    colours = palette.label_colours(variable.labels, ordered=variable.ordered)
    texts = {
        "variable": variable.name,
        "label": entry.label,
        "meaning": entry.meaning,
        "example": entry.example,
        "part of": entry.parent,
    }
    base = Look(size=10.5, down="center", across="left", indent=1)
    looked = {
        "variable": replace(base, size=8 if repeats else 10, colour=palette.GREY),
        "label": replace(base, bold=True, fill=colours.get(entry.label)),
        "meaning": base,
        "example": replace(base, size=10, italic=True, colour=palette.GREY),
        "part of": replace(base, size=10, colour=palette.GREY),
    }
    height = 23.0
    for column, header in enumerate(headers, start=1):
        look = looked[header]
        put_text(sheet, row, column, texts[header], looks[look])
        needed = layout.text_height(texts[header], _WIDTHS[header] - 2, look.size) + 8
        height = max(height, needed * (1.05 if look.bold else 1.0))
    set_height(sheet, row, height)
