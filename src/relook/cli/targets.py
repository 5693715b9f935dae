"""What TARGET names: a project folder, or a label table that is looked at as it is."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from pathlib import Path

from relook.cli.terminal import Terminal
from relook.core.differences import parse_difference
from relook.errors import Place, RelookError
from relook.project.setup.folder import Project
from relook.project.setup.guessed import folder_beside, guessed_project, in_folder
from relook.project.setup.settings import SETTINGS_FILE, Settings
from relook.tables.guessing import Overrides


def open_target(target: Path, terminal: Terminal, *, difference: str | None = None) -> Project:
    """Open a project folder, or guess the layout of a label table and say what was guessed.

    Parameters
    ----------
    target : Path
    terminal : Terminal
    difference : str, optional
        The difference function of the one variable, as `--difference` gives it.

    Raises
    ------
    RelookError
        No such file or folder; a table whose layout cannot be guessed.
    """
    if target.is_dir():
        project = Project.open(target)
        return project if difference is None else with_difference(project, difference)
    if target.name == SETTINGS_FILE and target.exists():
        return open_target(target.parent, terminal, difference=difference)
    if not target.exists():
        raise RelookError(
            "no such file or folder",
            where=Place(str(target)),
            mend="check the path; name a project folder or a label table",
        )
    with terminal.doing() as doing:
        guessed = guessed_project([target], _overrides(difference), doing)
    for line in guessed.said:
        terminal.say(line)
    terminal.say(f"the flags named above are those of `relook new {target}`")
    return guessed.project


def project_to_write(
    target: Path,
    terminal: Terminal,
    *,
    difference: str | None = None,
    adjudicators: Sequence[str] | None = None,
    dry_run: bool = False,
) -> tuple[Project, bool]:
    """Open a project folder, or the one that belongs to a bare table.

    Returns
    -------
    project : Project
    is_new : bool
        Whether its relook.toml is still to be written.

    Raises
    ------
    RelookError
        As for `open_target`; adjudicators given for a folder that names its own.
    """
    if target.is_dir() or target.name == SETTINGS_FILE:
        if adjudicators:
            raise RelookError(
                "--adjudicator is for a bare table",
                mend=f"write adjudicators = [...] under [worksheet] of {SETTINGS_FILE}",
            )
        return open_target(target, terminal, difference=difference), False
    folder = folder_beside(target)
    if target.exists() and (folder / SETTINGS_FILE).exists():
        terminal.say(f"going on in {folder}, which belongs to this table")
        return project_to_write(folder, terminal, difference=difference)
    project = in_folder(open_target(target, terminal, difference=difference), folder)
    if adjudicators:
        worksheet = replace(project.settings.worksheet, adjudicators=dict.fromkeys(adjudicators))
        project = replace(project, settings=replace(project.settings, worksheet=worksheet))
    terminal.say(f"{'would make' if dry_run else 'making'} {folder} beside the table")
    return project, True


def _overrides(difference: str | None) -> Overrides:
    if difference is None:
        return Overrides()
    name, options = parse_difference(difference)
    return Overrides(difference={"": name}, options={"": options})


def with_difference(project: Project, difference: str) -> Project:
    """Return the project with another difference function on its one variable.

    Raises
    ------
    RelookError
        Several variables, or no such function.
    """
    return replace(project, settings=settings_with_difference(project.settings, difference))


def settings_with_difference(settings: Settings, difference: str) -> Settings:
    """Return settings whose one variable has another difference function."""
    if len(settings.variables) != 1:
        raise RelookError(
            f"--difference speaks of one variable, and this project has {len(settings.variables)}",
            mend=f"write difference = … in the tables [variables.…] of {SETTINGS_FILE}",
        )
    name, options = parse_difference(difference)
    variable = replace(settings.variables[0], difference=name, options=options)
    return replace(settings, variables=(variable,))
