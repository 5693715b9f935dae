"""The final label of every item and variable, and how it was settled.

Decisions come first; where there is none the coders' consensus label stands, by level of
measurement. Nothing is chosen in silence: ties and splits are blank unless a rule is asked for, and
a rule that was used is named beside the label.
"""

from __future__ import annotations

import hashlib
import hmac
from collections import Counter
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from typing import Literal, get_args

import numpy as np

from relook.core.agreement import Agreement
from relook.core.consensus import Consensus
from relook.core.decisions import Settlement
from relook.project.figures.consensus_texts import consensus_for, consensus_text
from relook.project.outcome.corrected import as_written
from relook.project.setup.loading import Loaded
from relook.tables.labels import VariableLabels
from relook.worksheet.model import CANNOT_BE_CODED

SettledBy = Literal[
    "unanimous",
    "consensus",
    "decision",
    "cannot be coded",
    "split",
    "tie",
    "single",
    "unconfirmed",
    "no label",
]
SETTLED_BY: tuple[SettledBy, ...] = get_args(SettledBy)
TiesRule = Literal["blank", "most-used", "random"]
TIES_RULES: tuple[TiesRule, ...] = get_args(TiesRule)


@dataclass(frozen=True, slots=True, kw_only=True)
class FinalLabel:
    """The final label of one variable of one item.

    Attributes
    ----------
    item, variable : str
    label : str
        "" where blank.
    settled_by : str
        One of `SETTLED_BY`. "unconfirmed": a ruling against unanimous coders waits for a second
        adjudicator, so the coders' label is released.
    support, n_labels : int
        Coders' labels that equal the final label, of all labels of the item.
    n_supporters, n_rulings : int
        Adjudicators whose ruling it is, of all who ruled.
    round : int or None
        Of the latest of the rulings that carry it.
    reason : str
        As the adjudicators gave it, several parted by "; ".
    adjudicators : tuple of str
        Ids of those who ruled.
    candidates : tuple of str
        The tied labels, the rulings of a split, or the ruling that waits for confirmation.
    rule : str
        The rule that chose among candidates; "" where none was needed.
    """

    item: str
    variable: str
    label: str
    settled_by: SettledBy
    support: int
    n_labels: int
    n_supporters: int = 0
    n_rulings: int = 0
    round: int | None = None
    reason: str = ""
    adjudicators: tuple[str, ...] = ()
    candidates: tuple[str, ...] = ()
    rule: str = ""


def final_labels(
    loaded: Loaded,
    settled: Mapping[tuple[str, str], Settlement],
    *,
    ties: TiesRule = "blank",
    key: bytes = b"",
) -> list[FinalLabel]:
    """Return the final labels, by item in the order of the label table, then by variable.

    Parameters
    ----------
    loaded : Loaded
    settled : mapping of (item, variable) to Settlement
    ties : {"blank", "most-used", "random"}
        most-used: the candidate that coders used most over all items, then the first in the order
        of the labels. random: by a keyed hash of the item.
    key : bytes
        Keys the random rule.
    """
    by_variable = [
        _of_variable(loaded, name, settled, ties=ties, key=key) for name in loaded.agreements
    ]
    return [label for of_item in zip(*by_variable, strict=True) for label in of_item]


def counts_of(labels: Sequence[FinalLabel], variable: str | None = None) -> dict[str, int]:
    """Return how many labels were settled how; every way is named, those with none too."""
    counts = Counter(
        each.settled_by for each in labels if variable is None or each.variable == variable
    )
    return {name: counts[name] for name in SETTLED_BY}


