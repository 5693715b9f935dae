"""Agreement of the labels of a DataFrame, and where the disagreement lives."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field
from fractions import Fraction
from typing import Any, Literal

import numpy.typing as npt
import pandas as pd

from relook.core.resampling import RESAMPLES
from relook.frames.intake import Declared, loaded_of
from relook.frames.showing import Facts, as_html, figure, plain
from relook.project.figures.explaining import Explanation, explain
from relook.project.figures.item_table import item_table
from relook.project.figures.score_tables import (
    coder_pair_rows,
    coder_rows,
    group_rows,
    label_pair_rows,
    label_rows,
)
from relook.project.figures.scoring import Score, VariableScore, score
from relook.project.setup.settings import QueueSettings

RankBy = Literal["contribution", "doubt", "intensity"]


@dataclass(frozen=True, slots=True, kw_only=True, eq=False, repr=False)
class Measured:
    """Agreement on one variable, as `measure` found it.

    Attributes
    ----------
    variable : str
    difference : str
        Name of the difference function.
    alpha : float or None
        Krippendorff's alpha; None where it is undefined.
    undefined_because : str or None
    observed_disagreement, expected_disagreement : float or None
        D_o and D_e; alpha = 1 − D_o/D_e.
    interval : tuple of (float, float) or None
        95 % interval of alpha, from resampled items.
    no_interval_because : str or None
    n_items, n_pairable_items, n_disputed_items : int
        Items with a label; those with two or more; those of them whose labels differ.
    n_labels, n_missing, n_coders : int
    """

    variable: str
    difference: str
    alpha: float | None
    undefined_because: str | None
    observed_disagreement: float | None
    expected_disagreement: float | None
    interval: tuple[float, float] | None
    no_interval_because: str | None
    n_items: int
    n_pairable_items: int
    n_disputed_items: int
    n_labels: int
    n_missing: int
    n_coders: int
    _score: Score = field(repr=False)

    @property
    def items(self) -> pd.DataFrame:
        """The disputed items, in the order in which they deserve a second look.

        Returns
        -------
        DataFrame of shape (n_disputed_items, 14)
            Columns rank, item, variable, contribution (to D_o), share (of D_o), cumulative_share,
            alpha_cost (contribution/D_e: what alpha lost by it), intensity (mean δ² over the item's
            pairs of labels), doubt (a score from 0 to 1 of how likely the consensus label is
            wrong, after Dawid & Skene 1979, no calibrated probability; nan without ground for it),
            n_labels, consensus, tie, settled_alpha.

        Examples
        --------
        >>> import pandas as pd, relook
        >>> labels = pd.DataFrame({"a": list("xxyx"), "b": list("xyyx"), "c": list("xyzx")})
        >>> relook.measure(labels).items[["rank", "item", "n_labels", "consensus"]]
           rank item  n_labels consensus
        0     1    2         3         y
        1     2    1         3         y
        """
        return item_table(self._score)

    @property
    def coders(self) -> pd.DataFrame:
        """Each coder's part of D_o, heaviest first.

        Returns
        -------
        DataFrame of shape (n_coders, 11)
            `involved` is the share of D_o in pairs of which the coder is one side; `own_alpha` is
            1 − own mean difference/D_e; `alpha_without` is alpha of the others.
        """
        return pd.DataFrame(coder_rows(self._variable))

    @property
    def coder_pairs(self) -> pd.DataFrame:
        """The part of D_o of each two coders who meet, heaviest first, shape (n_pairs, 6)."""
        return pd.DataFrame(coder_pair_rows(self._variable))

    @property
    def labels(self) -> pd.DataFrame:
        """How often each label is used and how well it is agreed on, shape (n_values, 6).

        `alpha_against_rest` is nominal alpha with all other labels taken as one.
        """
        return pd.DataFrame(label_rows(self._variable))

    @property
    def label_pairs(self) -> pd.DataFrame:
        """The part of D_o of each two labels that clash, heaviest first, shape (n_pairs, 7).

        `chance_share` is the pair's share of D_e: what its frequency and distance would make it.

        Examples
        --------
        >>> import pandas as pd, relook
        >>> labels = pd.DataFrame({"a": list("xxyx"), "b": list("xyyx"), "c": list("xyzx")})
        >>> relook.measure(labels).label_pairs[["first", "second", "share"]]
          first second  share
        0     x      y    0.5
        1     y      z    0.5
        """
        return pd.DataFrame(label_pair_rows(self._variable))

    @property
    def groups(self) -> pd.DataFrame:
        """The part of D_o of each group of items, by the columns that `group_by` named."""
        return pd.DataFrame(group_rows(self._variable))

    def why(self, item: object) -> Explanation:
        """Return the arithmetic of one item, term by term.

        Parameters
        ----------
        item : object
            Its id, as in the labels.

        Raises
        ------
        RelookError
            No such item, or one without labels.

        Examples
        --------
        >>> import pandas as pd, relook
        >>> labels = pd.DataFrame({"a": list("xxyx"), "b": list("xyyx"), "c": list("xyzx")})
        >>> held = relook.measure(labels).why(1)
        >>> held.labels
        (('a', 'x'), ('b', 'y'), ('c', 'y'))
        """
        return explain(self._score.loaded, str(item))[0]

    @property
    def _variable(self) -> VariableScore:
        return self._score.variables[0]

    def _facts(self) -> Facts:
        alpha = figure(self.alpha)
        if self.alpha is None:
            alpha += f": {self.undefined_because}"
        if self.interval is not None:
            alpha += f", 95% interval {self.interval[0]:.3f} to {self.interval[1]:.3f}"
        items = (
            f"{self.n_pairable_items:,} of {self.n_items:,} with two labels or more, "
            f"{self.n_disputed_items:,} disputed"
        )
        labels = f"{self.n_labels:,} by {self.n_coders:,} coders, {self.n_missing:,} missing"
        return (
            ("alpha", alpha),
            ("D_o", figure(self.observed_disagreement)),
            ("D_e", figure(self.expected_disagreement)),
            ("items", items),
            ("labels", labels),
        )

    def __repr__(self) -> str:
        return plain(f"{self.variable}: {self.difference} differences", self._facts())

    def _repr_html_(self) -> str:
        return as_html(f"{self.variable}: {self.difference} differences", self._facts())


def measure(
    labels: pd.DataFrame | npt.ArrayLike,
    *,
    item: str | None = None,
    coder: str | None = None,
    label: str | None = None,
    coders: Sequence[str] | None = None,
    difference: str = "nominal",
    order: Sequence[Any] | None = None,
    tolerance: Fraction | int | str = 0,
    items: pd.DataFrame | None = None,
    show: Sequence[str] | None = None,
    group_by: Sequence[str] = (),
    rank_by: RankBy = "contribution",
    seed: int = 1,
) -> Measured:
    """Measure agreement on one variable and take the disagreement apart.

    Parameters
    ----------
    labels : DataFrame or array-like of shape (n_items, n_coders)
        Long, a row per label, with `item`, `coder` and `label`; or a row per item and a column per
        coder. None, nan and NA are missing labels, and so is an empty text. An array is of the
        second kind.
    item : str, optional
        Column of the item ids; the index where left out of a table with a column per coder.
    coder, label : str, optional
        Columns of a long table.
    coders : sequence of str, optional
        The columns that hold a coder's labels; all but `item` where left out.
    difference : str
        nominal, ordinal, interval, ratio, circular:12, polar:0,10, jaccard:;, masi:;, tree:/ or
        table:FILE.csv (Krippendorff 2004, 2011; Passonneau 2006; Wu & Palmer 1994). Labels that are
        sets or lists of labels need jaccard or masi.
    order : sequence, optional
        The labels in their order, for ordinal differences; taken from an ordered categorical where
        left out, else numbers by size. For other functions: the labels that there are.
    tolerance : Fraction, int or str
        Numbers this close are not in dispute.
    items : DataFrame, optional
        What coders saw: a row per item, its id in the column named as `item` or in the index.
    show : sequence of str, optional
        The columns of `items` that adjudicators will see; all of them where left out.
    group_by : sequence of str
        Columns of `items` to break the disagreement down by.
    rank_by : {"contribution", "doubt", "intensity"}
        What orders the items.
    seed : int
        For the resampling and the last tie-break.

    Returns
    -------
    Measured

    Raises
    ------
    RelookError
        With every problem found in the labels; rows are counted from 0, as by `iloc`.

    Notes
    -----
    alpha = 1 − D_o/D_e; an ordered pair (i, j) of labels of item u adds δ²(v_i, v_j)/(n (m_u − 1))
    to D_o, with n pairable labels in all and m_u of the item (Krippendorff 2004, ch. 11). The
    interval resamples items with all their labels (Zapf et al. 2016).

    Examples
    --------
    >>> import pandas as pd, relook
    >>> labels = pd.DataFrame({"Ann": [1, 2, 3, 3], "Bo": [1, 2, 3, 4], "Cy": [1, None, 3, 4]})
    >>> relook.measure(labels, difference="interval")
    label: interval differences
      alpha   0.929, 95% interval 0.312 to 1.000
      D_o     0.182
      D_e     2.545
      items   4 of 4 with two labels or more, 1 disputed
      labels  11 by 3 coders, 1 missing
    """
    loaded = loaded_of(
        labels,
        items,
        Declared(
            item=item,
            coder=coder,
            label=label,
            coders=coders,
            difference=difference,
            order=order,
            tolerance=tolerance,
            show=show,
            group_by=group_by,
        ),
    )
    held = score(loaded, QueueSettings(rank_by=rank_by), seed=seed, resamples=RESAMPLES)
    return measured_of(held)


def measured_of(held: Score) -> Measured:
    """Return the figures of a score of one variable."""
    scored = held.variables[0]
    agreement, result = scored.agreement, scored.interval
    return Measured(
        variable=scored.name,
        difference=scored.held.variable.difference,
        alpha=agreement.alpha,
        undefined_because=agreement.undefined_because,
        observed_disagreement=agreement.observed_disagreement,
        expected_disagreement=agreement.expected_disagreement,
        interval=None if result.interval is None else (result.interval.low, result.interval.high),
        no_interval_because=result.none_because,
        n_items=agreement.n_items,
        n_pairable_items=agreement.n_pairable_items,
        n_disputed_items=agreement.n_disputed_items,
        n_labels=agreement.n_labels,
        n_missing=scored.held.n_missing,
        n_coders=agreement.n_coders,
        _score=held,
    )
