"""Worksheets taken back, what the decisions changed, and the final labels."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import asdict, dataclass, field
from datetime import UTC, datetime
from pathlib import Path

import pandas as pd

from relook.core.decisions import Settlement
from relook.errors import Problem
from relook.frames.showing import Facts, as_html, figure, plain
from relook.project.archive.record import read_record
from relook.project.archive.settlements import settlements
from relook.project.outcome.moves import CoderStanding
from relook.project.outcome.rescore_tables import move_rows, stratum_rows
from relook.project.outcome.rescoring import Rescore, VariableRescore
from relook.project.outcome.rescoring import rescore as rescore_project
from relook.project.release.final_labels import final_labels
from relook.project.release.releasing import final_frame
from relook.project.returning.collected import Collected
from relook.project.returning.collecting import collect as collect_worksheets
from relook.project.setup.folder import Project
from relook.project.setup.loading import Loaded, load
from relook.project.setup.people import names_by_id


@dataclass(frozen=True, slots=True, kw_only=True, eq=False, repr=False)
class Returned:
    """What came back of a queue.

    Attributes
    ----------
    folder : Path
    n_taken, n_unchanged, n_blank : int
        Decisions that are new to the record, rows as it has them already, rows without a decision.
    is_complete : bool
        Whether every row that holds something was taken.
    """

    folder: Path
    n_taken: int
    n_unchanged: int
    n_blank: int
    is_complete: bool
    _collected: Collected = field(repr=False)
    _loaded: Loaded = field(repr=False)
    _settled: dict[tuple[str, str], Settlement] = field(repr=False)
    _names: dict[str, str] = field(repr=False)

    @property
    def decisions(self) -> pd.DataFrame:
        """Every standing decision of the record.

        Returns
        -------
        DataFrame of shape (n_decisions, 7)
            Columns item, variable, adjudicator, ruling (label or cannot be coded), label, reason,
            note.
        """
        rows = [
            {
                "item": each.item,
                "variable": each.variable,
                "adjudicator": self._names.get(each.adjudicator, each.adjudicator),
                "ruling": each.ruling,
                "label": each.label,
                "reason": each.reason,
                "note": each.note,
            }
            for held in self._settled.values()
            for each in held.standing
        ]
        columns = ["item", "variable", "adjudicator", "ruling", "label", "reason", "note"]
        return pd.DataFrame(rows, columns=columns)

    @property
    def settled(self) -> pd.DataFrame:
        """What the decisions amount to, shape (n_decided, 4): item, variable, state, label.

        State is settled, cannot be coded, split (adjudicators differ), unconfirmed (one ruling
        against coders who all agree) or open (withdrawn).
        """
        rows = [
            {"item": held.item, "variable": held.variable, "state": held.state, "label": held.label}
            for held in self._settled.values()
        ]
        return pd.DataFrame(rows, columns=["item", "variable", "state", "label"])

    @property
    def problems(self) -> pd.DataFrame:
        """What was not taken, each with its cell and how to mend it, shape (n_problems, 6)."""
        held = self._collected
        found = [report.problem for report in held.rejected]
        found += [
            Problem(f"copies of the row of item {each.item} differ", mend=each.mend)
            for each in held.conflicts
        ]
        found += held.unreadable
        rows = [
            {
                "file": where and where.file,
                "sheet": where and where.sheet,
                "row": where and where.row,
                "column": where and where.column,
                "message": problem.message,
                "mend": problem.mend,
            }
            for problem in found
            for where in (problem.where,)
        ]
        columns = ["file", "sheet", "row", "column", "message", "mend"]
        return pd.DataFrame(rows, columns=columns)

    @property
    def final_labels(self) -> pd.DataFrame:
        """A final label for every item, as far as there is one.

        Returns
        -------
        DataFrame of shape (n_items, …)
            Columns item, variable, label, settled_by (unanimous, consensus, decision, …), how many
            coders support the label, and who decided; a tie is left blank.
        """
        return final_frame(final_labels(self._loaded, self._settled), self._names)

    def _facts(self) -> Facts:
        n_not = len(self._collected.rejected) + len(self._collected.conflicts)
        return (
            ("taken", f"{self.n_taken:,} decisions; {self.n_unchanged:,} were known already"),
            ("blank", f"{self.n_blank:,} rows"),
            ("not taken", f"{n_not:,} rows and {len(self._collected.unreadable):,} files"),
            ("splits", f"{len(self._collected.splits):,}"),
        )

    def __repr__(self) -> str:
        return plain("returned", self._facts())

    def _repr_html_(self) -> str:
        return as_html("returned", self._facts())


@dataclass(frozen=True, slots=True, kw_only=True, eq=False, repr=False)
class Rescored:
    """Labels before and after the decisions.

    Attributes
    ----------
    variable : str
    alpha : float or None
        Of the labels as they were before the first round, and a reliability only if coders made
        them independently; decisions do not enter.
    interval : tuple of (float, float) or None
        Its 95 % interval.
    agreement_after : float or None
        Agreement in the corrected data. It is no reliability: decided items agree because they were
        decided. There is no interval of the change.
    n_settled, n_cannot_be_coded, n_split : int
    audit_share : float or None
        Of the items that would be released with a label but no decision: the share that the random
        audit says would be ruled otherwise, weighed by the sizes of the strata. Items whose labels
        tie are released blank, and left out.
    audit_interval : tuple of (float, float) or None
    """

    variable: str
    alpha: float | None
    interval: tuple[float, float] | None
    agreement_after: float | None
    n_settled: int
    n_cannot_be_coded: int
    n_split: int
    audit_share: float | None
    audit_interval: tuple[float, float] | None
    _rescore: Rescore = field(repr=False)

    @property
    def moves(self) -> pd.DataFrame:
        """Which labels became which: variable, from, to, n_labels, n_items; shape (n_moves, 5)."""
        columns = ["variable", "from", "to", "n_labels", "n_items"]
        return pd.DataFrame(move_rows(self._variable), columns=columns)

    @property
    def reasons(self) -> pd.DataFrame:
        """Why coders differed, by the adjudicators; shape (n_reasons, 3)."""
        rows = [asdict(each) for each in self._variable.reasons]
        return pd.DataFrame(rows, columns=["reason", "n_items", "n_with_reason"])

    @property
    def audit(self) -> pd.DataFrame:
        """What the latest audit found, a row per stratum, with Wilson's interval."""
        audits = self._variable.audits
        return pd.DataFrame([] if not audits else stratum_rows(audits[0]))

    @property
    def coders(self) -> pd.DataFrame:
        """Coders' labels against the decisions, on audit and on disputed items apart.

        Coders are not to be judged by disputed items: those were chosen because coders differ.
        """
        rows = [asdict(each) for each in self._variable.coders]
        return pd.DataFrame(rows, columns=list(CoderStanding.__dataclass_fields__))

    @property
    def _variable(self) -> VariableRescore:
        return self._rescore.variables[0]

    def _facts(self) -> Facts:
        alpha = figure(self.alpha)
        if self.interval is not None:
            alpha += f", 95% interval {self.interval[0]:.3f} to {self.interval[1]:.3f}"
        audit = "none"
        if self.audit_share is not None and self.audit_interval is not None:
            low, high = self.audit_interval
            audit = f"{self.audit_share:.1%} ruled otherwise, 95% interval {low:.1%} to {high:.1%}"
        items = (
            f"{self.n_settled:,} settled, {self.n_cannot_be_coded:,} cannot be coded, "
            f"{self.n_split:,} split"
        )
        return (
            ("alpha, independent labels", alpha),
            ("agreement in the corrected data", f"{figure(self.agreement_after)}, no reliability"),
            ("items", items),
            ("audit", audit),
        )

    def __repr__(self) -> str:
        return plain(f"{self.variable}, before and after", self._facts())

    def _repr_html_(self) -> str:
        return as_html(f"{self.variable}, before and after", self._facts())


