"""Agreement from DataFrames and arrays: the same figures as everywhere else."""

from __future__ import annotations

import doctest
import json
from fractions import Fraction

import numpy as np
import pandas as pd
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

import relook
from reference import by_definition as twin
from reference.loop import SAMPLES
from relook.cli.app import run
from relook.frames import measured, queued, returned, showing

FERRY = SAMPLES / "ferry_remarks"
TOPICS = ["delay", "cancellation", "crew", "booking", "comfort", "price", "other"]


def ferry_labels():
    return pd.read_csv(FERRY / "labels" / "labels.csv", dtype=str, keep_default_na=False)


def ferry_items():
    return pd.read_csv(FERRY / "items" / "remarks.csv", dtype=str, keep_default_na=False)


def declared():
    text = (FERRY / "relook.toml").read_text(encoding="utf-8")
    listed = text.partition("\nlabels = [")[2].partition("]")[0]
    return json.loads(f"[{listed}]") if listed else None


@pytest.mark.parametrize("module", [measured, queued, returned, showing])
def test_examples_are_true(module):
    """Each example in a docstring runs and gives what it says."""
    found = doctest.testmod(module, optionflags=doctest.IGNORE_EXCEPTION_DETAIL)
    assert found.attempted > 0
    assert found.failed == 0


def test_figures_and_tables_are_those_of_the_command_line(capsys):
    """On the sample project: alpha, interval, and every table, number for number."""
    labels = ferry_labels().replace("NA", np.nan)
    items = ferry_items().rename(columns={ferry_items().columns[0]: "item_id"})
    held = relook.measure(
        labels, item="item_id", coder="coder", label="topic", order=declared(), items=items,
        group_by=["route"],
    )  # fmt: skip
    assert run(["score", str(FERRY), "--json", "--quiet"]) == 0
    wanted = json.loads(capsys.readouterr().out)
    own = wanted["variables"][0]
    assert (held.alpha, held.observed_disagreement) == (own["alpha"], own["observed_disagreement"])
    assert held.interval == (own["interval"]["low"], own["interval"]["high"])
    assert (held.n_items, held.n_disputed_items) == (own["n_items"], own["n_disputed_items"])
    assert held.n_missing == own["n_missing_labels"]
    for name in ("coders", "coder_pairs", "labels", "label_pairs"):
        frame = pd.DataFrame(wanted[name])
        pd.testing.assert_frame_equal(getattr(held, name), frame, check_dtype=False)
    groups = pd.DataFrame([row for row in wanted["groups"] if row["column"] == "route"])
    pd.testing.assert_frame_equal(held.groups, groups, check_dtype=False)


def test_items_are_those_of_the_command_line(tmp_path, capsys):
    """The ranking and its figures equal the file that `score --items` writes."""
    labels = ferry_labels().replace("NA", np.nan)
    held = relook.measure(labels, item="item_id", coder="coder", label="topic", order=declared())
    file = tmp_path / "items.csv"
    assert run(["score", str(FERRY), "--items", str(file), "--quiet"]) == 0
    capsys.readouterr()
    wanted = pd.read_csv(file, dtype={"item": str, "consensus": str})
    assert list(held.items["item"]) == list(wanted["item"])
    np.testing.assert_allclose(held.items["contribution"], wanted["contribution"], rtol=1e-12)
    np.testing.assert_allclose(held.items["doubt"], wanted["doubt"], rtol=1e-9)


CELLS = st.one_of(st.none(), st.integers(0, 3))


@settings(deadline=None, max_examples=30)  # each example resamples three times
@given(st.lists(st.lists(CELLS, min_size=3, max_size=3), min_size=1, max_size=7))
@pytest.mark.parametrize("level", ["nominal", "ordinal", "interval"])
def test_random_arrays_equal_the_definitions(level, rows):
    """A table by coder, a long one and an array give the alpha of the slow twin."""
    table = {
        u: [(coder, value) for coder, value in zip("abc", row, strict=True) if value is not None]
        for u, row in enumerate(rows)
    }
    table = {u: labels for u, labels in table.items() if labels}
    if not table:
        return
    wanted = twin.alpha_by_definition(table, getattr(twin, level)).alpha
    wide = pd.DataFrame(rows, columns=list("abc"), dtype="Int64")
    long = wide.reset_index().melt("index", var_name="coder", value_name="label")
    array = wide.to_numpy(dtype=float, na_value=np.nan)
    found = [
        relook.measure(wide, difference=level).alpha,
        relook.measure(long, item="index", coder="coder", label="label", difference=level).alpha,
        relook.measure(array, difference=level).alpha,
    ]
    if wanted is None:
        assert found == [None] * 3
    else:
        assert found == [pytest.approx(float(wanted), rel=1e-12, abs=1e-12)] * 3


