"""Final labels as a workbook: every label a text cell, so that none is taken for a formula."""

from __future__ import annotations

from collections.abc import Sequence

from openpyxl.utils import get_column_letter

from relook.worksheet.looks import Looks
from relook.worksheet.overview_table import TableColumn, Value, finish, write_note, write_table
from relook.worksheet.packing import collection_paused, new_workbook, packed


def write_final_book(
    title: str,
    columns: Sequence[TableColumn],
    rows: Sequence[Sequence[Value]],
    notes: Sequence[str],
    stamp: str,
) -> bytes:
    """Write final labels as an .xlsx file: the table, and a sheet of what to know of it.

    Parameters
    ----------
    title : str
    columns : sequence of TableColumn
    rows : sequence of sequences
        A value per column; None leaves the cell empty.
    notes : sequence of str
    stamp : str
        ISO time to record in it.

    Returns
    -------
    bytes
        The same ones for the same contents.
    """
    with collection_paused():
        book = new_workbook(f"{title}: final labels")
        looks = Looks(book)
        sheet = book.create_sheet("Final labels")
        filled = [["" if value is None else value for value in row] for row in rows]
        last = write_table(sheet, looks, columns, filled)
        sheet.auto_filter.ref = f"A1:{get_column_letter(len(columns))}{max(2, last)}"
        finish(sheet, f"{title} · final labels")
        about = book.create_sheet("About")
        about.column_dimensions["A"].width = 100
        for row, note in enumerate(notes, start=1):
            write_note(about, looks, row, note, (1, 1), size=10.5)
        finish(about, f"{title} · final labels", freeze=None)
        book.active = 0
        return packed(book, stamp)
