"""The screen of `relook score`: figures with their meaning in words, then their sources."""

from __future__ import annotations

from collections.abc import Sequence

from rich.console import RenderableType
from rich.text import Text

from relook.cli.screens.layout import (
    amount,
    bar,
    coefficient,
    count,
    counted,
    figure_lines,
    heading,
    note,
    percent,
    shortened,
    small_table,
    stacked,
)
from relook.project.score_tables import (
    Row,
    coder_rows,
    group_rows,
    label_pair_rows,
    prospect_rows,
)
from relook.project.scoring import Score, VariableScore
from relook.project.verdict import alpha_in_words, verdict

_FIRST_ITEMS = 10
_FIRST_ROWS = 12
_PROSPECT_STEPS = 8


def score_screen(score: Score) -> RenderableType:
    """Lay out one page per variable, then the ranking of items over all of them."""
    parts: list[RenderableType] = []
    for scored in score.variables:
        parts += [*_variable(scored), Text("")]
    parts += _items(score)
    return stacked(*parts)


def _variable(scored: VariableScore) -> list[RenderableType]:
    agreement = scored.agreement
    title = f"{scored.name}: {scored.held.variable.difference} differences"
    singles = agreement.n_items - agreement.n_pairable_items
    counts = (
        f"{counted(agreement.n_pairable_items, 'item')} with two labels or more "
        f"({counted(agreement.n_pairable_labels, 'label')}"
        + (f" by {counted(agreement.n_coders, 'coder')}" if agreement.n_coders else "")
        + f"), {count(agreement.n_disputed_items)} disputed."
    )
    if singles:
        counts += f" {counted(singles, 'item')} with a single label take no part."
    if scored.held.n_missing:
        counts += f" {counted(scored.held.n_missing, 'missing label')}."
    parts: list[RenderableType] = [
        heading(title),
        figure_lines(
            [
                ("alpha", coefficient(agreement.alpha), _interval_text(scored)),
                ("observed disagreement", amount(agreement.observed_disagreement), "D_o"),
                (
                    "expected disagreement",
                    amount(agreement.expected_disagreement),
                    "D_e, chance",
                ),
            ]
        ),
        note(counts),
        note(alpha_in_words(agreement)),
    ]
    if scored.interval.warning:
        parts.append(note(scored.interval.warning))
    if scored.needed_items is not None:
        parts.append(
            note(
                f"Two coders need about {counted(scored.needed_items, 'item')} to tell this from "
                "alpha .800 at the 5 % level (Krippendorff 2004, after Bloch & Kraemer 1989)."
            )
        )
    if agreement.n_disputed_items:
        said = verdict(scored)
        if said is not None:
            parts.append(note(said))
        parts += _where(scored)
    return parts


def _interval_text(scored: VariableScore) -> str:
    result = scored.interval
    if scored.agreement.alpha is None:
        return scored.agreement.undefined_because or ""
    if result.interval is None:
        return f"no interval: {result.none_because}"
    held = result.interval
    text = (
        f"{held.confidence_level:.0%} interval {held.low:.3f} to {held.high:.3f} "
        f"({held.resamples:,} resamples of items, seed {held.seed})"
    )
    if held.undefined_resamples:
        text += f"; {counted(held.undefined_resamples, 'resample')} undefined and left out"
    return text


def _where(scored: VariableScore) -> list[RenderableType]:
    """Where the disagreement lives: coders, pairs of labels, groups, and the prospect."""
    parts: list[RenderableType] = []
    coders = coder_rows(scored)
    if len(coders) == 2:
        parts += [
            Text(""),
            heading("  coders"),
            note("Two coders share every disagreement equally, so neither is ranked."),
        ]
    elif coders:
        parts += [Text(""), heading("  coders"), _coders(coders)]
    pairs = label_pair_rows(scored)
    if pairs:
        parts += [Text(""), heading("  pairs of labels"), _pairs(pairs)]
    groups = group_rows(scored)
    for column in dict.fromkeys(row["column"] for row in groups):
        own = [row for row in groups if row["column"] == column]
        if len(own) > 1:
            parts += [Text(""), heading(f"  {column}"), _groups(own)]
    steps = prospect_rows(scored)
    if len(steps) > 1:
        parts += [Text(""), heading("  prospect"), _prospect(steps)]
        parts.append(
            note(
                "Agreement in the corrected data if the head of the queue were settled to its "
                "consensus labels, ties both ways. It is no reliability, and it can fall."
            )
        )
    return parts


