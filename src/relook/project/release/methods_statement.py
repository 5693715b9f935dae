"""Sentences for a methods section: every figure with its conditions, every rule its source."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

from relook import __version__
from relook.core.agreement import Agreement
from relook.core.doubt import SHRINK
from relook.core.resampling import IntervalResult
from relook.project.corrections.label_versions import LabelVersion
from relook.project.figures.interval_words import interval_draws, interval_ends
from relook.project.figures.scoring import resampled_by
from relook.project.outcome import rescore_sentences as sentences
from relook.project.outcome.audit_findings import AuditFindings, audited_items
from relook.project.outcome.rescoring import Rescore, VariableRescore
from relook.project.release.final_labels import FinalLabel, counts_of
from relook.project.setup.loading import Loaded

_SOURCES = {
    "alpha": "Krippendorff, K. (2004). Content Analysis: An Introduction to Its Methodology, 2nd "
    "ed., ch. 11. Sage.",
    "interval": "Zapf, A., Castell, S., Morawietz, L. & Karch, A. (2016). Measuring inter-rater "
    "reliability for nominal data - which coefficients and confidence intervals are appropriate? "
    "BMC Medical Research Methodology 16:93.",
    "few": "Hughes, J. (2022). Toward improved inference for Krippendorff's Alpha agreement "
    "coefficient. arXiv:2210.13265.",
    "audit": "Begg, C. B. & Greenes, R. A. (1983). Assessment of diagnostic tests when disease "
    "verification is subject to selection bias. Biometrics 39:207-215.",
    "exact": "Buonaccorsi, J. P. (1987). A note on confidence intervals for proportions in finite "
    "populations. The American Statistician 41:215-218.",
    "weighted": "Zou, G. Y., Huang, W. & Zhang, X. (2009). A note on confidence interval "
    "estimation for a linear function of binomial proportions. Computational Statistics & Data "
    "Analysis 53:1080-1085.",
    "doubt": "Dawid, A. P. & Skene, A. M. (1979). Maximum likelihood estimation of observer "
    "error-rates using the EM algorithm. Applied Statistics 28:20-28.",
    "jaccard": "Jaccard, P. (1912). The distribution of the flora in the alpine zone. New "
    "Phytologist 11:37-50.",
    "masi": "Passonneau, R. (2006). Measuring agreement on set-valued items (MASI) for semantic "
    "and pragmatic annotation. LREC.",
    "tree": "Wu, Z. & Palmer, M. (1994). Verb semantics and lexical selection. ACL.",
}
_FOR_THE_AUTHORS = (
    "For the authors to add, since no file shows it: how items were chosen; how coders were "
    "trained and kept from each other's labels, without which alpha is no reliability; why labels "
    "are missing, if any are; who adjudicated, and under which instructions."
)
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
            _alpha(name, agreement, intervals[name], first, independent),
        ]
        used += ["interval"] if interval is not None else []
        used += ["few"] if intervals[name].warning is not None else []
        used += [each for each in ("jaccard", "masi", "tree") if agreement.function.name == each]
        if version is not None:
            said.append(_self_corrected(name, version, released))
        if again is not None and rescored is not None:
            said += _decisions(again, rescored)
            ranks = {held.settings.get("rank_by") for held in rescored.rounds}
            used += ["doubt"] if "doubt" in ranks else []
            if again.audits:
                said.append(_audit(again.audits[0], ties))
                if again.audits[0].result.share_ruled_otherwise is not None:
                    used += ["audit", "exact", "weighted"]
        said.append(_released(name, released, finals, ties))
        paragraphs.append(" ".join(each for each in said if each))
    sources = [_SOURCES[name] for name in dict.fromkeys(used)]
    closing = f"Figures were computed with relook {__version__}."
    return "\n\n".join([*paragraphs, _FOR_THE_AUTHORS, closing, "Sources", *sources]) + "\n"


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
    result: IntervalResult,
    first: Loaded,
    independent: bool | None,
) -> str:
    which = {
        True: "of the labels as they were before the first round of second looks",
        False: "of the labels, which changed after the first round of second looks was sent and "
        "are not independent,",
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
    if result.interval is None:
        return f"{said})."
    drawn = interval_draws(result.interval, resampled_by(first))
    said += (
        f"; {interval_ends(result.interval)}, {drawn}, each with all its labels, Zapf et al. 2016)."
    )
    said += " The interval takes items for a random sample and missing labels for missing at random"
    said += ", and speaks of these coders alone."
    few = "" if result.warning is None else f" Caution (Hughes 2022): {result.warning}."
    return f"{said}{few}"


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
    ways = [
        f"{_counted(states['settled'], 'item was', 'items were')} settled",
        f"{states['cannot be coded']:,} found impossible to code",
        f"{states['split']:,} remained split",
    ]
    by = _counted(held.n_adjudicators, "adjudicator", "adjudicators")
    said = [
        _sent(held, rescored),
        f"{by} ruled on {'the others' if _n_unruled(held) else 'them'}{shown}: {', '.join(ways)}.",
        _own_items(rescored),
        _padded(held, rescored),
        sentences.overlap_sentence(held.overlap),
    ]
    if states["unconfirmed"]:
        verb = "was" if states["unconfirmed"] == 1 else "were"
        said.append(
            f"{_counted(states['unconfirmed'], 'ruling', 'rulings')} against unanimous coders "
            f"{verb} not confirmed by a second adjudicator and not applied."
        )
    if after.agreement is not None:
        said.append(
            f"With the decisions put in, agreement in the corrected data is {after.agreement:.3f} "
            f"over {after.n_pairable_items:,} items{_before(held)}; decided items agree by "
            f"construction, so this is not a reliability.{_at_random(held)}"
        )
    if rescored.stale:
        own = [each for each in rescored.stale if each.decision.variable == held.name]
        if own:
            said.append(
                f"{_counted(len(own), 'decision was', 'decisions were')} made on labels that "
                "changed since."
            )
    return said


def _n_unruled(held: VariableRescore) -> int:
    return held.n_waiting + held.states["open"]


def _sent(held: VariableRescore, rescored: Rescore) -> str:
    """How many items were sent for what reason, and how many nobody ruled on."""
    sent = {row.item for each in rescored.rounds for row in each.rows if row.variable == held.name}
    n_audit = len(audited_items(rescored.rounds, held.name))
    if not sent:
        return ""
    parts = [f"{len(sent) - n_audit:,} chosen by {_chosen(rescored)}"]
    parts += [f"{n_audit:,} drawn at random as an audit"] if n_audit else []
    n_unruled = _n_unruled(held)
    waiting = (
        f" {_counted(n_unruled, 'of them has', 'of them have')} no ruling and "
        f"{'is' if n_unruled == 1 else 'are'} released like items that were not sent."
        if n_unruled
        else ""
    )
    items = _counted(len(sent), "item was", "items were")
    return f"{items} sent for a second look: {' and '.join(parts)}.{waiting}"


def _own_items(rescored: Rescore) -> str:
    """Whether adjudicators had coded, as far as the settings name both."""
    named = rescored.loaded.project.settings.worksheet.adjudicators
    coded = sum(coder is not None for coder in named.values())
    if not coded:
        return ""
    return (
        f"{coded:,} of the {len(named):,} adjudicators had coded too; nobody was sent an item that "
        "they had labelled."
    )


def _padded(held: VariableRescore, rescored: Rescore) -> str:
    """That rows showed labels nobody gave, where some did."""
    hidden = any(each.settings.get("reveal") == "labels" for each in rescored.rounds)
    if not (hidden and audited_items(rescored.rounds, held.name)):
        return ""
    return (
        "So that audit items could not be told from the others, they were shown with further "
        "labels that nobody had given."
    )


def _before(held: VariableRescore) -> str:
    common = held.corrected.common.alpha
    return "" if common is None else f" (alpha of the same items: {common:.3f})"


def _at_random(held: VariableRescore) -> str:
    """What settling alone brings, without which the figure before says nothing."""
    drawn = held.any_label
    if drawn is None:
        return ""
    low, high = f"{drawn.low:.3f}", f"{drawn.high:.3f}"
    return (
        " Had each of them taken one of its own labels at random, it would be "
        f"{low if low == high else f'{low} to {high}'} ({drawn.draws} draws, seed {drawn.seed})."
    )


def _chosen(rescored: Rescore) -> str:
    """By what the rounds ranked items, in words."""
    words = {
        "contribution": "their contribution to the disagreement",
        "doubt": "how doubtful their consensus label is under the model of Dawid & Skene (1979), "
        f"each coder's table drawn toward the pooled one by {SHRINK:g} labels",
        "intensity": "the mean difference between two of their labels",
    }
    used = dict.fromkeys(
        str(held.settings.get("rank_by", "contribution")) for held in rescored.rounds
    )
    chosen = " and ".join(words[each] for each in used if each in words)
    return (
        f"{chosen} (ties by doubt where it is defined, then by intensity)" if chosen else "the lead"
    )


def _audit(held: AuditFindings, ties: str) -> str:
    result = held.result
    ruled = sum(part.n_ruled for part in result.strata)
    otherwise = sum(part.n_otherwise for part in result.strata)
    verb = "was" if otherwise == 1 else "were"
    items = _counted(held.n_drawn, "item was", "items were")
    said = (
        f"For the audit {items} drawn at random within strata from those that would be released "
        f"without a decision; of {ruled:,} of them with a ruling and a label to hold it against, "
        f"{otherwise:,} {verb} ruled otherwise"
    )
    if result.share_ruled_otherwise is None:
        return f"{said}; no share is estimated, as {result.undefined_because}."
    total = sum(part.n_items for part in result.strata)
    more = ["Adjudicators' own slips count as rulings otherwise."] if otherwise else []
    if held.n_unresolved:
        more.append(
            f"{_counted(held.n_unresolved, 'ruling', 'rulings')} among these, split or not "
            "confirmed by a second adjudicator, may yet fall."
        )
    if held.n_left_out:
        further = _counted(held.n_left_out, "further item", "further items")
        more.append(
            f"{further} among which the audit was drawn would be released blank because their "
            f"labels tie, and {'is' if held.n_left_out == 1 else 'are'} not counted."
        )
    if held.n_ties and ties != "blank":
        more.append(
            f"{held.n_ties:,} of the ruled items had tied labels and were held against the label "
            "that the rule for ties gives them."
        )
    if held.n_drawn > ruled + (held.n_ties if held.n_left_out else 0):
        more.append("Audit items without a ruling are taken as missing at random.")
    estimated = (
        f"{said}; weighted by the sizes of the strata (Begg & Greenes 1983), an estimated "
        f"{result.share_ruled_otherwise:.1%} of the {total:,} items that would be released with a "
        f"label had no audit item been ruled on ({result.confidence_level:.0%} interval "
        f"{result.low:.1%} to {result.high:.1%}; exact limits for finite strata, Buonaccorsi 1987, "
        "combined after Zou et al. 2009)."
    )
    return " ".join([estimated, *more])


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
