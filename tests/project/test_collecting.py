"""Damage that returned worksheets come with, and what is taken all the same."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import pytest
from openpyxl import Workbook

from reference.small_project import (
    NOW,
    SEVERITY,
    THEMES,
    TOPIC,
    column,
    edited,
    fill,
    give_back,
    make_project,
    make_worksheet,
    queue_of,
)
from relook.errors import RelookError
from relook.project.archive.record import read_record
from relook.project.returning.collected import Collected
from relook.project.returning.collecting import collect
from relook.project.setup.folder import Project

FILLED = {
    0: "delay",
    1: "staff",
    2: "price",
    3: "cannot be coded",
    4: "delay",
}  # the sixth is blank


def labels(project: Project) -> dict[str, str]:
    """Return the latest label, or other ruling, of each item."""
    return {held.item: held.label or held.ruling for held in read_record(project).decisions}


def collect_changed(
    root: Path, change: Callable[[Workbook], object] | None, decisions: dict[int, object]
) -> tuple[Project, Collected]:
    project, sent = make_project(root)
    data = fill(sent["Ada"], decisions)
    give_back(project, "ada.xlsx", data if change is None else edited(data, change))
    return project, collect(project, None, now=NOW)


ALL = {
    "remark 01": "delay",
    "remark 02": "staff",
    "remark 03": "price",
    "remark 04": "cannot be coded",
    "remark 05": "delay",
}


def _sort(book: Workbook) -> None:
    sheet = queue_of(book)
    rows = [[cell.value for cell in row] for row in sheet.iter_rows(min_row=2)]
    for number, row in enumerate(reversed(rows), start=2):
        for at, value in enumerate(row, start=1):
            sheet.cell(number, at).value = value


def _hide(book: Workbook) -> None:
    for number in (3, 4):
        queue_of(book).row_dimensions[number].hidden = True


def _delete_row(book: Workbook) -> None:
    queue_of(book).delete_rows(7)  # the blank one


def _duplicate_row(book: Workbook) -> None:
    sheet = queue_of(book)
    sheet.append([cell.value for cell in sheet[2]])


def _extra_column_and_sheet(book: Workbook) -> None:
    queue_of(book).insert_cols(3)
    queue_of(book)["C2"] = "ask Ben"
    book.create_sheet("sums")["A1"] = 12


def _rename_sheet(book: Workbook) -> None:
    queue_of(book).title = "Sheet1"


def _move_header(book: Workbook) -> None:
    queue_of(book).insert_rows(1, 4)


def _delete_evidence(book: Workbook) -> None:
    queue_of(book).delete_cols(3)


@pytest.mark.parametrize(
    "change",
    [
        None,
        _sort,
        _hide,
        _delete_row,
        _duplicate_row,
        _extra_column_and_sheet,
        _rename_sheet,
        _move_header,
        _delete_evidence,
    ],
)
def test_harmless_changes(tmp_path: Path, change: Callable[[Workbook], object] | None) -> None:
    """Sorted, hidden, deleted, duplicated, moved, renamed: every decision is taken."""
    project, result = collect_changed(tmp_path, change, FILLED)
    assert (result.accepted, result.rejected, result.edited) == (5, (), ())
    assert result.blank == (0 if change is _delete_row else 1)
    assert labels(project) == ALL


@pytest.mark.parametrize(
    ("typed", "label"),
    [
        ("delay ", "delay"),
        ("DELAY", "delay"),
        ("de\u200blay", "delay"),
        (7, "7"),
        (7.0, "7"),
        ("7.0", "7"),
    ],
)
def test_lenient_matches_are_taken_and_said(tmp_path: Path, typed: object, label: str) -> None:
    """Spaces, case and turned numbers are taken for the label that they can only mean."""
    project, result = collect_changed(tmp_path, None, {0: typed})
    assert labels(project) == {"remark 01": label}
    exact = typed in (7, 7.0)
    assert len(result.adjusted) == (0 if exact else 1)


@pytest.mark.parametrize(
    ("typed", "found", "reason", "mend"),
    [
        ("dely", "dely", "no label", 'change the cell to "delay"'),
        ("=A1", "=A1", "formula", "type the label"),
        ("#N/A", "#N/A", "error value", "type the label"),
        (True, "TRUE", "no label", "change the cell to one of"),
    ],
)
def test_rows_that_are_not_taken(
    tmp_path: Path, typed: object, found: str, reason: str, mend: str
) -> None:
    """One bad cell keeps its own row out, named by cell, and no other."""
    project, result = collect_changed(tmp_path, None, FILLED | {1: typed})
    assert result.accepted == 4
    (row,) = result.rejected
    assert (row.worksheet, row.sheet, row.row, row.column) == (
        "rounds/01/returned/ada.xlsx",
        "Queue",
        3,
        "G",
    )
    assert (row.item, row.found) == ("remark 02", found)
    assert reason in row.reason
    assert mend in row.mend
    assert result.mend_keys == (row.key,)
    assert "remark 02" not in labels(project)


def test_merged_decisions(tmp_path: Path) -> None:
    """Rows merged into one decision are listed; the first row's decision is taken."""

    def merge(book: Workbook) -> None:
        at = column(queue_of(book), "decision")
        queue_of(book).merge_cells(start_row=2, end_row=4, start_column=at, end_column=at)

    _, result = collect_changed(tmp_path, merge, FILLED)
    assert result.accepted == 3
    assert [row.reason for row in result.rejected] == [
        "the cell was merged into G2, so this row has no decision"
    ] * 2


