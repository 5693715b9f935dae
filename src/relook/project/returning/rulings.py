"""Rulings made elsewhere, and items with known answers: brought into the record from a table."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Callable, Collection, Mapping, Sequence
from dataclasses import dataclass, replace
from datetime import datetime
from pathlib import Path

from relook import __version__
from relook.cells.limits import column_letters
from relook.cells.model import EMPTY, Book, Cell, Sheet
from relook.cells.opening import open_book
from relook.core.decisions import LEAD, Decision
from relook.errors import Place, RelookError, listed, nearest
from relook.project.archive.record import Record, make_file, read_record, write_file
from relook.project.archive.recorded import Recorded, entry_to_dict
from relook.project.archive.rounds import read_rounds
from relook.project.returning.collected import Collected, RowReport
from relook.project.returning.collecting import splits_of
from relook.project.returning.returns import LoggedFile, Returned, Run, keep, log_run, read_returned
from relook.project.setup.folder import Project
from relook.worksheet.keys import adjudicator_id
from relook.worksheet.matching import folded, loosened, match_decision
from relook.worksheet.model import SheetVariable

KIND = "rulings"
_NEEDED = ("item", "label", "by")
_KNOWN = ("item", "variable", "label", "by", "reason", "note")


@dataclass(frozen=True, slots=True)
class _Ruling:
    entry: Recorded
    report: RowReport


def collect_rulings(
    project: Project,
    path: Path,
    *,
    variables: Mapping[str, SheetVariable],
    items: Collection[str],
    labels_digest_of: Callable[[str, str], str] | None = None,
    strict: bool = False,
    reinstate: bool = False,
    dry_run: bool = False,
    now: datetime,
) -> Collected:
    """Bring rulings from a table into the record, under the checks that worksheets get.

    Parameters
    ----------
    project : Project
    path : Path
        A table with the columns item, variable, label, by and, if wanted, reason and note. The
        variable may be left out where the project has one only.
    variables : mapping of str to SheetVariable
        What may be decided, by variable.
    items : collection of str
        The items that the project has.
    labels_digest_of : callable, optional
        Returns the digest of an item's labels on a variable as they stand.
    strict, reinstate, dry_run, now
        As for `relook.project.returning.collecting.collect`.

    Raises
    ------
    RelookError
        The file cannot be read or lacks a column, the record is damaged, or the folder cannot be
        written.
    """
    if not path.exists():
        raise RelookError("no such file", where=Place(str(path)), mend="check the path")
    returned = read_returned(project, path)
    rounds = [each.number for each in read_rounds(project)]
    latest = max(rounds, default=0)
    reader = _Reader(project, returned, variables, frozenset(items), labels_digest_of, latest)
    rulings, rejected = reader.read(open_book(returned.data, returned.name))
    if dry_run:
        return _add(project, rulings, rejected, returned, latest, strict, reinstate, None)
    with project.lock():
        return _add(project, rulings, rejected, returned, latest, strict, reinstate, now)


def _add(
    project: Project,
    rulings: Sequence[_Ruling],
    rejected: list[RowReport],
    returned: Returned,
    latest: int,
    strict: bool,
    reinstate: bool,
    now: datetime | None,
) -> Collected:
    record = read_record(project)
    entries, older, unchanged = _weigh(record, rulings, reinstate=reinstate)
    result = Collected(
        accepted=len(entries),
        superseded=sum(1 for entry in entries if entry.supersedes),
        unchanged=unchanged,
        rejected=tuple(rejected),
        older=tuple(older),
        files=(returned.name,),
        dry_run=now is None,
    )
    if strict and rejected:
        result = replace(result, accepted=0, superseded=0, held_back=True)
    elif now is not None and entries:
        keep(project, latest, returned)
        stamp = record.next_stamp(now)
        logged = LoggedFile(
            digest=returned.digest, name=returned.name, suffix=returned.suffix, seen=False
        )
        name, data = make_file(
            project.settings.project, record, stamp, entries, version=__version__, kind=KIND
        )
        run = Run(
            kind=KIND,
            stamp=stamp,
            version=__version__,
            follows=record.heads,
            reinstate=reinstate,
            files=(logged,),
            writes=name,
            entries=tuple(entry_to_dict(entry) for entry in entries),
        )
        log_run(project, latest, run)
        write_file(project, name, data)
        record = read_record(project)
        result = replace(result, record_file=project.relative(project.decisions_folder / name))
    return replace(result, splits=splits_of(project, record))


def _weigh(
    record: Record, rulings: Sequence[_Ruling], *, reinstate: bool
) -> tuple[list[Recorded], list[RowReport], int]:
    """Part the rulings into those to take, those that were superseded before, and the rest."""
    history: dict[tuple[str, str, str], list[Recorded]] = defaultdict(list)
    for entry in sorted(record.entries, key=lambda each: (each.decision.order, each.decision.id)):
        history[_who(entry)].append(entry)
    entries: list[Recorded] = []
    older: list[RowReport] = []
    unchanged = 0
    for ruling in rulings:
        earlier = history[_who(ruling.entry)]
        last = earlier[-1] if earlier else None
        nothing_to_withdraw = ruling.entry.decision.ruling == "withdraw" and (
            last is None or last.decision.ruling == "withdraw"
        )
        if nothing_to_withdraw or (last is not None and last.value == ruling.entry.value):
            unchanged += 1
        elif not reinstate and any(each.value == ruling.entry.value for each in earlier[:-1]):
            reason = "this ruling was superseded by a later one, which stands"
            older.append(
                replace(ruling.report, reason=reason, mend="add --reinstate to bring it back")
            )
        else:
            supersedes = "" if last is None else last.decision.id
            entries.append(replace(ruling.entry, supersedes=supersedes))
    return entries, older, unchanged


def _who(entry: Recorded) -> tuple[str, str, str]:
    return entry.decision.item, entry.decision.variable, entry.decision.adjudicator


class _Reader:
    """Reads and checks the rows of one table of rulings."""

    def __init__(
        self,
        project: Project,
        returned: Returned,
        variables: Mapping[str, SheetVariable],
        items: frozenset[str],
        labels_digest_of: Callable[[str, str], str] | None,
        round_number: int,
    ) -> None:
        self._secret = project.secret()
        self._returned = returned
        self._variables = variables
        self._items = items
        self._labels_digest_of = labels_digest_of
        self._round = round_number

    def read(self, book: Book) -> tuple[list[_Ruling], list[RowReport]]:
        """Return the valid rulings, one per item, variable and person, and what was rejected."""
        sheet, header, columns = self._find(book)
        rejected: list[RowReport] = []
        found: dict[tuple[str, str, str], list[_Ruling]] = defaultdict(list)
        for number in range(header + 1, len(sheet.rows)):
            row = sheet.rows[number]
            if not any(loosened(_at(row, column).text) for column in columns.values()):
                continue
            ruling = self._row(sheet, number, row, columns)
            if isinstance(ruling, RowReport):
                rejected.append(ruling)
            else:
                found[_who(ruling.entry)].append(ruling)
        rulings: list[_Ruling] = []
        for same in found.values():
            decided = {(each.entry.decision.ruling, each.entry.decision.label) for each in same}
            if len(decided) == 1:
                rulings.append(same[0])
                continue
            rows = ", ".join(str(each.report.row) for each in same)
            reason = f"the same person rules differently on this item in rows {rows}"
            mend = "keep the row that holds, and delete the others"
            rejected += [replace(each.report, reason=reason, mend=mend) for each in same]
        return rulings, rejected

    def _find(self, book: Book) -> tuple[Sheet, int, dict[str, int]]:
        best: dict[str, int] = {}
        for sheet in book.sheets:
            for number, row in enumerate(sheet.rows[:50]):
                texts = [folded(cell.text) for cell in row]
                columns = {name: texts.index(name) for name in _KNOWN if name in texts}
                if all(name in columns for name in self._needed()):
                    return sheet, number, columns
                best = max(best, columns, key=len)
        missing = [name for name in self._needed() if name not in best]
        raise RelookError(
            f"the table has no column {listed(missing)}",
            where=Place(self._returned.name),
            mend="head its columns item, variable, label, by and, if wanted, reason and note",
        )

    def _needed(self) -> tuple[str, ...]:
        return _NEEDED if len(self._variables) == 1 else (*_NEEDED, "variable")

    def _row(
        self, sheet: Sheet, number: int, row: Sequence[Cell], columns: Mapping[str, int]
    ) -> _Ruling | RowReport:
        texts = {name: loosened(_at(row, column).text) for name, column in columns.items()}
        item, by = texts["item"], texts["by"]
        only = next(iter(self._variables)) if len(self._variables) == 1 else ""
        variable = self._variables.get(texts.get("variable") or only)
        report = RowReport(
            worksheet=self._returned.name,
            sheet=sheet.title or None,
            row=number + 1,
            column=column_letters(columns["label"] + 1),
            item=item,
            variable=texts.get("variable") or only,
            found=loosened(_at(row, columns["label"]).text)[:60],
        )
        if item not in self._items:
            close = nearest(item, self._items) if len(self._items) < 20_000 else None
            return self._rejected(
                report,
                columns["item"],
                item,
                "no item has this id",
                f'did you mean "{close}"?' if close else "check it against the label table",
            )
        if variable is None:
            name = texts.get("variable", "")
            mend = f"the variables are {listed(self._variables)}"
            at = columns.get("variable", columns["label"])
            return self._rejected(report, at, name, "no variable has this name", mend)
        if not by:
            mend = "write who ruled"
            return self._rejected(report, columns["by"], "", "nobody is named as ruling", mend)
        cell = _at(row, columns["label"])
        reading = match_decision(cell, variable)
        if reading.state != "matched":
            reason, mend = reading.reason, reading.mend
            if reading.state == "blank":
                reason, mend = "the row rules nothing", "write a label, or delete the row"
            return replace(report, reason=reason, mend=mend)
        decision = Decision(
            item=item,
            variable=variable.name,
            adjudicator=LEAD if folded(by) == LEAD else adjudicator_id(self._secret, by),
            ruling=reading.ruling,
            label=reading.label,
            reason=texts.get("reason", ""),
            note=_at(row, columns["note"]).text.strip() if "note" in columns else "",
            round=self._round,
            kind=KIND,
        )
        entry = Recorded(
            decision=decision,
            source=self._returned.digest,
            sheet=sheet.title,
            cell=f"{report.column}{report.row}",
            found=reading.found if reading.adjusted else "",
            labels_digest=""
            if self._labels_digest_of is None
            else self._labels_digest_of(item, variable.name),
        )
        return _Ruling(entry, report)

    def _rejected(
        self, report: RowReport, column: int, found: str, reason: str, mend: str
    ) -> RowReport:
        return replace(
            report,
            column=column_letters(column + 1),
            found=found[:60],
            reason=reason,
            mend=mend,
        )


def _at(row: Sequence[Cell], index: int) -> Cell:
    return row[index] if index < len(row) else EMPTY
