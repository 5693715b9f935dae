"""What a collect found and did, as the object that `relook collect --json` writes."""

from __future__ import annotations

from collections.abc import Iterable
from typing import Any

from relook.errors import Problem
from relook.project.returning.collected import Collected, RowReport
from relook.project.returning.sorting import CollectedAll

Row = dict[str, Any]


def collected_object(result: CollectedAll) -> Row:
    """Return the object, but for its format number.

    Notes
    -----
    What `part_object` says of the worksheets of rounds, at its top; `codings`: the same of coding
    sheets, null where there was none.
    """
    rounds = Collected() if result.rounds is None else result.rounds
    codings = None if result.codings is None else part_object(result.codings)
    return {**part_object(rounds), "codings": codings}


def part_object(result: Collected) -> Row:
    """Return what was collected of one kind of sheets.

    Notes
    -----
    `accepted`, `unchanged`, `superseded`, `blank`: numbers of rows. `rejected`, `edited`, `older`
    and `adjusted`: a row each with worksheet, sheet, row, column, item, variable, found, reason and
    mend. `conflicts`: rows on which returns of one run differ. `splits`: items on which standing
    decisions differ. `unreadable` and `notes`: findings about whole files.
    """
    return {
        "accepted": result.accepted,
        "unchanged": result.unchanged,
        "superseded": result.superseded,
        "blank": result.blank,
        "rejected": _rows(result.rejected),
        "edited": _rows(result.edited),
        "older": _rows(result.older),
        "adjusted": _rows(result.adjusted),
        "conflicts": [
            {
                "item": held.item,
                "variable": held.variable,
                "mend": held.mend,
                "versions": [
                    {
                        "worksheet": version.worksheet,
                        "sheet": version.sheet,
                        "row": version.row,
                        "column": version.column,
                        "found": version.found,
                    }
                    for version in held.versions
                ],
            }
            for held in result.conflicts
        ],
        "splits": [
            {
                "item": held.item,
                "variable": held.variable,
                "rulings": [
                    {"adjudicator": adjudicator, "label": label}
                    for adjudicator, label in held.rulings
                ],
            }
            for held in result.splits
        ],
        "unreadable": _findings(result.unreadable),
        "notes": _findings(result.notes),
        "files": list(result.files),
        "record_file": result.record_file,
        "held_back": result.held_back,
        "written": not result.dry_run and not result.held_back,
    }


def _rows(reports: Iterable[RowReport]) -> list[Row]:
    return [
        {
            "worksheet": report.worksheet,
            "sheet": report.sheet,
            "row": report.row,
            "column": report.column,
            "item": report.item,
            "variable": report.variable,
            "found": report.found,
            "reason": report.reason,
            "mend": report.mend,
        }
        for report in reports
    ]


def _findings(problems: Iterable[Problem]) -> list[Row]:
    return [
        {
            "severity": problem.severity,
            "message": problem.message,
            "worksheet": None if problem.where is None else problem.where.file,
            "mend": problem.mend,
        }
        for problem in problems
    ]
