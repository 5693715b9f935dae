"""Intervals for alpha: against scipy, by brute force, and where there is none to give."""

import numpy as np
import pytest
from scipy.stats import bootstrap

from reference import by_definition as twin
from reference.cases import CASES, measured, random_table, tables
from reference.published import coder_rows, counts_table, example
from relook.core import resampling
from relook.core.agreement import NO_VARIATION, NOTHING_PAIRABLE, measure_agreement
from relook.core.alpha_of_weights import TOO_MANY_VALUES, AlphaOfWeights
from relook.core.differences import Values, difference_function
from relook.core.labels import CodedLabels
from relook.core.resampling import (
    NO_DISAGREEMENT,
    ONE_TO_DRAW,
    alpha_interval,
    paired_interval,
    unpaired_interval,
)
from relook.errors import RelookError


def rng(seed=1):
    return np.random.default_rng(seed)


def weighted_table(agreement, data, table, weights):
    """The table with each item as often as its profile's weight, divided among equal items."""
    out = {}
    first_of_profile = {}
    for place, item in enumerate(data.items):
        first_of_profile.setdefault(int(agreement.profile_of_item[place]), item)
    for profile, item in first_of_profile.items():
        if profile >= 0:
            for copy in range(int(weights[profile])):
                out[item, copy] = table[item]
    return out


@pytest.mark.parametrize("name", CASES)
def test_alpha_of_any_weighting_equals_the_twin(name):
    """Alpha of random weightings equals the definitions on the table written out item by item."""
    generator, defined = rng(3), 0
    for table, agreement, data in tables(name, 25):
        engine = AlphaOfWeights(agreement)
        weights = generator.integers(0, 3, size=(agreement.profiles.n_profiles, 6)).astype(float)
        found = engine.alphas(weights)
        for column in range(6):
            written_out = weighted_table(agreement, data, table, weights[:, column])
            wanted = twin.alpha_by_definition(written_out, CASES[name][0]).alpha
            if wanted is None:
                assert np.isnan(found[column])
            else:
                assert found[column] == pytest.approx(float(wanted), rel=1e-9, abs=1e-11)
                defined += 1
    assert defined > 50


@pytest.mark.parametrize("name", ["jaccard", "masi", "tree"])
def test_alpha_of_any_weighting_of_texts_equals_the_twin(name):
    """The same for sets and tree codes."""
    texts = ["a", "b", "a/b", "a/c", "b/c/d", "a/b/c"]
    delta = {"jaccard": twin.jaccard, "masi": twin.masi, "tree": twin.tree}[name]
    kind = tuple if name == "tree" else frozenset
    generator = rng(4)
    for _ in range(10):
        table = {
            item: [(coder, texts[int(generator.integers(6))]) for coder in range(3)]
            for item in range(6)
        }
        data = twin.coded(table)
        function = difference_function(name, {"separator": "/"})
        agreement = measure_agreement(data.labels, function, Values.from_texts(data.values))
        weights = generator.integers(1, 3, size=(agreement.profiles.n_profiles, 3)).astype(float)
        found = AlphaOfWeights(agreement).alphas(weights)
        for column in range(3):
            out = weighted_table(agreement, data, table, weights[:, column])
            parted = {i: [(c, kind(v.split("/"))) for c, v in row] for i, row in out.items()}
            wanted = twin.alpha_by_definition(parted, delta).alpha
            assert found[column] == pytest.approx(float(wanted), rel=1e-9, abs=1e-11)


@pytest.mark.parametrize("difference", ["nominal", "ordinal"])
def test_equals_scipy_bootstrap(difference):
    """The interval equals scipy's percentile bootstrap on 30 × 6 labels, within .02 of each bound.

    Both draw 2,000 resamples of their own; a bound's standard error is about .003.
    """
    table = counts_table(example("FLEISS1971")["data"])
    agreement, data = measured(table, difference)
    found = alpha_interval(agreement, rng()).interval
    function = difference_function(difference)
    rows = data.labels.value_index.reshape(30, 6)

    def alpha(chosen):
        labels = CodedLabels.from_codes(
            np.repeat(np.arange(30), 6), rows[chosen].ravel(), n_values=5
        )
        return measure_agreement(labels, function).alpha

    wanted = bootstrap(
        (np.arange(30),), alpha, vectorized=False, n_resamples=2000, method="percentile", rng=rng(2)
    ).confidence_interval
    assert found.low == pytest.approx(wanted.low, abs=0.02)
    assert found.high == pytest.approx(wanted.high, abs=0.02)
    assert found.low < agreement.alpha < found.high


