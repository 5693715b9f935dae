"""Workbooks, Parquet and JSON lines to the same frame of text cells as delimited text."""

from __future__ import annotations

import json
import re
from collections.abc import Sequence
from dataclasses import dataclass
from decimal import Decimal
from typing import Any

import numpy as np

from relook.cells.model import Book, Cell, Sheet
from relook.errors import Place, Problem, RelookError, listed, nearest
from relook.tables.arrow_columns import frame_of_columns
from relook.tables.delimited import Cells, drop_blank, frame_of_text
from relook.tables.headers import fold, letter

#: A header is looked for in this many rows of a sheet, so that a title above it does no harm.
_HEADER_WITHIN = 20
#: A column of text that takes fewer bytes a row is read as numbers into its few texts.
_FEW_BYTES = 3
#: Half of a character that takes two units in UTF-16; JSON can spell it, no text can hold it.
_HALF = re.compile("[\ud800-\udfff]")
_SHOWN_FORMAT = re.compile(r"(?P<whole>0+)(?P<places>\.0+)?(?P<percent>%?)")


@dataclass(frozen=True, slots=True)
class CellFault:
    """A cell that holds no text of its own: an error value, or a formula without a stored value."""

    row: int
    column: int
    text: str
    message: str


@dataclass(frozen=True, slots=True, eq=False)
class SheetCells:
    """The cells of a sheet, what it is called, and which of its cells cannot be used."""

    cells: Cells
    title: str
    faults: tuple[CellFault, ...]


def read_sheet(book: Book, sheet: str | None, wanted: Sequence[str]) -> SheetCells:
    """Take the table out of a workbook.

    Parameters
    ----------
    book : Book
    sheet : str or None
        Title of the sheet; None: the only one that fits.
    wanted : sequence of str
        Headers that the table must have; they tell which sheet and which row is meant.

    Raises
    ------
    RelookError
        No such sheet, none that fits, or several that do.
    """
    chosen = _choose_sheet(book, sheet, wanted)
    header_at = _header_row(chosen, wanted)
    assert header_at is not None
    records: list[list[str]] = []
    faults: list[CellFault] = []
    formulas = unshown = 0
    for row, cells in enumerate(chosen.rows, start=1):
        texts = []
        for column, cell in enumerate(cells):
            text, exact = shown_text(cell)
            texts.append(text)
            if cell.kind == "formula":
                formulas += 1
            unshown += not exact
            fault = _fault(cell)
            if fault is not None:
                faults.append(CellFault(row, column, text, fault))
        records.append(texts)
    header = _trimmed(records[header_at])
    problems = [
        Problem(
            "the row has a cell beyond the last header",
            Place(book.file, chosen.title, row, letter(len(header))),
            "give that column a header, or clear the cell",
        )
        for row, texts in enumerate(records[header_at + 1 :], start=header_at + 2)
        if any(text.strip() for text in texts[len(header) :])
    ]
    if problems:
        raise RelookError.from_problems(problems)
    body = records[header_at + 1 :]
    rows = np.arange(header_at + 2, header_at + 2 + len(body))
    said = f'sheet "{chosen.title}"'
    if header_at:
        said += f", header in row {header_at + 1}"
    if formulas:
        said += f", {formulas:,} formulas taken by their stored values"
    if unshown:
        said += f", {unshown:,} numbers taken as stored because of their cell format"
    frame = frame_of_text(body, len(header))
    cells_read = drop_blank(Cells(tuple(header), frame, rows, said))
    return SheetCells(cells_read, chosen.title, tuple(faults))


def shown_text(cell: Cell) -> tuple[str, bool]:
    """Return the text that a spreadsheet shows for a cell, and whether it is sure to be that.

    A number under a plain format such as ``000`` or ``0.00`` keeps its zeros; under a format of
    another kind (thousands, currency) it is given as stored, and the second value is False.
    """
    if cell.kind == "formula":
        return cell.cached, True
    if cell.kind != "number":
        return cell.text, True
    format_ = cell.number_format.strip()
    if format_ in ("", "@") or format_.casefold() in ("general", "standard"):
        return cell.text, True
    plain = _SHOWN_FORMAT.fullmatch(format_)
    if plain is None:
        return cell.text, False
    places = len(plain["places"] or ".") - 1
    number = Decimal(cell.text) * (100 if plain["percent"] else 1)
    rounded = f"{number:.{places}f}"
    if Decimal(rounded) != number:
        # The sheet shows fewer digits than it holds; hiding them would alter a label.
        return cell.text, False
    sign, digits = ("-", rounded[1:]) if rounded.startswith("-") else ("", rounded)
    whole, _, rest = digits.partition(".")
    shown = whole.zfill(len(plain["whole"])) + (f".{rest}" if rest else "")
    return sign + shown + plain["percent"], True


