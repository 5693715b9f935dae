"""Which items are coded anew, and by whom.

Items are drawn by a keyed hash of their ids, so neither the order of the file nor anything that the
project knows of an item decides whether it is drawn. Strata of a column get draws in proportion to
their sizes, the largest remainders first.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from itertools import combinations

import numpy as np

from relook.core.audit import allocate
from relook.errors import RelookError
from relook.worksheet.keys import keyed_bytes


@dataclass(frozen=True, slots=True, kw_only=True)
class Sample:
    """A random sample of items.

    Attributes
    ----------
    items : tuple of str
        In the order drawn.
    n_population : int
        Items that could have been drawn.
    groups : dict of str to (int, int)
        By group where the draw was proportional: items in all, items drawn.
    """

    items: tuple[str, ...]
    n_population: int
    groups: dict[str, tuple[int, int]]


def draw_sample(
    population: Sequence[str],
    n: int,
    *,
    seed: int,
    number: int,
    group_of: Mapping[str, str] | None = None,
) -> Sample:
    """Draw items at random without replacement.

    Parameters
    ----------
    population : sequence of str
        Item ids without repeats.
    n : int
        At least 1; all items where there are fewer.
    seed : int
    number : int
        Of the coding, so that a later one draws anew.
    group_of : mapping of str to str, optional
        The group of each item: each group then gets its share of the draws, one at least.

    Raises
    ------
    RelookError
        `n` below 1, or nothing to draw from.
    """
    if n < 1:
        raise RelookError(f"{n} items cannot be coded", mend="ask for one item or more")
    if not population:
        raise RelookError(
            "no item is left to draw from",
            mend="leave out --unseen, or add items to the item table",
        )
    key = f"{seed} {number}".encode()
    order = sorted(population, key=lambda item: (keyed_bytes(key, "draw", item), item))
    if group_of is None:
        return Sample(items=tuple(order[:n]), n_population=len(order), groups={})
    members: dict[str, list[str]] = {}
    for item in order:
        members.setdefault(group_of[item], []).append(item)
    names = sorted(members)
    sizes = np.array([len(members[name]) for name in names], dtype=np.int64)
    drawn = allocate(sizes, n).tolist()
    chosen = {item for name, k in zip(names, drawn, strict=True) for item in members[name][:k]}
    return Sample(
        items=tuple(item for item in order if item in chosen),
        n_population=len(order),
        groups={
            name: (size, k) for name, size, k in zip(names, sizes.tolist(), drawn, strict=True)
        },
    )


def deal(items: Sequence[str], coders: Sequence[str], overlap: int) -> dict[str, tuple[str, ...]]:
    """Give each item to so many coders that loads are equal and every pair of coders meets.

    Parameters
    ----------
    items : sequence of str
    coders : sequence of str
    overlap : int
        Coders of each item, at least 2.

    Returns
    -------
    dict of str to tuple of str
        The items of each coder. Loads differ by one at most.

    Raises
    ------
    RelookError
        Fewer than two coders to an item, or more than there are.

    Notes
    -----
    Each item goes to those of the least loaded coders who have met least so far. A search by hand
    over all sets of coders would be no better where it matters: that no pair is left without
    shared items as long as the numbers allow it.
    """
    if not 2 <= overlap <= len(coders):
        raise RelookError(
            f"{overlap} of {len(coders)} coders cannot code each item",
            mend=f"ask for an overlap from 2 to {len(coders)}"
            if len(coders) > 1
            else "agreement needs two coders or more; name them with --coder",
        )
    load = dict.fromkeys(coders, 0)
    met = dict.fromkeys(combinations(coders, 2), 0)
    dealt: dict[str, list[str]] = {coder: [] for coder in coders}
    for item in items:
        chosen: list[str] = []
        while len(chosen) < overlap:
            free = [coder for coder in coders if coder not in chosen]
            chosen.append(
                min(
                    free,
                    key=lambda coder: (
                        load[coder],
                        sum(met[pair] for pair in _pairs(coder, chosen, coders)),
                        coders.index(coder),
                    ),
                )
            )
        for coder in chosen:
            load[coder] += 1
            dealt[coder].append(item)
        for pair in combinations(sorted(chosen, key=coders.index), 2):
            met[pair] += 1
    return {coder: tuple(given) for coder, given in dealt.items()}


def _pairs(coder: str, others: Sequence[str], coders: Sequence[str]) -> list[tuple[str, str]]:
    return [
        (coder, other) if coders.index(coder) < coders.index(other) else (other, coder)
        for other in others
    ]
