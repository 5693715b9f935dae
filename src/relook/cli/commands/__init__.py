"""The commands, by the panel of `relook --help` that they stand in."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

from relook.cli.commands.check import check
from relook.cli.commands.collect import collect
from relook.cli.commands.new import new
from relook.cli.commands.queue import queue
from relook.cli.commands.recode import recode
from relook.cli.commands.release import release
from relook.cli.commands.rescore import rescore
from relook.cli.commands.score import score
from relook.cli.commands.status import status
from relook.cli.commands.why import why

#: Panel → (name, function, example) in the order of the job.
COMMANDS: dict[str, list[tuple[str, Callable[..., Any], str]]] = {
    "Look": [
        ("new", new, "relook new labels.csv items.csv --into my_project"),
        ("check", check, "relook check my_project --problems problems.csv"),
        ("score", score, "relook score my_project"),
        ("why", why, "relook why my_project r017"),
    ],
    "Round": [
        ("queue", queue, "relook queue my_project --top 40"),
        ("collect", collect, "relook collect my_project"),
        ("status", status, "relook status my_project"),
    ],
    "Conclude": [
        ("rescore", rescore, "relook rescore my_project"),
        ("recode", recode, "relook recode my_project --items 80 --overlap 2"),
        ("release", release, "relook release my_project"),
    ],
}
