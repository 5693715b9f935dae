"""Made cases of the sizes that projects have: two coders and forty codes, six and twelve, noise."""

from itertools import pairwise

import numpy as np
import pytest

from reference.made_projects import csv_text, long_csv, make, scored
from relook.project.figures.item_table import item_table
from relook.project.figures.score_object import score_object
from relook.project.figures.verdict import verdict
from relook.project.setup.settings import QueueSettings


@pytest.fixture(scope="module")
def forty(tmp_path_factory):
    """Two coders, 2,000 answers, 40 codes with skewed shares; each errs on 15 % of them."""
    rng = np.random.default_rng(2_040)
    shares = 1 / np.arange(1, 41)
    shares /= shares.sum()
    truth = rng.choice(40, 2_000, p=shares)
    labels = np.stack([truth, truth], axis=1)
    errs = rng.random(labels.shape) < 0.15
    labels[errs] = rng.choice(40, int(errs.sum()), p=shares)
    table = {
        f"a{u:04d}": [("ann", f"code{x:02d}"), ("bob", f"code{y:02d}")]
        for u, (x, y) in enumerate(labels.tolist())
    }
    return scored(make(tmp_path_factory.mktemp("forty"), long_csv(table)))


def test_ties_are_spread_over_the_pairs_of_labels(forty):
    """All disputed items are tied; the first rows take each pair once, heaviest first."""
    ranking, held = forty.ordering.ranking, forty.variables[0]
    assert np.unique(ranking.tied).size == 1
    pairs = []
    for item in ranking.item_index.tolist():
        profile = held.agreement.profile_of_item[item]
        start = held.agreement.profiles.start[profile]
        pairs.append(tuple(held.agreement.profiles.value_index[start : start + 2].tolist()))
    heaviest = [
        (int(a), int(b))
        for a, b in zip(held.label_pairs.first, held.label_pairs.second, strict=True)
    ]
    n_pairs = len(heaviest)
    assert n_pairs > 100
    assert sorted(pairs[:n_pairs]) == sorted(heaviest)
    share = dict(zip(heaviest, held.label_pairs.share.tolist(), strict=True))
    first_turn = [share[pair] for pair in pairs[:n_pairs]]
    assert all(a >= b - 1e-12 for a, b in pairwise(first_turn))


def test_two_coders_give_no_doubt_and_no_verdict(forty):
    """Null with its reason, in the column too; nobody is blamed."""
    held = score_object(forty)["variables"][0]
    assert held["doubt"] is None
    assert held["doubt_undefined_because"] == (
        "fewer than three coders share items, so nothing tells who is right"
    )
    assert item_table(forty)["doubt"].isna().all()
    assert held["verdict"] is None
    assert forty.ordering.selection.bound_by == "default top"
    assert held["n_selected_rows"] == 100


def test_twelve_variables_fill_one_queue(tmp_path):
    """Six coders, 300 items, ordinal and interval in turn: the noisiest variable leads."""
    rng = np.random.default_rng(6_300)
    names = [f"v{at:02d}" for at in range(12)]
    truth = rng.integers(1, 8, size=(300, 12))
    noise = np.where(np.arange(12) == 3, 1.6, 0.5)
    rows = []
    for u in range(300):
        for coder in "abcdef":
            marks = np.clip(np.rint(truth[u] + rng.normal(0, noise)), 1, 7).astype(int)
            rows.append((f"e{u:03d}", coder, *marks))
    order = "labels = [" + ", ".join(f'"{mark}"' for mark in range(1, 8)) + "]\n"
    variables = "".join(
        f'[variables.{name}]\ncolumn = "{name}"\n'
        + (f'difference = "ordinal"\n{order}' if at % 2 else 'difference = "interval"\n')
        for at, name in enumerate(names)
    )
    project = make(tmp_path, csv_text(("item", "coder", *names), rows), variables=variables)
    score = scored(project, queue=QueueSettings(top=40))
    held = score_object(score)
    led = {row["variable"]: row["n_led_items"] for row in held["variables"]}
    assert max(led, key=led.get) == "v03"
    assert sum(led.values()) == 40
    for scored_, row in zip(score.variables, held["variables"], strict=True):
        rows_of_it = [r for r in held["prospect"] if r["variable"] == row["variable"]]
        assert len(rows_of_it) == row["n_selected_rows"] + 1
        assert rows_of_it[0]["low"] == pytest.approx(row["alpha"], rel=1e-12)
        assert 0.3 < row["alpha"] < 1
        assert scored_.doubt.undefined_because is None or row["difference"] == "interval"
    table = item_table(score)
    assert table.groupby("rank")["item"].nunique().eq(1).all()
    n_selected = int(table["rank"].le(40).sum())
    assert n_selected == sum(row["n_selected_rows"] for row in held["variables"])


@pytest.mark.parametrize("seed", range(6))
@pytest.mark.parametrize("shares", [(0.25, 0.25, 0.25, 0.25), (0.6, 0.2, 0.1, 0.1)])
def test_of_pure_noise_nothing_is_claimed(tmp_path, shares, seed):
    """Alpha lies near 0 and no pair of labels, coder or items is said to carry the weight."""
    rng = np.random.default_rng([seed, 99])
    labels = rng.choice(list("pqrs"), p=shares, size=(300, 4))
    table = {f"i{u}": list(zip("abcd", map(str, row), strict=True)) for u, row in enumerate(labels)}
    held = scored(make(tmp_path, long_csv(table))).variables[0]
    assert abs(held.agreement.alpha) < 0.06
    assert verdict(held) is None
