"""Sums that never wrap round and lose no digits."""

from fractions import Fraction

import numpy as np
import pytest

from relook.core import exact
from relook.core.exact import (
    dot,
    group_sums,
    grouped_sums,
    largest,
    quotients,
    widened,
)


def test_dot_beyond_64_bits():
    """A sum of products beyond 2**63 equals Python's."""
    values = np.array([3_000_000_000, -2_999_999_999, 7])
    assert dot(values, values) == 3_000_000_000**2 + 2_999_999_999**2 + 49
    assert dot(values[:0], values[:0]) == 0


def test_widened_chooses_by_the_bound():
    """64-bit integers below 2**62, Python's own from there on."""
    values = np.array([1, 2], dtype=np.int32)
    assert widened(values, 2**62 - 1).dtype == np.int64
    assert widened(values, 2**62).dtype == object


def test_largest_takes_both_signs():
    """The largest absolute value, 0 for nothing, safe at the end of the range."""
    assert largest(np.array([-5, 3])) == 5
    assert largest(np.array([], dtype=np.int64)) == 0
    assert largest(np.array([-(2**63)])) == 2**63


def test_group_sums_beyond_64_bits():
    """Runs that sum beyond 2**63 do not wrap."""
    values = np.full(4, 2**62)
    assert group_sums(values, np.array([0, 3, 4])).tolist() == [3 * 2**62, 2**62]
    assert group_sums(values, np.array([0])).size == 0


@pytest.mark.parametrize("bottom", [3, 10**30])
def test_quotients_of_any_size(bottom):
    """Quotients are rounded once, whatever the size of the integers."""
    tops = [7, 10**25]
    found = quotients(np.array(tops, dtype=object), bottom)
    assert found.tolist() == [float(Fraction(top, bottom)) for top in tops]
    assert quotients(np.array([6]), bottom)[0] == 6 / bottom


def test_grouped_sums_keep_their_digits():
    """A million times 0.1 is 100,000 to 15 digits, where adding in turn leaves 11."""
    terms = np.full(1_000_000, 0.1)
    group = np.zeros(terms.size, dtype=np.int64)
    assert abs(grouped_sums(group, terms, 1)[0] / 100_000 - 1) < 1e-15
    assert abs(np.bincount(group, weights=terms)[0] / 100_000 - 1) > 1e-12
    assert grouped_sums(group[:0], terms[:0], 2).tolist() == [0, 0]


def test_grouped_sums_of_mixed_sizes():
    """Terms of very different sizes, and zeros, add up as exact fractions do."""
    rng = np.random.default_rng(1)
    terms = rng.random(3000) * 10.0 ** rng.integers(-9, 9, 3000)
    terms[::7] = 0
    group = rng.integers(0, 5, 3000)
    for code, found in enumerate(grouped_sums(group, terms, 5)):
        exact = sum(Fraction(term) for term in terms[group == code].tolist())
        assert found == pytest.approx(float(exact), rel=1e-14)
    assert grouped_sums(np.array([0, 1]), np.zeros(2), 2).tolist() == [0, 0]


@pytest.mark.parametrize(("n", "size"), [(0, 3), (10, 3), (101, 7), (101, 60)])
def test_codes_are_counted_in_runs_as_at_once(n, size, monkeypatch):
    """With runs of ten, narrow codes too; a code that never occurs counts 0."""
    monkeypatch.setattr(exact, "_RUN", 10)
    codes = np.random.default_rng(n).integers(0, max(1, size - 1), n).astype(np.int8)
    got = exact.tally(codes, size)
    assert got.tolist() == np.bincount(codes, minlength=size).tolist()
    assert got[-1] == 0
