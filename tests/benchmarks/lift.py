"""Is a queue any good? How many of the wrong consensus labels its head holds, on simulated coders.

Run with `python tests/benchmarks/lift.py` (`--replications N`, `--items N`). Every world draws its
number of values, shares of values, labels per item, coders' skill and items' difficulty; the true
label is known, so a consensus label is wrong or not. A tie for first place counts as the share of
the tied labels that are wrong, as if one of them were drawn. The table shows, for each order, the
mean share of wrong consensus labels in the first 5, 10, 20 and 30 % of the items that have two
labels or more, with its standard error over worlds.

Orders that rank disputed items only are followed by the unanimous items in random order. `random`
shuffles all items; `unbeatable` knows which labels are wrong.
"""

from __future__ import annotations

import argparse
import sys
from dataclasses import dataclass
from typing import Any

import numpy as np
import numpy.typing as npt

from relook.core.agreement import Agreement, measure_agreement
from relook.core.consensus import Consensus, plurality
from relook.core.differences import DIFFERENCE_FUNCTIONS, Values
from relook.core.doubt import Doubt, estimate_doubt
from relook.core.labels import CodedLabels
from relook.core.ranking import RankBy, RankedVariable, rank_items

Floats = npt.NDArray[np.float64]
Integers = npt.NDArray[np.integer[Any]]

SEED = 20260
HEADS = (0.05, 0.10, 0.20, 0.30)


@dataclass(frozen=True)
class Setting:
    """One kind of label set.

    Attributes
    ----------
    name : str
    labels_per_item : tuple of int
        Least and most; drawn evenly per item.
    n_values : tuple of int
        Least and most; drawn evenly per world.
    n_coders : int
    """

    name: str
    labels_per_item: tuple[int, int]
    n_values: tuple[int, int]
    n_coders: int


SETTINGS = (
    Setting("2 coders, 2 labels each item, 2-10 values", (2, 2), (2, 10), 2),
    Setting("3 labels each item, 2-10 values, 12 coders", (3, 3), (2, 10), 12),
    Setting("5 labels each item, 2-10 values, 40 coders", (5, 5), (2, 10), 40),
    Setting("2-10 labels an item, 2-10 values, 40 coders", (2, 10), (2, 10), 40),
)


@dataclass(frozen=True)
class World:
    """Labels and the truth behind them."""

    labels: CodedLabels
    truth: Integers


def simulate(setting: Setting, n_items: int, rng: np.random.Generator) -> World:
    """Draw a world.

    Shares of values are a Dirichlet draw (weight 1, so skewed). A coder has a skill around 1.2
    (spread .8) and own leanings among wrong labels; an item has a difficulty around 0 (spread 1)
    and one wrong label that attracts errors. The chance of a right label is 1/k + (1 − 1/k) times
    the logistic function of skill − difficulty.
    """
    k = int(rng.integers(setting.n_values[0], setting.n_values[1] + 1))
    shares = rng.dirichlet(np.ones(k))
    truth = rng.choice(k, n_items, p=shares)
    per_item = rng.integers(setting.labels_per_item[0], setting.labels_per_item[1] + 1, n_items)
    item = np.repeat(np.arange(n_items), per_item)
    # The coders of an item: the first m of a random order of everyone.
    ranked = np.argsort(rng.random((n_items, setting.n_coders)), axis=1)
    place = np.arange(item.size) - np.repeat(np.cumsum(per_item) - per_item, per_item)
    coder = ranked[item, place]

    skill = rng.normal(1.2, 0.8, setting.n_coders)
    difficulty = rng.normal(0.0, 1.0, n_items)
    logistic = 1 / (1 + np.exp(-(skill[coder] - difficulty[item])))
    right = rng.random(item.size) < 1 / k + (1 - 1 / k) * logistic
    lure = (truth + rng.integers(1, k, n_items)) % k
    leaning = rng.dirichlet(np.ones(k), setting.n_coders).cumsum(axis=1)
    own = (rng.random(item.size)[:, None] > leaning[coder]).sum(axis=1).clip(0, k - 1)
    other = (truth[item] + rng.integers(1, k, item.size)) % k
    own = np.where(own == truth[item], other, own)
    wrong = np.where(rng.random(item.size) < 0.5, lure[item], own)
    value = np.where(right, truth[item], wrong)
    labels = CodedLabels.from_codes(
        item, value, coder, n_items=n_items, n_values=k, n_coders=setting.n_coders
    )
    return World(labels, truth)


