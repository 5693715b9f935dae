"""Which items deserve a second look, in which order, and how many of them."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import get_args

import numpy as np

from relook.core.agreement import Agreement
from relook.core.doubt import Doubt, estimate_doubt, no_ground
from relook.core.exact import BoolArray, FloatArray, IntArray
from relook.core.ranking import RankBy, RankedVariable, Ranking, rank_items
from relook.core.selection import Selection, select_head
from relook.core.summed import NOT_AT_HAND, SummedAgreement
from relook.errors import RelookError, listed, nearest
from relook.project.figures.consensus_texts import consensus_for
from relook.project.setup.loading import Loaded, item_texts
from relook.project.setup.settings import QueueSettings, Settings
from relook.tables.numbers import parse_number
from relook.tables.reading import Doing, silently
from relook.tables.schema import Variable

#: The seed where none is given: fixed, so that the same command gives the same result.
DEFAULT_SEED = 1
#: Labels × values above which doubt does not break ties: the time of a step grows with both.
QUICK_DOUBT = 6_000_000
NOT_ASKED = (
    "it takes long with so many labels and values, and was not asked for by --rank-by doubt or "
    "--items"
)
#: What items can be ranked by.
ORDERS: tuple[RankBy, ...] = get_args(RankBy)


@dataclass(frozen=True, slots=True)
class Ordering:
    """A ranking of items and the head of it that is to be sent.

    Attributes
    ----------
    ranking : Ranking
    selection : Selection
    doubts : dict of str to Doubt
        By variable. Orders break their ties by doubt, where there is ground for it and it is not
        too long to estimate for that alone.
    """

    ranking: Ranking
    selection: Selection
    doubts: dict[str, Doubt]


def order_items(
    loaded: Loaded,
    queue: QueueSettings,
    *,
    seed: int,
    with_doubt: bool = False,
    leave_out: Mapping[str, BoolArray] | None = None,
    n_audit_items: int = 0,
    overlap: float = 0.0,
    doing: Doing = silently,
) -> Ordering:
    """Rank the disputed items and take the head that the settings ask for.

    Parameters
    ----------
    loaded : Loaded
    queue : QueueSettings
    seed : int
        Keys the last tie-break, a hash of the item's id.
    with_doubt : bool
        Estimate doubt however long it takes, as for a column of it. The order stays the same.
    leave_out : mapping of str to bool array of shape (n_items,), optional
        By variable: items that are settled or still out there.
    n_audit_items : int
    overlap : float
        Share of the rows that a second adjudicator gets too.
    doing : callable, optional
        Told what is being done, in words for the user.

    Raises
    ------
    RelookError
        An order by doubt that no variable has ground for, with the reason of each.
    """
    by_doubt = queue.rank_by == "doubt"
    doing("estimating doubt")
    doubts = doubts_of(loaded, every=by_doubt or with_doubt)
    if by_doubt:
        _refuse_order_by_doubt(doubts)
    variables = [
        ranked_variable(
            loaded.labels.variables[name].variable,
            agreement,
            doubts[name] if by_doubt or is_quick(agreement) else None,
            None if leave_out is None else leave_out[name],
        )
        for name, agreement in loaded.agreements.items()
    ]
    doing("ranking items")
    priority = priorities(loaded)
    rank_by: RankBy = queue.rank_by
    ranking = rank_items(variables, loaded.item_hashes(seed), rank_by=rank_by, priority=priority)
    selection = select_head(
        ranking,
        top=queue.top,
        share=queue.share,
        hours=queue.hours,
        seconds_per_item=queue.seconds_per_item,
        overlap=overlap,
        n_audit_items=n_audit_items,
    )
    return Ordering(ranking, selection, doubts)


def ranked_variable(
    variable: Variable,
    agreement: Agreement,
    doubt: Doubt | None,
    leave_out: BoolArray | None = None,
) -> RankedVariable:
    """Return a variable as it enters the ranking, with its doubt where there is one."""
    return RankedVariable(
        name=variable.name,
        agreement=agreement,
        weight=variable.weight,
        doubt=None if doubt is None else doubt.for_ranking,
        doubt_within_tie=None if doubt is None else doubt.doubt,
        leave_out=leave_out,
    )


def is_quick(agreement: Agreement) -> bool:
    """Whether doubt is estimated within seconds, so that it may break ties unasked."""
    if isinstance(agreement, SummedAgreement):
        return False
    used = np.count_nonzero(np.bincount(agreement.profiles.value_index))
    return int(used) * agreement.n_labels <= QUICK_DOUBT


def doubts_of(loaded: Loaded, *, every: bool) -> dict[str, Doubt]:
    """Estimate doubt on each variable; `every` and the reasons as in `doubt_of`."""
    return {name: doubt_of(agreement, every=every) for name, agreement in loaded.agreements.items()}


def doubt_of(agreement: Agreement, *, every: bool = False) -> Doubt:
    """Estimate doubt; where there is no ground for it, the result says why.

    Parameters
    ----------
    agreement : Agreement
    every : bool
        However long it takes.
    """
    because = NOT_AT_HAND if isinstance(agreement, SummedAgreement) else no_ground(agreement)
    if because is None and not every and not is_quick(agreement):
        because = NOT_ASKED
    if because is not None:
        return Doubt(None, because, None, None)
    return estimate_doubt(agreement, consensus_for(agreement))


def _refuse_order_by_doubt(doubts: Mapping[str, Doubt]) -> None:
    """Refuse an order by doubt where no variable has any."""
    if any(doubt.doubt is not None for doubt in doubts.values()):
        return
    reasons = "; ".join(
        f"{name}: {doubt.undefined_because}" if len(doubts) > 1 else str(doubt.undefined_because)
        for name, doubt in doubts.items()
    )
    raise RelookError(
        f"there is no doubt to rank by ({reasons})", mend="rank by contribution or by intensity"
    )


def priorities(loaded: Loaded) -> FloatArray | None:
    """Return the factor on each item's score, None where the project has no priority column."""
    source = loaded.project.settings.items
    if loaded.items is None or source is None or source.priority is None:
        return None
    texts = item_texts(loaded, source.priority)
    # Reading the item table made sure that each text is blank or a number of 0 or more.
    given = {text: float(parse_number(text) or 0) if text.strip() else 1.0 for text in set(texts)}
    return np.array([given[text] for text in texts], dtype=np.float64)


