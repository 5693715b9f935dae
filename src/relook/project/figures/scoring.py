"""A project's figures: agreement, where the disagreement lives, and what settling would bring."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from relook.core.agreement import NOTHING_PAIRABLE, Agreement
from relook.core.coder_parts import coder_pair_parts, coder_parts
from relook.core.consensus import Consensus
from relook.core.contributions import (
    PairParts,
    Parts,
    group_parts,
    item_contributions,
    label_pair_parts,
)
from relook.core.doubt import Doubt
from relook.core.exact import FloatArray, IntArray
from relook.core.label_tables import LabelParts, chance_shares, label_table
from relook.core.merging import Merger
from relook.core.resampling import CONFIDENCE_LEVEL, RESAMPLES, IntervalResult, alpha_interval
from relook.core.sample_size import needed_items
from relook.core.settling import Prospect, prospect
from relook.core.summed import NOT_AT_HAND, SummedAgreement
from relook.core.without_coder import WithoutCoder, alpha_without_coder
from relook.errors import Place, RelookError
from relook.project.archive.independence import changed_since_first_round
from relook.project.figures.consensus_texts import consensus_for
from relook.project.figures.label_mergers import (
    MergedScore,
    MergeGroup,
    merge_labels,
    mergers_that_lift,
)
from relook.project.figures.ordering import Ordering, groups_of, order_items, overlap_of
from relook.project.setup.loading import Loaded
from relook.project.setup.settings import QueueSettings
from relook.tables.labels import VariableLabels
from relook.tables.reading import Doing, silently

#: The conventional bar: alpha at which data may be relied on (Krippendorff 2004, p. 241).
CUSTOMARY_ALPHA = 0.8
ERROR_LEVEL = 0.05
#: Coders × distinct profile entries above which alpha without each coder is left out: the time
#: grows with both, and at this size takes a few seconds.
MOST_WITHOUT = 100_000_000
#: Pairs of coders above which their parts are left out.
MOST_CODER_PAIRS = 200_000
TOO_MANY_CODERS = "too many coders and differing items to take each coder out in turn"
TOO_MANY_PAIRS = "too many pairs of coders"
NO_CODERS = "the table holds counts without coders"
NEEDED_ITEMS_FOR = "the published rule is for two coders and nominal labels"


@dataclass(frozen=True, slots=True, kw_only=True)
class GroupScore:
    """A breakdown by one column of the item table."""

    column: str
    names: tuple[str, ...]
    parts: Parts


@dataclass(frozen=True, slots=True, kw_only=True)
class NeededItems:
    """How many items two coders need to share.

    Attributes
    ----------
    n_items : int
    bar : float
        The alpha that must be reached.
    error_level : float
        The chance, one-sided, of taking a lower alpha for that one.
    rarest_label : str
    rarest_share : float
        Of the pairable labels.
    """

    n_items: int
    bar: float
    error_level: float
    rarest_label: str
    rarest_share: float


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
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
    resampled_by : str or None
        The column whose groups of items were drawn for the interval.
    coders : Parts or None
        None where the table holds counts without coders.
    without : WithoutCoder or None
    no_without_because : str or None
    coder_pairs : PairParts or None
    no_coder_pairs_because : str or None
    label_pairs : PairParts
    chance_shares : float array of shape (n_label_pairs,)
        Each pair's share of D_e.
    label_parts : LabelParts
    groups : tuple of GroupScore
    prospect : Prospect
        Along the items of the selection that have a row for this variable.
    needed_items : NeededItems or None
        None where the published rule does not reach.
    doubt : Doubt
    mergers : tuple of Merger
        Pairs of labels whose merger would lift alpha most; none where labels cannot be merged.
    """

    held: VariableLabels
    coder_names: tuple[str, ...]
    agreement: Agreement
    contributions: FloatArray
    consensus: Consensus
    interval: IntervalResult
    resampled_by: str | None
    coders: Parts | None
    without: WithoutCoder | None
    no_without_because: str | None
    coder_pairs: PairParts | None
    no_coder_pairs_because: str | None
    label_pairs: PairParts
    chance_shares: FloatArray
    label_parts: LabelParts
    groups: tuple[GroupScore, ...]
    prospect: Prospect
    needed_items: NeededItems | None
    doubt: Doubt
    mergers: tuple[Merger, ...]

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
    merged : tuple of MergedScore
        What was asked for with labels merged.
    changed_files : tuple of str
        Label files that are not those of the first round: their labels may not be independent.
    """

    loaded: Loaded
    variables: tuple[VariableScore, ...]
    ordering: Ordering
    seed: int
    merged: tuple[MergedScore, ...] = ()
    changed_files: tuple[str, ...] = ()


def score(
    loaded: Loaded,
    queue: QueueSettings,
    *,
    seed: int,
    with_doubt: bool = False,
    ordering: Ordering | None = None,
    merge: Sequence[MergeGroup] = (),
    resamples: int = RESAMPLES,
    confidence_level: float = CONFIDENCE_LEVEL,
    doing: Doing = silently,
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
        Estimate doubt however long it takes.
    ordering : Ordering, optional
        One that was made already, as for a round.
    merge : sequence of MergeGroup
        Labels to be taken as one, beside the labels as they are.
    resamples : int
    confidence_level : float
    doing : callable, optional
        Told what is being done, in words for the user.

    Raises
    ------
    RelookError
        See `merge_labels` and `order_items`.
    """
    merged = merge_labels(loaded, merge)
    if ordering is None:
        ordering = order_items(
            loaded,
            queue,
            seed=seed,
            with_doubt=with_doubt,
            n_audit_items=queue.audit,
            overlap=overlap_of(loaded.project.settings),
            doing=doing,
        )
    doing("resampling items, and taking the disagreement apart")
    variables = tuple(
        _score_variable(loaded, name, position, ordering, seed, resamples, confidence_level)
        for position, name in enumerate(loaded.agreements)
    )
    return Score(
        loaded=loaded,
        variables=variables,
        ordering=ordering,
        seed=seed,
        merged=merged,
        changed_files=changed_since_first_round(loaded),
    )


