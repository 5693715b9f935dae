"""Difference functions that need an option: circular, polar, sets, trees, a user's table.

δ² of sets, trees and tables enters the sums as it stands: it is not squared again.

References
----------
Krippendorff, K. (2004). Content Analysis, 2nd ed., ch. 11 (circular and polar).
Jaccard, P. (1912). The distribution of the flora in the alpine zone. New Phytologist 11:37–50.
Passonneau, R. (2006). Measuring agreement on set-valued items (MASI) for semantic and pragmatic
annotation. LREC 2006. Wu, Z. & Palmer, M. (1994). Verb semantics and lexical selection. ACL 1994,
133–138.
"""

from __future__ import annotations

import math
from abc import abstractmethod
from collections.abc import Callable, Mapping
from dataclasses import dataclass
from fractions import Fraction
from typing import Self

import numpy as np

from relook.core.bound_differences import CircularDifferences, RationalDifferences
from relook.core.difference_base import (
    DifferenceFunction,
    Differences,
    PairwiseDifferences,
    Values,
)
from relook.core.exact import FloatArray, IntArray
from relook.errors import RelookError, listed

#: From pairs of value codes to the sizes of their sets' intersections and unions.
_Meeting = Callable[[IntArray, IntArray], tuple[IntArray, IntArray]]

_A_NUMBER = "write it in digits, with a point before decimals"
_ENDS = "give the lowest and the highest number that the scale has"


@dataclass(frozen=True, slots=True)
class DifferenceTable:
    """A user's table of differences between labels.

    Attributes
    ----------
    labels : tuple of str
    entries : tuple of tuples of Fraction
        δ² of each label (row) to each label (column), in the order of `labels`.
    """

    labels: tuple[str, ...]
    entries: tuple[tuple[Fraction, ...], ...]

    def faults(self) -> list[tuple[int, int, str]]:
        """Return what keeps the table from being one of differences.

        Returns
        -------
        list of (row index, column index, reason)
            Every fault, by row; each asymmetric pair once, at its lower left.
        """
        found: list[tuple[int, int, str]] = []
        for i, row in enumerate(self.entries):
            for j, entry in enumerate(row):
                pair = f"{listed([self.labels[i]])} and {listed([self.labels[j]])}"
                if entry < 0:
                    found.append((i, j, f"the difference of {pair} is negative"))
                elif i == j and entry != 0:
                    found.append((i, j, f"{listed([self.labels[i]])} differs from itself"))
                elif j < i and entry != self.entries[j][i]:
                    found.append((i, j, f"the difference of {pair} is not the same both ways"))
        return found


class Circular(DifferenceFunction):
    """δ² = sin²(π (c − k)/U) on a circle of circumference U, such as hours of the day."""

    name = "circular"
    needs = "number"
    options = ("period",)

    def __init__(self, period: Fraction | None = None) -> None:
        self.period = period

    def with_options(self, options: Mapping[str, object]) -> Self:
        """Take the period."""
        self._check_options(options)
        period = exact_number(options["period"], "period")
        if period <= 0:
            raise RelookError(
                f"the period of circular differences must be above 0; got {period}",
                mend="give how many steps lead round once, such as 24 for hours",
            )
        return type(self)(period)

    def bind(self, values: Values, marginals: IntArray) -> Differences:
        """Return δ² of points on the circle."""
        if self.period is None:
            raise self._missing()
        numerators = self._numbers(values)
        # Reduced exactly, so that labels a whole period apart are the same point.
        turn = self.period * values.denominator
        top = [int(x) * turn.denominator % turn.numerator for x in numerators]
        return CircularDifferences(np.asarray([x / turn.numerator for x in top], dtype=np.float64))


class Polar(DifferenceFunction):
    """δ² = (c − k)²/((c + k − 2a)(2b − c − k)) between the ends a < b of a scale."""

    name = "polar"
    needs = "number"
    compares_every_two = True
    options = ("ends",)

    def __init__(self, ends: tuple[Fraction, Fraction] | None = None) -> None:
        self.ends = ends

    def with_options(self, options: Mapping[str, object]) -> Self:
        """Take the two ends."""
        self._check_options(options)
        given = options["ends"]
        if not isinstance(given, list | tuple) or len(given) != 2:
            raise RelookError(
                f"`ends` must be two numbers, such as [0, 10]; got {given!r}", mend=_ENDS
            )
        low, high = (exact_number(end, "ends") for end in given)
        if not low < high:
            raise RelookError(
                f"the first of `ends` must be below the second; got {given!r}", mend=_ENDS
            )
        return type(self)((low, high))

    def check(self, values: Values) -> list[tuple[int, str]]:
        """Return the values outside the ends."""
        if self.ends is None or values.numerators is None:
            return []
        low, high = self.ends
        said = f"lies outside the ends {_plain(low)} and {_plain(high)}"
        return [
            (code, said)
            for code, x in enumerate(values.numerators)
            if not low <= Fraction(int(x), values.denominator) <= high
        ]

    def bind(self, values: Values, marginals: IntArray) -> Differences:
        """Return δ² in floats; labels at one end differ from themselves by 0."""
        if self.ends is None:
            raise self._missing()
        numerators = self._numbers(values)
        self._refuse_faults(values)
        low, high = self.ends
        exact = [Fraction(int(x), values.denominator) for x in numerators]
        above = np.asarray([float(x - low) for x in exact], dtype=np.float64)
        below = np.asarray([float(high - x) for x in exact], dtype=np.float64)

        def polar(first: IntArray, second: IntArray) -> FloatArray:
            step = above[first] - above[second]
            span = (above[first] + above[second]) * (below[first] + below[second])
            # The span is 0 only where both labels are the same end, and then so is the step.
            return np.asarray(step * step / np.where(span > 0, span, 1.0))

        return PairwiseDifferences(polar)


