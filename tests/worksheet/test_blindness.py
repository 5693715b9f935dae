"""A blind worksheet gives nothing away, and nothing in it can be made to run."""

from __future__ import annotations

import io
import random
import re
from itertools import pairwise
from pathlib import Path

import numpy as np
import pytest
from openpyxl import load_workbook
from sklearn.ensemble import RandomForestClassifier
from sklearn.metrics import roc_auc_score
from sklearn.model_selection import StratifiedKFold, cross_val_predict

from reference.made_sheets import (
    REASONS,
    SECRET,
    TOPIC,
    converted,
    every_text,
    formulas_of,
    made_worksheet,
    parts_of,
)
from relook.worksheet.competing import (
    RowLabels,
    competing_labels,
    pairs_of,
    shown_order,
)
from relook.worksheet.keys import canonical_text
from relook.worksheet.lists_sheet import Lists
from relook.worksheet.model import CodeBookEntry, SheetRow, SheetVariable, Worksheet
from relook.worksheet.plan import Adjudicator, PlanItem, plan_worksheets
from relook.worksheet.write import write_worksheet

LABELS = ("delay", "crew", "comfort", "price", "other")
CODERS = ("zebedee", "yolanda", "xanthippe")


def made_round(seed: int, *, padded: bool = True) -> tuple[list[Worksheet], dict[str, str]]:
    """Make a round of 200 disputed and 120 audit items; return its sheets and the kind by row code.

    Rows come in ranked order: disputed ones with most labels first, audits last.
    """
    chance = random.Random(seed)
    secret = chance.randbytes(32)
    rows = []
    for at in range(200):
        size = chance.choice((2, 2, 2, 3, 3, 4))
        given = tuple(chance.sample(LABELS, size))
        rows.append(RowLabels(item=f"r{at:03}", variable="topic", kind="disputed", given=given))
    rows.sort(key=lambda row: -len(row.given))
    for at in range(200, 320):
        given = tuple(chance.sample(LABELS, chance.choice((1, 1, 1, 1, 2))))
        rows.append(RowLabels(item=f"r{at:03}", variable="topic", kind="audit", given=given))
    # Item ids are the lead's own; here they carry no order of their own.
    names = [f"r{number}" for number in chance.sample(range(1_000, 9_999), len(rows))]
    rows = [
        RowLabels(item=name, variable=row.variable, kind=row.kind, given=row.given)
        for name, row in zip(names, rows, strict=True)
    ]
    shown = {(row.item, "topic"): row.given for row in rows}
    if padded:
        shown = competing_labels(rows, pairs_of(rows), reveal="labels", secret=secret)
    plan = plan_worksheets(
        [
            PlanItem(item=row.item, variables=("topic",), kind=row.kind, coders=CODERS)
            for row in rows
        ],
        [Adjudicator(id="a-1", name="Ada"), Adjudicator(id="a-2", name="Ben")],
        secret=secret,
        round_number=1,
        overlap=0.1,
    )
    texts = {row.item: "word " * chance.randrange(3, 40) for row in rows}
    sheets, kinds = [], {}
    for planned in plan.worksheets:
        made = []
        for row in planned.rows:
            kinds[row.key] = row.kind
            order = shown_order(
                shown[row.item, "topic"],
                item=row.item,
                variable="topic",
                worksheet=planned.id,
                secret=secret,
                numeric=False,
            )
            made.append(
                SheetRow(
                    key=row.key,
                    item=row.item,
                    variable="topic",
                    shown=(texts[row.item], "ferry"),
                    competing=order,
                )
            )
        sheets.append(
            made_worksheet(rows=tuple(made), id=planned.id, adjudicator=planned.adjudicator.name)
        )
    return sheets, kinds


