"""The rows of one returned worksheet, each checked against what was sent."""

from __future__ import annotations

from collections import Counter, defaultdict
from collections.abc import Callable, Iterable, Mapping, Sequence
from dataclasses import dataclass, field
from functools import cache

from relook.core.decisions import Ruling
from relook.errors import Place, Problem, RelookError
from relook.project.archive.rounds import Round, RoundRow
from relook.project.returning.collected import RowReport
from relook.worksheet.keys import ROW_CODE, evidence_digest
from relook.worksheet.matching import Reading, folded, match_decision, match_ticks, shown
from relook.worksheet.model import SheetVariable
from relook.worksheet.read import ReturnedRow, ReturnedWorksheet, is_own_header

#: A column whose cells nearly all differ tells rows apart; one of a few repeated labels does not.
_TELLING_SHARE = 0.5
_LEAST_TELLING = 3


@dataclass(frozen=True, slots=True)
class SentRow:
    """A row as it was sent: the round it belongs to, and what may be decided there."""

    row: RoundRow
    round: int
    variable: SheetVariable
    evidence: Mapping[str, str]  # digest by header, case-folded


@dataclass(frozen=True, slots=True)
class Sent:
    """Everything that was sent, by row code."""

    project: str
    rows: Mapping[str, SentRow]
    by_worksheet: Mapping[str, tuple[SentRow, ...]]
    set_labels: frozenset[str]  # of variables decided as sets, case-folded

    @classmethod
    def of_rounds(
        cls,
        project: str,
        rounds: Iterable[Round],
        variables_of: Callable[[Round], Mapping[str, SheetVariable]],
    ) -> Sent:
        """Gather the rows of every round."""
        rows: dict[str, SentRow] = {}
        by_worksheet: dict[str, list[SentRow]] = defaultdict(list)
        labels: set[str] = set()
        for each in rounds:
            variables = variables_of(each)
            for variable in variables.values():
                if variable.entry == "set":
                    labels.update(folded(label) for label in variable.labels)
            for row in each.rows:
                evidence = {folded(header): digest for header, digest in row.evidence.items()}
                sent = SentRow(row, each.number, variables[row.variable], evidence)
                rows[row.key] = sent
                by_worksheet[row.worksheet].append(sent)
        return cls(
            project,
            rows,
            {worksheet: tuple(held) for worksheet, held in by_worksheet.items()},
            frozenset(labels),
        )


@dataclass(frozen=True, slots=True, kw_only=True)
class Candidate:
    """A valid decision found in a returned file."""

    sent: SentRow
    reading: Reading
    reason: str
    note: str
    report: RowReport

    @property
    def ruled(self) -> tuple[Ruling, str | None]:
        """The ruling and its label."""
        return self.reading.ruling, self.reading.label

    @property
    def value(self) -> tuple[str, str | None, str, str]:
        """What was decided and said: ruling, label, reason, note."""
        return self.reading.ruling, self.reading.label, self.reason, self.note


@dataclass(slots=True)
class Checked:
    """What the rows of one returned file came to."""

    candidates: dict[str, Candidate] = field(default_factory=dict)
    blank: set[str] = field(default_factory=set)
    rejected: list[RowReport] = field(default_factory=list)
    edited: list[RowReport] = field(default_factory=list)
    keys: frozenset[str] = frozenset()  # of all rows that belong to the project
    notes: list[Problem] = field(default_factory=list)


def check_worksheet(returned: ReturnedWorksheet, sent: Sent) -> Checked:
    """Check every row of a returned worksheet against what was sent.

    Raises
    ------
    RelookError
        The worksheet belongs to another project.
    """
    _refuse_foreign(returned, sent)
    result = Checked(notes=list(returned.notes))
    known = [row for row in returned.rows if row.key in sent.rows]
    result.keys = frozenset(row.key for row in known)
    misplaced = _check_evidence(returned, known, sent, result)
    found: dict[str, list[Candidate]] = defaultdict(list)
    for row in returned.rows:
        held = sent.rows.get(row.key)
        if held is None:
            _reject_unknown(returned, row, result)
            continue
        reading = _read_decision(row, held, sent)
        report = _report(returned, row, held, found=reading.found)
        if reading.state == "blank":
            _take_blank(row, report, result)
            if id(row) in misplaced:
                result.edited.append(misplaced[id(row)])
        elif id(row) in misplaced:
            result.rejected.append(misplaced[id(row)])
        elif reading.state == "unmatched":
            result.rejected.append(_with(report, reading.reason, reading.mend))
        else:
            candidate = Candidate(
                sent=held, reading=reading, reason=row.reason, note=row.note, report=report
            )
            found[row.key].append(candidate)
    for key, candidates in found.items():
        _settle_duplicates(key, candidates, result)
    result.blank -= found.keys()
    return result


