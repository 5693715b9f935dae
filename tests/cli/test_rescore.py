"""`relook rescore` as a user runs it: screen, JSON, workbook, and every way to break it."""

import io
import json

import pytest
from openpyxl import load_workbook

from reference.concluded_project import Ruling, make_project, rule, send_round, write_labels
from reference.loop import copy_sample, fill_round
from relook.cli.app import run

LABELS = {
    "i1": [("c1", "a"), ("c2", "b"), ("c3", "b")],
    "i2": [("c1", "a"), ("c2", "a")],
    "i3": [("c1", "b"), ("c2", "c"), ("c3", "a")],
    "i4": [("c1", "c"), ("c2", "c"), ("c3", "c")],
    "i5": [("c1", "a"), ("c2", "b")],
}
RULINGS = [
    Ruling("i1", "b", reason="coder slip"),
    Ruling("i3", None),
    Ruling("i4", "c", kind="audit"),
]


@pytest.fixture(autouse=True)
def _fixed_clock(monkeypatch):
    monkeypatch.setenv("SOURCE_DATE_EPOCH", "1924992000")


@pytest.fixture
def project(tmp_path):
    made = make_project(tmp_path / "p", LABELS)
    strata = {"unanimous": (2, 1), "not queued": (1, 0), "single": (0, 0)}
    send_round(made, LABELS, {each.item: each.kind for each in RULINGS}, strata=strata)
    rule(made, LABELS, RULINGS)
    return made.root


def said(capsys, *arguments, code=0):
    assert run([*map(str, arguments)]) == code
    held = capsys.readouterr()
    return " ".join(held.out.split()), " ".join(held.err.split())


def test_the_screen_sets_alpha_and_the_corrected_data_side_by_side(project, capsys):
    """Each figure with its meaning; the corrected one is never called alpha or a reliability."""
    out, err = said(capsys, "rescore", project)
    assert "labels.csv: utf-8" in err
    for part in (
        "topic: before and after 3 decided items",
        "alpha, independent labels",
        "the same, on the items in both",
        "agreement in the corrected data",
        "Alpha is of the labels as they were before the first round, and a reliability only if",
        "No interval is put on that distance.",
        "2 items settled, 1 cannot be coded, 0 split, 0 unconfirmed, 0 open (withdrawn)",
        "a → cannot be coded",
        "random audit of what nobody ruled on",
        "do not judge a person",
        "No item was ruled on by two adjudicators independently of each other.",
        "1 disputed item left.",
        f"next: relook release {project}",
    ):
        assert part in out, part
    for word in ("improve", "better", "gained", "rose", "up from", "increase"):
        assert word not in out.casefold()


def test_json_has_the_documented_keys(project, capsys):
    """Scripts rely on these."""
    out, _ = said(capsys, "rescore", project, "--json", "-q")
    held = json.loads(out)
    assert held["format"] == 1
    (variable,) = held["variables"]
    assert {"variable", "before", "after", "settled", "cannot_be_coded"} <= set(variable)
    assert {"alpha", "observed_disagreement", "expected_disagreement"} <= set(variable["before"])
    assert {"agreement", "observed_disagreement", "expected_disagreement"} <= set(variable["after"])
    assert "alpha" not in variable["after"]
    assert {"coders", "moves", "reasons", "audit"} <= set(held)
    assert {"strata", "share_ruled_otherwise", "low", "high"} <= set(held["audit"])
    assert held["moves"][0] == {
        "variable": "topic",
        "from": "a",
        "to": None,
        "n_labels": 1,
        "n_items": 1,
    }
    assert held["independent"] is True


def test_the_workbook_holds_the_same_with_charts(project, tmp_path, capsys):
    """A sheet per table; bars drawn from its own cells; not overwritten unless told."""
    file = tmp_path / "report.xlsx"
    said(capsys, "rescore", project, "--xlsx", file)
    book = load_workbook(io.BytesIO(file.read_bytes()))
    assert book.sheetnames == ["Summary", "Labels", "Reasons", "Audit", "Coders", "Remaining"]
    assert {name: len(book[name]._charts) for name in book.sheetnames[1:]} == dict.fromkeys(
        book.sheetnames[1:], 1
    )
    texts = [str(cell.value) for row in book["Summary"].iter_rows() for cell in row if cell.value]
    assert "agreement in the corrected data" in texts
    assert any("not a reliability" in text for text in texts)
    _out, err = said(capsys, "rescore", project, "--xlsx", file, code=2)
    assert "error: the file exists already" in err
    before = file.read_bytes()
    said(capsys, "rescore", project, "--xlsx", file, "--force")
    assert file.read_bytes() == before


