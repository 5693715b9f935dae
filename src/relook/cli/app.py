"""The commands together, and how a wrong command line is answered."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Annotated

import typer

from relook import __version__
from relook.cli.commands import COMMANDS
from relook.cli.terminal import Terminal
from relook.errors import ExitCode, RelookError

app = typer.Typer(
    name="relook",
    no_args_is_help=True,
    pretty_exceptions_enable=False,
    context_settings={"help_option_names": ["-h", "--help"], "max_content_width": 100},
    rich_markup_mode="rich",
    epilog="Example: relook queue my_labels.csv",
)


def _print_version(wanted: bool) -> None:
    if wanted:
        typer.echo(f"relook {__version__}")
        raise typer.Exit


@app.callback()
def _root(
    version: Annotated[
        bool,
        typer.Option("--version", callback=_print_version, is_eager=True, help="Show the version."),
    ] = False,
) -> None:
    """Find the items worth a second look when coders disagree, and see the job through."""


for _panel, _commands in COMMANDS.items():
    for _name, _function, _example in _commands:
        app.command(_name, rich_help_panel=_panel, epilog=f"Example: {_example}")(_function)


def run(arguments: Sequence[str] | None = None) -> int:
    """Run one command line.

    Parameters
    ----------
    arguments : sequence of str, optional
        What was typed after `relook`; taken from the process where left out.

    Returns
    -------
    int
        The exit code.
    """
    try:
        code = app(args=arguments, standalone_mode=False, prog_name="relook")
    except (typer.Abort, KeyboardInterrupt):
        # Before a command began or after it ended; `running` answers what happens within it.
        return ExitCode.INTERRUPTED
    except typer.Exit as error:
        return error.exit_code
    except Exception as error:
        # Usage errors come from typer's own copy of its parser and share no public base class.
        says = getattr(error, "format_message", None)
        if says is None:
            raise
        if not says():  # bare `relook`, which has shown its help
            return ExitCode.COULD_NOT
        context = getattr(error, "ctx", None)
        path = context.command_path if context is not None else "relook"
        Terminal().error(RelookError(says(), mend=f"see `{path} --help`"))
        return ExitCode.COULD_NOT
    return code if isinstance(code, int) else ExitCode.FINE
