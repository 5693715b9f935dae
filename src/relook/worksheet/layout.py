"""Which columns a queue sheet has, what stands in their cells, how wide and how high.

The one place that says what text goes into which evidence cell: whoever writes a sheet, and
whoever fingerprints it, asks here.
"""

from __future__ import annotations

import unicodedata
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from typing import Literal

from relook.worksheet.model import (
    HEADER_COMPETING,
    HEADER_DECISION,
    HEADER_ITEM,
    HEADER_KEY,
    HEADER_LABEL,
    HEADER_NOTE,
    HEADER_REASON,
    HEADER_TICK,
    HEADER_VARIABLE,
    SheetRow,
    SheetVariable,
    Worksheet,
)

Role = Literal[
    "key", "item", "shown", "variable", "label", "coder", "remark", "tick", "decision", "reason",
    "note",
]  # fmt: skip

#: Beyond this many competing labels they stand sorted in one cell.
MOST_LABEL_COLUMNS = 6
#: Beyond this many coders or set labels there are no columns of their own for them.
MOST_CODER_COLUMNS = 8
MOST_TICK_COLUMNS = 12
HEADER_CODER = "by {coder}"
HEADER_CODERS = "by coder"
HEADER_REMARKS = "remarks"

BODY, TEXT, SMALL = 10.0, 11.5, 8.0
MOST_REPEAT_LINES = 4


@dataclass(frozen=True, slots=True)
class Column:
    """A column of the queue sheet.

    Attributes
    ----------
    header : str
        Unique within the sheet, case aside.
    role : str
    width : float
        In characters of the default font.
    index : int
        Which shown column, competing label, coder or tick this is, from 0.
    """

    header: str
    role: Role
    width: float
    index: int = 0

    @property
    def is_read(self) -> bool:
        """Whether an adjudicator is to read it, not to fill it in."""
        return self.role not in ("tick", "decision", "reason", "note")

    @property
    def is_evidence(self) -> bool:
        """Whether it is read and may be edited by mistake: all but the row's code."""
        return self.is_read and self.role != "key"


def tick_labels(variables: Sequence[SheetVariable]) -> tuple[str, ...]:
    """Return the labels that get a column to tick, in the code book's order.

    Sets are ticked as long as all the set variables of a sheet together have at most twelve
    labels. Beyond that a set is typed into the decision cell, its labels joined by the separator.
    """
    labels = dict.fromkeys(
        label for variable in variables if variable.entry == "set" for label in variable.labels
    )
    return tuple(labels) if len(labels) <= MOST_TICK_COLUMNS else ()


def coder_columns(rows: Sequence[SheetRow]) -> tuple[str, ...]:
    """Return the coders that get a column each; none where they are hidden or too many."""
    coders = sorted({coder for row in rows for coder, _ in row.coders})
    return tuple(coders) if len(coders) <= MOST_CODER_COLUMNS else ()


