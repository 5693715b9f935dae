"""The whole path once round, as a user goes it: queue, fill, collect, status."""

import json
import shutil

import pytest
from openpyxl import load_workbook

from reference.loop import copy_sample, fill, fill_round, queue_rows
from relook.cli.app import run

EPOCH = "1924992000"


@pytest.fixture(autouse=True)
def _fixed_clock(monkeypatch):
    monkeypatch.setenv("SOURCE_DATE_EPOCH", EPOCH)


@pytest.fixture
def ferry(tmp_path):
    return copy_sample("ferry_remarks", tmp_path)


def json_of(capsys, *arguments):
    code = run([*map(str, arguments), "--json", "--quiet"])
    return code, json.loads(capsys.readouterr().out)


def test_a_round_goes_out_and_comes_back(ferry, capsys):
    """Labels to queue to worksheets to record; collecting again changes nothing."""
    code, queued = json_of(capsys, "queue", ferry)
    assert code == 0
    assert (queued["round"], queued["n_disputed_items"], queued["bound_by"]) == (1, 40, "top")
    assert queued["n_audit_items"] == 20
    assert sum(sheet["n_rows"] for sheet in queued["worksheets"]) == queued["n_rows"]
    filled = fill_round(ferry, lambda item, variable: "delay")
    assert filled == queued["n_rows"]
    code, collected = json_of(capsys, "collect", ferry)
    assert code == 0
    assert collected["accepted"] == filled
    record = sorted((ferry / "decisions").iterdir())
    before = [file.read_bytes() for file in record]
    code, again = json_of(capsys, "collect", ferry)
    assert (code, again["accepted"], again["unchanged"]) == (0, 0, filled)
    assert [file.read_bytes() for file in sorted((ferry / "decisions").iterdir())] == before


def test_a_changed_decision_supersedes_and_the_old_one_is_kept(ferry, capsys):
    """A later version of a worksheet adds to the record; nothing is rewritten."""
    json_of(capsys, "queue", ferry)
    fill_round(ferry, lambda item, variable: "delay")
    _, first = json_of(capsys, "collect", ferry)
    sheet = next((ferry / "rounds/01/worksheets").glob("*Ada*"))
    later = ferry / "rounds/01/returned/later.xlsx"
    rows = fill(sheet, later, lambda item, variable: "crew")
    code, second = json_of(capsys, "collect", ferry, later)
    assert (code, second["accepted"], second["superseded"]) == (0, rows, rows)
    assert first["record_file"] != second["record_file"]
    assert len(list((ferry / "decisions").glob("*.jsonl"))) == 2


def test_rows_are_found_wherever_they_were_sorted_to(ferry, capsys):
    """The rows of a returned sheet in another order give the same decisions."""
    json_of(capsys, "queue", ferry)
    sheet = next((ferry / "rounds/01/worksheets").glob("*Ada*"))
    back = ferry / "rounds/01/returned/a.xlsx"
    fill(sheet, back, lambda item, variable: "delay" if item < "r150" else "crew")
    book = load_workbook(back)
    held = book["Queue"]
    numbers = [row for row, _ in queue_rows(held)]
    width = held.max_column
    texts = [[held.cell(row, column).value for column in range(1, width + 1)] for row in numbers]
    for row, values in zip(numbers, reversed(texts), strict=True):
        for column, value in enumerate(values, start=1):
            held.cell(row, column).value = value
    book.save(back)
    code, collected = json_of(capsys, "collect", ferry)
    assert (code, collected["accepted"], collected["rejected"]) == (0, len(numbers), [])
    entries = [
        json.loads(line)
        for file in (ferry / "decisions").glob("*.jsonl")
        for line in file.read_text(encoding="utf-8").splitlines()[1:]
    ]
    wrong = [e for e in entries if e["label"] != ("delay" if e["item"] < "r150" else "crew")]
    assert wrong == []


def test_a_row_that_cannot_be_taken_is_listed_with_its_mend(ferry, capsys):
    """A misspelt decision is rejected by name, and exit code 1 says that something was not taken."""
    json_of(capsys, "queue", ferry)
    sheet = next((ferry / "rounds/01/worksheets").glob("*Ada*"))
    rows = fill(sheet, ferry / "rounds/01/returned/a.xlsx", lambda item, variable: "dellay")
    code, collected = json_of(capsys, "collect", ferry)
    assert (code, collected["accepted"], len(collected["rejected"])) == (1, 0, rows)
    first = collected["rejected"][0]
    assert first["found"] == "dellay"
    assert '"delay"' in first["mend"]
    json_of(capsys, "collect", ferry, "--mend-sheet", ferry / "mend.xlsx", "--dry-run")
    assert not (ferry / "mend.xlsx").exists()
    run(["collect", str(ferry), "--mend-sheet", str(ferry / "mend.xlsx"), "--quiet"])
    assert fill(ferry / "mend.xlsx", ferry / "mended.xlsx", lambda item, variable: "delay") == rows
    (ferry / "rounds/01/returned/a.xlsx").unlink()
    capsys.readouterr()
    code, taken = json_of(capsys, "collect", ferry, ferry / "mended.xlsx")
    assert (code, taken["accepted"], taken["edited"]) == (0, rows, [])


