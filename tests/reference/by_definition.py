"""The slow twin: every figure by nested loops straight from its definition, in exact fractions.

A table is a dict from item to a list of (coder, value). A delta takes a table and returns δ² as a
function of two values, since ordinal differences depend on the table. No case is treated apart for
speed; where a figure is undefined the functions return None.
"""

from __future__ import annotations

import math
from collections import Counter
from collections.abc import Callable, Hashable, Mapping, Sequence
from dataclasses import dataclass
from fractions import Fraction
from itertools import permutations
from typing import Any

import numpy as np

from relook.core.differences import Values
from relook.core.labels import CodedLabels

Table = Mapping[Hashable, Sequence[tuple[Hashable, Any]]]
Number = Fraction | float
Difference = Callable[[Any, Any], Number]
Delta = Callable[[Table], Difference]


# ------------------------------------------------------------------------------- differences


def nominal(table: Table) -> Difference:
    """1 between different values."""
    return lambda c, k: Fraction(c != k)


def ordinal(table: Table) -> Difference:
    """(Σ_{g=c..k} n_g − (n_c + n_k)/2)² with n_g over pairable labels; values sort by themselves."""
    counts = marginals(table)

    def difference(c: Any, k: Any) -> Number:
        low, high = min(c, k), max(c, k)
        if low == high:
            return Fraction(0)
        between = sum(n for g, n in counts.items() if low <= g <= high)
        return (between - Fraction(counts[low] + counts[high], 2)) ** 2

    return difference


def interval(table: Table) -> Difference:
    """(c − k)²."""
    return lambda c, k: (Fraction(c) - Fraction(k)) ** 2


def ratio(table: Table) -> Difference:
    """((c − k)/(c + k))²; 0 for equal values."""
    return lambda c, k: (
        Fraction(0) if c == k else ((Fraction(c) - Fraction(k)) / (Fraction(c) + Fraction(k))) ** 2
    )


def circular(period: int | Fraction) -> Delta:
    """sin²(π (c − k)/period), in floats."""
    return lambda table: (
        lambda c, k: (
            0.0 if c == k else math.sin(math.pi * float((Fraction(c) - Fraction(k)) / period)) ** 2
        )
    )


def polar(low: int, high: int) -> Delta:
    """(c − k)²/((c + k − 2 low)(2 high − c − k)); 0 for equal values."""
    return lambda table: (
        lambda c, k: (
            Fraction(0)
            if c == k
            else (Fraction(c) - Fraction(k)) ** 2
            / ((Fraction(c) + Fraction(k) - 2 * low) * (2 * high - Fraction(c) - Fraction(k)))
        )
    )


def jaccard(table: Table) -> Difference:
    """1 − |A ∩ B|/|A ∪ B| of frozensets; two empty sets do not differ."""
    return lambda a, b: Fraction(0) if a == b else 1 - Fraction(len(a & b), len(a | b))


def masi(table: Table) -> Difference:
    """1 − J M (Passonneau 2006)."""

    def difference(a: frozenset[Any], b: frozenset[Any]) -> Number:
        if a == b:
            return Fraction(0)
        if not a & b:
            m = Fraction(0)
        elif a <= b or b <= a:
            m = Fraction(2, 3)
        else:
            m = Fraction(1, 3)
        # An empty set lies inside any other, but they share nothing, so J is 0 either way.
        return 1 - Fraction(len(a & b), len(a | b)) * m

    return difference


def tree(table: Table) -> Difference:
    """1 − 2 depth(common ancestor)/(depth a + depth b) of tuples (Wu & Palmer 1994)."""

    def difference(a: tuple[Any, ...], b: tuple[Any, ...]) -> Number:
        if a == b:
            return Fraction(0)
        shared = 0
        while shared < min(len(a), len(b)) and a[shared] == b[shared]:
            shared += 1
        return 1 - Fraction(2 * shared, len(a) + len(b))

    return difference


def listed_table(entries: Mapping[tuple[Any, Any], Fraction]) -> Delta:
    """Read δ² from a dict of pairs."""
    return lambda table: lambda c, k: Fraction(0) if c == k else entries[c, k]


