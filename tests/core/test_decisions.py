"""Decisions fold to the same settlements whatever their order, and as stated."""

from __future__ import annotations

from fractions import Fraction
from typing import Any

import pytest
from hypothesis import given
from hypothesis import strategies as st

from relook.core.decisions import Decision, Settlement, fold, number_of, number_text
from relook.errors import RelookError


def ruled(by: str, label: str | None, *, order: str = "1", **more: Any) -> Decision:
    """A ruling on item u, variable v; None is "cannot be coded"."""
    kind = "label" if label is not None else "cannot be coded"
    given: dict[str, Any] = {"ruling": kind, "item": "u", "variable": "v", "id": f"{by}{order}"}
    return Decision(adjudicator=by, label=label, order=(order,), **(given | more))


def settle(*decisions: Decision, **how: Any) -> Settlement:
    return fold(decisions, **how)["u", "v"]


ANY_DECISION = st.builds(
    Decision,
    item=st.sampled_from("uw"),
    variable=st.sampled_from(["v", "number"]),
    adjudicator=st.sampled_from(["a", "b", "c", "lead"]),
    ruling=st.just("label"),
    label=st.sampled_from(["1", "2", "2.0", "4"]),
    order=st.tuples(st.sampled_from("123")),
    id=st.sampled_from(["", "x", "y"]),
    reason=st.sampled_from(["", "slip"]),
) | st.builds(
    Decision,
    item=st.sampled_from("uw"),
    variable=st.sampled_from(["v", "number"]),
    adjudicator=st.sampled_from(["a", "b", "c", "lead"]),
    ruling=st.sampled_from(["cannot be coded", "withdraw"]),
    order=st.tuples(st.sampled_from("123")),
)
HOW = {"tolerances": {"number": Fraction(1)}, "unanimous": {("u", "v"): "1", ("w", "number"): "2"}}


@given(
    st.lists(ANY_DECISION, max_size=14).flatmap(lambda d: st.tuples(st.just(d), st.permutations(d)))
)
def test_any_order_of_the_record_folds_to_the_same(
    pair: tuple[list[Decision], list[Decision]],
) -> None:
    """A permutation of the record changes nothing, equal orders and ids included."""
    record, permuted = pair
    assert fold(record, **HOW) == fold(permuted, **HOW)


@given(
    st.lists(ANY_DECISION, max_size=10),
    st.lists(ANY_DECISION, max_size=10),
    st.lists(ANY_DECISION, max_size=4),
)
def test_merging_two_records_is_their_union(
    first: list[Decision], second: list[Decision], shared: list[Decision]
) -> None:
    """Decisions that both records hold count once, and either may come first."""
    one, other = first + shared, shared + second
    union = list(dict.fromkeys(one + other))
    assert fold(one + other, **HOW) == fold(union, **HOW) == fold(other + one, **HOW)


def test_agreeing_adjudicators_settle() -> None:
    """All rulings the same: settled, with everyone behind it."""
    got = settle(ruled("a", "x"), ruled("b", "x"))
    assert (got.state, got.label, got.supporters) == ("settled", "x", ("a", "b"))


@pytest.mark.parametrize(
    ("labels", "state", "label"),
    [
        (["x"], "settled", "x"),
        (["x", "y"], "split", None),
        (["x", "y", "x"], "settled", "x"),
        (["x", "y", "z"], "split", None),
        (["x", "x", "y", "y"], "split", None),
        (["x", "x", "y", "z"], "settled", "x"),
        ([None], "cannot be coded", None),
        ([None, "x"], "split", None),
        ([None, "x", None], "cannot be coded", None),
    ],
)
def test_more_than_one_who_agree_against_fewer_settle(
    labels: list[str | None], state: str, label: str | None
) -> None:
    """A third ruling ends a split; a draw or three different rulings do not."""
    got = settle(*(ruled(by, label) for by, label in zip("abcd", labels, strict=False)))
    assert (got.state, got.label) == (state, label)


def test_the_lead_ends_a_split() -> None:
    """The lead's ruling settles whatever the others ruled."""
    got = settle(ruled("a", "x"), ruled("b", "x"), ruled("lead", "z"))
    assert (got.state, got.label, got.supporters) == ("settled", "z", ("lead",))
    assert len(got.standing) == 3


