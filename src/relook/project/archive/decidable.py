"""What may be decided in the rows of a round, as the round itself remembers it."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import replace
from typing import Any

from relook.core.differences import DIFFERENCE_FUNCTIONS
from relook.project.archive.rounds import Round
from relook.project.setup.settings import Settings
from relook.tables.schema import Variable
from relook.worksheet.model import SheetVariable

#: The key of round.json's settings that holds them.
SHEET_VARIABLES = "sheet_variables"


def variables_to_settings(variables: Iterable[SheetVariable]) -> list[dict[str, Any]]:
    """Return what a round is to remember of its variables, for its settings."""
    return [
        {
            "name": variable.name,
            "entry": variable.entry,
            "labels": list(variable.labels),
            "ordered": variable.ordered,
            "low": variable.low,
            "high": variable.high,
            "separator": variable.separator,
        }
        for variable in variables
    ]


def takes_numbers(variable: Variable) -> bool:
    """Whether the labels of a variable are numbers."""
    kind = DIFFERENCE_FUNCTIONS.get(variable.difference)
    return kind is not None and kind.needs == "number"


def variables_of_round(held: Round, settings: Settings) -> dict[str, SheetVariable]:
    """Return what may be decided in a round's rows, by variable.

    Labels that were declared in relook.toml since may be decided too. A variable that relook.toml
    no longer has is still read as it was sent.
    """
    declared = {variable.name: variable for variable in settings.variables}
    found: dict[str, SheetVariable] = {}
    for entry in held.settings.get(SHEET_VARIABLES, ()):
        sent = _from_settings(entry)
        found[sent.name] = _widened(sent, declared.get(sent.name))
    for name in dict.fromkeys(row.variable for row in held.rows):
        if name not in found:
            variable = declared.get(name, Variable(name=name))
            found[name] = _from_declaration(variable)
    return found


def _from_settings(entry: Mapping[str, Any]) -> SheetVariable:
    return SheetVariable(
        name=str(entry["name"]),
        entry=entry["entry"],
        labels=tuple(entry["labels"]),
        ordered=bool(entry["ordered"]),
        low=entry["low"],
        high=entry["high"],
        separator=entry["separator"],
    )


def _widened(sent: SheetVariable, declared: Variable | None) -> SheetVariable:
    if declared is None or declared.labels is None or sent.entry == "number":
        return sent
    return replace(sent, labels=tuple(dict.fromkeys((*sent.labels, *declared.labels))))


def _from_declaration(variable: Variable) -> SheetVariable:
    separator = variable.options.get("separator")
    if variable.difference in ("jaccard", "masi"):
        return SheetVariable(
            name=variable.name,
            entry="set",
            labels=variable.labels or (),
            separator=separator if isinstance(separator, str) else None,
        )
    numeric = variable.labels is None and takes_numbers(variable)
    return SheetVariable(
        name=variable.name, entry="number" if numeric else "choice", labels=variable.labels or ()
    )
