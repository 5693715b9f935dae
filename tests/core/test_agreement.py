"""Alpha against published figures, other libraries, the slow twin, and every known trap."""

from fractions import Fraction

import numpy as np
import pytest
from nltk.metrics import agreement as nltk_agreement
from nltk.metrics.distance import (
    binary_distance,
    interval_distance,
    jaccard_distance,
    masi_distance,
)
from scipy.stats import rankdata
from sklearn.metrics import cohen_kappa_score
from statsmodels.stats.inter_rater import aggregate_raters, cohens_kappa, fleiss_kappa

from reference import by_definition as twin
from reference.published import (
    coder_rows,
    counts_table,
    example,
    two_coder_table,
    what_if,
)
from relook.core.agreement import (
    NO_VARIATION,
    NOTHING_PAIRABLE,
    Agreement,
    coincidence_matrix,
    measure_agreement,
)
from relook.core.differences import (
    DIFFERENCE_FUNCTIONS,
    DifferenceTable,
    Values,
    difference_function,
)
from relook.core.labels import CodedLabels
from relook.core.profiles import Profiles
from relook.errors import RelookError

DELTAS = {
    "nominal": twin.nominal,
    "ordinal": twin.ordinal,
    "interval": twin.interval,
    "ratio": twin.ratio,
}


def measured(table, name="nominal", options=None, **kwargs) -> Agreement:
    data = twin.coded(table)
    numbers = data.numbers() if name not in ("nominal", "ordinal") else None
    return measure_agreement(data.labels, difference_function(name, options), numbers, **kwargs)


def random_table(rng, n_items=8, n_coders=4, values=(1, 2, 3, 4, 5), missing=0.3):
    """A table with labels missing at random and items of every number of labels."""
    return {
        item: [
            (coder, values[int(rng.integers(len(values)))])
            for coder in range(n_coders)
            if rng.random() > missing
        ]
        for item in range(n_items)
    }


PUBLISHED = [
    # Krippendorff (2011), sections A, B, C and D: three digits printed, the last one cut off or
    # rounded: .797402 as .797, .849107 as .849, .815388 as .815, .743421 as .743, .691964 as .692.
    ("K2011-A", "nominal", ".095"),
    ("K2011-B", "nominal", ".692"),
    ("K2011-CD", "nominal", ".743"),
    ("K2011-CD", "ordinal", ".815"),
    ("K2011-CD", "interval", ".849"),
    ("K2011-CD", "ratio", ".797"),
]


@pytest.mark.parametrize(("name", "difference", "printed"), PUBLISHED)
def test_published_examples_to_their_three_digits(name, difference, printed):
    """Alpha of Krippendorff's worked examples rounds to the figure printed."""
    alpha = measured(coder_rows(name), difference).alpha
    assert f"{alpha:.3f}".removeprefix("0") == printed


@pytest.mark.parametrize(("name", "difference", "printed"), PUBLISHED)
def test_examples_equal_their_exact_fractions(name, difference, printed):
    """Alpha, D_o and D_e equal exact fractions computed from the definitions (1 unit of rounding)."""
    exact = example(name)["exact"][difference]
    found = measured(coder_rows(name), difference)
    assert found.alpha == pytest.approx(float(Fraction(exact["alpha_exact"])), rel=1e-15)
    assert found.observed_disagreement == pytest.approx(
        float(Fraction(exact["Do_exact"])), rel=1e-15
    )
    assert found.expected_disagreement == pytest.approx(
        float(Fraction(exact["De_exact"])), rel=1e-15
    )


@pytest.mark.parametrize(
    ("name", "options", "key"),
    [
        ("circular", {"period": 5}, "circular_U5"),
        ("circular", {"period": 4}, "circular_U4"),
        ("circular", {"period": 12}, "circular_U12"),
        ("polar", {"ends": [1, 5]}, "bipolar_1_5"),
        ("polar", {"ends": [0, 6]}, "bipolar_0_6"),
    ],
)
def test_circular_and_polar_equal_figures_from_the_definitions(name, options, key):
    """Circular and polar alpha of the 4 × 12 table equal our own exact figures (none is published)."""
    exact = example("K2011-CD")["exact"][key]
    found = measured(coder_rows("K2011-CD"), name, options)
    assert found.alpha == pytest.approx(exact["alpha"], rel=1e-14)
    assert found.observed_disagreement == pytest.approx(exact["Do"], rel=1e-14)
    assert found.expected_disagreement == pytest.approx(exact["De"], rel=1e-14)


