"""Planning a round: which rows go to whom, and why. Nothing is written here.

Ranked for selection, shuffled for presentation: the ranking decides which items are sent, and
leaves no trace in what an adjudicator sees.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from relook.core.audit import estimate
from relook.core.decisions import LEAD
from relook.errors import ExitCode, RelookError, listed, nearest
from relook.project.archive.history import History
from relook.project.archive.rounds import RoundStratum, stratum_of
from relook.project.figures.ordering import Ordering, order_items, overlap_of
from relook.project.sending.round_items import (
    audit_items,
    disputed_items,
    left_out_items,
    open_rows,
    second_opinions,
    single_items,
)
from relook.project.setup.loading import Loaded
from relook.project.setup.people import adjudicators_of
from relook.project.setup.settings import QueueSettings
from relook.worksheet.plan import Adjudicator, Plan, PlanItem, plan_worksheets

#: What a worksheet for a panel is called, where adjudicators would be named.
PANEL = "panel"


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
    reissue : str or None
        Send the open rows of this adjudicator once more, and nothing else.
    reissue_to : str or None
        To whom instead; None: to the same person.
    """

    queue: QueueSettings
    seed: int
    audit: int | None = None
    following: bool = False
    again: bool = False
    splits_only: bool = False
    reissue: str | None = None
    reissue_to: str | None = None


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

    @property
    def limit_if_all_upheld(self) -> float | None:
        """The upper limit of what a clean audit says, of the worst variable; None without one.

        It is what `rescore` will show if no audit item is ruled otherwise: the limit weighs the
        strata by their sizes, and so is wider than that of one sample of as many items. Items
        whose labels tie are left out, since they are released blank.
        """
        limits = [
            estimate(
                {stratum_of(each.stratum): each.n_items - each.n_tied for each in strata},
                {stratum_of(each.stratum): each.n_drawn - each.n_drawn_tied for each in strata},
                {},
            ).high
            for strata in (
                [each for each in self.strata if each.variable == name]
                for name in dict.fromkeys(each.variable for each in self.strata)
            )
        ]
        return max((limit for limit in limits if limit is not None), default=None)


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
    if request.reissue is not None:
        return _reissued(loaded, request, history, secret, number)
    if history.last_is_unanswered and not request.following:
        raise RelookError(
            f"nothing of round {number - 1} is back yet",
            mend="collect its worksheets first, or add --next to send another round all the same",
        )
    left_out = left_out_items(loaded, history, again=request.again)
    n_audit = n_audit_of(request, history)
    overlap = overlap_of(settings)
    ordering = order_items(
        loaded,
        request.queue,
        seed=request.seed,
        leave_out=left_out,
        n_audit_items=n_audit,
        overlap=overlap,
    )
    items = second_opinions(loaded, history)
    strata: tuple[RoundStratum, ...] = ()
    n_drawn = 0
    if not request.splits_only:
        disputed = disputed_items(loaded, ordering)
        if request.queue.include_single:
            disputed += single_items(loaded, left_out, {item.item for item in disputed})
        if not disputed and not items:
            raise _nothing_to_queue(loaded, history)
        items += disputed
        audits, strata = audit_items(loaded, request.seed, n_audit, left_out, items)
        n_drawn = len({item.item for item in audits})
        items += audits
    else:
        ordering, overlap = _nothing_ranked(loaded, request), 0.0
    if not items:
        raise RelookError(
            "there is no split and no contradicted unanimous item",
            mend="run `relook queue` without --splits for the next items",
            exit_code=ExitCode.FALLS_SHORT,
        )
    plan = _dealt(loaded, items, adjudicators_of(loaded.project, secret), secret, number, overlap)
    return PlannedRound(
        number=number,
        ordering=ordering,
        items=tuple(items),
        plan=plan,
        strata=strata,
        n_audit_items=n_drawn,
    )


def _dealt(
    loaded: Loaded,
    items: Sequence[PlanItem],
    adjudicators: Sequence[Adjudicator],
    secret: bytes,
    number: int,
    overlap: float,
) -> Plan:
    """Deal items out; second opinions that no adjudicator is left for go to the lead's panel."""
    most = loaded.project.settings.worksheet.rows_per_sheet
    panel = [item for item in items if _needs_panel(item, adjudicators)]
    others = [item for item in items if item not in panel]
    plan = plan_worksheets(
        others,
        adjudicators,
        secret=secret,
        round_number=number,
        overlap=overlap,
        size_limit=most,
    )
    if not panel:
        return plan
    # The lead may have labelled or ruled before; a panel decides in the open.
    of_panel = plan_worksheets(
        [replace(item, barred=(), coders=()) for item in panel],
        [Adjudicator(id=LEAD, name=PANEL)],
        secret=secret,
        round_number=number,
        size_limit=most,
    )
    said = f"{len(panel):,} rows go to a panel that you lead: no adjudicator is left for them"
    return replace(
        plan, worksheets=(*plan.worksheets, *of_panel.worksheets), said=(*plan.said, said)
    )


def _needs_panel(item: PlanItem, adjudicators: Sequence[Adjudicator]) -> bool:
    return item.kind in ("split", "recheck") and all(
        each.id in item.barred or (each.coder is not None and each.coder in item.coders)
        for each in adjudicators
    )


def _reissued(
    loaded: Loaded, request: QueueRequest, history: History, secret: bytes, number: int
) -> PlannedRound:
    """Plan the open rows of one adjudicator anew, for the same person or for another."""
    people = {held.name: held for held in adjudicators_of(loaded.project, secret)}
    giver = _person(people, str(request.reissue))
    taker = _person(people, request.reissue_to or str(request.reissue))
    items = open_rows(loaded, history, giver.id)
    if not items:
        raise RelookError(
            f"{giver.name} has no open row",
            mend="see `relook status` for who has what",
            exit_code=ExitCode.FALLS_SHORT,
        )
    plan = plan_worksheets(
        items,
        [taker],
        secret=secret,
        round_number=number,
        size_limit=loaded.project.settings.worksheet.rows_per_sheet,
    )
    return PlannedRound(
        number=number,
        ordering=_nothing_ranked(loaded, request),
        items=tuple(items),
        plan=plan,
        strata=(),
        n_audit_items=0,
    )


def _nothing_ranked(loaded: Loaded, request: QueueRequest) -> Ordering:
    """The ordering of a round for which no disputed item is selected."""
    every = {name: np.ones(len(loaded.labels.items), dtype=bool) for name in loaded.agreements}
    return order_items(loaded, request.queue, seed=request.seed, leave_out=every)


def _person(people: dict[str, Adjudicator], name: str) -> Adjudicator:
    if name in people:
        return people[name]
    close = nearest(name, people)
    raise RelookError(
        f'no adjudicator "{name}"',
        mend=f'did you mean "{close}"?' if close else f"the adjudicators are {listed(people)}",
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


def n_audit_of(request: QueueRequest, history: History) -> int:
    """Return how many audit items a round draws: in later rounds only what is asked for."""
    if request.splits_only:
        return 0
    if request.audit is not None:
        return request.audit
    return 0 if history.rounds else request.queue.audit
