"""`relook recode` as a user runs it: sheets out, filled, back, scored, set beside the first."""

from __future__ import annotations

import csv
import io
import json
import shutil

import pytest
from openpyxl import load_workbook

from reference import by_definition as twin
from reference.loop import copy_sample
from reference.made_sheets import every_text
from relook.cli.app import run


@pytest.fixture(autouse=True)
def _fixed_clock(monkeypatch):
    monkeypatch.setenv("SOURCE_DATE_EPOCH", "1924992000")


@pytest.fixture
def ferry(tmp_path):
    return copy_sample("ferry_remarks", tmp_path)


def json_of(capsys, *arguments, code=0):
    assert run([*map(str, arguments), "--json", "--quiet"]) == code
    return json.loads(capsys.readouterr().out)


def said(capsys, *arguments, code=0):
    assert run([*map(str, arguments)]) == code
    held = capsys.readouterr()
    return " ".join(held.out.split()), " ".join(held.err.split())


def columns_of(sheet):
    return {str(cell.value): cell.column for cell in sheet[1]}


def code(project, decide, number=2):
    """Fill every coding sheet into its folder for returned ones; return item → (coder, label)."""
    folder = project / "codings" / f"{number:02d}"
    given = {}
    for file in sorted((folder / "worksheets").glob("*.xlsx")):
        coder = file.stem.split("-", 2)[2]
        book = load_workbook(file)
        sheet = book["Items"]
        at = columns_of(sheet)
        for row in range(2, sheet.max_row + 1):
            item = sheet.cell(row, at["item"]).value
            label = decide(item, coder)
            sheet.cell(row, at["label"]).value = label
            given.setdefault(item, []).append((coder, label))
        book.save(folder / "returned" / file.name)
    return given


def first_coding(project):
    table = {}
    with (project / "labels" / "labels.csv").open(encoding="utf-8", newline="") as file:
        for entry in csv.DictReader(file):
            if entry["topic"] not in ("", "NA"):
                table.setdefault(entry["item_id"], []).append((entry["coder"], entry["topic"]))
    return table


def decide(item, coder):
    """Two coders in three say the same of an item, by its number alone."""
    labels = ("delay", "cancellation", "crew", "comfort")
    number = int(item[1:])
    return labels[(number + (number % 3 == 0 and coder == "Ilse")) % 4]


THREE = ("--coder", "Maren", "--coder", "Yusuf", "--coder", "Ilse")


def test_a_coding_goes_out_comes_back_and_is_scored(ferry, capsys):
    """Alpha of coding 2 is that of the labels typed in, by the slow twin; collecting twice is once."""
    drawn = json_of(capsys, "recode", ferry, "--items", 60, *THREE)
    assert (drawn["coding"], drawn["n_items"], drawn["n_population"]) == (2, 60, 300)
    assert [sheet["n_rows"] for sheet in drawn["worksheets"]] == [60, 60, 60]
    given = code(ferry, decide)
    collected = json_of(capsys, "collect", ferry)
    assert (collected["accepted"], collected["codings"]["accepted"]) == (0, 180)
    assert collected["codings"]["splits"] == []
    again = json_of(capsys, "collect", ferry)
    assert (again["codings"]["accepted"], again["codings"]["unchanged"]) == (0, 180)
    score = json_of(capsys, "score", ferry, "--coding", 2)["variables"][0]
    wanted = twin.alpha_by_definition(given, twin.nominal)
    assert score["alpha"] == pytest.approx(float(wanted.alpha), rel=1e-12)
    assert json_of(capsys, "score", ferry, "--coding", 1) == json_of(capsys, "score", ferry)
    status = json_of(capsys, "status", ferry)
    assert [sheet["n_answered"] for sheet in status["codings"][0]["worksheets"]] == [60, 60, 60]
    assert status["next"].startswith("relook rescore")


