"""A project's figures: agreement, where the disagreement lives, and what settling would bring."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from relook.core.agreement import Agreement
from relook.core.consensus import Consensus
from relook.core.contributions import (
    PairParts,
    Parts,
    coder_pair_parts,
    coder_parts,
    group_parts,
    item_contributions,
    label_pair_parts,
)
from relook.core.doubt import Doubt
from relook.core.exact import FloatArray, IntArray
from relook.core.label_tables import LabelParts, label_table
from relook.core.resampling import CONFIDENCE_LEVEL, RESAMPLES, IntervalResult, alpha_interval
from relook.core.sample_size import needed_items
from relook.core.settling import Prospect, prospect
from relook.core.without_coder import WithoutCoder, alpha_without_coder
from relook.project.explaining import consensus_for
from relook.project.loading import Loaded
from relook.project.ordering import Ordering, groups_of, order_items
from relook.project.settings import QueueSettings
from relook.tables.labels import VariableLabels

#: The conventional bar: alpha at which data may be relied on (Krippendorff 2004, p. 241).
CUSTOMARY_ALPHA = 0.8
#: Above this number of coders, alpha without each of them is left out of the screen.
MANY_CODERS = 200


@dataclass(frozen=True, slots=True, kw_only=True)
class GroupScore:
    """A breakdown by one column of the item table."""

    column: str
    names: tuple[str, ...]
    parts: Parts


@dataclass(frozen=True, slots=True, kw_only=True)
class VariableScore:
    """Everything that is known of one variable.

    Attributes
    ----------
    held : VariableLabels
    coder_names : tuple of str
    agreement : Agreement
    contributions : float array of shape (n_items,)
    consensus : Consensus
    interval : IntervalResult
    coders : Parts or None
        None where the table holds counts without coders.
    without : WithoutCoder or None
    coder_pairs, label_pairs : PairParts
    label_parts : LabelParts
    groups : tuple of GroupScore
    prospect : Prospect
        Along the items of the selection that have a row for this variable.
    needed_items : int or None
        What two coders would need to tell alpha from the customary bar.
    doubt : Doubt or None
        None where it was not asked for.
    """

    held: VariableLabels
    coder_names: tuple[str, ...]
    agreement: Agreement
    contributions: FloatArray
    consensus: Consensus
    interval: IntervalResult
    coders: Parts | None
    without: WithoutCoder | None
    coder_pairs: PairParts | None
    label_pairs: PairParts
    label_parts: LabelParts
    groups: tuple[GroupScore, ...]
    prospect: Prospect
    needed_items: int | None
    doubt: Doubt | None

    @property
    def name(self) -> str:
        """The variable's name."""
        return self.held.variable.name


@dataclass(frozen=True, slots=True, kw_only=True)
class Score:
    """All figures of a project.

    Attributes
    ----------
    loaded : Loaded
    variables : tuple of VariableScore
    ordering : Ordering
    seed : int
    """

    loaded: Loaded
    variables: tuple[VariableScore, ...]
    ordering: Ordering
    seed: int


def score(
    loaded: Loaded,
    queue: QueueSettings,
    *,
    seed: int,
    with_doubt: bool = False,
    ordering: Ordering | None = None,
    resamples: int = RESAMPLES,
    confidence_level: float = CONFIDENCE_LEVEL,
) -> Score:
    """Compute the figures of a project.

    Parameters
    ----------
    loaded : Loaded
    queue : QueueSettings
        Decides the ranking and how far the prospect goes.
    seed : int
        For the resampling and the last tie-break.
    with_doubt : bool
        Estimate doubt even where the order does not ask for it.
    ordering : Ordering, optional
        One that was made already, as for a round.
    resamples : int
    confidence_level : float
    """
    if ordering is None:
        ordering = order_items(loaded, queue, seed=seed, with_doubt=with_doubt)
    variables = tuple(
        _score_variable(loaded, name, position, ordering, seed, resamples, confidence_level)
        for position, name in enumerate(loaded.agreements)
    )
    return Score(loaded=loaded, variables=variables, ordering=ordering, seed=seed)


def _score_variable(
    loaded: Loaded,
    name: str,
    position: int,
    ordering: Ordering,
    seed: int,
    resamples: int,
    confidence_level: float,
) -> VariableScore:
    held, agreement = loaded.labels.variables[name], loaded.agreements[name]
    consensus = consensus_for(agreement)
    selected = ordering.ranking.items_with(position, ordering.selection.n_items)
    has_coders = agreement.labels.coder_index is not None
    few_coders = agreement.labels.n_coders <= MANY_CODERS
    return VariableScore(
        held=held,
        coder_names=loaded.labels.coders,
        agreement=agreement,
        contributions=item_contributions(agreement),
        consensus=consensus,
        interval=alpha_interval(
            agreement,
            np.random.default_rng(seed),
            resamples=resamples,
            confidence_level=confidence_level,
            cluster_of_item=_clusters(loaded),
            seed=seed,
        ),
        coders=coder_parts(agreement) if has_coders else None,
        without=alpha_without_coder(agreement) if has_coders and few_coders else None,
        coder_pairs=coder_pair_parts(agreement) if has_coders and few_coders else None,
        label_pairs=label_pair_parts(agreement),
        label_parts=label_table(agreement),
        groups=_groups(loaded, agreement),
        prospect=prospect(agreement, selected, consensus),
        needed_items=_needed(agreement),
        doubt=ordering.doubts.get(name),
    )


def _clusters(loaded: Loaded) -> IntArray | None:
    source = loaded.project.settings.items
    if loaded.items is None or source is None or source.resample_by is None:
        return None
    return groups_of(loaded, source.resample_by)[0]


def _groups(loaded: Loaded, agreement: Agreement) -> tuple[GroupScore, ...]:
    source = loaded.project.settings.items
    if loaded.items is None or source is None:
        return ()
    found = []
    for column in source.group_by:
        group_of_item, names = groups_of(loaded, column)
        parts = group_parts(agreement, group_of_item, len(names))
        found.append(GroupScore(column=column, names=names, parts=parts))
    return tuple(found)


def _needed(agreement: Agreement) -> int | None:
    """What two coders need; the formula speaks of nominal labels in use by both."""
    if agreement.function.name != "nominal" or agreement.n_coders != 2 or not agreement.alpha:
        return None
    used = agreement.marginals[agreement.marginals > 0]
    rarest = float(used.min()) / float(used.sum())
    return needed_items(CUSTOMARY_ALPHA, rarest)
