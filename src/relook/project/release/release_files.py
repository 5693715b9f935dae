"""Release folders: written whole, and checked against label files and record."""

from __future__ import annotations

import contextlib
import hashlib
import json
import shutil
import tempfile
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path, PurePosixPath
from typing import Any

from relook.errors import Place, Problem, RelookError, listed
from relook.project.archive.record import Record, read_record
from relook.project.archive.settlements import settlements
from relook.project.corrections.label_versions import with_version
from relook.project.release.final_labels import TIES_RULES
from relook.project.release.releasing import (
    FINAL_CSV,
    FORMAT,
    MANIFEST,
    ReleaseRequest,
    final_frame,
    released_labels,
)
from relook.project.setup.folder import Project, write_whole
from relook.project.setup.loading import Loaded, load
from relook.project.setup.people import names_by_id
from relook.tables.results import csv_bytes

FOLDER = "release"
_RELEASE_AGAIN = "make the release again with --force"


@dataclass(frozen=True, slots=True, kw_only=True)
class ReleaseCheck:
    """What a check of a release folder found.

    Attributes
    ----------
    folder : Path
    made : str
        When the release was made.
    n_files, n_labels : int
        Files of the manifest, and rows of final labels compared.
    problems : tuple of Problem
        Errors: the folder is not what the record says. Warnings: the record went on since.
    n_newer_decisions : int
        Entries of the record since.
    """

    folder: Path
    made: str
    n_files: int
    n_labels: int
    problems: tuple[Problem, ...]
    n_newer_decisions: int

    @property
    def holds(self) -> bool:
        """Whether nothing is wrong with it."""
        return all(problem.severity != "error" for problem in self.problems)


def write_release(
    project: Project, folder: Path, files: Mapping[str, bytes], *, force: bool = False
) -> None:
    """Write a release folder whole: it appears complete, or not at all.

    Parameters
    ----------
    project : Project
    folder : Path
    files : mapping of str to bytes
        By path from the folder.
    force : bool
        Whether a release that is there may be replaced.

    Raises
    ------
    RelookError
        The folder holds something and `force` is false, or files that no release wrote; or it
        cannot be written.
    """
    folder = folder.absolute()
    if folder == project.root or folder in project.root.parents:
        raise RelookError(
            "a release needs a folder of its own",
            where=Place(str(folder)),
            mend="name a folder that is not there yet",
        )
    with project.lock():
        _refuse_to_lose(project, folder, force=force)
        try:
            folder.parent.mkdir(parents=True, exist_ok=True)
            made = Path(tempfile.mkdtemp(prefix=f".{folder.name}.", dir=folder.parent))
        except OSError as error:
            raise _cannot_write(folder, error) from None
        try:
            for name, data in files.items():
                write_whole(made / PurePosixPath(name), data)
            made.chmod(0o755)
            old = None
            if folder.exists():
                old = folder.with_name(f".{folder.name}.old-{made.name[-8:]}")
                folder.rename(old)
            try:
                made.rename(folder)
            except BaseException:  # an interrupt too must not leave the old release hidden
                if old is not None:
                    old.rename(folder)
                raise
            if old is not None:
                shutil.rmtree(old, ignore_errors=True)
        except OSError as error:
            raise _cannot_write(folder, error) from None
        finally:
            if made.exists():
                shutil.rmtree(made, ignore_errors=True)


def _refuse_to_lose(project: Project, folder: Path, *, force: bool) -> None:
    if folder.is_file():
        raise RelookError(
            "there is a file of this name", where=Place(str(folder)), mend="name another folder"
        )
    there = _files_in(folder)
    if not there:
        return
    shown = Place(project.relative(folder))
    if not force:
        raise RelookError(
            "there is a release already" if MANIFEST in there else "the folder is not empty",
            where=shown,
            mend="add --force to replace a release, or name another folder by --to",
        )
    known: set[str] = set()
    with contextlib.suppress(RelookError):
        known = {MANIFEST, *_manifest(project, folder)["files"]}
    strange = sorted(there - known)
    if strange:
        raise RelookError(
            f"the folder holds files that no release wrote: {listed(strange)}",
            where=shown,
            mend="move them elsewhere; a release replaces its whole folder",
        )


