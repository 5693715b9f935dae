"""Where a project stands: rounds, worksheets out and back, decisions, splits, and what is next."""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterable, Sequence
from dataclasses import dataclass

from relook.core.decisions import Decision, Settlement
from relook.errors import Problem
from relook.project.archive.codings import labels_given, read_codings
from relook.project.archive.history import History
from relook.project.archive.record import inspect_record
from relook.project.archive.rounds import Round, read_rounds
from relook.project.archive.settlements import settlements
from relook.project.setup.folder import Project
from relook.project.setup.loading import Loaded, labels_digest, labels_of_item, load


@dataclass(frozen=True, slots=True, kw_only=True)
class SheetStanding:
    """One worksheet: how many of its rows have a standing decision of its adjudicator.

    Attributes
    ----------
    round : int
    file : str
    adjudicator : str
        Id.
    n_rows, n_decided : int
    """

    round: int
    file: str
    adjudicator: str
    n_rows: int
    n_decided: int

    @property
    def is_back(self) -> bool:
        """Whether anything of it was collected."""
        return self.n_decided > 0


@dataclass(frozen=True, slots=True, kw_only=True)
class Standing:
    """Where a project stands.

    Attributes
    ----------
    rounds : tuple of Round
    sheets : tuple of SheetStanding
    codings : tuple of Round
        The codings after the first.
    coding_sheets : tuple of SheetStanding
        Of these, with the coding's number for the round's.
    states : dict of str to int
        How many (item, variable) are settled, cannot be coded, split, unconfirmed, open.
    splits : tuple of Settlement
        Splits and rulings against unanimous coders that nobody has confirmed.
    stale : tuple of (item, variable)
        Sent with labels that have changed since.
    orphaned : tuple of (item, variable)
        Decided or sent, and no longer in the label table.
    problems : tuple of Problem
        Of the record and of reading.
    next_step : str
    """

    rounds: tuple[Round, ...]
    sheets: tuple[SheetStanding, ...]
    codings: tuple[Round, ...]
    coding_sheets: tuple[SheetStanding, ...]
    states: dict[str, int]
    splits: tuple[Settlement, ...]
    stale: tuple[tuple[str, str], ...]
    orphaned: tuple[tuple[str, str], ...]
    problems: tuple[Problem, ...]
    next_step: str


def standing_of(project: Project) -> Standing:
    """Find out where a project stands.

    Parameters
    ----------
    project : Project

    Raises
    ------
    RelookError
        The tables or a round file cannot be read. A damaged record is told among the problems.
    """
    loaded = load(project)
    rounds = read_rounds(project)
    record, problems = inspect_record(project)
    settled = settlements(loaded, record)
    history = History(rounds, record, settled)
    sheets = tuple(_sheets(rounds, [each for kept in settled.values() for each in kept.standing]))
    codings = read_codings(project)
    fresh, more_problems = inspect_record(project.codings)
    coding_sheets = tuple(
        sheet for held in codings for sheet in _sheets([held], labels_given(fresh, held))
    )
    waiting = tuple(held for held in settled.values() if held.state in ("split", "unconfirmed"))
    stale, orphaned = _changed(loaded, rounds)
    return Standing(
        rounds=tuple(rounds),
        sheets=sheets,
        codings=tuple(codings),
        coding_sheets=coding_sheets,
        states=dict(sorted(Counter(held.state for held in settled.values()).items())),
        splits=waiting,
        stale=stale,
        orphaned=orphaned,
        problems=(*loaded.problems, *problems, *more_problems),
        next_step=_next_step(project, history, sheets, coding_sheets, waiting),
    )


def _sheets(rounds: Sequence[Round], standing: Iterable[Decision]) -> list[SheetStanding]:
    ruled = {(each.item, each.variable, each.adjudicator) for each in standing}
    found = []
    for held in rounds:
        decided = Counter(
            row.worksheet for row in held.rows if (row.item, row.variable, row.adjudicator) in ruled
        )
        found += [
            SheetStanding(
                round=held.number,
                file=sheet.file,
                adjudicator=sheet.adjudicator,
                n_rows=sheet.n_rows,
                n_decided=decided[sheet.id],
            )
            for sheet in held.worksheets
        ]
    return found


def _changed(
    loaded: Loaded, rounds: list[Round]
) -> tuple[tuple[tuple[str, str], ...], tuple[tuple[str, str], ...]]:
    """Rows whose item's labels changed since they were sent, and rows whose item is gone."""
    latest = {(row.item, row.variable): row for held in rounds for row in held.rows}
    numbers = loaded.item_numbers([item for item, _ in latest])
    stale, orphaned = [], []
    for (key, row), number in zip(latest.items(), numbers, strict=True):
        if number < 0 or row.variable not in loaded.agreements:
            orphaned.append(key)
        elif labels_digest(labels_of_item(loaded, row.variable, int(number))) != row.labels_digest:
            stale.append(key)
    return tuple(sorted(stale)), tuple(sorted(orphaned))


def _next_step(
    project: Project,
    history: History,
    sheets: tuple[SheetStanding, ...],
    coding_sheets: tuple[SheetStanding, ...],
    waiting: tuple[Settlement, ...],
) -> str:
    shown = project.shown_root
    if coding_sheets and not any(sheet.is_back for sheet in coding_sheets):
        return f"wait for the coding sheets, then relook collect {shown}"
    if not sheets and coding_sheets:
        return f"relook rescore {shown}"
    if not sheets:
        return f"relook queue {shown}"
    out = [sheet for sheet in sheets if sheet.n_decided < sheet.n_rows]
    if history.last_is_unanswered:
        return f"wait for the worksheets, then relook collect {shown}"
    unsent = {(held.item, held.variable) for held in waiting} - history.waiting_for_second()
    rows = sum(sheet.n_rows - sheet.n_decided for sheet in out)
    if unsent and out:
        return (
            f"{rows:,} rows are still open; collect them, or have somebody else rule on "
            f"{len(unsent):,} already with relook queue {shown} --splits"
        )
    if unsent:
        return f"relook queue {shown} --splits"
    if out:
        return f"{rows:,} rows are still open; collect them, or go on with relook rescore {shown}"
    return f"relook rescore {shown}"
