"""Worksheets made up for tests, and ways to look into the files they become."""

from __future__ import annotations

import io
import os
import random
import re
import shutil
import subprocess
import zipfile
from dataclasses import replace
from pathlib import Path
from xml.etree import ElementTree

import pytest
from openpyxl import load_workbook
from openpyxl.workbook import Workbook

from relook.worksheet.keys import row_keys
from relook.worksheet.model import CodeBookEntry, SheetRow, SheetVariable, Worksheet
from relook.worksheet.write import write_worksheet

SECRET = bytes(range(32))
TOPIC = SheetVariable(
    name="topic",
    entry="choice",
    labels=("delay", "crew", "comfort", "price"),
    code_book=(CodeBookEntry(label="delay", meaning="late", example="An hour late."),),
)
CRUST = SheetVariable(
    name="crust",
    entry="choice",
    labels=("pale", "light", "golden", "dark", "burnt"),
    ordered=True,
)
CRUMB = SheetVariable(name="crumb", entry="number", low=0, high=100)
THEMES = SheetVariable(name="themes", entry="set", labels=("food", "staff", "noise"), separator=";")
REASONS = ("coder slip", "instructions unclear")


def made_worksheet(
    n_items: int = 6,
    variables: tuple[SheetVariable, ...] = (TOPIC,),
    texts: tuple[str, ...] = ("The boat was late.", "No heating at all."),
    **changes: object,
) -> Worksheet:
    """Make a worksheet; `changes` replace its fields."""
    chance = random.Random(7)
    pairs = [(f"item {at}", v) for at in range(n_items) for v in variables]
    keys = row_keys(SECRET, "W", [(item, v.name) for item, v in pairs])
    rows = []
    for key, (item, variable) in zip(keys, pairs, strict=True):
        at = int(item.split()[1])
        if variable.entry == "number":
            labels = tuple(sorted((str(chance.randrange(100)) for _ in range(2)), key=int))
        else:
            labels = tuple(chance.sample(variable.labels, 2))
        rows.append(
            SheetRow(
                key=key,
                item=item,
                variable=variable.name,
                shown=(texts[at % len(texts)], f"source {at}"),
                competing=labels,
            )
        )
    worksheet = Worksheet(
        id="2M9X-K7QF",
        project="0f1e2d3c",
        title="Ferry remarks",
        round=1,
        adjudicator="Ada",
        variables=variables,
        shown_columns=("text", "source"),
        reasons=REASONS,
        reveal="labels",
        rows=tuple(rows),
        may_show_other_labels=True,
        stamp="2031-02-03T04:05:06+00:00",
    )
    return replace(worksheet, **changes)  # type: ignore[arg-type]


def opened(worksheet: Worksheet) -> Workbook:
    """Write a worksheet and open it again."""
    return load_workbook(io.BytesIO(write_worksheet(worksheet)))


def parts_of(data: bytes) -> dict[str, str]:
    """Return every part of a workbook as text, by name."""
    with zipfile.ZipFile(io.BytesIO(data)) as archive:
        return {name: archive.read(name).decode("utf-8") for name in archive.namelist()}


def every_text(data: bytes) -> str:
    """Return everything that a workbook says: names of parts, attributes, texts."""
    said = []
    for name, part in parts_of(data).items():
        said.append(name)
        for element in ElementTree.fromstring(part).iter():
            said.extend(element.attrib.values())
            said.append(element.text or "")
    return "\n".join(said)


def formulas_of(data: bytes) -> list[str]:
    """Return every formula that stands in a cell of a workbook."""
    return [
        formula
        for name, part in parts_of(data).items()
        if name.startswith("xl/worksheets/")
        for formula in re.findall(r"<f[^>]*>([^<]*)</f>", part)
    ]


def need_libreoffice() -> str:
    """Return the program's path; skip the test where it is missing, but never in CI."""
    found = shutil.which("soffice")
    if found is None:
        if os.environ.get("CI") == "true":
            pytest.fail("LibreOffice (soffice) is missing; in CI it must be there")
        pytest.skip("LibreOffice (soffice) is not on the path")
    return found


def converted(data: bytes, folder: Path, source: str, target: str) -> bytes:
    """Open a file with LibreOffice and save it in another format, with a profile of its own."""
    program = need_libreoffice()
    out = folder / f"out-{target}"
    given = folder / f"given.{source}"
    given.write_bytes(data)
    profile = (folder / "profile").as_uri()
    subprocess.run(
        [
            program,
            f"-env:UserInstallation={profile}",
            "--headless",
            "--convert-to",
            target,
            "--outdir",
            str(out),
            str(given),
        ],
        check=True,
        capture_output=True,
        timeout=120,
    )
    return (out / f"given.{target}").read_bytes()
