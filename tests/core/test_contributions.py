"""Parts of D_o against the slow twin and exact what-if figures, and their sums."""

from fractions import Fraction

import numpy as np
import pytest

from reference import by_definition as twin
from reference.cases import CASES, measured, tables
from reference.published import coder_rows, what_if
from relook.core.agreement import measure_agreement
from relook.core.coder_parts import coder_pair_parts, coder_parts, label_parts
from relook.core.contributions import (
    alpha_costs,
    group_parts,
    intensity,
    item_contributions,
    label_pair_parts,
    shares,
)
from relook.core.crossings import group_coder_parts, group_label_pair_parts
from relook.core.differences import DIFFERENCE_FUNCTIONS
from relook.core.labels import CodedLabels
from relook.errors import RelookError

NEAR = {"rel": 1e-12, "abs": 1e-13}


@pytest.mark.parametrize("name", CASES)
def test_item_and_label_parts_equal_the_twin(name):
    """Contributions of items and parts of labels equal the definitions on random tables."""
    for table, agreement, data in tables(name):
        wanted = twin.item_parts(table, CASES[name][0])
        found = item_contributions(agreement)
        for place, item in enumerate(data.items):
            assert found[place] == pytest.approx(float(wanted.get(item, 0)), **NEAR)
        per_label = twin.label_parts(table, CASES[name][0])
        flat = [
            float(per_label.get((item, i), 0)) for item in table for i in range(len(table[item]))
        ]
        np.testing.assert_allclose(label_parts(agreement), flat, rtol=1e-12, atol=1e-13)


@pytest.mark.parametrize("name", CASES)
def test_coder_and_pair_parts_equal_the_twin(name):
    """Parts of coders, of pairs of coders and of pairs of labels equal the definitions."""
    delta = CASES[name][0]
    for table, agreement, data in tables(name):
        wanted = twin.coder_parts(table, delta)
        parts = coder_parts(agreement)
        for code, coder in enumerate(data.coders):
            assert parts.contribution[code] == pytest.approx(float(wanted.get(coder, 0)), **NEAR)
            of_coder = [
                item for item, labels in twin.pairable(table).items() if coder in dict(labels)
            ]
            assert parts.n_labels[code] == parts.n_items[code] == len(of_coder)

        pairs = coder_pair_parts(agreement)
        met = twin.coder_pair_parts(table, delta)
        found = {
            frozenset({data.coders[a], data.coders[b]}): part
            for a, b, part in zip(pairs.first, pairs.second, pairs.contribution, strict=True)
        }
        assert set(found) == set(met)
        for pair, part in found.items():
            assert part == pytest.approx(float(met[pair]), **NEAR)

        heavy = label_pair_parts(agreement)
        apart = {k: v for k, v in twin.label_pair_parts(table, delta).items() if v > 0}
        found = {
            frozenset({data.values[a], data.values[b]}): part
            for a, b, part in zip(heavy.first, heavy.second, heavy.contribution, strict=True)
        }
        assert set(found) == set(apart)
        for pair, part in found.items():
            assert part == pytest.approx(float(apart[pair]), **NEAR)


@pytest.mark.parametrize("name", CASES)
def test_groups_and_crossings_equal_the_twin(name):
    """Parts of groups, and of groups crossed with coders and label pairs, equal the definitions."""
    delta = CASES[name][0]
    for table, agreement, data in tables(name, 30):
        group = {item: place % 3 for place, item in enumerate(data.items)}
        codes = np.array([group[item] for item in data.items])
        wanted = twin.group_parts(table, delta, group)
        parts = group_parts(agreement, codes, 3)
        for code in range(3):
            assert parts.contribution[code] == pytest.approx(float(wanted.get(code, 0)), **NEAR)

        crossed = group_coder_parts(agreement, codes, 3)
        by_coder = twin.group_coder_parts(table, delta, group)
        assert crossed.group.size == len(by_coder)
        for g, c, part in zip(crossed.group, crossed.coder, crossed.contribution, strict=True):
            assert part == pytest.approx(float(by_coder[int(g), data.coders[c]]), **NEAR)

        pairs = group_label_pair_parts(agreement, codes, 3)
        by_pair = {
            k: v for k, v in twin.group_label_pair_parts(table, delta, group).items() if v > 0
        }
        assert pairs.group.size == len(by_pair)
        for g, a, b, part in zip(
            pairs.group, pairs.first, pairs.second, pairs.contribution, strict=True
        ):
            key = int(g), frozenset({data.values[a], data.values[b]})
            assert part == pytest.approx(float(by_pair[key]), **NEAR)


