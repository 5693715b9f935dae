"""Which look each cell of the queue has."""

from __future__ import annotations

import unicodedata
from dataclasses import replace
from typing import NamedTuple

from openpyxl.styles.cell_style import StyleArray

from relook.cells.writing import is_web_link
from relook.worksheet import layout, palette
from relook.worksheet.layout import Column
from relook.worksheet.looks import TEXT_FORMAT, Look, Looks
from relook.worksheet.model import SheetRow, Worksheet

_READ = ("item", "shown", "remark", "label")
_LONG = 600  # characters from which a text may be higher than the page allows


class _Case(NamedTuple):
    """Everything that the look of a cell depends on."""

    role: str
    place: int
    variable: str
    fill: str | None = None
    mirrored: bool = False
    link: bool = False
    quoted: bool = False
    repeats: bool = False
    long: bool = False


class RowStyles:
    """Looks of the queue's cells, each made once.

    Parameters
    ----------
    looks : Looks
    worksheet : Worksheet
    """

    def __init__(self, looks: Looks, worksheet: Worksheet) -> None:
        self._looks = looks
        self._variables = {variable.name: variable for variable in worksheet.variables}
        self._tick_labels = layout.tick_labels(worksheet.variables)
        self._main = layout.main_shown_column(worksheet)
        self._colours = {
            variable.name: palette.label_colours(variable.labels, ordered=variable.ordered)
            for variable in worksheet.variables
        }
        self._known: dict[_Case, tuple[StyleArray, float]] = {}

    def of(
        self, row: SheetRow, column: Column, text: str, repeats: bool
    ) -> tuple[StyleArray, float]:
        """Return the look of a cell and its font size.

        Parameters
        ----------
        row : SheetRow
        column : Column
        text : str
            What stands in the cell.
        repeats : bool
            Whether the row above shows the same item.
        """
        role = column.role
        variable = row.variable
        if not text:
            case = _Case(role, column.index, variable, repeats=repeats)
        else:
            fill = None
            if role == "label" and len(row.competing) <= layout.MOST_LABEL_COLUMNS:
                fill = self._colours.get(variable, {}).get(row.competing[column.index])
            shown = role == "shown"
            case = _Case(
                role,
                column.index,
                variable,
                fill,
                role in _READ and not text.isascii() and reads_right_to_left(text),
                shown and text[:4].lower() == "http" and is_web_link(text),
                text[0] in "=+-@",
                repeats,
                shown and len(text) > (4 * column.width if repeats else _LONG),
            )
        known = self._known.get(case)
        if known is None:
            look = self._look(case)
            known = self._known[case] = (self._looks[look], look.size)
        return known

    def _look(self, case: _Case) -> Look:
        # Centred, a short text stands clear of the rules; a text that may not fit shows its start.
        base = Look(
            size=layout.BODY,
            down="center",
            quoted=case.quoted,
            right_to_left=case.mirrored,
            across="left",
        )
        match case.role:
            case "key":
                return replace(base, size=layout.SMALL, colour=palette.GREY, wrap=False)
            case "item":
                size = layout.SMALL if case.repeats else 9.0
                return replace(base, size=size, colour=palette.GREY)
            case "shown":
                main = case.place == self._main and not case.repeats
                return replace(
                    base,
                    size=layout.SMALL if case.repeats else layout.TEXT if main else 9.0,
                    colour=palette.INK if main else palette.GREY,
                    down="top" if case.long else "center",
                    underline=case.link,
                    indent=int(case.place != self._main),
                )
            case "variable":
                several = len(self._variables) > 1
                colour = palette.INK if several else palette.GREY
                return replace(base, size=9.0, bold=several, colour=colour, indent=1)
            case "label" | "coder" | "remark":
                return replace(base, fill=case.fill, left="thin", indent=case.role == "label")
        return self._field_look(case, replace(base, fill=palette.FIELD, left="thin"))

    def _field_look(self, case: _Case, base: Look) -> Look:
        variable = self._variables.get(case.variable)
        if case.role == "tick":
            label = self._tick_labels[case.place]
            offered = variable is not None and variable.entry == "set" and label in variable.labels
            return replace(base, across="center", fill=palette.FIELD if offered else None)
        if case.role == "decision":
            # Typed into a text cell, a number would be a text that no rule can compare.
            numeric = variable is not None and variable.entry == "number"
            return replace(base, bold=True, number_format="General" if numeric else TEXT_FORMAT)
        return base


def reads_right_to_left(text: str) -> bool:
    """Whether the first letter with a direction is of a right-to-left script."""
    for character in text:
        direction = unicodedata.bidirectional(character)
        if direction in ("R", "AL"):
            return True
        if direction == "L":
            return False
    return False