def groups_of(loaded: Loaded, column: str) -> tuple[IntArray, tuple[str, ...]]:
    """Return the group of each item by a column of the item table, and the groups' names.

    Returns
    -------
    group_of_item : int array of shape (n_items,)
    names : tuple of str
        In order of their text; "" for items that the item table does not have.
    """
    names, group = np.unique(item_texts(loaded, column).astype(str), return_inverse=True)
    return group, tuple(str(name) for name in names)


def overlap_of(settings: Settings) -> float:
    """Return the share of rows that a second adjudicator gets too.

    One person cannot be two, so one adjudicator alone makes no overlap.
    """
    worksheet = settings.worksheet
    return worksheet.overlap if len(worksheet.adjudicators) > 1 else 0.0


def settings_of_queue(queue: QueueSettings, overrides: Mapping[str, object]) -> QueueSettings:
    """Return the queue settings with what the command line asked for this once.

    A limit given on the command line replaces all limits of relook.toml: whoever asks for the
    first 100 does not mean the first 40 that were written down earlier.

    Raises
    ------
    RelookError
        An order that is not known.
    """
    order = overrides.get("rank_by")
    if order is not None and order not in ORDERS:
        close = nearest(str(order), ORDERS)
        raise RelookError(
            f'"{order}" is no order of items',
            mend=f'did you mean "{close}"?' if close else f"use one of {listed(ORDERS)}",
        )
    given = {key: value for key, value in overrides.items() if value is not None}
    held = {name: getattr(queue, name) for name in QueueSettings.__dataclass_fields__}
    if any(limit in given for limit in ("top", "share", "hours")):
        held.update(top=None, share=None, hours=None)
    held.update(given)
    return QueueSettings(**held)