@pytest.mark.parametrize("difference", ["nominal", "ordinal", "interval", "ratio", "circular"])
def test_both_ways_of_drawing_have_one_distribution(difference, monkeypatch):
    """Drawing items and drawing profiles (multinomial) give bounds within .03 of each other."""
    table = random_table(rng(5), 200, 3, 3)
    agreement, _ = measured(table, difference)
    by_item = alpha_interval(agreement, rng(1)).interval
    # With every item ten times there are more items than fifteen per profile.
    assert agreement.n_pairable_items < 15 * agreement.profiles.n_profiles
    draw, _ = resampling._drawing(
        agreement.profile_of_item[agreement.labels.labels_per_item >= 2],
        agreement.profiles.n_profiles,
        None,
        np.flatnonzero(agreement.labels.labels_per_item >= 2),
    )
    often = np.bincount(draw.profile, minlength=draw.n_profiles)
    drawn = rng(2).multinomial(draw.profile.size, often / draw.profile.size, size=2000)
    alphas = AlphaOfWeights(agreement).alphas(drawn.T.astype(float))
    low, high = np.quantile(alphas, [0.025, 0.975])
    assert by_item.low == pytest.approx(low, abs=0.03)
    assert by_item.high == pytest.approx(high, abs=0.03)


def test_many_items_of_few_profiles_are_drawn_by_profile():
    """A thousand items of three profiles give an interval of the width that theory has.

    Half of the items are disputed at random: with two labels each and equal marginals alpha is
    close to 1 − 2 p, and its standard error to 2 √(p (1 − p)/N) = .0316.
    """
    item = np.repeat(np.arange(1000), 2)
    value = np.tile([0, 0, 1, 1, 0, 1, 1, 0], 250)
    labels = CodedLabels.from_codes(item, value)
    agreement = measure_agreement(labels, difference_function("nominal"))
    found = alpha_interval(agreement, rng()).interval
    assert found.high - found.low == pytest.approx(2 * 1.96 * 2 * np.sqrt(0.25 / 1000), rel=0.1)


def test_same_seed_same_interval():
    """The interval follows from the data and the seed, which is kept in it."""
    agreement, _ = measured(counts_table(example("FLEISS1971")["data"]))
    first, second = (alpha_interval(agreement, rng(7), seed=7) for _ in range(2))
    assert first == second
    assert first.interval.seed == 7
    assert first.interval.resamples == 2000
    assert alpha_interval(agreement, rng(8)) != first


def test_blocks_do_not_change_the_interval(monkeypatch):
    """Splitting the resamples into small blocks leaves the interval as it is."""
    agreement, _ = measured(random_table(rng(5), 40, 3, 3))
    whole = alpha_interval(agreement, rng(7))
    monkeypatch.setattr(resampling, "BLOCK", 5_000)
    assert alpha_interval(agreement, rng(7)) == whole


@pytest.mark.parametrize(
    ("table", "because"),
    [
        ({1: [("A", 1)], 2: []}, NOTHING_PAIRABLE),
        ({1: [("A", 1), ("B", 1)], 2: [("A", 1), ("B", 1)]}, NO_VARIATION),
        ({1: [("A", 1), ("B", 1)], 2: [("A", 2), ("B", 2)]}, NO_DISAGREEMENT),
        ({1: [("A", 1), ("B", 2)]}, ONE_TO_DRAW),
    ],
)
def test_no_interval_has_its_reason(table, because):
    """Undefined alpha, no disagreement, or a single item: no interval, and why."""
    agreement, _ = measured(table)
    found = alpha_interval(agreement, rng())
    assert found.interval is None
    assert found.none_because == because


def test_too_many_undefined_resamples_give_no_interval():
    """One disputed item of twenty is missed by a third of the resamples: no interval, and why."""
    table = {i: [("A", 1), ("B", 1)] for i in range(19)} | {19: [("A", 1), ("B", 2)]}
    agreement, _ = measured(table)
    found = alpha_interval(agreement, rng())
    assert found.interval is None
    # (19/20)^20 = 36 %, the standard error of the share among 2,000 being 1 %.
    share = int(found.none_because.split("%")[0].split()[-1])
    assert share == pytest.approx(36, abs=4)


def test_a_few_undefined_resamples_are_counted_and_left_out():
    """Four disputed items of twenty are missed by 1 % of the resamples; they are counted."""
    table = {i: [("A", 1), ("B", 1)] for i in range(16)}
    table |= {i: [("A", 1), ("B", 2)] for i in range(16, 20)}
    agreement, _ = measured(table)
    found = alpha_interval(agreement, rng()).interval
    # 2,000 × (16/20)^20 = 23; four standard deviations are 19.
    assert 4 <= found.undefined_resamples <= 42
    assert np.isfinite([found.low, found.high]).all()