def collect(
    folder: str | Path,
    files: Sequence[str | Path] | None = None,
    *,
    strict: bool = False,
    now: datetime | None = None,
) -> Returned:
    """Take worksheets back, in whatever state they return.

    Parameters
    ----------
    folder : str or Path
        Where the queue was written.
    files : sequence of str or Path, optional
        Returned worksheets; what lies in `rounds/01/returned` where left out.
    strict : bool
        Take all rows or none.
    now : datetime, optional
        The time to record, with its zone; now where left out.

    Returns
    -------
    Returned

    Raises
    ------
    RelookError
        No such folder or file, or nothing was sent from it. A file or row that cannot be taken
        raises nothing; see `Returned.problems`.

    Examples
    --------
    >>> import pandas as pd, relook, tempfile
    >>> labels = pd.DataFrame({"a": list("xxyx"), "b": list("xyyx"), "c": list("xyzx")})
    >>> with tempfile.TemporaryDirectory() as folder:
    ...     sheets = relook.queue(relook.measure(labels), top=1, audit=2).write(folder)
    ...     relook.collect(folder, sheets)
    returned
      taken      0 decisions; 0 were known already
      blank      3 rows
      not taken  0 rows and 0 files
      splits     0
    """
    project = Project.open(Path(folder))
    paths = None if files is None else [Path(file) for file in files]
    found = collect_worksheets(project, paths, strict=strict, now=now or datetime.now(UTC))
    loaded = load(project)
    return Returned(
        folder=project.root,
        n_taken=found.accepted,
        n_unchanged=found.unchanged,
        n_blank=found.blank,
        is_complete=found.is_complete,
        _collected=found,
        _loaded=loaded,
        _settled=settlements(loaded, read_record(project)),
        _names=names_by_id(project),
    )


def rescore(folder: str | Path, *, seed: int = 1) -> Rescored:
    """Compare the labels before and after the decisions.

    Parameters
    ----------
    folder : str or Path
        Where the queue was written.
    seed : int
        For the resampling.

    Returns
    -------
    Rescored

    Raises
    ------
    RelookError
        No decision was collected yet, or the labels changed since the queue was written.

    Examples
    --------
    >>> import pandas as pd, relook, tempfile
    >>> labels = pd.DataFrame({"a": list("xxyx"), "b": list("xyyx"), "c": list("xyzx")})
    >>> with tempfile.TemporaryDirectory() as folder:
    ...     _ = relook.queue(relook.measure(labels), top=1).write(folder)
    ...     relook.rescore(folder)
    Traceback (most recent call last):
    relook.errors.RelookError: the record holds no decision yet, so nothing has changed
    mend: collect returned worksheets with `relook collect` first; `relook score` shows alpha
    """
    held = rescore_project(load(Project.open(Path(folder))), seed=seed)
    scored = held.variables[0]
    interval = scored.interval.interval
    audit = scored.audits[0].result if scored.audits else None
    limits = (audit.low, audit.high) if audit is not None else (None, None)
    return Rescored(
        variable=scored.name,
        alpha=scored.corrected.given.alpha,
        interval=None if interval is None else (interval.low, interval.high),
        agreement_after=scored.corrected.after.agreement,
        n_settled=scored.states["settled"],
        n_cannot_be_coded=scored.states["cannot be coded"],
        n_split=scored.states["split"],
        audit_share=None if audit is None else audit.share_ruled_otherwise,
        audit_interval=None if limits[0] is None or limits[1] is None else (limits[0], limits[1]),
        _rescore=held,
    )
