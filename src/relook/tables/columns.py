"""Labels that are at hand as columns of codes, brought to the form of a table that was read."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from functools import partial
from pathlib import Path

import numpy as np
import pandas as pd

from relook.core.exact import IntArray
from relook.tables.code_book import with_difference_table
from relook.tables.coding import Context, code_variable
from relook.tables.findings import Findings
from relook.tables.joining import Flat
from relook.tables.labels import LabelData, VariableLabels, variable_labels
from relook.tables.reading import Table, Texts
from relook.tables.schema import Duplicates, Variable


@dataclass(frozen=True, slots=True, eq=False)
class LabelColumn:
    """The labels of one variable.

    Attributes
    ----------
    item, text : int arrays of shape (n_labels,)
        Into the items, and into `texts`.
    coder : int array of shape (n_labels,) or None
        Into the coders; None where nobody knows who gave a label.
    row : int array of shape (n_labels,)
        What messages call the label's row.
    texts : object array of shape (n_texts,)
        The distinct label texts.
    n_missing : int
        Labels that are known to be missing.
    """

    item: IntArray
    coder: IntArray | None
    text: IntArray
    row: IntArray
    texts: Texts
    n_missing: int = 0


def labels_of_columns(
    columns: Mapping[str, LabelColumn],
    variables: Sequence[Variable],
    *,
    items: Sequence[str] | Texts,
    coders: Sequence[str] | Texts,
    source: str,
    root: Path,
    duplicates: Duplicates = "error",
) -> LabelData:
    """Code labels that were not read from a file.

    Parameters
    ----------
    columns : mapping of str to LabelColumn
        By variable.
    variables : sequence of Variable
        At least one, each with a column.
    items, coders : sequence of str
        Without repeats.
    source : str
        What messages call the place that the labels come from.
    root : Path
        The folder that the path of a table of differences is relative to.
    duplicates : {"error", "first", "last"}
        What to do where a coder labelled one variable of one item twice, differently.

    Returns
    -------
    LabelData
        Without digests, for there is no file.

    Raises
    ------
    RelookError
        With every error found as its `problems`.
    """
    findings = Findings()
    names = [variable.name for variable in variables]
    table = Table(source, None, tuple(names), pd.DataFrame(), np.zeros(0, np.int64), "", "")
    every_item = np.asarray(items, dtype=object)
    every_coder = np.asarray(coders, dtype=object)
    context = Context([table], every_item, every_coder, duplicates, findings)
    found: dict[str, VariableLabels] = {}
    for position, declared in enumerate(variables):
        variable = findings.attempt(partial(with_difference_table, declared, root))
        if variable is None:
            continue
        coding = code_variable(variable, _flat(columns[variable.name], position), context)
        if coding is not None:
            found[variable.name] = variable_labels(variable, coding)
    if findings.any_errors:
        findings.raise_errors()
    return LabelData(
        every_item,
        tuple(every_coder),
        found,
        {},
        findings.sorted(),
        (),
        (source,),
        (None,),
        (tuple(names),),
    )


def _flat(column: LabelColumn, position: int) -> Flat:
    n = column.item.size
    return Flat(
        column.item,
        column.coder,
        column.text,
        np.zeros(n, dtype=np.int32),
        np.full(n, position, dtype=np.int32),
        column.row,
        None,
        column.texts,
        column.n_missing,
    )
