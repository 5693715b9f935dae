"""Worksheets returned twice, late, early and in two copies."""

from __future__ import annotations

from datetime import timedelta
from pathlib import Path

import pytest

from reference.small_project import NOW, fill, give_back, make_project, make_worksheet
from relook.core.decisions import fold
from relook.project.archive.record import read_record
from relook.project.returning.collecting import collect
from relook.project.setup.folder import Project


def settled(project: Project) -> dict[str, str]:
    folded = fold(read_record(project).decisions)
    return {item: held.label or held.state for (item, _), held in folded.items()}


@pytest.fixture
def sent(tmp_path: Path) -> tuple[Project, bytes]:
    project, files = make_project(tmp_path)
    return project, files["Ada"]


def test_again_changes_nothing(sent: tuple[Project, bytes]) -> None:
    """The same file again, or saved anew without a change, leaves the record as it is."""
    project, data = sent
    give_back(project, "a.xlsx", fill(data, {0: "delay"}, modified=1))
    collect(project, None, now=NOW)
    before = sorted(path.name for path in project.decisions_folder.iterdir())
    assert collect(project, None, now=NOW + timedelta(days=1)).unchanged == 1
    give_back(project, "a.xlsx", fill(data, {0: "delay"}, modified=9))
    assert collect(project, None, now=NOW + timedelta(days=2)).unchanged == 1
    assert sorted(path.name for path in project.decisions_folder.iterdir()) == before


def test_later_version_supersedes_and_keeps(sent: tuple[Project, bytes]) -> None:
    """A changed decision takes the place of the earlier one, which stays in the record."""
    project, data = sent
    give_back(project, "a.xlsx", fill(data, {0: "delay", 1: "staff"}))
    collect(project, None, now=NOW)
    give_back(project, "a.xlsx", fill(data, {0: "price", 1: "staff"}))
    result = collect(project, None, now=NOW + timedelta(hours=1))
    assert (result.accepted, result.superseded, result.unchanged) == (1, 1, 1)
    assert settled(project) == {"remark 01": "price", "remark 02": "staff"}
    entries = read_record(project).entries
    first = next(e for e in entries if e.decision.label == "delay")
    last = next(e for e in entries if e.decision.label == "price")
    assert last.supersedes == first.decision.id


@pytest.mark.parametrize("resaved", [False, True])
def test_older_version_comes_not_back(sent: tuple[Project, bytes], resaved: bool) -> None:
    """An older version after a newer one changes nothing, unless that is asked for."""
    project, data = sent
    old, new = fill(data, {0: "delay"}, modified=1), fill(data, {0: "price"}, modified=2)
    path = give_back(project, "a.xlsx", old)
    collect(project, [path], now=NOW)
    path.write_bytes(new)
    collect(project, [path], now=NOW)
    path.write_bytes(fill(data, {0: "delay"}, modified=3) if resaved else old)
    result = collect(project, [path], now=NOW)
    assert (result.accepted, [row.item for row in result.older]) == (0, ["remark 01"])
    assert "--reinstate" in result.older[0].mend
    assert settled(project) == {"remark 01": "price"}
    assert collect(project, [path], reinstate=True, now=NOW).accepted == 1
    assert settled(project) == {"remark 01": "delay"}


def test_older_version_that_was_never_collected(sent: tuple[Project, bytes]) -> None:
    """A version saved before the collected one is told by the time that the file itself names."""
    project, data = sent
    path = give_back(project, "new.xlsx", fill(data, {0: "price"}, modified=20))
    collect(project, [path], now=NOW)
    path = give_back(project, "old.xlsx", fill(data, {0: "delay"}, modified=10))
    result = collect(project, [path], now=NOW)
    assert (result.accepted, len(result.older)) == (0, 1)
    assert settled(project) == {"remark 01": "price"}


