"""Planning a round: which rows go to whom, and why. Nothing is written here.

Ranked for selection, shuffled for presentation: the ranking decides which items are sent, and
leaves no trace in what an adjudicator sees.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field

import numpy as np

from relook.core.audit import STRATA, allocate, draw_audit, stratify
from relook.core.decisions import Settlement
from relook.core.exact import BoolArray, IntArray
from relook.errors import ExitCode, RelookError
from relook.project.loading import Loaded
from relook.project.ordering import Ordering, item_hashes, order_items
from relook.project.people import adjudicators_of
from relook.project.record import Record
from relook.project.rounds import Round, RoundStratum
from relook.project.settings import QueueSettings
from relook.project.sheets import coders_of_item
from relook.worksheet.plan import Plan, PlanItem, plan_worksheets

#: A settlement in one of these states needs nobody's decision any more.
CLOSED = ("settled", "cannot be coded")


@dataclass(frozen=True, slots=True, kw_only=True)
class QueueRequest:
    """What a call of `relook queue` asks for.

    Attributes
    ----------
    queue : QueueSettings
        relook.toml's, with what the command line asked for this once.
    seed : int
    audit : int or None
        Audit items; None: as many as `queue.audit` in the first round, none later.
    following : bool
        Plan a round although nothing of the last one is back.
    again : bool
        Send items again that are settled or still out.
    splits_only : bool
        Send only the items on which adjudicators differ, and contradicted unanimous ones.
    """

    queue: QueueSettings
    seed: int
    audit: int | None = None
    following: bool = False
    again: bool = False
    splits_only: bool = False


@dataclass(frozen=True, slots=True, kw_only=True)
class PlannedRound:
    """A round as planned.

    Attributes
    ----------
    number : int
    ordering : Ordering
        Ranking and selection of the disputed items.
    items : tuple of PlanItem
        Every item that is sent, whatever for.
    plan : Plan
    strata : tuple of RoundStratum
    n_audit_items : int
    """

    number: int
    ordering: Ordering
    items: tuple[PlanItem, ...]
    plan: Plan
    strata: tuple[RoundStratum, ...]
    n_audit_items: int

    @property
    def n_items(self) -> int:
        """Items that are sent to somebody."""
        return len({row.item for sheet in self.plan.worksheets for row in sheet.rows})

    @property
    def n_rows(self) -> int:
        """Rows of all worksheets together, doubled ones twice."""
        return sum(len(sheet.rows) for sheet in self.plan.worksheets)


@dataclass(frozen=True, slots=True)
class History:
    """What was sent and decided before.

    Attributes
    ----------
    rounds : sequence of Round
    record : Record
    settled : dict of (item, variable) to Settlement
    """

    rounds: Sequence[Round] = ()
    record: Record = field(default_factory=Record)
    settled: dict[tuple[str, str], Settlement] = field(default_factory=dict)

    @property
    def closed(self) -> set[tuple[str, str]]:
        """What needs nobody's decision any more."""
        return {key for key, held in self.settled.items() if held.state in CLOSED}

    @property
    def out(self) -> set[tuple[str, str]]:
        """What was sent and has no standing decision yet."""
        ruled = {key for key, held in self.settled.items() if held.state != "open"}
        sent = {(row.item, row.variable) for held in self.rounds for row in held.rows}
        return sent - ruled

    def waiting_for_second(self) -> set[tuple[str, str]]:
        """Splits and rechecks that were sent to somebody who has not ruled yet."""
        ruled = {
            (decision.item, decision.variable, decision.adjudicator)
            for held in self.settled.values()
            for decision in held.standing
        }
        return {
            (row.item, row.variable)
            for held in self.rounds
            for row in held.rows
            if row.kind in ("split", "recheck")
            and (row.item, row.variable, row.adjudicator) not in ruled
        }

    @property
    def last_is_unanswered(self) -> bool:
        """Whether nothing at all of the last round is back."""
        if not self.rounds:
            return False
        last = self.rounds[-1].number
        return all(decision.round != last for decision in self.record.decisions)