def test_two_codings_of_the_same_items_are_paired(ferry, capsys):
    """The difference is of alphas on the shared items, each by the slow twin."""
    json_of(capsys, "recode", ferry, "--items", 60, *THREE)
    given = code(ferry, decide)
    json_of(capsys, "collect", ferry)
    held = json_of(capsys, "rescore", ferry)["codings"]
    change = held["variables"][0]["change"]
    before = first_coding(ferry)
    shared = {item: before[item] for item in given if len(before.get(item, ())) > 1}
    assert (change["paired"], change["n_shared_items"]) == (True, len(shared))
    first = twin.alpha_by_definition(shared, twin.nominal).alpha
    second = twin.alpha_by_definition({item: given[item] for item in shared}, twin.nominal).alpha
    assert change["first_alpha"] == pytest.approx(float(first), rel=1e-9)
    assert change["second_alpha"] == pytest.approx(float(second), rel=1e-9)
    assert change["difference"] == pytest.approx(float(second - first), rel=1e-9)
    low, high = change["interval"]["low"], change["interval"]["high"]
    assert low < change["difference"] < high
    out, _ = said(capsys, "rescore", ferry)
    assert "topic: coding 1 and coding 2" in out
    assert f"on the {len(shared)} items that both codings share" in out
    assert "paired: an item is drawn with the labels of both codings" in out
    assert "Other coders coded" in out


def test_new_items_are_compared_unpaired(ferry, capsys):
    """Items that only the item table has can be coded; without shared items nothing is paired."""
    table = ferry / "items" / "remarks.csv"
    header, *lines = table.read_text(encoding="utf-8").splitlines()
    fresh = [
        line.replace(line.split(",")[0], f"n{at:03d}", 1) for at, line in enumerate(lines[:40])
    ]
    table.write_text("\n".join([header, *fresh]) + "\n", encoding="utf-8")
    labels = ferry / "labels" / "labels.csv"
    json_of(capsys, "recode", ferry, "--items", 340, *THREE)
    drawn = set(json_of(capsys, "recode", ferry, "--items", 340, "--dry-run", *THREE)["items"])
    assert {f"n{at:03d}" for at in range(40)} <= drawn
    code(ferry, lambda item, coder: decide(item, coder) if item.startswith("n") else None)
    json_of(capsys, "collect", ferry)
    change = json_of(capsys, "rescore", ferry)["codings"]["variables"][0]["change"]
    assert (change["paired"], change["n_shared_items"]) == (False, 0)
    first = twin.alpha_by_definition(first_coding(ferry), twin.nominal).alpha
    assert change["first_alpha"] == pytest.approx(float(first), rel=1e-12)
    out, _ = said(capsys, "rescore", ferry)
    assert "unpaired: the items of each coding are drawn on their own" in out
    assert labels.exists()


def test_a_sheet_holds_nobodys_labels(ferry, capsys):
    """No coder of the first coding and no other coder's name is in a sheet; each has its own order."""
    json_of(capsys, "recode", ferry, "--items", 80, *THREE)
    sheets = sorted((ferry / "codings" / "02" / "worksheets").glob("*.xlsx"))
    orders = []
    for file in sheets:
        data = file.read_bytes()
        text = every_text(data)
        others = {"Maren", "Yusuf", "Ilse"} - {file.stem.split("-", 2)[2]}
        assert not any(name in text for name in ({"c01", "c02", "c03", "c04", "c05"} | others))
        sheet = load_workbook(io.BytesIO(data))["Items"]
        at = columns_of(sheet)
        assert not {"decision", "reason", "label 1"} & set(at)
        assert all(
            sheet.cell(row, at["label"]).value is None for row in range(2, sheet.max_row + 1)
        )
        orders.append([sheet.cell(row, at["item"]).value for row in range(2, sheet.max_row + 1)])
    assert len({tuple(order) for order in orders}) == 3
    assert len({frozenset(order) for order in orders}) == 1


def test_what_a_sheet_offers_does_not_depend_on_the_labels_given(ferry, tmp_path, capsys):
    """Projects whose coders said other things give the same sheets, byte for byte."""
    other = tmp_path / "other"
    shutil.copytree(ferry, other)
    for project in (ferry, other):
        (project / ".relook").mkdir()
        (project / ".relook" / "secret").write_text("0123456789abcdef" * 4, encoding="ascii")
    table = other / "labels" / "labels.csv"
    text = table.read_text(encoding="utf-8")
    table.write_text(text.replace("delay", "TEMP").replace("crew", "delay").replace("TEMP", "crew"))
    for project in (ferry, other):
        json_of(capsys, "recode", project, "--items", 40, *THREE)
    for file in (ferry / "codings" / "02" / "worksheets").iterdir():
        assert (
            other / "codings" / "02" / "worksheets" / file.name
        ).read_bytes() == file.read_bytes()