def test_both_versions_in_the_folder(sent: tuple[Project, bytes]) -> None:
    """A version collected before lies beside the next one without being a conflict."""
    project, data = sent
    give_back(project, "v1.xlsx", fill(data, {0: "delay", 1: "staff"}))
    collect(project, None, now=NOW)
    give_back(project, "v2.xlsx", fill(data, {0: "price", 1: "staff"}))
    result = collect(project, None, now=NOW)
    assert (result.accepted, result.conflicts, result.older) == (1, (), ())
    again = collect(project, None, now=NOW)
    assert (again.accepted, again.conflicts, again.older, again.unchanged) == (0, (), (), 2)
    assert settled(project) == {"remark 01": "price", "remark 02": "staff"}


def test_two_differing_copies_are_a_conflict(sent: tuple[Project, bytes]) -> None:
    """Neither copy is taken where they differ; where they agree, or one is blank, it is."""
    project, data = sent
    first = give_back(project, "a.xlsx", fill(data, {0: "delay", 1: "staff", 2: "price"}))
    give_back(project, "b.xlsx", fill(data, {0: "price", 1: "staff", 3: "delay"}))
    result = collect(project, None, now=NOW)
    assert result.accepted == 3
    (conflict,) = result.conflicts
    assert conflict.item == "remark 01"
    assert [version.found for version in sorted(conflict.versions, key=lambda v: v.worksheet)] == [
        "delay",
        "price",
    ]
    assert settled(project) == {"remark 02": "staff", "remark 03": "price", "remark 04": "delay"}
    assert len(collect(project, None, now=NOW).conflicts) == 1  # still unsolved
    assert collect(project, [first], now=NOW).accepted == 1
    assert settled(project)["remark 01"] == "delay"
    later = collect(project, None, now=NOW)
    assert (later.accepted, later.conflicts) == (0, ())
    assert settled(project)["remark 01"] == "delay"


def test_blank_never_withdraws(sent: tuple[Project, bytes]) -> None:
    """A later version with the decision deleted takes nothing back; `withdraw` does."""
    project, data = sent
    path = give_back(project, "a.xlsx", fill(data, {0: "delay"}))
    collect(project, [path], now=NOW)
    path.write_bytes(fill(data, {1: "staff"}))
    collect(project, [path], now=NOW)
    assert settled(project) == {"remark 01": "delay", "remark 02": "staff"}
    path.write_bytes(fill(data, {0: "withdraw", 1: "staff"}))
    assert collect(project, [path], now=NOW).superseded == 1
    assert settled(project) == {"remark 01": "open", "remark 02": "staff"}


def test_nothing_to_withdraw(sent: tuple[Project, bytes]) -> None:
    """Withdrawing what was never decided changes nothing."""
    project, data = sent
    give_back(project, "a.xlsx", fill(data, {0: "withdraw"}))
    assert collect(project, None, now=NOW).unchanged == 1
    assert read_record(project).files == ()


def test_mended_labels_are_taken_from_a_file_seen_before(sent: tuple[Project, bytes]) -> None:
    """A label declared after the first collect is taken from the same file."""
    project, data = sent
    give_back(project, "a.xlsx", fill(data, {0: "weather"}))
    assert len(collect(project, None, now=NOW).rejected) == 1
    toml = project.root / "relook.toml"
    toml.write_text(toml.read_text().replace('"price",', '"price", "weather",'))
    assert collect(Project.open(project.root), None, now=NOW).accepted == 1
    assert settled(project) == {"remark 01": "weather"}


def test_a_stale_sheet_of_an_earlier_round(tmp_path: Path) -> None:
    """What a later round decided stands, even if an earlier round's sheet comes after it."""
    sheets = [make_worksheet(number=1), make_worksheet(number=2)]
    project, files = make_project(tmp_path, sheets)
    give_back(project, "r2.xlsx", fill(files["Ada 2"], {0: "price"}), number=2)
    collect(project, None, now=NOW)
    give_back(project, "r1.xlsx", fill(files["Ada"], {0: "delay"}))
    collect(project, None, now=NOW)
    assert settled(project) == {"remark 01": "price"}
