"""A workbook as it was read: typed cells, nothing interpreted yet."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Literal

CellKind = Literal["empty", "text", "number", "bool", "date", "error", "formula"]
BookKind = Literal["xlsx", "ods", "csv"]


@dataclass(frozen=True, slots=True)
class Cell:
    """One cell.

    Attributes
    ----------
    kind : str
    text : str
        The text; for a number its shortest exact form ("3", "0.5"), for a date ISO, for a formula
        the formula with its "=".
    number_format : str
        The cell's number format, "" where the file has none.
    cached : str
        For a formula: the text of the value that the file stores for it.
    """

    kind: CellKind
    text: str = ""
    number_format: str = ""
    cached: str = ""


EMPTY = Cell("empty")


@dataclass(frozen=True, slots=True)
class Sheet:
    """A sheet; `rows[i]` is the spreadsheet's row i + 1, `rows[i][j]` its column j + 1.

    Rows may differ in length; empty rows within are kept, empty rows at the end are not. `merged`
    holds first row, first column, last row and last column, 1-based, of each merged range; its
    value stands in its first cell. `comments` holds row, column, 1-based, and text of each comment
    that is pinned to a cell.
    """

    title: str
    rows: tuple[tuple[Cell, ...], ...]
    hidden: bool = False
    merged: tuple[tuple[int, int, int, int], ...] = ()
    comments: tuple[tuple[int, int, str], ...] = ()


@dataclass(frozen=True, slots=True)
class Book:
    """A spreadsheet file.

    Attributes
    ----------
    file : str
        As it is to be named in messages.
    kind : {"xlsx", "ods", "csv"}
    sheets : tuple of Sheet
    properties : mapping of str to str
        Custom document properties.
    notes : tuple of str
        What had to be guessed or given up in reading, for the user.
    modified : str
        When the file says that it was last saved, in UTC to the second; "" where it does not say.
    """

    file: str
    kind: BookKind
    sheets: tuple[Sheet, ...]
    properties: Mapping[str, str] = field(default_factory=dict)
    notes: tuple[str, ...] = ()
    modified: str = ""
