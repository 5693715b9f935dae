"""The figures of a score as plain rows, for JSON, CSV, screens and workbooks alike.

Keys are documented and stable; scripts rely on them. Undefined numbers are None.
"""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import asdict
from typing import Any

import numpy as np

from relook.core.contributions import PairParts, Parts
from relook.core.doubt import Doubt
from relook.project.figures.scoring import NEEDED_ITEMS_FOR, Score, VariableScore
from relook.project.figures.verdict import verdict

Row = dict[str, Any]


def defined(number: float | np.floating[Any] | None) -> float | None:
    """Return a float, or None where it is undefined."""
    return None if number is None or math.isnan(number) else float(number)


def variable_rows(score: Score) -> list[Row]:
    """Return agreement on each variable with its conditions."""
    return [_variable_row(scored) for scored in score.variables]


def _variable_row(scored: VariableScore) -> Row:
    agreement, result = scored.agreement, scored.interval
    interval = result.interval
    return {
        "variable": scored.name,
        "difference": scored.held.variable.difference,
        "alpha": agreement.alpha,
        "undefined_because": agreement.undefined_because,
        "observed_disagreement": agreement.observed_disagreement,
        "expected_disagreement": agreement.expected_disagreement,
        "interval": None
        if interval is None
        else {**asdict(interval), "resampled_by": scored.resampled_by or "item"},
        "no_interval_because": result.none_because,
        "n_items": agreement.n_items,
        "n_pairable_items": agreement.n_pairable_items,
        "n_disputed_items": agreement.n_disputed_items,
        "n_labels": agreement.n_labels,
        "n_pairable_labels": agreement.n_pairable_labels,
        "n_coders": agreement.n_coders,
        "n_missing_labels": scored.held.n_missing,
        "needed_items": None if scored.needed_items is None else asdict(scored.needed_items),
        "no_needed_items_because": NEEDED_ITEMS_FOR if scored.needed_items is None else None,
        "doubt": _doubt_row(scored.doubt),
        "doubt_undefined_because": scored.doubt.undefined_because,
        "verdict": verdict(scored),
        "no_alpha_without_because": scored.no_without_because,
        "no_coder_pairs_because": scored.no_coder_pairs_because,
    }


def _doubt_row(doubt: Doubt) -> Row | None:
    model = doubt.model
    if model is None:
        return None
    return {
        "converged": model.converged,
        "steps": model.steps,
        "shrink": model.shrink,
        "start": model.start,
    }


def coder_rows(scored: VariableScore) -> list[Row]:
    """Return each coder's part of D_o, heaviest first."""
    if scored.coders is None:
        return []
    without = scored.without
    rows = [
        {
            "variable": scored.name,
            "coder": coder,
            **row,
            "alpha_without": None if without is None else defined(without.alpha[position]),
            "n_pairable_items_without": None
            if without is None
            else int(without.n_pairable_items[position]),
        }
        for position, coder, row in _parts_rows(scored.coders, scored.coder_names)
    ]
    return sorted(rows, key=lambda row: (-row["contribution"], row["coder"]))


def group_rows(scored: VariableScore) -> list[Row]:
    """Return each group's part of D_o, by column, heaviest first."""
    rows = []
    for group in scored.groups:
        own = [
            {"variable": scored.name, "column": group.column, "group": name, **row}
            for _, name, row in _parts_rows(group.parts, group.names)
        ]
        rows += sorted(own, key=lambda row: (-row["contribution"], row["group"]))
    return rows


def _parts_rows(parts: Parts, names: tuple[str, ...]) -> Iterator[tuple[int, str, Row]]:
    for position, name in enumerate(names):
        if parts.n_labels[position] == 0:
            continue
        yield (
            position,
            name,
            {
                "contribution": float(parts.contribution[position]),
                "share": float(parts.share[position]),
                "n_items": int(parts.n_items[position]),
                "n_labels": int(parts.n_labels[position]),
                "share_of_labels": float(parts.share_of_labels[position]),
                "involved": float(parts.involved[position]),
                "own_alpha": defined(parts.own_alpha[position]),
            },
        )


def label_pair_rows(scored: VariableScore) -> list[Row]:
    """Return the pairs of labels that clash, heaviest first.

    `chance_share` is the pair's share of D_e: what their frequency and distance would make it.
    """
    rows = _pair_rows(scored, scored.label_pairs, scored.held.texts)
    for row, chance in zip(rows, scored.chance_shares.tolist(), strict=True):
        row["chance_share"] = chance
    return rows


def coder_pair_rows(scored: VariableScore) -> list[Row]:
    """Return the pairs of coders who meet, heaviest first."""
    if scored.coder_pairs is None:
        return []
    rows = _pair_rows(scored, scored.coder_pairs, scored.coder_names)
    return sorted(rows, key=lambda row: (-row["contribution"], row["first"], row["second"]))


def _pair_rows(scored: VariableScore, pairs: PairParts, names: tuple[str, ...]) -> list[Row]:
    return [
        {
            "variable": scored.name,
            "first": names[first],
            "second": names[second],
            "contribution": float(contribution),
            "share": float(share),
            "n_items": int(n_items),
        }
        for first, second, contribution, share, n_items in zip(
            pairs.first, pairs.second, pairs.contribution, pairs.share, pairs.n_items, strict=True
        )
    ]


def label_rows(scored: VariableScore) -> list[Row]:
    """Return how often each label is used, and how well it is agreed on, in the labels' order."""
    parts = scored.label_parts
    n = max(1, scored.agreement.n_pairable_labels)
    return [
        {
            "variable": scored.name,
            "label": label,
            "n_labels": int(parts.n_labels[value]),
            "share_of_labels": float(parts.n_labels[value] / n),
            "alpha_against_rest": defined(parts.alpha[value]),
            "involved": float(parts.involved[value]),
        }
        for value, label in enumerate(scored.held.texts)
    ]


def prospect_rows(scored: VariableScore) -> list[Row]:
    """Return agreement in the corrected data after each settled item, both ends; 0 is now."""
    held = scored.prospect
    return [
        {
            "variable": scored.name,
            "n_settled": step,
            "low": defined(held.low[step]),
            "high": defined(held.high[step]),
            "n_ties": int(held.n_ties[step]),
        }
        for step in range(held.item_index.size + 1)
    ]
