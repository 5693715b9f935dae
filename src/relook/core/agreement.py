"""Observed and expected disagreement, and alpha.

Names ending in `_disagreement` are better when lower; `alpha` is better when higher: 1 is perfect,
0 is what chance would give, below 0 is systematic disagreement. `alpha` is the coefficient and
nothing else here; the width of an interval is a `confidence_level`.

References
----------
Krippendorff, K. (2004). Content Analysis, 2nd ed., ch. 11. Krippendorff, K. (2011). Computing
Krippendorff's Alpha-Reliability. University of Pennsylvania.
"""

from __future__ import annotations

from dataclasses import dataclass
from fractions import Fraction

import numpy as np

from relook.core.differences import DifferenceFunction, Differences, Values
from relook.core.exact import BoolArray, ExactArray, FloatArray, IntArray, dot, tally
from relook.core.labels import CodedLabels
from relook.core.profiles import Profiles, collapse
from relook.errors import RelookError

#: Why alpha is undefined; each text is shown to the user as it stands.
NOTHING_PAIRABLE = "no item has two labels or more"
NO_VARIATION = "all pairable labels are the same, so chance disagreement is 0"


@dataclass(frozen=True, slots=True, eq=False)
class Agreement:
    """Agreement on one variable, with the counts it came from.

    Attributes
    ----------
    alpha : float or None
        1 − D_o/D_e; None where undefined.
    undefined_because : str or None
        The reason, where alpha is None.
    observed_disagreement, expected_disagreement : float or None
        D_o and D_e; None where nothing is pairable.
    labels : CodedLabels
    profiles : Profiles
    profile_of_item : int array of shape (n_items,)
        -1 for an item without labels.
    values : Values
    function : DifferenceFunction
    differences : Differences
        δ² bound to the pairable labels.
    marginals : int array of shape (n_values,)
        n_c, the pairable labels of each value.
    within : array of shape (n_profiles,)
        Σ_ck n_uc n_uk δ²_ck × `differences.denominator`; 0 for a profile of one label.
    disputed_profiles : bool array of shape (n_profiles,)
        Contribution above 0 and, for numbers, labels further apart than the tolerance.
    """

    alpha: float | None
    undefined_because: str | None
    observed_disagreement: float | None
    expected_disagreement: float | None
    labels: CodedLabels
    profiles: Profiles
    profile_of_item: IntArray
    values: Values
    function: DifferenceFunction
    differences: Differences
    marginals: IntArray
    within: ExactArray | FloatArray
    disputed_profiles: BoolArray

    @property
    def n_labels(self) -> int:
        """All labels, pairable or not."""
        return self.labels.n_labels

    @property
    def n_pairable_labels(self) -> int:
        """n: the labels in items with two labels or more."""
        return int(self.marginals.sum())

    @property
    def n_items(self) -> int:
        """Items with a label at least."""
        return int(self.profiles.multiplicity.sum())

    @property
    def n_pairable_items(self) -> int:
        """Items with two labels or more."""
        return int(self.profiles.multiplicity[self.profiles.size >= 2].sum())

    @property
    def n_disputed_items(self) -> int:
        """Items whose labels disagree, beyond the tolerance for numbers."""
        return int(self.profiles.multiplicity[self.disputed_profiles].sum())

    @property
    def n_coders(self) -> int:
        """Coders with a label at least; 0 where the table holds counts."""
        if self.labels.coder_index is None:
            return 0
        return int(np.count_nonzero(tally(self.labels.coder_index, self.labels.n_coders)))


def measure_agreement(
    labels: CodedLabels,
    function: DifferenceFunction,
    values: Values | None = None,
    *,
    tolerance: Fraction | int = 0,
) -> Agreement:
    """Compute observed disagreement, expected disagreement and alpha.

    Parameters
    ----------
    labels : CodedLabels
    function : DifferenceFunction
    values : Values, optional
        What the value codes stand for; may be left out where only identity or order matters.
    tolerance : Fraction or int
        Numbers this close are not called disputed. It does not enter D_o, D_e or alpha.

    Returns
    -------
    Agreement

    Notes
    -----
    D_o = (1/n) Σ_u (1/(m_u − 1)) Σ_ck n_uc n_uk δ²_ck and D_e = 1/(n(n−1)) Σ_ck n_c n_k δ²_ck over
    the n pairable labels (Krippendorff 2011). Where all pairable labels are the same D_e is 0 and
    alpha is undefined, never 1.
    """
    values = Values(labels.n_values) if values is None else values
    profiles, profile_of_item = collapse(labels)
    return measure_profiles(labels, profiles, profile_of_item, function, values, tolerance)


