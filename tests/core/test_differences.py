"""The further difference functions: against the slow twin, and how they are declared and refused."""

from fractions import Fraction
from itertools import product

import numpy as np
import pytest

from reference import by_definition as twin
from relook.core.agreement import measure_agreement
from relook.core.bound_differences import RationalDifferences
from relook.core.differences import (
    DIFFERENCE_FUNCTIONS,
    DifferenceTable,
    Values,
    difference_function,
    parse_difference,
)
from relook.core.profiles import collapse
from relook.errors import RelookError

SETS = ["", "a", "b", "a;b", "b;c", "a;b;c", "c;d", "a;b;c;d;e", "f;g;h"]
PATHS = ["", "a", "b", "a/b", "a/c", "a/b/c", "b/a/c", "a/b/c/d"]
ENTRIES = DifferenceTable(
    ("x", "y", "z"),
    tuple(
        tuple(Fraction(cell) for cell in row)
        for row in (("0", "0.5", "1"), ("0.5", "0", "1/3"), ("1", "1/3", "0"))
    ),
)


def textual(name):
    """Function, value texts, and (text -> twin value, delta) of the functions that need texts."""
    if name == "table":
        entries = {
            (a, b): ENTRIES.entries[i][j]
            for (i, a), (j, b) in product(enumerate(ENTRIES.labels), repeat=2)
        }
        function = difference_function("table", {"table": ENTRIES})
        return function, list(ENTRIES.labels), str, twin.listed_table(entries)
    if name == "tree":
        function = difference_function("tree", {"separator": "/"})
        return function, PATHS, lambda t: tuple(filter(None, t.split("/"))), twin.tree
    function = difference_function(name, {"separator": ";"})
    return function, SETS, lambda t: frozenset(filter(None, t.split(";"))), getattr(twin, name)


@pytest.mark.parametrize("name", ["jaccard", "masi", "tree", "table"])
def test_differences_of_texts_are_exact_fractions(name):
    """δ² of every pair of texts is the exact fraction of the definition."""
    function, texts, parted, delta = textual(name)
    bound = function.bind(Values.from_texts(texts), np.ones(len(texts), dtype=np.int64))
    assert bound.exact
    difference = delta({})
    for (i, a), (j, b) in product(enumerate(texts), repeat=2):
        found = bound.numerators(np.array([i]), np.array([j]))[0]
        assert Fraction(int(found), bound.denominator) == difference(parted(a), parted(b))


@pytest.mark.parametrize("name", ["jaccard", "masi", "tree", "table"])
def test_alpha_of_texts_equals_the_twin(name):
    """On 60 random tables alpha of sets, trees and tables is the float of the exact fraction."""
    function, texts, parted, delta = textual(name)
    rng = np.random.default_rng(12)
    for _ in range(60):
        table = {
            item: [
                (coder, texts[int(rng.integers(len(texts)))])
                for coder in range(4)
                if rng.random() > 0.2
            ]
            for item in range(6)
        }
        data = twin.coded(table)
        found = measure_agreement(data.labels, function, Values.from_texts(data.values))
        exact = {i: [(c, parted(v)) for c, v in row] for i, row in table.items()}
        wanted = twin.alpha_by_definition(exact, delta)
        assert found.observed_disagreement == float(wanted.observed)
        assert found.expected_disagreement == float(wanted.expected)
        assert found.alpha == (None if wanted.alpha is None else float(wanted.alpha))


@pytest.mark.parametrize("name", ["jaccard", "masi"])
def test_large_sets_go_over_to_floats(name):
    """With forty elements the common denominator is too large; floats give the same δ² to 1e-15."""
    texts = [";".join(f"e{i}" for i in range(k)) for k in (1, 3, 20, 40)] + ["e7;x"]
    function, parted = (
        difference_function(name, {"separator": ";"}),
        lambda t: frozenset(t.split(";")),
    )
    bound = function.bind(Values.from_texts(texts), np.ones(5, dtype=np.int64))
    assert not bound.exact
    difference = getattr(twin, name)({})
    for (i, a), (j, b) in product(enumerate(texts), repeat=2):
        wanted = float(difference(parted(a), parted(b)))
        assert bound.between(np.array([i]), np.array([j]))[0] == pytest.approx(wanted, abs=1e-15)
    table = {i: [("A", texts[i]), ("B", texts[(i + 1) % 5])] for i in range(5)}
    data = twin.coded(table)
    found = measure_agreement(data.labels, function, Values.from_texts(data.values))
    exact = {i: [(c, parted(v)) for c, v in row] for i, row in table.items()}
    wanted = twin.alpha_by_definition(exact, getattr(twin, name))
    assert found.alpha == pytest.approx(float(wanted.alpha), rel=1e-12, abs=1e-14)


