"""Which of the decisions found in returned files go into the record: a pure function.

A decision is weighed against what the record holds of the same row and against the other files of
the run, never by the order of files. The rules, first that applies:

1. The same as the row's latest decision: unchanged.
2. The same as an earlier, superseded decision of the row, or from a file that an earlier run read
   already, or that was saved before the file of the latest decision: an older version. It is not
   brought back unless that is asked for.
3. Different in two files of the run: a conflict; neither is taken.
4. Else it is taken, and supersedes the latest decision, which stays in the record.
"""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from typing import Literal

from relook.core.decisions import Decision
from relook.project.archive.record import Record
from relook.project.archive.recorded import Recorded
from relook.project.returning.checking import Candidate, Checked
from relook.project.returning.collected import Conflict, RowReport, Version

Standing = Literal["new", "unchanged", "older"]


@dataclass(frozen=True, slots=True, kw_only=True)
class CheckedFile:
    """One file of a run with its checked rows.

    Attributes
    ----------
    digest : str
    modified : str
        When it says it was last saved; "" where it does not.
    seen : bool
        Whether an earlier run read the same bytes.
    checked : Checked
    """

    digest: str
    modified: str
    seen: bool
    checked: Checked


@dataclass(slots=True)
class Weighed:
    """What a run comes to."""

    entries: list[Recorded] = field(default_factory=list)
    adjusted: list[RowReport] = field(default_factory=list)
    rejected: list[RowReport] = field(default_factory=list)
    edited: list[RowReport] = field(default_factory=list)
    older: list[RowReport] = field(default_factory=list)
    conflicts: list[Conflict] = field(default_factory=list)
    unchanged: int = 0
    blank: int = 0


@dataclass(frozen=True, slots=True)
class _Past:
    """What the record holds: by row, and by who ruled on what."""

    of_row: Mapping[str, Sequence[Recorded]]
    latest: Mapping[tuple[str, str, str], Recorded]

    @classmethod
    def of(cls, record: Record) -> _Past:
        of_row: dict[str, list[Recorded]] = defaultdict(list)
        latest: dict[tuple[str, str, str], Recorded] = {}
        for entry in record.entries:
            held = entry.decision
            if entry.key:
                of_row[entry.key].append(entry)
            who = (held.item, held.variable, held.adjudicator)
            before = latest.get(who)
            if before is None or (held.order, held.id) > (
                before.decision.order,
                before.decision.id,
            ):
                latest[who] = entry
        return cls(of_row, latest)


def weigh(record: Record, files: Sequence[CheckedFile], *, reinstate: bool) -> Weighed:
    """Decide what the rows of a run's files add to the record.

    Parameters
    ----------
    record : Record
        As it stands before the run.
    files : sequence of CheckedFile
        In any order; the outcome does not depend on it.
    reinstate : bool
        Whether older versions may be brought back.
    """
    past = _Past.of(record)
    result = Weighed()
    ordered = sorted(files, key=lambda file: file.digest)
    found: dict[str, list[tuple[CheckedFile, Candidate]]] = defaultdict(list)
    for file in ordered:
        for key, candidate in file.checked.candidates.items():
            found[key].append((file, candidate))
        result.edited += [] if file.seen else file.checked.edited
    for key in sorted(found):
        _weigh_row(key, found[key], past, result, reinstate=reinstate)
    blank = {key for file in ordered for key in file.checked.blank}
    result.blank = len(blank - found.keys())
    for file in ordered:
        for report in file.checked.rejected:
            answered = report.key in found or report.key in past.of_row
            if not (file.seen and answered):
                result.rejected.append(report)
    for reports in (result.rejected, result.edited, result.older, result.adjusted):
        reports.sort(key=lambda report: (report.worksheet, report.sheet or "", report.row))
    return result


