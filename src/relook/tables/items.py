"""The item table: the texts that adjudicators see, and what items are grouped by."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path

import numpy as np
import pandas as pd

from relook.core.exact import IntArray
from relook.errors import Place, Problem, RelookError
from relook.tables.findings import Findings
from relook.tables.numbers import parse_number
from relook.tables.reading import Table, Texts, find_files, read_table
from relook.tables.schema import ItemSource


@dataclass(frozen=True, slots=True, eq=False)
class ItemData:
    """The item table.

    Attributes
    ----------
    frame : DataFrame
        Indexed by item id, in the order of the file; the columns that the source names, all text.
    digests : dict of str to str
        SHA-256 of each file by its displayed path.
    problems : tuple of Problem
        Warnings and notes.
    said : tuple of str
        One line per file on how it was read.
    rows : int array of shape (n_items,)
        The row of the spreadsheet of each item.
    file_of : object array of shape (n_items,)
        The file that each item stands in.
    """

    frame: pd.DataFrame
    digests: dict[str, str]
    problems: tuple[Problem, ...]
    said: tuple[str, ...]
    rows: IntArray
    file_of: Texts


def named_columns(source: ItemSource) -> tuple[str, ...]:
    """Return the columns that a source names beside its key, each once."""
    named = [*source.show, *source.group_by]
    named += [name for name in (source.priority, source.resample_by) if name is not None]
    return tuple(dict.fromkeys(named))


def read_items(source: ItemSource, root: Path) -> ItemData:
    """Read the item table.

    Parameters
    ----------
    source : ItemSource
    root : Path
        The folder that paths are relative to.

    Raises
    ------
    RelookError
        With every error found as its `problems`: a column that is not there, an item without an id,
        an item listed twice, a priority that is no number of 0 or more.
    """
    data, findings = survey_items(source, root)
    findings.raise_errors()
    assert data is not None
    return data


def survey_items(source: ItemSource, root: Path) -> tuple[ItemData | None, Findings]:
    """Read all that can be read, errors or not; see `read_items`."""
    findings = Findings()
    files = findings.attempt(lambda: find_files(source.files, root)) or ()
    tables: list[Table] = []
    frames: list[pd.DataFrame] = []
    rows: list[IntArray] = []
    for path in files:
        try:
            table = read_table(path, root, wanted=(source.key, *named_columns(source)))
        except RelookError as error:
            findings.take(error)
            continue
        found = _frame(table, source, findings)
        if found is not None:
            tables.append(table)
            frames.append(found[0])
            rows.append(found[1])
    if not frames:
        return None, findings
    together = _Listed(
        pd.concat(frames) if len(frames) > 1 else frames[0],
        np.concatenate(rows),
        np.repeat(np.array([t.file for t in tables], dtype=object), [len(f) for f in frames]),
    )
    _check_twice(together, findings)
    if source.priority is not None:
        _check_priority(together, source.priority, findings)
    first = ~together.frame.index.duplicated()
    data = ItemData(
        together.frame[first],
        {table.file: table.digest for table in tables},
        findings.sorted(),
        tuple(table.said for table in tables),
        together.rows[first],
        together.files[first],
    )
    return data, findings


@dataclass(frozen=True, slots=True, eq=False)
class _Listed:
    """The items of all files end to end, an item listed twice still there twice."""

    frame: pd.DataFrame
    rows: IntArray
    files: Texts


def _frame(
    table: Table, source: ItemSource, findings: Findings
) -> tuple[pd.DataFrame, IntArray] | None:
    """The named columns of one file, and its rows."""
    key = findings.attempt(lambda: table.find(source.key, "the items"))
    found = {
        name: findings.attempt(lambda name=name: table.find(name))  # type: ignore[misc]
        for name in named_columns(source)
    }
    columns = {name: at for name, at in found.items() if at is not None}
    if key is None or len(columns) < len(found):
        return None
    if table.n_rows == 0:
        findings.add("the table has a header and no rows", table.place, "give a table with items")
        return None
    used = {key, *columns.values()}
    for fault in table.faults:
        if fault.column in used:
            findings.add(
                fault.message,
                table.at(fault.row, fault.column),
                "put the value itself into the cell, or clear it",
            )
    ids = table.texts(key)
    blank = np.fromiter((not text.strip() for text in ids), dtype=bool, count=len(ids))
    for row in table.rows[blank][: findings.room()].tolist():
        findings.add(
            "the row has no item id", table.at(row, key), "fill in the id, or delete the row"
        )
    frame = pd.DataFrame(
        {name: table.texts(at) for name, at in columns.items()},
        index=pd.Index(ids, dtype=object, name=source.key),
        dtype=object,
    )
    return frame[~blank], table.rows[~blank]


def _check_twice(listed: _Listed, findings: Findings) -> None:
    repeated = listed.frame.index.duplicated(keep="first")
    if not repeated.any():
        return
    first: dict[str, int] = {}
    for at in np.flatnonzero(listed.frame.index.duplicated(keep=False)).tolist():
        item = str(listed.frame.index[at])
        before = first.setdefault(item, at)
        if before == at or not findings.room():
            continue
        where = f"row {listed.rows[before]}"
        if listed.files[before] != listed.files[at]:
            where = f"{listed.files[before]}, {where}"
        same = listed.frame.iloc[before].equals(listed.frame.iloc[at])
        findings.add(
            f'item "{item}" is listed already in {where}'
            + (", with the same texts" if same else ", with other texts"),
            Place(listed.files[at], row=int(listed.rows[at])),
            None if same else "keep one of the two rows",
            "note" if same else "error",
        )


def _check_priority(listed: _Listed, column: str, findings: Findings) -> None:
    texts = listed.frame[column].to_numpy(dtype=object)
    distinct, codes = np.unique(texts.astype(str), return_inverse=True)
    bad = [
        bool(text.strip()) and ((number := parse_number(text)) is None or number < 0)
        for text in distinct.tolist()
    ]
    for at in np.flatnonzero(np.array(bad, dtype=bool)[codes])[: findings.room()].tolist():
        findings.add(
            f'"{texts[at]}" is not a priority',
            Place(listed.files[at], row=int(listed.rows[at]), column=column),
            "write a number of 0 or more, or leave the cell empty for 1",
        )
