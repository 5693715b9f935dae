"""Collecting returned worksheets into the record, so that nothing people did is lost."""

from __future__ import annotations

import contextlib
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import replace
from datetime import datetime
from fractions import Fraction
from pathlib import Path

from relook import __version__
from relook.cells.opening import open_book
from relook.core.decisions import fold
from relook.errors import Place, Problem, RelookError, listed
from relook.project.archive.decidable import takes_numbers, variables_of_round
from relook.project.archive.record import Record, make_file, read_record, write_file
from relook.project.archive.rounds import read_rounds
from relook.project.returning.checking import Checked, Sent, check_worksheet
from relook.project.returning.collected import Collected, Split
from relook.project.returning.returns import (
    LoggedFile,
    Returned,
    Run,
    find_returned,
    keep,
    log_run,
    read_returned,
    seen_digests,
)
from relook.project.returning.weighing import CheckedFile, Weighed, weigh
from relook.project.setup.folder import Project
from relook.worksheet.read import read_worksheet


def collect(
    project: Project,
    worksheets: Sequence[Path] | None,
    *,
    strict: bool = False,
    reinstate: bool = False,
    dry_run: bool = False,
    now: datetime,
) -> Collected:
    """Read returned worksheets, check every row, and keep the decisions.

    Every valid decision is taken and every other row reported. The returned files are kept under
    their digests first, then the decisions are written as one file, whole; killed at any moment,
    the record is the old one or the new one, and the next run goes on from there.

    Parameters
    ----------
    project : Project
    worksheets : sequence of Path or None
        None: every file in the rounds' folders for returned worksheets.
    strict : bool
        Take all or nothing.
    reinstate : bool
        Bring superseded decisions back where an older version of a worksheet is given.
    dry_run : bool
        Report what would be done; write nothing.
    now : datetime
        Aware time that the decisions are recorded with.

    Raises
    ------
    RelookError
        No round was sent yet, a named file does not exist, the record is damaged, or the folder
        cannot be written. A returned file that cannot be read raises nothing; it is reported.
    """
    paths = find_returned(project, worksheets)
    sent = sent_rows(project)
    if not sent.rows:
        raise RelookError(
            "no worksheet was sent yet, so none can be collected",
            where=Place(str(project.root)),
            mend="run `relook queue` first, or `relook recode` for a fresh coding",
        )
    with _held(project, dry_run=dry_run):
        record = read_record(project)
        seen = seen_digests(project, record.names)
        returned, unreadable = _read_all(project, paths)
        files: list[CheckedFile] = []
        read: list[Returned] = []
        for each in returned:
            try:
                files.append(check_returned(each, sent, seen=each.digest in seen))
                read.append(each)
            except RelookError as error:
                unreadable.append(_problem_of(error))
        weighed = weigh(record, files, reinstate=reinstate)
        result = _report(weighed, files, read, unreadable, dry_run=dry_run)
        absent = rows_not_there(files, read, sent, record)
        result = replace(result, notes=(*result.notes, *absent))
        if strict and not result.is_complete:
            result = replace(result, accepted=0, superseded=0, adjusted=(), held_back=True)
        elif not dry_run:
            name = _write(project, record, weighed, read, sent, files, reinstate=reinstate, now=now)
            record = read_record(project) if name else record
            result = replace(result, record_file=name)
        # Coders are meant to differ; only between adjudicators is that a question to be settled.
        splits = splits_of(project, record) if project.area == "rounds" else ()
        return replace(result, splits=splits)


def sent_rows(project: Project) -> Sent:
    """Gather every row that was ever sent, with what may be decided there."""
    settings = project.settings
    return Sent.of_rounds(
        settings.project, read_rounds(project), lambda held: variables_of_round(held, settings)
    )


def check_returned(returned: Returned, sent: Sent, *, seen: bool) -> CheckedFile:
    """Open a returned file and check its rows.

    Raises
    ------
    RelookError
        It is no readable worksheet of this project.
    """
    book = open_book(returned.data, returned.name)
    checked = check_worksheet(read_worksheet(book), sent)
    return CheckedFile(digest=returned.digest, modified=book.modified, seen=seen, checked=checked)