@pytest.mark.parametrize("name", CASES)
def test_every_grouping_adds_up_to_observed_disagreement(name):
    """Parts by item, label, coder, pairs, groups and crossings each add up to D_o (1e-12)."""
    for _, agreement, data in tables(name):
        codes = np.arange(len(data.items)) % 2
        parts = [
            item_contributions(agreement),
            label_parts(agreement),
            coder_parts(agreement).contribution,
            coder_pair_parts(agreement).contribution,
            label_pair_parts(agreement).contribution,
            group_parts(agreement, codes, 2).contribution,
            group_coder_parts(agreement, codes, 2).contribution,
            group_label_pair_parts(agreement, codes, 2).contribution,
        ]
        for each in parts:
            assert each.sum() == pytest.approx(
                agreement.observed_disagreement, rel=1e-12, abs=1e-15
            )


@pytest.mark.parametrize("name", CASES)
def test_own_alphas_average_to_alpha(name):
    """Σ (n_i/n) α_i = α, for coders and for groups of items."""
    for _, agreement, data in tables(name):
        if agreement.alpha is None:
            continue
        codes = np.arange(len(data.items)) % 2
        for parts in (coder_parts(agreement), group_parts(agreement, codes, 2)):
            used = parts.n_labels > 0
            assert np.isnan(parts.own_alpha[~used]).all()
            mean = np.average(parts.own_alpha[used], weights=parts.n_labels[used])
            assert mean == pytest.approx(agreement.alpha, rel=1e-10, abs=1e-12)
            assert parts.share_of_labels.sum() == pytest.approx(1, rel=1e-12)


@pytest.mark.parametrize(
    ("name", "difference"),
    [
        ("K2011-A", "nominal"),
        ("K2011-B", "nominal"),
        ("K2011-CD", "nominal"),
        ("K2011-CD", "ordinal"),
        ("K2011-CD", "interval"),
        ("K2011-CD", "ratio"),
    ],
)
def test_exact_parts_of_the_worked_examples(name, difference):
    """Items, coders and pairs of coders of the worked examples carry the exact fractions."""
    exact = what_if(name)[difference]
    agreement, data = measured(coder_rows(name), difference)
    contributions = item_contributions(agreement)
    for item, figure in exact["item_contributions"].items():
        wanted = float(Fraction(figure["exact"]))
        assert contributions[data.items.index(int(item))] == pytest.approx(wanted, rel=1e-14)
    parts = coder_parts(agreement)
    for coder, figure in exact["coder_contributions"].items():
        wanted = float(Fraction(figure["exact"]))
        assert parts.contribution[data.coders.index(coder)] == pytest.approx(wanted, rel=1e-14)
    pairs = coder_pair_parts(agreement)
    found = {
        f"{data.coders[a]}|{data.coders[b]}": part
        for a, b, part in zip(pairs.first, pairs.second, pairs.contribution, strict=True)
    }
    for pair, figure in exact["pair_contributions"].items():
        assert found[pair] == pytest.approx(float(Fraction(figure["exact"])), rel=1e-14)


