"""Label texts that are numbers, exactly."""

from __future__ import annotations

import re
from decimal import Decimal
from fractions import Fraction

_NUMBER = re.compile(r"[+-]?(\d+(\.\d*)?|\.\d+)([eE][+-]?\d{1,3})?", re.ASCII)
_COMMA = re.compile(r"[+-]?\d*,\d+([eE][+-]?\d{1,3})?", re.ASCII)
_MINUS = str.maketrans({"\u2212": "-"})


def parse_number(text: str, decimal: str = ".") -> Fraction | None:
    """Return the number that a text writes, or None where it writes none.

    Parameters
    ----------
    text : str
        Digits with a sign, a decimal mark or an exponent; spaces around it do no harm. A true minus
        sign counts as one. No thousands marks, percent signs, infinities or nan.
    decimal : str
        The decimal mark, "." or ",".
    """
    plain = text.strip().translate(_MINUS)
    if decimal == ",":
        if "." in plain:
            return None
        plain = plain.replace(",", ".", 1)
    return Fraction(plain.rstrip(".")) if _NUMBER.fullmatch(plain) and plain else None


def has_decimal_comma(text: str) -> bool:
    """Whether the text would be a number if its comma were a decimal point."""
    return _COMMA.fullmatch(text.strip().translate(_MINUS)) is not None


def number_text(variants: list[str]) -> str:
    """Return the plainest spelling of one number: the shortest, then the first by code point."""
    return min((text.strip() for text in variants), key=lambda text: (len(text), text))


def natural_key(text: str) -> tuple[int, Fraction, str]:
    """Sort key: numbers by size, then words by code."""
    number = parse_number(text)
    return (1, Fraction(0), text) if number is None else (0, number, text)


def plain_number(number: Fraction) -> str:
    """Write a number as a person would: exactly where its decimals end, else to 6 digits."""
    rest = number.denominator
    for factor in (2, 5):
        while rest % factor == 0:
            rest //= factor
    if rest == 1 and number.denominator <= 10**6:
        return f"{Decimal(number.numerator) / Decimal(number.denominator):f}"
    return f"{float(number):.6g}"
