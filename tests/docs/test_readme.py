"""Every command in README.md runs, in its order, and every output shown there is what it prints.

A fenced block marked `sh` holds commands, one marked `python` a program; a block marked `text` right
after it holds lines of what they print, "…" standing for lines left out. The two set-up commands run in .ci/run, which takes
them from the README too.
"""

from __future__ import annotations

import os
import re
import shlex
import shutil
import subprocess
import sys
from pathlib import Path

import pytest

ROOT = Path(__file__).parents[2]
README = ROOT / "README.md"
BLOCK = re.compile(r"^```(sh|python|text)\n(.*?)^```\n", re.MULTILINE | re.DOTALL)
SKIPPED = "…"


def blocks() -> list[tuple[str, str, int]]:
    """Return kind, body and position of each block after the set-up part."""
    text = README.read_text(encoding="utf-8")
    begin = text.index("<!-- end of set-up -->")
    return [(found[1], found[2], found.start(2)) for found in BLOCK.finditer(text, begin)]


@pytest.fixture
def workplace(tmp_path, monkeypatch) -> Path:
    shutil.copytree(
        ROOT / "sample_projects",
        tmp_path / "sample_projects",
        ignore=lambda folder, names: [
            name
            for name in names
            if Path(folder).name == "ferry_remarks" and name in ("rounds", "decisions", ".relook")
        ],
    )
    monkeypatch.chdir(tmp_path)
    return tmp_path


def run(commands: str, folder: Path, kind: str = "sh") -> str:
    """Run a block in a shell, relook and Python being these ones."""
    environment = {
        **os.environ,
        "SOURCE_DATE_EPOCH": "1924992000",
        "NO_COLOR": "1",
        "PATH": f"{Path(sys.executable).parent}{os.pathsep}{os.environ['PATH']}",
        "PYTHONUTF8": "1",
    }
    if kind == "python":
        commands = f"{shlex.quote(sys.executable)} - <<'PROGRAM'\n{commands}PROGRAM\n"
    script = f'set -e\nrelook() {{ {shlex.quote(sys.executable)} -m relook "$@"; }}\n{commands}'
    done = subprocess.run(
        ["bash", "-c", script],
        cwd=folder,
        env=environment,
        capture_output=True,
        text=True,
        encoding="utf-8",
        check=False,
    )
    assert done.returncode == 0, f"{commands}\n{done.stdout}\n{done.stderr}"
    return done.stdout


def shown_lines(body: str) -> list[str]:
    return [line.rstrip() for line in body.splitlines()]


def missing_line(shown: list[str], printed: list[str]) -> str | None:
    """Return the first shown line that does not follow the ones before it, None where all do."""
    at = 0
    for line in shown:
        if line == SKIPPED:
            continue
        try:
            at = printed.index(line, at) + 1
        except ValueError:
            return line
    return None


@pytest.mark.skipif(shutil.which("bash") is None, reason="the README's commands need a shell")
def test_every_command_of_the_readme_runs_and_prints_what_is_shown(workplace):
    """The tour can be followed from top to bottom in one folder."""
    found = blocks()
    assert sum(kind == "sh" for kind, _, _ in found) >= 5
    printed: list[str] = []
    for kind, body, _ in found:
        if kind != "text":
            printed = [line.rstrip() for line in run(body, workplace, kind).splitlines()]
        else:
            assert missing_line(shown_lines(body), printed) is None, "\n".join(printed)
