"""Time reading and checking a million labels against plain reading of the same file.

Run: ``python tests/benchmarks/reading.py [LABELS]``. Prints seconds and their ratio, the best of
five runs each, in one process. The ratio is to stay at 2.5 or below.
"""

from __future__ import annotations

import sys
import tempfile
import time
from collections.abc import Callable
from pathlib import Path

import numpy as np
import pandas as pd

from relook.tables.checking import check_tables
from relook.tables.labels import read_labels
from relook.tables.schema import LabelSource, Variable

LIMIT = 2.5
RUNS = 5


def write_labels(path: Path, n_labels: int) -> None:
    """Write a long table: five labels on each item, by coders who never meet an item twice."""
    rng = np.random.default_rng(7)
    item = np.repeat(np.arange(n_labels // 5), 5)
    coder = (rng.integers(0, 100, n_labels // 5)[:, None] + 100 * np.arange(5)).ravel()
    words = np.array(["agree", "disagree", "neutral", "unclear", "off topic"])
    order = rng.permutation(item.size)
    frame = pd.DataFrame(
        {
            "item_id": [f"item-{one:06d}" for one in item[order]],
            "coder": [f"c{one:03d}" for one in coder[order]],
            "stance": words[rng.integers(0, 5, item.size)],
        }
    )
    frame.to_csv(path, index=False)


def best(work: Callable[[], object]) -> float:
    """Return the least seconds of several runs."""
    seconds = []
    for _ in range(RUNS):
        begin = time.perf_counter()
        work()
        seconds.append(time.perf_counter() - begin)
    return min(seconds)


def main() -> int:
    """Measure, print, and return 1 where the limit is passed."""
    n_labels = int(sys.argv[1]) if len(sys.argv) > 1 else 1_000_000
    with tempfile.TemporaryDirectory() as folder:
        path = Path(folder) / "labels.csv"
        write_labels(path, n_labels)
        source = LabelSource(files=(path,), item="item_id", coder="coder")
        variable = Variable(
            name="stance", labels=("agree", "disagree", "neutral", "unclear", "off topic")
        )
        plain = best(lambda: pd.read_csv(path, dtype=str))
        ours = best(lambda: read_labels(source, [variable], Path(folder)))
        checked = best(lambda: check_tables(source, [variable], None, Path(folder)))
    sys.stdout.write(
        f"{n_labels:,} labels: plain pandas {plain:.3f} s; read_labels {ours:.3f} s, "
        f"{ours / plain:.2f} times that; check_tables {checked:.3f} s, {checked / plain:.2f} times "
        f"(limit {LIMIT})\n"
    )
    return int(max(ours, checked) > LIMIT * plain)


if __name__ == "__main__":
    raise SystemExit(main())
