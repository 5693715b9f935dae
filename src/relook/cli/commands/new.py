"""`relook new`: look at label tables, guess the layout, and write a project."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated, cast, get_args

import typer

from relook.cli.options import DebugOption, DryRunOption, ForceOption, JsonOption, QuietOption
from relook.cli.running import running
from relook.errors import RelookError
from relook.tables.schema import Layout


def new(
    tables: Annotated[
        list[Path],
        typer.Argument(metavar="TABLE…", help="Label tables, and item tables if there are any."),
    ],
    into: Annotated[
        Path | None,
        typer.Option("--into", metavar="FOLDER", help="Where to make the project."),
    ] = None,
    layout: Annotated[
        str | None, typer.Option("--layout", help="long, by-coder or counts.")
    ] = None,
    item: Annotated[
        str | None, typer.Option("--item", metavar="COLUMN", help="Column of the item ids.")
    ] = None,
    coder: Annotated[
        str | None, typer.Option("--coder", metavar="COLUMN", help="Column of the coders.")
    ] = None,
    coder_from: Annotated[
        str | None, typer.Option("--coder-from", help="file: one file per coder, named by it.")
    ] = None,
    labels: Annotated[
        list[str] | None,
        typer.Option("--labels", metavar="COLUMN", help="Column of labels; may be repeated."),
    ] = None,
    columns: Annotated[
        str | None,
        typer.Option("--columns", metavar="PATTERN", help="Such as {variable}_{coder}."),
    ] = None,
    difference: Annotated[
        list[str] | None,
        typer.Option(
            "--difference",
            metavar="[VARIABLE=]FUNCTION",
            help="Difference function, of one variable or of all; may be repeated.",
        ),
    ] = None,
    declare: Annotated[
        list[str] | None,
        typer.Option(
            "--declare",
            metavar="[VARIABLE=]LABELS",
            help='The labels in order, such as "severity=none,minor,major"; may be repeated.',
        ),
    ] = None,
    missing: Annotated[
        list[str] | None,
        typer.Option("--missing", metavar="TEXT", help="Text that means no label; repeatable."),
    ] = None,
    items: Annotated[
        list[Path] | None,
        typer.Option("--items", metavar="TABLE", help="Table of the items' texts."),
    ] = None,
    key: Annotated[
        str | None, typer.Option("--key", metavar="COLUMN", help="Item ids in the item table.")
    ] = None,
    show: Annotated[
        list[str] | None,
        typer.Option("--show", metavar="COLUMN", help="Shown to adjudicators; repeatable."),
    ] = None,
    group_by: Annotated[
        list[str] | None,
        typer.Option("--group-by", metavar="COLUMN", help="For the breakdown; repeatable."),
    ] = None,
    remark: Annotated[
        str | None,
        typer.Option("--remark", metavar="COLUMN", help="Column of a coder's remark on a label."),
    ] = None,
    sheet: Annotated[
        str | None, typer.Option("--sheet", metavar="TITLE", help="Sheet of a workbook.")
    ] = None,
    delimiter: Annotated[
        str | None, typer.Option("--delimiter", metavar="MARK", help="Between cells of a row.")
    ] = None,
    encoding: Annotated[
        str | None, typer.Option("--encoding", metavar="NAME", help="Of the text files.")
    ] = None,
    yes: Annotated[bool, typer.Option("--yes", "-y", help="Write without asking.")] = False,
    dry_run: DryRunOption = False,
    force: ForceOption = False,
    as_json: JsonOption = False,
    quiet: QuietOption = False,
    debug: DebugOption = False,
) -> None:
    """Look at label tables, say what they seem to be, and write a project's relook.toml."""
    with running(quiet=quiet, debug=debug) as terminal:
        from relook.core.differences import parse_difference
        from relook.project.setup.guessed import (
            folder_beside,
            folder_for,
            guessed_project,
            in_folder,
            write_settings,
        )
        from relook.tables.guessing import Overrides

        functions: dict[str, str] = {}
        options: dict[str, dict[str, object]] = {}
        for text in difference or ():
            name, function = _assigned(text)
            functions[name], options[name] = parse_difference(function)
        declared = {
            name: tuple(label.strip() for label in listed.split(","))
            for name, listed in map(_assigned, declare or ())
        }
        overrides = Overrides(
            layout=_layout(layout),
            item=item,
            coder=coder,
            coder_from=_one_of("--coder-from", coder_from, ("column", "file")),
            labels=tuple(labels or ()),
            columns=columns,
            difference=functions,
            options=options,
            declared=declared,
            missing=None if missing is None else tuple(missing),
            items=tuple(items or ()),
            key=key,
            show=None if show is None else tuple(show),
            group_by=None if group_by is None else tuple(group_by),
            remark=remark,
            sheet=sheet,
            delimiter=delimiter,
            encoding=encoding,
        )
        guessed = guessed_project(tables, overrides)
        for line in guessed.said:
            terminal.say(line)
        folder = into if into is not None else folder_beside(tables[0])
        asks = not yes and not dry_run and terminal.out.is_terminal and not as_json
        if asks and not typer.confirm(f"Write {folder / 'relook.toml'}?", default=True, err=True):
            raise RelookError("nothing was written", mend="change the guess with the flags above")
        if not dry_run:
            with folder_for(in_folder(guessed.project, folder)) as made:
                write_settings(made, force=force)
        if as_json:
            terminal.json(
                {
                    "project": str(folder.absolute()),
                    "written": not dry_run,
                    "guesses": [
                        {"what": each.what, "value": each.value, "because": each.because,
                         "change": each.change}
                        for each in guessed.guess.guesses
                    ],
                }
            )  # fmt: skip
            return
        terminal.data(f"{'would write' if dry_run else 'wrote'} {folder / 'relook.toml'}")
        terminal.say(f"next: relook check {folder}, then relook queue {folder}")


def _assigned(text: str) -> tuple[str, str]:
    """Split "variable=value"; without a variable it is for all of them."""
    name, equals, value = text.partition("=")
    return (name.strip(), value.strip()) if equals else ("", text.strip())


def _layout(value: str | None) -> Layout | None:
    _one_of("--layout", value, get_args(Layout))
    return cast("Layout | None", value)


def _one_of(flag: str, value: str | None, words: tuple[str, ...]) -> str | None:
    if value is None or value in words:
        return value
    raise RelookError(f'{flag} is "{value}"', mend=f"write one of {', '.join(words)}")
