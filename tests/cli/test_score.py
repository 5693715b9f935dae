"""`relook score`, as a user meets it: the screen, the exit codes, the files it writes."""

import csv
import io
import json
import os
import subprocess
import sys

import numpy as np
import pytest

from reference.loop import copy_sample
from reference.made_projects import csv_text, long_csv, make
from relook.cli.app import run


def said(capsys, *arguments):
    code = run([*map(str, arguments)])
    held = capsys.readouterr()
    return code, held.out, held.err


def json_of(capsys, *arguments):
    code, out, _ = said(capsys, *arguments, "--json", "--quiet")
    return code, json.loads(out)


@pytest.fixture
def ferry(tmp_path):
    return copy_sample("ferry_remarks", tmp_path)


@pytest.fixture
def loaves(tmp_path):
    return copy_sample("guild_loaves", tmp_path)


def test_the_screen_says_what_each_figure_is(ferry, capsys):
    """Alpha with its interval and seed, both disagreements, counts, and every table of sources."""
    code, out, err = said(capsys, "score", ferry)
    assert code == 0
    assert "labels/labels.csv: utf-8, delimiter comma, 1,020 rows" in err
    _, held = json_of(capsys, "score", ferry)
    row = held["variables"][0]
    assert f"alpha                   {row['alpha']:.3f}  95% interval" in out
    assert "2,000 resamples of items, seed 1" in out
    for part in ("coders", "pairs of labels", "labels", "groups by route", "prospect"):
        assert f"\n  {part}\n" in out, part
    assert "131 disputed" in out
    assert "not a reliability" in out


def test_a_page_is_a_page(ferry, capsys):
    """A variable fits a printed page: 66 lines of 100 characters, without trailing blanks."""
    _, out, _ = said(capsys, "score", ferry)
    lines = out.split("\n")
    assert lines.index("items, by contribution") <= 66
    assert max(map(len, lines)) <= 100
    assert all(line == line.rstrip() for line in lines)


def test_several_variables_begin_with_a_summary(loaves, capsys):
    """Each variable's alpha and its part of the queue first; an item's rows stand together."""
    code, out, _ = said(capsys, "score", loaves)
    assert code == 0
    head = out.split("\n\n")[0]
    assert head.startswith("variables\n")
    for name in ("crust", "crumb", "aroma"):
        assert f"\n  {name} " in head
    assert "filled the queue: heaviest in" in out
    _, held = json_of(capsys, "score", loaves)
    led = {row["variable"]: row["n_led_items"] for row in held["variables"]}
    assert sum(led.values()) == held["n_selected_items"] == 25
    ranked = out.split("items, by contribution")[1].split("\n")[2:]
    assert ranked[0].split()[:2] == ["1", "L040"]
    assert ranked[1].split()[0] in led, "the item's second row repeats neither rank nor id"


def test_json_and_screen_agree_on_where_the_weight_lies(ferry, capsys):
    """The sentence of the screen is that of the JSON."""
    _, held = json_of(capsys, "score", ferry)
    _, out, _ = said(capsys, "score", ferry)
    verdict = held["variables"][0]["verdict"]
    assert verdict.startswith("Weight lies in ")
    assert verdict in " ".join(out.split())


def test_merged_labels_stand_beside_those_as_they_are(ferry, capsys):
    """Both alphas, the best mergers, and the caution; nothing of it without --merge."""
    code, out, _ = said(capsys, "score", ferry, "--merge", "late=delay,cancellation")
    assert code == 0
    assert "late = delay, cancellation" in out
    assert "a coarser code book measures less" in " ".join(out.split())
    _, held = json_of(capsys, "score", ferry, "--merge", "late=delay,cancellation")
    assert held["merged"][0]["alpha"] == pytest.approx(held["best_mergers"][0]["alpha"], rel=1e-12)
    _, plain, _ = said(capsys, "score", ferry)
    assert "coarser" not in plain


