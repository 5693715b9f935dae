"""Intervals for proportions, single and over strata.

References
----------
Wilson, E. B. (1927). Probable inference, the law of succession, and statistical inference. Journal
of the American Statistical Association 22:209–212. Clopper, C. J. & Pearson, E. S. (1934). The use
of confidence or fiducial limits illustrated in the case of the binomial. Biometrika 26:404–413.
Newcombe, R. G. (1998). Two-sided confidence
intervals for the single proportion: comparison of seven methods. Statistics in Medicine 17:857–872.
Zou, G. Y., Huang, W., Zhang, X. (2009). A note on confidence interval estimation for a linear
function of binomial proportions. Computational Statistics & Data Analysis 53:1080–1085.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from math import exp, lgamma, log, log1p, sqrt
from statistics import NormalDist

from relook.errors import RelookError


def wilson_interval(found: int, n: int, *, confidence_level: float = 0.95) -> tuple[float, float]:
    """Return Wilson's score interval for a proportion.

    Parameters
    ----------
    found, n : int
        `found` of `n`, n 1 or more.
    confidence_level : float
        Two-sided.

    Returns
    -------
    low, high : float

    Raises
    ------
    RelookError
        n below 1, or `found` not from 0 to n.

    Notes
    -----
    (2np + z² ± z √(z² + 4np(1 − p)))/(2(n + z²)), Wilson (1927, p. 210); method 3 of Newcombe
    (1998).
    """
    _check(found, n)
    z = NormalDist().inv_cdf((1 + confidence_level) / 2)
    middle = 2 * found + z * z
    reach = z * sqrt(z * z + 4 * found * (n - found) / n)
    below = 2 * (n + z * z)
    low = 0.0 if found == 0 else (middle - reach) / below
    high = 1.0 if found == n else (middle + reach) / below
    return low, high


def exact_interval(found: int, n: int, *, confidence_level: float = 0.95) -> tuple[float, float]:
    """Return the exact interval for a proportion, which covers at least as stated.

    Parameters
    ----------
    found, n : int
        `found` of `n`, n 1 or more.
    confidence_level : float
        Two-sided.

    Notes
    -----
    The shares at which finding so many or more, and so few or fewer, would have half of the error
    probability each (Clopper & Pearson 1934).
    """
    _check(found, n)
    each = (1 - confidence_level) / 2
    low = 0.0 if found == 0 else _share_where(lambda p: 1 - _at_most(found - 1, n, p) >= each)
    high = 1.0 if found == n else _share_where(lambda p: _at_most(found, n, p) <= each)
    return low, high


def weighted_interval(
    found: Sequence[int],
    n: Sequence[int],
    weights: Sequence[float],
    *,
    confidence_level: float = 0.95,
) -> tuple[float, float, float]:
    """Return Σ W_h p_h over strata with an interval.

    Parameters
    ----------
    found, n : sequences of int
        By stratum, each n 1 or more.
    weights : sequence of float
        W_h, 0 or more, adding up to 1.
    confidence_level : float
        Two-sided.

    Returns
    -------
    share, low, high : float

    Notes
    -----
    The distances of the strata's own limits l_h, u_h are added up as variances (Zou, Huang & Zhang
    2009): low = p − √(Σ W_h² (p_h − l_h)²), high = p + √(Σ W_h² (u_h − p_h)²). The limits are the
    exact ones: with Wilson's, and the few findings of an audit, the interval covers less than it
    states. With one stratum this is `exact_interval`.
    """
    share = below = above = 0.0
    for x, k, weight in zip(found, n, weights, strict=True):
        low, high = exact_interval(x, k, confidence_level=confidence_level)
        p = x / k
        share += weight * p
        below += (weight * (p - low)) ** 2
        above += (weight * (high - p)) ** 2
    return share, max(0.0, share - sqrt(below)), min(1.0, share + sqrt(above))


def clean_bound(n: int, *, confidence_level: float = 0.95) -> float:
    """Return the share that n items without a single finding bound from above.

    Parameters
    ----------
    n : int
        1 or more.
    confidence_level : float
        One-sided.

    Notes
    -----
    The exact bound 1 − (1 − level)^(1/n): a share above it would leave n items clean with a
    probability below 1 − level (Clopper & Pearson 1934, with nothing found). 26 % for 10 items, 5 %
    for 59.
    """
    if n < 1:
        raise RelookError(f"`n` must be 1 or more; got {n}")
    return float(1 - (1 - confidence_level) ** (1 / n))


def _check(found: int, n: int) -> None:
    if n < 1 or not 0 <= found <= n:
        raise RelookError(f"a proportion needs 0 <= found <= n with n 1 or more; got {found}/{n}")


def _at_most(found: int, n: int, p: float) -> float:
    """The probability of `found` or fewer of n, each with probability p in (0, 1)."""
    all_ways = lgamma(n + 1)
    return sum(
        exp(all_ways - lgamma(x + 1) - lgamma(n - x + 1) + x * log(p) + (n - x) * log1p(-p))
        for x in range(found + 1)
    )


def _share_where(reached: Callable[[float], bool]) -> float:
    """The least share at which a condition holds that holds for all larger ones, by halving."""
    low, high = 0.0, 1.0
    for _ in range(60):
        middle = (low + high) / 2
        if reached(middle):
            high = middle
        else:
            low = middle
    return (low + high) / 2
