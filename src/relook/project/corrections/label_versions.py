"""Label versions: labels that the coders corrected themselves, kept beside those they first gave.

A version lies in `label_versions/NN/`: byte copies of its tables, and `version.json`, which says
when it was recorded, what from, and how it differs. The user's label files are never written to,
and alpha stays the alpha of these.
"""

from __future__ import annotations

import hashlib
import json
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from pathlib import Path
from typing import Any

from relook.errors import Place, RelookError, listed
from relook.project.setup.folder import Project, write_whole
from relook.tables.reading import find_files

FORMAT = 1
FOLDER = "label_versions"
VERSION_FILE = "version.json"


@dataclass(frozen=True, slots=True, kw_only=True)
class LabelVersion:
    """One recorded version.

    Attributes
    ----------
    number : int
    made : str
        ISO time.
    files : mapping of str to str
        SHA-256 of each table, by its path from the project folder, in the order to read them.
    compared_with : mapping of str to str
        The label files that it was compared with, likewise.
    summary : mapping of str to object
        How many labels changed, by variable.
    """

    number: int
    made: str
    files: Mapping[str, str]
    compared_with: Mapping[str, str]
    summary: Mapping[str, Any]

    def to_json(self) -> bytes:
        """Return the bytes of version.json."""
        held = {
            "format": FORMAT,
            "version": self.number,
            "made": self.made,
            "files": dict(self.files),
            "compared_with": dict(self.compared_with),
            "summary": dict(self.summary),
        }
        return (json.dumps(held, ensure_ascii=False, indent=1) + "\n").encode("utf-8")


def read_versions(project: Project) -> list[LabelVersion]:
    """Return every label version of a project, first to last.

    Raises
    ------
    RelookError
        A version that cannot be read, or whose tables were changed or are gone.
    """
    found = []
    for file in sorted((project.root / FOLDER).glob(f"*/{VERSION_FILE}")):
        where = Place(project.relative(file))
        try:
            held = json.loads(file.read_bytes())
            if int(held["format"]) > FORMAT:
                raise RelookError("written by a newer relook", where=where, mend="update relook")
            version = LabelVersion(
                number=int(held["version"]),
                made=str(held["made"]),
                files=dict(held["files"]),
                compared_with=dict(held["compared_with"]),
                summary=dict(held["summary"]),
            )
        except (ValueError, TypeError, KeyError) as error:
            raise RelookError(
                f"not a readable label version ({type(error).__name__})",
                where=where,
                mend="restore the file from a copy of the project folder",
            ) from None
        for path, digest in version.files.items():
            table = project.root / path
            if not table.is_file() or _digest(table.read_bytes()) != digest:
                raise RelookError(
                    "a table of a label version was changed or is gone",
                    where=Place(path),
                    mend="restore the file from a copy of the project folder",
                )
        found.append(version)
    return sorted(found, key=lambda version: version.number)


def with_version(project: Project, number: int) -> Project:
    """Return the project as it reads with the labels of one version.

    Raises
    ------
    RelookError
        No such version.
    """
    versions = {version.number: version for version in read_versions(project)}
    if number not in versions:
        known = listed(str(each) for each in versions)
        raise RelookError(
            f"there is no label version {number}",
            where=Place(FOLDER),
            mend=f"the versions are {known}"
            if versions
            else "record one with `relook rescore --against TABLE`",
        )
    return _reading(project, [Path(path) for path in versions[number].files])


def reading_tables(project: Project, tables: Sequence[Path]) -> Project:
    """Return the project as it reads with other label tables in place of its own.

    Where coders are named by their files, the files of coders who gave none stay.
    """
    files = [table.absolute() for table in tables]
    if project.settings.labels.coder_from == "file":
        given = {file.stem for file in files}
        files += [
            file
            for file in find_files(project.settings.labels.files, project.root)
            if file.stem not in given
        ]
    return _reading(project, files)


def write_version(
    project: Project,
    tables: Sequence[Path],
    *,
    stamp: str,
    compared_with: Mapping[str, str],
    summary: Mapping[str, Any],
) -> tuple[LabelVersion, bool]:
    """Keep tables as the next label version, version.json last.

    Parameters
    ----------
    project : Project
    tables : sequence of Path
        Every table of the version, absolute.
    stamp : str
        ISO time to record.
    compared_with, summary
        As `LabelVersion` has them.

    Returns
    -------
    version : LabelVersion
    is_new : bool
        False where a version with the same tables is there already; nothing is written then.
    """
    data = [table.read_bytes() for table in tables]
    with project.lock():
        versions = read_versions(project)
        wanted = [_digest(each) for each in data]
        for version in versions:
            if list(version.files.values()) == wanted:
                return version, False
        number = max((version.number for version in versions), default=0) + 1
        folder = project.root / FOLDER / f"{number:02d}"
        paths = [folder / name for name in _names(tables)]
        for path, each in zip(paths, data, strict=True):
            write_whole(path, each)
        version = LabelVersion(
            number=number,
            made=stamp,
            files={project.relative(path): each for path, each in zip(paths, wanted, strict=True)},
            compared_with=compared_with,
            summary=summary,
        )
        write_whole(folder / VERSION_FILE, version.to_json())
    return version, True


def _reading(project: Project, files: Sequence[Path]) -> Project:
    labels = replace(project.settings.labels, files=tuple(files))
    return replace(project, settings=replace(project.settings, labels=labels))


def _names(tables: Sequence[Path]) -> list[str]:
    """File names of the copies; equal names from several folders are numbered."""
    names = [table.name for table in tables]
    if len({name.casefold() for name in names}) == len(names):
        return names
    return [f"{at:02d}-{name}" for at, name in enumerate(names, start=1)]


def _digest(data: bytes) -> str:
    return hashlib.sha256(data).hexdigest()
