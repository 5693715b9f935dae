"""The whole way in Python: measured, queued, written, filled, collected, rescored."""

from __future__ import annotations

import json
from datetime import UTC, datetime

import pandas as pd
import pytest
from openpyxl import load_workbook

import relook
from reference.loop import fill_round
from relook.cli.app import run

NOW = datetime(2031, 3, 1, 9, 0, tzinfo=UTC)
SECRET = bytes(range(32))


def labels():
    rows = [
        (
            f"i{item:02d}",
            f"c{coder}",
            "b" if (item % 3 == 0 and coder == 2) or item % 5 == 0 else "a",
        )
        for item in range(60)
        for coder in range(3)
    ]
    return pd.DataFrame(rows, columns=["id", "who", "topic"])


def items():
    return pd.DataFrame(
        {"text": [f"text of {n}" for n in range(60)]}, index=[f"i{n:02d}" for n in range(60)]
    )


@pytest.fixture
def queue():
    held = relook.measure(labels(), item="id", coder="who", label="topic", items=items())
    return relook.queue(held, adjudicators=["Ines", "Otto"], top=8, audit=6, secret=SECRET)


def decide(item, variable):
    return "b" if int(item[1:]) % 5 == 0 else "a"


def test_what_is_written_is_what_was_planned(queue, tmp_path):
    """The rows shown beforehand are those of the round on disk, code by code."""
    files = queue.write(tmp_path / "q", made=NOW)
    assert [file.name for file in files] == ["round-01-Ines.xlsx", "round-01-Otto.xlsx"]
    kept = json.loads((tmp_path / "q" / "rounds" / "01" / "round.json").read_text(encoding="utf-8"))
    planned = queue.rows
    assert list(planned["row_code"]) == [row["key"] for row in kept["rows"]]
    assert list(planned["item"]) == [row["item"] for row in kept["rows"]]
    assert list(planned["kind"]) == [row["kind"] for row in kept["rows"]]
    ranks = [None if rank is pd.NA else int(rank) for rank in planned["rank"]]
    assert ranks == [row["rank"] for row in kept["rows"]]
    sent = planned["kind"] == "disputed"
    parts = [row["contribution"] for row in kept["rows"] if row["kind"] == "disputed"]
    assert list(planned.loc[sent, "contribution"]) == pytest.approx(parts, rel=1e-12)
    sheet = load_workbook(files[0])["Queue"]
    assert "text of" in str(sheet.cell(2, 3).value)


def test_the_loop_closes(queue, tmp_path, capsys):
    """Decisions come back, final labels are made, and the command line says the same."""
    folder = tmp_path / "q"
    queue.write(folder, made=NOW)
    filled = fill_round(folder, decide)
    back = relook.collect(folder, now=NOW)
    assert (back.n_taken, back.is_complete, len(back.problems)) == (filled, True, 0)
    assert set(back.decisions["adjudicator"]) == {"Ines", "Otto"}
    assert (back.settled["state"] == "settled").all()
    finals = back.final_labels.set_index("item")["label"]
    assert len(finals) == 60
    sent = set(queue.rows["item"])
    assert all(finals[item] == decide(item, "topic") for item in sent)
    held = relook.rescore(folder)
    assert run(["rescore", str(folder), "--json", "--quiet"]) == 0
    wanted = json.loads(capsys.readouterr().out)["variables"][0]
    assert held.alpha == wanted["before"]["alpha"]
    assert held.agreement_after == wanted["after"]["agreement"]
    assert held.n_settled == wanted["settled"] == len(sent)
    assert held.audit_share == wanted["audits"][0]["share_ruled_otherwise"]
    assert held.moves["n_labels"].sum() > 0
    assert held.alpha == relook.measure(labels(), item="id", coder="who", label="topic").alpha
    assert "no reliability" in repr(held)
    again = relook.collect(folder, now=NOW)
    assert (again.n_taken, again.n_unchanged) == (0, filled)


def test_slips_are_a_table_with_cells(queue, tmp_path):
    """A label that is none: file, sheet, row, column, message and mend."""
    folder = tmp_path / "q"
    queue.write(folder, made=NOW)
    wrong = queue.rows["item"].iloc[0]
    fill_round(folder, lambda item, variable: "bb" if item == wrong else "a")
    back = relook.collect(folder, now=NOW)
    assert not back.is_complete
    assert list(back.problems.columns) == ["file", "sheet", "row", "column", "message", "mend"]
    assert len(back.problems) == (queue.rows["item"] == wrong).sum()
    assert back.problems["mend"].str.contains("change the cell").all()


def test_a_folder_with_a_project_is_left_alone(queue, tmp_path):
    """A second queue does not overwrite the first."""
    queue.write(tmp_path / "q", made=NOW)
    with pytest.raises(relook.RelookError, match="there is a project in this folder already"):
        queue.write(tmp_path / "q", made=NOW)


@pytest.mark.parametrize("names", [[], ["Ines", "Ines"], [""]])
def test_adjudicators_are_named_once_each(names):
    """None, twice, or without a name."""
    held = relook.measure(labels(), item="id", coder="who", label="topic")
    with pytest.raises(relook.RelookError, match="named once each"):
        relook.queue(held, adjudicators=names)


def test_items_without_labels_stay_items(tmp_path):
    """An item that nobody labelled is one of the items after writing, too."""
    frame = pd.DataFrame({"a": ["x", "y", None], "b": ["x", "x", None], "c": ["x", "x", None]})
    held = relook.measure(frame)
    assert held.n_items == 2
    relook.queue(held, top=1, audit=0).write(tmp_path / "q", made=NOW)
    fill_round(tmp_path / "q", lambda item, variable: "x")
    back = relook.collect(tmp_path / "q", now=NOW)
    assert len(back.final_labels) == 3
