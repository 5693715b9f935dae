"""Laws of alpha, for every difference function: a new one is tested by being listed."""

from __future__ import annotations

from dataclasses import dataclass
from fractions import Fraction

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from properties.strategies import N_VALUES, Table, tables
from reference.by_definition import coded
from relook.core.agreement import Agreement, coincidence_matrix, measure_agreement
from relook.core.coder_parts import coder_pair_parts, coder_parts, label_parts
from relook.core.contributions import item_contributions, label_pair_parts
from relook.core.differences import (
    DIFFERENCE_FUNCTIONS,
    DifferenceTable,
    Values,
    difference_function,
)
from relook.core.profiles import collapse, merge

FEW = settings(max_examples=25, deadline=None)


@dataclass(frozen=True)
class Case:
    """A difference function, its options, and what the value codes stand for."""

    name: str
    options: dict[str, object]
    numbers: tuple[Fraction, ...] | None = None
    texts: tuple[str, ...] | None = None

    def values(self, n_values: int = N_VALUES) -> Values:
        if self.texts is not None:
            return Values.from_texts(self.texts[:n_values])
        if self.numbers is not None:
            return Values.from_numbers(self.numbers[:n_values])
        return Values(n_values)


def _table(scale: Fraction = Fraction(1)) -> DifferenceTable:
    """Differences (i − j)² + 1 between six labels, times a constant."""
    labels = tuple("uvwxyz")
    rows = [
        [scale * ((i - j) ** 2 + 1) if i != j else Fraction(0) for j in range(6)] for i in range(6)
    ]
    return DifferenceTable(labels, tuple(tuple(row) for row in rows))


NUMBERS = tuple(Fraction(number) for number in ("0", "1", "2.5", "4", "5.25", "9"))
SETS = ("", "a", "b", "a;b", "b;c", "a;b;c")
PATHS = ("", "a", "a/b", "a/c", "b", "a/b/c")
CASES = {
    "nominal": Case("nominal", {}),
    "ordinal": Case("ordinal", {}),
    "interval": Case("interval", {}, NUMBERS),
    "ratio": Case("ratio", {}, NUMBERS),
    "circular": Case("circular", {"period": 12}, NUMBERS),
    "polar": Case("polar", {"ends": [0, 9]}, NUMBERS),
    "jaccard": Case("jaccard", {"separator": ";"}, texts=SETS),
    "masi": Case("masi", {"separator": ";"}, texts=SETS),
    "tree": Case("tree", {"separator": "/"}, texts=PATHS),
    "table": Case("table", {"table": _table()}, texts=tuple("uvwxyz")),
}
EVERY = pytest.mark.parametrize("case", CASES.values(), ids=CASES)


def measured(table: Table, case: Case, values: Values | None = None) -> Agreement:
    values = case.values() if values is None else values
    labels = coded(table, range(values.n_values)).labels
    return measure_agreement(labels, difference_function(case.name, case.options), values)


def same(first: Agreement, second: Agreement, *, scale: float = 1.0) -> None:
    """Alpha equal, D_o and D_e equal up to a constant."""
    assert (first.alpha is None) == (second.alpha is None)
    if first.alpha is not None:
        assert second.alpha == pytest.approx(first.alpha, rel=1e-9, abs=1e-11)
    if first.observed_disagreement is not None:
        for name in ("observed_disagreement", "expected_disagreement"):
            wanted = scale * getattr(first, name)
            assert getattr(second, name) == pytest.approx(wanted, rel=1e-9, abs=1e-12)


def test_every_function_is_under_the_laws():
    """Every row of the table of functions has a case here."""
    assert set(CASES) == set(DIFFERENCE_FUNCTIONS)


# --- δ² itself


@EVERY
@given(counts=st.lists(st.integers(0, 9), min_size=N_VALUES, max_size=N_VALUES))
@FEW
def test_differences_are_symmetric_not_negative_and_zero_on_the_diagonal(case, counts):
    """δ²(c, c) = 0 and δ²(c, k) = δ²(k, c) ≥ 0, whatever the counts."""
    function = difference_function(case.name, case.options)
    delta = function.bind(case.values(), np.array(counts)).matrix(N_VALUES)
    assert not np.diag(delta).any()
    assert (delta >= 0).all()
    np.testing.assert_allclose(delta, delta.T, rtol=1e-14, atol=1e-16)


@EVERY
@given(counts=st.lists(st.integers(0, 9), min_size=N_VALUES, max_size=N_VALUES))
@FEW
def test_closed_forms_equal_sums_over_pairs(case, counts):
    """Σ n_c n_k δ²_ck over all pairs is what the function's own closed form or blocks give."""
    n_c = np.array(counts)
    bound = difference_function(case.name, case.options).bind(case.values(), n_c)
    summed = n_c @ bound.matrix(N_VALUES) @ n_c
    assert bound.pair_sum(n_c) / bound.denominator == pytest.approx(summed, rel=1e-10, abs=1e-10)


# --- laws of all functions


