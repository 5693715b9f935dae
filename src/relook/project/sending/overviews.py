"""The lead's overview of a round, put together from its plan and the project's figures."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterable
from dataclasses import fields
from typing import TypeVar

from relook.project.figures.interval_words import interval_draws, interval_ends
from relook.project.figures.item_table import item_table
from relook.project.figures.score_tables import (
    Row,
    coder_rows,
    defined,
    group_rows,
    label_pair_rows,
    prospect_rows,
    variable_rows,
)
from relook.project.figures.scoring import Score
from relook.project.sending.issuing import IssuedRound
from relook.project.sending.queueing import PlannedRound
from relook.project.setup.loading import labels_of_item, shown_texts
from relook.worksheet.overview_model import (
    CoderRow,
    Figure,
    GroupRow,
    LabelPairRow,
    Overview,
    ProspectRow,
    RankedRow,
)

_Kind = TypeVar("_Kind", CoderRow, LabelPairRow, GroupRow, ProspectRow)


def overview_of(score: Score, planned: PlannedRound, issued: IssuedRound) -> Overview:
    """Return what overview.xlsx holds.

    Parameters
    ----------
    score : Score
        With the ordering that the round was planned from.
    planned : PlannedRound
    issued : IssuedRound
    """
    settings = score.loaded.project.settings.worksheet
    each = score.variables
    return Overview(
        title=settings.title or score.loaded.project.title,
        round=planned.number,
        stamp=issued.round.made,
        figures=tuple(_figures(score)),
        notes=tuple(_notes(score, planned)),
        ranking=_ranking(score, planned),
        coders=_rows(CoderRow, [row for scored in each for row in coder_rows(scored)]),
        label_pairs=_rows(
            LabelPairRow, [row for scored in each for row in label_pair_rows(scored)]
        ),
        label_order=tuple(
            (scored.name, scored.held.texts)
            for scored in each
            if scored.agreement.function.needs != "number"
        ),
        groups=_rows(GroupRow, [row for scored in each for row in group_rows(scored)]),
        prospect=_rows(ProspectRow, [row for scored in each for row in prospect_rows(scored)]),
    )


def _rows(kind: type[_Kind], rows: Iterable[Row]) -> tuple[_Kind, ...]:
    """Take from each row of figures what the overview shows of it; the keys are its fields."""
    names = [field.name for field in fields(kind)]
    return tuple(kind(**{name: row[name] for name in names}) for row in rows)


def _figures(score: Score) -> list[Figure]:
    figures = []
    for row, scored in zip(variable_rows(score), score.variables, strict=True):
        interval = scored.interval.interval
        said = row["undefined_because"] or "a reliability only if coders worked independently"
        if interval is not None:
            draws = interval_draws(interval, scored.resampled_by)
            said += f"; {interval_ends(interval)}, {draws}"
            if scored.interval.warning is not None:
                said += f". Caution: {scored.interval.warning}"
        elif row["alpha"] is not None:
            said += f"; no interval: {row['no_interval_because']}"
        name = row["variable"]
        figures += [
            Figure(variable=name, name="alpha", value=row["alpha"], conditions=said),
            Figure(
                variable=name,
                name="observed disagreement D_o",
                value=row["observed_disagreement"],
                conditions=f"{row['difference']} differences",
            ),
            Figure(
                variable=name,
                name="expected disagreement D_e",
                value=row["expected_disagreement"],
                conditions="what chance would give with these labels",
            ),
            Figure(
                variable=name,
                name="disputed items",
                value=row["n_disputed_items"],
                conditions=(
                    f"of {row['n_pairable_items']:,} with two labels or more; "
                    f"{row['n_items'] - row['n_pairable_items']:,} with one label take no part"
                ),
            ),
        ]
    return figures


def _notes(score: Score, planned: PlannedRound) -> list[str]:
    ordering = planned.ordering
    notes = []
    if ordering.selection.n_items:
        notes.append(f"Queued: {ordering.selection.sentence(ordering.ranking)}.")
    if planned.n_audit_items:
        drawn = ", ".join(
            f"{held.variable} {held.stratum} {held.n_drawn} of {held.n_items}"
            for held in planned.strata
            if held.n_items
        )
        notes.append(f"Audit: {planned.n_audit_items:,} items drawn at random ({drawn}).")
    notes += list(planned.plan.said)
    if planned.plan.unplanned:
        left = ", ".join(held.item for held in planned.plan.unplanned[:20])
        notes.append(f"Left for the lead: {left}.")
    notes.append(
        "Agreement after adjudication is no reliability; report alpha of the independent labels "
        "beside it."
    )
    return notes


def _ranking(score: Score, planned: PlannedRound) -> tuple[RankedRow, ...]:
    loaded = score.loaded
    holders: dict[tuple[str, str], list[str]] = defaultdict(list)
    for sheet in planned.plan.worksheets:
        for row in sheet.rows:
            holders[row.item, row.variable].append(sheet.adjudicator.name)
    table = item_table(score, planned.ordering.selection.n_items)
    numbers = loaded.item_numbers(table["item"].tolist())
    rows = []
    for held, number in zip(table.to_dict("records"), numbers, strict=True):
        item, variable = str(held["item"]), str(held["variable"])
        shown = shown_texts(loaded, item)
        rows.append(
            RankedRow(
                rank=int(held["rank"]),
                item=item,
                variable=variable,
                contribution=float(held["contribution"]),
                share=float(held["share"]),
                cumulative_share=float(held["cumulative_share"]),
                alpha_cost=defined(held["alpha_cost"]),
                doubt=defined(held["doubt"]),
                consensus=str(held["consensus"]),
                tie=bool(held["tie"]),
                settled_alpha=defined(held["settled_alpha"]),
                text=shown[0][1] if shown else "",
                labels=tuple(labels_of_item(loaded, variable, int(number))),
                adjudicators=tuple(holders[item, variable]),
            )
        )
    return tuple(rows)
