"""A release: final labels, corrected tables, a methods statement, and a manifest of all of them.

A release is made from the label files and the record alone, so it can be checked against them:
release.json names the digest of every file, of the label files and of the record.
"""

from __future__ import annotations

import hashlib
import json
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

import pandas as pd

from relook import __version__
from relook.core.decisions import Settlement
from relook.errors import listed
from relook.project.archive.independence import check_independence
from relook.project.archive.record import Record, read_record
from relook.project.archive.rounds import read_rounds
from relook.project.archive.settlements import settlements
from relook.project.corrections.label_versions import LabelVersion, read_versions, with_version
from relook.project.outcome.corrected import correct
from relook.project.outcome.rescoring import (
    Rescore,
    interval_of,
    rescore_labels,
)
from relook.project.release.corrected_tables import COUNTS_NOTE, corrected_tables
from relook.project.release.final_labels import FinalLabel, TiesRule, counts_of, final_labels
from relook.project.release.methods_statement import methods_statement
from relook.project.setup.folder import Project
from relook.project.setup.loading import Loaded, load
from relook.project.setup.people import names_by_id
from relook.tables.numbers import parse_number
from relook.tables.results import csv_bytes
from relook.worksheet.final_book import write_final_book
from relook.worksheet.overview_table import COUNT, TableColumn

FORMAT = 1
FINAL_CSV, FINAL_XLSX = "final_labels.csv", "final_labels.xlsx"
METHODS, MANIFEST = "methods.txt", "release.json"
COLUMNS = (
    "item",
    "variable",
    "label",
    "settled_by",
    "support",
    "n_labels",
    "adjudicators_for",
    "adjudicators_ruled",
    "round",
    "reason",
    "adjudicators",
    "candidates",
    "rule",
)
#: The rows of a sheet but for its header.
MOST_SHEET_LABELS = 1_048_575
#: Between several adjudicators or candidates in one cell.
BETWEEN = " | "
_FORMULA_STARTS = ("=", "+", "-", "@", "\t", "\r")
_WIDTHS = {"item": 18, "variable": 14, "label": 24, "reason": 24, "adjudicators": 22}
_COUNTS = ("support", "n_labels", "adjudicators_for", "adjudicators_ruled", "round")
_SETTLED_BY = (
    "settled by: unanimous, consensus (coders' labels decide), decision (adjudicators'), cannot be "
    "coded, split (adjudicators differ), tie (coders' labels tie), single (one label), unconfirmed "
    "(a ruling against unanimous coders that nobody has confirmed; the coders' label stands), no "
    "label."
)
_SUPPORT = (
    "support: coders' labels that equal the final label, of n labels. adjudicators for: those "
    "whose ruling it is, of those who ruled."
)
_CANDIDATES = (
    "candidates: tied labels, the rulings of a split, or a ruling that waits for confirmation. "
    "rule: what chose among them; blank where nothing did."
)
#: What the workbook says of its columns.
_ABOUT = (_SETTLED_BY, _SUPPORT, _CANDIDATES)


@dataclass(frozen=True, slots=True, kw_only=True)
class ReleaseRequest:
    """What a call of `relook release` asks for.

    Attributes
    ----------
    ties : {"blank", "most-used", "random"}
    names : bool
        Name adjudicators; else they stand under their ids.
    version : int or None
        Release this label version in place of the labels as first given.
    relabelled : bool
        Go on although label files changed since the first round.
    seed : int
        Of the interval in the methods statement.
    """

    ties: TiesRule = "blank"
    names: bool = False
    version: int | None = None
    relabelled: bool = False
    seed: int = 1


@dataclass(frozen=True, slots=True, kw_only=True)
class Release:
    """A release in memory; nothing is written yet.

    Attributes
    ----------
    loaded : Loaded
        With the labels that are released.
    finals : tuple of FinalLabel
    counts : dict of str to dict of str to int
        By variable: how many labels were settled how.
    files : dict of str to bytes
        By their path from the release folder, release.json last.
    rescored : Rescore or None
    notes : tuple of str
        What to know before relying on it.
    """

    loaded: Loaded
    finals: tuple[FinalLabel, ...]
    counts: dict[str, dict[str, int]]
    files: dict[str, bytes]
    rescored: Rescore | None
    notes: tuple[str, ...]


def make_release(project: Project, request: ReleaseRequest, stamp: str) -> Release:
    """Work out a release.

    Parameters
    ----------
    project : Project
    request : ReleaseRequest
    stamp : str
        ISO time to record.

    Raises
    ------
    RelookError
        The tables or the record cannot be read, label files changed since the first round, no such
        label version, or decisions are no longer allowed.
    """
    first = load(project)
    rounds, record = read_rounds(project), read_record(project)
    changed = check_independence(first, rounds, relabelled=request.relabelled)
    version = _version(project, request.version)
    released = first if version is None else load(with_version(project, version.number))
    settled = settlements(released, record)
    finals = released_labels(project, released, settled, request)
    rescored = None
    if record.decisions:
        rescored = rescore_labels(
            released,
            rounds,
            record,
            changed,
            seed=request.seed,
            labels_of_ties=_labels_of_ties(project, released, request),
        )
    corrected = {name: correct(released, name, settled) for name in released.agreements}
    tables = corrected_tables(released, corrected)
    notes = _notes(released, rescored, finals)
    counts = {name: counts_of(finals, name) for name in released.agreements}
    statement = methods_statement(
        first,
        released,
        rescored,
        {name: interval_of(first, name, request.seed) for name in first.agreements},
        finals,
        ties=request.ties,
        independent=not changed if rounds else None,
        version=version,
    )
    frame = final_frame(finals, names_by_id(project) if request.names else {})
    files = {FINAL_CSV: csv_bytes(frame)}
    if len(frame) <= MOST_SHEET_LABELS:
        files[FINAL_XLSX] = _book(project, frame, notes, stamp)
    else:
        notes = (
            *notes,
            f"A sheet holds {MOST_SHEET_LABELS:,} labels at most, so there is no {FINAL_XLSX}.",
        )
    files |= {table.name: table.data for table in tables}
    files[METHODS] = statement.encode("utf-8")
    manifest = _manifest(project, request, stamp, released, record, counts, notes, files)
    files[MANIFEST] = (json.dumps(manifest, ensure_ascii=False, indent=1) + "\n").encode("utf-8")
    return Release(
        loaded=released,
        finals=finals,
        counts=counts,
        files=files,
        rescored=rescored,
        notes=notes,
    )