def test_few_items_come_with_a_warning():
    """Under 30 pairable items the interval comes with a caution; from 30 on it does not."""
    eleven = alpha_interval(measured(coder_rows("K2011-CD"))[0], rng())
    assert eleven.interval is not None
    assert "11 pairable items" in eleven.warning
    thirty = alpha_interval(measured(counts_table(example("FLEISS1971")["data"]))[0], rng())
    assert thirty.warning is None


def test_items_that_are_not_pairable_do_not_matter():
    """Adding items of one label or none leaves the interval as it is."""
    table = random_table(rng(5), 40, 3, 3)
    more = table | {"lone": [("A", 1)], "bare": []}
    # Coders do not enter, so the names of the new ones do not matter.
    first = alpha_interval(measured({k: v for k, v in table.items() if len(v) > 1})[0], rng(7))
    assert alpha_interval(measured(more)[0], rng(7)) == first


def test_clusters_of_one_are_items():
    """Clusters of one item each give an interval within .03 of drawing items."""
    agreement, _ = measured(random_table(rng(5), 150, 3, 3))
    plain = alpha_interval(agreement, rng(1)).interval
    alone = alpha_interval(agreement, rng(2), cluster_of_item=np.arange(150)).interval
    assert alone.low == pytest.approx(plain.low, abs=0.03)
    assert alone.high == pytest.approx(plain.high, abs=0.03)


def test_clusters_of_like_items_widen_the_interval():
    """Where the items of a cluster are copies of one, the interval is that of the clusters.

    Ten copies of 40 items make an interval √10 times too narrow unless clusters are drawn.
    """
    table = random_table(rng(6), 40, 3, 3)
    copies = {(item, copy): labels for item, labels in table.items() for copy in range(10)}
    agreement, _ = measured(copies)
    items = alpha_interval(agreement, rng(1)).interval
    cluster = np.repeat(np.arange(40), 10)
    clusters = alpha_interval(agreement, rng(2), cluster_of_item=cluster).interval
    ratio = (clusters.high - clusters.low) / (items.high - items.low)
    assert ratio == pytest.approx(np.sqrt(10), rel=0.15)
    one = alpha_interval(agreement, rng(2), cluster_of_item=np.zeros(400, dtype=int))
    assert one.none_because == ONE_TO_DRAW


def test_paired_interval_of_a_table_with_itself_is_zero():
    """The same labels twice: the difference and both its bounds are exactly 0."""
    agreement, _ = measured(random_table(rng(5), 60, 3, 3), "ordinal")
    found = paired_interval(agreement, agreement, rng())
    assert found.paired
    assert found.difference == found.interval.low == found.interval.high == 0.0


def two_codings(n=80):
    """The same items coded twice, the second time better, one item not pairable in each."""
    generator = rng(9)
    truth = generator.integers(0, 3, n)
    made = []
    for skill in (0.6, 0.85):
        right = generator.random((n, 3)) < skill
        values = np.where(right, truth[:, None], generator.integers(0, 3, (n, 3)))
        made.append(values)
    return made


def test_paired_interval_by_brute_force():
    """Bounds equal those of drawing shared items one by one and measuring anew, within .03."""
    first, second = two_codings()
    item = np.repeat(np.arange(80), 3)
    function = difference_function("ordinal")
    before, after = (
        measure_agreement(CodedLabels.from_codes(item, values.ravel()), function)
        for values in (first, second)
    )
    found = paired_interval(before, after, rng(1), resamples=1000)
    generator, drawn = rng(2), []
    for _ in range(1000):
        chosen = generator.integers(0, 80, 80)
        one, two = (
            measure_agreement(CodedLabels.from_codes(item, values[chosen].ravel()), function).alpha
            for values in (first, second)
        )
        drawn.append(two - one)
    low, high = np.quantile(drawn, [0.025, 0.975])
    assert found.difference == pytest.approx(after.alpha - before.alpha, rel=1e-12)
    assert found.interval.low == pytest.approx(low, abs=0.03)
    assert found.interval.high == pytest.approx(high, abs=0.03)


def test_paired_alphas_are_those_of_the_shared_items():
    """Items pairable in one coding only are left out of both alphas."""
    first = {
        1: [("A", 1), ("B", 1)],
        2: [("A", 1), ("B", 2)],
        3: [("A", 2), ("B", 2)],
        4: [("A", 3), ("B", 1)],
    }
    second = {
        1: [("A", 1), ("B", 1)],
        2: [("A", 2), ("B", 2)],
        3: [("A", 2), ("B", 1)],
        4: [("A", 3)],
    }
    found = paired_interval(measured(first)[0], measured(second)[0], rng())
    shared = {1, 2, 3}
    for table, mine in ((first, found.first_alpha), (second, found.second_alpha)):
        kept = {item: labels for item, labels in table.items() if item in shared}
        assert mine == pytest.approx(float(twin.alpha_by_definition(kept, twin.nominal).alpha))
    assert found.n_shared_items == 3


