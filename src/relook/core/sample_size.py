"""How many items two coders need to share.

References
----------
Krippendorff, K. (2004). Content Analysis, 2nd ed., ch. 11, after Bloch, D. A. & Kraemer, H. C.
(1989). 2 × 2 kappa coefficients: measures of agreement or association. Biometrics 45:269–287.
"""

from __future__ import annotations

import math
from statistics import NormalDist

from relook.errors import RelookError


def needed_items(smallest_alpha: float, rarest_share: float, error_level: float = 0.05) -> int:
    """Return how many items two coders should label to tell alpha from a smaller one.

    Parameters
    ----------
    smallest_alpha : float
        The alpha that must be reached, from 0 to below 1.
    rarest_share : float
        The share of the rarest label, above 0 and below 1.
    error_level : float
        Chance of taking a smaller alpha for that one, above 0 and below 0.5.

    Returns
    -------
    int

    Raises
    ------
    RelookError
        An argument out of bounds.

    Notes
    -----
    N = 2 z² [(1 + α)(3 − α)/(4 (1 − α) p (1 − p)) − α], z one-tailed, rounded up. For two coders
    and nominal labels; a cautious figure elsewhere. No rule for more coders is offered.

    Examples
    --------
    >>> needed_items(0.8, 0.25)
    139
    """
    if not 0 <= smallest_alpha < 1:
        raise RelookError(f"`smallest_alpha` must be from 0 to below 1; got {smallest_alpha}")
    if not 0 < rarest_share < 1:
        raise RelookError(f"`rarest_share` must be above 0 and below 1; got {rarest_share}")
    if not 0 < error_level < 0.5:
        raise RelookError(f"`error_level` must be above 0 and below 0.5; got {error_level}")
    z = NormalDist().inv_cdf(1 - error_level)
    a, p = smallest_alpha, rarest_share
    return math.ceil(2 * z * z * ((1 + a) * (3 - a) / (4 * (1 - a) * p * (1 - p)) - a))
