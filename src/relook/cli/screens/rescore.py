"""The screen of `relook rescore`: before and after side by side, each with its meaning."""

from __future__ import annotations

from rich.console import RenderableType
from rich.text import Text

from relook.cli.screens.layout import (
    amount,
    bar,
    coefficient,
    count,
    counted,
    heading,
    note,
    percent,
    shortened,
    small_table,
    stacked,
)
from relook.cli.screens.recode import compared_screen
from relook.project.figures.interval_words import interval_draws, interval_ends
from relook.project.outcome import rescore_sentences as sentences
from relook.project.outcome.codings_compared import CodingsCompared
from relook.project.outcome.moves import CoderStanding, Move
from relook.project.outcome.rescoring import Rescore, VariableRescore

_SHOWN = 12


def rescore_screen(held: Rescore, compared: CodingsCompared | None = None) -> RenderableType:
    """Lay out a fresh coding where there is one, a page per variable, and what holds for all."""
    parts: list[RenderableType] = [] if compared is None else compared_screen(compared)
    for scored in held.variables:
        parts += [*_variable(held, scored), Text("")]
    stale = sentences.stale_sentence(held)
    if stale is not None:
        parts += [heading("decisions made on other labels"), note(stale), Text("")]
    shown = held.loaded.project.shown_root
    unsettled = sum(
        scored.states["split"] + scored.states["unconfirmed"] for scored in held.variables
    )
    first = (
        f"relook queue {shown} --splits for what needs a second adjudicator, or "
        if unsettled
        else ""
    )
    parts.append(note(f"next: {first}relook release {shown}"))
    return stacked(*parts)


def _variable(held: Rescore, scored: VariableRescore) -> list[RenderableType]:
    parts: list[RenderableType] = [
        heading(f"{scored.name}: before and after {counted(_ruled(scored), 'decided item')}"),
        _figures(held, scored),
        note(_interval(scored)),
        note(sentences.meaning_of_alpha(held)),
        note(sentences.CORRECTED),
    ]
    parts += [
        note(said) for said in (sentences.any_label_sentence(scored.any_label),) if said is not None
    ]
    parts += [Text(""), note(sentences.states_sentence(scored))]
    unchanged = sentences.unchanged_sentence(scored)
    parts += [note(unchanged)] if unchanged else []
    caution = sentences.overlap_caution(scored.overlap)
    parts += [note(caution)] if caution else []
    parts += _moves(scored)
    parts += _reasons(scored)
    parts += _audit(scored)
    parts += _coders(scored)
    parts += [
        Text(""),
        heading("  adjudicators with each other"),
        note(sentences.overlap_sentence(scored.overlap)),
    ]
    return parts + _remaining(scored)


def _ruled(scored: VariableRescore) -> int:
    return scored.states["settled"] + scored.states["cannot be coded"]


def _figures(held: Rescore, scored: VariableRescore) -> RenderableType:
    given, common, after = scored.corrected.given, scored.corrected.common, scored.corrected.after
    rows = [
        (
            sentences.name_of_alpha(held),
            coefficient(given.alpha),
            amount(given.observed_disagreement),
            amount(given.expected_disagreement),
            count(given.n_pairable_items),
            count(given.n_disputed_items),
        )
    ]
    if held.changed_files:
        rows.insert(
            0,
            (
                "alpha when the first round was sent",
                coefficient(scored.alpha_of_first_round),
                *("",) * 4,
            ),
        )
    if after.n_cannot_be_coded:
        rows.append(
            (
                "the same, on the items in both",
                coefficient(common.alpha),
                amount(common.observed_disagreement),
                amount(common.expected_disagreement),
                count(common.n_pairable_items),
                count(common.n_disputed_items),
            )
        )
    rows.append(
        (
            "not alpha: agreement in the corrected data",
            coefficient(after.agreement),
            amount(after.observed_disagreement),
            amount(after.expected_disagreement),
            count(after.n_pairable_items),
            count(after.n_disputed_items),
        )
    )
    return small_table(
        ("", "figure", "D_o", "D_e", "items", "disputed"), rows, numbers=(1, 2, 3, 4, 5)
    )


def _interval(scored: VariableRescore) -> str:
    result = scored.interval
    if result.interval is None:
        return f"No interval for alpha: {result.none_because}."
    draws = interval_draws(result.interval, scored.resampled_by)
    said = f"Alpha's {interval_ends(result.interval)} ({draws})."
    return f"{said} Caution: {result.warning}." if result.warning else said


