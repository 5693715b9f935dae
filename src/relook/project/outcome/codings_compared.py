"""Two codings side by side: what fresh, independent labels say of alpha now.

After the instructions were mended only a fresh coding gives a new reliability (Krippendorff 2004,
ch. 11). Where both codings have labels of the same items, the items are drawn together and the
interval of the change is paired; else the items of each coding are drawn on their own.
"""

from __future__ import annotations

from dataclasses import asdict, dataclass
from fractions import Fraction
from typing import Any, Literal

import numpy as np
import pandas as pd

from relook.core.agreement import Agreement, measure_agreement
from relook.core.exact import IntArray
from relook.core.labels import CodedLabels
from relook.core.resampling import (
    CONFIDENCE_LEVEL,
    RESAMPLES,
    DifferenceResult,
    paired_interval,
    unpaired_interval,
)
from relook.project.archive.codings import (
    CODERS,
    UNSEEN,
    coding_numbered,
    labels_given,
    load_coding,
    read_codings,
)
from relook.project.archive.record import read_record
from relook.project.archive.rounds import Round
from relook.project.setup.loading import Loaded

Row = dict[str, Any]
Coders = Literal["the same", "others", "some the same"]


@dataclass(frozen=True, slots=True, kw_only=True)
class CodingSide:
    """One variable in one coding, on all its items.

    Attributes
    ----------
    alpha : float or None
    undefined_because : str or None
    observed_disagreement, expected_disagreement : float or None
    n_items, n_disputed_items : int
        Items with two labels or more, and those of them that are disputed.
    n_labels, n_coders : int
    """

    alpha: float | None
    undefined_because: str | None
    observed_disagreement: float | None
    expected_disagreement: float | None
    n_items: int
    n_disputed_items: int
    n_labels: int
    n_coders: int


@dataclass(frozen=True, slots=True, kw_only=True)
class VariableCompared:
    """One variable in both codings.

    Attributes
    ----------
    name : str
    first, second : CodingSide
    change : DifferenceResult
        Second less first; where it is paired, on the shared items alone.
    n_shared_items : int
        Items with two labels or more in both codings.
    """

    name: str
    first: CodingSide
    second: CodingSide
    change: DifferenceResult
    n_shared_items: int


@dataclass(frozen=True, slots=True, kw_only=True)
class CodingsCompared:
    """The first coding and a later one.

    Attributes
    ----------
    number : int
        Of the later one.
    coders : {"the same", "others", "some the same"}
        Whether its coders are those of the first.
    unseen : bool
        Whether its items were drawn from those that nobody had been shown.
    n_sent, n_answered : int
        Rows of its sheets, and those that were answered.
    variables : tuple of VariableCompared
    seed : int
    """

    number: int
    coders: Coders
    unseen: bool
    n_sent: int
    n_answered: int
    variables: tuple[VariableCompared, ...]
    seed: int


def latest_coding_back(loaded: Loaded) -> int | None:
    """Return the number of the last coding of which a label is back, None where there is none."""
    codings = read_codings(loaded.project)
    if not codings:
        return None
    record = read_record(loaded.project.codings)
    back = [
        held.number
        for held in codings
        if any(each.ruling == "label" for each in labels_given(record, held))
    ]
    return back[-1] if back else None


def compare_codings(
    loaded: Loaded,
    number: int,
    *,
    seed: int,
    resamples: int = RESAMPLES,
    confidence_level: float = CONFIDENCE_LEVEL,
) -> CodingsCompared:
    """Set a later coding beside the first.

    Parameters
    ----------
    loaded : Loaded
        The first coding: the label tables.
    number : int
        Of the later one.
    seed : int
        For the resampling.
    resamples : int
    confidence_level : float

    Raises
    ------
    RelookError
        No such coding, or none of its labels is back.
    """
    project = loaded.project
    held = coding_numbered(project, number)
    asked = {row.variable for row in held.rows}
    shared = [name for name in loaded.agreements if name in asked]
    later = load_coding(project, held, only=shared)
    given = labels_given(read_record(project.codings), held)
    return CodingsCompared(
        number=number,
        coders=_coders(loaded, held),
        unseen=bool(held.settings.get(UNSEEN)),
        n_sent=len(held.rows),
        n_answered=len(given),
        variables=tuple(
            _compared(loaded, later, name, seed, resamples, confidence_level) for name in shared
        ),
        seed=seed,
    )


def _coders(loaded: Loaded, held: Round) -> Coders:
    before, now = set(loaded.labels.coders), set(held.settings[CODERS].values())
    if now <= before:
        return "the same"
    return "some the same" if now & before else "others"