def test_lone_dissenter_carries_half_and_is_involved_in_all():
    """Four coders, one always differs: that coder's part is half of D_o, involvement all of it."""
    table = {i: [("A", 1), ("B", 1), ("C", 1), ("D", 2)] for i in range(5)}
    table[9] = [(coder, 2) for coder in "ABCD"]
    agreement, data = measured(table)
    parts = coder_parts(agreement)
    dissenter = data.coders.index("D")
    assert parts.share[dissenter] == pytest.approx(0.5, rel=1e-12)
    assert parts.involved[dissenter] == pytest.approx(1.0, rel=1e-12)
    assert parts.involved[0] == pytest.approx(1 / 3, rel=1e-12)


def test_intensity_is_the_mean_over_pairs():
    """One label against three is 1/2 of the pairs; an item of one label has intensity 0."""
    table = {
        1: [("A", 1), ("B", 1), ("C", 1), ("D", 2)],
        2: [("A", 1)],
        3: [("A", 1), ("B", 4)],
        4: [],
    }
    agreement, _ = measured(table)
    assert intensity(agreement).tolist() == [0.5, 0.0, 1.0, 0.0]
    agreement, _ = measured(table, "interval")
    assert intensity(agreement).tolist() == [0.5, 0.0, 9.0, 0.0]


def test_shares_and_alpha_costs():
    """Shares add up to 1 and alpha costs to 1 − α; both are safe where nothing is disputed."""
    agreement, _ = measured(coder_rows("K2011-CD"), "ordinal")
    contributions = item_contributions(agreement)
    assert shares(agreement, contributions).sum() == pytest.approx(1, rel=1e-14)
    assert alpha_costs(agreement, contributions).sum() == pytest.approx(
        1 - agreement.alpha, rel=1e-14
    )
    calm, _ = measured({1: [("A", 1), ("B", 1)]})
    assert shares(calm, item_contributions(calm)).tolist() == [0.0]
    assert alpha_costs(calm, item_contributions(calm)) is None


@pytest.mark.parametrize("table", [{}, {1: []}, {1: [("A", 1)]}, {1: [("A", 1), ("B", 1)]}])
@pytest.mark.parametrize("name", CASES)
def test_parts_of_degenerate_tables_are_zero(name, table):
    """Where nothing is pairable or nothing differs every part is 0 and nothing warns."""
    agreement, data = measured(table, name)
    codes = np.zeros(len(data.items), dtype=np.int64)
    assert not item_contributions(agreement).any()
    assert not label_parts(agreement).any()
    assert not coder_parts(agreement).contribution.any()
    assert not coder_pair_parts(agreement).contribution.any()
    assert label_pair_parts(agreement).contribution.size == 0
    assert not group_parts(agreement, codes, 1).contribution.any()
    assert not group_coder_parts(agreement, codes, 1).contribution.any()
    assert group_label_pair_parts(agreement, codes, 1).contribution.size == 0


def test_label_pairs_come_heaviest_first_with_ties_by_value():
    """Pairs are sorted by contribution; equal ones by their values, whatever the order of items."""
    table = {
        1: [("A", 3), ("B", 4)],
        2: [("A", 2), ("B", 1)],
        3: [("A", 2), ("B", 4)],
        4: [("A", 4), ("B", 2)],
    }
    agreement, _ = measured(table)
    pairs = label_pair_parts(agreement)
    assert list(zip(pairs.first.tolist(), pairs.second.tolist(), strict=True)) == [
        (1, 3),
        (0, 1),
        (2, 3),
    ]
    assert pairs.n_items.tolist() == [2, 1, 1]


def test_label_pairs_count_items_not_meetings():
    """Two labels that meet in several ways within an item meet in one item."""
    table = {1: [("A", 1), ("B", 1), ("C", 2), ("D", 2)], 2: [("A", 1), ("B", 2)]}
    agreement, _ = measured(table)
    assert label_pair_parts(agreement).n_items.tolist() == [2]
    assert coder_pair_parts(agreement).n_items.tolist() == [2, 1, 1, 1, 1, 1]


