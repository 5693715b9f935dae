"""A rescore as a workbook: the same figures and sentences as on the screen, with charts."""

from __future__ import annotations

from relook.project.figures.interval_words import interval_draws, interval_ends
from relook.project.outcome import rescore_sentences as sentences
from relook.project.outcome.audit_findings import pooled
from relook.project.outcome.rescoring import Rescore, VariableRescore
from relook.worksheet.overview_model import Figure
from relook.worksheet.overview_table import COUNT, PERCENT, TableColumn, Value
from relook.worksheet.report import Report, ReportChart, ReportTable


def report_of(held: Rescore, stamp: str) -> Report:
    """Return what `relook rescore --xlsx` writes.

    Parameters
    ----------
    held : Rescore
    stamp : str
        ISO time to record in the file.
    """
    settings = held.loaded.project.settings.worksheet
    notes = [sentences.meaning_of_alpha(held), sentences.CORRECTED]
    several = len(held.variables) > 1
    for scored in held.variables:
        own = [
            sentences.any_label_sentence(scored.any_label),
            sentences.states_sentence(scored),
            sentences.unchanged_sentence(scored),
            sentences.overlap_sentence(scored.overlap),
            sentences.overlap_caution(scored.overlap),
        ]
        notes += [f"{scored.name}: {said}" if several else said for said in own if said]
    stale = sentences.stale_sentence(held)
    return Report(
        title=settings.title or held.loaded.project.title,
        subtitle="Before and after decisions",
        stamp=stamp,
        figures=tuple(figure for scored in held.variables for figure in _figures(held, scored)),
        notes=(*notes, *([stale] if stale else [])),
        tables=(_moves(held), _reasons(held), _audit(held), _coders(held), _remaining(held)),
    )


def _figures(held: Rescore, scored: VariableRescore) -> list[Figure]:
    given, common, after = scored.corrected.given, scored.corrected.common, scored.corrected.after
    interval = scored.interval.interval
    said = given.undefined_because or f"{given.n_pairable_items:,} items with two labels or more"
    if interval is not None:
        draws = interval_draws(interval, scored.resampled_by)
        said += f"; {interval_ends(interval)}, {draws}"
    if scored.interval.warning is not None:
        said += f". Caution: {scored.interval.warning}."
    own = f"{after.n_settled:,} items settled, {after.n_cannot_be_coded:,} cannot be coded"
    rows: list[tuple[str, Value, str]] = [
        (sentences.name_of_alpha(held), given.alpha, said),
        ("observed disagreement D_o before", given.observed_disagreement, ""),
        ("expected disagreement D_e before", given.expected_disagreement, ""),
        (
            "D_o before, on the items in both",
            common.observed_disagreement,
            "without the items that cannot be coded",
        ),
        ("D_e before, on the items in both", common.expected_disagreement, ""),
        (
            "agreement in the corrected data",
            after.agreement,
            f"{after.undefined_because or own}; not a reliability",
        ),
        ("D_o after", after.observed_disagreement, f"{after.n_disputed_items:,} disputed items"),
        ("D_e after", after.expected_disagreement, ""),
    ]
    return [
        Figure(variable=scored.name, name=name, value=value, conditions=conditions)
        for name, value, conditions in rows
    ]


def _moves(held: Rescore) -> ReportTable:
    rows: list[tuple[Value, ...]] = []
    for scored in held.variables:
        total = sum(move.n_labels for move in scored.moves)
        for move in scored.moves:
            name = f"{move.old} → {move.new or 'cannot be coded'}"
            share = move.n_labels / total
            rows.append((scored.name, name, move.n_labels, move.n_items, share))
    return ReportTable(
        title="Labels",
        columns=(
            TableColumn("variable", 16),
            TableColumn("label → decision", 40),
            TableColumn("labels", 9, COUNT),
            TableColumn("items", 9, COUNT),
            TableColumn("of changed labels", 12, PERCENT),
        ),
        rows=tuple(rows),
        chart=ReportChart(
            title="Which labels became which", value_title="of changed labels", names=2, values=5
        ),
    )


