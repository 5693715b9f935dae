"""Any spreadsheet file as typed cells, or a clear sentence why not."""

from __future__ import annotations

from relook.cells.csv_cells import read_csv
from relook.cells.model import Book
from relook.cells.ods import read_ods
from relook.cells.package import damage_told
from relook.cells.sniffing import sniff
from relook.cells.xlsx import read_xlsx


def open_book(data: bytes, file: str) -> Book:
    """Read a spreadsheet from its bytes.

    What the file is, is told from its bytes, not from its name. Merged cells have their value in
    the first cell only; hidden and filtered rows are read like any others.

    Parameters
    ----------
    data : bytes
        The whole file.
    file : str
        As it is to be named in messages.

    Raises
    ------
    RelookError
        It is no .xlsx, .ods or CSV file, is encrypted or damaged, or unfolds beyond the limits.
    """
    kind, package = sniff(data, file)
    with damage_told(file):
        if package is None:
            return read_csv(data, file)
        return read_ods(package) if kind == "ods" else read_xlsx(package)
