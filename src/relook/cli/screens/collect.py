"""The screen of `relook collect`: what was taken, and every row that was not, with its mend."""

from __future__ import annotations

from collections.abc import Sequence

from rich.console import RenderableType
from rich.text import Text

from relook.cli.screens.layout import (
    by_mend,
    counted,
    heading,
    note,
    shortened,
    small_table,
    stacked,
    told_together,
)
from relook.project.returning.collected import Collected, RowReport
from relook.project.returning.rebuilding import Rebuilt
from relook.project.returning.sorting import CollectedAll
from relook.project.setup.folder import Project
from relook.project.setup.people import names_by_id

_SHOWN = 20


def collect_screen(result: CollectedAll, project: Project) -> RenderableType:
    """Lay out what a collect did, worksheets of rounds before coding sheets."""
    parts: list[RenderableType] = []
    if result.rounds is not None:
        parts += _collected(result.rounds, project, "worksheet", "decision")
    if result.codings is not None:
        parts += [Text("")] if parts else []
        parts += _collected(result.codings, project, "coding sheet", "label")
    done = [part for part in (result.rounds, result.codings) if part is not None]
    if not result.is_complete:
        sheet = (
            ""
            if result.rounds is None or result.rounds.is_complete
            else (", or have just these rows filled in anew: add --mend-sheet FILE.xlsx")
        )
        parts += [
            Text(""),
            note(f"next: mend the cells named above and run relook collect again{sheet}"),
        ]
    elif any(not part.dry_run and (part.accepted or part.unchanged) for part in done):
        splits = result.rounds is not None and result.rounds.splits
        step = "queue {} --splits" if splits else "rescore {}"
        parts += [Text(""), note(f"next: relook {step.format(project.shown_root)}")]
    return stacked(*parts)


def _collected(result: Collected, project: Project, sheet: str, entry: str) -> list[RenderableType]:
    parts: list[RenderableType] = [heading(f"collected {counted(len(result.files), sheet)}")]
    parts.append(note(_sum(result, entry)))
    for said, problems in (
        ("not readable, nothing taken from it", result.unreadable),
        ("to be known", result.notes),
    ):
        if problems:
            parts += [Text(""), heading(said)]
            parts += [note(told_together(each)) for each in by_mend(problems[:_SHOWN])]
            parts += _more(len(problems))
    parts += _rows("not taken", result.rejected)
    parts += _conflicts(result)
    parts += _rows("taken, though written otherwise", result.adjusted)
    parts += _rows("shown evidence was edited; never taken", result.edited)
    parts += _rows("older than what the record has; not brought back", result.older)
    if result.splits:
        names = names_by_id(project)
        parts += [
            Text(""),
            heading(f"{counted(len(result.splits), 'split')}: adjudicators differ"),
            small_table(
                ("item", "variable", "rulings"),
                [
                    (
                        shortened(held.item, 24),
                        held.variable,
                        ", ".join(f"{names.get(who, who)} {label}" for who, label in held.rulings),
                    )
                    for held in result.splits[:_SHOWN]
                ],
            ),
            *_more(len(result.splits)),
            note(f"`relook queue {project.shown_root} --splits` sends them to somebody else."),
        ]
    return parts


def rebuild_screen(rebuilt: Rebuilt) -> RenderableType:
    """Lay out what a rebuild restored."""
    parts: list[RenderableType] = [
        heading(f"went through {counted(rebuilt.runs, 'logged collect')} again"),
        note(f"{counted(len(rebuilt.restored), 'file')} of the record made anew."),
    ]
    parts += [note(name) for name in rebuilt.restored]
    if rebuilt.set_aside:
        parts.append(note(f"Set aside, not deleted: {', '.join(rebuilt.set_aside)}."))
    return stacked(*parts)


def _sum(result: Collected, entry: str) -> str:
    taken = counted(result.accepted, entry)
    if result.held_back:
        return "Nothing was taken: --strict takes all rows or none, and some cannot be taken."
    said = f"{taken} would be taken" if result.dry_run else f"{taken} taken"
    if result.superseded:
        said += f", {result.superseded:,} of them in place of an earlier one, which is kept"
    said += f". {counted(result.unchanged, 'row')} as the record has them already"
    said += f", {counted(result.blank, 'row')} still blank."
    not_taken = len(result.rejected) + len(result.conflicts)
    if not_taken:
        said += f" {counted(not_taken, 'row')} not taken; see below."
    if result.record_file is not None:
        said += f"\nThe record has a new file: {result.record_file}"
    return said


def _rows(title: str, reports: Sequence[RowReport]) -> list[RenderableType]:
    if not reports:
        return []
    parts: list[RenderableType] = [Text(""), heading(f"{title}: {counted(len(reports), 'row')}")]
    parts += [note(str(report.problem)) for report in reports[:_SHOWN]]
    return parts + _more(len(reports))


def _conflicts(result: Collected) -> list[RenderableType]:
    if not result.conflicts:
        return []
    parts: list[RenderableType] = [
        Text(""),
        heading(f"{counted(len(result.conflicts), 'conflict')}: copies of one row differ"),
    ]
    for held in result.conflicts[:_SHOWN]:
        versions = "; ".join(
            f'{version.worksheet}, row {version.row}: "{version.found}"'
            for version in held.versions
        )
        parts.append(note(f"item {held.item}, {held.variable}: {versions}\nmend: {held.mend}"))
    return parts + _more(len(result.conflicts))


def _more(n: int) -> list[RenderableType]:
    return [note(f"… and {n - _SHOWN:,} more; --json has them all")] if n > _SHOWN else []
