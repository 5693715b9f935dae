"""What a difference function is, and how bound differences are summed.

A function is *bound* to the values in use and their pairable counts, because ordinal differences
depend on those counts. Bound differences are integers over one common denominator wherever the
function allows, so that sums stay exact until the last step.
"""

from __future__ import annotations

import math
from abc import ABC, abstractmethod
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from fractions import Fraction
from math import lcm
from typing import ClassVar, Literal, Self

import numpy as np

from relook.core.exact import (
    ExactArray,
    FloatArray,
    IntArray,
    dot,
    group_sums,
    largest,
    quotients,
    widened,
)
from relook.core.profiles import Profiles
from relook.errors import RelookError, listed, nearest

#: What a function must know of a value beyond its identity.
Needs = Literal["identity", "order", "number", "text"]


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
    texts : tuple of str or None
        The label that each value stands for; needed for sets, trees and tables.
    """

    n_values: int
    numerators: ExactArray | None = None
    denominator: int = 1
    texts: tuple[str, ...] | None = None

    @classmethod
    def from_texts(cls, texts: Sequence[str]) -> Values:
        """Keep the texts of labels that are words, in the order of their codes."""
        return cls(len(texts), texts=tuple(texts))

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

    def toward_item(self, profiles: Profiles) -> ExactArray | FloatArray:
        """Return Σ_k n_uk δ²_ck × denominator of each profile entry c, shape (n_entries,).

        That is how far one label of that value lies from all the labels of its item; weighted by
        the counts it sums to `within`.
        """
        _, first, second = profiles.value_pairs()
        values, counts = profiles.value_index, profiles.count
        delta = self.numerators(values[first], values[second])
        if not self.exact:
            n = counts.size
            onto_first = np.bincount(first, weights=counts[second] * delta, minlength=n)
            return onto_first + np.bincount(second, weights=counts[first] * delta, minlength=n)
        most = int(profiles.size.max()) if counts.size else 0
        delta = widened(delta, most * largest(delta))
        sums = np.zeros(counts.size, dtype=delta.dtype)
        np.add.at(sums, first, counts[second] * delta)
        np.add.at(sums, second, counts[first] * delta)
        return sums

    def points(self, n_values: int) -> FloatArray | None:
        """Return points whose squared distances are δ², shape (n_values, n_dimensions).

        None where the function has no such points. Sums over pairs then follow from moments.
        """
        return None

    def matrix(self, n_values: int) -> FloatArray:
        """Return δ² as a float array of shape (n_values, n_values)."""
        codes = np.arange(n_values)
        return self.between(codes[:, None], codes[None, :])

    def between(self, first: IntArray, second: IntArray) -> FloatArray:
        """Return δ² of pairs of value codes as floats."""
        return quotients(self.numerators(first, second), self.denominator)


class NominalDifferences(Differences):
    """1 between different values."""

    def numerators(self, first: IntArray, second: IntArray) -> ExactArray:
        """Return 1 where the codes differ."""
        return np.not_equal(first, second).astype(np.int64)

    def pair_sum(self, marginals: IntArray) -> int:
        """Return n² − Σ n_c²."""
        n = int(marginals.sum())
        return n * n - dot(marginals, marginals)

    def toward_item(self, profiles: Profiles) -> ExactArray:
        """Return the number of other values among the labels of the item."""
        return np.asarray(profiles.size[profiles.profile_of_entry] - profiles.count)


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
        _, first, second = self._moments(profiles)
        return np.asarray(2 * (profiles.size * second - first * first))

    def toward_item(self, profiles: Profiles) -> ExactArray:
        """Return m x_c² − 2 x_c Σ n_uk x_k + Σ n_uk x_k² of each entry."""
        if profiles.n_profiles == 0:
            return np.zeros(0, dtype=np.int64)
        x, first, second = self._moments(profiles)
        at = profiles.profile_of_entry
        return np.asarray(profiles.size[at] * x * x - 2 * x * first[at] + second[at])

    def points(self, n_values: int) -> FloatArray:
        """Return the coordinates, measured from the lowest and scaled, in one dimension."""
        x = self.coordinates[:n_values]
        x = x - (x.min() if x.size else 0)
        return quotients(x, 1)[:, None] / math.sqrt(self.denominator)

    def _moments(self, profiles: Profiles) -> tuple[ExactArray, ExactArray, ExactArray]:
        """Return coordinates of the entries, and Σ n x and Σ n x² of the profiles.

        Measured from each profile's lowest value, so that squares stay small.
        """
        begin = profiles.start[:-1]
        x = self.coordinates[profiles.value_index]
        x = x - np.repeat(np.minimum.reduceat(x, begin), profiles.n_distinct)
        most = int(profiles.size.max())
        bound = 4 * (most * largest(x)) ** 2
        x, counts = widened(x, bound), widened(profiles.count, bound)
        first = np.add.reduceat(counts * x, begin)
        second = np.add.reduceat(counts * x * x, begin)
        return x, first, second


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
    needs : {"identity", "order", "number", "text"}
        What must be known of a label beyond its identity.
    moves_with_marginals : bool
        Whether δ² changes when the counts of the values change.
    options : tuple of str
        What the function must be told besides.
    compares_every_two : bool
        Whether D_e needs every two distinct values, so that time grows with their square.
    """

    name: ClassVar[str]
    needs: ClassVar[Needs]
    moves_with_marginals: ClassVar[bool] = False
    compares_every_two: ClassVar[bool] = False
    options: ClassVar[tuple[str, ...]] = ()

    @abstractmethod
    def bind(self, values: Values, marginals: IntArray) -> Differences:
        """Return δ² between the given values.

        Parameters
        ----------
        values : Values
        marginals : int array of shape (n_values,)
            n_c, the pairable labels of each value.
        """

    def with_options(self, options: Mapping[str, object]) -> Self:
        """Return this function told what it must be told.

        Raises
        ------
        RelookError
            An option missing, not known, or of the wrong kind.
        """
        self._check_options(options)
        return self

    def check(self, values: Values) -> list[tuple[int, str]]:
        """Return the values that this function cannot take, each with the reason.

        Returns
        -------
        list of (value code, reason)
            The reason reads on after the label: "-3" "is negative, …".
        """
        return []

    def _check_options(self, options: Mapping[str, object]) -> None:
        """Refuse an option that is missing or not known."""
        for given in options:
            if given not in self.options:
                meant = nearest(given, self.options)
                raise RelookError(
                    f'{self.name} differences have no option "{given}"',
                    mend=f'did you mean "{meant}"?' if meant else self._usage(),
                )
        if any(needed not in options for needed in self.options):
            raise self._missing()

    def _missing(self) -> RelookError:
        return RelookError(
            f"{self.name} differences need {listed(self.options)}", mend=self._usage()
        )

    def _usage(self) -> str:
        if not self.options:
            return f"leave the option out; {self.name} differences take none"
        return f"declare {listed(self.options)} for the variable"

    def _numbers(self, values: Values) -> ExactArray:
        if values.numerators is None:
            raise RelookError(f"{self.name} differences need numbers")
        return values.numerators

    def _texts(self, values: Values) -> tuple[str, ...]:
        if values.texts is None:
            raise RelookError(f"{self.name} differences need the texts of the labels")
        return values.texts

    def _refuse_faults(self, values: Values) -> None:
        """Refuse values that `check` finds fault with."""
        faults = self.check(values)
        if not faults:
            return
        code, reason = faults[0]
        if values.texts is not None:
            label = f'"{values.texts[code]}"'
        else:
            label = str(Fraction(int(self._numbers(values)[code]), values.denominator))
        more = "" if len(faults) == 1 else f" (and {len(faults) - 1:,} more)"
        raise RelookError(f"{self.name} differences: {label} {reason}{more}")