def _compared(
    loaded: Loaded, later: Loaded, name: str, seed: int, resamples: int, confidence_level: float
) -> VariableCompared:
    items = pd.Index(loaded.labels.items)
    every = items.append(pd.Index(later.labels.items).difference(items, sort=False))
    tolerance = loaded.labels.variables[name].variable.tolerance
    first = _on_items(loaded.agreements[name], items, every, tolerance)
    second = _on_items(later.agreements[name], pd.Index(later.labels.items), every, tolerance)
    pairable = np.stack([agreement.labels.labels_per_item >= 2 for agreement in (first, second)])
    n_shared = int(np.count_nonzero(pairable.all(axis=0)))
    rng = np.random.default_rng(seed)
    if 2 * n_shared >= second.n_pairable_items and n_shared > 0:
        change = paired_interval(
            first,
            second,
            rng,
            resamples=resamples,
            confidence_level=confidence_level,
            cluster_of_item=_clusters(loaded, every),
            seed=seed,
        )
    else:
        change = unpaired_interval(
            first, second, rng, resamples=resamples, confidence_level=confidence_level, seed=seed
        )
    return VariableCompared(
        name=name,
        first=_side(first),
        second=_side(second),
        change=change,
        n_shared_items=n_shared,
    )


def _on_items(
    agreement: Agreement, own: pd.Index, every: pd.Index, tolerance: Fraction
) -> Agreement:
    """The same labels on a longer list of items, so that item i is item i in both codings."""
    if own.equals(every):
        return agreement
    labels = agreement.labels
    place = every.get_indexer(own)
    moved = CodedLabels.from_codes(
        place[labels.item_index],
        labels.value_index,
        labels.coder_index,
        n_items=len(every),
        n_values=labels.n_values,
        n_coders=labels.n_coders,
    )
    return measure_agreement(moved, agreement.function, agreement.values, tolerance=tolerance)


def _clusters(loaded: Loaded, items: pd.Index) -> IntArray | None:
    source = loaded.project.settings.items
    if loaded.items is None or source is None or source.resample_by is None:
        return None
    texts = loaded.items.frame[source.resample_by].reindex(items).fillna("")
    return np.unique(texts.to_numpy(dtype=object).astype(str), return_inverse=True)[1]


def _side(agreement: Agreement) -> CodingSide:
    return CodingSide(
        alpha=agreement.alpha,
        undefined_because=agreement.undefined_because,
        observed_disagreement=agreement.observed_disagreement,
        expected_disagreement=agreement.expected_disagreement,
        n_items=agreement.n_pairable_items,
        n_disputed_items=agreement.n_disputed_items,
        n_labels=agreement.n_pairable_labels,
        n_coders=agreement.n_coders,
    )


def change_sentence(compared: CodingsCompared, variable: VariableCompared) -> str:
    """Say by how much alpha differs, on what, and how sure that is."""
    change = variable.change
    if change.difference is None:
        return f"No difference of the two alphas can be given: {change.none_because}."
    said = f"Alpha differs by {change.difference:+.3f}"
    if change.paired:
        said += f" on the {variable.n_shared_items:,} items that both codings share"
        said += f" ({change.first_alpha:.3f} and {change.second_alpha:.3f})"
    if change.interval is None:
        return f"{said}; no interval: {change.none_because}."
    held = change.interval
    how = (
        "paired: an item is drawn with the labels of both codings"
        if change.paired
        else "unpaired: the items of each coding are drawn on their own"
    )
    said += (
        f"; {held.confidence_level:.0%} interval {held.low:+.3f} to {held.high:+.3f} "
        f"({how}, {held.resamples:,} resamples, seed {held.seed})."
    )
    if not change.paired and variable.n_shared_items:
        said += (
            f" {variable.n_shared_items:,} items are in both codings; that is left out of account."
        )
    return f"{said} {change.warning}" if change.warning else said


def condition_sentences(compared: CodingsCompared) -> tuple[str, ...]:
    """Say what the comparison rests on."""
    said = [
        (
            "Both alphas are of labels as coders gave them, before any decision; that they worked "
            "alone is for you to see to."
        ),
        {
            "the same": "The same coders coded before, so practice, and memory of items, may have "
            "a part in the difference, not the instructions alone.",
            "others": "Other coders coded, so the difference is of coders and instructions "
            "together.",
            "some the same": "Some of the coders coded before and others did not, so the "
            "difference is of coders, practice and instructions together.",
        }[compared.coders],
    ]
    if compared.unseen:
        said.append(
            "Its items were drawn from those that no worksheet had shown. Disputed items are the "
            "first to be shown, so these are easier than all items together, and so is alpha of "
            "this coding high for that reason alone; only the difference on shared items compares "
            "like with like."
        )
    left = compared.n_sent - compared.n_answered
    if left:
        said.append(
            f"{left:,} of {compared.n_sent:,} rows are still open. Rows that coders put off are "
            "seldom a random part of all."
        )
    return tuple(said)


def codings_object(compared: CodingsCompared) -> Row:
    """Return the comparison as `relook rescore --json` writes it.

    Keys: `coding, coders, unseen, n_sent, n_answered, seed`; `variables[]`: `variable`; `first{}`
    and `second{}` as `CodingSide`; `change{paired, first_alpha, second_alpha, difference,
    n_shared_items, interval, none_because, warning}`.
    """
    return {
        "coding": compared.number,
        "coders": compared.coders,
        "unseen": compared.unseen,
        "n_sent": compared.n_sent,
        "n_answered": compared.n_answered,
        "seed": compared.seed,
        "variables": [
            {
                "variable": each.name,
                "first": asdict(each.first),
                "second": asdict(each.second),
                "change": {**asdict(each.change), "n_shared_items": each.n_shared_items},
            }
            for each in compared.variables
        ],
    }
