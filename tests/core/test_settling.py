"""Settled alphas and the prospect, against published cases and the slow twin."""

from __future__ import annotations

from collections.abc import Callable, Hashable
from fractions import Fraction
from typing import Any

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from reference import by_definition as twin
from reference import published
from relook.core import settled_base, settled_sums
from relook.core.agreement import NO_VARIATION, NOTHING_PAIRABLE, Agreement, measure_agreement
from relook.core.consensus import consensus_of, extend_values
from relook.core.differences import (
    DIFFERENCE_FUNCTIONS,
    Circular,
    DifferenceFunction,
    Jaccard,
    Polar,
    Tree,
    Values,
)
from relook.core.labels import CodedLabels
from relook.core.settling import (
    CANNOT_BE_CODED,
    agreement_after,
    decided_values,
    prospect,
    settled_alphas,
)
from relook.errors import RelookError

CHECKS = [
    (name, level)
    for name in ("K2011-A", "K2011-B", "K2011-CD")
    for level in published.what_if(name)
]
DELTAS: dict[str, Any] = {
    "nominal": twin.nominal,
    "ordinal": twin.ordinal,
    "interval": twin.interval,
    "ratio": twin.ratio,
}


def measured(table: Any, level: str) -> tuple[Agreement, twin.Coded]:
    coded = twin.coded(table)
    words = not coded.values or isinstance(coded.values[0], str)
    values = Values(len(coded.values)) if words else coded.numbers()
    return measure_agreement(coded.labels, DIFFERENCE_FUNCTIONS[level], values), coded


@pytest.mark.parametrize(("name", "level"), CHECKS)
def test_settling_one_item_gives_the_exact_alphas(name: str, level: str) -> None:
    """Every label on every disputed item of the worked examples of Krippendorff (2011)."""
    table = published.coder_rows(name)
    agreement, coded = measured(table, level)
    for item, by_label in published.what_if(name)[level]["alpha_resolved_exact"].items():
        at = coded.items.index(int(item))
        codes = [[str(value) for value in coded.values].index(label) for label in by_label]
        profile = np.full(len(codes), agreement.profile_of_item[at])
        got = settled_alphas(agreement, profile, np.array(codes))
        want = [float(Fraction(figure["exact"])) for figure in by_label.values()]
        assert got.agreement == pytest.approx(want, abs=1e-12)
        assert got.undefined_because is None


def test_settling_several_items_is_not_the_sum_of_single_gains() -> None:
    """Joint settlement in Krippendorff (2011), nominal: 180/193, then exactly 1."""
    table = published.coder_rows("K2011-CD")
    agreement, coded = measured(table, "nominal")
    order = np.array([coded.items.index(item) for item in (2, 6, 8)])
    got = prospect(
        agreement,
        order,
        consensus_of(agreement.profiles, agreement.function, agreement.values),
    )
    wanted = published.what_if("joint")
    # Item 2 has 2, 2, 3, 2; item 6 has four labels, a tie; item 8 has 1, 1, 2, 1.
    figures = [agreement_after(agreement, order[:k], np.array([1, 1, 0])[:k]) for k in (2, 3)]
    assert figures[0].agreement == pytest.approx(float(Fraction(wanted["resolve 2->2, 6->2"])))
    assert figures[1].agreement == 1.0
    gain = figures[1].agreement - (agreement.alpha or 0)
    assert gain == pytest.approx(wanted["joint gain"], abs=1e-12)
    assert gain != pytest.approx(wanted["sum of the three single gains"], abs=1e-3)
    assert got.n_ties.tolist() == [0, 0, 1, 1]
    assert got.low[-1] == got.high[-1] == 1.0


@pytest.mark.parametrize("case", published.what_if("paradoxes"), ids=lambda case: case["note"])
def test_settling_can_lower_agreement_or_leave_it_undefined(case: Any) -> None:
    """Worked cases: even the majority label can lower alpha, and the common one undo it."""
    table = {item: list(labels.items()) for item, labels in case["data"].items()}
    agreement, coded = measured(table, case["metric"])
    assert agreement.alpha == pytest.approx(float(Fraction(case["alpha_before"])), abs=1e-12)
    at = coded.items.index(str(case["unit"]))
    code = coded.values.index(case["label"])
    got = settled_alphas(agreement, agreement.profile_of_item[[at]], np.array([code]))
    corrected = agreement_after(agreement, np.array([at]), np.array([code]))
    if case["alpha_after"] == "None":
        assert bool(got.undefined[0])
        assert got.undefined_because == corrected.undefined_because == NO_VARIATION
        assert corrected.agreement is None
    else:
        after = float(Fraction(case["alpha_after"]))
        assert got.agreement[0] == pytest.approx(after, abs=1e-12)
        assert corrected.agreement == pytest.approx(after, abs=1e-12)