def test_slips_are_listed_and_the_rest_is_taken(ferry, capsys):
    """A misspelt label is named with its cell, "cannot be coded" counts as missing, the order is free."""
    json_of(capsys, "recode", ferry, "--items", 30, *THREE)
    code(ferry, decide)
    file = ferry / "codings" / "02" / "returned" / "coding-02-Ilse.xlsx"
    book = load_workbook(file)
    sheet = book["Items"]
    at = columns_of(sheet)
    rows = [[cell.value for cell in row] for row in sheet.iter_rows(min_row=2)]
    for number, row in enumerate(sorted(rows, key=str, reverse=True), start=2):
        for column, value in enumerate(row, start=1):
            sheet.cell(number, column).value = value
    sheet.cell(2, at["label"]).value = "cancelation"
    sheet.cell(3, at["label"]).value = "cannot be coded"
    sheet.cell(4, at["label"]).value = None
    sheet.cell(5, at["remark"]).value = "edited"
    book.save(file)
    held = json_of(capsys, "collect", ferry, code=1)["codings"]
    assert (held["accepted"], held["blank"]) == (88, 1)
    (wrong,) = held["rejected"]
    assert (wrong["row"], wrong["mend"]) == (2, 'change the cell to "cancellation"')
    # The row whose text was edited still has a decision that is taken, and the edit is told.
    assert [edit["row"] for edit in held["edited"]] == [5]
    score = json_of(capsys, "score", ferry, "--coding", 2)["variables"][0]
    assert score["n_labels"] == 87
    text, _ = said(capsys, "rescore", ferry)
    assert "2 of 90 rows are still open" in text


def test_only_unseen_items_are_drawn_and_that_is_said(ferry, capsys):
    """Items of a round's worksheets take no part, nor do those of an earlier coding."""
    json_of(capsys, "queue", ferry)
    sent = json.loads((ferry / "rounds" / "01" / "round.json").read_text(encoding="utf-8"))["rows"]
    shown = {row["item"] for row in sent}
    drawn = json_of(capsys, "recode", ferry, "--items", 50, "--unseen", *THREE)
    assert not shown & set(drawn["items"])
    assert drawn["n_shown"] == len(shown)
    later = json_of(capsys, "recode", ferry, "--items", 50, "--unseen", *THREE)
    assert later["coding"] == 3
    assert not set(drawn["items"]) & set(later["items"])
    text, _ = said(capsys, "recode", ferry, "--items", 10, "--unseen", "--dry-run", *THREE)
    assert "alpha of this coding will be high for that reason" in text


def test_worksheets_and_coding_sheets_are_told_apart(ferry, tmp_path, capsys):
    """Both kinds in one heap each go to their own record, wherever they lie."""
    json_of(capsys, "queue", ferry)
    json_of(capsys, "recode", ferry, "--items", 20, *THREE)
    code(ferry, decide)
    heap = tmp_path / "heap"
    heap.mkdir()
    for file in (ferry / "codings" / "02" / "returned").glob("*.xlsx"):
        shutil.move(file, heap / f"again {file.name}")
    sheet = next((ferry / "rounds" / "01" / "worksheets").glob("*.xlsx"))
    book = load_workbook(sheet)
    queue = book["Queue"]
    at = columns_of(queue)
    queue.cell(2, at["decision"]).value = "delay"
    book.save(heap / "decided.xlsx")
    held = json_of(capsys, "collect", ferry, heap)
    assert (held["accepted"], held["codings"]["accepted"]) == (1, 60)
    text, _ = said(capsys, "collect", ferry, heap, "--strict")
    assert "collected 1 worksheet" in text
    assert "collected 3 coding sheets" in text


def test_strict_takes_all_of_both_kinds_or_none(ferry, tmp_path, capsys):
    """One wrong cell in a coding sheet holds back a good worksheet too."""
    json_of(capsys, "queue", ferry)
    json_of(capsys, "recode", ferry, "--items", 20, *THREE)
    code(ferry, lambda item, coder: "nonsense" if coder == "Ilse" else "delay")
    sheet = next((ferry / "rounds" / "01" / "worksheets").glob("*.xlsx"))
    book = load_workbook(sheet)
    queue = book["Queue"]
    queue.cell(2, columns_of(queue)["decision"]).value = "delay"
    book.save(ferry / "rounds" / "01" / "returned" / "decided.xlsx")
    held = json_of(capsys, "collect", ferry, "--strict", code=1)
    assert (held["accepted"], held["held_back"], held["codings"]["held_back"]) == (0, True, True)
    assert not list((ferry / "decisions").glob("*.jsonl"))
    assert not list((ferry / "codings" / "record").glob("*.jsonl"))


