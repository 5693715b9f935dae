"""How every command begins and ends: expected and unexpected faults part ways here."""

from __future__ import annotations

import contextlib
import os
import sys
from collections.abc import Iterator

import typer

from relook import __version__
from relook.cli.terminal import Terminal
from relook.errors import ExitCode, RelookError


@contextlib.contextmanager
def running(*, quiet: bool = False, debug: bool = False) -> Iterator[Terminal]:
    """Give a command its terminal, and turn what it raises into a message and an exit code.

    Parameters
    ----------
    quiet : bool
        Leave out what is said along the way.
    debug : bool
        Let errors through with their traceback.
    """
    terminal = Terminal(quiet=quiet)
    try:
        yield terminal
        sys.stdout.flush()
    except RelookError as error:
        if debug:
            raise
        terminal.error(error)
        raise typer.Exit(int(error.exit_code)) from None
    except BrokenPipeError:
        _close_pipe_quietly()
        raise typer.Exit(int(ExitCode.CLOSED_PIPE)) from None
    except KeyboardInterrupt:
        terminal.err.print("interrupted; no file was left half written")
        raise typer.Exit(int(ExitCode.INTERRUPTED)) from None
    except typer.Exit:
        raise
    except MemoryError:
        terminal.error(RelookError("not enough memory", mend="use a machine with more memory"))
        raise typer.Exit(int(ExitCode.COULD_NOT)) from None
    except Exception as error:
        if debug:
            raise
        terminal.error(
            RelookError(
                f"internal error in relook {__version__}: {type(error).__name__}: {error}",
                mend="run the command again with --debug and report what it prints",
            )
        )
        raise typer.Exit(int(ExitCode.COULD_NOT)) from None


def _close_pipe_quietly() -> None:
    """Point stdout at nothing: flushing into the closed pipe at exit would complain again."""
    devnull = os.open(os.devnull, os.O_WRONLY)
    with contextlib.suppress(OSError, ValueError):
        os.dup2(devnull, sys.stdout.fileno())
