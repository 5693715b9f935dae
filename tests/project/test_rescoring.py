"""Before and after: figures as the slow twin has them, and sentences that say no more."""

import random
from fractions import Fraction

import numpy as np
import pytest
from scipy.stats import hypergeom

from reference import by_definition
from reference.concluded_project import Ruling, make_project, rule, send_round, write_labels
from relook.core.decisions import Settlement
from relook.errors import ExitCode, RelookError
from relook.project.archive.record import read_record
from relook.project.archive.rounds import Round, RoundRow, RoundStratum, read_rounds
from relook.project.archive.settlements import settlements
from relook.project.outcome import rescore_sentences as sentences
from relook.project.outcome.audit_findings import audits_of
from relook.project.outcome.moves import Overlap, ReasonCount
from relook.project.outcome.rescore_tables import rescore_object
from relook.project.outcome.rescoring import rescore
from relook.project.setup.loading import load


def rescored(project, **options):
    options.setdefault("seed", 1)
    return rescore(load(project), resamples=200, **options)


def only(held):
    (variable,) = held.variables
    return variable


LABELS = {
    "i1": [("c1", "a"), ("c2", "b"), ("c3", "b")],
    "i2": [("c1", "a"), ("c2", "a")],
    "i3": [("c1", "b"), ("c2", "c"), ("c3", "a")],
    "i4": [("c1", "c"), ("c2", "c"), ("c3", "c")],
    "i5": [("c1", "a"), ("c2", "b")],
    "i6": [("c1", "b"), ("c2", "a")],
    "i7": [("c1", "a")],
}


def made(tmp_path, rulings, labels=LABELS, sent=None, **options):
    project = make_project(tmp_path / "p", labels, **options)
    send_round(project, labels, sent or {each.item: each.kind for each in rulings})
    rule(project, labels, rulings)
    return project


def random_case(rng, values):
    labels = {
        f"i{at:02d}": [
            (f"c{coder}", str(rng.choice(values)))
            for coder in rng.sample(range(5), rng.randint(1, 4))
        ]
        for at in range(25)
    }
    decided = {
        item: None if rng.random() < 0.2 else str(rng.choice(values))
        for item in rng.sample(sorted(labels), 9)
        if len(set(labels[item])) > 1
    }
    # A ruling against coders who all agree waits for a second adjudicator, so none is made here.
    decided = {
        item: label
        for item, label in decided.items()
        if len({given for _, given in labels[item]}) > 1
    }
    return labels, decided


@pytest.mark.parametrize("seed", range(4))
@pytest.mark.parametrize(
    ("difference", "delta"),
    [
        ("nominal", by_definition.nominal),
        ("ordinal", by_definition.ordinal),
        ("interval", by_definition.interval),
    ],
)
def test_figures_before_after_and_on_common_items_equal_the_slow_twin(
    tmp_path, seed, difference, delta
):
    """Alpha, D_o and D_e of random tables with random decisions, to 12 digits; some values new."""
    rng = random.Random(f"{seed} {difference}")
    labels, decided = random_case(rng, [1, 2, 3, 5, 8])
    if difference != "nominal" and any(decided.values()):
        first = next(item for item, label in decided.items() if label is not None)
        decided[first] = "4"  # which nobody gave, and which lies between labels in use
    rulings = [Ruling(item, label) for item, label in decided.items()]
    project = made(tmp_path, rulings, labels, difference=difference)
    held = only(rescored(project))
    row = rescore_object(rescored(project))["variables"][0]
    number = {item: [(c, Fraction(v)) for c, v in given] for item, given in labels.items()}
    common = {i: given for i, given in number.items() if decided.get(i, "") is not None}
    after = {
        i: [(c, Fraction(decided[i])) for c, _ in given] if i in decided else given
        for i, given in common.items()
    }
    for table, key, name in (
        (number, "before", "alpha"),
        (common, "common", "agreement"),
        (after, "after", "agreement"),
    ):
        want = by_definition.alpha_by_definition(table, delta)
        found = row[key]
        assert found[name] == pytest.approx(float(want.alpha), rel=1e-12)
        assert found["observed_disagreement"] == pytest.approx(float(want.observed), rel=1e-12)
        assert found["expected_disagreement"] == pytest.approx(float(want.expected), rel=1e-12)
    moved = sum(
        1
        for item, label in decided.items()
        for _, given in labels[item]
        if label is None or Fraction(given) != Fraction(label)
    )
    assert sum(move.n_labels for move in held.moves) == moved


