"""What the random audit found: how much of what nobody rules on would be ruled otherwise.

The strata are those of the draw, with the sizes that the round recorded. Where several rounds drew
audit items the latest with a ruling speaks; earlier draws came from other strata and are given
apart.

The share is of items that would be released with a label. Items whose labels tie are released
blank unless a rule for ties is asked for: without one they are left out of both sides, since a
blank cannot be ruled otherwise; with one they are judged by the label that the rule gives them.
"""

from __future__ import annotations

from collections import Counter
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from fractions import Fraction

from relook.core.audit import AuditResult, Stratum, estimate
from relook.core.decisions import Settlement, number_of
from relook.core.proportions import weighted_interval
from relook.project.archive.decidable import takes_numbers
from relook.project.archive.rounds import Round, RoundRow, stratum_of
from relook.project.figures.consensus_texts import consensus_for, consensus_text
from relook.project.setup.loading import Loaded
from relook.tables.numbers import parse_number

CONFIDENCE_LEVEL = 0.95


@dataclass(frozen=True, slots=True, kw_only=True)
class AuditFindings:
    """What one round's audit found on one variable.

    Attributes
    ----------
    variable : str
    round : int
        The round that drew the items.
    n_drawn : int
        Audit items sent.
    n_unresolved : int
        Ruled otherwise by one adjudicator against another, or against unanimous coders with nobody
        to confirm it yet. They count as ruled otherwise.
    n_ties : int
        Ruled items whose labels tie. They count only where a rule gives them a label.
    n_left_out : int
        Items that would be released without a decision and blank: not in `result`.
    result : AuditResult
    """

    variable: str
    round: int
    n_drawn: int
    n_unresolved: int
    n_ties: int
    n_left_out: int
    result: AuditResult


@dataclass(frozen=True, slots=True, kw_only=True)
class PooledAudit:
    """Σ W_h p_h over the strata of several variables.

    Attributes
    ----------
    share_ruled_otherwise, low, high : float or None
    undefined_because : str or None
    """

    share_ruled_otherwise: float | None
    low: float | None
    high: float | None
    undefined_because: str | None


def audited_items(rounds: Sequence[Round], variable: str) -> frozenset[str]:
    """Return the items of a variable that were first sent as audit items."""
    first: dict[str, str] = {}
    for held in rounds:
        for row in held.rows:
            if row.variable == variable:
                first.setdefault(row.item, row.kind)
    return frozenset(item for item, kind in first.items() if kind == "audit")


def audits_of(
    loaded: Loaded,
    name: str,
    rounds: Sequence[Round],
    settled: Mapping[tuple[str, str], Settlement],
    label_of_tie: Mapping[str, str] | None = None,
) -> tuple[AuditFindings, ...]:
    """Work out what each round's audit found on one variable, latest first.

    Parameters
    ----------
    loaded : Loaded
    name : str
    rounds : sequence of Round
    settled : mapping of (item, variable) to Settlement
    label_of_tie : mapping of str to str, optional
        The label that a rule gives each item whose labels tie; None: they are released blank.

    Returns
    -------
    tuple of AuditFindings
        Of the rounds that drew audit items of this variable; those without any ruling come last.
    """
    found = [
        _audit(loaded, name, held, settled, label_of_tie)
        for held in rounds
        if any(each.variable == name and each.n_drawn for each in held.strata)
    ]
    ruled = {id(each): any(part.n_ruled for part in each.result.strata) for each in found}
    return tuple(sorted(found, key=lambda each: (not ruled[id(each)], -each.round)))


