"""Bad input is answered with what, where and the mend; exit 2, nothing written, no traceback."""

import os
import subprocess
import sys
from pathlib import Path

import pytest

from reference.loop import copy_sample
from relook.cli.app import run

HEAD = "item,coder,label\n"
FINE = HEAD + "a,x,1\na,y,2\nb,x,1\nb,y,1\n"


def project(folder: Path, labels: str | bytes, settings: str = "") -> Path:
    data = labels if isinstance(labels, bytes) else labels.encode("utf-8")
    (folder / "labels.csv").write_bytes(data)
    (folder / "relook.toml").write_text(
        'project = "p"\n[labels]\nfiles = ["labels.csv"]\nitem = "item"\ncoder = "coder"\n'
        + settings,
        encoding="utf-8",
    )
    return folder


CASES = {
    "empty file": ("", "", "the file is empty, labels.csv", "give a table with a header"),
    "header only": (HEAD, "", "no rows", "labels.csv"),
    "missing column": (
        FINE.replace("coder", "codr"), "", 'no column "coder"', '"codr"'),
    "undeclared label": (
        FINE, '[variables.label]\ncolumn = "label"\nlabels = ["1", "3"]',
        '"2" is not a declared label', 'labels.csv, row 3, column "label"'),
    "not a number": (
        FINE.replace("y,2", "y,two"), '[variables.label]\ncolumn = "label"\ndifference = "interval"',
        '"two" is not a number', 'labels.csv, row 3, column "label"'),
    "same coder twice": (
        FINE + "a,x,2\n", "", 'coder "x" gave item "a" two labels', "row 6"),
    "no pairable item": (
        HEAD + "a,x,1\nb,y,2\n", "", "no item has two labels or more", ""),
    "not UTF-8 by name": (
        FINE.replace("a,", "ä,").encode("latin-1"), 'encoding = "utf-8"', "labels.csv", "utf-8"),
    "unknown key": (FINE, "[queue]\ntopp = 3", "unknown key [queue] topp", 'did you mean "top"?'),
}  # fmt: skip


@pytest.mark.parametrize("case", CASES)
@pytest.mark.parametrize("command", ["score", "queue"])
def test_a_bad_table_is_named_and_nothing_is_written(tmp_path, capsys, case, command):
    """The message names the file, and row and column where there are any."""
    labels, settings, said, also = CASES[case]
    folder = project(tmp_path, labels, settings)
    before = sorted(folder.rglob("*"))
    code = run([command, str(folder)])
    shown = capsys.readouterr()
    text = " ".join((shown.err + shown.out).split())
    if case == "no pairable item":
        assert code == (2 if command == "score" else 1)
    else:
        assert code == 2
        assert "mend: " in shown.err
    assert said in text
    assert also in text
    assert "Traceback" not in text
    assert "internal error" not in text
    assert sorted(folder.rglob("*")) == before


def test_no_such_target(tmp_path, capsys):
    """A path that is not there is named."""
    assert run(["score", str(tmp_path / "nowhere.csv")]) == 2
    assert "no such file or folder" in capsys.readouterr().err


def test_a_folder_without_a_project(tmp_path, capsys):
    """The mend tells how to make one."""
    assert run(["queue", str(tmp_path)]) == 2
    assert "relook new TABLE" in capsys.readouterr().err


def test_a_worksheet_of_another_project_is_refused(tmp_path, capsys):
    """Nothing of it is taken, and it is named."""
    first, second = tmp_path / "one", tmp_path / "two"
    for folder in (first, second):
        copy_sample("ferry_remarks", folder)
        assert run(["queue", str(folder / "ferry_remarks"), "--quiet"]) == 0
    settings = second / "ferry_remarks/relook.toml"
    foreign = next((first / "ferry_remarks/rounds/01/worksheets").glob("*.xlsx"))
    text = settings.read_text(encoding="utf-8")
    settings.write_text(text.replace('project = "', 'project = "other'), encoding="utf-8")
    round_file = second / "ferry_remarks/rounds/01/round.json"
    round_file.write_text(
        round_file.read_text(encoding="utf-8").replace('"project": "', '"project": "other'),
        encoding="utf-8",
    )
    capsys.readouterr()
    assert run(["collect", str(second / "ferry_remarks"), str(foreign)]) == 1
    assert "project" in capsys.readouterr().out
    assert not list((second / "ferry_remarks/decisions").glob("*.jsonl"))


@pytest.mark.parametrize("data", [b"", b"not a workbook", b"PK\x03\x04 cut short"])
def test_a_file_that_is_no_workbook_is_named(tmp_path, capsys, data):
    """Whatever it holds, it is reported and nothing is taken."""
    ferry = copy_sample("ferry_remarks", tmp_path)
    run(["queue", str(ferry), "--quiet"])
    bad = tmp_path / "bad.xlsx"
    bad.write_bytes(data)
    capsys.readouterr()
    assert run(["collect", str(ferry), str(bad)]) == 1
    assert "bad.xlsx" in capsys.readouterr().out


