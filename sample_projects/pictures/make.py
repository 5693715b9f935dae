"""Make the pictures of this folder from a sample project.

    python sample_projects/pictures/make.py

Needs relook installed, LibreOffice (soffice) and pdftoppm, and a system with pseudo-terminals. The
sheet is what LibreOffice prints of a worksheet; the terminal is what `relook score` writes to one.
"""

from __future__ import annotations

import contextlib
import os
import pty
import shutil
import subprocess
import sys
import tempfile
from pathlib import Path

from rich.console import Console
from rich.terminal_theme import TerminalTheme
from rich.text import Text

HERE = Path(__file__).parent
SAMPLE = HERE.parent / "ferry_remarks"
#: Row codes and the order of rows follow from the secret, so that pictures stay the same.
SECRET = HERE.parent / "ferry_remarks_part_way" / ".relook" / "secret"
COLUMNS = 100
LINES = 39
FOREGROUND, BACKGROUND = (38, 38, 36), (250, 248, 243)
#: Bold is all the emphasis that the screens use; these colours serve nothing but rich's demand.
THEME = TerminalTheme(BACKGROUND, FOREGROUND, [FOREGROUND] * 8, [FOREGROUND] * 8)
#: No frame, no title bar and no font from elsewhere: lines of text on paper.
SVG = """\
<svg viewBox="0 0 {terminal_width} {terminal_height}" xmlns="http://www.w3.org/2000/svg"
    xml:space="preserve">
<style>
.{unique_id}-matrix {{
  white-space: pre;
  font-family: "DejaVu Sans Mono", Consolas, Menlo, monospace;
  font-size: {char_height}px;
  line-height: {line_height}px;
}}
{styles}
</style>
<defs>{lines}</defs>
<rect fill="#faf8f3" width="{terminal_width}" height="{terminal_height}"/>
<g class="{unique_id}-matrix" transform="translate(9, 0)">{matrix}</g>
</svg>
"""


def relook(*arguments: str) -> list[str]:
    """Return the command line that runs relook with this Python."""
    return [sys.executable, "-m", "relook", *arguments]


def written_to_a_terminal(command: list[str]) -> str:
    """Run a command with a pseudo-terminal for its stdout; return what it wrote."""
    theirs, ours = pty.openpty()
    environment = {**os.environ, "COLUMNS": str(COLUMNS), "TERM": "xterm-256color"}
    environment.pop("NO_COLOR", None)
    with subprocess.Popen(command, stdout=ours, stderr=subprocess.DEVNULL, env=environment):
        os.close(ours)
        received = bytearray()
        with contextlib.suppress(OSError):  # how the end of a pseudo-terminal shows on Linux
            while data := os.read(theirs, 65_536):
                received.extend(data)
    os.close(theirs)
    return received.decode("utf-8").replace("\r", "")


def picture_of_a_terminal(to: Path) -> None:
    """Draw the head of `relook score` as it stands in a terminal."""
    lines = written_to_a_terminal(relook("score", str(SAMPLE))).split("\n")[:LINES]
    console = Console(record=True, width=COLUMNS, file=open(os.devnull, "w"))  # noqa: SIM115, PTH123
    console.print(Text.from_ansi("\n".join(["$ relook score ferry_remarks", *lines])))
    svg = console.export_svg(theme=THEME, code_format=SVG, unique_id="relook")
    to.write_text("\n".join(line.rstrip() for line in svg.split("\n")), encoding="utf-8")


def picture_of_a_sheet(to: Path) -> None:
    """Draw the first page of the queue sheet of an adjudicator."""
    with tempfile.TemporaryDirectory() as scratch:
        project = Path(scratch) / "ferry_remarks"
        shutil.copytree(SAMPLE, project)
        (project / ".relook").mkdir(exist_ok=True)
        shutil.copy(SECRET, project / ".relook" / "secret")
        subprocess.run(relook("queue", str(project), "--quiet"), check=True, capture_output=True)
        sheet = sorted((project / "rounds" / "01" / "worksheets").glob("*.xlsx"))[0]
        subprocess.run(
            ["soffice", "--headless", "--convert-to", "pdf", "--outdir", scratch, str(sheet)],
            check=True,
            capture_output=True,
        )
        printed = Path(scratch) / f"{sheet.stem}.pdf"
        page = ["-f", "2", "-l", "2", "-r", "86", "-png", "-singlefile"]
        drawn = Path(scratch) / "page"
        subprocess.run(["pdftoppm", *page, str(printed), str(drawn)], check=True)
        shutil.copy(drawn.with_suffix(".png"), to)


def main() -> None:
    """Make both pictures."""
    picture_of_a_terminal(HERE / "terminal.svg")
    picture_of_a_sheet(HERE / "queue_sheet.png")


if __name__ == "__main__":
    main()
