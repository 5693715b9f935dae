"""A project guessed from bare tables, held in memory until something must be written."""

from __future__ import annotations

import contextlib
import os
import secrets
from collections.abc import Iterator, Sequence
from dataclasses import dataclass, replace
from pathlib import Path

from relook.errors import Place, RelookError
from relook.project.setup.folder import Project, write_whole
from relook.project.setup.settings import SETTINGS_FILE, Settings
from relook.project.setup.settings_text import settings_toml
from relook.tables.guessing import Guess, Overrides, guess
from relook.tables.reading import Doing, is_text, silently


@dataclass(frozen=True, slots=True)
class GuessedProject:
    """A project whose settings were guessed.

    Attributes
    ----------
    project : Project
        Its root is the folder that the tables' paths are relative to. Nothing is written.
    guess : Guess
    """

    project: Project
    guess: Guess

    @property
    def said(self) -> tuple[str, ...]:
        """What was guessed, from what, and how to change it, a line each."""
        return self.guess.said


def guessed_project(
    tables: Sequence[Path], overrides: Overrides | None = None, doing: Doing = silently
) -> GuessedProject:
    """Guess a project from label tables and, among them, item tables.

    Parameters
    ----------
    tables : sequence of Path
        At least one.
    overrides : Overrides, optional
    doing : callable, optional
        Told what is being done, in words for the user.

    Raises
    ------
    RelookError
        Tables that cannot be read, or whose layout cannot be told.
    """
    root = Path.cwd()
    held = guess(tables, overrides, root, doing)
    settings = Settings(project="", labels=held.source, variables=held.variables, items=held.items)
    return GuessedProject(Project(root, settings, tables=held.tables), held)


def folder_beside(table: Path) -> Path:
    """Return the project folder that belongs to a bare table: `<table>-relook` beside it."""
    return table.with_name(f"{table.stem}-relook")


def settings_for_folder(project: Project, folder: Path) -> Settings:
    """Return a guessed project's settings as they stand in a folder: paths from there, a new id."""
    settings = project.settings
    items = settings.items
    return replace(
        settings,
        project=settings.project or secrets.token_hex(16),
        labels=replace(
            settings.labels,
            files=tuple(_from(folder, project.root, path) for path in settings.labels.files),
        ),
        variables=tuple(
            variable
            if variable.code_book is None
            else replace(variable, code_book=_from(folder, project.root, variable.code_book))
            for variable in settings.variables
        ),
        items=None
        if items is None
        else replace(items, files=tuple(_from(folder, project.root, path) for path in items.files)),
    )


def in_folder(project: Project, folder: Path) -> Project:
    """Return a guessed project as it will stand in a folder; nothing is written.

    Paths are relative to the folder where it exists, as they are to be kept; else absolute, for no
    path leads through a folder that is not there.
    """
    folder = folder.absolute()
    return Project(folder, settings_for_folder(project, folder), tables=project.tables)


def write_settings(project: Project, *, force: bool = False) -> None:
    """Write a project's relook.toml.

    Parameters
    ----------
    project : Project
        As `in_folder` made it; the folder is made where missing.
    force : bool
        Replace a relook.toml that is there.

    Raises
    ------
    RelookError
        The folder holds a relook.toml, or cannot be written.
    """
    file = project.root / SETTINGS_FILE
    if file.exists() and not force:
        raise RelookError(
            "there is a project in this folder already",
            where=Place(str(file)),
            mend="go on with it, choose another folder, or add --force to replace its settings",
        )
    text = settings_toml(project.settings)
    if not is_text(text):
        raise RelookError(
            "the way to a table leads through a folder whose name holds bytes that are no text in "
            f"UTF-8, so {SETTINGS_FILE} cannot name it",
            where=Place(ascii(str(project.root))),
            mend="rename the folder, or move the tables into the project folder",
        )
    write_whole(file, text.encode("utf-8"))


@contextlib.contextmanager
def folder_for(project: Project) -> Iterator[Project]:
    """Make a guessed project's folder, and take it away again if the work in it fails.

    Yields
    ------
    Project
        With paths from the folder, as relook.toml is to keep them.
    """
    made = not project.root.exists()
    try:
        project.root.mkdir(parents=True, exist_ok=True)
    except OSError as error:
        raise RelookError(
            f"cannot make the folder: {error.strerror or error}",
            where=Place(str(project.root)),
            mend="check that you may write there",
        ) from None
    try:
        yield replace(project, settings=settings_for_folder(project, project.root))
    except BaseException:
        if made:
            with contextlib.suppress(OSError):  # not empty: something was written after all
                project.root.rmdir()
        raise


def _from(folder: Path, root: Path, path: Path) -> Path:
    """A path as seen from a folder; absolute where no relative one leads there."""
    whole = (root / path).absolute()
    if not folder.is_dir():
        return whole
    try:
        return Path(Path(os.path.relpath(whole, folder)).as_posix())
    except ValueError:
        return whole