def test_changed_label_files_stop_it_unless_told(project, capsys):
    """Exit 2 with the items; --relabelled goes on and withholds the word."""
    write_labels(project / "labels.csv", {**LABELS, "i1": [("c1", "b"), ("c2", "b")]})
    out, err = said(capsys, "rescore", project, code=2)
    assert out == ""
    assert '1 of the items that were sent have other labels now: "i1"' in err
    assert "mend: put the files of the first round back" in err
    out, _ = said(capsys, "rescore", project, "--relabelled")
    assert "independent labels" not in out
    assert "alpha when the first round was sent 0.500" in out
    assert "This figure is not a reliability." in out
    assert "1 standing decision made on labels that have changed since: i1." in out


def test_corrected_tables_are_compared_and_kept(project, tmp_path, capsys):
    """--against shows who moved which way, and keeps a version; --dry-run keeps none."""
    table = tmp_path / "new.csv"
    write_labels(table, {**LABELS, "i5": [("c1", "b"), ("c2", "b")]})
    out, _ = said(capsys, "rescore", project, "--against", table, "--dry-run")
    assert "Nothing was recorded (--dry-run)." in out
    assert not (project / "label_versions").exists()
    out, _ = said(capsys, "rescore", project, "--against", table)
    for part in (
        "topic: 1 label changed by their coders",
        "agreement after coders corrected their labels",
        "It is not a reliability",
        (
            "Of 1 change, 1 went toward the other coders' labels as first given, 0 away from them, "
            "0 neither way; 0 had no other label to compare. 0 labels added, 0 removed."
        ),
        "i5 c1 a → b toward",
        "Label version 1: label_versions/01/new.csv",
        f"next: relook release {project} --version 1",
    ):
        assert part in out, part
    out, _ = said(capsys, "rescore", project, "--against", table, "--json", "-q")
    assert json.loads(out)["version"] == 1


def test_a_table_that_lacks_many_labels_is_questioned(project, tmp_path, capsys):
    """A table of the corrected rows alone is not the whole table."""
    write_labels(tmp_path / "new.csv", {"i5": [("c1", "b"), ("c2", "b")]})
    out, _ = said(capsys, "rescore", project, "--against", tmp_path / "new.csv", "--dry-run")
    assert "The table lacks 11 of 13 labels." in out


@pytest.mark.parametrize(
    ("arguments", "code", "message"),
    [
        (["--variable", "topci"], 2, 'no variable "topci" mend: did you mean "topic"?'),
        (["--against", "none.csv"], 2, "there is no such file"),
        (["--against", "a.csv", "--xlsx", "b.xlsx"], 2, "leave one of them out"),
        (["--seed", "-1"], 2, "mend: see `relook rescore --help`"),
    ],
)
def test_what_is_wrong_is_told_with_a_mend(project, capsys, arguments, code, message):
    """No traceback, no output on stdout."""
    out, err = said(capsys, "rescore", project, *arguments, code=code)
    assert out == ""
    assert message in err


def test_no_decision_falls_short(tmp_path, capsys):
    """A fresh sample has nothing to compare: exit 1 and what to do."""
    _out, err = said(capsys, "rescore", copy_sample("ferry_remarks", tmp_path), code=1)
    assert "error: the record holds no decision yet" in err
    assert "relook collect" in err


def test_several_variables_of_the_sample_are_all_compared(tmp_path, capsys):
    """From worksheets to the screen, three variables with three difference functions."""
    project = copy_sample("guild_loaves", tmp_path)
    said(capsys, "queue", project, "--top", "8", "-q")
    decisions = {"crust": "golden", "crumb": "50", "aroma": "cannot be coded"}
    assert fill_round(project, lambda item, variable: decisions[variable])
    said(capsys, "collect", project, "-q")
    out, _ = said(capsys, "rescore", project, "--json", "-q")
    held = json.loads(out)
    assert [each["variable"] for each in held["variables"]] == ["crust", "crumb", "aroma"]
    assert {row["variable"] for row in held["moves"]} == {"crust", "crumb", "aroma"}
    assert all(row["to"] is None for row in held["moves"] if row["variable"] == "aroma")
    names = {(row["variable"], row["stratum"]) for row in held["audit"]["strata"]}
    assert {name for name, _ in names} == {"crust", "crumb", "aroma"}
