"""Who gets which row."""

from __future__ import annotations

from collections import Counter

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from reference.made_sheets import SECRET
from relook.errors import RelookError
from relook.worksheet.plan import Adjudicator, Plan, PlanItem, plan_worksheets

ADA = Adjudicator(id="a-1", name="Ada")
BEN = Adjudicator(id="a-2", name="Ben")
CLEO = Adjudicator(id="a-3", name="Cleo", coder="c03")


def items(n: int, kind: str = "disputed", n_variables: int = 1, **more: object) -> list[PlanItem]:
    variables = tuple(f"v{at}" for at in range(n_variables))
    return [
        PlanItem(item=f"{kind} {at}", variables=variables, kind=kind, **more)  # type: ignore[arg-type]
        for at in range(n)
    ]


def planned(wanted: list[PlanItem], people: list[Adjudicator], **more: object) -> Plan:
    return plan_worksheets(wanted, people, secret=SECRET, round_number=1, **more)  # type: ignore[arg-type]


def loads(plan: Plan) -> dict[str, int]:
    counted: Counter[str] = Counter()
    for worksheet in plan.worksheets:
        counted[worksheet.adjudicator.name] += len(worksheet.rows)
    return dict(counted)


def test_rows_are_dealt_evenly_and_each_goes_to_one() -> None:
    """41 disputed items and 20 audit items over three: 20 or 21 rows each."""
    plan = planned(items(41) + items(20, "audit"), [ADA, BEN, CLEO])
    assert sorted(loads(plan).values()) == [20, 20, 21]
    every = [row.item for worksheet in plan.worksheets for row in worksheet.rows]
    assert len(every) == len(set(every)) == 61


def test_everybody_gets_a_like_share_of_each_kind() -> None:
    """Audit items are no one adjudicator's lot."""
    plan = planned(items(40) + items(20, "audit"), [ADA, BEN])
    for worksheet in plan.worksheets:
        assert sum(row.kind == "audit" for row in worksheet.rows) == 10


def test_nobody_gets_an_item_they_coded() -> None:
    """Cleo is also coder c03; the others take up the slack, and the loads still come out even."""
    wanted = items(20, coders=("c01", "c03")) + items(10, "audit", coders=("c01",))
    plan = planned(wanted, [ADA, BEN, CLEO])
    cleo = [w for w in plan.worksheets if w.adjudicator == CLEO]
    assert {row.kind for w in cleo for row in w.rows} == {"audit"}
    assert loads(plan) == {"Ada": 10, "Ben": 10, "Cleo": 10}


def test_what_cannot_be_planned_is_listed_and_said() -> None:
    """An item that its only adjudicator coded, or has ruled on, is left for the lead."""
    wanted = [
        PlanItem(item="a", variables=("v",), kind="disputed", coders=("c03",)),
        PlanItem(item="b", variables=("v",), kind="split", barred=("a-3",)),
        PlanItem(item="c", variables=("v",), kind="disputed"),
    ]
    plan = planned(wanted, [CLEO])
    assert [(each.item, each.reason) for each in plan.unplanned] == [
        ("a", "every adjudicator labelled it as a coder"),
        ("b", "every adjudicator has ruled on it already or labelled it as a coder"),
    ]
    assert "2 items can be given to nobody" in plan.said[0]
    assert loads(plan) == {"Cleo": 1}


def test_the_overlap_goes_to_two_different_adjudicators() -> None:
    """A tenth of 60 items: six of them twice, under different codes."""
    plan = planned(items(60), [ADA, BEN], overlap=0.1)
    assert plan.n_overlap == 6
    assert sorted(loads(plan).values()) == [33, 33]
    codes = [row.key for worksheet in plan.worksheets for row in worksheet.rows]
    assert len(set(codes)) == 66


def test_an_overlap_that_cannot_be_had_is_said() -> None:
    """One adjudicator cannot overlap with anybody; splits go to one further person only."""
    alone = planned(items(10), [ADA], overlap=0.5)
    assert (alone.n_overlap, alone.said) == (
        0,
        ("5 items were to go to two adjudicators; only 0 can",),
    )
    assert planned(items(10, "split"), [ADA, BEN], overlap=1.0).n_overlap == 0


