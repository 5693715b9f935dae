"""Before and after: what the decisions changed, and what may be said of it.

Alpha is of independently made labels, and only of labels that nobody changed since the first round
was sent. What decisions change is the agreement in the corrected data, which is no reliability
(Krippendorff 2004, ch. 11). So both stand side by side, and no interval is put on the change.
"""

from __future__ import annotations

from collections import Counter
from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np

from relook.core.decisions import Settlement
from relook.core.resampling import CONFIDENCE_LEVEL, RESAMPLES, IntervalResult, alpha_interval
from relook.core.settling import CANNOT_BE_CODED, agreement_after
from relook.errors import ExitCode, RelookError
from relook.project.archive.independence import check_independence
from relook.project.archive.record import Record, read_record, stale_decisions
from relook.project.archive.recorded import Recorded
from relook.project.archive.rounds import Round, read_rounds
from relook.project.archive.settlements import settlements, tolerances
from relook.project.figures.scoring import clusters_of, resampled_by
from relook.project.outcome.audit_findings import AuditFindings, audited_items, audits_of
from relook.project.outcome.corrected import Corrected, correct
from relook.project.outcome.moves import (
    CoderStanding,
    Move,
    Overlap,
    ReasonCount,
    coders_against_decisions,
    moves_of,
    overlap_of,
    reasons_of,
)
from relook.project.outcome.remaining import (
    Remaining,
    RemainingPair,
    remaining_items,
    remaining_pairs,
)
from relook.project.setup.loading import Loaded, labels_digest, labels_of_item

STATES = ("settled", "cannot be coded", "split", "unconfirmed", "open")
#: How often items are settled by one of their own labels, drawn at random, for comparison.
DRAWS = 20


@dataclass(frozen=True, slots=True, kw_only=True)
class AnyLabel:
    """What agreement becomes where each decided item takes one of its own labels at random.

    Attributes
    ----------
    low, high : float
        The least and the most of the draws.
    draws, seed : int
    """

    low: float
    high: float
    draws: int
    seed: int


@dataclass(frozen=True, slots=True, kw_only=True)
class VariableRescore:
    """One variable before and after.

    Attributes
    ----------
    corrected : Corrected
    interval : IntervalResult
        Of alpha before; there is none of the change.
    resampled_by : str or None
        The column whose clusters were drawn for it; None where items were.
    states : dict of str to int
        How many items stand how, every state of `STATES` among them.
    n_waiting : int
        Items that were sent and have no ruling yet.
    n_adjudicators : int
        Who have a standing decision.
    any_label : AnyLabel or None
        None where nothing was settled or agreement is undefined.
    moves : tuple of Move
    reasons : tuple of ReasonCount
        On all but audit items.
    coders : tuple of CoderStanding
    audits : tuple of AuditFindings
        Latest first.
    n_sent_since_audit : int
        Disputed items that later rounds sent out of what the latest audit was drawn from.
    overlap : Overlap
    remaining : tuple of Remaining
    remaining_pairs : tuple of RemainingPair
    alpha_of_first_round : float or None
        As the first round recorded it.
    """

    corrected: Corrected
    interval: IntervalResult
    resampled_by: str | None
    states: dict[str, int]
    n_waiting: int
    n_adjudicators: int
    any_label: AnyLabel | None
    moves: tuple[Move, ...]
    reasons: tuple[ReasonCount, ...]
    coders: tuple[CoderStanding, ...]
    audits: tuple[AuditFindings, ...]
    n_sent_since_audit: int
    overlap: Overlap
    remaining: tuple[Remaining, ...]
    remaining_pairs: tuple[RemainingPair, ...]
    alpha_of_first_round: float | None

    @property
    def name(self) -> str:
        """The variable's name."""
        return self.corrected.variable.name


