"""Doubt: Dawid and Skene's published example, the ground it needs, and ties."""

from __future__ import annotations

import numpy as np
import pytest

from reference import published
from relook.core.agreement import measure_agreement
from relook.core.consensus import consensus_of
from relook.core.differences import DIFFERENCE_FUNCTIONS, Jaccard, Values
from relook.core.doubt import (
    NO_CODERS,
    NO_THIRD_LABEL,
    NOT_DISCRETE,
    TOO_FEW_CODERS,
    TOO_LARGE,
    Doubt,
    estimate_doubt,
    fit_coders,
    no_ground,
)
from relook.core.labels import CodedLabels
from relook.errors import RelookError


def dawid_and_skene() -> CodedLabels:
    """45 patients; observer 1 labelled each of them three times, observers 2 to 5 once."""
    table = np.array(published.example("DS1979")["data"])
    return CodedLabels.from_codes(
        np.repeat(np.arange(45), 7), table.ravel() - 1, np.tile([0, 0, 0, 1, 2, 3, 4], 45)
    )


def crowd(seed: int, n_items: int, m: int, k: int, n_coders: int) -> CodedLabels:
    """Coders who are right more often than not, m different ones on each item."""
    rng = np.random.default_rng(seed)
    truth = rng.integers(0, k, n_items)
    skill = rng.uniform(0.4, 0.95, n_coders)
    coder = np.concatenate([rng.choice(n_coders, m, replace=False) for _ in range(n_items)])
    item = np.repeat(np.arange(n_items), m)
    right = rng.random(item.size) < skill[coder]
    value = np.where(right, truth[item], rng.integers(0, k, item.size))
    return CodedLabels.from_codes(item, value, coder, n_values=k, n_coders=n_coders)


def doubt_of(labels: CodedLabels, level: str = "nominal", shrink: float = 3.0) -> Doubt:
    function = DIFFERENCE_FUNCTIONS[level]
    agreement = measure_agreement(labels, function, Values.from_numbers(range(labels.n_values)))
    consensus = consensus_of(agreement.profiles, function, agreement.values)
    return estimate_doubt(agreement, consensus, shrink=shrink)


def test_the_published_shares_and_rows_come_out_without_shrinking() -> None:
    """Dawid & Skene (1979), shares and observer 1's rows as printed (recalled, two decimals)."""
    model = fit_coders(dawid_and_skene(), shrink=0.0)
    printed = published.example("DS1979")["published"]
    assert model.converged
    assert model.class_shares == pytest.approx(
        [float(share) for share in printed["class_marginals"]], abs=0.005
    )
    rows = [[float(p) for p in row] for row in printed["observer1 P(l|j) rows j=1..3"]]
    # .8764 and .053 were printed .88 and .05: two decimals, so half a hundredth.
    assert model.coder_tables[0][:3] == pytest.approx(np.array(rows), abs=0.005)


def test_every_observers_table_equals_an_independent_fit() -> None:
    """All five tables, computed apart from this code from the same start, to their four digits."""
    exact = published.example("DS1979")["exact"]
    model = fit_coders(dawid_and_skene(), shrink=0.0, tolerance=1e-10)
    for observer, rows in exact["error_rates_P(l|j)"].items():
        got = model.coder_tables[int(observer) - 1]
        assert got == pytest.approx(np.array(list(rows.values())), abs=6e-5)
    best = exact["most_probable_class"]
    assert (model.posteriors.argmax(axis=0) + 1).tolist() == [best[str(i + 1)] for i in range(45)]