def test_the_same_input_seed_and_secret_give_the_same_bytes(ferry, tmp_path, capsys):
    """Two folders with one secret write identical files."""
    twin = tmp_path / "twin" / ferry.name
    (ferry / ".relook").mkdir()
    (ferry / ".relook" / "secret").write_text("ab" * 32, encoding="ascii")
    shutil.copytree(ferry, twin)
    for folder in (ferry, twin):
        assert run(["queue", str(folder), "--quiet"]) == 0
    files = sorted(p.relative_to(ferry) for p in (ferry / "rounds").rglob("*") if p.is_file())
    assert len(files) == 4
    for file in files:
        assert (ferry / file).read_bytes() == (twin / file).read_bytes(), file


def test_a_second_round_waits_for_the_first(ferry, capsys):
    """Nothing is back: refused with the mend; --next goes on with other items."""
    json_of(capsys, "queue", ferry)
    assert run(["queue", str(ferry)]) == 2
    assert "add --next" in capsys.readouterr().err
    code, second = json_of(capsys, "queue", ferry, "--next")
    assert (code, second["round"], second["n_audit_items"]) == (0, 2, 0)
    rows = [
        {row["item"] for row in json.loads((ferry / f"rounds/0{n}/round.json").read_text())["rows"]}
        for n in (1, 2)
    ]
    assert not rows[0] & rows[1]


def test_splits_go_to_the_panel_when_nobody_is_left(ferry, capsys):
    """Two adjudicators differ on the doubled rows; the lead's panel gets them, and settles them."""
    json_of(capsys, "queue", ferry)
    folder = ferry / "rounds/01"
    for name, label in (("Ada", "delay"), ("Ben", "crew")):
        sheet = next((folder / "worksheets").glob(f"*{name}*"))
        fill(sheet, folder / "returned" / sheet.name, lambda item, variable, label=label: label)
    _, collected = json_of(capsys, "collect", ferry)
    assert collected["splits"]
    code, queued = json_of(capsys, "queue", ferry, "--splits")
    assert code == 0
    panel = [sheet for sheet in queued["worksheets"] if sheet["adjudicator"] == "panel"]
    assert panel
    assert panel[0]["n_rows"] == len(collected["splits"])
    fill_round(ferry, lambda item, variable: "delay", number=2)
    _, settled = json_of(capsys, "collect", ferry)
    # Rechecks of unanimous items may split anew; what the panel ruled on is settled.
    first = {held["item"] for held in collected["splits"]}
    assert not first & {held["item"] for held in settled["splits"]}


def test_reissue_sends_open_rows_to_somebody_else(ferry, capsys):
    """Ada leaves; Ben gets her open rows, none that he ruled on."""
    json_of(capsys, "queue", ferry)
    folder = ferry / "rounds/01"
    sheet = next((folder / "worksheets").glob("*Ben*"))
    fill(sheet, folder / "returned" / sheet.name, lambda item, variable: "delay")
    json_of(capsys, "collect", ferry)
    code, queued = json_of(capsys, "queue", ferry, "--reissue", "Ada", "--to", "Ben")
    assert (code, queued["n_disputed_items"]) == (0, 0)
    first = json.loads((folder / "round.json").read_text(encoding="utf-8"))["rows"]
    second = json.loads((ferry / "rounds/02/round.json").read_text(encoding="utf-8"))["rows"]
    ben = {row["item"] for row in first if row["worksheet"] != first[0]["worksheet"]}
    ada = {row["item"] for row in first} - ben
    assert {row["item"] for row in second} == ada


def test_a_rehearsal_writes_nothing(ferry, capsys):
    """--dry-run speaks of the same round and leaves the folder as it was, secret included."""
    before = sorted(path.relative_to(ferry) for path in ferry.rglob("*"))
    code, planned = json_of(capsys, "queue", ferry, "--dry-run")
    assert (code, planned["written"], planned["n_disputed_items"]) == (0, False, 40)
    assert sorted(path.relative_to(ferry) for path in ferry.rglob("*")) == before


def test_a_bare_table_makes_a_project_beside_it(ferry, tmp_path, capsys, monkeypatch):
    """The guess is said; a second call goes on in the folder that is there."""
    monkeypatch.chdir(tmp_path)
    shutil.copy(ferry / "labels/labels.csv", tmp_path / "mine.csv")
    assert run(["queue", "mine.csv", "--top", "12", "--adjudicator", "Cy"]) == 0
    said = capsys.readouterr()
    assert 'items: column "item_id"' in said.err
    assert "making mine-relook beside the table" in said.err
    text = (tmp_path / "mine-relook/relook.toml").read_text(encoding="utf-8")
    assert 'files = ["../mine.csv"]' in text
    assert "top = 12" in text
    assert '"Cy"' in text
    assert run(["queue", "mine.csv", "--next"]) == 0
    assert "going on in mine-relook" in capsys.readouterr().err
    assert (tmp_path / "mine-relook/rounds/02/round.json").exists()


