"""Widths and heights by estimate."""

from __future__ import annotations

import pytest

from reference.made_sheets import made_worksheet
from relook.worksheet.layout import (
    columns_of,
    display_width,
    line_height,
    main_shown_column,
    text_height,
    wrapped_lines,
)


@pytest.mark.parametrize(
    ("text", "lines"),
    [("", 1), ("word", 1), ("a\n\nb", 3), ("0" * 9, 1), ("0" * 30, 4), ("00000 " * 4, 4)],
)
def test_lines_are_counted_as_words_wrap(text: str, lines: int) -> None:
    """In a column of ten digits, of which a cell keeps nearly one free."""
    assert wrapped_lines(text, 10) == lines


def test_wide_characters_count_two_and_marks_none() -> None:
    """East Asian ideographs and pictographs are two digits wide; combining marks add nothing."""
    assert display_width("漢字🚢") == 6
    assert display_width("e\u0301") == display_width("e")
    assert display_width("MMM") > display_width("000") > display_width("iii")


def test_height_grows_with_text_and_size() -> None:
    """Never less for more."""
    heights = [text_height("word " * count, 20, 11) for count in range(1, 60)]
    assert heights == sorted(heights)
    assert text_height("x", 20, 8) == line_height(8) < line_height(12)


def test_the_longest_shown_column_gets_the_page() -> None:
    """The item's text is dominant wherever its column stands."""
    rows = made_worksheet(texts=("a text of some length that fills a line and more " * 3,)).rows
    worksheet = made_worksheet(rows=rows)
    assert main_shown_column(worksheet) == 0
    widths = {column.header: column.width for column in columns_of(worksheet)}
    assert widths["text"] > 2 * widths["source"]
    # 260 digits are what a wide screen shows; labels, fields and text together stay well below.
    assert sum(widths.values()) < 230
