"""Two thousand damaged workbooks: never a traceback, never a decision that nobody made or lost."""

from __future__ import annotations

import io
import random
import zipfile
from collections import Counter

import pytest
from openpyxl import Workbook

from reference.small_project import edited, fill, make_project, make_worksheet, queue_of
from relook.errors import RelookError
from relook.project.returning.checking import Sent
from relook.project.returning.collecting import check_returned, sent_rows
from relook.project.returning.returns import Returned
from relook.worksheet.write import write_worksheet

DECIDED = {0: "delay", 1: "staff", 2: "price", 4: "delay"}
PARTS = (
    "xl/worksheets/sheet2.xml",
    "xl/workbook.xml",
    "xl/_rels/workbook.xml.rels",
    "xl/styles.xml",
)


@pytest.fixture(scope="module")
def sent(tmp_path_factory: pytest.TempPathFactory) -> Sent:
    return sent_rows(make_project(tmp_path_factory.mktemp("sent"))[0])


@pytest.fixture(scope="module")
def filled() -> bytes:
    return fill(write_worksheet(make_worksheet()), dict(DECIDED))


def outcome(data: bytes, sent: Sent) -> tuple[dict[str, str | None], set[str], bool]:
    """Return what would be taken, the items reported, and whether the file was refused."""
    returned = Returned(name="a.xlsx", suffix=".xlsx", data=data, digest="0" * 64)
    try:
        checked = check_returned(returned, sent, seen=False).checked
    except RelookError as error:
        refusal = error
    else:
        refusal = None
    if refusal is not None:
        assert refusal.where is not None
        assert refusal.where.file == "a.xlsx"
        assert refusal.mend
        return {}, set(), True
    taken = {each.sent.row.item: each.reading.label for each in checked.candidates.values()}
    reports = [*checked.rejected, *checked.edited]
    assert all(report.reason for report in reports)
    return taken, {report.item for report in reports}, False


ITEMS = {f"remark {number + 1:02d}": label for number, label in DECIDED.items()}


def test_flipped_bytes(filled: bytes, sent: Sent) -> None:
    """A byte changed anywhere in the file: all decisions, or a refusal; checksums see to it."""
    draw = random.Random(1)
    refused = 0
    for _ in range(1000):
        data = bytearray(filled)
        for _ in range(draw.choice((1, 1, 4))):
            data[draw.randrange(len(data))] ^= 1 << draw.randrange(8)
        taken, _, was_refused = outcome(bytes(data), sent)
        refused += was_refused
        assert was_refused or taken == ITEMS
    assert 0 < refused < 1000


def test_cut_files(filled: bytes, sent: Sent) -> None:
    """A file cut anywhere is refused."""
    draw = random.Random(2)
    for _ in range(200):
        _, _, refused = outcome(filled[: draw.randrange(len(filled) - 30)], sent)
        assert refused


def test_mutated_xml(filled: bytes, sent: Sent) -> None:
    """XML altered and zipped anew: no traceback, and nothing is taken that is no declared label."""
    draw = random.Random(3)
    source = zipfile.ZipFile(io.BytesIO(filled))
    parts = {name: source.read(name) for name in source.namelist()}
    tokens = [
        b"<",
        b">",
        b'"',
        b"&",
        b"/",
        b"<c>",
        b"</row>",
        b"<row r='9'/>",
        b"<v>9</v>",
        b"99999999",
    ]
    refused = Counter[bool]()
    for _ in range(700):
        name = draw.choice([part for part in PARTS if part in parts])
        text = bytearray(parts[name])
        at = draw.randrange(len(text))
        if draw.random() < 0.5:
            text[at : at + draw.randrange(1, 30)] = draw.choice(tokens)
        else:
            text[at] = draw.randrange(32, 127)
        taken, _, was_refused = outcome(_zipped(parts | {name: bytes(text)}), sent)
        refused[was_refused] += 1
        assert set(taken.values()) <= {"delay", "staff", "price", "Ja", "7", None}
    assert len(refused) == 2


def _zipped(parts: dict[str, bytes]) -> bytes:
    out = io.BytesIO()
    with zipfile.ZipFile(out, "w", zipfile.ZIP_STORED) as target:
        for name, part in parts.items():
            target.writestr(name, part)
    return out.getvalue()


JUNK = (
    "delay",
    "dely",
    "",
    None,
    7,
    0.5,
    True,
    "=A1",
    "#N/A",
    "withdraw",
    "cannot be coded",
    "x" * 300,
)


def test_edited_cells(filled: bytes, sent: Sent) -> None:
    """Cells of a sheet altered at random: each decision is taken, or its row or cell reported."""
    draw = random.Random(4)
    for _ in range(100):
        cells = [
            (draw.randrange(2, 8), draw.randrange(1, 10), draw.choice(JUNK))
            for _ in range(draw.randrange(1, 4))
        ]

        def change(book: Workbook, cells: list[tuple[int, int, object]] = cells) -> None:
            for row, at, value in cells:
                queue_of(book).cell(row, at).value = value  # type: ignore[assignment]

        taken, reported, refused = outcome(edited(filled, change), sent)
        assert not refused
        touched = {row for row, at, _ in cells if at in (1, 7)}
        for number, label in DECIDED.items():
            item = f"remark {number + 1:02d}"
            if number + 2 not in touched and item not in reported:
                assert taken[item] == label
