"""A sparse table of counts times a block of columns."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np

from relook.core.exact import FloatArray, IntArray

#: Cells up to which the whole table is held and multiplied as it is.
MOST_DENSE_CELLS = 4_000_000
#: Fill below which the entries alone are quicker.
LEAST_FILL = 0.03


@dataclass(frozen=True, eq=False)
class SparseCounts:
    """A table of numbers most of which are 0.

    Attributes
    ----------
    row, column : int array of shape (n_entries,)
        Where the entries are; `row` ascends.
    count : float array of shape (n_entries,)
    n_rows, n_columns : int
    """

    row: IntArray
    column: IntArray
    count: FloatArray
    n_rows: int
    n_columns: int

    @classmethod
    def from_entries(
        cls, row: IntArray, column: IntArray, count: FloatArray, n_rows: int, n_columns: int
    ) -> SparseCounts:
        """Sort entries by row."""
        order = np.argsort(row, kind="stable")
        return cls(row[order], column[order], count[order], n_rows, n_columns)

    @classmethod
    def one_each(cls, row: IntArray, n_rows: int) -> SparseCounts:
        """Return the table that adds up column j into row `row[j]`."""
        return cls.from_entries(row, np.arange(row.size), np.ones(row.size), n_rows, row.size)

    @property
    def n_entries(self) -> int:
        """The number of entries."""
        return int(self.row.size)

    @property
    def n_terms(self) -> int:
        """How many numbers a product holds at once, per column of the block."""
        inner = 0 if self._dense is not None else self.n_entries
        return max(self.n_rows, self.n_columns, inner)

    def times(self, block: FloatArray) -> FloatArray:
        """Return the product with a block of shape (n_columns, n_block).

        Returns
        -------
        float array of shape (n_rows, n_block)
        """
        if self._dense is not None:
            return np.asarray(self._dense @ block)
        out = np.zeros((self.n_rows, block.shape[1]))
        if self.n_entries:
            terms = block[self.column] * self.count[:, None]
            begins = np.flatnonzero(np.diff(self.row, prepend=-1))
            out[self.row[begins]] = np.add.reduceat(terms, begins, axis=0)
        return out

    @cached_property
    def _dense(self) -> FloatArray | None:
        cells = self.n_rows * self.n_columns
        if cells > MOST_DENSE_CELLS or self.n_entries < LEAST_FILL * cells:
            return None
        table = np.zeros((self.n_rows, self.n_columns))
        table[self.row, self.column] = self.count
        return table
