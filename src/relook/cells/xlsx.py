"""Cells of an .xlsx file, streamed.

The parts are read here rather than through openpyxl because a file that comes back by mail may be
hostile or damaged: a general reader unfolds a whole row before anyone can count its cells, drops
the stored values of formulas, and raises a dozen kinds of errors. Tests hold this reader to
openpyxl's results on honest files.

Reference: ECMA-376, Office Open XML File Formats, Part 1 (5th edition, 2016), §18.3 and §18.8.
"""

from __future__ import annotations

import posixpath
import re
from collections.abc import Mapping

from relook.cells.limits import MOST_COMMENTS, MOST_SHEETS, Meter, column_number
from relook.cells.model import Book, Sheet
from relook.cells.package import SAVE_AGAIN, Package
from relook.cells.xlsx_sheet import SheetReader
from relook.cells.xlsx_values import Styles, unescape
from relook.errors import Place, RelookError

_MAIN = "http://schemas.openxmlformats.org/spreadsheetml/2006/main "
_OFFICE = "http://schemas.openxmlformats.org/officeDocument/2006/"
_RELATION = "http://schemas.openxmlformats.org/package/2006/relationships Relationship"
_PROPERTY = f"{_OFFICE}custom-properties property"
_MODIFIED = "http://purl.org/dc/terms/ modified"
_UTC = re.compile(r"\d{4}-\d\d-\d\dT\d\d:\d\d:\d\dZ", re.ASCII)
_REFERENCE = re.compile(r"([A-Z]{1,3})([1-9]\d{0,6})", re.ASCII)
#: What stands before the text where a program keeps threads of comments elsewhere.
_THREAD = "[Threaded comment]"
_STRICT = "http://purl.oclc.org/ooxml/"


def read_xlsx(package: Package) -> Book:
    """Return the cells of every worksheet.

    Raises
    ------
    RelookError
        The file is damaged, has no sheets, or unfolds beyond the limits.
    """
    file = package.file
    workbook = _workbook_part(package)
    related = _relations(package, workbook)
    listed, starts_1904 = _sheets(package, workbook)
    by_kind = dict(related.values())
    strings = _shared_strings(package, by_kind.get("sharedStrings"))
    styles = Styles.read(package, by_kind.get("styles"), starts_1904=starts_1904)
    meter = Meter(file)
    sheets = []
    for title, relation, hidden in listed:
        kind, target = related.get(relation, ("", ""))
        if kind != "worksheet":  # a sheet that is only a chart has no cells
            continue
        if target not in package.names:
            raise RelookError(
                f'the sheet "{title}" is missing from the file', where=Place(file), mend=SAVE_AGAIN
            )
        reader = SheetReader(title, strings, styles, meter)
        rows = reader.read(package, target)
        comments = _comments(package, target)
        sheets.append(Sheet(title, rows, hidden, tuple(reader.merged), comments))
    if not sheets:
        raise RelookError("the file holds no sheet", where=Place(file), mend=SAVE_AGAIN)
    return Book(
        file,
        "xlsx",
        tuple(sheets),
        _custom_properties(package),
        modified=_last_saved(package),
    )


def _relations(package: Package, part: str) -> dict[str, tuple[str, str]]:
    """Return kind and target of each relation of a part, by relation id."""
    folder, name = posixpath.split(part)
    rels = posixpath.join(folder, "_rels", f"{name}.rels")
    found: dict[str, tuple[str, str]] = {}

    def start(tag: str, attributes: Mapping[str, str]) -> None:
        if tag == _RELATION and attributes.get("TargetMode") != "External":
            target = attributes.get("Target", "")
            full = posixpath.normpath(posixpath.join("/", folder, target)).lstrip("/")
            kind = attributes.get("Type", "").rpartition("/")[2]
            found[attributes.get("Id", "")] = (kind, full)

    if rels in package.names:
        package.parse(rels, start)
    return found


def _workbook_part(package: Package) -> str:
    for kind, target in _relations(package, "").values():
        if kind == "officeDocument" and target in package.names:
            return target
    if "xl/workbook.xml" in package.names:
        return "xl/workbook.xml"
    raise RelookError("the file holds no workbook", where=Place(package.file), mend=SAVE_AGAIN)