@dataclass(frozen=True, slots=True, kw_only=True)
class Rescore:
    """Everything that `relook rescore` says.

    Attributes
    ----------
    loaded : Loaded
    rounds : tuple of Round
    variables : tuple of VariableRescore
    changed_files : tuple of str
        Label files that are not those of the first round; alpha is then not of independent labels.
    stale, gone : tuple of Recorded
        Standing decisions made on other labels, and those whose item or variable is gone.
    seed : int
    """

    loaded: Loaded
    rounds: tuple[Round, ...]
    variables: tuple[VariableRescore, ...]
    changed_files: tuple[str, ...]
    stale: tuple[Recorded, ...]
    gone: tuple[Recorded, ...]
    seed: int

    @property
    def independent(self) -> bool:
        """Whether the labels are those of the first round, so that alpha is of independent ones."""
        return bool(self.rounds) and not self.changed_files


def rescore(
    loaded: Loaded,
    *,
    seed: int,
    relabelled: bool = False,
    resamples: int = RESAMPLES,
    confidence_level: float = CONFIDENCE_LEVEL,
) -> Rescore:
    """Put the record's decisions into the labels and compare.

    Parameters
    ----------
    loaded : Loaded
    seed : int
        For the resampling and the comparison with labels at random.
    relabelled : bool
        Go on although label files changed since the first round; alpha is then not called
        independent.
    resamples : int
    confidence_level : float

    Raises
    ------
    RelookError
        The record holds no decision (exit code 1), label files changed since the first round, or
        decisions are no longer allowed.
    """
    project = loaded.project
    rounds, record = read_rounds(project), read_record(project)
    if not record.decisions:
        raise RelookError(
            "the record holds no decision yet, so nothing has changed",
            mend="collect returned worksheets with `relook collect` first; "
            "`relook score` shows alpha",
            exit_code=ExitCode.FALLS_SHORT,
        )
    changed = check_independence(loaded, rounds, relabelled=relabelled)
    return rescore_labels(
        loaded,
        rounds,
        record,
        changed,
        seed=seed,
        resamples=resamples,
        confidence_level=confidence_level,
    )


def rescore_labels(
    loaded: Loaded,
    rounds: Sequence[Round],
    record: Record,
    changed: tuple[str, ...],
    *,
    seed: int,
    resamples: int = RESAMPLES,
    confidence_level: float = CONFIDENCE_LEVEL,
    labels_of_ties: Mapping[str, Mapping[str, str]] | None = None,
) -> Rescore:
    """Compare labels before and after a record's decisions, whatever was checked before.

    Parameters
    ----------
    loaded : Loaded
    rounds : sequence of Round
    record : Record
    changed : tuple of str
        As `check_independence` returned it.
    seed, resamples, confidence_level
        As for `rescore`.
    labels_of_ties : mapping of str to mapping of str to str, optional
        By variable and item, the label that a rule gives it where labels tie; the audit judges
        these items by it, and leaves them out without a rule.
    """
    settled = settlements(loaded, record)
    stale, gone = _stale(loaded, record, settled)
    return Rescore(
        loaded=loaded,
        rounds=tuple(rounds),
        variables=tuple(
            _variable(
                loaded,
                name,
                settled,
                audits_of(loaded, name, rounds, settled, (labels_of_ties or {}).get(name)),
                interval_of(loaded, name, seed, resamples, confidence_level),
                rounds=rounds,
                seed=seed,
            )
            for name in loaded.agreements
        ),
        changed_files=changed,
        stale=stale,
        gone=gone,
        seed=seed,
    )