def plan_round(
    loaded: Loaded, request: QueueRequest, history: History, secret: bytes
) -> PlannedRound:
    """Select items, draw audits, and deal them out.

    Parameters
    ----------
    loaded : Loaded
    request : QueueRequest
    history : History
    secret : bytes
        Keys every order that an adjudicator sees.

    Raises
    ------
    RelookError
        The last round has nothing back; or nothing is left to send (exit code 1).
    """
    settings = loaded.project.settings
    number = max((held.number for held in history.rounds), default=0) + 1
    if history.last_is_unanswered and not request.following:
        raise RelookError(
            f"nothing of round {number - 1} is back yet",
            mend="collect its worksheets first, or add --next to send another round all the same",
        )
    left_out = _left_out(loaded, history, again=request.again)
    n_audit = _n_audit(request, history)
    # One person cannot be two, so one adjudicator alone makes no overlap.
    overlap = settings.worksheet.overlap if len(settings.worksheet.adjudicators) > 1 else 0.0
    ordering = order_items(
        loaded,
        request.queue,
        seed=request.seed,
        leave_out=left_out,
        n_audit_items=n_audit,
        overlap=overlap,
    )
    items = _second_opinions(loaded, history, secret)
    strata: tuple[RoundStratum, ...] = ()
    n_drawn = 0
    if not request.splits_only:
        disputed = _disputed(loaded, ordering)
        if request.queue.include_single:
            disputed += _singles(loaded, left_out, {item.item for item in disputed})
        if not disputed and not items:
            raise _nothing_to_queue(loaded, history)
        items += disputed
        audits, strata = _audit(loaded, request, n_audit, left_out, items)
        n_drawn = len({item.item for item in audits})
        items += audits
    elif not items:
        raise RelookError(
            "there is no split and no contradicted unanimous item",
            mend="run `relook queue` without --splits for the next items",
            exit_code=ExitCode.FALLS_SHORT,
        )
    plan = plan_worksheets(
        items,
        adjudicators_of(loaded.project, secret),
        secret=secret,
        round_number=number,
        overlap=overlap,
        size_limit=settings.worksheet.rows_per_sheet,
    )
    return PlannedRound(
        number=number,
        ordering=ordering,
        items=tuple(items),
        plan=plan,
        strata=strata,
        n_audit_items=n_drawn,
    )


def _nothing_to_queue(loaded: Loaded, history: History) -> RelookError:
    reasons = {held.undefined_because for held in loaded.agreements.values()} - {None}
    if any(held.n_disputed_items for held in loaded.agreements.values()):
        said = "every disputed item is settled, still out, or has priority 0"
        mend = "collect what is out, or add --again to send items once more"
    elif reasons:
        said = f"nothing to queue: {'; '.join(sorted(str(reason) for reason in reasons))}"
        mend = "queueing needs items on which coders differ; see `relook score`"
    else:
        said = "nothing to queue: no item is disputed"
        mend = "check the labels with `relook score`; there is nothing to settle"
    return RelookError(said, mend=mend, exit_code=ExitCode.FALLS_SHORT)


def _left_out(loaded: Loaded, history: History, *, again: bool) -> dict[str, BoolArray]:
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


def _n_audit(request: QueueRequest, history: History) -> int:
    if request.splits_only:
        return 0
    if request.audit is not None:
        return request.audit
    return 0 if history.rounds else request.queue.audit


def _disputed(loaded: Loaded, ordering: Ordering) -> list[PlanItem]:
    ranking = ordering.ranking
    found = []
    for place, item in enumerate(ordering.selection.item_index.tolist()):
        rows = ranking.row_variable[ranking.row_start[place] : ranking.row_start[place + 1]]
        variables = tuple(ranking.variables[position] for position in rows)
        found.append(_plan_item(loaded, item, variables, "disputed"))
    return found


def _plan_item(
    loaded: Loaded, item: int, variables: tuple[str, ...], kind: str, stratum: str = ""
) -> PlanItem:
    return PlanItem(
        item=str(loaded.labels.items[item]),
        variables=variables,
        kind=kind,  # type: ignore[arg-type]  # the callers pass literals
        stratum=stratum,
        coders=tuple(sorted(coders_of_item(loaded, item))),
    )


def _singles(loaded: Loaded, left_out: dict[str, BoolArray], taken: set[str]) -> list[PlanItem]:
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


def _second_opinions(loaded: Loaded, history: History, secret: bytes) -> list[PlanItem]:
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


def _audit(
    loaded: Loaded,
    request: QueueRequest,
    n_audit: int,
    left_out: dict[str, BoolArray],
    queued: Sequence[PlanItem],
) -> tuple[list[PlanItem], tuple[RoundStratum, ...]]:
    """Draw audit items from everything that would be released without a decision.

    With several variables the draws are shared out in proportion to what each would release.
    """
    if n_audit == 0:
        return [], ()
    strata_of: dict[str, IntArray] = {}
    for name, agreement in loaded.agreements.items():
        sent = np.zeros(len(loaded.labels.items), dtype=bool)
        numbers = loaded.item_numbers([held.item for held in queued if name in held.variables])
        sent[numbers[numbers >= 0]] = True
        strata_of[name] = stratify(agreement, left_out[name] | sent)
    sizes = np.array([int((stratum >= 0).sum()) for stratum in strata_of.values()])
    shares = allocate(sizes, n_audit)
    hashes = item_hashes(loaded, request.seed)
    items: list[PlanItem] = []
    strata: list[RoundStratum] = []
    for position, (name, stratum) in enumerate(strata_of.items()):
        rng = np.random.default_rng([request.seed, position])
        draw = draw_audit(stratum, int(shares[position]), rng, item_hash=hashes)
        items += [
            _plan_item(loaded, item, (name,), "audit", STRATA[at])
            for item, at in zip(draw.item_index.tolist(), draw.stratum.tolist(), strict=True)
        ]
        strata += [
            RoundStratum(
                variable=name, stratum=kind, n_items=draw.sizes[kind], n_drawn=draw.drawn[kind]
            )
            for kind in STRATA
        ]
    return items, tuple(strata)
