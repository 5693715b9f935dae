"""Text into cells, so that it stays text and comes back as it was.

A spreadsheet program takes `=…` for a formula, `00123` for a number and `1-2` for a date, and a
workbook cannot hold every character at all. Each rule here is applied wherever a workbook is
written, and whatever had to be altered is returned as a note, never done in silence.
"""

from __future__ import annotations

import re
from collections.abc import Iterable
from typing import TYPE_CHECKING
from urllib.parse import urlsplit

if TYPE_CHECKING:
    from openpyxl.cell.cell import Cell
    from openpyxl.styles.cell_style import StyleArray
    from openpyxl.worksheet.worksheet import Worksheet as OpenpyxlSheet

#: The most that a cell holds, in UTF-16 units; a program that finds more repairs the file.
MOST_UNITS = 32_767
#: The most line breaks that a cell holds.
MOST_BREAKS = 253
#: The most links that a sheet holds, and the most characters of one link.
MOST_LINKS = 65_530
MOST_LINK_LENGTH = 2_079
CUT_MARKER = " […cut: a cell holds no more]"
REPLACEMENT = "\N{REPLACEMENT CHARACTER}"

#: Not allowed in XML 1.0 (section 2.2), lone surrogates included.
_ILLEGAL = re.compile("[\x00-\x08\x0b\x0c\x0e-\x1f\ud800-\udfff\ufffe\uffff]")
#: `_x0041_` in a cell stands for the character U+0041 (ECMA-376-1, 22.9.2.19), so a text that
#: holds such letters literally has its underscore escaped. Looking ahead rather than consuming
#: finds the overlapping ones: `_x0041_x0042_`.
_ESCAPE_LIKE = re.compile("_(?=x[0-9A-Fa-f]{4}_)")
_ESCAPED = re.compile("_x([0-9A-Fa-f]{4})_")
_WEB_LINK = re.compile(r"https?://[^\s<>\"{}|\\^`]+", re.IGNORECASE)


def utf16_length(text: str) -> int:
    """Return the length in UTF-16 units, in which spreadsheet programs count."""
    return len(text) + sum(character > "\uffff" for character in text)


def clean_text(text: str) -> tuple[str, tuple[str, ...]]:
    """Return the text as a cell can hold it, and what had to be altered.

    Characters that XML cannot hold become U+FFFD, so that the reader sees that something stood
    there; CRLF and CR become LF; line breaks beyond the 253rd become spaces; what is beyond 32,767
    UTF-16 units is cut, and a marker says so.

    Parameters
    ----------
    text : str

    Returns
    -------
    text : str
    notes : tuple of str
        One phrase per rule that altered the text; empty where it stands as it was. The change of
        line ends alone is not noted: no spreadsheet program keeps CR.
    """
    if text.isascii() and text.isprintable() and len(text) <= MOST_UNITS:
        return text, ()
    notes = []
    text = text.replace("\r\n", "\n").replace("\r", "\n")
    text, replaced = _ILLEGAL.subn(REPLACEMENT, text)
    if replaced:
        notes.append(f"{replaced:,} characters that a cell cannot hold were replaced")
    breaks = text.count("\n")
    if breaks > MOST_BREAKS:
        *kept, rest = text.split("\n", MOST_BREAKS)
        text = "\n".join([*kept, rest.replace("\n", " ")])
        notes.append(f"{breaks - MOST_BREAKS:,} line breaks became spaces")
    if utf16_length(text) > MOST_UNITS:
        text = cut_text(text, MOST_UNITS)
        notes.append(f"cut at {MOST_UNITS:,} characters, the most that a cell holds")
    return text, tuple(notes)


def cut_text(text: str, most: int) -> str:
    """Return the text cut to at most `most` UTF-16 units, the marker at its end included.

    A character of two units is never cut in half.
    """
    if utf16_length(text) <= most:
        return text
    room = (most - utf16_length(CUT_MARKER)) * 2
    head = text.encode("utf-16-le", "surrogatepass")[:room]
    return head.decode("utf-16-le", "ignore") + CUT_MARKER


def escape_text(text: str) -> str:
    """Write `_x0041_` and the like so that a program shows these letters, not the character."""
    return _ESCAPE_LIKE.sub("_x005F_", text) if "_x" in text else text


def unescape_text(text: str) -> str:
    """Undo `escape_text`, and decode what a spreadsheet program escaped."""
    if "_x" not in text:
        return text
    return _ESCAPED.sub(lambda found: chr(int(found.group(1), 16)), text)


def fully_unescaped(text: str) -> str:
    """Decode until nothing is left to decode, whichever program has escaped or decoded before.

    For comparing only: a text that holds `_x0041_` literally comes out as "A", and does so both
    before and after its round through a spreadsheet program.
    """
    while (decoded := unescape_text(text)) != text:
        text = decoded
    return text


def storable(text: str) -> str:
    """Return the text as it is to be put into the XML: clean and escaped.

    Escaping can lengthen a text at the limit, so it is cut once more by its stored length.
    """
    cleaned, _ = clean_text(text)
    stored = escape_text(cleaned)
    if stored is cleaned or utf16_length(stored) <= MOST_UNITS:
        return stored
    excess = utf16_length(stored) - MOST_UNITS
    return escape_text(cut_text(cleaned, MOST_UNITS - excess))


def is_web_link(text: str) -> bool:
    """Whether the whole text is one http or https address, the only kind that becomes a link."""
    if text[:4].lower() != "http" or len(text) > MOST_LINK_LENGTH:
        return False
    if not _WEB_LINK.fullmatch(text):
        return False
    try:
        return bool(urlsplit(text).hostname)
    except ValueError:
        return False


def put_text(
    sheet: OpenpyxlSheet, row: int, column: int, text: str, look: StyleArray | None = None
) -> Cell:
    """Put a text into a cell so that no program takes it for anything else.

    The value is set first, since setting it guesses a type; the type and the look then say that it
    is text. A look without the number format `@` is for cells that nobody types into.

    Parameters
    ----------
    sheet : openpyxl worksheet
    row, column : int
        1-based.
    text : str
    look : StyleArray, optional
        Shared style; without it the cell is plain text.
    """
    cell: Cell = sheet.cell(row, column)  # type: ignore[assignment]  # no merged cells here
    if text:
        cell.value = storable(text)
        cell.data_type = "s"
    if look is None:
        cell.number_format = "@"
    else:
        cell._style = look  # type: ignore[attr-defined]  # in __slots__, missing from the stub
    return cell


def altered_notes(texts: Iterable[tuple[str, str]]) -> tuple[str, ...]:
    """Say which of several texts cannot be written as they stand.

    Parameters
    ----------
    texts : iterable of (str, str)
        What the text is ('item "a12", column "text"') and the text.
    """
    said: list[str] = []
    for name, text in texts:
        _, notes = clean_text(text)
        said.extend(f"{name}: {note}" for note in notes)
    return tuple(said)
