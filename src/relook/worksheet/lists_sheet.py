"""The hidden sheet that dropdowns read, and the rules that read it.

Lists stand in cells, as text, since a list written into the rule itself is limited to 255
characters and breaks at commas and quotes. One rule serves the whole decision column: it looks up
the variable named in its own row, so sorting cannot part a row from its choices. EXACT rather than
MATCH compares the names, for MATCH takes `*` and `?` for wildcards and ignores case.
"""

from __future__ import annotations

from dataclasses import dataclass

from openpyxl import Workbook

from relook.cells.writing import put_text
from relook.worksheet.looks import Look, Looks
from relook.worksheet.model import (
    CANNOT_BE_CODED,
    FORMAT,
    PROPERTY_FORMAT,
    PROPERTY_PROJECT,
    PROPERTY_WORKSHEET,
    SHEET_LISTS,
    TICK,
    WITHDRAW,
    Worksheet,
)

SPECIAL = (CANNOT_BE_CODED, WITHDRAW)
#: Stand for "no bound" in the sheet: beyond any number that a spreadsheet can hold.
_LOWEST, _HIGHEST = -9.99e307, 9.99e307


@dataclass(frozen=True, slots=True)
class Lists:
    """Where the lists are, and formulas that read them for the row of a cell.

    Attributes
    ----------
    n_variables : int
    n_choices : int
        Rows of the column of choices.
    same_for_all : bool
        Whether every variable has the same choices, as it is with one variable.
    reasons, ticks : str
        References to the lists of reasons and of ticks; "" where empty.
    """

    n_variables: int
    n_choices: int
    same_for_all: bool
    reasons: str
    ticks: str

    def _range(self, letter: str) -> str:
        return f"'{SHEET_LISTS}'!${letter}$2:${letter}${self.n_variables + 1}"

    def _of_variable(self, letter: str, variable: str) -> str:
        """Return a formula for a number of the variable named in the cell `variable`."""
        return f"SUMPRODUCT(EXACT({self._range('A')},{variable})*{self._range(letter)})"

    def choices(self, variable: str) -> str:
        """Return a reference to the choices of the variable named in a cell.

        A name that is not known, as after an edit, leaves the choices open to every variable.
        """
        start = f"'{SHEET_LISTS}'!$H$2"
        if self.same_for_all:
            return f"{start}:$H${self.n_choices + 1}"
        offset = self._of_variable("C", variable)
        count = f"MAX({len(SPECIAL)},{self._of_variable('D', variable)})"
        return f"OFFSET({start},{offset},0,{count},1)"

    def is_number(self, variable: str) -> str:
        """Return a formula that is 1 where the variable named in a cell takes numbers."""
        return self._of_variable("B", variable)

    def within_bounds(self, variable: str, value: str) -> str:
        """Return a formula that tells whether a number lies within its variable's bounds."""
        low, high = self._of_variable("E", variable), self._of_variable("F", variable)
        return f"AND({value}>={low},{value}<={high})"


def is_special(cell: str) -> str:
    """Return a formula that tells whether a cell holds one of the words allowed everywhere."""
    return "OR(" + ",".join(f'EXACT({cell},"{word}")' for word in SPECIAL) + ")"


def write_lists(book: Workbook, looks: Looks, worksheet: Worksheet) -> Lists:
    """Write the hidden sheet of lists.

    Column A names the variables; B is 1 for numbers; C and D say where a variable's choices begin
    and how many there are; E and F are its bounds; H holds the choices, J the reasons, K the tick,
    M and N by which worksheet this is, for programs that drop the document's properties.
    """
    sheet = book.create_sheet(SHEET_LISTS)
    plain = looks[Look(below=None, wrap=False)]
    choices = list(SPECIAL)
    same = len({v.labels for v in worksheet.variables}) == 1 and all(
        v.entry != "number" for v in worksheet.variables
    )
    headers = {1: "variable", 8: "choices", 10: "reasons", 11: "tick", 13: "file"}
    for column, header in headers.items():
        put_text(sheet, 1, column, header, plain)
    for row, variable in enumerate(worksheet.variables, start=2):
        own = (*variable.labels, *SPECIAL) if variable.entry != "number" else SPECIAL
        offset = len(choices)
        if same:
            choices, offset = [*own], 0
        else:
            choices += own
        put_text(sheet, row, 1, variable.name, plain)
        numbers = (
            int(variable.entry == "number"),
            offset,
            len(own),
            _LOWEST if variable.low is None else variable.low,
            _HIGHEST if variable.high is None else variable.high,
        )
        for column, number in enumerate(numbers, start=2):
            sheet.cell(row, column, number)
    for column, texts in ((8, choices), (10, list(worksheet.reasons)), (11, [TICK])):
        for row, text in enumerate(texts, start=2):
            put_text(sheet, row, column, text, plain)
    identity = {
        PROPERTY_PROJECT: worksheet.project,
        PROPERTY_WORKSHEET: worksheet.id,
        PROPERTY_FORMAT: str(FORMAT),
    }
    for row, (name, value) in enumerate(identity.items(), start=2):
        put_text(sheet, row, 13, name, plain)
        put_text(sheet, row, 14, value, plain)
    sheet.sheet_state = "hidden"
    reasons = len(worksheet.reasons)
    return Lists(
        n_variables=len(worksheet.variables),
        n_choices=len(choices),
        same_for_all=same,
        reasons=f"'{SHEET_LISTS}'!$J$2:$J${reasons + 1}" if reasons else "",
        ticks=f"'{SHEET_LISTS}'!$K$2:$K$2",
    )
