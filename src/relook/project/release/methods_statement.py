"""Sentences for a methods section: every figure with its conditions, every rule its source."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

from relook import __version__
from relook.core.agreement import Agreement
from relook.core.resampling import Interval, IntervalResult
from relook.project.corrections.label_versions import LabelVersion
from relook.project.outcome.audit_findings import AuditFindings
from relook.project.outcome.rescoring import Rescore, VariableRescore
from relook.project.release.final_labels import FinalLabel, counts_of
from relook.project.setup.loading import Loaded

_SOURCES = {
    "alpha": "Krippendorff, K. (2004). Content Analysis: An Introduction to Its Methodology, 2nd "
    "ed., ch. 11. Sage.",
    "interval": "Zapf, A., Castell, S., Morawietz, L. & Karch, A. (2016). Measuring inter-rater "
    "reliability for nominal data. BMC Medical Research Methodology 16:93.",
    "audit": "Begg, C. B. & Greenes, R. A. (1983). Assessment of diagnostic tests when disease "
    "verification is subject to selection bias. Biometrics 39:207-215.",
    "weighted": "Zou, G. Y., Huang, W. & Zhang, X. (2009). A note on confidence interval "
    "estimation "
    "for a linear function of binomial proportions. Computational Statistics & Data Analysis "
    "53:1080-1085.",
    "doubt": "Dawid, A. P. & Skene, A. M. (1979). Maximum likelihood estimation of observer "
    "error-rates using the EM algorithm. Applied Statistics 28:20-28.",
    "masi": "Passonneau, R. (2006). Measuring agreement on set-valued items (MASI) for semantic "
    "and "
    "pragmatic annotation. LREC.",
    "tree": "Wu, Z. & Palmer, M. (1994). Verbs semantics and lexical selection. ACL.",
}
_CONSENSUS = {
    "identity": "the label that more of its coders gave than any other",
    "text": "the label that more of its coders gave than any other",
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
    first: Loaded,
    released: Loaded,
    rescored: Rescore | None,
    intervals: Mapping[str, IntervalResult],
    finals: Sequence[FinalLabel],
    *,
    ties: str,
    independent: bool | None,
    version: LabelVersion | None = None,
) -> str:
    """Return the statement, a paragraph per variable, then the sources.

    Parameters
    ----------
    first : Loaded
        With the labels as first given.
    released : Loaded
        With the labels that are released: the same, or a label version.
    rescored : Rescore or None
        Of the labels that are released; None where there are no decisions.
    intervals : mapping of str to IntervalResult
        Of alpha of the labels as first given, by variable.
    finals : sequence of FinalLabel
    ties : str
        The rule that was asked for.
    independent : bool or None
        Whether `first` holds the label files of the first round; None where no round was sent.
    version : LabelVersion or None
        Where labels that coders corrected themselves are released.
    """
    used = ["alpha"]
    paragraphs = []
    for name, agreement in first.agreements.items():
        again = None
        if rescored is not None:
            again = next(each for each in rescored.variables if each.name == name)
        interval = intervals[name].interval
        said = [
            _labels(name, agreement, first),
            _alpha(name, agreement, interval, first, independent),
        ]
        used += ["interval"] if interval is not None else []
        used += [each for each in ("masi", "tree") if agreement.function.name == each]
        if version is not None:
            said.append(_self_corrected(name, version, released))
        if again is not None and rescored is not None:
            said += _decisions(again, rescored)
            ranks = {held.settings.get("rank_by") for held in rescored.rounds}
            used += ["doubt"] if "doubt" in ranks else []
            if again.audits:
                said.append(_audit(again.audits[0]))
                used += ["audit", "weighted"]
        said.append(_released(name, released, finals, ties))
        paragraphs.append(" ".join(each for each in said if each))
    sources = [_SOURCES[name] for name in dict.fromkeys(used)]
    closing = f"Figures were computed with relook {__version__}."
    return "\n\n".join([*paragraphs, closing, "Sources", *sources]) + "\n"


def _labels(name: str, agreement: Agreement, first: Loaded) -> str:
    by = f" by {agreement.n_coders:,} coders" if agreement.n_coders else ""
    left = first.labels.left_out
    without = f" ({len(left):,} more left out)" if left else ""
    return (
        f'On "{name}", {agreement.n_items:,} items were given {agreement.n_labels:,} labels{by}'
        f"{without}; {agreement.n_pairable_items:,} items have two labels or more "
        f"({agreement.n_pairable_labels:,} labels, which alpha is of), and coders differ on "
        f"{agreement.n_disputed_items:,} of them."
    )


def _alpha(
    name: str,
    agreement: Agreement,
    interval: Interval | None,
    first: Loaded,
    independent: bool | None,
) -> str:
    which = {
        True: "of the labels that coders made independently",
        False: "of the labels, which changed after the first round of second looks was sent and "
        "are "
        "not independent,",
        None: "of the labels",
    }[independent]
    if agreement.alpha is None:
        return f"Krippendorff's alpha {which} is undefined: {agreement.undefined_because}."
    function = first.labels.variables[name].variable.difference
    said = (
        f"Krippendorff's alpha {which} ({function} differences) is {agreement.alpha:.3f} (observed "
        f"disagreement {_amount(agreement.observed_disagreement)}, expected "
        f"{_amount(agreement.expected_disagreement)}; Krippendorff 2004"
    )
    if interval is not None:
        said += (
            f"; {interval.confidence_level:.0%} interval {interval.low:.3f} to "
            f"{interval.high:.3f} from {interval.resamples:,} resamples of items with their "
            "labels, "
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
    reveal = {str(each.settings.get("reveal", "labels")) for each in rescored.rounds}
    shown = ""
    if len(reveal) == 1:
        shown = f", {_REVEALED[reveal.pop()]}" if reveal <= _REVEALED.keys() else ""
    states, after = held.states, held.corrected.after
    audit = " and on a random audit" if held.audits else ""
    ways = [
        f"{_counted(states['settled'], 'item was', 'items were')} settled",
        f"{states['cannot be coded']:,} found impossible to code",
        f"{states['split']:,} remained split",
    ]
    said = [
        (
            f"{_counted(held.n_adjudicators, 'adjudicator', 'adjudicators')} ruled on items chosen "
            f"by {_chosen(rescored)}{audit}{shown}: {', '.join(ways)}."
        )
    ]
    if states["unconfirmed"]:
        verb = "was" if states["unconfirmed"] == 1 else "were"
        said.append(
            f"{_counted(states['unconfirmed'], 'ruling', 'rulings')} against unanimous coders "
            f"{verb} not confirmed by a second adjudicator and not applied."
        )
    if after.agreement is not None:
        said.append(
            f"With the decisions put in, agreement in the corrected data is {after.agreement:.3f}; "
            "decided items agree by construction, so this is not a reliability."
        )
    if rescored.stale:
        own = [each for each in rescored.stale if each.decision.variable == held.name]
        if own:
            said.append(
                f"{_counted(len(own), 'decision was', 'decisions were')} made on labels that "
                "changed since."
            )
    return said


def _chosen(rescored: Rescore) -> str:
    """By what the rounds ranked items, in words."""
    words = {
        "contribution": "their contribution to the disagreement",
        "doubt": "the estimated probability that their consensus label is wrong (Dawid & Skene "
        "1979)",
        "intensity": "the mean difference between two of their labels",
    }
    used = dict.fromkeys(
        str(held.settings.get("rank_by", "contribution")) for held in rescored.rounds
    )
    return " and ".join(words[each] for each in used if each in words) or "the lead"


def _audit(held: AuditFindings) -> str:
    result = held.result
    ruled = sum(part.n_ruled for part in result.strata)
    otherwise = sum(part.n_otherwise for part in result.strata)
    verb = "was" if otherwise == 1 else "were"
    said = (
        f"Of {ruled:,} audit items drawn at random within strata from those that would be released "
        f"without a decision, {otherwise:,} {verb} ruled otherwise"
    )
    if result.share_ruled_otherwise is None:
        return f"{said}; no share is estimated, as {result.undefined_because}."
    total = sum(part.n_items for part in result.strata)
    ties = (
        f" {held.n_ties:,} of the ruled items had tied labels and count as not ruled otherwise, as "
        "if ties were released blank."
        if held.n_ties
        else ""
    )
    return (
        f"{said}; weighted by the sizes of the strata (Begg & Greenes 1983), an estimated "
        f"{result.share_ruled_otherwise:.1%} of {total:,} items ({result.confidence_level:.0%} "
        f"interval {result.low:.1%} to {result.high:.1%}; exact limits combined after Zou et al. "
        f"2009).{ties}"
    )


def _released(name: str, released: Loaded, finals: Sequence[FinalLabel], ties: str) -> str:
    own = [each for each in finals if each.variable == name]
    ways = ", ".join(f"{way} {n:,}" for way, n in counts_of(own).items() if n)
    blank = sum(1 for each in own if not each.label)
    rule = {
        "blank": "Ties and splits are blank.",
        "most-used": "Ties and splits took the candidate label used most over all items.",
        "random": "Ties and splits took one of their candidate labels at random.",
    }[ties]
    return (
        f"Released are {len(own) - blank:,} final labels of {len(own):,} items ({ways}; {blank:,} "
        f"blank). Without a decision an item's final label is {_consensus(released, name)}. {rule}"
    )


def _consensus(released: Loaded, name: str) -> str:
    difference = released.labels.variables[name].variable.difference
    if difference in ("jaccard", "masi"):
        return "the set of the elements that more than half of its labels hold"
    if difference == "circular":
        return "the mean direction of its labels"
    return _CONSENSUS[released.agreements[name].function.needs]


def _counted(n: int, one: str, many: str) -> str:
    return f"{n:,} {one if n == 1 else many}"


def _amount(value: float | None) -> str:
    if value is None:
        return "undefined"
    return f"{value:,.1f}" if abs(value) >= 1000 else f"{value:.4g}"
