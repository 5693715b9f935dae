"""Intervals for proportions against published rows, scipy and simulation."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.stats import binomtest

from relook.core.proportions import (
    clean_bound,
    exact_interval,
    weighted_interval,
    wilson_interval,
)
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
def test_the_exact_interval_gives_the_published_rows(
    found: int, n: int, low: float, high: float
) -> None:
    """Newcombe's four examples of Clopper and Pearson's interval, to the four decimals printed."""
    assert exact_interval(found, n) == pytest.approx((low, high), abs=5e-5)


@pytest.mark.parametrize("n", [1, 2, 30, 500])
def test_the_exact_interval_equals_scipy(n: int) -> None:
    """binomtest(...).proportion_ci(method="exact") to 1e-9."""
    for found in range(0, n + 1, max(1, n // 5)):
        want = binomtest(found, n).proportion_ci(method="exact")
        assert exact_interval(found, n) == pytest.approx((want.low, want.high), abs=1e-9)


def test_one_stratum_has_its_own_interval() -> None:
    """The weighted interval of a single stratum is the exact one."""
    low, high = exact_interval(3, 40)
    assert weighted_interval([3], [40], [1.0]) == pytest.approx((3 / 40, low, high), abs=1e-15)


def test_the_weighted_share_is_the_weighted_mean() -> None:
    """Two strata by hand: .75 × 1/10 + .25 × 1/2 = .2, and limits on either side of it."""
    share, low, high = weighted_interval([1, 5], [10, 10], [0.75, 0.25])
    assert share == pytest.approx(0.2, abs=1e-15)
    assert 0 < low < share < high < 1


@pytest.mark.parametrize(
    ("weights", "rates", "draws"),
    [
        ((0.8, 0.15, 0.05), (0.03, 0.2, 0.1), (30, 10, 5)),
        ((0.6, 0.3, 0.1), (0.01, 0.3, 0.2), (40, 20, 5)),
        ((0.9, 0.1), (0.0, 0.4), (40, 10)),
        ((0.5, 0.5), (0.1, 0.1), (60, 60)),
    ],
)
def test_the_weighted_interval_covers(
    weights: tuple[float, ...], rates: tuple[float, ...], draws: tuple[int, ...]
) -> None:
    """A 95 % interval holds the truth in at least 94 % of 3,000 simulated audits (seed 11)."""
    rng = np.random.default_rng(11)
    truth = float(np.dot(weights, rates))
    covered = 0
    outcomes, often = np.unique(
        rng.binomial(draws, rates, size=(3000, len(draws))), axis=0, return_counts=True
    )
    for found, times in zip(outcomes.tolist(), often.tolist(), strict=True):
        _, low, high = weighted_interval(found, draws, weights)
        covered += times * (low <= truth <= high)
    assert covered / 3000 >= 0.94


@pytest.mark.parametrize(("n", "bound"), [(10, 0.2589), (59, 0.0495), (1, 0.95)])
def test_a_clean_audit_bounds_the_share(n: int, bound: float) -> None:
    """Below 26 % for 10, below 5 % for 59; equals scipy's one-sided exact limit."""
    assert clean_bound(n) == pytest.approx(bound, abs=5e-5)
    exact = binomtest(0, n, alternative="less").proportion_ci(0.95, method="exact").high
    assert clean_bound(n) == pytest.approx(exact, abs=1e-12)


def test_impossible_counts_are_refused() -> None:
    """No items, or more findings than items."""
    for found, n in [(0, 0), (3, 2), (-1, 4)]:
        with pytest.raises(RelookError, match="0 <= found <= n"):
            wilson_interval(found, n)
    with pytest.raises(RelookError, match="must be 1 or more"):
        clean_bound(0)
