"""A release: every way of settling, nothing chosen in silence, everything checkable."""

import csv
import io
import json
from collections import Counter

import pytest
from openpyxl import load_workbook

from reference.concluded_project import (
    Ruling,
    make_project,
    rule,
    send_round,
    write_labels,
)
from relook.errors import RelookError
from relook.project.corrections.correcting import compare_with, record_correction
from relook.project.release.release_files import check_release, write_release
from relook.project.release.releasing import ReleaseRequest, formula_like, make_release
from relook.project.setup.folder import Project
from relook.project.setup.loading import load

STAMP = "2031-03-01T09:00:00+00:00"
LABELS = {
    "unanimous": [("c1", "a"), ("c2", "a")],
    "consensus": [("c1", "a"), ("c2", "a"), ("c3", "b")],
    "decided": [("c1", "a"), ("c2", "b"), ("c3", "b")],
    "impossible": [("c1", "a"), ("c2", "b")],
    "split": [("c1", "a"), ("c2", "c")],
    "tie": [("c1", "b"), ("c2", "a")],
    "single": [("c1", "c")],
    "unconfirmed": [("c1", "b"), ("c2", "b")],
    "nothing": [("c1", "")],
    "withdrawn": [("c1", "a"), ("c2", "a"), ("c3", "c")],
}
RULINGS = [
    Ruling("decided", "a", reason="coder slip"),
    Ruling("impossible", None, reason="context missing"),
    Ruling("split", "a"),
    Ruling("split", "b", by="a-BEN"),
    Ruling("unconfirmed", "a", kind="audit"),
    Ruling("withdrawn", "c"),
]


@pytest.fixture
def project(tmp_path):
    made = make_project(tmp_path / "p", LABELS)
    send_round(
        made,
        LABELS,
        {each.item: each.kind for each in RULINGS},
        strata={"unanimous": (4, 1), "not queued": (3, 0), "single": (1, 0)},
    )
    rule(made, LABELS, RULINGS)
    rule(made, LABELS, [Ruling("withdrawn", None, withdrawn=True)], minute=1)
    return made


def released(project, **options):
    return make_release(project, ReleaseRequest(**options), STAMP)


def rows_of(release, name="final_labels.csv"):
    return list(csv.DictReader(io.StringIO(release.files[name].decode("utf-8"))))


def by_item(release):
    return {row["item"]: row for row in rows_of(release)}


def test_every_item_is_released_with_how_it_was_settled(project):
    """Each way of settling, its label and its support."""
    found = by_item(released(project))
    got = {
        item: (row["settled_by"], row["label"], row["support"], row["n_labels"])
        for item, row in found.items()
    }
    assert got == {
        "unanimous": ("unanimous", "a", "2", "2"),
        "consensus": ("consensus", "a", "2", "3"),
        "decided": ("decision", "a", "1", "3"),
        "impossible": ("cannot be coded", "", "0", "2"),
        "split": ("split", "", "0", "2"),
        "tie": ("tie", "", "0", "2"),
        "single": ("single", "c", "1", "1"),
        "unconfirmed": ("unconfirmed", "b", "2", "2"),
        "nothing": ("no label", "", "0", "0"),
        "withdrawn": ("consensus", "a", "2", "3"),
    }
    assert list(found) == list(LABELS)
    decided = found["decided"]
    assert (decided["round"], decided["reason"], decided["adjudicators"]) == (
        "1",
        "coder slip",
        "a-ADA",
    )
    assert found["split"]["candidates"] == "a | b"
    assert found["unconfirmed"]["candidates"] == "a"
    assert found["tie"]["candidates"] == "a | b"


def test_ties_and_splits_take_a_label_only_by_a_rule_that_is_named(project):
    """most-used: the candidate that coders used most; the row says which rule it was."""
    found = by_item(released(project, ties="most-used"))
    for item in ("tie", "split"):
        assert (found[item]["label"], found[item]["rule"]) == ("a", "most-used")
        assert found[item]["settled_by"] == item
    assert (found["impossible"]["label"], found["impossible"]["rule"]) == ("", "")
    assert {row["rule"] for row in found.values()} == {"", "most-used"}


