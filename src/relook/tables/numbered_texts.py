"""Short texts as whole numbers, so that a column of ids is coded without hashing each of them.

Ids mostly count: "r0001", "r0002", or "1" to "2000000". Their bytes are digits of a number, each in
a base as large as the bytes at its place are varied, and a table with a place for every such number
is no larger than the column. Looking a number up there takes a fraction of the time of hashing a
text. Where the numbers would be too large, as those of random ids are, nothing is lost but a look
at the first texts.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from relook.core.exact import IntArray

Bytes = npt.NDArray[np.uint8]

#: Texts with more bytes, or of more different lengths, are not tried.
MOST_BYTES, MOST_LENGTHS = 32, 12
#: Texts that are looked at before all of them are.
_FIRST = 4_096
_BLOCK = 1 << 16


@dataclass(frozen=True, slots=True)
class TextBytes:
    """Texts end to end: text i is `letters[bounds[i]:bounds[i + 1]]`, in UTF-8.

    Attributes
    ----------
    bounds : int array of shape (n_texts + 1,)
    letters : uint8 array
    """

    bounds: IntArray
    letters: Bytes

    @property
    def n(self) -> int:
        """How many texts there are."""
        return self.bounds.size - 1


def numbers_of_texts(parts: Sequence[TextBytes], most: int) -> tuple[IntArray, int] | None:
    """Return a number for each text, the same for equal texts and for no others.

    Parameters
    ----------
    parts : sequence of TextBytes
    most : int
        The numbers stay below it.

    Returns
    -------
    numbers : int array of shape (n_texts,)
    size : int
        The numbers stay below it too.

    None where that cannot be.
    """
    seen = _Places()
    if parts and parts[0].n > _FIRST:
        first = TextBytes(parts[0].bounds[: _FIRST + 1], parts[0].letters)
        if not (seen.look_at(first) and seen.size <= most):
            return None
    for part in parts:
        if not (seen.look_at(part) and seen.size <= most):
            return None
    bases = seen.bases()
    numbers: IntArray = np.empty(sum(part.n for part in parts), dtype=np.int32)
    at = 0
    for part in parts:
        _number(part, seen, bases, numbers[at : at + part.n])
        at += part.n
    return numbers, seen.size


class _Places:
    """The least and largest byte at each place of the texts of each length."""

    def __init__(self) -> None:
        self.least: dict[int, Bytes] = {}
        self.largest: dict[int, Bytes] = {}

    @property
    def size(self) -> int:
        """How many texts there could be with such bytes."""
        return sum(self._of_length(length) for length in self.least)

    def bases(self) -> dict[int, int]:
        """The number that texts of each length begin at."""
        found, begin = {}, 0
        for length in sorted(self.least):
            found[length] = begin
            begin += self._of_length(length)
        return found

    def _of_length(self, length: int) -> int:
        size = 1
        for low, high in zip(
            self.least[length].tolist(), self.largest[length].tolist(), strict=True
        ):
            size *= high - low + 1
        return size

    def look_at(self, part: TextBytes) -> bool:
        """Take in some texts; false where they are too long or of too many lengths."""
        for begin in range(0, part.n, _BLOCK):
            bounds = part.bounds[begin : begin + _BLOCK + 1]
            lengths = np.diff(bounds)
            if lengths.max(initial=0) > MOST_BYTES:
                return False
            for length in np.flatnonzero(np.bincount(lengths)).tolist():
                held = _of_one_length(bounds, lengths, length, part.letters)
                low, high = held.min(axis=1), held.max(axis=1)
                if length in self.least:
                    low = np.minimum(low, self.least[length])
                    high = np.maximum(high, self.largest[length])
                self.least[length], self.largest[length] = low, high
        return len(self.least) <= MOST_LENGTHS


def _of_one_length(bounds: IntArray, lengths: IntArray, length: int, letters: Bytes) -> Bytes:
    """Return the bytes of the texts of one length, shape (length, n_texts)."""
    begin = bounds[:-1][lengths == length]
    if begin.size == lengths.size:
        held = letters[bounds[0] : bounds[-1]].reshape(begin.size, length)
        return np.ascontiguousarray(held.T)
    return np.asarray(letters[begin + np.arange(length, dtype=bounds.dtype)[:, None]])


def _number(part: TextBytes, seen: _Places, bases: dict[int, int], into: IntArray) -> None:
    for begin in range(0, part.n, _BLOCK):
        bounds = part.bounds[begin : begin + _BLOCK + 1]
        lengths = np.diff(bounds)
        for length in np.flatnonzero(np.bincount(lengths)).tolist():
            held = _of_one_length(bounds, lengths, length, part.letters)
            number = np.zeros(held.shape[1], dtype=np.int32)
            for place, low, high in zip(
                held, seen.least[length].tolist(), seen.largest[length].tolist(), strict=True
            ):
                if high > low:
                    number *= high - low + 1
                    number += place
                    number -= low
            number += bases[length]
            if number.size == lengths.size:
                into[begin : begin + lengths.size] = number
            else:
                into[begin : begin + lengths.size][lengths == length] = number


def in_order_of_appearance(numbers: IntArray, size: int) -> tuple[IntArray, IntArray]:
    """Renumber numbers from 0 in the order in which they first appear.

    Parameters
    ----------
    numbers : int array of shape (n,)
    size : int
        The numbers stay below it.

    Returns
    -------
    codes : int array of shape (n,)
    first : int array of shape (n_distinct,)
        Where each code first appears, ascending.
    """
    n = numbers.size
    where = np.full(size, n, dtype=np.int32)
    n_found = 0
    for begin in range(0, n, _BLOCK):
        block = numbers[begin : begin + _BLOCK]
        at = np.flatnonzero(where[block] == n)
        if at.size == 0:
            continue
        new, place = block[at], (begin + at).astype(np.int32)
        # Written from the last to the first, so that the first one stands.
        where[new[::-1]] = place[::-1]
        n_found += int(np.count_nonzero(where[new] == place))
        if n_found == size:
            break
    first = np.sort(where[where < n])
    code = where  # its room is used again
    code[numbers[first]] = np.arange(first.size, dtype=np.int32)
    return code[numbers], first
