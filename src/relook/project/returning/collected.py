"""What a collect found and did, row by row, for whoever tells the user."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass

from relook.errors import Place, Problem


@dataclass(frozen=True, slots=True, kw_only=True)
class RowReport:
    """A row that was not taken, or not without a remark.

    Attributes
    ----------
    worksheet : str
        The returned file, as named to the user.
    sheet : str or None
        Title of the sheet; None in a CSV file.
    row : int
    column : str
        Letter of the column.
    key, item, variable : str
        What the row is about, as far as it is known; else "".
    found : str
        What the cell shows.
    reason : str
        Why it was not taken, or what is to be said of it.
    mend : str
        What to do; "" where nothing need be done.
    """

    worksheet: str
    sheet: str | None
    row: int
    column: str
    key: str = ""
    item: str = ""
    variable: str = ""
    found: str = ""
    reason: str = ""
    mend: str = ""

    @property
    def where(self) -> Place:
        """The cell's place."""
        return Place(self.worksheet, self.sheet, self.row, self.column)

    @property
    def problem(self) -> Problem:
        """The row as a finding with place and mend."""
        said = f'"{self.found}": {self.reason}' if self.found else self.reason
        return Problem(said, self.where, self.mend or None)


@dataclass(frozen=True, slots=True, kw_only=True)
class Version:
    """What one of several differing returns says of a row."""

    worksheet: str
    sheet: str | None
    row: int
    column: str
    found: str


@dataclass(frozen=True, slots=True, kw_only=True)
class Conflict:
    """A row on which returns of one run differ; none of them is taken."""

    key: str
    item: str
    variable: str
    versions: tuple[Version, ...]

    @property
    def mend(self) -> str:
        """What to do about it."""
        return "ask which one holds, and collect that file alone by its name"


@dataclass(frozen=True, slots=True, kw_only=True)
class Split:
    """An item on which the adjudicators' standing decisions differ.

    Attributes
    ----------
    item, variable : str
    rulings : tuple of (str, str)
        Adjudicator's id, and the label or "cannot be coded".
    """

    item: str
    variable: str
    rulings: tuple[tuple[str, str], ...]


@dataclass(frozen=True, slots=True, kw_only=True)
class Collected:
    """What a collect found and did.

    Attributes
    ----------
    accepted : int
        Decisions taken into the record, or that would be, under a dry run.
    superseded : int
        How many of them take the place of an earlier decision, which is kept.
    unchanged : int
        Rows whose decision the record has already.
    blank : int
        Rows without a decision.
    rejected : tuple of RowReport
        Rows that hold something that was not taken.
    edited : tuple of RowReport
        Cells of the evidence that are not as they were sent; never taken.
    older : tuple of RowReport
        Rows of an earlier version of a worksheet; not brought back.
    adjusted : tuple of RowReport
        Decisions taken although written otherwise than the label.
    conflicts : tuple of Conflict
    splits : tuple of Split
        As the record now stands.
    unreadable : tuple of Problem
        Files of which nothing was taken.
    notes : tuple of Problem
        What had to be guessed, and notes that stand beside no decision.
    files : tuple of str
        The files that were read.
    record_file : str or None
        The decisions file that was written, as named to the user.
    held_back : bool
        Whether nothing was taken because not everything could be (`strict`).
    dry_run : bool
    """

    accepted: int = 0
    superseded: int = 0
    unchanged: int = 0
    blank: int = 0
    rejected: tuple[RowReport, ...] = ()
    edited: tuple[RowReport, ...] = ()
    older: tuple[RowReport, ...] = ()
    adjusted: tuple[RowReport, ...] = ()
    conflicts: tuple[Conflict, ...] = ()
    splits: tuple[Split, ...] = ()
    unreadable: tuple[Problem, ...] = ()
    notes: tuple[Problem, ...] = ()
    files: tuple[str, ...] = ()
    record_file: str | None = None
    held_back: bool = False
    dry_run: bool = False

    @property
    def is_complete(self) -> bool:
        """Whether every row that holds something was taken."""
        return not (self.rejected or self.conflicts or self.unreadable)

    @property
    def mend_keys(self) -> tuple[str, ...]:
        """Row codes of the known rows that were not taken, each once, in the order reported."""
        reports: Iterable[RowReport | Conflict] = (*self.rejected, *self.conflicts)
        return tuple(dict.fromkeys(report.key for report in reports if report.item and report.key))
