"""The figures of a rescore in sentences, each with its condition and no more than it allows.

Screens, workbooks and the methods statement all say them from here. The rule for reasons is ours
and states its counts; that disagreement is first a fault of the instructions follows Oortwijn et
al. (2021).
"""

from __future__ import annotations

from relook.core.audit import SLIP_EXAMPLE
from relook.project.outcome.audit_findings import AuditFindings
from relook.project.outcome.moves import LEAST_SHARED_ITEMS, Overlap, ReasonCount
from relook.project.outcome.rescoring import AnyLabel, Rescore, VariableRescore

#: A reason allows a conclusion where so many items have one, and it is that of so many and of this
#: share of them.
LEAST_ITEMS_WITH_REASON = 10
LEAST_ITEMS_OF_A_REASON = 5
LEAST_SHARE_OF_A_REASON = 0.2

#: So many items that adjudicators share are enough to caution of how little they agree.
LEAST_ITEMS_OF_A_CAUTION = 5

#: What each of the reasons that relook.toml has by default allows to conclude. Reasons of one's own
#: are counted, and nothing is concluded from them.
CONCLUSIONS = {
    "coder slip": "these were slips, which decisions mend; the instructions need no change for "
    "them",
    "instructions unclear": "mend the instructions before coding more",
    "item ambiguous": "no instruction will settle these; say in the instructions what to do with "
    "items that allow two labels",
    "context missing": "show coders more of the context before coding more",
    "no fitting label": "the set of labels has a gap; look at what these items share",
}

INDEPENDENT = (
    "Alpha is of the labels as they were before the first round, and a reliability only if coders "
    "made them independently of each other; decisions do not enter."
)
NOT_INDEPENDENT = (
    "The label files changed after the first round was sent, so these labels may have been changed "
    "because of it. This figure is not a reliability."
)
UNKNOWN_INDEPENDENCE = (
    "No round was sent, so nothing here tells whether these labels were changed after somebody saw "
    "them. Alpha is a reliability only if they were made independently."
)
CORRECTED = (
    "Agreement in the corrected data is what is left after decisions replaced labels. Decided "
    "items "
    "agree because they were decided, rightly or wrongly, so it is not a reliability, and its "
    "distance from alpha is not a gain in one. No interval is put on that distance. Only fresh, "
    "independent coding gives a new alpha."
)
DISPUTED_ONLY = (
    "On disputed items somebody must differ from the decision, and they are the hardest: they "
    "alone "
    "do not judge a person. Audit items were drawn at random from what was not queued, so they are "
    "the easier ones."
)


def meaning_of_alpha(held: Rescore) -> str:
    """Say what the figure of the labels as given is, by what is known of them."""
    if held.independent:
        return INDEPENDENT
    return NOT_INDEPENDENT if held.changed_files else UNKNOWN_INDEPENDENCE


def name_of_alpha(held: Rescore) -> str:
    """Return what to call the figure of the labels as given."""
    return "alpha, independent labels" if held.independent else "alpha of the labels as they stand"


def any_label_sentence(held: AnyLabel | None) -> str | None:
    """Say what settling the same items to labels drawn at random would bring."""
    if held is None:
        return None
    low, high = f"{held.low:.3f}", f"{held.high:.3f}"
    return (
        "For comparison: had each decided item taken one of its own labels at random, agreement in "
        f"the corrected data would be {low if low == high else f'{low} to {high}'} "
        f"({held.draws} draws, seed "
        f"{held.seed}). A figure like that comes from settling alone and says nothing of whether "
        "the decisions are right."
    )


def states_sentence(held: VariableRescore) -> str:
    """Say how many items stand how."""
    states = held.states
    said = (
        f"{_counted(states['settled'], 'item')} settled, {states['cannot be coded']:,} cannot be "
        f"coded, {states['split']:,} split, {states['unconfirmed']:,} unconfirmed, "
        f"{states['open']:,} open (withdrawn)"
    )
    return f"{said}; {held.n_waiting:,} sent and not ruled on."


def unchanged_sentence(held: VariableRescore) -> str | None:
    """Say which ruled items keep their coders' labels."""
    split, unconfirmed = held.states["split"], held.states["unconfirmed"]
    said = []
    if split:
        said.append(
            f"{_counted(split, 'split')} {'keeps' if split == 1 else 'keep'} the coders' labels "
            "until adjudicators agree."
        )
    if unconfirmed:
        said.append(
            f"{_counted(unconfirmed, 'ruling')} against unanimous coders "
            f"{'waits' if unconfirmed == 1 else 'wait'} for a second adjudicator; the coders' "
            "label "
            "stands till then, since most such rulings may be slips of the adjudicator."
        )
    return " ".join(said) or None


