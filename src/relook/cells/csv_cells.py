"""Cells of a sheet that came back as CSV: all of them text."""

from __future__ import annotations

import codecs
import csv
import io
import re
from collections import Counter
from collections.abc import Iterator

from relook.cells.limits import Meter
from relook.cells.model import EMPTY, Book, Cell, Sheet
from relook.errors import Place, RelookError

_DELIMITERS = (",", ";", "\t", "|")
_NAMES = {",": "comma", ";": "semicolon", "\t": "tab", "|": "bar"}
_BINARY = re.compile("[\x00-\x08]")
_SAMPLE = 200  # rows looked at to find the delimiter


def read_csv(data: bytes, file: str) -> Book:
    """Return the cells of a delimited text; encoding and delimiter are found and said in the notes.

    Raises
    ------
    RelookError
        The bytes are no text, or the quoting is broken beyond reading.
    """
    text, encoding = _decode(data, file)
    first_line, _, _ = text.partition("\n")
    announced = first_line.strip().strip('"').lower()
    if announced.startswith("sep=") and len(announced) == 5:
        delimiter = announced[4]
    else:
        delimiter = _guess_delimiter(text, file)
    meter = Meter(file)
    rows: list[tuple[Cell, ...]] = []
    gap = 0
    known: dict[str, Cell] = {"": EMPTY}
    for number, record in enumerate(_records(text, delimiter, file), start=1):
        if number == 1 and announced.startswith("sep="):
            record = []
        cells = _trimmed(record, known)
        if not cells:
            gap += 1
            continue
        meter.admit("", number, len(cells))
        meter.count_row("", number, len(cells), len(cells), gap)
        rows.extend([()] * gap)
        rows.append(cells)
        gap = 0
    note = f"read as {encoding}, delimiter {_NAMES.get(delimiter, delimiter)}"
    return Book(file, "csv", (Sheet("", tuple(rows)),), notes=(note,))


def _trimmed(record: list[str], known: dict[str, Cell]) -> tuple[Cell, ...]:
    width = len(record)
    while width and not record[width - 1]:
        width -= 1
    cells = []
    for text in record[:width]:
        cell = known.get(text)
        if cell is None:
            cell = known[text] = Cell("text", text)
        cells.append(cell)
    return tuple(cells)


def _decode(data: bytes, file: str) -> tuple[str, str]:
    encodings = ["utf-8-sig"]
    if data.startswith((codecs.BOM_UTF16_LE, codecs.BOM_UTF16_BE)):
        encodings = ["utf-16"]
    else:
        encodings.append("cp1252")  # what Windows programs write when they do not write UTF-8
    for encoding in encodings:
        try:
            text = data.decode(encoding)
        except UnicodeDecodeError:
            continue
        if _BINARY.search(text):
            break
        return text, encoding.removesuffix("-sig")
    raise RelookError(
        "the file is neither a spreadsheet nor a text table",
        where=Place(file),
        mend="save it as .xlsx, .ods or .csv in the spreadsheet program",
    )


def _records(text: str, delimiter: str, file: str) -> Iterator[list[str]]:
    number = 0
    reader = csv.reader(io.StringIO(text, newline=""), delimiter=delimiter)
    try:
        for record in reader:
            number += 1
            yield record
    except csv.Error as fault:
        raise RelookError(
            f"the row cannot be read as CSV ({fault})",
            where=Place(file, row=number + 1),
            mend='look for a quotation mark (") that is not closed there',
        ) from fault


def _guess_delimiter(text: str, file: str) -> str:
    """Return the delimiter under which most rows have the same number of cells, two or more."""
    best, best_score = ",", (0, 0)
    for delimiter in _DELIMITERS:
        widths: Counter[int] = Counter()
        try:
            for record, _ in zip(_records(text, delimiter, file), range(_SAMPLE), strict=False):
                widths[len(record)] += 1
        except RelookError:
            continue
        width, rows = max(widths.items(), key=lambda pair: (pair[0] > 1, pair[1], pair[0]))
        if width > 1 and (rows, width) > best_score:
            best, best_score = delimiter, (rows, width)
    return best
