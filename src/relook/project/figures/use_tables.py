"""Who uses which label how often, and parts of D_o crossed by group, as plain rows."""

from __future__ import annotations

import numpy as np

from relook.core.crossings import group_coder_parts, group_label_pair_parts
from relook.core.label_tables import label_use, meetings
from relook.core.summed import SummedAgreement
from relook.project.figures.ordering import groups_of
from relook.project.figures.score_tables import Row
from relook.project.figures.scoring import Score, VariableScore


def label_use_rows(scored: VariableScore) -> list[Row]:
    """Return how often each coder gave each label, among pairable labels; only what occurs.

    `share_of_coder` is the label's share of that coder's labels. Coders may have labelled different
    items, so that a difference may lie in the items.
    """
    if scored.coders is None:
        return []
    use, whole = label_use(scored.agreement), scored.coders.n_labels
    return [
        {
            "variable": scored.name,
            "coder": scored.coder_names[coder],
            "label": scored.held.texts[value],
            "n_labels": n_labels,
            "share_of_coder": n_labels / int(whole[coder]),
        }
        for coder, value, n_labels in zip(
            use.coder.tolist(), use.value.tolist(), use.n_labels.tolist(), strict=True
        )
    ]


def two_coders(scored: VariableScore) -> tuple[int, int] | None:
    """Return the two coders of a variable that has just two, in order of first appearance."""
    if scored.coders is None or isinstance(scored.agreement, SummedAgreement):
        return None
    taking_part = np.flatnonzero(scored.coders.n_labels)
    return (int(taking_part[0]), int(taking_part[1])) if taking_part.size == 2 else None


def cross_table_rows(scored: VariableScore) -> list[Row]:
    """Return how often one coder's label met the other's; nothing unless there are two coders."""
    pair = two_coders(scored)
    if pair is None:
        return []
    met, texts = meetings(scored.agreement, *pair), scored.held.texts
    first, second = (scored.coder_names[coder] for coder in pair)
    return [
        {
            "variable": scored.name,
            "first_coder": first,
            "second_coder": second,
            "first": texts[value],
            "second": texts[other],
            "n_items": n_items,
        }
        for value, other, n_items in zip(
            met.first.tolist(), met.second.tolist(), met.n_items.tolist(), strict=True
        )
    ]


def direction_rows(scored: VariableScore) -> list[Row]:
    """Return who of two coders uses which label more, widest difference first.

    Both labelled the same items, so the difference is theirs. Nothing unless there are two coders.
    """
    pair = two_coders(scored)
    if pair is None:
        return []
    met, n_values = meetings(scored.agreement, *pair), len(scored.held.texts)
    used = [
        np.bincount(values, weights=met.n_items, minlength=n_values).astype(int).tolist()
        for values in (met.first, met.second)
    ]
    first, second = (scored.coder_names[coder] for coder in pair)
    rows = [
        {
            "variable": scored.name,
            "label": label,
            "first_coder": first,
            "second_coder": second,
            "n_first": by_first,
            "n_second": by_second,
            "difference": by_first - by_second,
        }
        for label, by_first, by_second in zip(scored.held.texts, *used, strict=True)
        if by_first or by_second
    ]
    return sorted(rows, key=lambda row: (-abs(row["difference"]), -row["n_first"], row["label"]))


def higher_rows(scored: VariableScore) -> list[Row]:
    """Return how often each of two coders gave the higher label; nothing for labels without order.

    `mean_difference` is first less second over their shared items, None for ordinal labels.
    """
    pair, needs = two_coders(scored), scored.agreement.function.needs
    if pair is None or needs not in ("order", "number") or scored.agreement.function.name in _ROUND:
        return []
    met = meetings(scored.agreement, *pair)
    place = np.arange(len(scored.held.texts), dtype=np.float64)
    if needs == "number":
        place = scored.agreement.values.numbers()
    gap = place[met.first] - place[met.second]
    n_items = int(met.n_items.sum())
    return [
        {
            "variable": scored.name,
            "first_coder": scored.coder_names[pair[0]],
            "second_coder": scored.coder_names[pair[1]],
            "n_items": n_items,
            "first_higher": int(met.n_items[gap > 0].sum()),
            "second_higher": int(met.n_items[gap < 0].sum()),
            "mean_difference": float(gap @ met.n_items) / n_items if needs == "number" else None,
        }
    ]


#: Difference functions whose numbers have no higher and lower.
_ROUND = ("circular",)


def group_coder_rows(score: Score, scored: VariableScore) -> list[Row]:
    """Return the part of D_o of each coder within each group of items; adds up by column."""
    if scored.coders is None:
        return []
    rows = []
    for group in scored.groups:
        group_of_item, names = groups_of(score.loaded, group.column)
        parts = group_coder_parts(scored.agreement, group_of_item, len(names))
        rows += [
            {
                "variable": scored.name,
                "column": group.column,
                "group": names[of_group],
                "coder": scored.coder_names[coder],
                "contribution": contribution,
                "share": share,
                "n_labels": n_labels,
            }
            for of_group, coder, contribution, share, n_labels in zip(
                parts.group.tolist(),
                parts.coder.tolist(),
                parts.contribution.tolist(),
                parts.share.tolist(),
                parts.n_labels.tolist(),
                strict=True,
            )
        ]
    return rows


def group_label_pair_rows(score: Score, scored: VariableScore) -> list[Row]:
    """Return the part of D_o of each pair of labels within each group; adds up by column."""
    rows = []
    for group in scored.groups:
        group_of_item, names = groups_of(score.loaded, group.column)
        parts = group_label_pair_parts(scored.agreement, group_of_item, len(names))
        rows += [
            {
                "variable": scored.name,
                "column": group.column,
                "group": names[of_group],
                "first": scored.held.texts[first],
                "second": scored.held.texts[second],
                "contribution": contribution,
                "share": share,
                "n_items": n_items,
            }
            for of_group, first, second, contribution, share, n_items in zip(
                parts.group.tolist(),
                parts.first.tolist(),
                parts.second.tolist(),
                parts.contribution.tolist(),
                parts.share.tolist(),
                parts.n_items.tolist(),
                strict=True,
            )
        ]
    return rows