def _reasons(held: Rescore) -> ReportTable:
    rows: tuple[tuple[Value, ...], ...] = tuple(
        (
            scored.name,
            each.reason,
            each.n_items,
            each.n_with_reason,
            each.n_items / each.n_with_reason,
        )
        for scored in held.variables
        for each in scored.reasons
    )
    return ReportTable(
        title="Reasons",
        columns=(
            TableColumn("variable", 16),
            TableColumn("reason", 36),
            TableColumn("items", 9, COUNT),
            TableColumn("of items with a reason", 14, COUNT),
            TableColumn("share", 10, PERCENT),
        ),
        rows=rows,
        notes=tuple(
            said for scored in held.variables for said in sentences.reason_sentences(scored.reasons)
        ),
        chart=ReportChart(
            title="Why coders differed", value_title="of items with a reason", names=2, values=5
        ),
    )


def _audit(held: Rescore) -> ReportTable:
    rows: list[tuple[Value, ...]] = []
    notes: list[str] = []
    audits = [scored.audits[0] for scored in held.variables if scored.audits]
    for scored in held.variables:
        for audit in scored.audits[:1]:
            rows += [
                (
                    scored.name,
                    part.stratum,
                    part.n_items,
                    part.n_ruled,
                    part.n_otherwise,
                    part.share,
                    part.low,
                    part.high,
                )
                for part in audit.result.strata
            ]
            notes.append(sentences.audit_sentence(audit))
            notes += sentences.audit_cautions(audit, scored.n_sent_since_audit)
    whole = pooled(audits)
    if len(audits) > 1 and whole.share_ruled_otherwise is not None:
        notes.append(
            f"Over all variables: {whole.share_ruled_otherwise:.1%} "
            f"(95% interval {whole.low:.1%} to {whole.high:.1%})."
        )
    return ReportTable(
        title="Audit",
        columns=(
            TableColumn("variable", 16),
            TableColumn("items that are", 18),
            TableColumn("in all", 9, COUNT),
            TableColumn("ruled", 9, COUNT),
            TableColumn("otherwise", 11, COUNT),
            TableColumn("share", 10, PERCENT),
            TableColumn("low", 10, PERCENT),
            TableColumn("high", 10, PERCENT),
        ),
        rows=tuple(rows),
        notes=tuple(notes),
        chart=ReportChart(
            title="Audit items ruled otherwise", value_title="of ruled items", names=2, values=6
        ),
    )


def _coders(held: Rescore) -> ReportTable:
    rows: tuple[tuple[Value, ...], ...] = tuple(
        (
            scored.name,
            f"{each.coder}, {each.items}",
            each.n_labels,
            each.n_upheld,
            each.share_upheld,
            each.low,
            each.high,
        )
        for scored in held.variables
        for each in scored.coders
    )
    return ReportTable(
        title="Coders",
        columns=(
            TableColumn("variable", 16),
            TableColumn("coder and items", 28),
            TableColumn("labels", 9, COUNT),
            TableColumn("upheld", 9, COUNT),
            TableColumn("share", 10, PERCENT),
            TableColumn("low", 10, PERCENT),
            TableColumn("high", 10, PERCENT),
        ),
        rows=rows,
        notes=(sentences.DISPUTED_ONLY,),
        chart=ReportChart(
            title="Labels upheld by the decisions", value_title="of labels", names=2, values=5
        ),
    )


def _remaining(held: Rescore) -> ReportTable:
    rows: tuple[tuple[Value, ...], ...] = tuple(
        (
            scored.name,
            each.item,
            each.share,
            ", ".join(f"{coder} {label}".strip() for coder, label in each.labels),
            each.state or "",
        )
        for scored in held.variables
        for each in scored.remaining
    )
    return ReportTable(
        title="Remaining",
        columns=(
            TableColumn("variable", 16),
            TableColumn("item", 20),
            TableColumn("of what is left", 12, PERCENT),
            TableColumn("labels", 60),
            TableColumn("state", 12),
        ),
        rows=rows,
        notes=("The disputed items without a decision that weigh most in what is left of D_o.",),
        chart=ReportChart(title="What remains worst", value_title="of D_o left", names=2, values=3),
    )
