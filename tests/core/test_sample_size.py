"""The needed number of items, against the two printed cells and the generated table."""

import pytest

from reference.published import example
from relook.core.sample_size import needed_items
from relook.errors import RelookError


def test_printed_cells():
    """P = .25 and error level .05: 139 items for .800, 81 for .667 (Krippendorff 2004)."""
    printed = example("KSAMPLE")["published"]
    assert needed_items(0.8, 0.25) == printed["p_c=.25 alpha_min=.800 p=.05"] == 139
    assert needed_items(0.667, 0.25) == printed["p_c=.25 alpha_min=.667 p=.05"] == 81


def test_generated_table():
    """All 108 cells of the formula, generated apart from this code, for 2 to 10 equal shares."""
    table = example("KSAMPLE")["exact"]["table categories->alpha_min->p"]
    compared = 0
    for categories, by_alpha in table.items():
        for smallest, by_level in by_alpha.items():
            for level, wanted in by_level.items():
                found = needed_items(float(smallest), 1 / int(categories), float(level))
                assert found == wanted
                compared += 1
    assert compared == 108


@pytest.mark.parametrize(
    ("arguments", "named"),
    [
        ((1.0, 0.25), "smallest_alpha"),
        ((-0.1, 0.25), "smallest_alpha"),
        ((0.8, 0.0), "rarest_share"),
        ((0.8, 1.0), "rarest_share"),
        ((0.8, 0.25, 0.5), "error_level"),
        ((0.8, 0.25, 0.0), "error_level"),
    ],
)
def test_arguments_out_of_bounds(arguments, named):
    """Arguments for which the formula has no meaning are refused by name."""
    with pytest.raises(RelookError, match=named):
        needed_items(*arguments)
