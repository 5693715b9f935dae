"""Use of labels by value and by coder, and the cross table of two coders."""

import numpy as np
import pytest

from reference import by_definition as twin
from reference.cases import CASES, measured, tables
from reference.published import counts_table, example, two_coder_table
from relook.core.contributions import PairParts, label_pair_parts
from relook.core.label_tables import chance_shares, cross_table, label_table, label_use


def test_alpha_against_the_rest_is_alpha_of_two_values():
    """Each label's alpha equals nominal alpha with all other labels taken as one."""
    compared = 0
    for table, agreement, data in tables("nominal"):
        found = label_table(agreement)
        for code, value in enumerate(data.values):
            into = {other: (other == value) for other in data.values}
            wanted = twin.alpha_by_definition(twin.merged(table, into), twin.nominal)
            if wanted.alpha is None:
                assert np.isnan(found.alpha[code])
            else:
                assert found.alpha[code] == pytest.approx(float(wanted.alpha), rel=1e-12, abs=1e-12)
                compared += 1
        assert found.n_labels.sum() == agreement.n_pairable_labels
    assert compared > 100


@pytest.mark.parametrize("name", ["nominal", "ordinal", "interval"])
def test_involvement_is_the_share_of_pairs_with_the_label(name):
    """A label's involvement is the share of D_o in pairs one side of which it is."""
    for table, agreement, data in tables(name, 20):
        if not agreement.observed_disagreement:
            continue
        pairs = twin.label_pair_parts(table, CASES[name][0])
        found = label_table(agreement)
        for code, value in enumerate(data.values):
            part = sum(float(each) for pair, each in pairs.items() if value in pair)
            wanted = part / agreement.observed_disagreement
            assert found.involved[code] == pytest.approx(wanted, rel=1e-12, abs=1e-12)


def test_category_figures_of_fleiss_1971_by_identity():
    """Fleiss' κ per category follows from each label's alpha: κ_c = 1 − (1 − α_c) n/(n − 1)."""
    agreement, _ = measured(counts_table(example("FLEISS1971")["data"]))
    wanted = example("FLEISS1971")["exact"]["category_kappas"]
    kappas = 1 - (1 - label_table(agreement).alpha) * 180 / 179
    np.testing.assert_allclose(kappas, wanted, rtol=1e-12)


def test_use_by_coder_counts_pairable_labels_only():
    """A lone label is not counted; the rest is counted by coder and value."""
    agreement, _ = measured({1: [("A", 1), ("B", 2)], 2: [("A", 1), ("B", 1)], 3: [("B", 2)]})
    use = label_use(agreement)
    rows = zip(use.coder.tolist(), use.value.tolist(), use.n_labels.tolist(), strict=True)
    assert list(rows) == [(0, 0, 2), (1, 0, 1), (1, 1, 1)]


def test_cross_table_of_two_coders():
    """The cross table gives Cohen's (1960) 200 cases back; the other way round it is transposed."""
    cells = example("COHEN1960-2")["data"]
    agreement, _ = measured(two_coder_table(cells))
    assert cross_table(agreement, 0, 1).tolist() == cells
    assert cross_table(agreement, 1, 0).tolist() == np.transpose(cells).tolist()


@pytest.mark.parametrize("name", ["nominal", "ordinal", "interval"])
def test_shares_by_chance_are_the_terms_of_expected_disagreement(name):
    """Each pair's share of D_e is its term of the definition's sum, by the twin; they add up to 1."""
    for table, agreement, data in tables(name, 20):
        pairs = label_pair_parts(agreement)
        found = chance_shares(agreement, pairs)
        whole = twin.alpha_by_definition(table, CASES[name][0])
        if not whole.expected:
            assert not found.any()
            continue
        terms = twin.expected_pair_parts(table, CASES[name][0])
        for first, second, share in zip(pairs.first, pairs.second, found, strict=True):
            pair = frozenset((data.values[first], data.values[second]))
            assert share == pytest.approx(float(terms[pair] / whole.expected), rel=1e-12)
        assert sum(terms.values()) == whole.expected


def test_no_disagreement_by_chance_has_no_shares():
    """One label only: D_e is 0, and so is each pair's share of it."""
    agreement, _ = measured({1: [("A", 1), ("B", 1)], 2: [("A", 2)]})
    assert agreement.expected_disagreement == 0
    pairs = PairParts(*(np.array([each]) for each in (0, 1, 0.0, 0.0, 0)))
    assert chance_shares(agreement, pairs).tolist() == [0.0]
