"""One item's arithmetic, term by term, so that a sceptic can redo it by hand."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import asdict, dataclass
from fractions import Fraction

import numpy as np

from relook.core.agreement import Agreement
from relook.core.consensus import Consensus, extend_values
from relook.core.contributions import alpha_costs, item_contributions, shares
from relook.core.differences import doubled_midranks
from relook.core.doubt import Doubt
from relook.core.exact import FloatArray, IntArray
from relook.core.settling import settled_alphas
from relook.errors import RelookError, nearest
from relook.project.figures.consensus_texts import consensus_for, consensus_text
from relook.project.figures.ordering import doubt_of
from relook.project.setup.loading import Loaded, labels_of_item, shown_texts
from relook.tables.labels import VariableLabels
from relook.tables.numbers import plain_number
from relook.tables.schema import Variable

#: δ² of each difference function in words that can be redone by hand; options are filled in.
FORMULAS = {
    "nominal": "δ² = 1 between different labels",
    "ordinal": "δ² = (midrank − midrank)², by the midranks of all pairable labels",
    "interval": "δ² = (c − k)²",
    "ratio": "δ² = ((c − k)/(c + k))²",
    "circular": "δ² = sin²(180° × (c − k)/{period})",
    "polar": "δ² = (c − k)²/((c + k − 2 × {low})(2 × {high} − c − k))",
    "jaccard": "δ² = 1 − shared elements/all elements of the two sets",
    "masi": "δ² = 1 − J × M: J = shared/all elements; M = 1 if equal, 2/3 if one set lies inside "
    "the other, 1/3 if they overlap, 0 if they share nothing",
    "tree": "δ² = 1 − 2 × shared levels/(levels of one + levels of the other), levels parted by "
    '"{separator}"',
    "table": "δ² as given in the table of differences",
}


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
class Midrank:
    """Where a label of an ordinal variable stands among all pairable labels.

    Attributes
    ----------
    label : str
    n_labels : int
        n_c, over all items.
    midrank : float
        Labels below it, plus (n_c + 1)/2.
    """

    label: str
    n_labels: int
    midrank: float


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
    formula : str
        δ² in words.
    labels : tuple of (coder, label)
    midranks : tuple of Midrank
        Of every label in use, in order, where δ² comes from them; else empty.
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
    doubt : float or None
        Score from 0 to 1 of how likely the consensus label is wrong.
    doubt_undefined_because : str or None
    rank : int or None
        Place among the disputed items by contribution, equal ones sharing the best place; None
        where it is not disputed.
    candidates : tuple of Candidate
    """

    item: str
    variable: str
    difference: str
    formula: str
    labels: tuple[tuple[str, str], ...]
    shown: tuple[tuple[str, str], ...]
    midranks: tuple[Midrank, ...]
    pairs: tuple[PairTerm, ...]
    pair_sum: float
    n_pairable_labels: int
    contribution: float
    share: float | None
    alpha_cost: float | None
    consensus: str | None
    tied: tuple[str, ...]
    doubt: float | None
    doubt_undefined_because: str | None
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


def why_object(item: str, explanations: Sequence[Explanation]) -> dict[str, object]:
    """Return everything that `relook why --json` writes, but for its format number.

    Keys: `item`; `variables[]`, each with the attributes of `Explanation`, where `labels[]` are
    `coder, label` and `shown[]` are `column, text`.
    """
    return {"item": item, "variables": [_explanation_object(held) for held in explanations]}