def test_masi_weights_are_passonneau_2006():
    """M is 1, 2/3, 1/3, 0: a in ab gives 1 − 1/2 · 2/3; ab and bc give 1 − 1/3 · 1/3."""
    function = difference_function("masi", {"separator": ";"})
    texts = ["a", "a;b", "b;c", "d"]
    delta = function.bind(Values.from_texts(texts), np.ones(4, dtype=np.int64)).matrix(4)
    assert delta[0, 1] == pytest.approx(1 - 1 / 2 * 2 / 3, rel=1e-15)
    assert delta[1, 2] == pytest.approx(1 - 1 / 3 * 1 / 3, rel=1e-15)
    assert delta[0, 3] == 1


def test_sets_ignore_order_repeats_and_spaces():
    """Written as "b; a", "a;b" or "a;b;a" a set is the same, and two ways to write nothing are one too."""
    function = difference_function("jaccard", {"separator": ";"})
    texts = ["a;b", "b; a", "a;b;a", "", " ; "]
    delta = function.bind(Values.from_texts(texts), np.ones(5, dtype=np.int64)).matrix(5)
    assert not delta[:3, :3].any()
    assert not delta[3:, 3:].any()
    assert (delta[:3, 3:] == 1).all()


def test_a_coarse_table_with_a_long_denominator_goes_over_to_floats():
    """Entries with many decimals are floats; entries with few are integers over a denominator."""
    long = Fraction("0.12345678901")
    table = DifferenceTable(("x", "y"), ((Fraction(0), long), (long, Fraction(0))))
    function = difference_function("table", {"table": table})
    bound = function.bind(Values.from_texts(["y", "x"]), np.array([1, 1]))
    assert not bound.exact
    assert bound.matrix(2)[0, 1] == float(long)


@pytest.mark.parametrize("period", [7, 24, Fraction(1, 2), 86_400])
def test_circular_equals_the_twin(period):
    """Circular D_o, D_e, parts and alpha equal sums over pairs, to 1e-12, at any period."""
    rng = np.random.default_rng(4)
    function = difference_function("circular", {"period": period})
    for spread in (3, 40):
        table = {
            item: [(coder, int(rng.integers(spread))) for coder in range(4)] for item in range(7)
        }
        data = twin.coded(table)
        found = measure_agreement(data.labels, function, data.numbers())
        wanted = twin.alpha_by_definition(table, twin.circular(period))
        if wanted.observed < 1e-20:  # every label is a whole number of half turns
            continue
        assert found.observed_disagreement == pytest.approx(wanted.observed, rel=1e-11)
        assert found.expected_disagreement == pytest.approx(wanted.expected, rel=1e-11)
        toward = found.differences.toward_item(found.profiles)
        summed = np.add.reduceat(found.profiles.count * toward, found.profiles.start[:-1])
        np.testing.assert_allclose(summed, found.within, rtol=1e-9, atol=1e-16)


def test_circular_unanimity_is_exactly_zero():
    """Labels a whole period apart are one; unanimous items contribute exactly 0."""
    table = {i: [("A", 23), ("B", 23 + 24 * i), ("C", 23)] for i in range(5)} | {
        9: [("A", 1), ("B", 2)]
    }
    data = twin.coded(table)
    function = difference_function("circular", {"period": 24})
    found = measure_agreement(data.labels, function, data.numbers())
    assert found.n_disputed_items == 1
    quiet = {i: labels for i, labels in table.items() if i != 9}
    data = twin.coded(quiet)
    assert measure_agreement(data.labels, function, data.numbers()).alpha is None


def test_circular_midnight_is_near():
    """Hours 23 and 0 differ as little as 11 and 12, and 12 hours apart is the most there is."""
    function = difference_function("circular", {"period": 24})
    hours = Values.from_numbers([0, 11, 12, 23])
    delta = function.bind(hours, np.ones(4, dtype=np.int64)).matrix(4)
    assert delta[0, 3] == pytest.approx(delta[1, 2], rel=1e-12)
    assert delta[0, 2] == pytest.approx(1, rel=1e-15)


