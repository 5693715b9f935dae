"""The cells of one worksheet of an .xlsx file, streamed."""

from __future__ import annotations

from collections.abc import Mapping

from relook.cells.limits import MOST_MERGED, Meter
from relook.cells.model import EMPTY, Cell
from relook.cells.package import Package
from relook.cells.xlsx_values import Styles, unescape

_MAIN = "http://schemas.openxmlformats.org/spreadsheetml/2006/main "
_ROW = f"{_MAIN}row"
_CELL = f"{_MAIN}c"
_VALUE = f"{_MAIN}v"
_FORMULA = f"{_MAIN}f"
_TEXT = f"{_MAIN}t"
_MERGED = f"{_MAIN}mergeCell"
_PHONETIC = f"{_MAIN}rPh"


class SheetReader:
    """Reads one worksheet; one object per sheet.

    Parameters
    ----------
    title : str
    strings : list of str
        The shared texts.
    styles : Styles
    meter : Meter
        Shared by the sheets of a file.
    """

    def __init__(self, title: str, strings: list[str], styles: Styles, meter: Meter) -> None:
        self.merged: list[tuple[int, int, int, int]] = []
        self._title = title
        self._strings = strings
        self._styles = styles
        self._meter = meter
        self._rows: list[tuple[Cell, ...]] = []
        self._row = 0
        self._cells: list[Cell] = []
        self._full = 0
        self._column = 0
        self._kind = ""
        self._style = 0
        self._value: list[str] = []
        self._formula: list[str] = []
        self._has_value = False
        self._has_formula = False
        self._shared_id = ""
        self._shared_formulas: dict[str, str] = {}
        self._into: list[str] | None = None
        self._phonetic = False
        self._columns: dict[str, int] = {}
        self._known: dict[tuple[str, int], Cell] = {}

    def read(self, package: Package, part: str) -> tuple[tuple[Cell, ...], ...]:
        """Return the rows; empty ones at the end and empty cells at a row's end are left out."""
        package.parse(part, self._start, self._end, self._text)
        return tuple(self._rows)

    def _start(self, tag: str, attributes: Mapping[str, str]) -> None:
        if tag == _CELL:
            reference = attributes.get("r")
            self._column = self._column + 1 if reference is None else self._column_of(reference)
            self._kind = attributes.get("t", "n")
            self._style = int(attributes.get("s", "0"))
            self._has_value = self._has_formula = False
        elif tag == _VALUE:
            self._has_value = True
            self._value = self._into = []
        elif tag == _ROW:
            number = attributes.get("r")
            self._row = self._row + 1 if number is None else int(number)
            self._column = 0
            self._cells = []
            self._full = 0
        elif tag == _TEXT and self._kind == "inlineStr" and not self._phonetic:
            if not self._has_value:
                self._value = []
            self._has_value = True
            self._into = self._value
        elif tag == _FORMULA:
            self._has_formula = True
            self._formula = self._into = []
            self._shared_id = attributes.get("si", "") if attributes.get("t") == "shared" else ""
        elif tag == _PHONETIC:
            self._phonetic = True
        elif tag == _MERGED and len(self.merged) < MOST_MERGED:
            self.merged.append(self._range(attributes.get("ref", "")))

    def _range(self, reference: str) -> tuple[int, int, int, int]:
        first, _, last = reference.partition(":")
        corners = []
        for corner in (first, last or first):
            letters = corner.rstrip("0123456789")
            corners += [int(corner[len(letters) :]), self._column_of(corner)]
        return corners[0], corners[1], corners[2], corners[3]

    def _text(self, data: str) -> None:
        if self._into is not None:
            self._into.append(data)

    def _end(self, tag: str) -> None:
        if tag == _CELL:
            if self._has_value or self._has_formula:
                self._place(self._cell())
        elif tag == _ROW:
            self._close_row()
        elif tag == _PHONETIC:
            self._phonetic = False
        else:
            self._into = None

    def _column_of(self, reference: str) -> int:
        letters = reference.rstrip("0123456789")
        column = self._columns.get(letters)
        if column is None:
            column = 0
            for letter in letters.upper():
                if not "A" <= letter <= "Z":
                    raise ValueError(f"{reference!r} is not a cell")
                column = column * 26 + ord(letter) - 64
            if column == 0:
                raise ValueError(f"{reference!r} is not a cell")
            self._columns[letters] = column
        return column

    def _cell(self) -> Cell:
        stored = "".join(self._value) if self._has_value else ""
        if self._has_formula:
            return self._formula_cell(stored)
        if self._kind == "s":
            known = self._known.get((stored, self._style))
            if known is None:
                known = self._typed(stored)
                self._known[(stored, self._style)] = known
            return known
        return self._typed(stored)

    def _formula_cell(self, stored: str) -> Cell:
        formula = "".join(self._formula)
        if self._shared_id:
            # The followers of a shared formula name it by number; the leader's text stands for all.
            formula = formula or self._shared_formulas.get(self._shared_id, "")
            self._shared_formulas.setdefault(self._shared_id, formula)
        if formula in ("TRUE()", "FALSE()"):  # how LibreOffice stores plain truth values
            return Cell("bool", formula[:-2], self._styles.format_of(self._style))
        cached = self._typed(stored).text if self._has_value else ""
        return Cell("formula", f"={formula}", self._styles.format_of(self._style), cached)

    def _typed(self, stored: str) -> Cell:
        number_format = self._styles.format_of(self._style)
        match self._kind:
            case "s":
                return _text_cell(self._strings[_position(stored)], number_format)
            case "str" | "inlineStr":
                return _text_cell(unescape(stored), number_format)
            case "b":
                true = stored.strip() in ("1", "true", "TRUE")
                return Cell("bool", "TRUE" if true else "FALSE", number_format)
            case "e":
                return Cell("error", stored, number_format)
            case "d":
                return Cell("date", stored.removesuffix("T00:00:00"), number_format)
            case "n":
                return self._styles.number(stored, self._style) if stored.strip() else EMPTY
            case _:
                raise ValueError(f"{self._kind!r} is no kind of cell")

    def _place(self, cell: Cell) -> None:
        if cell is EMPTY:
            return
        self._meter.admit(self._title, self._row, self._column)
        missing = self._column - len(self._cells) - 1
        if missing < 0:
            raise ValueError(f"the cells of row {self._row} are out of order")
        if missing:
            self._cells.extend([EMPTY] * missing)
        self._cells.append(cell)
        self._full += 1

    def _close_row(self) -> None:
        if not self._full:
            return
        gap = self._row - len(self._rows) - 1
        if gap < 0:
            raise ValueError(f"row {self._row} is out of order")
        self._meter.count_row(self._title, self._row, len(self._cells), self._full, gap)
        if gap:
            self._rows.extend([()] * gap)
        self._rows.append(tuple(self._cells))


def _text_cell(text: str, number_format: str) -> Cell:
    return Cell("text", text, number_format) if text else EMPTY


def _position(stored: str) -> int:
    position = int(stored)
    if position < 0:
        raise IndexError(f"there is no shared text {position}")
    return position
