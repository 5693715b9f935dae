"""Random items that would be released without a decision: drawn, and what their rulings say.

Adjudicating only disputed items overstates how good the rest is (Begg, C. B. & Greenes, R. A.
(1983). Assessment of diagnostic tests when disease verification is subject to selection bias.
Biometrics 39:207–215). So some of the rest is drawn at random, within strata whose sizes are kept,
and each stratum's share counts by its size.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Literal

import numpy as np

from relook.core.agreement import Agreement
from relook.core.exact import BoolArray, IntArray
from relook.core.proportions import exact_interval, weighted_interval
from relook.errors import RelookError

Stratum = Literal["unanimous", "not queued", "single"]

#: unanimous: two labels or more, none in dispute. not queued: disputed, but not sent. single: one
#: label. The order is that of the codes that `stratify` returns.
STRATA: tuple[Stratum, ...] = ("unanimous", "not queued", "single")


@dataclass(frozen=True, slots=True, kw_only=True)
class Slip:
    """Why a ruling against coders who agree may be the adjudicator's slip.

    Attributes
    ----------
    true_share, slip_rate, share_shown : float
        Where `true_share` of the items are wrong and an adjudicator slips on `slip_rate` of them,
        the audit shows `share_shown` as wrong.
    """

    true_share: float
    slip_rate: float

    @property
    def share_shown(self) -> float:
        """Wrong items ruled so, and right items ruled wrong by a slip."""
        return self.true_share * (1 - self.slip_rate) + (1 - self.true_share) * self.slip_rate


#: The example to print beside an audit: 1 % true with 3 % slips shows 3.9 %.
SLIP_EXAMPLE = Slip(true_share=0.01, slip_rate=0.03)


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class AuditDraw:
    """Audit items and the chances they were drawn with.

    Attributes
    ----------
    item_index : int array of shape (n_drawn,)
        In a random order.
    stratum : int array of shape (n_drawn,)
        Position in `STRATA`.
    sizes : dict of str to int
        Items of each stratum, at the draw.
    drawn : dict of str to int
        Of these, the audit items.
    tied, drawn_tied : dict of str to int
        Of each of these, the items that have no consensus label to be released with.
    """

    item_index: IntArray
    stratum: IntArray
    sizes: dict[Stratum, int]
    drawn: dict[Stratum, int]
    tied: dict[Stratum, int]
    drawn_tied: dict[Stratum, int]

    @property
    def chances(self) -> dict[Stratum, float]:
        """The chance with which each item of a stratum was drawn; 0 for an empty stratum."""
        return {
            name: self.drawn[name] / self.sizes[name] if self.sizes[name] else 0.0
            for name in STRATA
        }


@dataclass(frozen=True, slots=True, kw_only=True)
class StratumResult:
    """What the audit found in one stratum.

    Attributes
    ----------
    stratum : str
    n_items : int
        Items of the stratum, as `estimate` was given them.
    n_ruled : int
        Audit items with a ruling.
    n_otherwise : int
        Of these, ruled otherwise than they would have been released.
    share, low, high : float or None
        n_otherwise/n_ruled with its exact interval; None without a ruling.
    """

    stratum: Stratum
    n_items: int
    n_ruled: int
    n_otherwise: int
    share: float | None
    low: float | None
    high: float | None


@dataclass(frozen=True, slots=True, kw_only=True)
class AuditResult:
    """What the audit says of everything that would be released without a decision.

    Attributes
    ----------
    strata : tuple of StratumResult
        Those with an item at least.
    share_ruled_otherwise, low, high : float or None
        Σ W_h p_h with W_h the stratum's share of the items released without a decision, and its
        interval; None where a stratum has no ruling.
    undefined_because : str or None
    confidence_level : float
    """

    strata: tuple[StratumResult, ...]
    share_ruled_otherwise: float | None
    low: float | None
    high: float | None
    undefined_because: str | None
    confidence_level: float


def stratify(agreement: Agreement, leave_out: BoolArray) -> IntArray:
    """Say which stratum each item belongs to.

    Parameters
    ----------
    agreement : Agreement
    leave_out : bool array of shape (n_items,)
        Items that are queued, or that have a decision already.

    Returns
    -------
    int array of shape (n_items,)
        Position in `STRATA`; -1 for items left out and items without labels.
    """
    stratum = np.full(agreement.labels.n_items, -1, dtype=np.int64)
    known = agreement.profile_of_item >= 0
    profile = agreement.profile_of_item[known]
    of_profile = np.where(
        agreement.profiles.size < 2,
        STRATA.index("single"),
        np.where(
            agreement.disputed_profiles, STRATA.index("not queued"), STRATA.index("unanimous")
        ),
    )
    stratum[known] = of_profile[profile]
    stratum[np.asarray(leave_out, dtype=bool)] = -1
    return stratum


def allocate(sizes: IntArray, n: int) -> IntArray:
    """Share out n draws in proportion to the sizes, one at least where there is something to draw.

    Parameters
    ----------
    sizes : int array of shape (n_strata,)
    n : int
        More than all items together draws them all.

    Returns
    -------
    int array of shape (n_strata,)
        By largest remainders; ties go to the earlier stratum. With fewer draws than strata that
        hold items the larger strata get one each.
    """
    sizes = np.asarray(sizes, dtype=np.int64)
    total = int(sizes.sum())
    n = min(n, total)
    if n <= 0:
        return np.zeros_like(sizes)
    filled = np.flatnonzero(sizes)
    given = np.zeros_like(sizes)
    if n <= filled.size:
        given[filled[np.argsort(-sizes[filled], kind="stable")][:n]] = 1
        return given
    given[filled] = np.maximum(1, n * sizes[filled] // total)
    # The least ones may have pushed the sum above n: take back where most was given too many.
    while int(given.sum()) > n:
        over = np.where(given > 1, given * total - n * sizes, np.iinfo(np.int64).min)
        given[int(np.argmax(over))] -= 1
    while int(given.sum()) < n:
        short = np.where(given < sizes, n * sizes - given * total, np.iinfo(np.int64).min)
        given[int(np.argmax(short))] += 1
    return given


def draw_audit(
    stratum: IntArray,
    n: int,
    rng: np.random.Generator,
    *,
    item_hash: IntArray | None = None,
    tied: BoolArray | None = None,
) -> AuditDraw:
    """Draw audit items at random from each stratum.

    Parameters
    ----------
    stratum : int array of shape (n_items,)
        As `stratify` returns.
    n : int
        Audit items in all; fewer are drawn where there are fewer.
    rng : numpy.random.Generator
    item_hash : int array of shape (n_items,), optional
        A keyed hash of each item's id, so that the draw does not depend on the order of the file.
    tied : bool array of shape (n_items,), optional
        Items whose labels tie. They are drawn like any other, and counted.

    Returns
    -------
    AuditDraw
    """
    if n < 0:
        raise RelookError(f"`n` must be 0 or more; got {n}")
    sizes = _sizes(stratum)
    given = allocate(sizes, n)
    drawn = []
    for code, k in enumerate(given.tolist()):
        items = np.flatnonzero(stratum == code)
        if item_hash is not None:
            items = items[np.argsort(item_hash[items], kind="stable")]
        drawn.append(rng.choice(items, size=k, replace=False) if k else items[:0])
    every = rng.permutation(np.concatenate(drawn))
    tied = np.zeros(stratum.size, dtype=bool) if tied is None else np.asarray(tied, dtype=bool)
    return AuditDraw(
        item_index=every,
        stratum=stratum[every],
        sizes=_by_stratum(sizes),
        drawn=_by_stratum(given),
        tied=_by_stratum(_sizes(stratum[tied])),
        drawn_tied=_by_stratum(_sizes(stratum[every][tied[every]])),
    )


def _sizes(stratum: IntArray) -> IntArray:
    return np.bincount(stratum[stratum >= 0], minlength=len(STRATA))


def _by_stratum(counts: IntArray) -> dict[Stratum, int]:
    return dict(zip(STRATA, counts.tolist(), strict=True))


def estimate(
    sizes: Mapping[Stratum, int],
    ruled: Mapping[Stratum, int],
    otherwise: Mapping[Stratum, int],
    *,
    confidence_level: float = 0.95,
) -> AuditResult:
    """Estimate the share that would be ruled otherwise, by stratum and in all.

    Parameters
    ----------
    sizes : mapping of stratum to int
        Items of each stratum that the share is of, each as likely to be drawn as any other.
    ruled : mapping of stratum to int
        Of these, the audit items with a ruling; left-out strata have none.
    otherwise : mapping of stratum to int
        Of these, ruled otherwise.
    confidence_level : float

    Returns
    -------
    AuditResult

    Notes
    -----
    Audit items without a ruling are taken as missing at random within their stratum. An adjudicator
    who slips raises the share (`SLIP_EXAMPLE`).
    """
    names = [name for name in STRATA if sizes.get(name, 0) > 0]
    strata = tuple(
        _stratum_result(
            name, sizes[name], ruled.get(name, 0), otherwise.get(name, 0), confidence_level
        )
        for name in names
    )
    empty = [result.stratum for result in strata if result.n_ruled == 0]
    because = None
    if not strata:
        because = "nothing would be released without a decision"
    elif empty:
        because = f"no audit item was ruled on among the items that are {' or '.join(empty)}"
    if because is not None:
        return AuditResult(
            strata=strata,
            share_ruled_otherwise=None,
            low=None,
            high=None,
            undefined_because=because,
            confidence_level=confidence_level,
        )
    share, low, high = weighted_interval(
        [result.n_otherwise for result in strata],
        [result.n_ruled for result in strata],
        [result.n_items for result in strata],
        confidence_level=confidence_level,
    )
    return AuditResult(
        strata=strata,
        share_ruled_otherwise=share,
        low=low,
        high=high,
        undefined_because=None,
        confidence_level=confidence_level,
    )


def _stratum_result(
    name: Stratum, size: int, n: int, found: int, confidence_level: float
) -> StratumResult:
    interval: tuple[float | None, float | None] = (None, None)
    if n:
        interval = exact_interval(found, n, size, confidence_level=confidence_level)
    return StratumResult(
        stratum=name,
        n_items=size,
        n_ruled=n,
        n_otherwise=found,
        share=found / n if n else None,
        low=interval[0],
        high=interval[1],
    )
