"""The screen of `relook status`."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from typing import Any

from rich.console import RenderableType
from rich.text import Text

from relook.cli.screens.layout import (
    coefficient,
    count,
    counted,
    heading,
    note,
    shortened,
    small_table,
    stacked,
)
from relook.project.archive.codings import CODERS
from relook.project.returning.standing import SheetStanding, Standing
from relook.project.setup.folder import Project
from relook.project.setup.people import names_by_id

_SHOWN = 12


def status_screen(standing: Standing, project: Project) -> RenderableType:
    """Lay out where a project stands."""
    names = names_by_id(project)
    parts: list[RenderableType] = [heading(project.title)]
    if not standing.rounds:
        parts.append(note("No round was sent yet."))
    for held in standing.rounds:
        alphas = ", ".join(f"{each.variable} {coefficient(each.alpha)}" for each in held.variables)
        parts += [
            Text(""),
            heading(f"round {held.number}, {held.made[:10]}"),
            note(f"alpha of independent labels: {alphas}"),
            _sheets("worksheet", "decided", standing.sheets, held.number, names),
        ]
    for held in standing.codings:
        coders: dict[str, str] = held.settings[CODERS]
        parts += [
            Text(""),
            heading(f"coding {held.number}, {held.made[:10]}"),
            _sheets("coding sheet", "answered", standing.coding_sheets, held.number, coders),
        ]
    if standing.states:
        said = ", ".join(f"{state} {n:,}" for state, n in standing.states.items())
        parts += [Text(""), note(f"Items by what the decisions amount to: {said}.")]
    if standing.splits:
        parts += [
            Text(""),
            heading("waiting for a second opinion"),
            small_table(
                ("item", "variable", "", "rulings"),
                [
                    (
                        shortened(held.item, 24),
                        held.variable,
                        held.state,
                        ", ".join(
                            f"{names.get(each.adjudicator, each.adjudicator)} "
                            f"{each.label or each.ruling}"
                            for each in held.standing
                        ),
                    )
                    for held in standing.splits[:_SHOWN]
                ],
            ),
        ]
        if len(standing.splits) > _SHOWN:
            parts.append(note(f"… and {len(standing.splits) - _SHOWN:,} more; --json has them all"))
    for said, keys in (
        ("made on other labels: the labels changed after the row was sent", standing.stale),
        ("orphaned: no longer in the label table", standing.orphaned),
    ):
        if keys:
            items = ", ".join(item for item, _ in keys[:_SHOWN])
            parts.append(note(f"{counted(len(keys), 'row')} {said}: {items}"))
    parts += [Text(""), note(f"next: {standing.next_step}")]
    return stacked(*parts)


def _sheets(
    what: str,
    done: str,
    sheets: Iterable[SheetStanding],
    number: int,
    names: Mapping[str, str],
) -> RenderableType:
    """The sheets of one round or coding: whose they are, and how far along."""
    return small_table(
        (what, "for", "rows", done, "open"),
        [
            (
                sheet.file,
                names.get(sheet.adjudicator, sheet.adjudicator),
                count(sheet.n_rows),
                count(sheet.n_decided),
                count(sheet.n_rows - sheet.n_decided),
            )
            for sheet in sheets
            if sheet.round == number
        ],
        numbers=(2, 3, 4),
    )


def status_object(standing: Standing, project: Project) -> dict[str, Any]:
    """Return everything that `relook status --json` writes, but for its format number."""
    names = names_by_id(project)
    return {
        "project": str(project.root),
        "rounds": [
            {
                "round": held.number,
                "made": held.made,
                "variables": [
                    {"variable": each.variable, "alpha": each.alpha} for each in held.variables
                ],
                "worksheets": [
                    {
                        "file": str(project.root / sheet.file),
                        "adjudicator": names.get(sheet.adjudicator, sheet.adjudicator),
                        "n_rows": sheet.n_rows,
                        "n_decided": sheet.n_decided,
                        "back": sheet.is_back,
                    }
                    for sheet in standing.sheets
                    if sheet.round == held.number
                ],
            }
            for held in standing.rounds
        ],
        "codings": [
            {
                "coding": held.number,
                "made": held.made,
                "worksheets": [
                    {
                        "file": str(project.root / sheet.file),
                        "coder": held.settings[CODERS].get(sheet.adjudicator, sheet.adjudicator),
                        "n_rows": sheet.n_rows,
                        "n_answered": sheet.n_decided,
                        "back": sheet.is_back,
                    }
                    for sheet in standing.coding_sheets
                    if sheet.round == held.number
                ],
            }
            for held in standing.codings
        ],
        "states": standing.states,
        "splits": [
            {
                "item": held.item,
                "variable": held.variable,
                "state": held.state,
                "rulings": [
                    {"adjudicator": each.adjudicator, "label": each.label or each.ruling}
                    for each in held.standing
                ],
            }
            for held in standing.splits
        ],
        "stale": [{"item": item, "variable": variable} for item, variable in standing.stale],
        "orphaned": [{"item": item, "variable": variable} for item, variable in standing.orphaned],
        "next": standing.next_step,
    }