def rows_not_there(
    files: Sequence[CheckedFile], read: Sequence[Returned], sent: Sent, record: Record
) -> list[Problem]:
    """Tell of rows that a returned worksheet should have and that are in no file.

    Rows that have a decision already are passed over: a mend sheet holds few rows on purpose.
    """
    there = {key for file in files for key in file.checked.keys}
    decided = {(each.item, each.variable, each.adjudicator) for each in record.decisions}
    names: dict[str, str] = {}
    for file, returned in zip(files, read, strict=True):
        for key in file.checked.keys:
            names[sent.rows[key].row.worksheet] = returned.name
    found = []
    for worksheet, name in names.items():
        rows = [held.row for held in sent.by_worksheet[worksheet]]
        gone = [
            row.item
            for row in rows
            if row.key not in there and (row.item, row.variable, row.adjudicator) not in decided
        ]
        if gone:
            said = f"{len(gone):,} of the {len(rows):,} rows that were sent are not in the file"
            found.append(
                Problem(
                    f"{said}: {listed(dict.fromkeys(gone))}; they stay open",
                    Place(name),
                    "if they were deleted, fill them in in the worksheet as it was sent",
                    "note",
                )
            )
    return found


def splits_of(project: Project, record: Record) -> tuple[Split, ...]:
    """Return the items on which the standing decisions of adjudicators differ."""
    tolerances: Mapping[str, Fraction] = {
        variable.name: variable.tolerance
        for variable in project.settings.variables
        if takes_numbers(variable)
    }
    settled = fold(record.decisions, tolerances=tolerances)
    return tuple(
        Split(
            item=held.item,
            variable=held.variable,
            rulings=tuple(
                (decision.adjudicator, decision.label or decision.ruling)
                for decision in held.standing
            ),
        )
        for held in settled.values()
        if held.state == "split"
    )


@contextlib.contextmanager
def _held(project: Project, *, dry_run: bool) -> Iterator[None]:
    """Hold the project's lock, unless nothing will be written anyway."""
    if dry_run:
        yield
    else:
        with project.lock():
            yield


def _read_all(project: Project, paths: Sequence[Path]) -> tuple[list[Returned], list[Problem]]:
    """Read every file once; the same bytes under two names count once."""
    by_digest: dict[str, Returned] = {}
    unreadable: list[Problem] = []
    for path in paths:
        try:
            returned = read_returned(project, path)
        except RelookError as error:
            unreadable.append(_problem_of(error))
            continue
        by_digest.setdefault(returned.digest, returned)
    return list(by_digest.values()), unreadable


def _problem_of(error: RelookError) -> Problem:
    return Problem(error.message, error.where, error.mend)


def _report(
    weighed: Weighed,
    files: Sequence[CheckedFile],
    read: Sequence[Returned],
    unreadable: Sequence[Problem],
    *,
    dry_run: bool,
) -> Collected:
    return Collected(
        accepted=len(weighed.entries),
        superseded=sum(1 for entry in weighed.entries if entry.supersedes),
        unchanged=weighed.unchanged,
        blank=weighed.blank,
        rejected=tuple(weighed.rejected),
        edited=tuple(weighed.edited),
        older=tuple(weighed.older),
        adjusted=tuple(weighed.adjusted),
        conflicts=tuple(weighed.conflicts),
        unreadable=tuple(unreadable),
        notes=tuple(note for file in files for note in file.checked.notes),
        files=tuple(each.name for each in read),
        dry_run=dry_run,
    )


def _write(
    project: Project,
    record: Record,
    weighed: Weighed,
    read: Sequence[Returned],
    sent: Sent,
    files: Sequence[CheckedFile],
    *,
    reinstate: bool,
    now: datetime,
) -> str | None:
    """Keep the returned files, log the run, then write the decisions; return that file's name."""
    if not weighed.entries and all(file.seen for file in files):
        return None
    rounds = [_round_of(file.checked, sent) for file in files]
    for number, returned, file in zip(rounds, read, files, strict=True):
        if not file.seen:
            keep(project, number, returned)
    stamp = record.next_stamp(now)
    name, data = "", b""
    if weighed.entries:
        name, data = make_file(
            project.settings.project,
            record,
            stamp,
            weighed.entries,
            version=__version__,
            kind="collect",
        )
    logged = tuple(
        LoggedFile(digest=each.digest, name=each.name, suffix=each.suffix, seen=file.seen)
        for each, file in zip(read, files, strict=True)
    )
    run = Run(
        kind="collect",
        stamp=stamp,
        version=__version__,
        follows=record.heads,
        reinstate=reinstate,
        files=logged,
        writes=name,
    )
    log_run(project, max(rounds), run)
    if not name:
        return None
    write_file(project, name, data)
    return project.relative(project.decisions_folder / name)


def _round_of(checked: Checked, sent: Sent) -> int:
    """Return the latest round that a file has rows of."""
    keys = [
        *checked.candidates,
        *checked.blank,
        *(report.key for report in (*checked.rejected, *checked.edited)),
    ]
    return max((sent.rows[key].round for key in keys if key in sent.rows), default=1)
