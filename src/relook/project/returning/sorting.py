"""Returned files that may be worksheets of rounds or coding sheets: each to where it belongs."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from datetime import datetime
from pathlib import Path

from relook.cells.opening import open_book
from relook.errors import RelookError
from relook.project.archive.codings import read_codings
from relook.project.returning.collected import Collected
from relook.project.returning.collecting import collect
from relook.project.returning.returns import find_returned, read_returned
from relook.project.setup.folder import Project
from relook.worksheet.read import read_worksheet


@dataclass(frozen=True, slots=True)
class CollectedAll:
    """What a call of `relook collect` did.

    Attributes
    ----------
    rounds : Collected or None
        Decisions; None where no worksheet of a round was among the files.
    codings : Collected or None
        Fresh labels; None where no coding sheet was.
    """

    rounds: Collected | None
    codings: Collected | None

    @property
    def is_complete(self) -> bool:
        """Whether every row was taken that was filled in."""
        return all(part.is_complete for part in (self.rounds, self.codings) if part is not None)


def collect_all(
    project: Project,
    worksheets: Sequence[Path] | None,
    *,
    strict: bool = False,
    reinstate: bool = False,
    dry_run: bool = False,
    now: datetime,
) -> CollectedAll:
    """Collect worksheets of rounds and coding sheets.

    Parameters
    ----------
    project : Project
    worksheets : sequence of Path or None
        None: every file in the folders for returned ones, of rounds and of codings.
    strict, reinstate, dry_run, now
        As for `relook.project.returning.collecting.collect`.

    Raises
    ------
    RelookError
        As there.
    """

    def collected(area: Project, files: Sequence[Path] | None) -> Collected:
        return collect(area, files, strict=strict, reinstate=reinstate, dry_run=dry_run, now=now)

    codings = read_codings(project)
    if not codings:
        return CollectedAll(collected(project, worksheets), None)
    paths = find_returned(project, worksheets)
    if worksheets is None:
        paths += find_returned(project.codings, None)
    any_round = any(project.rounds_folder.glob("*/round.json"))
    keys = {row.key for held in codings for row in held.rows}
    fresh = [path for path in paths if _is_coding_sheet(project, path, keys)]
    others = [path for path in paths if path not in set(fresh)]
    if not any_round:  # a file that is neither is told of among the coding sheets
        fresh, others = paths, []
    parts = [(project, others)] if others else []
    parts += [(project.codings, fresh)] if fresh or not parts else []
    if strict and len(parts) > 1:
        # All or nothing is of both kinds together, so that neither is written before both are seen.
        seen = [collect(*part, strict=True, dry_run=True, now=now) for part in parts]
        if not all(each.is_complete for each in seen):
            held = [replace(each, accepted=0, superseded=0, held_back=True) for each in seen]
            return CollectedAll(*held)
    done = {area.area: collected(area, files) for area, files in parts}
    return CollectedAll(done.get("rounds"), done.get("codings"))


def _is_coding_sheet(project: Project, path: Path, keys: set[str]) -> bool:
    """Whether a file has a row of a coding; one that cannot be read has none."""
    try:
        returned = read_returned(project, path)
        sheet = read_worksheet(open_book(returned.data, returned.name))
    except RelookError:
        return False
    return any(row.key in keys for row in sheet.rows)
