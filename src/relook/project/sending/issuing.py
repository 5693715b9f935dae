"""A planned round as files: worksheets, overview and round.json, written whole or not at all."""

from __future__ import annotations

import hashlib
import re
import unicodedata
from collections.abc import Iterable
from dataclasses import asdict, dataclass

from relook import __version__
from relook.core.contributions import label_pair_parts
from relook.errors import Place, RelookError
from relook.project.archive.decidable import SHEET_VARIABLES, variables_to_settings
from relook.project.archive.rounds import (
    ROUND_FILE,
    Round,
    RoundRow,
    RoundVariable,
    RoundWorksheet,
)
from relook.project.sending.queueing import PlannedRound, QueueRequest
from relook.project.sending.sheets import given_labels, sheet_row, sheet_variable, shown_columns
from relook.project.setup.folder import Project, write_whole
from relook.project.setup.loading import Loaded, labels_digest, labels_of_item
from relook.worksheet.competing import RowLabels, competing_labels, shown_order
from relook.worksheet.keys import evidence_digests
from relook.worksheet.layout import evidence_cells
from relook.worksheet.model import Reveal, SheetVariable, Worksheet
from relook.worksheet.plan import Adjudicator, PlannedRow, PlannedWorksheet
from relook.worksheet.write import write_worksheet

OVERVIEW_FILE = "overview.xlsx"


@dataclass(frozen=True, slots=True)
class IssuedRound:
    """A round and the bytes of its worksheets, by file name; nothing is written yet.

    Attributes
    ----------
    round : Round
    worksheets : dict of str to bytes
        By the path from the project folder.
    """

    round: Round
    worksheets: dict[str, bytes]


def issue_round(
    loaded: Loaded, planned: PlannedRound, request: QueueRequest, secret: bytes, stamp: str
) -> IssuedRound:
    """Make the worksheets of a planned round and its round.json.

    Parameters
    ----------
    loaded : Loaded
    planned : PlannedRound
    request : QueueRequest
    secret : bytes
    stamp : str
        ISO time to record.

    Raises
    ------
    RelookError
        A code book that cannot be read, or remarks shown beside hidden audits.
    """
    project = loaded.project
    variables = {
        name: sheet_variable(held, loaded.agreements[name], project.root)
        for name, held in loaded.labels.variables.items()
    }
    competing = _competing(loaded, planned, variables, secret)
    ranks = {
        str(loaded.labels.items[item]): place + 1
        for place, item in enumerate(planned.ordering.selection.item_index.tolist())
    }
    contributions = _contributions(loaded, planned)
    files: dict[str, bytes] = {}
    sheets: list[RoundWorksheet] = []
    rows: list[RoundRow] = []
    for held in planned.plan.worksheets:
        worksheet = _worksheet(loaded, planned, held, variables, competing, secret, stamp)
        data = write_worksheet(worksheet)
        path = project.relative(
            project.worksheets_folder(planned.number)
            / file_name(f"round-{planned.number:02d}", held.adjudicator, held.suffix, files)
        )
        files[path] = data
        sheets.append(
            RoundWorksheet(
                id=held.id,
                adjudicator=held.adjudicator.id,
                file=path,
                digest=hashlib.sha256(data).hexdigest(),
                n_rows=len(held.rows),
            )
        )
        rows += [
            _round_row(loaded, held, row, shown.competing, evidence, ranks, contributions)
            for row, shown, evidence in zip(
                held.rows, worksheet.rows, evidence_cells(worksheet), strict=True
            )
        ]
    issued = Round(
        number=planned.number,
        made=stamp,
        relook=__version__,
        project=project.settings.project,
        seed=request.seed,
        settings=_settings(loaded, planned, request, tuple(variables.values())),
        label_files=loaded.labels.digests,
        variables=tuple(_round_variable(loaded, name) for name in loaded.agreements),
        strata=planned.strata,
        worksheets=tuple(sheets),
        rows=tuple(rows),
    )
    return IssuedRound(issued, files)


