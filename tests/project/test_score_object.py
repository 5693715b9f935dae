"""Everything that `--json` writes: complete, exact, documented, and undefined where it must be."""

import json
import re
from collections import defaultdict

import numpy as np
import pytest

from reference import by_definition as twin
from reference.cases import CASES, random_table
from reference.made_projects import csv_text, long_csv, make, scored
from reference.published import coder_rows, example, what_if
from relook.project.figures.score_object import score_object

NOMINAL = '[variables.label]\ncolumn = "label"\n'


def object_of(tmp_path, table, **how):
    """Score a table; what is written must survive JSON without nan."""
    merge = how.pop("merge", ())
    held = score_object(scored(make(tmp_path, long_csv(table), **how), merge=merge))
    return json.loads(json.dumps(held, allow_nan=False))


def close(number):
    return pytest.approx(float(number), rel=1e-12, abs=1e-12)


@pytest.mark.parametrize("name", ["nominal", "ordinal", "interval"])
def test_every_part_is_that_of_the_definitions(tmp_path, name):
    """Coders, pairs, groups and crossings equal the slow twin's and each adds up to D_o."""
    rng = np.random.default_rng(8)
    table = random_table(rng, 30, 4, 4)
    delta = CASES[name][0]
    group = {item: "odd" if item % 2 else "even" for item in table}
    order = 'labels = ["1", "2", "3", "4"]\n' if name == "ordinal" else ""
    held = object_of(
        tmp_path,
        table,
        variables=f'[variables.label]\ncolumn = "label"\ndifference = "{name}"\n{order}',
        items=csv_text(("item", "half"), group.items()),
        item_settings='key = "item"\ngroup_by = ["half"]\n',
    )
    wanted = twin.alpha_by_definition(table, delta)
    row = held["variables"][0]
    assert row["alpha"] == close(wanted.alpha)
    assert row["observed_disagreement"] == close(wanted.observed)
    assert row["expected_disagreement"] == close(wanted.expected)

    coders = twin.coder_parts(table, delta)
    assert {r["coder"]: r["contribution"] for r in held["coders"]} == {
        str(coder): close(part) for coder, part in coders.items()
    }
    for r in held["coders"]:
        left = twin.alpha_by_definition(twin.without_coder(table, int(r["coder"])), delta)
        assert r["alpha_without"] == close(left.alpha)
    own = sum(r["n_labels"] * r["own_alpha"] for r in held["coders"]) / row["n_pairable_labels"]
    assert own == close(wanted.alpha)

    pairs = twin.coder_pair_parts(table, delta)
    assert {
        frozenset((int(r["first"]), int(r["second"]))): r["contribution"]
        for r in held["coder_pairs"]
    } == {pair: close(part) for pair, part in pairs.items()}
    labels = {pair: part for pair, part in twin.label_pair_parts(table, delta).items() if part}
    assert {
        frozenset((int(r["first"]), int(r["second"]))): r["contribution"]
        for r in held["label_pairs"]
    } == {pair: close(part) for pair, part in labels.items()}
    groups = twin.group_parts(table, delta, group)
    assert {r["group"]: r["contribution"] for r in held["groups"]} == {
        name_: close(part) for name_, part in groups.items()
    }
    for key in (
        "coders",
        "coder_pairs",
        "label_pairs",
        "groups",
        "group_coders",
        "group_label_pairs",
    ):
        assert sum(r["contribution"] for r in held[key]) == close(wanted.observed), key
        assert sum(r["share"] for r in held[key]) == close(1), key
    crossed = defaultdict(float)
    for r in held["group_coders"]:
        crossed[r["coder"]] += r["contribution"]
    assert dict(crossed) == {str(coder): close(part) for coder, part in coders.items()}
    assert sum(r["n_labels"] for r in held["label_use"]) == row["n_pairable_labels"]