def test_an_items_rows_stay_together_in_each_order() -> None:
    """Twelve variables, two kinds of row, a size limit: never is an item parted."""
    wanted = items(10, n_variables=4)
    wanted += [PlanItem(item=each.item, variables=("w",), kind="audit") for each in wanted]
    plan = planned(wanted, [ADA], size_limit=12)
    assert [worksheet.suffix for worksheet in plan.worksheets] == ["-1", "-2", "-3", "-4", "-5"]
    seen: list[str] = []
    for worksheet in plan.worksheets:
        assert len(worksheet.rows) <= 12
        names = [row.item for row in worksheet.rows]
        runs = [name for at, name in enumerate(names) if at == 0 or names[at - 1] != name]
        assert len(runs) == len(set(runs))
        seen += runs
    assert sorted(seen) == sorted({each.item for each in wanted})


def test_parts_are_about_equally_long() -> None:
    """100 rows under a limit of 40 make 34, 34 and 32, not 40, 40 and 20."""
    plan = planned(items(100), [ADA], size_limit=40)
    assert [len(worksheet.rows) for worksheet in plan.worksheets] == [34, 34, 32]
    assert len({worksheet.id for worksheet in plan.worksheets}) == 3


def test_the_plan_does_not_depend_on_the_order_of_the_items() -> None:
    """Ranked order in, the same sheets out as from any other order."""
    wanted = items(30) + items(12, "audit")
    assert planned(wanted, [ADA, BEN], overlap=0.2) == planned(
        wanted[::-1], [ADA, BEN], overlap=0.2
    )


def test_two_adjudicators_see_shared_items_in_unrelated_orders() -> None:
    """Everything shared: rank correlation of the orders is within four standard errors of 0."""
    plan = planned(items(200), [ADA, BEN], overlap=1.0)
    first, second = ([row.item for row in w.rows] for w in plan.worksheets)
    place = {item: at for at, item in enumerate(second)}
    mean = 199 / 2
    covariance = sum((at - mean) * (place[item] - mean) for at, item in enumerate(first))
    assert abs(covariance / sum((at - mean) ** 2 for at in range(200))) < 4 / 199**0.5


@pytest.mark.parametrize(
    ("people", "more", "message"),
    [
        ([], {}, "no adjudicator"),
        ([ADA, ADA], {}, "named twice"),
        ([ADA], {"overlap": 1.5}, "from 0 to 1"),
        ([ADA], {"size_limit": 0}, "1 or more"),
    ],
)
def test_what_makes_no_sense_is_refused(
    people: list[Adjudicator], more: dict[str, object], message: str
) -> None:
    """With a message that says what is wrong."""
    with pytest.raises(RelookError, match=message):
        planned(items(3), people, **more)


@settings(max_examples=40)
@given(
    st.lists(st.tuples(st.sets(st.integers(0, 3), max_size=3), st.integers(1, 4)), max_size=25),
    st.floats(0, 1),
    st.one_of(st.none(), st.integers(1, 9)),
)
def test_laws_of_planning(
    wanted: list[tuple[set[int], int]], overlap: float, size_limit: int | None
) -> None:
    """Every row is planned or listed; nobody gets what they coded; loads differ by one item."""
    people = [Adjudicator(id=f"a-{at}", name=str(at), coder=f"c{at}") for at in range(3)]
    given_items = [
        PlanItem(
            item=f"i{at}",
            variables=tuple(f"v{number}" for number in range(size)),
            kind="disputed",
            coders=tuple(f"c{coder}" for coder in coders),
        )
        for at, (coders, size) in enumerate(wanted)
    ]
    plan = planned(given_items, people, overlap=overlap, size_limit=size_limit)
    by_item = {each.item: each for each in given_items}
    times: Counter[tuple[str, str]] = Counter()
    for worksheet in plan.worksheets:
        for row in worksheet.rows:
            assert worksheet.adjudicator.coder not in by_item[row.item].coders
            times[row.item, row.variable] += 1
    left = {each.item for each in plan.unplanned}
    for each in given_items:
        counts = {times[each.item, variable] for variable in each.variables}
        assert counts <= ({0} if each.item in left else {1, 2})
    keys = [row.key for worksheet in plan.worksheets for row in worksheet.rows]
    assert len(set(keys)) == len(keys)
    if all(not coders for coders, _ in wanted) and wanted and overlap == 0:
        counted = loads(plan)
        totals = [counted.get(person.name, 0) for person in people]
        assert max(totals) - min(totals) <= max(size for _, size in wanted)