# ------------------------------------------------------------------------------- alpha


@dataclass(frozen=True)
class Figures:
    """Alpha and what it is made of; None where undefined."""

    alpha: Number | None
    observed: Number | None
    expected: Number | None
    n: int


def pairable(table: Table) -> dict[Hashable, list[tuple[Hashable, Any]]]:
    """Return the items with two labels or more."""
    return {item: list(labels) for item, labels in table.items() if len(labels) >= 2}


def marginals(table: Table) -> Counter[Any]:
    """Return n_c, the pairable labels of each value."""
    return Counter(value for labels in pairable(table).values() for _, value in labels)


def ordered_pairs(table: Table) -> list[tuple[Hashable, int, int, Fraction]]:
    """Return (item, i, j, 1/(n (m_u − 1))) for every ordered pair of labels of one item."""
    kept = pairable(table)
    n = sum(len(labels) for labels in kept.values())
    return [
        (item, i, j, Fraction(1, n * (len(labels) - 1)))
        for item, labels in kept.items()
        for i, j in permutations(range(len(labels)), 2)
    ]


def alpha_by_definition(table: Table, delta: Delta) -> Figures:
    """Return alpha, D_o and D_e: D_o over pairs within items, D_e over all pairs of labels."""
    difference = delta(table)
    observed: Number = Fraction(0)
    for item, i, j, weight in ordered_pairs(table):
        observed += weight * difference(table[item][i][1], table[item][j][1])
    counts = marginals(table)
    n = sum(counts.values())
    if n == 0:
        return Figures(None, None, None, 0)
    expected: Number = Fraction(0)
    for c in counts:
        for k in counts:
            expected += counts[c] * counts[k] * difference(c, k)
    expected = expected / (n * (n - 1))
    return Figures(1 - observed / expected if expected else None, observed, expected, n)


def expected_pair_parts(table: Table, delta: Delta) -> dict[frozenset[Any], Number]:
    """Return the part of D_e of each unordered pair of values, a value with itself as a set of one."""
    difference = delta(table)
    counts = marginals(table)
    n = sum(counts.values())
    sums: dict[frozenset[Any], Number] = {}
    for c in counts:
        for k in counts:
            part = counts[c] * counts[k] * difference(c, k) / (n * (n - 1))
            sums[frozenset({c, k})] = sums.get(frozenset({c, k}), Fraction(0)) + part
    return sums


# ------------------------------------------------------------------------------- parts of D_o


def _grouped(
    table: Table, delta: Delta, key: Callable[[Hashable, int, int], Any]
) -> dict[Any, Number]:
    """Add up δ²/(n (m_u − 1)) of all ordered pairs of labels under a key."""
    difference = delta(table)
    sums: dict[Any, Number] = {}
    for item, i, j, weight in ordered_pairs(table):
        part = weight * difference(table[item][i][1], table[item][j][1])
        name = key(item, i, j)
        sums[name] = sums.get(name, Fraction(0)) + part
    return sums


def item_parts(table: Table, delta: Delta) -> dict[Hashable, Number]:
    """Return the contribution of each pairable item."""
    return _grouped(table, delta, lambda item, i, j: item)


def label_parts(table: Table, delta: Delta) -> dict[tuple[Hashable, int], Number]:
    """Return the part of each pairable label, by item and place in its list."""
    return _grouped(table, delta, lambda item, i, j: (item, i))


def coder_parts(table: Table, delta: Delta) -> dict[Hashable, Number]:
    """Return the part of each coder."""
    return _grouped(table, delta, lambda item, i, j: table[item][i][0])


def coder_pair_parts(table: Table, delta: Delta) -> dict[frozenset[Hashable], Number]:
    """Return the part of each unordered pair of coders."""
    return _grouped(
        table, delta, lambda item, i, j: frozenset({table[item][i][0], table[item][j][0]})
    )


