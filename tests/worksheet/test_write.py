"""The adjudicator's file: its sheets, rules, looks and bytes."""

from __future__ import annotations

import io
import subprocess
import sys
import zipfile
from dataclasses import replace
from pathlib import Path

import pytest
from openpyxl import load_workbook

from reference.made_sheets import (
    CRUMB,
    CRUST,
    REASONS,
    THEMES,
    TOPIC,
    every_text,
    formulas_of,
    made_worksheet,
    opened,
    parts_of,
)
from relook.errors import RelookError
from relook.worksheet import palette
from relook.worksheet.layout import columns_of, evidence_cells
from relook.worksheet.model import SheetRow, SheetVariable
from relook.worksheet.write import write_worksheet


def headers(sheet: object) -> list[str]:
    return [cell.value for cell in sheet[1]]  # type: ignore[index]


def letter_of(sheet: object, header: str) -> str:
    return next(cell.column_letter for cell in sheet[1] if cell.value == header)  # type: ignore[index]


def rule_at(sheet: object, header: str) -> object:
    """Return the one validation of a column."""
    letter = letter_of(sheet, header)
    found = [
        rule
        for rule in sheet.data_validations.dataValidation  # type: ignore[attr-defined]
        if f"{letter}2" in str(rule.sqref) and str(rule.sqref).startswith(letter)
    ]
    assert len(found) == 1
    return found[0]


def test_sheets_stand_in_the_order_they_are_read() -> None:
    """Start here first and active; the lists last and hidden."""
    book = opened(made_worksheet())
    assert book.sheetnames == ["Start here", "Queue", "Code book", "_lists"]
    assert book.active is not None
    assert book.active.title == "Start here"
    assert book["_lists"].sheet_state == "hidden"


def test_the_queue_holds_evidence_then_fields() -> None:
    """Row code, item, shown columns, variable, labels side by side, then what is filled in."""
    worksheet = made_worksheet()
    sheet = opened(worksheet)["Queue"]
    assert headers(sheet) == [
        "row code", "item", "text", "source", "variable", "label 1", "label 2",
        "decision", "reason", "note",
    ]  # fmt: skip
    for number, row in enumerate(worksheet.rows, start=2):
        cells = [cell.value for cell in sheet[number]]
        assert cells == [
            row.key, row.item, *row.shown, row.variable, *row.competing, None, None, None,
        ]  # fmt: skip


def test_the_cells_hold_exactly_what_is_fingerprinted() -> None:
    """Whoever makes the digests asks for the same texts that are written."""
    row = made_worksheet().rows[0]
    rows = (
        replace(row, competing=("a", "b"), tallies=(3, 1), coders=(("c1", "a"), ("c2", "b"))),
        replace(row, key="other", competing=tuple("hgfedcba"), remarks=("one", "two")),
    )
    worksheet = made_worksheet(rows=rows, shown_columns=("decision", "label 1"))
    sheet = opened(worksheet)["Queue"]
    names = headers(sheet)
    assert len({name.casefold() for name in names}) == len(names)
    for number, evidence in enumerate(evidence_cells(worksheet), start=2):
        written = dict(zip(names, (cell.value or "" for cell in sheet[number]), strict=True))
        assert {header: written[header] for header in evidence} == evidence
    assert evidence_cells(worksheet)[0]["label 1"] == "a × 3"
    assert evidence_cells(worksheet)[0]["by c2"] == "b"
    assert evidence_cells(worksheet)[1]["label 1"].count("\n") == 7
    assert evidence_cells(worksheet)[1]["label 2"] == ""


def test_nothing_revealed_means_no_label_columns() -> None:
    """Under `nothing` the adjudicator decides from the item alone."""
    rows = tuple(replace(row, competing=()) for row in made_worksheet().rows)
    names = headers(opened(made_worksheet(rows=rows, reveal="nothing"))["Queue"])
    assert not any(name.startswith("label") for name in names)


