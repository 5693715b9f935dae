"""How labels are used: per value, per coder, and between two coders."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from relook.core.agreement import Agreement
from relook.core.coder_parts import coder_entries, coder_index
from relook.core.contributions import PairParts, entry_parts, shares
from relook.core.exact import FloatArray, IntArray, grouped_sums


@dataclass(frozen=True, slots=True, eq=False)
class LabelParts:
    """One row per value: how often it is used and how well it is agreed on.

    Attributes
    ----------
    n_labels : int array of shape (n_values,)
        n_c, its pairable labels.
    alpha : float array of shape (n_values,)
        Nominal alpha of this label against all the others taken as one; nan where it is not used
        or nothing else is.
    involved : float array of shape (n_values,)
        Share of D_o in pairs of which this label is one side.
    """

    n_labels: IntArray
    alpha: FloatArray
    involved: FloatArray


@dataclass(frozen=True, slots=True, eq=False)
class Use:
    """How often each coder gave each value, among pairable labels; only what occurs.

    Attributes
    ----------
    coder, value, n_labels : int array of shape (n_used,)
        By coder, then value.
    """

    coder: IntArray
    value: IntArray
    n_labels: IntArray


def label_table(agreement: Agreement) -> LabelParts:
    """Return use, alpha against the rest, and involvement of each value.

    Notes
    -----
    Taking all other labels as one, D_o = (2/n) Σ_u n_uc (m_u − n_uc)/(m_u − 1) and
    D_e = 2 n_c (n − n_c)/(n (n − 1)).
    """
    profiles, n_c = agreement.profiles, agreement.marginals
    n, n_values = int(n_c.sum()), profiles.n_values
    at = profiles.profile_of_entry
    size, often, count = profiles.size[at], profiles.multiplicity[at], profiles.count
    apart = often * (count * (size - count) / np.maximum(size - 1, 1))
    observed = 2 * grouped_sums(profiles.value_index, apart, n_values) / max(n, 1)
    expected = 2.0 * n_c * (n - n_c) / max(n * (n - 1), 1)
    alpha = np.full(n_values, np.nan)
    np.divide(observed, expected, out=alpha, where=expected > 0)
    parts = grouped_sums(profiles.value_index, often * count * entry_parts(agreement), n_values)
    return LabelParts(n_c, 1 - alpha, shares(agreement, 2 * parts))


def label_use(agreement: Agreement) -> Use:
    """Return how often each coder gave each value, among pairable labels."""
    given, profiles = coder_entries(agreement), agreement.profiles
    pairable = profiles.size[profiles.profile_of_entry] >= 2
    value = profiles.value_index[pairable]
    table = np.zeros((given.shape[0], profiles.n_values), dtype=np.int64)
    np.add.at(table.T, value, given[:, pairable].T)
    of_coder, of_value = np.nonzero(table)
    return Use(of_coder, of_value, table[of_coder, of_value])


@dataclass(frozen=True, slots=True, eq=False)
class Meetings:
    """How often one coder's value met another's on the same item; only what occurs.

    Attributes
    ----------
    first, second : int array of shape (n_met,)
        The value of the one coder and that of the other; by first, then second.
    n_items : int array of shape (n_met,)
    """

    first: IntArray
    second: IntArray
    n_items: IntArray


def meetings(agreement: Agreement, first: int, second: int) -> Meetings:
    """Return which values of two coders met, and on how many items.

    Parameters
    ----------
    agreement : Agreement
    first, second : int
        The two coders.

    Raises
    ------
    RelookError
        The labels carry no coders.
    """
    coder, labels = coder_index(agreement), agreement.labels
    given = []
    for one in (first, second):
        value = np.full(labels.n_items, -1, dtype=np.int64)
        value[labels.item_index[coder == one]] = labels.value_index[coder == one]
        given.append(value)
    both = (given[0] >= 0) & (given[1] >= 0)
    n_values = max(1, labels.n_values)
    key, n_items = np.unique(given[0][both] * n_values + given[1][both], return_counts=True)
    of_first, of_second = np.divmod(key, n_values)
    return Meetings(of_first, of_second, n_items)


def cross_table(agreement: Agreement, first: int, second: int) -> IntArray:
    """Return how often one coder's value met another's on the same item, as a table.

    Parameters
    ----------
    agreement : Agreement
    first, second : int
        The coders in the rows and in the columns.

    Returns
    -------
    int array of shape (n_values, n_values)
    """
    met, n_values = meetings(agreement, first, second), agreement.labels.n_values
    table = np.zeros((n_values, n_values), dtype=np.int64)
    table[met.first, met.second] = met.n_items
    return table


def chance_shares(agreement: Agreement, pairs: PairParts) -> FloatArray:
    """Return the share of D_e of each pair of values, shape (n_pairs,).

    Beside the share of D_o it tells whether two labels clash beyond what their frequency and their
    distance would have them clash; all 0 where D_e is 0 or undefined.

    Notes
    -----
    2 n_c n_k δ²_ck/(n (n − 1))/D_e.
    """
    n, expected = agreement.n_pairable_labels, agreement.expected_disagreement
    if not expected:
        return np.zeros(pairs.first.size)
    often = agreement.marginals.astype(np.float64)
    delta = agreement.differences.between(pairs.first, pairs.second)
    return np.asarray(2 * often[pairs.first] * often[pairs.second] * delta / n / (n - 1) / expected)