def check_release(project: Project, folder: Path) -> ReleaseCheck:
    """Verify a release folder against the label files and the record.

    Parameters
    ----------
    project : Project
    folder : Path

    Raises
    ------
    RelookError
        No release there, or label files or record that cannot be read.

    Notes
    -----
    Every file must have the digest that release.json gives it, the label files must be those that
    were released, the record must still hold what it held, and the final labels worked out anew
    from both must be the released ones to the byte. Whether the record as it stands now would
    release the same is told apart.
    """
    manifest = _manifest(project, folder)
    problems = _file_problems(project, folder, manifest)
    request = ReleaseRequest(
        ties=manifest["ties"], names=manifest["names"], version=manifest["version"]
    )
    if request.version is None:
        released = load(project)
    else:
        released = load(with_version(project, request.version))
    record = read_record(project)
    problems += _label_file_problems(released, manifest["label_files"])
    lost = {name: digest for name, digest in manifest["record"].items() if name not in record.names}
    problems += [
        Problem(
            "the release rests on a file of the record that is gone",
            Place(f"decisions/{name}"),
            "restore it from a copy of the project folder",
        )
        for name in sorted(lost)
    ]
    then = record.up_to(manifest["record"])
    n_labels = 0
    if not any(problem.severity == "error" for problem in problems):
        expected = _final(project, released, then, request)
        n_labels = len(expected.splitlines()) - 1
        held = (folder / FINAL_CSV).read_bytes()
        if expected != held:
            problems.append(
                Problem(
                    "the final labels are not those that the label files and the record give",
                    Place(project.relative(folder / FINAL_CSV)),
                    "relook.toml may have changed since, or another version of relook made them; "
                    + _RELEASE_AGAIN,
                )
            )
        elif len(record.files) > len(then.files):
            problems += _newer(project, folder, released, record, request, held)
    return ReleaseCheck(
        folder=folder,
        made=str(manifest["made"]),
        n_files=len(manifest["files"]),
        n_labels=n_labels,
        problems=tuple(problems),
        n_newer_decisions=len(record.entries) - len(then.entries),
    )


def _final(project: Project, released: Loaded, record: Record, request: ReleaseRequest) -> bytes:
    finals = released_labels(project, released, settlements(released, record), request)
    return csv_bytes(final_frame(finals, names_by_id(project) if request.names else {}))


def _newer(
    project: Project,
    folder: Path,
    released: Loaded,
    record: Record,
    request: ReleaseRequest,
    held: bytes,
) -> list[Problem]:
    now = _final(project, released, record, request)
    where = Place(project.relative(folder / FINAL_CSV))
    if now == held:
        return [Problem("decisions were collected since, and change nothing", where, None, "note")]
    return [
        Problem(
            "decisions were collected since, and would change the release",
            where,
            _RELEASE_AGAIN,
            "error",
        )
    ]


def _file_problems(project: Project, folder: Path, manifest: Mapping[str, Any]) -> list[Problem]:
    problems = []
    for name, digest in manifest["files"].items():
        path = folder / PurePosixPath(name)
        where = Place(project.relative(path))
        if not path.is_file():
            problems.append(Problem("a released file is gone", where, _RELEASE_AGAIN))
        elif hashlib.sha256(path.read_bytes()).hexdigest() != digest:
            problems.append(
                Problem("a released file was changed after the release", where, _RELEASE_AGAIN)
            )
    strange = sorted(_files_in(folder) - {MANIFEST, *manifest["files"]})
    if strange:
        problems.append(
            Problem(
                f"files that no release wrote: {listed(strange)}",
                Place(project.relative(folder)),
                "move them elsewhere",
                "warning",
            )
        )
    return problems


def _label_file_problems(released: Loaded, then: Mapping[str, str]) -> list[Problem]:
    now = released.labels.digests
    return [
        Problem(
            "this label file is not the one that was released",
            Place(file),
            f"put the released file back, or {_RELEASE_AGAIN}",
        )
        for file in sorted({*then, *now})
        if then.get(file) != now.get(file)
    ]


def _manifest(project: Project, folder: Path) -> dict[str, Any]:
    path = folder / MANIFEST
    where = Place(project.relative(path))
    try:
        held = json.loads(path.read_bytes())
    except FileNotFoundError:
        raise RelookError(
            "there is no release in this folder",
            where=Place(project.relative(folder)),
            mend="make one with `relook release`, or name its folder by --to",
        ) from None
    except (OSError, ValueError):
        held = None
    try:
        if int(held["format"]) > FORMAT:
            raise RelookError("written by a newer relook", where=where, mend="update relook")
        if held["project"] != project.settings.project:
            raise RelookError(
                "this release belongs to another project",
                where=where,
                mend="name the project folder that it was made from",
            )
        version = held["version"]
        return {
            "made": str(held["made"]),
            "ties": next(rule for rule in TIES_RULES if rule == held["ties"]),
            "names": bool(held["names"]),
            "version": None if version is None else int(version),
            "label_files": dict(held["label_files"]),
            "record": dict(held["record"]),
            "files": dict(held["files"]),
        }
    except (TypeError, KeyError, ValueError, StopIteration):
        raise RelookError("not a readable release.json", where=where, mend=_RELEASE_AGAIN) from None


def _files_in(folder: Path) -> set[str]:
    """Every file below a folder, by its path from there; what desktops leave behind is no file."""
    if not folder.is_dir():
        return set()
    litter = {".DS_Store", "Thumbs.db", "desktop.ini"}
    return {
        path.relative_to(folder).as_posix()
        for path in folder.rglob("*")
        if path.is_file() and path.name not in litter
    }


def _cannot_write(folder: Path, error: OSError) -> RelookError:
    return RelookError(
        f"cannot write: {error.strerror or error}",
        where=Place(str(folder)),
        mend="close its files in other programs, and check that you may write there",
    )