def test_one_variable_has_a_plain_range_as_its_dropdown() -> None:
    """All rows, one rule, a stop with a helpful message, blanks allowed."""
    worksheet = made_worksheet()
    book = opened(worksheet)
    rule = rule_at(book["Queue"], "decision")
    assert (rule.type, rule.showErrorMessage, rule.errorStyle, rule.allow_blank) == (  # type: ignore[attr-defined]
        "list", True, "stop", True,
    )  # fmt: skip
    assert str(rule.sqref) == "H2:H7"  # type: ignore[attr-defined]
    assert rule.formula1 == "'_lists'!$H$2:$H$7"  # type: ignore[attr-defined]
    choices = [book["_lists"].cell(row, 8).value for row in range(2, 8)]
    assert choices == [*TOPIC.labels, "cannot be coded", "withdraw"]
    reasons = rule_at(book["Queue"], "reason")
    assert reasons.formula1 == "'_lists'!$J$2:$J$3"  # type: ignore[attr-defined]
    assert [book["_lists"].cell(row, 10).value for row in (2, 3)] == list(REASONS)


@pytest.mark.parametrize(
    "variables", [(TOPIC,), (TOPIC, CRUST), (CRUMB,), (CRUST, CRUMB), (THEMES,)]
)
def test_messages_keep_within_the_formats_limits(variables: tuple[SheetVariable, ...]) -> None:
    """Titles up to 32 characters and texts up to 255, or the file is repaired and they are gone."""
    for rule in opened(made_worksheet(variables=variables))[
        "Queue"
    ].data_validations.dataValidation:
        assert len(rule.errorTitle or "") <= 32
        assert len(rule.promptTitle or "") <= 32
        assert len(rule.error or "") <= 255
        assert len(rule.prompt or "") <= 255
        assert len(rule.formula1) <= 8_192


def test_labels_with_commas_and_quotes_stand_whole_in_the_list() -> None:
    """A list in cells has no delimiter to break at, and no limit of 255 characters."""
    labels = ('say "no", then go', "a,b;c", "=odd", "00123", "x" * 300)
    book = opened(made_worksheet(variables=(replace(TOPIC, labels=labels, code_book=()),)))
    cells = [book["_lists"].cell(row, 8) for row in range(2, 7)]
    assert [(cell.value, cell.data_type) for cell in cells] == [(label, "s") for label in labels]


def test_numbers_alone_are_kept_within_bounds_or_one_of_two_words() -> None:
    """A number rule that lets `cannot be coded` in; the cell is no text cell, or nothing is a number."""
    sheet = opened(made_worksheet(variables=(CRUMB,)))["Queue"]
    rule = rule_at(sheet, "decision")
    assert (rule.type, rule.showErrorMessage, rule.errorStyle) == ("custom", True, "stop")  # type: ignore[attr-defined]
    assert "from 0 to 100" in rule.error  # type: ignore[attr-defined]
    assert "cannot be coded" in rule.formula1  # type: ignore[attr-defined]
    assert sheet[f"{letter_of(sheet, 'decision')}2"].number_format == "General"


def test_labels_beside_numbers_keep_the_dropdown_and_a_mark() -> None:
    """No stop, since it would refuse numbers; a red mark shows what does not fit its row."""
    sheet = opened(made_worksheet(variables=(CRUST, CRUMB)))["Queue"]
    rule = rule_at(sheet, "decision")
    assert (rule.type, rule.showErrorMessage) == ("list", False)  # type: ignore[attr-defined]
    formats = [cell.number_format for cell in sheet[letter_of(sheet, "decision")][1:3]]
    assert formats == ["@", "General"]
    fills = {
        rule.dxf.fill.bgColor.rgb[-6:]
        for area in sheet.conditional_formatting
        for rule in area.rules
    }
    assert fills == {palette.AMISS, palette.DONE}


def test_sets_are_ticked_label_by_label() -> None:
    """A column per label; the decision cell takes the two words only."""
    sheet = opened(made_worksheet(variables=(THEMES,)))["Queue"]
    assert headers(sheet)[-6:] == [
        "has food", "has staff", "has noise", "decision", "reason", "note",
    ]  # fmt: skip
    many = replace(THEMES, labels=tuple(f"theme {at}" for at in range(13)))
    plain = opened(made_worksheet(variables=(many,)))["Queue"]
    assert not any(name.startswith("has ") for name in headers(plain))
    assert rule_at(plain, "decision").showErrorMessage is False  # type: ignore[attr-defined]


