"""Run whole commands on label tables of growing size, beside an engine that only reads and groups.

Run: ``python tests/benchmarks/scale.py [LABELS …] [--runs N]``, or ``--small`` for a quick look.
Prints a table of labels, format, command, seconds, their ratio to the floor, and peak memory.

The floor is DuckDB (the `bench` extra) with as many threads as there are cores: it reads the same
file and counts each item's labels and how often each set of counts occurs, which is what alpha and
all contributions rest on. Every command is a process of its own and its seconds are the least of
several runs, taken in turn with the floor, since other work on the machine slows them alike.
"""

from __future__ import annotations

import argparse
import importlib.util
import os
import shutil
import subprocess
import sys
import tempfile
import time
from dataclasses import dataclass
from pathlib import Path

#: The largest table that is written as CSV too.
MOST_CSV = 10_000_000
CODERS, PER_ITEM = 200, 5
VALUES = ("agree", "disagree", "neutral", "unclear", "off topic")

FLOOR = """
import os, sys
import duckdb
path, values = sys.argv[1], sys.argv[2:]
source = "read_parquet(?)" if path.endswith(".parquet") else "read_csv(?, all_varchar = true)"
counts = ", ".join(f"count(*) FILTER (label = '{value}')::UTINYINT AS n{at}"
                   for at, value in enumerate(values))
engine = duckdb.connect(config={"threads": os.cpu_count()})
profiles = engine.execute(
    f"SELECT * EXCLUDE item, count(*) FROM (SELECT item, {counts} FROM {source} GROUP BY item) "
    "GROUP BY ALL", [path]).fetchall()
print(len(profiles), "profiles")
"""


@dataclass(frozen=True)
class Run:
    """What one process took: seconds by the clock, and the most memory it held, in bytes."""

    seconds: float
    peak: int


def make_labels(path: Path, n_labels: int) -> None:
    """Write a long table in which easy items are unanimous and hard ones disputed, in no order."""
    import numpy as np
    import pyarrow as pa
    from pyarrow import csv, parquet

    rng = np.random.default_rng(20260301)
    n_items = n_labels // PER_ITEM
    truth = rng.choice(len(VALUES), n_items, p=[0.36, 0.24, 0.2, 0.12, 0.08]).astype(np.int8)
    ease = rng.beta(4.0, 1.0, n_items).astype(np.float32)
    ids = pa.array(np.char.mod("i%08d", np.arange(n_items)))
    coders = pa.array([f"c{at:03d}" for at in range(CODERS)])
    writer: parquet.ParquetWriter | csv.CSVWriter | None = None
    order = rng.permutation(n_items * PER_ITEM).astype(np.int32)
    for begin in range(0, order.size, 1 << 20):
        place = order[begin : begin + (1 << 20)]
        item, turn = place // PER_ITEM, place % PER_ITEM
        # Every turn has coders of its own, so that nobody meets an item twice.
        coder = turn * (CODERS // PER_ITEM) + rng.integers(0, CODERS // PER_ITEM, place.size)
        slipped = rng.random(place.size, dtype=np.float32) > ease[item]
        other = rng.integers(1, len(VALUES), place.size)
        value = np.where(slipped, (truth[item] + other) % len(VALUES), truth[item])
        columns = {
            "item": ids.take(pa.array(item)),
            "coder": coders.take(pa.array(coder)),
            "label": pa.array(VALUES).take(pa.array(value)),
        }
        table = pa.table(columns)
        if writer is None and path.suffix == ".parquet":
            writer = parquet.ParquetWriter(path, table.schema)
        elif writer is None:
            plain = csv.WriteOptions(quoting_style="none", quoting_header="none")
            writer = csv.CSVWriter(path, table.schema, write_options=plain)
        writer.write_table(table)
    if writer is not None:
        writer.close()


def run(command: list[str]) -> Run:
    """Run a process to its end; its output is looked at only where it fails."""
    with tempfile.TemporaryFile() as said:
        begin = time.perf_counter()
        child = subprocess.Popen(command, stdout=said, stderr=subprocess.STDOUT)
        _, status, used = os.wait4(child.pid, 0)
        seconds = time.perf_counter() - begin
        child.returncode = os.waitstatus_to_exitcode(status)
        if child.returncode:
            said.seek(0)
            text = said.read().decode(errors="replace")
            raise SystemExit(f"{' '.join(command[:6])} failed:\n{text}")
    # Linux counts in KiB, macOS in bytes.
    return Run(seconds, used.ru_maxrss * (1 if sys.platform == "darwin" else 1024))


def commands(path: Path, folder: Path) -> dict[str, list[str]]:
    """Return what is measured on one table."""
    relook = [sys.executable, "-m", "relook"]
    return {
        "floor": [sys.executable, "-c", FLOOR, str(path), *VALUES],
        "score": [*relook, "score", str(path)],
        "queue --top 1000": [*relook, "queue", str(path), "--top", "1000"],
    }


def measure(path: Path, folder: Path, runs: int, with_floor: bool) -> dict[str, Run]:
    """Return the best of several runs of each command, all taken in turn."""
    best: dict[str, Run] = {}
    for _ in range(runs):
        for name, command in commands(path, folder).items():
            if name == "floor" and not with_floor:
                continue
            found = run(command)
            shutil.rmtree(path.with_name(f"{path.stem}-relook"), ignore_errors=True)
            held = best.get(name, found)
            best[name] = Run(min(found.seconds, held.seconds), max(found.peak, held.peak))
    return best


def tables(n_labels: int) -> list[str]:
    """Return the endings of the tables that are made of so many labels."""
    return [".csv", ".parquet"] if n_labels <= MOST_CSV else [".parquet"]


def main() -> int:
    """Make the tables, measure, print."""
    asked = argparse.ArgumentParser(description="Whole commands on tables of growing size.")
    asked.add_argument("labels", nargs="*", type=int, default=[])
    asked.add_argument("--small", action="store_true", help="10,000 and 100,000 labels, one run")
    asked.add_argument("--runs", type=int, default=3)
    asked.add_argument("--make", metavar="FILE", help="write a table of LABELS labels and stop")
    given = asked.parse_args()
    if given.make:
        make_labels(Path(given.make), given.labels[0])
        return 0
    sizes = given.labels or [10_000, 100_000, *([] if given.small else [1_000_000, 10_000_000])]
    runs = 1 if given.small else given.runs
    with_floor = importlib.util.find_spec("duckdb") is not None
    if not with_floor:
        sys.stdout.write("DuckDB is not installed (extra bench), so there is no floor\n")
    line = "{:>12}  {:8}  {:18}{:>9}  {:>9}  {:>8}\n"
    sys.stdout.write(line.format("labels", "format", "command", "seconds", "× floor", "peak"))
    with tempfile.TemporaryDirectory() as scratch:
        for n_labels in sizes:
            for ending in tables(n_labels):
                path = Path(scratch) / f"labels{ending}"
                # A child's peak begins at what its parent holds, so this process makes no table.
                run([sys.executable, __file__, str(n_labels), "--make", str(path)])
                found = measure(path, Path(scratch), runs, with_floor)
                floor = found.get("floor")
                for name, one in found.items():
                    ratio = "" if floor is None else f"{one.seconds / floor.seconds:.2f}"
                    peak = f"{one.peak / 1e9:.2f} GB"
                    sys.stdout.write(
                        line.format(
                            f"{n_labels:,}", ending[1:], name, f"{one.seconds:.2f}", ratio, peak
                        )
                    )
                    sys.stdout.flush()
                path.unlink()
    return 0


if __name__ == "__main__":
    raise SystemExit(main())
