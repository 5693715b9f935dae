"""Figures put into sentences: what an alpha means, and where the weight of disagreement lies.

Each sentence follows a stated rule with stated minimum counts and is silent where the rule cannot
tell. The customary levels are Krippendorff's; the thresholds of the second rule are our own choice,
and no source gives them.
"""

from __future__ import annotations

import numpy as np

from relook.core.agreement import Agreement
from relook.core.resampling import FEW_ITEMS, Interval
from relook.errors import listed
from relook.project.figures.scoring import VariableScore

#: Customary levels (Krippendorff 2004, pp. 241–243).
RELIABLE = 0.800
TENTATIVE = 0.667

#: Where weight lies: nothing is said with fewer disputed items or coders than these.
LEAST_DISPUTED_ITEMS = 20
LEAST_CODERS = 3
#: A coder of so many labels or more stands out whose part of the disagreement is more than this
#: many times their part of the labels, and whose leaving lifts alpha so far.
LEAST_LABELS_OF_A_CODER = 20
CODER_TIMES = 1.2
CODER_LIFT = 0.03
#: A pair of labels stands out that carries this share of D_o, so many times the next pair's, so
#: many times what chance would have it carry, in so many items.
PAIR_SHARE = 0.2
PAIR_TIMES_NEXT = 1.5
PAIR_TIMES_CHANCE = 1.5
LEAST_ITEMS_OF_A_PAIR = 10
#: Items stand out where at most this share of the disputed ones carries half of D_o.
HEAD_OF_ITEMS = 0.15


def alpha_in_words(agreement: Agreement, interval: Interval | None = None) -> str:
    """Say what an alpha allows, by the customary levels and with their condition.

    Parameters
    ----------
    agreement : Agreement
    interval : Interval, optional
        Of this alpha. Where it holds 0 nothing is claimed, and it tempers what is.

    Returns
    -------
    str
        Under 30 pairable items it names no level.
    """
    alpha = agreement.alpha
    if alpha is None:
        return f"Alpha is undefined: {agreement.undefined_because}. That is not perfect agreement."
    n_items = agreement.n_pairable_items
    if n_items < FEW_ITEMS:
        said = f"{n_items:,} item is" if n_items == 1 else f"{n_items:,} items are"
        return (
            f"{said} fewer than {FEW_ITEMS}: too few to hold this alpha against a customary level."
        )
    if interval is not None and interval.low <= 0 <= interval.high:
        return "The interval holds 0: this agreement cannot be told from chance."
    if alpha <= 0:
        if interval is not None:
            return "Coders agree less than chance would have them agree: look for a cause."
        return "Coders do not agree more than chance would have them agree."
    if alpha >= RELIABLE:
        said = "At .800 or above data are customarily relied on"
        bar = RELIABLE
    elif alpha >= TENTATIVE:
        said = "Between .667 and .800 customarily only tentative conclusions are drawn"
        bar = TENTATIVE
    else:
        said = "Below .667 data are customarily not relied on"
        bar = -1.0
    if interval is not None and interval.low < bar:
        said += f", and the interval reaches below {bar:.3f}".replace("0.", ".")
    return (
        f"{said}; the bar should follow the cost of being wrong (Krippendorff 2004, pp. 241–243)."
    )


def verdict(scored: VariableScore) -> str | None:
    """Say in one sentence where the weight of the disagreement lies.

    Returns
    -------
    str or None
        None where the rule cannot tell: fewer than 20 disputed items, and always with two coders or
        without coders.

    Notes
    -----
    All that hold are named, in this order:

    1. A pair of labels, which speaks of the instructions: among three labels in use or more, the
       heaviest pair carries 20 % of D_o or more, 1.5 times the next pair's share or more, 1.5 times
       its share of D_e or more, in 10 items or more.
    2. A coder with 20 labels or more whose part of D_o is more than 1.2 times their part of the
       labels, and without whom alpha is higher by .03 or more. Of several, figures are given of the
       one without whom it is highest; the others are named.
    3. Items: half of D_o lies in 15 % of the disputed items or fewer.

    The first and the third are left out where alpha's interval does not lie above 0, for labels no
    better than chance tell nothing of the labels or items. The thresholds are our choice; no source
    gives them.
    """
    if scored.coders is None or np.count_nonzero(scored.coders.n_labels) < LEAST_CODERS:
        return None
    if scored.agreement.n_disputed_items < LEAST_DISPUTED_ITEMS:
        return None
    interval = scored.interval.interval
    above_chance = interval is not None and interval.low > 0
    found = [
        _of_label_pair(scored) if above_chance else None,
        _of_coder(scored),
        _of_items(scored) if above_chance else None,
    ]
    said = [part for part in found if part is not None]
    return f"Weight lies in {'; and in '.join(said)}." if said else None


def _of_label_pair(scored: VariableScore) -> str | None:
    pairs = scored.label_pairs
    if pairs.share.size < 2 or np.count_nonzero(scored.agreement.marginals) < LEAST_CODERS:
        return None  # with two labels there is only one pair
    # Pairs come heaviest first.
    least = max(
        PAIR_SHARE,
        PAIR_TIMES_NEXT * float(pairs.share[1]),
        PAIR_TIMES_CHANCE * float(scored.chance_shares[0]),
    )
    if pairs.share[0] < least or pairs.n_items[0] < LEAST_ITEMS_OF_A_PAIR:
        return None
    first, second = (scored.held.texts[int(value[0])] for value in (pairs.first, pairs.second))
    return (
        f'one pair of labels, "{first}" against "{second}" ({pairs.share[0]:.0%} of the '
        f"disagreement, in {int(pairs.n_items[0]):,} items: see what the instructions say of the "
        "two)"
    )


def _of_coder(scored: VariableScore) -> str | None:
    coders, without, alpha = scored.coders, scored.without, scored.agreement.alpha
    if coders is None or without is None or alpha is None:
        return None
    times = np.divide(
        coders.share,
        coders.share_of_labels,
        out=np.zeros_like(coders.share),
        where=coders.share_of_labels > 0,
    )
    lift = np.nan_to_num(without.alpha - alpha, nan=-1.0)
    stands_out = (
        (coders.n_labels >= LEAST_LABELS_OF_A_CODER) & (times > CODER_TIMES) & (lift >= CODER_LIFT)
    )
    if not bool(stands_out.any()):
        return None
    coder = int(np.argmax(np.where(stands_out, lift, -np.inf)))
    others = [scored.coder_names[at] for at in np.flatnonzero(stands_out).tolist() if at != coder]
    likewise = f"; the same holds of {listed(others)}" if others else ""
    return (
        f"coder {scored.coder_names[coder]} ({coders.share[coder]:.0%} of the disagreement with "
        f"{coders.share_of_labels[coder]:.0%} of the labels; alpha without them "
        f"{without.alpha[coder]:.3f} over {int(without.n_pairable_items[coder]):,} items{likewise}"
        ": ask how they read the instructions before judging)"
    )


def _of_items(scored: VariableScore) -> str | None:
    disputed = np.append(scored.agreement.disputed_profiles, False)
    parts = scored.contributions[disputed[scored.agreement.profile_of_item]]
    heaviest = np.sort(parts)[::-1]
    half = (scored.agreement.observed_disagreement or 0.0) / 2
    needed = int(np.searchsorted(np.cumsum(heaviest), half)) + 1
    if needed > HEAD_OF_ITEMS * heaviest.size:
        return None
    return (
        f"few items ({needed:,} of {heaviest.size:,} disputed ones carry half of the disagreement)"
    )
