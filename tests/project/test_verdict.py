"""The sentence on where the weight lies: each branch on a made case, and silence."""

import numpy as np
import pytest

from reference.made_projects import long_csv, make, scored
from relook.project.figures import verdict as rules
from relook.project.figures.verdict import alpha_in_words, verdict


def one(tmp_path, table):
    return scored(make(tmp_path, long_csv(table))).variables[0]


def agreed(n, labels="pqrs", coders="abc"):
    """Items on which all agree, the labels in turn."""
    return {f"i{u:03d}": [(c, labels[u % len(labels)]) for c in coders] for u in range(n)}


def with_pair(n_clashes, coders="abc"):
    """120 items, on some of which one coder in turn says q where the others say p."""
    table = agreed(120, coders=coders)
    for u in range(n_clashes):
        odd = coders[u % len(coders)]
        table[f"x{u:03d}"] = [(c, "q" if c == odd else "p") for c in coders]
    others = ["pr", "ps", "qr", "qs", "rs"]
    for u in range(10):
        odd, (most, one_) = coders[u % len(coders)], others[u % 5]
        table[f"y{u:03d}"] = [(c, one_ if c == odd else most) for c in coders]
    return table


def test_a_pair_of_labels_is_named(tmp_path):
    """One pair carries 15 of 25 disputed items: the instructions are to be looked at."""
    said = verdict(one(tmp_path, with_pair(15)))
    assert said == (
        'Weight lies in one pair of labels, "p" against "q" (60% of the disagreement, in 15 items: '
        "see what the instructions say of the two)."
    )


def test_fewer_than_twenty_disputed_items_say_nothing(tmp_path):
    """The same pattern with 19 disputed items is too thin."""
    assert verdict(one(tmp_path, with_pair(9))) is None


def test_two_coders_are_never_judged(tmp_path):
    """The heaviest pair of labels does not bring a sentence out of two coders."""
    scored_ = one(tmp_path, with_pair(40, coders="ab"))
    assert scored_.agreement.n_disputed_items == 50
    assert scored_.label_pairs.share[0] > 0.5
    assert verdict(scored_) is None


def test_a_coder_is_named(tmp_path):
    """One coder of four goes astray, in all directions: no pair of labels stands out."""
    rng = np.random.default_rng(4)
    table = agreed(120, coders="abcd")
    for u, labels in enumerate(table.values()):
        if u < 40:
            # Each of the 12 ordered pairs of labels about as often as any other.
            labels[3] = ("d", "pqrs"["pqrs".index(labels[3][1]) - 1 - int(rng.integers(3))])
    said = verdict(one(tmp_path, table))
    assert said.startswith("Weight lies in coder d (50% of the disagreement with 25% of the ")
    assert "alpha without them 1.000 over 120 items" in said
    assert said.endswith(": ask how they read the instructions before judging).")


def test_few_items_are_named(tmp_path):
    """Of 40 disputed items, 3 of numbers far apart carry half of the disagreement."""
    table = {f"i{u:03d}": [(c, 10 * (u % 10)) for c in "abc"] for u in range(100)}
    for u in range(37):
        labels = table[f"i{u:03d}"]
        labels[u % 3] = ("abc"[u % 3], labels[0][1] + 2)
    for u in range(37, 40):
        labels = table[f"i{u:03d}"]
        labels[u % 3] = ("abc"[u % 3], labels[0][1] + 40)
    variable = '[variables.label]\ncolumn = "label"\ndifference = "interval"\n'
    held = scored(make(tmp_path, long_csv(table), variables=variable)).variables[0]
    said = verdict(held)
    assert "few items (2 of 40 disputed ones carry half of the disagreement)" in said