def _weigh_row(
    key: str,
    found: Sequence[tuple[CheckedFile, Candidate]],
    past: _Past,
    result: Weighed,
    *,
    reinstate: bool,
) -> None:
    earlier = past.of_row.get(key, ())
    judged = [(_judge(file, candidate, earlier), file, candidate) for file, candidate in found]
    older = [(file, candidate) for how, file, candidate in judged if how == "older"]
    new = [(file, candidate) for how, file, candidate in judged if how == "new"]
    # A copy that says what the record says already contradicts another only if it is news itself.
    same = [
        (file, candidate) for how, file, candidate in judged if how == "unchanged" and not file.seen
    ]
    if reinstate:
        new, older = [*new, *older], []
    answered = any(how == "unchanged" for how, _, _ in judged) or bool(new)
    result.older.extend(
        _said(
            candidate,
            "an older version of the row says so; a later one stands",
            "add --reinstate to bring it back",
        )
        for file, candidate in older
        if not (file.seen and answered)
    )
    contenders = [*new, *same] if new else []
    if len({candidate.ruled for _, candidate in contenders}) > 1:
        first = contenders[0][1].sent.row
        result.conflicts.append(
            Conflict(
                key=key,
                item=first.item,
                variable=first.variable,
                versions=tuple(_version(candidate) for _, candidate in contenders),
            )
        )
    elif new:
        _take(*_fullest(new), past, result)
    elif answered or not older:
        result.unchanged += 1


def _judge(file: CheckedFile, candidate: Candidate, earlier: Sequence[Recorded]) -> Standing:
    if not earlier:
        return "new"
    latest = earlier[-1]
    if candidate.value == latest.value:
        return "unchanged"
    saved_before = bool(file.modified and latest.modified) and file.modified < latest.modified
    superseded = any(candidate.value == entry.value for entry in earlier[:-1])
    return "older" if superseded or file.seen or saved_before else "new"


def _fullest(
    new: Sequence[tuple[CheckedFile, Candidate]],
) -> tuple[CheckedFile, Candidate]:
    """Return the return with the most to say; all of them rule the same."""
    return max(new, key=lambda pair: (len(pair[1].note), len(pair[1].reason), pair[0].digest))


def _take(file: CheckedFile, candidate: Candidate, past: _Past, result: Weighed) -> None:
    sent = candidate.sent
    ruling, label = candidate.ruled
    who = (sent.row.item, sent.row.variable, sent.row.adjudicator)
    before = past.latest.get(who)
    if ruling == "withdraw" and (before is None or before.decision.ruling == "withdraw"):
        result.unchanged += 1  # nothing is there to be taken back
        return
    if candidate.reading.adjusted:
        result.adjusted.append(
            _said(
                candidate,
                f'taken as "{label or ruling}"; it differs by {candidate.reading.adjusted}',
            )
        )
    report = candidate.report
    result.entries.append(
        Recorded(
            decision=Decision(
                item=sent.row.item,
                variable=sent.row.variable,
                adjudicator=sent.row.adjudicator,
                ruling=ruling,
                label=label,
                reason=candidate.reason,
                note=candidate.note,
                round=sent.round,
                kind=sent.row.kind,
            ),
            key=sent.row.key,
            worksheet=sent.row.worksheet,
            source=file.digest,
            modified=file.modified,
            sheet=report.sheet or "",
            cell=f"{report.column}{report.row}",
            found=candidate.reading.found if candidate.reading.adjusted else "",
            supersedes="" if before is None else before.decision.id,
            labels_digest=sent.row.labels_digest,
        )
    )


def _version(candidate: Candidate) -> Version:
    report = candidate.report
    return Version(
        worksheet=report.worksheet,
        sheet=report.sheet,
        row=report.row,
        column=report.column,
        found=report.found,
    )


def _said(candidate: Candidate, reason: str, mend: str = "") -> RowReport:
    report = candidate.report
    return RowReport(
        worksheet=report.worksheet,
        sheet=report.sheet,
        row=report.row,
        column=report.column,
        key=report.key,
        item=report.item,
        variable=report.variable,
        found=report.found,
        reason=reason,
        mend=mend,
    )