def wrongness(agreement: Agreement, consensus: Consensus, truth: Integers) -> Floats:
    """Return 1 for a wrong consensus label, 0 for a right one, a share for a tie; by item."""
    profile = agreement.profile_of_item
    wrong = (consensus.value_index[profile] != truth).astype(np.float64)
    for item in np.flatnonzero(consensus.tie[profile]).tolist():
        tied = consensus.tied_values(int(profile[item]))
        wrong[item] = float(np.mean(tied != truth[item]))
    return wrong


def orders_of(
    agreement: Agreement, doubt: Doubt, wrong: Floats, rng: np.random.Generator
) -> dict[str, Integers]:
    """Return every order of all items that is compared."""
    n_items = wrong.size
    item_hash = rng.permutation(n_items)
    plain = RankedVariable(name="v", agreement=agreement)
    doubting = RankedVariable(
        name="v", agreement=agreement, doubt=doubt.for_ranking, doubt_within_tie=doubt.doubt
    )
    cases: list[tuple[str, RankBy, RankedVariable]] = [
        ("contribution", "contribution", plain),
        ("contribution, ties by doubt", "contribution", doubting),
        ("intensity", "intensity", plain),
        ("doubt", "doubt", doubting),
    ]
    orders: dict[str, Integers] = {"random": rng.permutation(n_items)}
    for name, rank_by, variable in cases:
        if variable.doubt is None and variable is doubting:
            continue
        head = rank_items([variable], item_hash, rank_by=rank_by).item_index
        rest = np.ones(n_items, dtype=bool)
        rest[head] = False
        orders[name] = np.concatenate([head, rng.permutation(np.flatnonzero(rest))])
    orders["unbeatable"] = np.argsort(-wrong, kind="stable")
    return orders


def found_in_heads(wrong: Floats, order: Integers) -> list[float]:
    """Return the share of all wrong consensus labels that each head of the order holds."""
    upto = np.cumsum(wrong[order])
    return [float(upto[round(head * wrong.size) - 1] / upto[-1]) for head in HEADS]


def measure(setting: Setting, n_items: int, replications: int) -> tuple[dict[str, Floats], float]:
    """Return, by order, the shares found (replications, heads), and the mean share wrong."""
    found: dict[str, list[list[float]]] = {}
    shares = []
    for replication in range(replications):
        rng = np.random.default_rng([SEED, SETTINGS.index(setting), replication])
        world = simulate(setting, n_items, rng)
        agreement = measure_agreement(world.labels, DIFFERENCE_FUNCTIONS["nominal"])
        consensus = plurality(agreement.profiles, Values(world.labels.n_values))
        doubt = estimate_doubt(agreement, consensus)
        wrong = wrongness(agreement, consensus, world.truth)
        shares.append(float(wrong.mean()))
        for name, order in orders_of(agreement, doubt, wrong, rng).items():
            found.setdefault(name, []).append(found_in_heads(wrong, order))
    return {name: np.array(rows) for name, rows in found.items()}, float(np.mean(shares))


def table(n_items: int, replications: int) -> str:
    """Return the whole table as text."""
    lines = [
        f"{replications} worlds of {n_items:,} items a setting, seed {SEED}",
        "% of wrong consensus labels found in the first … of the items (standard error)",
        "",
    ]
    for setting in SETTINGS:
        found, wrong = measure(setting, n_items, replications)
        lines.append(f"{setting.name}; {wrong:.1%} of consensus labels wrong")
        lines.append(f"  {'order':<28}" + "".join(f"{head:>14.0%}" for head in HEADS))
        for name, rows in found.items():
            mean = 100 * rows.mean(axis=0)
            error = 100 * rows.std(axis=0, ddof=1) / np.sqrt(len(rows))
            cells = "".join(f"{m:>8.1f} ({e:3.1f})" for m, e in zip(mean, error, strict=True))
            lines.append(f"  {name:<28}{cells}")
        lines.append("")
    return "\n".join(lines)


def main() -> None:
    """Print the table."""
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("--replications", type=int, default=40)
    parser.add_argument("--items", type=int, default=2000)
    given = parser.parse_args()
    sys.stdout.write(table(given.items, given.replications) + "\n")


if __name__ == "__main__":
    main()
