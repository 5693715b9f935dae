"""Consensus labels as texts, one by one and in bulk."""

from __future__ import annotations

from fractions import Fraction

import numpy as np
import numpy.typing as npt

from relook.core.agreement import Agreement
from relook.core.consensus import Consensus, consensus_of
from relook.core.exact import IntArray
from relook.tables.labels import VariableLabels
from relook.tables.numbers import plain_number

Texts = npt.NDArray[np.object_]

#: Between tied labels in one cell.
TIED = " | "


def consensus_for(agreement: Agreement) -> Consensus:
    """Find the consensus labels of a variable as its difference function asks."""
    return consensus_of(agreement.profiles, agreement.function, agreement.values)


def consensus_text(
    held: VariableLabels, consensus: Consensus, profile: int
) -> tuple[str | None, tuple[str, ...]]:
    """Return the consensus label of a profile, None for a tie.

    Returns
    -------
    text : str or None
    tied : tuple of str
        The labels that share first place; empty where there is no tie.
    """
    if consensus.tie[profile]:
        labels = _every_label(held, consensus)
        return None, tuple(str(labels[value]) for value in consensus.tied_values(profile))
    return str(consensus_texts(held, consensus, np.array([profile]))[0]), ()


def consensus_texts(held: VariableLabels, consensus: Consensus, profiles: IntArray) -> Texts:
    """Return the consensus label of each profile; tied labels with " | " between.

    Parameters
    ----------
    held : VariableLabels
    consensus : Consensus
    profiles : int array of shape (n,)

    Returns
    -------
    object array of shape (n,)
    """
    value = consensus.value_index[profiles]
    labels = _every_label(held, consensus)
    texts = labels[value]
    tie = consensus.tie[profiles]
    for at in np.flatnonzero(tie).tolist():
        tied = consensus.tied_values(int(profiles[at]))
        texts[at] = TIED.join(str(label) for label in labels[tied])
    means = np.flatnonzero((value < 0) & ~tie)
    if means.size:
        texts[means] = _mean_texts(consensus, profiles[means])
    return texts


def _every_label(held: VariableLabels, consensus: Consensus) -> Texts:
    """The texts of all value codes, sets that nobody gave included; the last is "" for code -1."""
    given = consensus.values.texts or ()
    return np.array([*held.texts, *given[len(held.texts) :], ""], dtype=object)


def _mean_texts(consensus: Consensus, profiles: IntArray) -> Texts:
    """Means that nobody gave; each distinct one is written once."""
    tops, bottoms, numbers = consensus.numerators, consensus.denominators, consensus.number
    if tops is not None and bottoms is not None:
        means = [
            Fraction(int(top), int(bottom))
            for top, bottom in zip(tops[profiles], bottoms[profiles], strict=True)
        ]
        written = {mean: plain_number(mean) for mean in set(means)}
        return np.array([written[mean] for mean in means], dtype=object)
    assert numbers is not None  # only means have no value code
    return np.array([f"{number:.6g}" for number in numbers[profiles].tolist()], dtype=object)
