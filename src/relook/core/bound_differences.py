"""Bound differences of the further functions: points on a circle, and fractions."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from relook.core.difference_base import Differences, PairwiseDifferences
from relook.core.exact import ExactArray, FloatArray, IntArray, dot
from relook.core.profiles import Profiles


class CircularDifferences(Differences):
    """sin²(π (x_c − x_k)) for places x on a circle of circumference 1.

    Notes
    -----
    With h = 1 − cos 2πx and s = sin 2πx, measured from any place of the circle,
    Σ_ck n_c n_k sin²(π (x_c − x_k)) = (2 n H − H² − S²)/2, H = Σ n_c h_c and S = Σ n_c s_c. Unlike
    sums of cosines this does not cancel where all labels lie close together, and it is exactly 0
    where all are the same.
    """

    exact = False

    def __init__(self, places: FloatArray) -> None:
        self.places = places

    def numerators(self, first: IntArray, second: IntArray) -> FloatArray:
        """Return δ² itself."""
        return np.asarray(np.sin(np.pi * (self.places[first] - self.places[second])) ** 2)

    def pair_sum(self, marginals: IntArray) -> float:
        """Return the sum over ordered pairs from moments about the first value in use."""
        used = np.flatnonzero(marginals)
        if used.size == 0:
            return 0.0
        n = float(marginals.sum())
        h, s = _on_circle(self.places[used] - self.places[used[0]])
        height, side = float(marginals[used] @ h), float(marginals[used] @ s)
        return max(0.0, (2 * n * height - height**2 - side**2) / 2)

    def within(self, profiles: Profiles) -> FloatArray:
        """Return the sums within each profile from moments about its first value."""
        if profiles.n_profiles == 0:
            return np.zeros(0)
        _, _, height, side = self._moments(profiles)
        return np.maximum(0.0, (2 * profiles.size * height - height**2 - side**2) / 2)

    def toward_item(self, profiles: Profiles) -> FloatArray:
        """Return (H + m h_c − h_c H − s_c S)/2 of each entry."""
        if profiles.n_profiles == 0:
            return np.zeros(0)
        h, s, height, side = self._moments(profiles)
        at = profiles.profile_of_entry
        sums = height[at] + profiles.size[at] * h - h * height[at] - s * side[at]
        return np.maximum(0.0, sums / 2)

    def points(self, n_values: int) -> FloatArray:
        """Return points on a circle of diameter 1, shape (n_values, 2)."""
        turn = 2 * np.pi * self.places[:n_values]
        return np.stack([np.cos(turn), np.sin(turn)], axis=1) / 2

    def _moments(self, profiles: Profiles) -> tuple[FloatArray, FloatArray, FloatArray, FloatArray]:
        """Return h and s of the entries, and their sums over the labels of each profile."""
        begin = profiles.start[:-1]
        x = self.places[profiles.value_index]
        h, s = _on_circle(x - np.repeat(x[begin], profiles.n_distinct))
        return (
            h,
            s,
            np.add.reduceat(profiles.count * h, begin),
            np.add.reduceat(profiles.count * s, begin),
        )


class RationalDifferences(PairwiseDifferences):
    """Fractions of small integers, over one common denominator as long as that stays small.

    Attributes
    ----------
    exact : bool
        Whether the common denominator is small enough for integers.
    """

    #: Common denominators from here on would make sums of counts overflow.
    MOST = 2**31

    def __init__(
        self,
        fraction: Callable[[IntArray, IntArray], tuple[IntArray, IntArray]],
        common: int,
    ) -> None:
        self.fraction = fraction
        self.exact = common < self.MOST
        self.denominator = common if self.exact else 1

    def numerators(self, first: IntArray, second: IntArray) -> ExactArray | FloatArray:
        """Return δ² × denominator."""
        top, bottom = self.fraction(first, second)
        if self.exact:
            return np.asarray(top * (self.denominator // bottom))
        return np.asarray(top / bottom, dtype=np.float64)

    def pair_sum(self, marginals: IntArray) -> int | float:
        """Return the sum over ordered pairs, block by block of rows."""
        used = np.flatnonzero(marginals)
        counts = marginals[used]
        rows = max(1, self.BLOCK // max(1, used.size))
        total: int | float = 0
        for begin in range(0, used.size, rows):
            block = used[begin : begin + rows]
            delta = self.numerators(block[:, None], used[None, :])
            weights = counts[begin : begin + rows]
            if self.exact:
                # Below 2**31 times the number of labels, so a row cannot wrap round.
                total += dot(weights, delta @ counts)
            else:
                total += float(weights @ (delta @ counts))
        return total


def _on_circle(turn: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Return 1 − cos 2πx and sin 2πx."""
    return 2 * np.sin(np.pi * turn) ** 2, np.sin(2 * np.pi * turn)
