"""The label tables again, with decisions in place of the labels they overrule.

Same columns, same rows, same order, so that what reads the coders' tables goes on with these. Only
cells of settled items differ. Written as CSV in UTF-8 with the delimiter of the original where that
was delimited text.
"""

from __future__ import annotations

import csv
import io
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import PurePosixPath

from relook.project.outcome.corrected import Corrected, as_written
from relook.project.setup.loading import Loaded
from relook.tables.reading import Table, find_files, read_table

FOLDER = "corrected"
#: Why there are no corrected tables for a table of counts.
COUNTS_NOTE = (
    "A table of counts holds no labels of single coders to correct, so there is no corrected "
    "table: "
    "use final_labels.csv."
)


@dataclass(frozen=True, slots=True, kw_only=True)
class CorrectedTable:
    """One table with its decisions put in.

    Attributes
    ----------
    name : str
        From the release folder.
    data : bytes
    n_changed : int
        Cells that differ from the original.
    """

    name: str
    data: bytes
    n_changed: int


def corrected_tables(
    loaded: Loaded, corrected: Mapping[str, Corrected]
) -> tuple[CorrectedTable, ...]:
    """Write the decisions into copies of the label tables.

    Parameters
    ----------
    loaded : Loaded
    corrected : mapping of str to Corrected
        By variable.

    Returns
    -------
    tuple of CorrectedTable
        One per label table; none for a table of counts.

    Notes
    -----
    An item that cannot be coded has its cells set to the first missing marker. Items that are
    split, tied or waiting for a second adjudicator keep their coders' labels. A cell that says the
    same as the decision stays as it was written.
    """
    source = loaded.project.settings.labels
    if source.layout == "counts":
        return ()
    cells = _changed_cells(loaded, corrected, source.missing[0] if source.missing else "")
    found = []
    names: set[str] = set()
    for at, path in enumerate(find_files(source.files, loaded.project.root)):
        table = read_table(
            path,
            loaded.project.root,
            sheet=source.sheet or loaded.labels.sheets[at],
            delimiter=source.delimiter,
            encoding=source.encoding,
        )
        name = f"{PurePosixPath(table.file).stem}.csv"
        if name.casefold() in names:
            name = f"{at + 1:02d}-{name}"
        names.add(name.casefold())
        own = cells.get(at, {})
        own |= _repeats(loaded, corrected, table, at, own)
        data = _written(table, own, source.delimiter or table.delimiter or ",")
        found.append(CorrectedTable(name=f"{FOLDER}/{name}", data=data, n_changed=len(own)))
    return tuple(found)


def _changed_cells(
    loaded: Loaded, corrected: Mapping[str, Corrected], missing: str
) -> dict[int, dict[tuple[int, int], str]]:
    """By file: (row of the spreadsheet, 0-based column) and the new text."""
    cells: dict[int, dict[tuple[int, int], str]] = {}
    for name, held in corrected.items():
        labels = loaded.labels.variables[name]
        decided = {
            int(item): (None if settlement.label is None else held.texts[code], code)
            for item, code, settlement in zip(
                held.item_index, held.decided, held.settled, strict=True
            )
        }
        for at, item in enumerate(labels.labels.item_index.tolist()):
            if item not in decided:
                continue
            text, code = decided[item]
            if text is not None and int(held.given.labels.value_index[at]) == code:
                continue
            place = int(labels.rows[at]), int(labels.column_index[at])
            cells.setdefault(int(labels.file_index[at]), {})[place] = (
                missing if text is None else text
            )
    return cells


def _repeats(
    loaded: Loaded,
    corrected: Mapping[str, Corrected],
    table: Table,
    file: int,
    known: Mapping[tuple[int, int], str],
) -> dict[tuple[int, int], str]:
    """Rows of a settled item that repeat a coder's label and do not count.

    They would contradict the corrected row beside them, so they say the decision too. Coders who
    are left out keep their labels.
    """
    source = loaded.project.settings.labels
    if source.layout != "long":
        return {}
    items = table.texts(table.find(source.item))
    coders = table.texts(table.find(source.coder)) if source.coder else None
    missing, left_out = set(source.missing), set(source.leave_out)
    found: dict[tuple[int, int], str] = {}
    for name, held in corrected.items():
        labels = loaded.labels.variables[name]
        counted = set(labels.rows[labels.file_index == file].tolist())
        column = table.find(held.variable.column or name)
        texts = table.texts(column)
        decided = {each.item: each.label for each in held.settled}
        for at, row in enumerate(table.rows.tolist()):
            if row in counted or items[at] not in decided or texts[at].strip() in missing:
                continue
            if coders is not None and coders[at] in left_out:
                continue
            label = decided[items[at]]
            text = next(iter(source.missing), "") if label is None else as_written(labels, label)
            if (row, column) not in known and text != texts[at]:
                found[row, column] = text
    return found


def _written(table: Table, cells: Mapping[tuple[int, int], str], delimiter: str) -> bytes:
    columns = [table.texts(at) for at in range(len(table.header))]
    for at, row in enumerate(table.rows.tolist()):
        for column in range(len(columns)):
            text = cells.get((row, column))
            if text is not None:
                if not columns[column].flags.writeable:
                    columns[column] = columns[column].copy()
                columns[column][at] = text
    out = io.StringIO(newline="")
    writer = csv.writer(out, delimiter=delimiter, lineterminator="\n")
    writer.writerow(table.header)
    writer.writerows(zip(*columns, strict=True))
    return out.getvalue().encode("utf-8", errors="surrogatepass")