def released_labels(
    project: Project,
    released: Loaded,
    settled: Mapping[tuple[str, str], Settlement],
    request: ReleaseRequest,
) -> tuple[FinalLabel, ...]:
    """Return the final labels that a request asks for."""
    # Keyed by the project's id, so that the same draw can be checked wherever the folder is.
    key = project.settings.project.encode("utf-8")
    return tuple(final_labels(released, settled, ties=request.ties, key=key))


def _labels_of_ties(
    project: Project, released: Loaded, request: ReleaseRequest
) -> dict[str, dict[str, str]] | None:
    """What the rule that was asked for would make of every tie, decided since or not."""
    if request.ties == "blank":
        return None
    found: dict[str, dict[str, str]] = {name: {} for name in released.agreements}
    for each in released_labels(project, released, {}, request):
        if each.rule:
            found[each.variable][each.item] = each.label
    return found


def final_frame(finals: Sequence[FinalLabel], names: Mapping[str, str]) -> pd.DataFrame:
    """Return the table of final labels, all text and whole numbers.

    Parameters
    ----------
    finals : sequence of FinalLabel
    names : mapping of str to str
        Name of each adjudicator by id; ids that are not in it stand as they are.
    """
    rows = [
        (
            each.item,
            each.variable,
            each.label,
            each.settled_by,
            each.support,
            each.n_labels,
            each.n_supporters,
            each.n_rulings,
            each.round,
            each.reason,
            BETWEEN.join(names.get(person, person) for person in each.adjudicators),
            BETWEEN.join(each.candidates),
            each.rule,
        )
        for each in finals
    ]
    return pd.DataFrame(rows, columns=list(COLUMNS), dtype=object)


def formula_like(text: str) -> bool:
    """Whether a spreadsheet program might run a text of a CSV as a formula; numbers are safe."""
    return text.startswith(_FORMULA_STARTS) and parse_number(text) is None


def _version(project: Project, number: int | None) -> LabelVersion | None:
    if number is None:
        return None
    with_version(project, number)  # names those that there are, where this is none
    return next(each for each in read_versions(project) if each.number == number)


def _notes(
    released: Loaded, rescored: Rescore | None, finals: Sequence[FinalLabel]
) -> tuple[str, ...]:
    notes = []
    if released.project.settings.labels.layout == "counts":
        notes.append(COUNTS_NOTE)
    risky = dict.fromkeys(
        text for each in finals for text in (each.item, each.label) if formula_like(text)
    )
    if risky:
        notes.append(
            f"{len(risky):,} ids or labels begin with =, +, - or @ ({listed(risky, most=3)}). The "
            f"CSV files hold them exactly as they are, and a spreadsheet program may run them as "
            f"formulas: open {FINAL_XLSX} instead, whose cells are text."
        )
    if rescored is not None:
        waiting = sum(each.n_waiting for each in rescored.variables)
        if waiting:
            notes.append(f"{waiting:,} rows that were sent have no decision; they are released "
                         "like items that were not sent.")  # fmt: skip
        if rescored.stale:
            notes.append(f"{len(rescored.stale):,} standing decisions were made on labels that "
                         "have changed since.")  # fmt: skip
        if rescored.gone:
            notes.append(f"{len(rescored.gone):,} standing decisions are on items that are no "
                         "longer in the label table, and are not released.")  # fmt: skip
    return tuple(notes)


def _book(project: Project, frame: pd.DataFrame, notes: Sequence[str], stamp: str) -> bytes:
    columns = [
        TableColumn(
            name.replace("_", " "), _WIDTHS.get(name, 14), COUNT if name in _COUNTS else "@"
        )
        for name in frame.columns
    ]
    settings = project.settings.worksheet
    rows = frame.to_numpy(dtype=object).tolist()
    return write_final_book(
        settings.title or project.title, columns, rows, [*_ABOUT, *notes], stamp
    )


def _manifest(
    project: Project,
    request: ReleaseRequest,
    stamp: str,
    released: Loaded,
    record: Record,
    counts: Mapping[str, Mapping[str, int]],
    notes: Sequence[str],
    files: Mapping[str, bytes],
) -> dict[str, Any]:
    return {
        "format": FORMAT,
        "relook": __version__,
        "project": project.settings.project,
        "made": stamp,
        "ties": request.ties,
        "names": request.names,
        "version": request.version,
        "relabelled": request.relabelled,
        "seed": request.seed,
        "label_files": dict(released.labels.digests),
        "record": record.heads,
        "settled_by": {name: dict(each) for name, each in counts.items()},
        "notes": list(notes),
        "files": {name: hashlib.sha256(data).hexdigest() for name, data in files.items()},
    }