@pytest.mark.parametrize(
    ("merge", "says"),
    [
        ("late=delay,cancelation", 'mend: did you mean "cancellation"?'),
        ("crew=delay,cancellation", '"crew" is another label of topic'),
        ("late", "does not say NAME=LABEL,LABEL"),
    ],
)
def test_a_merger_that_cannot_be_is_an_error(ferry, capsys, merge, says):
    """Exit 2 with the nearest label, and nothing on stdout."""
    code, out, err = said(capsys, "score", ferry, "--merge", merge)
    assert (code, out) == (2, "")
    assert says in err


def test_items_are_written_once(ferry, tmp_path, capsys):
    """A row per disputed item; a second time only with --force; never over a source."""
    file = tmp_path / "items.csv"
    code, _, err = said(capsys, "score", ferry, "--items", file)
    assert code == 0
    assert f"wrote {file}" in err
    rows = list(csv.DictReader(io.StringIO(file.read_text(encoding="utf-8"))))
    assert len(rows) == 131
    assert all(0 <= float(row["doubt"]) <= 1 for row in rows)
    before = file.read_bytes()
    code, out, err = said(capsys, "score", ferry, "--items", file)
    assert (code, out) == (2, "")
    assert "mend: choose another name, or add --force" in err
    assert said(capsys, "score", ferry, "--items", file, "--force")[0] == 0
    assert file.read_bytes() == before
    source = ferry / "labels/labels.csv"
    kept = source.read_bytes()
    code, _, err = said(capsys, "score", ferry, "--items", source, "--force")
    assert code == 2
    assert "this file is one that relook reads" in err
    assert source.read_bytes() == kept


def test_items_say_why_doubt_is_empty(tmp_path, capsys):
    """Two coders: the column is empty, and stderr has the reason."""
    table = {u: [("a", "pq"[u % 2]), ("b", "p")] for u in range(8)}
    project = make(tmp_path / "p", long_csv(table)).root
    _, _, err = said(capsys, "score", project, "--items", tmp_path / "items.csv")
    assert "label: no doubt, because fewer than three coders share items" in err
    _, held = json_of(capsys, "score", project)
    assert held["variables"][0]["doubt"] is None
    assert held["variables"][0]["doubt_undefined_because"].startswith("fewer than three coders")


def test_no_order_by_doubt_without_ground(tmp_path, capsys):
    """A clear error, not an arbitrary order."""
    table = {u: [("a", "pq"[u % 2]), ("b", "p")] for u in range(8)}
    code, out, err = said(
        capsys, "score", make(tmp_path, long_csv(table)).root, "--rank-by", "doubt"
    )
    assert (code, out) == (2, "")
    assert "there is no doubt to rank by (fewer than three coders" in err
    assert "mend: rank by contribution or by intensity" in err


@pytest.mark.parametrize(("asked", "code"), [("0.8", 1), ("0.6", 0), ("-0.5", 0), ("bar", 1)])
def test_a_bar_is_met_or_not(ferry, capsys, asked, code):
    """Exit 1 where alpha is below; the bar of relook.toml by its name; figures are shown anyway."""
    with (ferry / "relook.toml").open("a", encoding="utf-8") as file:
        file.write("\n[bar]\nalpha = 0.7\n")
    got, out, err = said(capsys, "score", ferry, "--require", asked)
    assert got == code
    assert out.startswith("topic:")
    assert ("is below" in err) == bool(code)


@pytest.mark.parametrize("asked", ["x", "nan", "inf", "1.5", "-1"])
def test_a_bar_that_is_none_is_an_error(ferry, capsys, asked):
    """No alpha reaches such a bar, or every one does: a slip."""
    code, out, err = said(capsys, "score", ferry, f"--require={asked}")
    assert (code, out) == (2, "")
    assert f'got "{asked}"' in err


def test_no_bar_in_the_settings_is_an_error(ferry, capsys):
    """--require bar needs one to be written down."""
    code, _, err = said(capsys, "score", ferry, "--require", "bar")
    assert code == 2
    assert "mend: write alpha = 0.8 under [bar]" in err


