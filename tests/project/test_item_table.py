"""The item table: documented columns, full precision, rows of an item together."""

import csv
import io

import numpy as np
import pytest

from reference import by_definition as twin
from reference.cases import random_table
from reference.made_projects import csv_text, long_csv, make, scored
from relook.project.figures.item_table import COLUMNS, item_table
from relook.tables.results import csv_bytes


def test_figures_are_those_of_the_definitions(tmp_path):
    """Contribution, share, cost and settled alpha of every disputed item, to the last digits."""
    rng = np.random.default_rng(6)
    table = random_table(rng, 25, 4, 4)
    held = item_table(scored(make(tmp_path, long_csv(table))))
    parts = {item: p for item, p in twin.item_parts(table, twin.nominal).items() if p}
    whole = twin.alpha_by_definition(table, twin.nominal)
    assert list(held.columns) == list(COLUMNS)
    assert sorted(held["item"]) == sorted(map(str, parts))
    assert held["rank"].tolist() == list(range(1, len(parts) + 1))
    assert held["contribution"].is_monotonic_decreasing
    settled = 0
    for row in held.itertuples():
        item = int(row.item)
        assert row.contribution == pytest.approx(float(parts[item]), rel=1e-12)
        assert row.share == pytest.approx(float(parts[item] / whole.observed), rel=1e-12)
        assert row.alpha_cost == pytest.approx(float(parts[item] / whole.expected), rel=1e-12)
        labels = [value for _, value in table[item]]
        most = max(map(labels.count, labels))
        leading = sorted({str(v) for v in labels if labels.count(v) == most})
        assert (row.consensus, row.tie) == (" | ".join(leading), len(leading) > 1)
        assert row.n_labels == len(labels)
        if not row.tie:
            wanted = twin.settled_alpha_by_definition(
                table, twin.nominal, {item: int(row.consensus)}
            )
            assert row.settled_alpha == pytest.approx(float(wanted), rel=1e-12)
            settled += 1
        else:
            assert np.isnan(row.settled_alpha)
    assert 0 < settled < len(held)
    assert held["cumulative_share"].iloc[-1] == pytest.approx(1, rel=1e-12)


def test_csv_reads_back_to_the_same_numbers(tmp_path):
    """Full precision: not one digit is lost, and undefined cells are empty."""
    rng = np.random.default_rng(9)
    table = random_table(rng, 40, 3, 3)
    held = item_table(scored(make(tmp_path, long_csv(table))))
    data = csv_bytes(held)
    again = list(csv.DictReader(io.StringIO(data.decode())))
    for column in ("contribution", "share", "cumulative_share", "alpha_cost", "settled_alpha"):
        read = [float(row[column] or "nan") for row in again]
        assert np.array_equal(read, held[column], equal_nan=True), column
    assert b"nan" not in data.lower().split(b"\n", 1)[1]


def test_rows_of_an_item_stand_together(tmp_path):
    """Several variables: an item's rows are neighbours, of one rank, heaviest variable first."""
    rng = np.random.default_rng(10)
    rows = [
        (u, c, *(str(rng.choice(list("pq"))) for _ in range(3))) for u in range(30) for c in "abc"
    ]
    names = ("one", "two", "three")
    variables = "".join(f'[variables.{n}]\ncolumn = "{n}"\n' for n in names)
    project = make(tmp_path, csv_text(("item", "coder", *names), rows), variables=variables)
    held = item_table(scored(project))
    assert held["rank"].is_monotonic_increasing
    assert held.groupby("rank")["item"].nunique().eq(1).all()
    assert held.groupby("item")["rank"].nunique().eq(1).all()
    assert len(held) > held["item"].nunique()
    shares = held.groupby("variable")["cumulative_share"]
    assert shares.apply(lambda each: each.is_monotonic_increasing).all()


def test_doubt_is_empty_without_ground(tmp_path):
    """Two coders give no ground for doubt; the column is there and empty."""
    table = {u: [("a", "pq"[u % 2]), ("b", "p")] for u in range(8)}
    held = item_table(scored(make(tmp_path, long_csv(table))))
    assert len(held) == 4
    assert held["doubt"].isna().all()


def test_nothing_disputed_leaves_a_header(tmp_path):
    """No rows, but the documented columns."""
    table = {u: [("a", "pq"[u % 2]), ("b", "pq"[u % 2])] for u in range(8)}
    data = csv_bytes(item_table(scored(make(tmp_path, long_csv(table)))))
    assert data == (",".join(COLUMNS) + "\n").encode()


@pytest.mark.parametrize(
    ("variable", "labels", "consensus"),
    [
        ('difference = "interval"\n', ("1", "2"), "1.5"),
        ('difference = "interval"\n', ("1", "2", "2"), "1.66667"),
        ('difference = "circular"\nperiod = 12\n', ("11", "2"), "0.5"),
        ('difference = "jaccard"\nseparator = ";"\n', ("a;b", "b;c", "c;a"), "a;b;c"),
        ('difference = "jaccard"\nseparator = ";"\n', ("a", "b"), " | a;b"),
        ('difference = "ordinal"\nlabels = ["a", "b", "c"]\n', ("a", "c", "b"), "b"),
    ],
)
def test_consensus_that_nobody_gave_is_written(tmp_path, variable, labels, consensus):
    """Means, mean directions and sets of majority elements have a text of their own."""
    table = {
        1: list(zip("klm", labels, strict=False)),
        2: [(c, labels[0]) for c in "kl"],
        3: [(c, labels[1]) for c in "kl"],
    }
    project = make(
        tmp_path, long_csv(table), variables=f'[variables.label]\ncolumn = "label"\n{variable}'
    )
    held = item_table(scored(project))
    assert held["consensus"].tolist() == [consensus]
