"""A project folder: the secret, the lock, and files that are never half written."""

import os
from pathlib import Path

import pytest

from relook.errors import RelookError
from relook.project.setup import folder
from relook.project.setup.folder import Project, write_whole


@pytest.fixture
def project(tmp_path: Path) -> Project:
    (tmp_path / "relook.toml").write_text(
        'project = "p"\n[labels]\nfiles = ["a.csv"]\ncoder = "c"\n', encoding="utf-8"
    )
    return Project.open(tmp_path)


def test_the_secret_is_made_once(project):
    """The second call returns what the first one made."""
    first = project.secret()
    assert len(first) == 32
    assert project.secret() == first
    assert Project.open(project.root).secret() == first


def test_a_damaged_secret_is_refused(project):
    """A secret that is not what was written stops the work."""
    project.secret()
    (project.root / ".relook" / "secret").write_text("no", encoding="ascii")
    with pytest.raises(RelookError, match="secret is damaged"):
        project.secret()


def test_a_lost_secret_is_not_replaced(project):
    """Row codes of earlier rounds would no longer match a new secret."""
    round_file = project.round_folder(1) / "round.json"
    round_file.parent.mkdir(parents=True)
    round_file.write_text("{}", encoding="utf-8")
    with pytest.raises(RelookError, match="secret is missing"):
        project.secret()


def test_a_second_writer_waits_and_then_gives_up(project, monkeypatch):
    """The lock names the folder and the mend."""
    monkeypatch.setattr(folder, "_LOCK_SECONDS", 0.05)
    with (
        project.lock(),
        pytest.raises(RelookError, match="another relook is writing"),
        project.lock(),
    ):
        pytest.fail("two writers at once")


def test_the_old_file_is_seen_until_the_new_one_is_whole(tmp_path, monkeypatch):
    """While the new bytes are being written the name still holds the old ones."""
    target = tmp_path / "file"
    target.write_bytes(b"old")
    seen = []
    real = os.fsync

    def look(handle: int) -> None:
        seen.append(target.read_bytes())
        real(handle)

    monkeypatch.setattr(folder.os, "fsync", look)
    write_whole(target, b"new")
    assert seen[0] == b"old"
    assert target.read_bytes() == b"new"


def test_a_failed_write_leaves_the_old_file_and_nothing_else(tmp_path, monkeypatch):
    """A full disk is an error with a mend; no temporary file stays behind."""
    target = tmp_path / "file"
    target.write_bytes(b"old")

    def fail(handle: int) -> None:
        raise OSError(28, "No space left on device")

    monkeypatch.setattr(folder.os, "fsync", fail)
    with pytest.raises(RelookError, match="No space left on device"):
        write_whole(target, b"new")
    assert [path.name for path in tmp_path.iterdir()] == ["file"]
    assert target.read_bytes() == b"old"


def test_a_file_open_elsewhere_says_so(tmp_path, monkeypatch):
    """A refused replacement is what a spreadsheet program's lock looks like."""

    def refuse(self: Path, target: Path) -> None:
        raise PermissionError(13, "Permission denied")

    monkeypatch.setattr(Path, "replace", refuse)
    with pytest.raises(RelookError) as caught:
        write_whole(tmp_path / "file", b"new")
    assert "close it in the spreadsheet program" in str(caught.value.mend)


def test_an_existing_file_needs_force(tmp_path):
    """Without force nothing is replaced."""
    target = tmp_path / "file"
    write_whole(target, b"old", force=False)
    with pytest.raises(RelookError, match="exists already"):
        write_whole(target, b"new", force=False)
    assert target.read_bytes() == b"old"


def test_paths_are_named_from_the_project_folder(project):
    """A path inside is short and has forward slashes; one outside is whole."""
    assert project.relative(project.round_folder(3) / "x.xlsx") == "rounds/03/x.xlsx"
    assert project.relative(Path("/elsewhere/y")) == str(Path("/elsewhere/y"))
