"""The screen of `relook score`: figures with their meaning in words, then their sources."""

from __future__ import annotations

from collections.abc import Sequence

from rich.console import RenderableType
from rich.text import Text

from relook.cli.screens.layout import (
    amount,
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
from relook.cli.screens.score_sources import sources
from relook.project.figures.interval_words import interval_draws, interval_ends
from relook.project.figures.label_mergers import CAUTION, MergedScore
from relook.project.figures.score_object import best_merger_rows, changed_warning, selected_row
from relook.project.figures.score_object import variable_warnings as warnings_of
from relook.project.figures.scoring import Score, VariableScore
from relook.project.figures.verdict import alpha_in_words, verdict

_FIRST_ITEMS = 10
#: Rows of each small table: fewer where there are many variables, each of which has a page.
_ROWS, _ROWS_OF_MANY, _MANY_VARIABLES = 5, 3, 4
_LABELS_IN_A_CELL = 6
_MERGERS = 5


def score_screen(score: Score) -> RenderableType:
    """Lay out a summary of several variables, a page for each, then the ranking of items."""
    several = len(score.variables) > 1
    parts: list[RenderableType] = []
    if several:
        parts += [*_summary(score), Text("")]
    n_rows = _ROWS if len(score.variables) < _MANY_VARIABLES else _ROWS_OF_MANY
    for scored in score.variables:
        parts += [*_variable(score, scored, n_rows), Text("")]
    if several and n_rows < _ROWS:
        parts += [note("`--variable NAME` shows one variable with longer tables."), Text("")]
    parts += _items(score)
    return stacked(*parts)


def _summary(score: Score) -> list[RenderableType]:
    """One line per variable: what it is, and what the queue would hold of it."""
    rows = []
    for position, scored in enumerate(score.variables):
        agreement, interval = scored.agreement, scored.interval.interval
        selected = selected_row(score, position)
        low, high = selected["projected_agreement"].values()
        rows.append(
            (
                shortened(scored.name, 20),
                scored.held.variable.difference,
                coefficient(agreement.alpha),
                "none" if interval is None else f"{interval.low:.3f} to {interval.high:.3f}",
                count(agreement.n_disputed_items),
                count(selected["n_led_items"]),
                count(selected["n_selected_rows"]),
                percent(selected["share_selected"], decimals=0)
                if agreement.observed_disagreement
                else "none",
                _from_to(low, high),
            )
        )
    headers = (
        "variable",
        "differences",
        "alpha",
        "interval",
        "disputed",
        "heaviest in",
        "rows",
        "of D_o",
        "agreement then",
    )
    return [
        heading("variables"),
        small_table(headers, rows, numbers=(2, 4, 5, 6, 7)),
        note(
            "From “heaviest in” on: of the items that would be queued, in how many the variable "
            "weighs most, its rows, the share of its D_o in them, and agreement in the corrected "
            "data if all of them took their consensus labels."
        ),
    ]


def _from_to(low: float | None, high: float | None) -> str:
    if low is None or high is None or f"{low:.3f}" == f"{high:.3f}":
        return coefficient(low)
    return f"{low:.3f} to {high:.3f}"


def _variable(score: Score, scored: VariableScore, n_rows: int) -> list[RenderableType]:
    agreement = scored.agreement
    parts: list[RenderableType] = [
        heading(f"{scored.name}: {scored.held.variable.difference} differences"),
        figure_lines(
            [
                (
                    "corrected or alpha" if score.changed_files else "alpha",
                    coefficient(agreement.alpha),
                    _interval_text(scored),
                ),
                (
                    "observed disagreement",
                    amount(agreement.observed_disagreement),
                    "D_o, mean difference δ² between labels of one item",
                ),
                (
                    "expected disagreement",
                    amount(agreement.expected_disagreement),
                    "D_e, the same between labels of all items, as by chance",
                ),
            ]
        ),
        note(_counts(score, scored)),
        note(alpha_in_words(agreement, scored.interval.interval)),
    ]
    undefined = agreement.undefined_because is not None
    parts += [note(f"Caution: {said}.") for said in warnings_of(scored)[int(undefined) :]]
    if score.changed_files:
        parts.append(note(f"Caution: {changed_warning(score.changed_files)}."))
    if scored.needed_items is not None:
        held = scored.needed_items
        parts.append(
            note(
                f"Two coders need about {counted(held.n_items, 'shared item')} to show an alpha of "
                f"{_plain(held.bar)} at the {held.error_level:.0%} level, for the rarest label "
                f'("{shortened(held.rarest_label, 24)}", {percent(held.rarest_share)} of labels); '
                "a cautious figure (Krippendorff 2004, after Bloch & Kraemer 1989)."
            )
        )
    if agreement.n_disputed_items:
        said = verdict(scored)
        if said is not None:
            parts.append(note(said))
    for merged in score.merged:
        if merged.variable == scored.name:
            parts += _merged(scored, merged)
    if agreement.n_disputed_items:
        parts += sources(scored, n_rows)
    return parts


def _counts(score: Score, scored: VariableScore) -> str:
    agreement = scored.agreement
    by = f" by {counted(agreement.n_coders, 'coder')}" if agreement.n_coders else ", coders unknown"
    said = (
        f"{counted(agreement.n_pairable_items, 'item')} with two labels or more "
        f"({counted(agreement.n_pairable_labels, 'label')}{by}), "
        f"{count(agreement.n_disputed_items)} disputed."
    )
    tolerance = scored.held.variable.tolerance
    if tolerance:
        said += f" Numbers up to {float(tolerance):g} apart are not called disputed."
    singles = agreement.n_items - agreement.n_pairable_items
    if singles:
        takes = "takes" if singles == 1 else "take"
        said += f" {counted(singles, 'item')} with a single label {takes} no part."
    if scored.held.n_missing:
        said += f" {counted(scored.held.n_missing, 'missing label')}."
    left_out = score.loaded.labels.left_out
    if left_out:
        names = ", ".join(f"{name} ({count(n)} labels)" for name, n in left_out.items())
        said += f" Left out: {names}."
    return said


def _interval_text(scored: VariableScore) -> str:
    result = scored.interval
    if scored.agreement.alpha is None:
        return ""
    if result.interval is None:
        return f"no interval: {result.none_because}"
    draws = interval_draws(result.interval, scored.resampled_by)
    return f"{interval_ends(result.interval)} ({draws})"


def _merged(scored: VariableScore, merged: MergedScore) -> list[RenderableType]:
    """Figures with labels merged beside those without, and the mergers that lift alpha most."""
    groups = "; ".join(
        f"{shortened(group.name, 24)} = {', '.join(shortened(label, 24) for label in group.labels)}"
        for group in merged.groups
    )
    parts: list[RenderableType] = [Text(""), heading("  with labels merged")]
    if merged.agreement is None:
        return [*parts, note(f"{groups}: {merged.not_merged_because}.")]
    before, after = scored.agreement, merged.agreement
    rows = [
        (
            name,
            coefficient(held.alpha),
            amount(held.observed_disagreement),
            amount(held.expected_disagreement),
            count(held.n_disputed_items),
        )
        for name, held in (("as they are", before), (groups, after))
    ]
    parts.append(
        small_table(("labels", "alpha", "D_o", "D_e", "disputed"), rows, numbers=(1, 2, 3, 4))
    )
    if after.undefined_because is not None:
        parts.append(note(f"Undefined with them merged: {after.undefined_because}."))
    best = best_merger_rows(scored)
    if best:
        pairs = [
            (
                f"{shortened(row['first'], 30)} + {shortened(row['second'], 30)}",
                coefficient(row["alpha"]),
                f"+{row['gain']:.3f}",
            )
            for row in best[:_MERGERS]
        ]
        parts += [
            note("Pairs whose merger alone would lift alpha most:"),
            small_table(("labels", "alpha", "gain"), pairs, numbers=(1, 2)),
        ]
    return [*parts, note(f"But {CAUTION}.")]


def _items(score: Score) -> list[RenderableType]:
    ranking, selection = score.ordering.ranking, score.ordering.selection
    if not ranking.n_items:
        disputed = any(scored.agreement.n_disputed_items for scored in score.variables)
        if disputed:
            return [note("Every disputed item has the priority 0, so there is nothing to queue.")]
        return [note("No item is disputed, so there is nothing to queue.")]
    several = len(ranking.variables) > 1
    rows = []
    for place in range(min(_FIRST_ITEMS, ranking.n_items)):
        item = int(ranking.item_index[place])
        begin, end = int(ranking.row_start[place]), int(ranking.row_start[place + 1])
        for row in range(begin, end):
            # An item's rows stand together; its rank and id are said once.
            first = row == begin
            scored = score.variables[int(ranking.row_variable[row])]
            rows.append(
                (
                    count(place + 1) if first else "",
                    shortened(str(score.loaded.labels.items[item]), 24) if first else "",
                    percent(ranking.carried[place] / ranking.carried_in_all) if first else "",
                    *((shortened(scored.name, 20),) if several else ()),
                    _labels_text(scored, item),
                )
            )
    shares = "of disagreement" if several else "of D_o"
    headers = ("rank", "item", shares, *(("variable",) if several else ()), "labels")
    parts: list[RenderableType] = [
        heading(f"items, by {ranking.rank_by}"),
        small_table(headers, rows, numbers=(0, 2)),
    ]
    if several:
        parts.append(
            note(
                "Shares are of the chance-scaled disagreement of all variables, by their weights; "
                "an item shows the variables to which it contributes their mean or more."
            )
        )
    items = score.loaded.project.settings.items
    if items is not None and items.priority is not None:
        parts.append(note(f'Ranked by {ranking.rank_by} times the column "{items.priority}".'))
    left = ranking.n_items - _FIRST_ITEMS
    if left > 0:
        parts.append(note(f"and {counted(left, 'item')} more; `--items FILE.csv` writes them all"))
    said = selection.sentence(ranking)
    if any(score.loaded.project.rounds_folder.glob("*")):
        parts.append(
            note(f"Selected here: {said}. `relook queue` leaves out what is settled or sent.")
        )
    else:
        parts.append(note(f"`relook queue` would send {said}."))
    return parts


def _labels_text(scored: VariableScore, item: int) -> str:
    profiles = scored.agreement.profiles
    profile = int(scored.agreement.profile_of_item[item])
    entries: Sequence[int] = range(int(profiles.start[profile]), int(profiles.start[profile + 1]))
    labels = [
        (int(profiles.count[entry]), scored.held.texts[profiles.value_index[entry]])
        for entry in entries
    ]
    if scored.agreement.function.needs == "identity":
        labels.sort(key=lambda pair: -pair[0])
    shown = [
        shortened(label, 24) if times == 1 else f"{shortened(label, 24)} ×{times}"
        for times, label in labels[:_LABELS_IN_A_CELL]
    ]
    left = len(labels) - _LABELS_IN_A_CELL
    return ", ".join(shown) + (f" and {left} more" if left > 0 else "")


def _plain(bar: float) -> str:
    return f"{bar:.3f}".removeprefix("0")
