"""Decisions of adjudicators, and what they amount to: a pure function of the record.

The record is a set of decisions. Folding it in any order gives the same settlements, so two copies
of a project folder that are merged as a union of files agree with each other.
"""

from __future__ import annotations

import re
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from fractions import Fraction
from typing import Literal

from relook.errors import RelookError

#: What an adjudicator can say of an item: a label, that none can be given, or that an earlier
#: decision of theirs is taken back.
Ruling = Literal["label", "cannot be coded", "withdraw"]
State = Literal["settled", "cannot be coded", "split", "unconfirmed", "open"]

#: The adjudicator id whose ruling ends every split.
LEAD = "lead"

_NUMBER = re.compile(r"[+-]?(\d+(\.\d*)?|\.\d+)([eE][+-]?\d{1,3})?", re.ASCII)


@dataclass(frozen=True, slots=True, kw_only=True)
class Decision:
    """One ruling by one adjudicator on one variable of one item.

    Attributes
    ----------
    item, variable : str
    adjudicator : str
        Id, never a name.
    ruling : {"label", "cannot be coded", "withdraw"}
    label : str or None
        The label given; None unless `ruling` is "label".
    reason, note : str
        As chosen and written; empty where nothing was said.
    round : int
    kind : str
        Why the item was sent: disputed, audit, split, recheck; "rulings" for rulings made
        elsewhere.
    order : tuple of str
        Sorts decisions of one adjudicator on one item and variable; the last one stands.
    id : str
        Names the decision in the record.
    """

    item: str
    variable: str
    adjudicator: str
    ruling: Ruling
    label: str | None = None
    reason: str = ""
    note: str = ""
    round: int = 0
    kind: str = ""
    order: tuple[str, ...] = ()
    id: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class Settlement:
    """What the standing decisions on one variable of one item amount to.

    Attributes
    ----------
    state : {"settled", "cannot be coded", "split", "unconfirmed", "open"}
        "split" where adjudicators differ and neither more of them nor the lead decide it.
        "unconfirmed" where one adjudicator alone rules against coders who all agree: the coders'
        label stands until a second adjudicator rules the same way, because at a low rate of errors
        most such rulings are slips of the adjudicator. "open" where every decision was withdrawn.
    label : str or None
        The label where settled.
    standing : tuple of Decision
        The last decision of each adjudicator, withdrawn ones left out, by adjudicator.
    number : Fraction or None
        Where settled with a number: the exact number, the mean where rulings lie within the
        tolerance.
    proposed : str or None
        Where unconfirmed: the label that waits for a second adjudicator, None for
        "cannot be coded".
    supporters : tuple of str
        The adjudicators whose standing decisions carry the settlement, in order.
    """

    item: str
    variable: str
    state: State
    label: str | None
    standing: tuple[Decision, ...]
    number: Fraction | None = None
    proposed: str | None = None
    supporters: tuple[str, ...] = ()


def standing_decisions(decisions: Iterable[Decision]) -> dict[tuple[str, str], list[Decision]]:
    """Return the last decision of each adjudicator by (item, variable), withdrawn ones left out."""
    last: dict[tuple[str, str, str], Decision] = {}
    for decision in decisions:
        key = (decision.item, decision.variable, decision.adjudicator)
        held = last.get(key)
        if held is None or _rank(decision) > _rank(held):
            last[key] = decision
    by_item: dict[tuple[str, str], list[Decision]] = {}
    for (item, variable, _), decision in sorted(last.items(), key=lambda pair: pair[0]):
        kept = by_item.setdefault((item, variable), [])
        if decision.ruling != "withdraw":
            kept.append(decision)
    return by_item


def fold(
    decisions: Iterable[Decision],
    *,
    tolerances: Mapping[str, Fraction] | None = None,
    unanimous: Mapping[tuple[str, str], str] | None = None,
    lead: str = LEAD,
) -> dict[tuple[str, str], Settlement]:
    """Work out what all decisions amount to, whatever the order they are given in.

    Parameters
    ----------
    decisions : iterable of Decision
        The whole record; a decision that occurs twice counts once.
    tolerances : mapping of variable to Fraction, optional
        The variables whose labels are numbers, each with the difference up to which two rulings
        agree (0: only equal numbers, however they are written). Labels of the others are compared
        as text.
    unanimous : mapping of (item, variable) to label, optional
        The label on which all coders of an item agree, where they do: a ruling against it needs a
        second adjudicator; one that says the same needs none.
    lead : str
        The adjudicator whose ruling settles whatever the others ruled, and confirms alone.

    Returns
    -------
    dict of (item, variable) to Settlement
        In the order of item and variable.

    Raises
    ------
    RelookError
        A label of a variable of numbers is no number.

    Notes
    -----
    Standing is the last decision of each adjudicator. All of them agree: settled. Rulings within
    the tolerance agree on their mean. They differ: settled where two or more agree and every other
    ruling has fewer behind it, or where the lead ruled; otherwise split.
    """
    tolerances = {} if tolerances is None else tolerances
    unanimous = {} if unanimous is None else unanimous
    return {
        key: _settle(key, tuple(standing), tolerances.get(key[1]), unanimous.get(key), lead)
        for key, standing in standing_decisions(decisions).items()
    }


