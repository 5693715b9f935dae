"""What decisions did to the labels: which became which, why, and how each coder stood to them."""

from __future__ import annotations

from collections import Counter, defaultdict
from collections.abc import Collection, Iterable, Mapping
from dataclasses import dataclass
from fractions import Fraction

import numpy as np

from relook.core.agreement import measure_agreement
from relook.core.decisions import LEAD, Decision, Settlement, number_of
from relook.core.exact import BoolArray, IntArray
from relook.core.labels import CodedLabels
from relook.core.proportions import wilson_interval
from relook.core.settling import CANNOT_BE_CODED
from relook.project.outcome.corrected import Corrected, with_decisions
from relook.project.setup.loading import Loaded

#: Below this number of shared items adjudicators' agreement is given as counts alone.
LEAST_SHARED_ITEMS = 30
#: Kinds of rows that an adjudicator rules on without knowing that another has.
_UNPROMPTED = ("disputed", "audit")


@dataclass(frozen=True, slots=True, kw_only=True)
class Move:
    """Labels that became another label, or that left with an item that cannot be coded.

    Attributes
    ----------
    old : str
    new : str or None
        None where the item cannot be coded.
    n_labels, n_items : int
    """

    old: str
    new: str | None
    n_labels: int
    n_items: int


@dataclass(frozen=True, slots=True, kw_only=True)
class ReasonCount:
    """How many items have a reason among their standing decisions, of those that have any."""

    reason: str
    n_items: int
    n_with_reason: int


@dataclass(frozen=True, slots=True, kw_only=True)
class CoderStanding:
    """A coder's labels against the decisions, on audit items or on all the others.

    Attributes
    ----------
    coder : str
    items : str
        "audit": drawn at random from what would be released without a decision. "disputed": every
        other decided item, chosen because coders differed.
    n_labels, n_upheld : int
        Labels on settled items, and those that the decision upheld (within the tolerance).
    share_upheld, low, high : float or None
        With Wilson's interval, on audit items alone: disputed ones are no sample of anything.
    """

    coder: str
    items: str
    n_labels: int
    n_upheld: int
    share_upheld: float | None
    low: float | None
    high: float | None


@dataclass(frozen=True, slots=True, kw_only=True)
class Overlap:
    """How adjudicators agree on items that several of them ruled on, none knowing of the other.

    Attributes
    ----------
    n_items, n_agree : int
        Items with two such rulings or more, and those on which all say the same.
    n_adjudicators : int
    alpha : float or None
        Their own alpha, over the items with two labels or more, where there are 30 of them.
    n_labelled_items : int
    undefined_because : str or None
        Why there is no alpha.
    """

    n_items: int
    n_agree: int
    n_adjudicators: int
    alpha: float | None
    n_labelled_items: int
    undefined_because: str | None


def moves_of(corrected: Corrected) -> tuple[Move, ...]:
    """Count which labels became which, most labels first; labels that stayed are left out."""
    labels = corrected.given.labels
    decision = _decision_of_label(corrected)
    moved = (decision != _NONE) & (decision != labels.value_index)
    triples = zip(
        labels.value_index[moved].tolist(),
        decision[moved].tolist(),
        labels.item_index[moved].tolist(),
        strict=True,
    )
    n_labels: Counter[tuple[int, int]] = Counter()
    items: defaultdict[tuple[int, int], set[int]] = defaultdict(set)
    for old, new, item in triples:
        n_labels[old, new] += 1
        items[old, new].add(item)
    found = [
        Move(
            old=corrected.texts[old],
            new=None if new == CANNOT_BE_CODED else corrected.texts[new],
            n_labels=n,
            n_items=len(items[old, new]),
        )
        for (old, new), n in n_labels.items()
    ]
    return tuple(sorted(found, key=lambda each: (-each.n_labels, each.old, each.new or "")))


_NONE = -2


def _decision_of_label(corrected: Corrected) -> IntArray:
    """The decision on the item of each label, `_NONE` where there is none."""
    labels = corrected.given.labels
    decision = np.full(labels.n_items, _NONE, dtype=np.int64)
    decision[corrected.item_index] = corrected.decided
    return np.asarray(decision[labels.item_index])


def reasons_of(settled: Iterable[Settlement]) -> tuple[ReasonCount, ...]:
    """Tally reasons over items, each once per item whoever gave it, most frequent first."""
    tally: Counter[str] = Counter()
    n_with_reason = 0
    for held in settled:
        reasons = {decision.reason for decision in held.standing if decision.reason}
        tally.update(reasons)
        n_with_reason += bool(reasons)
    return tuple(
        ReasonCount(reason=reason, n_items=n, n_with_reason=n_with_reason)
        for reason, n in sorted(tally.items(), key=lambda pair: (-pair[1], pair[0]))
    )


