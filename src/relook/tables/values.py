"""Label texts to value codes, by what the difference function needs to know of a label."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from fractions import Fraction
from typing import Literal

import numpy as np

from relook.core.differences import DifferenceFunction, Values, difference_function
from relook.core.exact import IntArray
from relook.errors import RelookError, listed, nearest
from relook.tables.numbers import has_decimal_comma, natural_key, number_text, parse_number
from relook.tables.schema import Variable

Kind = Literal["words", "ordered", "numbers", "sets"]
#: Functions whose labels are sets, the same whatever the order in which they are written.
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


def kind_of(function: DifferenceFunction) -> Kind:
    """Return what the labels of a function are: words, ordered words, numbers or sets of words."""
    if function.name in _SETS:
        return "sets"
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
        A declaration that cannot be: an unknown difference function or a wrong option, a label
        declared twice, a declared label that is no number where numbers are needed.
    """
    function = difference_function(variable.difference, variable.options)
    kind = kind_of(function)
    if variable.labels is not None:
        _check_declared(variable, variable.labels)
    if kind == "numbers":
        coded = _numbers(variable, texts)
    elif kind == "sets":
        coded = _sets(variable, texts)
    elif variable.labels is not None:
        coded = _declared(texts, variable.labels)
    elif kind == "ordered":
        coded = _numeric_order(variable, texts)
    else:
        coded = _in_order(texts)
    return _checked(function, texts, coded)


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


def _checked(function: DifferenceFunction, texts: Sequence[str], coded: CodedValues) -> CodedValues:
    """Part the values that the function cannot take from the others."""
    # Declared labels that nobody used are no fault of the table's.
    used = set(coded.code_of_text.tolist())
    faults = {code: why for code, why in function.check(coded.values) if code in used}
    if not faults:
        return coded
    bad = dict(coded.bad)
    codes = coded.code_of_text.copy()
    for at, code in enumerate(coded.code_of_text.tolist()):
        if code in faults:
            bad[at] = BadLabel(
                f'"{texts[at]}" {faults[code]}',
                f"correct the cell, or change the settings of {function.name} differences",
            )
            codes[at] = -1
    return CodedValues(coded.texts, coded.values, codes, bad)


def _in_order(texts: Sequence[str]) -> CodedValues:
    order = sorted(range(len(texts)), key=lambda at: natural_key(texts[at]))
    codes = np.empty(len(texts), dtype=np.int64)
    codes[order] = np.arange(len(texts))
    labels = tuple(texts[at] for at in order)
    return CodedValues(labels, Values.from_texts(labels), codes, {})


def _declared(texts: Sequence[str], labels: tuple[str, ...]) -> CodedValues:
    code = {label: at for at, label in enumerate(labels)}
    codes = np.array([code.get(text, -1) for text in texts], dtype=np.int64)
    bad = {at: undeclared(text, labels) for at, text in enumerate(texts) if text not in code}
    return CodedValues(labels, Values.from_texts(labels), codes, bad)


def _numeric_order(variable: Variable, texts: Sequence[str]) -> CodedValues:
    """Ordinal labels without a declared order: only numbers order themselves."""
    numbers = [parse_number(text, variable.decimal) for text in texts]
    words = [text for text, number in zip(texts, numbers, strict=True) if number is None]
    if not words:
        return _by_number(texts, [n for n in numbers if n is not None], as_numbers=False)
    example = ", ".join(f'"{text}"' for text in sorted(texts, key=natural_key)[:6])
    more = ", …]" if len(texts) > 6 else "]"
    message = BadLabel(
        f'the order of "{words[0]}" is not known: ordinal labels that are words must be declared',
        f'list the labels of "{variable.name}" from lowest to highest (here they stand by the '
        f"alphabet): labels = [{example}{more}",
    )
    codes = np.full(len(texts), -1, dtype=np.int64)
    return CodedValues((), Values.from_texts(()), codes, {texts.index(words[0]): message})


def _by_number(
    texts: Sequence[str], numbers: Sequence[Fraction], *, as_numbers: bool
) -> CodedValues:
    """Equal numbers are one value, however they are written."""
    variants: dict[Fraction, list[str]] = {}
    for text, number in zip(texts, numbers, strict=True):
        variants.setdefault(number, []).append(text)
    order = sorted(variants)
    code = {number: at for at, number in enumerate(order)}
    codes = np.array([code[number] for number in numbers], dtype=np.int64)
    labels = tuple(number_text(variants[number]) for number in order)
    values = Values.from_numbers(order) if as_numbers else Values.from_texts(labels)
    return CodedValues(labels, values, codes, {})


def _numbers(variable: Variable, texts: Sequence[str]) -> CodedValues:
    declared = _declared_numbers(variable)
    numbers: list[Fraction] = []
    good: list[int] = []
    bad: dict[int, BadLabel] = {}
    for at, text in enumerate(texts):
        number = parse_number(text, variable.decimal)
        if number is None:
            bad[at] = _not_a_number(text, variable)
        elif declared is not None and number not in declared:
            bad[at] = undeclared(text, list(declared.values()))
        else:
            numbers.append(number)
            good.append(at)
    found = _by_number([texts[at] for at in good], numbers, as_numbers=True)
    codes = np.full(len(texts), -1, dtype=np.int64)
    codes[good] = found.code_of_text
    return CodedValues(found.texts, found.values, codes, bad)


def _not_a_number(text: str, variable: Variable) -> BadLabel:
    if variable.decimal == "." and has_decimal_comma(text):
        return BadLabel(
            f'"{text}" is not a number: it has a decimal comma',
            f'write "{text.strip().replace(",", ".")}", or set decimal = "," for "{variable.name}"',
        )
    return BadLabel(
        f'"{text}" is not a number, as {variable.difference} differences need',
        "write a number, or declare the text as a missing marker",
    )


def _declared_numbers(variable: Variable) -> dict[Fraction, str] | None:
    if variable.labels is None:
        return None
    declared: dict[Fraction, str] = {}
    for label in variable.labels:
        number = parse_number(label, variable.decimal)
        if number is None:
            raise RelookError(
                f'the declared label "{label}" of the variable "{variable.name}" is not a number, '
                f"as {variable.difference} differences need",
                mend='declare numbers, or use difference = "ordinal"',
            )
        declared[number] = label
    return declared


def _sets(variable: Variable, texts: Sequence[str]) -> CodedValues:
    """Sets are the same whatever the order in which their labels were written."""
    separator = str(variable.options["separator"])
    declared = variable.labels
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
    codes = np.array([-1 if text is None else code[text] for text in canonical], dtype=np.int64)
    return CodedValues(tuple(order), Values.from_texts(order), codes, bad)
