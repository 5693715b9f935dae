"""round.json holds what was sent, and reads back as it was written."""

import dataclasses
import json

import pytest

from relook.errors import RelookError
from relook.project.archive.rounds import (
    Round,
    RoundRow,
    RoundStratum,
    RoundVariable,
    RoundWorksheet,
    read_rounds,
)
from relook.project.setup.folder import Project

ROUND = Round(
    number=1,
    made="2031-05-01T08:00:00+00:00",
    relook="0.1.0",
    project="p",
    seed=7,
    settings={"top": 3},
    label_files={"a.csv": "00"},
    variables=(
        RoundVariable(
            variable="topic",
            difference="nominal",
            alpha=0.5,
            undefined_because=None,
            observed_disagreement=0.25,
            expected_disagreement=0.5,
            n_items=9,
            n_pairable_items=8,
            n_disputed_items=3,
            n_labels=20,
            n_pairable_labels=19,
            n_coders=3,
        ),
    ),
    strata=(RoundStratum(variable="topic", stratum="unanimous", n_items=5, n_drawn=1),),
    worksheets=(RoundWorksheet(id="W", adjudicator="a-1", file="f.xlsx", digest="11", n_rows=1),),
    rows=(
        RoundRow(
            key="K",
            item="r1",
            variable="topic",
            worksheet="W",
            adjudicator="a-1",
            kind="disputed",
            rank=1,
            contribution=0.1,
            evidence={"remark": "ab"},
        ),
    ),
)


def write(project_root, held: Round) -> None:
    file = project_root / "rounds" / f"{held.number:02d}" / "round.json"
    file.parent.mkdir(parents=True)
    file.write_bytes(held.to_json())


@pytest.fixture
def project(tmp_path) -> Project:
    (tmp_path / "relook.toml").write_text(
        'project = "p"\n[labels]\nfiles = ["a.csv"]\ncoder = "c"\n', encoding="utf-8"
    )
    return Project.open(tmp_path)


def test_a_round_reads_back_as_it_was_written():
    """Writing and reading change nothing."""
    assert Round.from_json(ROUND.to_json(), "round.json") == ROUND


def test_a_round_without_rows_is_valid_json():
    """Empty lists are written as such."""
    empty = dataclasses.replace(ROUND, strata=(), rows=())
    assert json.loads(empty.to_json())["rows"] == []
    assert Round.from_json(empty.to_json(), "round.json") == empty


def test_rounds_are_read_in_order(project):
    """Round 2 comes after round 1, whatever the file system says."""
    write(project.root, dataclasses.replace(ROUND, number=2))
    write(project.root, ROUND)
    assert [found.number for found in read_rounds(project)] == [1, 2]


@pytest.mark.parametrize(
    ("data", "said"),
    [
        (b"{", "not a readable round file"),
        (b"[]", "not a readable round file"),
        (b"{}", "not a readable round file"),
        (b'{"format": 9}', "written by a newer relook"),
    ],
)
def test_a_damaged_round_is_named(data, said):
    """Whatever is wrong with the file, the message names it."""
    with pytest.raises(RelookError, match=said) as caught:
        Round.from_json(data, "rounds/01/round.json")
    assert "rounds/01/round.json" in str(caught.value)


def test_a_round_of_another_project_is_refused(project):
    """Rounds copied from elsewhere would mix two projects' row codes."""
    write(project.root, dataclasses.replace(ROUND, project="q"))
    with pytest.raises(RelookError, match="belongs to another project"):
        read_rounds(project)
