"""Consensus labels by level, against plain definitions."""

from __future__ import annotations

import statistics
from collections import Counter
from fractions import Fraction

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from relook.core.consensus import Consensus, consensus_of, extend_values
from relook.core.differences import (
    DIFFERENCE_FUNCTIONS,
    Circular,
    DifferenceFunction,
    Jaccard,
    Values,
)
from relook.core.labels import CodedLabels
from relook.core.profiles import collapse
from relook.errors import RelookError

TABLES = st.lists(st.lists(st.integers(0, 5), min_size=1, max_size=7), min_size=1, max_size=9)
NUMBERS = [Fraction(-1), Fraction(0), Fraction(1, 3), Fraction(1, 2), Fraction(2), Fraction(10)]


def consensus(
    table: list[list[int]], function: DifferenceFunction, values: Values
) -> list[tuple[Consensus, int]]:
    """The consensus, and the profile of each item."""
    item = np.repeat(np.arange(len(table)), [len(labels) for labels in table])
    flat = np.array([value for labels in table for value in labels], dtype=np.int64)
    labels = CodedLabels.from_codes(item, flat, n_items=len(table), n_values=values.n_values)
    profiles, profile_of_item = collapse(labels)
    got = consensus_of(profiles, function, values)
    return [(got, profile) for profile in profile_of_item.tolist()]


def check(got: Consensus, profile: int, leaders: list[int]) -> None:
    """One leader is the value; several are a tie."""
    assert bool(got.tie[profile]) == (len(leaders) > 1)
    assert got.tied_values(profile).tolist() == (leaders if len(leaders) > 1 else [])
    assert int(got.value_index[profile]) == (leaders[0] if len(leaders) == 1 else -1)


@given(TABLES)
def test_nominal_takes_the_plurality(table: list[list[int]]) -> None:
    """The most frequent value; all of the most frequent ones are tied."""
    found = consensus(table, DIFFERENCE_FUNCTIONS["nominal"], Values(6))
    for labels, (got, profile) in zip(table, found, strict=True):
        counts = Counter(labels)
        check(got, profile, sorted(v for v in counts if counts[v] == max(counts.values())))


@given(TABLES)
def test_ordinal_takes_the_median(table: list[list[int]]) -> None:
    """statistics.median_low and median_high; where they differ it is a tie of both."""
    found = consensus(table, DIFFERENCE_FUNCTIONS["ordinal"], Values(6))
    for labels, (got, profile) in zip(table, found, strict=True):
        check(got, profile, sorted({statistics.median_low(labels), statistics.median_high(labels)}))


@pytest.mark.parametrize("level", ["interval", "ratio"])
@given(table=TABLES)
def test_numbers_take_the_exact_mean(level: str, table: list[list[int]]) -> None:
    """The mean as a fraction; a value where the mean is one; never a tie."""
    values = Values.from_numbers(NUMBERS)
    found = consensus(table, DIFFERENCE_FUNCTIONS[level], values)
    for labels, (got, profile) in zip(table, found, strict=True):
        mean = sum((NUMBERS[v] for v in labels), Fraction(0)) / len(labels)
        assert got.mean(profile) == mean
        assert got.number is not None
        assert got.number[profile] == pytest.approx(float(mean), rel=1e-15, abs=1e-15)
        assert int(got.value_index[profile]) == (NUMBERS.index(mean) if mean in NUMBERS else -1)
        assert not got.tie[profile]


def test_numbers_too_large_for_64_bits_keep_their_mean() -> None:
    """The mean of 2**80 and 2**80 + 2 is 2**80 + 1, a value that is in use."""
    values = Values.from_numbers([2**80, 2**80 + 1, 2**80 + 2])
    (got, profile), *_ = consensus([[0, 2]], DIFFERENCE_FUNCTIONS["interval"], values)
    assert got.mean(profile) == 2**80 + 1
    assert got.value_index[profile] == 1