def test_the_random_rule_is_the_same_each_time_and_spreads(tmp_path):
    """Keyed by item and project, so a check draws the same; both candidates occur."""
    labels = {f"i{at:03d}": [("c1", "a"), ("c2", "b")] for at in range(60)}
    project = make_project(tmp_path / "p", labels)
    one, two = (rows_of(released(project, ties="random")) for _ in range(2))
    assert one == two
    drawn = Counter(row["label"] for row in one)
    assert set(drawn) == {"a", "b"}
    assert min(drawn.values()) >= 15


def test_the_corrected_table_has_the_layout_of_the_input(project):
    """Same header, rows and order; only cells of settled items differ."""
    data = released(project).files["corrected/labels.csv"].decode("utf-8")
    before = (project.root / "labels.csv").read_text(encoding="utf-8").splitlines()
    changed = {old: new for old, new in zip(before, data.splitlines(), strict=True) if old != new}
    assert changed == {
        "decided,c2,b": "decided,c2,a",
        "decided,c3,b": "decided,c3,a",
        "impossible,c1,a": "impossible,c1,",
        "impossible,c2,b": "impossible,c2,",
    }


def test_the_corrected_table_reads_as_the_corrected_data(project):
    """Alpha's arithmetic on the corrected table gives the printed agreement."""
    release = released(project)
    write_release(project, project.root / "release", release.files)
    again = project.root / "again"
    again.mkdir()
    settings = (project.root / "relook.toml").read_text(encoding="utf-8")
    (again / "relook.toml").write_text(
        settings.replace('"labels.csv"', '"../release/corrected/labels.csv"'), encoding="utf-8"
    )
    figure = load(Project.open(again)).agreements["topic"].alpha
    (held,) = release.rescored.variables
    assert figure == pytest.approx(held.corrected.after.agreement, rel=1e-12)


def test_a_table_by_coder_keeps_its_columns_and_delimiter(tmp_path):
    """Semicolons stay semicolons, columns that are no label stay as they are."""
    root = tmp_path / "p"
    root.mkdir()
    (root / "labels.csv").write_text("item;c1;c2;site\ni1;a;b;x, y\ni2;a;a;z\n", encoding="utf-8")
    (root / "relook.toml").write_text(
        'format = 1\nproject = "madeforatest"\n[labels]\nfiles = ["labels.csv"]\n'
        'layout = "by-coder"\nitem = "item"\ncoders = ["c1", "c2"]\n[variables.topic]\n',
        encoding="utf-8",
    )
    project = Project.open(root)
    rule(project, {"i1": [("c1", "a"), ("c2", "b")]}, [Ruling("i1", "b")])
    data = released(project).files["corrected/labels.csv"].decode("utf-8")
    assert data == "item;c1;c2;site\ni1;b;b;x, y\ni2;a;a;z\n"


def test_repeated_rows_are_corrected_together(tmp_path):
    """A row that repeats a label does not contradict the corrected one beside it."""
    labels = {"i1": [("c1", "a"), ("c1", "a"), ("c2", "b")]}
    project = make_project(tmp_path / "p", labels)
    rule(project, labels, [Ruling("i1", "b")])
    data = released(project).files["corrected/labels.csv"].decode("utf-8")
    assert data.splitlines()[1:] == ["i1,c1,b", "i1,c1,b", "i1,c2,b"]


def test_counts_get_final_labels_and_a_note_instead(tmp_path):
    """There is no coder's label to correct in a table of counts."""
    root = tmp_path / "p"
    root.mkdir()
    (root / "labels.csv").write_text("item,a,b\ni1,2,1\ni2,0,3\n", encoding="utf-8")
    (root / "relook.toml").write_text(
        'format = 1\nproject = "x"\n[labels]\nfiles = ["labels.csv"]\nlayout = "counts"\n'
        'item = "item"\n[variables.topic]\nlabels = ["a", "b"]\n',
        encoding="utf-8",
    )
    release = released(Project.open(root))
    assert [row["label"] for row in rows_of(release)] == ["a", "b"]
    assert not [name for name in release.files if name.startswith("corrected/")]
    assert "no corrected table" in release.notes[0]


