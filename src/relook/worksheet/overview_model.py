"""What the lead's overview of a round is made of: plain values, computed elsewhere."""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True, slots=True, kw_only=True)
class Figure:
    """A figure and the conditions under which it holds.

    Attributes
    ----------
    variable : str
        "" for figures of the whole round.
    name : str
        Such as "alpha" or "observed disagreement D_o".
    value : float, int, str or None
        None where undefined; `conditions` then says why.
    conditions : str
        In words: of what, over how many items, with which interval.
    """

    variable: str = ""
    name: str
    value: float | int | str | None
    conditions: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class RankedRow:
    """One row of the queue, as the lead sees it.

    Attributes
    ----------
    rank : int
    item, variable : str
    contribution, share, cumulative_share : float
        The item's part of D_o, that part over D_o, and the running sum of shares.
    alpha_cost : float or None
        contribution / D_e; None where alpha is undefined.
    doubt : float or None
        None where it is not defined.
    consensus : str
        The consensus label, or the tied ones.
    tie : bool
    settled_alpha : float or None
        Agreement were this item alone settled.
    text : str
        The item's main text; "" where none is shown.
    labels : tuple of (str, str)
        Coder and label.
    adjudicators : tuple of str
        Who has the row.
    """

    rank: int
    item: str
    variable: str
    contribution: float
    share: float
    cumulative_share: float
    alpha_cost: float | None = None
    doubt: float | None = None
    consensus: str = ""
    tie: bool = False
    settled_alpha: float | None = None
    text: str = ""
    labels: tuple[tuple[str, str], ...] = ()
    adjudicators: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True, kw_only=True)
class CoderRow:
    """A coder's part of one variable's disagreement.

    Attributes
    ----------
    contribution, share : float
        Of D_o.
    n_labels : int
        Pairable labels.
    share_of_labels : float
    involved : float
        Share of D_o in which the coder is involved.
    own_alpha : float or None
    """

    variable: str
    coder: str
    contribution: float
    share: float
    n_labels: int
    share_of_labels: float
    involved: float
    own_alpha: float | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class LabelPairRow:
    """Two labels that met, and their part of D_o."""

    variable: str
    first: str
    second: str
    contribution: float
    share: float


@dataclass(frozen=True, slots=True, kw_only=True)
class GroupRow:
    """A group of items and its part of D_o."""

    variable: str
    column: str
    group: str
    n_items: int
    contribution: float
    share: float
    own_alpha: float | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class ProspectRow:
    """Agreement in the corrected data after the first `n_settled` items of the queue, both ends."""

    variable: str
    n_settled: int
    low: float | None
    high: float | None


@dataclass(frozen=True, slots=True, kw_only=True)
class Overview:
    """Everything that goes into overview.xlsx.

    Attributes
    ----------
    title : str
    round : int
    stamp : str
        ISO time recorded for the round.
    figures : tuple of Figure
    notes : tuple of str
        Sentences: what bound the queue, which variable filled it, what was left unplanned.
    ranking : tuple of RankedRow
        The queue, not every item.
    coders : tuple of CoderRow
    label_pairs : tuple of LabelPairRow
    label_order : tuple of (str, tuple of str)
        Variable and its labels in the order of the heat table; left out: as they first occur.
    groups : tuple of GroupRow
    prospect : tuple of ProspectRow
        By variable, `n_settled` ascending from 0.
    """

    title: str
    round: int
    stamp: str
    figures: tuple[Figure, ...] = ()
    notes: tuple[str, ...] = ()
    ranking: tuple[RankedRow, ...] = ()
    coders: tuple[CoderRow, ...] = ()
    label_pairs: tuple[LabelPairRow, ...] = ()
    label_order: tuple[tuple[str, tuple[str, ...]], ...] = ()
    groups: tuple[GroupRow, ...] = ()
    prospect: tuple[ProspectRow, ...] = ()
