"""What is left once decisions are in: the items and the pairs of labels that still weigh most."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np

from relook.core.contributions import item_contributions, label_pair_parts
from relook.core.decisions import Settlement
from relook.core.ties import tie_levels
from relook.project.outcome.corrected import Corrected
from relook.project.setup.loading import Loaded, labels_of_item

MOST_REMAINING = 10


@dataclass(frozen=True, slots=True, kw_only=True)
class Remaining:
    """A disputed item without a decision: what still weighs most.

    Attributes
    ----------
    item : str
    contribution, share : float
        Of the observed disagreement that is left.
    labels : tuple of (coder, label)
    state : str or None
        "split" or "open" where it was ruled on, None where nobody has.
    """

    item: str
    contribution: float
    share: float
    labels: tuple[tuple[str, str], ...]
    state: str | None


@dataclass(frozen=True, slots=True, kw_only=True)
class RemainingPair:
    """Two labels that still clash, their share of what is left, and in how many items."""

    first: str
    second: str
    share: float
    n_items: int


def remaining_items(
    loaded: Loaded, corrected: Corrected, own: Mapping[str, Settlement]
) -> tuple[Remaining, ...]:
    """Return the disputed items without a decision that weigh most.

    Parameters
    ----------
    loaded : Loaded
    corrected : Corrected
    own : mapping of item to Settlement
        Of this variable.
    """
    measured = corrected.measured
    contribution = item_contributions(measured)
    observed = measured.observed_disagreement or 1.0
    profile = measured.profile_of_item
    disputed = np.append(measured.disputed_profiles, False)[profile]
    items = np.flatnonzero(disputed)
    names = loaded.labels.items
    level = tie_levels(contribution[items])
    heaviest = items[np.lexsort((names[items].astype(str), level))].tolist()
    return tuple(
        Remaining(
            item=str(names[item]),
            contribution=float(contribution[item]),
            share=float(contribution[item]) / observed,
            labels=tuple(labels_of_item(loaded, corrected.variable.name, item)),
            state=own[names[item]].state if names[item] in own else None,
        )
        for item in heaviest[:MOST_REMAINING]
    )


def remaining_pairs(corrected: Corrected) -> tuple[RemainingPair, ...]:
    """Return the pairs of labels that still clash most."""
    parts = label_pair_parts(corrected.measured)
    return tuple(
        RemainingPair(
            first=corrected.texts[first],
            second=corrected.texts[second],
            share=float(share),
            n_items=int(n),
        )
        for first, second, share, n in zip(
            parts.first[:MOST_REMAINING],
            parts.second[:MOST_REMAINING],
            parts.share[:MOST_REMAINING],
            parts.n_items[:MOST_REMAINING],
            strict=True,
        )
    )
