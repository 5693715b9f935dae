"""`relook status`: rounds, who has what, what is back, splits, and what is next."""

from __future__ import annotations

from pathlib import Path

from relook.cli.options import DebugOption, JsonOption, ProjectArgument, QuietOption
from relook.cli.running import running


def status(
    project: ProjectArgument = Path(),
    as_json: JsonOption = False,
    quiet: QuietOption = False,
    debug: DebugOption = False,
) -> None:
    """Show rounds, worksheets out and back, decisions, splits, and what is next."""
    with running(quiet=quiet, debug=debug) as terminal:
        from relook.cli.screens.status import status_object, status_screen
        from relook.project.returning.standing import standing_of
        from relook.project.setup.folder import Project

        opened = Project.open(project)
        standing = standing_of(opened)
        terminal.problems(standing.problems)
        if as_json:
            terminal.json(status_object(standing, opened))
        else:
            terminal.data(status_screen(standing, opened))
