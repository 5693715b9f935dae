"""The screen of `relook check`: errors first, then warnings, then notes.

Findings that one mend is for stand together, with the mend below the last of them.
"""

from __future__ import annotations

from typing import Any

from rich.console import RenderableType
from rich.text import Text

from relook.cli.screens.layout import by_mend, counted, heading, note, stacked, told_together
from relook.errors import Problem
from relook.tables.checking import Checked

_SHOWN = 20
WORKSHEETS_ARE_OUT = (
    "A round of this project is out, and shows the labels as they were: files that are mended now "
    "are no longer those that alpha may be taken from. Mend them if nothing is back yet, and queue "
    "anew with the folder rounds taken away; else leave them, and decide in the worksheets."
)


def check_screen(checked: Checked) -> RenderableType:
    """Lay out the first 20 findings and their number."""
    found = checked.problems
    if not found:
        return Text("Nothing wrong was found.")
    parts: list[RenderableType] = [heading(_sum(found))]
    for together in by_mend(found[:_SHOWN]):
        parts += [Text(""), note(told_together(together, severity=True))]
    if len(found) > _SHOWN:
        left = len(found) - _SHOWN
        parts += [Text(""), note(f"… and {left:,} more; --problems FILE.csv writes them all")]
    return stacked(*parts)


def check_object(checked: Checked) -> dict[str, Any]:
    """Return everything that `relook check --json` writes, but for its format number."""
    return {
        "errors": _count(checked.problems, "error"),
        "warnings": _count(checked.problems, "warning"),
        "notes": _count(checked.problems, "note"),
        "problems": [
            {
                "severity": problem.severity,
                "message": problem.message,
                "file": None if problem.where is None else problem.where.file,
                "sheet": None if problem.where is None else problem.where.sheet,
                "row": None if problem.where is None else problem.where.row,
                "column": None if problem.where is None else problem.where.column,
                "mend": problem.mend,
            }
            for problem in checked.problems
        ],
    }


def _count(problems: tuple[Problem, ...], severity: str) -> int:
    return sum(1 for problem in problems if problem.severity == severity)


def _sum(problems: tuple[Problem, ...]) -> str:
    words = (("error", "error"), ("warning", "warning"), ("note", "note"))
    return ", ".join(
        counted(_count(problems, severity), word)
        for severity, word in words
        if _count(problems, severity)
    )
