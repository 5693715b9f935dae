"""A small project with one round sent, and returned worksheets filled in by hand.

Invented: remarks about a ferry line, coded for topic and severity.
"""

from __future__ import annotations

import hashlib
import io
import re
import zipfile
from collections.abc import Callable, Mapping, Sequence
from datetime import UTC, datetime
from pathlib import Path

from openpyxl import Workbook, load_workbook
from openpyxl.worksheet.worksheet import Worksheet as XlsxSheet

from relook.project.archive.decidable import SHEET_VARIABLES, variables_to_settings
from relook.project.archive.rounds import Round, RoundRow, RoundWorksheet
from relook.project.setup.folder import Project, write_whole
from relook.worksheet.keys import adjudicator_id, evidence_digests, row_keys, worksheet_id
from relook.worksheet.layout import evidence_cells
from relook.worksheet.model import SheetRow, SheetVariable, Worksheet
from relook.worksheet.write import write_worksheet

SECRET = bytes(range(32))
PROJECT_ID = "k7f3ferry"
NOW = datetime(2026, 3, 1, 9, 0, tzinfo=UTC)
TOPICS = ("delay", "staff", "price", "Ja", "7")
TOPIC = SheetVariable(name="topic", entry="choice", labels=TOPICS)
SEVERITY = SheetVariable(name="severity", entry="number", low=0.0, high=10.0)
THEMES = SheetVariable(name="themes", entry="set", labels=("food", "noise", "view"), separator=";")
SETTINGS = f"""format = 1
project = "{PROJECT_ID}"
[labels]
files = ["labels.csv"]
item = "item"
coder = "coder"
[variables.topic]
column = "topic"
difference = "nominal"
labels = ["delay", "staff", "price", "Ja", "7"]
[variables.severity]
column = "severity"
difference = "interval"
[worksheet]
adjudicators = ["Ada", "Ben"]
"""


def make_worksheet(
    *,
    adjudicator: str = "Ada",
    number: int = 1,
    n_items: int = 6,
    variables: Sequence[SheetVariable] = (TOPIC,),
) -> Worksheet:
    """Return a worksheet of a few items, a row for each variable."""
    who = adjudicator_id(SECRET, adjudicator)
    name = worksheet_id(SECRET, number, who)
    pairs = [(f"remark {item:02d}", each) for item in range(1, n_items + 1) for each in variables]
    keys = row_keys(SECRET, name, [(item, each.name) for item, each in pairs])
    rows = tuple(
        SheetRow(
            key=key,
            item=item,
            variable=each.name,
            shown=(f"The boat of {item} was late, and nobody said why.",),
            competing=(each.labels[:2] if each.labels else ("1", "4")),
        )
        for key, (item, each) in zip(keys, pairs, strict=True)
    )
    return Worksheet(
        id=name,
        project=PROJECT_ID,
        title="Ferry",
        round=number,
        adjudicator=adjudicator,
        variables=tuple(variables),
        shown_columns=("text",),
        reasons=("coder slip", "item ambiguous"),
        reveal="labels",
        rows=rows,
        may_show_other_labels=False,
        stamp="2026-02-01T09:00:00+00:00",
    )


def make_project(
    root: Path, worksheets: Sequence[Worksheet] | None = None, *, settings: str = SETTINGS
) -> tuple[Project, dict[str, bytes]]:
    """Make a project folder in which the given worksheets were sent; return it and their bytes."""
    sheets = [make_worksheet()] if worksheets is None else list(worksheets)
    root.mkdir(parents=True, exist_ok=True)
    (root / "relook.toml").write_text(settings, encoding="utf-8")
    write_whole(root / ".relook" / "secret", SECRET.hex().encode("ascii") + b"\n")
    project = Project.open(root)
    sent: dict[str, bytes] = {}
    for number in sorted({sheet.round for sheet in sheets}):
        mine = [sheet for sheet in sheets if sheet.round == number]
        for sheet in mine:
            name = sheet.adjudicator if number == 1 else f"{sheet.adjudicator} {number}"
            sent[name] = write_worksheet(sheet)
            write_whole(project.worksheets_folder(number) / f"{name}.xlsx", sent[name])
        held = _round(number, mine, sent)
        write_whole(project.round_folder(number) / "round.json", held.to_json())
        project.returned_folder(number).mkdir(exist_ok=True)
    return project, sent


