"""The record made anew from the kept worksheets and the log of what was done with them."""

from __future__ import annotations

import hashlib
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path

from relook.errors import Place, Problem, RelookError
from relook.project.archive.record import (
    Record,
    inspect_record,
    make_file,
    parse_file,
    read_record,
    record_paths,
    write_file,
)
from relook.project.archive.recorded import entry_from_dict
from relook.project.returning.checking import Sent
from relook.project.returning.collecting import check_returned, sent_rows
from relook.project.returning.returns import Returned, Run, kept_files, read_runs
from relook.project.returning.weighing import weigh
from relook.project.setup.folder import Project

_SET_ASIDE = "set-aside"


@dataclass(frozen=True, slots=True, kw_only=True)
class Rebuilt:
    """What a rebuild did.

    Attributes
    ----------
    restored : tuple of str
        Decisions files that were made anew.
    set_aside : tuple of str
        Damaged or foreign files that were moved out of the record; none is deleted.
    runs : int
        How many logged collects were done once more.
    """

    restored: tuple[str, ...]
    set_aside: tuple[str, ...]
    runs: int


def rebuild(project: Project, *, dry_run: bool = False) -> Rebuilt:
    """Do every logged collect once more on the kept files, and restore what the record lacks.

    A restored file has the same bytes, and so the same name, as the one that was lost. Sound files
    stay as they are; damaged ones are moved to decisions/set-aside.

    Raises
    ------
    RelookError
        Kept files or logs are missing or damaged themselves, or the record still has gaps.
    """
    sent = sent_rows(project)
    with project.lock():
        waiting = read_runs(project)
        runs = len(waiting)
        record, _ = inspect_record(project)
        kept = _sound_kept_files(project, waiting)
        made: dict[str, bytes] = {}
        # A run can be done again once all that it followed is there.
        while ready := [run for run in waiting if record.names.issuperset(run.follows)]:
            for run in ready:
                waiting.remove(run)
                redone = _redo(project, run, record.up_to(run.follows), sent, kept)
                if redone is not None and redone[0] not in record.names:
                    made[redone[0]] = redone[1]
                    record = record.with_file(parse_file(project, *redone))
        aside = [path for path in record_paths(project) if path.name not in record.names]
        aside += [path for path in record_paths(project) if path.name in made]
        if not dry_run:
            for path in aside:
                _move_aside(path)
            for name, data in made.items():
                write_file(project, name, data)
            read_record(project)
        return Rebuilt(
            restored=tuple(sorted(made)),
            set_aside=tuple(project.relative(path) for path in aside),
            runs=runs - len(waiting),
        )


def _redo(
    project: Project, run: Run, record: Record, sent: Sent, kept: Mapping[str, bytes]
) -> tuple[str, bytes] | None:
    """Return name and bytes of the decisions file that a run wrote, None where it wrote none."""
    if run.kind == "rulings":
        entries = [entry_from_dict(line, (), "") for line in run.entries]
    else:
        files = []
        for file in run.files:
            returned = Returned(
                name=file.name,
                suffix=file.suffix,
                data=kept[file.digest],
                digest=file.digest,
            )
            files.append(check_returned(returned, sent, seen=file.seen))
        entries = weigh(record, files, reinstate=run.reinstate).entries
    if not entries:
        return None
    return make_file(
        project.settings.project,
        record,
        run.stamp,
        entries,
        version=run.version,
        kind=run.kind,
    )


def _sound_kept_files(project: Project, runs: list[Run]) -> dict[str, bytes]:
    """Return the bytes of the kept files by digest, each checked against its name."""
    sound: dict[str, bytes] = {}
    for digest, path in kept_files(project).items():
        data = path.read_bytes()
        if hashlib.sha256(data).hexdigest() == digest:
            sound[digest] = data
    wanted = {file.digest: file.name for run in runs if run.kind == "collect" for file in run.files}
    problems = [
        Problem(
            f"the kept copy of this worksheet (sha256 {digest[:16]}…) is missing or was changed",
            Place(name),
            "restore the folder rounds/*/returned/kept from a copy of the project folder",
        )
        for digest, name in sorted(wanted.items())
        if digest not in sound
    ]
    if problems:
        raise RelookError.from_problems(problems)
    return sound


def _move_aside(path: Path) -> None:
    folder = path.parent / _SET_ASIDE
    try:
        folder.mkdir(exist_ok=True)
        target, number = folder / path.name, 1
        while target.exists():
            number += 1
            target = folder / f"{path.name}.{number}"
        path.rename(target)
    except OSError as error:
        raise RelookError(
            f"the file cannot be moved: {error.strerror or error}",
            where=Place(str(path)),
            mend="check your permissions",
        ) from None