def test_the_last_decision_of_an_adjudicator_stands() -> None:
    """A later order supersedes, wherever it stands in the record."""
    got = settle(ruled("a", "new", order="2"), ruled("a", "old", order="1"))
    assert (got.label, len(got.standing)) == ("new", 1)


def test_withdrawing_takes_a_decision_back_and_a_later_one_gives_it_again() -> None:
    """All withdrawn is open; a withdrawal counts for its adjudicator alone."""
    gone = ruled("a", None, order="2", ruling="withdraw")
    assert settle(ruled("a", "x"), gone).state == "open"
    assert settle(ruled("a", "x"), gone, ruled("b", "y")).label == "y"
    assert settle(ruled("a", "x"), gone, ruled("a", "z", order="3")).label == "z"


@pytest.mark.parametrize(
    ("labels", "tolerance", "state", "label", "number"),
    [
        (["2", "3"], 1, "settled", "2.5", Fraction(5, 2)),
        (["2", "3"], 0, "split", None, None),
        (["2", "2.0"], 0, "settled", "2", Fraction(2)),
        (["2.0", "2.0"], 0, "settled", "2.0", Fraction(2)),
        (["1", "2", "3"], 1, "split", None, None),
        (["1", "1.5", "4"], 1, "settled", "1.25", Fraction(5, 4)),
        (["1", "2", "2"], 1, "settled", "1.66666666667", Fraction(5, 3)),
        (["0.1", "0.2", "0.3"], Fraction(1, 5), "settled", "0.2", Fraction(1, 5)),
        (["1", None], 5, "split", None, None),
    ],
)
def test_numbers_within_the_tolerance_settle_with_their_mean(
    labels: list[str | None],
    tolerance: Fraction | int,
    state: str,
    label: str | None,
    number: Fraction | None,
) -> None:
    """Within the tolerance is agreement, exactly at it too; overlapping windows are a split."""
    got = settle(
        *(ruled(by, label) for by, label in zip("abc", labels, strict=False)),
        tolerances={"v": Fraction(tolerance)},
    )
    assert (got.state, got.label, got.number) == (state, label, number)


def test_one_ruling_against_unanimous_coders_waits_for_a_second() -> None:
    """It is shown as proposed; a second adjudicator confirms it, and the same label needs none."""
    coders = {("u", "v"): "x"}
    alone = settle(ruled("a", "y", kind="audit"), unanimous=coders)
    assert (alone.state, alone.label, alone.proposed) == ("unconfirmed", None, "y")
    confirmed = settle(ruled("a", "y"), ruled("b", "y", kind="recheck"), unanimous=coders)
    assert (confirmed.state, confirmed.label) == ("settled", "y")
    assert settle(ruled("a", "x"), unanimous=coders).label == "x"
    assert settle(ruled("a", "y"), ruled("b", "x"), unanimous=coders).state == "split"
    assert settle(ruled("lead", "y"), unanimous=coders).label == "y"
    uncodable = settle(ruled("a", None), unanimous=coders)
    assert (uncodable.state, uncodable.proposed) == ("unconfirmed", None)


def test_a_number_within_the_tolerance_of_unanimous_coders_is_no_contradiction() -> None:
    """Differences up to the tolerance are no finding."""
    how: dict[str, Any] = {"unanimous": {("u", "v"): "2.0"}, "tolerances": {"v": Fraction(1)}}
    assert settle(ruled("a", "3"), **how).state == "settled"
    assert settle(ruled("a", "3.5"), **how).state == "unconfirmed"


@pytest.mark.parametrize("text", ["", "x", "1,5", "nan", "inf", "1e999999999", "1_0", "1/0", "٣"])
def test_what_is_no_number_is_refused(text: str) -> None:
    """Also what would make a number of gigabytes."""
    with pytest.raises(RelookError, match="is no number"):
        number_of(text)


@given(st.fractions(max_denominator=10**6))
def test_a_number_that_ends_is_written_exactly(number: Fraction) -> None:
    """Reading the text gives the number back, to 12 digits where its decimals never end."""
    again = number_of(number_text(number))
    rest = number.denominator
    for prime in (2, 5):
        while rest % prime == 0:
            rest //= prime
    if rest == 1:
        assert again == number
    else:
        assert abs(again - number) <= abs(number) * Fraction(1, 10**11)
