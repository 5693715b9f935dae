"""The difference functions δ²(c, k), one class each and one table of them.

Laws that every function keeps, and that the tests check for all of them: δ²(c, c) = 0,
δ²(c, k) = δ²(k, c) ≥ 0. Which maps of the labels leave alpha unchanged differs: any renaming
(nominal), any increasing map (ordinal), a + bx (interval), bx with b > 0 (ratio).

A function is *bound* to the values in use and their pairable counts, because ordinal differences
depend on those counts. Bound differences are integers over one common denominator wherever the
function allows, so that sums stay exact until the last step.

References
----------
Krippendorff, K. (2004). Content Analysis, 2nd ed., ch. 11. Krippendorff, K. (2011). Computing
Krippendorff's Alpha-Reliability. University of Pennsylvania.
"""

from __future__ import annotations

from abc import ABC, abstractmethod
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from fractions import Fraction
from math import lcm
from typing import ClassVar, Literal

import numpy as np

from relook.core.exact import ExactArray, FloatArray, IntArray, dot, group_sums, largest, widened
from relook.core.profiles import Profiles
from relook.errors import RelookError

#: What a function must know of a value beyond its identity.
Needs = Literal["identity", "order", "number"]


@dataclass(frozen=True, slots=True, eq=False)
class Values:
    """What the value codes of a variable stand for.

    Attributes
    ----------
    n_values : int
        Codes run from 0 to n_values - 1; for ordinal variables in the order of the labels.
    numerators : int array of shape (n_values,) or None
        The number that each value stands for, times `denominator`; None where labels are words.
    denominator : int
    """

    n_values: int
    numerators: ExactArray | None = None
    denominator: int = 1

    @classmethod
    def from_numbers(cls, numbers: Sequence[Fraction | int]) -> Values:
        """Put exact numbers over their common denominator.

        Parameters
        ----------
        numbers : sequence of Fraction or int, length n_values
        """
        fractions = [Fraction(number) for number in numbers]
        denominator = lcm(*(number.denominator for number in fractions)) if fractions else 1
        exact = [number.numerator * (denominator // number.denominator) for number in fractions]
        whole = np.array(exact, dtype=object)
        return cls(len(exact), widened(whole, 4 * largest(whole)), denominator)

    def numbers(self) -> FloatArray:
        """The numbers as floats, shape (n_values,).

        Raises
        ------
        RelookError
            The labels are words.
        """
        if self.numerators is None:
            raise RelookError("these labels are words, not numbers")
        return np.asarray(
            [int(top) / self.denominator for top in self.numerators], dtype=np.float64
        )


class Differences(ABC):
    """δ² between value codes, bound to the values in use and their counts.

    Attributes
    ----------
    exact : bool
        Whether the numerators are integers.
    denominator : int
        δ² is a numerator over this; 1 where not exact.
    """

    exact: bool = True
    denominator: int = 1

    @abstractmethod
    def numerators(self, first: IntArray, second: IntArray) -> ExactArray | FloatArray:
        """Return δ² × denominator of pairs of value codes, elementwise and broadcast."""

    @abstractmethod
    def pair_sum(self, marginals: IntArray) -> int | float:
        """Return Σ_ck n_c n_k δ²_ck × denominator over all ordered pairs of values.

        Parameters
        ----------
        marginals : int array of shape (n_values,)
            n_c, the pairable labels of each value.
        """

    def within(self, profiles: Profiles) -> ExactArray | FloatArray:
        """Return Σ_ck n_uc n_uk δ²_ck × denominator of each profile, shape (n_profiles,)."""
        profile, first, second = profiles.value_pairs()
        values, counts = profiles.value_index, profiles.count
        delta = self.numerators(values[first], values[second])
        if not self.exact:
            weighted = 2.0 * counts[first] * counts[second] * delta
            return np.bincount(profile, weights=weighted, minlength=profiles.n_profiles)
        most = int(counts.max()) if counts.size else 0
        delta = widened(delta, 2 * most * most * largest(delta))
        weighted = 2 * counts[first] * counts[second] * delta
        sums = np.zeros(profiles.n_profiles, dtype=weighted.dtype)
        if profile.size:
            begins = np.flatnonzero(np.diff(profile, prepend=-1))
            runs = np.append(begins, profile.size)
            summed = group_sums(weighted, runs)
            sums = sums.astype(summed.dtype)
            sums[profile[begins]] = summed
        return sums

    def matrix(self, n_values: int) -> FloatArray:
        """Return δ² as a float array of shape (n_values, n_values)."""
        codes = np.arange(n_values)
        return np.asarray(
            self.numerators(codes[:, None], codes[None, :]).astype(np.float64) / self.denominator
        )

    def between(self, first: IntArray, second: IntArray) -> FloatArray:
        """Return δ² of pairs of value codes as floats."""
        return np.asarray(self.numerators(first, second).astype(np.float64) / self.denominator)


class NominalDifferences(Differences):
    """1 between different values."""

    def numerators(self, first: IntArray, second: IntArray) -> ExactArray:
        """Return 1 where the codes differ."""
        return np.not_equal(first, second).astype(np.int64)

    def pair_sum(self, marginals: IntArray) -> int:
        """Return n² − Σ n_c²."""
        n = int(marginals.sum())
        return n * n - dot(marginals, marginals)


class CoordinateDifferences(Differences):
    """(x_c − x_k)² for an integer coordinate x of each value.

    Σ_ck n_c n_k (x_c − x_k)² = 2 (n Σ n_c x_c² − (Σ n_c x_c)²), so sums never need the pairs.
    """

    def __init__(self, coordinates: ExactArray, denominator: int) -> None:
        self.coordinates = coordinates
        self.denominator = denominator

    def numerators(self, first: IntArray, second: IntArray) -> ExactArray:
        """Return the squared distance of the coordinates."""
        reach = 2 * largest(self.coordinates)
        x = widened(self.coordinates, reach * reach)
        step = x[first] - x[second]
        return np.asarray(step * step)

    def pair_sum(self, marginals: IntArray) -> int:
        """Return the sum over ordered pairs from the first two moments."""
        x = self.coordinates - (self.coordinates.min() if self.coordinates.size else 0)
        n = int(marginals.sum())
        first = dot(marginals, x)
        squares = widened(x, largest(x) ** 2) ** 2
        return 2 * (n * dot(marginals, squares) - first * first)

    def within(self, profiles: Profiles) -> ExactArray:
        """Return the sums within each profile from its first two moments."""
        if profiles.n_profiles == 0:
            return np.zeros(0, dtype=np.int64)
        # Measured from the profile's lowest value, so that squares stay small.
        x = self.coordinates[profiles.value_index]
        lowest = np.minimum.reduceat(x, profiles.start[:-1])
        x = x - np.repeat(lowest, profiles.n_distinct)
        most = int(profiles.size.max())
        bound = 2 * (most * largest(x)) ** 2
        x, counts = widened(x, bound), widened(profiles.count, bound)
        first = np.add.reduceat(counts * x, profiles.start[:-1])
        second = np.add.reduceat(counts * x * x, profiles.start[:-1])
        return np.asarray(2 * (profiles.size * second - first * first))


class PairwiseDifferences(Differences):
    """Any function of two value codes, in floats.

    Expected disagreement then needs all pairs of distinct values; they are taken in blocks, so that
    memory stays bounded.
    """

    exact = False
    BLOCK = 2_000_000

    def __init__(self, function: Callable[[IntArray, IntArray], FloatArray]) -> None:
        self.function = function

    def numerators(self, first: IntArray, second: IntArray) -> FloatArray:
        """Return δ² itself."""
        return self.function(first, second)

    def pair_sum(self, marginals: IntArray) -> float:
        """Return the sum over ordered pairs, block by block of rows."""
        used = np.flatnonzero(marginals)
        weights = marginals[used].astype(np.float64)
        rows = max(1, self.BLOCK // max(1, used.size))
        total = 0.0
        for begin in range(0, used.size, rows):
            block = used[begin : begin + rows]
            delta = self.function(block[:, None], used[None, :])
            total += float(weights[begin : begin + rows] @ delta @ weights)
        return total


class DifferenceFunction(ABC):
    """A level of measurement: which δ² its labels call for.

    Attributes
    ----------
    name : str
        As written in relook.toml.
    needs : {"identity", "order", "number"}
        What must be known of a label beyond its identity.
    moves_with_marginals : bool
        Whether δ² changes when the counts of the values change.
    """

    name: ClassVar[str]
    needs: ClassVar[Needs]
    moves_with_marginals: ClassVar[bool] = False

    @abstractmethod
    def bind(self, values: Values, marginals: IntArray) -> Differences:
        """Return δ² between the given values.

        Parameters
        ----------
        values : Values
        marginals : int array of shape (n_values,)
            n_c, the pairable labels of each value.
        """


class Nominal(DifferenceFunction):
    """δ² = 1 for different labels (Krippendorff 2011, section on metric differences)."""

    name = "nominal"
    needs = "identity"

    def bind(self, values: Values, marginals: IntArray) -> Differences:
        """Return unit differences."""
        return NominalDifferences()


def doubled_midranks(marginals: IntArray) -> IntArray:
    """Return twice the midrank of each value among the pairable labels, less 1.

    Parameters
    ----------
    marginals : int array of shape (..., n_values)
        n_g of the values in rank order.

    Notes
    -----
    The midrank of value c is Σ_{g<c} n_g + (n_c + 1)/2; doubling keeps it an integer.
    """
    below = np.cumsum(marginals, axis=-1) - marginals
    return np.asarray(2 * below + marginals)


class Ordinal(DifferenceFunction):
    """δ² = (Σ_{g=c..k} n_g − (n_c + n_k)/2)², the squared distance of midranks (2004, p. 232).

    The counts are those of pairable labels only.
    """

    name = "ordinal"
    needs = "order"
    moves_with_marginals = True

    def bind(self, values: Values, marginals: IntArray) -> Differences:
        """Return squared distances of doubled midranks over 4."""
        return CoordinateDifferences(doubled_midranks(marginals.astype(np.int64)), 4)


class Interval(DifferenceFunction):
    """δ² = (c − k)²."""

    name = "interval"
    needs = "number"

    def bind(self, values: Values, marginals: IntArray) -> Differences:
        """Return squared distances of the numbers over their common denominator."""
        if values.numerators is None:
            raise RelookError("interval differences need numbers")
        return CoordinateDifferences(values.numerators, values.denominator**2)


class Ratio(DifferenceFunction):
    """δ² = ((c − k)/(c + k))² for labels of 0 or more; 0 against 0 is 0."""

    name = "ratio"
    needs = "number"

    def bind(self, values: Values, marginals: IntArray) -> Differences:
        """Return squared relative differences."""
        x = values.numbers()
        if x.size and float(x.min()) < 0:
            raise RelookError("ratio differences need numbers of 0 or more")

        def relative(first: IntArray, second: IntArray) -> FloatArray:
            total = x[first] + x[second]
            step = x[first] - x[second]
            # Only 0 against 0 has a total of 0, and its step is 0 too.
            return np.asarray((step / np.where(total > 0, total, 1.0)) ** 2)

        return PairwiseDifferences(relative)


#: Every level of measurement by its name in relook.toml. A new function is a class and a row here.
DIFFERENCE_FUNCTIONS: dict[str, DifferenceFunction] = {
    function.name: function for function in (Nominal(), Ordinal(), Interval(), Ratio())
}
