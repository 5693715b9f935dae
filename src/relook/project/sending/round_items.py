"""The items of a round, by the reason for which they are sent."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import replace

import numpy as np

from relook.core.agreement import Agreement
from relook.core.audit import STRATA, AuditDraw, allocate, draw_audit, stratify
from relook.core.exact import BoolArray
from relook.project.archive.history import History
from relook.project.archive.rounds import RoundStratum
from relook.project.figures.consensus_texts import consensus_for
from relook.project.figures.ordering import Ordering
from relook.project.sending.sheets import coders_of_item
from relook.project.setup.loading import Loaded
from relook.worksheet.plan import PlanItem, RowKind


def left_out_items(loaded: Loaded, history: History, *, again: bool) -> dict[str, BoolArray]:
    """By variable: items that are settled or still out there."""
    left = {name: np.zeros(len(loaded.labels.items), dtype=bool) for name in loaded.agreements}
    if again:
        return left
    busy = history.closed | history.out | set(history.settled)
    for name, mask in left.items():
        own = [item for item, variable in busy if variable == name]
        numbers = loaded.item_numbers(own)
        mask[numbers[numbers >= 0]] = True
    return left


def disputed_items(loaded: Loaded, ordering: Ordering) -> list[PlanItem]:
    """The head of the ranking, each item with the variables it is sent for."""
    ranking = ordering.ranking
    found = []
    for place, item in enumerate(ordering.selection.item_index.tolist()):
        rows = ranking.row_variable[ranking.row_start[place] : ranking.row_start[place + 1]]
        variables = tuple(ranking.variables[position] for position in rows)
        found.append(_plan_item(loaded, item, variables, "disputed"))
    return found


def _plan_item(
    loaded: Loaded, item: int, variables: tuple[str, ...], kind: RowKind, stratum: str = ""
) -> PlanItem:
    return PlanItem(
        item=str(loaded.labels.items[item]),
        variables=variables,
        kind=kind,
        stratum=stratum,
        coders=tuple(sorted(coders_of_item(loaded, item))),
    )


def single_items(loaded: Loaded, left_out: dict[str, BoolArray], taken: set[str]) -> list[PlanItem]:
    """Items with a single label, which nothing else can compare."""
    found = []
    for name, agreement in loaded.agreements.items():
        single = np.append(agreement.profiles.size == 1, False)[agreement.profile_of_item]
        found += [
            _plan_item(loaded, item, (name,), "disputed", "single")
            for item in np.flatnonzero(single & ~left_out[name]).tolist()
            if str(loaded.labels.items[item]) not in taken
        ]
    return found


def second_opinions(loaded: Loaded, history: History) -> list[PlanItem]:
    """Splits, and rulings against unanimous coders, for somebody who has not ruled on them."""
    waiting = history.waiting_for_second()
    found = []
    for (item, variable), held in history.settled.items():
        if held.state not in ("split", "unconfirmed") or (item, variable) in waiting:
            continue
        number = int(loaded.item_numbers([item])[0])
        if number < 0 or variable not in loaded.agreements:
            continue
        found.append(
            PlanItem(
                item=item,
                variables=(variable,),
                kind="split" if held.state == "split" else "recheck",
                coders=tuple(sorted(coders_of_item(loaded, number))),
                barred=tuple(sorted({decision.adjudicator for decision in held.standing})),
            )
        )
    return found


def audit_draws(
    loaded: Loaded,
    seed: int,
    n_audit: int,
    left_out: Mapping[str, BoolArray],
    sent: Mapping[str, BoolArray],
) -> list[tuple[str, AuditDraw]]:
    """Draw from each variable's items that are neither left out nor sent anyway; nothing for 0."""
    if n_audit == 0:
        return []
    strata_of = {
        name: stratify(agreement, left_out[name] | sent[name])
        for name, agreement in loaded.agreements.items()
    }
    sizes = np.array([int((stratum >= 0).sum()) for stratum in strata_of.values()])
    shares = allocate(sizes, n_audit)
    hashes = loaded.item_hashes(seed)
    return [
        (
            name,
            draw_audit(
                stratum,
                int(shares[position]),
                np.random.default_rng([seed, position]),
                item_hash=hashes,
                tied=_tied(loaded.agreements[name]),
            ),
        )
        for position, (name, stratum) in enumerate(strata_of.items())
    ]


def _tied(agreement: Agreement) -> BoolArray:
    """Items whose labels tie; those without labels do not."""
    tied = np.append(consensus_for(agreement).tie, False)
    return np.asarray(tied[agreement.profile_of_item], dtype=bool)


def audit_items(
    loaded: Loaded,
    seed: int,
    n_audit: int,
    left_out: dict[str, BoolArray],
    queued: Sequence[PlanItem],
) -> tuple[list[PlanItem], tuple[RoundStratum, ...]]:
    """Draw audit items from everything that would be released without a decision.

    With several variables the draws are shared out in proportion to what each would release.
    """
    sent = {name: np.zeros(len(loaded.labels.items), dtype=bool) for name in loaded.agreements}
    for name, mask in sent.items():
        numbers = loaded.item_numbers([held.item for held in queued if name in held.variables])
        mask[numbers[numbers >= 0]] = True
    items: list[PlanItem] = []
    strata: list[RoundStratum] = []
    for name, draw in audit_draws(loaded, seed, n_audit, left_out, sent):
        items += [
            _plan_item(loaded, item, (name,), "audit", STRATA[at])
            for item, at in zip(draw.item_index.tolist(), draw.stratum.tolist(), strict=True)
        ]
        strata += [
            RoundStratum(
                variable=name,
                stratum=kind,
                n_items=draw.sizes[kind],
                n_drawn=draw.drawn[kind],
                n_tied=draw.tied[kind],
                n_drawn_tied=draw.drawn_tied[kind],
            )
            for kind in STRATA
        ]
    return items, tuple(strata)


def open_rows(loaded: Loaded, history: History, adjudicator: str) -> list[PlanItem]:
    """The rows that were sent to somebody, need a decision still, and have none of theirs."""
    ruled: dict[tuple[str, str], set[str]] = {}
    for key, held in history.settled.items():
        ruled[key] = {decision.adjudicator for decision in held.standing}
    found: dict[tuple[str, str], PlanItem] = {}
    for held_round in history.rounds:
        for row in held_round.rows:
            key = (row.item, row.variable)
            done = key in history.closed or adjudicator in ruled.get(key, set())
            number = int(loaded.item_numbers([row.item])[0])
            if row.adjudicator != adjudicator or done or number < 0:
                continue
            planned = _plan_item(loaded, number, (row.variable,), _kind(row.kind), row.stratum)
            found[key] = replace(planned, barred=tuple(sorted(ruled.get(key, set()))))
    return list(found.values())


def _kind(kind: str) -> RowKind:
    """A row's kind as its round wrote it; rounds only ever write these four."""
    kinds: tuple[RowKind, ...] = ("disputed", "audit", "split", "recheck")
    return next((each for each in kinds if each == kind), "disputed")
