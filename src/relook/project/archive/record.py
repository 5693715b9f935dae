"""The record of decisions: immutable files, written whole, each naming those it follows.

A file is named by its time and by the digest of its bytes, so a changed file is found out, and two
copies of a project folder merge as the union of their files. Nothing is ever rewritten.
"""

from __future__ import annotations

import hashlib
import json
import re
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from datetime import UTC, datetime
from pathlib import Path

from relook.core.decisions import Decision
from relook.errors import Place, Problem, RelookError
from relook.project.archive.recorded import Recorded, entry_from_dict, entry_to_dict
from relook.project.setup.folder import Project, write_whole

FORMAT = 1
_NAME = re.compile(r"\d{8}T\d{12}Z-[0-9a-f]{16}\.jsonl")
_DIGEST_LENGTH = 16
_RESTORE = (
    "restore it from a copy of the project folder, or run "
    "`relook collect --rebuild` to make it anew from the kept worksheets"
)


@dataclass(frozen=True, slots=True, kw_only=True)
class RecordFile:
    """One file of the record.

    Attributes
    ----------
    name : str
    digest : str
        SHA-256 of its bytes.
    stamp : str
        ISO time in UTC; never before that of a file it follows.
    generation : int
        One more than the largest of the files it follows.
    follows : mapping of str to str
        Digest of each file that it follows, by name: those that nothing else followed when it was
        written.
    entries : tuple of Recorded
    """

    name: str
    digest: str
    stamp: str
    generation: int
    follows: Mapping[str, str]
    entries: tuple[Recorded, ...]


@dataclass(frozen=True, slots=True)
class Record:
    """Every decision of a project; `files` stand in the order in which they count."""

    files: tuple[RecordFile, ...] = ()

    @property
    def entries(self) -> tuple[Recorded, ...]:
        """Every entry, earliest first."""
        return tuple(entry for file in self.files for entry in file.entries)

    @property
    def decisions(self) -> tuple[Decision, ...]:
        """Every decision, earliest first, superseded ones too."""
        return tuple(entry.decision for entry in self.entries)

    @property
    def names(self) -> frozenset[str]:
        """Names of the files."""
        return frozenset(file.name for file in self.files)

    def with_file(self, added: RecordFile) -> Record:
        """Return the record with one more file, in its place."""
        return Record(tuple(sorted((*self.files, added), key=_place)))

    @property
    def heads(self) -> dict[str, str]:
        """Name and digest of each file that no other follows."""
        followed = {name for file in self.files for name in file.follows}
        return {file.name: file.digest for file in self.files if file.name not in followed}

    def up_to(self, heads: Iterable[str]) -> Record:
        """Return the part of the record that some files and all they follow make up."""
        by_name = {file.name: file for file in self.files}
        wanted: set[str] = set()
        waiting = list(heads)
        while waiting:
            name = waiting.pop()
            if name not in wanted and name in by_name:
                wanted.add(name)
                waiting.extend(by_name[name].follows)
        return Record(tuple(file for file in self.files if file.name in wanted))

    def next_stamp(self, now: datetime) -> str:
        """Return the time of the next file: now, or that of the latest file where it is later."""
        return max([stamp_of(now), *(file.stamp for file in self.files)])


def _place(file: RecordFile) -> tuple[str, int, str]:
    return file.stamp, file.generation, file.digest


def stamp_of(moment: datetime) -> str:
    """Return an aware time in UTC, to the microsecond, so that texts sort as times do."""
    return moment.astimezone(UTC).strftime("%Y-%m-%dT%H:%M:%S.%fZ")


def make_file(
    project_id: str,
    record: Record,
    stamp: str,
    entries: Sequence[Recorded],
    *,
    version: str,
    kind: str,
) -> tuple[str, bytes]:
    """Return name and bytes of the file that adds entries to a record.

    Parameters
    ----------
    project_id : str
    record : Record
        What it follows.
    stamp : str
        From `Record.next_stamp`.
    entries : sequence of Recorded
        Their decisions' `order` and `id` are set on reading.
    version : str
        Of relook.
    kind : str
        "collect" or "rulings".
    """
    header = {
        "format": FORMAT,
        "relook": version,
        "project": project_id,
        "kind": kind,
        "stamp": stamp,
        "generation": 1 + max((file.generation for file in record.files), default=0),
        "follows": record.heads,
        "decisions": len(entries),
    }
    lines = [header, *(entry_to_dict(entry) for entry in entries)]
    data = "".join(json.dumps(line, ensure_ascii=True) + "\n" for line in lines).encode("ascii")
    compact = re.sub(r"[-:.]", "", stamp)
    return f"{compact}-{hashlib.sha256(data).hexdigest()[:_DIGEST_LENGTH]}.jsonl", data


def write_file(project: Project, name: str, data: bytes) -> None:
    """Write a file of the record whole; one that is there already has the same bytes."""
    path = project.decisions_folder / name
    if not path.exists():
        write_whole(path, data, force=True)


