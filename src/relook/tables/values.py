"""Label texts to value codes, by what the difference function needs to know of a label."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from fractions import Fraction
from typing import Literal

import numpy as np

from relook.core.differences import DIFFERENCE_FUNCTIONS, Values
from relook.core.exact import IntArray
from relook.errors import RelookError, listed, nearest
from relook.tables.numbers import has_decimal_comma, natural_key, number_text, parse_number
from relook.tables.schema import Variable

Kind = Literal["words", "ordered", "numbers", "sets"]
_SETS = ("jaccard", "masi")


@dataclass(frozen=True, slots=True)
class BadLabel:
    """Why a label text cannot be used, and the mend."""

    message: str
    mend: str


@dataclass(frozen=True, slots=True, eq=False)
class CodedValues:
    """What the distinct label texts of a variable come to.

    Attributes
    ----------
    texts : tuple of str
        The label of each value code.
    values : Values
    code_of_text : int array of shape (n_texts,)
        The value code of each text given in, -1 where it cannot be used.
    bad : dict of int to BadLabel
        For the texts with -1, by their position.
    """

    texts: tuple[str, ...]
    values: Values
    code_of_text: IntArray
    bad: dict[int, BadLabel]


def kind_of(variable: Variable) -> Kind:
    """Return what the labels of a variable are: words, ordered words, numbers or sets of words.

    Raises
    ------
    RelookError
        There is no such difference function.
    """
    if variable.difference in _SETS:
        return "sets"
    function = DIFFERENCE_FUNCTIONS.get(variable.difference)
    if function is None:
        close = nearest(variable.difference, DIFFERENCE_FUNCTIONS)
        raise RelookError(
            f'"{variable.difference}" is not a difference function; there are '
            f"{listed(DIFFERENCE_FUNCTIONS)}",
            mend=f'did you mean "{close}"?' if close else "use one of these",
        )
    if function.needs == "number":
        return "numbers"
    return "ordered" if function.needs == "order" else "words"


def code_values(variable: Variable, texts: Sequence[str]) -> CodedValues:
    """Give each label text of a variable its value code.

    Parameters
    ----------
    variable : Variable
    texts : sequence of str
        The distinct texts that occur, missing markers left out.

    Returns
    -------
    CodedValues
        Declared labels come in the order declared, used or not; others by size for numbers and by
        code point for words, never by their order in the file.

    Raises
    ------
    RelookError
        A declaration that cannot be: an unknown difference function, a label declared twice, a
        declared label that is no number where numbers are needed.
    """
    kind = kind_of(variable)
    if kind == "numbers":
        return _numbers(variable, texts)
    if kind == "sets":
        return _sets(variable, texts)
    if variable.labels is not None:
        return _declared(variable, texts, variable.labels)
    if kind == "ordered":
        return _numeric_order(variable, texts)
    order = sorted(range(len(texts)), key=lambda at: natural_key(texts[at]))
    codes = np.empty(len(texts), dtype=np.int64)
    codes[order] = np.arange(len(texts))
    return CodedValues(tuple(texts[at] for at in order), Values(len(texts)), codes, {})


def _declared(variable: Variable, texts: Sequence[str], labels: tuple[str, ...]) -> CodedValues:
    _check_declared(variable, labels)
    code = {label: at for at, label in enumerate(labels)}
    codes = np.array([code.get(text, -1) for text in texts], dtype=np.int64)
    bad = {
        at: undeclared(text, labels) for at, text in enumerate(texts) if text not in code
    }
    return CodedValues(labels, Values(len(labels)), codes, bad)


def undeclared(text: str, labels: Sequence[str]) -> BadLabel:
    """Return the message for a label that was not declared, naming the nearest that was."""
    close = nearest(text, labels)
    if close is None:
        return BadLabel(
            f'"{text}" is not a declared label; they are {listed(labels)}',
            "change the cell to one of these, or declare the label",
        )
    return BadLabel(
        f'"{text}" is not a declared label',
        f'change the cell to "{close}", or add "{text}" to the declared labels',
    )


def _check_declared(variable: Variable, labels: tuple[str, ...]) -> None:
    seen: set[str] = set()
    for label in labels:
        if label in seen:
            raise RelookError(
                f'the label "{label}" of the variable "{variable.name}" is declared twice',
                mend="declare it once",
            )
        seen.add(label)


def _numeric_order(variable: Variable, texts: Sequence[str]) -> CodedValues:
    """Ordinal labels without a declared order: only numbers order themselves."""
    numbers = [parse_number(text) for text in texts]
    words = [text for text, number in zip(texts, numbers, strict=True) if number is None]
    if not words:
        return _by_number(texts, [n for n in numbers if n is not None], words_only=True)
    example = ", ".join(f'"{text}"' for text in sorted(texts, key=natural_key)[:6])
    message = BadLabel(
        f'the order of "{words[0]}" is not known: ordinal labels that are words must be declared',
        f'list the labels of "{variable.name}" from lowest to highest: labels = [{example}'
        + (", …]" if len(texts) > 6 else "]"),
    )
    first = texts.index(words[0])
    codes = np.full(len(texts), -1, dtype=np.int64)
    return CodedValues((), Values(0), codes, {first: message})


def _by_number(
    texts: Sequence[str], numbers: Sequence[Fraction], *, words_only: bool = False
) -> CodedValues:
    """Equal numbers are one value, however they are written."""
    variants: dict[Fraction, list[str]] = {}
    for text, number in zip(texts, numbers, strict=True):
        variants.setdefault(number, []).append(text)
    order = sorted(variants)
    code = {number: at for at, number in enumerate(order)}
    codes = np.array([code[number] for number in numbers], dtype=np.int64)
    labels = tuple(number_text(variants[number]) for number in order)
    values = Values(len(order)) if words_only else Values.from_numbers(order)
    return CodedValues(labels, values, codes, {})


def _numbers(variable: Variable, texts: Sequence[str]) -> CodedValues:
    decimal = str(variable.options.get("decimal", "."))
    fits = _limits(variable, decimal)
    numbers: list[Fraction] = []
    good: list[int] = []
    bad: dict[int, BadLabel] = {}
    for at, text in enumerate(texts):
        number = parse_number(text, decimal)
        fault = _not_a_number(text, variable, decimal) if number is None else fits(number, text)
        if fault is not None:
            bad[at] = fault
        elif number is not None:
            numbers.append(number)
            good.append(at)
    found = _by_number([texts[at] for at in good], numbers)
    codes = np.full(len(texts), -1, dtype=np.int64)
    codes[good] = found.code_of_text
    return CodedValues(found.texts, found.values, codes, bad)


def _not_a_number(text: str, variable: Variable, decimal: str) -> BadLabel:
    if decimal == "." and has_decimal_comma(text):
        return BadLabel(
            f'"{text}" is not a number: it has a decimal comma',
            f'write "{text.strip().replace(",", ".")}", or set decimal = "," for "{variable.name}"',
        )
    return BadLabel(
        f'"{text}" is not a number, as {variable.difference} differences need',
        "write a number, or declare the text as a missing marker",
    )


def _limits(variable: Variable, decimal: str) -> Callable[[Fraction, str], BadLabel | None]:
    """What a number must keep to: declared labels, 0 or more for ratio, the ends for polar."""
    declared: dict[Fraction, str] | None = None
    if variable.labels is not None:
        _check_declared(variable, variable.labels)
        declared = {}
        for label in variable.labels:
            number = parse_number(label, decimal)
            if number is None:
                raise RelookError(
                    f'the declared label "{label}" of the variable "{variable.name}" is not a '
                    f"number, as {variable.difference} differences need",
                    mend='declare numbers, or use difference = "ordinal"',
                )
            declared[number] = label
    ends = variable.options.get("ends")
    low, high = (Fraction(str(e)) for e in ends) if isinstance(ends, list | tuple) else (None, None)

    def fits(number: Fraction, text: str) -> BadLabel | None:
        if declared is not None and number not in declared:
            return undeclared(text, list(declared.values()))
        if variable.difference == "ratio" and number < 0:
            return BadLabel(
                f'"{text}" is below 0, and ratio differences need numbers of 0 or more',
                'correct the cell, or use difference = "interval"',
            )
        if low is not None and high is not None and not low <= number <= high:
            return BadLabel(
                f'"{text}" lies outside the ends {_plain(low)} and {_plain(high)}',
                "correct the cell, or widen the ends",
            )
        return None

    return fits


def _plain(number: Fraction) -> str:
    return str(number.numerator) if number.denominator == 1 else str(float(number))


def _sets(variable: Variable, texts: Sequence[str]) -> CodedValues:
    """Sets are the same whatever the order in which their labels were written."""
    separator = str(variable.options.get("separator", ";"))
    declared = variable.labels
    if declared is not None:
        _check_declared(variable, declared)
    place = {label: at for at, label in enumerate(declared or ())}
    canonical: list[str | None] = []
    bad: dict[int, BadLabel] = {}
    for at, text in enumerate(texts):
        labels = sorted({one.strip() for one in text.split(separator)} - {""})
        unknown = [one for one in labels if declared is not None and one not in place]
        if unknown:
            bad[at] = undeclared(unknown[0], declared or ())
            canonical.append(None)
            continue
        labels.sort(key=lambda one: (place.get(one, 0), one))
        canonical.append(separator.join(labels))
    order = sorted({text for text in canonical if text is not None})
    code = {text: at for at, text in enumerate(order)}
    codes = np.array(
        [-1 if text is None else code[text] for text in canonical], dtype=np.int64
    )
    return CodedValues(tuple(order), Values(len(order)), codes, bad)