def test_labels_that_look_like_formulas_stay_exact_and_are_told(tmp_path):
    """The CSV holds the very label, the workbook a text cell, and a note warns."""
    labels = {"=1+1": [("c1", "=cmd()"), ("c2", "=cmd()")], "i2": [("c1", "-1"), ("c2", "-1")]}
    release = released(make_project(tmp_path / "p", labels))
    assert [(row["item"], row["label"]) for row in rows_of(release)] == [
        ("=1+1", "=cmd()"),
        ("i2", "-1"),
    ]
    assert release.notes == (
        (
            '2 ids or labels begin with =, +, - or @ ("=1+1", "=cmd()"). The CSV files hold them '
            "exactly as they are, and a spreadsheet program may run them as formulas: open "
            "final_labels.xlsx instead, whose cells are text."
        ),
    )
    sheet = load_workbook(io.BytesIO(release.files["final_labels.xlsx"]))["Final labels"]
    cells = [sheet.cell(2, column) for column in (1, 3)]
    assert [(cell.value, cell.data_type) for cell in cells] == [("=1+1", "s"), ("=cmd()", "s")]
    assert not formula_like("-1.5")
    assert formula_like("@SUM(A1)")


def test_adjudicators_are_pseudonyms_unless_names_are_asked_for(tmp_path):
    """By default no file of a release holds a name of relook.toml."""
    extra = '[worksheet]\nadjudicators = ["Ada Lovelorn"]\n'
    labels = {"i1": [("c1", "a"), ("c2", "b")]}
    project = make_project(tmp_path / "p", labels, extra=extra)
    from relook.worksheet.keys import adjudicator_id

    person = adjudicator_id(project.secret(), "Ada Lovelorn")
    rule(project, labels, [Ruling("i1", "a", by=person)])
    plain, named = released(project), released(project, names=True)
    texts = [data for name, data in plain.files.items() if not name.endswith(".xlsx")]
    assert not any(b"Lovelorn" in data for data in texts)
    assert rows_of(plain)[0]["adjudicators"] == person
    assert rows_of(named)[0]["adjudicators"] == "Ada Lovelorn"


def test_the_methods_statement_carries_each_figure_with_its_condition(project):
    """Sentence by sentence, on the made case."""
    said = released(project).files["methods.txt"].decode("utf-8")
    first = load(project).agreements["topic"]
    for sentence in (
        (
            'On "topic", 9 items were given 20 labels by 3 coders; 8 items have two labels or more '
            "(19 labels, which alpha is of), and coders differ on 6 of them."
        ),
        (
            "Krippendorff's alpha of the labels as they were before the first round of second looks "
            "(nominal differences) is "
            f"{first.alpha:.3f} (observed disagreement {first.observed_disagreement:.4g}, expected "
            f"{first.expected_disagreement:.4g}; Krippendorff 2004; 95% interval "
        ),
        (
            "5 items were sent for a second look: 4 chosen by their contribution to the disagreement "
            "(ties by doubt where it is defined, then by intensity) and 1 drawn at random as an audit. "
            "1 of them has no ruling and is released like "
            "items that were not sent. 2 adjudicators ruled on the others, shown the competing "
            "labels, but not who or how many had given them: 1 item was settled, 1 found impossible "
            "to code, 1 remained split."
        ),
        (
            "So that audit items could not be told from the others, they were shown with further "
            "labels that nobody had given. 2 adjudicators share 1 item and agree on 0."
        ),
        (
            "1 ruling against unanimous coders was not confirmed by a second adjudicator and not "
            "applied."
        ),
        "decided items agree by construction, so this is not a reliability. Had each of them taken",
        (
            "no share is estimated, as no audit item was ruled on among the items that are not queued "
            "or single."
        ),
        (
            "Released are 6 final labels of 10 items (unanimous 1, consensus 2, decision 1, cannot be "
            "coded 1, split 1, tie 1, single 1, unconfirmed 1, no label 1; 4 blank)."
        ),
        "Ties and splits are blank.",
        "Krippendorff, K. (2004).",
    ):
        assert sentence in said, sentence


