"""How many items a queue takes, and what bound it."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest

from relook.core.agreement import measure_agreement
from relook.core.differences import DIFFERENCE_FUNCTIONS, Values
from relook.core.labels import CodedLabels
from relook.core.ranking import RankedVariable, Ranking, rank_items
from relook.core.selection import select_head
from relook.errors import RelookError


def ranking(n: int, agreed: int = 0) -> Ranking:
    """N items that contribute alike, and some that agree."""
    item = np.repeat(np.arange(n + agreed), 2)
    value = np.concatenate([np.tile([0, 1], n), np.zeros(2 * agreed, np.int64)])
    agreement = measure_agreement(
        CodedLabels.from_codes(item, value, n_values=2), DIFFERENCE_FUNCTIONS["nominal"]
    )
    return rank_items([RankedVariable(name="v", agreement=agreement)], np.arange(n + agreed))


@pytest.mark.parametrize(
    ("how", "n", "bound_by"),
    [
        ({"top": 7}, 7, "top"),
        ({"share": 0.6}, 24, "share"),
        ({"share": 0.61}, 25, "share"),
        ({"share": 1.0}, 40, "share"),
        ({"hours": 0.25, "seconds_per_item": 45}, 20, "hours"),
        ({"hours": 0.25, "seconds_per_item": 45, "n_audit_items": 5}, 15, "hours"),
        ({"hours": 0.25, "seconds_per_item": 45, "overlap": 0.25}, 16, "hours"),
        ({"hours": 0.25, "seconds_per_item": 45, "overlap": 0.1, "n_audit_items": 3}, 15, "hours"),
        ({"top": 9, "share": 0.6, "hours": 0.25, "seconds_per_item": 45}, 9, "top"),
        ({"top": 30, "share": 0.6, "hours": 0.25, "seconds_per_item": 45}, 20, "hours"),
        ({"top": 500}, 40, "all disputed items"),
        ({}, 20, "default share"),
        ({"seconds_per_item": 45}, 20, "default share"),
    ],
)
def test_the_smallest_limit_binds_and_is_named(how: dict[str, Any], n: int, bound_by: str) -> None:
    """40 items of equal contribution; times by hand: 15 minutes are 20 rulings of 45 seconds."""
    got = select_head(ranking(40, agreed=10), **how)
    assert (got.n_items, got.bound_by) == (n, bound_by)
    assert got.share == pytest.approx(n / 40)
    assert got.item_index.size == got.n_rows == n


def test_without_a_wish_at_most_a_hundred() -> None:
    """Half of 300 equal items would be 150."""
    got = select_head(ranking(300))
    assert (got.n_items, got.bound_by) == (100, "default top")
    assert got.limits == {"default share": 150, "default top": 100}


def test_time_counts_audits_and_overlap() -> None:
    """16 items, a quarter of them twice, and 4 audit items at 45 seconds: 24 rulings."""
    got = select_head(ranking(40), top=16, seconds_per_item=45, overlap=0.25, n_audit_items=4)
    assert got.seconds == 24 * 45


def test_a_share_that_priority_rules_out_takes_all_there_is() -> None:
    """Half of the disagreement is kept out by priority 0, so 80 % cannot be reached."""
    item = np.repeat(np.arange(4), 2)
    agreement = measure_agreement(
        CodedLabels.from_codes(item, np.tile([0, 1], 4)), DIFFERENCE_FUNCTIONS["nominal"]
    )
    ranked = rank_items(
        [RankedVariable(name="v", agreement=agreement)],
        np.arange(4),
        priority=np.array([1.0, 1.0, 0.0, 0.0]),
    )
    got = select_head(ranked, share=0.8)
    assert (got.n_items, got.bound_by, got.share) == (2, "all disputed items", 0.5)


def test_it_says_which_variable_filled_the_queue() -> None:
    """Variable b is disputed in three items, a in one, with the same marginals: 3 of 4 is 75 %."""
    item = np.repeat(np.arange(4), 2)
    a = CodedLabels.from_codes(item, np.array([0, 1, 0, 0, 1, 1, 0, 0]), n_values=2)
    b = CodedLabels.from_codes(item, np.array([0, 0, 0, 1, 1, 0, 0, 1]), n_values=2)
    variables = [
        RankedVariable(
            name=name,
            agreement=measure_agreement(labels, DIFFERENCE_FUNCTIONS["nominal"], Values(2)),
        )
        for name, labels in (("a", a), ("b", b))
    ]
    ranked = rank_items(variables, np.arange(4))
    got = select_head(ranked, top=3)
    assert got.led_by_variable.tolist() == [1, 2]
    assert got.rows_per_variable.tolist() == [1, 2]
    assert got.share_per_variable == pytest.approx([1.0, 2 / 3])
    assert got.sentence(ranked) == (
        "3 of 4 disputed items, 75% of the chance-scaled disagreement; as many as were asked for; "
        '"b" filled the queue: heaviest in 2 of 3'
    )


def test_nothing_disputed_selects_nothing() -> None:
    """No share of nothing."""
    got = select_head(ranking(0, agreed=5), top=3)
    assert (got.n_items, got.share, got.bound_by) == (0, None, "all disputed items")


@pytest.mark.parametrize(
    ("how", "said"),
    [
        ({"top": 0}, "`top` must be 1 or more; got 0"),
        ({"share": 0.0}, "`share` must be above 0"),
        ({"share": 60}, "`share` must be above 0 and at most 1; got 60"),
        ({"hours": 1}, "hours need the time that one item takes"),
        ({"hours": -1, "seconds_per_item": 45}, "`hours` must be above 0"),
        ({"hours": 1, "seconds_per_item": 0}, "`seconds_per_item` must be above 0"),
        ({"top": 5, "overlap": 1.5}, "`overlap` must be from 0 to 1"),
        ({"top": 5, "n_audit_items": -1}, "`n_audit_items` must be 0 or more"),
        ({"hours": 0.1, "seconds_per_item": 45, "n_audit_items": 8}, "leave no time"),
    ],
)
def test_limits_out_of_range_are_refused(how: dict[str, Any], said: str) -> None:
    """Each names itself and what it got."""
    with pytest.raises(RelookError, match=said):
        select_head(ranking(40), **how)


def test_variables_that_lead_as_often_share_the_sentence() -> None:
    """Two variables of the same labels, one disputed item each: both filled the queue."""
    item = np.repeat(np.arange(4), 2)
    a = CodedLabels.from_codes(item, np.array([0, 1, 0, 0, 1, 1, 0, 0]), n_values=2)
    b = CodedLabels.from_codes(item, np.array([0, 0, 0, 1, 1, 1, 0, 0]), n_values=2)
    variables = [
        RankedVariable(name=n, agreement=measure_agreement(labels, DIFFERENCE_FUNCTIONS["nominal"]))
        for n, labels in (("a", a), ("b", b))
    ]
    ranked = rank_items(variables, np.arange(4))
    assert (
        select_head(ranked, top=2)
        .sentence(ranked)
        .endswith('"a" and "b" filled the queue: heaviest in 1 of 2 each')
    )


def test_the_sentence_of_nothing_has_no_share() -> None:
    """Nothing disputed: neither a share nor a variable that filled the queue."""
    item = np.repeat(np.arange(2), 2)
    agreed = CodedLabels.from_codes(item, np.array([0, 0, 1, 1]), n_values=2)
    agreement = measure_agreement(agreed, DIFFERENCE_FUNCTIONS["nominal"])
    variables = [RankedVariable(name=name, agreement=agreement) for name in "ab"]
    ranked = rank_items(variables, np.arange(2))
    got = select_head(ranked)
    assert got.sentence(ranked) == "0 of 0 disputed items; that is all of them"


def test_hours_that_just_fit_are_used_up() -> None:
    """A tenth more rulings than items: 100 rulings pay for 90 items and 9 second rulings of them.

    91 items would need 91 + 10 rulings, by hand.
    """
    got = select_head(ranking(200), hours=1, seconds_per_item=36, overlap=0.1)
    assert got.n_items == 90
    assert got.seconds == 99 * 36