def _sheets(package: Package, part: str) -> tuple[list[tuple[str, str, bool]], bool]:
    """Return title, relation and whether hidden of each sheet; whether dates begin in 1904."""
    listed: list[tuple[str, str, bool]] = []
    starts_1904 = False

    def start(tag: str, attributes: Mapping[str, str]) -> None:
        nonlocal starts_1904
        if tag.startswith(_STRICT):
            raise RelookError(
                'the file was saved as "Strict Open XML", which is not read',
                where=Place(package.file),
                mend='save it as "Excel workbook (.xlsx)", without "Strict", and use that file',
            )
        if tag == f"{_MAIN}sheet":
            hidden = attributes.get("state", "visible") != "visible"
            relation = attributes.get(f"{_OFFICE}relationships id", "")
            listed.append((unescape(attributes.get("name", "")), relation, hidden))
        elif tag == f"{_MAIN}workbookPr":
            starts_1904 = attributes.get("date1904", "0") in ("1", "true")

    package.parse(part, start)
    if len(listed) > MOST_SHEETS:
        raise RelookError(
            f"the file holds {len(listed):,} sheets, more than {MOST_SHEETS}",
            where=Place(package.file),
            mend="keep only the sheets that are needed",
        )
    return listed, starts_1904


def _shared_strings(package: Package, part: str | None) -> list[str]:
    """Return the texts that cells refer to by number; readings printed above text are left out."""
    strings: list[str] = []
    pieces: list[str] = []
    state = {"inside": False, "phonetic": False}
    item, run, phonetic = f"{_MAIN}si", f"{_MAIN}t", f"{_MAIN}rPh"

    def start(tag: str, _: Mapping[str, str]) -> None:
        if tag == run:
            state["inside"] = not state["phonetic"]
        elif tag == item:
            pieces.clear()
        elif tag == phonetic:
            state["phonetic"] = True

    def end(tag: str) -> None:
        if tag == run:
            state["inside"] = False
        elif tag == item:
            strings.append(unescape("".join(pieces)))
        elif tag == phonetic:
            state["phonetic"] = False

    def text(data: str) -> None:
        if state["inside"]:
            pieces.append(data)

    if part is not None and part in package.names:
        package.parse(part, start, end, text)
    return strings


def _comments(package: Package, sheet: str) -> tuple[tuple[int, int, str], ...]:
    """Return the comments of a sheet, of a thread what its first comment says (§18.7)."""
    parts = dict(_relations(package, sheet).values())
    part = parts.get("comments", "")
    found: list[tuple[int, int, str]] = []
    pieces: list[str] = []
    at = ""
    inside = False

    def start(tag: str, attributes: Mapping[str, str]) -> None:
        nonlocal at, inside
        if tag == f"{_MAIN}comment":
            at = attributes.get("ref", "")
            pieces.clear()
        inside = tag == f"{_MAIN}t"

    def end(tag: str) -> None:
        nonlocal inside
        inside = False
        place = _REFERENCE.fullmatch(at)
        if tag == f"{_MAIN}comment" and place and len(found) < MOST_COMMENTS:
            said = unescape("".join(pieces))
            if said.startswith(_THREAD):
                said = said.partition("Comment:")[2]
            found.append((int(place[2]), column_number(place[1]), said.strip()))

    def text(data: str) -> None:
        if inside:
            pieces.append(data)

    if part in package.names:
        package.parse(part, start, end, text)
    return tuple(each for each in found if each[2])


def _custom_properties(package: Package) -> dict[str, str]:
    part = "docProps/custom.xml"
    if part not in package.names:
        return {}
    found: dict[str, str] = {}
    current = ""

    def start(tag: str, attributes: Mapping[str, str]) -> None:
        nonlocal current
        if tag == _PROPERTY:
            current = attributes.get("name", "")
            found[current] = ""

    def text(data: str) -> None:
        if current:
            found[current] += data

    package.parse(part, start, None, text)
    return {name: " ".join(value.split()) for name, value in found.items()}


def _last_saved(package: Package) -> str:
    """Return the time of the last save where it is told in UTC, as ECMA-376 has it."""
    part = "docProps/core.xml"
    if part not in package.names:
        return ""
    pieces: list[str] = []
    inside = False

    def start(tag: str, _: Mapping[str, str]) -> None:
        nonlocal inside
        inside = tag == _MODIFIED

    def end(_: str) -> None:
        nonlocal inside
        inside = False

    def text(data: str) -> None:
        if inside:
            pieces.append(data)

    package.parse(part, start, end, text)
    told = "".join(pieces).strip()
    return told if _UTC.fullmatch(told) else ""