def test_coincidences_of_the_published_table():
    """The coincidence matrix is the one of Krippendorff (2011), section C, with n = 40."""
    data = twin.coded(coder_rows("K2011-CD"))
    found = measure_agreement(data.labels, DIFFERENCE_FUNCTIONS["nominal"])
    printed = [
        [float(Fraction(cell)) for cell in row] for row in example("K2011-CD")["coincidence_matrix"]
    ]
    assert found.n_pairable_labels == 40
    np.testing.assert_allclose(coincidence_matrix(found.profiles), printed, rtol=1e-14)


def test_fleiss_1971_by_identity():
    """α = 1 − (1 − κ)(n − 1)/n with Fleiss' κ = .430 of 30 patients × 6 raters (Fleiss 1971, Table 1)."""
    rows = example("FLEISS1971")["data"]
    found = measured(counts_table(rows))
    n = found.n_pairable_labels
    kappa = 1 - (1 - found.alpha) * n / (n - 1)
    assert n == 180
    assert f"{kappa:.3f}" == "0.430"
    assert found.alpha == pytest.approx(float(Fraction("5477/12637")), rel=1e-15)
    assert kappa == pytest.approx(fleiss_kappa(np.array(rows)), rel=1e-12)


def test_artstein_poesio_2008_by_identity():
    """Scott's π = .79953 of two coders × 100 utterances follows from alpha (2008, p. 559 ff.)."""
    table = two_coder_table(example("AP2008")["data"]["table_rows_coder_a_cols_coder_b"])
    found = measured(table)
    n = found.n_pairable_labels
    pi = 1 - (1 - found.alpha) * n / (n - 1)
    assert f"{pi:.5f}" == "0.79953"
    assert found.observed_disagreement == pytest.approx(1 - 0.88, rel=1e-15)
    assert found.alpha == pytest.approx(float(Fraction("2396/2993")), rel=1e-15)


def test_artstein_poesio_2008_weighted_table():
    """Their weighted D_o = .09 and D_e = .4879 come out of a table of differences, not squared."""
    example_table = example("AP2008")["data"]
    table = two_coder_table(example_table["table_rows_coder_a_cols_coder_b"])
    data = twin.coded(table)
    half = Fraction(1, 2)
    weights = DifferenceTable(
        tuple(example_table["labels"]),
        (
            (Fraction(0), Fraction(1), half),
            (Fraction(1), Fraction(0), half),
            (half, half, Fraction(0)),
        ),
    )
    found = measure_agreement(
        data.labels,
        difference_function("table", {"table": weights}),
        Values.from_texts(example_table["labels"]),
    )
    assert found.observed_disagreement == pytest.approx(0.09, rel=1e-15)
    assert f"{found.expected_disagreement:.4f}" == "0.4879"
    assert found.alpha == pytest.approx(float(Fraction("7919/9710")), rel=1e-15)


def test_cohen_1960_table():
    """On Cohen's 200 cases alpha equals its exact value, and Cohen's κ = .492 is another figure."""
    cells = example("COHEN1960-2")["data"]
    found = measured(two_coder_table(cells))
    assert found.alpha == pytest.approx(float(Fraction("127/260")), rel=1e-15)
    assert round(cohens_kappa(np.array(cells)).kappa, 3) == 0.492
    assert round(found.alpha, 3) == 0.488


def test_dawid_skene_1979_table():
    """Alpha of 45 patients, five observers and all seven columns, equals the exact fractions."""
    rows = example("DS1979")["data"]
    exact = example("DS1979")["exact"]
    columns = {"alpha_5_observers_first_reading": [0, 3, 4, 5, 6], "alpha_7_columns": range(7)}
    for key, chosen in columns.items():
        table = {i: [(c, row[c]) for c in chosen] for i, row in enumerate(rows)}
        for difference in ("nominal", "ordinal", "interval"):
            wanted = float(Fraction(exact[key][difference]["alpha_exact"]))
            assert measured(table, difference).alpha == pytest.approx(wanted, rel=1e-15)


