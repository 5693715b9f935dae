"""The parts of several files and columns end to end, with one code per distinct text."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
import pandas as pd

from relook.core.exact import BoolArray, IntArray
from relook.tables.layouts import Coded, FileParts, Part
from relook.tables.reading import Texts


@dataclass(frozen=True, slots=True, eq=False)
class Flat:
    """Labels of one variable from all files, in the order of reading.

    Attributes
    ----------
    item, text : int arrays of shape (n_labels,)
        Into `Joined.items` and `texts`.
    coder : int array of shape (n_labels,) or None
        Into `Joined.coders`; None for counts.
    file, column, row : int arrays of shape (n_labels,)
    remark : object array of shape (n_labels,) or None
    texts : object array of shape (n_texts,)
        The distinct label texts.
    n_missing : int
    """

    item: IntArray
    coder: IntArray | None
    text: IntArray
    file: IntArray
    column: IntArray
    row: IntArray
    remark: Texts | None
    texts: Texts
    n_missing: int

    def take(self, chosen: IntArray | BoolArray) -> Flat:
        """Return the chosen labels."""
        return Flat(
            self.item[chosen],
            None if self.coder is None else self.coder[chosen],
            self.text[chosen],
            _taken(self.file, chosen),
            _taken(self.column, chosen),
            self.row[chosen],
            None if self.remark is None else self.remark[chosen],
            self.texts,
            self.n_missing,
        )


@dataclass(frozen=True, slots=True, eq=False)
class Joined:
    """Everything read, under one set of codes.

    `items` and `coders` are object arrays in order of first appearance.
    """

    items: Texts
    coders: Texts
    flats: dict[str, Flat]


def join(files: Sequence[FileParts], names: Sequence[str]) -> Joined:
    """Put the parts of all files together.

    Parameters
    ----------
    files : sequence of FileParts
        One per file, in the order of reading.
    names : sequence of str
        The variables.
    """
    parts = [(at, part) for at, file in enumerate(files) for part in file.parts]
    # Items without a label belong to the items too, so each file's own list comes first.
    own = [Coded(np.zeros(0, dtype=np.int64), file.items) for file in files]
    item_codes, items = join_texts([*own, *(part.items for _, part in parts)])
    coders_of = [part.coders for _, part in parts if part.coders is not None]
    coder_codes, coders = join_texts(coders_of)
    with_coders = iter(coder_codes)
    pieces: dict[str, list[tuple[int, Part, IntArray, IntArray | None]]] = {n: [] for n in names}
    for (file, part), item in zip(parts, item_codes[len(own) :], strict=True):
        coder = None if part.coders is None else next(with_coders)
        pieces[part.variable].append((file, part, item, coder))
    return Joined(items, coders, {name: _flat(found) for name, found in pieces.items()})


def _flat(pieces: Sequence[tuple[int, Part, IntArray, IntArray | None]]) -> Flat:
    text_codes, texts = join_texts([part.labels for _, part, _, _ in pieces])
    coders = [coder for *_, coder in pieces if coder is not None]
    remarks = [
        np.full(part.rows.size, "", dtype=object) if part.remarks is None else part.remarks
        for _, part, _, _ in pieces
    ]
    any_remarks = any(part.remarks is not None for _, part, _, _ in pieces)
    return Flat(
        _end_to_end([item for _, _, item, _ in pieces]),
        None if len(coders) < len(pieces) else _end_to_end(coders),
        _end_to_end(text_codes),
        _end_to_end([_same(file, part.rows.size) for file, part, _, _ in pieces]),
        _end_to_end([_same(part.column, part.rows.size) for _, part, _, _ in pieces]),
        _end_to_end([part.rows for _, part, _, _ in pieces]),
        np.concatenate(remarks) if any_remarks else None,
        texts,
        sum(part.n_missing for _, part, _, _ in pieces),
    )


def join_texts(parts: Sequence[Coded]) -> tuple[list[IntArray], Texts]:
    """Bring several code lists to one, in order of first appearance.

    Returns
    -------
    codes : list of int arrays
        One per part, into `texts`.
    texts : object array
        The distinct texts of all parts that are in use or, for a part without codes, listed.
    """
    if not parts:
        return [], np.empty(0, dtype=object)
    if all(part.texts is parts[0].texts for part in parts):
        return [part.codes for part in parts], parts[0].texts
    together = np.concatenate([part.texts for part in parts])
    codes, texts = pd.factorize(together)
    ends = np.cumsum([len(part.texts) for part in parts])
    lookups = np.split(codes, ends[:-1])
    return [lookup[part.codes] for lookup, part in zip(lookups, parts, strict=True)], np.asarray(
        texts, dtype=object
    )


def order_by_item_and_coder(item: IntArray, coder: IntArray, n_coders: int) -> IntArray:
    """Return the positions that sort labels by item, then coder, then order of reading."""
    n = item.size
    bits = max(1, n).bit_length()
    widest = (int(item.max(initial=0)) + 1) * max(1, n_coders)
    if widest < 2 ** (62 - bits):
        # The position in the low bits makes one plain sort of integers stable.
        word = item.astype(np.int64)
        word *= max(1, n_coders)
        word += coder
        word <<= bits
        word |= np.arange(n)
        word.sort()
        word &= (1 << bits) - 1
        return word
    return np.lexsort((coder, item))


def _same(number: int, n: int) -> IntArray:
    """One number n times over, held once: most tables come from one file, one column of labels."""
    return np.broadcast_to(np.int32(number), n)


def _taken(numbers: IntArray, chosen: IntArray | BoolArray) -> IntArray:
    """The chosen numbers; one that is held once stays so."""
    if numbers.strides != (0,) or numbers.size == 0:
        return numbers[chosen]
    n = int(np.count_nonzero(chosen)) if chosen.dtype == np.bool_ else chosen.size
    return np.broadcast_to(numbers[0], n)


def _end_to_end(arrays: Sequence[IntArray]) -> IntArray:
    if len(arrays) == 1:
        return arrays[0]
    return np.concatenate(arrays) if arrays else np.zeros(0, dtype=np.int64)
