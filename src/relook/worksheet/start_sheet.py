"""The first sheet: who, what to do, what to beware of, how far along."""

from __future__ import annotations

from collections.abc import Sequence

from openpyxl import Workbook
from openpyxl.utils import get_column_letter
from openpyxl.worksheet.worksheet import Worksheet as OpenpyxlSheet

from relook.cells.writing import put_text
from relook.worksheet import layout, palette
from relook.worksheet.looks import Look, Looks
from relook.worksheet.model import (
    CANNOT_BE_CODED,
    SHEET_CODE_BOOK,
    SHEET_QUEUE,
    SHEET_START,
    TICK,
    WITHDRAW,
    SheetVariable,
    Worksheet,
)
from relook.worksheet.page import set_height, set_up_page
from relook.worksheet.queue_rules import bounds_in_words

_MARGIN, _NAME, _TEXT = 3.0, 15.0, 82.0
FILLED_IN_BY = "Filled in by"
_CAUTIONS = (
    (
        "Some of what you will read may be upsetting. Take breaks, skip a row whenever you need "
        "to, and tell whoever sent you this sheet if it is too much: nobody expects you to go on."
    ),
    (
        "What you read may be private. Keep this file to yourself, and delete it once you have "
        "sent it back."
    ),
    (
        "If a decision could touch somebody's health, safety or legal position, local rules and "
        "licensed practice come first. This sheet settles labels for a study; it is no finding "
        "about a person."
    ),
)


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
    page.title(worksheet.title or "A second look")
    page.line(f"Second look, round {worksheet.round}", size=11, colour=palette.GREY)
    page.gap()
    page.pair("For", worksheet.adjudicator, strong=True)
    page.field(FILLED_IN_BY, "Your name, should you be somebody else than named above.")
    page.formula("Decided", _progress(worksheet))
    page.gap()
    page.heading("What this is")
    page.paragraph(_what_this_is(worksheet))
    page.heading("What to do")
    for number, step in enumerate(_steps(worksheet), start=1):
        page.pair(f"{number}", step)
    page.heading("Good to know")
    for note in _good_to_know(worksheet):
        page.pair("·", note)
    page.heading("Take care")
    for caution in _CAUTIONS:
        page.pair("·", caution)
    footer = f"{worksheet.title} · round {worksheet.round} · {worksheet.adjudicator}"
    set_up_page(sheet, footer, orientation="portrait", header_row=False)


def _progress(worksheet: Worksheet) -> str:
    """Return a formula that counts the rows with a decision.

    Lengths are counted, not cells: a cell with an empty text is none.
    """
    columns = layout.columns_of(worksheet)
    last = max(2, len(worksheet.rows) + 1)
    filled = [
        f"(LEN('{SHEET_QUEUE}'!${letter}$2:${letter}${last})>0)"
        for letter, column in (
            (get_column_letter(n), column) for n, column in enumerate(columns, start=1)
        )
        if column.role in ("decision", "tick")
    ]
    total = len(worksheet.rows)
    return f'=SUMPRODUCT(--(({"+".join(filled)})>0))&" of {total}"'


def _what_this_is(worksheet: Worksheet) -> str:
    rows, items = len(worksheet.rows), len({row.item for row in worksheet.rows})
    counted = f"{items:,} {'item' if items == 1 else 'items'}"
    if rows != items:
        counted += f", {rows:,} questions in all"
    return (
        f"Several people read the same items and gave each a label. Here are {counted} that are to "
        f"be looked at again. You decide which label is right, by the sheet “{SHEET_CODE_BOOK}”. "
        "There is no score and no right number of anything: what counts is what you make of each "
        "item when you read it with a fresh eye."
    )


def _steps(worksheet: Worksheet) -> list[str]:
    variables = worksheet.variables
    return [
        f"Read the sheet “{SHEET_CODE_BOOK}” once from top to bottom.",
        f"Go to the sheet “{SHEET_QUEUE}”. Each row asks one thing of one item. Read the item."
        + (" Then look at the labels beside it." if worksheet.reveal != "nothing" else ""),
        *_how_to_decide(variables),
        (
            "Choose a reason if one fits: what may have led people to differ. Add a note where it "
            "would help the next reader. Both may stay empty."
        ),
        (
            "If no label can be given (the text is missing, or in a language you do not read), "
            f"decide “{CANNOT_BE_CODED}”. That is a decision too."
        ),
        (
            "Save the file and send it back as it is. Half of it is better than nothing: rows you "
            "leave empty are simply still open."
        ),
    ]


def _how_to_decide(variables: Sequence[SheetVariable]) -> list[str]:
    steps = []
    choices = [v for v in variables if v.entry == "choice"]
    numbers = [v for v in variables if v.entry == "number"]
    sets = [v for v in variables if v.entry == "set"]
    if choices:
        only = "" if len(choices) == len(variables) else f" ({_names(choices)})"
        steps.append(
            f"Put your label into the column “decision”{only}: open its list with Alt+Down, or "
            "type the label. Any label of the list may be right, shown in the row or not."
        )
    for bounds in dict.fromkeys((v.low, v.high) for v in numbers):
        asked = [v for v in numbers if (v.low, v.high) == bounds]
        only = "" if len(asked) == len(variables) else f" ({_names(asked)})"
        steps.append(
            f"Type a number{bounds_in_words(*bounds)} into the column “decision”{only}. It need "
            "not be one of the numbers shown."
        )
    if sets and layout.tick_labels(variables):
        only = "" if len(sets) == len(variables) else f" ({_names(sets)})"
        steps.append(
            f"Put {TICK} into the column of every label that belongs to the item{only}, and leave "
            "“decision” empty."
        )
    elif sets:
        separators = " or ".join(dict.fromkeys(v.separator or ";" for v in sets))
        only = "" if len(sets) == len(variables) else f" ({_names(sets)})"
        steps.append(
            f"Type every label that belongs to the item into the column “decision”{only}, with "
            f"{separators} between them."
        )
    return steps


def _names(variables: Sequence[SheetVariable]) -> str:
    names = [f"“{variable.name}”" for variable in variables[:4]]
    left = len(variables) - len(names)
    return ", ".join(names) + (f" and {left} more" if left > 0 else "")


def _good_to_know(worksheet: Worksheet) -> list[str]:
    notes = []
    if worksheet.reveal == "labels":
        notes.append(
            "Labels beside an item stand in no meaningful order"
            + (" (numbers from low to high)" if _has_numbers(worksheet) else "")
            + ", and how many people gave each is left out on purpose."
        )
    if worksheet.may_show_other_labels:
        notes.append(
            "A row may show labels that nobody gave. That, too, is on purpose: it keeps every row "
            "an open question."
        )
    if worksheet.reveal == "tallies":
        notes.append("The number after a label is how many people gave it. Many can be wrong.")
    if worksheet.reveal == "names":
        notes.append("The sheet shows who gave which label. Judge the item, not the person.")
    notes += [
        "Sort and filter as you like; each row keeps its code, and its list follows it. Please "
        "leave the codes and the texts as they are. Green marks a row with a decision"
        + (", red a decision that does not fit its row." if _has_red(worksheet) else "."),
        (
            "You may change a decision at any time before you send the file. To take back one that "
            f"was already sent, decide “{WITHDRAW}”; emptying the cell does not."
        ),
    ]
    return notes


def _has_numbers(worksheet: Worksheet) -> bool:
    return any(variable.entry == "number" for variable in worksheet.variables)


def _has_red(worksheet: Worksheet) -> bool:
    typed = any(variable.entry == "set" for variable in worksheet.variables)
    return not typed or bool(layout.tick_labels(worksheet.variables))


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
