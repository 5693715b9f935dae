"""A collect that is killed, or meets a full disk or a locked folder, loses nothing."""

from __future__ import annotations

import errno
import os
import shutil
import subprocess
import sys
from pathlib import Path

import pytest

from reference.small_project import NOW, fill, give_back, make_project
from relook.errors import RelookError
from relook.project.archive.record import read_record
from relook.project.returning.collecting import collect
from relook.project.returning.rebuilding import rebuild
from relook.project.setup.folder import Project

KILLS = 200


def _state(project: Project) -> dict[str, str | None]:
    return {held.item: held.label for held in read_record(project).decisions}


def _said_by_collect(project: Project) -> str | None:
    try:
        collect(project, None, now=NOW)
    except RelookError as error:
        return str(error)
    return None


@pytest.mark.skipif(not hasattr(os, "fork"), reason="needs fork, which Windows has not")
def test_killed_at_any_moment(tmp_path: Path) -> None:
    """After SIGKILL at 200 moments the record is the old or the new one, and the next run works."""
    template, sent = make_project(tmp_path / "template")
    give_back(template, "v1.xlsx", fill(sent["Ada"], {0: "delay"}))
    collect(template, None, now=NOW)
    old = _state(template)
    give_back(template, "v2.xlsx", fill(sent["Ada"], {0: "staff", 1: "price"}))
    whole = tmp_path / "whole"
    shutil.copytree(template.root, whole)
    collect(Project.open(whole), None, now=NOW)
    new = _state(Project.open(whole))
    assert old != new
    # Forking a process with threads is unsafe, and pytest's plugins may have some; so the fork is
    # done in a fresh interpreter, which reports the moments at which it killed.
    work = tmp_path / "work"
    work.mkdir()
    program = Path(__file__).parents[1] / "reference" / "killing.py"
    subprocess.run(
        [sys.executable, str(program), str(template.root), str(work), str(KILLS)],
        check=True,
        timeout=300,
        env={**os.environ, "PYTHONPATH": os.pathsep.join(sys.path)},
    )
    seen = set()
    for number in range(KILLS):
        project = Project.open(work / str(number))
        state = _state(project)
        assert state in (old, new)
        seen.add(state == new)
        collect(project, None, now=NOW)
        assert _state(project) == new
        if number % 10 == 0:
            shutil.rmtree(project.decisions_folder)
            rebuild(project)
            assert _state(project) == new
    assert seen == {False, True}


def test_full_disk_at_every_write(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """Whichever write fails, the record is the old one, said plainly, and the next run works."""
    template, sent = make_project(tmp_path / "template")
    give_back(template, "a.xlsx", fill(sent["Ada"], {0: "delay"}))
    real = os.fsync
    failed = 0
    for at in range(20):
        root = tmp_path / str(at)
        shutil.copytree(template.root, root)
        project = Project.open(root)
        calls = iter(range(1000))

        def full(handle: int, at: int = at, calls: object = calls) -> None:
            if next(calls) == at:  # type: ignore[call-overload]
                raise OSError(errno.ENOSPC, "No space left on device")
            real(handle)

        monkeypatch.setattr(os, "fsync", full)
        said = _said_by_collect(project)
        if said is not None:
            failed += 1
            assert "No space left" in said
            assert "disk has room" in said
            assert not list(root.rglob("*.part"))
        monkeypatch.setattr(os, "fsync", real)
        assert _state(project) in ({}, {"remark 01": "delay"})
        collect(project, None, now=NOW)
        assert _state(project) == {"remark 01": "delay"}
    assert failed >= 3  # the kept worksheet, the log, the decisions


def test_folder_that_cannot_be_written(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """A folder without permission to write is told, and read all the same in a dry run."""
    project, sent = make_project(tmp_path)
    give_back(project, "a.xlsx", fill(sent["Ada"], {0: "delay"}))

    def refuse(*_: object, **__: object) -> object:
        raise PermissionError(errno.EACCES, "Permission denied")

    monkeypatch.setattr("tempfile.NamedTemporaryFile", refuse)
    with pytest.raises(RelookError, match="Permission denied"):
        collect(project, None, now=NOW)
    assert collect(project, None, dry_run=True, now=NOW).accepted == 1
    monkeypatch.undo()
    assert collect(project, None, now=NOW).accepted == 1
