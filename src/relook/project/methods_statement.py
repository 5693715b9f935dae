"""A few sentences for a methods section: every figure with its conditions, every rule its source."""

from __future__ import annotations

from collections.abc import Sequence

from relook import __version__
from relook.project.audit_findings import AuditFindings
from relook.project.final_labels import FinalLabel, counts_of
from relook.project.label_versions import LabelVersion
from relook.project.loading import Loaded
from relook.project.rescoring import Rescore, VariableRescore
from relook.project.scoring import VariableScore

_SOURCES = {
    "alpha": "Krippendorff, K. (2004). Content Analysis: An Introduction to Its Methodology, 2nd "
    "ed., ch. 11. Sage.",
    "interval": "Zapf, A., Castell, S., Morawietz, L. & Karch, A. (2016). Measuring inter-rater "
    "reliability for nominal data. BMC Medical Research Methodology 16:93.",
    "audit": "Begg, C. B. & Greenes, R. A. (1983). Assessment of diagnostic tests when disease "
    "verification is subject to selection bias. Biometrics 39:207-215.",
    "weighted": "Zou, G. Y., Huang, W. & Zhang, X. (2009). A note on confidence interval estimation "
    "for a linear function of binomial proportions. Computational Statistics & Data Analysis "
    "53:1080-1085.",
    "masi": "Passonneau, R. (2006). Measuring agreement on set-valued items (MASI) for semantic and "
    "pragmatic annotation. LREC.",
    "tree": "Wu, Z. & Palmer, M. (1994). Verbs semantics and lexical selection. ACL.",
}
_CONSENSUS = {
    "identity": "the label most coders gave",
    "order": "the median label",
    "number": "the mean of its labels",
}
_REVEALED = {
    "nothing": "without being shown the coders' labels",
    "labels": "shown the competing labels, but not who or how many had given them",
    "tallies": "shown the competing labels and how many coders had given them",
    "names": "shown which coder had given which label",
}


def methods_statement(
    loaded: Loaded,
    rescored: Rescore | None,
    scored: Sequence[VariableScore],
    finals: Sequence[FinalLabel],
    *,
    ties: str,
    version: LabelVersion | None = None,
) -> str:
    """Return the statement, a paragraph per variable, then the sources.

    Parameters
    ----------
    loaded : Loaded
        With the labels that are released.
    rescored : Rescore or None
        Of the labels as first given; None where there are no decisions.
    scored : sequence of VariableScore
        Of the labels as first given.
    finals : sequence of FinalLabel
    ties : str
        The rule that was asked for.
    version : LabelVersion or None
        Where labels that coders corrected themselves are released.
    """
    used = ["alpha"]
    paragraphs = []
    for held in scored:
        again = None
        if rescored is not None:
            again = next(each for each in rescored.variables if each.name == held.name)
        said = [_labels(held, loaded), _alpha(held, rescored)]
        if held.interval.interval is not None:
            used.append("interval")
        used += [name for name in ("masi", "tree") if held.agreement.function.name == name]
        if version is not None:
            said.append(_self_corrected(held.name, version, loaded))
        if again is not None and rescored is not None:
            said += _decisions(again, rescored)
            if again.audits:
                said.append(_audit(again.audits[0]))
                used += ["audit", "weighted"]
        said.append(_released(held, finals, ties))
        paragraphs.append(" ".join(each for each in said if each))
    sources = [_SOURCES[name] for name in dict.fromkeys(used)]
    closing = f"Figures were computed with relook {__version__}."
    return "\n\n".join([*paragraphs, closing, "Sources", *sources]) + "\n"


def _labels(held: VariableScore, loaded: Loaded) -> str:
    agreement = held.agreement
    by = f" by {agreement.n_coders:,} coders" if agreement.n_coders else ""
    left = loaded.labels.left_out
    without = f" ({len(left):,} coders left out)" if left else ""
    return (
        f'On "{held.name}", {agreement.n_items:,} items were given {agreement.n_labels:,} '
        f"labels{by}{without}; {agreement.n_pairable_items:,} items have two labels or more, and "
        f"coders differ on {agreement.n_disputed_items:,} of them."
    )


