"""The command line: the only place that prints, exits and asks the clock.

Each command is a module of `commands`; what a command shows is laid out in `screens`. Modules that
need pandas or openpyxl are imported inside the commands, so that `relook --help` is quick.
"""

from __future__ import annotations

import contextlib
import os
import signal
import sys


def main() -> None:
    """Run the command that was typed; the entry point of `relook`."""
    try:
        from relook.cli.app import run

        code = run()
    except KeyboardInterrupt:  # while modules were being imported
        code = 130
    # All is written and said by now; a late Ctrl-C would only end Python in the midst of its end.
    signal.signal(signal.SIGINT, signal.SIG_IGN)
    if code == 130:
        # Python itself would end by the signal where an import was interrupted, not by the code.
        for stream in (sys.stdout, sys.stderr):
            with contextlib.suppress(OSError, ValueError):
                stream.flush()
        os._exit(code)
    sys.exit(code)