def _coders(rows: Sequence[Row]) -> RenderableType:
    most = max(row["share"] for row in rows)
    shown = [
        (
            row["coder"],
            count(row["n_labels"]),
            percent(row["share_of_labels"]),
            percent(row["share"]),
            bar(row["share"], most),
            percent(row["involved"]),
            coefficient(row["own_alpha"]),
            coefficient(row["alpha_without"]),
        )
        for row in rows[:_FIRST_ROWS]
    ]
    headers = ("coder", "labels", "of labels", "of D_o", "", "involved in", "own alpha", "without")
    table = small_table(headers, shown, numbers=(1, 2, 3, 5, 6, 7))
    return stacked(table, *_left(rows, "coder"))


def _pairs(rows: Sequence[Row]) -> RenderableType:
    most = rows[0]["share"]
    shown = [
        (
            f"{shortened(row['first'], 30)} – {shortened(row['second'], 30)}",
            count(row["n_items"]),
            percent(row["share"]),
            bar(row["share"], most),
        )
        for row in rows[:_FIRST_ROWS]
    ]
    table = small_table(("labels", "items", "of D_o", ""), shown, numbers=(1, 2))
    return stacked(table, *_left(rows, "pair"))


def _groups(rows: Sequence[Row]) -> RenderableType:
    most = max(row["share"] for row in rows)
    shown = [
        (
            shortened(row["group"] or "(blank)", 30),
            count(row["n_items"]),
            percent(row["share_of_labels"]),
            percent(row["share"]),
            bar(row["share"], most),
            coefficient(row["own_alpha"]),
        )
        for row in rows[:_FIRST_ROWS]
    ]
    headers = ("group", "items", "of labels", "of D_o", "", "own alpha")
    table = small_table(headers, shown, numbers=(1, 2, 3, 5))
    return stacked(table, *_left(rows, "group"))


def _left(rows: Sequence[Row], word: str) -> list[RenderableType]:
    left = len(rows) - _FIRST_ROWS
    return [note(f"and {counted(left, word)} more; --json has them all")] if left > 0 else []


def _prospect(rows: Sequence[Row]) -> RenderableType:
    last = len(rows) - 1
    steps = sorted({round(last * step / _PROSPECT_STEPS) for step in range(_PROSPECT_STEPS + 1)})
    shown = [
        (
            count(rows[step]["n_settled"]),
            coefficient(rows[step]["low"]),
            coefficient(rows[step]["high"]),
        )
        for step in steps
    ]
    headers = ("items settled", "agreement from", "to")
    return small_table(headers, shown, numbers=(0, 1, 2))


def _items(score: Score) -> list[RenderableType]:
    ranking, selection = score.ordering.ranking, score.ordering.selection
    if not ranking.n_items:
        return [note("No item is disputed, so there is nothing to queue.")]
    rows = []
    for place in range(min(_FIRST_ITEMS, ranking.n_items)):
        item = int(ranking.item_index[place])
        begin, end = ranking.row_start[place], ranking.row_start[place + 1]
        rows.append(
            (
                count(place + 1),
                shortened(str(score.loaded.labels.items[item]), 24),
                percent(ranking.carried[place] / ranking.carried_in_all),
                "; ".join(
                    _labels_text(score, int(at), item) for at in ranking.row_variable[begin:end]
                ),
            )
        )
    several = len(ranking.variables) > 1
    headers = ("rank", "item", "of disagreement" if several else "of D_o", "labels")
    return [
        heading(f"items, by {ranking.rank_by}"),
        small_table(headers, rows, numbers=(0, 2)),
        note(f"`relook queue` would send {selection.sentence(ranking)}."),
    ]


def _labels_text(score: Score, position: int, item: int) -> str:
    scored = score.variables[position]
    profiles = scored.agreement.profiles
    profile = int(scored.agreement.profile_of_item[item])
    entries = range(int(profiles.start[profile]), int(profiles.start[profile + 1]))
    labels = sorted(
        ((int(profiles.count[entry]), scored.held.texts[profiles.value_index[entry]])
         for entry in entries),
        key=lambda pair: -pair[0],
    )  # fmt: skip
    text = ", ".join(f"{shortened(label, 24)} {times}" for times, label in labels)
    return f"{scored.name}: {text}" if len(score.variables) > 1 else text
