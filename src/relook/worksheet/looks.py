"""How cells look, each look made once and shared by all the cells that have it.

A calm page: black on white, hairlines between rows, the item's text large, everything that is only
for reference small and grey, and the cells to fill in tinted like a form.
"""

from __future__ import annotations

from copy import copy
from dataclasses import dataclass
from typing import Literal

from openpyxl import Workbook
from openpyxl.styles import Alignment, Border, Font, PatternFill, Side
from openpyxl.styles.cell_style import StyleArray
from openpyxl.styles.differential import DifferentialStyle

from relook.worksheet import palette

#: Named in every font, or some programs fall back to a serif one; where it is missing, Carlito has
#: the same widths.
FONT = "Calibri"
TEXT_FORMAT = "@"
Rule = Literal["hair", "thin", "medium"]


@dataclass(frozen=True, slots=True, kw_only=True)
class Look:
    """What a cell looks like; see openpyxl for the meaning of each."""

    size: float = 10.0
    bold: bool = False
    italic: bool = False
    colour: str = palette.INK
    fill: str | None = None
    number_format: str = TEXT_FORMAT
    across: str | None = None
    down: str = "top"
    wrap: bool = True
    indent: int = 0
    right_to_left: bool = False
    underline: bool = False
    below: Rule | None = "hair"
    above: Rule | None = None
    left: Rule | None = None
    quoted: bool = False


class Looks:
    """The looks of one workbook.

    Parameters
    ----------
    book : openpyxl Workbook
    """

    def __init__(self, book: Workbook) -> None:
        self._book = book
        self._made: dict[Look, StyleArray] = {}
        scratch = book.create_sheet("scratch")
        self._cell = scratch.cell(1, 1)
        book.remove(scratch)

    def __getitem__(self, look: Look) -> StyleArray:
        """Return the shared style of a look."""
        made = self._made.get(look)
        if made is None:
            made = self._made[look] = self._make(look)
        return made

    def _make(self, look: Look) -> StyleArray:
        cell = self._cell
        cell.font = Font(
            name=FONT,
            sz=look.size,
            b=look.bold,
            i=look.italic,
            color=look.colour,
            u="single" if look.underline else None,
        )
        cell.fill = PatternFill("solid", fgColor=look.fill) if look.fill else PatternFill()
        cell.border = Border(bottom=_side(look.below), top=_side(look.above), left=_side(look.left))
        cell.alignment = Alignment(
            horizontal="right" if look.right_to_left else look.across,
            vertical=look.down,
            wrap_text=look.wrap,
            indent=look.indent,
            readingOrder=2 if look.right_to_left else 0,
        )
        cell.number_format = look.number_format
        cell.quotePrefix = look.quoted
        return copy(cell._style)  # type: ignore[no-any-return]


def _side(style: Rule | None) -> Side | None:
    if style is None:
        return None
    colour = palette.RULE if style in ("hair", "thin") else palette.INK
    return Side(style=style, color=colour)


def conditional(*, fill: str, colour: str | None = None) -> DifferentialStyle:
    """Return the look that a conditional format gives a cell.

    Conditional fills take the background colour, plain ones the foreground.
    """
    return DifferentialStyle(
        fill=PatternFill(bgColor=fill), font=Font(color=colour) if colour else None
    )