def test_edited_evidence_is_reported_never_taken(tmp_path: Path) -> None:
    """An edit to what was sent is told with its cell; the decision beside it is taken."""

    def edit(book: Workbook) -> None:
        queue_of(book)["C3"] = "Another text."

    project, result = collect_changed(tmp_path, edit, FILLED)
    (cell,) = result.edited
    assert (cell.row, cell.column, cell.found, cell.item) == (3, "C", "Another text.", "remark 02")
    assert labels(project) == ALL


@pytest.mark.parametrize("columns", [(3,), (2, 3), (1,), (5, 6)])
def test_partial_sorts_are_rejected(tmp_path: Path, columns: tuple[int, ...]) -> None:
    """Where some columns were sorted without the others, no moved row is taken."""

    def sort(book: Workbook) -> None:
        sheet = queue_of(book)
        for at in columns:
            values = [sheet.cell(number, at).value for number in range(2, 8)]
            moved = [*values[1:3], values[0], *values[3:]]
            for number, value in enumerate(moved, start=2):
                sheet.cell(number, at).value = value

    project, result = collect_changed(tmp_path, sort, FILLED)
    if columns == (5, 6):  # the competing labels are the same in every row
        assert result.accepted == 5
        return
    assert result.accepted == 2
    assert len(result.rejected) == 3
    assert all("belongs to another row" in row.reason for row in result.rejected)
    assert set(labels(project)) == {"remark 04", "remark 05"}


def test_duplicated_row_with_another_decision(tmp_path: Path) -> None:
    """A row that is there twice and says two things is not taken."""

    def double(book: Workbook) -> None:
        sheet = queue_of(book)
        sheet.append([cell.value for cell in sheet[2]])
        sheet.cell(sheet.max_row, column(sheet, "decision")).value = "price"

    project, result = collect_changed(tmp_path, double, FILLED)
    assert [row.row for row in result.rejected] == [2, 8]
    assert "there 2 times, with different decisions (rows 2, 8)" in result.rejected[0].reason
    assert "remark 01" not in labels(project)


def test_unknown_and_missing_row_codes(tmp_path: Path) -> None:
    """A decision without a row code of the project is listed, not lost from sight."""

    def damage(book: Workbook) -> None:
        queue_of(book)["A2"] = "AAAA-BBBB-CCCC"
        queue_of(book)["A3"] = None
        queue_of(book)["A4"] = "sorry, I was not sure here"

    _, result = collect_changed(tmp_path, damage, FILLED)
    assert result.accepted == 2
    assert [row.reason for row in result.rejected] == [
        '"AAAA-BBBB-CCCC" is no row code of this project',
        "the row has a decision but no row code",
        "what stands for the row code is no row code of this project",
    ]


def test_note_without_a_decision(tmp_path: Path) -> None:
    """A note beside a blank decision is told: someone meant to say something."""
    project, sent = make_project(tmp_path)
    give_back(project, "a.xlsx", fill(sent["Ada"], {0: "not sure, ask Ben"}, header="note"))
    result = collect(project, None, now=NOW)
    assert (result.accepted, result.blank) == (0, 6)
    assert ["not sure, ask Ben" in note.message for note in result.notes] == [True]


def test_a_reason_without_a_decision_is_told_too(tmp_path: Path) -> None:
    """It may be all that somebody did of a row."""
    project, sent = make_project(tmp_path)
    give_back(project, "a.xlsx", fill(sent["Ada"], {0: "coder slip"}, header="reason"))
    (note,) = collect(project, None, now=NOW).notes
    assert note.message == 'the row has a reason but no decision: "coder slip"'


def test_numbers_and_sets(tmp_path: Path) -> None:
    """Numbers within bounds and sets of labels are decisions like others."""
    sheet = make_worksheet(n_items=2, variables=(TOPIC, SEVERITY, THEMES))
    project, sent = make_project(tmp_path, [sheet])
    data = fill(sent["Ada"], {0: "delay", 1: 3.5, 3: "staff", 4: 12, 5: "view;food"})
    give_back(project, "a.xlsx", fill(data, {2: "x"}, header="has noise"))
    result = collect(project, None, now=NOW)
    found = {(held.item, held.variable): held.label for held in read_record(project).decisions}
    assert found == {
        ("remark 01", "topic"): "delay",
        ("remark 01", "severity"): "3.5",
        ("remark 01", "themes"): "noise",
        ("remark 02", "topic"): "staff",
        ("remark 02", "themes"): "food;view",
    }
    assert [row.reason for row in result.rejected] == ["it lies outside the bounds"]


