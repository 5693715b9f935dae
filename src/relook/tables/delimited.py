"""Delimited text to a frame of text cells, with the rows that a spreadsheet shows.

The shape of the file (how many cells each row has) is counted on its bytes first, so that a row
that is too long or too short is an error with its row rather than cells that moved. Regular files
are then read by the quick reader; files with quotes in odd places by the careful one. Both keep
every character.
"""

from __future__ import annotations

import csv
import io
from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
import numpy.typing as npt
import pandas as pd

from relook.core.exact import BoolArray, IntArray
from relook.errors import Place, Problem, RelookError
from relook.tables.arrow_columns import arrow_column, maybe_blank, read_regular

DELIMITERS = (",", ";", "\t", "|")
_NAMES = {",": "comma", ";": "semicolon", "\t": "tab", "|": "bar"}
_QUOTE, _LINE_FEED, _RETURN = 34, 10, 13
#: More ragged rows than this are counted, not listed.
_MOST = 1_000


@dataclass(frozen=True, slots=True, eq=False)
class Cells:
    """The cells of one table, all text.

    Attributes
    ----------
    header : tuple of str
    frame : DataFrame
        A str column per header, labelled 0, 1, …; blank rows left out.
    rows : int array of shape (len(frame),)
        The row of the spreadsheet that each row of `frame` stood in.
    said : str
        How the table was read.
    delimiter : str or None
        Of delimited text.
    """

    header: tuple[str, ...]
    frame: pd.DataFrame
    rows: IntArray
    said: str
    delimiter: str | None = None


@dataclass(frozen=True, slots=True, eq=False)
class _Shape:
    """How a file falls into rows and cells under one delimiter.

    `widths` holds the cells of each row, 0 for a blank row; `regular` says that every quote opens
    or closes a whole cell, so that quick and careful reading agree.
    """

    delimiter: str
    widths: IntArray
    regular: bool
    records: list[list[str]] | None = None

    @property
    def header_at(self) -> int:
        """The position of the first row that is not blank."""
        return int(np.argmax(self.widths > 0))

    @property
    def width(self) -> int:
        """The cells of the header."""
        return int(self.widths[self.header_at])

    @property
    def ragged(self) -> IntArray:
        """Positions of the rows with another number of cells than the header."""
        return np.flatnonzero((self.widths != self.width) & (self.widths > 0))


def read_delimited(data: bytes, file: str, delimiter: str | None = None) -> Cells:
    """Read delimited text.

    Parameters
    ----------
    data : bytes
        UTF-8 without a byte order mark.
    file : str
        As it is to be named in messages.
    delimiter : str, optional
        Found among comma, semicolon, tab and bar where left out: one under which every row has as
        many cells as the header.

    Raises
    ------
    RelookError
        Nothing in the file, rows of unequal length, or quotes that do not close.
    """
    if delimiter is not None and (len(delimiter) != 1 or delimiter in '"\r\n'):
        raise RelookError(
            f'"{delimiter}" cannot be a delimiter',
            where=Place(file),
            mend='use one character, such as "," ";" "|" or a tab',
        )
    if not data or data.isspace():
        raise RelookError("the file is empty", where=Place(file), mend="give a table with a header")
    even = _even(data, delimiter)
    if even is not None:
        return drop_blank(even)
    shape = _choose(data, file, delimiter)
    if shape.ragged.size:
        raise RelookError.from_problems(_ragged_problems(shape, file))
    cells = _quick(data, shape) if shape.regular and shape.records is None else None
    frame = _careful(data, file, shape) if cells is None else cells
    header = tuple(frame.iloc[shape.header_at])
    frame = frame.iloc[shape.header_at + 1 :]
    rows = np.arange(shape.header_at + 2, shape.header_at + 2 + len(frame))
    said = _said(shape.delimiter, shape.width, told=delimiter is not None)
    return drop_blank(Cells(header, frame, rows, said, shape.delimiter))


def _said(delimiter: str, width: int, *, told: bool) -> str:
    if width == 1 and not told:
        return "one column"
    return f"delimiter {_NAMES.get(delimiter, delimiter)}"


