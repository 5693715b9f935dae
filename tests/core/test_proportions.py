"""Intervals for proportions against published rows, scipy and simulation."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.stats import binomtest, hypergeom

from relook.core.proportions import exact_interval, weighted_interval, wilson_interval
from relook.errors import RelookError


@pytest.mark.parametrize(
    ("found", "n", "low", "high"),
    # Newcombe, R. G. (1998). Statistics in Medicine 17:857-872, Table I, method 3; 4 decimals.
    [
        (81, 263, 0.2553, 0.3662),
        (15, 148, 0.0624, 0.1605),
        (0, 20, 0.0, 0.1611),
        (1, 29, 0.0061, 0.1718),
    ],
)
def test_wilson_gives_the_published_rows(found: int, n: int, low: float, high: float) -> None:
    """Newcombe's four examples, to the four decimals printed."""
    assert wilson_interval(found, n) == pytest.approx((low, high), abs=5e-5)


@pytest.mark.parametrize("n", [1, 2, 7, 30, 200])
@pytest.mark.parametrize("level", [0.8, 0.95, 0.99])
def test_wilson_equals_scipy(n: int, level: float) -> None:
    """binomtest(...).proportion_ci(method="wilson") for every count."""
    for found in range(0, n + 1, max(1, n // 9)):
        want = binomtest(found, n).proportion_ci(confidence_level=level, method="wilson")
        got = wilson_interval(found, n, confidence_level=level)
        assert got == pytest.approx((want.low, want.high), abs=1e-12)


@pytest.mark.parametrize(
    ("found", "n", "low", "high"),
    # Newcombe (1998), Table I, method 5; 4 decimals.
    [
        (81, 263, 0.2527, 0.3676),
        (15, 148, 0.0578, 0.1617),
        (0, 20, 0.0, 0.1684),
        (1, 29, 0.0009, 0.1776),
    ],
)
def test_the_exact_interval_of_a_large_set_gives_the_published_rows(
    found: int, n: int, low: float, high: float
) -> None:
    """Newcombe's four examples of Clopper and Pearson's interval, to the four decimals printed.

    They are of an endless population; of ten million the limits are the same to 1e-5.
    """
    assert exact_interval(found, n, 10**7) == pytest.approx((low, high), abs=6e-5)


@pytest.mark.parametrize("n", [1, 2, 30, 500])
def test_the_exact_interval_of_a_large_set_is_the_binomial_one(n: int) -> None:
    """binomtest(...).proportion_ci(method="exact"), from a set of a hundred million, to 1e-6."""
    for found in range(0, n + 1, max(1, n // 5)):
        want = binomtest(found, n).proportion_ci(method="exact")
        got = exact_interval(found, n, 10**8)
        assert got == pytest.approx((want.low, want.high), abs=1e-5)


@pytest.mark.parametrize("size", [1, 2, 7, 30, 61])
@pytest.mark.parametrize("level", [0.8, 0.95])
def test_the_exact_interval_inverts_the_hypergeometric_tails(size: int, level: float) -> None:
    """Every draw from a small set: the least and the most marked ones that scipy's tails allow."""
    each = (1 - level) / 2
    for n in range(1, size + 1, max(1, size // 6)):
        for found in range(n + 1):
            held = [
                k
                for k in range(found, size - (n - found) + 1)
                if min(hypergeom.sf(found - 1, size, k, n), hypergeom.cdf(found, size, k, n)) > each
            ]
            want = (held[0] / size, held[-1] / size)
            assert exact_interval(found, n, size, confidence_level=level) == want


def test_a_whole_set_is_certain() -> None:
    """Once all are drawn the share is known; half of ten clean leave at most three (by scipy)."""
    assert exact_interval(2, 9, 9) == (2 / 9, 2 / 9)
    assert hypergeom.cdf(0, 10, 3, 5) > 0.025 > hypergeom.cdf(0, 10, 4, 5)
    assert exact_interval(0, 5, 10) == (0, 0.3)


def test_one_stratum_has_its_own_interval() -> None:
    """The weighted interval of a single stratum is the exact one."""
    low, high = exact_interval(3, 40, 90)
    assert weighted_interval([3], [40], [90]) == pytest.approx((3 / 40, low, high), abs=1e-15)


def test_the_weighted_share_is_the_weighted_mean() -> None:
    """Two strata by hand: .75 × 1/10 + .25 × 1/2 = .2, and limits on either side of it."""
    share, low, high = weighted_interval([1, 5], [10, 10], [75, 25])
    assert share == pytest.approx(0.2, abs=1e-15)
    assert 6 / 100 <= low < share < high <= 1 - 14 / 100


def test_what_was_seen_bounds_the_weighted_interval() -> None:
    """One found among many: at least that one is there, and at least the clean ones are not."""
    share, low, high = weighted_interval([1, 0], [18, 3], [20, 4])
    assert low == 1 / 24 < share
    assert high <= 1 - 20 / 24


@pytest.mark.parametrize(
    ("sizes", "otherwise", "draws"),
    [
        ((800, 150, 50), (24, 30, 5), (30, 10, 5)),
        ((6000, 3000, 1000), (60, 900, 200), (40, 20, 5)),
        ((90, 10), (0, 4), (40, 5)),
        ((100, 100), (10, 10), (60, 60)),
        ((60, 40, 12), (3, 8, 2), (20, 20, 6)),
        ((37, 20, 48), (4, 2, 1), (28, 20, 21)),
        ((64, 33, 19), (1, 1, 1), (32, 33, 4)),
    ],
)
def test_the_weighted_interval_covers(
    sizes: tuple[int, ...], otherwise: tuple[int, ...], draws: tuple[int, ...]
) -> None:
    """A 95 % interval holds the truth in at least 94 % of 3,000 simulated audits (seed 11)."""
    rng = np.random.default_rng(11)
    truth = sum(otherwise) / sum(sizes)
    covered = 0
    rest = np.subtract(sizes, otherwise)
    outcomes, often = np.unique(
        rng.hypergeometric(otherwise, rest, draws, size=(3000, len(draws))),
        axis=0,
        return_counts=True,
    )
    for found, times in zip(outcomes.tolist(), often.tolist(), strict=True):
        _, low, high = weighted_interval(found, draws, sizes)
        covered += times * (low - 1e-12 <= truth <= high + 1e-12)
    assert covered / 3000 >= 0.94


def test_impossible_counts_are_refused() -> None:
    """No items, or more findings than items."""
    for found, n in [(0, 0), (3, 2), (-1, 4)]:
        with pytest.raises(RelookError, match="0 <= found <= n"):
            wilson_interval(found, n)
        with pytest.raises(RelookError, match="0 <= found <= n"):
            exact_interval(found, n, 10)
    with pytest.raises(RelookError, match="11 cannot be drawn from 10"):
        exact_interval(0, 11, 10)