def test_one_coder_codes_an_item_again_in_a_later_coding(ferry, capsys):
    """Labels of two codings by the same people of the same items stay apart."""
    for _ in range(2):
        json_of(capsys, "recode", ferry, "--items", 300, *THREE)
    code(ferry, lambda item, coder: "delay", number=2)
    code(ferry, decide, number=3)
    held = json_of(capsys, "collect", ferry)["codings"]
    assert (held["accepted"], held["superseded"]) == (1800, 0)
    assert json_of(capsys, "score", ferry, "--coding", 2, code=0)["variables"][0]["alpha"] is None
    assert json_of(capsys, "score", ferry, "--coding", 3)["variables"][0]["alpha"] > 0.5
    assert json_of(capsys, "rescore", ferry)["codings"]["coding"] == 3
    assert json_of(capsys, "rescore", ferry, "--coding", 2)["codings"]["coding"] == 2


def test_the_record_of_a_coding_is_made_anew_from_kept_sheets(ferry, capsys):
    """A lost file of the record comes back with the same bytes."""
    json_of(capsys, "recode", ferry, "--items", 20, *THREE)
    code(ferry, decide)
    json_of(capsys, "collect", ferry)
    (file,) = (ferry / "codings" / "record").glob("*.jsonl")
    before = file.read_bytes()
    file.unlink()
    said(capsys, "collect", ferry, "--rebuild")
    assert file.read_bytes() == before


def test_without_a_number_the_published_rule_decides(ferry, capsys):
    """The rule's number for alpha .8 and the rarest label's share; it is more than there are."""
    drawn = json_of(capsys, "recode", ferry, "--dry-run")
    assert (drawn["needed_items"], drawn["n_items"]) == (302, 300)
    assert drawn["coders"] == ["c01", "c02", "c03", "c04", "c05"] or drawn["same_coders"]
    text, _ = said(capsys, "recode", ferry, "--dry-run")
    assert "302 were asked for, and there are no more" in text
    assert "Bloch & Kraemer 1989" in text
    assert not (ferry / "codings").exists()


@pytest.mark.parametrize(
    ("arguments", "message"),
    [
        (("--by", "rout"), 'the item table has no column "rout"'),
        (("--overlap", "9"), "9 of 5 coders cannot code each item"),
        (("--coder", "Ilse"), "1 of 1 coders cannot code each item"),
        (("--coder", "Ilse", "--coder", " Ilse "), 'the coder "Ilse" is named twice'),
        (("--variable", "topics"), '"topics"'),
    ],
)
def test_what_cannot_be_is_told_with_a_mend(ferry, capsys, arguments, message):
    """Nothing is written, and the message says what to do."""
    _, err = said(capsys, "recode", ferry, "--items", 20, *arguments, code=2)
    assert message in err
    assert "mend: " in err
    assert not list(ferry.glob("codings/*/round.json"))


def test_a_coding_that_is_not_there_or_not_back_is_told(ferry, capsys):
    """Each with what to do."""
    _, err = said(capsys, "score", ferry, "--coding", 2, code=2)
    assert "there is no coding 2" in err
    json_of(capsys, "recode", ferry, "--items", 20, *THREE)
    _, err = said(capsys, "score", ferry, "--coding", 2, code=2)
    assert "no label of coding 2 is back yet" in err
    _, err = said(capsys, "rescore", ferry, "--coding", 2, code=2)
    assert "no label of coding 2 is back yet" in err


def test_several_variables_are_asked_item_by_item(tmp_path, capsys):
    """An item's rows stand together; numbers and ordered labels are taken as in worksheets."""
    guild = copy_sample("guild_loaves", tmp_path)
    drawn = json_of(capsys, "recode", guild, "--items", 12, *THREE)
    sheet = load_workbook(drawn["worksheets"][0]["file"])["Items"]
    at = columns_of(sheet)
    pairs = [
        (sheet.cell(row, at["item"]).value, sheet.cell(row, at["variable"]).value)
        for row in range(2, sheet.max_row + 1)
    ]
    names = drawn["variables"]
    assert len(pairs) == 12 * len(names)
    for begin in range(0, len(pairs), len(names)):
        assert len({item for item, _ in pairs[begin : begin + len(names)]}) == 1
        assert [name for _, name in pairs[begin : begin + len(names)]] == names
    if len(names) > 1:
        only = json_of(capsys, "recode", guild, "--items", 12, "--variable", names[0], *THREE)
        assert only["variables"] == names[:1]
    _, err = said(capsys, "recode", guild, *THREE, code=2)
    assert "no published rule says how many items" in err