def _even(data: bytes, delimiter: str | None) -> Cells | None:
    """Read a file that can be read in one way only, without counting its cells first.

    None where there is a choice of delimiters, a quote, a row of another width, or no header in the
    first row; and where pyarrow is not installed. The reader refuses uneven rows itself.
    """
    found = [one for one in DELIMITERS if one.encode() in data]
    chosen = delimiter or (found[0] if found else ",")
    if ord(chosen) > 127 or b"\n" not in data or (delimiter is None and len(found) > 1):
        return None
    first = data[: data.index(b"\n")].decode("utf-8").removesuffix("\r")
    header = tuple(first.split(chosen))
    if not first.strip(" \t\r\n" + chosen):
        return None
    frame = read_regular(data, chosen, len(header), skip_rows=1)
    lines = data.count(b"\n") + (not data.endswith(b"\n"))
    if frame is None or len(frame) + 1 != lines:
        return None
    rows = np.arange(2, 2 + len(frame), dtype=np.int32)
    said = _said(chosen, len(header), told=delimiter is not None)
    return Cells(header, frame, rows, said, chosen)


def drop_blank(cells: Cells) -> Cells:
    """Leave out the rows in which every cell is blank."""
    frame = cells.frame
    blank: BoolArray = np.ones(len(frame), dtype=bool)
    for column in frame.columns:
        arrow = arrow_column(frame[column])
        if arrow is not None:
            blank &= maybe_blank(arrow)
        if not blank.any():
            return replace(cells, frame=frame.reset_index(drop=True))
    for column in frame.columns:
        at = np.flatnonzero(blank)
        if at.size == 0:
            break
        blank[at] = [not text.strip() for text in frame[column].iloc[at].to_numpy(dtype=object)]
    if not blank.any():
        return replace(cells, frame=frame.reset_index(drop=True))
    keep = ~blank
    return replace(cells, frame=frame[keep].reset_index(drop=True), rows=cells.rows[keep])


def frame_of_text(records: Sequence[Sequence[str]], width: int) -> pd.DataFrame:
    """Return rows of text as a frame of `width` str columns, short rows filled with empty cells."""
    columns = {
        column: pd.Series(
            [row[column] if column < len(row) else "" for row in records], dtype="str"
        )
        for column in range(width)
    }
    return pd.DataFrame(columns)


def _choose(data: bytes, file: str, delimiter: str | None) -> _Shape:
    """The shape under the given delimiter, or under the one that fits every row best."""
    array = np.frombuffer(data, dtype=np.uint8)
    ends = _line_ends(array, data)
    inside = None
    if b'"' in data:
        inside = (np.cumsum(array == _QUOTE, dtype=np.uint8) & 1).astype(bool)
        ends = ends[~inside[ends]]
    if inside is not None and inside[-1]:
        # Perhaps an inch mark or the like; the careful reader knows, and names the row.
        return _careful_shape(data, file, delimiter)
    tried = [delimiter] if delimiter is not None else [d for d in DELIMITERS if d.encode() in data]
    shapes = [_shape(data, array, ends, inside, one) for one in tried or [","]]
    if not all(shape.regular for shape in shapes):
        regular = [shape for shape in shapes if shape.regular and not shape.ragged.size]
        if not any(shape.width > 1 for shape in regular):
            return _careful_shape(data, file, delimiter)
        shapes = regular
    return _best(shapes)


def _best(shapes: Sequence[_Shape]) -> _Shape:
    """The shape with the most columns among those without ragged rows, else the widest."""
    even = [shape for shape in shapes if not shape.ragged.size and shape.width > 1]
    return max(even or shapes, key=lambda shape: shape.width)


def _line_ends(array: npt.NDArray[np.uint8], data: bytes) -> IntArray:
    ends = array == _LINE_FEED
    if b"\r" in data:
        lone = array == _RETURN
        lone[:-1] &= array[1:] != _LINE_FEED
        ends |= lone
    return np.flatnonzero(ends)


def _shape(
    data: bytes,
    array: npt.NDArray[np.uint8],
    ends: IntArray,
    inside: BoolArray | None,
    delimiter: str,
) -> _Shape:
    if ord(delimiter) > 127:
        records = list(csv.reader(io.StringIO(data.decode(), newline=""), delimiter=delimiter))
        return _Shape(delimiter, _widths(records), False, records)
    code = ord(delimiter)
    cuts = np.flatnonzero(array == code)
    if inside is not None:
        cuts = cuts[~inside[cuts]]
    starts = np.concatenate([[0], ends + 1])
    stops = np.concatenate([ends, [array.size]])
    if starts[-1] >= array.size:
        starts, stops = starts[:-1], stops[:-1]
    before = np.searchsorted(cuts, np.append(starts, array.size))
    widths = np.diff(before) + 1
    # A row is blank when it holds nothing but delimiters and spaces: few rows are short enough.
    odd = np.flatnonzero(stops - starts <= np.maximum(widths + 1, 8))
    spaces = b" \t\r\n" + delimiter.encode()
    blank = [at for at in odd.tolist() if not data[starts[at] : stops[at]].strip(spaces)]
    widths[blank] = 0
    return _Shape(delimiter, widths, inside is None or _quotes_whole_cells(array, code))


