"""Figures put into sentences: what an alpha means, and where the weight of disagreement lies.

Each sentence follows a stated rule with stated minimum counts and is silent where the rule cannot
tell. The thresholds of the second rule are our own choice and say so; they are not from the
literature.
"""

from __future__ import annotations

import numpy as np

from relook.core.agreement import Agreement
from relook.project.scoring import VariableScore

#: Customary levels (Krippendorff 2004, pp. 241–243).
RELIABLE = 0.800
TENTATIVE = 0.667

#: Where weight lies: nothing is said with fewer disputed items or coders than these.
LEAST_DISPUTED_ITEMS = 20
LEAST_CODERS = 3
LEAST_LABELS_OF_A_CODER = 20
#: A coder stands out who is involved in more of the disagreement than this many times what their
#: labels would make it, and whose leaving lifts alpha so far.
CODER_TIMES = 1.2
CODER_LIFT = 0.03
#: A pair of labels stands out that carries this share of D_o, so many times the next pair's, in so
#: many items.
PAIR_SHARE = 0.2
PAIR_TIMES = 1.5
LEAST_ITEMS_OF_A_PAIR = 10
#: Items stand out where this share of the disputed ones carries half of D_o.
HEAD_OF_ITEMS = 0.15


def alpha_in_words(agreement: Agreement) -> str:
    """Say what an alpha allows, by the customary levels and with their condition."""
    alpha = agreement.alpha
    if alpha is None:
        return f"Alpha is undefined: {agreement.undefined_because}. That is not perfect agreement."
    if alpha >= RELIABLE:
        said = "At .800 or above data are customarily relied on"
    elif alpha >= TENTATIVE:
        said = "Between .667 and .800 customarily only tentative conclusions are drawn"
    elif alpha > 0:
        said = "Below .667 data are customarily not relied on"
    elif alpha == 0:
        said = "Coders agree as often as chance would have them agree"
    else:
        return "Coders agree less than chance would have them agree: look for a systematic cause."
    return (
        f"{said}; the bar should follow the cost of being wrong (Krippendorff 2004, pp. 241–243)."
    )


def verdict(scored: VariableScore) -> str | None:
    """Say where the weight of the disagreement lies: a pair of labels, a coder, or a few items.

    Returns
    -------
    str or None
        None where the rule cannot tell: fewer than 20 disputed items, and always with two coders or
        without coders.

    Notes
    -----
    Tried in this order, and all that hold are said: (1) one pair of labels carries 20 % of D_o or
    more and 1.5 times the next pair's share or more, in 10 items or more: the instructions do not
    tell them apart; (2) a coder with 20 labels or more is involved in more than 1.2 times what
    their labels would have them be, and alpha without them is higher by .03 or more; (3) half of
    D_o lies in 15 % of the disputed items or fewer. The thresholds are our choice; no source gives
    them.
    """
    agreement = scored.agreement
    if scored.coders is None or agreement.n_coders < LEAST_CODERS:
        return None
    if agreement.n_disputed_items < LEAST_DISPUTED_ITEMS:
        return None
    said = [
        sentence
        for sentence in (_of_label_pair(scored), _of_coder(scored), _of_items(scored))
        if sentence is not None
    ]
    return " ".join(said) if said else None


def _of_label_pair(scored: VariableScore) -> str | None:
    pairs = scored.label_pairs
    if pairs.share.size < 2 or len(scored.held.texts) < LEAST_CODERS:
        return None  # with two labels there is only one pair
    heaviest = int(np.argmax(pairs.share))
    next_share = float(np.sort(pairs.share)[-2])
    if (
        pairs.share[heaviest] < max(PAIR_SHARE, PAIR_TIMES * next_share)
        or pairs.n_items[heaviest] < LEAST_ITEMS_OF_A_PAIR
    ):
        return None
    first = scored.held.texts[pairs.first[heaviest]]
    second = scored.held.texts[pairs.second[heaviest]]
    return (
        f'Weight lies in one pair of labels: "{first}" against "{second}" carries '
        f"{pairs.share[heaviest]:.0%} of the disagreement, in {int(pairs.n_items[heaviest]):,} "
        "items. Look first at what the instructions say of these two."
    )


def _of_coder(scored: VariableScore) -> str | None:
    coders, without = scored.coders, scored.without
    alpha = scored.agreement.alpha
    if coders is None or without is None or alpha is None:
        return None
    # A pair has two sides, so a coder like the others is involved in twice their share of labels.
    times = np.divide(
        coders.involved,
        2 * coders.share_of_labels,
        out=np.zeros_like(coders.involved),
        where=coders.share_of_labels > 0,
    )
    lift = np.nan_to_num(without.alpha - alpha, nan=-1.0)
    stands_out = (
        (coders.n_labels >= LEAST_LABELS_OF_A_CODER) & (times > CODER_TIMES) & (lift >= CODER_LIFT)
    )
    if not bool(stands_out.any()):
        return None
    coder = int(np.argmax(np.where(stands_out, lift, -np.inf)))
    return (
        f"Coder {scored.coder_names[coder]} is involved in {coders.involved[coder]:.0%} of the "
        f"disagreement with {coders.share_of_labels[coder]:.0%} of the labels; without them alpha "
        f"would be {without.alpha[coder]:.3f} over {int(without.n_pairable_items[coder]):,} items. "
        "That may be a misunderstanding as well as carelessness: ask before judging."
    )


def _of_items(scored: VariableScore) -> str | None:
    heaviest = np.sort(scored.contributions[scored.contributions > 0])[::-1]
    if heaviest.size < LEAST_DISPUTED_ITEMS:
        return None
    needed = int(np.searchsorted(np.cumsum(heaviest), heaviest.sum() / 2)) + 1
    if needed > HEAD_OF_ITEMS * heaviest.size:
        return None
    return (
        f"Weight lies in few items: {needed:,} of {heaviest.size:,} disputed ones carry half of "
        "the disagreement."
    )
