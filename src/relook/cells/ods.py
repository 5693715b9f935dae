"""Cells of an .ods file, streamed.

A few bytes may say that a row is repeated a million times, so repeats are counted before they are
unfolded, and empty ones never are.

Reference: OASIS Open Document Format for Office Applications 1.3 (2021), Part 3, §9 and §19.
"""

from __future__ import annotations

import re
from collections.abc import Mapping

from relook.cells.limits import LONGEST_GAP, MOST_COMMENTS, MOST_MERGED, MOST_SHEETS, Meter
from relook.cells.model import EMPTY, Book, Cell, Sheet
from relook.cells.package import SAVE_AGAIN, Package
from relook.cells.xlsx_values import shortest
from relook.errors import Place, RelookError

_NS = "urn:oasis:names:tc:opendocument:xmlns:"
_TABLE = f"{_NS}table:1.0 "
_TEXT = f"{_NS}text:1.0 "
_OFFICE = f"{_NS}office:1.0 "
_STYLE = f"{_NS}style:1.0 "
_META = f"{_NS}meta:1.0 "
_CALC = "urn:org:documentfoundation:names:experimental:calc:xmlns:calcext:1.0 "
_CELLS = (f"{_TABLE}table-cell", f"{_TABLE}covered-table-cell")
_ROW = f"{_TABLE}table-row"
_PARAGRAPH = f"{_TEXT}p"
_COMMENT = f"{_OFFICE}annotation"
_ASIDE = (_COMMENT, f"{_TEXT}note", f"{_TABLE}shapes", f"{_TEXT}ruby-text")
_SPACE = re.compile("[ \t\r\n]+")
_DURATION = re.compile(r"PT(\d+)H(\d+)M(\d+)(?:[.,]\d+)?S")
_FORMATS = {"percentage": "0%", "date": "yyyy-mm-dd", "time": "hh:mm:ss"}


def read_ods(package: Package) -> Book:
    """Return the cells of every sheet.

    Raises
    ------
    RelookError
        The file is damaged, has no sheets, or unfolds beyond the limits.
    """
    reader = _ContentReader(package.file)
    package.parse("content.xml", reader.start, reader.end, reader.text)
    if not reader.sheets:
        raise RelookError("the file holds no sheet", where=Place(package.file), mend=SAVE_AGAIN)
    return Book(package.file, "ods", tuple(reader.sheets), _custom_properties(package))


class _ContentReader:
    """Handlers for content.xml."""

    def __init__(self, file: str) -> None:
        self.sheets: list[Sheet] = []
        self._file = file
        self._meter = Meter(file)
        self._hidden_styles: set[str] = set()
        self._style_name = ""
        self._depth = 0  # tables may stand within cells; those are not read
        self._title = ""
        self._hidden = False
        self._rows: list[tuple[Cell, ...]] = []
        self._merged: list[tuple[int, int, int, int]] = []
        self._comments: list[tuple[int, int, str]] = []
        self._said: list[str] | None = None  # of a comment that is being read
        self._gap = 0
        self._row_repeat = 1
        self._cells: list[Cell] = []
        self._empty_before = 0
        self._full = 0
        self._attributes: Mapping[str, str] | None = None
        self._paragraphs: list[str] = []
        self._pieces: list[str] | None = None
        self._aside = 0

    def start(self, tag: str, attributes: Mapping[str, str]) -> None:
        if tag in _ASIDE:
            self._aside += 1
            if tag == _COMMENT and self._aside == 1 and self._attributes is not None:
                self._said = []
        elif self._aside:
            if tag == _PARAGRAPH and self._said is not None:
                self._said.append("")
        elif tag == _PARAGRAPH:
            self._pieces = []
        elif self._pieces is not None:
            self._pieces.append(_inline(tag, attributes))
        elif tag in _CELLS and self._depth == 1:
            self._attributes = attributes
            self._paragraphs = []
        elif tag == _ROW and self._depth == 1:
            self._row_repeat = _repeat(attributes, "number-rows-repeated")
            self._cells = []
            self._empty_before = self._full = 0
        elif tag == f"{_TABLE}table":
            self._depth += 1
            if self._depth == 1:
                self._open_sheet(attributes)
        elif tag == f"{_STYLE}style":
            self._style_name = attributes.get(f"{_STYLE}name", "")
        elif tag == f"{_STYLE}table-properties" and attributes.get(f"{_TABLE}display") == "false":
            self._hidden_styles.add(self._style_name)

    def end(self, tag: str) -> None:
        if tag in _ASIDE:
            self._aside -= 1
            if tag == _COMMENT and self._said is not None:
                self._close_comment(self._said)
                self._said = None
        elif self._aside:
            return
        elif tag == _PARAGRAPH and self._pieces is not None:
            self._paragraphs.append(_collapsed(self._pieces))
            self._pieces = None
        elif tag in _CELLS and self._depth == 1:
            self._close_cell()
        elif tag == _ROW and self._depth == 1:
            self._close_row()
        elif tag == f"{_TABLE}table":
            self._depth -= 1
            if self._depth == 0:
                self.sheets.append(
                    Sheet(
                        self._title,
                        tuple(self._rows),
                        self._hidden,
                        tuple(self._merged),
                        tuple(self._comments),
                    )
                )

    def text(self, data: str) -> None:
        if self._pieces is not None and not self._aside:
            self._pieces.append(_SPACE.sub(" ", data))
        elif self._said:  # within a paragraph; date and author stand before the first
            self._said[-1] += data

    def _open_sheet(self, attributes: Mapping[str, str]) -> None:
        if len(self.sheets) >= MOST_SHEETS:
            raise RelookError(
                f"the file holds more than {MOST_SHEETS} sheets",
                where=Place(self._file),
                mend="keep only the sheets that are needed",
            )
        self._title = attributes.get(f"{_TABLE}name", "")
        self._hidden = attributes.get(f"{_TABLE}style-name", "") in self._hidden_styles
        self._rows = []
        self._merged = []
        self._comments = []
        self._gap = 0

    def _close_comment(self, paragraphs: list[str]) -> None:
        said = "\n".join(paragraphs).strip()
        if said and len(self._comments) < MOST_COMMENTS:
            row = len(self._rows) + self._gap + 1
            self._comments.append((row, len(self._cells) + self._empty_before + 1, said))

    def _close_cell(self) -> None:
        attributes = self._attributes
        if attributes is None:
            return
        self._attributes = None
        repeat = _repeat(attributes, "number-columns-repeated")
        cell = _cell(attributes, "\n".join(self._paragraphs))
        row = len(self._rows) + self._gap + 1
        self._note_merging(attributes, row)
        if cell is EMPTY:
            self._empty_before += repeat
            return
        self._meter.admit(self._title, row, len(self._cells) + self._empty_before + repeat)
        self._cells.extend([EMPTY] * self._empty_before)
        self._cells.extend([cell] * repeat)
        self._empty_before = 0
        self._full += repeat

    def _note_merging(self, attributes: Mapping[str, str], row: int) -> None:
        rows = int(attributes.get(f"{_TABLE}number-rows-spanned", "1"))
        columns = int(attributes.get(f"{_TABLE}number-columns-spanned", "1"))
        if (rows > 1 or columns > 1) and len(self._merged) < MOST_MERGED:
            column = len(self._cells) + self._empty_before + 1
            self._merged.append((row, column, row + rows - 1, column + columns - 1))

    def _close_row(self) -> None:
        repeat = self._row_repeat
        if not self._full:
            self._gap += repeat
            return
        row = len(self._rows) + self._gap + 1
        width = len(self._cells)
        self._meter.count_row(self._title, row, width, self._full, self._gap)
        if repeat > LONGEST_GAP:
            raise RelookError(
                f"row {row:,} is repeated {repeat:,} times",
                where=Place(self._file, self._title, row),
                mend="delete the repeated rows, and save again",
            )
        again = repeat - 1
        self._meter.count_row(self._title, row, width * again, self._full * again, 0)
        self._rows.extend([()] * self._gap)
        self._rows.extend([tuple(self._cells)] * repeat)
        self._gap = 0


