"""Returned files: found, read once, and kept under their digests with a log of what was done.

From the kept files and the log the record can be made anew. A user's own file is never altered.
"""

from __future__ import annotations

import hashlib
import json
import re
from collections.abc import Collection, Mapping, Sequence
from dataclasses import asdict, dataclass
from pathlib import Path
from typing import Any

from relook.errors import Place, Problem, RelookError
from relook.project.setup.folder import Project, write_whole

_LARGEST = 256 * 2**20
_KEPT = "kept"
_NOT_OURS = ("~$", ".")
_SYSTEM_FILES = ("thumbs.db", "desktop.ini", "icon\r")
_DIGEST = re.compile(r"[0-9a-f]{64}")


@dataclass(frozen=True, slots=True, kw_only=True)
class Returned:
    """A returned file, read once.

    Attributes
    ----------
    name : str
        As it is named in messages.
    suffix : str
        The ending of its name, such as ".xlsx".
    data : bytes
    digest : str
        SHA-256 of `data`.
    """

    name: str
    suffix: str
    data: bytes
    digest: str


@dataclass(frozen=True, slots=True, kw_only=True)
class LoggedFile:
    """A file that a run read: its digest, the name it had, and whether an earlier run read it."""

    digest: str
    name: str
    suffix: str
    seen: bool


@dataclass(frozen=True, slots=True, kw_only=True)
class Run:
    """What is needed to do a collect once more exactly as it was done.

    Attributes
    ----------
    kind : str
        "collect" or "rulings".
    stamp : str
    version : str
        Of relook.
    follows : mapping of str to str
        The record's newest files when it ran, digest by name.
    reinstate : bool
    files : tuple of LoggedFile
    writes : str
        Name of the decisions file that it wrote next; "" where there was nothing to write. Where
        that file is not there, the run was broken off, or the file was lost.
    entries : tuple of mapping
        Of rulings made elsewhere: what was taken, as written in the record. What worksheets hold is
        read from the kept files instead.
    """

    kind: str
    stamp: str
    version: str
    follows: Mapping[str, str]
    reinstate: bool
    files: tuple[LoggedFile, ...]
    writes: str
    entries: tuple[Mapping[str, Any], ...] = ()

    def to_json(self) -> bytes:
        """Return the bytes of its log file."""
        return (json.dumps({"format": 1, **asdict(self)}, indent=1) + "\n").encode("ascii")

    @classmethod
    def from_json(cls, data: bytes) -> Run:
        """Read a log file; damage raises ValueError, TypeError or KeyError."""
        held = json.loads(data)
        return cls(
            kind=str(held["kind"]),
            stamp=str(held["stamp"]),
            version=str(held["version"]),
            follows=dict(held["follows"]),
            reinstate=bool(held["reinstate"]),
            files=tuple(LoggedFile(**entry) for entry in held["files"]),
            writes=str(held["writes"]),
            entries=tuple(dict(entry) for entry in held["entries"]),
        )


def find_returned(project: Project, paths: Sequence[Path] | None) -> list[Path]:
    """Return the files to read: those named, or all in the rounds' folders for returned files.

    A folder that is named stands for the files in it. Lock files of spreadsheet programs and files
    of the operating system are passed over.

    Raises
    ------
    RelookError
        A named file does not exist.
    """
    if paths is None:
        folders = sorted(project.rounds_folder.glob("*/returned"))
        return [file for folder in folders for file in _files_in(folder)]
    found: list[Path] = []
    missing: list[Problem] = []
    for path in paths:
        if path.is_dir():
            found += _files_in(path)
        elif path.exists():
            found.append(path)
        else:
            missing.append(Problem("no such file", Place(str(path)), "check the path"))
    if missing:
        raise RelookError.from_problems(missing)
    by_place = {path.absolute(): path for path in found}
    return list(by_place.values())


def _files_in(folder: Path) -> list[Path]:
    if not folder.is_dir():
        return []
    return sorted(
        path
        for path in folder.iterdir()
        if path.is_file()
        and not path.name.startswith(_NOT_OURS)
        and path.name.lower() not in _SYSTEM_FILES
    )


def read_returned(project: Project, path: Path) -> Returned:
    """Read a file's bytes, once.

    Raises
    ------
    RelookError
        It cannot be read, or is far too large for a worksheet.
    """
    name = project.relative(path)
    try:
        if path.stat().st_size > _LARGEST:
            raise RelookError(
                f"the file is larger than {_LARGEST // 2**20} MB; no worksheet is",
                where=Place(name),
                mend="take the file away, or save the worksheet anew",
            )
        data = path.read_bytes()
    except OSError as error:
        raise RelookError(
            f"the file cannot be read: {error.strerror or error}",
            where=Place(name),
            mend="close it in the spreadsheet program if it is open there, or check permissions",
        ) from None
    return Returned(
        name=name,
        suffix=path.suffix.lower(),
        data=data,
        digest=hashlib.sha256(data).hexdigest(),
    )


def kept_folder(project: Project, round_number: int) -> Path:
    """Return where a round's returned files are kept."""
    return project.returned_folder(round_number) / _KEPT


def kept_files(project: Project) -> dict[str, Path]:
    """Return the kept files by digest."""
    return {
        path.stem: path
        for path in sorted(project.rounds_folder.glob(f"*/returned/{_KEPT}/*"))
        if _DIGEST.fullmatch(path.stem) and path.suffix != ".json"
    }


def keep(project: Project, round_number: int, returned: Returned) -> None:
    """Keep a returned file's bytes under their digest, in its round."""
    suffix = returned.suffix if re.fullmatch(r"\.[a-z0-9]{1,8}", returned.suffix) else ".bin"
    suffix = ".bin" if suffix == ".json" else suffix
    path = kept_folder(project, round_number) / f"{returned.digest}{suffix}"
    if not path.exists():
        write_whole(path, returned.data)


def log_run(project: Project, round_number: int, run: Run) -> None:
    """Write the log of a run beside the kept files."""
    data = run.to_json()
    compact = re.sub(r"[-:.]", "", run.stamp)
    name = f"{compact}-{hashlib.sha256(data).hexdigest()[:16]}.json"
    path = kept_folder(project, round_number) / name
    if not path.exists():
        write_whole(path, data)


def seen_digests(project: Project, names: Collection[str]) -> frozenset[str]:
    """Return the digests of the files that runs have read to the end.

    Parameters
    ----------
    project : Project
    names : collection of str
        Names of the decisions files that are there. A run whose file is not among them was broken
        off before it had written, so what it read still counts as new.
    """
    runs, _ = _inspect_runs(project)
    done = [run for run in runs if not run.writes or run.writes in names]
    return frozenset(file.digest for run in done for file in run.files)


def read_runs(project: Project) -> list[Run]:
    """Return the logged runs, earliest first.

    Raises
    ------
    RelookError
        Logs that cannot be read, all of them at once.
    """
    runs, problems = _inspect_runs(project)
    if problems:
        raise RelookError.from_problems(problems)
    return sorted(runs, key=lambda run: (run.stamp, run.writes))


def _inspect_runs(project: Project) -> tuple[list[Run], list[Problem]]:
    runs: list[Run] = []
    problems: list[Problem] = []
    for path in sorted(project.rounds_folder.glob(f"*/returned/{_KEPT}/*.json")):
        try:
            runs.append(Run.from_json(path.read_bytes()))
        except (ValueError, TypeError, KeyError, OSError) as error:
            problems.append(
                Problem(
                    f"the log of a collect cannot be read ({type(error).__name__})",
                    Place(project.relative(path)),
                    "restore it from a copy of the project folder",
                )
            )
    return runs, problems
