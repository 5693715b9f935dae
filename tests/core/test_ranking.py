"""The order of a queue, against a plain reading of its rules."""

from __future__ import annotations

from collections import defaultdict
from typing import Any

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from reference import by_definition as twin
from reference import published
from relook.core.agreement import Agreement, measure_agreement
from relook.core.differences import DIFFERENCE_FUNCTIONS, Values
from relook.core.labels import CodedLabels
from relook.core.ranking import RankedVariable, Ranking, rank_items
from relook.core.ties import tie_levels
from relook.errors import RelookError


def measured(rows: list[list[int]], level: str = "nominal", tolerance: int = 0) -> Agreement:
    """Rows of value codes, an item each; the codes are the numbers."""
    item = np.repeat(np.arange(len(rows)), [len(labels) for labels in rows])
    flat = np.array([value for labels in rows for value in labels], dtype=np.int64)
    n_values = int(flat.max()) + 1
    labels = CodedLabels.from_codes(item, flat, n_items=len(rows), n_values=n_values)
    values = Values.from_numbers(list(range(n_values)))
    return measure_agreement(labels, DIFFERENCE_FUNCTIONS[level], values, tolerance=tolerance)


def ranked(rows: list[list[int]], level: str = "nominal", **how: Any) -> Ranking:
    variable = RankedVariable(name="v", agreement=measured(rows, level))
    return rank_items([variable], np.arange(len(rows))[::-1].copy(), **how)


def by_rules(rows: list[list[int]], level: str, item_hash: list[int]) -> list[int]:
    """One variable, by contribution: the rules in plain Python over exact fractions."""
    table = {item: list(enumerate(labels)) for item, labels in enumerate(rows)}
    delta = {"nominal": twin.nominal, "ordinal": twin.ordinal, "interval": twin.interval}[level]
    parts = {item: part for item, part in twin.item_parts(table, delta).items() if part}
    total = twin.label_pair_parts(table, delta)
    # Equally heavy pairs stand in the order of their labels.
    pair_order = sorted(
        (pair for pair in total if len(pair) == 2), key=lambda pair: (-total[pair], sorted(pair))
    )
    difference = delta(table)

    def heaviest(item: int) -> Any:
        own: dict[Any, Any] = defaultdict(int)
        values = rows[item]
        for i, first in enumerate(values):
            for j, second in enumerate(values):
                if i != j and first != second:
                    own[frozenset({first, second})] += difference(first, second)
        return max(own, key=lambda pair: (own[pair], -pair_order.index(pair)))

    def mean_difference(item: int) -> Any:
        m = len(rows[item])
        return parts[item] / m  # n d_u/m is the mean over ordered pairs

    blocks: dict[Any, list[int]] = defaultdict(list)
    for item in parts:
        blocks[parts[item], mean_difference(item)].append(item)  # type: ignore[arg-type]
    order: list[int] = []
    for key in sorted(blocks, reverse=True):
        hands: dict[int, list[int]] = defaultdict(list)
        for item in sorted(blocks[key], key=lambda item: item_hash[item]):
            hands[pair_order.index(heaviest(item))].append(item)
        turn = 0
        while any(len(hand) > turn for hand in hands.values()):
            order += [hands[pair][turn] for pair in sorted(hands) if len(hands[pair]) > turn]
            turn += 1
    return order


@pytest.mark.parametrize("level", ["nominal", "ordinal", "interval"])
@given(
    rows=st.lists(st.lists(st.integers(0, 3), min_size=1, max_size=4), min_size=2, max_size=10),
    data=st.data(),
)
def test_one_variable_ranks_by_the_rules(level: str, rows: list[list[int]], data: Any) -> None:
    """Contribution, intensity, in turn over pairs heaviest first, then the hash."""
    item_hash = data.draw(st.permutations(range(len(rows))))
    variable = RankedVariable(name="v", agreement=measured(rows, level))
    got = rank_items([variable], np.array(item_hash))
    assert got.item_index.tolist() == by_rules(rows, level, item_hash)
    assert got.carried_in_all == pytest.approx(variable.agreement.observed_disagreement or 0.0)


