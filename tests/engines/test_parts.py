"""Labels in parts give what they give in one: score and queue, shuffled or promised by item."""

from __future__ import annotations

import json
import shutil
import warnings
from pathlib import Path

import numpy as np
import pytest

from relook.cli.app import run
from relook.errors import RelookError

distributed = pytest.importorskip("distributed", reason="dask comes with the extra `cluster`")

PAIRS = ("coder_pairs", "no_coder_pairs_because", "doubt", "doubt_undefined_because")
VARIABLES = """
[variables.topic]
column = "topic"
[variables.grade]
column = "grade"
difference = "{difference}"
"""


@pytest.fixture(scope="module")
def address():
    """Two workers as threads of this process: quick, and closed at the end."""
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        with distributed.LocalCluster(
            n_workers=2, threads_per_worker=1, processes=False, dashboard_address=None
        ) as local:
            yield local.scheduler_address


@pytest.fixture(autouse=True)
def _as_with_many_labels(monkeypatch):
    """Doubt, which breaks ties among few labels on one machine, is left to single machines here."""
    monkeypatch.setattr("relook.project.figures.ordering.QUICK_DOUBT", 0)
    monkeypatch.setenv("SOURCE_DATE_EPOCH", "1924992000")


def made_rows(n_items=240):
    rng = np.random.default_rng(11)
    rows = []
    for item in range(n_items):
        true = int(rng.integers(0, 4))
        for coder in rng.choice(9, int(rng.integers(0, 6)), replace=False).tolist():
            topic = "abcd"[true if rng.random() < 0.7 else int(rng.integers(0, 4))]
            grade = str(true + int(rng.integers(1, 4)))
            rows.append((f"i{item:04d}", f"c{coder}", topic, "" if rng.random() < 0.1 else grade))
    return rows


def write(folder, rows, part_of, difference="interval"):
    """Write rows into the files that `part_of` says, and a project that reads all of them."""
    (folder / "parts").mkdir(parents=True)
    lines = {}
    for row in rows:
        lines.setdefault(part_of(row), []).append(",".join(row))
    for part, own in lines.items():
        text = "\n".join(["item,coder,topic,grade", *own]) + "\n"
        (folder / "parts" / f"p{part}.csv").write_text(text, encoding="utf-8")
    (folder / "relook.toml").write_text(
        'format = 1\nproject = "parts"\n[labels]\nfiles = ["parts/p*.csv"]\nitem = "item"\n'
        f'coder = "coder"\n{VARIABLES.format(difference=difference)}[queue]\ntop = 12\naudit = 9\n'
        '[worksheet]\ntitle = "Parts"\nadjudicators = ["Ines", "Otto"]\n',
        encoding="utf-8",
    )
    (folder / ".relook").mkdir()
    (folder / ".relook" / "secret").write_text("0123456789abcdef" * 4 + "\n", encoding="ascii")
    return folder


def by_item(n):
    return lambda row: int(row[0][1:]) % n


def anyhow(n):
    return lambda row: (int(row[0][1:]) + int(row[1][1:])) % n


def json_of(capsys, *arguments, code=0):
    assert run([*map(str, arguments), "--json", "--quiet"]) == code
    return json.loads(capsys.readouterr().out)


def without(held, *names):
    return {key: value for key, value in held.items() if key not in names}


def near(found, wanted):
    """Equal, floats to 1e-12; lists of coders' rows in any order of the coders."""
    assert type(found) is type(wanted)
    if isinstance(wanted, dict):
        assert found.keys() == wanted.keys()
        for key, value in wanted.items():
            near(found[key], value)
    elif isinstance(wanted, list):
        assert len(found) == len(wanted)
        for one, other in zip(found, wanted, strict=True):
            near(one, other)
    elif isinstance(wanted, float):
        assert found == pytest.approx(wanted, rel=1e-12, abs=1e-15)
    else:
        assert found == wanted


def comparable(score):
    held = without(score, "coder_pairs", "project")
    held["variables"] = [without(each, *PAIRS) for each in held["variables"]]
    held["label_use"] = sorted(held["label_use"], key=lambda row: str(sorted(row.items())))
    return held


@pytest.mark.parametrize("difference", ["interval", "ordinal", "ratio"])
@pytest.mark.parametrize(("parts", "promised"), [(1, True), (4, True), (4, False), (3, False)])
def test_score_is_that_of_one_machine(difference, parts, promised, tmp_path, address, capsys):
    """Every figure but those that are left out, whole numbers exactly and floats to 12 digits."""
    split = by_item(parts) if promised else anyhow(parts)
    project = write(tmp_path / "p", made_rows(), split, difference)
    wanted = json_of(capsys, "score", project)
    how = ("--engine", "dask", "--scheduler", address, *(("--by-item",) if promised else ()))
    found = json_of(capsys, "score", project, *how)
    near(comparable(found), comparable(wanted))
    assert found["coder_pairs"] == []
    assert "left to one" in found["variables"][0]["no_coder_pairs_because"]