class _OfTexts(DifferenceFunction):
    """Differences read off the texts of the labels, with a separator."""

    needs = "text"
    compares_every_two = True
    options = ("separator",)

    def __init__(self, separator: str | None = None) -> None:
        self.separator = separator

    def with_options(self, options: Mapping[str, object]) -> Self:
        """Take the separator."""
        self._check_options(options)
        separator = options["separator"]
        if not isinstance(separator, str) or not separator.strip():
            raise RelookError(
                f'`separator` must be a mark such as ";"; got {separator!r}',
                mend="give the mark that stands between the parts of a label",
            )
        return type(self)(separator)

    def parts(self, text: str) -> list[str]:
        """Return the elements or path steps that a label's text names, spaces trimmed."""
        if self.separator is None:
            raise self._missing()
        return [part.strip() for part in text.split(self.separator) if part.strip()]

    def bind(self, values: Values, marginals: IntArray) -> Differences:
        """Return δ² as fractions over a common denominator."""
        texts = self._texts(values)
        return self._bind([self.parts(text) for text in texts])

    @abstractmethod
    def _bind(self, parts: list[list[str]]) -> Differences: ...


class _OfSets(_OfTexts):
    """Differences of sets: several labels on one item."""

    def _bind(self, parts: list[list[str]]) -> Differences:
        elements = {name: i for i, name in enumerate(sorted({e for each in parts for e in each}))}
        member = np.zeros((len(parts), len(elements)), dtype=bool)
        for code, each in enumerate(parts):
            member[code, [elements[name] for name in each]] = True
        size = member.sum(axis=1)
        # Eight elements to a byte, and the bits of each byte counted from a table: memory stays
        # that of the pairs, however many elements there are.
        packed = np.packbits(member, axis=1)
        ones = np.unpackbits(np.arange(256, dtype=np.uint8)[:, None], axis=1).sum(axis=1)

        def meeting(first: IntArray, second: IntArray) -> tuple[IntArray, IntArray]:
            both = np.zeros(np.broadcast_shapes(first.shape, second.shape), dtype=np.int64)
            for byte in packed.T:
                both += ones[byte[first] & byte[second]].astype(np.int64)
            return both, size[first] + size[second] - both

        largest_union = min(len(elements), 2 * int(size.max(initial=0)))
        return self._of_meeting(meeting, size, max(1, largest_union))

    @abstractmethod
    def _of_meeting(self, meeting: _Meeting, size: IntArray, largest_union: int) -> Differences: ...


class Jaccard(_OfSets):
    """δ² = 1 − |A ∩ B|/|A ∪ B| of sets; two empty sets do not differ."""

    name = "jaccard"

    def _of_meeting(self, meeting: _Meeting, size: IntArray, largest_union: int) -> Differences:
        def apart(first: IntArray, second: IntArray) -> tuple[IntArray, IntArray]:
            both, either = meeting(first, second)
            return either - both, np.maximum(either, 1)

        return RationalDifferences(apart, math.lcm(*range(1, largest_union + 1)))


class Masi(_OfSets):
    """δ² = 1 − J M of sets, with J = |A ∩ B|/|A ∪ B|.

    M is 1 for equal sets, 2/3 where one holds the other, 1/3 where they overlap, else 0. Two
    empty sets do not differ.
    """

    name = "masi"

    def _of_meeting(self, meeting: _Meeting, size: IntArray, largest_union: int) -> Differences:
        def apart(first: IntArray, second: IntArray) -> tuple[IntArray, IntArray]:
            both, either = meeting(first, second)
            inside = both == np.minimum(size[first], size[second])
            thirds = np.where(both == either, 3, np.where(inside, 2, 1))
            bottom = np.maximum(3 * either, 1)
            return np.where(either > 0, bottom - both * thirds, 0), bottom

        return RationalDifferences(apart, 3 * math.lcm(*range(1, largest_union + 1)))