@pytest.mark.parametrize("trap", [trap for trap in what_if("traps") if trap != "right answers"])
def test_traps_are_not_printed(trap):
    """None of the figures that a wrong program gives for the 4 × 12 table is ours."""
    difference = trap.split(",")[0].split(" ")[0]
    wrong = what_if("traps")[trap]
    right = what_if("traps")["right answers"][difference]
    found = measured(coder_rows("K2011-CD"), difference).alpha
    assert found == pytest.approx(right, rel=1e-14)
    assert abs(found - wrong) > 4e-4


@pytest.mark.parametrize("without", range(1, 13))
@pytest.mark.parametrize("difference", DELTAS)
def test_alpha_without_each_item(difference, without):
    """Leaving an item of the 4 × 12 table out gives the exact figure."""
    table = twin.without_item(coder_rows("K2011-CD"), without)
    wanted = what_if("K2011-CD")[difference]["alpha_without_item"][str(without)]["exact"]
    assert measured(table, difference).alpha == pytest.approx(float(Fraction(wanted)), rel=1e-14)


@pytest.mark.parametrize("difference", DELTAS)
def test_equals_the_slow_twin_on_random_tables(difference):
    """On 400 random tables with gaps alpha, D_o and D_e equal the definitions: floats of fractions."""
    rng = np.random.default_rng(2011)
    defined = 0
    for _ in range(400):
        values = tuple(range(1, int(rng.integers(2, 7))))
        table = random_table(rng, int(rng.integers(1, 9)), int(rng.integers(1, 6)), values)
        wanted = twin.alpha_by_definition(table, DELTAS[difference])
        found = measured(table, difference)
        for mine, exact in (
            (found.observed_disagreement, wanted.observed),
            (found.expected_disagreement, wanted.expected),
            (found.alpha, wanted.alpha),
        ):
            if exact is None:
                assert mine is None
            elif difference == "ratio":
                assert mine == pytest.approx(float(exact), rel=1e-12, abs=1e-14)
            else:
                assert mine == float(exact)
        assert found.n_pairable_labels == wanted.n
        defined += wanted.alpha is not None
    assert defined > 200


def test_decimals_stay_exact():
    """Labels such as 0.1 and 0.3 are taken as tenths, so 0.1 + 0.2 troubles nobody."""
    table = {i: [("A", Fraction(1, 10)), ("B", Fraction(3, 10))] for i in range(3)}
    table[3] = [("A", Fraction(1, 10)), ("B", Fraction(1, 10))]
    wanted = twin.alpha_by_definition(table, twin.interval)
    found = measured(table, "interval")
    assert found.alpha == float(wanted.alpha)
    assert found.observed_disagreement == float(wanted.observed)


@pytest.mark.parametrize(
    ("difference", "distance"),
    [
        ("nominal", binary_distance),
        ("interval", interval_distance),
        ("jaccard", jaccard_distance),
        ("masi", masi_distance),
    ],
)
def test_equals_nltk(difference, distance):
    """On 40 random tables alpha equals NLTK's, missing labels left out and undefined cases skipped."""
    rng = np.random.default_rng(8)
    sets = ["a", "b", "c", "a;b", "b;c", "a;b;c", "c;d"]
    compared = 0
    for _ in range(40):
        if difference in ("jaccard", "masi"):
            table = random_table(rng, values=sets, missing=0.2)
            data = twin.coded(table)
            function = difference_function(difference, {"separator": ";"})
            found = measure_agreement(data.labels, function, Values.from_texts(data.values))
            outside = {s: frozenset(s.split(";")) for s in sets}
        else:
            table = random_table(rng, missing=0.2)
            found = measured(table, difference)
            outside = {value: value for value in range(1, 6)}
        if found.alpha is None:
            continue
        # Lone labels make no pairs; NLTK is given the pairable ones.
        triples = [
            (str(coder), str(item), outside[value])
            for item, labels in twin.pairable(table).items()
            for coder, value in labels
        ]
        wanted = nltk_agreement.AnnotationTask(triples, distance=distance).alpha()
        assert found.alpha == pytest.approx(wanted, rel=1e-12, abs=1e-12)
        compared += 1
    assert compared > 30