def test_two_coders_get_a_cross_table_and_a_direction(tmp_path):
    """Krippendorff 2011, example A: D_o .4, alpha 2/21; parts of .2 each tell nothing."""
    held = object_of(tmp_path, coder_rows("K2011-A"))
    row = held["variables"][0]
    exact = what_if("K2011-A")["nominal"]
    assert row["alpha"] == close(exact["alpha"]["value"])
    assert [r["contribution"] for r in held["coders"]] == [close(0.2), close(0.2)]
    assert [r["alpha_without"] for r in held["coders"]] == [None, None]
    first, second = (example("K2011-A")["data"][coder] for coder in "AB")
    cells = {(r["first"], r["second"]): r["n_items"] for r in held["cross_table"]}
    for one in "01":
        for other in "01":
            met = sum((str(a), str(b)) == (one, other) for a, b in zip(first, second, strict=True))
            assert cells.get((one, other), 0) == met
    for r in held["directions"]:
        used = [sum(str(v) == r["label"] for v in values) for values in (first, second)]
        assert [r["n_first"], r["n_second"]] == used
        assert r["difference"] == used[0] - used[1]
    assert row["verdict"] is None
    assert held["higher"] == []


def test_of_two_coders_it_is_said_who_is_higher(tmp_path):
    """Numbers have a direction; the mean difference is over the shared items."""
    table = {
        1: [("a", 3), ("b", 1)],
        2: [("a", 2), ("b", 2)],
        3: [("a", 1), ("b", 2)],
        4: [("a", 9)],
    }
    held = object_of(
        tmp_path, table, variables='[variables.label]\ncolumn = "label"\ndifference = "interval"\n'
    )
    (row,) = held["higher"]
    assert (row["n_items"], row["first_higher"], row["second_higher"]) == (3, 1, 1)
    assert row["mean_difference"] == close(1 / 3)


def test_chance_shares_are_shares_of_expected_disagreement(tmp_path):
    """Where every pair of labels meets, the chance shares add up to 1."""
    table = {u: [("a", x), ("b", y)] for u, (x, y) in enumerate(["pq", "pr", "qr", "pp", "qq"])}
    held = object_of(tmp_path, table)
    assert len(held["label_pairs"]) == 3
    assert sum(r["chance_share"] for r in held["label_pairs"]) == close(1)
    # n_p, n_q, n_r = 4, 4, 2: pairs of 16, 8 and 8 of 32.
    assert {r["first"] + r["second"]: r["chance_share"] for r in held["label_pairs"]} == {
        "pq": close(0.5), "pr": close(0.25), "qr": close(0.25)
    }  # fmt: skip


def test_every_key_is_documented(tmp_path):
    """The docstring of `score_object` names each key of each list."""
    from relook.project.figures.label_mergers import MergeGroup

    rng = np.random.default_rng(5)
    table = {u: [(c, str(rng.choice(list("pqr")))) for c in "ab"] for u in range(40)}
    held = object_of(
        tmp_path,
        table,
        items=csv_text(("item", "half"), [(u, u % 2) for u in table]),
        item_settings='key = "item"\ngroup_by = ["half"]\n',
        variables='[variables.label]\ncolumn = "label"\ndifference = "ordinal"\nlabels = ["p", "q", "r"]\n',
        merge=[MergeGroup("x", ("p", "q"))],
    )
    documented = set(re.findall(r"\w+", score_object.__doc__))

    def keys(thing):
        if isinstance(thing, dict):
            for key, value in thing.items():
                yield key
                yield from keys(value)
        elif isinstance(thing, list):
            for value in thing:
                yield from keys(value)

    assert set(keys(held)) <= documented
    empty = {name for name, value in held.items() if value == []}
    assert empty == {"left_out", "changed_files", "warnings"}