def test_the_view_is_ready_to_work_in() -> None:
    """Frozen header, filter on all columns, unprotected, first field selected, print set up."""
    worksheet = made_worksheet()
    sheet = opened(worksheet)["Queue"]
    assert sheet.freeze_panes == "C2"
    assert sheet.auto_filter.ref == "A1:J7"
    assert sheet.protection.sheet is False
    active = [s.activeCell for s in sheet.sheet_view.selection if s.pane == "bottomRight"]
    assert active == ["H2"]
    assert sheet.page_setup.orientation == "landscape"
    assert (sheet.page_setup.fitToWidth, sheet.page_setup.fitToHeight) == (1, 0)
    assert sheet.print_title_rows == "$1:$1"
    assert "&P" in sheet.oddFooter.right.text
    assert not sheet.merged_cells.ranges


def test_every_font_is_named() -> None:
    """Unnamed fonts come out as a serif in some programs."""
    book = opened(made_worksheet())
    assert {cell.font.name for sheet in book for row in sheet for cell in row} == {"Calibri"}


def test_rows_are_as_high_as_their_text_but_not_fixed() -> None:
    """The file gives heights without saying that a user set them, so rows grow with notes."""
    data = write_worksheet(made_worksheet(texts=("short", "a long text " * 60)))
    part = parts_of(data)["xl/worksheets/sheet2.xml"]
    assert "customHeight" not in part
    sheet = load_workbook(io.BytesIO(data))["Queue"]
    low, high = (sheet.row_dimensions[row].height for row in (2, 3))
    assert low < 30 < 100 < high <= 409


def test_a_text_beyond_the_page_is_as_high_as_allowed_and_shows_its_start() -> None:
    """409 points; aligned to the top, since a centred one would show its middle."""
    sheet = opened(made_worksheet(texts=("word " * 6_000,)))["Queue"]
    assert sheet.row_dimensions[2].height == 409
    assert sheet["C2"].alignment.vertical == "top"


def test_an_items_further_rows_repeat_its_text_in_small_grey_type() -> None:
    """Never merged, so that sorting works; never as high again as the first."""
    long = "a rather long text " * 60
    sheet = opened(made_worksheet(variables=(TOPIC, CRUST), texts=(long,)))["Queue"]
    first, again = sheet["C2"], sheet["C3"]
    assert first.value == again.value
    assert (first.font.sz, again.font.sz) == (11.5, 8)
    assert again.font.color.rgb[-6:] == palette.GREY
    assert sheet.row_dimensions[3].height < sheet.row_dimensions[2].height / 2


def test_colours_follow_the_label_and_the_text_says_it() -> None:
    """The same label has the same colour everywhere; more than eight labels have none."""
    worksheet = made_worksheet(20)
    book = opened(worksheet)
    expected = palette.label_colours(TOPIC.labels, ordered=False)
    for row in book["Queue"].iter_rows(min_row=2, min_col=6, max_col=7):
        for cell in row:
            assert cell.fill.fgColor.rgb[-6:] == expected[cell.value]
    many = replace(TOPIC, labels=tuple(f"label {at}" for at in range(40)), code_book=())
    plain = opened(made_worksheet(variables=(many,)))["Queue"]
    assert plain["F2"].fill.patternType is None


def test_right_to_left_text_reads_from_the_right() -> None:
    """By the first letter with a direction; pictographs and digits have none."""
    texts = ("123 שלום עולם", "🚢 hello", "مرحبا")
    sheet = opened(made_worksheet(3, texts=texts))["Queue"]
    orders = [sheet.cell(row, 3).alignment.readingOrder for row in (2, 3, 4)]
    assert orders == [2, 0, 2]


def test_web_addresses_are_links_and_nothing_else_is() -> None:
    """One link, to the address that is shown."""
    worksheet = made_worksheet(
        2, texts=("https://example.org/a?b=1&c=2", "file:///etc/passwd"), title="https://x.example"
    )
    sheet = opened(worksheet)["Queue"]
    assert sheet["C2"].hyperlink.target == "https://example.org/a?b=1&c=2"
    assert sheet["C3"].hyperlink is None
    targets = [
        part for name, part in parts_of(write_worksheet(worksheet)).items()
        if name.endswith(".rels") and "External" in part
    ]  # fmt: skip
    assert len(targets) == 1
    assert targets[0].count("External") == 1


