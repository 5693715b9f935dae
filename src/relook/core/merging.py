"""What if labels were merged?

A coarser code book measures less: alpha after a merger answers another question, and a merger is
worth considering only where the code book can do without the distinction.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from relook.core.agreement import Agreement, measure_agreement
from relook.core.contributions import label_pair_parts
from relook.core.difference_base import CoordinateDifferences, Values
from relook.core.differences import doubled_midranks
from relook.core.exact import FloatArray, IntArray, quotients
from relook.core.ties import tie_levels
from relook.errors import RelookError

#: Difference functions whose labels can be merged: what a merged label means is plain.
MERGEABLE = ("nominal", "ordinal")


@dataclass(frozen=True, slots=True)
class Merger:
    """Two values taken as one.

    Attributes
    ----------
    first, second : int
        Value codes, first < second.
    alpha, observed_disagreement, expected_disagreement : float
        With the two merged.
    gain : float
        Alpha with the two merged, less alpha.
    """

    first: int
    second: int
    alpha: float
    observed_disagreement: float
    expected_disagreement: float
    gain: float


def why_not_mergeable(agreement: Agreement) -> str | None:
    """Return why labels of this variable cannot be merged, or None where they can."""
    name = agreement.function.name
    if name in MERGEABLE:
        return None
    return f"labels can be merged under {' and '.join(MERGEABLE)} differences only, not {name}"


def merged_values(agreement: Agreement, groups: Sequence[Sequence[int]]) -> tuple[IntArray, int]:
    """Return the new code of each value, and how many values are left.

    Parameters
    ----------
    agreement : Agreement
    groups : sequence of sequences of int
        Value codes that become one; values in no group stay as they are.

    Returns
    -------
    new_value : int array of shape (n_values,)
        New codes keep the order of the first value of each group.
    n_values : int

    Raises
    ------
    RelookError
        A variable whose labels cannot be merged, a value in two groups, or ordinal labels that are
        not neighbours.
    """
    because = why_not_mergeable(agreement)
    if because is not None:
        raise RelookError(because)
    n_values = agreement.profiles.n_values
    stands_for = np.arange(n_values)
    seen: set[int] = set()
    for group in groups:
        codes = sorted(set(group))
        if not codes:
            continue
        if not 0 <= codes[0] <= codes[-1] < n_values:
            raise RelookError(f"value codes must lie between 0 and {n_values - 1}; got {codes}")
        if seen.intersection(codes):
            raise RelookError("a label can be merged into one group only")
        if agreement.function.needs == "order" and codes != list(range(codes[0], codes[-1] + 1)):
            raise RelookError(
                "ordinal labels can be merged with their neighbours only",
                mend="name every label in between too",
            )
        seen.update(codes)
        stands_for[codes] = codes[0]
    left, new_value = np.unique(stands_for, return_inverse=True)
    return new_value, int(left.size)


def merged_agreement(
    agreement: Agreement, groups: Sequence[Sequence[int]]
) -> tuple[Agreement, IntArray]:
    """Measure agreement with values merged.

    Parameters
    ----------
    agreement : Agreement
    groups : sequence of sequences of int
        As for `merged_values`.

    Returns
    -------
    merged : Agreement
    new_value : int array of shape (n_values,)
        The code in `merged` of each value before.
    """
    new_value, n_values = merged_values(agreement, groups)
    labels = agreement.labels.recoded(new_value, n_values)
    return measure_agreement(labels, agreement.function, Values(n_values)), new_value


def best_mergers(agreement: Agreement, most: int = 10) -> list[Merger]:
    """Return the pairs of values whose merger would lift alpha most, best first.

    Parameters
    ----------
    agreement : Agreement
    most : int
        At most so many; only pairs that lift alpha at all.

    Returns
    -------
    list of Merger
        Empty where alpha is undefined. Gains equal to 12 significant digits are ordered by value.

    Raises
    ------
    RelookError
        A variable whose labels cannot be merged.

    Notes
    -----
    Merging nominal values c and k takes (2/n) o_ck from D_o and 2 n_c n_k/(n(n−1)) from D_e, so
    only values that meet can lift alpha. Of ordinal values only neighbours are merged; then the two
    share a midrank and all others keep theirs.
    """
    because = why_not_mergeable(agreement)
    if because is not None:
        raise RelookError(because)
    if agreement.alpha is None:
        return []
    if agreement.function.name == "nominal":
        first, second, observed, expected = _nominal_mergers(agreement)
    else:
        first, second, observed, expected = _ordinal_mergers(agreement)
    # Rounding must not make a denominator of nothing where the two values are the only ones.
    n_used = int(np.count_nonzero(agreement.marginals))
    if n_used <= 2:
        return []
    alpha = 1 - observed / expected
    gain = alpha - agreement.alpha
    order = np.lexsort((second, first, tie_levels(gain)))
    return [
        Merger(
            int(first[i]),
            int(second[i]),
            float(alpha[i]),
            float(observed[i]),
            float(expected[i]),
            float(gain[i]),
        )
        for i in order[:most].tolist()
        if gain[i] > 1e-12
    ]


def _nominal_mergers(
    agreement: Agreement,
) -> tuple[IntArray, IntArray, FloatArray, FloatArray]:
    pairs, n_c = label_pair_parts(agreement), agreement.marginals
    n = agreement.n_pairable_labels
    everything = n * n - int(np.dot(n_c, n_c))
    together = n_c[pairs.first] * n_c[pairs.second]
    expected = (everything - 2 * together) / (n * (n - 1))
    observed = (agreement.observed_disagreement or 0.0) - pairs.contribution
    return pairs.first, pairs.second, np.maximum(observed, 0.0), expected


def _ordinal_mergers(
    agreement: Agreement,
) -> tuple[IntArray, IntArray, FloatArray, FloatArray]:
    profiles, n_c = agreement.profiles, agreement.marginals.astype(np.int64)
    used = np.flatnonzero(n_c)
    first, second = used[:-1], used[1:]
    n, ranks = agreement.n_pairable_labels, doubled_midranks(n_c)
    observed, expected = np.zeros(first.size), np.zeros(first.size)
    weight = profiles.multiplicity / np.maximum(profiles.size - 1, 1)
    for i, (c, k) in enumerate(zip(first.tolist(), second.tolist(), strict=True)):
        merged = ranks.copy()
        # Doubled midrank of the two together: twice what lies below c, plus both counts.
        merged[c] = merged[k] = ranks[c] + n_c[k]
        differences = CoordinateDifferences(merged, 4)
        within = quotients(differences.within(profiles), 4)
        observed[i] = float(np.sum(weight * within)) / n
        expected[i] = differences.pair_sum(n_c) / 4 / n / (n - 1)
    return first, second, observed, expected