def test_contributions_are_those_of_the_worked_example() -> None:
    """Krippendorff (2011) with four coders: exact contributions of the disputed items, per level."""
    coded = twin.coded(published.coder_rows("K2011-CD"))
    for level in ("nominal", "ordinal", "interval", "ratio"):
        agreement = measure_agreement(coded.labels, DIFFERENCE_FUNCTIONS[level], coded.numbers())
        got = rank_items(
            [RankedVariable(name="v", agreement=agreement)], np.arange(len(coded.items))
        )
        want = published.what_if("K2011-CD")[level]["item_contributions"]
        found = {
            str(coded.items[item]): part
            for item, part in zip(got.item_index, got.row_contribution, strict=True)
        }
        assert found == pytest.approx(
            {item: each["value"] for item, each in want.items()}, abs=1e-12
        )


def test_ties_are_dealt_in_turn_over_pairs_heaviest_first() -> None:
    """Three items 0–1, two 0–2, one 1–2 with two coders: 01 02 12 01 02 01."""
    rows = [[0, 1], [0, 1], [1, 0], [0, 2], [2, 0], [1, 2], [0, 0]]
    got = ranked(rows)
    kinds = ["".join(map(str, sorted(rows[item]))) for item in got.item_index]
    assert kinds == ["01", "02", "12", "01", "02", "01"]
    assert np.unique(got.tied).size == 1
    # Within a pair by hash, which falls with position here.
    assert got.item_index.tolist() == [2, 4, 5, 1, 3, 0]


@given(st.permutations(range(8)))
def test_the_order_does_not_follow_the_file(permutation: list[int]) -> None:
    """Items in another order, with their hashes, rank the same."""
    rows = [[0, 1], [0, 1], [1, 2], [0, 2, 2], [2, 0], [1, 2], [0, 0], [1, 1, 0]]
    item_hash = np.array([5, 3, 8, 1, 2, 7, 6, 4])
    straight = rank_items([RankedVariable(name="v", agreement=measured(rows))], item_hash)
    moved = rank_items(
        [RankedVariable(name="v", agreement=measured([rows[i] for i in permutation]))],
        item_hash[permutation],
    )
    assert [permutation[item] for item in moved.item_index] == straight.item_index.tolist()


def test_doubt_breaks_ties_before_intensity_does() -> None:
    """Equal contributions: the larger doubt first; nan counts as none."""
    agreement = measured([[0, 1], [0, 1], [0, 1], [0, 1]])
    variable = RankedVariable(
        name="v", agreement=agreement, doubt=np.array([0.1, np.nan, 0.9, 0.5])
    )
    assert rank_items([variable], np.arange(4)).item_index.tolist() == [2, 3, 0, 1]


def test_ranking_by_doubt_breaks_equal_doubts_within_a_tie() -> None:
    """Doubt first, then what tells between equal doubts."""
    variable = RankedVariable(
        name="v",
        agreement=measured([[0, 1], [0, 1], [0, 1, 1], [0, 1]]),
        doubt=np.array([0.5, 0.5, 0.7, 0.5]),
        doubt_within_tie=np.array([0.2, 0.4, 0.7, 0.3]),
    )
    got = rank_items([variable], np.arange(4), rank_by="doubt")
    assert got.item_index.tolist() == [2, 1, 3, 0]
    assert got.score.tolist() == [0.7, 0.5, 0.5, 0.5]


def test_ranking_by_intensity_ignores_the_number_of_labels() -> None:
    """1 : 1 has a mean difference of 1, 9 : 1 of .2, though both contribute alike: 2/n and 2/n."""
    rows = [[0] * 9 + [1], [0, 1]]
    by_contribution, by_intensity = ranked(rows), ranked(rows, rank_by="intensity")
    assert by_contribution.score[0] == pytest.approx(by_contribution.score[1], rel=1e-12)
    assert by_intensity.item_index.tolist() == [1, 0]
    assert by_intensity.score.tolist() == pytest.approx([1.0, 0.2])