def number_of(label: str) -> Fraction:
    """Return the exact number that a label's text stands for.

    Raises
    ------
    RelookError
        It is no number.
    """
    text = label.strip()
    # Without the limit on the exponent a short text could ask for gigabytes of digits.
    if not _NUMBER.fullmatch(text):
        raise RelookError(
            f'"{label}" is no number',
            mend="decide a number, with a point before the decimals",
        )
    return Fraction(text)


def number_text(number: Fraction) -> str:
    """Return a number as text: exactly where its decimals end, else to 12 significant digits."""
    if number.denominator == 1:
        return str(number.numerator)
    rest = number.denominator
    for prime in (2, 5):
        while rest % prime == 0:
            rest //= prime
    if rest != 1 or number.denominator > 10**12:
        return f"{float(number):.12g}"
    places = 1
    while (number * 10**places).denominator != 1:
        places += 1
    digits = str(abs(int(number * 10**places))).rjust(places + 1, "0")
    return f"{'-' if number < 0 else ''}{digits[:-places]}.{digits[-places:]}"


def _rank(decision: Decision) -> tuple[tuple[str, ...], str, int, str, bool, str, str, str, str]:
    """Sorts decisions of one adjudicator; every field counts, so that no two that differ tie."""
    return (
        decision.order,
        decision.id,
        decision.round,
        decision.ruling,
        decision.label is not None,
        decision.label or "",
        decision.reason,
        decision.note,
        decision.kind,
    )


@dataclass(frozen=True, slots=True)
class _Camp:
    """Standing decisions that agree with each other; `label` is None for "cannot be coded"."""

    members: tuple[Decision, ...]
    label: str | None
    number: Fraction | None = None


def _settle(
    key: tuple[str, str],
    standing: tuple[Decision, ...],
    tolerance: Fraction | None,
    unanimous: str | None,
    lead: str,
) -> Settlement:
    item, variable = key
    if not standing:
        return Settlement(item=item, variable=variable, state="open", label=None, standing=())
    by_lead = tuple(decision for decision in standing if decision.adjudicator == lead)
    camp = _leading_camp(_camps(by_lead or standing, tolerance))
    if camp is None:
        return Settlement(
            item=item, variable=variable, state="split", label=None, standing=standing
        )
    supporters = tuple(decision.adjudicator for decision in camp.members)
    alone = len(supporters) < 2 and not by_lead
    state: State = "settled" if camp.label is not None else "cannot be coded"
    if alone and unanimous is not None and not _says(camp, unanimous, tolerance):
        state = "unconfirmed"
    return Settlement(
        item=item,
        variable=variable,
        state=state,
        label=camp.label if state == "settled" else None,
        standing=standing,
        number=camp.number if state == "settled" else None,
        proposed=camp.label if state == "unconfirmed" else None,
        supporters=supporters,
    )


def _camps(standing: Sequence[Decision], tolerance: Fraction | None) -> list[_Camp]:
    """Group decisions that agree. Numbers may stand in several camps, where windows overlap."""
    by_label: dict[str | None, list[Decision]] = {}
    for decision in standing:
        by_label.setdefault(decision.label if decision.ruling == "label" else None, []).append(
            decision
        )
    if tolerance is None:
        return [_Camp(tuple(members), label) for label, members in by_label.items()]
    camps = [_Camp(tuple(by_label.pop(None)), None)] if None in by_label else []
    numbered = sorted(
        ((number_of(label), decision) for label, kept in by_label.items() if label is not None
         for decision in kept),
        key=lambda pair: (pair[0], pair[1].adjudicator),
    )  # fmt: skip
    reached = 0
    for begin, (low, _) in enumerate(numbered):
        end = begin
        while end < len(numbered) and numbered[end][0] - low <= tolerance:
            end += 1
        if end > reached:  # else the window lies inside the one before
            camps.append(_numbers_camp(numbered[begin:end]))
            reached = end
    return camps


def _numbers_camp(numbered: Sequence[tuple[Fraction, Decision]]) -> _Camp:
    """Rulings within the tolerance, settled with their mean."""
    members = tuple(sorted((kept for _, kept in numbered), key=lambda kept: kept.adjudicator))
    texts = {kept.label for kept in members}
    mean = sum((number for number, _ in numbered), Fraction(0)) / len(numbered)
    # One text is kept as it was written: "2.0" stays "2.0".
    label = texts.pop() if len(texts) == 1 else number_text(mean)
    return _Camp(members, label, mean)


def _leading_camp(camps: Sequence[_Camp]) -> _Camp | None:
    """The only camp, or the one of two or more with more members than any other."""
    if len(camps) == 1:
        return camps[0]
    ranked = sorted(camps, key=lambda camp: len(camp.members), reverse=True)
    first, second = len(ranked[0].members), len(ranked[1].members)
    return ranked[0] if first >= 2 and first > second else None


def _says(camp: _Camp, unanimous: str, tolerance: Fraction | None) -> bool:
    """Whether a ruling says what the coders said."""
    if camp.label is None or tolerance is None or camp.number is None:
        return camp.label == unanimous
    return abs(camp.number - number_of(unanimous)) <= tolerance