def test_tables_of_counts_know_no_coders():
    """Asking for coders where the table holds counts is an error that says so."""
    labels = CodedLabels.from_codes(np.array([0, 0]), np.array([0, 1]))
    agreement = measure_agreement(labels, DIFFERENCE_FUNCTIONS["nominal"])
    for ask in (coder_parts, coder_pair_parts):
        with pytest.raises(RelookError, match="counts"):
            ask(agreement)
    assert item_contributions(agreement).tolist() == [1.0]


@pytest.mark.parametrize("codes", [np.array([0]), np.array([0, 2]), np.array([-1, 0])])
def test_groups_must_cover_the_items(codes):
    """Groups of the wrong length or out of bounds are refused."""
    agreement, _ = measured({1: [("A", 1), ("B", 2)], 2: [("A", 1), ("B", 2)]})
    for ask in (group_parts, group_coder_parts, group_label_pair_parts):
        with pytest.raises(RelookError, match="group_of_item"):
            ask(agreement, codes, 2)


def test_large_tables_add_up_to_twelve_digits():
    """200,000 equal contributions still add up to D_o to 1e-12, by coder and by group too."""
    n = 200_000
    item = np.repeat(np.arange(n), 3)
    value = np.tile([0, 1, 1], n)
    labels = CodedLabels.from_codes(item, value, np.tile([0, 1, 2], n))
    agreement = measure_agreement(labels, DIFFERENCE_FUNCTIONS["nominal"])
    observed = float(Fraction(2, 3))
    assert agreement.observed_disagreement == observed
    parts = coder_parts(agreement)
    np.testing.assert_allclose(parts.contribution, [1 / 3, 1 / 6, 1 / 6], rtol=1e-13)
    grouped = group_parts(agreement, np.zeros(n, dtype=np.int64), 1)
    assert grouped.contribution[0] == pytest.approx(observed, rel=1e-13)
    np.testing.assert_allclose(
        coder_pair_parts(agreement).contribution, [1 / 3, 1 / 3, 0], rtol=1e-13
    )


def test_ordinal_parts_of_huge_counts_do_not_overflow():
    """Ordinal parts of labels 3,000,000 apart in rank equal the moments computed in Python integers."""
    n = 600_000
    item = np.repeat(np.arange(n), 5)
    value = np.tile([0, 0, 1, 2, 2], n)
    labels = CodedLabels.from_codes(item, value, np.tile(np.arange(5), n))
    agreement = measure_agreement(labels, DIFFERENCE_FUNCTIONS["ordinal"])
    midrank = [Fraction(2 * n, 2), 2 * n + Fraction(n, 2), 3 * n + Fraction(2 * n, 2)]
    row = [midrank[v] for v in (0, 0, 1, 2, 2)]
    per_coder = [sum((x - y) ** 2 for y in row) / 4 / 5 for x in row]
    np.testing.assert_allclose(
        coder_parts(agreement).contribution, [float(part) for part in per_coder], rtol=1e-13
    )
    assert agreement.observed_disagreement == float(sum(per_coder))


def test_pairs_of_coders_add_up_however_often_they_are_joined(monkeypatch):
    """Sums of runs of labels, added up after every run, are those added up once (1e-12)."""
    rng = np.random.default_rng(21)
    labels = CodedLabels.from_codes(
        np.repeat(np.arange(400), 4), rng.integers(0, 5, 1600), np.tile(np.arange(4), 400)
    )
    agreement = measure_agreement(labels, DIFFERENCE_FUNCTIONS["nominal"])
    once = coder_pair_parts(agreement)
    monkeypatch.setattr("relook.core.labels.BLOCK", 40)
    monkeypatch.setattr("relook.core.coder_parts._MOST_PENDING", 1)
    often = coder_pair_parts(agreement)
    assert often.first.tolist() == once.first.tolist()
    assert often.n_items.tolist() == once.n_items.tolist()
    assert often.contribution == pytest.approx(once.contribution, rel=1e-12)
