"""Which labels a row shows."""

from __future__ import annotations

import random
from collections import Counter

import pytest

from reference.made_sheets import SECRET
from relook.errors import RelookError
from relook.worksheet.competing import RowLabels, competing_labels, pairs_of, shown_order

LABELS = ("delay", "crew", "comfort", "price", "other")


def disputed(item: str, *given: str) -> RowLabels:
    return RowLabels(item=item, variable="topic", kind="disputed", given=given)


def audit(item: str, *given: str) -> RowLabels:
    return RowLabels(item=item, variable="topic", kind="audit", given=given)


ROWS = (
    *(disputed(f"d{at}", "delay", "crew") for at in range(12)),
    *(disputed(f"e{at}", "delay", "price", "other") for at in range(4)),
    *(audit(f"a{at}", "delay") for at in range(8)),
)


def test_pairs_are_counted_in_items() -> None:
    """Three labels make three pairs; audit rows with one label make none."""
    assert pairs_of(ROWS) == {
        "topic": {
            ("crew", "delay"): 12.0,
            ("delay", "price"): 4.0,
            ("delay", "other"): 4.0,
            ("other", "price"): 4.0,
        }
    }


def test_audit_rows_show_as_many_labels_as_disputed_ones() -> None:
    """Twelve of sixteen disputed rows show two labels and four show three: so six and two of eight."""
    shown = competing_labels(ROWS, pairs_of(ROWS), reveal="labels", secret=SECRET)
    sizes = Counter(len(shown[row.item, "topic"]) for row in ROWS if row.kind == "audit")
    assert sizes == {2: 6, 3: 2}


def test_further_labels_come_from_pairs_that_occur() -> None:
    """`comfort` meets nothing, so it is never shown; what was given is shown and kept first."""
    shown = competing_labels(ROWS, pairs_of(ROWS), reveal="labels", secret=SECRET)
    for row in ROWS:
        labels = shown[row.item, "topic"]
        assert labels[: len(row.given)] == row.given
        assert len(set(labels)) == len(labels)
        assert "comfort" not in labels
        if row.kind == "disputed":
            assert labels == row.given


def test_further_labels_are_drawn_by_weight() -> None:
    """Beside `delay`: crew 12 of 20, price and other 4 each; 2,000 draws, within 5 s.e. (0.055)."""
    pairs = pairs_of(ROWS)
    rows = [disputed("d", "delay", "crew"), *(audit(f"a{at}", "delay") for at in range(2_000))]
    shown = competing_labels(rows, pairs, reveal="labels", secret=SECRET)
    drawn = Counter(shown[f"a{at}", "topic"][1] for at in range(2_000))
    assert drawn["crew"] / 2_000 == pytest.approx(0.6, abs=0.055)
    assert drawn["price"] / 2_000 == pytest.approx(0.2, abs=0.045)


def test_the_draw_depends_on_the_secret_and_nothing_else() -> None:
    """The order of rows does not matter; another secret shows other labels."""
    pairs = pairs_of(ROWS)
    shown = competing_labels(ROWS, pairs, reveal="labels", secret=SECRET)
    assert shown == competing_labels(ROWS[::-1], pairs, reveal="labels", secret=SECRET)
    assert shown != competing_labels(ROWS, pairs, reveal="labels", secret=bytes(32))


def test_a_label_without_pairs_is_joined_by_any_label_in_dispute() -> None:
    """`comfort` was never disputed; its audit row still shows two labels."""
    rows = (*ROWS, audit("z", "comfort"))
    shown = competing_labels(rows, pairs_of(ROWS), reveal="labels", secret=SECRET)
    assert len(shown["z", "topic"]) >= 2


def test_no_pairs_at_all_leave_a_row_as_it_is() -> None:
    """Nothing can be drawn where nothing was ever disputed."""
    rows = (audit("z", "comfort"),)
    assert competing_labels(rows, {}, reveal="labels", secret=SECRET) == {
        ("z", "topic"): ("comfort",)
    }


def test_numbers_are_joined_by_numbers_a_real_gap_away() -> None:
    """50 met nothing; real pairs are 10 apart, so 40 or 60 joins it, though nobody gave either."""
    pairs = {"crumb": {("20", "30"): 3.0, ("70", "80"): 1.0}}
    rows = (
        RowLabels(item="d", variable="crumb", kind="disputed", given=("20", "30")),
        RowLabels(item="a", variable="crumb", kind="audit", given=("50",)),
    )
    shown = competing_labels(rows, pairs, reveal="labels", secret=SECRET, numeric=("crumb",))
    assert set(shown["a", "crumb"]) in ({"50", "40"}, {"50", "60"})


def test_tallies_and_names_show_what_was_given() -> None:
    """Audit rows can then be told, and are."""
    for reveal in ("tallies", "names"):
        shown = competing_labels(ROWS, pairs_of(ROWS), reveal=reveal, secret=SECRET)  # type: ignore[arg-type]
        assert shown == {(row.item, row.variable): row.given for row in ROWS}


def test_nothing_revealed_shows_no_labels() -> None:
    """Not even on disputed rows."""
    shown = competing_labels(ROWS, pairs_of(ROWS), reveal="nothing", secret=SECRET)
    assert set(shown.values()) == {()}


@pytest.mark.parametrize("reveal", ["nothing", "labels"])
def test_hidden_audits_beside_remarks_are_refused(reveal: str) -> None:
    """A remark exists for given labels only, so it would tell which rows are audits."""
    with pytest.raises(RelookError, match="remarks would tell") as caught:
        competing_labels(
            ROWS,
            pairs_of(ROWS),
            reveal=reveal,
            secret=SECRET,
            remarks_shown=True,  # type: ignore[arg-type]
        )
    assert caught.value.mend is not None
    without = [row for row in ROWS if row.kind == "disputed"]
    assert competing_labels(without, {}, reveal=reveal, secret=SECRET, remarks_shown=True)  # type: ignore[arg-type]


def order(labels: tuple[str, ...], item: str, *, numeric: bool = False) -> tuple[str, ...]:
    return shown_order(
        labels, item=item, variable="v", worksheet="w", secret=SECRET, numeric=numeric
    )


def test_labels_stand_in_a_keyed_order() -> None:
    """The order given does not matter, and each label comes first about equally often."""
    first: Counter[str] = Counter()
    for at in range(1_000):
        labels = list(LABELS)
        random.Random(at).shuffle(labels)
        shown = order(tuple(labels), f"i{at}")
        assert shown == order(LABELS, f"i{at}")
        first[shown[0]] += 1
    # A fifth of 1,000 each; five standard errors of a binomial are 63.
    assert all(abs(first[label] - 200) < 63 for label in LABELS)


def test_numbers_ascend_and_many_labels_are_sorted() -> None:
    """9 before 10; and seven labels share a cell, so they stand as in a list."""
    assert order(("10", "9", "-1", "9.5"), "i", numeric=True) == ("-1", "9", "9.5", "10")
    assert order(tuple("gfedcba"), "i") == tuple("abcdefg")
