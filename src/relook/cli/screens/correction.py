"""The screen of `relook rescore --against`: what coders changed in their own labels."""

from __future__ import annotations

from rich.console import RenderableType
from rich.text import Text

from relook.cli.screens.layout import (
    amount,
    coefficient,
    count,
    counted,
    heading,
    note,
    shortened,
    small_table,
    stacked,
)
from relook.project.corrections.correcting import MOST_REMOVED, Correction, VariableCorrection
from relook.project.corrections.label_versions import LabelVersion

_SHOWN = 20


def correction_screen(held: Correction, version: LabelVersion | None) -> RenderableType:
    """Lay out what changed per variable, and where it is kept."""
    parts: list[RenderableType] = []
    for each in held.variables:
        parts += [*_variable(held, each), Text("")]
    shown = held.loaded.project.shown_root
    if version is None:
        parts.append(note("Nothing was recorded (--dry-run)."))
    else:
        parts += [
            note(f"Label version {version.number}: {', '.join(version.files)}"),
            note(f"next: relook release {shown} --version {version.number}"),
        ]
    return stacked(*parts)


def _variable(held: Correction, each: VariableCorrection) -> list[RenderableType]:
    name = "alpha, independent labels" if held.independent else "alpha of the labels first given"
    rows = [
        (
            label,
            coefficient(agreement.alpha),
            amount(agreement.observed_disagreement),
            amount(agreement.expected_disagreement),
            count(agreement.n_pairable_items),
            count(agreement.n_disputed_items),
        )
        for label, agreement in (
            (name, each.before),
            ("agreement after coders corrected their labels", each.after),
        )
    ]
    headers = ("", "figure", "D_o", "D_e", "items", "disputed")
    parts: list[RenderableType] = [
        heading(f"{each.name}: {counted(len(each.changes), 'label')} changed by their coders"),
        small_table(headers, rows, numbers=(1, 2, 3, 4, 5)),
        note(
            "The second figure is of labels that coders changed knowing that they had differed. It "
            "is not a reliability, whatever it is, and neither is its distance from the first."
        ),
        note(direction_sentence(each)),
    ]
    total = sum(coder.n_labels for coder in each.coders)
    if each.n_removed > MOST_REMOVED * total:
        parts.append(
            note(
                f"The table lacks {each.n_removed:,} of {total:,} labels. Should it hold only what "
                "was corrected, put these into a copy of the whole table first."
            )
        )
    own = [
        (
            shortened(coder.coder, 24),
            count(coder.n_labels),
            count(coder.n_changed),
            count(coder.directions["toward"]),
            count(coder.directions["away"]),
            count(coder.n_added),
            count(coder.n_removed),
        )
        for coder in each.coders
        if coder.n_changed or coder.n_added or coder.n_removed
    ]
    headers_of_coders = ("coder", "labels", "changed", "toward", "away", "added", "removed")
    parts += [Text(""), small_table(headers_of_coders, own, numbers=(1, 2, 3, 4, 5, 6))]
    if each.changes:
        changes = [
            (
                shortened(change.item, 24),
                shortened(change.coder, 16),
                f"{shortened(change.old, 24)} → {shortened(change.new, 24)}",
                change.direction,
            )
            for change in each.changes[:_SHOWN]
        ]
        parts += [Text(""), small_table(("item", "coder", "label", "the others"), changes)]
        left = len(each.changes) - _SHOWN
        if left > 0:
            parts.append(note(f"and {counted(left, 'change')} more; --json has them all"))
    return parts


def direction_sentence(each: VariableCorrection) -> str:
    """Say which way the changes went."""
    held = each.directions
    return (
        f"Of {counted(len(each.changes), 'change')}, {held['toward']:,} went toward the other "
        f"coders' labels as first given, {held['away']:,} away from them, {held['neither']:,} "
        f"neither way; {held['alone']:,} had no other label to compare. "
        f"{counted(each.n_added, 'label')} added, {each.n_removed:,} removed."
    )
