"""Any sequence of filling, collecting and merging gives what a plain replay gives."""

from __future__ import annotations

import shutil
import tempfile
from collections import defaultdict
from dataclasses import dataclass, field
from datetime import timedelta
from pathlib import Path

from hypothesis import given, settings
from hypothesis import strategies as st

from reference.small_project import NOW, fill, make_project, make_worksheet
from relook.core.decisions import fold
from relook.project.archive.record import read_record
from relook.project.returning.collecting import collect
from relook.project.returning.rebuilding import rebuild
from relook.project.setup.folder import Project
from relook.worksheet.write import write_worksheet

SENT = write_worksheet(make_worksheet(n_items=2))
LABELS = st.sampled_from(["", "delay", "staff", "withdraw"])
FILES: dict[tuple[str, str], bytes] = {}


def filled(decisions: tuple[str, str]) -> bytes:
    """Return the worksheet with its two rows decided so; the same bytes each time."""
    if decisions not in FILES:
        typed = {row: label for row, label in enumerate(decisions) if label}
        FILES[decisions] = fill(SENT, typed)
    return FILES[decisions]


@dataclass
class Replay:
    """The rules in their plainest form, for one adjudicator and one worksheet."""

    history: dict[int, list[str]] = field(default_factory=lambda: defaultdict(list))
    seen: set[tuple[str, str]] = field(default_factory=set)

    def collect(self, version: tuple[str, str], *, reinstate: bool) -> None:
        """Collect one version of the worksheet, named alone."""
        for row, label in enumerate(version):
            past = self.history[row]
            if not label or (past and past[-1] == label):
                continue
            if label == "withdraw" and (not past or past[-1] == "withdraw"):
                continue
            older = bool(past) and (label in past or version in self.seen)
            if reinstate or not older:
                past.append(label)
        self.seen.add(version)

    @property
    def settled(self) -> dict[str, str | None]:
        """The label that stands of each item; None where it was withdrawn."""
        return {
            f"remark {row + 1:02d}": None if past[-1] == "withdraw" else past[-1]
            for row, past in self.history.items()
            if past
        }


def settled(project: Project) -> dict[str, str | None]:
    folded = fold(read_record(project).decisions)
    return {item: held.label for (item, _), held in folded.items()}


STEPS = st.lists(st.tuples(st.tuples(LABELS, LABELS), st.booleans()), min_size=1, max_size=6)


@settings(max_examples=40, deadline=None)
@given(STEPS)
def test_sequences_equal_a_plain_replay(steps: list[tuple[tuple[str, str], bool]]) -> None:
    """Collect, collect later, collect older, reinstate: the record is what the rules say."""
    with tempfile.TemporaryDirectory() as folder:
        project, _ = make_project(Path(folder) / "p", [make_worksheet(n_items=2)])
        replay = Replay()
        path = Path(folder) / "back.xlsx"
        for number, (version, reinstate) in enumerate(steps):
            path.write_bytes(filled(version))
            collect(project, [path], reinstate=reinstate, now=NOW + timedelta(hours=number))
            replay.collect(version, reinstate=reinstate)
            assert settled(project) == replay.settled
        shutil.rmtree(project.decisions_folder, ignore_errors=True)
        rebuild(project)
        assert settled(project) == replay.settled


@settings(max_examples=15, deadline=None)
@given(STEPS, STEPS)
def test_merged_folders_equal_their_union(
    here_steps: list[tuple[tuple[str, str], bool]], there_steps: list[tuple[tuple[str, str], bool]]
) -> None:
    """Two copies collected into apart, then merged either way, settle alike; so does a rebuild."""
    with tempfile.TemporaryDirectory() as folder:
        here, _ = make_project(Path(folder) / "here", [make_worksheet(n_items=2)])
        shutil.copytree(here.root, Path(folder) / "there")
        there = Project.open(Path(folder) / "there")
        path = Path(folder) / "back.xlsx"
        for project, steps, offset in ((here, here_steps, 0), (there, there_steps, 1)):
            for number, (version, reinstate) in enumerate(steps):
                path.write_bytes(filled(version))
                moment = NOW + timedelta(hours=2 * number + offset)
                collect(project, [path], reinstate=reinstate, now=moment)
        for one, other in ((here, there), (there, here)):
            for name in ("decisions", "rounds"):
                if (one.root / name).is_dir():
                    shutil.copytree(one.root / name, other.root / name, dirs_exist_ok=True)
        merged = read_record(here)
        assert merged == read_record(there)
        shutil.rmtree(here.decisions_folder, ignore_errors=True)
        rebuild(here)
        assert read_record(here) == merged
