"""Alpha without each coder, against the slow twin and exact figures."""

from fractions import Fraction

import numpy as np
import pytest

from reference import by_definition as twin
from reference.cases import CASES, measured, tables
from reference.published import coder_rows, what_if
from relook.core.without_coder import alpha_without_coder


@pytest.mark.parametrize("name", CASES)
def test_equals_measuring_anew_without_the_coder(name):
    """Alpha, items and labels without each coder equal the definitions on random tables."""
    compared = 0
    for table, agreement, data in tables(name):
        found = alpha_without_coder(agreement)
        for code, coder in enumerate(data.coders):
            left = twin.without_coder(table, coder)
            wanted = twin.alpha_by_definition(left, CASES[name][0])
            assert found.n_pairable_labels[code] == wanted.n
            assert found.n_pairable_items[code] == len(twin.pairable(left))
            if wanted.alpha is None:
                assert np.isnan(found.alpha[code])
            else:
                assert found.alpha[code] == pytest.approx(float(wanted.alpha), rel=1e-10, abs=1e-12)
                compared += 1
    assert compared > 50


@pytest.mark.parametrize("difference", ["nominal", "ordinal", "interval", "ratio"])
def test_exact_figures_of_the_worked_example(difference):
    """Without A, B, C or D the 4 × 12 table has the exact alphas."""
    agreement, data = measured(coder_rows("K2011-CD"), difference)
    found = alpha_without_coder(agreement)
    for coder, figure in what_if("K2011-CD")[difference]["alpha_without_coder"].items():
        wanted = float(Fraction(figure["exact"]))
        assert found.alpha[data.coders.index(coder)] == pytest.approx(wanted, rel=1e-13)


def test_two_coders_leave_nothing_pairable():
    """Of two coders neither can be left out: alpha would be undefined over no items."""
    agreement, _ = measured(coder_rows("K2011-A"))
    found = alpha_without_coder(agreement)
    assert np.isnan(found.alpha).all()
    assert found.n_pairable_items.tolist() == [0, 0]


def test_only_dissenter_gone_leaves_exactly_one():
    """Without the only dissenter alpha is exactly 1: nothing is left of rounding."""
    table = {i: [("A", i % 3), ("B", i % 3), ("C", (i + 1) % 3)] for i in range(1, 40)}
    agreement, data = measured(table, "nominal")
    assert alpha_without_coder(agreement).alpha[data.coders.index("C")] == 1.0