def test_undefined_meets_no_bar(tmp_path, capsys):
    """One label throughout is not agreement enough for any bar."""
    table = {u: [("a", "p"), ("b", "p")] for u in range(40)}
    root = make(tmp_path, long_csv(table)).root
    assert said(capsys, "score", root)[0] == 0
    code, _, err = said(capsys, "score", root, "--require", "-0.9")
    assert code == 1
    assert "alpha is undefined (all pairable labels are the same" in err


def test_a_bar_is_for_independent_labels_only(ferry, capsys):
    """Label files that changed after a round was sent are not judged by alpha."""
    assert said(capsys, "queue", ferry, "--quiet")[0] == 0
    assert said(capsys, "score", ferry, "--require", "0.6")[0] == 0
    labels = ferry / "labels/labels.csv"
    text = labels.read_text(encoding="utf-8")
    labels.write_text(text.replace(",delay", ",crew", 1), encoding="utf-8")
    code, out, err = said(capsys, "score", ferry)
    assert code == 0
    assert "labels may no longer be independent" in " ".join(err.split())
    assert "corrected or alpha" in out
    code, _, err = said(capsys, "score", ferry, "--require", "0.6")
    assert code == 2
    assert "speaks of independently made labels" in err


DEGENERATE = {
    "all the same": ({u: [("a", "p"), ("b", "p")] for u in range(3)}, 0, "undefined", "chance disagreement is 0"),
    "single labels": ({u: [("ab"[u % 2], "pq"[u % 2])] for u in range(6)}, 2, "undefined", "no item has two labels or more"),
    "perfect": ({u: [("a", "pq"[u % 2]), ("b", "pq"[u % 2])] for u in range(6)}, 0, "1.000", "no disagreement seen"),
    "never agreed": ({u: [("a", "pq"[u % 2]), ("b", "qp"[u % 2])] for u in range(4)}, 0, "-0.750", "4 items are fewer than 30"),
    "one clash": ({u: [("a", "p"), ("b", "q" if u == 0 else "p")] for u in range(3)}, 0, "0.000", "resamples, above 5%"),
    "one item": ({1: [("a", "p"), ("b", "q")]}, 0, "0.000", "only one item or cluster"),
}  # fmt: skip


@pytest.mark.parametrize("case", DEGENERATE)
def test_degenerate_labels_have_a_value_and_a_reason(tmp_path, capsys, case):
    """Alpha as documented, its reason in words, the exit code; JSON without nan."""
    table, code, alpha, because = DEGENERATE[case]
    root = make(tmp_path, long_csv(table)).root
    got, out, _ = said(capsys, "score", root)
    assert got == code
    line = next(line for line in out.split("\n") if line.startswith("  alpha"))
    assert line.split()[1] == alpha
    assert because in " ".join(out.split())
    got, text, _ = said(capsys, "score", root, "--json", "--quiet")
    assert got == code
    json.loads(text, parse_constant=lambda name: pytest.fail(f"{name} in JSON"))


def test_one_variable_without_agreement_does_not_fail_the_others(tmp_path, capsys):
    """Of two variables one is single labels: exit 0, with the reason beside it."""
    rows = [(u, c, "pq"[u % 2], "x" if c == "a" else "") for u in range(6) for c in "ab"]
    project = make(
        tmp_path,
        csv_text(("item", "coder", "one", "two"), rows),
        variables='[variables.one]\ncolumn = "one"\n[variables.two]\ncolumn = "two"\n',
    )
    code, out, _ = said(capsys, "score", project.root)
    assert code == 0
    assert "Alpha is undefined: no item has two labels or more." in out