def read_record(project: Project) -> Record:
    """Read and check the whole record.

    Raises
    ------
    RelookError
        A changed, missing or foreign file or a conflict copy: every one of them at once.
    """
    record, problems = inspect_record(project)
    if problems:
        raise RelookError.from_problems(problems)
    return record


def inspect_record(project: Project) -> tuple[Record, list[Problem]]:
    """Read the record as far as it is sound.

    Returns
    -------
    tuple of (Record, list of Problem)
        The sound files, and what is wrong with the others.
    """
    problems: list[Problem] = []
    files: list[RecordFile] = []
    for path in record_paths(project):
        try:
            files.append(_read_file(project, path))
        except RelookError as error:
            problems.append(Problem(error.message, error.where, error.mend))
    present = {file.name for file in files}
    broken = {path.name for path in record_paths(project)} - present
    for file in sorted(files, key=lambda file: file.name):
        problems.extend(
            Problem(
                f"the file is missing, though {file.name} follows it",
                Place(project.relative(project.decisions_folder / name)),
                _RESTORE,
            )
            for name in sorted(file.follows)
            if name not in present and name not in broken
        )
    return Record(tuple(sorted(files, key=_place))), problems


def record_paths(project: Project) -> list[Path]:
    """Return the files of the decisions folder that are, or pose as, files of the record."""
    if not project.decisions_folder.is_dir():
        return []
    return sorted(
        path
        for path in project.decisions_folder.iterdir()
        if path.is_file() and ".jsonl" in path.name and not path.name.startswith(".")
    )


def stale_decisions(
    entries: Iterable[Recorded], current: Mapping[tuple[str, str], str]
) -> tuple[list[Recorded], list[Recorded]]:
    """Tell the decisions whose grounds have changed.

    Parameters
    ----------
    entries : iterable of Recorded
    current : mapping of (item, variable) to str
        Digest of the labels as they stand now, for every item that is still there.

    Returns
    -------
    tuple of (list of Recorded, list of Recorded)
        Those made on other labels, and those whose item or variable is gone.
    """
    changed, gone = [], []
    for entry in entries:
        digest = current.get((entry.decision.item, entry.decision.variable))
        if digest is None:
            gone.append(entry)
        elif entry.labels_digest and digest != entry.labels_digest:
            changed.append(entry)
    return changed, gone


def _read_file(project: Project, path: Path) -> RecordFile:
    where = Place(project.relative(path))
    try:
        data = path.read_bytes()
    except OSError as error:
        raise RelookError(
            f"the file cannot be read: {error.strerror or error}",
            where=where,
            mend="check your permissions",
        ) from None
    digest = hashlib.sha256(data).hexdigest()
    if not _NAME.fullmatch(path.name):
        raise _foreign_name(path, digest, where)
    if digest[:_DIGEST_LENGTH] != path.stem.rpartition("-")[2]:
        raise RelookError("the file was changed after it was written", where=where, mend=_RESTORE)
    try:
        return parse_file(project, path.name, data)
    except (ValueError, TypeError, KeyError) as error:
        raise RelookError(
            f"the file is no part of a record ({type(error).__name__})", where=where, mend=_RESTORE
        ) from None


def _foreign_name(path: Path, digest: str, where: Place) -> RelookError:
    twin = next(
        (
            other.name
            for other in path.parent.glob(f"*-{digest[:_DIGEST_LENGTH]}.jsonl")
            if _NAME.fullmatch(other.name)
        ),
        None,
    )
    if twin is not None:
        return RelookError(
            f"the file is a second copy of {twin}", where=where, mend="delete this copy"
        )
    return RelookError(
        "the file is not named as a file of the record is; it looks like a conflict copy, made "
        "when two computers wrote to the folder at once",
        where=where,
        mend="move it out of the folder, and restore the original from a copy where it is missing",
    )


def parse_file(project: Project, name: str, data: bytes) -> RecordFile:
    """Read the bytes of a file of the record.

    Raises
    ------
    RelookError
        Of a newer format or another project.
    ValueError, TypeError, KeyError
        Not written by relook.
    """
    digest = hashlib.sha256(data).hexdigest()
    where = Place(project.relative(project.decisions_folder / name))
    lines = [json.loads(line) for line in data.splitlines()]
    header = lines[0]
    if int(header["format"]) > FORMAT:
        raise RelookError(
            f"the file was written by a newer relook (format {header['format']})",
            where=where,
            mend="update relook",
        )
    if header["project"] != project.settings.project:
        raise RelookError(
            "the file belongs to another project", where=where, mend="move it out of the folder"
        )
    if int(header["decisions"]) != len(lines) - 1:
        raise ValueError("lines are missing")
    stamp, generation = str(header["stamp"]), int(header["generation"])
    stem = name.removesuffix(".jsonl")
    entries = tuple(
        entry_from_dict(line, (stamp, f"{generation:08d}", digest), f"{stem}:{number}")
        for number, line in enumerate(lines[1:], start=1)
    )
    return RecordFile(
        name=name,
        digest=digest,
        stamp=stamp,
        generation=generation,
        follows={str(key): str(value) for key, value in header["follows"].items()},
        entries=entries,
    )