def test_paired_interval_needs_shared_items():
    """Nothing shared, one item shared, or an undefined side: no interval, and why."""
    first = measured({1: [("A", 1), ("B", 2)], 2: [("A", 1)]})[0]
    second = measured({1: [("A", 1)], 2: [("A", 1), ("B", 2)]})[0]
    assert "no item" in paired_interval(first, second, rng()).none_because
    assert paired_interval(first, first, rng()).none_because == ONE_TO_DRAW
    calm = measured({1: [("A", 1), ("B", 1)], 2: [("A", 1), ("B", 1)]})[0]
    wild = measured({1: [("A", 1), ("B", 2)], 2: [("A", 1), ("B", 1)]})[0]
    found = paired_interval(wild, calm, rng())
    assert "undefined" in found.none_because
    assert found.second_alpha is None
    with pytest.raises(RelookError, match="same items"):
        paired_interval(first, measured({1: [("A", 1), ("B", 2)]})[0], rng())


def test_unpaired_interval_is_wider_than_paired_where_items_drive_both():
    """Drawing apart forgets what the two share; the difference itself is the same."""
    first, second = two_codings()
    item = np.repeat(np.arange(80), 3)
    function = difference_function("nominal")
    before = measure_agreement(CodedLabels.from_codes(item, first.ravel()), function)
    after = measure_agreement(CodedLabels.from_codes(item, second.ravel()), function)
    apart = unpaired_interval(before, after, rng(1))
    assert not apart.paired
    assert apart.n_shared_items is None
    assert apart.difference == after.alpha - before.alpha
    # Variances add up: the width is the root of the squared widths of the two intervals.
    widths = [alpha_interval(each, rng(3)).interval for each in (before, after)]
    wanted = np.hypot(*(each.high - each.low for each in widths))
    assert apart.interval.high - apart.interval.low == pytest.approx(wanted, rel=0.1)
    calm = measured({1: [("A", 1), ("B", 1)]})[0]
    assert unpaired_interval(before, calm, rng()).none_because == NO_VARIATION


@pytest.mark.parametrize(
    "given", [{"resamples": 0}, {"confidence_level": 1.0}, {"confidence_level": 0}]
)
def test_arguments_out_of_bounds(given):
    """No resamples, or a confidence level that is none, is refused by name."""
    agreement, _ = measured(coder_rows("K2011-CD"))
    with pytest.raises(RelookError, match=next(iter(given))):
        alpha_interval(agreement, rng(), **given)


def test_many_values_take_no_table_of_pairs(monkeypatch):
    """Beyond the limit of tabled values ratio differences go block by block, to the same result."""
    agreement, _ = measured(random_table(rng(5), 60, 3, 9), "ratio")
    tabled = alpha_interval(agreement, rng(7)).interval
    monkeypatch.setattr("relook.core.alpha_of_weights.MOST_TABLED_VALUES", 2)
    blocks = alpha_interval(agreement, rng(7)).interval
    assert blocks.low == pytest.approx(tabled.low, rel=1e-10)
    assert blocks.high == pytest.approx(tabled.high, rel=1e-10)


def test_one_item_gives_no_unpaired_interval():
    """Drawing one item with replacement gives it back."""
    lone, _ = measured({1: [("A", 1), ("B", 2)]})
    many, _ = measured({1: [("A", 1), ("B", 2)], 2: [("A", 1), ("B", 1)], 3: [("A", 2), ("B", 2)]})
    found = unpaired_interval(many, lone, rng=rng(), resamples=50, seed=1)
    assert (found.interval, found.none_because) == (None, ONE_TO_DRAW)


@pytest.mark.parametrize("name", ["ratio", "polar"])
def test_too_many_values_are_not_compared_in_each_resample(name, monkeypatch):
    """Beyond the limit the interval is left out, with the reason; closed forms have no limit."""
    monkeypatch.setattr("relook.core.alpha_of_weights.MOST_TABLED_VALUES", 2)
    monkeypatch.setattr("relook.core.alpha_of_weights.MOST_RESAMPLED_VALUES", 3)
    table = random_table(rng(), n_items=12)
    many, _ = measured(table, name)
    found = alpha_interval(many, rng(), resamples=20)
    assert (found.interval, found.none_because) == (None, TOO_MANY_VALUES)
    for compared in (
        paired_interval(many, many, rng(), resamples=20),
        unpaired_interval(many, many, rng(), resamples=20),
    ):
        assert (compared.interval, compared.none_because) == (None, TOO_MANY_VALUES)
        assert compared.difference == 0
    for closed in ("nominal", "ordinal", "interval", "circular"):
        assert alpha_interval(measured(table, closed)[0], rng(), resamples=20).interval is not None