def test_counts_have_no_coders(tmp_path, capsys):
    """A table of counts: alpha, pairs of labels and prospect, and no word of coders."""
    rng = np.random.default_rng(4)
    rows = [(f"i{u}", *rng.multinomial(4, [0.7, 0.2, 0.1])) for u in range(40)]
    project = make(
        tmp_path,
        csv_text(("item", "p", "q", "r"), rows),
        label_settings='layout = "counts"\nitem = "item"\n',
        variables='[variables.label]\nlabels = ["p", "q", "r"]\n',
    )
    code, out, _ = said(capsys, "score", project.root)
    assert code == 0
    assert "(160 labels, coders unknown)" in out
    assert "\n  coders\n" not in out
    _, held = json_of(capsys, "score", project.root)
    assert (held["coders"], held["coder_pairs"], held["label_use"]) == ([], [], [])
    row = held["variables"][0]
    assert row["no_coder_pairs_because"] == "the table holds counts without coders"
    assert row["doubt_undefined_because"] == "the labels are counts without coders"


def test_all_items_of_priority_zero_leave_nothing_to_queue(tmp_path, capsys):
    """Disputed items that are kept out are not called undisputed."""
    table = {u: [("a", "pq"[u % 2]), ("b", "p")] for u in range(8)}
    project = make(
        tmp_path,
        long_csv(table),
        items=csv_text(("item", "due"), [(u, 0) for u in table]),
        item_settings='key = "item"\npriority = "due"\n',
    )
    code, out, _ = said(capsys, "score", project.root)
    assert code == 0
    assert "Every disputed item has the priority 0" in out


def test_the_same_command_gives_the_same_text(loaves, capsys):
    """Seeds are fixed unless given, and those given are said."""
    first, second = (said(capsys, "score", loaves) for _ in range(2))
    assert first == second
    _, held = json_of(capsys, "score", loaves, "--seed", "5")
    assert held["seed"] == held["variables"][0]["interval"]["seed"] == 5


@pytest.mark.parametrize("encoding", ["ascii", "cp1252"])
def test_a_stream_of_few_characters_is_no_error(ferry, encoding):
    """Bars and dashes become escapes there, and JSON stays JSON."""
    environment = {**os.environ, "PYTHONIOENCODING": encoding}
    for arguments in ((), ("--json",)):
        done = subprocess.run(
            [sys.executable, "-m", "relook", "score", str(ferry), "--quiet", *arguments],
            capture_output=True,
            env=environment,
            check=False,
        )
        assert (done.returncode, done.stderr) == (0, b"")
        text = done.stdout.decode(encoding)
        if arguments:
            assert json.loads(text)["variables"][0]["variable"] == "topic"
        else:
            assert "\\u25aa" in text


def test_score_selects_what_queue_would_send(ferry, capsys):
    """Audits and overlap cost hours in both, and the order is the same."""
    with_hours = ("--hours", "1", "--seconds-per-item", "60")
    _, held = json_of(capsys, "score", ferry, *with_hours)
    _, queued = json_of(capsys, "queue", ferry, *with_hours, "--dry-run")
    assert held["bound_by"] == queued["bound_by"] == "hours"
    assert held["n_selected_items"] == queued["n_disputed_items"] < 40
    row, sent = held["variables"][0], queued["variables"][0]
    assert row["share_selected"] == sent["share_of_disagreement"]
    assert row["projected_agreement"] == sent["projected_agreement"]


def test_labels_that_read_alike_are_told_beside_alpha(tmp_path, capsys):
    """Case lowers alpha as if coders differed; that stands under the figure."""
    file = tmp_path / "labels.csv"
    rows = [
        ("1", "a", "Billing"),
        ("1", "b", "billing"),
        ("2", "a", "Refund"),
        ("2", "b", "Refund"),
    ]
    file.write_text(
        "item,coder,label\n" + "".join(",".join(r) + "\n" for r in rows), encoding="utf-8"
    )
    assert run(["score", str(file)]) == 0
    out = " ".join(capsys.readouterr().out.split())
    assert 'labels that read alike count as different: "billing" beside "Billing"' in out
    assert "(upper and lower case); `relook check` lists them" in out


def test_nothing_typed_shows_the_help_and_no_empty_error(capsys):
    """Bare `relook` is a question, not a mistake with an empty name."""
    assert run([]) == 2
    held = capsys.readouterr()
    assert "relook queue my_labels.csv" in held.out
    assert "error" not in held.err