def test_reading_commands_leave_a_bare_table_alone(ferry, tmp_path, capsys, monkeypatch):
    """Score and why on a table write nothing beside it."""
    monkeypatch.chdir(tmp_path)
    shutil.copy(ferry / "labels/labels.csv", tmp_path / "mine.csv")
    before = sorted(tmp_path.iterdir())
    assert run(["score", "mine.csv"]) == 0
    assert run(["why", "mine.csv", "r219"]) == 0
    assert sorted(tmp_path.iterdir()) == before


def test_labels_that_are_all_the_same_are_undefined_and_not_queued(tmp_path, capsys):
    """Score says undefined and exits 0; queue exits 1 and makes no folder."""
    table = tmp_path / "same.csv"
    table.write_text(
        "item,coder,label\n" + "".join(f"i{i},c{c},yes\n" for i in range(5) for c in "ab"),
        encoding="utf-8",
    )
    assert run(["score", str(table)]) == 0
    assert "undefined" in capsys.readouterr().out
    assert run(["queue", str(table)]) == 1
    assert "nothing to queue" in capsys.readouterr().err
    assert [path.name for path in tmp_path.iterdir()] == ["same.csv"]


def test_status_tells_what_is_out_and_what_is_next(ferry, capsys):
    """Before, between and after: the next step is named."""
    _, fresh = json_of(capsys, "status", ferry)
    assert fresh["next"].startswith("relook queue")
    json_of(capsys, "queue", ferry)
    _, waiting = json_of(capsys, "status", ferry)
    assert waiting["next"].startswith("wait for the worksheets")
    assert [sheet["back"] for sheet in waiting["rounds"][0]["worksheets"]] == [False, False]
    fill_round(ferry, lambda item, variable: "delay")
    json_of(capsys, "collect", ferry)
    _, done = json_of(capsys, "status", ferry)
    assert [sheet["back"] for sheet in done["rounds"][0]["worksheets"]] == [True, True]
    assert done["states"]["settled"] > 0


def test_labels_that_changed_after_the_round_are_told(ferry, capsys):
    """A row whose labels changed is "made on other labels"; one whose item is gone is orphaned."""
    json_of(capsys, "queue", ferry)
    rows = json.loads((ferry / "rounds/01/round.json").read_text(encoding="utf-8"))["rows"]
    disputed = sorted({row["item"] for row in rows if row["kind"] == "disputed"})
    changed, gone = disputed[0], disputed[1]
    file = ferry / "labels/labels.csv"
    lines = file.read_text(encoding="utf-8").splitlines(keepends=True)
    lines = [line for line in lines if not line.startswith(f"{gone},")]
    at = next(n for n, line in enumerate(lines) if line.startswith(f"{changed},"))
    item, coder, label = lines[at].rstrip("\n").split(",")
    lines[at] = f"{item},{coder},{'price' if label != 'price' else 'crew'}\n"
    file.write_text("".join(lines), encoding="utf-8")
    _, standing = json_of(capsys, "status", ferry)
    assert {held["item"] for held in standing["stale"]} == {changed}
    assert {held["item"] for held in standing["orphaned"]} == {gone}


def test_single_label_items_are_sent_when_asked_for(ferry, capsys):
    """--include-single adds the six items that nothing else can compare."""
    code, queued = json_of(capsys, "queue", ferry, "--include-single", "--audit", "0")
    assert (code, queued["n_disputed_items"], queued["n_items"]) == (0, 40, 46)
    rows = json.loads((ferry / "rounds/01/round.json").read_text(encoding="utf-8"))["rows"]
    single = {row["item"] for row in rows if row["stratum"] == "single"}
    assert single == {"r084", "r096", "r186", "r229", "r267", "r275"}


def test_a_clean_audit_reaches_the_limit_that_queue_promised(tmp_path, capsys):
    """All audit items upheld: the interval's upper end is what `queue` said it would be."""
    labels = [
        f"i{item:03d},c{coder},{'b' if (item % 3 == 0 and coder == 2) or item % 5 == 0 else 'a'}"
        for item in range(90)
        for coder in range(3)
    ]
    table = tmp_path / "labels.csv"
    table.write_text("item,coder,label\n" + "\n".join(labels) + "\n", encoding="utf-8")
    _, queued = json_of(capsys, "queue", table, "--top", 9, "--audit", 12)
    project = tmp_path / "labels-relook"
    fill_round(project, lambda item, variable: "b" if int(item[1:]) % 5 == 0 else "a")
    json_of(capsys, "collect", project)
    _, after = json_of(capsys, "rescore", project)
    audit = after["audit"]
    assert (audit["share_ruled_otherwise"], audit["low"]) == (0, 0)
    assert audit["high"] == queued["audit_limit_if_all_upheld"]
    assert 0 < audit["high"] < 0.5
