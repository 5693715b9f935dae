"""Files that must not be opened: told what they are, at once, in little memory."""

from __future__ import annotations

import io
import struct
import time
import tracemalloc
import zipfile

import pytest
from openpyxl import Workbook

from reference.ods_files import MIMETYPE, ods, row, text, zipped
from relook.cells.opening import open_book
from relook.errors import RelookError

MAIN = "http://schemas.openxmlformats.org/spreadsheetml/2006/main"
OLD = b"\xd0\xcf\x11\xe0\xa1\xb1\x1a\xe1"
MOST_SECONDS = 1.0
MOST_MEMORY = 64 * 2**20


def workbook(replaced: dict[str, bytes | str] | None = None) -> bytes:
    """Return a small workbook with parts replaced."""
    book = Workbook()
    book.active["A1"] = "text"
    out = io.BytesIO()
    book.save(out)
    source = zipfile.ZipFile(out)
    parts: dict[str, bytes | str] = {name: source.read(name) for name in source.namelist()}
    return zipped(parts | (replaced or {}))


def sheet(rows: str) -> dict[str, bytes | str]:
    return {
        "xl/worksheets/sheet1.xml": f'<worksheet xmlns="{MAIN}"><sheetData>{rows}</sheetData></worksheet>'
    }


def doctype(root: str) -> str:
    entities = "".join(f'<!ENTITY e{n} "{f"&e{n - 1};" * 10}">' for n in range(1, 10))
    return f'<!DOCTYPE x [<!ENTITY e0 "ha">{entities}]>{root}'


def flagged_as_encrypted(data: bytes) -> bytes:
    raw = bytearray(data)
    for mark, offset in ((b"PK\x03\x04", 6), (b"PK\x01\x02", 8)):
        at = raw.find(mark)
        while at >= 0:
            raw[at + offset] |= 1
            at = raw.find(mark, at + 4)
    return bytes(raw)


def unknown_packing(data: bytes) -> bytes:
    raw = bytearray(data)
    for mark, offset in ((b"PK\x03\x04", 8), (b"PK\x01\x02", 10)):
        at = raw.find(mark)
        while at >= 0:
            raw[at + offset : at + offset + 2] = struct.pack("<H", 97)
            at = raw.find(mark, at + 4)
    return bytes(raw)


FILES = {
    "empty": (b"", "empty"),
    "password": (OLD + b"\0" * 600 + "EncryptedPackage".encode("utf-16-le"), "password"),
    "old xls": (OLD + b"\0" * 600, "old .xls"),
    "web page": (b"<html><body><table>", "web page"),
    "pdf": (b"%PDF-1.7", "a PDF"),
    "xml": (b'<?xml version="1.0"?><a/>', "an XML file"),
    "binary": (b"\x00\x01\x02\x03" * 50, "neither a spreadsheet nor a text"),
    "archive": (zipped({"a.txt": "a"}), "zip archive"),
    "text document": (
        zipped({"[Content_Types].xml": "<a/>", "word/document.xml": "<a/>"}),
        "no spreadsheet",
    ),
    "xlsb": (zipped({"[Content_Types].xml": "<a/>", "xl/workbook.bin": "a"}), "xlsb"),
    "ods of another kind": (
        zipped({"mimetype": MIMETYPE.replace("spreadsheet", "text")}),
        "no spreadsheet",
    ),
    "ods without content": (zipped({"mimetype": MIMETYPE}), "no content"),
    "ods with a password": (ods(row(text("a")), manifest="<encryption-data/>"), "password"),
    "truncated": (workbook()[:-300], "damaged"),
    "half": (workbook()[:2000], "damaged"),
    "strict": (
        workbook(
            {"xl/workbook.xml": '<workbook xmlns="http://purl.oclc.org/ooxml/spreadsheetml/main"/>'}
        ),
        "Strict",
    ),
    "no workbook": (zipped({"[Content_Types].xml": "<a/>"}), "no workbook"),
    "no sheets": (workbook({"xl/workbook.xml": f'<workbook xmlns="{MAIN}"/>'}), "no sheet"),
    "broken xml": (workbook(sheet("<row><c>")), "damaged"),
    "encrypted entries": (flagged_as_encrypted(workbook()), "encrypted"),
    "unknown packing": (unknown_packing(workbook()), "packed or encrypted"),
    "missing text": (workbook(sheet('<row r="1"><c r="A1" t="s"><v>99</v></c></row>')), "damaged"),
    "entities": (workbook({"xl/styles.xml": doctype(f'<styleSheet xmlns="{MAIN}"/>')}), "entities"),
    "entities in the sheet": (
        workbook(
            {"xl/worksheets/sheet1.xml": doctype(f'<worksheet xmlns="{MAIN}">&e9;</worksheet>')}
        ),
        "entities",
    ),
    "entities in ods": (
        zipped({"mimetype": MIMETYPE, "content.xml": doctype("<a>&e9;</a>")}),
        "entities",
    ),
    "far corner": (
        workbook(sheet('<row r="1048576"><c r="XFD1048576"><v>1</v></c></row>')),
        "XFD1048576 lies far",
    ),
    "far row": (
        workbook(sheet('<row r="1048576"><c r="A1048576"><v>1</v></c></row>')),
        "empty rows below",
    ),
    "far right cells": (
        workbook(
            sheet("".join(f'<row r="{n}"><c r="EZZ{n}"><v>1</v></c></row>' for n in range(1, 3000)))
        ),
        "empty cells",
    ),
    "a very long row": (
        workbook(sheet("<row>" + "<c><v>1</v></c>" * 20_000 + "</row>")),
        "lies far beyond",
    ),
    "empty bomb": (workbook(sheet(" " * 30_000_000)), "unfolds into"),
    "bomb in a part that is not read": (
        workbook({"xl/media/x.bin": b"\0" * 40_000_000}),
        "unfolds into",
    ),
    "many parts": (
        zipped({"[Content_Types].xml": "<a/>"} | {f"p{n}": "" for n in range(5000)}),
        "5,001 parts",
    ),
}


@pytest.mark.parametrize("name", FILES)
def test_refused_with_a_clear_sentence(name: str) -> None:
    """Each is refused with what it is, the file's name and a mend, in under a second."""
    data, said = FILES[name]
    begun = time.perf_counter()
    with pytest.raises(RelookError, match=said) as caught:
        open_book(data, "returned/a.xlsx")
    assert time.perf_counter() - begun < MOST_SECONDS
    assert caught.value.where is not None
    assert caught.value.where.file == "returned/a.xlsx"
    assert caught.value.mend


@pytest.mark.parametrize(
    "name",
    ["far corner", "far row", "far right cells", "empty bomb", "entities", "a very long row"],
)
def test_refused_in_little_memory(name: str) -> None:
    """What unfolds is stopped before it fills memory."""
    data, _ = FILES[name]
    tracemalloc.start()
    with pytest.raises(RelookError):
        open_book(data, "a.xlsx")
    _, peak = tracemalloc.get_traced_memory()
    tracemalloc.stop()
    assert peak < MOST_MEMORY


def test_a_large_honest_table_is_read() -> None:
    """Limits do not stand in the way of a table with many rows."""
    rows = "".join(
        f'<row r="{n}"><c r="A{n}"><v>{n}</v></c><c r="B{n}"><v>{n % 7}</v></c></row>'
        for n in range(1, 30_001)
    )
    assert len(open_book(workbook(sheet(rows)), "a.xlsx").sheets[0].rows) == 30_000
