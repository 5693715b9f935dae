"""A project's tables, read once and measured."""

from __future__ import annotations

import hashlib
from collections.abc import Sequence
from dataclasses import dataclass, field
from functools import cached_property
from pathlib import Path

import numpy as np
import numpy.typing as npt

from relook.core.agreement import Agreement, measure_agreement
from relook.core.differences import difference_function
from relook.core.exact import IntArray
from relook.errors import Place, Problem, RelookError
from relook.project.setup.folder import Project
from relook.project.setup.item_hashes import ItemLookup, hashed_ids
from relook.project.setup.settings import SETTINGS_FILE
from relook.tables.items import ItemData, read_items
from relook.tables.labels import LabelData, VariableLabels, read_labels
from relook.tables.reading import Doing, silently
from relook.tables.schema import Variable

Texts = npt.NDArray[np.object_]
#: Distinct labels beyond which functions that compare every two of them are refused: at this number
#: D_e takes 400 million differences.
MOST_COMPARED = 20_000


@dataclass(frozen=True)
class Loaded:
    """A project with its labels and items.

    Attributes
    ----------
    project : Project
    labels : LabelData
    items : ItemData or None
    agreements : dict of str to Agreement
        One per variable, in the order of the settings.
    hashes : dict of int to int array of shape (n_items,)
        Keyed hashes of the items' ids by seed, as far as they were taken already.
    """

    project: Project
    labels: LabelData
    items: ItemData | None
    agreements: dict[str, Agreement]
    hashes: dict[int, IntArray] = field(default_factory=dict)

    @property
    def problems(self) -> tuple[Problem, ...]:
        """Warnings and notes of reading."""
        return self.labels.problems + (self.items.problems if self.items is not None else ())

    @property
    def said(self) -> tuple[str, ...]:
        """A line per file that was read: what it was taken for."""
        return self.labels.said + (self.items.said if self.items is not None else ())

    def item_hashes(self, seed: int) -> IntArray:
        """Return a keyed hash of each item's id, so that no tie follows the order of the file."""
        known = self.hashes.get(seed)
        if known is None:
            known = self.hashes[seed] = hashed_ids(self.labels.items, seed)
        return known

    def item_numbers(self, items: Sequence[str]) -> IntArray:
        """Return the index of each item's id, -1 for those without an entry in the label table."""
        # Nothing is looked up in a first round, and so no hash is taken for it.
        return self._lookup.numbers(items) if len(items) else np.zeros(0, dtype=np.int64)

    @cached_property
    def _lookup(self) -> ItemLookup:
        """Asked for row by row, so made once."""
        seed = next(iter(self.hashes), 0)
        return ItemLookup(self.labels.items, self.item_hashes(seed), seed)


def load(project: Project, *, only: Sequence[str] | None = None, doing: Doing = silently) -> Loaded:
    """Read a project's tables and measure agreement on each variable.

    Parameters
    ----------
    project : Project
    only : sequence of str, optional
        Names of the variables to measure; all of them where left out.
    doing : callable, optional
        Told what is being done, in words for the user.

    Raises
    ------
    RelookError
        Problems in the tables, all of them at once, or no such variable.
    """
    settings = project.settings
    wanted = [settings.variable(name).name for name in only] if only else None
    variables = [
        variable for variable in settings.variables if wanted is None or variable.name in wanted
    ]
    doing("reading the labels")
    labels = read_labels(settings.labels, variables, project.root, project.tables)
    items = read_items(settings.items, project.root) if settings.items is not None else None
    doing("grouping items by their labels")
    agreements = {name: measure(held) for name, held in labels.variables.items()}
    return Loaded(project, labels, items, agreements)


def measure(held: VariableLabels) -> Agreement:
    """Measure agreement on one variable's labels.

    Raises
    ------
    RelookError
        Too many distinct labels for a function that compares every two of them.
    """
    variable: Variable = held.variable
    function = difference_function(variable.difference, variable.options)
    if function.compares_every_two and held.values.n_values > MOST_COMPARED:
        numbers = function.needs == "number"
        raise RelookError(
            f'"{variable.name}" has {held.values.n_values:,} distinct labels; {function.name} '
            f"differences compare every two of them, which is done up to {MOST_COMPARED:,}",
            mend="round the numbers, or take interval differences"
            if numbers
            else "take labels that recur, or nominal differences",
        )
    return measure_agreement(held.labels, function, held.values, tolerance=variable.tolerance)


def refuse_source(loaded: Loaded, file: Path) -> None:
    """Refuse to write where the project's own tables or settings lie, whatever is forced.

    Raises
    ------
    RelookError
        The file is one that relook reads.
    """
    project = loaded.project
    read = [*loaded.labels.digests, *(loaded.items.digests if loaded.items is not None else ())]
    if project.settings.project:
        read.append(SETTINGS_FILE)
    if file.resolve() in {(project.root / name).resolve() for name in read}:
        raise RelookError(
            "this file is one that relook reads",
            where=Place(str(file)),
            mend="choose another name for what is to be written",
        )


def item_texts(loaded: Loaded, column: str) -> Texts:
    """Return a column of the item table for each labelled item, "" where the table has no entry.

    Returns
    -------
    object array of shape (n_items,)
    """
    assert loaded.items is not None
    texts = loaded.items.frame[column].reindex(loaded.labels.items).fillna("")
    return texts.to_numpy(dtype=object)


def shown_texts(loaded: Loaded, item: str) -> tuple[tuple[str, str], ...]:
    """Return (column, text) of the shown columns of one item; nothing without an entry for it."""
    source = loaded.project.settings.items
    if loaded.items is None or source is None or item not in loaded.items.frame.index:
        return ()
    entry = loaded.items.frame.loc[item]
    return tuple((column, str(entry[column])) for column in source.show)


def labels_of_item(loaded: Loaded, variable: str, item: int) -> list[tuple[str, str]]:
    """Return (coder, label) of one item, by coder; coders are "" in a table of counts."""
    held = loaded.labels.variables[variable]
    codes = held.labels
    own = codes.of_item(item)
    texts = [held.texts[value] for value in codes.value_index[own]]
    coders = (
        [""] * len(texts)
        if codes.coder_index is None
        else [loaded.labels.coders[coder] for coder in codes.coder_index[own]]
    )
    return sorted(zip(coders, texts, strict=True))


def labels_digest(pairs: Sequence[tuple[str, str]]) -> str:
    """Digest an item's labels, so that a later change of any of them shows.

    Parameters
    ----------
    pairs : sequence of (coder, label)

    Returns
    -------
    str
        16 hexadecimal digits.
    """
    said = "\x1e".join(f"{coder}\x1f{label}" for coder, label in sorted(pairs))
    return hashlib.sha256(said.encode("utf-8", errors="surrogatepass")).hexdigest()[:16]