def measure_profiles(
    labels: CodedLabels,
    profiles: Profiles,
    profile_of_item: IntArray,
    function: DifferenceFunction,
    values: Values,
    tolerance: Fraction | int,
) -> Agreement:
    """Compute the same from label profiles that are known already; `labels` is only handed on."""
    marginals = profiles.pairable_marginals()
    differences = function.bind(values, marginals)
    pairable = profiles.size >= 2
    within = differences.within(profiles)
    n = int(marginals.sum())

    alpha = observed = expected = because = None
    if n == 0:
        because = NOTHING_PAIRABLE
    else:
        d_o = _observed(profiles, within, pairable, n, differences)
        d_e = _ratio(differences.pair_sum(marginals), differences.denominator * n * (n - 1))
        observed, expected = float(d_o), float(d_e)
        if d_e == 0:
            because = NO_VARIATION
        else:
            alpha = float(1 - d_o / d_e)
    disputed = pairable & np.asarray(within > 0, dtype=bool)
    if tolerance:
        disputed &= _spread_beyond(profiles, values, Fraction(tolerance))
    return Agreement(
        alpha,
        because,
        observed,
        expected,
        labels,
        profiles,
        profile_of_item,
        values,
        function,
        differences,
        marginals,
        within,
        disputed,
    )


def coincidence_matrix(profiles: Profiles) -> FloatArray:
    """Return the coincidences o_ck = Σ_u (ordered c–k pairs in u)/(m_u − 1).

    Returns
    -------
    float array of shape (n_values, n_values)
        Symmetric; its rows sum to the pairable labels of each value.
    """
    profile, first, second = profiles.value_pairs()
    values, counts = profiles.value_index, profiles.count
    per_pair = np.zeros(profiles.n_profiles)
    pairable = profiles.size >= 2
    per_pair[pairable] = profiles.multiplicity[pairable] / (profiles.size[pairable] - 1)
    matrix = np.zeros((profiles.n_values, profiles.n_values))
    np.add.at(
        matrix,
        (values[first], values[second]),
        per_pair[profile] * counts[first] * counts[second],
    )
    matrix += matrix.T
    own = counts * (counts - 1) * per_pair[profiles.profile_of_entry]
    np.add.at(matrix, (values, values), own)
    return matrix


def _observed(
    profiles: Profiles,
    within: ExactArray | FloatArray,
    pairable: BoolArray,
    n: int,
    differences: Differences,
) -> Fraction | float:
    """D_o: exact over each number of labels m, one fraction at the end."""
    if not differences.exact:
        shares = profiles.multiplicity[pairable] * within[pairable] / (profiles.size[pairable] - 1)
        return float(np.sum(shares)) / n
    total = Fraction(0)
    for m in np.unique(profiles.size[pairable]).tolist():
        of_size = profiles.size == m
        total += Fraction(dot(profiles.multiplicity[of_size], within[of_size]), m - 1)
    return total / (n * differences.denominator)


def _ratio(top: int | float, bottom: int) -> Fraction | float:
    return Fraction(top, bottom) if isinstance(top, int) else top / bottom


def _spread_beyond(profiles: Profiles, values: Values, tolerance: Fraction) -> BoolArray:
    """Whether the labels of each profile lie further apart than the tolerance, exactly."""
    if values.numerators is None:
        raise RelookError("a tolerance needs labels that are numbers")
    x = values.numerators[profiles.value_index]
    begin = profiles.start[:-1]
    spread = np.maximum.reduceat(x, begin) - np.minimum.reduceat(x, begin)
    limit = tolerance * values.denominator
    return np.asarray(spread.astype(object) * limit.denominator > limit.numerator, dtype=bool)