STATES = [
    Ruling("i1", "b"),
    Ruling("i2", "b", kind="audit"),  # against unanimous coders, unconfirmed
    Ruling("i3", None),
    Ruling("i5", "a"),
    Ruling("i5", "b", by="a-BEN"),
    Ruling("i6", "a"),
]


def test_items_are_counted_by_what_their_decisions_amount_to(tmp_path):
    """Settled, cannot be coded, split, unconfirmed, open and still waiting, each said."""
    project = made(
        tmp_path, STATES, sent={**{each.item: each.kind for each in STATES}, "i4": "audit"}
    )
    rule(project, LABELS, [Ruling("i6", None, withdrawn=True)], minute=1)
    held = only(rescored(project))
    assert held.states == {
        "settled": 1,
        "cannot be coded": 1,
        "split": 1,
        "unconfirmed": 1,
        "open": 1,
    }
    assert sentences.states_sentence(held) == (
        "1 item settled, 1 cannot be coded, 1 split, 1 unconfirmed, 1 open (withdrawn); "
        "1 sent and not ruled on."
    )
    said = sentences.unchanged_sentence(held)
    assert "1 split keeps the coders' labels" in said
    assert "1 ruling against unanimous coders waits for a second adjudicator" in said
    # Neither the split, nor the unconfirmed, nor the open item is changed.
    assert [(move.old, move.new, move.n_labels, move.n_items) for move in held.moves] == [
        ("a", None, 1, 1),
        ("a", "b", 1, 1),
        ("b", None, 1, 1),
        ("c", None, 1, 1),
    ]


def test_what_remains_worst_leaves_out_what_was_decided(tmp_path):
    """Disputed items without a decision, by their part of what is left; a split says so."""
    held = only(rescored(made(tmp_path, STATES)))
    assert [(each.item, each.state) for each in held.remaining] == [("i5", "split")]
    assert held.remaining[0].share == pytest.approx(1.0)
    pair = held.remaining_pairs[0]
    assert (pair.first, pair.second, pair.n_items) == ("a", "b", 1)


@pytest.mark.parametrize(
    ("n", "of", "allows"),
    [(14, 40, True), (8, 40, True), (7, 40, False), (5, 10, True), (4, 10, False), (9, 9, False)],
)
def test_a_reason_allows_a_conclusion_from_stated_counts_on(n, of, allows):
    """10 items with a reason, 5 of them with this one, and a fifth of them."""
    reason = ReasonCount(reason="instructions unclear", n_items=n, n_with_reason=of)
    (said,) = sentences.reason_sentences((reason,))
    concluded = f'"instructions unclear" in {n} of {of}: mend the instructions before coding more.'
    assert (said == concluded) is allows
    if not allows:
        assert said == f"{of} items with a reason: too few of any one to conclude from."


def test_nothing_is_concluded_from_reasons_of_ones_own():
    """A reason that relook does not know is counted and left alone; none given is said."""
    own = ReasonCount(reason="bad scan", n_items=20, n_with_reason=20)
    assert sentences.reason_sentences((own,)) == (
        "20 items with a reason: too few of any one to conclude from.",
    )
    assert sentences.reason_sentences(()) == (
        "No reason was given, so nothing is said of why coders differed.",
    )


def test_reasons_count_items_and_leave_audits_out(tmp_path):
    """Two adjudicators with one reason count once; an audit's reason explains no dispute."""
    project = made(
        tmp_path,
        [
            Ruling("i1", "b", reason="coder slip"),
            Ruling("i1", "b", by="a-BEN", reason="coder slip"),
            Ruling("i3", "a", reason="item ambiguous"),
            Ruling("i4", "c", reason="coder slip", kind="audit"),
        ],
    )
    assert only(rescored(project)).reasons == (
        ReasonCount(reason="coder slip", n_items=1, n_with_reason=2),
        ReasonCount(reason="item ambiguous", n_items=1, n_with_reason=2),
    )