def _round(number: int, sheets: Sequence[Worksheet], sent: Mapping[str, bytes]) -> Round:
    rows = []
    written = []
    for sheet in sheets:
        who = adjudicator_id(SECRET, sheet.adjudicator)
        name = sheet.adjudicator if number == 1 else f"{sheet.adjudicator} {number}"
        written.append(
            RoundWorksheet(
                id=sheet.id,
                adjudicator=who,
                file=f"{name}.xlsx",
                digest=hashlib.sha256(sent[name]).hexdigest(),
                n_rows=len(sheet.rows),
            )
        )
        for row, evidence in zip(sheet.rows, evidence_cells(sheet), strict=True):
            rows.append(
                RoundRow(
                    key=row.key,
                    item=row.item,
                    variable=row.variable,
                    worksheet=sheet.id,
                    adjudicator=who,
                    kind="disputed",
                    labels_digest="d" * 12,
                    evidence=evidence_digests(evidence),
                )
            )
    variables = {each.name: each for sheet in sheets for each in sheet.variables}
    return Round(
        number=number,
        made="2026-02-01T09:00:00+00:00",
        relook="0.1.0",
        project=PROJECT_ID,
        seed=1,
        settings={SHEET_VARIABLES: variables_to_settings(variables.values())},
        label_files={},
        variables=(),
        strata=(),
        worksheets=tuple(written),
        rows=tuple(rows),
    )


def edited(data: bytes, change: Callable[[Workbook], object]) -> bytes:
    """Return a workbook's bytes after a change, as a program that edits it would save them."""
    book = load_workbook(io.BytesIO(data))
    change(book)
    out = io.BytesIO()
    book.save(out)
    return out.getvalue()


def queue_of(book: Workbook) -> XlsxSheet:
    """Return the queue sheet."""
    return book["Queue"]


def header_row(sheet: XlsxSheet) -> int:
    """Return the 1-based row of the headers."""
    for row in sheet.iter_rows():
        if any(cell.value == "decision" for cell in row):
            return int(row[0].row)
    raise AssertionError("there is no header row")


def column(sheet: XlsxSheet, header: str) -> int:
    """Return the 1-based column of a header."""
    for cell in sheet[header_row(sheet)]:
        if cell.value == header:
            return int(cell.column)
    raise AssertionError(f"there is no column {header}")


def fill(
    data: bytes, decisions: Mapping[int, object], *, header: str = "decision", modified: int = 0
) -> bytes:
    """Return a worksheet with decisions typed in; 0 is its first row below the header.

    `modified` counts minutes: when the file says that it was saved.
    """

    def change(book: Workbook) -> None:
        sheet = queue_of(book)
        top, at = header_row(sheet), column(sheet, header)
        for index, value in decisions.items():
            sheet.cell(top + 1 + index, at).value = value  # type: ignore[assignment]

    filled = edited(data, change)
    return _stamped(filled, modified)


def _stamped(data: bytes, minutes: int) -> bytes:
    """Set the time of the last save, so that tests do not depend on the clock."""
    stamp = f"2026-02-02T{minutes // 60:02d}:{minutes % 60:02d}:00Z".encode()
    source = zipfile.ZipFile(io.BytesIO(data))
    out = io.BytesIO()
    with zipfile.ZipFile(out, "w", zipfile.ZIP_DEFLATED) as target:
        for info in source.infolist():
            part = source.read(info.filename)
            if info.filename == "docProps/core.xml":
                part = re.sub(rb"(<dcterms:modified[^>]*>)[^<]*", rb"\g<1>" + stamp, part)
            target.writestr(zipfile.ZipInfo(info.filename), part, zipfile.ZIP_DEFLATED)
    return out.getvalue()


def give_back(project: Project, name: str, data: bytes, *, number: int = 1) -> Path:
    """Put a returned file where the lead puts it."""
    path = project.returned_folder(number) / name
    path.write_bytes(data)
    return path