def test_collecting_before_a_round_was_sent(tmp_path, capsys):
    """The mend is to queue first."""
    ferry = copy_sample("ferry_remarks", tmp_path)
    assert run(["collect", str(ferry)]) == 2
    assert "run `relook queue` first" in capsys.readouterr().err


@pytest.mark.skipif(os.name == "nt", reason="pipes close otherwise there")
def test_a_closed_pipe_is_quiet(tmp_path):
    """`relook score | head -1` ends with 141 and says nothing on stderr."""
    ferry = copy_sample("ferry_remarks", tmp_path)
    read, write = os.pipe()
    os.close(read)
    done = subprocess.run(
        [sys.executable, "-m", "relook", "score", str(ferry), "--quiet"],
        stdout=write,
        stderr=subprocess.PIPE,
        text=True,
        check=False,
    )
    os.close(write)
    assert (done.returncode, done.stderr) == (141, "")


def test_an_unexpected_fault_asks_for_debug(tmp_path, capsys, monkeypatch):
    """What is not the user's mistake says so, without a traceback."""
    import relook.project.setup.folder

    def fail(root: Path) -> None:
        raise ZeroDivisionError("by hand")

    monkeypatch.setattr(relook.project.setup.folder, "load_settings", fail)
    assert run(["score", str(tmp_path)]) == 2
    said = capsys.readouterr().err
    assert "internal error in relook" in said
    assert "--debug" in said
    with pytest.raises(ZeroDivisionError):
        run(["score", str(tmp_path), "--debug"])


def test_interrupting_says_that_nothing_is_half_written(tmp_path, capsys, monkeypatch):
    """Ctrl-C exits with 130."""
    import relook.project.setup.folder

    def interrupt(root: Path) -> None:
        raise KeyboardInterrupt

    monkeypatch.setattr(relook.project.setup.folder, "load_settings", interrupt)
    assert run(["score", str(tmp_path)]) == 130
    assert "interrupted" in capsys.readouterr().err


@pytest.mark.parametrize(
    ("flag", "value", "mend"),
    [("--share", "0", "give a share such as 0.6"), ("--hours", "0", "give hours such as 6")],
)
def test_a_limit_of_nothing_is_answered_with_a_mend(tmp_path, capsys, flag, value, mend):
    """A queue of no items is no queue."""
    ferry = copy_sample("ferry_remarks", tmp_path)
    assert run(["queue", str(ferry), flag, value]) == 2
    assert f"mend: {mend}" in capsys.readouterr().err
    assert not (ferry / "rounds").exists()


@pytest.mark.skipif(sys.platform != "linux", reason="only Linux has names of any bytes")
def test_names_that_are_no_text_are_refused_in_words(tmp_path, capsys):
    """A file so named cannot name a coder, and a folder so named cannot stand in relook.toml."""
    rows = "item,x,y,z\n" + "".join(f"i{at},p,{'pq'[at % 2]},p\n" for at in range(8))
    table = Path(os.fsdecode(os.fsencode(tmp_path) + b"/caf\xe9.csv"))
    table.write_text(rows, encoding="utf-8")
    assert run(["score", str(table)]) == 2
    said = capsys.readouterr().err
    assert "holds bytes that are no text in UTF-8" in said
    assert "mend: rename the file" in said
    folder = Path(os.fsdecode(os.fsencode(tmp_path) + b"/d\xe9"))
    folder.mkdir()
    (folder / "labels.csv").write_text(rows, encoding="utf-8")
    into = tmp_path / "p"
    assert run(["new", str(folder / "labels.csv"), "--into", str(into), "--yes"]) == 2
    assert "relook.toml cannot name it" in capsys.readouterr().err
    assert not into.exists()


def test_a_row_that_was_entered_twice_does_not_hide_the_layout(tmp_path, capsys):
    """Fifteen items by three coders and one of them again, otherwise: the rows and the mend."""
    rows = [f"T{at:02d},{'pq'[at % 2]},{'pq'[at % 3 > 0]},q" for at in range(15)]
    table = tmp_path / "t.csv"
    table.write_text(
        "\n".join(["ticket,Anna,Ben,Cleo", *rows, "T08,q,q,p"]) + "\n", encoding="utf-8"
    )
    assert run(["score", str(table)]) == 2
    said = capsys.readouterr().err
    assert "layout: by-coder (a row per item, a column per coder), because hardly an item" in said
    assert 'coder "Anna" gave item "T08" two labels' in said
    assert "delete one of the two rows" in said
    assert "row 17" in said