def _refuse_foreign(returned: ReturnedWorksheet, sent: Sent) -> None:
    known = any(row.key in sent.rows for row in returned.rows)
    if returned.project and returned.project != sent.project:
        raise RelookError(
            "the worksheet belongs to another project",
            where=Place(returned.file),
            mend="collect it with that project's folder",
        )
    if not known:
        raise RelookError(
            "none of its row codes belongs to this project",
            where=Place(returned.file),
            mend="check that this is a worksheet of this project with its row codes intact",
        )


def _read_decision(row: ReturnedRow, held: SentRow, sent: Sent) -> Reading:
    if held.variable.entry != "set" or not row.ticked:
        return match_decision(row.decision, held.variable)
    own = {folded(label): label for label in held.variable.labels}
    ticked = [own.get(label, label) for label in row.ticked if label in sent.set_labels]
    return match_ticks(ticked, row.decision, held.variable)


def _report(
    returned: ReturnedWorksheet, row: ReturnedRow, held: SentRow | None, *, found: str
) -> RowReport:
    return RowReport(
        worksheet=returned.file,
        sheet=row.sheet or None,
        row=row.row,
        column=row.decision_column,
        key=row.key,
        item="" if held is None else held.row.item,
        variable="" if held is None else held.row.variable,
        found=found,
    )


def _with(report: RowReport, reason: str, mend: str, *, column: str | None = None) -> RowReport:
    return RowReport(
        worksheet=report.worksheet,
        sheet=report.sheet,
        row=report.row,
        column=report.column if column is None else column,
        key=report.key,
        item=report.item,
        variable=report.variable,
        found=report.found,
        reason=reason,
        mend=mend,
    )


def _reject_unknown(returned: ReturnedWorksheet, row: ReturnedRow, result: Checked) -> None:
    found = shown(row.decision)
    if not found:
        return  # whatever stands in the column of row codes there, nothing was decided in the row
    report = _report(returned, row, None, found=found)
    if row.key:
        # A note that was typed there would be hard to know again in the form of a code.
        named = f'"{row.key}"' if ROW_CODE.fullmatch(row.key) else "what stands for the row code"
        reason = f"{named} is no row code of this project"
    else:
        reason = "the row has a decision but no row code"
    mend = "copy the row code from the worksheet that was sent"
    result.rejected.append(_with(report, reason, mend))


def _take_blank(row: ReturnedRow, report: RowReport, result: Checked) -> None:
    if row.merged_into:
        result.rejected.append(
            _with(
                report,
                f"the cell was merged into {row.merged_into}, so this row has no decision",
                "unmerge the cells and give each row its own decision",
            )
        )
        return
    result.blank.add(row.key)
    for what, said in (("note", row.note), ("reason", row.reason)):
        if not said:
            continue
        result.notes.append(
            Problem(
                f'the row has a {what} but no decision: "{said[:80]}"',
                report.where,
                f"decide the row, if the {what} was meant as an answer",
                "warning",
            )
        )


def _settle_duplicates(key: str, candidates: Sequence[Candidate], result: Checked) -> None:
    """Take a row that is there several times if its decisions agree."""
    first = candidates[0]
    if len(candidates) == 1:
        result.candidates[key] = first
        return
    if len({candidate.ruled for candidate in candidates}) > 1:
        rows = ", ".join(str(candidate.report.row) for candidate in candidates)
        result.rejected.extend(
            _with(
                candidate.report,
                f"the row code {key} is there {len(candidates)} times, with different decisions "
                f"(rows {rows})",
                "keep the row that holds, and delete the others",
            )
            for candidate in candidates
        )
        return
    reasons = [candidate.reason for candidate in candidates if candidate.reason]
    notes = dict.fromkeys(candidate.note for candidate in candidates if candidate.note)
    result.candidates[key] = Candidate(
        sent=first.sent,
        reading=first.reading,
        reason=reasons[0] if reasons else "",
        note="\n".join(notes),
        report=first.report,
    )


