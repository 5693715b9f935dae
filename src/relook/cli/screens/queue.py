"""The screen of `relook queue`: what was selected, what it may bring, and what to do next."""

from __future__ import annotations

from rich.console import RenderableType
from rich.text import Text

from relook.cli.screens.layout import (
    coefficient,
    count,
    counted,
    heading,
    note,
    percent,
    small_table,
    stacked,
)
from relook.project.figures.score_tables import defined
from relook.project.sending.queue_run import QueueRun


def queue_screen(run: QueueRun) -> RenderableType:
    """Lay out a round that was written, or that would be."""
    planned = run.planned
    ordering = planned.ordering
    verb = "would write" if run.dry_run else "wrote"
    parts: list[RenderableType] = [heading(f"round {planned.number}")]
    if ordering.selection.n_items:
        parts.append(note(f"Queued: {ordering.selection.sentence(ordering.ranking)}."))
    seconds = [item for item in planned.items if item.kind in ("split", "recheck")]
    if seconds:
        parts.append(
            note(f"Second opinions: {counted(len(seconds), 'row')} that rulings differ on.")
        )
    if planned.n_audit_items:
        limit = planned.limit_if_all_upheld
        clean = (
            ""
            if limit is None
            else f" Even if all {planned.n_audit_items:,} are upheld, up to {limit:.0%} of the "
            "labels released so may deserve to be others (95% interval, strata weighed by their "
            "sizes)."
        )
        parts.append(
            note(
                f"Audit: {counted(planned.n_audit_items, 'item')} drawn at random from those that "
                f"would be released without a decision.{clean}"
            )
        )
    if ordering.selection.seconds is not None and ordering.selection.n_items:
        parts.append(note(_time(run, ordering.selection.seconds)))
    if ordering.selection.n_items:
        parts += [Text(""), _variables(run)]
        parts.append(
            note(
                "Agreement in the corrected data if these items alone took their consensus "
                "labels. It is no reliability; no decision should aim at it."
            )
        )
    parts += [Text(""), heading(f"{verb}"), _files(run)]
    parts += [note(f"{said}.") for said in planned.plan.said]
    parts += [note(f"Caution: {said}") for said in run.cautions]
    if planned.plan.unplanned:
        items = ", ".join(held.item for held in planned.plan.unplanned[:12])
        parts.append(note(f"Left for you: {items}."))
    if not run.dry_run:
        project = run.loaded.project
        shown = project.shown_root
        parts += [
            Text(""),
            note(
                f"Send the files of {project.relative(project.worksheets_folder(planned.number))} "
                "and nothing else: relook.toml and the overview name coders.\n"
                f"When they are back, put them into "
                f"{project.relative(project.returned_folder(planned.number))} and run: "
                f"relook collect {shown}"
            ),
        ]
    return stacked(*parts)


def _time(run: QueueRun, seconds: float) -> str:
    each = run.planned.ordering.selection.seconds_per_item
    minutes = max(1, round(seconds / 60))
    spent = f"{minutes} min" if minutes < 120 else f"{minutes / 60:.1f} h"
    return (
        f"At {each:g} s an item, all its rows together, that is about {spent} of adjudicators' "
        "time, audit items and second rulings included (seconds_per_item sets it)."
    )


def _variables(run: QueueRun) -> RenderableType:
    selection = run.planned.ordering.selection
    rows = []
    for position, scored in enumerate(run.score.variables):
        low, high = defined(scored.prospect.low[-1]), defined(scored.prospect.high[-1])
        rows.append(
            (
                scored.name,
                count(int(selection.rows_per_variable[position])),
                percent(defined(selection.share_per_variable[position])),
                coefficient(scored.agreement.alpha),
                f"{coefficient(low)} to {coefficient(high)}",
            )
        )
    headers = ("variable", "rows", "of D_o", "alpha now", "agreement if settled")
    return small_table(headers, rows, numbers=(1, 2, 3))


def _files(run: QueueRun) -> RenderableType:
    planned, project = run.planned, run.loaded.project
    rows = [
        (held.file, sheet.adjudicator.name, counted(held.n_rows, "row"))
        for held, sheet in zip(run.issued.round.worksheets, planned.plan.worksheets, strict=True)
    ]
    rows.append((project.relative(run.overview), "for you alone", ""))
    return small_table(("file", "for", ""), rows)
