"""A worksheet of rows that were sent before, rebuilt from what their round remembers."""

from __future__ import annotations

from collections.abc import Sequence
from datetime import datetime

from relook.errors import RelookError
from relook.project.archive.decidable import variables_of_round
from relook.project.archive.rounds import Round, RoundRow, read_rounds
from relook.project.sending.sheets import sheet_row, sheet_variable, shown_columns
from relook.project.setup.folder import Project
from relook.project.setup.loading import load
from relook.project.setup.people import names_by_id
from relook.worksheet.model import Worksheet
from relook.worksheet.write import write_worksheet


def mend_worksheet(project: Project, keys: Sequence[str], now: datetime) -> bytes:
    """Write a worksheet of just the rows that were not taken, under their own row codes.

    Parameters
    ----------
    project : Project
    keys : sequence of str
        Row codes, of the latest round among them where they come from several.
    now : datetime

    Raises
    ------
    RelookError
        No round knows these codes, or the tables cannot be read.
    """
    wanted = set(keys)
    rounds = [held for held in read_rounds(project) if any(row.key in wanted for row in held.rows)]
    if not rounds:
        raise RelookError(
            "none of these rows was ever sent", mend="collect the worksheets of this project"
        )
    held = rounds[-1]
    rows = [row for each in rounds for row in each.rows if row.key in wanted]
    return write_worksheet(
        rebuilt_worksheet(project, held, rows, now.isoformat(timespec="seconds"))
    )


def rebuilt_worksheet(
    project: Project, held: Round, rows: Sequence[RoundRow], stamp: str
) -> Worksheet:
    """Return a worksheet of rows as they were sent, with the same labels shown.

    Parameters
    ----------
    project : Project
    held : Round
        The round that says what may be decided.
    rows : sequence of RoundRow
        At least one; their order is kept.
    stamp : str
    """
    loaded = load(project)
    reveal = held.settings.get("reveal", "labels")
    names = names_by_id(project)
    people = dict.fromkeys(row.adjudicator for row in rows)
    used = dict.fromkeys(row.variable for row in rows)
    decidable = variables_of_round(held, project.settings)
    variables = tuple(
        sheet_variable(loaded.labels.variables[name], loaded.agreements[name], project.root)
        if name in loaded.agreements
        else decidable[name]
        for name in used
    )
    numbers = loaded.item_numbers([row.item for row in rows])
    settings = project.settings.worksheet
    return Worksheet(
        id=rows[0].worksheet,
        project=project.settings.project,
        title=settings.title or project.title,
        round=held.number,
        adjudicator=", ".join(names.get(person, person) for person in people),
        variables=variables,
        shown_columns=shown_columns(loaded),
        reasons=settings.reasons,
        reveal=reveal,
        rows=tuple(
            sheet_row(loaded, row.key, row.variable, int(item), row.competing, reveal=reveal)
            for row, item in zip(rows, numbers, strict=True)
            if item >= 0
        ),
        may_show_other_labels=reveal == "labels"
        and any(row.kind in ("audit", "recheck") for row in held.rows),
        stamp=stamp,
    )