def write_round(
    project: Project, issued: IssuedRound, overview: bytes | None = None, *, force: bool = False
) -> None:
    """Write the files of a round or coding; round.json comes last: without it there is none.

    Parameters
    ----------
    project : Project
        Its area says which of the two it is.
    issued : IssuedRound
    overview : bytes, optional
        The lead's workbook.
    force : bool

    Raises
    ------
    RelookError
        Files of that round exist and `force` is false, or cannot be written.
    """
    number = issued.round.number
    folder = project.round_folder(number)
    if (folder / ROUND_FILE).exists() and not force:
        what, command = ("coding", "recode") if project.area == "codings" else ("round", "queue")
        raise RelookError(
            f"{what} {number} exists already",
            where=Place(project.relative(folder)),
            mend=f"run `relook {command}` again for the next {what}, or add --force to replace it",
        )
    for path, data in issued.worksheets.items():
        write_whole(project.root / path, data)
    if overview is not None:
        write_whole(folder / OVERVIEW_FILE, overview)
    project.returned_folder(number).mkdir(exist_ok=True)
    project.decisions_folder.mkdir(exist_ok=True)
    write_whole(folder / ROUND_FILE, issued.round.to_json())


def file_name(occasion: str, person: Adjudicator, suffix: str, taken: Iterable[str]) -> str:
    """Return a worksheet's file name, safe on every file system.

    Parameters
    ----------
    occasion : str
        Such as "round-01".
    person : Adjudicator
        Whose it is.
    suffix : str
        Says which part it is where there are several.
    taken : iterable of str
        Paths that are given away already.
    """
    plain = unicodedata.normalize("NFC", person.name)
    plain = re.sub(r"[^\w-]+", "-", plain).strip("-_")[:40] or person.id
    name = f"{occasion}-{plain}{suffix}.xlsx"
    if any(path.casefold().endswith("/" + name.casefold()) for path in taken):
        # Two names that differ only in what file systems do not tell apart.
        name = f"{occasion}-{plain}-{person.id}{suffix}.xlsx"
    return name


def _worksheet(
    loaded: Loaded,
    planned: PlannedRound,
    held: PlannedWorksheet,
    variables: dict[str, SheetVariable],
    competing: dict[tuple[str, str], tuple[str, ...]],
    secret: bytes,
    stamp: str,
) -> Worksheet:
    settings = loaded.project.settings.worksheet
    numbers = loaded.item_numbers([row.item for row in held.rows])
    rows = tuple(
        sheet_row(
            loaded,
            row.key,
            row.variable,
            int(item),
            shown_order(
                competing[row.item, row.variable],
                item=row.item,
                variable=row.variable,
                worksheet=held.id,
                secret=secret,
                numeric=variables[row.variable].entry == "number",
            ),
            reveal=settings.reveal,
        )
        for row, item in zip(held.rows, numbers, strict=True)
    )
    used = {row.variable for row in held.rows}
    return Worksheet(
        id=held.id,
        project=loaded.project.settings.project,
        title=settings.title or loaded.project.title,
        round=planned.number,
        adjudicator=held.adjudicator.name,
        variables=tuple(variable for name, variable in variables.items() if name in used),
        shown_columns=shown_columns(loaded),
        reasons=settings.reasons,
        reveal=settings.reveal,
        rows=rows,
        # Said in every sheet of a round with audits, so that it tells nothing of a sheet.
        may_show_other_labels=settings.reveal == "labels"
        and any(item.kind in ("audit", "recheck") for item in planned.items),
        stamp=stamp,
    )