def refuse_nothing_pairable(score: Score) -> None:
    """Refuse labels of which no variable has an item labelled twice.

    Raises
    ------
    RelookError
        There is nothing that agreement could be measured on.
    """
    if any(scored.agreement.n_pairable_labels for scored in score.variables):
        return
    raise RelookError(
        f"nothing to compare: {NOTHING_PAIRABLE}",
        where=Place(", ".join(score.loaded.labels.files)),
        mend="alpha needs items that two coders or more labelled; check the columns of the items "
        "and the coders",
    )


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
    no_without, no_pairs = _left_out(agreement)
    label_pairs = label_pair_parts(agreement)
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
            cluster_of_item=clusters_of(loaded),
            seed=seed,
        ),
        resampled_by=resampled_by(loaded),
        coders=None if agreement.labels.coder_index is None else coder_parts(agreement),
        without=None if no_without else alpha_without_coder(agreement),
        no_without_because=no_without,
        coder_pairs=None if no_pairs else coder_pair_parts(agreement),
        no_coder_pairs_because=no_pairs,
        label_pairs=label_pairs,
        chance_shares=chance_shares(agreement, label_pairs),
        label_parts=label_table(agreement),
        groups=_groups(loaded, agreement),
        prospect=prospect(agreement, selected, consensus),
        needed_items=needed_for(held, agreement) if agreement.n_coders == 2 else None,
        doubt=ordering.doubts[name],
        mergers=tuple(mergers_that_lift(agreement)),
    )


def _left_out(agreement: Agreement) -> tuple[str | None, str | None]:
    """Why alpha without each coder, and why the pairs of coders, are left out."""
    if agreement.labels.coder_index is None:
        return NO_CODERS, NO_CODERS
    if isinstance(agreement, SummedAgreement):
        return None, NOT_AT_HAND
    n_coders = agreement.labels.n_coders
    too_long = n_coders * agreement.profiles.value_index.size > MOST_WITHOUT
    too_many = n_coders * (n_coders - 1) // 2 > MOST_CODER_PAIRS
    return TOO_MANY_CODERS if too_long else None, TOO_MANY_PAIRS if too_many else None


def resampled_by(loaded: Loaded) -> str | None:
    """Return the column whose clusters are drawn whole for intervals; None where items are."""
    source = loaded.project.settings.items
    return None if loaded.items is None or source is None else source.resample_by


def clusters_of(loaded: Loaded) -> IntArray | None:
    """Return the cluster of each item where the settings name a column to resample by."""
    column = resampled_by(loaded)
    return None if column is None else groups_of(loaded, column)[0]


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


def needed_for(held: VariableLabels, agreement: Agreement) -> NeededItems | None:
    """Return what two coders need by the published rule; None where labels are not nominal."""
    if agreement.function.name != "nominal" or agreement.alpha is None:
        return None
    counts = agreement.marginals
    rarest = int(np.argmin(np.where(counts > 0, counts, counts.max() + 1)))
    share = int(counts[rarest]) / agreement.n_pairable_labels
    return NeededItems(
        n_items=needed_items(CUSTOMARY_ALPHA, share, ERROR_LEVEL),
        bar=CUSTOMARY_ALPHA,
        error_level=ERROR_LEVEL,
        rarest_label=held.texts[rarest],
        rarest_share=share,
    )
