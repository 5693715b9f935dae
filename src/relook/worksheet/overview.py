"""The lead's workbook on a round: what was queued and why, as tables and native charts.

It is for the lead alone: it names coders and ranks. Everything in it is a plain value made
elsewhere; nothing is computed here but where things stand on the page.
"""

from __future__ import annotations

import relook.worksheet.overview_sheets as overview_sheets
from relook.worksheet.looks import Looks
from relook.worksheet.overview_model import (
    CoderRow,
    Figure,
    GroupRow,
    LabelPairRow,
    Overview,
    ProspectRow,
    RankedRow,
)
from relook.worksheet.packing import new_workbook, packed

__all__ = [
    "CoderRow",
    "Figure",
    "GroupRow",
    "LabelPairRow",
    "Overview",
    "ProspectRow",
    "RankedRow",
    "write_overview",
]


def write_overview(overview: Overview) -> bytes:
    """Write the lead's workbook as an .xlsx file.

    Parameters
    ----------
    overview : Overview

    Returns
    -------
    bytes
        The same ones for the same overview.
    """
    book = new_workbook(f"{overview.title}: overview" if overview.title else "Overview")
    looks = Looks(book)
    overview_sheets.write_summary(book, looks, overview)
    overview_sheets.write_ranking(book, looks, overview)
    overview_sheets.write_coders(book, looks, overview)
    overview_sheets.write_label_pairs(book, looks, overview)
    overview_sheets.write_groups(book, looks, overview)
    overview_sheets.write_prospect(book, looks, overview)
    book.active = 0
    return packed(book, overview.stamp)