def test_coders_stand_apart_on_audit_and_on_disputed_items(tmp_path):
    """Only audit items, drawn at random, come with an interval."""
    project = made(tmp_path, [Ruling("i1", "b"), Ruling("i4", "c", kind="audit")])
    found = {(each.coder, each.items): each for each in only(rescored(project)).coders}
    assert (found["c1", "disputed"].n_upheld, found["c1", "disputed"].n_labels) == (0, 1)
    assert (found["c2", "disputed"].n_upheld, found["c2", "disputed"].n_labels) == (1, 1)
    assert found["c1", "disputed"].low is None
    audit = found["c1", "audit"]
    assert (audit.n_upheld, audit.n_labels) == (1, 1)
    # Wilson (1927) for 1 of 1 at 95 %: 1/(1 + 1.96²) to 1.
    assert audit.low == pytest.approx(0.2065, abs=5e-5)
    assert "do not judge a person" in sentences.DISPUTED_ONLY


def numbered(n, *, unanimous=True):
    return {
        f"i{at:03d}": [
            ("c1", "a" if at % 2 else "b"),
            ("c2", ("a" if at % 2 else "b") if unanimous else "c"),
        ]
        for at in range(n)
    }


def test_the_audit_sentence_carries_its_counts_share_and_interval(tmp_path):
    """Two strata of a made case, by hand: Σ W_h p_h = 0.8 × 1/4 + 0.2 × 0/2 = 20 %."""
    labels = {
        **numbered(80),
        **{f"x{at}": [("c1", "a"), ("c2", "a"), ("c3", "b")] for at in range(20)},
    }
    audit = {"i000": "b", "i001": "a", "i002": "b", "i003": "b", "x0": "a", "x1": "a"}
    project = make_project(tmp_path / "p", labels)
    send_round(
        project,
        labels,
        dict.fromkeys(audit, "audit"),
        strata={"unanimous": (80, 4), "not queued": (20, 2), "single": (0, 0)},
        stratum_of={"x0": "not queued", "x1": "not queued"},
    )
    rule(project, labels, [Ruling(item, label, kind="audit") for item, label in audit.items()])
    held = only(rescored(project))
    (found,) = held.audits
    first, second = found.result.strata
    assert (first.n_items, first.n_ruled, first.n_otherwise) == (80, 4, 1)
    assert (second.n_items, second.n_ruled, second.n_otherwise) == (20, 2, 0)
    # 1 of 4 drawn from 80: one such item at least, and 63 at most, by the tails of scipy.
    tails = [hypergeom.sf(0, 80, 1, 4), hypergeom.cdf(1, 80, 63, 4), hypergeom.cdf(1, 80, 64, 4)]
    assert min(tails[:2]) > 0.025 > tails[2]
    assert (first.low, first.high) == (1 / 80, 63 / 80)
    assert found.result.share_ruled_otherwise == pytest.approx(0.8 / 4)
    low, high = found.result.low, found.result.high
    assert sentences.audit_sentence(found) == (
        "Audit of round 1: 1 of 6 ruled items (6 drawn) ruled otherwise than they would be "
        "released. Weighed by the sizes of the strata that is 20.0% of the 100 items that would be "
        f"released with a label but no decision (95% interval {low:.1%} to {high:.1%})."
    )
    cautions = sentences.audit_cautions(found, held.n_sent_since_audit)
    assert cautions[0].startswith("1 of them is a split or waits for a second adjudicator")
    assert "an audit would show 3.9%" in cautions[-1]


def test_a_stratum_without_a_ruling_gives_no_share(tmp_path):
    """What was not looked at is not guessed."""
    labels = numbered(10)
    project = make_project(tmp_path / "p", labels)
    send_round(
        project,
        labels,
        {"i000": "audit"},
        strata={"unanimous": (9, 1), "single": (1, 0)},
    )
    rule(project, labels, [Ruling("i000", "b", kind="audit")])
    (found,) = only(rescored(project)).audits
    assert sentences.audit_sentence(found).endswith(
        "No share is given for the release: no audit item was ruled on among the items that are "
        "single."
    )