@pytest.mark.parametrize(
    ("hours", "mean", "value", "tie"),
    [
        ([23, 1], 0.0, 0, False),
        ([23, 0, 1], 0.0, 0, False),
        ([6, 18], float("nan"), -1, True),
        ([0, 3], 1.5, -1, False),
        ([5], 5.0, 5, False),
    ],
)
def test_a_circle_takes_the_mean_direction(
    hours: list[int], mean: float, value: int, tie: bool
) -> None:
    """23 and 1 o'clock meet at midnight; opposite hours point nowhere and are a tie."""
    function = Circular(Fraction(24))
    values = Values.from_numbers(list(range(24)))
    (got, profile), *_ = consensus([hours], function, values)
    assert got.number is not None
    gap = (got.number[profile] - mean + 12) % 24 - 12
    assert gap == pytest.approx(0, abs=1e-9, nan_ok=True) or (tie and np.isnan(gap))
    assert bool(got.tie[profile]) == tie
    if len(set(hours)) == 1:
        assert got.value_index[profile] == value
    assert got.tied_values(profile).tolist() == (sorted(hours) if tie else [])


def test_sets_take_the_majority_of_each_element() -> None:
    """A in 2 of 3, b in 2 of 3, c in 1: the set a;b, which nobody gave, is added to the values."""
    values = Values.from_texts(["a", "b;c", "a; b"])
    function = Jaccard(";")
    table = [[0, 1, 2], [0, 0, 1], [0, 1], [2]]
    found = consensus(table, function, Values.from_texts(["a", "b", "a;b;c"]))
    texts = found[0][0].values.texts
    assert texts is not None
    assert texts[found[0][0].value_index[found[0][1]]] == "a;b"
    assert found[1][0].value_index[found[1][1]] == 0
    (got, profile) = consensus(table, function, values)[2]
    assert got.tie[profile]
    assert got.values.texts is not None
    # a, b and c are each in one of two: none of them, or all of them.
    assert sorted(got.values.texts[code] for code in got.tied_values(profile)) == ["", "a;b;c"]
    got, profile = consensus(table, function, values)[0]
    assert got.value_index[profile] == 2  # "a; b", as it was first written


def test_words_have_no_mean() -> None:
    """A mean of labels that are words is refused."""
    with pytest.raises(RelookError, match="labels that are numbers"):
        consensus([[0, 1]], DIFFERENCE_FUNCTIONS["interval"], Values(2))


def test_means_that_nobody_gave_extend_the_values() -> None:
    """Codes in use stay; new numbers follow in numeric order; equal ones share a code."""
    values = Values.from_numbers([0, 1, 4])
    tops, bottoms = np.array([1, 8, 2, 5]), np.array([2, 2, 4, 3])
    extended, codes = extend_values(values, tops, bottoms)
    numbers = [Fraction(int(top), extended.denominator) for top in extended.numerators]  # type: ignore[union-attr]
    assert numbers == [0, 1, 4, Fraction(1, 2), Fraction(5, 3)]
    assert codes.tolist() == [3, 2, 3, 4]


def test_no_items_have_no_consensus() -> None:
    """An empty table gives empty arrays at every level."""
    labels = CodedLabels.from_codes(np.zeros(0, np.int64), np.zeros(0, np.int64))
    profiles, _ = collapse(labels)
    for name in ("nominal", "ordinal", "interval"):
        got = consensus_of(profiles, DIFFERENCE_FUNCTIONS[name], Values.from_numbers([]))
        assert got.value_index.size == got.tie.size == 0


def test_a_mean_exists_of_numbers_only() -> None:
    """1, 2 and 2 have the exact mean 5/3; a plurality has none."""
    values = Values.from_numbers([1, 2])
    got, profile = consensus([[0, 1, 1]], DIFFERENCE_FUNCTIONS["interval"], values)[0]
    assert got.mean(profile) == Fraction(5, 3)
    got, profile = consensus([[0, 1, 1]], DIFFERENCE_FUNCTIONS["nominal"], values)[0]
    assert got.mean(profile) is None


def test_functions_without_their_options_have_no_consensus() -> None:
    """A circle needs its period, sets their texts and separator."""
    with pytest.raises(RelookError, match="circular differences need a period"):
        consensus([[0, 1]], DIFFERENCE_FUNCTIONS["circular"], Values.from_numbers([1, 2]))
    with pytest.raises(RelookError, match="their separator"):
        consensus([[0, 1]], Jaccard(";"), Values(2))


def test_no_items_have_no_majority_either() -> None:
    """An empty table of sets."""
    profiles, _ = collapse(CodedLabels.from_codes(np.zeros(0, np.int64), np.zeros(0, np.int64)))
    assert consensus_of(profiles, Jaccard(";"), Values.from_texts([])).value_index.size == 0
