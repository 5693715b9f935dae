"""How much of a file is read before it is refused.

A spreadsheet of a few kilobytes can unfold into gigabytes: by compression, by repetition, or by one
cell in the far corner. Each limit stands far above honest files and far below what hurts.
"""

from __future__ import annotations

from relook.errors import Place, RelookError

MOST_BYTES = 512 * 2**20  # of all parts of a file, unpacked
MOST_PARTS = 4096  # files within the file
#: Honest parts pack 4 to 13 times, very repetitive ones up to about 50 times.
MOST_PACKING = 100
ALWAYS_UNPACKED = 4 * 2**20  # a part up to this size is read however well it packs
MOST_COLUMNS = 4096
MOST_CELLS = 6_000_000  # that hold something
MOST_HOLES = 2_000_000  # empty cells to the left of full ones, and empty rows above them
LONGEST_GAP = 100_000  # empty rows between two full ones
MOST_SHEETS = 256
MOST_MERGED = 10_000  # merged ranges of a sheet that are remembered
MOST_COMMENTS = 10_000  # comments of a sheet that are remembered


def column_letters(number: int) -> str:
    """Return the letters of a 1-based column: 1 is A, 27 is AA."""
    letters = ""
    while number > 0:
        number, rest = divmod(number - 1, 26)
        letters = chr(65 + rest) + letters
    return letters


def column_number(letters: str) -> int:
    """Return the 1-based number of a column by its letters: A is 1, AA is 27."""
    number = 0
    for letter in letters:
        number = number * 26 + ord(letter) - 64
    return number


class Meter:
    """Counts what a file unfolds into, over all its sheets, and stops where it is too much.

    Parameters
    ----------
    file : str
        As it is to be named in messages.
    """

    def __init__(self, file: str) -> None:
        self.file = file
        self._cells = 0
        self._holes = 0

    def admit(self, sheet: str, row: int, column: int) -> None:
        """Check the position of a full cell, 1-based.

        Raises
        ------
        RelookError
            The column lies beyond the limit.
        """
        if column > MOST_COLUMNS:
            raise RelookError(
                f"cell {column_letters(column)}{row} lies far beyond the table "
                f"(more than {MOST_COLUMNS:,} columns are not read)",
                where=Place(self.file, sheet, row, column_letters(column)),
                mend="delete what is in that cell, or its whole column, and save again",
            )

    def count_row(self, sheet: str, row: int, width: int, full: int, gap: int) -> None:
        """Count one row with something in it.

        Parameters
        ----------
        sheet : str
        row, width : int
            The row, and its last full column; both 1-based.
        full : int
            How many of its cells hold something.
        gap : int
            How many empty rows lie between it and the full row before.

        Raises
        ------
        RelookError
            The row lies far below the others, or the file has grown too large.
        """
        if gap > LONGEST_GAP:
            raise RelookError(
                f"row {row:,} lies {gap:,} empty rows below the rest of the table",
                where=Place(self.file, sheet, row),
                mend="delete what is in that row, and save again",
            )
        self._cells += full
        self._holes += width - full + gap
        if self._cells > MOST_CELLS or self._holes > MOST_HOLES:
            what = "full" if self._cells > MOST_CELLS else "empty"
            most = MOST_CELLS if what == "full" else MOST_HOLES
            raise RelookError(
                f"the file holds more than {most:,} {what} cells",
                where=Place(self.file, sheet, row),
                mend="keep only the table in the file, or export the table as CSV",
            )
