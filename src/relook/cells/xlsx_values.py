"""What the cells of an .xlsx file mean: escaped characters, number formats, dates."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from datetime import date, datetime, time, timedelta

from openpyxl.styles.numbers import BUILTIN_FORMATS, is_date_format, is_timedelta_format
from openpyxl.utils.datetime import CALENDAR_MAC_1904, CALENDAR_WINDOWS_1900, from_excel

from relook.cells.model import Cell
from relook.cells.package import Package
from relook.cells.writing import unescape_text

_MAIN = "http://schemas.openxmlformats.org/spreadsheetml/2006/main "
_EXACT_WHOLE = 10**15


def unescape(text: str) -> str:
    """Undo the escapes of ECMA-376 Part 1, §22.9.2.19; halves of characters become "�"."""
    if "_x" not in text:
        return text
    units = unescape_text(text).encode("utf-16-le", "surrogatepass")
    return units.decode("utf-16-le", "replace")


def shortest(number: float) -> str:
    """Return the shortest text that reads as this number: "3", "0.5", "1e+22"."""
    if number.is_integer() and abs(number) < _EXACT_WHOLE:
        return str(int(number))
    return repr(number)


def number_cell(text: str, number_format: str) -> Cell:
    """Return the cell of a stored number; a whole number keeps all the digits that are stored."""
    stripped = text.strip()
    if stripped.removeprefix("-").isdecimal() and stripped.isascii():
        return Cell(
            "number", str(int(stripped)) if len(stripped) < 400 else stripped, number_format
        )
    number = float(stripped)
    if number != number or number in (float("inf"), float("-inf")):
        return Cell("error", stripped, number_format)
    return Cell("number", shortest(number), number_format)


def date_text(value: date | time | timedelta) -> str:
    """Return a date, a time of day or a duration as ISO text; midnight is left out of a date."""
    if isinstance(value, datetime):
        return value.date().isoformat() if value.time() == time() else value.isoformat()
    if isinstance(value, timedelta):
        return str(value)
    return value.isoformat()


@dataclass(frozen=True, slots=True)
class Styles:
    """The number formats of a workbook.

    Attributes
    ----------
    formats : tuple of str
        By style index.
    dated, spans : tuple of bool
        Whether a number so formatted is a date, and whether it is a duration.
    starts_1904 : bool
        Whether day 0 is 1904-01-01.
    """

    formats: tuple[str, ...]
    dated: tuple[bool, ...]
    spans: tuple[bool, ...]
    starts_1904: bool

    @classmethod
    def read(cls, package: Package, part: str | None, *, starts_1904: bool) -> Styles:
        """Read the style table; a workbook without one has the format General alone."""
        codes: dict[int, str] = {}
        used: list[int] = []
        inside = False
        owner = f"{_MAIN}cellXfs"

        def start(tag: str, attributes: Mapping[str, str]) -> None:
            nonlocal inside
            if tag == f"{_MAIN}numFmt":
                codes[int(attributes.get("numFmtId", "0"))] = attributes.get("formatCode", "")
            elif tag == owner:
                inside = True
            elif inside and tag == f"{_MAIN}xf":
                used.append(int(attributes.get("numFmtId", "0")))

        def end(tag: str) -> None:
            nonlocal inside
            if tag == owner:
                inside = False

        if part is not None and part in package.names:
            package.parse(part, start, end)
        formats = tuple(codes.get(each) or BUILTIN_FORMATS.get(each, "General") for each in used)
        return cls(
            formats,
            tuple(bool(is_date_format(each)) for each in formats),
            tuple(bool(is_timedelta_format(each)) for each in formats),
            starts_1904,
        )

    def format_of(self, style: int) -> str:
        """Return the number format of a style, General where there is none."""
        return self.formats[style] if 0 <= style < len(self.formats) else "General"

    def number(self, text: str, style: int) -> Cell:
        """Return the cell of a stored number: a date where its format says so."""
        if not (0 <= style < len(self.dated) and self.dated[style]):
            return number_cell(text, self.format_of(style))
        epoch = CALENDAR_MAC_1904 if self.starts_1904 else CALENDAR_WINDOWS_1900
        try:
            value = from_excel(float(text), epoch, timedelta=self.spans[style])
        except (OverflowError, ValueError):
            return number_cell(text, self.format_of(style))
        return Cell("date", date_text(value), self.format_of(style))