def test_equals_kappa_of_statsmodels_by_identity():
    """On complete nominal tables 1 − (1 − α) n/(n − 1) is Fleiss' κ as statsmodels computes it."""
    rng = np.random.default_rng(5)
    for _ in range(30):
        data = rng.integers(0, 4, size=(12, 5))
        table = {i: list(enumerate(row)) for i, row in enumerate(data.tolist())}
        found = measured(table)
        n = found.n_pairable_labels
        wanted = fleiss_kappa(aggregate_raters(data)[0])
        assert 1 - (1 - found.alpha) * n / (n - 1) == pytest.approx(wanted, rel=1e-10)


def test_close_to_cohens_kappa_with_equal_marginals():
    """Two coders with the same marginals: Cohen's κ of scikit-learn follows from alpha."""
    rng = np.random.default_rng(6)
    for _ in range(20):
        first = rng.integers(0, 3, size=30)
        second = rng.permutation(first)
        table = {
            i: [("A", int(a)), ("B", int(b))]
            for i, (a, b) in enumerate(zip(first, second, strict=True))
        }
        found = measured(table)
        n = found.n_pairable_labels
        wanted = cohen_kappa_score(first, second)
        assert 1 - (1 - found.alpha) * n / (n - 1) == pytest.approx(wanted, rel=1e-10, abs=1e-12)


def test_ordinal_is_interval_on_pooled_midranks():
    """Ordinal alpha equals interval alpha on scipy's midranks of the pairable labels, gaps or not."""
    rng = np.random.default_rng(7)
    for _ in range(30):
        table = twin.pairable(random_table(rng, 10, 4))
        pooled = [value for labels in table.values() for _, value in labels]
        if len(set(pooled)) < 2:
            continue
        rank = dict(zip(pooled, rankdata(pooled), strict=True))
        ranked = {
            item: [(coder, Fraction(float(rank[value]))) for coder, value in labels]
            for item, labels in table.items()
        }
        assert measured(table, "ordinal").alpha == measured(ranked, "interval").alpha


def test_interval_is_one_way_analysis_of_variance():
    """On complete data interval alpha is 1 − MSW/MST of a one-way analysis of variance over items."""
    rng = np.random.default_rng(9)
    for _ in range(20):
        data = rng.integers(0, 20, size=(9, 4))
        table = {i: list(enumerate(row)) for i, row in enumerate(data.tolist())}
        within = ((data - data.mean(axis=1, keepdims=True)) ** 2).sum() / (data.size - len(data))
        total = ((data - data.mean()) ** 2).sum() / (data.size - 1)
        assert measured(table, "interval").alpha == pytest.approx(1 - within / total, rel=1e-12)


DEGENERATE = [
    ("no items at all", {}, NOTHING_PAIRABLE),
    ("items without labels", {1: [], 2: []}, NOTHING_PAIRABLE),
    ("only lone labels", {1: [("A", 1)], 2: [("B", 2)]}, NOTHING_PAIRABLE),
    ("one item, one label twice", {1: [("A", 1), ("B", 1)]}, NO_VARIATION),
    ("all labels the same", {i: [("A", 3), ("B", 3), ("C", 3)] for i in range(9)}, NO_VARIATION),
    (
        "pairable labels the same, lone ones differ",
        {1: [("A", 1), ("B", 1)], 2: [("A", 1), ("B", 1)], 3: [("A", 2)]},
        NO_VARIATION,
    ),
]


@pytest.mark.parametrize("difference", ["nominal", "ordinal", "interval", "ratio"])
@pytest.mark.parametrize(("what", "table", "because"), DEGENERATE)
def test_degenerate_data_is_undefined_with_its_reason(difference, what, table, because):
    """Alpha of data that cannot tell is None with the reason, never 1 and never nan."""
    found = measured(table, difference)
    assert found.alpha is None
    assert found.undefined_because == because
    assert found.observed_disagreement in (None, 0.0)


def test_one_disputed_item_alone_is_zero():
    """One item with two different labels: all disagreement is within it, and alpha is 0."""
    found = measured({1: [("A", 1), ("B", 2)]}, "interval")
    assert found.alpha == 0.0
    assert found.n_disputed_items == 1