def test_numbers_keep_their_digits():
    """0.1 + 0.2 is not 0.3, and 1 and 1.0 are one label; alpha is that of exact fractions."""
    frame = pd.DataFrame({"a": [0.1 + 0.2, 1, 2.5], "b": [0.3, 1.0, 2.5]})
    table = {
        u: [("a", Fraction(repr(a))), ("b", Fraction(repr(b)))]
        for u, (a, b) in enumerate(zip(frame["a"], frame["b"], strict=True))
    }
    held = relook.measure(frame, difference="interval")
    assert held.n_disputed_items == 1
    wanted = twin.alpha_by_definition(table, twin.interval).alpha
    assert held.alpha == pytest.approx(float(wanted), rel=1e-12)


def test_an_ordered_categorical_brings_its_order():
    """Low < mid < high, though the alphabet says otherwise."""
    kind = pd.CategoricalDtype(["low", "mid", "high"], ordered=True)
    frame = pd.DataFrame({"a": ["low", "mid", "high"], "b": ["mid", "mid", "low"]}).astype(kind)
    table = {0: [("a", 0), ("b", 1)], 1: [("a", 1), ("b", 1)], 2: [("a", 2), ("b", 0)]}
    wanted = twin.alpha_by_definition(table, twin.ordinal).alpha
    assert relook.measure(frame, difference="ordinal").alpha == pytest.approx(float(wanted))
    words = frame.astype(str)
    given_order = relook.measure(words, difference="ordinal", order=["low", "mid", "high"])
    assert given_order.alpha == pytest.approx(float(wanted))


def test_sets_may_be_sets_or_lists_in_any_order():
    """{"x", "y"} is ["y", "x"]; MASI of them by the slow twin."""
    frame = pd.DataFrame({"a": [{"x", "y"}, ["x"], None], "b": [["y", "x"], {"y", "x"}, {"z"}]})
    sets = {0: [("a", "xy"), ("b", "xy")], 1: [("a", "x"), ("b", "xy")]}
    table = {u: [(c, frozenset(v)) for c, v in row] for u, row in sets.items()}
    wanted = twin.alpha_by_definition(table, twin.masi).alpha
    assert relook.measure(frame, difference="masi:;").alpha == pytest.approx(float(wanted))


def test_texts_of_labels_are_escaped_in_html():
    """A label that is a script is text in a notebook."""
    frame = pd.DataFrame({"item": [1, 1, 2, 2], "coder": list("abab"), "<b>x</b>": list("pqpp")})
    shown = relook.measure(frame, item="item", coder="coder", label="<b>x</b>")._repr_html_()
    assert "<b>" not in shown
    assert "&lt;b&gt;x&lt;/b&gt;" in shown


@pytest.mark.parametrize(
    ("how", "message"),
    [
        ({"item": "id", "coder": "coder", "label": "label"}, 'no column "id"'),
        ({"item": "item", "coder": "coder"}, "needs its columns of items, coders and labels"),
        ({"label": "label"}, "a column of labels needs a column of coders"),
        ({"coders": ["coder"]}, "needs two coders or more; got 1"),
        (
            {"item": "item", "coder": "coder", "label": "label", "difference": "intervall"},
            "intervall",
        ),
        ({"item": "item", "coder": "coder", "label": "label", "difference": "interval"}, '"x"'),
    ],
)
def test_what_cannot_be_measured_is_told_with_a_mend(how, message):
    """What and the mend, as from the command line."""
    frame = pd.DataFrame({"item": [1, 1, 2], "coder": list("aba"), "label": list("xyx")})
    with pytest.raises(relook.RelookError) as caught:
        relook.measure(frame, **how)
    problems = caught.value.problems or [caught.value]
    assert any(message in problem.message for problem in problems)
    assert all(problem.mend for problem in problems)


def test_places_are_rows_as_iloc_counts_them():
    """A label twice by one coder, and an id that is missing, each with its row."""
    twice = pd.DataFrame(
        {"i": [1, 1, 1], "c": ["a", "b", "a"], "v": ["x", "x", "y"]}, index=[7, 8, 9]
    )
    with pytest.raises(relook.RelookError) as caught:
        relook.measure(twice, item="i", coder="c", label="v")
    assert '"x" here and "y" in row 2, the labels, row 0, column "v"' in str(caught.value)
    lacking = pd.DataFrame({"i": [1, 1, None], "c": ["a", "b", "a"], "v": ["x", "x", "y"]})
    with pytest.raises(relook.RelookError, match="1 labels have no i, the labels, row 2"):
        relook.measure(lacking, item="i", coder="c", label="v")


def test_the_item_table_must_name_an_item_once():
    """An id twice in the item table is refused."""
    labels = pd.DataFrame({"a": ["x", "y"], "b": ["x", "x"]}, index=["p", "q"])
    items = pd.DataFrame({"text": ["one", "two"]}, index=["p", "p"])
    with pytest.raises(relook.RelookError, match='the item "p" stands twice'):
        relook.measure(labels, items=items)


def test_an_array_has_two_axes():
    """A list of labels is no table."""
    with pytest.raises(relook.RelookError, match="items by coders; got 1"):
        relook.measure(["x", "y"])