@EVERY
@given(table=tables(), order=st.randoms(use_true_random=False))
@FEW
def test_order_of_items_does_not_matter(case, table, order):
    """Items in another order: the same figures, to the last bit."""
    items = list(table)
    order.shuffle(items)
    first, second = measured(table, case), measured({item: table[item] for item in items}, case)
    assert (first.alpha, first.observed_disagreement) == (
        second.alpha,
        second.observed_disagreement,
    )


@EVERY
@given(table=tables(), order=st.randoms(use_true_random=False))
@FEW
def test_labels_may_be_exchanged_among_the_coders_of_an_item(case, table, order):
    """Who of an item's coders gave which label does not enter alpha."""
    mixed = {}
    for item, labels in table.items():
        values = [value for _, value in labels]
        order.shuffle(values)
        mixed[item] = [(coder, value) for (coder, _), value in zip(labels, values, strict=True)]
    first, second = measured(table, case), measured(mixed, case)
    assert (first.alpha, first.observed_disagreement) == (
        second.alpha,
        second.observed_disagreement,
    )


@EVERY
@given(table=tables(), value=st.integers(0, N_VALUES - 1))
@FEW
def test_items_that_are_not_pairable_do_not_enter(case, table, value):
    """An item with one label, and one with none, change nothing."""
    more = table | {"lone": [(0, value)], "bare": []}
    first, second = measured(table, case), measured(more, case)
    assert (first.alpha, first.observed_disagreement) == (
        second.alpha,
        second.observed_disagreement,
    )


@EVERY
@given(table=tables(n_values=N_VALUES - 2))
@FEW
def test_declared_labels_that_nobody_used_do_not_enter(case, table):
    """Two labels at the end that nobody gave change nothing."""
    first = measured(table, case, case.values(N_VALUES - 2))
    same(first, measured(table, case))


@EVERY
@given(table=tables(), parts=st.integers(0, 7))
@FEW
def test_parts_add_up_to_observed_disagreement(case, table, parts):
    """Items, labels, coders, coder pairs and label pairs each add up to D_o (1e-12)."""
    agreement = measured(table, case)
    observed = agreement.observed_disagreement or 0.0
    for found in (
        item_contributions(agreement),
        label_parts(agreement),
        coder_parts(agreement).contribution,
        coder_pair_parts(agreement).contribution,
        label_pair_parts(agreement).contribution,
    ):
        assert found.sum() == pytest.approx(observed, rel=1e-12, abs=1e-14)
        assert (found >= 0).all()


@EVERY
@given(table=tables())
@FEW
def test_observed_disagreement_is_the_coincidences_weighed(case, table):
    """D_o = (1/n) Σ o_ck δ²_ck, and the rows of the coincidences are the marginals."""
    agreement = measured(table, case)
    if not agreement.n_pairable_labels:
        assert agreement.observed_disagreement is None
        return
    coincidences = coincidence_matrix(agreement.profiles)
    np.testing.assert_allclose(coincidences.sum(axis=1), agreement.marginals, atol=1e-12)
    summed = (coincidences * agreement.differences.matrix(N_VALUES)).sum()
    wanted = summed / agreement.n_pairable_labels
    assert agreement.observed_disagreement == pytest.approx(wanted, rel=1e-10, abs=1e-13)


@EVERY
@given(table=tables(), cut=st.integers(0, 7))
@FEW
def test_profiles_of_two_parts_merge_to_the_whole(case, table, cut):
    """Splitting the items in two and merging their profiles gives those of all items."""
    rows = list(table.items())
    whole, first, second = (
        collapse(coded(dict(part), range(N_VALUES)).labels)[0]
        for part in (rows, rows[:cut], rows[cut:])
    )
    merged, _ = merge([first, second], max(first.n_values, second.n_values))
    for name in ("value_index", "count", "start", "multiplicity"):
        assert getattr(merged, name).tolist() == getattr(whole, name).tolist()


@EVERY
@given(table=tables())
@FEW
def test_alpha_is_at_most_one_and_one_only_without_disagreement(case, table):
    """Alpha never exceeds 1, and where it is exactly 1 nothing is disputed."""
    agreement = measured(table, case)
    if agreement.alpha is None:
        assert agreement.undefined_because
        return
    assert agreement.alpha <= 1
    if agreement.n_disputed_items == 0:
        assert agreement.alpha == 1
    assert agreement.n_disputed_items <= agreement.n_pairable_items


# --- laws of one function each


def renamed(table: Table, new: list[int]) -> Table:
    return {item: [(c, new[v]) for c, v in labels] for item, labels in table.items()}


@given(table=tables(), new=st.permutations(range(N_VALUES)))
@FEW
def test_nominal_does_not_know_names(table, new):
    """Nominal: any renaming of the labels."""
    same(measured(table, CASES["nominal"]), measured(renamed(table, new), CASES["nominal"]))


