"""Samples for a fresh coding: random, proportional, and dealt out evenly."""

from __future__ import annotations

from collections import Counter
from itertools import combinations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from relook.errors import RelookError
from relook.project.recoding.drawing import deal, draw_sample

ITEMS = [f"i{number:04d}" for number in range(400)]


def test_a_draw_does_not_follow_the_order_of_the_file():
    """The same items in any order give the same sample; another seed or coding gives another."""
    drawn = draw_sample(ITEMS, 50, seed=1, number=2)
    assert draw_sample(ITEMS[::-1], 50, seed=1, number=2) == drawn
    assert draw_sample(ITEMS, 50, seed=2, number=2).items != drawn.items
    assert draw_sample(ITEMS, 50, seed=1, number=3).items != drawn.items
    assert len(set(drawn.items)) == 50
    assert drawn.n_population == 400


def test_each_item_has_the_same_chance():
    """Over 400 seeds each of 40 items is drawn 100 times of 400, give or take 5 standard errors."""
    counts = Counter(
        item
        for seed in range(400)
        for item in draw_sample(ITEMS[:40], 10, seed=seed, number=2).items
    )
    often = np.array([counts[item] for item in ITEMS[:40]])
    assert abs(often - 100).max() < 5 * np.sqrt(400 * 0.25 * 0.75)


def test_groups_get_their_share_of_the_draws():
    """200, 120 and 80 items of 400: 40 draws are 20, 12 and 8, by hand."""
    groups = {item: "a" if at < 200 else "b" if at < 320 else "c" for at, item in enumerate(ITEMS)}
    drawn = draw_sample(ITEMS, 40, seed=1, number=2, group_of=groups)
    assert drawn.groups == {"a": (200, 20), "b": (120, 12), "c": (80, 8)}
    assert Counter(groups[item] for item in drawn.items) == {"a": 20, "b": 12, "c": 8}


def test_more_than_there_are_takes_all():
    """A sample of 999 of 400 items is all of them, once each."""
    assert sorted(draw_sample(ITEMS, 999, seed=1, number=2).items) == ITEMS


@given(st.integers(1, 60), st.integers(2, 7), st.data())
def test_loads_are_equal_and_items_have_their_overlap(n, n_coders, data):
    """Each item goes to so many different coders; loads differ by one at most."""
    overlap = data.draw(st.integers(2, n_coders))
    coders = [f"c{number}" for number in range(n_coders)]
    dealt = deal(ITEMS[:n], coders, overlap)
    counts = Counter(item for items in dealt.values() for item in items)
    assert counts == dict.fromkeys(ITEMS[:n], overlap)
    assert all(len(set(items)) == len(items) for items in dealt.values())
    loads = [len(items) for items in dealt.values()]
    assert max(loads) - min(loads) <= 1


@pytest.mark.parametrize(("n_coders", "overlap"), [(3, 2), (4, 2), (5, 2), (5, 3), (6, 4), (7, 2)])
def test_every_pair_of_coders_meets_about_as_often(n_coders, overlap):
    """120 items: pairs meet 120 × C(k, 2)/C(n, 2) times on average, and none strays by a quarter."""
    coders = [f"c{number}" for number in range(n_coders)]
    dealt = {coder: set(items) for coder, items in deal(ITEMS[:120], coders, overlap).items()}
    met = [len(dealt[a] & dealt[b]) for a, b in combinations(coders, 2)]
    mean = 120 * overlap * (overlap - 1) / (n_coders * (n_coders - 1))
    assert sum(met) == pytest.approx(mean * len(met))
    assert min(met) >= 0.75 * mean
    assert max(met) <= 1.25 * mean


@pytest.mark.parametrize(
    ("attempt", "message"),
    [
        (lambda: draw_sample(ITEMS, 0, seed=1, number=2), "0 items cannot be coded"),
        (lambda: draw_sample([], 5, seed=1, number=2), "no item is left to draw from"),
        (lambda: deal(ITEMS, ["a", "b"], 3), "3 of 2 coders cannot code each item"),
        (lambda: deal(ITEMS, ["a"], 1), "1 of 1 coders cannot code each item"),
    ],
)
def test_what_cannot_be_drawn_is_refused(attempt, message):
    """Each with what to do instead."""
    with pytest.raises(RelookError, match=message) as caught:
        attempt()
    assert caught.value.mend
