"""The map of each package names every module in it, and no other."""

import re
import tomllib
from pathlib import Path

import pytest

PACKAGE = Path(__file__).parents[2] / "src" / "relook"


PROJECT = sorted(
    folder.relative_to(PACKAGE).as_posix()
    for folder in (PACKAGE / "project").iterdir()
    if (folder / "__init__.py").is_file()
)


@pytest.mark.parametrize(
    "name", ["core", "cells", "tables", "worksheet", "frames", "engines", *PROJECT]
)
def test_each_package_says_what_its_modules_are(name):
    """A newcomer finds every file of a package in its docstring."""
    folder = PACKAGE / name
    text = (folder / "__init__.py").read_text(encoding="utf-8")
    groups = re.split(r"^(?=\S[^:\n]*: )", text.partition("\n\n")[2], flags=re.MULTILINE)
    listed = [line.partition(": ")[2] for line in groups if ": " in line]
    named = {module for part in listed for module in re.findall(r"[a-z_]+", part)}
    modules = {file.stem for file in folder.glob("*.py")} - {"__init__"}
    assert modules <= named, modules - named


def test_the_project_names_its_packages_in_the_order_of_their_imports():
    """The list in the package's docstring is the one that the layer check enforces."""
    text = (PACKAGE / "project" / "__init__.py").read_text(encoding="utf-8")
    named = re.findall(r"^(\w+): ", text, flags=re.MULTILINE)
    settings = tomllib.loads((PACKAGE.parents[1] / "pyproject.toml").read_text(encoding="utf-8"))
    layers = [
        layer.removeprefix("relook.project.")
        for contract in settings["tool"]["importlinter"]["contracts"]
        for layer in contract.get("layers", [])
        if layer.startswith("relook.project.")
    ]
    assert named == layers[::-1]
    assert sorted(named) == [name.removeprefix("project/") for name in PROJECT]


def test_the_layers_stand_at_the_top_of_the_package():
    """The package opens with the direction of its imports."""
    text = (PACKAGE / "__init__.py").read_text(encoding="utf-8")
    assert "cli → (frames, engines) → project → (tables, worksheet) → cells → core → errors" in text
