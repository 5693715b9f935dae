"""What every sheet shares: rows that grow, and how it comes out of a printer."""

from __future__ import annotations

from typing import Literal

from openpyxl.worksheet.dimensions import RowDimension
from openpyxl.worksheet.header_footer import HeaderFooterItem, _HeaderFooterPart
from openpyxl.worksheet.properties import PageSetupProperties
from openpyxl.worksheet.worksheet import Worksheet as OpenpyxlSheet

from relook.worksheet import palette
from relook.worksheet.looks import FONT

MOST_HEIGHT = 409.0  # points: the most that a spreadsheet program allows


class GrowingRow(RowDimension):
    """A row whose height is a starting point, so that it still grows with a long note."""

    @property
    def customHeight(self) -> bool:  # noqa: N802  # openpyxl's name
        """Never: a height said to be the user's own would be kept, whatever is typed."""
        return False


def set_height(sheet: OpenpyxlSheet, row: int, points: float) -> None:
    """Give a row a height to start with."""
    points = round(min(MOST_HEIGHT, points), 1)
    sheet.row_dimensions[row] = GrowingRow(sheet, index=row, ht=points)


def set_up_page(
    sheet: OpenpyxlSheet,
    footer: str,
    *,
    orientation: Literal["portrait", "landscape"] = "landscape",
    header_row: bool = True,
) -> None:
    """Print as wide as the paper, on as many pages as it takes, each with its number.

    Parameters
    ----------
    sheet : openpyxl worksheet
    footer : str
        Stands at the foot of every page.
    orientation : {"portrait", "landscape"}
    header_row : bool
        Whether the first row is a header, to be repeated on every page.
    """
    sheet.sheet_view.showGridLines = False
    sheet.page_setup.orientation = orientation
    sheet.page_setup.paperSize = 9  # A4
    sheet.page_setup.fitToWidth, sheet.page_setup.fitToHeight = 1, 0
    sheet.sheet_properties.pageSetUpPr = PageSetupProperties(fitToPage=True)
    if header_row:
        sheet.print_title_rows = "1:1"
    margins = sheet.page_margins
    margins.left = margins.right = 0.4
    margins.top, margins.bottom = 0.5, 0.75
    _set_footer(sheet, footer)


def _set_footer(sheet: OpenpyxlSheet, text: str) -> None:
    """Print a line and the page number at the foot of every page.

    `&` begins a code there, so it is doubled; the line is kept short, as a footer has 255
    characters.
    """
    plain = " ".join("".join(c if c.isprintable() else " " for c in text).split())
    font, size, grey = f"{FONT},Regular", 8, palette.GREY
    left = _HeaderFooterPart(plain[:80].replace("&", "&&"), font, size, grey)
    right = _HeaderFooterPart("&P / &N", font, size, grey)
    sheet.HeaderFooter.oddFooter = HeaderFooterItem(left=left, right=right)