def columns_of(worksheet: Worksheet) -> tuple[Column, ...]:
    """Return the columns of a worksheet's queue sheet, from left to right."""
    rows = worksheet.rows
    shown = _shown_widths(worksheet)
    labels = max((_label_cells(row) for row in rows), default=0)
    label_width = _fitting((label for row in rows for label in row.competing), 10, 18)
    wanted = [
        Column(HEADER_KEY, "key", 13.5),
        Column(HEADER_ITEM, "item", _fitting((row.item for row in rows), 7, 16)),
        *(
            Column(header, "shown", width, index)
            for index, (header, width) in enumerate(
                zip(worksheet.shown_columns, shown, strict=True)
            )
        ),
        Column(HEADER_VARIABLE, "variable", _fitting((v.name for v in worksheet.variables), 9, 18)),
        *(
            Column(HEADER_COMPETING.format(number=number + 1), "label", label_width, number)
            for number in range(labels)
        ),
    ]
    coders = coder_columns(rows)
    wanted += [
        Column(HEADER_CODER.format(coder=coder), "coder", label_width, index)
        for index, coder in enumerate(coders)
    ]
    if not coders and any(row.coders for row in rows):
        wanted.append(Column(HEADER_CODERS, "coder", 32))
    if any(row.remarks for row in rows):
        wanted.append(Column(HEADER_REMARKS, "remark", 32))
    wanted += [
        Column(
            HEADER_TICK.format(label=label), "tick", max(9.0, min(14.0, len(label) + 6.0)), index
        )
        for index, label in enumerate(tick_labels(worksheet.variables))
    ]
    choices = [label for variable in worksheet.variables for label in variable.labels]
    field = HEADER_LABEL if worksheet.is_coding else HEADER_DECISION
    wanted.append(Column(field, "decision", _fitting([*choices, "cannot be coded"], 16, 26)))
    if not worksheet.is_coding:
        wanted.append(Column(HEADER_REASON, "reason", _fitting(worksheet.reasons, 16, 22)))
    wanted.append(Column(HEADER_NOTE, "note", 28))
    return _with_unique_headers(wanted)


def _with_unique_headers(wanted: Sequence[Column]) -> tuple[Column, ...]:
    """Rename shown columns whose header is one of ours, or there twice."""
    ours = {column.header.casefold() for column in wanted if column.role != "shown"}
    # On reading either of the two is where decisions stand, so no sheet shows a column by its name.
    ours |= {HEADER_DECISION, HEADER_LABEL}
    columns, taken = [], set(ours)
    for column in wanted:
        header = column.header
        if column.role == "shown":
            bare = header if header.strip() else "column"
            header = f"{bare} (shown)" if bare.casefold() in ours else bare
            number = 1
            while header.casefold() in taken:
                number += 1
                header = f"{bare} ({number})"
            taken.add(header.casefold())
        columns.append(Column(header, column.role, column.width, column.index))
    return tuple(columns)


def _label_cells(row: SheetRow) -> int:
    return len(row.competing) if len(row.competing) <= MOST_LABEL_COLUMNS else 1


def label_texts(row: SheetRow) -> tuple[str, ...]:
    """Return what stands in the label cells of a row: a label each, or all of them in one."""
    if row.tallies:
        texts = tuple(
            f"{label} × {count}" for label, count in zip(row.competing, row.tallies, strict=True)
        )
    else:
        texts = row.competing
    if len(texts) <= MOST_LABEL_COLUMNS:
        return texts
    return ("\n".join(f"· {text}" for text in texts),)


def cell_text(row: SheetRow, column: Column, coders: Sequence[str]) -> str:
    """Return the text of an evidence cell, or the row's code.

    Parameters
    ----------
    row : SheetRow
    column : Column
    coders : sequence of str
        The coders that have a column each (`coder_columns`).
    """
    at = column.index
    match column.role:
        case "key":
            return row.key
        case "item":
            return row.item
        case "shown":
            return row.shown[at] if at < len(row.shown) else ""
        case "variable":
            return row.variable
        case "label":
            texts = label_texts(row)
            return texts[at] if at < len(texts) else ""
        case "coder" if coders:
            return dict(row.coders).get(coders[at], "")
        case "coder":
            return "\n".join(f"{coder}: {label}" for coder, label in row.coders)
        case "remark":
            return "\n".join(row.remarks)
    return ""


def evidence_cells(worksheet: Worksheet) -> tuple[dict[str, str], ...]:
    """Return header and text of every evidence cell, row by row.

    The digests of these (`relook.worksheet.keys.evidence_digests`) tell later whether a returned
    sheet still shows what was sent.
    """
    evidence = [column for column in columns_of(worksheet) if column.is_evidence]
    coders = coder_columns(worksheet.rows)
    return tuple(
        {column.header: cell_text(row, column, coders) for column in evidence}
        for row in worksheet.rows
    )


# Widths and heights.


