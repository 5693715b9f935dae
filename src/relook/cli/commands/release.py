"""`relook release`: final labels with how each was settled, and a check of an earlier release."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

from relook.cli.options import (
    DebugOption,
    DryRunOption,
    ForceOption,
    JsonOption,
    ProjectArgument,
    QuietOption,
    SeedOption,
)
from relook.cli.running import running
from relook.errors import ExitCode, RelookError, listed


def release(
    project: ProjectArgument = Path(),
    to: Annotated[
        Path | None,
        typer.Option(
            "--to",
            metavar="FOLDER",
            help="Folder of the release.",
            show_default="release in the project folder",
        ),
    ] = None,
    ties: Annotated[
        str,
        typer.Option(
            "--ties",
            metavar="RULE",
            help="What ties and splits become: blank, most-used (the candidate used most over all "
            "items) or random.",
        ),
    ] = "blank",
    names: Annotated[
        bool, typer.Option("--names", help="Name adjudicators; without it they stand under ids.")
    ] = False,
    version: Annotated[
        int | None,
        typer.Option(
            "--version",
            min=1,
            metavar="N",
            help="Release a label version that `rescore --against` recorded.",
        ),
    ] = None,
    relabelled: Annotated[
        bool,
        typer.Option(
            "--relabelled",
            help="Go on although label files changed since the first round; the statement says so.",
        ),
    ] = False,
    check: Annotated[
        bool,
        typer.Option(
            "--check", help="Write nothing; verify a release against label files and record."
        ),
    ] = False,
    seed: SeedOption = None,
    dry_run: DryRunOption = False,
    force: ForceOption = False,
    as_json: JsonOption = False,
    quiet: QuietOption = False,
    debug: DebugOption = False,
) -> None:
    """Write final labels, corrected tables and a methods statement, all checkable later."""
    with running(quiet=quiet, debug=debug) as terminal:
        from relook.cli.screens.release import (
            check_object,
            check_screen,
            release_object,
            release_screen,
        )
        from relook.project.figures.ordering import DEFAULT_SEED
        from relook.project.release.final_labels import TIES_RULES
        from relook.project.release.release_files import FOLDER, check_release, write_release
        from relook.project.release.releasing import ReleaseRequest, make_release
        from relook.project.setup.folder import Project

        opened = Project.open(project)
        folder = to if to is not None else Path(opened.shown_root) / FOLDER
        if check:
            found = check_release(opened, folder)
            terminal.problems(found.problems)
            if as_json:
                terminal.json(check_object(found))
            else:
                terminal.data(check_screen(found))
            if not found.holds:
                raise typer.Exit(int(ExitCode.FALLS_SHORT))
            return
        rule = next((each for each in TIES_RULES if each == ties), None)
        if rule is None:
            raise RelookError(
                f'"{ties}" is no rule for ties', mend=f"use one of {listed(TIES_RULES)}"
            )
        request = ReleaseRequest(
            ties=rule,
            names=names,
            version=version,
            relabelled=relabelled,
            seed=DEFAULT_SEED if seed is None else seed,
        )
        made = make_release(opened, request, terminal.now().isoformat(timespec="seconds"))
        for line in made.loaded.said:
            terminal.say(line)
        terminal.problems(made.loaded.problems)
        if not dry_run:
            write_release(opened, folder, made.files, force=force)
        if as_json:
            terminal.json(release_object(made, folder.absolute(), dry_run=dry_run))
        else:
            terminal.data(release_screen(made, folder, dry_run=dry_run))