def coders_against_decisions(
    loaded: Loaded, corrected: Corrected, audit: Collection[str]
) -> tuple[CoderStanding, ...]:
    """Compare each coder's labels with the decisions, audit items apart from disputed ones.

    Parameters
    ----------
    loaded : Loaded
    corrected : Corrected
    audit : collection of str
        The items of this variable that were drawn for an audit.

    Returns
    -------
    tuple of CoderStanding
        By coder, then audit before disputed; empty for a table of counts.
    """
    labels = corrected.given.labels
    if labels.coder_index is None:
        return ()
    decision = _decision_of_label(corrected)
    known = decision >= 0
    upheld = np.zeros(labels.n_labels, dtype=bool)
    upheld[known] = _same(corrected, labels.value_index[known], decision[known])
    audited = np.zeros(labels.n_items, dtype=bool)
    audited[[at for each, at in zip(corrected.settled, corrected.item_index.tolist(), strict=True)
             if each.item in audit]] = True  # fmt: skip
    found = []
    for coder, name in enumerate(loaded.labels.coders):
        own = known & (labels.coder_index == coder)
        for items, which in (("audit", audited), ("disputed", ~audited)):
            mine = own & which[labels.item_index]
            n, n_upheld = int(mine.sum()), int((mine & upheld).sum())
            if not n:
                continue
            interval: tuple[float | None, float | None] = (None, None)
            if items == "audit":
                interval = wilson_interval(n_upheld, n)
            found.append(
                CoderStanding(
                    coder=name,
                    items=items,
                    n_labels=n,
                    n_upheld=n_upheld,
                    share_upheld=n_upheld / n,
                    low=interval[0],
                    high=interval[1],
                )
            )
    return tuple(sorted(found, key=lambda each: (each.coder, each.items)))


def _same(corrected: Corrected, label: IntArray, decision: IntArray) -> BoolArray:
    """Whether label and decision are one value, or numbers within the tolerance of each other."""
    values, tolerance = corrected.given.values, corrected.variable.tolerance
    if values.numerators is None or not tolerance:
        return np.asarray(label == decision, dtype=bool)
    apart = np.abs(values.numerators[label] - values.numerators[decision]).astype(object)
    limit = Fraction(tolerance) * values.denominator
    return np.asarray(apart * limit.denominator <= limit.numerator, dtype=bool)


def overlap_of(
    loaded: Loaded,
    name: str,
    settled: Mapping[tuple[str, str], Settlement],
    tolerance: Fraction | None,
) -> Overlap:
    """Say how adjudicators agree with each other on one variable.

    Parameters
    ----------
    loaded : Loaded
    name : str
        Of the variable.
    settled : mapping of (item, variable) to Settlement
    tolerance : Fraction or None
        Of a variable of numbers.

    Notes
    -----
    Second opinions on splits and rulings of the lead are left out: they were asked for because of
    what others had ruled. So were the adjudicators not free in which items they share, and where
    these are disputed ones their alpha tells of hard items alone.
    """
    shared: list[tuple[str, tuple[Decision, ...]]] = []
    for (item, variable), held in settled.items():
        own = tuple(
            decision
            for decision in held.standing
            if decision.kind in _UNPROMPTED and decision.adjudicator != LEAD
        )
        if variable == name and len(own) >= 2:
            shared.append((item, own))
    people = sorted({decision.adjudicator for _, own in shared for decision in own})
    n_agree = sum(1 for _, own in shared if _all_agree(own, tolerance))
    rulings = [
        (row, people.index(decision.adjudicator), decision.label)
        for row, (_, own) in enumerate(shared)
        for decision in own
        if decision.label is not None
    ]
    per_item = Counter(row for row, _, _ in rulings)
    n_labelled = sum(1 for n in per_item.values() if n >= 2)
    alpha: float | None = None
    because: str | None = f"fewer than {LEAST_SHARED_ITEMS} shared items with labels"
    if n_labelled >= LEAST_SHARED_ITEMS:
        alpha, because = _own_alpha(loaded, name, rulings, len(shared), len(people))
    return Overlap(
        n_items=len(shared),
        n_agree=n_agree,
        n_adjudicators=len(people),
        alpha=alpha,
        n_labelled_items=n_labelled,
        undefined_because=because if alpha is None else None,
    )


def _all_agree(rulings: tuple[Decision, ...], tolerance: Fraction | None) -> bool:
    labels = [decision.label for decision in rulings]
    given = [label for label in labels if label is not None]
    if len(given) < len(labels):
        return not given
    if tolerance is None:
        return len(set(given)) == 1
    numbers = [number_of(label) for label in given]
    return max(numbers) - min(numbers) <= tolerance


def _own_alpha(
    loaded: Loaded, name: str, rulings: list[tuple[int, int, str]], n_items: int, n_people: int
) -> tuple[float | None, str | None]:
    held, agreement = loaded.labels.variables[name], loaded.agreements[name]
    extended, texts, code_of = with_decisions(held, agreement, [label for _, _, label in rulings])
    labels = CodedLabels.from_codes(
        np.array([row for row, _, _ in rulings], dtype=np.int64),
        np.array([code_of[label] for _, _, label in rulings], dtype=np.int64),
        np.array([person for _, person, _ in rulings], dtype=np.int64),
        n_items=n_items,
        n_values=len(texts),
        n_coders=n_people,
    )
    own = measure_agreement(labels, agreement.function, extended.values)
    return own.alpha, own.undefined_because
