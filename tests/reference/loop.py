"""Helpers for tests that go round the loop as a user does: copy a sample, fill a worksheet."""

from __future__ import annotations

import shutil
from collections.abc import Callable, Iterator
from pathlib import Path

from openpyxl import load_workbook
from openpyxl.worksheet.worksheet import Worksheet

ROOT = Path(__file__).parents[2]
SAMPLES = ROOT / "sample_projects"


def copy_sample(name: str, into: Path) -> Path:
    """Copy a sample project to a folder of its own."""
    return Path(shutil.copytree(SAMPLES / name, into / name))


def queue_rows(sheet: Worksheet) -> Iterator[tuple[int, dict[str, int]]]:
    """Yield the row number and the columns by header of each row of a queue sheet."""
    for header in sheet.iter_rows():
        columns = {
            str(cell.value).casefold(): cell.column for cell in header if cell.value is not None
        }
        if {"row code", "decision"} <= set(columns):
            break
    else:
        raise AssertionError("no header row")
    for row in range(header[0].row + 1, sheet.max_row + 1):
        if sheet.cell(row, columns["row code"]).value:
            yield row, columns


def fill(file: Path, to: Path, decide: Callable[[str, str], str | None]) -> int:
    """Fill the decisions of a worksheet and save it elsewhere; return how many were filled.

    `decide` gets item and variable and returns a label, or None to leave the row blank.
    """
    book = load_workbook(file)
    sheet = book["Queue"]
    filled = 0
    for row, columns in queue_rows(sheet):
        item = str(sheet.cell(row, columns["item"]).value)
        variable = str(sheet.cell(row, columns["variable"]).value)
        label = decide(item, variable)
        if label is not None:
            sheet.cell(row, columns["decision"]).value = label
            filled += 1
    to.parent.mkdir(parents=True, exist_ok=True)
    book.save(to)
    return filled


def fill_round(project: Path, decide: Callable[[str, str], str | None], number: int = 1) -> int:
    """Fill every worksheet of a round into its folder for returned ones."""
    folder = project / "rounds" / f"{number:02d}"
    return sum(
        fill(sheet, folder / "returned" / sheet.name, decide)
        for sheet in sorted((folder / "worksheets").glob("*.xlsx"))
    )