@given(table=tables(), places=st.lists(st.integers(0, 20), min_size=6, max_size=6, unique=True))
@FEW
def test_ordinal_knows_order_only(table, places):
    """Ordinal: any increasing map, gaps between labels included."""
    places = sorted(places)
    values = Values(21)
    same(
        measured(table, CASES["ordinal"]),
        measured(renamed(table, places), CASES["ordinal"], values),
    )


@given(table=tables())
@FEW
def test_ordinal_may_be_turned_round(table):
    """Ordinal: the reverse order gives the same alpha."""
    back = list(range(N_VALUES))[::-1]
    same(measured(table, CASES["ordinal"]), measured(renamed(table, back), CASES["ordinal"]))


fractions = st.fractions(min_value=-5, max_value=5, max_denominator=20)


@given(table=tables(), a=fractions, b=fractions.filter(bool))
@FEW
def test_interval_knows_differences_only(table, a, b):
    """Interval: a + b x for any b but 0; D_o and D_e grow by b²."""
    moved = Values.from_numbers([a + b * x for x in NUMBERS])
    first, second = measured(table, CASES["interval"]), measured(table, CASES["interval"], moved)
    assert first.alpha == second.alpha
    same(first, second, scale=float(b * b))


@given(table=tables(), b=st.fractions(min_value=Fraction(1, 20), max_value=50, max_denominator=20))
@FEW
def test_ratio_knows_proportions_only(table, b):
    """Ratio: b x for any b above 0."""
    moved = Values.from_numbers([b * x for x in NUMBERS])
    same(measured(table, CASES["ratio"]), measured(table, CASES["ratio"], moved))


@given(table=tables(), a=fractions, turns=st.integers(-3, 3))
@FEW
def test_circular_knows_no_beginning(table, a, turns):
    """Circular: any rotation, whole periods included, and the other sense of rotation."""
    case = CASES["circular"]
    first = measured(table, case)
    same(first, measured(table, case, Values.from_numbers([x + a + 12 * turns for x in NUMBERS])))
    same(first, measured(table, case, Values.from_numbers([-x for x in NUMBERS])))


@given(table=tables(), a=fractions, b=st.fractions(min_value=Fraction(1, 9), max_value=9))
@FEW
def test_polar_moves_with_its_ends(table, a, b):
    """Polar: a + b x where the ends move along; and turned round."""
    moved = Case("polar", {"ends": [a, a + 9 * b]}, tuple(a + b * x for x in NUMBERS))
    turned = Case("polar", {"ends": [0, 9]}, tuple(9 - x for x in NUMBERS))
    first = measured(table, CASES["polar"])
    same(first, measured(table, moved))
    same(first, measured(table, turned))


@given(table=tables())
@FEW
@pytest.mark.parametrize("name", ["jaccard", "masi"])
def test_sets_do_not_know_the_names_of_their_elements(name, table):
    """Sets: renaming and reordering elements, and another separator."""
    texts = tuple("|".join(f"new {e}" for e in reversed(t.split(";")) if e) for t in SETS)
    moved = Case(name, {"separator": "|"}, texts=texts)
    same(measured(table, CASES[name]), measured(table, moved))


@given(table=tables())
@FEW
def test_trees_do_not_know_the_names_of_siblings(table):
    """Tree: renaming siblings at any depth."""
    texts = ("", "q", "q/z", "q/b", "a", "q/z/a")
    moved = Case("tree", {"separator": "/"}, texts=texts)
    same(measured(table, CASES["tree"]), measured(table, moved))


@given(
    table=tables(),
    constant=st.fractions(min_value=Fraction(1, 50), max_value=50, max_denominator=50),
)
@FEW
def test_a_constant_factor_does_not_enter_alpha(table, constant):
    """Table: multiplying δ² by a constant multiplies D_o and D_e and leaves alpha."""
    scaled = Case("table", {"table": _table(constant)}, texts=tuple("uvwxyz"))
    same(measured(table, CASES["table"]), measured(table, scaled), scale=float(constant))


@given(table=tables(n_values=2))
@FEW
def test_with_two_values_nominal_ordinal_and_interval_are_one(table):
    """Two values in use: nominal, ordinal and interval alpha are the same number."""
    alphas = {measured(table, CASES[name]).alpha for name in ("nominal", "ordinal", "interval")}
    assert len(alphas) == 1


@given(table=tables())
@FEW
def test_nominal_is_a_table_of_ones(table):
    """A table of ones, sets without common elements, and paths of one step are all nominal."""
    ones = [[Fraction(i != j) for j in range(6)] for i in range(6)]
    letters = tuple("uvwxyz")
    cases = [
        Case("table", {"table": DifferenceTable(letters, tuple(map(tuple, ones)))}, texts=letters),
        Case("jaccard", {"separator": ";"}, texts=letters),
        Case("masi", {"separator": ";"}, texts=letters),
        Case("tree", {"separator": "/"}, texts=letters),
    ]
    wanted = measured(table, CASES["nominal"]).alpha
    for case in cases:
        assert measured(table, case).alpha == wanted
