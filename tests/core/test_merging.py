"""Alpha with labels merged, against measuring the merged table anew."""

from itertools import combinations, pairwise

import pytest

from reference import by_definition as twin
from reference.cases import measured, tables
from reference.published import coder_rows, example, two_coder_table
from relook.core.merging import best_mergers, merged_agreement, merged_values, why_not_mergeable
from relook.errors import RelookError


@pytest.mark.parametrize(("name", "delta"), [("nominal", twin.nominal), ("ordinal", twin.ordinal)])
def test_mergers_equal_the_merged_table(name, delta):
    """Every merger that lifts alpha is found, with the alpha, D_o and D_e of the merged table."""
    compared = 0
    for table, agreement, data in tables(name, 80):
        if agreement.alpha is None:
            assert best_mergers(agreement) == []
            continue
        used = sorted(twin.marginals(table))
        pairs = combinations(used, 2) if name == "nominal" else pairwise(used)
        wanted = {}
        for c, k in pairs:
            figures = twin.alpha_by_definition(twin.merged(table, {k: c}), delta)
            if figures.alpha is not None and float(figures.alpha) > agreement.alpha + 1e-9:
                wanted[data.values.index(c), data.values.index(k)] = figures
        found = {(m.first, m.second): m for m in best_mergers(agreement, 1000)}
        assert set(found) == set(wanted)
        for pair, figures in wanted.items():
            assert found[pair].alpha == pytest.approx(float(figures.alpha), rel=1e-12)
            assert found[pair].observed_disagreement == pytest.approx(
                float(figures.observed), rel=1e-12, abs=1e-14
            )
            assert found[pair].expected_disagreement == pytest.approx(
                float(figures.expected), rel=1e-12
            )
            assert found[pair].gain == pytest.approx(found[pair].alpha - agreement.alpha)
            compared += 1
    assert compared > 20


def test_mergers_come_best_first_and_at_most_so_many():
    """The list is sorted by gain and cut where asked."""
    agreement, _ = measured(two_coder_table(example("COHEN1960-2")["data"]))
    mergers = best_mergers(agreement)
    gains = [merger.gain for merger in mergers]
    assert gains == sorted(gains, reverse=True)
    assert len(mergers) >= 1
    assert best_mergers(agreement, 1) == mergers[:1]


def test_merged_agreement_measures_anew():
    """Merging 3 and 4 of the 4 × 12 table equals the table with 4 written as 3."""
    table = coder_rows("K2011-CD")
    for name, delta in (("nominal", twin.nominal), ("ordinal", twin.ordinal)):
        agreement, _ = measured(table, name)
        found, new_value = merged_agreement(agreement, [[2, 3]])
        assert new_value.tolist() == [0, 1, 2, 2, 3]
        wanted = twin.alpha_by_definition(twin.merged(table, {4: 3}), delta)
        assert found.alpha == float(wanted.alpha)
        assert found.profiles.n_values == 4


def test_all_merged_into_one_is_undefined():
    """A code book of one label cannot tell anything: alpha is None, not 1."""
    agreement, _ = measured(coder_rows("K2011-A"))
    found, _ = merged_agreement(agreement, [[0, 1]])
    assert found.alpha is None
    assert best_mergers(agreement) == []


def test_new_codes_keep_their_order():
    """Groups take the place of their first label; an empty group changes nothing."""
    agreement, _ = measured(coder_rows("K2011-CD"))
    new_value, n_values = merged_values(agreement, [[4, 1], [], [2]])
    assert (new_value.tolist(), n_values) == ([0, 1, 2, 3, 1], 4)


@pytest.mark.parametrize(
    ("name", "groups", "said"),
    [
        ("interval", [[0, 1]], "not interval"),
        ("nominal", [[0, 1], [1, 2]], "one group only"),
        ("nominal", [[0, 9]], "between 0 and 4"),
        ("ordinal", [[0, 2]], "neighbours"),
    ],
)
def test_mergers_that_mean_nothing_are_refused(name, groups, said):
    """Numbers, overlapping groups, unknown codes and ordinal leaps are errors."""
    agreement, _ = measured(coder_rows("K2011-CD"), name)
    with pytest.raises(RelookError, match=said):
        merged_agreement(agreement, groups)


def test_numbers_have_no_mergers_and_say_why():
    """For numbers there is a reason instead of a list."""
    agreement, _ = measured(coder_rows("K2011-CD"), "interval")
    assert "nominal and ordinal" in why_not_mergeable(agreement)
    with pytest.raises(RelookError, match="nominal and ordinal"):
        best_mergers(agreement)
    assert why_not_mergeable(measured(coder_rows("K2011-CD"), "ordinal")[0]) is None