def _fault(cell: Cell) -> str | None:
    if cell.kind == "error":
        return f"the cell holds the error value {cell.text}"
    if cell.kind == "formula" and not cell.cached:
        return "the cell is a formula without a stored value"
    if cell.kind == "formula" and cell.cached.startswith("#") and cell.cached[1:2].isupper():
        return f"the formula in the cell gave the error value {cell.cached}"
    return None


def _choose_sheet(book: Book, title: str | None, wanted: Sequence[str]) -> Sheet:
    titles = [sheet.title for sheet in book.sheets]
    if title is not None:
        for sheet in book.sheets:
            if sheet.title == title:
                if _header_row(sheet, wanted) is None:
                    raise _no_fit(book, [sheet], wanted)
                return sheet
        close = nearest(title, titles)
        raise RelookError(
            f'there is no sheet "{title}"; the sheets are {listed(titles)}',
            where=Place(book.file),
            mend=f'did you mean "{close}"?' if close else "name one of these sheets",
        )
    filled = [sheet for sheet in book.sheets if any(_filled(row) for row in sheet.rows)]
    if not filled:
        raise RelookError(
            "the workbook is empty", where=Place(book.file), mend="give a table with a header"
        )
    fitting = [sheet for sheet in filled if _header_row(sheet, wanted) is not None]
    if not wanted:
        # A sheet of remarks has one column; a table of labels has two at least.
        wide = [sheet for sheet in fitting if max(_filled(row) for row in sheet.rows) > 1]
        fitting = wide or fitting
    if len(fitting) > 1:
        visible = [sheet for sheet in fitting if not sheet.hidden]
        fitting = visible if len(visible) == 1 else fitting
    if len(fitting) == 1:
        return fitting[0]
    if not fitting:
        raise _no_fit(book, filled, wanted)
    raise RelookError(
        f"several sheets could be meant: {listed(sheet.title for sheet in fitting)}",
        where=Place(book.file),
        mend='name the sheet: sheet = "…" in relook.toml, or --sheet',
    )


def _no_fit(book: Book, sheets: Sequence[Sheet], wanted: Sequence[str]) -> RelookError:
    headers = [
        cell.text for sheet in sheets for row in sheet.rows[:1] for cell in row if cell.text.strip()
    ]
    only = sheets[0].title if len(sheets) == 1 else None
    found = {fold(header) for header in headers}
    missing = [column for column in wanted if fold(column) not in found]
    close = nearest(missing[0], headers) if missing else None
    lack = "the sheet lacks" if only else "no sheet has"
    kind = "column" if len(missing or wanted) == 1 else "columns"
    return RelookError(
        f"{lack} the {kind} {listed(missing or wanted)}; the headers are {listed(headers)}",
        where=Place(book.file, only),
        mend=f'did you mean "{close}"?' if close else "name columns that are there",
    )


def _header_row(sheet: Sheet, wanted: Sequence[str]) -> int | None:
    """The first row that holds every wanted header; without any wanted, the likeliest."""
    if wanted:
        folded = {fold(header) for header in wanted}
        for at, row in enumerate(sheet.rows[:_HEADER_WITHIN]):
            if folded <= {fold(cell.text) for cell in row}:
                return at
        return None
    filled = [_filled(row) for row in sheet.rows[:_HEADER_WITHIN]]
    if not any(filled):
        return None
    # A title stands alone in its row; the header is the first row as wide as what follows it.
    widest = max(filled)
    return next(at for at, number in enumerate(filled) if number * 2 > widest or number == widest)


def _filled(row: Sequence[Cell]) -> int:
    return sum(1 for cell in row if cell.text.strip() or cell.cached.strip())


def _trimmed(texts: list[str]) -> list[str]:
    last = max((at for at, text in enumerate(texts) if text.strip()), default=-1)
    return texts[: last + 1]


def read_parquet(data: bytes, file: str) -> Cells:
    """Read a Parquet file; its first record counts as row 2, as in a sheet with a header.

    Raises
    ------
    RelookError
        pyarrow is not installed, the file is damaged, or a column is nested.
    """
    try:
        import pyarrow as pa
        import pyarrow.parquet as pq
    except ImportError:
        raise RelookError(
            "reading Parquet needs pyarrow, which is not installed",
            where=Place(file),
            mend='run: pip install "relook[fast]", or give the table as CSV',
        ) from None
    try:
        held = pq.ParquetFile(pa.BufferReader(data))
        table = pq.read_table(pa.BufferReader(data), read_dictionary=_of_few_texts(held))
    except (pa.ArrowException, OSError):
        raise RelookError(
            "the Parquet file is damaged",
            where=Place(file),
            mend="write it again, or give the table as CSV",
        ) from None
    columns = {}
    for at, name in enumerate(table.column_names):
        column = table.column(at)
        if pa.types.is_nested(column.type):
            raise RelookError(
                f"the cells hold {column.type}, not single values",
                where=Place(file, column=name),
                mend="write a column of text, lists joined by a separator",
            )
        columns[at] = _arrow_texts(column, pa)
    frame = frame_of_columns(columns)
    rows = np.arange(2, 2 + len(frame), dtype=np.int32)
    return drop_blank(Cells(tuple(table.column_names), frame, rows, "Parquet"))