def test_worksheet_of_another_project(tmp_path: Path) -> None:
    """A worksheet of another project is refused as a whole; the others are taken."""
    project, sent = make_project(tmp_path / "a")
    (tmp_path / "b").mkdir()
    other = edited(
        sent["Ada"], lambda book: setattr(book.custom_doc_props["relook project"], "value", "zzz")
    )
    give_back(project, "other.xlsx", other)
    give_back(project, "ada.xlsx", fill(sent["Ada"], FILLED))
    result = collect(project, None, now=NOW)
    assert result.accepted == 5
    assert [problem.message for problem in result.unreadable] == [
        "the worksheet belongs to another project"
    ]


def test_files_that_are_no_worksheets(tmp_path: Path) -> None:
    """What is no workbook is named with its mend; lock files are passed over in silence."""
    project, sent = make_project(tmp_path)
    give_back(project, "ada.xlsx", fill(sent["Ada"], FILLED))
    give_back(project, "~$ada.xlsx", b"lock")
    give_back(project, ".~lock.ada.xlsx#", b"lock")
    give_back(project, "photo.xlsx", b"\x89PNG")
    give_back(project, "list.csv", b"a,b\n1,2\n")
    result = collect(project, None, now=NOW)
    assert result.accepted == 5
    assert [str(problem.where) for problem in result.unreadable] == [
        "rounds/01/returned/list.csv",
        "rounds/01/returned/photo.xlsx",
    ]


def test_strict_takes_all_or_nothing(tmp_path: Path) -> None:
    """Under strict, one bad row keeps everything out, and nothing is written."""
    project, sent = make_project(tmp_path)
    give_back(project, "ada.xlsx", fill(sent["Ada"], FILLED | {1: "dely"}))
    result = collect(project, None, strict=True, now=NOW)
    assert (result.accepted, result.held_back, len(result.rejected)) == (0, True, 1)
    assert read_record(project).files == ()
    give_back(project, "ada.xlsx", fill(sent["Ada"], FILLED))
    assert collect(project, None, strict=True, now=NOW).accepted == 5


def test_dry_run_writes_nothing(tmp_path: Path) -> None:
    """A dry run reports what would be taken, and leaves every file as it was."""
    project, sent = make_project(tmp_path)
    give_back(project, "ada.xlsx", fill(sent["Ada"], FILLED))
    before = sorted(tmp_path.rglob("*"))
    result = collect(project, None, dry_run=True, now=NOW)
    assert (result.accepted, result.record_file) == (5, None)
    assert sorted(tmp_path.rglob("*")) == before


def test_the_users_file_is_kept_as_it_is(tmp_path: Path) -> None:
    """The returned file stays unaltered, and a copy is kept under its digest."""
    project, sent = make_project(tmp_path)
    path = give_back(project, "ada.xlsx", fill(sent["Ada"], FILLED))
    before = path.read_bytes()
    collect(project, None, now=NOW)
    assert path.read_bytes() == before
    (kept,) = project.returned_folder(1).glob("kept/*.xlsx")
    assert kept.read_bytes() == before


def test_named_files_and_folders(tmp_path: Path) -> None:
    """Worksheets may lie anywhere and be named; a missing one stops the collect."""
    project, sent = make_project(tmp_path / "project")
    mail = tmp_path / "mail"
    mail.mkdir()
    (mail / "sheet (1).xlsx").write_bytes(fill(sent["Ada"], FILLED))
    with pytest.raises(RelookError, match="no such file"):
        collect(project, [mail / "none.xlsx"], now=NOW)
    assert collect(project, [mail], now=NOW).accepted == 5


def test_nothing_was_sent(tmp_path: Path) -> None:
    """Before the first round there is nothing to collect."""
    project, _ = make_project(tmp_path, [])
    with pytest.raises(RelookError, match="no worksheet was sent yet"):
        collect(project, None, now=NOW)


def test_splits_are_listed(tmp_path: Path) -> None:
    """Where two adjudicators rule differently, the item is named with both rulings."""
    sheets = [make_worksheet(adjudicator="Ada"), make_worksheet(adjudicator="Ben")]
    project, sent = make_project(tmp_path, sheets)
    give_back(project, "ada.xlsx", fill(sent["Ada"], {0: "delay", 1: "staff"}))
    give_back(project, "ben.xlsx", fill(sent["Ben"], {0: "delay", 1: "price"}))
    result = collect(project, None, now=NOW)
    (split,) = result.splits
    assert split.item == "remark 02"
    assert sorted(label for _, label in split.rulings) == ["price", "staff"]


def test_same_inputs_give_the_same_bytes(tmp_path: Path) -> None:
    """The record of the same files at the same time is the same, byte for byte."""
    written = []
    for name in ("a", "b"):
        project, sent = make_project(tmp_path / name)
        give_back(project, "ada.xlsx", fill(sent["Ada"], FILLED))
        collect(project, None, now=NOW)
        written.append(
            {file.name: file.read_bytes() for file in project.decisions_folder.iterdir()}
        )
    assert written[0] == written[1]
