"""Text into cells: what is altered, and that the rest is not."""

from __future__ import annotations

import io

import pytest
from hypothesis import given
from hypothesis import strategies as st
from openpyxl import Workbook, load_workbook

from relook.cells.writing import (
    CUT_MARKER,
    MOST_BREAKS,
    MOST_UNITS,
    altered_notes,
    clean_text,
    cut_text,
    escape_text,
    fully_unescaped,
    is_web_link,
    put_text,
    storable,
    unescape_text,
    utf16_length,
)


@pytest.mark.parametrize("text", ["", "plain", "a\tb", "a\nb", "é 漢字 שלום 🚢", "  spaces  "])
def test_ordinary_text_is_left_alone(text: str) -> None:
    """Tabs, line feeds, accents, other scripts and pictographs need no cleaning."""
    assert clean_text(text) == (text, ())


@pytest.mark.parametrize(
    "character", [chr(code) for code in (0, 8, 11, 31, 0xFFFE, 0xFFFF, 0xD800, 0xDFFF)]
)
def test_characters_that_xml_cannot_hold_are_replaced_and_noted(character: str) -> None:
    """Each becomes U+FFFD, so that something is still seen to stand there."""
    text, notes = clean_text(f"a{character}b")
    assert text == "a\ufffdb"
    assert notes == ("1 characters that a cell cannot hold were replaced",)


def test_line_ends_become_line_feeds() -> None:
    """CRLF and CR are line ends, which every spreadsheet program turns into LF."""
    assert clean_text("a\r\nb\rc") == ("a\nb\nc", ())


def test_line_breaks_beyond_the_limit_become_spaces() -> None:
    """A cell holds 253 of them."""
    text, notes = clean_text("x\n" * 300)
    assert text.count("\n") == MOST_BREAKS
    assert len(text) == 600
    assert notes == ("47 line breaks became spaces",)


@pytest.mark.parametrize("letter", ["x", "🚢"])
def test_a_long_text_is_cut_by_utf16_units_with_a_marker(letter: str) -> None:
    """Programs count UTF-16 units, so 20,000 pictographs are too many, and none is cut in half."""
    text, notes = clean_text(letter * 40_000)
    assert MOST_UNITS - 1 <= utf16_length(text) <= MOST_UNITS
    assert text.endswith(CUT_MARKER)
    assert text.removesuffix(CUT_MARKER).strip(letter) == ""
    assert len(notes) == 1


def test_a_text_at_the_limit_is_not_cut() -> None:
    """32,767 units fit."""
    assert clean_text("x" * MOST_UNITS) == ("x" * MOST_UNITS, ())
    assert cut_text("x" * 10, 10) == "x" * 10


@pytest.mark.parametrize("text", ["_x000D_", "_x0041_x0042_", "_x005F_x000D_", "a_x00e9_b"])
def test_escape_like_letters_are_escaped_and_decode_to_themselves(text: str) -> None:
    """A program that decodes `_x0041_` must show the letters, overlapping ones included."""
    assert escape_text(text) != text
    assert unescape_text(escape_text(text)) == text


def test_comparing_does_not_depend_on_how_often_a_text_was_escaped() -> None:
    """Programs differ in whether they decode, so both forms compare equal."""
    assert fully_unescaped("_x0041_") == fully_unescaped(escape_text("_x0041_")) == "A"


@given(st.text(alphabet=st.characters(), max_size=60))
def test_any_text_is_stored_so_that_decoding_gives_the_clean_text(text: str) -> None:
    """The law of the two steps: clean, then escape."""
    assert unescape_text(storable(text)) == clean_text(text)[0]


def test_escaping_never_exceeds_the_limit() -> None:
    """A text at the limit is cut again by its stored length."""
    assert utf16_length(storable("_x0041_" * 4_681)) <= MOST_UNITS


@pytest.mark.parametrize(
    "text",
    ["=1+1", "=cmd|'/c calc'!A0", "+1", "-2+3", "@SUM(A1)", "\t=1", "#N/A", "TRUE", "007", "1E5",
     "2031-01-02", "50%", "'x", '=HYPERLINK("http://x")'],
)  # fmt: skip
def test_nothing_becomes_anything_but_text(text: str) -> None:
    """Formulas, error names, numbers, dates: all come back as the text they were."""
    book = Workbook()
    put_text(book.worksheets[0], 1, 1, text)
    saved = io.BytesIO()
    book.save(saved)
    cell = load_workbook(saved).worksheets[0].cell(1, 1)
    assert (cell.value, cell.data_type, cell.number_format) == (text, "s", "@")


@pytest.mark.parametrize(
    ("text", "link"),
    [
        ("https://example.org/a?b=1&c=2", True),
        ("HTTP://example.org", True),
        ("see https://example.org", False),
        ("https://example.org and more", False),
        ("file:///etc/passwd", False),
        ("javascript:alert(1)", False),
        ("http://", False),
        ("http://[broken", False),
        ('http://a"b', False),
        ("https://example.org/" + "x" * 3_000, False),
    ],
)
def test_only_a_whole_web_address_becomes_a_link(text: str, link: bool) -> None:
    """Other schemes, parts of sentences, broken and overlong addresses stay text."""
    assert is_web_link(text) is link


def test_what_cannot_be_written_as_it_stands_is_listed() -> None:
    """Each altered text is named once per rule."""
    said = altered_notes([("item a", "fine"), ("item b", "\x01"), ("item c", "y" * 40_000)])
    assert [line.split(":")[0] for line in said] == ["item b", "item c"]