def reason_sentences(reasons: tuple[ReasonCount, ...]) -> tuple[str, ...]:
    """Return the plain conclusions that the reasons allow; none below the stated counts.

    Notes
    -----
    A reason is concluded from where 10 items or more have a reason and it is that of 5 of them or
    more and of 20 % or more. The thresholds are our choice; no source gives them.
    """
    said = [
        f'"{each.reason}" in {each.n_items:,} of {each.n_with_reason:,}: '
        f"{CONCLUSIONS[each.reason]}."
        for each in reasons
        if each.reason in CONCLUSIONS and allows_conclusion(each)
    ]
    if not reasons:
        return ("No reason was given, so nothing is said of why coders differed.",)
    if not said:
        n = reasons[0].n_with_reason
        return (f"{_counted(n, 'item')} with a reason: too few of any one to conclude from.",)
    return tuple(said)


def allows_conclusion(held: ReasonCount) -> bool:
    """Whether enough items have this reason."""
    return (
        held.n_with_reason >= LEAST_ITEMS_WITH_REASON
        and held.n_items >= LEAST_ITEMS_OF_A_REASON
        and held.n_items >= LEAST_SHARE_OF_A_REASON * held.n_with_reason
    )


def audit_sentence(held: AuditFindings) -> str:
    """Say what the audit found over all its strata."""
    result = held.result
    ruled = sum(part.n_ruled for part in result.strata)
    otherwise = sum(part.n_otherwise for part in result.strata)
    total = sum(part.n_items for part in result.strata)
    head = (
        f"Audit of round {held.round}: {otherwise:,} of {_counted(ruled, 'ruled item')} "
        f"({held.n_drawn:,} drawn) ruled otherwise than they would be released."
    )
    if result.share_ruled_otherwise is None:
        return f"{head} No share is given for the release: {result.undefined_because}."
    return (
        f"{head} Weighed by the sizes of the strata that is "
        f"{result.share_ruled_otherwise:.1%} of the {total:,} items that would be released with a "
        f"label but no decision ({result.confidence_level:.0%} interval {result.low:.1%} to "
        f"{result.high:.1%})."
    )


def audit_cautions(held: AuditFindings, n_sent_since: int) -> tuple[str, ...]:
    """Say what to bear in mind of an audit."""
    said = []
    if held.n_unresolved:
        verb = "is a split or waits" if held.n_unresolved == 1 else "are splits or wait"
        said.append(
            f"{held.n_unresolved:,} of them {verb} for a second adjudicator and may yet turn out a "
            "slip."
        )
    if held.n_left_out:
        said.append(
            f"Not counted: {_counted(held.n_left_out, 'item')} whose labels tie, {held.n_ties:,} "
            "of them ruled on in the audit; without a decision they are released blank."
        )
    if n_sent_since:
        said.append(
            f"Later rounds sent {_counted(n_sent_since, 'more item')}; the share is of what would "
            f"have been released when round {held.round} was drawn."
        )
    if any(part.n_otherwise for part in held.result.strata):
        said.append(
            "Adjudicators slip too, and their slips count here: in a made example of "
            f"{SLIP_EXAMPLE.true_share:.0%} wrong items and {SLIP_EXAMPLE.slip_rate:.0%} slips an "
            f"audit would show {SLIP_EXAMPLE.share_shown:.1%}."
        )
    return tuple(said)


def overlap_caution(held: Overlap) -> str | None:
    """Say it where adjudicators agree on fewer than half of 5 shared items or more (our choice)."""
    if held.n_items < LEAST_ITEMS_OF_A_CAUTION or 2 * held.n_agree >= held.n_items:
        return None
    return (
        f"Caution: adjudicators agree on {held.n_agree:,} of the {held.n_items:,} items that "
        "several of them ruled on, so decisions may be no steadier than the labels that they "
        "replace. See to the splits and to the instructions before more is decided."
    )


def overlap_sentence(held: Overlap) -> str:
    """Say how adjudicators agree with each other."""
    if not held.n_items:
        return "No item was ruled on by two adjudicators independently of each other."
    said = (
        f"{held.n_adjudicators} adjudicators share {_counted(held.n_items, 'item')} and agree on "
        f"{held.n_agree:,}."
    )
    if held.alpha is not None:
        return (
            f"{said} Their own alpha is {held.alpha:.3f} over {held.n_labelled_items:,} of these "
            "items, chosen ones and no random sample."
        )
    if held.n_labelled_items < LEAST_SHARED_ITEMS:
        return f"{said} Too few for an alpha of their own (fewer than {LEAST_SHARED_ITEMS})."
    return f"{said} Their own alpha is undefined: {held.undefined_because}."


def stale_sentence(held: Rescore) -> str | None:
    """Say which decisions were made on other labels, or on items that are gone."""
    said = []
    for word, entries in (
        ("made on labels that have changed since", held.stale),
        ("on items that are no longer in the label table; they are not put in", held.gone),
    ):
        if entries:
            items = list(dict.fromkeys(entry.decision.item for entry in entries))
            named = ", ".join(items[:12]) + (f" and {len(items) - 12:,} more" if items[12:] else "")
            said.append(f"{_counted(len(entries), 'standing decision')} {word}: {named}.")
    return " ".join(said) or None


def _counted(n: int, one: str) -> str:
    return f"{n:,} {one if n == 1 else one + 's'}"