class Tree(_OfTexts):
    """δ² = 1 − 2 depth(common ancestor)/(depth a + depth b) of codes such as `transport/ferry`.

    The root above all codes has depth 0, so codes without a common step differ by 1.
    """

    name = "tree"

    def check(self, values: Values) -> list[tuple[int, str]]:
        """Return the codes with nothing between two separators, which is a slip of the keyboard."""
        if self.separator is None or values.texts is None:
            return []
        said = f'has an empty step between two "{self.separator}"'
        return [
            (code, said)
            for code, text in enumerate(values.texts)
            if any(not step.strip() for step in text.split(self.separator)[1:-1])
        ]

    def _bind(self, parts: list[list[str]]) -> Differences:
        depth = np.asarray([len(each) for each in parts], dtype=np.int64)
        deepest = max(1, int(depth.max(initial=0)))
        # step[v, d] names the path of the first d + 1 steps; codes shorter than that get a name of
        # their own, which matches nothing.
        names: dict[tuple[str, ...], int] = {}
        step = -1 - np.tile(np.arange(len(parts)), (deepest, 1)).T
        for code, each in enumerate(parts):
            for d in range(len(each)):
                step[code, d] = names.setdefault(tuple(each[: d + 1]), len(names))

        def apart(first: IntArray, second: IntArray) -> tuple[IntArray, IntArray]:
            shared = np.zeros(np.broadcast_shapes(first.shape, second.shape), dtype=np.int64)
            for d in range(deepest):
                shared += step[first, d] == step[second, d]
            shared = np.where(first == second, depth[first], shared)
            bottom = np.maximum(depth[first] + depth[second], 1)
            return depth[first] + depth[second] - 2 * shared, bottom

        return RationalDifferences(apart, math.lcm(*range(1, 2 * deepest + 1)))


class Table(DifferenceFunction):
    """δ² read from a user's table: symmetric, nothing negative, 0 on the diagonal."""

    name = "table"
    needs = "text"
    compares_every_two = True
    options = ("table",)

    def __init__(self, table: DifferenceTable | None = None) -> None:
        self.table = table

    def with_options(self, options: Mapping[str, object]) -> Self:
        """Take the table, which must have been read."""
        self._check_options(options)
        table = options["table"]
        if not isinstance(table, DifferenceTable):
            raise RelookError(f"the table of differences has not been read; got {table!r}")
        faults = table.faults()
        if faults:
            raise RelookError(
                f"{faults[0][2]}" + ("" if len(faults) == 1 else f" (and {len(faults) - 1} more)")
            )
        return type(self)(table)

    def check(self, values: Values) -> list[tuple[int, str]]:
        """Return the values that the table does not list."""
        if self.table is None or values.texts is None:
            return []
        known = set(self.table.labels)
        return [
            (code, "is not in the table of differences")
            for code, text in enumerate(values.texts)
            if text not in known
        ]

    def bind(self, values: Values, marginals: IntArray) -> Differences:
        """Return the entries over their common denominator."""
        if self.table is None:
            raise self._missing()
        texts = self._texts(values)
        self._refuse_faults(values)
        place = {label: i for i, label in enumerate(self.table.labels)}
        at = np.asarray([place[text] for text in texts], dtype=np.int64)
        entries = self.table.entries
        common = math.lcm(*(entry.denominator for row in entries for entry in row))
        top = [[int(entry * common) for entry in row] for row in entries]
        largest = max((entry for row in top for entry in row), default=0)
        if max(largest, common) >= RationalDifferences.MOST:
            floats = np.asarray([[float(entry) for entry in row] for row in entries])
            return PairwiseDifferences(lambda first, second: floats[at[first], at[second]])
        whole = np.asarray(top, dtype=np.int64)

        def read(first: IntArray, second: IntArray) -> tuple[IntArray, IntArray]:
            found = whole[at[first], at[second]]
            return found, np.full_like(found, common)

        return RationalDifferences(read, common)


def exact_number(given: object, option: str) -> Fraction:
    """Return a number given in an option, exactly as it was written.

    Raises
    ------
    RelookError
        Not a number.
    """
    if isinstance(given, bool) or not isinstance(given, int | float | str | Fraction):
        raise RelookError(f"`{option}` must be a number; got {given!r}", mend=_A_NUMBER)
    try:
        return given if isinstance(given, Fraction) else Fraction(str(given).strip())
    except (ValueError, ZeroDivisionError):
        raise RelookError(f"`{option}` must be a number; got {given!r}", mend=_A_NUMBER) from None


def _plain(number: Fraction) -> str:
    return str(number) if number.denominator == 1 else f"{float(number):g}"