def test_evenly_spread_disagreement_says_nothing(tmp_path):
    """Every coder and every pair of labels alike: the rule cannot tell, and is silent."""
    table = agreed(120)
    pairs = [(a, b) for a in "pqrs" for b in "pqrs" if a < b]
    for u in range(36):
        most, odd = pairs[u % 6]
        table[f"x{u:03d}"] = [(c, odd if i == u // 6 % 3 else most) for i, c in enumerate("abc")]
    held = one(tmp_path, table)
    assert held.agreement.n_disputed_items == 36
    assert verdict(held) is None


def test_a_pair_as_heavy_as_chance_would_have_it_is_not_named(tmp_path):
    """Two labels so common that they clash most by chance say nothing of the instructions."""
    rng = np.random.default_rng(11)
    said = []
    for seed in range(12):
        labels = rng.choice(list("pqrs"), p=[0.55, 0.35, 0.05, 0.05], size=(200, 4))
        # Half of the items are agreed on, so that alpha lies well above 0.
        labels[:100] = labels[:100, :1]
        table = {
            f"i{u}": list(zip("abcd", map(str, row), strict=True)) for u, row in enumerate(labels)
        }
        held = one(tmp_path / str(seed), table)
        assert held.label_pairs.share[0] > 0.5
        said.append(verdict(held))
    assert said == [None] * 12


def test_counts_without_coders_say_nothing(tmp_path):
    """Without coders the two explanations cannot be told apart."""
    rows = "\n".join(f"i{u},{3 if u % 2 else 1},{1 if u % 2 else 3}" for u in range(60))
    project = make(
        tmp_path,
        f"item,p,q\n{rows}\n",
        label_settings='layout = "counts"\nitem = "item"\n',
        variables='[variables.label]\nlabels = ["p", "q"]\n',
    )
    held = scored(project).variables[0]
    assert held.agreement.n_disputed_items == 60
    assert verdict(held) is None


def test_the_thresholds_are_those_of_the_docstring():
    """What the docstring states is what the rule uses."""
    text = " ".join(verdict.__doc__.split())
    assert f"carries {rules.PAIR_SHARE * 100:.0f} % of D_o or more" in text
    assert f"{rules.PAIR_TIMES_NEXT} times the next pair's share" in text
    assert f"{rules.PAIR_TIMES_CHANCE} times its share of D_e" in text
    assert f"in {rules.LEAST_ITEMS_OF_A_PAIR} items or more" in text
    assert f"coder with {rules.LEAST_LABELS_OF_A_CODER} labels or more" in text
    assert f"more than {rules.CODER_TIMES} times" in text
    assert f"higher by .{rules.CODER_LIFT * 100:02.0f} or more" in text
    assert f"half of D_o lies in {rules.HEAD_OF_ITEMS * 100:.0f} % of the disputed items" in text
    assert f"fewer than {rules.LEAST_DISPUTED_ITEMS} disputed items" in text


def words(tmp_path, table):
    held = one(tmp_path, table)
    return alpha_in_words(held.agreement, held.interval.interval)


def clashing(n_items, n_clashes):
    """Two labels in turn, three coders; one of them differs on some items."""
    table = agreed(n_items, labels="pq")
    for u in range(n_clashes):
        labels = table[f"i{u:03d}"]
        odd = u % 3
        labels[odd] = (labels[odd][0], "q" if labels[odd][1] == "p" else "p")
    return table


@pytest.mark.parametrize(
    ("n_clashes", "begins"),
    [
        (5, "At .800 or above data are customarily relied on; the bar"),
        (
            25,
            "At .800 or above data are customarily relied on, and the interval reaches below .800",
        ),
        (40, "Between .667 and .800 customarily only tentative"),
        (90, "Below .667 data are customarily not relied on; the bar"),
    ],
)
def test_levels_are_named_with_their_condition(tmp_path, n_clashes, begins):
    """The customary levels, tempered by the interval (Krippendorff 2004, pp. 241–243)."""
    said = words(tmp_path, clashing(200, n_clashes))
    assert said.startswith(begins)
    assert "cost of being wrong (Krippendorff 2004, pp. 241–243)" in said


def test_pure_noise_is_not_called_anything(tmp_path):
    """Where the interval holds 0 no level and no cause is named."""
    rng = np.random.default_rng(2)
    table = {f"i{u}": [(c, str(rng.choice(list("pqr")))) for c in "abc"] for u in range(150)}
    held = one(tmp_path, table)
    assert held.interval.interval.low < 0 < held.interval.interval.high
    assert alpha_in_words(held.agreement, held.interval.interval) == (
        "The interval holds 0: this agreement cannot be told from chance."
    )
    assert verdict(held) is None


def test_systematic_disagreement_asks_for_its_cause(tmp_path):
    """Coders who never agree lie below chance, and the interval with them."""
    table = {f"i{u}": [("a", "pq"[u % 2]), ("b", "qp"[u % 2])] for u in range(40)}
    assert words(tmp_path, table).startswith("Coders agree less than chance")


def test_few_items_are_held_against_no_level(tmp_path):
    """Under 30 items even a perfect alpha is not called reliable."""
    said = words(tmp_path, agreed(29))
    assert said.startswith("29 items are fewer than 30: too few to hold this alpha")


def test_undefined_is_not_perfect(tmp_path):
    """One label throughout: the reason, and no praise."""
    said = words(tmp_path, agreed(40, labels="p"))
    assert said == (
        "Alpha is undefined: all pairable labels are the same, so chance disagreement is 0. That "
        "is not perfect agreement."
    )
