"""The parts of several files and columns end to end, with one code per distinct text."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from concurrent.futures import ThreadPoolExecutor
from dataclasses import dataclass, replace

import numpy as np
import pandas as pd

from relook.core.exact import BoolArray, IntArray
from relook.tables.layouts import Coded, FileParts, Part
from relook.tables.reading import Texts

_RUN = 1 << 16
#: So many numbers are sorted on two threads.
_MANY = 1 << 20


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


def by_item_and_coder(flat: Flat, n_items: int, n_coders: int) -> Flat:
    """Sort labels by item, then coder, then order of reading."""
    widths = (n_items, n_coders, flat.item.size, len(flat.texts))
    item, coder, place, text = (max(0, width - 1).bit_length() for width in widths)
    if item + coder + place + text > 63:
        order = np.lexsort((flat.item,) if flat.coder is None else (flat.coder, flat.item))
        return flat.take(order)
    # One number holds a label whole, so a plain sort of numbers moves everything there is of it,
    # and the place in it makes that sort stable.
    word = np.empty(flat.item.size, dtype=np.int64)
    for run in _runs(word.size):
        part = word[run]
        part[:] = flat.item[run]
        if flat.coder is not None:
            part <<= coder
            part |= flat.coder[run]
        part <<= place
        part |= np.arange(run.start, run.stop)
        part <<= text
        part |= flat.text[run]
    _sort_on_both(word)
    places: IntArray = np.empty(word.size, dtype=np.int32 if place < 32 else np.int64)
    texts, items = np.empty_like(flat.text), np.empty_like(flat.item)
    coders = None if flat.coder is None else np.empty_like(flat.coder)
    for run in _runs(word.size):
        part = word[run]
        texts[run] = part & ((1 << text) - 1)
        part >>= text
        places[run] = part & ((1 << place) - 1)
        part >>= place
        if coders is not None:
            coders[run] = part & ((1 << coder) - 1)
            part >>= coder
        items[run] = part
    del word
    return replace(
        flat,
        item=items,
        coder=coders,
        text=texts,
        file=_taken(flat.file, places),
        column=_taken(flat.column, places),
        row=_rows_at(flat, places),
        remark=None if flat.remark is None else flat.remark[places],
    )


def _rows_at(flat: Flat, places: IntArray) -> IntArray:
    """The rows of labels at other places: mostly one label a row, of one column without a gap."""
    row, n = flat.row, flat.item.size
    one_column = flat.file.strides == flat.column.strides == (0,) and flat.coder is not None
    # Rows of one column ascend, so that the first and the last tell whether one is left out.
    if n and one_column and int(row[-1]) - int(row[0]) == n - 1:
        return places + places.dtype.type(row[0])
    return np.asarray(row[places])


def _runs(n: int) -> Iterator[slice]:
    """Cut so many places into runs that stay in the processor's cache."""
    for begin in range(0, n, _RUN):
        yield slice(begin, min(n, begin + _RUN))


def _sort_on_both(numbers: IntArray) -> None:
    """Sort numbers where they stand, a half on each of two threads where they are many."""
    middle = numbers.size // 2
    if numbers.size < _MANY:
        numbers.sort()
        return
    numbers.partition(middle)
    with ThreadPoolExecutor(2) as both:
        list(both.map(lambda half: half.sort(), (numbers[:middle], numbers[middle:])))


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
