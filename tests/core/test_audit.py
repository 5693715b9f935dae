"""Audit items: strata, the draw, and what the rulings say."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy.stats import hypergeom

from relook.core.agreement import measure_agreement
from relook.core.audit import (
    SLIP_EXAMPLE,
    STRATA,
    allocate,
    draw_audit,
    estimate,
    stratify,
)
from relook.core.differences import DIFFERENCE_FUNCTIONS
from relook.core.labels import CodedLabels
from relook.errors import RelookError


def test_items_fall_into_the_strata_that_would_be_released_undecided() -> None:
    """Unanimous, disputed but not queued, single; queued items and items without labels in none."""
    labels = CodedLabels.from_codes(
        np.array([0, 0, 1, 1, 2, 2, 3]), np.array([0, 0, 0, 1, 1, 0, 1]), n_items=5
    )
    agreement = measure_agreement(labels, DIFFERENCE_FUNCTIONS["nominal"])
    queued = np.array([False, True, False, False, False])
    assert stratify(agreement, queued).tolist() == [
        STRATA.index("unanimous"), -1, STRATA.index("not queued"), STRATA.index("single"), -1,
    ]  # fmt: skip


@given(
    st.lists(st.integers(0, 500), min_size=3, max_size=3).map(np.array),
    st.integers(0, 400),
)
def test_draws_are_shared_out_in_proportion(sizes: np.ndarray, n: int) -> None:
    """All are used, none beyond its stratum, one at least each, and never off by more than that."""
    given_ = allocate(sizes, n)
    filled = int((sizes > 0).sum())
    assert int(given_.sum()) == min(n, int(sizes.sum()))
    assert bool(np.all(given_ <= sizes))
    if n >= filled:
        assert bool(np.all(given_[sizes > 0] >= 1))
    exact = n * sizes / max(1, int(sizes.sum()))
    if n <= int(sizes.sum()):
        assert bool(np.all(given_ <= np.maximum(1, np.ceil(exact))))


def test_a_draw_keeps_sizes_and_chances() -> None:
    """20 of 100 + 50 + 10: stored sizes, chances drawn/size, every item of its stratum, none twice."""
    stratum = np.repeat([0, 1, 2, -1], [100, 50, 10, 30])
    draw = draw_audit(stratum, 20, np.random.default_rng(5))
    assert draw.sizes == {"unanimous": 100, "not queued": 50, "single": 10}
    assert draw.drawn == {"unanimous": 13, "not queued": 6, "single": 1}
    assert draw.chances["not queued"] == 6 / 50
    assert np.unique(draw.item_index).size == 20
    assert draw.stratum.tolist() == stratum[draw.item_index].tolist()


def test_a_draw_does_not_follow_the_order_of_the_file() -> None:
    """With hashed ids the same items are drawn when the file is turned round."""
    rng = np.random.default_rng(8)
    item_hash = rng.integers(0, 2**62, 60)
    stratum = np.repeat([0, 1, 2], 20)
    one = draw_audit(stratum, 12, np.random.default_rng(3), item_hash=item_hash)
    other = draw_audit(stratum[::-1], 12, np.random.default_rng(3), item_hash=item_hash[::-1])
    assert one.item_index.tolist() == (59 - other.item_index).tolist()


def test_each_item_of_a_stratum_has_the_same_chance() -> None:
    """4,000 draws of 6 (seed 2): every item within 5 standard errors of its stored chance."""
    stratum = np.repeat([0, 1, 2], [12, 6, 2])
    rng = np.random.default_rng(2)
    often = np.zeros(20)
    for _ in range(4000):
        draw = draw_audit(stratum, 6, rng)
        often[draw.item_index] += 1
    chance = np.array([draw.chances[STRATA[code]] for code in stratum])
    error = np.sqrt(chance * (1 - chance) / 4000)
    assert bool(np.all(np.abs(often / 4000 - chance) < 5 * error))


def test_the_share_for_the_release_weighs_strata_by_size() -> None:
    """Σ W_h p_h by hand: (900 × 1/30 + 100 × 4/10) / 1000 = .07."""
    got = estimate(
        {"unanimous": 900, "not queued": 100, "single": 0},
        {"unanimous": 30, "not queued": 10},
        {"unanimous": 1, "not queued": 4},
    )
    assert got.share_ruled_otherwise == pytest.approx(0.07, abs=1e-15)
    assert got.low is not None
    assert got.high is not None
    assert got.low < 0.07 < got.high
    assert [result.stratum for result in got.strata] == ["unanimous", "not queued"]


def test_a_stratum_without_a_ruling_leaves_the_release_undefined() -> None:
    """The strata that have rulings still say theirs."""
    got = estimate({"unanimous": 90, "single": 10}, {"unanimous": 59}, {})
    assert got.share_ruled_otherwise is None
    assert got.undefined_because == "no audit item was ruled on among the items that are single"
    assert got.strata[0].share == 0
    # 59 of 90 drawn, nothing found: up to 3 of the other 31 may be otherwise (scipy's hypergeom).
    assert hypergeom.cdf(0, 90, 3, 59) > 0.025 > hypergeom.cdf(0, 90, 4, 59)
    assert (got.strata[0].low, got.strata[0].high) == (0, 3 / 90)
    assert got.strata[1].share is None
    assert estimate({}, {}, {}).undefined_because == "nothing would be released without a decision"


def test_estimates_cover_simulated_audits() -> None:
    """Drawn from a known release, the 95 % interval holds the true share in 94 % or more (seed 6)."""
    rng = np.random.default_rng(6)
    stratum = np.repeat([0, 1, 2], [1500, 300, 200])
    wrong = rng.random(2000) < np.repeat([0.02, 0.3, 0.1], [1500, 300, 200])
    truth, covered, total = wrong.mean(), 0, 0.0
    for _ in range(1000):
        draw = draw_audit(stratum, 80, rng)
        otherwise = {
            name: int(wrong[draw.item_index[draw.stratum == code]].sum())
            for code, name in enumerate(STRATA)
        }
        got = estimate(draw.sizes, draw.drawn, otherwise)
        assert got.low is not None
        assert got.high is not None
        assert got.share_ruled_otherwise is not None
        covered += got.low <= truth <= got.high
        total += got.share_ruled_otherwise
    assert covered >= 940
    assert total / 1000 == pytest.approx(truth, abs=0.005)


def test_slips_make_a_nearly_clean_release_look_worse() -> None:
    """1 % true with 3 % slips shows .01 × .97 + .99 × .03 = 3.94 %; arithmetic, no source."""
    assert SLIP_EXAMPLE.share_shown == pytest.approx(0.0394, abs=1e-12)


def test_small_strata_take_from_the_large_one() -> None:
    """One each of three strata of one item, by hand: 5 draws of 1, 1, 100 are 1, 1 and 3."""
    assert allocate(np.array([1, 1, 100]), 5).tolist() == [1, 1, 3]


def test_no_draws_and_fewer_draws_than_strata() -> None:
    """Nothing for nothing; what there is goes to the largest strata."""
    assert allocate(np.array([5, 7, 6]), 0).tolist() == [0, 0, 0]
    assert allocate(np.array([5, 7, 6]), 2).tolist() == [0, 1, 1]


def test_a_negative_number_of_draws_is_refused() -> None:
    """It is no number of items."""
    with pytest.raises(RelookError, match="`n` must be 0 or more; got -1"):
        draw_audit(np.array([0, 0]), -1, np.random.default_rng(1))


def test_too_many_draws_are_taken_back_where_most_was_given() -> None:
    """8 of 1, 1, 1, 1, 40, 60, by hand: floors with one at least are 1, 1, 1, 1, 3, 4, three too many.

    Exact shares of the last two are 320/104 = 3.08 and 480/104 = 4.62; taking one back at a time
    where most is given beyond them leaves 1 and 3.
    """
    assert allocate(np.array([1, 1, 1, 1, 40, 60]), 8).tolist() == [1, 1, 1, 1, 1, 3]


def test_each_stratum_has_its_own_share_and_interval() -> None:
    """12 of 40 drawn from 100: share .3, and limits by the tails of scipy's hypergeom."""
    got = estimate({"unanimous": 100}, {"unanimous": 40}, {"unanimous": 12}).strata[0]
    assert got.share == 0.3
    held = [
        k
        for k in range(12, 73)
        if min(hypergeom.sf(11, 100, k, 40), hypergeom.cdf(12, 100, k, 40)) > 0.025
    ]
    assert (got.low, got.high) == (held[0] / 100, held[-1] / 100)