TABLES = st.lists(st.lists(st.integers(0, 4), min_size=1, max_size=5), min_size=2, max_size=7).map(
    lambda rows: {item: list(enumerate(labels)) for item, labels in enumerate(rows)}
)


@pytest.mark.parametrize("level", list(DELTAS))
@given(table=TABLES, shuffle=st.randoms(use_true_random=False))
def test_each_step_of_the_prospect_equals_the_twin(level: str, table: Any, shuffle: Any) -> None:
    """Both ends, every step, recomputed from the definitions in exact fractions."""
    agreement, coded = measured(table, level)
    consensus = consensus_of(agreement.profiles, agreement.function, agreement.values)
    order = list(range(len(table)))
    shuffle.shuffle(order)
    got = prospect(agreement, np.array(order), consensus)
    for most_used, path in ((True, got.cautious), (False, got.other)):
        codes, values = decided_values(agreement, consensus, most_used=most_used)
        meaning = _meanings(values, coded)
        rulings: list[tuple[Hashable, Any]] = [
            (coded.items[item], meaning[codes[agreement.profile_of_item[item]]]) for item in order
        ]
        want = twin.prospect_by_definition(table, DELTAS[level], rulings)
        assert len(want) == path.agreement.size
        for step, figure in enumerate(want):
            if figure is None:
                assert np.isnan(path.agreement[step])
            else:
                assert path.agreement[step] == pytest.approx(float(figure), abs=1e-12)


def _meanings(values: Values, coded: twin.Coded) -> list[Any]:
    if values.numerators is None:
        return coded.values
    return [Fraction(int(top), values.denominator) for top in values.numerators]


@pytest.mark.parametrize("level", list(DELTAS))
@given(table=TABLES)
def test_every_candidate_equals_the_twin(level: str, table: Any) -> None:
    """All labels in use on all items, and a number that nobody gave."""
    agreement, coded = measured(table, level)
    values = agreement.values
    if level in ("interval", "ratio"):
        values, _ = extend_values(values, np.array([7]), np.array([3]))
    meaning = _meanings(values, coded)
    item = np.repeat(np.arange(len(table)), len(meaning))
    code = np.tile(np.arange(len(meaning)), len(table))
    got = settled_alphas(agreement, agreement.profile_of_item[item], code, values)
    for at, figure in enumerate(got.agreement):
        want = twin.settled_alpha_by_definition(
            table, DELTAS[level], {coded.items[item[at]]: meaning[code[at]]}
        )
        if want is None:
            assert np.isnan(figure)
        else:
            assert figure == pytest.approx(float(want), abs=1e-12)


FURTHER: list[tuple[DifferenceFunction, Callable[[], Values]]] = [
    (Circular(Fraction(5)), lambda: Values.from_numbers([0, 1, 2, 3, 4])),
    (Polar((Fraction(0), Fraction(4))), lambda: Values.from_numbers([0, 1, 2, 3, 4])),
    (Jaccard(";"), lambda: Values.from_texts(["a", "b", "a;b", "c", "a;c"])),
    (Tree("/"), lambda: Values.from_texts(["a", "b", "a/x", "a/y", "c/z"])),
]


@pytest.mark.parametrize(
    ("function", "values"), FURTHER, ids=lambda given: getattr(given, "name", "")
)
@given(table=TABLES)
def test_the_prospect_works_for_every_difference_function(
    function: DifferenceFunction, values: Callable[[], Values], table: Any
) -> None:
    """Each step equals measuring the corrected labels anew."""
    coded = twin.coded(table, values=[0, 1, 2, 3, 4])
    agreement = measure_agreement(coded.labels, function, values())
    consensus = consensus_of(agreement.profiles, function, agreement.values)
    order = np.arange(len(table))
    got = prospect(agreement, order, consensus)
    for most_used, path in ((True, got.cautious), (False, got.other)):
        codes, extended = decided_values(agreement, consensus, most_used=most_used)
        for step in range(len(table) + 1):
            settled = order[:step]
            want = agreement_after(
                agreement, settled, codes[agreement.profile_of_item[settled]], extended
            )
            if want.agreement is None:
                assert np.isnan(path.agreement[step])
            else:
                assert path.agreement[step] == pytest.approx(want.agreement, abs=1e-9)