def _competing(
    loaded: Loaded,
    planned: PlannedRound,
    variables: dict[str, SheetVariable],
    secret: bytes,
) -> dict[tuple[str, str], tuple[str, ...]]:
    reveal: Reveal = loaded.project.settings.worksheet.reveal
    numbers = loaded.item_numbers([item.item for item in planned.items])
    rows: dict[tuple[str, str], RowLabels] = {}
    for item, number in zip(planned.items, numbers, strict=True):
        for name in item.variables:
            rows[item.item, name] = RowLabels(
                item=item.item,
                variable=name,
                kind=item.kind,
                given=given_labels(loaded, name, int(number)),
            )
    return competing_labels(
        list(rows.values()),
        _meeting_pairs(loaded),
        reveal=reveal,
        secret=secret,
        numeric=[name for name, variable in variables.items() if variable.entry == "number"],
    )


def _meeting_pairs(loaded: Loaded) -> dict[str, dict[tuple[str, str], float]]:
    """By variable: in how many items two labels meet."""
    found = {}
    for name, agreement in loaded.agreements.items():
        pairs = label_pair_parts(agreement)
        texts = loaded.labels.variables[name].texts
        found[name] = {
            (texts[first], texts[second]): float(n_items)
            for first, second, n_items in zip(
                pairs.first.tolist(), pairs.second.tolist(), pairs.n_items.tolist(), strict=True
            )
        }
    return found


def _contributions(loaded: Loaded, planned: PlannedRound) -> dict[tuple[str, str], float]:
    """The contribution of each (item, variable) that was selected as disputed."""
    ranking, selection = planned.ordering.ranking, planned.ordering.selection
    found = {}
    for place, item in enumerate(selection.item_index.tolist()):
        for row in range(int(ranking.row_start[place]), int(ranking.row_start[place + 1])):
            name = ranking.variables[int(ranking.row_variable[row])]
            found[str(loaded.labels.items[item]), name] = float(ranking.row_contribution[row])
    return found


def _round_row(
    loaded: Loaded,
    held: PlannedWorksheet,
    row: PlannedRow,
    competing: tuple[str, ...],
    evidence: dict[str, str],
    ranks: dict[str, int],
    contributions: dict[tuple[str, str], float],
) -> RoundRow:
    item = int(loaded.item_numbers([row.item])[0])
    selected = (row.item, row.variable) in contributions
    return RoundRow(
        key=row.key,
        item=row.item,
        variable=row.variable,
        worksheet=held.id,
        adjudicator=held.adjudicator.id,
        kind=row.kind,
        stratum=row.stratum,
        rank=ranks[row.item] if selected else None,
        contribution=contributions.get((row.item, row.variable)),
        labels_digest=labels_digest(labels_of_item(loaded, row.variable, item)),
        competing=competing,
        evidence=evidence_digests(evidence),
    )


def _round_variable(loaded: Loaded, name: str) -> RoundVariable:
    agreement = loaded.agreements[name]
    return RoundVariable(
        variable=name,
        difference=loaded.labels.variables[name].variable.difference,
        alpha=agreement.alpha,
        undefined_because=agreement.undefined_because,
        observed_disagreement=agreement.observed_disagreement,
        expected_disagreement=agreement.expected_disagreement,
        n_items=agreement.n_items,
        n_pairable_items=agreement.n_pairable_items,
        n_disputed_items=agreement.n_disputed_items,
        n_labels=agreement.n_labels,
        n_pairable_labels=agreement.n_pairable_labels,
        n_coders=agreement.n_coders,
    )


def _settings(
    loaded: Loaded,
    planned: PlannedRound,
    request: QueueRequest,
    variables: tuple[SheetVariable, ...],
) -> dict[str, object]:
    settings = loaded.project.settings
    return {
        **asdict(request.queue),
        "n_audit_items": planned.n_audit_items,
        "bound_by": planned.ordering.selection.bound_by,
        "overlap": settings.worksheet.overlap,
        "n_overlap_items": planned.plan.n_overlap,
        "reveal": settings.worksheet.reveal,
        "leave_out": list(settings.labels.leave_out),
        SHEET_VARIABLES: variables_to_settings(variables),
    }
