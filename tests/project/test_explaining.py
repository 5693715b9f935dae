"""The arithmetic of one item, to be redone by hand."""

from fractions import Fraction

import numpy as np
import pytest

from reference import by_definition as twin
from reference.cases import CASES, random_table
from reference.made_projects import csv_text, long_csv, make
from reference.published import coder_rows, what_if
from relook.errors import RelookError
from relook.project.figures.explaining import FORMULAS, explain, why_object
from relook.project.setup.loading import load


def variable(text):
    return f'[variables.label]\ncolumn = "label"\n{text}'


def test_published_settled_alphas(tmp_path):
    """Krippendorff 2011, example A: each disputed item settled to each label."""
    loaded = load(make(tmp_path, long_csv(coder_rows("K2011-A"))))
    exact = what_if("K2011-A")["nominal"]
    for item, after in exact["alpha_resolved_exact"].items():
        (held,) = explain(loaded, item)
        assert held.contribution == pytest.approx(
            exact["item_contributions"][item]["value"], rel=1e-12
        )
        assert {row.label: row.agreement for row in held.candidates} == {
            label: pytest.approx(figure["value"], rel=1e-12) for label, figure in after.items()
        }
        assert held.rank == 1
        assert held.doubt is None
        assert held.doubt_undefined_because.startswith("fewer than three coders")


@pytest.mark.parametrize("name", ["nominal", "ordinal", "interval", "ratio"])
def test_the_terms_lead_to_the_contribution(tmp_path, name):
    """2 × Σ pairs × δ² / (n (m − 1)) of what is shown is what the definitions give."""
    rng = np.random.default_rng(12)
    table = random_table(rng, 12, 5, 4)
    order = 'labels = ["1", "2", "3", "4"]\n' if name == "ordinal" else ""
    loaded = load(
        make(tmp_path, long_csv(table), variables=variable(f'difference = "{name}"\n{order}'))
    )
    parts = twin.item_parts(table, CASES[name][0])
    for item, wanted in parts.items():
        (held,) = explain(loaded, str(item))
        m, total = len(held.labels), sum(t.pairs * t.difference for t in held.pairs)
        assert held.pair_sum == pytest.approx(total)
        assert 2 * total / (held.n_pairable_labels * (m - 1)) == pytest.approx(held.contribution)
        assert held.contribution == pytest.approx(float(wanted), rel=1e-12)


def test_ordinal_differences_can_be_redone_from_what_is_shown(tmp_path):
    """Midranks follow from the counts shown, and δ² from the midranks."""
    rng = np.random.default_rng(13)
    table = random_table(rng, 12, 5, 4)
    loaded = load(
        make(
            tmp_path,
            long_csv(table),
            variables=variable('difference = "ordinal"\nlabels = ["1", "2", "3", "4"]\n'),
        )
    )
    counts = twin.marginals(table)
    redone = 0
    for item in twin.pairable(table):
        (held,) = explain(loaded, str(item))
        below, rank = 0, {}
        for row in held.midranks:
            assert row.n_labels == counts[int(row.label)]
            rank[row.label] = below + Fraction(row.n_labels + 1, 2)
            assert row.midrank == rank[row.label]
            below += row.n_labels
        for term in held.pairs:
            assert term.difference == (rank[term.first] - rank[term.second]) ** 2
            redone += 1
    assert redone > 10


def test_the_mean_of_numbers_is_a_candidate(tmp_path):
    """Numbers can be settled to their mean, though nobody gave it."""
    table = {1: [("a", 1), ("b", 2)], 2: [("a", 5), ("b", 5)], 3: [("a", 9), ("b", 9)]}
    loaded = load(make(tmp_path, long_csv(table), variables=variable('difference = "interval"\n')))
    (held,) = explain(loaded, "1")
    assert [(row.label, row.given) for row in held.candidates] == [
        ("1", 1),
        ("2", 1),
        ("1.5 (the mean)", 0),
    ]
    wanted = twin.settled_alpha_by_definition(table, twin.interval, {1: Fraction(3, 2)})
    assert held.candidates[2].agreement == pytest.approx(float(wanted), rel=1e-12)