def test_simulated_audits_cover_as_stated(tmp_path):
    """Known truth, strata, and adjudicators who slip: the 95 % interval holds the share in 94 %.

    600 simulated audits of 60 items from a release of 2,000, seed 11; the share that rulings would
    find is Σ W_h (t_h (1 − s) + (1 − t_h) s) with slips at rate s.
    """
    rng = np.random.default_rng(11)
    sizes = {"unanimous": 1600, "not queued": 360, "single": 40}
    drawn = {"unanimous": 44, "not queued": 12, "single": 4}
    wrong_rate = {"unanimous": 0.02, "not queued": 0.25, "single": 0.1}
    slip = 0.03
    labels, of = {}, {}
    for name in sizes:
        for at in range(sizes[name]):
            item = f"{name[0]}{at:04d}"
            third = [("c3", "b")] if name == "not queued" else []
            labels[item] = [("c1", "a"), *([("c2", "a")] if name != "single" else []), *third]
            of[item] = name
    loaded = load(make_project(tmp_path / "p", labels))
    items = {name: [item for item in labels if of[item] == name] for name in sizes}
    wrong = {
        item
        for name, own in items.items()
        for item in rng.choice(own, round(wrong_rate[name] * len(own)), replace=False).tolist()
    }
    share = sum(
        sizes[name] / 2000 * (wrong_rate[name] * (1 - slip) + (1 - wrong_rate[name]) * slip)
        for name in sizes
    )
    strata = tuple(
        RoundStratum(variable="topic", stratum=name, n_items=sizes[name], n_drawn=drawn[name])
        for name in sizes
    )
    held = 0
    runs = 600
    for _ in range(runs):
        chosen = [
            item for name in sizes for item in rng.choice(items[name], drawn[name], replace=False)
        ]
        slipped = rng.random(len(chosen)) < slip
        settled = {}
        for item, slips in zip(map(str, chosen), slipped, strict=True):
            label = "b" if (item in wrong) != bool(slips) else "a"
            settled[item, "topic"] = Settlement(
                item=item, variable="topic", state="settled", label=label, standing=()
            )
        sent = Round(
            number=1, made="", relook="", project="", seed=1, settings={}, label_files={},
            variables=(), strata=strata, worksheets=(),
            rows=tuple(
                RoundRow(key="", item=item, variable="topic", worksheet="", adjudicator="",
                         kind="audit", stratum=of[item])
                for item, _ in settled
            ),
        )  # fmt: skip
        (found,) = audits_of(loaded, "topic", [sent], settled)
        held += found.result.low <= share <= found.result.high
    assert held / runs >= 0.94


def test_overlap_is_counts_under_30_items_and_an_alpha_above(tmp_path):
    """29 shared items give counts alone; 30 give the adjudicators' own alpha, as defined."""
    labels = numbered(40, unanimous=False)
    items = list(labels)
    for n, folder in ((29, "few"), (30, "enough")):
        rulings = [
            Ruling(item, "a" if (at + (at % 10 == 0) * (person == "a-BEN")) % 2 else "b", by=person)
            for at, item in enumerate(items[:n])
            for person in ("a-ADA", "a-BEN")
        ]
        held = only(rescored(made(tmp_path / folder, rulings, labels))).overlap
        differ = sum(1 for at in range(n) if at % 10 == 0)
        said = sentences.overlap_sentence(held)
        assert said.startswith(f"2 adjudicators share {n} items and agree on {n - differ}.")
        if n < 30:
            assert held.alpha is None
            assert said.endswith("Too few for an alpha of their own (fewer than 30).")
            continue
        table = {}
        for ruling in rulings:
            table.setdefault(ruling.item, []).append((ruling.by, ruling.label))
        want = by_definition.alpha_by_definition(table, by_definition.nominal).alpha
        assert held.alpha == pytest.approx(float(want), rel=1e-12)
        assert f"Their own alpha is {held.alpha:.3f} over 30 of these items" in said


def test_a_caution_is_given_where_adjudicators_hardly_agree(tmp_path):
    """2 of 5 shared items: said on top; 3 of 5, and 1 of 4, are not."""
    for shared, agree, cautioned in ((5, 2, True), (5, 3, False), (4, 1, False)):
        overlap = Overlap(
            n_items=shared, n_agree=agree, n_adjudicators=2, alpha=None,
            n_labelled_items=shared, undefined_because=None,
        )  # fmt: skip
        said = sentences.overlap_caution(overlap)
        assert (said is not None) is cautioned
        if said is not None:
            assert said.startswith("Caution: adjudicators agree on 2 of the 5 items")


