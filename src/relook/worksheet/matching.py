"""What a decision cell says: which label, or why none.

People retype, paste and re-save: labels come back with other spaces, in another case, as numbers,
truth values or percentages. A cell is matched in steps from exact to lenient, and only a match that
no second label shares is taken. Dates, errors and formulas are never guessed at.
"""

from __future__ import annotations

import re
import unicodedata
from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass
from decimal import Decimal, InvalidOperation
from typing import Literal

from relook.cells.model import Cell
from relook.core.decisions import Ruling
from relook.errors import listed, nearest
from relook.worksheet.model import CANNOT_BE_CODED, WITHDRAW, SheetVariable

_INVISIBLE = re.compile("[\u00ad\u200b-\u200f\u202a-\u202e\u2060-\u2064\ufeff\ufe00-\ufe0f]")
_NUMBER = re.compile(r"[+-]?(\d+(\.\d*)?|\.\d+)([eE][+-]?\d{1,3})?", re.ASCII)
_COMMA_NUMBER = re.compile(r"([+-]?)(\d+),(\d+)", re.ASCII)
_WORDS: tuple[tuple[str, Ruling], ...] = (
    (CANNOT_BE_CODED, "cannot be coded"),
    (WITHDRAW, "withdraw"),
)
_TRUTH = {"TRUE": ("true", "yes"), "FALSE": ("false", "no")}
_LONGEST_SHOWN = 60


@dataclass(frozen=True, slots=True, kw_only=True)
class Reading:
    """What a decision cell was read as.

    Attributes
    ----------
    state : {"blank", "matched", "unmatched"}
    ruling : {"label", "cannot be coded", "withdraw"}
        Where matched.
    label : str or None
        The label as declared, where the ruling is one; a number in its shortest form; a set in the
        code book's order.
    found : str
        What the cell shows.
    adjusted : str
        Where the match was not exact: in what the cell differs from the label; "" where exact.
    reason, mend : str
        Where unmatched: why, and what to do.
    """

    state: Literal["blank", "matched", "unmatched"]
    ruling: Ruling = "label"
    label: str | None = None
    found: str = ""
    adjusted: str = ""
    reason: str = ""
    mend: str = ""


BLANK = Reading(state="blank")


def match_decision(cell: Cell, variable: SheetVariable) -> Reading:
    """Read a decision cell.

    Parameters
    ----------
    cell : Cell
    variable : SheetVariable
        What may be decided: labels, numbers within bounds, or sets of labels.

    Notes
    -----
    The steps, the first that finds one label alone wins: the text as it stands (canonically
    composed) · without invisible characters, runs of spaces as one · in any case · by value: truth
    values, numbers ("3.0" for "3"), percentages. "cannot be coded" and "withdraw" are matched in
    the same steps. A decimal comma is read as a point where it cannot part thousands: "0,5" is
    0.5, "1,500" is refused.
    """
    if cell.kind == "empty" or not loosened(cell.text):
        return BLANK
    found = shown(cell)
    refused = _refused_kind(cell, found)
    if refused is not None:
        return refused
    word = _match_word(cell, found)
    if word is not None:
        return word
    if variable.entry == "number":
        return _match_number(cell, variable, found)
    if variable.entry == "set":
        return _match_set(cell, variable, found)
    return _match_label(cell, variable, found)


def match_ticks(ticked: Sequence[str], cell: Cell, variable: SheetVariable) -> Reading:
    """Read a set decided by ticks, or in the decision cell where nothing is ticked.

    Parameters
    ----------
    ticked : sequence of str
        The labels whose columns hold a mark.
    cell : Cell
        The decision cell.
    variable : SheetVariable
    """
    if not ticked:
        return match_decision(cell, variable)
    foreign = [label for label in ticked if label not in variable.labels]
    found = ", ".join(ticked)
    if foreign:
        return _unmatched(
            found,
            f'{listed(foreign)} is no label of "{variable.name}"',
            "take the mark out, or tick one of the variable's own labels",
        )
    by_tick = Reading(state="matched", label=_joined(ticked, variable), found=found)
    typed = match_decision(cell, variable)
    if typed.state == "blank" or (typed.state == "matched" and typed.label == by_tick.label):
        return by_tick
    return _unmatched(
        f"{typed.found} beside ticks for {found}",
        "the decision cell and the ticks say different things",
        "clear the decision cell, or take out the ticks",
    )


