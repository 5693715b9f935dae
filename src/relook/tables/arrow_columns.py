"""Columns of text as pyarrow holds them: what the extra `fast` reads, looks through and codes.

Nothing here makes a Python object per cell: only distinct texts become strings. All functions are
called with a column or a file at hand that came from here, but for `read_regular`, which says
whether the extra is installed.
"""

from __future__ import annotations

import sys
from collections.abc import Mapping
from typing import Any

import numpy as np
import numpy.typing as npt
import pandas as pd

from relook.core.exact import BoolArray, IntArray
from relook.tables.numbered_texts import TextBytes, in_order_of_appearance, numbers_of_texts

#: Bytes that a blank text may begin with: ASCII white space, and the first bytes of all others
#: that Unicode counts as such (U+0085, U+00A0, U+1680, U+2000 and following, U+3000).
_SPACES = (*range(9, 14), *range(28, 33), 0xC2, 0xE1, 0xE2, 0xE3)

#: From so many texts on, columns with many distinct ones among the first are coded by numbers.
_MANY, _HEAD = 100_000, 4_096
#: Numbers, and a byte more on the way to them, fit into 32 bits.
_MOST = 2**31 - 512


def read_regular(
    data: bytes, delimiter: str, width: int, skip_rows: int = 0
) -> pd.DataFrame | None:
    """Read delimited text without quotes.

    Without a quote, a lone carriage return or a NUL there is one way only to read the bytes, so
    that this sees what any reader would see.

    Parameters
    ----------
    data : bytes
        UTF-8.
    delimiter : str
    width : int
        How many cells each row has.
    skip_rows : int
        Lines to pass over.

    Returns
    -------
    DataFrame or None
        A column of text per cell, labelled 0, 1, …. None where pyarrow is not installed, the bytes
        leave room for doubt, or a row has another number of cells.
    """
    lone_return = b"\r" in data and data.count(b"\r") != data.count(b"\r\n")
    if b'"' in data or b"\0" in data or lone_return:
        return None
    try:
        import pyarrow as pa
        from pyarrow import csv as arrow_csv
    except ImportError:
        return None
    names = [str(column) for column in range(width)]
    try:
        table = arrow_csv.read_csv(
            pa.BufferReader(data),
            read_options=arrow_csv.ReadOptions(
                column_names=names, block_size=1 << 24, skip_rows=skip_rows
            ),
            parse_options=arrow_csv.ParseOptions(
                delimiter=delimiter, quote_char=False, ignore_empty_lines=False
            ),
            convert_options=arrow_csv.ConvertOptions(
                column_types=dict.fromkeys(names, pa.string()),
                strings_can_be_null=False,
                null_values=[],
            ),
        )
    except pa.ArrowException:
        return None
    return frame_of_columns(dict(enumerate(table.columns)))


def frame_of_columns(columns: Mapping[int, Any]) -> pd.DataFrame:
    """Return Arrow columns of text as a frame that holds them as they are."""
    held = {at: pd.arrays.ArrowExtensionArray(column) for at, column in columns.items()}
    return pd.DataFrame(held, copy=False)


def arrow_column(column: pd.Series) -> Any | None:
    """Return the Arrow column that a frame made here holds, None for any other."""
    if not isinstance(column.dtype, pd.ArrowDtype):
        return None
    return column.array.__arrow_array__()


def coded_column(column: Any) -> tuple[IntArray, npt.NDArray[np.object_]]:
    """Return an Arrow column as codes into its distinct texts, in order of first appearance."""
    import pyarrow as pa

    if pa.types.is_dictionary(column.type):
        return _renumbered(column.unify_dictionaries())
    numbered = _coded_by_numbers(column)
    if numbered is not None:
        return numbered
    encoded = column.dictionary_encode()
    if encoded.num_chunks == 0:
        return np.zeros(0, dtype=np.int32), np.empty(0, dtype=object)
    # All chunks share the dictionary of the last, which holds the texts of those before it.
    texts = encoded.chunk(encoded.num_chunks - 1).dictionary.to_numpy(zero_copy_only=False)
    codes = pa.chunked_array([chunk.indices for chunk in encoded.chunks]).to_numpy()
    return codes, np.asarray(texts, dtype=object)


def _renumbered(column: Any) -> tuple[IntArray, npt.NDArray[np.object_]]:
    """Bring a column that is codes already, under one dictionary, to the order of appearance."""
    if len(column) == 0:
        return np.zeros(0, dtype=np.int32), np.empty(0, dtype=object)
    texts = column.chunk(0).dictionary.to_numpy(zero_copy_only=False)
    held = np.concatenate([chunk.indices.to_numpy() for chunk in column.chunks])
    codes, first = in_order_of_appearance(held, len(texts))
    return codes, np.asarray(texts[held[first]], dtype=object)


def _coded_by_numbers(column: Any) -> tuple[IntArray, npt.NDArray[np.object_]] | None:
    """Code a column whose many distinct texts are numbers in disguise, as most ids are."""
    import pyarrow as pa

    n = len(column)
    if not _MANY <= n < 2**31 or column.null_count:
        return None
    head = column.slice(0, _HEAD)
    if len(head.unique()) < _HEAD // 4:
        return None  # few texts are hashed quickly
    found = numbers_of_texts([_text_bytes(chunk) for chunk in column.chunks], min(2 * n, _MOST))
    if found is None:
        return None
    codes, first = in_order_of_appearance(*found)
    # In the type of `first`, which would be brought to another one whole.
    begins = np.cumsum([0, *map(len, column.chunks)], dtype=first.dtype)
    cuts = np.searchsorted(first, begins).tolist()
    texts = [
        chunk.take(pa.array(first[low:high] - begin))
        for chunk, begin, low, high in zip(column.chunks, begins, cuts, cuts[1:], strict=False)
    ]
    return codes, np.asarray(pa.chunked_array(texts).to_numpy(), dtype=object)


def release_memory() -> None:
    """Give back what columns took that are gone; pyarrow keeps it for itself otherwise."""
    loaded = sys.modules.get("pyarrow")
    if loaded is not None:
        loaded.default_memory_pool().release_unused()


def _text_bytes(chunk: Any) -> TextBytes:
    _, offsets, held = chunk.buffers()
    large = str(chunk.type).startswith("large")
    every: IntArray = (
        np.frombuffer(offsets, np.int64) if large else np.frombuffer(offsets, np.int32)
    )
    bounds = every[chunk.offset : chunk.offset + len(chunk) + 1]
    letters = np.zeros(0, np.uint8) if held is None else np.frombuffer(held, dtype=np.uint8)
    return TextBytes(bounds, letters)


def maybe_blank(column: Any) -> BoolArray:
    """Return which cells of an Arrow column are empty or begin as a blank one may, by its bytes."""
    if str(column.type).startswith("dictionary"):
        codes, texts = coded_column(column)
        return np.asarray([not text.strip() for text in texts], dtype=bool)[codes]
    found = [np.zeros(0, dtype=bool)]
    space = np.zeros(256, dtype=bool)
    space[list(_SPACES)] = True
    for chunk in column.chunks:
        held = _text_bytes(chunk)
        begin, empty = held.bounds[:-1], held.bounds[1:] == held.bounds[:-1]
        if held.letters.size == 0:
            found.append(empty)
            continue
        # An empty cell at the very end begins where no byte is.
        first = held.letters[np.minimum(begin, held.letters.size - 1)]
        found.append(empty | space[first])
    return np.concatenate(found)
