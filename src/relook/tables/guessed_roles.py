"""What is guessed of the label tables, and the view of them that it is guessed from."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field

import numpy as np
import pandas as pd

from relook.core.exact import IntArray
from relook.errors import Place
from relook.tables.headers import find_column, fold
from relook.tables.reading import Table
from relook.tables.schema import Layout
from relook.tables.sketches import Sketch

#: A guess in parts: what, value, because, flag that changes it; "because" is "" where it was told.
Line = tuple[str, str, str, str]


@dataclass(slots=True)
class Roles:
    """What each column of the label tables is.

    Attributes
    ----------
    layout : {"long", "by-coder", "counts"}
    item : str
    coder : str or None
    coder_from_file : bool
    coder_columns : tuple of str
        by-coder with one variable.
    pattern : str or None
        by-coder with names that hold variable and coder.
    remark : str or None
    variables : list of (name, column or None)
    columns_of : dict of str to list of Sketch
        The columns that hold each variable's labels.
    lines : list of Line
    """

    layout: Layout
    item: str
    coder: str | None = None
    coder_from_file: bool = False
    coder_columns: tuple[str, ...] = ()
    pattern: str | None = None
    remark: str | None = None
    variables: list[tuple[str, str | None]] = field(default_factory=list)
    columns_of: dict[str, list[Sketch]] = field(default_factory=dict)
    lines: list[Line] = field(default_factory=list)

    def sketches_of(self, variable: str) -> list[Sketch]:
        """Return the columns that hold a variable's labels."""
        return self.columns_of.get(variable, [])

    @property
    def label_sketches(self) -> list[Sketch]:
        """Every column that holds labels."""
        return [one for columns in self.columns_of.values() for one in columns]


@dataclass(frozen=True, slots=True, eq=False)
class View:
    """The label tables laid end to end, columns matched by folded header."""

    columns: list[Sketch]
    file: IntArray
    place: Place
    headers: tuple[str, ...]

    def find(self, name: str, role: str) -> Sketch:
        """Return a column by its header."""
        at = find_column([one.header for one in self.columns], name, self.place, role)
        return self.columns[at]

    def without(self, *used: Sketch | None) -> list[Sketch]:
        """Return the other columns."""
        return [one for one in self.columns if all(one is not other for other in used)]

    @property
    def n_files(self) -> int:
        """The number of files."""
        return int(self.file.max(initial=0)) + 1


def view_of(tables: Sequence[Table], sketches: Sequence[list[Sketch]]) -> View:
    """Lay tables end to end, keeping the columns that all of them have."""
    place = tables[0].place
    if len(tables) == 1:
        file = np.zeros(tables[0].n_rows, dtype=np.int64)
        return View(list(sketches[0]), file, place, tables[0].header)
    folded = [{fold(one.header): one for one in found} for found in sketches]
    columns = []
    for one in sketches[0]:
        name = fold(one.header)
        if all(name in found for found in folded):
            texts = np.concatenate([found[name].texts[found[name].codes] for found in folded])
            codes, distinct = pd.factorize(texts)
            columns.append(Sketch(one.at, one.header, codes, np.asarray(distinct, dtype=object)))
    file = np.repeat(np.arange(len(tables)), [table.n_rows for table in tables])
    return View(columns, file, place, tables[0].header)
