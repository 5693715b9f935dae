"""The first sheet: who, what to do, what to beware of, how far along."""

from __future__ import annotations

from openpyxl import Workbook
from openpyxl.utils import get_column_letter
from openpyxl.worksheet.worksheet import Worksheet as OpenpyxlSheet

from relook.cells.writing import put_text
from relook.worksheet import layout, palette
from relook.worksheet import start_words as words
from relook.worksheet.looks import Look, Looks
from relook.worksheet.model import FILLED_IN_BY, SHEET_START, Worksheet
from relook.worksheet.page import set_height, set_up_page

_MARGIN, _NAME, _TEXT = 3.0, 15.0, 82.0


def write_start(book: Workbook, looks: Looks, worksheet: Worksheet) -> None:
    """Write the first sheet.

    Parameters
    ----------
    book : openpyxl Workbook
    looks : Looks
        Of the same workbook.
    worksheet : Worksheet
    """
    sheet = book.create_sheet(SHEET_START, 0)
    for letter, width in zip("ABC", (_MARGIN, _NAME, _TEXT), strict=True):
        sheet.column_dimensions[letter].width = width
    page = _Page(sheet, looks)
    page.title(worksheet.title or words.TITLE[worksheet.purpose])
    page.line(words.occasion(worksheet), size=11, colour=palette.GREY)
    page.gap()
    page.pair("For", worksheet.adjudicator, strong=True)
    page.field(FILLED_IN_BY, "Your name, should you be somebody else than named above.")
    page.formula("Labelled" if worksheet.is_coding else "Decided", _progress(worksheet))
    page.gap()
    page.heading("What this is")
    page.paragraph(words.what_this_is(worksheet))
    page.heading("What to do")
    for number, step in enumerate(words.steps(worksheet), start=1):
        page.pair(f"{number}", step)
    page.heading("Good to know")
    for note in words.good_to_know(worksheet):
        page.pair("·", note)
    page.heading("Take care")
    for caution in words.CAUTIONS:
        page.pair("·", caution)
    footer = f"{worksheet.title} · {worksheet.occasion} · {worksheet.adjudicator}"
    set_up_page(sheet, footer, orientation="portrait", header_row=False)


def _progress(worksheet: Worksheet) -> str:
    """Return a formula that counts the rows with a decision.

    Lengths are counted, not cells: a cell with an empty text is none.
    """
    columns = layout.columns_of(worksheet)
    last = max(2, len(worksheet.rows) + 1)
    filled = [
        f"(LEN('{worksheet.fields_sheet}'!${letter}$2:${letter}${last})>0)"
        for letter, column in (
            (get_column_letter(n), column) for n, column in enumerate(columns, start=1)
        )
        if column.role in ("decision", "tick")
    ]
    total = len(worksheet.rows)
    return f'=SUMPRODUCT(--(({"+".join(filled)})>0))&" of {total}"'


class _Page:
    """Writes lines one below the other, each as high as its text."""

    def __init__(self, sheet: OpenpyxlSheet, looks: Looks) -> None:
        self._sheet = sheet
        self._looks = looks
        self._row = 1

    def title(self, text: str) -> None:
        self._row += 1
        look = self._looks[Look(size=20, bold=True, below=None, down="bottom", wrap=True)]
        self._merged(text, look, 20)

    def line(self, text: str, *, size: float, colour: str) -> None:
        self._merged(text, self._looks[Look(size=size, colour=colour, below=None)], size)

    def heading(self, text: str) -> None:
        self.gap(8)
        look = self._looks[Look(size=11, bold=True, below="thin", down="bottom", wrap=False)]
        put_text(self._sheet, self._row, 2, text, look)
        put_text(self._sheet, self._row, 3, "", look)
        self._height(22)
        self.gap(5)

    def paragraph(self, text: str) -> None:
        self._merged(text, self._looks[Look(size=11, below=None)], 11)

    def pair(self, name: str, text: str, *, strong: bool = False) -> None:
        grey = self._looks[Look(size=11, colour=palette.GREY, below=None, across="right", indent=1)]
        put_text(self._sheet, self._row, 2, name, grey)
        put_text(
            self._sheet, self._row, 3, text, self._looks[Look(size=11, bold=strong, below=None)]
        )
        self._height(max(18.0, layout.text_height(text, _TEXT, 11) + 5))

    def field(self, name: str, prompt: str) -> None:
        grey = self._looks[Look(size=11, colour=palette.GREY, below=None, across="right", indent=1)]
        put_text(self._sheet, self._row, 2, name, grey)
        look = self._looks[Look(size=11, fill=palette.FIELD, below="thin", above="thin")]
        put_text(self._sheet, self._row, 3, "", look)
        self._height(20)
        hint = self._looks[Look(size=9, colour=palette.GREY, below=None, wrap=False)]
        put_text(self._sheet, self._row, 3, prompt, hint)
        self._height(16)

    def formula(self, name: str, formula: str) -> None:
        grey = self._looks[Look(size=11, colour=palette.GREY, below=None, across="right", indent=1)]
        put_text(self._sheet, self._row, 2, name, grey)
        look = self._looks[Look(size=11, bold=True, below=None, number_format="General")]
        cell = put_text(self._sheet, self._row, 3, "", look)
        cell.value = formula
        self._height(18)

    def gap(self, height: float = 12) -> None:
        self._height(height)

    def _merged(self, text: str, look: object, size: float) -> None:
        """Write across both columns; nothing is sorted here, so merging does no harm."""
        put_text(self._sheet, self._row, 2, text, look)  # type: ignore[arg-type]
        self._sheet.merge_cells(
            start_row=self._row, end_row=self._row, start_column=2, end_column=3
        )
        self._height(layout.text_height(text, _NAME + _TEXT, size) + 6)

    def _height(self, points: float) -> None:
        set_height(self._sheet, self._row, points)
        self._row += 1