def test_second_opinions_do_not_count_as_overlap(tmp_path):
    """Whoever is asked because others differed tells nothing of how adjudicators agree."""
    project = made(tmp_path, [Ruling("i1", "b"), Ruling("i1", "b", by="a-BEN", kind="split")])
    assert only(rescored(project)).overlap.n_items == 0


def test_changed_label_files_stop_it_and_name_the_items(tmp_path):
    """Alpha of labels that may have been changed because of the worksheets is none of independent
    labels: exit 2, and with --relabelled the word is withheld.
    """
    project = made(tmp_path, STATES)
    write_labels(tmp_path / "p/labels.csv", {**LABELS, "i1": [("c1", "b"), *LABELS["i1"][1:]]})
    with pytest.raises(RelookError, match=r'1 of the items that were sent .*"i1"') as caught:
        rescored(project)
    assert caught.value.exit_code == ExitCode.COULD_NOT
    assert "--relabelled" in caught.value.mend
    held = rescored(project, relabelled=True)
    assert not held.independent
    assert held.changed_files == ("labels.csv",)
    assert "independent" not in sentences.name_of_alpha(held)
    assert sentences.meaning_of_alpha(held) == sentences.NOT_INDEPENDENT
    assert [entry.decision.item for entry in held.stale] == ["i1"]
    assert sentences.stale_sentence(held) == (
        "1 standing decision made on labels that have changed since: i1."
    )


def test_decisions_on_items_that_are_gone_are_listed_and_not_put_in(tmp_path):
    """An item that left the label table keeps its place in the record and in no figure."""
    project = made(tmp_path, STATES)
    write_labels(tmp_path / "p/labels.csv", {i: g for i, g in LABELS.items() if i != "i1"})
    held = rescored(project, relabelled=True)
    assert [entry.decision.item for entry in held.gone] == ["i1"]
    assert "no longer in the label table; they are not put in: i1" in sentences.stale_sentence(held)


def test_a_record_without_decisions_falls_short(tmp_path):
    """Nothing was collected: exit 1, and the mend names the commands."""
    with pytest.raises(RelookError, match="no decision yet") as caught:
        rescored(make_project(tmp_path / "p", LABELS))
    assert caught.value.exit_code == ExitCode.FALLS_SHORT


def test_a_decision_that_is_no_longer_declared_is_told(tmp_path):
    """relook.toml lost a label that was decided."""
    project = made(tmp_path, [Ruling("i1", "z")], declared=["a", "b", "c"])
    with pytest.raises(RelookError, match='"z" is not a declared label'):
        rescored(project)


def test_pure_noise_settled_by_copying_one_coder_is_no_improvement(tmp_path):
    """Coins are tossed, a coder is copied: agreement rises by construction, and the words say so."""
    rng = np.random.default_rng(5)
    labels = {
        f"n{at:03d}": [(f"c{coder}", "abc"[rng.integers(3)]) for coder in range(3)]
        for at in range(200)
    }
    disputed = [item for item, given in labels.items() if len({v for _, v in given}) > 1][:100]
    project = made(tmp_path, [Ruling(item, labels[item][0][1]) for item in disputed], labels)
    held = rescored(project)
    scored = only(held)
    after, noise = scored.corrected.after.agreement, scored.any_label
    assert scored.interval.interval.low < 0 < scored.interval.interval.high
    assert after > 0.4
    # Labels drawn at random from the items' own do as well: the figure comes from settling alone.
    assert noise.low - 0.01 <= after <= noise.high + 0.01
    row = rescore_object(held)["variables"][0]
    assert set(row["after"]) & {"alpha", "interval", "low", "high", "reliability"} == set()
    said = sentences.any_label_sentence(noise)
    assert f"{noise.low:.3f}" in said
    assert "says nothing of whether the decisions are right" in said
    assert "not a reliability" in sentences.CORRECTED
    assert "No interval is put on that distance" in sentences.CORRECTED


def test_the_comparison_at_random_follows_its_seed(tmp_path):
    """Same seed, same figures; the seed is told."""
    project = made(tmp_path, STATES)
    one, two = (only(rescored(project, seed=7)).any_label for _ in range(2))
    assert one == two
    assert one.seed == 7