def test_polar_ends_do_not_divide_by_zero():
    """Unanimity at an end of the scale is 0; end against end is (b − a)²/(b − a)² = 1."""
    function = difference_function("polar", {"ends": [0, 10]})
    delta = function.bind(Values.from_numbers([0, 5, 10]), np.ones(3, dtype=np.int64)).matrix(3)
    assert np.diag(delta).tolist() == [0, 0, 0]
    assert delta[0, 2] == 1
    assert delta[0, 1] == pytest.approx(25 / (5 * 15), rel=1e-15)


CHECKS = [
    ("ratio", {}, Values.from_numbers([-1, 0, 2]), [(0, "negative")]),
    ("polar", {"ends": [0, 10]}, Values.from_numbers([-1, 0, 10, 11]), [(0, "ends"), (3, "ends")]),
    ("table", {"table": ENTRIES}, Values.from_texts(["x", "w"]), [(1, "not in the table")]),
]


@pytest.mark.parametrize(("name", "options", "values", "wanted"), CHECKS)
def test_values_out_of_bounds_are_named_and_refused(name, options, values, wanted):
    """`check` lists every value that the function cannot take, and `bind` refuses them."""
    function = difference_function(name, options)
    found = function.check(values)
    assert [code for code, _ in found] == [code for code, _ in wanted]
    for (_, reason), (_, part) in zip(found, wanted, strict=True):
        assert part in reason
    with pytest.raises(RelookError, match=wanted[0][1]):
        function.bind(values, np.ones(values.n_values, dtype=np.int64))


@pytest.mark.parametrize("name", DIFFERENCE_FUNCTIONS)
def test_values_in_bounds_pass(name):
    """Values that a function is made for pass its check."""
    options = {
        "circular": {"period": 12},
        "polar": {"ends": [0, 10]},
        "table": {"table": ENTRIES},
    }.get(name, {"separator": ";"} if DIFFERENCE_FUNCTIONS[name].needs == "text" else {})
    function = difference_function(name, options)
    words = Values.from_texts(["x", "y"])
    assert function.check(words if function.needs == "text" else Values.from_numbers([0, 1])) == []


@pytest.mark.parametrize("name", ["interval", "ratio", "circular", "polar"])
def test_functions_of_numbers_refuse_words(name):
    """Functions of numbers say that they need numbers."""
    options = {"circular": {"period": 12}, "polar": {"ends": [0, 1]}}.get(name, {})
    with pytest.raises(RelookError, match=f"{name} differences need numbers"):
        difference_function(name, options).bind(Values(2), np.array([1, 1]))


@pytest.mark.parametrize("name", ["jaccard", "masi", "tree", "table"])
def test_functions_of_texts_refuse_bare_codes(name):
    """Functions of texts say that they need them."""
    with pytest.raises(RelookError, match=f"{name} differences need the texts"):
        textual(name)[0].bind(Values(2), np.array([1, 1]))


@pytest.mark.parametrize(
    ("name", "options", "said"),
    [
        ("nominl", {}, 'did you mean "nominal"'),
        ("Ordinal", {}, 'did you mean "ordinal"'),
        ("circular", {}, 'need "period"'),
        ("circular", {"perod": 12}, 'did you mean "period"'),
        ("circular", {"period": 0}, "above 0"),
        ("circular", {"period": "noon"}, "must be a number"),
        ("circular", {"period": True}, "must be a number"),
        ("circular", {"period": "1/0"}, "must be a number"),
        ("polar", {"ends": [1]}, "two numbers"),
        ("polar", {"ends": [10, 0]}, "below the second"),
        ("jaccard", {"separator": ""}, "must be a mark"),
        ("tree", {"separator": 3}, "must be a mark"),
        ("table", {"table": "file.csv"}, "has not been read"),
        ("interval", {"period": 3}, "take none"),
    ],
)
def test_wrong_declarations_are_refused(name, options, said):
    """Unknown names and options bring the nearest known one; wrong values say what is needed."""
    with pytest.raises(RelookError) as caught:
        difference_function(name, options)
    assert said in str(caught.value)


@pytest.mark.parametrize("name", ["circular", "polar", "jaccard", "masi", "tree", "table"])
def test_functions_with_options_refuse_to_work_without(name):
    """Taken bare from the table of functions they say what they need."""
    texts = Values(2, np.array([0, 1]), 1, ("a", "b"))
    with pytest.raises(RelookError, match="need"):
        DIFFERENCE_FUNCTIONS[name].bind(texts, np.array([1, 1]))


