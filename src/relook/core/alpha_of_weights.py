"""Alpha of many weightings of the same profiles at once.

A resample is a weighting: how often each label profile was drawn. Everything is linear algebra over
profiles, so that thousands of resamples cost a few matrix products.
"""

from __future__ import annotations

import numpy as np

from relook.core.agreement import Agreement
from relook.core.difference_base import Differences, NominalDifferences
from relook.core.exact import BoolArray, FloatArray, quotients
from relook.core.sparse import SparseCounts

#: Values up to which δ² between all of them is kept as a table (72 MB).
MOST_TABLED_VALUES = 3_000
#: Values beyond which a function that compares every two of them is not resampled: each resample
#: would take some 25 million differences.
MOST_RESAMPLED_VALUES = 5_000
TOO_MANY_VALUES = (
    f"with more than {MOST_RESAMPLED_VALUES:,} distinct labels, comparing every two of them in "
    "each resample takes too long"
)


class AlphaOfWeights:
    """Alpha as a function of how often each profile of one agreement counts.

    Attributes
    ----------
    width : int
        Numbers held per weighting while it is worked on, for the choice of block sizes.
    """

    def __init__(self, agreement: Agreement) -> None:
        profiles = agreement.profiles
        self._profiles = profiles
        self._moves = agreement.function.moves_with_marginals
        self._differences = agreement.differences
        self._pairable = (profiles.size >= 2).astype(np.float64)[:, None]
        self._size = profiles.size.astype(np.float64)[:, None]
        at, counts = profiles.profile_of_entry, profiles.count.astype(np.float64)
        shape = (profiles.n_profiles, profiles.n_values)
        self._values_of_profiles = SparseCounts(at, profiles.value_index, counts, *shape)
        self._profiles_of_values = SparseCounts.from_entries(
            profiles.value_index, at, counts, *reversed(shape)
        )
        alone = np.flatnonzero(profiles.n_distinct == 1)
        value = profiles.value_index[profiles.start[:-1][alone]]
        used, row = np.unique(value, return_inverse=True)
        self._unanimous = SparseCounts.from_entries(
            row, alone, np.ones(alone.size), used.size, profiles.n_profiles
        )
        within = quotients(agreement.within, agreement.differences.denominator)
        self._within = within / np.maximum(profiles.size - 1, 1)
        self._points = self._centred_points(agreement)
        self._tabled = self._table(agreement.differences)
        tables = [self._profiles_of_values, self._unanimous]
        if self._moves:
            tables.append(self._values_of_profiles)
        self.width = max(1, *(table.n_terms for table in tables))

    @property
    def takes_too_long(self) -> bool:
        """Whether there are too many values to compare every two of them time and again."""
        return (
            self._tabled is None
            and self._points is None
            and not self._moves
            and not isinstance(self._differences, NominalDifferences)
            and self._profiles.n_values > MOST_RESAMPLED_VALUES
        )

    def alphas(self, weights: FloatArray) -> FloatArray:
        """Return alpha of each weighting; nan where it is undefined.

        Parameters
        ----------
        weights : float array of shape (n_profiles, n_weightings)
            Whole numbers. Profiles of one label do not count.
        """
        weights = weights * self._pairable
        n = (weights * self._size).sum(axis=0)
        if self._moves:
            observed, expected = self._ordinal(weights, n)
        else:
            observed, expected = self._within @ weights, self._expected(weights, n)
        defined = (n > 0) & (expected > 0) & ~self._all_the_same(weights)
        alphas = np.full(n.size, np.nan)
        # α = 1 − (observed/n) / (expected/(n (n − 1)))
        ratio = observed[defined] * (n[defined] - 1) / expected[defined]
        alphas[defined] = 1 - ratio
        return alphas

    def _all_the_same(self, weights: FloatArray) -> BoolArray:
        """Whether every drawn label is the same; told from counts, so that no rounding enters."""
        most = self._unanimous.times(weights).max(axis=0, initial=0.0)
        return np.asarray(most == weights.sum(axis=0))

    def _expected(self, weights: FloatArray, n: FloatArray) -> FloatArray:
        """Σ_ck n_c n_k δ²_ck of each weighting."""
        if self._points is not None:
            return self._from_points(weights, n)
        marginals = self._profiles_of_values.times(weights)
        if isinstance(self._differences, NominalDifferences):
            return np.asarray(n * n - (marginals * marginals).sum(axis=0))
        if self._tabled is not None:
            return np.asarray((marginals * (self._tabled @ marginals)).sum(axis=0))
        total = np.zeros(n.size)
        codes = np.arange(self._profiles.n_values)
        rows = max(1, 2_000_000 // codes.size)
        for begin in range(0, codes.size, rows):
            block = codes[begin : begin + rows]
            delta = self._differences.between(block[:, None], codes[None, :])
            total += (marginals[block] * (delta @ marginals)).sum(axis=0)
        return total

    def _from_points(self, weights: FloatArray, n: FloatArray) -> FloatArray:
        """2 (n Σ |x|² − |Σ x|²) for labels at points x; no pair of values is visited."""
        assert self._points is not None
        sums, squares = self._points
        total = sums @ weights
        return np.asarray(2 * (n * (squares @ weights) - (total * total).sum(axis=0)))

    def _ordinal(self, weights: FloatArray, n: FloatArray) -> tuple[FloatArray, FloatArray]:
        """Observed and expected sums with midranks of each weighting's own counts.

        With midranks x, Σ_ck n_uc n_uk (x_c − x_k)² = 2 (m Σ n_uc x_c² − (Σ n_uc x_c)²).
        """
        marginals = self._profiles_of_values.times(weights)
        x = np.cumsum(marginals, axis=0) - marginals / 2 - n / 2
        share = weights / np.maximum(self._size - 1, 1)
        squares = self._profiles_of_values.times(share * self._size)
        sums = self._values_of_profiles.times(x)
        observed = 2 * ((squares * x * x).sum(axis=0) - (share * sums * sums).sum(axis=0))
        # Midranks are centred, so their first moment is 0.
        return observed, 2 * n * (marginals * x * x).sum(axis=0)

    def _centred_points(self, agreement: Agreement) -> tuple[FloatArray, FloatArray] | None:
        """Σ x and Σ |x|² of each profile, x measured from the mean of all labels."""
        profiles = self._profiles
        points = None if self._moves else self._differences.points(profiles.n_values)
        if points is None:
            return None
        counts = agreement.marginals
        points = points - (counts @ points) / max(int(counts.sum()), 1)
        sums = self._values_of_profiles.times(points)
        squares = self._values_of_profiles.times((points * points).sum(axis=1)[:, None])
        return np.ascontiguousarray(sums.T), squares[:, 0]

    def _table(self, differences: Differences) -> FloatArray | None:
        n_values = self._profiles.n_values
        closed = self._moves or isinstance(differences, NominalDifferences)
        if closed or self._points is not None or n_values > MOST_TABLED_VALUES:
            return None
        return differences.matrix(n_values)