def test_changed_labels_are_not_called_independent(project):
    """The release stops as a rescore does; with --relabelled the statement withholds the word."""
    write_labels(project.root / "labels.csv", {**LABELS, "decided": [("c1", "a"), ("c2", "a")]})
    with pytest.raises(RelookError, match="not those of the first round"):
        released(project)
    said = released(project, relabelled=True).files["methods.txt"].decode("utf-8")
    assert "made independently" not in said
    assert "are not independent" in said


def test_a_label_version_can_be_released_and_is_said(project):
    """Its labels are released; alpha stays that of the labels first given."""
    corrected = {**LABELS, "tie": [("c1", "a"), ("c2", "a")]}
    write_labels(project.root.parent / "new.csv", corrected)
    record_correction(compare_with(load(project), [project.root.parent / "new.csv"]), STAMP)
    release = released(project, version=1)
    assert by_item(release)["tie"]["settled_by"] == "unanimous"
    said = release.files["methods.txt"].decode("utf-8")
    assert "1 changed, of which 1 toward the other coders' labels and 0 away from them" in said
    assert f"is {load(project).agreements['topic'].alpha:.3f} (observed" in said
    write_release(project, project.root / "release", release.files)
    assert check_release(project, project.root / "release").holds


def write(project, force=False, **options):
    folder = project.root / "release"
    write_release(project, folder, released(project, **options).files, force=force)
    return folder


def test_a_release_is_written_whole_and_holds(project):
    """Every file of the manifest is there, and nothing else is left behind."""
    folder = write(project)
    manifest = json.loads((folder / "release.json").read_text(encoding="utf-8"))
    there = {p.relative_to(folder).as_posix() for p in folder.rglob("*") if p.is_file()}
    assert there == {*manifest["files"], "release.json"}
    assert not [p for p in project.root.iterdir() if p.name.startswith(".release")]
    found = check_release(project, folder)
    assert (found.holds, found.n_labels, found.problems) == (True, 10, ())


def test_a_release_is_replaced_only_when_told_and_never_with_foreign_files(project):
    """Without --force it stays; with it, files that no release wrote are not lost."""
    folder = write(project)
    with pytest.raises(RelookError, match="a release already"):
        write(project)
    before = (folder / "final_labels.csv").read_bytes()
    write(project, force=True, ties="most-used")
    assert (folder / "final_labels.csv").read_bytes() != before
    (folder / "notes.txt").write_text("mine")
    with pytest.raises(RelookError, match=r'no release wrote: "notes.txt"'):
        write(project, force=True)
    assert (folder / "notes.txt").read_text() == "mine"


@pytest.mark.parametrize("name", ["final_labels.csv", "methods.txt", "corrected/labels.csv"])
def test_a_changed_or_lost_file_is_found(project, name):
    """A byte more, or no file at all."""
    folder = write(project)
    with (folder / name).open("ab") as file:
        file.write(b" ")
    (problem,) = check_release(project, folder).problems
    assert problem.message == "a released file was changed after the release"
    assert problem.where.file == f"release/{name}"
    (folder / name).unlink()
    assert [p.message for p in check_release(project, folder).problems] == [
        "a released file is gone"
    ]


def test_a_forged_label_is_found_even_with_its_digest(project):
    """Label and digest changed together: the record gives another label."""
    import hashlib

    folder = write(project)
    forged = (
        (folder / "final_labels.csv").read_bytes().replace(b"decided,topic,a", b"decided,topic,c")
    )
    (folder / "final_labels.csv").write_bytes(forged)
    manifest = json.loads((folder / "release.json").read_text(encoding="utf-8"))
    manifest["files"]["final_labels.csv"] = hashlib.sha256(forged).hexdigest()
    (folder / "release.json").write_text(json.dumps(manifest), encoding="utf-8")
    (problem,) = check_release(project, folder).problems
    assert "not those that the label files and the record give" in problem.message


