"""The screen of `relook release`: what was released, how it was settled, and what to know."""

from __future__ import annotations

from pathlib import Path
from typing import Any

from rich.console import RenderableType
from rich.text import Text

from relook.cli.screens.layout import count, counted, heading, note, small_table, stacked
from relook.project.release.corrected_tables import FOLDER as CORRECTED
from relook.project.release.final_labels import SETTLED_BY
from relook.project.release.release_files import ReleaseCheck
from relook.project.release.releasing import METHODS, Release


def release_screen(held: Release, folder: Path, *, dry_run: bool) -> RenderableType:
    """Lay out a release."""
    verb = "would be written to" if dry_run else "written to"
    names = list(held.counts)
    used = [way for way in SETTLED_BY if any(held.counts[name][way] for name in names)]
    rows = [(way, *(count(held.counts[name][way]) for name in names)) for way in used]
    blank = {
        name: sum(1 for each in held.finals if each.variable == name and not each.label)
        for name in names
    }
    rows.append(("blank among these", *(count(blank[name]) for name in names)))
    parts: list[RenderableType] = [
        heading(f"{counted(len(held.finals), 'final label')} {verb} {folder}"),
        small_table(("settled by", *names), rows, numbers=tuple(range(1, len(names) + 1))),
    ]
    ties = sum(each["tie"] + each["split"] for each in held.counts.values())
    chosen = sum(1 for each in held.finals if each.rule)
    if chosen:
        rule = next(each.rule for each in held.finals if each.rule)
        parts.append(
            note(f"{counted(chosen, 'tie or split', 'ties and splits')} took a label by {rule}.")
        )
    elif ties:
        parts.append(
            note(
                f"{counted(ties, 'tie or split is', 'ties and splits are')} blank; --ties "
                "most-used "
                "or random would choose among their candidates, and say so."
            )
        )
    parts += [note(said) for said in held.notes]
    if any(name.startswith(f"{CORRECTED}/") for name in held.files):
        parts.append(
            note(
                "Corrected tables have the columns, rows and delimiter of your own; they are CSV "
                "in UTF-8 whatever those are. Labels that nobody ruled on stand as they were given."
            )
        )
    parts += [Text(""), heading("methods statement"), note(_statement(held)), Text("")]
    parts.append(note(f"Files: {', '.join(held.files)}"))
    return stacked(*parts)


def _statement(held: Release) -> str:
    return held.files[METHODS].decode("utf-8").partition("\n\nSources")[0]


def check_screen(held: ReleaseCheck) -> RenderableType:
    """Lay out what a check of a release found."""
    files, labels = counted(held.n_files, "file"), counted(held.n_labels, "final label")
    if held.holds:
        said = (
            f"{files} as released on {held.made[:10]}; label files and record as they were; "
            f"{labels} worked out anew and the same to the byte."
        )
        return stacked(heading(f"{held.folder}: holds"), note(said))
    return stacked(heading(f"{held.folder}: does not hold"), note(f"{files} looked at."))


def release_object(held: Release, folder: Path, *, dry_run: bool) -> dict[str, Any]:
    """Return everything that `relook release --json` writes, but for its format number.

    Keys: `folder, written, n_labels, n_blank`; `settled_by[]`: `variable, settled_by, n`;
    `files[]`; `notes[]`.
    """
    return {
        "folder": str(folder),
        "written": not dry_run,
        "n_labels": len(held.finals),
        "n_blank": sum(1 for each in held.finals if not each.label),
        "settled_by": [
            {"variable": name, "settled_by": way, "n": n}
            for name, each in held.counts.items()
            for way, n in each.items()
        ],
        "files": [str(folder / name) for name in held.files],
        "notes": list(held.notes),
    }


def check_object(held: ReleaseCheck) -> dict[str, Any]:
    """Return everything that `relook release --check --json` writes, but for its format number."""
    return {
        "folder": str(held.folder),
        "made": held.made,
        "holds": held.holds,
        "n_files": held.n_files,
        "n_labels": held.n_labels,
        "n_newer_decisions": held.n_newer_decisions,
        "problems": [
            {
                "severity": problem.severity,
                "message": problem.message,
                "file": problem.where.file if problem.where else None,
                "mend": problem.mend,
            }
            for problem in held.problems
        ],
    }