@pytest.mark.parametrize("promised", [True, False])
def test_queue_sends_the_same_rows(promised, tmp_path, address, capsys):
    """Items, ranks, audits, row codes and worksheets are those of one machine, byte for byte."""
    rows = made_rows()
    one = write(tmp_path / "one", rows, by_item(3) if promised else anyhow(3))
    other = Path(shutil.copytree(one, tmp_path / "other"))
    json_of(capsys, "queue", one)
    how = ("--engine", "dask", "--scheduler", address, *(("--by-item",) if promised else ()))
    json_of(capsys, "queue", other, *how)
    kept = [json.loads((p / "rounds/01/round.json").read_text("utf-8")) for p in (one, other)]
    assert [without(row, "contribution") for row in kept[1]["rows"]] == [
        without(row, "contribution") for row in kept[0]["rows"]
    ]
    assert kept[1]["strata"] == kept[0]["strata"]
    assert kept[1]["label_files"] == kept[0]["label_files"]
    for sheet in (one / "rounds/01/worksheets").iterdir():
        assert (other / "rounds/01/worksheets" / sheet.name).read_bytes() == sheet.read_bytes()


def test_a_second_round_leaves_out_what_was_sent(tmp_path, address, capsys):
    """Items of the first round are known by their ids although ids are not here."""
    one = write(tmp_path / "one", made_rows(), by_item(3))
    other = Path(shutil.copytree(one, tmp_path / "other"))
    how = ("--engine", "dask", "--scheduler", address, "--by-item")
    for project, extra in ((one, ()), (other, how)):
        json_of(capsys, "queue", project, *extra)
        json_of(capsys, "queue", project, "--next", *extra)
    sent = [
        [row["key"] for row in json.loads((p / "rounds/02/round.json").read_text("utf-8"))["rows"]]
        for p in (one, other)
    ]
    assert sent[0] == sent[1]


def test_a_broken_promise_is_refused(tmp_path, address, capsys):
    """Items that lie in several files are found out, and the mend is to have them shuffled."""
    project = write(tmp_path / "p", made_rows(), anyhow(3))
    code = run(["score", str(project), "--engine", "dask", "--scheduler", address, "--by-item"])
    err = " ".join(capsys.readouterr().err.split())
    assert code == 2
    assert "items lie in more than one part" in err
    assert "leave out --by-item" in err


@pytest.mark.parametrize("promised", [True, False])
def test_bad_labels_are_told_with_file_and_row(promised, tmp_path, address, capsys):
    """All of them by file; shuffled, those of the files that were reached."""
    rows = made_rows()
    rows[10] = (*rows[10][:3], "ten")
    rows[200] = (*rows[200][:3], "twelve")
    project = write(tmp_path / "p", rows, by_item(4))
    how = ("--by-item",) if promised else ()
    assert run(["score", str(project), "--engine", "dask", "--scheduler", address, *how]) == 2
    err = " ".join(capsys.readouterr().err.split())
    told = ['"ten" is not a number' in err, '"twelve" is not a number' in err]
    assert all(told) if promised else any(told)
    assert "parts/p" in err
    assert "row " in err


def test_a_coder_twice_on_an_item_in_two_files_is_found(tmp_path, address, capsys):
    """Brought together by item, the two labels meet."""
    rows = [("i1", "c1", "a", "1"), ("i1", "c2", "a", "1"), ("i1", "c1", "b", "1")]
    project = write(tmp_path / "p", [*rows, ("i2", "c1", "a", "2"), ("i2", "c2", "b", "2")],
                    lambda row: int(row[2] == "b"))  # fmt: skip
    assert run(["score", str(project), "--engine", "dask", "--scheduler", address]) == 2
    err = " ".join(capsys.readouterr().err.split())
    assert 'coder "c1" gave item "i1" two labels of "topic"' in err


@pytest.mark.parametrize(
    ("command", "arguments", "said"),
    [
        ("score", ("--engine", "spark"), '"spark" is no engine'),
        ("score", ("--by-item",), "are of the engine dask"),
        ("score", ("--engine", "dask", "--items", "out.csv"), "--items needs every label at once"),
        ("score", ("--engine", "dask", "--coding", "1"), "--coding needs every label at once"),
        ("queue", ("--engine", "dask", "--splits"), "are of single items"),
        ("queue", ("--engine", "dask", "--rank-by", "doubt"), "left to one"),
    ],
)
def test_what_it_cannot_do_is_told_with_a_mend(command, arguments, said, tmp_path, address, capsys):
    """Nothing is written, and the message names what to leave out."""
    project = write(tmp_path / "p", made_rows(40), by_item(2))
    where = ("--scheduler", address) if "dask" in arguments else ()
    assert run([command, str(project), *arguments, *where]) == 2
    err = " ".join(capsys.readouterr().err.split())
    assert said in err
    assert "mend:" in err
    assert not (project / "rounds").exists()


def test_a_scheduler_that_is_not_there_is_told():
    """With the address and what to check, after ten seconds at most."""
    from relook.engines.cluster import cluster_at

    with pytest.raises(RelookError, match="does not answer"), cluster_at("nowhere", by_item=True):
        pass


@pytest.mark.filterwarnings("ignore")
def test_worker_processes_on_this_machine_do_the_same(tmp_path, capsys):
    """Without an address a cluster of processes is started, and closed at the end."""
    project = write(tmp_path / "p", made_rows(60), by_item(2))
    wanted = json_of(capsys, "score", project)
    found = json_of(capsys, "score", project, "--engine", "dask", "--by-item")
    near(comparable(found), comparable(wanted))