def shown(cell: Cell) -> str:
    """Return what a cell shows, shortened, for a message."""
    text = cell.text
    if cell.kind == "number" and "%" in cell.number_format:
        text = f"{Decimal(text) * 100:f}%"
    elif cell.kind == "formula" and cell.cached:
        text = f"{text} (showing {cell.cached})"
    text = " ".join(text.split())
    return text if len(text) <= _LONGEST_SHOWN else text[: _LONGEST_SHOWN - 1] + "…"


def composed(text: str) -> str:
    """Return text canonically composed, with line feeds alone as line ends."""
    plain = text.replace("\r\n", "\n").replace("\r", "\n")
    return plain if plain.isascii() else unicodedata.normalize("NFC", plain)


def loosened(text: str) -> str:
    """Return text without invisible characters, its runs of spaces and breaks as one space."""
    return " ".join(_INVISIBLE.sub("", composed(text)).split())


def folded(text: str) -> str:
    """Return text without differences of case, space and invisible characters."""
    return loosened(text).casefold()


def decimal_of(text: str) -> Decimal | None:
    """Return the number that a text writes, None where it writes none or an ambiguous one."""
    plain = loosened(text).replace("\N{MINUS SIGN}", "-")
    comma = _COMMA_NUMBER.fullmatch(plain)
    if comma is not None:
        whole, part = comma[2], comma[3]
        if len(part) == 3 and len(whole) <= 3 and whole.strip("0"):
            return None
        plain = f"{comma[1]}{whole}.{part}"
    if len(plain) > _LONGEST_SHOWN or not _NUMBER.fullmatch(plain):
        return None
    try:
        return Decimal(plain)
    except InvalidOperation:
        return None


def decimal_text(number: Decimal) -> str:
    """Return a number's shortest plain text: "3", "0.5"."""
    if number == 0:
        return "0"
    text = f"{number:f}"
    return text.rstrip("0").rstrip(".") if "." in text else text


def _unmatched(found: str, reason: str, mend: str) -> Reading:
    return Reading(state="unmatched", found=found, reason=reason, mend=mend)


def _refused_kind(cell: Cell, found: str) -> Reading | None:
    match cell.kind:
        case "formula":
            return _unmatched(
                found,
                "the cell holds a formula, not a decision",
                "type the label itself into the cell",
            )
        case "error":
            return _unmatched(
                found, "the cell holds an error value", "type the label itself into the cell"
            )
        case "date":
            return _unmatched(
                found,
                "the spreadsheet program turned the decision into a date or time",
                "format the cell as text, then type the label again",
            )
        case _:
            return None


def _match_word(cell: Cell, found: str) -> Reading | None:
    for fold, adjusted in _STEPS:
        for word, ruling in _WORDS:
            if fold(cell.text) == word:
                return Reading(state="matched", ruling=ruling, found=found, adjusted=adjusted)
    return None


_STEPS: tuple[tuple[Callable[[str], str], str], ...] = (
    (composed, ""),
    (loosened, "spaces or invisible characters"),
    (folded, "upper and lower case"),
)


def _match_label(cell: Cell, variable: SheetVariable, found: str) -> Reading:
    hit = _one_label(cell, variable.labels)
    if isinstance(hit, _Hit):
        return Reading(state="matched", label=hit.label, found=found, adjusted=hit.adjusted)
    if hit:
        return _unmatched(
            found,
            f"it could mean {listed(hit)}",
            "write the label exactly as the code book has it",
        )
    return _unmatched(
        found, f'it is no label of "{variable.name}"', _nearest_mend(cell.text, variable.labels)
    )


def _nearest_mend(text: str, labels: Iterable[str]) -> str:
    known = [*labels, CANNOT_BE_CODED, WITHDRAW]
    said = folded(text)
    named = [label for label in labels if folded(label) and folded(label) in said]
    if len(named) > 1:
        return f"it names {listed(named)}: ask which one is meant, and write that alone"
    close = nearest(loosened(text), known)
    if close is not None:
        return f'change the cell to "{close}"'
    return f"change the cell to one of {listed(known, most=8)}"


