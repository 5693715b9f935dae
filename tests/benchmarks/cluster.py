"""Labels on workers with less memory than the data, one of them killed half-way.

    python tests/benchmarks/cluster.py --labels 100000000

Makes seeded labels as Parquet parts, sums them up with dask on workers of this machine whose memory
together is less than the labels take as columns of text, kills one worker when half of the parts are
done, and compares alpha with a plain pass of numpy over the same seeds.
"""

from __future__ import annotations

import argparse
import os
import resource
import shutil
import signal
import sys
import tempfile
import threading
import time
from pathlib import Path

import numpy as np
import pyarrow as pa
import pyarrow.parquet as pq
from distributed import Client, LocalCluster

from relook.engines.cluster import Cluster
from relook.engines.running import score_in_parts
from relook.project.setup.folder import Project
from relook.project.setup.settings import QueueSettings

LABELS = np.array(["red", "green", "blue", "amber", "grey"])
PER_ITEM, N_CODERS = 5, 200


def part_of(number: int, n_items: int) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """Return item, coder and label codes of one part; every item has five labels."""
    rng = np.random.default_rng([7, number])
    true = rng.integers(0, LABELS.size, n_items)
    noise = rng.random(n_items) ** 2 * 0.6
    other = rng.random((n_items, PER_ITEM)) < noise[:, None]
    value = np.where(other, rng.integers(0, LABELS.size, (n_items, PER_ITEM)), true[:, None])
    coder = (rng.integers(0, N_CODERS, n_items)[:, None] + np.arange(PER_ITEM)) % N_CODERS
    return np.arange(n_items) + number * n_items, coder, value


def write_part(folder: Path, number: int, n_items: int) -> int:
    """Write one part and return how many bytes its columns take as text."""
    item, coder, value = part_of(number, n_items)
    ids = pa.array([f"item-{at:010d}" for at in item.tolist()])
    names = pa.array([f"coder-{at:03d}" for at in range(N_CODERS)])
    table = pa.table(
        {
            "item": ids.take(pa.array(np.repeat(np.arange(n_items), PER_ITEM))),
            "coder": names.take(pa.array(coder.ravel())),
            "label": pa.array(LABELS).take(pa.array(value.ravel())),
        }
    )
    pq.write_table(table, folder / f"part-{number:04d}.parquet")
    return table.nbytes


def alpha_by_numpy(n_parts: int, n_items: int) -> float:
    """Nominal alpha, one pass over the same seeds: 1 − D_o/D_e from pairs that differ."""
    apart, counts = 0, np.zeros(LABELS.size, dtype=np.int64)
    for number in range(n_parts):
        value = part_of(number, n_items)[2]
        each = np.stack([(value == label).sum(axis=1) for label in range(LABELS.size)])
        apart += int((PER_ITEM**2 - (each.astype(np.int64) ** 2).sum(axis=0)).sum())
        counts += each.sum(axis=1)
    n = int(counts.sum())
    observed = apart / (PER_ITEM - 1) / n
    expected = (n**2 - int((counts.astype(object) ** 2).sum())) / (n * (n - 1))
    return float(1 - observed / expected)


def kill_half_way(client: Client, n_parts: int, told: list[str]) -> None:
    """Kill one worker process once half of the parts are in some worker's memory."""
    while True:
        done = sum(len(keys) for keys in client.has_what().values())
        if done >= n_parts // 2:
            break
        time.sleep(0.2)
    workers = client.run(os.getpid)
    address, pid = sorted(workers.items())[0]
    os.kill(pid, signal.SIGKILL)
    told.append(f"killed the worker at {address} when {done} of {n_parts} parts were done")


def main() -> None:
    """Make the data, run, and say what was seen."""
    asked = argparse.ArgumentParser()
    asked.add_argument("--labels", type=int, default=100_000_000)
    asked.add_argument("--parts", type=int, default=100)
    asked.add_argument("--workers", type=int, default=2)
    asked.add_argument("--memory", default="1.2GB", help="of each worker")
    given = asked.parse_args()
    n_items = given.labels // PER_ITEM // given.parts
    folder = Path(tempfile.mkdtemp(prefix="labels-"))
    try:
        size = sum(write_part(folder, number, n_items) for number in range(given.parts))
        (folder / "relook.toml").write_text(
            'format = 1\nproject = "cluster"\n[labels]\nfiles = ["part-*.parquet"]\n'
            'item = "item"\ncoder = "coder"\n[variables.label]\ncolumn = "label"\n',
            encoding="utf-8",
        )
        sys.stdout.write(
            f"{given.labels:,} labels in {given.parts} parts, {size / 1e9:.2f} GB as text" + "\n"
        )
        with (
            LocalCluster(
                n_workers=given.workers,
                threads_per_worker=1,
                memory_limit=given.memory,
                dashboard_address=None,
                silence_logs=50,
            ) as local,
            Client(local) as client,
        ):
            info = client.scheduler_info(n_workers=-1)["workers"].values()
            total = sum(worker["memory_limit"] for worker in info)
            sys.stdout.write(f"{given.workers} workers with {total / 1e9:.2f} GB together" + "\n")
            told: list[str] = []
            killer = threading.Thread(
                target=kill_half_way, args=(client, given.parts, told), daemon=True
            )
            killer.start()
            begun = time.perf_counter()
            found = score_in_parts(
                Project.open(folder), QueueSettings(), Cluster(client, by_item=True), seed=1
            )
            seconds = time.perf_counter() - begun
        for line in told:
            sys.stdout.write(line + "\n")
        alpha = found.variables[0].agreement.alpha
        wanted = alpha_by_numpy(given.parts, n_items)
        sys.stdout.write(
            f"alpha {alpha!r}, by numpy {wanted!r}, difference {abs(alpha - wanted):.1e}" + "\n"
        )
        here = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1e6
        workers = resource.getrusage(resource.RUSAGE_CHILDREN).ru_maxrss / 1e6
        sys.stdout.write(
            f"{seconds:.0f} s; at most {here:.2f} GB here, {workers:.2f} GB in any one worker\n"
        )
    finally:
        shutil.rmtree(folder)


if __name__ == "__main__":
    main()