def _alpha(held: VariableScore, rescored: Rescore | None) -> str:
    agreement, result = held.agreement, held.interval
    function = held.held.variable.difference
    which = "of the labels"
    if rescored is None or rescored.independent:
        which = "of the labels as coders first gave them"
    elif rescored.changed_files:
        which = (
            "of the labels, which were changed after the first round of second looks was sent and "
            "are not independent,"
        )
    if agreement.alpha is None:
        return f"Krippendorff's alpha {which} is undefined: {agreement.undefined_because}."
    said = (
        f"Krippendorff's alpha {which} ({function} differences) is {agreement.alpha:.3f} (observed "
        f"disagreement {agreement.observed_disagreement:.4g}, expected "
        f"{agreement.expected_disagreement:.4g}; Krippendorff 2004"
    )
    if result.interval is not None:
        interval = result.interval
        said += (
            f"; {interval.confidence_level:.0%} interval {interval.low:.3f} to "
            f"{interval.high:.3f} from {interval.resamples:,} resamples of items with their labels, "
            f"seed {interval.seed}, Zapf et al. 2016"
        )
    return f"{said})."


def _self_corrected(name: str, version: LabelVersion, loaded: Loaded) -> str:
    summary = version.summary.get(name, {})
    figure = loaded.agreements[name].alpha
    after = "undefined" if figure is None else f"{figure:.3f}"
    return (
        f"Coders then corrected labels of their own: {summary.get('changed', 0):,} changed, of "
        f"which {summary.get('toward', 0):,} toward the other coders' labels and "
        f"{summary.get('away', 0):,} away from them. Agreement after that correction, which is not "
        f"independent and no reliability, is {after}."
    )


def _decisions(held: VariableRescore, rescored: Rescore) -> list[str]:
    people = {
        decision.adjudicator
        for each in held.corrected.settled
        for decision in each.standing
    }
    reveal = {str(each.settings.get("reveal", "labels")) for each in rescored.rounds}
    shown = ""
    if len(reveal) == 1:
        shown = f", {_REVEALED[reveal.pop()]}" if reveal <= _REVEALED.keys() else ""
    states, after = held.states, held.corrected.after
    said = [
        f"{len(people):,} adjudicator{'s' if len(people) != 1 else ''} ruled on items chosen by "
        f"their contribution to the disagreement and on a random audit{shown}: "
        f"{states['settled']:,} items were settled, {states['cannot be coded']:,} found impossible "
        f"to code, {states['split']:,} remained split, and {states['unconfirmed']:,} rulings "
        "against unanimous coders were not confirmed by a second adjudicator and not applied."
    ]
    if not held.audits:
        said[0] = said[0].replace(" and on a random audit", "")
    if after.agreement is not None:
        said.append(
            f"With the decisions put in, agreement in the corrected data is {after.agreement:.3f}; "
            "decided items agree by construction, so this is not a reliability."
        )
    if rescored.stale:
        own = [each for each in rescored.stale if each.decision.variable == held.name]
        if own:
            said.append(f"{len(own):,} decisions were made on labels that changed since.")
    return said


def _audit(held: AuditFindings) -> str:
    result = held.result
    ruled = sum(part.n_ruled for part in result.strata)
    otherwise = sum(part.n_otherwise for part in result.strata)
    said = (
        f"Of {ruled:,} audit items drawn at random within strata from those that would be released "
        f"without a decision, {otherwise:,} were ruled otherwise"
    )
    if result.share_ruled_otherwise is None:
        return f"{said}; no share is estimated, as {result.undefined_because}."
    total = sum(part.n_items for part in result.strata)
    return (
        f"{said}; weighted by the sizes of the strata (Begg & Greenes 1983), an estimated "
        f"{result.share_ruled_otherwise:.1%} of {total:,} items ({result.confidence_level:.0%} "
        f"interval {result.low:.1%} to {result.high:.1%}; exact limits combined after Zou et al. "
        "2009)."
    )


def _released(held: VariableScore, finals: Sequence[FinalLabel], ties: str) -> str:
    own = [each for each in finals if each.variable == held.name]
    counts = counts_of(own)
    ways = ", ".join(f"{name} {n:,}" for name, n in counts.items() if n)
    blank = sum(1 for each in own if not each.label)
    rule = {
        "blank": "Ties and splits are blank.",
        "most-used": "Ties and splits took the candidate label used most over all items.",
        "random": "Ties and splits took one of their candidate labels at random.",
    }[ties]
    consensus = _consensus(held)
    return (
        f"Released are {len(own) - blank:,} final labels of {len(own):,} items ({ways}; {blank:,} "
        f"blank). Without a decision an item's final label is {consensus}. {rule}"
    )


def _consensus(held: VariableScore) -> str:
    difference = held.held.variable.difference
    if difference in ("jaccard", "masi"):
        return "the set of the elements that more than half of its labels hold"
    if difference == "circular":
        return "the mean direction of its labels"
    return _CONSENSUS[held.agreement.function.needs]
