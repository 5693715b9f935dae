"""The Python interface is small, pinned, light to import, and typed for others."""

from __future__ import annotations

import inspect
import os
import subprocess
import sys
import textwrap
from pathlib import Path

import pytest

import relook

NAMES = {
    "Measured": None,
    "Queue": None,
    "RelookError": None,
    "Rescored": None,
    "Returned": None,
    "__version__": None,
    "measure": "labels, *, item, coder, label, coders, difference, order, tolerance, items, show, "
    "group_by, rank_by, seed",
    "queue": "measured, *, adjudicators, top, share, hours, seconds_per_item, audit, overlap, title, "
    "secret, seed",
    "collect": "folder, files, *, strict, now",
    "rescore": "folder, *, seed",
}


def test_the_names_are_these_and_no_others():
    """A change here is a change for everybody who uses relook from Python."""
    assert set(relook.__all__) == set(NAMES)
    assert set(NAMES) <= set(dir(relook))


@pytest.mark.parametrize("name", [name for name, wanted in NAMES.items() if wanted])
def test_signatures_are_these(name):
    """Names and order of the parameters, and which of them are by keyword alone."""
    found, star = [], False
    for parameter in inspect.signature(getattr(relook, name)).parameters.values():
        if parameter.kind is parameter.KEYWORD_ONLY and not star:
            found.append("*")
            star = True
        found.append(parameter.name)
    assert ", ".join(found) == NAMES[name]


@pytest.mark.parametrize("name", sorted(NAMES))
def test_each_name_is_documented(name):
    """With parameters, what comes back and an example."""
    thing = getattr(relook, name)
    if inspect.isfunction(thing):
        for part in ("Parameters", "Returns", "Raises", "Examples"):
            assert f"{part}\n    ---" in thing.__doc__, part
    elif inspect.isclass(thing):
        assert thing.__doc__
        for attribute, held in vars(thing).items():
            if isinstance(held, property) and not attribute.startswith("_"):
                assert held.__doc__, attribute


def test_a_name_that_is_none_is_refused():
    """As any module does."""
    with pytest.raises(AttributeError, match="no attribute 'measures'"):
        relook.measures  # noqa: B018


def test_importing_is_light():
    """`import relook` brings in neither pandas nor numpy; they come with the first name."""
    program = (
        "import sys, relook; print(sorted({'numpy', 'pandas', 'openpyxl'} & set(sys.modules)))"
    )
    done = subprocess.run(
        [sys.executable, "-c", program], capture_output=True, text=True, check=True
    )
    assert done.stdout.strip() == "[]"


def test_a_strict_checker_outside_accepts_it(tmp_path):
    """A program that uses every name passes `mypy --strict`; one that misuses them does not."""
    pytest.importorskip("mypy", reason="mypy comes with the extra `lint`")
    (tmp_path / "good.py").write_text(
        textwrap.dedent(
            """
            import pandas as pd
            import relook

            def once(labels: pd.DataFrame, folder: str) -> float | None:
                held: relook.Measured = relook.measure(labels, item="i", coder="c", label="v")
                queue: relook.Queue = relook.queue(held, adjudicators=["Ines"], top=5)
                sheets = queue.write(folder)
                back: relook.Returned = relook.collect(folder, sheets)
                after: relook.Rescored = relook.rescore(folder)
                low, high = after.interval or (0.0, 0.0)
                names: list[str] = list(back.decisions.columns)
                print(held.items.head(), names, low < high, relook.__version__)
                return held.alpha
            """
        ),
        encoding="utf-8",
    )
    (tmp_path / "bad.py").write_text(
        "import relook\nrelook.rescore('q', sed=1)\nrelook.measure([[1]]).alpha + 1\n",
        encoding="utf-8",
    )
    source = Path(relook.__file__).parents[1]
    # Where relook is installed its py.typed has to do; a checkout must be pointed at.
    environment = dict(os.environ)
    if source.name != "site-packages":
        environment["MYPYPATH"] = str(source)
    settings = tmp_path / "mypy.ini"
    settings.write_text("[mypy]\n", encoding="utf-8")
    command = [sys.executable, "-m", "mypy", "--strict", "--config-file", str(settings)]
    command += ["--cache-dir", str(tmp_path / "cache"), "--follow-imports", "silent"]

    def checked(name):
        return subprocess.run(
            [*command, name],
            cwd=tmp_path,
            capture_output=True,
            text=True,
            env=environment,
        )

    good = checked("good.py")
    assert good.returncode == 0, good.stdout
    bad = checked("bad.py")
    assert bad.returncode == 1
    assert '"sed"' in bad.stdout
    assert "operand" in bad.stdout
