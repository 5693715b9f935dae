"""The picture of a terminal shows what the command writes today."""

import html
import os
import re
import subprocess
import sys
from pathlib import Path

SAMPLES = Path(__file__).parents[2] / "sample_projects"


def lines_in(svg):
    """The text of a picture by line, without spaces, which the picture places by coordinates."""
    lines = {}
    for height, text in re.findall(r'<text [^>]* y="([\d.]+)"[^>]*>([^<]*)</text>', svg):
        lines.setdefault(float(height), []).append(html.unescape(text))
    found = ["".join("".join(parts).split()) for _, parts in sorted(lines.items())]
    return [line for line in found if line]


def test_the_picture_of_a_terminal_is_what_score_writes():
    """Line by line, the head of `relook score` on the sample project."""
    done = subprocess.run(
        [sys.executable, "-m", "relook", "score", str(SAMPLES / "ferry_remarks")],
        capture_output=True,
        encoding="utf-8",
        env={**os.environ, "PYTHONUTF8": "1"},
        check=True,
    )
    written = ["".join(line.split()) for line in done.stdout.split("\n") if line.strip()]
    command, *shown = lines_in((SAMPLES / "pictures" / "terminal.svg").read_text(encoding="utf-8"))
    assert command == "$relookscoreferry_remarks"
    assert len(shown) > 30
    assert shown == written[: len(shown)]