@pytest.mark.parametrize("level", ["ordinal", "ratio"])
def test_blocks_of_steps_join_without_a_seam(level: str, monkeypatch: pytest.MonkeyPatch) -> None:
    """The same figures whatever the size of the work arrays."""
    rng = np.random.default_rng(4)
    table = {u: list(enumerate(rng.integers(1, 6, 4).tolist())) for u in range(60)}
    agreement, _ = measured(table, level)
    consensus = consensus_of(agreement.profiles, agreement.function, agreement.values)
    order = rng.permutation(60)
    whole = prospect(agreement, order, consensus)
    monkeypatch.setattr(settled_base, "CELLS", 40)
    monkeypatch.setattr(settled_sums, "_LEAST_STEPS", 7)
    parts = prospect(agreement, order, consensus)
    assert parts.cautious.agreement == pytest.approx(whole.cautious.agreement, abs=1e-12)
    assert parts.other.agreement == pytest.approx(whole.other.agreement, abs=1e-12)


def test_sizes_without_a_small_common_denominator_stay_exact_enough() -> None:
    """Items of 2 to 60 labels: 1/(m − 1) has no useful common denominator, 1e-12 holds."""
    rng = np.random.default_rng(9)
    table = {u: list(enumerate(rng.integers(0, 3, u + 2).tolist())) for u in range(59)}
    for level in ("nominal", "ordinal"):
        agreement, _ = measured(table, level)
        consensus = consensus_of(agreement.profiles, agreement.function, agreement.values)
        order = rng.permutation(59)
        got = prospect(agreement, order, consensus)
        codes, _ = decided_values(agreement, consensus, most_used=True)
        for step in (0, 1, 30, 58, 59):
            settled = order[:step]
            want = agreement_after(agreement, settled, codes[agreement.profile_of_item[settled]])
            assert got.cautious.agreement[step] == pytest.approx(want.agreement, abs=1e-12)
        assert got.cautious.agreement[-1] == 1.0


def test_falls_are_shown() -> None:
    """A prospect that drops says after how many items; the case is the first paradox."""
    case = published.what_if("paradoxes")[0]
    table = {item: list(labels.items()) for item, labels in case["data"].items()}
    agreement, coded = measured(table, "nominal")
    consensus = consensus_of(agreement.profiles, agreement.function, agreement.values)
    got = prospect(agreement, np.array([coded.items.index("0")]), consensus)
    assert got.falls.tolist() == [1]
    assert got.cautious.agreement.tolist() == pytest.approx([1 / 36, 0], abs=1e-12)


def test_ties_go_to_the_most_used_label_at_the_cautious_end() -> None:
    """Labels 0 five times and 1 once: the tied item becomes 0, at the other end 1."""
    table = {0: [("a", 0), ("b", 1)], 1: [("a", 0), ("b", 0)], 2: [("a", 0), ("b", 0)]}
    agreement, _ = measured(table, "nominal")
    consensus = consensus_of(agreement.profiles, agreement.function, agreement.values)
    tied = agreement.profile_of_item[0]
    most, _ = decided_values(agreement, consensus, most_used=True)
    fewest, _ = decided_values(agreement, consensus, most_used=False)
    assert (most[tied], fewest[tied]) == (0, 1)
    got = prospect(agreement, np.array([0]), consensus)
    assert bool(np.isnan(got.cautious.agreement[1]))
    assert got.undefined_because == NO_VARIATION
    assert got.other.agreement[1] == 1.0


def test_items_that_cannot_be_coded_leave_the_sums() -> None:
    """As if they had never been labelled: equal to the table without the item."""
    table = published.coder_rows("K2011-CD")
    agreement, coded = measured(table, "ordinal")
    got = agreement_after(agreement, np.array([coded.items.index(6)]), np.array([CANNOT_BE_CODED]))
    want = published.what_if("K2011-CD")["ordinal"]["alpha_without_item"]["6"]["exact"]
    assert got.agreement == pytest.approx(float(Fraction(want)), abs=1e-12)
    assert (got.n_cannot_be_coded, got.n_settled, got.n_pairable_items) == (1, 0, 10)
    assert got.n_disputed_items == 2


