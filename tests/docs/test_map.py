"""The map of each package names every module in it, and no other."""

import re
from pathlib import Path

import pytest

PACKAGE = Path(__file__).parents[2] / "src" / "relook"


@pytest.mark.parametrize("name", ["core", "cells", "tables", "worksheet", "project"])
def test_each_package_says_what_its_modules_are(name):
    """A newcomer finds every file of a package in its docstring."""
    folder = PACKAGE / name
    text = (folder / "__init__.py").read_text(encoding="utf-8")
    groups = re.split(r"^(?=\S[^:\n]*: )", text.partition("\n\n")[2], flags=re.MULTILINE)
    listed = [line.partition(": ")[2] for line in groups if ": " in line]
    named = {module for part in listed for module in re.findall(r"[a-z_]+", part)}
    modules = {file.stem for file in folder.glob("*.py")} - {"__init__"}
    assert modules <= named, modules - named


def test_the_layers_stand_at_the_top_of_the_package():
    """The package opens with the direction of its imports."""
    text = (PACKAGE / "__init__.py").read_text(encoding="utf-8")
    assert "cli → project → (tables, worksheet) → cells → core → errors" in text
