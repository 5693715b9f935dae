"""The command line: the only place that prints, exits and asks the clock.

Each command is a module of `commands`; what a command shows is laid out in `screens`. Modules that
need pandas or openpyxl are imported inside the commands, so that `relook --help` is quick.
"""

from __future__ import annotations

import sys


def main() -> None:
    """Run the command that was typed; the entry point of `relook`."""
    from relook.cli.app import run

    sys.exit(run())
