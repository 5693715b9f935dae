"""Tables of the three layouts to one flat form: an item, a coder and a text per label."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import PurePosixPath

import numpy as np

from relook.core.exact import BoolArray, IntArray
from relook.tables.findings import Findings
from relook.tables.reading import Table, Texts
from relook.tables.schema import LabelSource, Variable
from relook.tables.wide_columns import coder_columns, count_columns


@dataclass(frozen=True, slots=True, eq=False)
class Coded:
    """Texts as codes: `texts[codes]`."""

    codes: IntArray
    texts: Texts


@dataclass(frozen=True, slots=True, eq=False)
class Part:
    """Labels of one variable from one column of one file, missing ones left out.

    Attributes
    ----------
    variable : str
    column : int
        The 0-based column of the labels.
    items, labels : Coded of shape (n_labels,)
    coders : Coded or None
        None for counts.
    rows : int array of shape (n_labels,)
        Rows of the spreadsheet.
    remarks : object array of shape (n_labels,) or None
    n_missing : int
        Cells without a label.
    """

    variable: str
    column: int
    items: Coded
    coders: Coded | None
    labels: Coded
    rows: IntArray
    remarks: Texts | None
    n_missing: int


@dataclass(frozen=True, slots=True, eq=False)
class FileParts:
    """What one file holds.

    `items` are its distinct item ids in order of appearance, those without a label included.
    """

    items: Texts
    parts: tuple[Part, ...]


def wanted_columns(source: LabelSource, variables: Sequence[Variable]) -> tuple[str, ...]:
    """Return the headers that every label table must have."""
    wanted = [source.item]
    if source.layout == "long":
        if source.coder_from == "column" and source.coder is not None:
            wanted.append(source.coder)
        wanted += [variable.column or variable.name for variable in variables]
        if source.remark is not None:
            wanted.append(source.remark)
    elif source.layout == "by-coder" and source.columns is None:
        wanted += source.coders
    return tuple(dict.fromkeys(wanted))


def take_apart(
    table: Table, source: LabelSource, variables: Sequence[Variable], findings: Findings
) -> FileParts:
    """Take the labels out of one table.

    Problems (missing columns, cells without an item, a coder or a usable value) go to `findings`;
    what can be read is returned all the same, so that one pass finds everything.
    """
    item = findings.attempt(lambda: table.find(source.item, "the items"))
    if table.n_rows == 0:
        findings.add("the table has a header and no rows", table.place, "give a table with labels")
        return FileParts(np.empty(0, dtype=object), ())
    if item is None:
        _find_others(table, source, variables, findings)
        return FileParts(np.empty(0, dtype=object), ())
    items = Coded(*table.coded(item))
    blank_items = blank_texts(items.texts)
    blank = blank_items[items.codes]
    if source.layout == "long":
        parts = _long(table, source, variables, items, blank, findings)
    elif source.layout == "by-coder":
        parts = _by_coder(table, source, variables, items, blank, findings)
    else:
        parts = _counts(table, source, variables, items, blank, findings)
    used = {item, *(part.column for part in parts)}
    missing = set(source.missing)
    for fault in table.faults:
        # A formula without a stored value reads as empty, which must not pass for a missing label.
        if fault.column in used and (not fault.text or fault.text not in missing):
            findings.add(
                fault.message,
                table.at(fault.row, fault.column),
                "put the value itself into the cell, or clear it",
            )
    if not blank_items.any():
        return FileParts(items.texts, tuple(parts))
    _report_blank_items(table, item, parts, findings)
    return FileParts(items.texts[~blank_items], tuple(_without_blank(part) for part in parts))


def blank_texts(texts: Texts) -> BoolArray:
    """Return which texts are empty or spaces."""
    # A map runs without a step of the interpreter per text; ids can be millions.
    spaces = np.fromiter(map(str.isspace, texts), dtype=bool, count=len(texts))
    return np.asarray(spaces | (texts == ""), dtype=bool)


def _find_others(
    table: Table, source: LabelSource, variables: Sequence[Variable], findings: Findings
) -> None:
    """Where the item column is missing already, name the other missing columns in the same pass."""
    if source.layout != "long":
        return
    if source.coder_from == "column" and source.coder is not None:
        coder = source.coder
        findings.attempt(lambda: table.find(coder, "the coders"))
    for variable in variables:
        _find_label_column(table, variable, findings)


def _find_label_column(table: Table, variable: Variable, findings: Findings) -> int | None:
    name = variable.column or variable.name
    return findings.attempt(lambda: table.find(name, f'the labels of "{variable.name}"'))


def _long(
    table: Table,
    source: LabelSource,
    variables: Sequence[Variable],
    items: Coded,
    blank_item: BoolArray,
    findings: Findings,
) -> list[Part]:
    coders, blank_coder = _coders_of_rows(table, source, findings)
    remark = source.remark
    remark_at = None
    if remark is not None:
        remark_at = findings.attempt(lambda: table.find(remark, "the remarks"))
    parts = []
    lacking: BoolArray = np.zeros(table.n_rows, dtype=bool)
    for variable in variables:
        column = _find_label_column(table, variable, findings)
        if column is None or coders is None:
            continue
        labels = Coded(*table.coded(column))
        given = ~_is_missing(labels.texts, source.missing)[labels.codes]
        n_missing = int(table.n_rows - given.sum())
        lacking |= given & blank_coder & ~blank_item
        given &= ~blank_coder
        remarks = None if remark_at is None else table.texts(remark_at)
        parts.append(
            _part(
                variable.name, column, items, coders, labels, table.rows, remarks, given, n_missing
            )
        )
    findings.add_at(
        table.rows[lacking].tolist(),
        "the row has a label but no coder",
        lambda row: table.at(row, table.find(source.coder or "")),
        "fill in who gave it, or clear the label",
    )
    return parts


def _coders_of_rows(
    table: Table, source: LabelSource, findings: Findings
) -> tuple[Coded | None, BoolArray]:
    none: BoolArray = np.zeros(table.n_rows, dtype=bool)
    if source.coder_from == "file":
        name = PurePosixPath(table.file.replace("\\", "/")).stem
        texts = np.array([name], dtype=object)
        return Coded(np.zeros(table.n_rows, dtype=np.int32), texts), none
    if source.coder is None:
        findings.add(
            "no column is named for the coders",
            table.place,
            'name it: coder = "…"; or coder_from = "file" where each coder has a file',
        )
        return None, none
    name = source.coder
    column = findings.attempt(lambda: table.find(name, "the coders"))
    if column is None:
        return None, none
    coders = Coded(*table.coded(column))
    blank = blank_texts(coders.texts)
    if not blank.any():
        return coders, none
    # A row without a coder is left out or an error, so its code is never looked at.
    named = Coded(np.maximum(np.cumsum(~blank) - 1, 0)[coders.codes], coders.texts[~blank])
    return named, blank[coders.codes]


def _by_coder(
    table: Table,
    source: LabelSource,
    variables: Sequence[Variable],
    items: Coded,
    blank_item: BoolArray,
    findings: Findings,
) -> list[Part]:
    parts = []
    for variable, coder, column in coder_columns(table, source, variables, findings):
        labels = Coded(*table.coded(column))
        given = ~_is_missing(labels.texts, source.missing)[labels.codes]
        n_missing = int(np.sum(~given & ~blank_item))
        coders = Coded(np.zeros(table.n_rows, dtype=np.int64), np.array([coder], dtype=object))
        parts.append(
            _part(variable, column, items, coders, labels, table.rows, None, given, n_missing)
        )
    return parts


def _counts(
    table: Table,
    source: LabelSource,
    variables: Sequence[Variable],
    items: Coded,
    blank_item: BoolArray,
    findings: Findings,
) -> list[Part]:
    parts = []
    for variable, label, column in count_columns(table, source, variables, findings):
        texts = Coded(*table.coded(column))
        numbers = np.zeros(len(texts.texts), dtype=np.int64)
        missing = _is_missing(texts.texts, source.missing) | blank_texts(texts.texts)
        bad: BoolArray = np.zeros(len(texts.texts), dtype=bool)
        for at, text in enumerate(texts.texts):
            plain = text.strip().removesuffix(".0")
            if plain.isascii() and plain.isdigit() and len(plain) <= 7:
                numbers[at] = int(plain)
            elif not missing[at]:
                bad[at] = True
        for at in np.flatnonzero(bad[texts.codes] & ~blank_item)[: findings.room()].tolist():
            findings.add(
                f'"{texts.texts[texts.codes[at]]}" is not a number of coders',
                table.at(int(table.rows[at]), column),
                "write a whole number of 0 or more, or leave the cell empty",
            )
        often = numbers[texts.codes]
        each = np.repeat(np.arange(table.n_rows), often)
        labels = Coded(np.zeros(each.size, dtype=np.int64), np.array([label], dtype=object))
        item_codes = Coded(items.codes[each], items.texts)
        parts.append(Part(variable, column, item_codes, None, labels, table.rows[each], None, 0))
    return parts


def _is_missing(texts: Texts, missing: Sequence[str]) -> BoolArray:
    marks = set(missing)
    return np.fromiter((text in marks for text in texts), dtype=bool, count=len(texts))


def _part(
    variable: str,
    column: int,
    items: Coded,
    coders: Coded,
    labels: Coded,
    rows: IntArray,
    remarks: Texts | None,
    given: BoolArray,
    n_missing: int,
) -> Part:
    if not given.all():
        items = Coded(items.codes[given], items.texts)
        coders = Coded(coders.codes[given], coders.texts)
        labels = Coded(labels.codes[given], labels.texts)
        rows = rows[given]
        remarks = None if remarks is None else remarks[given]
    return Part(variable, column, items, coders, labels, rows, remarks, n_missing)


def _report_blank_items(table: Table, item: int, parts: Sequence[Part], findings: Findings) -> None:
    labelled = [part.rows[blank_texts(part.items.texts)[part.items.codes]] for part in parts]
    rows = np.unique(np.concatenate(labelled)) if labelled else np.zeros(0, dtype=np.int64)
    findings.add_at(
        rows.tolist(),
        "the row has a label but no item",
        lambda row: table.at(row, item),
        "fill in which item it belongs to, or delete the row",
    )


def _without_blank(part: Part) -> Part:
    blank = blank_texts(part.items.texts)
    keep = ~blank[part.items.codes]
    coders = part.coders
    return Part(
        part.variable,
        part.column,
        Coded((np.cumsum(~blank) - 1)[part.items.codes[keep]], part.items.texts[~blank]),
        None if coders is None else Coded(coders.codes[keep], coders.texts),
        Coded(part.labels.codes[keep], part.labels.texts),
        part.rows[keep],
        None if part.remarks is None else part.remarks[keep],
        part.n_missing,
    )
