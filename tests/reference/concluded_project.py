"""A project made by hand with labels, one round and decisions, for tests of what comes after."""

from __future__ import annotations

import csv
import hashlib
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from datetime import UTC, datetime
from pathlib import Path

from relook.core.decisions import Decision
from relook.project.archive.record import make_file, read_record, stamp_of, write_file
from relook.project.archive.recorded import Recorded
from relook.project.archive.rounds import Round, RoundRow, RoundStratum, RoundVariable
from relook.project.setup.folder import Project, write_whole
from relook.project.setup.loading import labels_digest

PROJECT_ID = "madeforatest"
NOW = datetime(2031, 3, 1, 9, 0, tzinfo=UTC)

Labels = Mapping[str, Sequence[tuple[str, str]]]


@dataclass(frozen=True)
class Ruling:
    """One ruling of a made record; `label` None is "cannot be coded"."""

    item: str
    label: str | None
    by: str = "a-ADA"
    reason: str = ""
    kind: str = "disputed"
    withdrawn: bool = False


def make_project(
    root: Path,
    labels: Labels,
    *,
    difference: str = "nominal",
    declared: Sequence[str] = (),
    extra: str = "",
    source: str = "",
) -> Project:
    """Make a project folder with one variable, `topic`, and its labels in a long table."""
    root.mkdir(parents=True, exist_ok=True)
    write_labels(root / "labels.csv", labels)
    words = f"labels = {list(declared)!r}\n" if declared else ""
    (root / "relook.toml").write_text(
        f'format = 1\nproject = "{PROJECT_ID}"\n'
        f'[labels]\nfiles = ["labels.csv"]\nitem = "item"\ncoder = "coder"\n{source}'
        f'[variables.topic]\ncolumn = "topic"\ndifference = "{difference}"\n{words}{extra}',
        encoding="utf-8",
    )
    return Project.open(root)


def write_labels(file: Path, labels: Labels) -> None:
    """Write a long table."""
    with file.open("w", encoding="utf-8", newline="") as out:
        writer = csv.writer(out, lineterminator="\n")
        writer.writerow(["item", "coder", "topic"])
        writer.writerows(
            (item, coder, label) for item, given in labels.items() for coder, label in given
        )


def send_round(
    project: Project,
    labels: Labels,
    sent: Mapping[str, str],
    *,
    strata: Mapping[str, tuple[int, ...]] | None = None,
    number: int = 1,
    stratum_of: Mapping[str, str] | None = None,
) -> Round:
    """Write round.json; `sent` gives each item's kind.

    `strata` gives the size and the draws of each stratum, and where there are any the ties among
    either.
    """
    digest = hashlib.sha256((project.root / "labels.csv").read_bytes()).hexdigest()
    held = Round(
        number=number,
        made="2031-02-01T09:00:00+00:00",
        relook="0.1.0",
        project=project.settings.project,
        seed=1,
        settings={"reveal": "labels"},
        label_files={"labels.csv": digest},
        variables=(
            RoundVariable(
                variable="topic",
                difference="nominal",
                alpha=0.5,
                undefined_because=None,
                observed_disagreement=0.2,
                expected_disagreement=0.4,
                n_items=len(labels),
                n_pairable_items=len(labels),
                n_disputed_items=1,
                n_labels=sum(len(given) for given in labels.values()),
                n_pairable_labels=sum(len(given) for given in labels.values()),
                n_coders=2,
            ),
        ),
        strata=tuple(
            RoundStratum(
                **dict(zip(("n_items", "n_drawn", "n_tied", "n_drawn_tied"), counts, strict=False)),
                variable="topic",
                stratum=name,
            )
            for name, counts in (strata or {}).items()
        ),
        worksheets=(),
        rows=tuple(
            RoundRow(
                key=f"key {at}",
                item=item,
                variable="topic",
                worksheet="w",
                adjudicator="a-ADA",
                kind=kind,
                stratum=(stratum_of or {}).get(item, "unanimous" if kind == "audit" else ""),
                labels_digest=labels_digest(labels[item]),
            )
            for at, (item, kind) in enumerate(sent.items())
        ),
    )
    write_whole(project.round_folder(number) / "round.json", held.to_json())
    return held


def rule(
    project: Project, labels: Labels, rulings: Iterable[Ruling], *, minute: int = 0
) -> tuple[Decision, ...]:
    """Add a file of rulings to the record; return the decisions of the whole record."""
    entries = [
        Recorded(
            decision=Decision(
                item=each.item,
                variable="topic",
                adjudicator=each.by,
                ruling="withdraw"
                if each.withdrawn
                else "cannot be coded"
                if each.label is None
                else "label",
                label=None if each.withdrawn else each.label,
                reason=each.reason,
                round=1,
                kind=each.kind,
            ),
            labels_digest=labels_digest(labels[each.item]) if each.item in labels else "",
        )
        for each in rulings
    ]
    record = read_record(project)
    stamp = record.next_stamp(NOW.replace(minute=minute))
    assert stamp >= stamp_of(NOW)
    name, data = make_file(PROJECT_ID, record, stamp, entries, version="0.1.0", kind="collect")
    write_file(project, name, data)
    return read_record(project).decisions
