"""Sums of integers that never wrap round.

numpy's 64-bit integers overflow silently, and ordinal differences of ten million labels do reach
that far. Each helper bounds its result first and falls back to Python's own integers, which have no
limit and cost time only where they are needed.
"""

from __future__ import annotations

from typing import Any

import numpy as np
import numpy.typing as npt

IntArray = npt.NDArray[np.integer[Any]]
FloatArray = npt.NDArray[np.float64]
BoolArray = npt.NDArray[np.bool_]
#: Integers of any width: a numpy integer array, or an object array of Python integers.
ExactArray = npt.NDArray[Any]

_LIMIT = 2**62
#: Codes that are counted at once.
_RUN = 1 << 22


def largest(values: ExactArray) -> int:
    """Return the largest absolute value, 0 for an empty array."""
    if values.size == 0:
        return 0
    return max(abs(int(values.max())), abs(int(values.min())))


def widened(values: ExactArray, bound: int) -> ExactArray:
    """Return `values` in a type in which results up to `bound` cannot wrap round.

    Parameters
    ----------
    values : int array
    bound : int
        An upper limit of every absolute value that the caller will compute from `values`.
    """
    return values.astype(np.int64 if bound < _LIMIT else object)


def dot(left: ExactArray, right: ExactArray) -> int:
    """Return the sum of products of two integer arrays of shape (n,), exactly."""
    if left.size == 0:
        return 0
    bound = largest(left) * largest(right) * left.size
    return int(np.dot(widened(left, bound), widened(right, bound)))


def group_sums(values: ExactArray, start: IntArray) -> ExactArray:
    """Return the sum of each run of `values`.

    Parameters
    ----------
    values : int array of shape (n,)
    start : int array of shape (n_groups + 1,)
        Where each run begins; the last entry is n. No run may be empty.
    """
    if len(start) <= 1:
        return np.zeros(0, dtype=np.int64)
    longest = int(np.diff(start).max())
    wide = widened(values, largest(values) * longest)
    return np.asarray(np.add.reduceat(wide, start[:-1]))


def quotients(numerators: ExactArray, denominators: ExactArray | int) -> FloatArray:
    """Return numerators over denominators as floats, each rounded once at most a few units.

    Parameters
    ----------
    numerators : int or float array
    denominators : int array that broadcasts with `numerators`, or an integer of any size
    """
    if isinstance(denominators, int):
        wide = numerators.dtype == object or abs(denominators) >= _LIMIT
    else:
        wide = numerators.dtype == object or denominators.dtype == object
    if not wide:
        return np.asarray(np.true_divide(numerators, denominators), dtype=np.float64)
    return np.asarray(numerators.astype(object) / denominators, dtype=np.float64)


def grouped_sums(group: IntArray, terms: FloatArray, n_groups: int) -> FloatArray:
    """Return the sum of the terms of each group, shape (n_groups,).

    Parameters
    ----------
    group : int array of shape (n,)
    terms : float array of shape (n,), none negative
    n_groups : int

    Notes
    -----
    Adding a million equal terms one by one loses five digits of sixteen. Each term is cut at a bit
    that all share: the upper parts, 27 bits or fewer, add up exactly, and the error of the lower
    parts is too small to be seen.
    """
    if terms.size == 0:
        return np.zeros(n_groups)
    _, exponent = np.frexp(float(terms.max()))
    # Adding and subtracting this number rounds to a multiple of 2**(exponent - 27).
    cut = np.ldexp(1.5, int(exponent) + 25)
    upper = (terms + cut) - cut
    high = np.bincount(group, weights=upper, minlength=n_groups)
    low = np.bincount(group, weights=terms - upper, minlength=n_groups)
    return np.asarray(high + low, dtype=np.float64)


def tally(codes: IntArray, n: int) -> IntArray:
    """Count how often each code occurs, as `numpy.bincount` does, which copies narrow codes first.

    Parameters
    ----------
    codes : int array of shape (n_codes,), none negative
    n : int
        Above every code.

    Returns
    -------
    int array of shape (n,)
    """
    # Each run adds a count for every code, so runs are no shorter than that.
    run = max(n, _RUN)
    found = np.bincount(codes[:run], minlength=n)
    for begin in range(run, codes.size, run):
        found += np.bincount(codes[begin : begin + run], minlength=n)
    return found


def numbered(keys: IntArray, limit: int) -> tuple[IntArray, IntArray, IntArray]:
    """Number the distinct keys in ascending order, as `numpy.unique` does, without sorting if few.

    Parameters
    ----------
    keys : int array of shape (n,), none negative
    limit : int
        Above every key.

    Returns
    -------
    distinct : int array of shape (n_distinct,)
        Ascending.
    which : int array of shape (n,)
        The position of each key in `distinct`.
    often : int array of shape (n_distinct,)
    """
    if limit > max(4 * keys.size, 1 << 16):
        return np.unique(keys, return_inverse=True, return_counts=True)
    every = np.bincount(keys, minlength=1)
    distinct = np.flatnonzero(every)
    number = np.zeros(every.size, dtype=np.int64)
    number[distinct] = np.arange(distinct.size)
    return distinct, number[keys], every[distinct]
