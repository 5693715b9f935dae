"""The table of items: a row per disputed item and variable, in rank order."""

from __future__ import annotations

import numpy as np
import pandas as pd

from relook.core.contributions import alpha_costs, intensity
from relook.core.exact import FloatArray, IntArray
from relook.core.settling import decided_values, settled_alphas
from relook.project.figures.consensus_texts import consensus_texts
from relook.project.figures.scoring import Score, VariableScore

COLUMNS = (
    "rank",
    "item",
    "variable",
    "contribution",
    "share",
    "cumulative_share",
    "alpha_cost",
    "intensity",
    "doubt",
    "n_labels",
    "consensus",
    "tie",
    "settled_alpha",
)


def item_table(score: Score, n_items: int | None = None) -> pd.DataFrame:
    """Return the ranked items with their figures.

    Parameters
    ----------
    score : Score
    n_items : int, optional
        Only the head of the ranking.

    Returns
    -------
    DataFrame
        Columns `COLUMNS`. An item has a row for each variable that it is sent for. `share` and
        `cumulative_share` are of the variable's D_o, the latter of its rows down to this one;
        `intensity` is the mean δ² over the item's pairs of labels; `consensus` names tied labels
        with " | " between, and `tie` says so; `settled_alpha` is agreement in the corrected data if
        that item alone took its consensus label, nan where that is a tie. `doubt` is nan where
        there is no ground for it.
    """
    ranking = score.ordering.ranking
    n = ranking.n_items if n_items is None else min(n_items, ranking.n_items)
    n_rows = int(ranking.row_start[n])
    place = np.repeat(np.arange(n), np.diff(ranking.row_start[: n + 1]))
    variable = ranking.row_variable[:n_rows]
    frames = []
    for position, scored in enumerate(score.variables):
        rows = np.flatnonzero(variable == position)
        items = ranking.item_index[place[rows]]
        frame = _rows_of_variable(score, scored, items)
        frame.insert(0, "rank", place[rows] + 1)
        frame.index = pd.Index(rows)
        frames.append(frame)
    # Frames without rows would only turn the types of the others' columns.
    table = pd.concat([frame for frame in frames if len(frame)] or frames[:1]).sort_index()
    return table.loc[:, list(COLUMNS)].reset_index(drop=True)


def _rows_of_variable(score: Score, scored: VariableScore, items: IntArray) -> pd.DataFrame:
    agreement = scored.agreement
    contribution = scored.contributions[items]
    observed = agreement.observed_disagreement or 1.0
    costs = alpha_costs(agreement, contribution)
    profile = agreement.profile_of_item[items]
    distinct, which = np.unique(profile, return_inverse=True)
    consensus = consensus_texts(scored.held, scored.consensus, distinct)
    doubt = scored.doubt.doubt
    none = np.full(items.size, np.nan)
    return pd.DataFrame(
        {
            "item": score.loaded.labels.items[items],
            "variable": scored.name,
            "contribution": contribution,
            "share": contribution / observed,
            "cumulative_share": np.cumsum(contribution) / observed,
            "alpha_cost": none if costs is None else costs,
            "intensity": intensity(agreement)[items],
            "doubt": none if doubt is None else doubt[items],
            "n_labels": agreement.profiles.size[profile],
            "consensus": consensus[which],
            "tie": scored.consensus.tie[profile],
            "settled_alpha": _settled(scored, distinct)[which],
        }
    )


def _settled(scored: VariableScore, profile: IntArray) -> FloatArray:
    """Agreement if one item of each profile took its consensus label; nan for ties."""
    after = np.full(profile.size, np.nan)
    known = ~scored.consensus.tie[profile]
    if bool(known.any()) and scored.agreement.alpha is not None:
        decided, values = decided_values(scored.agreement, scored.consensus, most_used=True)
        chosen = profile[known]
        figures = settled_alphas(scored.agreement, chosen, decided[chosen], values)
        after[known] = figures.agreement
    return after
