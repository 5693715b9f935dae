"""The record: what is written, and what is noticed when it was tampered with."""

from __future__ import annotations

import json
import shutil
from datetime import timedelta
from pathlib import Path

import pytest

from reference.small_project import NOW, SETTINGS, fill, give_back, make_project, make_worksheet
from relook.errors import RelookError
from relook.project.archive.record import inspect_record, read_record, stale_decisions
from relook.project.returning.collecting import collect
from relook.project.returning.rebuilding import rebuild
from relook.project.setup.folder import Project


@pytest.fixture
def project(tmp_path: Path) -> Project:
    """A project with three decisions files, each following the one before."""
    project, sent = make_project(tmp_path / "project")
    for number, label in enumerate(["delay", "staff", "price"]):
        path = give_back(project, f"v{number}.xlsx", fill(sent["Ada"], {0: label, number: label}))
        collect(project, [path], now=NOW + timedelta(hours=number))
    return project


def test_what_a_line_holds(project: Project) -> None:
    """Who, when, round, item, variable, decision, worksheet, cell and what it supersedes."""
    first, second, _ = sorted(project.decisions_folder.iterdir())
    header, *lines = [json.loads(line) for line in second.read_text().splitlines()]
    assert header["stamp"] == "2026-03-01T10:00:00.000000Z"
    assert list(header["follows"]) == [first.name]
    line = next(line for line in lines if line["item"] == "remark 01")
    assert line["label"] == "staff"
    assert line["round"] == 1
    assert line["cell"] == "G2"
    assert line["supersedes"] == f"{first.stem}:1"
    assert line["adjudicator"].startswith("a-")
    assert "Ada" not in second.read_text()


def test_changed_file(project: Project) -> None:
    """A file that was altered by hand is named."""
    victim = sorted(project.decisions_folder.iterdir())[1]
    victim.write_text(victim.read_text().replace('"staff"', '"price"'))
    with pytest.raises(RelookError, match="changed after it was written") as caught:
        read_record(project)
    assert caught.value.where is not None
    assert caught.value.where.file == f"decisions/{victim.name}"
    assert "--rebuild" in (caught.value.mend or "")


def test_missing_file(project: Project) -> None:
    """A file that others follow is missed and named."""
    victim = sorted(project.decisions_folder.iterdir())[1]
    victim.unlink()
    with pytest.raises(RelookError, match="the file is missing, though") as caught:
        read_record(project)
    assert victim.name in str(caught.value)


@pytest.mark.parametrize(
    ("name", "said"),
    [
        ("{stem} (1).jsonl", "second copy of"),
        ("{stem}.sync-conflict-20260301.jsonl", "second copy of"),
    ],
)
def test_conflict_copies(project: Project, name: str, said: str) -> None:
    """Copies that syncing made are named and stop the work."""
    original = sorted(project.decisions_folder.iterdir())[0]
    copy = project.decisions_folder / name.format(stem=original.stem)
    shutil.copy(original, copy)
    with pytest.raises(RelookError, match=said):
        read_record(project)
    copy.write_text("other\n")
    with pytest.raises(RelookError, match="conflict copy"):
        read_record(project)


def test_foreign_file(project: Project, tmp_path: Path) -> None:
    """A file of another project is named, and so is every other fault at once."""
    other, _ = make_project(tmp_path / "other", settings=SETTINGS)
    text = (other.root / "relook.toml").read_text().replace("k7f3ferry", "another")
    (other.root / "relook.toml").write_text(text)
    file = sorted(project.decisions_folder.iterdir())[0]
    (other.decisions_folder).mkdir()
    shutil.copy(file, other.decisions_folder / file.name)
    with pytest.raises(RelookError, match="belongs to another project"):
        read_record(Project.open(other.root))


def test_unrelated_files_are_no_concern(project: Project) -> None:
    """A half-written file, a read-me or a system file is no part of the record."""
    before = read_record(project)
    (project.decisions_folder / ".x.jsonl.abc.part").write_text("{")
    (project.decisions_folder / "README.txt").write_text("ours")
    (project.decisions_folder / ".DS_Store").write_bytes(b"\0")
    assert read_record(project) == before


def test_merged_copies_are_the_union(tmp_path: Path) -> None:
    """Two copies of a project that were collected into apart merge as the union of their files."""
    sheets = [make_worksheet(adjudicator="Ada"), make_worksheet(adjudicator="Ben")]
    here, sent = make_project(tmp_path / "here", sheets)
    shutil.copytree(here.root, tmp_path / "there")
    there = Project.open(tmp_path / "there")
    collect(here, [give_back(here, "a.xlsx", fill(sent["Ada"], {0: "delay"}))], now=NOW)
    collect(there, [give_back(there, "b.xlsx", fill(sent["Ben"], {0: "staff"}))], now=NOW)
    for one, other in ((here, there), (there, here)):
        shutil.copytree(one.decisions_folder, other.decisions_folder, dirs_exist_ok=True)
    assert read_record(here) == read_record(there)
    assert {held.label for held in read_record(here).decisions} == {"delay", "staff"}
    result = collect(here, [give_back(here, "a.xlsx", fill(sent["Ada"], {0: "price"}))], now=NOW)
    assert result.superseded == 1
    assert len(read_record(here).files[-1].follows) == 2


def test_a_clock_set_back_changes_no_order(tmp_path: Path) -> None:
    """A file never counts before one that it follows, whatever the clock says."""
    project, sent = make_project(tmp_path)
    path = give_back(project, "a.xlsx", fill(sent["Ada"], {0: "delay"}))
    collect(project, [path], now=NOW)
    path.write_bytes(fill(sent["Ada"], {0: "price"}))
    collect(project, [path], now=NOW - timedelta(days=400))
    assert [held.label for held in read_record(project).decisions] == ["delay", "price"]


def test_rebuilt_byte_for_byte(project: Project) -> None:
    """From the kept worksheets every lost or damaged file is made anew with the same bytes."""
    files = {path.name: path.read_bytes() for path in project.decisions_folder.iterdir()}
    first, second, third = sorted(project.decisions_folder.iterdir())
    first.unlink()
    second.write_text("damaged\n")
    third.unlink()
    rebuilt = rebuild(project)
    assert len(rebuilt.restored) == 3
    assert rebuilt.set_aside == (f"decisions/{second.name}",)
    after = {path.name: path.read_bytes() for path in project.decisions_folder.glob("*.jsonl")}
    assert after == files
    assert (project.decisions_folder / "set-aside" / second.name).read_text() == "damaged\n"


def test_rebuilt_when_the_folder_is_gone(project: Project) -> None:
    """Without any record left, the kept worksheets give the whole of it."""
    before = read_record(project)
    shutil.rmtree(project.decisions_folder)
    rebuild(project)
    assert read_record(project) == before
    assert rebuild(project).restored == ()


def test_rebuild_needs_the_kept_files(project: Project) -> None:
    """A kept worksheet that was altered is named instead of being used."""
    kept = sorted(project.returned_folder(1).glob("kept/*.xlsx"))[0]
    kept.write_bytes(b"other")
    with pytest.raises(RelookError, match="is missing or was changed"):
        rebuild(project)


def test_decisions_on_other_labels(project: Project) -> None:
    """Decisions whose labels changed since, or whose item is gone, are told apart."""
    record, problems = inspect_record(project)
    assert problems == []
    current = {("remark 01", "topic"): "other", ("remark 02", "topic"): "d" * 12}
    changed, gone = stale_decisions(record.entries, current)
    assert {entry.decision.item for entry in changed} == {"remark 01"}
    assert {entry.decision.item for entry in gone} == {"remark 03"}
