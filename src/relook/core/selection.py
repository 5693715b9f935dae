"""How many items to send: the head of a ranking that adjudicator time, or a share, allows."""

from __future__ import annotations

from dataclasses import dataclass
from fractions import Fraction
from math import ceil, floor
from typing import Literal

import numpy as np

from relook.core.exact import FloatArray, IntArray
from relook.core.ranking import Ranking
from relook.core.ties import TIE
from relook.errors import RelookError

BoundBy = Literal["top", "share", "hours", "default share", "default top", "all disputed items"]

#: Where nothing is asked: half of the disagreement, at most this many items.
DEFAULT_SHARE = 0.5
DEFAULT_TOP = 100


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Selection:
    """The head of a ranking.

    Attributes
    ----------
    n_items, n_rows : int
        The first `n_items` of the ranking, and their rows.
    item_index : int array of shape (n_items,)
    bound_by : str
        What limited the number: "top", "share", "hours"; "default share" or "default top" where
        nothing was asked; "all disputed items" where every ranked item is in.
    limits : dict of str to int
        How many items each limit would allow.
    share : float or None
        Of the disagreement, what the items carry; None where there is none.
    rows_per_variable : int array of shape (n_variables,)
    led_by_variable : int array of shape (n_variables,)
        For how many items the variable is the heaviest: which variable filled the queue.
    share_per_variable : float array of shape (n_variables,)
        Share of each variable's D_o in its selected rows; nan where D_o is 0 or undefined.
    seconds : float or None
        Adjudicator time, audit items and overlap included, where the time per item is known.
    seconds_per_item : float or None
        What it was reckoned with.
    """

    n_items: int
    n_rows: int
    item_index: IntArray
    bound_by: BoundBy
    limits: dict[str, int]
    share: float | None
    rows_per_variable: IntArray
    led_by_variable: IntArray
    share_per_variable: FloatArray
    seconds: float | None
    seconds_per_item: float | None = None

    def sentence(self, ranking: Ranking) -> str:
        """Say how many items were taken, what bound, and which variable filled the queue."""
        said = f"{self.n_items:,} of {ranking.n_items:,} disputed items"
        if self.share is not None:
            of = "disagreement" if len(ranking.variables) == 1 else "chance-scaled disagreement"
            share = f"{self.share:.0%}" if self.share >= 0.005 else "less than 1%"
            said += f", {share} of the {of}"
        said += {
            "top": "; as many as were asked for",
            "share": "; the share that was asked for",
            "hours": "; as many as the hours allow",
            "default share": "; no limit was set, so half of the disagreement",
            "default top": f"; no limit was set, so at most {DEFAULT_TOP}",
            "all disputed items": "; that is all of them",
        }[self.bound_by]
        if len(ranking.variables) > 1 and self.n_items:
            most = int(self.led_by_variable.max())
            leads = [
                f'"{name}"'
                for name, led in zip(ranking.variables, self.led_by_variable.tolist(), strict=True)
                if led == most
            ]
            said += (
                f"; {' and '.join(leads)} filled the queue: heaviest in "
                f"{most:,} of {self.n_items:,}{' each' if len(leads) > 1 else ''}"
            )
        return said


def select_head(
    ranking: Ranking,
    *,
    top: int | None = None,
    share: float | None = None,
    hours: float | None = None,
    seconds_per_item: float | None = None,
    overlap: float = 0.0,
    n_audit_items: int = 0,
) -> Selection:
    """Take the head of a ranking; the smallest limit binds.

    Parameters
    ----------
    ranking : Ranking
    top : int, optional
        At most so many disputed items.
    share : float, optional
        The shortest head that carries this share of the disagreement (`Ranking.carried_in_all`).
    hours : float, optional
        All adjudicator time together; needs `seconds_per_item`.
    seconds_per_item : float, optional
        Time for one item, all its rows included.
    overlap : float
        Share of the items that a second adjudicator rules on too.
    n_audit_items : int
        Audit items, which cost the same time.

    Returns
    -------
    Selection

    Raises
    ------
    RelookError
        A limit out of its range, or hours that the audit items use up.
    """
    _check(top, share, hours, seconds_per_item, overlap, n_audit_items)
    limits: dict[str, int] = {}
    if top is not None:
        limits["top"] = top
    if share is not None:
        limits["share"] = _shortest_head(ranking, share)
    if hours is not None and seconds_per_item is not None:
        limits["hours"] = _within_hours(hours, seconds_per_item, overlap, n_audit_items)
    if not limits:
        limits = {"default share": _shortest_head(ranking, DEFAULT_SHARE)}
        limits["default top"] = DEFAULT_TOP
    bound_by = min(limits, key=lambda name: limits[name])
    n = min(limits[bound_by], ranking.n_items)
    # A share may need every item, and is then still what was asked for.
    if limits[bound_by] > ranking.n_items or (
        n == ranking.n_items and bound_by in ("top", "hours", "default top")
    ):
        bound_by = "all disputed items"
    return _selection(ranking, n, bound_by, limits, seconds_per_item, overlap, n_audit_items)