def _repeat(attributes: Mapping[str, str], name: str) -> int:
    repeat = int(attributes.get(f"{_TABLE}{name}", "1"))
    if repeat < 1:
        raise ValueError(f"{name} is {repeat}")
    return repeat


def _inline(tag: str, attributes: Mapping[str, str]) -> str:
    if tag == f"{_TEXT}s":
        # A protected space: kept apart from those that collapse until the paragraph is complete.
        count = min(int(attributes.get(f"{_TEXT}c", "1")), 32_767)
        return "\x00" * count
    if tag == f"{_TEXT}tab":
        return "\t"
    if tag == f"{_TEXT}line-break":
        return "\n"
    return ""


def _collapsed(pieces: list[str]) -> str:
    joined = re.sub(" +", " ", "".join(pieces)).strip(" ")
    return joined.replace("\x00", " ")


def _cell(attributes: Mapping[str, str], text: str) -> Cell:
    kind = attributes.get(f"{_OFFICE}value-type", "")
    formula = attributes.get(f"{_TABLE}formula")
    plain = _plain_cell(kind, attributes, text)
    if formula is not None:
        # LibreOffice stores plain truth values and errors as formulas of themselves.
        if formula in ("of:=TRUE()", "of:=FALSE()"):
            return Cell("bool", formula[4:-2])
        if formula.startswith("of:=#"):
            return Cell("error", formula[4:])
        return Cell("formula", "=" + formula.partition("=")[2], plain.number_format, plain.text)
    return plain


def _plain_cell(kind: str, attributes: Mapping[str, str], text: str) -> Cell:
    number_format = _FORMATS.get(kind, "")
    if attributes.get(f"{_CALC}value-type") == "error":
        return Cell("error", text, number_format)
    if kind in ("float", "percentage", "currency"):
        return Cell("number", shortest(float(attributes[f"{_OFFICE}value"])), number_format)
    if kind == "boolean":
        true = attributes.get(f"{_OFFICE}boolean-value") == "true"
        return Cell("bool", "TRUE" if true else "FALSE")
    if kind == "date":
        stored = attributes.get(f"{_OFFICE}date-value", text)
        return Cell("date", stored.removesuffix("T00:00:00"), number_format)
    if kind == "time":
        stored = attributes.get(f"{_OFFICE}time-value", text)
        return Cell("date", _DURATION.sub(r"\1:\2:\3", stored), number_format)
    value = attributes.get(f"{_OFFICE}string-value", text)
    return Cell("text", value) if value else EMPTY


def _custom_properties(package: Package) -> dict[str, str]:
    found: dict[str, str] = {}
    current = ""

    def start(tag: str, attributes: Mapping[str, str]) -> None:
        nonlocal current
        current = attributes.get(f"{_META}name", "") if tag == f"{_META}user-defined" else ""
        if current:
            found[current] = ""

    def end(_: str) -> None:
        nonlocal current
        current = ""

    def text(data: str) -> None:
        if current:
            found[current] += data

    if "meta.xml" in package.names:
        package.parse("meta.xml", start, end, text)
    return found
