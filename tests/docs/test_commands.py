"""Each command explains itself and stands in the README; help is quick."""

import subprocess
import sys
from pathlib import Path

import pytest

from relook.cli.app import run
from relook.cli.commands import COMMANDS

ROOT = Path(__file__).parents[2]
EVERY = [entry for entries in COMMANDS.values() for entry in entries]


@pytest.mark.parametrize("name", [name for name, _, _ in EVERY])
def test_each_command_has_help_that_ends_in_an_example(name, capsys):
    """`relook NAME --help` says what it does and shows one call."""
    assert run([name, "--help"]) == 0
    said = " ".join(capsys.readouterr().out.split())
    assert f"Usage: relook {name}" in said
    assert f"Example: relook {name}" in said


@pytest.mark.parametrize("name", [name for name, _, _ in EVERY])
def test_each_command_stands_in_the_readme(name):
    """A command that the README does not tell of does not exist for a newcomer."""
    assert f"relook {name}" in (ROOT / "README.md").read_text(encoding="utf-8")


@pytest.mark.parametrize("arguments", [["--help"], ["--version"], ["queue", "--help"]])
def test_help_loads_nothing_heavy(arguments):
    """Neither pandas nor openpyxl nor numpy is needed to explain a command."""
    script = (
        "import sys; from relook.cli.app import run; run(sys.argv[1:]); "
        "heavy = {'pandas', 'openpyxl', 'numpy'} & set(sys.modules); "
        "sys.exit(f'imported {sorted(heavy)}' if heavy else 0)"
    )
    done = subprocess.run(
        [sys.executable, "-c", script, *arguments], capture_output=True, text=True, check=False
    )
    assert done.returncode == 0, done.stderr


def test_a_wrong_command_line_is_answered_in_the_usual_form(capsys):
    """Usage errors read what, and on a line of its own the mend; exit code 2."""
    assert run(["scor"]) == 2
    said = capsys.readouterr().err
    assert said.startswith("error: ")
    assert "mend: see `relook" in said