# Evidence.


def _check_evidence(
    returned: ReturnedWorksheet, known: Sequence[ReturnedRow], sent: Sent, result: Checked
) -> dict[int, RowReport]:
    """Report edited evidence; return the rows that show the evidence of another row.

    A sort that left out some columns puts one row's evidence beside another row's code. It is told
    from an edit by the column as a whole: the altered cells are the sent ones in another order, or
    a cell that tells rows apart holds what was sent for another item.
    """
    digest_of = cache(evidence_digest)
    altered: dict[str, list[tuple[ReturnedRow, str]]] = defaultdict(list)
    for row in known:
        for header, digest in sent.rows[row.key].evidence.items():
            text = row.evidence.get(header)
            if text is not None and digest_of(text) != digest:
                altered[header].append((row, digest_of(text)))
    _note_missing_columns(returned, known, sent, result)
    _note_further_columns(returned, known, sent, result)
    misplaced: dict[int, RowReport] = {}
    for header, cells in altered.items():
        column = returned.columns.get(header, header)
        moved = _moved_rows(header, cells, sent)
        for row, _ in cells:
            held = sent.rows[row.key]
            report = _report(returned, row, held, found=row.evidence[header][:60])
            if id(row) in moved:
                decision = _report(returned, row, held, found=shown(row.decision))
                misplaced[id(row)] = _with(
                    decision,
                    f'the cell under "{header}" (column {column}) belongs to another row, as '
                    "after sorting only some of the columns",
                    "undo the sort, or copy the decision into the worksheet as it was sent",
                )
            else:
                reason = f'the cell under "{header}" is not as it was sent; the change is not taken'
                result.edited.append(_with(report, reason, "", column=column))
    return misplaced


def _moved_rows(
    header: str, cells: Sequence[tuple[ReturnedRow, str]], sent: Sent
) -> frozenset[int]:
    sent_digests = Counter(sent.rows[row.key].evidence[header] for row, _ in cells)
    if len(cells) > 1 and Counter(digest for _, digest in cells) == sent_digests:
        return frozenset(id(row) for row, _ in cells)
    worksheets = {sent.rows[row.key].row.worksheet for row, _ in cells}
    owners: dict[str, set[str]] = defaultdict(set)
    items: set[str] = set()
    for worksheet in worksheets:
        for held in sent.by_worksheet[worksheet]:
            owners[held.evidence.get(header, "")].add(held.row.item)
            items.add(held.row.item)
    if len(owners) < max(_LEAST_TELLING, _TELLING_SHARE * len(items)):
        return frozenset()
    return frozenset(
        id(row)
        for row, digest in cells
        if digest in owners and sent.rows[row.key].row.item not in owners[digest]
    )


def _note_missing_columns(
    returned: ReturnedWorksheet, known: Sequence[ReturnedRow], sent: Sent, result: Checked
) -> None:
    missing = dict.fromkeys(
        header
        for row in known
        for header in sent.rows[row.key].evidence
        if header not in row.evidence
    )
    result.notes.extend(
        Problem(
            f'the column "{header}" is gone or renamed, so its cells were not compared',
            Place(returned.file),
            severity="note",
        )
        for header in missing
    )


def _note_further_columns(
    returned: ReturnedWorksheet, known: Sequence[ReturnedRow], sent: Sent, result: Checked
) -> None:
    """Tell of columns that were put in and hold something: nothing is taken from them."""
    filled = Counter(header for row in known for header, text in row.evidence.items() if text)
    was_sent = {header for row in known for header in sent.rows[row.key].evidence}
    result.notes.extend(
        Problem(
            f'the column "{header}" was not sent and is not taken; cells filled in it: {n:,}',
            Place(returned.file, column=returned.columns.get(header)),
            "write what matters into the note of the row",
            "note",
        )
        for header, n in filled.items()
        if header not in was_sent and not is_own_header(header)
    )
