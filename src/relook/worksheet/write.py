"""An adjudicator's worksheet, from the model alone."""

from __future__ import annotations

from openpyxl.packaging.custom import StringProperty

from relook.worksheet.code_book_sheet import write_code_book
from relook.worksheet.lists_sheet import write_lists
from relook.worksheet.looks import Looks
from relook.worksheet.model import (
    FORMAT,
    PROPERTY_FORMAT,
    PROPERTY_PROJECT,
    PROPERTY_WORKSHEET,
    SHEET_LISTS,
    Worksheet,
)
from relook.worksheet.packing import collection_paused, new_workbook, packed
from relook.worksheet.queue_sheet import write_queue
from relook.worksheet.start_sheet import write_start


def write_worksheet(worksheet: Worksheet) -> bytes:
    """Write a worksheet as an .xlsx file.

    Parameters
    ----------
    worksheet : Worksheet

    Returns
    -------
    bytes
        The same ones for the same worksheet.

    Raises
    ------
    RelookError
        Where `worksheet.stamp` is no ISO time.

    Notes
    -----
    The sheets are "Start here", "Queue", "Code book" and a hidden one that the dropdowns read. The
    file is recognised again by its properties, and by the hidden sheet where a program dropped
    those.
    """
    with collection_paused():
        return _written(worksheet)


def _written(worksheet: Worksheet) -> bytes:
    book = new_workbook(worksheet.title)
    looks = Looks(book)
    write_start(book, looks, worksheet)
    # The lists stand last in the book but are needed first: the queue's rules point into them.
    lists = write_lists(book, looks, worksheet)
    write_queue(book, looks, worksheet, lists)
    write_code_book(book, looks, worksheet)
    book.move_sheet(SHEET_LISTS, offset=2)
    book.active = 0
    for name, value in (
        (PROPERTY_PROJECT, worksheet.project),
        (PROPERTY_WORKSHEET, worksheet.id),
        (PROPERTY_FORMAT, str(FORMAT)),
    ):
        properties = book.custom_doc_props  # type: ignore[attr-defined]  # missing in the stub
        properties.append(StringProperty(name=name, value=value))
    return packed(book, worksheet.stamp)