def test_start_here_says_what_to_do_in_plain_words() -> None:
    """Who, which round, shown labels that nobody gave, cautions, and a place for a name."""
    said = every_text(write_worksheet(made_worksheet()))
    for words in (
        "Ada", "round 1", "Filled in by", "labels that nobody gave", "upsetting", "breaks",
        "health, safety or legal", "licensed practice", "cannot be coded", "withdraw",
    ):  # fmt: skip
        assert words in said
    plain = every_text(write_worksheet(made_worksheet(may_show_other_labels=False)))
    assert "labels that nobody gave" not in plain
    for jargon in ("alpha", "disagreement", "Krippendorff", "audit", "contribution"):
        assert jargon not in said


def test_the_only_formula_counts_decided_rows() -> None:
    """Progress; by lengths, so that empty texts do not count, and ticks do."""
    assert formulas_of(write_worksheet(made_worksheet())) == [
        """SUMPRODUCT(--(((LEN('Queue'!$H$2:$H$7)>0))&gt;0))&amp;" of 6\"""".replace(
            ">0))&", "&gt;0))&"
        )
    ]
    ticked = formulas_of(write_worksheet(made_worksheet(variables=(THEMES,))))
    assert ticked[0].count("LEN(") == 4


def test_the_code_book_lists_meanings_and_every_label() -> None:
    """The file's entries first, then labels without one, then what is always allowed."""
    sheet = opened(made_worksheet())["Code book"]
    rows = [[cell.value for cell in row] for row in sheet.iter_rows()]
    assert rows == [
        ["label", "meaning", "example"],
        ["delay", "late", "An hour late."],
        ["crew", None, None],
        ["comfort", None, None],
        ["price", None, None],
        ["cannot be coded", "No label can be given.", None],
    ]


def test_the_file_says_which_worksheet_it_is_twice() -> None:
    """In its properties, and on the hidden sheet for programs that drop those."""
    book = opened(made_worksheet())
    properties = {each.name: each.value for each in book.custom_doc_props}
    assert properties == {
        "relook project": "0f1e2d3c", "relook worksheet": "2M9X-K7QF", "relook format": "1",
    }  # fmt: skip
    lists = book["_lists"]
    assert {lists.cell(row, 13).value: lists.cell(row, 14).value for row in (2, 3, 4)} == properties


def test_same_worksheet_same_bytes() -> None:
    """Also in another process, where hashes of strings differ."""
    data = write_worksheet(made_worksheet(variables=(TOPIC, CRUMB, THEMES)))
    assert data == write_worksheet(made_worksheet(variables=(TOPIC, CRUMB, THEMES)))
    code = (
        "import sys, hashlib; sys.path[:0] = sys.argv[1:];"
        "from reference.made_sheets import *;"
        "data = write_worksheet(made_worksheet(variables=(TOPIC, CRUMB, THEMES)));"
        "print(hashlib.sha256(data).hexdigest())"
    )
    tests = Path(__file__).parents[1]
    import hashlib

    run = subprocess.run(
        [sys.executable, "-c", code, str(tests), str(tests.parent / "src")],
        capture_output=True,
        text=True,
        check=True,
        env={"PYTHONHASHSEED": "4321", "PATH": ""},
    )
    assert run.stdout.strip() == hashlib.sha256(data).hexdigest()


def test_times_come_from_the_stamp_alone() -> None:
    """The properties carry the round's time in UTC; every entry of the zip the same fixed date."""
    data = write_worksheet(made_worksheet(stamp="2031-02-03T06:05:06+02:00"))
    core = parts_of(data)["docProps/core.xml"]
    assert core.count("2031-02-03T04:05:06Z") == 2
    with zipfile.ZipFile(io.BytesIO(data)) as archive:
        assert {entry.date_time for entry in archive.infolist()} == {(1980, 1, 1, 0, 0, 0)}
        assert archive.namelist()[0] == "[Content_Types].xml"
    with pytest.raises(RelookError, match="not an ISO time"):
        write_worksheet(made_worksheet(stamp="yesterday"))


def test_no_rows_make_a_file_that_still_opens() -> None:
    """An empty worksheet is odd, not broken."""
    worksheet = made_worksheet(rows=())
    assert opened(worksheet)["Queue"].max_row == 1
    assert [column.header for column in columns_of(worksheet)][:2] == ["row code", "item"]


def test_a_row_of_another_variable_still_has_a_look() -> None:
    """A row that names a variable the sheet does not declare is written, not refused."""
    row = SheetRow(key="K", item="i", variable="unknown", shown=("t", "s"), competing=("x",))
    assert opened(made_worksheet(rows=(row,)))["Queue"]["F2"].value == "x"
