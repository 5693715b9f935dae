"""What to know before worksheets go out: it is cheaper to mend a table than what came of it."""

from __future__ import annotations

import numpy as np

from relook.core.agreement import Agreement
from relook.project.figures.ordering import Ordering
from relook.project.setup.loading import Loaded
from relook.tables.labels import VariableLabels
from relook.tables.twins import near_twins

_NAMED = 3


def cautions_of(loaded: Loaded, ordering: Ordering) -> tuple[str, ...]:
    """Return what to know of a round, a sentence or two each, the gravest first.

    Parameters
    ----------
    loaded : Loaded
    ordering : Ordering
        By which the items of the round were chosen.
    """
    variables = loaded.labels.variables
    said = [_twins(held, loaded.agreements[name]) for name, held in variables.items()]
    said.append(_no_texts(loaded))
    said.append(_no_meanings(loaded))
    said += [_unsettled(name, ordering) for name in variables]
    if ordering.ranking.rank_by == "contribution" and ordering.selection.n_items:
        said += [_unequal(name, agreement) for name, agreement in loaded.agreements.items()]
    return tuple(each for each in said if each)


def _twins(held: VariableLabels, agreement: Agreement) -> str:
    """Labels that are one to the eye and two to the arithmetic."""
    if agreement.function.needs == "number":
        return ""
    profiles = agreement.profiles
    often = profiles.count * profiles.multiplicity[profiles.profile_of_entry]
    uses = np.bincount(profiles.value_index, weights=often, minlength=len(held.texts))
    pairs = near_twins({text: int(n) for text, n in zip(held.texts, uses, strict=False) if n})
    if not pairs:
        return ""
    named = ", ".join(f'"{pair.kept}" and "{pair.other}"' for pair in pairs[:_NAMED])
    more = f", and {len(pairs) - _NAMED:,} more" if pairs[_NAMED:] else ""
    return (
        f"Labels of {held.variable.name} that differ by next to nothing count as different, and "
        f"adjudicators see them so: {named}{more}. If they are one, mend the table before anything "
        "is sent; relook check has the rows."
    )


def _no_texts(loaded: Loaded) -> str:
    source = loaded.project.settings.items
    if loaded.items is not None and source is not None and source.show:
        return ""
    return (
        "Adjudicators see ids and labels alone, no text of any item: name a table of items and its "
        "columns to show under [items] in relook.toml, or begin with relook new … --items FILE."
    )


def _no_meanings(loaded: Loaded) -> str:
    bare = [
        held.variable.name
        for held in loaded.labels.variables.values()
        if held.variable.code_book is None
    ]
    if not bare:
        return ""
    return (
        f"No code book says what the labels of {', '.join(bare)} mean, so the worksheets list them "
        "bare: name one by code_book in relook.toml (columns label, meaning, example)."
    )


def _unsettled(name: str, ordering: Ordering) -> str:
    held = ordering.doubts.get(name)
    model = None if held is None else held.model
    if model is None or model.converged:
        return ""
    return (
        f"Doubt about {name} had not settled after {model.steps:,} steps, so where it decides, the "
        "order may be another with more of them."
    )


def _unequal(name: str, agreement: Agreement) -> str:
    """Where some items have twice the labels of others, what contributes most has most labels."""
    size = agreement.profiles.size[agreement.disputed_profiles]
    if not size.size or size.max() < 2 * size.min():
        return ""
    low, high = int(size.min()), int(size.max())
    return (
        f"Disputed items have {low} to {high} labels of {name}, and more labels can contribute "
        "more: --rank-by doubt or intensity does not favour them."
    )