def _shown_widths(worksheet: Worksheet) -> list[float]:
    """Give the longest of the shown columns most of the page, the others what they need."""
    count = len(worksheet.shown_columns)
    typical = []
    for index in range(count):
        lengths = sorted(len(row.shown[index]) for row in worksheet.rows if index < len(row.shown))
        typical.append(lengths[len(lengths) * 9 // 10] if lengths else 0)
    if not count:
        return []
    main = max(range(count), key=lambda index: (typical[index], -index))
    widths = []
    for index, header in enumerate(worksheet.shown_columns):
        least = max(9.0, min(18.0, len(header) + 2.0))
        if index == main:
            widths.append(max(least, 34.0, min(72.0, 24 + typical[index] / 4)))
        else:
            widths.append(max(least, min(26.0, typical[index] + 2.0)))
    return widths


def main_shown_column(worksheet: Worksheet) -> int:
    """Return the index of the shown column that holds the item's text, the widest one."""
    widths = _shown_widths(worksheet)
    return max(range(len(widths)), key=lambda index: (widths[index], -index), default=0)


def _fitting(texts: Iterable[str], least: float, most: float) -> float:
    """Return the width at which the longest of some short texts fits, within bounds."""
    longest = max((display_width(text) for text in set(texts)), default=0.0)
    return max(least, min(most, longest + 2.5))


#: Advance widths of Calibri, and of Carlito, which has the same ones, in 1/2048 em; a column's
#: width is counted in digits, of 1038.
_DIGIT = 1038
_INSET = 0.9  # what a cell keeps free at its sides, in digits
_ADVANCES = {
    462: " ijl'`|.,:;", 625: "ftrI()[]{}-/\\!\"", 850: "szcJLF?_", 930: "kvxygES*^T<>=+~#$",
    1076: "abdehnopquBKPXYCRVZ", 1038: "0123456789", 1290: "AGHNOUD&", 1470: "wQ", 1700: "m%@MW",
}  # fmt: skip


class _Widths(dict[str, float]):
    """Widths of characters in digits, worked out once for those that no table lists."""

    def __missing__(self, character: str) -> float:
        width = self[character] = _other_width(character)
        return width


_WIDTHS = _Widths(
    (character, advance / _DIGIT) for advance, group in _ADVANCES.items() for character in group
)


def display_width(text: str) -> float:
    """Return the width of a line in digits of its own font size.

    Characters beyond ASCII come from fonts unknown and are taken for rather wide: East Asian ones
    and pictographs count two, marks none.
    """
    return sum(map(_WIDTHS.__getitem__, text))


def _other_width(character: str) -> float:
    if unicodedata.category(character) in ("Cf", "Mn", "Me", "Cc"):
        return 0.0
    if unicodedata.east_asian_width(character) in "WF":
        return 2.0
    return 1.3 if character.isupper() else 1.2


def wrapped_lines(text: str, width: float) -> int:
    """Estimate how many lines a text takes, wrapped at words within `width` characters.

    Spreadsheet programs do not tell, so words are laid out greedily by the widths of their
    characters. A word longer than a line is broken.
    """
    limit = max(1.0, width - _INSET)
    space = _WIDTHS[" "]
    lines = 0
    for paragraph in text.split("\n"):
        lines += 1
        if len(paragraph) * 2 <= limit:
            continue
        used = 0.0
        for word in paragraph.split(" "):
            wide = display_width(word)
            if used and used + space + wide > limit:
                lines += 1
                used = 0.0
            elif used:
                used += space
            if wide > limit:
                extra = int((used + wide - 1e-9) // limit)
                lines += extra
                used = used + wide - extra * limit
            else:
                used += wide
    return lines


def text_height(text: str, width: float, size: float) -> float:
    """Estimate the height, in points, of a text of a font size in a column of a width."""
    return wrapped_lines(text, width * 11.0 / size) * line_height(size)


def line_height(size: float) -> float:
    """Return the height of a line, in points, at a font size."""
    return round(size * 1.32, 2)
