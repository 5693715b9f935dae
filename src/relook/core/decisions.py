"""Decisions of adjudicators, and what they amount to: a pure function of the record.

The record is a set of decisions. Folding it in any order gives the same settlements, so two copies
of a project folder that are merged as a union of files agree with each other.
"""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass
from typing import Literal

#: What an adjudicator can say of an item: a label, that none can be given, or that an earlier
#: decision of theirs is taken back.
Ruling = Literal["label", "cannot be coded", "withdraw"]
State = Literal["settled", "cannot be coded", "split", "open"]


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
        Why the item was sent: disputed, audit, split, recheck; "rulings" for rulings made elsewhere.
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
    state : {"settled", "cannot be coded", "split", "open"}
        "open" where every decision was withdrawn.
    label : str or None
        The label where settled.
    standing : tuple of Decision
        The last decision of each adjudicator, withdrawn ones left out, by adjudicator.
    """

    item: str
    variable: str
    state: State
    label: str | None
    standing: tuple[Decision, ...]


def standing_decisions(decisions: Iterable[Decision]) -> dict[tuple[str, str], list[Decision]]:
    """Return the last decision of each adjudicator by (item, variable), withdrawn ones left out."""
    last: dict[tuple[str, str, str], Decision] = {}
    for decision in decisions:
        key = (decision.item, decision.variable, decision.adjudicator)
        held = last.get(key)
        if held is None or (decision.order, decision.id) > (held.order, held.id):
            last[key] = decision
    by_item: dict[tuple[str, str], list[Decision]] = {}
    for (item, variable, _), decision in sorted(last.items()):
        kept = by_item.setdefault((item, variable), [])
        if decision.ruling != "withdraw":
            kept.append(decision)
    return by_item