def plain_fit(labels: CodedLabels, shrink: float, steps: int) -> np.ndarray:
    """The equations one by one, in loops over labels; T of shape (n_values, n_items)."""
    k, n_items = labels.n_values, labels.n_items
    assert labels.coder_index is not None
    each = list(
        zip(
            labels.item_index.tolist(),
            labels.coder_index.tolist(),
            labels.value_index.tolist(),
            strict=True,
        )
    )
    t = np.zeros((k, n_items))
    for i, _, v in each:
        t[v, i] += 1
    t /= t.sum(axis=0)
    for _ in range(steps):
        counts = np.zeros((labels.n_coders, k, k))
        for i, c, v in each:
            counts[c, :, v] += t[:, i]
        pooled = counts.sum(axis=0) / counts.sum(axis=(0, 2))[:, None]
        tables = (counts + shrink * pooled) / (counts.sum(axis=2, keepdims=True) + shrink)
        new = np.tile(t.mean(axis=1)[:, None], n_items)
        for i, c, v in each:
            new[:, i] *= tables[c, :, v]
        t = new / new.sum(axis=0)
    return t


@pytest.mark.parametrize("shrink", [1.0, 3.0, 10.0])
def test_the_fit_equals_the_equations_in_loops(shrink: float) -> None:
    """After as many steps, every posterior to 1e-10 (seed 1)."""
    labels = crowd(1, 60, 4, 3, 7)
    model = fit_coders(labels, shrink=shrink, most_steps=9, tolerance=0.0)
    assert (model.steps, model.converged) == (9, False)
    assert model.posteriors == pytest.approx(plain_fit(labels, shrink, 9), abs=1e-10)


def test_a_fit_stops_when_no_probability_moves_and_says_so() -> None:
    """The last move is below the tolerance, the one before is not."""
    moves: list[float] = []
    model = fit_coders(crowd(2, 80, 4, 3, 9), progress=lambda step, moved: moves.append(moved))
    assert model.converged
    assert model.steps == len(moves)
    assert moves[-1] < 1e-6 <= moves[-2]


def test_shrinking_keeps_a_coder_with_few_labels_from_certainty() -> None:
    """A coder of two labels has a row of certainty without it; with 3 labels more none has .95."""
    rng = np.random.default_rng(4)
    item = np.repeat(np.arange(40), 3)
    value = np.where(rng.random(120) < 0.8, item % 3, rng.integers(0, 3, 120))
    labels = CodedLabels.from_codes(
        np.append(item, [0, 1]), np.append(value, [0, 2]), np.append(np.tile([0, 1, 2], 40), [3, 3])
    )
    assert fit_coders(labels, shrink=0.0).coder_tables[3].max() > 0.9999
    assert fit_coders(labels, shrink=3.0).coder_tables[3].max() < 0.95


def test_unused_values_items_and_coders_change_nothing() -> None:
    """Declared labels that nobody gave, items and coders without labels."""
    plain = crowd(5, 50, 4, 3, 6)
    padded = CodedLabels(
        plain.item_index + 2,
        plain.value_index * 2,
        plain.coder_index,
        n_items=55,
        n_values=9,
        n_coders=8,
    )
    one, other = doubt_of(plain), doubt_of(padded)
    assert one.doubt is not None
    assert other.doubt is not None
    assert other.doubt[2:52] == pytest.approx(one.doubt, abs=1e-12)
    assert bool(np.isnan(other.doubt[[0, 1, 52, 53, 54]]).all())


def test_doubt_is_the_chance_that_the_consensus_is_wrong() -> None:
    """1 − T(plurality) over the fitted posteriors, and calibrated: its mean is near the error rate."""
    labels = crowd(6, 3000, 5, 4, 25)
    got = doubt_of(labels)
    assert got.doubt is not None
    assert got.tie is not None
    assert got.model is not None
    best = np.zeros((4, 3000))
    np.add.at(best, (labels.value_index, labels.item_index), 1)
    clear = ~got.tie
    posterior = got.model.posteriors[best.argmax(axis=0), np.arange(3000)]
    assert got.doubt[clear] == pytest.approx(1 - posterior[clear], abs=1e-12)
    truth = np.random.default_rng(6).integers(0, 4, 3000)
    wrong = best.argmax(axis=0)[clear] != truth[clear]
    assert got.doubt[clear].mean() == pytest.approx(wrong.mean(), abs=0.02)