def _moves(scored: VariableRescore) -> list[RenderableType]:
    if not scored.moves:
        return [note("No label was changed by a decision.")]
    most = scored.moves[0].n_labels
    rows = [
        (
            _move_text(move),
            count(move.n_labels),
            count(move.n_items),
            bar(move.n_labels, most),
        )
        for move in scored.moves[:_SHOWN]
    ]
    return [
        Text(""),
        heading("  which labels became which"),
        small_table(("", "labels", "items", ""), rows, numbers=(1, 2)),
        *_left(len(scored.moves), "move"),
    ]


def _move_text(move: Move) -> str:
    old, new = shortened(move.old, 30), shortened(move.new or "cannot be coded", 30)
    # Undeclared labels may differ in nothing that a screen shows.
    return f"{old} → {new}" + (" (differ in spaces)" if old == new else "")


def _reasons(scored: VariableRescore) -> list[RenderableType]:
    parts: list[RenderableType] = [Text(""), heading("  why coders differed, by the adjudicators")]
    if scored.reasons:
        rows = [
            (
                shortened(each.reason, 40),
                f"{count(each.n_items)} of {count(each.n_with_reason)}",
                bar(each.n_items, scored.reasons[0].n_items),
            )
            for each in scored.reasons[:_SHOWN]
        ]
        parts += [
            small_table(("reason", "items", ""), rows, numbers=(1,)),
            *_left(len(scored.reasons), "reason"),
        ]
    return parts + [note(said) for said in sentences.reason_sentences(scored.reasons)]


def _audit(scored: VariableRescore) -> list[RenderableType]:
    parts: list[RenderableType] = [Text(""), heading("  random audit of what nobody ruled on")]
    if not scored.audits:
        return [*parts, note("No audit items were drawn, so nothing is known of the other items.")]
    audit = scored.audits[0]
    rows = [
        (
            part.stratum,
            count(part.n_items),
            count(part.n_ruled),
            count(part.n_otherwise),
            percent(part.share) if part.share is not None else "",
            "" if part.low is None else f"{percent(part.low)} to {percent(part.high)}",
        )
        for part in audit.result.strata
    ]
    level = f"{audit.result.confidence_level:.0%} interval"
    headers = ("items that are", "in all", "ruled", "otherwise", "share", level)
    parts += [
        small_table(headers, rows, numbers=(1, 2, 3, 4)),
        note(sentences.audit_sentence(audit)),
    ]
    return parts + [
        note(said) for said in sentences.audit_cautions(audit, scored.n_sent_since_audit)
    ]


def _coders(scored: VariableRescore) -> list[RenderableType]:
    if not scored.coders:
        return []
    by_coder: dict[str, dict[str, CoderStanding]] = {}
    for each in scored.coders:
        by_coder.setdefault(each.coder, {})[each.items] = each
    rows = [
        (shortened(coder, 24), *_against(held.get("audit")), *_against(held.get("disputed"))[:1])
        for coder, held in list(by_coder.items())[:_SHOWN]
    ]
    headers = ("coder", "upheld, audit", "interval", "upheld, disputed")
    return [
        Text(""),
        heading("  coders' labels against the decisions"),
        small_table(headers, rows, numbers=(1, 3)),
        *_left(len(by_coder), "coder"),
        note(sentences.DISPUTED_ONLY),
    ]


def _against(held: CoderStanding | None) -> tuple[str, str]:
    if held is None:
        return "", ""
    interval = "" if held.low is None else f"{percent(held.low)} to {percent(held.high)}"
    return f"{count(held.n_upheld)} of {count(held.n_labels)}", interval


def _remaining(scored: VariableRescore) -> list[RenderableType]:
    parts: list[RenderableType] = [Text(""), heading("  what remains worst")]
    if not scored.remaining:
        return [*parts, note("No disputed item is left.")]
    rows = [
        (
            shortened(each.item, 24),
            percent(each.share),
            ", ".join(f"{coder} {label}".strip() for coder, label in each.labels),
            each.state or "",
        )
        for each in scored.remaining
    ]
    left = scored.corrected.after.n_disputed_items
    pairs = ", ".join(
        f"{pair.first} – {pair.second} {pair.share:.0%}" for pair in scored.remaining_pairs[:5]
    )
    return [
        *parts,
        small_table(("item", "of what is left", "labels", ""), rows, numbers=(1,)),
        note(
            f"{counted(left, 'disputed item')} left. Pairs of labels, of D_o that is left: {pairs}."
        ),
    ]


def _left(n: int, word: str) -> list[RenderableType]:
    left = n - _SHOWN
    return [note(f"and {counted(left, word)} more; --json has them all")] if left > 0 else []
