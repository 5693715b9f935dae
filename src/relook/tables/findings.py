"""Problems gathered in one pass, bounded in number, in the order in which a reader mends them."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Sequence
from typing import TypeVar

from relook.errors import Place, Problem, RelookError, Severity

#: Problems of one severity beyond this are counted, not kept.
MOST = 2_000
T = TypeVar("T")
_ORDER: dict[Severity, int] = {"error": 0, "warning": 1, "note": 2}


def counted(number: int, noun: str) -> str:
    """Return a number with its noun, such as "1 item" or "1,204 items"."""
    return f"{number:,} {noun}" if number == 1 else f"{number:,} {noun}s"


class Findings:
    """A growing list of problems."""

    def __init__(self) -> None:
        self._kept: list[Problem] = []
        self._number: dict[Severity, int] = {"error": 0, "warning": 0, "note": 0}

    def add(
        self,
        message: str,
        where: Place | None = None,
        mend: str | None = None,
        severity: Severity = "error",
    ) -> None:
        """Keep a problem, or count it where there are too many."""
        self.extend([Problem(message, where, mend, severity)])

    def extend(self, problems: Iterable[Problem]) -> None:
        """Keep several problems."""
        for problem in problems:
            self._number[problem.severity] += 1
            if self._number[problem.severity] <= MOST:
                self._kept.append(problem)

    def take(self, error: RelookError) -> None:
        """Keep what an error says, so that the pass can go on."""
        self.extend(error.problems or [Problem(error.message, error.where, error.mend)])

    def attempt(self, step: Callable[[], T]) -> T | None:
        """Run a step; where it fails, keep its problems and return None."""
        try:
            return step()
        except RelookError as error:
            self.take(error)
            return None

    @property
    def any_errors(self) -> bool:
        """Whether an error was found."""
        return self._number["error"] > 0

    def room(self, severity: Severity = "error") -> int:
        """How many more problems of a severity will be kept."""
        return max(0, MOST - self._number[severity])

    def add_at(
        self, rows: Sequence[int], message: str, place: Callable[[int], Place], mend: str
    ) -> None:
        """Keep one error for each of many rows; those beyond the limit are only counted."""
        kept = rows[: self.room()]
        for row in kept:
            self.add(message, place(row), mend)
        self._number["error"] += len(rows) - len(kept)

    def sorted(self) -> tuple[Problem, ...]:
        """Return the problems: errors first, then by file and row, and how many were left out."""
        kept = sorted(
            self._kept,
            key=lambda problem: (
                _ORDER[problem.severity],
                (problem.where and problem.where.file) or "",
                (problem.where and problem.where.sheet) or "",
                (problem.where and problem.where.row) or 0,
            ),
        )
        for severity, number in self._number.items():
            if number > MOST:
                last = max(at for at, one in enumerate(kept) if one.severity == severity)
                words = {"error": "errors", "warning": "warnings", "note": "notes"}[severity]
                left = Problem(
                    f"{number - MOST:,} more {words} are not listed",
                    mend="mend these first",
                    severity=severity,
                )
                kept.insert(last + 1, left)
        return tuple(kept)

    def raise_errors(self) -> None:
        """Raise the errors, if there are any, as one.

        Raises
        ------
        RelookError
        """
        if self.any_errors:
            errors = [problem for problem in self.sorted() if problem.severity == "error"]
            raise RelookError.from_problems(errors)
