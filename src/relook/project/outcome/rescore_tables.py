"""The figures of a rescore as plain rows, for JSON, screens and workbooks alike.

Keys are documented and stable; scripts rely on them. Undefined numbers are None.
"""

from __future__ import annotations

from dataclasses import asdict
from typing import Any

from relook.core.agreement import Agreement
from relook.project.archive.recorded import Recorded
from relook.project.outcome.audit_findings import AuditFindings, pooled
from relook.project.outcome.rescore_sentences import reason_sentences
from relook.project.outcome.rescoring import Rescore, VariableRescore

Row = dict[str, Any]


def rescore_object(held: Rescore) -> Row:
    """Return everything that `relook rescore --json` writes, but for its format number.

    Keys: `seed`, `independent` (false where label files changed since the first round, or no round
    was sent), `changed_label_files`; `variables[]` as `variable_row`; `moves[]`: `variable, from,
    to` (null: cannot be coded), `n_labels, n_items`; `reasons[]`: `variable, reason, n_items,
    n_with_reason`; `conclusions[]`: `variable, text`; `coders[]`: `variable, coder, items`
    ("audit" or "disputed"), `n_labels, n_upheld, share_upheld, low, high`; `audit`: `strata[],
    share_ruled_otherwise, low, high, undefined_because`, over all variables; `stale[]`, `gone[]`:
    `item, variable, adjudicator, round`.
    """
    each = held.variables
    audits = [scored.audits[0] for scored in each if scored.audits]
    return {
        "project": str(held.loaded.project.root),
        "seed": held.seed,
        "independent": held.independent,
        "changed_label_files": list(held.changed_files),
        "variables": [variable_row(scored, independent=held.independent) for scored in each],
        "moves": [row for scored in each for row in move_rows(scored)],
        "reasons": [
            {"variable": scored.name, **asdict(reason)}
            for scored in each
            for reason in scored.reasons
        ],
        "conclusions": [
            {"variable": scored.name, "text": text}
            for scored in each
            for text in reason_sentences(scored.reasons)
        ],
        "coders": [
            {"variable": scored.name, **asdict(coder)} for scored in each for coder in scored.coders
        ],
        "audit": {
            "strata": [row for audit in audits for row in stratum_rows(audit)],
            **asdict(pooled(audits)),
        },
        "stale": [_entry_row(entry) for entry in held.stale],
        "gone": [_entry_row(entry) for entry in held.gone],
    }


def variable_row(scored: VariableRescore, *, independent: bool) -> Row:
    """Return one variable before and after.

    Keys: `variable, difference`; `before{alpha, independent, interval, ...}`, `after{agreement,
    ...}`, `common{...}` (the labels as given on the items that are in both), each with
    `observed_disagreement, expected_disagreement, undefined_because` and counts; the counts
    `settled, cannot_be_coded, split, unconfirmed, open, waiting`; `any_label{low, high, draws,
    seed} | null`; `overlap{}`; `audits[]`, latest first; `remaining[]`, `remaining_pairs[]`.
    """
    corrected, after, interval = scored.corrected, scored.corrected.after, scored.interval.interval
    return {
        "variable": scored.name,
        "difference": corrected.variable.difference,
        "before": {
            "independent": independent,
            "alpha": corrected.given.alpha,
            "alpha_of_first_round": scored.alpha_of_first_round,
            "interval": None if interval is None else asdict(interval),
            "no_interval_because": scored.interval.none_because,
            **_disagreements(corrected.given),
        },
        "after": {
            "agreement": after.agreement,
            "undefined_because": after.undefined_because,
            "observed_disagreement": after.observed_disagreement,
            "expected_disagreement": after.expected_disagreement,
            "n_pairable_items": after.n_pairable_items,
            "n_pairable_labels": after.n_pairable_labels,
            "n_disputed_items": after.n_disputed_items,
        },
        "common": {"agreement": corrected.common.alpha, **_disagreements(corrected.common)},
        "settled": scored.states["settled"],
        "cannot_be_coded": scored.states["cannot be coded"],
        "split": scored.states["split"],
        "unconfirmed": scored.states["unconfirmed"],
        "open": scored.states["open"],
        "waiting": scored.n_waiting,
        "any_label": None if scored.any_label is None else asdict(scored.any_label),
        "overlap": asdict(scored.overlap),
        "audits": [audit_row(audit) for audit in scored.audits],
        "remaining": [
            {
                **asdict(item),
                "labels": [{"coder": coder, "label": label} for coder, label in item.labels],
            }
            for item in scored.remaining
        ],
        "remaining_pairs": [asdict(pair) for pair in scored.remaining_pairs],
    }


def _disagreements(agreement: Agreement) -> Row:
    return {
        "undefined_because": agreement.undefined_because,
        "observed_disagreement": agreement.observed_disagreement,
        "expected_disagreement": agreement.expected_disagreement,
        "n_pairable_items": agreement.n_pairable_items,
        "n_pairable_labels": agreement.n_pairable_labels,
        "n_disputed_items": agreement.n_disputed_items,
    }


def move_rows(scored: VariableRescore) -> list[Row]:
    """Return which labels became which."""
    return [
        {
            "variable": scored.name,
            "from": move.old,
            "to": move.new,
            "n_labels": move.n_labels,
            "n_items": move.n_items,
        }
        for move in scored.moves
    ]


def stratum_rows(audit: AuditFindings) -> list[Row]:
    """Return what the audit found per stratum."""
    return [{"variable": audit.variable, **asdict(part)} for part in audit.result.strata]


def audit_row(audit: AuditFindings) -> Row:
    """Return one round's audit of one variable."""
    result = audit.result
    return {
        "round": audit.round,
        "n_drawn": audit.n_drawn,
        "n_unresolved": audit.n_unresolved,
        "n_ties": audit.n_ties,
        "n_left_out": audit.n_left_out,
        "strata": stratum_rows(audit),
        "share_ruled_otherwise": result.share_ruled_otherwise,
        "low": result.low,
        "high": result.high,
        "undefined_because": result.undefined_because,
        "confidence_level": result.confidence_level,
    }


def _entry_row(entry: Recorded) -> Row:
    held = entry.decision
    return {
        "item": held.item,
        "variable": held.variable,
        "adjudicator": held.adjudicator,
        "round": held.round,
    }