def pooled(audits: Sequence[AuditFindings]) -> PooledAudit:
    """Weigh the strata of several variables by their sizes into one share for the release.

    Parameters
    ----------
    audits : sequence of AuditFindings
        One per variable.
    """
    strata = [(each.variable, part) for each in audits for part in each.result.strata]
    if not strata:
        return PooledAudit(
            share_ruled_otherwise=None,
            low=None,
            high=None,
            undefined_because="no audit items were drawn",
        )
    empty = [f"{part.stratum} ({name})" for name, part in strata if not part.n_ruled]
    if empty:
        because = f"no audit item was ruled on among the items that are {' or '.join(empty)}"
        return PooledAudit(
            share_ruled_otherwise=None, low=None, high=None, undefined_because=because
        )
    share, low, high = weighted_interval(
        [part.n_otherwise for _, part in strata],
        [part.n_ruled for _, part in strata],
        [part.n_items for _, part in strata],
        confidence_level=CONFIDENCE_LEVEL,
    )
    return PooledAudit(share_ruled_otherwise=share, low=low, high=high, undefined_because=None)


def _audit(
    loaded: Loaded,
    name: str,
    held: Round,
    settled: Mapping[tuple[str, str], Settlement],
    label_of_tie: Mapping[str, str] | None,
) -> AuditFindings:
    rows: dict[str, RoundRow] = {}
    for row in held.rows:
        if row.variable == name and row.kind == "audit":
            rows.setdefault(row.item, row)
    stands = _released(loaded, name, list(rows))
    ruled: Counter[Stratum] = Counter()
    otherwise: Counter[Stratum] = Counter()
    n_unresolved = n_ties = 0
    for item, row in rows.items():
        settlement = settled.get((item, name))
        if settlement is None or settlement.state == "open" or item not in stands:
            continue
        label = stands[item]
        if label is None:
            n_ties += 1
            if label_of_tie is None:
                continue
            label = _plain(label_of_tie[item], loaded.labels.variables[name].variable.decimal)
        stratum = stratum_of(row.stratum)
        ruled[stratum] += 1
        if is_otherwise(settlement, label, _tolerance(loaded, name)):
            otherwise[stratum] += 1
            n_unresolved += settlement.state in ("split", "unconfirmed")
    strata = [each for each in held.strata if each.variable == name]
    left_out = {each.stratum: each.n_tied if label_of_tie is None else 0 for each in strata}
    sizes = {
        # Labels that changed since the draw may have untied more of the audit items.
        stratum_of(each.stratum): max(
            each.n_items - left_out[each.stratum], ruled[stratum_of(each.stratum)]
        )
        for each in strata
    }
    return AuditFindings(
        variable=name,
        round=held.number,
        n_drawn=len(rows),
        n_unresolved=n_unresolved,
        n_ties=n_ties,
        n_left_out=sum(left_out.values()),
        result=estimate(sizes, ruled, otherwise, confidence_level=CONFIDENCE_LEVEL),
    )


def is_otherwise(held: Settlement, label: str, tolerance: Fraction | None) -> bool:
    """Whether an audit item was ruled otherwise than it would have been released.

    A split, and a ruling against unanimous coders that waits for a second adjudicator, count as
    ruled otherwise until they are resolved: left out they would make the release look better.
    """
    if held.state != "settled":
        return True
    if tolerance is None or held.number is None:
        return held.label != label
    stands = parse_number(label)
    return abs(held.number - (number_of(label) if stands is None else stands)) > tolerance


def _released(loaded: Loaded, name: str, items: Sequence[str]) -> dict[str, str | None]:
    """The consensus label that each item would be released with; None for a tie."""
    agreement, held = loaded.agreements[name], loaded.labels.variables[name]
    consensus = consensus_for(agreement)
    found: dict[str, str | None] = {}
    for item, number in zip(items, loaded.item_numbers(list(items)).tolist(), strict=True):
        profile = int(agreement.profile_of_item[number]) if number >= 0 else -1
        if profile >= 0:
            text, _ = consensus_text(held, consensus, profile)
            found[item] = None if text is None else _plain(text, held.variable.decimal)
    return found


def _plain(text: str, decimal: str) -> str:
    return text if decimal == "." or parse_number(text, decimal) is None else text.replace(",", ".")


def _tolerance(loaded: Loaded, name: str) -> Fraction | None:
    variable = loaded.labels.variables[name].variable
    return variable.tolerance if takes_numbers(variable) else None