def test_priority_multiplies_the_score_and_0_keeps_out() -> None:
    """Twice the weight goes first; 0 never comes; what all items carry stays the whole."""
    rows = [[0, 1], [0, 1], [0, 1], [0, 0]]
    got = ranked(rows, priority=np.array([1.0, 2.0, 0.0, 1.0]))
    assert got.item_index.tolist() == [1, 0]
    assert got.carried_in_all == pytest.approx(0.75)
    with pytest.raises(RelookError, match="0 or more"):
        ranked(rows, priority=np.array([1.0, -1.0, 1.0, 1.0]))
    with pytest.raises(RelookError, match="0 or more"):
        ranked(rows, priority=np.array([1.0, np.nan, 1.0, 1.0]))


def test_numbers_within_the_tolerance_are_not_ranked() -> None:
    """1 against 2 within 1 is no dispute; 1 against 4 is."""
    variable = RankedVariable(name="v", agreement=measured([[1, 2], [1, 4]], "interval", 1))
    assert rank_items([variable], np.arange(2)).item_index.tolist() == [1]


def test_several_variables_add_up_on_a_chance_scale() -> None:
    """Score Σ weight × n_v d_u,v/D_e,v from the twin; an item's rows together, heaviest first."""
    first = [[0, 1, 1], [0, 0, 0], [1, 2, 0], [2, 2, 2], [0, 0, 1]]
    second = [[0, 3], [1, 1], [3, 3], [0, 1], []]
    weights = (1.0, 2.0)
    agreements = [measured(first), measured(second, "interval")]
    got = rank_items(
        [
            RankedVariable(name=name, agreement=agreement, weight=weight)
            for name, agreement, weight in zip("ab", agreements, weights, strict=True)
        ],
        np.arange(5),
    )
    want: dict[Any, Any] = defaultdict(float)
    scaled: dict[Any, Any] = {}
    for v, (rows, delta) in enumerate(((first, twin.nominal), (second, twin.interval))):
        table = {u: list(enumerate(labels)) for u, labels in enumerate(rows)}
        figures = twin.alpha_by_definition(table, delta)
        for u, part in twin.item_parts(table, delta).items():
            scaled[u, v] = weights[v] * float(figures.n * part / figures.expected)  # type: ignore[operator]
            want[u] += scaled[u, v]
    order = sorted((u for u in want if want[u]), key=lambda u: -want[u])
    assert got.item_index.tolist() == order
    assert got.score == pytest.approx([want[u] for u in order], rel=1e-12)
    assert got.carried_in_all == pytest.approx(sum(want.values()), rel=1e-12)
    for rank, u in enumerate(order):
        rows_of_item = got.row_variable[got.row_start[rank] : got.row_start[rank + 1]].tolist()
        mean = [
            sum(each for (_, of), each in scaled.items() if of == v)
            / sum(1 for _, of in scaled if of == v)
            for v in (0, 1)
        ]
        wanted = [v for v in (0, 1) if scaled.get((u, v), 0) and scaled[u, v] >= mean[v]]
        heaviest = max((0, 1), key=lambda v: scaled.get((u, v), 0))
        assert sorted(rows_of_item) == sorted({*wanted, heaviest})
        assert rows_of_item[0] == heaviest
    assert got.items_with(1).tolist() == [
        u for rank, u in enumerate(order)
        if 1 in got.row_variable[got.row_start[rank] : got.row_start[rank + 1]]
    ]  # fmt: skip