def test_an_audit_of_everything_leaves_nothing_uncertain() -> None:
    """All items of every stratum ruled on: the interval is the share itself."""
    got = estimate({"unanimous": 8, "single": 2}, {"unanimous": 8, "single": 2}, {"unanimous": 1})
    found = (got.low, got.share_ruled_otherwise, got.high)
    assert found == pytest.approx((0.1, 0.1, 0.1), abs=1e-15)


def test_a_draw_counts_the_ties_of_each_stratum() -> None:
    """Of all items and of those drawn; none where nothing is said of ties."""
    stratum = np.array([0, 0, 1, 1, 1, 1, 2, -1])
    tied = np.array([False, False, True, True, False, False, False, True])
    draw = draw_audit(stratum, 7, np.random.default_rng(4), tied=tied)
    assert draw.tied == {"unanimous": 0, "not queued": 2, "single": 0}
    assert draw.drawn_tied == draw.tied
    some = draw_audit(stratum, 4, np.random.default_rng(4), tied=tied)
    assert some.drawn_tied["not queued"] == int(tied[some.item_index].sum())
    assert sum(draw_audit(stratum, 7, np.random.default_rng(4)).tied.values()) == 0


def test_nothing_is_drawn_where_nothing_is_asked_for() -> None:
    """A draw of none has no items and no chances; an empty stratum has none either."""
    draw = draw_audit(np.array([0, 0, 1]), 0, np.random.default_rng(1))
    assert draw.item_index.size == 0
    assert draw.chances == {"unanimous": 0.0, "not queued": 0.0, "single": 0.0}
    assert draw_audit(np.array([0, 0]), 1, np.random.default_rng(1)).chances["single"] == 0.0
