"""Ctrl-C at any moment: one line, exit code 130, nothing half written, and the next run works."""

from __future__ import annotations

import os
import signal
import subprocess
import sys
import time
from pathlib import Path

import pytest

from relook.project.archive.rounds import read_rounds
from relook.project.setup.folder import Project

TRIES = 4


def write_labels(path: Path) -> None:
    """Write some labels, enough for the work to last."""
    rows = ["item,coder,label"]
    rows += [
        f"i{at // 4},c{at % 4},{('yes', 'no', 'unsure')[at * at % 7 % 3]}" for at in range(60_000)
    ]
    path.write_text("\n".join(rows) + "\n", encoding="utf-8")


def begin(folder: Path) -> subprocess.Popen[str]:
    return subprocess.Popen(
        [sys.executable, "-m", "relook", "queue", "labels.csv", "--top", "200"],
        cwd=folder,
        stdout=subprocess.PIPE,
        stderr=subprocess.PIPE,
        text=True,
        preexec_fn=_takes_interrupts,
    )


def _takes_interrupts() -> None:
    """A shell has what it starts in the background ignore SIGINT, and that is handed down."""
    signal.signal(signal.SIGINT, signal.SIG_DFL)


@pytest.mark.skipif(os.name == "nt", reason="Windows has no SIGINT for one process")
def test_interrupted_at_any_moment(tmp_path: Path) -> None:
    """Interrupted at several moments of a queue, from the first line it says to its end.

    The moments are counted from that line, after which there is the whole queue to plan and write:
    Python itself takes a while to begin, which is not ours to answer for.
    """
    codes = []
    for number in range(TRIES):
        folder = tmp_path / str(number)
        folder.mkdir()
        write_labels(folder / "labels.csv")
        child = begin(folder)
        assert child.stderr is not None
        assert child.stderr.readline()
        time.sleep(0.2 * number**2)
        child.send_signal(signal.SIGINT)
        _, said = child.communicate(timeout=120)
        codes.append(child.returncode)
        assert child.returncode in (0, 130), said
        assert "Traceback" not in said
        if child.returncode == 130:
            assert said.strip().splitlines()[-1:] in (
                ["interrupted; no file was left half written"],
                [],
            )
        assert not list(folder.rglob("*.part"))
        made = folder / "labels-relook"
        if (made / "relook.toml").exists():
            assert len(read_rounds(Project.open(made))) in (0, 1)
        again = subprocess.run(
            [sys.executable, "-m", "relook", "queue", "labels.csv", "--top", "200", "--next"],
            cwd=folder,
            capture_output=True,
            text=True,
            check=False,
        )
        assert again.returncode == 0, again.stderr
    assert codes[0] == 130
