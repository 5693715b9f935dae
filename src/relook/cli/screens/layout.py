"""How figures, bars and small tables look on a terminal, the same on every screen.

Colour and width never carry meaning: a bar stands beside its number, an undefined figure says so.
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import replace

from rich.console import Group, RenderableType
from rich.padding import Padding
from rich.table import Table
from rich.text import Text

from relook.errors import Problem

_BAR, _BAR_WIDTH = "▪", 12
_TEXT_WIDTH = 48
UNDEFINED = "undefined"


def heading(text: str) -> Text:
    """A line that begins a part of a screen."""
    return Text(text, style="bold")


def note(text: str) -> Padding:
    """A sentence below a figure or a table, set in from the margin."""
    return Padding(Text(text), (0, 0, 0, 2), expand=False)


def stacked(*parts: RenderableType) -> Group:
    """Parts of a screen below one another."""
    return Group(*parts)


def small_table(
    headers: Sequence[str], rows: Iterable[Sequence[str]], *, numbers: Sequence[int] = ()
) -> Padding:
    """A table without rules.

    Parameters
    ----------
    headers : sequence of str
    rows : iterable of sequence of str
    numbers : sequence of int
        Positions of the columns to align on the right.
    """
    lines = list(rows)
    table = Table(box=None, pad_edge=False, header_style="underline", padding=(0, 2, 0, 0))
    for position, header in enumerate(headers):
        right = position in numbers
        # A bar that goes on in the next line would look like a shorter one.
        bars = bool(lines) and not any(row[position].strip(_BAR) for row in lines)
        table.add_column(
            Text(header),
            justify="right" if right else "left",
            no_wrap=right or bars,
            overflow="fold",
            min_width=_BAR_WIDTH if bars and any(row[position] for row in lines) else None,
        )
    for row in lines:
        table.add_row(*(Text(cell) for cell in row))
    return Padding(table, (0, 0, 0, 2), expand=False)


def figure_lines(lines: Iterable[tuple[str, str, str]]) -> Padding:
    """Figures with their names before and their conditions after."""
    table = Table(box=None, show_header=False, pad_edge=False, padding=(0, 2, 0, 0))
    table.add_column(no_wrap=True)
    table.add_column(justify="right", no_wrap=True)
    table.add_column(overflow="fold")
    for name, value, condition in lines:
        table.add_row(Text(name), Text(value, style="bold"), Text(condition))
    return Padding(table, (0, 0, 0, 2), expand=False)


def coefficient(value: float | None) -> str:
    """Alpha or agreement to three decimals, as in the literature."""
    return UNDEFINED if value is None else f"{value:z.3f}"


def amount(value: float | None) -> str:
    """A disagreement or a contribution: whole numbers in full, others to four digits or more."""
    if value is None:
        return UNDEFINED
    if value == round(value) and abs(value) < 1e12:
        return f"{value:,.0f}"
    return f"{value:,.1f}" if abs(value) >= 1000 else f"{value:.4g}"


def percent(value: float | None, *, decimals: int = 1) -> str:
    """A share as a percentage; one too small for its decimals is not shown as nothing."""
    if value is None:
        return UNDEFINED
    least = 10.0**-decimals
    if 0 < 100 * value < least / 2:
        return f"<{least:.{decimals}f}%"
    return f"{100 * value:.{decimals}f}%"


def count(value: int) -> str:
    """A whole number with its thousands apart."""
    return f"{value:,}"


def counted(value: int, one: str, many: str | None = None) -> str:
    """A whole number and the word for it: "1 item", "2 items"."""
    return f"{value:,} {one if value == 1 else many or one + 's'}"


def bar(value: float, most: float) -> str:
    """A bar for a value between 0 and `most`; it stands beside the number, never instead of it."""
    if most <= 0:
        return ""
    return _BAR * max(0, round(_BAR_WIDTH * value / most))


def shortened(text: str, width: int = _TEXT_WIDTH) -> str:
    """A text on one line, cut with an ellipsis where it is longer than `width`."""
    line = " ".join(text.split())
    return line if len(line) <= width else line[: width - 1].rstrip() + "…"


def by_mend(found: Sequence[Problem]) -> list[list[Problem]]:
    """Put findings of one severity and one mend together, each group where its first one is."""
    groups: dict[tuple[str, str], list[Problem]] = {}
    for at, problem in enumerate(found):
        # Those without a mend have nothing in common.
        key = (problem.severity, problem.mend or f"\0{at}")
        groups.setdefault(key, []).append(problem)
    return list(groups.values())


def told_together(found: Sequence[Problem], *, severity: bool = False) -> str:
    """Tell findings that one mend is for, and the mend below the last of them."""
    told = [f"{f'{one.severity}: ' if severity else ''}{replace(one, mend=None)}" for one in found]
    mend = found[-1].mend
    return "\n".join([*told, f"mend: {mend}"] if mend is not None else told)