def test_later_decisions_are_told_by_whether_they_matter(project):
    """One that changes nothing is a note; one that changes a label fails the check."""
    folder = write(project)
    rule(project, LABELS, [Ruling("unanimous", "a", kind="audit")], minute=2)
    rule(project, LABELS, [Ruling("unanimous", None, kind="audit", withdrawn=True)], minute=3)
    found = check_release(project, folder)
    assert (found.holds, found.n_newer_decisions) == (True, 2)
    assert [p.severity for p in found.problems] == ["note"]
    rule(project, LABELS, [Ruling("tie", "b")], minute=4)
    found = check_release(project, folder)
    assert not found.holds
    assert "would change the release" in found.problems[0].message


def test_other_label_files_and_a_lost_record_are_found(project):
    """A release rests on both."""
    folder = write(project)
    kept = (project.root / "labels.csv").read_bytes()
    write_labels(project.root / "labels.csv", {**LABELS, "tie": [("c1", "a")]})
    assert "not the one that was released" in check_release(project, folder).problems[0].message
    (project.root / "labels.csv").write_bytes(kept)
    sorted((project.root / "decisions").iterdir())[-1].unlink()
    assert "is gone" in check_release(project, folder).problems[0].message


def test_a_folder_without_a_release_is_no_release(project):
    """The mend says how to make one; a broken manifest is told as such."""
    with pytest.raises(RelookError, match="no release in this folder"):
        check_release(project, project.root / "release")
    folder = write(project)
    (folder / "release.json").write_text("[]")
    with pytest.raises(RelookError, match=r"not a readable release\.json"):
        check_release(project, folder)


def test_the_project_folder_itself_is_never_a_release(project):
    """--to must not sweep away the project."""
    with pytest.raises(RelookError, match="a folder of its own"):
        write_release(project, project.root, {"a": b""}, force=True)
    assert (project.root / "relook.toml").exists()


def test_the_same_record_gives_the_same_bytes(project):
    """Every file of a release, workbook included."""
    assert released(project).files == released(project).files


def test_more_labels_than_a_sheet_holds_come_as_csv_alone(project, monkeypatch):
    """The workbook is left out and a note says so; nothing is cut."""
    monkeypatch.setattr("relook.project.release.releasing.MOST_SHEET_LABELS", 9)
    release = released(project)
    assert "final_labels.xlsx" not in release.files
    assert len(rows_of(release)) == 10
    assert release.notes[-1] == "A sheet holds 9 labels at most, so there is no final_labels.xlsx."


def test_decimal_commas_stay_decimal_commas(tmp_path):
    """Decisions are recorded with a point; the release writes numbers as the table does."""
    labels = {
        "i1": [("c1", "1,5"), ("c2", "4")],
        "i2": [("c1", "1,5"), ("c2", "2")],
        "i3": [("c1", "0,5"), ("c2", "0,5")],
    }
    project = make_project(tmp_path / "p", labels, difference="interval", extra='decimal = ","\n')
    rule(project, labels, [Ruling("i1", "2.5")])
    release = released(project)
    assert [(row["label"], row["settled_by"]) for row in rows_of(release)] == [
        ("2,5", "decision"),
        ("1,75", "consensus"),
        ("0,5", "unanimous"),
    ]
    corrected = release.files["corrected/labels.csv"].decode("utf-8").splitlines()
    assert corrected[1:3] == ['i1,c1,"2,5"', 'i1,c2,"2,5"']


def test_sets_that_nobody_gave_can_be_decided_and_released(tmp_path):
    """Elements in any order are one set; a new set enters the corrected data."""
    labels = {"i1": [("c1", "x;y"), ("c2", "y")], "i2": [("c1", "z"), ("c2", "z")]}
    project = make_project(tmp_path / "p", labels, difference="jaccard", extra='separator = ";"\n')
    rule(project, labels, [Ruling("i1", "y;z")])
    release = released(project)
    assert [row["label"] for row in rows_of(release)] == ["y;z", "z"]
    (held,) = release.rescored.variables
    assert held.corrected.after.observed_disagreement == 0
    assert {(move.old, move.new) for move in held.moves} == {("x;y", "y;z"), ("y", "y;z")}