def _variable(
    loaded: Loaded,
    name: str,
    settled: Mapping[tuple[str, str], Settlement],
    audits: tuple[AuditFindings, ...],
    interval: IntervalResult,
    *,
    rounds: Sequence[Round],
    seed: int,
) -> VariableRescore:
    corrected = correct(loaded, name, settled)
    own = {item: held for (item, variable), held in settled.items() if variable == name}
    counts: Counter[str] = Counter(held.state for held in own.values())
    audited = audited_items(rounds, name)
    sent = {row.item for held in rounds for row in held.rows if row.variable == name}
    latest = audits[0].round if audits else 0
    tolerance = tolerances(loaded.project.settings).get(name)
    return VariableRescore(
        corrected=corrected,
        interval=interval,
        resampled_by=resampled_by(loaded),
        states={state: counts[state] for state in STATES},
        n_waiting=len(sent - own.keys()),
        n_adjudicators=len(
            {decision.adjudicator for held in own.values() for decision in held.standing}
        ),
        any_label=_any_label(corrected, seed),
        moves=moves_of(corrected),
        reasons=reasons_of(held for item, held in own.items() if item not in audited),
        coders=coders_against_decisions(loaded, corrected, audited),
        audits=audits,
        n_sent_since_audit=_sent_since(rounds, name, latest),
        overlap=overlap_of(loaded, name, settled, tolerance),
        remaining=remaining_items(loaded, corrected, own),
        remaining_pairs=remaining_pairs(corrected),
        alpha_of_first_round=next(
            (each.alpha for held in rounds[:1] for each in held.variables if each.variable == name),
            None,
        ),
    )


def interval_of(
    loaded: Loaded,
    name: str,
    seed: int,
    resamples: int = RESAMPLES,
    confidence_level: float = CONFIDENCE_LEVEL,
) -> IntervalResult:
    """Return the interval of alpha of one variable, clusters of items drawn whole."""
    return alpha_interval(
        loaded.agreements[name],
        np.random.default_rng(seed),
        resamples=resamples,
        confidence_level=confidence_level,
        cluster_of_item=clusters_of(loaded),
        seed=seed,
    )


def _any_label(corrected: Corrected, seed: int) -> AnyLabel | None:
    """Settle the same items to one of their own labels each, drawn at random, some times over.

    Decisions make items agree whatever they say; this is how much of the figure that alone brings.
    """
    ruled = corrected.decided != CANNOT_BE_CODED
    labels = corrected.given.labels
    per_item = labels.labels_per_item
    first = np.cumsum(per_item) - per_item
    settled = corrected.item_index[ruled & (per_item[corrected.item_index] > 0)]
    if not settled.size:
        return None
    unusable = corrected.item_index[~ruled]
    rng = np.random.default_rng(seed)
    figures = []
    for _ in range(DRAWS):
        drawn = labels.value_index[first[settled] + rng.integers(0, per_item[settled])]
        after = agreement_after(
            corrected.given,
            np.concatenate([settled, unusable]),
            np.concatenate([drawn, np.full(unusable.size, CANNOT_BE_CODED)]),
        )
        if after.agreement is None:
            return None
        figures.append(after.agreement)
    return AnyLabel(low=min(figures), high=max(figures), draws=DRAWS, seed=seed)


def _sent_since(rounds: Sequence[Round], name: str, latest: int) -> int:
    """Disputed items that rounds after the audit's sent for the first time."""
    before: set[str] = set()
    after: set[str] = set()
    for held in rounds:
        for row in held.rows:
            if row.variable != name:
                continue
            if held.number <= latest:
                before.add(row.item)
            elif row.kind == "disputed":
                after.add(row.item)
    return len(after - before) if latest else 0


def _stale(
    loaded: Loaded, record: Record, settled: Mapping[tuple[str, str], Settlement]
) -> tuple[tuple[Recorded, ...], tuple[Recorded, ...]]:
    standing = {decision.id for held in settled.values() for decision in held.standing}
    entries = [entry for entry in record.entries if entry.decision.id in standing]
    ruled = sorted({(entry.decision.item, entry.decision.variable) for entry in entries})
    numbers = loaded.item_numbers([item for item, _ in ruled])
    current = {
        key: labels_digest(labels_of_item(loaded, key[1], int(number)))
        for key, number in zip(ruled, numbers, strict=True)
        if number >= 0 and key[1] in loaded.agreements
    }
    changed, gone = stale_decisions(entries, current)
    unread = set(_unread(loaded))
    return tuple(changed), tuple(each for each in gone if each.decision.variable not in unread)


def _unread(loaded: Loaded) -> list[str]:
    """Variables that the settings have and this call left out."""
    return [
        variable.name
        for variable in loaded.project.settings.variables
        if variable.name not in loaded.agreements
    ]
