"""What people write where no decision is read from is told, and rows that are gone are."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import pytest
from openpyxl import Workbook
from openpyxl.comments import Comment

from reference.small_project import NOW, column, edited, fill, give_back, make_project, queue_of
from relook.project.returning.collecting import collect

ALL = {0: "delay", 1: "staff", 2: "price", 3: "cannot be coded", 4: "delay", 5: "price"}


def notes_of(
    root: Path, change: Callable[[Workbook], object] | None, decisions: dict[int, object]
) -> list[str]:
    project, sent = make_project(root)
    data = fill(sent["Ada"], decisions)
    give_back(project, "ada.xlsx", data if change is None else edited(data, change))
    return [str(note) for note in collect(project, None, now=NOW).notes]


def test_an_untouched_worksheet_has_nothing_to_tell(tmp_path: Path) -> None:
    """All rows filled in, nothing else written anywhere."""
    assert notes_of(tmp_path, None, ALL) == []


def _comment(book: Workbook) -> None:
    sheet = queue_of(book)
    sheet.cell(3, column(sheet, "decision")).comment = Comment("not sure\nat all", "Ada")


def _thread(book: Workbook) -> None:
    said = "[Threaded comment]\n\nYour program shows this thread.\n\nComment:\n    is it a delay?"
    queue_of(book)["A2"].comment = Comment(said, "Ada")


def _below(book: Workbook) -> None:
    sheet = queue_of(book)
    sheet.cell(sheet.max_row + 2, 2).value = "labels overlap"


def _beside(book: Workbook) -> None:
    sheet = queue_of(book)
    sheet.cell(4, sheet.max_column + 2).value = "ask me"


def _column(book: Workbook) -> None:
    sheet = queue_of(book)
    at = sheet.max_column + 1
    for row, value in enumerate(("My view", "hm", "well"), start=1):
        sheet.cell(row, at).value = value


def _sheet(book: Workbook) -> None:
    book.create_sheet("Thoughts")["B2"] = "more"


def _name(book: Workbook) -> None:
    start = book["Start here"]
    (at,) = [cell.row for cell in start["B"] if cell.value == "Filled in by"]
    start.cell(at, 3).value = "Carla"


@pytest.mark.parametrize(
    ("change", "said"),
    [
        (
            _comment,
            (
                'a comment on a cell is not taken: "not sure at all", '
                'rounds/01/returned/ada.xlsx, sheet "Queue", row 3, column "G"'
            ),
        ),
        (_thread, 'a comment on a cell is not taken: "is it a delay?"'),
        (_below, 'a text outside the table is not taken: "labels overlap"'),
        (_beside, 'a text outside the table is not taken: "ask me"'),
        (_column, 'the column "my view" was not sent and is not taken; cells filled in it: 2'),
        (_sheet, 'the sheet "Thoughts" was not sent with the worksheet and is not read'),
        (_name, 'the sheet says "Filled in by" Carla; the rows are recorded as those'),
    ],
)
def test_what_is_not_taken_is_told_with_its_place(
    tmp_path: Path, change: Callable[[Workbook], object], said: str
) -> None:
    """Each once, naming the file."""
    (note,) = notes_of(tmp_path, change, ALL)
    assert note.startswith(said)
    assert "rounds/01/returned/ada.xlsx" in note


def test_many_texts_are_quoted_in_part_and_counted(tmp_path: Path) -> None:
    """Ten are quoted, long ones cut, the rest counted."""

    def scribble(book: Workbook) -> None:
        sheet = queue_of(book)
        for row in range(20, 35):
            sheet.cell(row, 2).value = f"{row} " + "very " * 100

    notes = notes_of(tmp_path, scribble, ALL)
    assert len(notes) == 11
    assert len(notes[0].splitlines()[0]) < 300
    assert notes[10].startswith("… and 5 more such texts")


def test_rows_that_are_gone_are_told_until_they_are_decided(tmp_path: Path) -> None:
    """A deleted row is named; a mend sheet of that row alone misses none of the decided ones."""
    project, sent = make_project(tmp_path)
    data = edited(fill(sent["Ada"], ALL), lambda book: queue_of(book).delete_rows(3))
    give_back(project, "ada.xlsx", data)
    (note,) = collect(project, None, now=NOW).notes
    assert str(note) == (
        '1 of the 6 rows that were sent are not in the file: "remark 02"; they stay open, '
        "rounds/01/returned/ada.xlsx\n"
        "mend: if they were deleted, fill them in in the worksheet as it was sent"
    )
    rest = fill(sent["Ada"], {1: "staff"})
    give_back(project, "rest.xlsx", edited(rest, lambda book: queue_of(book).delete_rows(4, 9)))
    assert collect(project, None, now=NOW).notes == ()