def _of_few_texts(file: Any) -> list[str]:
    """The columns that take so few bytes a row that only the numbers of texts can be in them."""
    held = file.metadata
    sizes = [0] * held.num_columns
    for group in range(held.num_row_groups):
        for at in range(held.num_columns):
            sizes[at] += held.row_group(group).column(at).total_uncompressed_size
    paths = [held.schema.column(at).path for at in range(held.num_columns)]
    most = _FEW_BYTES * held.num_rows
    return [path for path, size in zip(paths, sizes, strict=True) if size < most]


def _arrow_texts(column: Any, pa: Any) -> Any:
    """An Arrow column as one of texts: whole floats without ".0", missing values empty."""
    if pa.types.is_dictionary(column.type):
        if column.type.value_type == pa.string() and column.null_count == 0:
            return column
        column = column.cast(column.type.value_type)
    if pa.types.is_string(column.type) or pa.types.is_large_string(column.type):
        return column if column.null_count == 0 else column.fill_null("")
    # What a value is called is worked out once for each that occurs.
    encoded = column.combine_chunks().dictionary_encode(null_encoding="encode")
    values = encoded.dictionary.to_pylist()
    if pa.types.is_floating(column.type):
        texts = [_float_text(value) for value in values]
    elif pa.types.is_boolean(column.type):
        texts = ["" if value is None else str(value).lower() for value in values]
    elif pa.types.is_binary(column.type) or pa.types.is_large_binary(column.type):
        texts = ["" if v is None else v.decode("utf-8", "replace") for v in values]
    else:
        texts = ["" if value is None else str(value) for value in values]
    return pa.chunked_array([pa.array(texts, pa.string()).take(encoded.indices)])


def _float_text(value: float | None) -> str:
    if value is None or value != value:
        return ""
    return str(int(value)) if value == int(value) and abs(value) < 1e15 else repr(value)


def read_json_lines(data: bytes, file: str) -> Cells:
    """Read JSON lines: an object per line, its row the line's number. Numbers keep their digits.

    Raises
    ------
    RelookError
        A line that is no object, a key given twice in one, or a value that is a list or an object.
    """
    problems: list[Problem] = []
    records: list[dict[str, str]] = []
    rows: list[int] = []
    header: dict[str, None] = {}
    for row, line in enumerate(data.decode().split("\n"), start=1):
        if not line.strip():
            continue
        record = _json_record(line, Place(file, row=row), problems)
        header.update(dict.fromkeys(record))
        records.append(record)
        rows.append(row)
    if problems:
        raise RelookError.from_problems(problems)
    names = tuple(header)
    frame = frame_of_text(
        [[record.get(name, "") for name in names] for record in records], len(names)
    )
    return drop_blank(Cells(names, frame, np.array(rows, dtype=np.int64), "JSON lines"))


def _json_record(line: str, where: Place, problems: list[Problem]) -> dict[str, str]:
    def texts(pairs: list[tuple[str, Any]]) -> dict[str, Any]:
        names = [name for name, _ in pairs]
        problems.extend(
            Problem(f'the key "{name}" occurs twice', where, "keep one of them")
            for name in dict.fromkeys(names)
            if names.count(name) > 1
        )
        return dict(pairs)

    try:
        found = json.loads(
            line, parse_float=str, parse_int=str, parse_constant=str, object_pairs_hook=texts
        )
    except (ValueError, RecursionError):
        problems.append(
            Problem("the line is not JSON", where, "write one JSON object per line, nothing else")
        )
        return {}
    if not isinstance(found, dict):
        problems.append(
            Problem(
                "the line is not a JSON object", where, 'write {"item": …, "coder": …} per line'
            )
        )
        return {}
    record = {}
    for name, value in found.items():
        if _HALF.search(name) or (isinstance(value, str) and _HALF.search(value)):
            problems.append(
                Problem(
                    "the line holds half of a character, which is no text (an escape from \\ud800 "
                    "to \\udfff without its other half)",
                    where,
                    "write the whole character, or take the escape out",
                )
            )
            return {}
        if isinstance(value, dict | list):
            problems.append(
                Problem(
                    "the value is a list or an object, not a single value",
                    Place(where.file, row=where.row, column=name),
                    "write it as text, several labels joined by a separator",
                )
            )
        elif value is None:
            record[name] = ""
        else:
            record[name] = value if isinstance(value, str) else str(value).lower()
    return record