def _quotes_whole_cells(array: npt.NDArray[np.uint8], delimiter: int) -> bool:
    """Whether each quote opens a cell, closes one, or stands doubled within one."""
    quotes = np.flatnonzero(array == _QUOTE)
    around = np.zeros(256, dtype=bool)
    around[[delimiter, _LINE_FEED, _RETURN, _QUOTE]] = True
    opening, closing = quotes[0::2], quotes[1::2]
    opening = opening[opening > 0]
    closing = closing[closing < array.size - 1]
    return bool(around[array[opening - 1]].all() and around[array[closing + 1]].all())


def _quick(data: bytes, shape: _Shape) -> pd.DataFrame | None:
    """Read a regular file; None where the reader counts other rows than the bytes show."""
    frame = read_regular(data, shape.delimiter, shape.width)
    if frame is not None and len(frame) == shape.widths.size:
        return frame
    frame = pd.read_csv(
        io.BytesIO(data),
        sep=shape.delimiter,
        header=None,
        names=list(range(shape.width)),
        index_col=False,
        dtype="str",
        na_filter=False,
        keep_default_na=False,
        skip_blank_lines=False,
        low_memory=False,
        encoding="utf-8",
        engine="c",
    )
    return frame if len(frame) == shape.widths.size else None


def _careful(data: bytes, file: str, shape: _Shape) -> pd.DataFrame:
    records = shape.records
    if records is None:
        records = _records(data, file, shape.delimiter)
    return frame_of_text(records, shape.width)


def _careful_shape(data: bytes, file: str, delimiter: str | None) -> _Shape:
    """Try each delimiter with the careful reader; quotes that none explains are an error."""
    shapes, first_fault = [], None
    head = data.lstrip().split(b"\n", 1)[0]
    found = [d for d in DELIMITERS if d.encode() in head]
    for one in [delimiter] if delimiter is not None else found or [","]:
        try:
            records = _records(data, file, one)
        except RelookError as fault:
            first_fault = first_fault or fault
            continue
        shapes.append(_Shape(one, _widths(records), False, records))
    if not shapes and first_fault is not None:
        raise first_fault
    return _best(shapes)


def _records(data: bytes, file: str, delimiter: str) -> list[list[str]]:
    reader = csv.reader(io.StringIO(data.decode(), newline=""), delimiter=delimiter, strict=True)
    records: list[list[str]] = []
    try:
        records.extend(reader)
    except csv.Error as fault:
        where = Place(file, row=len(records) + 1)
        said = str(fault)
        if "unexpected end" in said:
            raise RelookError(
                "a quoted cell begins here and never ends",
                where=where,
                mend='close the quote, or double each " that belongs to the text',
            ) from None
        if "expected after" in said:
            raise RelookError(
                "text follows the closing quote of a cell",
                where=where,
                mend='quote the whole cell and double each " that belongs to the text',
            ) from None
        raise RelookError(
            f"the row cannot be read ({said})",
            where=where,
            mend="look for a quote that never closes, or shorten the cell",
        ) from None
    return records


def _widths(records: list[list[str]]) -> IntArray:
    return np.array(
        [len(row) if any(cell.strip() for cell in row) else 0 for row in records], dtype=np.int64
    )


def _ragged_problems(shape: _Shape, file: str) -> list[Problem]:
    found = shape.ragged
    name = _NAMES.get(shape.delimiter, shape.delimiter)
    problems = [
        Problem(
            f"{_cells(int(shape.widths[at]))}, but the header has {shape.width:,}",
            Place(file, row=at + 1),
            f"bring the row to {_cells(shape.width)}, or quote cells that hold a {name}",
        )
        for at in found[:_MOST].tolist()
    ]
    if found.size > _MOST:
        problems.append(
            Problem(
                f"{found.size - _MOST:,} more rows do not have {_cells(shape.width)}",
                Place(file),
                f"if {name} is not the delimiter, name the one that is",
            )
        )
    return problems


def _cells(number: int) -> str:
    return f"{number:,} cell" if number == 1 else f"{number:,} cells"
