"""What agreement becomes when items are settled, computed exactly and never guessed.

Settling an item turns its m_u labels into the decision; n stays, while the marginals, expected
disagreement and ordinal differences are recomputed. Agreement can fall, and become undefined, so
nothing here urges a label: `prospect` shows both ends of what the head of a ranking would bring.
The figure is the agreement in the corrected data, and no reliability.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from relook.core.agreement import NO_VARIATION, NOTHING_PAIRABLE, Agreement, measure_agreement
from relook.core.consensus import Consensus, extend_values
from relook.core.differences import Values
from relook.core.exact import BoolArray, FloatArray, IntArray
from relook.core.labels import CodedLabels
from relook.core.settled_base import Base, base_of
from relook.core.settled_sums import alternatives, sequence
from relook.errors import RelookError

#: In `agreement_after`: the item was ruled impossible to code, so its labels leave the sums.
CANNOT_BE_CODED = -1
_UNTOUCHED = -2


@dataclass(frozen=True, slots=True, eq=False)
class SettledFigures:
    """Agreement in the corrected data after each of several settlements.

    Attributes
    ----------
    agreement : float array of shape (n,)
        1 − D_o/D_e; nan where undefined.
    observed_disagreement, expected_disagreement : float arrays of shape (n,)
        nan where nothing is pairable.
    undefined_because : str or None
        Why, where any `agreement` is nan.
    """

    agreement: FloatArray
    observed_disagreement: FloatArray
    expected_disagreement: FloatArray
    undefined_because: str | None

    @property
    def undefined(self) -> BoolArray:
        """Where agreement is undefined, shape (n,)."""
        return np.isnan(self.agreement)


@dataclass(frozen=True, slots=True, eq=False)
class Prospect:
    """Agreement in the corrected data as the head of a ranking is settled, item by item.

    Attributes
    ----------
    item_index : int array of shape (n_steps,)
        The items in the order in which they are settled.
    cautious : SettledFigures of n_steps + 1
        Ties go to the tied label most used. Entry t is after t items; entry 0 is now.
    other : SettledFigures of n_steps + 1
        Ties go to the tied label least used.
    n_ties : int array of shape (n_steps + 1,)
        How many of the items settled so far had a tie for their consensus label.
    """

    item_index: IntArray
    cautious: SettledFigures
    other: SettledFigures
    n_ties: IntArray

    @property
    def low(self) -> FloatArray:
        """The lower of both ends after each step; nan where either is undefined."""
        return np.minimum(self.cautious.agreement, self.other.agreement)

    @property
    def high(self) -> FloatArray:
        """The higher of both ends after each step; nan where either is undefined."""
        return np.maximum(self.cautious.agreement, self.other.agreement)

    @property
    def undefined_because(self) -> str | None:
        """Why a step is undefined at either end."""
        return self.cautious.undefined_because or self.other.undefined_because

    @property
    def falls(self) -> IntArray:
        """Steps (1-based: after that many items) at which the cautious end is lower than before."""
        path = self.cautious.agreement
        with np.errstate(invalid="ignore"):
            lower = path[1:] < path[:-1] - 1e-12
        return np.flatnonzero(lower) + 1


@dataclass(frozen=True, slots=True, kw_only=True)
class CorrectedAgreement:
    """Agreement in the corrected data; never an alpha, for its labels are not independent.

    Attributes
    ----------
    agreement : float or None
        1 − D_o/D_e of the corrected data; None where undefined.
    undefined_because : str or None
    observed_disagreement, expected_disagreement : float or None
    n_settled, n_cannot_be_coded : int
        Decisions that were put in, and items that left the sums.
    n_pairable_items, n_pairable_labels, n_disputed_items : int
        What is left.
    """

    agreement: float | None
    undefined_because: str | None
    observed_disagreement: float | None
    expected_disagreement: float | None
    n_settled: int
    n_cannot_be_coded: int
    n_pairable_items: int
    n_pairable_labels: int
    n_disputed_items: int


def settled_alphas(
    agreement: Agreement,
    profile_index: IntArray,
    candidate: IntArray,
    values: Values | None = None,
) -> SettledFigures:
    """Compute what agreement would be if one item were settled, for each (profile, label) given.

    Parameters
    ----------
    agreement : Agreement
    profile_index : int array of shape (n,)
        The profile of the item that is settled.
    candidate : int array of shape (n,)
        The decision: a code of `values`.
    values : Values, optional
        An extension of `agreement.values`, for decisions that nobody gave (see `extend_values`).

    Returns
    -------
    SettledFigures of n
        Each entry settles one item and leaves all others as they are. Settling an item with a
        single label changes nothing, since it is not pairable.
    """
    base = base_of(agreement, values)
    if base.n == 0:
        return _nothing_pairable(profile_index.size)
    observed, expected = alternatives(base, profile_index, candidate)
    return _figures(base, observed, expected)


def prospect(agreement: Agreement, order: IntArray, consensus: Consensus) -> Prospect:
    """Settle items one after the other to their consensus label and recompute everything each time.

    Parameters
    ----------
    agreement : Agreement
    order : int array of shape (n_steps,)
        Items, first to last, none twice, each with a label at least.
    consensus : Consensus
        Of the profiles of `agreement`.

    Returns
    -------
    Prospect
    """
    order = np.asarray(order, dtype=np.int64)
    profiles = agreement.profile_of_item[order]
    if profiles.size and int(profiles.min()) < 0:
        raise RelookError("an item without labels cannot be settled by its consensus label")
    cautious, values = decided_values(agreement, consensus, most_used=True)
    other, _ = decided_values(agreement, consensus, most_used=False)
    base = base_of(agreement, values)
    ties = np.concatenate([[0], np.cumsum(consensus.tie[profiles])])
    if base.n == 0:
        nothing = _nothing_pairable(order.size + 1)
        return Prospect(order, nothing, nothing, ties)
    ends: list[SettledFigures] = []
    for decided in (cautious, other):
        if ends and bool(np.array_equal(decided[profiles], cautious[profiles])):
            ends.append(ends[0])
            continue
        observed, expected = sequence(base, profiles, decided[profiles])
        ends.append(_figures(base, observed, expected))
    return Prospect(order, ends[0], ends[1], ties)


def decided_values(
    agreement: Agreement, consensus: Consensus, *, most_used: bool
) -> tuple[IntArray, Values]:
    """Turn a consensus into one decision per profile.

    Parameters
    ----------
    agreement : Agreement
    consensus : Consensus
    most_used : bool
        Whether a tie goes to the tied label with the most pairable labels or to that with the
        fewest; among equally used ones to the lowest code.

    Returns
    -------
    value_index : int array of shape (n_profiles,)
        Codes of `values`.
    values : Values
        The values in use, then the means that nobody gave.
    """
    decided = consensus.value_index.copy()
    tied_profile = np.repeat(np.arange(decided.size), np.diff(consensus.tied_start))
    if tied_profile.size:
        tied = consensus.tied_value_index
        # A set that nobody gave is used least of all.
        used = np.append(agreement.marginals, 0)[np.minimum(tied, agreement.marginals.size)]
        best = np.lexsort((tied, -used if most_used else used, tied_profile))
        first = np.flatnonzero(np.diff(tied_profile[best], prepend=-1))
        decided[tied_profile[best][first]] = tied[best][first]
    missing = decided < 0
    if not bool(missing.any()):
        return decided, consensus.values
    if consensus.numerators is not None and consensus.denominators is not None:
        tops, bottoms = consensus.numerators[missing], consensus.denominators[missing]
    else:
        assert consensus.number is not None  # words always have a leader
        ratios = [number.as_integer_ratio() for number in consensus.number[missing].tolist()]
        tops = np.array([top for top, _ in ratios], dtype=object)
        bottoms = np.array([bottom for _, bottom in ratios], dtype=object)
    values, codes = extend_values(agreement.values, tops, bottoms)
    decided[missing] = codes
    return decided, values


def agreement_after(
    agreement: Agreement,
    item_index: IntArray,
    decided: IntArray,
    values: Values | None = None,
) -> CorrectedAgreement:
    """Put decisions into the data and measure agreement again.

    Parameters
    ----------
    agreement : Agreement
        Of the labels as they were given.
    item_index : int array of shape (n,)
        The settled items, none twice.
    decided : int array of shape (n,)
        The decision on each: a code of `values`, or `CANNOT_BE_CODED`.
    values : Values, optional
        An extension of `agreement.values`, for decisions that nobody gave.

    Returns
    -------
    CorrectedAgreement

    Notes
    -----
    Every label of a settled item becomes the decision. An item that cannot be coded has no right
    label that coders could have agreed on, so all its labels leave the sums, and n with them. Items
    that carry a single label stay unpairable whatever is decided.
    """
    values = agreement.values if values is None else values
    labels = agreement.labels
    decided = np.asarray(decided, dtype=np.int64)
    corrected = corrected_labels(labels, item_index, decided, values.n_values)
    after = measure_agreement(corrected, agreement.function, values)
    disputed_before = np.zeros(labels.n_items, dtype=bool)
    known = agreement.profile_of_item >= 0
    disputed_before[known] = agreement.disputed_profiles[agreement.profile_of_item[known]]
    disputed_before[np.asarray(item_index, dtype=np.int64)] = False
    return CorrectedAgreement(
        agreement=after.alpha,
        undefined_because=after.undefined_because,
        observed_disagreement=after.observed_disagreement,
        expected_disagreement=after.expected_disagreement,
        n_settled=int((decided >= 0).sum()),
        n_cannot_be_coded=int((decided == CANNOT_BE_CODED).sum()),
        n_pairable_items=after.n_pairable_items,
        n_pairable_labels=after.n_pairable_labels,
        # Within the tolerance is no dispute, before or after; decisions only ever end one.
        n_disputed_items=int(disputed_before.sum()),
    )


def corrected_labels(
    labels: CodedLabels, item_index: IntArray, decided: IntArray, n_values: int
) -> CodedLabels:
    """Put decisions into the labels.

    Parameters
    ----------
    labels : CodedLabels
    item_index : int array of shape (n,)
        The settled items, none twice.
    decided : int array of shape (n,)
        The decision on each, below `n_values`, or `CANNOT_BE_CODED`.
    n_values : int
        Of the corrected labels; decisions may be values that nobody gave.

    Returns
    -------
    CodedLabels
        Every label of a settled item is the decision; items that cannot be coded have none.
    """
    decision_of_item = np.full(labels.n_items, _UNTOUCHED, dtype=np.int64)
    decision_of_item[np.asarray(item_index, dtype=np.int64)] = decided
    decision = decision_of_item[labels.item_index]
    return CodedLabels(
        labels.item_index,
        np.where(decision >= 0, decision, labels.value_index),
        labels.coder_index,
        n_items=labels.n_items,
        n_values=n_values,
        n_coders=labels.n_coders,
    ).where(decision != CANNOT_BE_CODED)


def _figures(base: Base, observed: FloatArray, expected: FloatArray) -> SettledFigures:
    """Figures from the sums over pairs, nan where expected disagreement is 0."""
    n = base.n
    d_o = observed / (base.scale * n)
    d_e = expected / (float(n) * (n - 1))
    undefined = expected == 0
    agreement = np.full(d_o.shape, np.nan)
    defined = ~undefined
    agreement[defined] = 1 - d_o[defined] / d_e[defined]
    denominator = float(base.differences.denominator)
    return SettledFigures(
        agreement,
        d_o / denominator,
        d_e / denominator,
        NO_VARIATION if bool(undefined.any()) else None,
    )


def _nothing_pairable(n: int) -> SettledFigures:
    nothing = np.full(n, np.nan)
    return SettledFigures(nothing, nothing, nothing, NOTHING_PAIRABLE)
