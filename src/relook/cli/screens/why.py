"""The screen of `relook why`: one item's arithmetic, to be redone by hand."""

from __future__ import annotations

from collections.abc import Sequence

from rich.console import RenderableType
from rich.padding import Padding
from rich.text import Text

from relook.cli.screens.layout import (
    amount,
    coefficient,
    count,
    counted,
    heading,
    note,
    percent,
    small_table,
    stacked,
)
from relook.project.explaining import Explanation


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
    rows = [
        (
            f"{term.first} – {term.second}",
            count(term.pairs),
            amount(term.difference),
            amount(term.pairs * term.difference),
        )
        for term in held.pairs
    ]
    headers = ("different labels", "pairs of coders", "δ²", "pairs × δ²")
    parts.append(small_table(headers, rows, numbers=(1, 2, 3)))
    parts.append(note(_arithmetic(held, m)))
    parts += [note(line) for line in _standing(held)]
    if held.candidates:
        parts += [
            Text(""),
            heading("  if it alone were settled"),
            small_table(
                ("to", "given by", "agreement in the corrected data"),
                [
                    (row.label, count(row.given), coefficient(row.agreement))
                    for row in held.candidates
                ],
                numbers=(1, 2),
            ),
            note(
                f"Alpha of the independent labels is {coefficient(held.alpha)}. These figures show "
                "how the arithmetic moves; they say nothing of which label is right."
            ),
        ]
    return parts


def _arithmetic(held: Explanation, m: int) -> str:
    return (
        f"contribution = 2 × {amount(held.pair_sum)} / (n (m − 1)) = 2 × {amount(held.pair_sum)} / "
        f"({count(held.n_pairable_labels)} × {m - 1}) = {amount(held.contribution)}\n"
        f"n = {count(held.n_pairable_labels)} pairable labels of all items, m = {m} of this one; "
        "each pair counts in both orders, hence the 2"
    )


def _standing(held: Explanation) -> list[str]:
    lines = []
    if held.share is not None and held.observed_disagreement is not None:
        lines.append(
            f"share = contribution / D_o = {amount(held.contribution)} / "
            f"{amount(held.observed_disagreement)} = {percent(held.share, decimals=2)}"
        )
    if held.alpha_cost is not None and held.expected_disagreement is not None:
        lines.append(
            f"alpha cost = contribution / D_e = {amount(held.contribution)} / "
            f"{amount(held.expected_disagreement)} = {amount(held.alpha_cost)}, "
            f"its part of 1 − alpha = {amount(1 - (held.alpha or 0))}"
        )
    if held.rank is not None:
        lines.append(
            f"place {count(held.rank)} by contribution, of "
            f"{counted(held.n_disputed_items, 'disputed item')} (equal ones share a place)"
        )
    if held.consensus is not None:
        lines.append(f"consensus label: {held.consensus}")
    elif held.tied:
        lines.append(f"no consensus label: a tie of {', '.join(held.tied)}")
    return lines
