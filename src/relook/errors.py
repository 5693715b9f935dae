"""What can go wrong, and how it is said: what, where, mend.

Every fault that a user can cause is a `RelookError`. Its fields are kept apart and the sentence is
made from them in one place, so that no message forgets to say where the fault is or how to mend it.
"""

from __future__ import annotations

import difflib
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from enum import IntEnum
from typing import Literal

Severity = Literal["error", "warning", "note"]


class ExitCode(IntEnum):
    """What the process says to a script that called it."""

    FINE = 0
    FALLS_SHORT = 1  # the thing checked falls short: problems, rejected rows, a bar not met
    COULD_NOT = 2  # usage or input: it could not be done
    INTERRUPTED = 130
    CLOSED_PIPE = 141


@dataclass(frozen=True, slots=True)
class Place:
    """Where something is, in the words that the user's own programs show.

    Attributes
    ----------
    file : str or None
        Path or name of the file.
    sheet : str or None
        Title of the sheet, for workbooks.
    row : int or None
        The 1-based row that a spreadsheet shows, the header row counted.
    column : str or None
        Header of the column, or its letter where there is no header.
    """

    file: str | None = None
    sheet: str | None = None
    row: int | None = None
    column: str | None = None

    def __str__(self) -> str:
        parts = []
        if self.file is not None:
            parts.append(self.file)
        if self.sheet is not None:
            parts.append(f'sheet "{self.sheet}"')
        if self.row is not None:
            parts.append(f"row {self.row}")
        if self.column is not None:
            parts.append(f'column "{self.column}"')
        return ", ".join(parts)


@dataclass(frozen=True, slots=True)
class Problem:
    """One finding about a user's file.

    Attributes
    ----------
    message : str
        What is wrong.
    where : Place or None
        Where it is.
    mend : str or None
        What to do about it.
    severity : {"error", "warning", "note"}
        An error stops the work; a warning and a note do not.
    """

    message: str
    where: Place | None = None
    mend: str | None = None
    severity: Severity = "error"

    def __str__(self) -> str:
        """Say what, where, and on a line of its own the mend."""
        said = self.message if self.where is None else f"{self.message}, {self.where}"
        return said if self.mend is None else f"{said}\nmend: {self.mend}"


class RelookError(Exception):
    """A fault that the user can mend.

    Parameters
    ----------
    message : str
        What is wrong.
    where : Place, optional
        Where it is.
    mend : str, optional
        What to do about it.
    problems : sequence of Problem, optional
        All the findings, where one pass found several; the message then sums them up.
    exit_code : ExitCode, optional
        What a command that meets this error exits with.
    """

    def __init__(
        self,
        message: str,
        *,
        where: Place | None = None,
        mend: str | None = None,
        problems: Sequence[Problem] = (),
        exit_code: ExitCode = ExitCode.COULD_NOT,
    ) -> None:
        super().__init__(message)
        self.message = message
        self.where = where
        self.mend = mend
        self.problems = tuple(problems)
        self.exit_code = exit_code

    def __str__(self) -> str:
        return str(Problem(self.message, self.where, self.mend))

    @classmethod
    def from_problems(cls, problems: Sequence[Problem]) -> RelookError:
        """Sum up several errors in one; a single one is raised as it stands.

        Parameters
        ----------
        problems : sequence of Problem
            At least one.
        """
        if len(problems) == 1:
            only = problems[0]
            return cls(only.message, where=only.where, mend=only.mend, problems=problems)
        return cls(f"{len(problems):,} problems", problems=problems)


def nearest(wanted: str, known: Iterable[str]) -> str | None:
    """Return the known word closest to `wanted`, or None where none is close.

    A difference of case or of surrounding space alone is always close.
    """
    by_plain: dict[str, str] = {}
    for word in known:
        by_plain.setdefault(word.strip().casefold(), word)
    found = difflib.get_close_matches(wanted.strip().casefold(), list(by_plain), n=1, cutoff=0.6)
    return by_plain[found[0]] if found else None


def listed(words: Iterable[str], *, most: int = 12) -> str:
    """Return words in quotes, in the order given, with the number of those left out."""
    every = list(words)
    shown = ", ".join(f'"{word}"' for word in every[:most])
    left = len(every) - most
    return shown if left <= 0 else f"{shown} and {left:,} more"