def _selection(
    ranking: Ranking,
    n: int,
    bound_by: str,
    limits: dict[str, int],
    seconds_per_item: float | None,
    overlap: float,
    n_audit_items: int,
) -> Selection:
    n_rows = int(ranking.row_start[n])
    n_variables = len(ranking.variables)
    variable = ranking.row_variable[:n_rows]
    settled = np.bincount(
        variable, weights=ranking.row_contribution[:n_rows], minlength=n_variables
    )
    observed = ranking.observed_disagreement
    known = np.isfinite(observed) & (observed > 0)
    shares = np.full(n_variables, np.nan)
    shares[known] = settled[known] / observed[known]
    whole = ranking.carried_in_all
    return Selection(
        n_items=n,
        n_rows=n_rows,
        item_index=ranking.item_index[:n],
        bound_by=bound_by,  # type: ignore[arg-type]
        limits=limits,
        share=float(ranking.carried[:n].sum()) / whole if whole > 0 else None,
        rows_per_variable=np.bincount(variable, minlength=n_variables),
        led_by_variable=np.bincount(
            ranking.row_variable[ranking.row_start[:n]], minlength=n_variables
        ),
        share_per_variable=shares,
        seconds=None
        if seconds_per_item is None
        else seconds_per_item * _n_rulings(n, overlap, n_audit_items),
        seconds_per_item=seconds_per_item,
    )


def _check(
    top: int | None,
    share: float | None,
    hours: float | None,
    seconds_per_item: float | None,
    overlap: float,
    n_audit_items: int,
) -> None:
    if top is not None and top < 1:
        raise RelookError(f"`top` must be 1 or more; got {top}", mend="give a number such as 40")
    if share is not None and not 0 < share <= 1:
        raise RelookError(
            f"`share` must be above 0 and at most 1; got {share:g}",
            mend="give a share such as 0.6",
        )
    if hours is not None and not hours > 0:
        raise RelookError(f"`hours` must be above 0; got {hours:g}", mend="give hours such as 6")
    if seconds_per_item is not None and not seconds_per_item > 0:
        raise RelookError(f"`seconds_per_item` must be above 0; got {seconds_per_item}")
    if hours is not None and seconds_per_item is None:
        raise RelookError(
            "hours need the time that one item takes", mend="add --seconds-per-item, such as 45"
        )
    if not 0 <= overlap <= 1:
        raise RelookError(f"`overlap` must be from 0 to 1; got {overlap}")
    if n_audit_items < 0:
        raise RelookError(f"`n_audit_items` must be 0 or more; got {n_audit_items}")


def _shortest_head(ranking: Ranking, share: float) -> int:
    """The fewest items that carry the share; one more than there are where all do not."""
    upto = np.cumsum(ranking.carried)
    wanted = share * ranking.carried_in_all * (1 - TIE)
    return int(np.searchsorted(upto, wanted)) + 1


def _n_rulings(n: int, overlap: float, n_audit_items: int) -> int:
    return n + ceil(n * _exact(overlap)) + n_audit_items


def _exact(share: float) -> Fraction:
    """A share as it was written: 0.1 is a tenth, so that ten times it is 1 and no more."""
    return Fraction(share).limit_denominator(1_000_000)


def _within_hours(hours: float, seconds: float, overlap: float, n_audit_items: int) -> int:
    """The most items that fit, audit items and overlap paid for first."""
    rulings = floor(hours * 3600 / seconds + 1e-9)
    # n + ceil(n × overlap) ≤ rulings if and only if n × (1 + overlap) ≤ rulings.
    n = max(0, floor((rulings - n_audit_items) / (1 + _exact(overlap))))
    if n == 0:
        raise RelookError(
            f"{hours:g} hours at {seconds:g} seconds an item leave no time for a disputed item "
            f"beside {n_audit_items:,} audit items",
            mend="allow more hours, or fewer audit items",
        )
    return n
