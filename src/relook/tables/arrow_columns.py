"""Columns of text as pyarrow holds them: what the extra `fast` reads, looks through and codes.

Nothing here makes a Python object per cell: only distinct texts become strings. All functions are
called with a column or a file at hand that came from here, but for `read_regular`, which says
whether the extra is installed.
"""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

import numpy as np
import numpy.typing as npt
import pandas as pd

from relook.core.exact import BoolArray, IntArray

#: Bytes that a blank text may begin with: ASCII white space, and the first bytes of all others
#: that Unicode counts as such (U+0085, U+00A0, U+1680, U+2000 and following, U+3000).
_SPACES = (*range(9, 14), *range(28, 33), 0xC2, 0xE1, 0xE2, 0xE3)


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

    encoded = column.dictionary_encode()
    if encoded.num_chunks == 0:
        return np.zeros(0, dtype=np.int32), np.empty(0, dtype=object)
    # All chunks share the dictionary of the last, which holds the texts of those before it.
    texts = encoded.chunk(encoded.num_chunks - 1).dictionary.to_numpy(zero_copy_only=False)
    codes = pa.chunked_array([chunk.indices for chunk in encoded.chunks]).to_numpy()
    return codes, np.asarray(texts, dtype=object)


def maybe_blank(column: Any) -> BoolArray:
    """Return which cells of an Arrow column are empty or begin as a blank one may, by its bytes."""
    found = [np.zeros(0, dtype=bool)]
    space = np.zeros(256, dtype=bool)
    space[list(_SPACES)] = True
    for chunk in column.chunks:
        _, offsets, held = chunk.buffers()
        wide = np.int64 if str(chunk.type).startswith("large") else np.int32
        bounds = np.frombuffer(offsets, dtype=wide)[chunk.offset : chunk.offset + len(chunk) + 1]
        begin, empty = bounds[:-1], bounds[1:] == bounds[:-1]
        if held is None or held.size == 0:
            found.append(empty)
            continue
        letters = np.frombuffer(held, dtype=np.uint8)
        # An empty cell at the very end begins where no byte is.
        first = letters[np.minimum(begin, letters.size - 1)]
        found.append(empty | space[first])
    return np.concatenate(found)