@pytest.mark.parametrize(
    ("table", "because", "observed"),
    [
        (
            {u: [("a", "p"), ("b", "p")] for u in range(3)},
            "all pairable labels are the same, so chance disagreement is 0",
            0.0,
        ),
        ({u: [("ab"[u % 2], "p")] for u in range(3)}, "no item has two labels or more", None),
    ],
)
def test_undefined_is_null_with_its_reason(tmp_path, table, because, observed):
    """Never nan, never 1; a warning names it."""
    held = object_of(tmp_path, table)
    row = held["variables"][0]
    assert (row["alpha"], row["undefined_because"]) == (None, because)
    assert row["observed_disagreement"] == observed
    assert (row["interval"], row["no_interval_because"]) == (None, because)
    assert {"variable": "label", "warning": f"alpha is undefined: {because}"} in held["warnings"]
    assert row["projected_agreement"] == {"low": None, "high": None}
    assert (held["n_disputed_items"], held["n_selected_items"]) == (0, 0)


def test_no_disagreement_has_no_interval(tmp_path):
    """D_o = 0: alpha is 1, and nothing is known of its spread."""
    row = object_of(tmp_path, {u: [("a", "pq"[u % 2]), ("b", "pq"[u % 2])] for u in range(9)})[
        "variables"
    ][0]
    assert (row["alpha"], row["interval"]) == (1.0, None)
    assert row["no_interval_because"] == "no disagreement seen"
    assert row["share_selected"] is None


def test_too_many_undefined_resamples_leave_no_interval(tmp_path):
    """One item of three keeps the labels apart: a resample without it is undefined."""
    table = {1: [("a", "p"), ("b", "q")], 2: [("a", "p"), ("b", "p")], 3: [("a", "p"), ("b", "p")]}
    row = object_of(tmp_path, table)["variables"][0]
    assert row["interval"] is None
    assert re.fullmatch(
        r"alpha was undefined in \d+% of the resamples, above 5%", row["no_interval_because"]
    )


def test_clusters_are_drawn_whole_and_named(tmp_path):
    """With 2 of 40 items to a cluster the interval warns of few clusters, and differs."""
    rng = np.random.default_rng(3)
    table = {u: [(c, str(rng.choice(list("pq")))) for c in "ab"] for u in range(40)}
    plain = object_of(tmp_path / "plain", table)["variables"][0]["interval"]
    held = object_of(
        tmp_path / "clusters",
        table,
        items=csv_text(("item", "thread"), [(u, u // 2) for u in table]),
        item_settings='key = "item"\nresample_by = "thread"\n',
    )
    interval = held["variables"][0]["interval"]
    assert (plain["resampled_by"], interval["resampled_by"]) == ("item", "thread")
    assert (plain["low"], plain["high"]) != (interval["low"], interval["high"])
    assert any("20 clusters, fewer than 30" in r["warning"] for r in held["warnings"])


def test_needed_items_are_said_for_two_coders_and_nominal_labels_only(tmp_path):
    """Krippendorff 2004 after Bloch & Kraemer 1989: p = .25 at .05 asks for 139 items."""
    table = {u: [("a", "pppq"[u % 4]), ("b", "pppq"[u % 4])] for u in range(40)}
    row = object_of(tmp_path / "two", table)["variables"][0]
    assert row["needed_items"] == {
        "n_items": 139,
        "bar": 0.8,
        "error_level": 0.05,
        "rarest_label": "q",
        "rarest_share": 0.25,
    }
    for u in table:
        table[u].append(("c", "p"))
    row = object_of(tmp_path / "three", table)["variables"][0]
    assert row["needed_items"] is None
    assert row["no_needed_items_because"] == (
        "the published rule is for two coders and nominal labels"
    )


def test_left_out_coders_are_named(tmp_path):
    """Figures say whose labels they leave out."""
    table = {u: [(c, "pq"[u % 2]) for c in "abc"] for u in range(4)}
    held = object_of(
        tmp_path,
        table,
        label_settings='item = "item"\ncoder = "coder"\nleave_out = ["c"]\n',
    )
    assert held["left_out"] == [{"coder": "c", "n_labels": 4}]
    assert held["variables"][0]["n_coders"] == 2