def test_the_latest_audit_with_a_ruling_speaks_and_later_rows_are_told(tmp_path):
    """Each draw has its own strata; items sent after it are counted in a caution."""
    labels = {**numbered(10), "x1": [("c1", "a"), ("c2", "b")]}
    project = make_project(tmp_path / "p", labels)
    send_round(project, labels, {"i000": "audit"}, strata={"unanimous": (10, 1)})
    send_round(project, labels, {"i001": "audit"}, strata={"unanimous": (9, 1)}, number=2)
    send_round(project, labels, {"x1": "disputed"}, number=3)
    rule(project, labels, [Ruling("i000", "b", kind="audit")])
    held = only(rescored(project))
    assert [(each.round, each.n_drawn) for each in held.audits] == [(1, 1), (2, 1)]
    rule(project, labels, [Ruling("i001", "a", kind="audit")], minute=1)
    held = only(rescored(project))
    assert [each.round for each in held.audits] == [2, 1]
    assert held.n_sent_since_audit == 1
    assert sentences.audit_cautions(held.audits[0], held.n_sent_since_audit) == (
        (
            "Later rounds sent 1 more item; the share is of what would have been released when round 2 "
            "was drawn."
        ),
    )


def test_ties_stay_out_of_the_audit_unless_a_rule_gives_them_a_label(tmp_path):
    """Released blank they are on neither side of the share; by a rule they are judged like any.

    By hand, in one stratum of 4 items with a majority and 2 that tie: of the three ruled ones with
    a majority one is ruled otherwise, 1/3 of 4; with the ties at "b" it is 1/3 + 1 of 2 ruled "a",
    that is 2/5 of 6.
    """
    majority = {f"m{at}": [("c1", "a"), ("c2", "b"), ("c3", "a")] for at in range(4)}
    tied = {f"x{at}": [("c1", "a"), ("c2", "b")] for at in range(2)}
    labels = {**numbered(4), **majority, **tied}
    project = make_project(tmp_path / "p", labels)
    audit = {"m0": "a", "m1": "b", "m2": "a", "x0": "a", "x1": "b"}
    send_round(
        project,
        labels,
        dict.fromkeys(audit, "audit"),
        strata={"not queued": (6, 5, 2, 2)},
        stratum_of=dict.fromkeys(audit, "not queued"),
    )
    rule(project, labels, [Ruling(item, label, kind="audit") for item, label in audit.items()])
    loaded = load(project)
    (found,) = only(rescored(project)).audits
    (part,) = found.result.strata
    assert (part.n_items, part.n_ruled, part.n_otherwise) == (4, 3, 1)
    assert (found.n_ties, found.n_left_out) == (2, 2)
    assert found.result.share_ruled_otherwise == pytest.approx(1 / 3)
    assert sentences.audit_cautions(found, 0)[0] == (
        "Not counted: 2 items whose labels tie, 2 of them ruled on in the audit; without a decision "
        "they are released blank."
    )
    (by_rule,) = audits_of(
        loaded,
        "topic",
        read_rounds(project),
        settlements(loaded, read_record(project)),
        {"x0": "b", "x1": "b"},
    )
    (part,) = by_rule.result.strata
    assert (part.n_items, part.n_ruled, part.n_otherwise) == (6, 5, 2)
    assert (by_rule.n_ties, by_rule.n_left_out) == (2, 0)


def test_numbers_within_the_tolerance_are_upheld(tmp_path):
    """A coder within the tolerance of the decision is not overruled, and an audit is not moved."""
    labels = {"i1": [("c1", "1"), ("c2", "5")], "i2": [("c1", "3"), ("c2", "3.5")]}
    project = make_project(tmp_path / "p", labels, difference="interval", extra="tolerance = 0.5\n")
    send_round(project, labels, {"i1": "disputed", "i2": "audit"}, strata={"unanimous": (1, 1)})
    rule(project, labels, [Ruling("i1", "4.5"), Ruling("i2", "3.5", kind="audit")])
    held = only(rescored(project))
    upheld = {(each.coder, each.items): each.n_upheld for each in held.coders}
    assert upheld == {
        ("c1", "audit"): 1,
        ("c1", "disputed"): 0,
        ("c2", "audit"): 1,
        ("c2", "disputed"): 1,
    }
    assert held.audits[0].result.share_ruled_otherwise == 0
