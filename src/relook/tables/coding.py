"""One variable's label texts to coded labels: bad labels and double labels found on the way."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from relook.core.exact import BoolArray, IntArray, tally
from relook.core.labels import CodedLabels
from relook.errors import Place
from relook.tables.findings import Findings
from relook.tables.joining import Flat, by_item_and_coder
from relook.tables.reading import Table, Texts
from relook.tables.schema import Duplicates, Variable
from relook.tables.values import CodedValues, code_values

#: Rows named in one message beside the first.
_MORE_ROWS = 5


@dataclass(frozen=True, slots=True, eq=False)
class Coding:
    """Labels of one variable in their final order, and the `Flat` they came from in that order."""

    coded: CodedValues
    labels: CodedLabels
    flat: Flat


@dataclass(frozen=True, slots=True, eq=False)
class Context:
    """What every variable shares: the tables for places, the names for messages."""

    tables: Sequence[Table]
    items: Texts
    coders: Texts
    duplicates: Duplicates
    findings: Findings

    def place(self, flat: Flat, at: int) -> Place:
        """Return where a label stands."""
        return self.tables[int(flat.file[at])].at(int(flat.row[at]), int(flat.column[at]))


def code_variable(variable: Variable, flat: Flat, context: Context) -> Coding | None:
    """Code the labels of one variable; problems go to the context's findings.

    Returns
    -------
    Coding or None
        None where the variable's declaration cannot be used.
    """
    used = np.flatnonzero(tally(flat.text, len(flat.texts)))
    coded = context.findings.attempt(
        lambda: code_values(variable, [str(text) for text in flat.texts[used]])
    )
    if coded is None:
        return None
    code_of_text: IntArray = np.full(len(flat.texts), -1, dtype=np.int32)
    code_of_text[used] = coded.code_of_text
    if coded.bad:
        bad = {int(used[at]): fault for at, fault in coded.bad.items()}
        for text, fault in bad.items():
            for where, more in _places_of(flat, text, context):
                context.findings.add(fault.message + more, where, fault.mend)
        flat = flat.take(code_of_text[flat.text] >= 0)
    flat = by_item_and_coder(flat, len(context.items), len(context.coders))
    value: IntArray = code_of_text[flat.text]
    if flat.coder is not None:
        keep = _single(variable, flat, value, context)
        if not keep.all():
            flat, value = flat.take(keep), value[keep]
    labels = CodedLabels(
        flat.item,
        value,
        flat.coder,
        n_items=len(context.items),
        n_values=len(coded.texts),
        n_coders=len(context.coders),
    )
    return Coding(coded, labels, flat)


def _places_of(flat: Flat, text: int, context: Context) -> list[tuple[Place, str]]:
    """Where a bad text stands: per file and column its first row, with the other rows in words."""
    found = np.flatnonzero(flat.text == text)
    key = flat.file[found].astype(np.int64) << 32 | flat.column[found]
    places = []
    for one in np.unique(key).tolist():
        here = found[key == one]
        here = here[np.argsort(flat.row[here], kind="stable")]
        places.append((context.place(flat, int(here[0])), _more_rows(flat.row[here[1:]])))
    return places


def _more_rows(rows: IntArray) -> str:
    if rows.size == 0:
        return ""
    named = ", ".join(str(row) for row in rows[:_MORE_ROWS].tolist())
    left = rows.size - _MORE_ROWS
    word = "row" if rows.size == 1 else "rows"
    return f" (also in {word} {named}{f' and {left:,} more' if left > 0 else ''})"


def _single(variable: Variable, flat: Flat, value: IntArray, context: Context) -> BoolArray:
    """Which labels stay where a coder labelled an item more than once.

    The labels come sorted by item, coder and order of reading, so repeats are neighbours.
    """
    assert flat.coder is not None
    keep: BoolArray = np.ones(value.size, dtype=bool)
    same = (flat.item[1:] == flat.item[:-1]) & (flat.coder[1:] == flat.coder[:-1])
    if not same.any():
        return keep
    starts = np.flatnonzero(np.concatenate([[True], ~same]))
    stops = np.append(starts[1:], value.size)
    repeated = np.flatnonzero(stops - starts > 1)
    highest = np.maximum.reduceat(value, starts)[repeated]
    lowest = np.minimum.reduceat(value, starts)[repeated]
    starts, stops = starts[repeated], stops[repeated]
    differ = highest != lowest
    if context.duplicates == "last":
        keep[:-1] &= ~same
    else:
        keep[1:] &= ~same
    for at in np.flatnonzero(differ)[: context.findings.room()].tolist():
        _report_conflict(variable, flat, int(starts[at]), int(stops[at]), context)
    agree = np.flatnonzero(~differ)
    if agree.size:
        first = int(starts[agree[0]])
        item, coder = context.items[flat.item[first]], context.coders[flat.coder[first]]
        others = "" if agree.size == 1 else f", and {agree.size - 1:,} more such repeats"
        context.findings.add(
            f'coder "{coder}" gave item "{item}" the same label of "{variable.name}" again in row '
            f"{int(flat.row[first + 1])}; it counts once{others}",
            context.place(flat, first),
            None,
            "note",
        )
    return keep


def _report_conflict(
    variable: Variable, flat: Flat, start: int, stop: int, context: Context
) -> None:
    assert flat.coder is not None
    item, coder = context.items[flat.item[start]], context.coders[flat.coder[start]]
    first = context.place(flat, start)
    texts = [flat.texts[flat.text[at]] for at in range(start, stop)]
    other = next(at for at in range(start, stop) if flat.text[at] != flat.text[start])
    second = context.place(flat, other)
    where = f"row {second.row}"
    if second.file != first.file:
        where = f"{second.file}, row {second.row}"
    elif second.column != first.column:
        where += f', column "{second.column}"'
    said = (
        f'coder "{coder}" gave item "{item}" two labels of "{variable.name}": '
        f'"{texts[0]}" here and "{texts[other - start]}" in {where}'
    )
    if context.duplicates == "error":
        mend = 'delete one of the two rows, or set duplicates = "first" or "last"'
        context.findings.add(said, first, mend)
    else:
        context.findings.add(f"{said}; the {context.duplicates} counts", first, None, "warning")
