"""One item's arithmetic, term by term, so that a sceptic can redo it by hand."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from relook.core.agreement import Agreement
from relook.core.consensus import Consensus, consensus_of, extend_values
from relook.core.contributions import alpha_costs, item_contributions, shares
from relook.core.exact import IntArray
from relook.core.settling import settled_alphas
from relook.errors import RelookError, nearest
from relook.project.loading import Loaded, labels_of_item, shown_texts
from relook.tables.labels import VariableLabels
from relook.tables.numbers import plain_number


@dataclass(frozen=True, slots=True, kw_only=True)
class PairTerm:
    """Two distinct labels that meet in the item.

    Attributes
    ----------
    first, second : str
    pairs : int
        How many unordered pairs of coders stand this way: n_uc × n_uk.
    difference : float
        δ² between the two labels.
    """

    first: str
    second: str
    pairs: int
    difference: float


@dataclass(frozen=True, slots=True, kw_only=True)
class Candidate:
    """A label that the item could be settled to, and what agreement would then be.

    Attributes
    ----------
    label : str
    given : int
        How many coders gave it.
    agreement : float or None
        Agreement in the corrected data; None where undefined.
    """

    label: str
    given: int
    agreement: float | None


@dataclass(frozen=True, slots=True, kw_only=True)
class Explanation:
    """The contribution of one item on one variable.

    Attributes
    ----------
    labels : tuple of (coder, label)
    pairs : tuple of PairTerm
        Only pairs of different labels; equal labels differ by 0.
    pair_sum : float
        Σ pairs × δ² over unordered pairs.
    n_pairable_labels : int
        n over all items.
    contribution : float
        2 × pair_sum / (n (m − 1)); 0 for an item with fewer than two labels.
    share, alpha_cost : float or None
        None where D_o or D_e is 0 or undefined.
    consensus : str or None
        None for a tie.
    tied : tuple of str
    rank : int or None
        Place among the items by contribution, equal ones sharing the best place; None where 0.
    candidates : tuple of Candidate
    """

    item: str
    variable: str
    difference: str
    labels: tuple[tuple[str, str], ...]
    shown: tuple[tuple[str, str], ...]
    pairs: tuple[PairTerm, ...]
    pair_sum: float
    n_pairable_labels: int
    contribution: float
    share: float | None
    alpha_cost: float | None
    consensus: str | None
    tied: tuple[str, ...]
    rank: int | None
    n_disputed_items: int
    alpha: float | None
    undefined_because: str | None
    observed_disagreement: float | None
    expected_disagreement: float | None
    candidates: tuple[Candidate, ...]


def explain(loaded: Loaded, item: str) -> list[Explanation]:
    """Explain one item on every variable on which it has a label.

    Parameters
    ----------
    loaded : Loaded
    item : str
        The item's id.

    Raises
    ------
    RelookError
        No such item, or one without labels.
    """
    number = int(loaded.item_numbers([item])[0])
    if number < 0:
        close = nearest(item, loaded.labels.items)
        raise RelookError(
            f'no item "{item}" in the label table',
            mend=f'did you mean "{close}"?' if close else "check the item's id in the label table",
        )
    found = [
        _explain(loaded, name, number)
        for name, agreement in loaded.agreements.items()
        if agreement.profile_of_item[number] >= 0
    ]
    if not found:
        raise RelookError(
            f'item "{item}" has no label', mend="every cell of its labels is a missing label"
        )
    return found


def _explain(loaded: Loaded, name: str, item: int) -> Explanation:
    held = loaded.labels.variables[name]
    agreement = loaded.agreements[name]
    profile = int(agreement.profile_of_item[item])
    contributions = item_contributions(agreement)
    contribution = float(contributions[item])
    costs = alpha_costs(agreement, contributions[[item]])
    observed = agreement.observed_disagreement
    consensus = consensus_for(agreement)
    text, tied = consensus_text(held, consensus, profile)
    pairs = _pairs(held, agreement, profile)
    return Explanation(
        item=str(loaded.labels.items[item]),
        variable=name,
        difference=held.variable.difference,
        labels=tuple(labels_of_item(loaded, name, item)),
        shown=shown_texts(loaded, str(loaded.labels.items[item])),
        pairs=pairs,
        pair_sum=sum(term.pairs * term.difference for term in pairs),
        n_pairable_labels=agreement.n_pairable_labels,
        contribution=contribution,
        share=float(shares(agreement, contributions[[item]])[0]) if observed else None,
        alpha_cost=None if costs is None else float(costs[0]),
        consensus=text,
        tied=tied,
        rank=int(np.count_nonzero(contributions > contribution)) + 1 if contribution > 0 else None,
        n_disputed_items=agreement.n_disputed_items,
        alpha=agreement.alpha,
        undefined_because=agreement.undefined_because,
        observed_disagreement=observed,
        expected_disagreement=agreement.expected_disagreement,
        candidates=_candidates(held, agreement, consensus, profile),
    )


def _pairs(held: VariableLabels, agreement: Agreement, profile: int) -> tuple[PairTerm, ...]:
    profiles = agreement.profiles
    entries = slice(profiles.start[profile], profiles.start[profile + 1])
    values, counts = profiles.value_index[entries], profiles.count[entries]
    first, second = np.triu_indices(values.size, k=1)
    delta = agreement.differences.between(values[first], values[second])
    return tuple(
        PairTerm(
            first=held.texts[values[i]],
            second=held.texts[values[j]],
            pairs=int(counts[i] * counts[j]),
            difference=float(d),
        )
        for i, j, d in zip(first, second, delta, strict=True)
    )


def _candidates(
    held: VariableLabels, agreement: Agreement, consensus: Consensus, profile: int
) -> tuple[Candidate, ...]:
    """Every label the item could be settled to: the code book's, or those given and their mean."""
    profiles = agreement.profiles
    if int(profiles.size[profile]) < 2 or agreement.alpha is None:
        return ()
    entries = slice(profiles.start[profile], profiles.start[profile + 1])
    given = dict(zip(profiles.value_index[entries], profiles.count[entries], strict=True))
    values, texts = agreement.values, list(held.texts)
    codes: IntArray = np.arange(len(texts))
    if agreement.function.needs == "number":
        codes = np.array(sorted(given))
        mean = consensus.mean(profile)
        if mean is not None and int(consensus.value_index[profile]) < 0:
            extended = extend_values(
                values, np.array([mean.numerator]), np.array([mean.denominator])
            )
            values, new = extended[0], int(extended[1][0])
            texts.append(f"{plain_number(mean)} (the mean)")
            codes = np.append(codes, new)
    figures = settled_alphas(agreement, np.full(codes.size, profile), codes, values)
    return tuple(
        Candidate(
            label=texts[min(int(code), len(texts) - 1)],
            given=int(given.get(code, 0)),
            agreement=None if np.isnan(after) else float(after),
        )
        for code, after in zip(codes, figures.agreement, strict=True)
    )