def test_where_nothing_is_pairable_everything_is_undefined() -> None:
    """Settling cannot make a single label pairable."""
    table = {0: [("a", 0)], 1: [("a", 1)]}
    agreement, _ = measured(table, "nominal")
    consensus = consensus_of(agreement.profiles, agreement.function, agreement.values)
    got = prospect(agreement, np.array([0, 1]), consensus)
    assert bool(np.isnan(got.low).all())
    assert got.undefined_because == NOTHING_PAIRABLE
    alone = settled_alphas(agreement, agreement.profile_of_item, np.array([1, 0]))
    assert alone.undefined_because == NOTHING_PAIRABLE


def test_an_item_without_labels_is_not_settled() -> None:
    """It has no consensus label."""
    labels = CodedLabels.from_codes(np.array([0, 0]), np.array([0, 1]), n_items=2)
    agreement = measure_agreement(labels, DIFFERENCE_FUNCTIONS["nominal"])
    consensus = consensus_of(agreement.profiles, DIFFERENCE_FUNCTIONS["nominal"], Values(2))
    with pytest.raises(RelookError, match="an item without labels cannot be settled"):
        prospect(agreement, np.array([0, 1]), consensus)


def test_no_cases_have_no_sums() -> None:
    """Nothing in, nothing out, of the same kind."""
    none = np.zeros(0, dtype=np.int64)
    got = settled_base.case_sums(none, none)
    assert (got.size, got.dtype) == (0, np.int64)


def test_figures_of_decimals_are_not_scaled() -> None:
    """Labels in quarters: D_o and D_e after each step are those of measuring the corrected labels."""
    table = {
        1: [("A", Fraction(1, 4)), ("B", Fraction(3, 4))],
        2: [("A", 2), ("B", Fraction(5, 4))],
    }
    table[3] = [("A", Fraction(1, 2)), ("B", Fraction(1, 2))]
    agreement, _ = measured(table, "interval")
    assert agreement.differences.denominator > 1
    got = prospect(
        agreement,
        np.array([0, 1]),
        consensus_of(agreement.profiles, agreement.function, agreement.values),
    ).cautious
    before = twin.alpha_by_definition(table, twin.interval)
    first = twin.alpha_by_definition(
        {**table, 1: [("A", Fraction(1, 2)), ("B", Fraction(1, 2))]}, twin.interval
    )
    for step, want in enumerate((before, first)):
        assert got.observed_disagreement[step] == pytest.approx(float(want.observed), rel=1e-12)
        assert got.expected_disagreement[step] == pytest.approx(float(want.expected), rel=1e-12)


def test_the_first_label_of_the_list_counts_as_a_decision() -> None:
    """Code 0 is a label like any other: settled to it, the item is settled and no longer disputed."""
    table = {1: [("A", "a"), ("B", "b")], 2: [("A", "b"), ("B", "b")], 3: [("A", "a"), ("B", "b")]}
    agreement, coded = measured(table, "nominal")
    assert coded.values[0] == "a"
    got = agreement_after(agreement, np.array([0]), np.array([0]))
    assert (got.n_settled, got.n_cannot_be_coded, got.n_disputed_items) == (1, 0, 1)
    want = twin.settled_alpha_by_definition(table, twin.nominal, {1: "a"})
    assert got.agreement == pytest.approx(float(want), abs=1e-12)


def test_decimals_of_seventeen_digits_are_settled_exactly() -> None:
    """Totals beyond 64 bits beside small steps: both figures of each step equal the twin's."""
    long = Fraction("0.30000000000000004")
    table = {
        1: [("A", long), ("B", Fraction("0.3"))],
        2: [("A", 1), ("B", 1)],
        3: [("A", 2), ("B", 5)],
    }
    agreement, coded = measured(table, "interval")
    consensus = consensus_of(agreement.profiles, agreement.function, agreement.values)
    got = prospect(agreement, np.array([0, 2]), consensus).cautious
    mean = (long + Fraction("0.3")) / 2
    rulings: list[tuple[Hashable, Any]] = [(1, mean), (3, Fraction(7, 2))]
    want = twin.prospect_by_definition(table, twin.interval, rulings)
    assert got.agreement == pytest.approx(
        [float(each) for each in want if each is not None], rel=1e-12
    )
    assert coded.items == [1, 2, 3]