def test_a_set_that_nobody_gave_is_a_candidate(tmp_path):
    """The elements that most coders hold make a set of their own."""
    table = {1: [("a", "x;y"), ("b", "y;z"), ("c", "z;x")], 2: [("a", "x"), ("b", "x"), ("c", "y")]}
    loaded = load(
        make(
            tmp_path,
            long_csv(table),
            variables=variable('difference = "jaccard"\nseparator = ";"\n'),
        )
    )
    (held,) = explain(loaded, "1")
    assert held.consensus == "x;y;z"
    assert ("x;y;z", 0) in [(row.label, row.given) for row in held.candidates]


def test_every_difference_function_has_its_formula(tmp_path):
    """No function is left without words, and options are filled in."""
    from relook.core.differences import DIFFERENCE_FUNCTIONS

    assert set(FORMULAS) == set(DIFFERENCE_FUNCTIONS)
    table = {1: [("a", 1), ("b", 2)]}
    for text, wanted in (
        ('difference = "circular"\nperiod = 24\n', "δ² = sin²(180° × (c − k)/24)"),
        (
            'difference = "polar"\nends = [0, 10]\n',
            "δ² = (c − k)²/((c + k − 2 × 0)(2 × 10 − c − k))",
        ),
    ):
        loaded = load(make(tmp_path, long_csv(table), variables=variable(text)))
        assert explain(loaded, "1")[0].formula == wanted


def test_single_and_unanimous_items_contribute_nothing(tmp_path):
    """No terms, no rank; a single label has no candidates either."""
    table = {1: [("a", "p")], 2: [("a", "p"), ("b", "p")], 3: [("a", "p"), ("b", "q")]}
    loaded = load(make(tmp_path, long_csv(table)))
    (single,), (unanimous,) = explain(loaded, "1"), explain(loaded, "2")
    assert (single.contribution, single.rank, single.candidates) == (0.0, None, ())
    assert (unanimous.contribution, unanimous.rank, unanimous.pairs) == (0.0, None, ())


def test_only_variables_with_a_label_are_explained(tmp_path):
    """An item is explained on each variable that it was labelled on."""
    names = ("one", "two", "three")
    text = csv_text(
        ("item", "coder", *names),
        [(1, "a", "p", "", "x"), (1, "b", "q", "", "x"), (2, "a", "p", "z", "")],
    )
    variables = "".join(f'[variables.{name}]\ncolumn = "{name}"\n' for name in names)
    loaded = load(make(tmp_path, text, variables=variables))
    held = why_object("1", explain(loaded, "1"))
    assert [row["variable"] for row in held["variables"]] == ["one", "three"]
    assert held["variables"][0]["labels"] == [
        {"coder": "a", "label": "p"},
        {"coder": "b", "label": "q"},
    ]


def test_doubt_is_shown_where_it_exists(tmp_path):
    """Three coders give ground for it."""
    table = {u: [(c, "pq"[u % 2]) for c in "ab"] + [("c", "p")] for u in range(12)}
    loaded = load(make(tmp_path, long_csv(table)))
    (held,) = explain(loaded, "1")
    assert 0 < held.doubt < 1
    assert held.doubt_undefined_because is None


def test_an_unknown_item_names_the_nearest(tmp_path):
    """A slip of the finger is answered with the id that was meant."""
    loaded = load(make(tmp_path, long_csv({"r017": [("a", "p"), ("b", "q")]})))
    with pytest.raises(RelookError) as caught:
        explain(loaded, "r17")
    assert (caught.value.message, caught.value.mend) == (
        'no item "r17" in the label table',
        'did you mean "r017"?',
    )


def test_an_item_without_labels_says_so(tmp_path):
    """All cells missing is another case than not being there."""
    text = csv_text(
        ("item", "coder", "label"), [("1", "a", "NA"), ("2", "a", "p"), ("2", "b", "q")]
    )
    with pytest.raises(RelookError, match='item "1" has no label'):
        explain(load(make(tmp_path, text)), "1")