def test_tolerance_moves_disputes_and_nothing_else():
    """Numbers within the tolerance are not disputed; D_o, D_e and alpha stay as they are."""
    table = {1: [("A", 10), ("B", 11)], 2: [("A", 10), ("B", 15)], 3: [("A", 2), ("B", 2)]}
    plain, eased = measured(table, "interval"), measured(table, "interval", tolerance=1)
    assert (plain.n_disputed_items, eased.n_disputed_items) == (2, 1)
    assert plain.alpha == eased.alpha


def test_tolerance_compares_exactly():
    """0.4 − 0.3 is within a tolerance of 0.1, although in floats it is above."""
    table = {1: [("A", Fraction(4, 10)), ("B", Fraction(3, 10))], 2: [("A", 1), ("B", 1)]}
    assert 0.4 - 0.3 > 0.1
    assert measured(table, "interval", tolerance=Fraction(1, 10)).n_disputed_items == 0
    assert measured(table, "interval", tolerance=Fraction(9, 100)).n_disputed_items == 1


def test_tolerance_needs_numbers():
    """A tolerance on words is an error."""
    data = twin.coded({1: [("A", "x"), ("B", "y")]})
    with pytest.raises(RelookError, match="numbers"):
        measure_agreement(data.labels, DIFFERENCE_FUNCTIONS["nominal"], tolerance=1)


def test_counts_of_the_agreement():
    """Items, labels and coders are counted with and without those that make no pairs."""
    found = measured(coder_rows("K2011-CD"))
    assert (found.n_items, found.n_pairable_items, found.n_disputed_items) == (12, 11, 3)
    assert (found.n_labels, found.n_pairable_labels, found.n_coders) == (41, 40, 4)


@pytest.mark.parametrize("difference", ["nominal", "ordinal"])
def test_ten_million_labels_of_one_profile_do_not_overflow(difference):
    """Multiplicities of ten million: sums beyond 2**63 equal Python's own integers."""
    often = np.array([10_000_000, 9_999_999, 5_000_001])
    profiles = Profiles(
        np.array([0, 1, 1, 2, 0, 2]),
        np.array([2, 1, 1, 2, 1, 1]),
        np.array([0, 2, 4, 6]),
        often,
        3,
    )
    marginals = profiles.pairable_marginals()
    n_c = [2 * 10_000_000 + 5_000_001, 10_000_000 + 9_999_999, 2 * 9_999_999 + 5_000_001]
    assert marginals.tolist() == n_c
    bound = DIFFERENCE_FUNCTIONS[difference].bind(Values(3), marginals)

    def delta(c, k):
        if difference == "nominal":
            return Fraction(c != k)
        low, high = min(c, k), max(c, k)
        between = sum(n_c[low : high + 1]) - Fraction(n_c[c] + n_c[k], 2)
        return between**2 if c != k else Fraction(0)

    wanted = sum(n_c[c] * n_c[k] * delta(c, k) for c in range(3) for k in range(3))
    assert Fraction(bound.pair_sum(marginals), bound.denominator) == wanted
    within = [2 * 2 * delta(0, 1), 2 * 2 * delta(1, 2), 2 * delta(0, 2)]
    assert [Fraction(int(w), bound.denominator) for w in bound.within(profiles)] == within
    toward = [delta(0, 1), 2 * delta(0, 1), 2 * delta(1, 2), delta(1, 2), delta(0, 2), delta(0, 2)]
    assert [Fraction(int(t), bound.denominator) for t in bound.toward_item(profiles)] == toward


def test_counts_have_no_coders() -> None:
    """A table of counts has labels of nobody in particular; else coders with a label count."""
    items, values = np.array([0, 0, 1]), np.array([0, 1, 1])
    counts = CodedLabels.from_codes(items, values)
    assert measure_agreement(counts, DIFFERENCE_FUNCTIONS["nominal"]).n_coders == 0
    coded = CodedLabels.from_codes(items, values, np.array([0, 3, 3]), n_coders=9)
    assert measure_agreement(coded, DIFFERENCE_FUNCTIONS["nominal"]).n_coders == 2