@dataclass(frozen=True, slots=True)
class _Hit:
    label: str
    adjusted: str


def _one_label(cell: Cell, labels: Sequence[str]) -> _Hit | list[str]:
    """Return the one label that a cell means, or the several (or none) that it could mean."""
    for fold, adjusted in _STEPS:
        wanted = fold(cell.text)
        hits = [label for label in labels if fold(label) == wanted]
        if len(hits) == 1:
            return _Hit(hits[0], adjusted)
        if hits:
            return hits
    hits = _by_value(cell, labels)
    return _Hit(hits[0], "the way the value is written") if len(hits) == 1 else hits


def _by_value(cell: Cell, labels: Sequence[str]) -> list[str]:
    truth = cell.text if cell.kind == "bool" else ""
    if truth:
        for word in _TRUTH[truth]:
            hits = [label for label in labels if folded(label) == word]
            if hits:
                return hits
        return []
    number = decimal_of(cell.text)
    if number is None:
        return []
    if cell.kind == "number" and "%" in cell.number_format:
        percent = number * 100
        hits = [label for label in labels if _percent_of(label) == percent]
        if hits:
            return hits
    return [label for label in labels if decimal_of(label) == number]


def _percent_of(label: str) -> Decimal | None:
    plain = loosened(label)
    return decimal_of(plain[:-1]) if plain.endswith("%") else None


def _match_number(cell: Cell, variable: SheetVariable, found: str) -> Reading:
    if cell.kind == "bool":
        return _unmatched(found, "it is a truth value, not a number", "type a number")
    if cell.kind == "number" and "%" in cell.number_format:
        return _unmatched(
            found,
            "it is a percentage, which could mean either of two numbers",
            "format the cell as a plain number and type the number again",
        )
    number = decimal_of(cell.text)
    if number is None:
        ambiguous = _COMMA_NUMBER.fullmatch(loosened(cell.text)) is not None
        if ambiguous:
            return _unmatched(
                found,
                "the comma could part decimals or thousands",
                "write the number with a point before the decimals and nothing between thousands",
            )
        return _unmatched(found, "it is not a number", _number_mend(variable))
    if variable.labels:
        hits = [label for label in variable.labels if decimal_of(label) == number]
        if len(hits) == 1:
            return Reading(state="matched", label=hits[0], found=found)
        return _unmatched(
            found, f'it is no label of "{variable.name}"', _nearest_mend(cell.text, variable.labels)
        )
    low, high = variable.low, variable.high
    if (low is not None and number < Decimal(low)) or (high is not None and number > Decimal(high)):
        return _unmatched(found, "it lies outside the bounds", _number_mend(variable))
    adjusted = "a decimal comma" if "," in cell.text else ""
    return Reading(state="matched", label=decimal_text(number), found=found, adjusted=adjusted)


def _number_mend(variable: SheetVariable) -> str:
    low, high = variable.low, variable.high
    if low is not None and high is not None:
        return f"type a number from {low:g} to {high:g}"
    if low is not None:
        return f"type a number of {low:g} or more"
    return "type a number" if high is None else f"type a number up to {high:g}"


def _match_set(cell: Cell, variable: SheetVariable, found: str) -> Reading:
    whole = _one_label(cell, variable.labels)
    if isinstance(whole, _Hit):
        return Reading(state="matched", label=whole.label, found=found, adjusted=whole.adjusted)
    separator = variable.separator or ";"
    parts = [part for part in cell.text.split(separator) if loosened(part)]
    labels, adjusted = [], ""
    for part in parts:
        hit = _one_label(Cell("text", part.strip()), variable.labels)
        if not isinstance(hit, _Hit):
            why = f"could mean {listed(hit)}" if hit else f'is no label of "{variable.name}"'
            return _unmatched(
                found,
                f'"{loosened(part)}" {why}',
                f'{_nearest_mend(part, variable.labels)}; labels are joined by "{separator}"',
            )
        labels.append(hit.label)
        adjusted = adjusted or hit.adjusted
    if not labels:
        return BLANK
    return Reading(state="matched", label=_joined(labels, variable), found=found, adjusted=adjusted)


def _joined(labels: Iterable[str], variable: SheetVariable) -> str:
    given = set(labels)
    separator = variable.separator or ";"
    return separator.join(label for label in variable.labels if label in given)