def _of_variable(
    loaded: Loaded,
    name: str,
    settled: Mapping[tuple[str, str], Settlement],
    *,
    ties: TiesRule,
    key: bytes,
) -> list[FinalLabel]:
    agreement, held = loaded.agreements[name], loaded.labels.variables[name]
    consensus = consensus_for(agreement)
    labels = agreement.labels
    used = np.bincount(labels.value_index, minlength=labels.n_values).tolist()
    standing = {text: (-n, at) for at, (text, n) in enumerate(zip(held.texts, used, strict=True))}
    coders: dict[int, _Coders] = {}
    found = []
    for item, profile in zip(
        loaded.labels.items.tolist(), agreement.profile_of_item.tolist(), strict=True
    ):
        said = coders.get(profile)
        if said is None:
            said = coders[profile] = _coders(held, agreement, consensus, profile)
        label = _final(str(item), held, said, settled.get((item, name)))
        if ties != "blank" and label.candidates and not label.label:
            label = _by_rule(label, said, ties, standing, key)
        found.append(label)
    return found


@dataclass(frozen=True, slots=True)
class _Coders:
    """What the coders of an item say together: how often each label, and their consensus."""

    counts: Mapping[str, int]
    consensus: str
    tied: tuple[str, ...]

    @property
    def n(self) -> int:
        return sum(self.counts.values())

    @property
    def settled_by(self) -> SettledBy:
        if self.n < 2:
            return "single" if self.n else "no label"
        if self.tied:
            return "tie"
        return "unanimous" if len(self.counts) == 1 else "consensus"


def _coders(
    held: VariableLabels, agreement: Agreement, consensus: Consensus, profile: int
) -> _Coders:
    if profile < 0:
        return _Coders({}, "", ())
    profiles = agreement.profiles
    entries = slice(int(profiles.start[profile]), int(profiles.start[profile + 1]))
    counts = {
        held.texts[value]: int(n)
        for value, n in zip(profiles.value_index[entries], profiles.count[entries], strict=True)
    }
    text, tied = consensus_text(held, consensus, profile)
    return _Coders(counts, as_written(held, text or ""), tied)


def _final(
    item: str, held: VariableLabels, said: _Coders, settlement: Settlement | None
) -> FinalLabel:
    plain = FinalLabel(
        item=item,
        variable=held.variable.name,
        label=said.consensus,
        settled_by=said.settled_by,
        support=said.counts.get(said.consensus, 0),
        n_labels=said.n,
        candidates=said.tied,
    )
    if settlement is None or not settlement.standing:
        return plain
    rulings = settlement.standing
    carrying = [each for each in rulings if each.adjudicator in settlement.supporters] or rulings
    ruled = replace(
        plain,
        n_supporters=len(settlement.supporters),
        n_rulings=len(rulings),
        round=max(each.round for each in carrying) or None,
        reason="; ".join(dict.fromkeys(each.reason for each in carrying if each.reason)),
        adjudicators=tuple(each.adjudicator for each in rulings),
    )
    if settlement.state == "unconfirmed":
        waiting = as_written(held, settlement.proposed or CANNOT_BE_CODED)
        return replace(ruled, settled_by="unconfirmed", candidates=(waiting,))
    if settlement.state == "split":
        rulings_by_label = dict.fromkeys(
            as_written(held, each.label or CANNOT_BE_CODED) for each in rulings
        )
        return replace(
            ruled, label="", settled_by="split", support=0, candidates=tuple(rulings_by_label)
        )
    label = as_written(held, settlement.label or "")
    return replace(
        ruled,
        label=label,
        settled_by="decision" if settlement.label is not None else "cannot be coded",
        support=said.counts.get(label, 0) if label else 0,
        candidates=(),
    )


def _by_rule(
    label: FinalLabel,
    said: _Coders,
    ties: TiesRule,
    standing: Mapping[str, tuple[int, int]],
    key: bytes,
) -> FinalLabel:
    """Choose among candidates that are labels; "cannot be coded" is none."""
    among = [each for each in label.candidates if each != CANNOT_BE_CODED]
    if not among:
        return label
    ranked = sorted(among, key=lambda text: (standing.get(text, (0, len(standing))), text))
    chosen = ranked[0]
    if ties == "random":
        about = f"{label.variable}\x1f{label.item}".encode("utf-8", errors="surrogatepass")
        drawn = int.from_bytes(hmac.new(key, about, hashlib.sha256).digest()[:8], "big")
        chosen = ranked[drawn % len(ranked)]
    return replace(label, label=chosen, support=said.counts.get(chosen, 0), rule=ties)
