"""`relook why`: one item's arithmetic on the screen and as JSON."""

import json
import re

import pytest

from reference.loop import copy_sample
from reference.made_projects import long_csv, make
from relook.cli.app import run


def said(capsys, *arguments):
    code = run([*map(str, arguments)])
    held = capsys.readouterr()
    return code, held.out, held.err


@pytest.fixture
def loaves(tmp_path):
    return copy_sample("guild_loaves", tmp_path)


def number(text):
    return float(text.replace(",", ""))


def test_a_sceptic_can_redo_the_screen(loaves, capsys):
    """The figures printed lead to the contribution, the share and the cost that are printed."""
    code, out, _ = said(capsys, "why", loaves, "L069", "--variable", "crust")
    assert code == 0
    ranks = dict(re.findall(r"^  (\w+) +\d+ +([\d.]+)$", out.split("midrank = ")[0], re.M))
    total = 0.0
    for first, second, pairs, delta, product in re.findall(
        r"^  (\w+) – (\w+) +(\d+) +([\d.,]+) +([\d.,]+)$", out, re.M
    ):
        assert (float(ranks[first]) - float(ranks[second])) ** 2 == number(delta)
        assert int(pairs) * number(delta) == number(product)
        total += number(product)
    n, m_less_1, contribution = re.search(r"/ \(([\d,]+) × (\d+)\) = ([\d.,]+)", out).groups()
    redone = 2 * total / (number(n) * int(m_less_1))
    assert redone == pytest.approx(number(contribution), rel=1e-5)
    d_o = number(re.search(r"contribution / D_o = [\d.,]+ / ([\d.,]+)", out)[1])
    share = float(re.search(r"= ([\d.]+)%", out)[1])
    assert 100 * redone / d_o == pytest.approx(share, abs=0.006)
    d_e = number(re.search(r"contribution / D_e = [\d.,]+ / ([\d.,]+)", out)[1])
    cost = float(re.search(r"/ D_e = [\d.,]+ / [\d.,]+ = ([\d.]+)", out)[1])
    assert redone / d_e == pytest.approx(cost, rel=1e-4)


def test_all_variables_are_explained(loaves, capsys):
    """The item's shown columns once, then each variable; a unanimous one says so."""
    code, out, _ = said(capsys, "why", loaves, "L069")
    assert code == 0
    assert out.startswith("item L069\n  description: ")
    assert [out.count(f"\n{name}: ") for name in ("crust", "crumb", "aroma")] == [1, 1, 1]
    assert "δ² = (c − k)²" in out
    assert "All its labels are the same, so it contributes nothing." in out
    assert "doubt is undefined: the labels are numbers on a scale" in " ".join(out.split())
    assert "they say nothing of which label is right" in " ".join(out.split())
    assert all(line == line.rstrip() for line in out.split("\n"))


def test_json_holds_the_same(loaves, capsys):
    """One object with a format number, full precision, and candidates with agreement."""
    code, out, _ = said(capsys, "why", loaves, "L069", "--json", "--quiet")
    held = json.loads(out)
    assert (code, held["format"], held["item"]) == (0, 1, "L069")
    crust = held["variables"][0]
    assert 2 * crust["pair_sum"] / (512 * 4) == pytest.approx(crust["contribution"], rel=1e-12)
    assert [row["label"] for row in crust["candidates"]] == [
        "pale", "golden", "chestnut", "dark", "scorched"
    ]  # fmt: skip


def test_a_single_label_takes_no_part(tmp_path, capsys):
    """Nothing to compare, and nothing claimed."""
    table = {1: [("a", "p")], 2: [("a", "p"), ("b", "q")]}
    code, out, _ = said(capsys, "why", make(tmp_path, long_csv(table)).root, "1")
    assert code == 0
    assert "A single label cannot be compared, so the item takes no part." in out


def test_settling_the_only_dispute_can_be_undefined(tmp_path, capsys):
    """To the common label all labels would be the same, and that is said."""
    table = {1: [("a", "p"), ("b", "q")], 2: [("a", "p"), ("b", "p")], 3: [("a", "p"), ("b", "p")]}
    code, out, _ = said(capsys, "why", make(tmp_path, long_csv(table)).root, "1")
    assert code == 0
    assert re.search(r"^  p +1 +undefined$", out, re.M)
    assert "Undefined: then all pairable labels would be the same." in out
    assert "no consensus label: a tie of p, q" in out


def test_many_labels_are_shortened(tmp_path, capsys):
    """Forty codes: those given, then eight of the rest; JSON has every one."""
    table = {u: [("a", f"c{u:02d}"), ("b", f"c{(u + (u == 3)) % 40:02d}")] for u in range(40)}
    root = make(tmp_path, long_csv(table)).root
    _, out, _ = said(capsys, "why", root, "3")
    assert "and 30 labels that nobody gave; --json has them all" in out
    _, text, _ = said(capsys, "why", root, "3", "--json", "-q")
    assert len(json.loads(text)["variables"][0]["candidates"]) == 40


@pytest.mark.parametrize(
    ("arguments", "says"),
    [
        (("L69",), 'mend: did you mean "L069"?'),
        (("L069", "--variable", "crest"), 'mend: did you mean "crust"?'),
    ],
)
def test_a_slip_names_the_nearest(loaves, capsys, arguments, says):
    """Exit 2, nothing on stdout."""
    code, out, err = said(capsys, "why", loaves, *arguments)
    assert (code, out) == (2, "")
    assert says in err


def test_labels_within_the_tolerance_have_no_place(loaves, capsys):
    """L012's crumb marks, 49 to 51 with a tolerance of 2: no dispute, so no place in the queue."""
    code, out, _ = said(capsys, "why", loaves, "L012", "--variable", "crumb")
    assert code == 0
    assert "not disputed: its labels lie within the tolerance" in out
    assert "place " not in out


def test_a_tie_has_no_consensus_to_doubt(tmp_path, capsys):
    """Two labels each of two, four coders: no figure of doubt, and why not."""
    ferry = copy_sample("ferry_remarks", tmp_path)
    code, out, _ = said(capsys, "why", ferry, "r052")
    assert code == 0
    assert "no consensus label: a tie of" in out
    assert "no doubt is given, since the labels tie" in " ".join(out.split())
