"""A returned worksheet: which sheet, columns and rows of a workbook are ours.

The queue sheet is known by its headers, columns by their headers, rows by their codes. Sheets may
have been renamed or copied, columns moved or inserted, rows sorted, the header among them.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

from relook.cells.limits import column_letters
from relook.cells.model import EMPTY, Book, Cell, Sheet
from relook.errors import Place, Problem, RelookError, listed, nearest
from relook.worksheet.beside import beside_table, comments, other_sheets
from relook.worksheet.keys import ROW_CODE, plain_key
from relook.worksheet.matching import folded
from relook.worksheet.model import (
    FORMAT,
    HEADER_DECISION,
    HEADER_ITEM,
    HEADER_KEY,
    HEADER_LABEL,
    HEADER_NOTE,
    HEADER_REASON,
    HEADER_TICK,
    HEADER_VARIABLE,
    PROPERTY_FORMAT,
    PROPERTY_PROJECT,
    PROPERTY_WORKSHEET,
)

_LEAST_HEADERS = 2  # of ours, in one row, to tell the header row
_TICK = folded(HEADER_TICK.format(label="\x00")).partition("\x00")[0]
#: Where decisions stand in a queue sheet, and labels in a coding sheet.
_FIELDS = (HEADER_DECISION, HEADER_LABEL)
_OURS = (HEADER_KEY, HEADER_ITEM, HEADER_VARIABLE, *_FIELDS, HEADER_REASON, HEADER_NOTE)


@dataclass(frozen=True, slots=True, kw_only=True)
class ReturnedRow:
    """One row of a returned queue sheet.

    Attributes
    ----------
    sheet : str
        Title of the sheet; "" in a CSV file.
    row : int
    key : str
        The row code in its own form; "" where the row has none.
    decision : Cell
    decision_column : str
        Letter of the decision column.
    merged_into : str
        The cell, such as "F5", into which the empty decision cell was merged; "" where it was not.
    ticked : tuple of str
        Labels whose columns hold a mark, as the headers name them, case-folded.
    reason, note : str
    evidence : mapping of str to str
        Texts of the other cells by header, case-folded.
    """

    sheet: str
    row: int
    key: str
    decision: Cell
    decision_column: str
    merged_into: str = ""
    ticked: tuple[str, ...] = ()
    reason: str = ""
    note: str = ""
    evidence: Mapping[str, str]


@dataclass(frozen=True, slots=True, kw_only=True)
class ReturnedWorksheet:
    """A workbook that came back.

    Attributes
    ----------
    file : str
    project, worksheet : str
        Ids as the file tells them; "" where it does not.
    rows : tuple of ReturnedRow
        Every row of every queue sheet that has a row code or a decision.
    columns : mapping of str to str
        Letters of the columns by header, case-folded, of the first queue sheet.
    notes : tuple of Problem
        What had to be guessed, and what stands where nothing is read from.
    """

    file: str
    project: str
    worksheet: str
    rows: tuple[ReturnedRow, ...]
    columns: Mapping[str, str]
    notes: tuple[Problem, ...] = ()


def is_own_header(header: str) -> bool:
    """Whether a case-folded header is that of a column to fill in, or of the row itself."""
    return header in {folded(own) for own in _OURS} or header.startswith(_TICK)


def read_worksheet(book: Book) -> ReturnedWorksheet:
    """Find the queue in a returned workbook.

    Parameters
    ----------
    book : Book

    Raises
    ------
    RelookError
        No sheet has the columns of a queue, a column is there twice with different decisions, or
        the worksheet was written by a newer version.
    """
    identity = _identity(book)
    _check_format(identity.get(PROPERTY_FORMAT, ""), book.file)
    queues = [found for sheet in book.sheets if (found := _find_queue(sheet)) is not None]
    if not queues:
        raise _no_queue(book)
    rows: list[ReturnedRow] = []
    notes = [Problem(note, Place(book.file), severity="note") for note in book.notes]
    for queue in queues:
        columns, said = _columns(queue, book.file)
        notes += said
        own = _rows(queue, columns)
        rows += own
        notes += beside_table(
            queue.sheet,
            book.file,
            header_row=queue.header_row,
            columns={*(at for each in queue.headers.values() for at in each), columns.key},
            rows={row.row - 1 for row in own} | set(_repeated_headers(queue, columns)),
        )
    notes += [*comments(book), *other_sheets(book, [queue.sheet for queue in queues])]
    return ReturnedWorksheet(
        file=book.file,
        project=identity.get(PROPERTY_PROJECT, ""),
        worksheet=identity.get(PROPERTY_WORKSHEET, ""),
        rows=tuple(rows),
        columns={
            header: column_letters(indices[0] + 1) for header, indices in queues[0].headers.items()
        },
        notes=tuple(notes),
    )


@dataclass(frozen=True, slots=True)
class _Queue:
    sheet: Sheet
    header_row: int  # index into the sheet's rows
    headers: Mapping[str, tuple[int, ...]]  # column indices by case-folded header


def _identity(book: Book) -> dict[str, str]:
    """Return what the file says of itself: in its properties, else on a sheet."""
    wanted = (PROPERTY_PROJECT, PROPERTY_WORKSHEET, PROPERTY_FORMAT)
    found = {name: book.properties[name] for name in wanted if book.properties.get(name)}
    if len(found) == len(wanted):
        return found
    for sheet in book.sheets:
        for row in sheet.rows[:50]:
            for index, cell in enumerate(row[:-1]):
                if cell.text in wanted and row[index + 1].text:
                    found.setdefault(cell.text, row[index + 1].text)
    return found


def _check_format(text: str, file: str) -> None:
    number = text.partition(".")[0]  # some programs store it as a number
    if number.isdecimal() and int(number) > FORMAT:
        raise RelookError(
            f"the worksheet was written by a newer relook (format {number})",
            where=Place(file),
            mend="update relook",
        )


def _find_queue(sheet: Sheet) -> _Queue | None:
    """Return the queue of a sheet, None where it has none.

    The header row is the one with the row code and the field to fill in; where no row has both, the
    first with two headers of ours and row codes in one of its columns.
    """
    ours = {folded(header) for header in _OURS}
    second: _Queue | None = None
    for number, row in enumerate(sheet.rows):
        if len(row) < _LEAST_HEADERS:
            continue
        texts = [folded(cell.text) if cell.kind == "text" else "" for cell in row]
        found = ours.intersection(texts)
        if len(found) < _LEAST_HEADERS:
            continue
        headers: dict[str, tuple[int, ...]] = {}
        for index, text in enumerate(texts):
            if text:
                headers[text] = (*headers.get(text, ()), index)
        queue = _Queue(sheet, number, headers)
        if HEADER_KEY in found and _field_of(headers) is not None:
            return queue
        second = second or queue
    if second is None:
        return None
    if _field_of(second.headers) is None or _column_of_keys(sheet) is not None:
        return second
    return None


def _field_of(headers: Mapping[str, object]) -> str | None:
    return next((field for field in _FIELDS if field in headers), None)


def _column_of_keys(sheet: Sheet) -> int | None:
    counts: dict[int, int] = {}
    for row in sheet.rows:
        for index, cell in enumerate(row):
            if cell.kind == "text" and ROW_CODE.fullmatch(plain_key(cell.text[:40])):
                counts[index] = counts.get(index, 0) + 1
    return max(counts, key=lambda index: (counts[index], -index)) if counts else None


@dataclass(frozen=True, slots=True)
class _Columns:
    key: int
    decision: int
    reason: int | None
    note: int | None
    ticks: Mapping[int, str]  # label, case-folded, by column
    evidence: Mapping[str, int]


def _columns(queue: _Queue, file: str) -> tuple[_Columns, list[Problem]]:
    notes: list[Problem] = []
    headers = queue.headers
    where = Place(file, queue.sheet.title or None, queue.header_row + 1)
    key: int | None
    if HEADER_KEY in headers:
        key = _best_key_column(queue, headers[HEADER_KEY])
    else:
        key = _column_of_keys(queue.sheet)
        if key is None:
            raise _missing_column((HEADER_KEY,), headers, where)
        letter = column_letters(key + 1)
        said = f'no column is called "{HEADER_KEY}"; the row codes were found in column {letter}'
        notes.append(Problem(said, where, severity="note"))
    field = _field_of(headers)
    if field is None:
        # A coding sheet has no reasons; without that column either may have been meant.
        meant = (HEADER_DECISION,) if HEADER_REASON in headers else _FIELDS
        raise _missing_column(meant, headers, where)
    decision = _only_filled(queue, field, where)
    reason, note = headers.get(HEADER_REASON), headers.get(HEADER_NOTE)
    taken = {HEADER_KEY, field, HEADER_REASON, HEADER_NOTE}
    ticks = {
        indices[0]: header.removeprefix(_TICK)
        for header, indices in headers.items()
        if header.startswith(_TICK)
    }
    columns = _Columns(
        key=key,
        decision=decision,
        reason=None if reason is None else reason[-1],
        note=None if note is None else note[-1],
        ticks=ticks,
        evidence={header: indices[0] for header, indices in headers.items() if header not in taken},
    )
    return columns, notes


def _best_key_column(queue: _Queue, indices: Sequence[int]) -> int:
    if len(indices) == 1:
        return indices[0]
    return max(
        indices,
        key=lambda index: sum(
            1
            for row in queue.sheet.rows
            if ROW_CODE.fullmatch(plain_key(_at(row, index).text[:40]))
        ),
    )


def _only_filled(queue: _Queue, field: str, where: Place) -> int:
    """Return the decision column; of copies of it, the only one with anything in it."""
    indices = queue.headers[field]
    filled = [
        index
        for index in indices
        if any(
            _at(row, index) is not EMPTY
            for number, row in enumerate(queue.sheet.rows)
            if number != queue.header_row
        )
    ]
    if len(filled) > 1:
        letters = [column_letters(index + 1) for index in filled]
        raise RelookError(
            f'{len(filled)} columns are called "{field}": {", ".join(letters)}',
            where=where,
            mend=f"rename the columns that do not hold the {field}s",
        )
    return filled[0] if filled else indices[0]


def _rows(queue: _Queue, columns: _Columns) -> list[ReturnedRow]:
    merged = {
        (row, columns.decision + 1): f"{column_letters(left)}{top}"
        for top, left, bottom, right in queue.sheet.merged
        if left <= columns.decision + 1 <= right
        for row in range(top, min(bottom, len(queue.sheet.rows)) + 1)
        if (row, columns.decision + 1) != (top, left)
    }
    letter = column_letters(columns.decision + 1)
    rows = []
    for number, cells in enumerate(queue.sheet.rows):
        if number == queue.header_row or not cells:
            continue
        key = plain_key(_at(cells, columns.key).text[:40])
        decision = _at(cells, columns.decision)
        into = merged.get((number + 1, columns.decision + 1), "")
        ticked = tuple(
            label for index, label in columns.ticks.items() if folded(_at(cells, index).text)
        )
        has_key = ROW_CODE.fullmatch(key) is not None
        if not has_key and (number < queue.header_row or not (decision.text or ticked or key)):
            continue
        if _repeats_header(cells, columns):
            continue
        rows.append(
            ReturnedRow(
                sheet=queue.sheet.title,
                row=number + 1,
                key=key,
                decision=decision,
                decision_column=letter,
                merged_into=into if decision is EMPTY else "",
                ticked=ticked,
                reason=_said(cells, columns.reason),
                note=_said(cells, columns.note),
                evidence={
                    header: _text(_at(cells, index)) for header, index in columns.evidence.items()
                },
            )
        )
    return rows


def _repeated_headers(queue: _Queue, columns: _Columns) -> list[int]:
    """Rows that are the header once more, as after two sheets were joined."""
    return [at for at, cells in enumerate(queue.sheet.rows) if _repeats_header(cells, columns)]


def _repeats_header(cells: Sequence[Cell], columns: _Columns) -> bool:
    return (
        folded(_at(cells, columns.key).text) == HEADER_KEY
        and folded(_at(cells, columns.decision).text) in _FIELDS
    )


def _at(cells: Sequence[Cell], index: int) -> Cell:
    return cells[index] if index < len(cells) else EMPTY


def _text(cell: Cell) -> str:
    return cell.cached or cell.text if cell.kind == "formula" else cell.text


def _said(cells: Sequence[Cell], index: int | None) -> str:
    """Return what was written into a free cell; a formula as it was typed."""
    return "" if index is None else _at(cells, index).text.strip()


def _missing_column(
    wanted: Sequence[str], headers: Mapping[str, object], where: Place
) -> RelookError:
    name = " or ".join(f'"{header}"' for header in wanted)
    close = next((found for header in wanted if (found := nearest(header, headers))), None)
    mend = (
        f'rename the column "{close}" to {name}'
        if close is not None
        else f"write {name} above its column (found: {listed(headers)})"
    )
    return RelookError(f"no column is called {name}", where=where, mend=mend)


def _no_queue(book: Book) -> RelookError:
    titles = [sheet.title for sheet in book.sheets if sheet.title]
    sheets = f"; its sheets are {listed(titles)}" if titles else ""
    return RelookError(
        f'no sheet has the columns "{HEADER_KEY}" and "{HEADER_DECISION}" or "{HEADER_LABEL}"'
        f"{sheets}",
        where=Place(book.file),
        mend="if this is a returned worksheet, restore its header row; else take the file away",
    )