def test_faults_of_a_table_are_all_listed():
    """A negative entry, a diagonal that is not 0, and an asymmetric pair each have their place."""
    rows = (("0", "1", "2"), ("1", "3", "-1"), ("1", "-1", "0"))
    table = DifferenceTable(
        ("x", "y", "z"), tuple(tuple(Fraction(cell) for cell in row) for row in rows)
    )
    assert [(row, column) for row, column, _ in table.faults()] == [(1, 1), (1, 2), (2, 0), (2, 1)]
    with pytest.raises(RelookError, match="and 3 more"):
        difference_function("table", {"table": table})
    assert ENTRIES.faults() == []


@pytest.mark.parametrize(
    ("text", "wanted"),
    [
        ("nominal", ("nominal", {})),
        ("circular:12", ("circular", {"period": "12"})),
        ("polar:0,10", ("polar", {"ends": ["0", "10"]})),
        ("jaccard:;", ("jaccard", {"separator": ";"})),
        ("masi:|", ("masi", {"separator": "|"})),
        ("tree:/", ("tree", {"separator": "/"})),
        ("tree::", ("tree", {"separator": ":"})),
        ("table:my differences.csv", ("table", {"table": "my differences.csv"})),
        ("table:C:\\x.csv", ("table", {"table": "C:\\x.csv"})),
    ],
)
def test_difference_in_one_word(text, wanted):
    """A function and its option can be written in one word."""
    assert parse_difference(text) == wanted
    if wanted[0] != "table":
        assert difference_function(*wanted).name == wanted[0]


@pytest.mark.parametrize(
    ("text", "said"),
    [
        ("nominal:3", "take no option"),
        ("circular", "circular:12"),
        ("polar:", "polar:0,10"),
        ("polar:0", "two numbers"),
        ("polar:a,b", "must be a number"),
        ("circle:12", 'did you mean "circular"'),
        ("zzz", "use one of"),
    ],
)
def test_wrong_words_are_refused(text, said):
    """Each wrong word says what to write."""
    with pytest.raises(RelookError) as caught:
        parse_difference(text)
    assert said in str(caught.value)


def test_sums_over_pairs_go_in_blocks(monkeypatch):
    """Expected disagreement is the same, however small the blocks of pairs."""
    function, texts, _, _ = textual("tree")
    counts = np.arange(1, len(texts) + 1)
    bound = function.bind(Values.from_texts(texts), counts)
    whole = bound.pair_sum(counts)
    monkeypatch.setattr(RationalDifferences, "BLOCK", 3)
    assert bound.pair_sum(counts) == whole


def test_distance_to_the_item_sums_to_the_whole():
    """For every function Σ n_uc Σ_k n_uk δ²_ck is the sum within the item."""
    rng = np.random.default_rng(3)
    table = {i: [(c, int(rng.integers(1, 8))) for c in range(5)] for i in range(12)}
    data = twin.coded(table)
    profiles, _ = collapse(data.labels)
    texts = tuple("a/b/c/d/e/f/g"[: 2 * k + 1] for k in range(len(data.values)))
    numbers = data.numbers()
    values = Values(numbers.n_values, numbers.numerators, numbers.denominator, texts)
    for name, function in DIFFERENCE_FUNCTIONS.items():
        if name == "table":
            continue
        options = {"circular": {"period": 9}, "polar": {"ends": [0, 9]}}.get(
            name, {"separator": "/"} if function.needs == "text" else {}
        )
        bound = function.with_options(options).bind(values, profiles.pairable_marginals())
        summed = np.add.reduceat(profiles.count * bound.toward_item(profiles), profiles.start[:-1])
        np.testing.assert_allclose(
            summed.astype(float), bound.within(profiles).astype(float), rtol=1e-12, atol=1e-14
        )


@pytest.mark.parametrize(
    ("name", "options"),
    [
        ("ratio", {}),
        ("polar", {"ends": [0, 9]}),
        ("table", {"table": ENTRIES}),
        ("tree", {"separator": "/"}),
    ],
)
def test_bare_codes_have_nothing_to_check(name, options):
    """Values of which neither text nor number is known cannot be out of bounds."""
    assert difference_function(name, options).check(Values(3)) == []


def test_words_have_no_coordinates():
    """Labels that are words are refused where numbers are asked for."""
    with pytest.raises(RelookError, match="these labels are words, not numbers"):
        Values.from_texts(["a", "b"]).numbers()