def features_of(worksheet: Worksheet) -> tuple[list[list[float]], list[str]]:
    """Read back from the file whatever of a row could tell its kind, its words aside.

    How many labels, how they are ordered, the characters of the code, the place in the sheet, the
    length of the text, the height, and which style each cell has.
    """
    sheet = load_workbook(io.BytesIO(write_worksheet(worksheet)))["Queue"]
    headers = [cell.value for cell in sheet[1]]
    at = [number for number, header in enumerate(headers) if header.startswith("label")]
    rows, keys = [], []
    for number in range(2, sheet.max_row + 1):
        cells = sheet[number]
        labels = [cells[place].value for place in at if cells[place].value]
        ranks = [LABELS.index(label) for label in labels]
        rising = sum(a < b for a, b in pairwise(ranks))
        rows.append(
            [
                len(labels),
                rising,
                float(ranks == sorted(ranks)),
                *(ord(character) for character in cells[0].value if character != "-"),
                number / sheet.max_row,
                len(cells[2].value),
                sheet.row_dimensions[number].height,
                *(cells[place].style_id for place in range(len(headers)) if place not in at),
            ]
        )
        keys.append(cells[0].value)
    return rows, keys


def audits_told(seed: int, *, padded: bool) -> float:
    """Return how well a forest tells audits from the rest: area under the curve, chance is 0.5."""
    sheets, kinds = made_round(seed, padded=padded)
    read = [features_of(sheet) for sheet in sheets]
    features = np.array([row for rows, _ in read for row in rows])
    is_audit = np.array([kinds[key] == "audit" for _, keys in read for key in keys])
    forest = RandomForestClassifier(n_estimators=40, min_samples_leaf=3, random_state=seed)
    folds = StratifiedKFold(5, shuffle=True, random_state=seed)
    chances = cross_val_predict(forest, features, is_audit, cv=folds, method="predict_proba")
    return float(roc_auc_score(is_audit, chances[:, 1]))


def test_a_classifier_cannot_tell_audits_from_disputed_rows() -> None:
    """Six made rounds (seeds 1–6) of about 350 rows: on average within 0.06 of chance.

    The area's standard error is about 0.032 in one round (Hanley & McNeil 1982) and 0.013 over
    six, so the margin is four and a half of them.
    """
    areas = [audits_told(seed, padded=True) for seed in range(1, 7)]
    assert abs(float(np.mean(areas)) - 0.5) < 0.06


def test_the_classifier_would_tell_rows_that_show_given_labels_only() -> None:
    """The same features give unpadded audits away, so the test above can fail."""
    assert audits_told(1, padded=False) > 0.85


def test_no_part_of_the_file_names_coders_kinds_or_the_secret() -> None:
    """Every part unzipped: cells, hidden sheet, names, properties, rules, styles."""
    for worksheet in made_round(3)[0]:
        data = write_worksheet(worksheet)
        said = every_text(data).casefold()
        raw = "".join(parts_of(data).values()).casefold()
        for word in (*CODERS, "disputed", "audit", "split", "recheck", "unanimous", "stratum",
                     "rank", "tally", "seed", "secret", SECRET.hex()):  # fmt: skip
            assert re.search(rf"(?<![a-z]){word}(?![a-z])", said) is None, word
            assert re.search(rf"(?<![a-z]){word}(?![a-z])", raw) is None, word


def test_no_part_of_the_file_is_more_than_a_worksheet_needs() -> None:
    """No comments, drawings, external links, macros, or defined names beyond filter and titles."""
    parts = parts_of(write_worksheet(made_worksheet()))
    assert sorted(parts) == [
        "[Content_Types].xml", "_rels/.rels", "docProps/app.xml", "docProps/core.xml",
        "docProps/custom.xml", "xl/_rels/workbook.xml.rels", "xl/styles.xml",
        "xl/theme/theme1.xml", "xl/workbook.xml", "xl/worksheets/sheet1.xml",
        "xl/worksheets/sheet2.xml", "xl/worksheets/sheet3.xml", "xl/worksheets/sheet4.xml",
    ]  # fmt: skip
    names = re.findall(r'<definedName name="([^"]*)"', parts["xl/workbook.xml"])
    assert set(names) <= {"_xlnm.Print_Titles", "_xlnm._FilterDatabase"}
    assert ">relook</dc:creator>" in parts["docProps/core.xml"]


