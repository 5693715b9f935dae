"""What an adjudicator is shown of an item: variables, competing labels, shown texts."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path

from relook.core.agreement import Agreement
from relook.project.setup.loading import Loaded, labels_of_item, shown_texts
from relook.tables.code_book import read_code_book
from relook.tables.labels import VariableLabels
from relook.worksheet.model import CodeBookEntry, Reveal, SheetRow, SheetVariable

SET_FUNCTIONS = ("jaccard", "masi")


def sheet_variable(held: VariableLabels, agreement: Agreement, root: Path) -> SheetVariable:
    """Return a variable as an adjudicator meets it.

    Parameters
    ----------
    held : VariableLabels
    agreement : Agreement
    root : Path
        The folder that the code book's path is relative to.

    Raises
    ------
    RelookError
        A code book that cannot be read.
    """
    variable = held.variable
    entries: tuple[CodeBookEntry, ...] = ()
    if variable.code_book is not None:
        entries = tuple(
            CodeBookEntry(
                label=entry.label,
                meaning=entry.meaning,
                example=entry.example,
                parent=entry.parent,
            )
            for entry in read_code_book(variable.code_book, root).lines
        )
    if agreement.function.needs == "number" and variable.labels is None:
        low, high = _bounds(variable.options.get("ends"))
        return SheetVariable(
            name=variable.name, entry="number", low=low, high=high, code_book=entries
        )
    labels = _decidable(held, entries)
    separator = variable.options.get("separator")
    if variable.difference in SET_FUNCTIONS and isinstance(separator, str):
        elements = variable.labels or tuple(entry.label for entry in entries)
        if not elements:
            parts = (text.split(separator) for text in held.texts)
            elements = tuple(sorted({part.strip() for found in parts for part in found} - {""}))
        return SheetVariable(
            name=variable.name,
            entry="set",
            labels=elements,
            separator=separator,
            code_book=entries,
        )
    return SheetVariable(
        name=variable.name,
        entry="choice",
        labels=labels,
        ordered=agreement.function.needs == "order",
        code_book=entries,
    )


def _bounds(ends: object) -> tuple[float | None, float | None]:
    if isinstance(ends, Sequence) and len(ends) == 2:
        return float(ends[0]), float(ends[1])
    return None, None


def _decidable(held: VariableLabels, entries: Sequence[CodeBookEntry]) -> tuple[str, ...]:
    """Declared labels; else the code book's and those that occur."""
    if held.variable.labels is not None:
        return held.variable.labels
    return tuple(dict.fromkeys([*(entry.label for entry in entries), *held.texts]))


def given_labels(loaded: Loaded, variable: str, item: int) -> tuple[str, ...]:
    """Return the distinct labels that coders gave to an item, in the order of the value codes."""
    agreement = loaded.agreements[variable]
    profile = int(agreement.profile_of_item[item])
    if profile < 0:
        return ()
    profiles = agreement.profiles
    entries = slice(profiles.start[profile], profiles.start[profile + 1])
    texts = loaded.labels.variables[variable].texts
    return tuple(texts[value] for value in profiles.value_index[entries])


def sheet_row(
    loaded: Loaded,
    key: str,
    variable: str,
    item: int,
    competing: tuple[str, ...],
    *,
    reveal: Reveal,
) -> SheetRow:
    """Return one row of a queue sheet with no more in it than `reveal` allows.

    Parameters
    ----------
    loaded : Loaded
    key : str
    variable : str
    item : int
    competing : tuple of str
        The labels to show; left out of the row under "nothing".
    reveal : {"nothing", "labels", "tallies", "names"}
    """
    pairs = labels_of_item(loaded, variable, item)
    tallies: tuple[int, ...] = ()
    if reveal in ("tallies", "names"):
        counts = dict.fromkeys(competing, 0)
        for _, label in pairs:
            counts[label] = counts.get(label, 0) + 1
        competing = tuple(counts)
        tallies = tuple(counts.values())
    text = str(loaded.labels.items[item])
    return SheetRow(
        key=key,
        item=text,
        variable=variable,
        shown=tuple(shown for _, shown in shown_texts(loaded, text)) or _blanks(loaded),
        competing=() if reveal == "nothing" else competing,
        tallies=tallies,
        coders=tuple(pairs) if reveal == "names" else (),
    )


def shown_columns(loaded: Loaded) -> tuple[str, ...]:
    """Return the headers of the columns that adjudicators see."""
    source = loaded.project.settings.items
    return () if source is None else source.show


def _blanks(loaded: Loaded) -> tuple[str, ...]:
    return ("",) * len(shown_columns(loaded))


def coders_of_item(loaded: Loaded, item: int) -> frozenset[str]:
    """Return everyone who labelled an item on any variable."""
    found: set[str] = set()
    for held in loaded.labels.variables.values():
        codes = held.labels
        if codes.coder_index is None:
            continue
        own = codes.coder_index[codes.of_item(item)]
        found.update(loaded.labels.coders[coder] for coder in own)
    return frozenset(found)