def test_a_variable_asked_of_few_items_weighs_no_less() -> None:
    """n_v d_u,v/D_e,v is the same whether 2 or 200 items were asked, marginals alike."""
    few = measured([[0, 1], [1, 0]] + [[]] * 198)
    many = measured([[0, 1], [1, 0]] * 100)
    few_got = rank_items([RankedVariable(name=n, agreement=few) for n in "ab"], np.arange(200))
    many_got = rank_items([RankedVariable(name=n, agreement=many) for n in "ab"], np.arange(200))
    # D_e is 2/3 of 4 labels and 200/399 of 400: the small-sample term n/(n − 1) is all that tells.
    assert few_got.score[0] / many_got.score[0] == pytest.approx((200 / 399) / (2 / 3), rel=1e-12)


def test_an_undefined_variable_adds_nothing() -> None:
    """Beside a variable on which everyone agrees the other one ranks alone."""
    agreed = measured([[0, 0], [0, 0], [0, 0]])
    other = measured([[0, 1], [0, 0], [1, 1]])
    got = rank_items(
        [RankedVariable(name="a", agreement=agreed), RankedVariable(name="b", agreement=other)],
        np.arange(3),
    )
    assert got.item_index.tolist() == [0]
    assert got.row_variable.tolist() == [1]
    assert np.isfinite(got.score).all()


def test_doubt_that_nobody_has_cannot_rank() -> None:
    """Ranking by doubt without one is refused, with what to do instead."""
    with pytest.raises(RelookError, match="no variable has a doubt") as caught:
        ranked([[0, 1]], rank_by="doubt")
    assert caught.value.mend is not None


def test_scores_equal_to_12_digits_are_tied() -> None:
    """Relative, so also for tiny scores; 11 equal digits are no tie."""
    scores = np.array([1.0, 1 + 5e-13, 1 + 5e-11, 3e-20, 3e-20 * (1 + 5e-13), 0.0])
    assert tie_levels(scores).tolist() == [1, 1, 0, 2, 2, 3]


def test_nothing_disputed_gives_an_empty_ranking() -> None:
    """No items, no rows, and nothing carried."""
    got = ranked([[0, 0], [1, 1]])
    assert got.n_items == 0
    assert got.row_start.tolist() == [0]
    assert got.carried_in_all == 0.0
    assert got.rank_of_item(2).tolist() == [0, 0]


@pytest.mark.parametrize(
    ("how", "said"),
    [
        ({"variables": []}, "`variables` must hold at least one variable; got none"),
        ({"weight": -1.0}, 'the weight of "v" must not be negative'),
        ({"hashes": 3}, "`item_hash` must have 2 entries"),
    ],
)
def test_what_cannot_be_ranked_is_refused(how: dict[str, Any], said: str) -> None:
    """Each says what was wrong with what it got."""
    agreement = measured([[0, 1], [0, 0]])
    variables = [RankedVariable(name="v", agreement=agreement, weight=how.get("weight", 1.0))]
    with pytest.raises(RelookError, match=said):
        rank_items(how.get("variables", variables), np.arange(how.get("hashes", 2)))


def test_a_variable_without_doubt_leaves_the_order_to_the_others() -> None:
    """By doubt, over two variables of which one has it: 0.4 before 0.1, at equal contribution."""
    agreement = measured([[0, 1], [0, 1], [0, 0]])
    got = rank_items(
        [
            RankedVariable(name="a", agreement=agreement, doubt=np.array([0.1, 0.4, 0.0])),
            RankedVariable(name="b", agreement=agreement),
        ],
        np.arange(3),
        rank_by="doubt",
    )
    assert got.item_index.tolist() == [1, 0]


def test_a_variable_that_nobody_answered_twice_takes_no_rows() -> None:
    """Single labels have no disagreement to weigh; the other variable ranks alone."""
    single = measured([[0], [1], []])
    other = measured([[0, 1], [0, 0], [1, 1]])
    got = rank_items(
        [RankedVariable(name="a", agreement=single), RankedVariable(name="b", agreement=other)],
        np.arange(3),
    )
    assert (got.item_index.tolist(), got.row_variable.tolist()) == ([0], [1])