def test_the_other_labels_of_a_shared_item_stand_in_another_order() -> None:
    """Two adjudicators who compare an item see no common order, hence none with a meaning."""
    orders = [
        shown_order(
            LABELS, item=f"i{at}", variable="v", worksheet=sheet, secret=SECRET, numeric=False
        )
        for at in range(200)
        for sheet in ("first", "second")
    ]
    same = sum(orders[at] == orders[at + 1] for at in range(0, 400, 2))
    assert same <= 10  # 200/120 expected; more than 10 has a chance below 1e-5


HOSTILE = (
    "=1+1",
    '=HYPERLINK("http://evil.example","click")',
    "=cmd|'/c calc'!A0",
    "+1+1",
    "-1+1",
    "@SUM(1+1)",
    "\t=1+1",
    "\r=1+1",
    "=DDE(\"soffice\",\"x\",\"y\")",
    "a_x000D_b",
    "a\x07b",
    "]]><f>1+1</f>&amp;<script>",
    "'=1+1",
    "file:///etc/passwd",
    "javascript:alert(1)",
    "=[other.xlsx]Sheet1!A1",
)  # fmt: skip


def hostile_worksheet() -> Worksheet:
    """Put hostile text wherever text from outside goes."""
    labels = HOSTILE[:6]
    variable = SheetVariable(
        name="=1+2",
        entry="choice",
        labels=labels,
        code_book=tuple(
            CodeBookEntry(label=label, meaning=label, example=label, parent=label)
            for label in labels
        ),
    )
    rows = tuple(
        SheetRow(
            key=f"K{at}",
            item=text,
            variable="=1+2",
            shown=(text, text),
            competing=(text, "=1+1"),
            remarks=(text,),
        )
        for at, text in enumerate(HOSTILE)
    )
    return made_worksheet(
        rows=rows,
        variables=(variable, TOPIC),
        shown_columns=("=1+1", "@x"),
        reasons=(*REASONS, "=1+1", "+x"),
        adjudicator="=1+1",
        title="=1+1 & &P",
    )


def test_hostile_text_is_text_in_every_cell() -> None:
    """The only formula is our own, nothing is an error cell, and no part points outside."""
    data = write_worksheet(hostile_worksheet())
    assert len(formulas_of(data)) == 1
    parts = parts_of(data)
    assert not any("External" in part for part in parts.values())
    for name, part in parts.items():
        if name.startswith("xl/worksheets/"):
            assert re.findall(r'<c [^>]*t="(?:e|str|b)"', part) == []
            rules = re.findall(r"<formula1?>([^<]*)</formula1?>", part)
            assert not any("evil" in rule or "cmd" in rule for rule in rules)
    queue = load_workbook(io.BytesIO(data))["Queue"]
    for number, text in enumerate(HOSTILE, start=2):
        assert canonical_text(queue.cell(number, 2).value) == canonical_text(text)
        assert queue.cell(number, 2).data_type == "s"


@pytest.mark.libreoffice
@pytest.mark.parametrize("way", ["xlsx", "ods"])
def test_hostile_text_stays_text_through_another_program(way: str, tmp_path: Path) -> None:
    """Opened and saved by LibreOffice, straight and through .ods, it reads as it was sent."""
    worksheet = hostile_worksheet()
    data = converted(write_worksheet(worksheet), tmp_path, "xlsx", way)
    if way == "ods":
        data = converted(data, tmp_path, "ods", "xlsx")
    queue = load_workbook(io.BytesIO(data))["Queue"]
    for number, text in enumerate(HOSTILE, start=2):
        for column in (2, 3, 4):
            cell = queue.cell(number, column)
            assert cell.data_type == "s"
            assert canonical_text(cell.value) == canonical_text(text)
            assert cell.hyperlink is None
    assert [sheet.title for sheet in load_workbook(io.BytesIO(data)).worksheets][:3] == [
        "Start here", "Queue", "Code book",
    ]  # fmt: skip


