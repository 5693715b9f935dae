"""The labels of one variable as flat arrays of codes.

Crowds are sparse: five labels each on fifty thousand items by five hundred coders. So labels are
never held as items × coders; they are three columns of equal length, sorted by item.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

from relook.core.exact import BoolArray, IntArray, tally
from relook.errors import RelookError

#: Labels in one run of `CodedLabels.blocks`.
BLOCK = 1 << 18


@dataclass(frozen=True, slots=True, eq=False)
class CodedLabels:
    """Labels of one variable, coded as integers.

    Attributes
    ----------
    item_index : int array of shape (n_labels,)
        The item of each label, ascending.
    value_index : int array of shape (n_labels,)
        The value of each label, below `n_values`.
    coder_index : int array of shape (n_labels,) or None
        The coder of each label; None where the table holds counts without coders.
    n_items, n_values, n_coders : int
        How many there are, those without any label counted.
    """

    item_index: IntArray
    value_index: IntArray
    coder_index: IntArray | None
    n_items: int
    n_values: int
    n_coders: int

    @classmethod
    def from_codes(
        cls,
        item_index: IntArray,
        value_index: IntArray,
        coder_index: IntArray | None = None,
        *,
        n_items: int | None = None,
        n_values: int | None = None,
        n_coders: int | None = None,
    ) -> CodedLabels:
        """Sort the labels by item, keeping the given order within an item.

        Parameters
        ----------
        item_index, value_index : int array of shape (n_labels,)
        coder_index : int array of shape (n_labels,), optional
        n_items, n_values, n_coders : int, optional
            Taken from the largest code where left out.

        Raises
        ------
        RelookError
            Arrays of unequal length, or codes out of bounds.
        """
        columns = {"item_index": item_index, "value_index": value_index}
        if coder_index is not None:
            columns["coder_index"] = coder_index
        limits = {"item_index": n_items, "value_index": n_values, "coder_index": n_coders}
        totals: dict[str, int] = {"coder_index": n_coders or 0}
        for name, codes in columns.items():
            if codes.shape != item_index.shape or codes.ndim != 1:
                raise RelookError(
                    f"`{name}` must have shape ({item_index.size},); got {codes.shape}"
                )
            if codes.size and int(codes.min()) < 0:
                raise RelookError(f"`{name}` must not be negative; got {int(codes.min())}")
            needed = int(codes.max()) + 1 if codes.size else 0
            limit = limits[name]
            if limit is not None and needed > limit:
                raise RelookError(f"`{name}` must be below {limit}; got {needed - 1}")
            totals[name] = needed if limit is None else limit
        if item_index.size > 1 and bool(np.any(item_index[1:] < item_index[:-1])):
            order = np.argsort(item_index, kind="stable")
            item_index, value_index = item_index[order], value_index[order]
            coder_index = None if coder_index is None else coder_index[order]
        return cls(
            item_index,
            value_index,
            coder_index,
            n_items=totals["item_index"],
            n_values=totals["value_index"],
            n_coders=totals["coder_index"],
        )

    @property
    def n_labels(self) -> int:
        """The number of labels."""
        return int(self.item_index.size)

    @property
    def labels_per_item(self) -> IntArray:
        """The number of labels of each item, shape (n_items,)."""
        return tally(self.item_index, self.n_items)

    def of_item(self, item: int) -> slice:
        """Return where the labels of one item stand."""
        # In the type of the array, or the whole array would be brought to that of the numbers.
        bounds = np.array([item, item + 1], dtype=self.item_index.dtype)
        begin, end = np.searchsorted(self.item_index, bounds).tolist()
        return slice(begin, end)

    def blocks(self) -> Iterator[CodedLabels]:
        """Yield the labels in runs of whole items, each long enough to be worth a step of its own.

        What is worked out label by label goes through memory that stays in the processor's cache
        and is used again by the next run; with millions of labels that is most of the time.
        """
        begin = 0
        while begin < self.n_labels:
            end = begin + BLOCK
            if end < self.n_labels:
                # Back to where the last item begins; one that fills a run is taken whole.
                cut = int(np.searchsorted(self.item_index, self.item_index[end]))
                end = (
                    cut
                    if cut > begin
                    else int(np.searchsorted(self.item_index, self.item_index[end], side="right"))
                )
            run = slice(begin, end)
            yield CodedLabels(
                self.item_index[run],
                self.value_index[run],
                None if self.coder_index is None else self.coder_index[run],
                n_items=self.n_items,
                n_values=self.n_values,
                n_coders=self.n_coders,
            )
            begin = end

    def without_coder(self, coder: int) -> CodedLabels:
        """Return the labels of everyone but one coder."""
        if self.coder_index is None:
            raise RelookError("these labels carry no coders")
        return self.where(self.coder_index != coder)

    def where(self, keep: BoolArray) -> CodedLabels:
        """Return the labels for which `keep`, a bool array of shape (n_labels,), is true."""
        return CodedLabels(
            self.item_index[keep],
            self.value_index[keep],
            None if self.coder_index is None else self.coder_index[keep],
            n_items=self.n_items,
            n_values=self.n_values,
            n_coders=self.n_coders,
        )

    def recoded(self, new_value: IntArray, n_values: int) -> CodedLabels:
        """Return the labels with value v replaced by `new_value[v]`, as when labels are merged.

        Parameters
        ----------
        new_value : int array of shape (n_values before,)
        n_values : int
            How many values there are afterwards.
        """
        return CodedLabels(
            self.item_index,
            np.asarray(new_value)[self.value_index],
            self.coder_index,
            n_items=self.n_items,
            n_values=n_values,
            n_coders=self.n_coders,
        )