def label_pair_parts(table: Table, delta: Delta) -> dict[frozenset[Any], Number]:
    """Return the part of each unordered pair of values, a value with itself as a set of one."""
    return _grouped(
        table, delta, lambda item, i, j: frozenset({table[item][i][1], table[item][j][1]})
    )


def group_parts(
    table: Table, delta: Delta, group: Mapping[Hashable, Hashable]
) -> dict[Hashable, Number]:
    """Return the part of each group of items."""
    return _grouped(table, delta, lambda item, i, j: group[item])


def group_coder_parts(
    table: Table, delta: Delta, group: Mapping[Hashable, Hashable]
) -> dict[tuple[Hashable, Hashable], Number]:
    """Return the part of each coder in each group of items."""
    return _grouped(table, delta, lambda item, i, j: (group[item], table[item][i][0]))


def group_label_pair_parts(
    table: Table, delta: Delta, group: Mapping[Hashable, Hashable]
) -> dict[tuple[Hashable, frozenset[Any]], Number]:
    """Return the part of each unordered pair of values in each group of items."""
    return _grouped(
        table,
        delta,
        lambda item, i, j: (group[item], frozenset({table[item][i][1], table[item][j][1]})),
    )


# ------------------------------------------------------------------------------- what if


def without_coder(table: Table, coder: Hashable) -> Table:
    """Return the table without one coder's labels."""
    return {
        item: [label for label in labels if label[0] != coder] for item, labels in table.items()
    }


def without_item(table: Table, item: Hashable) -> Table:
    """Return the table without one item."""
    return {other: labels for other, labels in table.items() if other != item}


def settled(table: Table, rulings: Mapping[Hashable, Any]) -> Table:
    """Return the table with all labels of the ruled items replaced by the ruling."""
    return {
        item: [(coder, rulings.get(item, value)) for coder, value in labels]
        for item, labels in table.items()
    }


def settled_alpha_by_definition(
    table: Table, delta: Delta, rulings: Mapping[Hashable, Any]
) -> Number | None:
    """Return the agreement once the ruled items carry the ruling; marginals and δ² follow."""
    return alpha_by_definition(settled(table, rulings), delta).alpha


def prospect_by_definition(
    table: Table, delta: Delta, rulings: Sequence[tuple[Hashable, Any]]
) -> list[Number | None]:
    """Return the agreement after none, the first, the first two … rulings."""
    return [
        settled_alpha_by_definition(table, delta, dict(rulings[:k]))
        for k in range(len(rulings) + 1)
    ]


def merged(table: Table, into: Mapping[Any, Any]) -> Table:
    """Return the table with values replaced."""
    return {
        item: [(coder, into.get(value, value)) for coder, value in labels]
        for item, labels in table.items()
    }


# ------------------------------------------------------------------------------- to the fast code


@dataclass(frozen=True)
class Coded:
    """A table as codes, with what the codes stand for."""

    labels: CodedLabels
    items: list[Hashable]
    coders: list[Hashable]
    values: list[Any]

    def numbers(self) -> Values:
        """Return the values as exact numbers."""
        return Values.from_numbers(self.values)


def coded(table: Table, values: Sequence[Any] | None = None) -> Coded:
    """Code a table: items in their order, coders and values sorted.

    `values` lists the values where some do not occur or do not sort.
    """
    items = list(table)
    found = [label for labels in table.values() for label in labels]
    coders = sorted({coder for coder, _ in found}, key=lambda coder: (str(type(coder)), coder))
    if values is None:
        values = sorted({value for _, value in found})
    of_coder = {coder: code for code, coder in enumerate(coders)}
    of_value = {value: code for code, value in enumerate(values)}
    rows = [
        (place, of_coder[coder], of_value[value])
        for place, item in enumerate(items)
        for coder, value in table[item]
    ]
    columns = np.array(rows, dtype=np.int64).reshape(-1, 3).T
    labels = CodedLabels.from_codes(
        columns[0],
        columns[2],
        columns[1],
        n_items=len(items),
        n_values=len(values),
        n_coders=len(coders),
    )
    return Coded(labels, items, coders, list(values))