@pytest.mark.libreoffice
def test_a_rows_choices_follow_it_when_rows_are_sorted(tmp_path: Path) -> None:
    """LibreOffice evaluates the rule's own formula in rows that were put in another order.

    The variables are named so that wildcards or a comparison without case would mix them up.
    """
    variables = (
        SheetVariable(name="tone", entry="choice", labels=("warm", "cold")),
        SheetVariable(name="Tone", entry="choice", labels=("one", "two", "three")),
        SheetVariable(name="t*", entry="choice", labels=("=odd", ">5", "a*", "x,y")),
        SheetVariable(name="crumb", entry="number", low=0, high=10),
    )
    book = load_workbook(
        io.BytesIO(write_worksheet(made_worksheet(3, variables=variables))),
    )
    queue = book["Queue"]
    place = {cell.value: cell.column for cell in queue[1]}
    last = queue.max_row
    values = [[cell.value for cell in row] for row in queue.iter_rows(min_row=2)]
    random.Random(5).shuffle(values)
    for number, row in enumerate(values, start=2):
        for column, value in enumerate(row, start=1):
            queue.cell(number, column).value = value
            if isinstance(value, str):
                queue.cell(number, column).data_type = "s"
    rules = queue.data_validations.dataValidation
    rule = next(rule for rule in rules if "OFFSET" in (rule.formula1 or ""))
    letter = queue.cell(1, place["variable"]).column_letter
    check = book.create_sheet("check")
    for number in range(2, last + 1):
        formula = rule.formula1.replace(f"${letter}2", f"Queue!${letter}{number}")
        check.cell(number - 1, 1).value = f"=ROWS({formula})"
        check.cell(number - 1, 2).value = f"=INDEX({formula},1)"
        check.cell(number - 1, 3).value = f"=INDEX({formula},ROWS({formula}))"
    for sheet in ("Start here", "Queue", "Code book"):
        book[sheet].sheet_state = "visible"
    saved = io.BytesIO()
    book.save(saved)
    back = converted(saved.getvalue(), tmp_path, "xlsx", "xlsx")
    read = load_workbook(io.BytesIO(converted(back, tmp_path, "xlsx", "xlsx")), data_only=True)
    names = [row[place["variable"] - 1] for row in values]
    expected = {
        variable.name: (
            len(variable.labels) + 2,
            variable.labels[0] if variable.labels else "cannot be coded",
            "withdraw",
        )
        for variable in variables
    }
    found = [tuple(cell.value for cell in row) for row in read["check"].iter_rows(max_col=3)]
    assert found == [expected[name] for name in names]
    kept = load_workbook(io.BytesIO(back))["Queue"].data_validations.dataValidation
    assert any("OFFSET" in (each.formula1 or "") for each in kept)


@pytest.mark.libreoffice
def test_progress_is_counted_by_the_program(tmp_path: Path) -> None:
    """Two decisions, in the third and the fifth row: two of six."""
    book = load_workbook(io.BytesIO(write_worksheet(made_worksheet())))
    queue = book["Queue"]
    decision = next(cell.column for cell in queue[1] if cell.value == "decision")
    queue.cell(3, decision).value = "crew"
    queue.cell(5, decision).value = "cannot be coded"
    saved = io.BytesIO()
    book.save(saved)
    back = converted(saved.getvalue(), tmp_path, "xlsx", "xlsx")
    start = load_workbook(io.BytesIO(back), data_only=True)["Start here"]
    assert "2 of 6" in [cell.value for row in start.iter_rows() for cell in row]


def test_lists_are_named_once() -> None:
    """One variable, or variables with the same labels, need no look-up at all."""
    lists = Lists(n_variables=1, n_choices=4, same_for_all=True, reasons="", ticks="")
    assert lists.choices("$E2") == "'_lists'!$H$2:$H$5"
