"""`relook release` as a user runs it: files, screen, check, and every way to break it."""

import csv
import json
import shutil

import pytest

from reference.loop import copy_sample, fill_round
from relook.cli.app import run


@pytest.fixture(autouse=True)
def _fixed_clock(monkeypatch):
    monkeypatch.setenv("SOURCE_DATE_EPOCH", "1924992000")


@pytest.fixture(scope="module")
def concluded(tmp_path_factory):
    """The sample project after one round, all of it settled to one label."""
    project = copy_sample("ferry_remarks", tmp_path_factory.mktemp("concluded"))
    assert run(["queue", str(project), "-q"]) == 0
    assert fill_round(project, lambda item, variable: "delay")
    assert run(["collect", str(project), "-q"]) == 0
    return project


@pytest.fixture
def project(concluded, tmp_path):
    return shutil.copytree(concluded, tmp_path / "ferry")


def said(capsys, *arguments, code=0):
    capsys.readouterr()
    assert run([*map(str, arguments)]) == code
    held = capsys.readouterr()
    return " ".join(held.out.split()), " ".join(held.err.split())


def test_a_release_tells_how_everything_was_settled(project, capsys):
    """Counts on the screen are those of the file, and all files are there."""
    out, _ = said(capsys, "release", project)
    with (project / "release/final_labels.csv").open(encoding="utf-8", newline="") as file:
        rows = list(csv.DictReader(file))
    assert out.startswith(f"300 final labels written to {project}/release")
    for way in ("unanimous", "consensus", "decision", "tie", "single"):
        assert f"{way} {sum(row['settled_by'] == way for row in rows)} " in out
    blank = sum(not row["label"] for row in rows)
    assert f"blank among these {blank} " in out
    ties = sum(row["settled_by"] in ("tie", "split") for row in rows)
    assert f"{ties} ties and splits are blank; --ties most-used or random" in out
    assert "methods statement" in out
    names = sorted(p.name for p in (project / "release").rglob("*") if p.is_file())
    assert names == [
        "final_labels.csv",
        "final_labels.xlsx",
        "labels.csv",
        "methods.txt",
        "release.json",
    ]


def test_a_release_can_be_checked_and_fails_when_touched(project, capsys):
    """Exit 0 while it holds, 1 with the file where it does not."""
    said(capsys, "release", project)
    out, err = said(capsys, "release", project, "--check")
    assert f"{project}/release: holds" in out
    assert "300 final labels worked out anew and the same to the byte" in out
    with (project / "release/final_labels.csv").open("a") as file:
        file.write("\n")
    out, err = said(capsys, "release", project, "--check", code=1)
    assert "does not hold" in out
    assert "a released file was changed after the release, release/final_labels.csv" in err
    out, _ = said(capsys, "release", project, "--check", "--json", "-q", code=1)
    held = json.loads(out)
    assert (held["holds"], held["problems"][0]["file"]) == (False, "release/final_labels.csv")


def test_nothing_is_replaced_unless_told(project, capsys):
    """--force replaces a release, --to names another folder, --dry-run writes none."""
    out, _ = said(capsys, "release", project, "--dry-run", "--json", "-q")
    assert json.loads(out)["written"] is False
    assert not (project / "release").exists()
    said(capsys, "release", project)
    _, err = said(capsys, "release", project, code=2)
    assert "error: there is a release already" in err
    said(capsys, "release", project, "--force", "--ties", "most-used")
    said(capsys, "release", project, "--to", project / "second")
    said(capsys, "release", project, "--to", project / "second", "--check")


def test_a_rule_for_ties_is_said(project, capsys):
    """How many labels a rule chose, and which rule."""
    out, _ = said(capsys, "release", project, "--ties", "most-used", "--dry-run")
    assert "ties and splits took a label by most-used." in out
    assert "Ties and splits took the candidate label used most over all items." in out


@pytest.mark.parametrize(
    ("arguments", "message"),
    [
        (["--ties", "first"], '"first" is no rule for ties mend: use one of "blank", "most-used"'),
        (["--version", "3"], "there is no label version 3"),
        (["--check"], "there is no release in this folder"),
        (["--version", "0"], "mend: see `relook release --help`"),
    ],
)
def test_what_is_wrong_is_told_with_a_mend(project, capsys, arguments, message):
    """Exit 2, nothing written."""
    out, err = said(capsys, "release", project, *arguments, code=2)
    assert out == ""
    assert message in err
    assert not (project / "release").exists()


def test_a_project_without_decisions_can_be_released(tmp_path, capsys):
    """Consensus labels alone; no figure of corrected data is invented."""
    project = copy_sample("ferry_remarks", tmp_path)
    out, _ = said(capsys, "release", project)
    assert "decision" not in out.split("methods statement")[0]
    assert "corrected data" not in out
    assert "Krippendorff's alpha of the labels (nominal differences) is 0.642" in out
    said(capsys, "release", project, "--check")