def _explanation_object(held: Explanation) -> dict[str, object]:
    return {
        **asdict(held),
        "labels": [{"coder": coder, "label": label} for coder, label in held.labels],
        "shown": [{"column": column, "text": text} for column, text in held.shown],
    }


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
    doubt = doubt_of(agreement)
    pairs = _pairs(held, agreement, profile)
    return Explanation(
        item=str(loaded.labels.items[item]),
        variable=name,
        difference=held.variable.difference,
        formula=_formula(held.variable),
        labels=tuple(labels_of_item(loaded, name, item)),
        shown=shown_texts(loaded, str(loaded.labels.items[item])),
        midranks=_midranks(held, agreement),
        pairs=pairs,
        pair_sum=sum(term.pairs * term.difference for term in pairs),
        n_pairable_labels=agreement.n_pairable_labels,
        contribution=contribution,
        share=float(shares(agreement, contributions[[item]])[0]) if observed else None,
        alpha_cost=None if costs is None else float(costs[0]),
        consensus=text,
        tied=tied,
        doubt=_doubt_of(doubt, item),
        doubt_undefined_because=doubt.undefined_because,
        rank=_rank(agreement, contributions, item),
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


def _formula(variable: Variable) -> str:
    options = dict(variable.options)
    low, high = ("", "") if variable.difference != "polar" else _ends(options["ends"])
    return FORMULAS[variable.difference].format(
        period=options.get("period", ""),
        separator=options.get("separator", ""),
        low=low,
        high=high,
    )


def _ends(given: object) -> tuple[str, str]:
    assert isinstance(given, list | tuple)  # the settings were checked
    return str(given[0]), str(given[1])


def _rank(agreement: Agreement, contributions: FloatArray, item: int) -> int | None:
    disputed = np.append(agreement.disputed_profiles, False)[agreement.profile_of_item]
    if not disputed[item]:
        return None
    return int(np.count_nonzero(contributions[disputed] > contributions[item])) + 1


def _midranks(held: VariableLabels, agreement: Agreement) -> tuple[Midrank, ...]:
    if agreement.function.name != "ordinal":
        return ()
    counts = agreement.marginals
    doubled = doubled_midranks(counts)
    return tuple(
        Midrank(
            label=held.texts[value],
            n_labels=int(counts[value]),
            midrank=(int(doubled[value]) + 1) / 2,
        )
        for value in np.flatnonzero(counts).tolist()
    )


def _doubt_of(doubt: Doubt, item: int) -> float | None:
    return None if doubt.doubt is None else float(doubt.doubt[item])


def _candidates(
    held: VariableLabels, agreement: Agreement, consensus: Consensus, profile: int
) -> tuple[Candidate, ...]:
    """Every label that the item could be settled to: of the list, or those given and their mean."""
    profiles = agreement.profiles
    if int(profiles.size[profile]) < 2 or agreement.alpha is None:
        return ()
    entries = slice(profiles.start[profile], profiles.start[profile + 1])
    given = dict(zip(profiles.value_index[entries], profiles.count[entries], strict=True))
    values, texts = agreement.values, list(held.texts)
    codes: IntArray = np.arange(len(texts))
    if agreement.function.needs == "number":
        codes = np.array(sorted(given))
        mean = _new_mean(consensus, profile)
        if mean is not None:
            extended = extend_values(
                values, np.array([mean.numerator]), np.array([mean.denominator])
            )
            values, new = extended[0], int(extended[1][0])
            texts += [""] * (new + 1 - len(texts))
            texts[new] = f"{plain_number(mean)} (the mean)"
            codes = np.append(codes, new)
    elif consensus.values.texts is not None:
        # Sets that most coders hold the elements of, though nobody gave them as a whole.
        values, texts = consensus.values, list(consensus.values.texts)
        own = [int(consensus.value_index[profile]), *consensus.tied_values(profile).tolist()]
        codes = np.append(codes, [code for code in own if code >= len(held.texts)])
    figures = settled_alphas(
        agreement, np.full(codes.size, profile), codes.astype(np.int64), values
    )
    return tuple(
        Candidate(
            label=texts[code],
            given=int(given.get(code, 0)),
            agreement=None if np.isnan(after) else float(after),
        )
        for code, after in zip(codes.astype(int).tolist(), figures.agreement, strict=True)
    )


def _new_mean(consensus: Consensus, profile: int) -> Fraction | None:
    """The mean of a profile where it is a number that nobody gave."""
    if int(consensus.value_index[profile]) >= 0 or consensus.tie[profile]:
        return None
    if consensus.number is None:
        return None
    mean = consensus.mean(profile)
    return Fraction(float(consensus.number[profile])) if mean is None else mean
