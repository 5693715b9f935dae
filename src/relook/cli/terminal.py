"""The outside world as one object: two consoles and a clock, which tests replace."""

from __future__ import annotations

import contextlib
import json
import os
import sys
from collections.abc import Callable, Iterable, Iterator
from datetime import UTC, datetime
from typing import IO, Any

from rich.console import Console
from rich.progress import BarColumn, Progress, TaskProgressColumn, TextColumn
from rich.text import Text

from relook.errors import Problem, RelookError

_SHOWN = 20
_NARROWEST = 80
_PLAIN_WIDTH = 100


class Terminal:
    """Where output goes. stdout is for data, stderr for everything else.

    Parameters
    ----------
    stdout, stderr : file, optional
    quiet : bool
        Leave out what is said along the way; data, warnings and errors stay.
    """

    def __init__(
        self, stdout: IO[str] | None = None, stderr: IO[str] | None = None, *, quiet: bool = False
    ) -> None:
        self.quiet = quiet
        self.out = _console(_writable(stdout or sys.stdout))
        self.err = _console(_writable(stderr or sys.stderr))

    def data(self, thing: Any) -> None:
        """Write something to stdout: a text, or anything that rich can lay out.

        Lines end where their text does, so that what is kept in a file or compared has no padding.
        """
        with self.out.capture() as captured:
            self.out.print(Text(thing) if isinstance(thing, str) else thing)
        lines = captured.get().split("\n")
        self.out.file.write("\n".join(line.rstrip(" ") for line in lines))

    def json(self, held: dict[str, Any]) -> None:
        """Write one JSON object to stdout, numbers in full and undefined ones as null."""
        text = json.dumps(
            {"format": 1, **held},
            ensure_ascii=not _is_unicode(self.out.file),
            allow_nan=False,
            indent=1,
        )
        self.out.file.write(text + "\n")

    def say(self, text: str) -> None:
        """Tell what is being done or was guessed."""
        if not self.quiet:
            self.err.print(Text(text), soft_wrap=True)

    def warn(self, text: str) -> None:
        """Tell what the user should know before relying on the result."""
        self.err.print(Text.assemble(("warning: ", "bold"), text), soft_wrap=True)

    def error(self, error: RelookError) -> None:
        """Tell what is wrong, where, and on its own line the mend."""
        if len(error.problems) > 1:
            self.problems(error.problems)
            self.err.print(Text.assemble(("error: ", "bold"), error.message), soft_wrap=True)
            return
        self._fault("error", Problem(error.message, error.where, error.mend))

    def problems(self, problems: Iterable[Problem], *, most: int | None = _SHOWN) -> None:
        """Tell several findings, the first 20 unless told otherwise."""
        found = list(problems)
        for problem in found if most is None else found[:most]:
            self._fault(problem.severity, problem)
        if most is not None and len(found) > most:
            self.err.print(Text(f"… and {len(found) - most:,} more"))

    def _fault(self, severity: str, problem: Problem) -> None:
        self.err.print(Text.assemble((f"{severity}: ", "bold"), str(problem)), soft_wrap=True)

    @contextlib.contextmanager
    def progress(self, what: str, total: int) -> Iterator[Progress | None]:
        """Show progress on stderr where that is a terminal; elsewhere nothing."""
        if self.quiet or not self.err.is_terminal:
            yield None
            return
        columns = (TextColumn("{task.description}"), BarColumn(), TaskProgressColumn())
        with Progress(*columns, console=self.err, transient=True) as progress:
            progress.add_task(what, total=total)
            yield progress

    @contextlib.contextmanager
    def doing(self) -> Iterator[Callable[[str], None]]:
        """Give work something to tell what it is doing; shown where stderr is a terminal.

        Yields
        ------
        callable
            Takes what is being done, such as "ranking items"; the line is gone at the end.
        """
        if self.quiet or not self.err.is_terminal:
            yield lambda text: None
            return
        with self.err.status("") as status:
            yield lambda text: status.update(Text(text))

    @staticmethod
    def now() -> datetime:
        """Return the time to record: SOURCE_DATE_EPOCH where that is set, else the clock.

        Raises
        ------
        RelookError
            SOURCE_DATE_EPOCH is not a number of seconds.
        """
        epoch = os.environ.get("SOURCE_DATE_EPOCH")
        if epoch is None:
            return datetime.now(UTC)
        try:
            return datetime.fromtimestamp(int(epoch), UTC)
        except (ValueError, OverflowError, OSError):
            raise RelookError(
                f"SOURCE_DATE_EPOCH is {epoch!r}",
                mend="set it to a number of seconds since 1970, or unset it",
            ) from None


class _PipeConsole(Console):
    """A console that lets a closed pipe be answered in one place, with its own exit code."""

    def on_broken_pipe(self) -> None:
        """Raise what happened; rich itself would exit with 1, which means something else here."""
        raise BrokenPipeError


def _is_unicode(file: IO[str]) -> bool:
    """Whether every character can be written; a stream without an encoding takes any."""
    encoding = getattr(file, "encoding", None) or "utf-8"
    return encoding.lower().replace("-", "").startswith("utf")


def _writable(file: IO[str]) -> IO[str]:
    """Let a stream take every character, so that no label is lost and no bar ends in an error.

    A file or pipe gets UTF-8, unless PYTHONIOENCODING asks for another encoding; there, and on a
    terminal of few characters, the others are written as escapes.
    """
    reconfigure = getattr(file, "reconfigure", None)
    if reconfigure is None:
        return file
    if _is_unicode(file):
        # Half a character, as in the name of a file in another encoding, is all it could not take.
        if getattr(file, "errors", None) == "strict":
            reconfigure(errors="backslashreplace")
        return file
    if file.isatty() or "PYTHONIOENCODING" in os.environ:
        reconfigure(errors="backslashreplace")
    else:
        reconfigure(encoding="utf-8")
    return file


def _console(file: IO[str]) -> Console:
    """A console that never breaks user text: no markup, no emoji codes, no automatic colours.

    Off a terminal the width is fixed, so that what a script reads does not depend on a window.
    """
    probe = Console(file=file)
    width = max(_NARROWEST, probe.width) if probe.is_terminal else _PLAIN_WIDTH
    return _PipeConsole(file=file, width=width, markup=False, emoji=False, highlight=False)
