"""Collect in child processes and kill each at a random moment.

Run as: killing.py TEMPLATE WORK KILLS.
"""

from __future__ import annotations

import os
import random
import shutil
import signal
import sys
import time
from pathlib import Path

from reference.small_project import NOW
from relook.project.returning.collecting import collect
from relook.project.setup.folder import Project


def main(template: Path, work: Path, kills: int) -> None:
    """Leave `kills` copies of the template behind, a collect killed in each.

    How long a whole collect lasts is measured here, in a child like those that are killed. The
    first child is killed at once and the last one never, so that both ends are always there.
    """
    draw = random.Random(20260301)
    lasts = 0.0
    for number in range(-1, kills):
        root = work / ("measured" if number < 0 else str(number))
        shutil.copytree(template, root)
        project = Project.open(root)
        begun = time.perf_counter()
        child = os.fork()
        if child == 0:
            collect(project, None, now=NOW)
            os._exit(0)
        if 0 < number < kills - 1:
            time.sleep(draw.uniform(0.0, 1.3 * lasts))
        if 0 <= number < kills - 1:
            os.kill(child, signal.SIGKILL)
        os.waitpid(child, 0)
        if number < 0:
            lasts = time.perf_counter() - begun


if __name__ == "__main__":
    main(Path(sys.argv[1]), Path(sys.argv[2]), int(sys.argv[3]))
