"""The difference functions δ²(c, k), one class each and one table of them.

Laws that every function keeps, and that the tests check for all of them: δ²(c, c) = 0,
δ²(c, k) = δ²(k, c) ≥ 0. Which maps of the labels leave alpha unchanged differs: any renaming
(nominal), any increasing map (ordinal), a + bx (interval), bx with b > 0 (ratio).

A function is *bound* to the values in use and their pairable counts, because ordinal differences
depend on those counts. Bound differences are integers over one common denominator wherever the
function allows, so that sums stay exact until the last step.

References
----------
Krippendorff, K. (2004). Content Analysis, 2nd ed., ch. 11. Krippendorff, K. (2011). Computing
Krippendorff's Alpha-Reliability. University of Pennsylvania.
"""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np

from relook.core.difference_base import (
    CoordinateDifferences,
    DifferenceFunction,
    Differences,
    Needs,
    NominalDifferences,
    PairwiseDifferences,
    Values,
)
from relook.core.exact import FloatArray, IntArray
from relook.core.further_differences import (
    Circular,
    DifferenceTable,
    Jaccard,
    Masi,
    Polar,
    Table,
    Tree,
)
from relook.errors import RelookError, listed, nearest

__all__ = [
    "DIFFERENCE_FUNCTIONS",
    "Circular",
    "CoordinateDifferences",
    "DifferenceFunction",
    "DifferenceTable",
    "Differences",
    "Interval",
    "Jaccard",
    "Masi",
    "Needs",
    "Nominal",
    "NominalDifferences",
    "Ordinal",
    "PairwiseDifferences",
    "Polar",
    "Ratio",
    "Table",
    "Tree",
    "Values",
    "difference_function",
    "doubled_midranks",
    "parse_difference",
]


class Nominal(DifferenceFunction):
    """δ² = 1 for different labels (Krippendorff 2011, section on metric differences)."""

    name = "nominal"
    needs = "identity"

    def bind(self, values: Values, marginals: IntArray) -> Differences:
        """Return unit differences."""
        return NominalDifferences()


def doubled_midranks(marginals: IntArray) -> IntArray:
    """Return twice the midrank of each value among the pairable labels, less 1.

    Parameters
    ----------
    marginals : int array of shape (..., n_values)
        n_g of the values in rank order.

    Notes
    -----
    The midrank of value c is Σ_{g<c} n_g + (n_c + 1)/2; doubling keeps it an integer.
    """
    below = np.cumsum(marginals, axis=-1) - marginals
    return np.asarray(2 * below + marginals)


class Ordinal(DifferenceFunction):
    """δ² = (Σ_{g=c..k} n_g − (n_c + n_k)/2)², the squared distance of midranks (2004, p. 232).

    The counts are those of pairable labels only.
    """

    name = "ordinal"
    needs = "order"
    moves_with_marginals = True

    def bind(self, values: Values, marginals: IntArray) -> Differences:
        """Return squared distances of doubled midranks over 4."""
        return CoordinateDifferences(doubled_midranks(marginals.astype(np.int64)), 4)


class Interval(DifferenceFunction):
    """δ² = (c − k)²."""

    name = "interval"
    needs = "number"

    def bind(self, values: Values, marginals: IntArray) -> Differences:
        """Return squared distances of the numbers over their common denominator."""
        return CoordinateDifferences(self._numbers(values), values.denominator**2)


class Ratio(DifferenceFunction):
    """δ² = ((c − k)/(c + k))² for labels of 0 or more; 0 against 0 is 0."""

    name = "ratio"
    needs = "number"
    compares_every_two = True

    def check(self, values: Values) -> list[tuple[int, str]]:
        """Return the values below 0."""
        if values.numerators is None:
            return []
        below = np.flatnonzero(np.asarray(values.numerators < 0, dtype=bool))
        return [(code, "is negative, and a ratio needs 0 or more") for code in below.tolist()]

    def bind(self, values: Values, marginals: IntArray) -> Differences:
        """Return squared relative differences."""
        self._numbers(values)
        self._refuse_faults(values)
        x = values.numbers()

        def relative(first: IntArray, second: IntArray) -> FloatArray:
            total = x[first] + x[second]
            step = x[first] - x[second]
            # Only 0 against 0 has a total of 0, and its step is 0 too.
            return np.asarray((step / np.where(total > 0, total, 1.0)) ** 2)

        return PairwiseDifferences(relative)


#: Every level of measurement by its name in relook.toml. A new function is a class and a row here;
#: those with options must be told them first (`difference_function`).
DIFFERENCE_FUNCTIONS: dict[str, DifferenceFunction] = {
    function.name: function
    for function in (
        Nominal(),
        Ordinal(),
        Interval(),
        Ratio(),
        Circular(),
        Polar(),
        Jaccard(),
        Masi(),
        Tree(),
        Table(),
    )
}


def difference_function(
    name: str, options: Mapping[str, object] | None = None
) -> DifferenceFunction:
    """Return a difference function told what it must be told.

    Parameters
    ----------
    name : str
        A name in `DIFFERENCE_FUNCTIONS`.
    options : mapping, optional
        period (circular), ends (polar), separator (jaccard, masi, tree), or table (table: a
        `DifferenceTable`).

    Raises
    ------
    RelookError
        A name or an option that is not known, missing or of the wrong kind.

    Examples
    --------
    >>> difference_function("circular", {"period": 24}).name
    'circular'
    """
    if name not in DIFFERENCE_FUNCTIONS:
        meant = nearest(name, DIFFERENCE_FUNCTIONS)
        raise RelookError(
            f'"{name}" is not a difference function',
            mend=f'did you mean "{meant}"?' if meant else f"use one of {_names()}",
        )
    return DIFFERENCE_FUNCTIONS[name].with_options(options or {})


def parse_difference(text: str) -> tuple[str, dict[str, object]]:
    """Read a difference function written in one word, such as `circular:12`.

    Parameters
    ----------
    text : str
        `nominal`, `circular:12`, `polar:0,10`, `jaccard:;`, `masi:;`, `tree:/` or
        `table:differences.csv`.

    Returns
    -------
    name : str
    options : dict
        As relook.toml would have them; the table is its path, still to be read.

    Raises
    ------
    RelookError
        A name that is not known, or an option missing or not to be read.

    Examples
    --------
    >>> parse_difference("polar:0,10")
    ('polar', {'ends': ['0', '10']})
    """
    name, colon, rest = text.strip().partition(":")
    if name not in DIFFERENCE_FUNCTIONS:
        difference_function(name)
    function = DIFFERENCE_FUNCTIONS[name]
    if not function.options:
        if colon:
            raise RelookError(
                f"{name} differences take no option; got {text!r}", mend=f"write {name}"
            )
        return name, {}
    rest = rest if rest.isspace() else rest.strip()
    if not rest:
        raise RelookError(
            f"{name} differences need {listed(function.options)}",
            mend=f"write it after a colon, such as {_WRITTEN[name]}",
        )
    options: dict[str, object] = {function.options[0]: rest}
    if name == "polar":
        options = {"ends": [end.strip() for end in rest.split(",")]}
    if name != "table":
        function.with_options(options)
    return name, options


#: How each function with an option is written in one word.
_WRITTEN = {
    "circular": "circular:12",
    "polar": "polar:0,10",
    "jaccard": "jaccard:;",
    "masi": "masi:;",
    "tree": "tree:/",
    "table": "table:differences.csv",
}


def _names() -> str:
    return listed(DIFFERENCE_FUNCTIONS)