def test_a_tie_ranks_as_a_half_at_least() -> None:
    """Its doubt is 1 less the largest T among the tied; for ranking ½ where that is less."""
    got = doubt_of(crowd(7, 400, 4, 3, 12))
    assert got.doubt is not None
    assert got.for_ranking is not None
    assert got.tie is not None
    assert bool(got.tie.any())
    assert bool((got.doubt[got.tie] < 0.5).any())
    assert bool((got.for_ranking[got.tie] >= 0.5).all())
    assert got.for_ranking[~got.tie].tolist() == got.doubt[~got.tie].tolist()


def test_ordinal_doubt_is_of_the_median() -> None:
    """Labels 0 0 1 2 2: the plurality is tied, the median is 1 and has its own doubt."""
    item = np.repeat(np.arange(30), 5)
    value = np.tile([0, 0, 1, 2, 2], 30)
    labels = CodedLabels.from_codes(item, value, np.tile(np.arange(5), 30))
    got = doubt_of(labels, "ordinal")
    assert got.doubt is not None
    assert got.tie is not None
    assert got.model is not None
    assert not got.tie.any()
    assert got.doubt == pytest.approx(1 - got.model.posteriors[1], abs=1e-12)


@pytest.mark.parametrize(
    ("item", "coder", "because"),
    [
        ([0, 0, 1, 1], [0, 1, 0, 1], TOO_FEW_CODERS),
        ([0, 0, 0, 1, 1], [0, 1, 1, 0, 1], TOO_FEW_CODERS),  # a repeat is no third coder
        ([0, 0, 1], [0, 1, 2], TOO_FEW_CODERS),  # the third shares no item
        ([0, 0, 1, 1], [0, 1, 1, 2], NO_THIRD_LABEL),
        ([0, 0, 0, 1, 1], [0, 1, 2, 0, 1], None),
        ([0, 0, 0], None, NO_CODERS),
    ],
)
def test_doubt_needs_three_coders_on_an_item(
    item: list[int], coder: list[int] | None, because: str | None
) -> None:
    """Null with the reason otherwise: two coders give no ground to say who is better."""
    labels = CodedLabels.from_codes(
        np.array(item), np.arange(len(item)) % 2, None if coder is None else np.array(coder)
    )
    agreement = measure_agreement(labels, DIFFERENCE_FUNCTIONS["nominal"])
    assert no_ground(agreement) == because
    got = doubt_of(labels)
    assert (got.doubt is None) == (because is not None)
    assert got.undefined_because == because


def test_numbers_and_sets_have_no_doubt() -> None:
    """They are no labels from a list."""
    labels = crowd(8, 20, 4, 3, 6)
    assert doubt_of(labels, "interval").undefined_because == NOT_DISCRETE
    values = Values.from_texts(["a", "b", "a;b"])
    assert no_ground(measure_agreement(labels, Jaccard(";"), values)) == NOT_DISCRETE


def test_the_order_of_the_labels_does_not_matter() -> None:
    """Labels in another order give the same doubt to rounding."""
    labels = crowd(9, 100, 4, 3, 8)
    assert labels.coder_index is not None
    order = np.random.default_rng(9).permutation(labels.n_labels)
    again = CodedLabels.from_codes(
        labels.item_index[order], labels.value_index[order], labels.coder_index[order]
    )
    assert doubt_of(again).doubt == pytest.approx(doubt_of(labels).doubt, abs=1e-9)


def test_doubt_that_is_undefined_ranks_nothing() -> None:
    """Two coders: no doubt, so none to rank by."""
    assert doubt_of(crowd(8, 20, 2, 3, 2)).for_ranking is None


def test_counts_have_no_coders_to_fit() -> None:
    """The model is of coders."""
    with pytest.raises(RelookError, match="counts"):
        fit_coders(CodedLabels.from_codes(np.array([0, 0]), np.array([0, 1])))


def test_tables_beyond_the_limit_are_left_out(monkeypatch: pytest.MonkeyPatch) -> None:
    """So many items × values are not held in memory, and that is said."""
    monkeypatch.setattr("relook.core.doubt._LARGEST_TABLE", 100)
    assert doubt_of(crowd(8, 200, 4, 3, 6)).undefined_because == TOO_LARGE
