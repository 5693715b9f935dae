"""Collect in child processes and kill each at a random moment.

Run as: killing.py TEMPLATE WORK KILLS SECONDS, where SECONDS is how long a whole collect lasts.
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
from relook.project.collecting import collect
from relook.project.folder import Project


def main(template: Path, work: Path, kills: int, seconds: float) -> None:
    """Leave `kills` copies of the template behind, a collect killed in each."""
    draw = random.Random(20260301)
    for number in range(kills):
        root = work / str(number)
        shutil.copytree(template, root)
        project = Project.open(root)
        child = os.fork()
        if child == 0:
            collect(project, None, now=NOW)
            os._exit(0)
        time.sleep(draw.uniform(0.0, 1.3 * seconds))
        os.kill(child, signal.SIGKILL)
        os.waitpid(child, 0)


if __name__ == "__main__":
    main(Path(sys.argv[1]), Path(sys.argv[2]), int(sys.argv[3]), float(sys.argv[4]))
