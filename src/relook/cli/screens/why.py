"""The screen of `relook why`: one item's arithmetic, to be redone by hand."""

from __future__ import annotations

from collections.abc import Sequence

from rich.console import RenderableType
from rich.padding import Padding
from rich.text import Text

from relook.cli.screens.layout import (
    UNDEFINED,
    count,
    counted,
    heading,
    note,
    percent,
    shortened,
    small_table,
    stacked,
)
from relook.project.figures.explaining import Candidate, Explanation

#: Labels that nobody gave and that the item could still be settled to: at most so many are shown.
_FURTHER_CANDIDATES = 8
_PAIRS = 40


def why_screen(explanations: Sequence[Explanation]) -> RenderableType:
    """Lay out the item once and its arithmetic per variable."""
    first = explanations[0]
    parts: list[RenderableType] = [heading(f"item {first.item}")]
    parts += [
        Padding(Text.assemble((f"{column}: ", "dim"), text), (0, 0, 0, 2), expand=False)
        for column, text in first.shown
    ]
    for held in explanations:
        parts += [Text(""), *_variable(held)]
    return stacked(*parts)


def _variable(held: Explanation) -> list[RenderableType]:
    m = len(held.labels)
    parts: list[RenderableType] = [
        heading(f"{held.variable}: {held.difference} differences"),
        note(
            f"{counted(m, 'label')}: "
            + ", ".join(f"{coder} {label}" if coder else label for coder, label in held.labels)
        ),
    ]
    if m < 2:
        return [*parts, note("A single label cannot be compared, so the item takes no part.")]
    if not held.pairs:
        return [*parts, note("All its labels are the same, so it contributes nothing.")]
    parts += _midranks(held)
    rows = [
        (
            f"{shortened(term.first)} – {shortened(term.second)}",
            count(term.pairs),
            _figure(term.difference),
            _figure(term.pairs * term.difference),
        )
        for term in held.pairs
    ]
    headers = ("different labels", "pairs of coders", "δ²", "pairs × δ²")
    parts += [note(f"{held.formula}:"), small_table(headers, rows[:_PAIRS], numbers=(1, 2, 3))]
    if len(rows) > _PAIRS:
        parts.append(note(f"and {counted(len(rows) - _PAIRS, 'pair')} more; --json has them all"))
    parts.append(note(_arithmetic(held, m)))
    parts += [note(line) for line in _standing(held)]
    return parts + _settled(held)


def _midranks(held: Explanation) -> list[RenderableType]:
    """What ordinal differences are made of."""
    if not held.midranks:
        return []
    rows = [
        (shortened(row.label), count(row.n_labels), f"{row.midrank:,.1f}") for row in held.midranks
    ]
    return [
        small_table(("label, in order", "labels n_c", "midrank"), rows, numbers=(1, 2)),
        note("midrank = labels below + (n_c + 1)/2, over the pairable labels of all items"),
    ]


def _settled(held: Explanation) -> list[RenderableType]:
    """Agreement if this item alone took each label: those given, then some that were not."""
    if not held.candidates:
        return []
    given = [row for row in held.candidates if row.given]
    further = [row for row in held.candidates if not row.given]
    shown: list[Candidate] = given + further[:_FURTHER_CANDIDATES]
    rows = [
        (
            shortened(row.label),
            count(row.given),
            UNDEFINED if row.agreement is None else f"{row.agreement:.5f}",
        )
        for row in shown
    ]
    parts: list[RenderableType] = [
        Text(""),
        heading("  if it alone were settled"),
        small_table(("to", "given by", "agreement in the corrected data"), rows, numbers=(1, 2)),
    ]
    left = len(further) - _FURTHER_CANDIDATES
    if left > 0:
        parts.append(note(f"and {counted(left, 'label')} that nobody gave; --json has them all"))
    if any(row.agreement is None for row in shown):
        parts.append(note("Undefined: then all pairable labels would be the same."))
    parts.append(
        note(
            f"Alpha of the independent labels is {held.alpha:.5f}. These figures show how the "
            "arithmetic moves; they say nothing of which label is right."
        )
    )
    return parts


def _figure(value: float) -> str:
    """A figure to be reckoned on with: whole numbers in full, others to six digits or more."""
    if value == round(value) and abs(value) < 1e12:
        return f"{value:,.0f}"
    return f"{value:,.2f}" if abs(value) >= 10_000 else f"{value:.6g}"


def _arithmetic(held: Explanation, m: int) -> str:
    total = _figure(held.pair_sum)
    return (
        f"contribution = 2 × {total} / (n (m − 1)) = 2 × {total} / "
        f"({count(held.n_pairable_labels)} × {m - 1}) = {_figure(held.contribution)}\n"
        f"n = {count(held.n_pairable_labels)} pairable labels of all items, m = {m} of this one; "
        f"{total} is the sum over pairs, and each pair counts in both orders, hence the 2"
    )


def _standing(held: Explanation) -> list[str]:
    lines = []
    if held.share is not None and held.observed_disagreement is not None:
        lines.append(
            f"share = contribution / D_o = {_figure(held.contribution)} / "
            f"{_figure(held.observed_disagreement)} = {percent(held.share, decimals=2)}"
        )
    if held.alpha_cost is not None and held.expected_disagreement is not None:
        lines.append(
            f"alpha cost = contribution / D_e = {_figure(held.contribution)} / "
            f"{_figure(held.expected_disagreement)} = {_figure(held.alpha_cost)}, "
            f"its part of 1 − alpha = {_figure(1 - (held.alpha or 0))}"
        )
    if held.rank is not None:
        lines.append(
            f"place {count(held.rank)} by contribution, of "
            f"{counted(held.n_disputed_items, 'disputed item')} (equal ones share a place)"
        )
    else:
        lines.append("not disputed: its labels lie within the tolerance, so it is not queued")
    if held.consensus is not None:
        lines.append(f"consensus label: {held.consensus}")
    elif held.tied:
        lines.append(f"no consensus label: a tie of {', '.join(held.tied)}")
    if held.tied:
        lines.append("no doubt is given, since the labels tie and there is no consensus to doubt")
    elif held.doubt is not None:
        # The model takes coders' errors for independent, so that its extremes promise too much.
        doubt = f"{held.doubt:.2f}"
        doubt = {"0.00": "below 0.01", "1.00": "above 0.99"}.get(doubt, doubt)
        lines.append(
            f"doubt {doubt}: a score from 0 to 1 that the consensus label is wrong, by a model of "
            "how each coder labels (Dawid & Skene 1979) that takes their errors for independent; "
            "not calibrated"
        )
    else:
        lines.append(f"doubt is undefined: {held.doubt_undefined_because}")
    return lines
