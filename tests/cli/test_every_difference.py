"""Each difference function the whole way: declared, checked, scored, queued, decided, released.

The tests are parametrised by the list of functions: one that is added without a case here fails.
"""

from __future__ import annotations

import csv
import json
from fractions import Fraction

import pytest
from openpyxl import load_workbook

from reference import by_definition as twin
from reference.loop import SAMPLES, queue_rows
from relook.cli.app import run
from relook.core.differences import DIFFERENCE_FUNCTIONS

CODERS = ("ann", "bo", "cy")
SETS = (
    'separator = ";"\nlabels = ["a", "b", "c"]\n',
    [
        ("a", "a", "a"),
        ("a;b", "b; a", "a;b"),
        ("a", "b;c", "a;c"),
        ("b", "b", "b"),
        ("c", "c", "b;c"),
        ("a;b;c", "a", "b"),
    ],
    "a;c",
    "a;d",
    '"d"',
)
#: Difference function → (TOML of the variable, labels of six items by three coders, a decision for
#: the item that is disputed most, a label that cannot be, what is said of it).
CASES = {
    "nominal": (
        'labels = ["p", "q", "r"]\n',
        ["ppp", "ppq", "pqr", "qqq", "rrr", "rrp"],
        "q",
        "s",
        "is not a declared label",
    ),
    "ordinal": (
        'labels = ["low", "mid", "high"]\n',
        [("low",) * 3, ("low", "mid", "low"), ("low", "mid", "high"), ("high",) * 3, ("mid",) * 3,
         ("high", "mid", "mid")],
        "mid",
        "hihg",
        'change the cell to "high"',
    ),
    "interval": ("", ["111", "112", "139", "222", "333", "344"], "4", "four", "is not a number"),
    "ratio": ("", ["111", "112", "139", "222", "333", "344"], "4", "-2", "is negative"),
    "circular": (
        "period = 12\n",
        [("11", "0", "1"), ("3", "3", "3"), ("6", "7", "6"), ("0", "6", "3"), ("9", "9", "10"),
         ("1", "1", "1")],
        "3",
        "noon",
        "is not a number",
    ),
    "polar": (
        "ends = [0, 10]\n",
        [("0", "0", "1"), ("5", "5", "6"), ("0", "10", "5"), ("9", "9", "9"), ("3", "3", "3"),
         ("10", "10", "9")],
        "5",
        "11",
        "lies outside the ends 0 and 10",
    ),
    "jaccard": SETS,
    "masi": SETS,
    "tree": (
        'separator = "/"\n',
        [("x/a", "x/a", "x/b"), ("x", "x", "x"), ("y/a", "x/a", "y"), ("y/a", "y/a", "y/a"),
         ("x/b", "x/b", "x/b"), ("y", "y/a", "y")],
        "x/a",
        "x//a",
        "empty",
    ),
    "table": (
        'table = "differences.csv"\n',
        ["ppp", "ppq", "pqr", "qqq", "rrr", "rrp"],
        "q",
        "s",
        "is not in the table of differences",
    ),
}  # fmt: skip
TABLE = {("p", "q"): Fraction(1, 4), ("p", "r"): Fraction(1), ("q", "r"): Fraction(1, 2)}


def definition(name):
    """The slow twin's function, and how a label's text becomes what it takes."""
    if name in ("nominal", "ordinal"):
        order = ["low", "mid", "high"]
        return getattr(twin, name), lambda text: order.index(text) if text in order else text
    if name in ("interval", "ratio"):
        return getattr(twin, name), Fraction
    if name == "circular":
        return twin.circular(12), Fraction
    if name == "polar":
        return twin.polar(0, 10), Fraction
    if name in ("jaccard", "masi"):
        return getattr(twin, name), lambda text: frozenset(p.strip() for p in text.split(";"))
    if name == "tree":
        return twin.tree, lambda text: tuple(text.split("/"))
    return twin.listed_table({**TABLE, **{pair[::-1]: apart for pair, apart in TABLE.items()}}), str


def write(folder, name, labels):
    folder.mkdir()
    with (folder / "labels.csv").open("w", encoding="utf-8", newline="") as file:
        writer = csv.writer(file)
        writer.writerow(("item", "coder", "label"))
        writer.writerows(
            (f"i{number}", coder, label)
            for number, row in enumerate(labels)
            for coder, label in zip(CODERS, row, strict=True)
        )
    (folder / "differences.csv").write_text(
        "label,p,q,r\np,0,0.25,1\nq,0.25,0,0.5\nr,1,0.5,0\n", encoding="utf-8"
    )
    (folder / "relook.toml").write_text(
        'format = 1\nproject = "every"\n[labels]\nfiles = ["labels.csv"]\nitem = "item"\n'
        f'coder = "coder"\n[variables.v]\ncolumn = "label"\ndifference = "{name}"\n{CASES[name][0]}'
        '[worksheet]\nadjudicators = ["Ines"]\n',
        encoding="utf-8",
    )
    return folder


def json_of(capsys, *arguments, code=0):
    assert run([*map(str, arguments), "--json", "--quiet"]) == code
    return json.loads(capsys.readouterr().out)


def decide(sheet, item, label):
    """Fill in the decision of one item as the sheet asks for it: a tick per label, or the cell."""
    for row, columns in queue_rows(sheet):
        if str(sheet.cell(row, columns["item"]).value) != item:
            continue
        ticks = {header: at for header, at in columns.items() if header.startswith("has ")}
        if ticks:
            for part in label.split(";"):
                sheet.cell(row, ticks[f"has {part}"]).value = "x"
        else:
            number = (
                label.isdigit() and sheet.cell(row, columns["decision"]).number_format == "General"
            )
            sheet.cell(row, columns["decision"]).value = int(label) if number else label
        return
    raise AssertionError(f"{item} is not in the sheet")


def test_every_function_has_a_case():
    """A function that is not tried the whole way is not there."""
    assert set(CASES) == set(DIFFERENCE_FUNCTIONS)


@pytest.mark.parametrize("name", DIFFERENCE_FUNCTIONS)
def test_from_declaration_to_final_label(name, tmp_path, monkeypatch, capsys):
    """Alpha and each contribution equal the definitions; a decision comes back and is released."""
    monkeypatch.setenv("SOURCE_DATE_EPOCH", "1924992000")
    _, rows, decision, *_ = CASES[name]
    project = write(tmp_path / "p", name, rows)
    assert run(["check", str(project)]) == 0
    capsys.readouterr()
    delta, value_of = definition(name)
    table = {
        f"i{number}": [(coder, value_of(text)) for coder, text in zip(CODERS, row, strict=True)]
        for number, row in enumerate(rows)
    }
    figures = twin.alpha_by_definition(table, delta)
    parts = twin.item_parts(table, delta)
    score = json_of(capsys, "score", project)["variables"][0]
    assert score["alpha"] == pytest.approx(float(figures.alpha), rel=1e-12)
    assert score["observed_disagreement"] == pytest.approx(float(figures.observed), rel=1e-12)
    worst = max(parts, key=lambda item: (float(parts[item]), item))
    (why,) = json_of(capsys, "why", project, worst)["variables"]
    assert why["contribution"] == pytest.approx(float(parts[worst]), rel=1e-12)
    assert run(["why", str(project), worst]) == 0
    assert worst in capsys.readouterr().out
    queued = json_of(capsys, "queue", project, "--top", 9, "--audit", 1)
    assert queued["n_disputed_items"] == sum(part != 0 for part in parts.values())
    file = queued["worksheets"][0]["file"]
    book = load_workbook(file)
    decide(book["Queue"], worst, decision)
    book.save(project / "rounds" / "01" / "returned" / "back.xlsx")
    collected = json_of(capsys, "collect", project)
    assert (collected["accepted"], collected["rejected"]) == (1, [])
    settled = {**table, worst: [(coder, value_of(decision)) for coder in CODERS]}
    after = json_of(capsys, "rescore", project)["variables"][0]["after"]["agreement"]
    wanted = twin.alpha_by_definition(settled, delta).alpha
    assert after == pytest.approx(float(wanted), rel=1e-12)
    assert run(["release", str(project), "--quiet"]) == 0
    capsys.readouterr()
    finals = next((project / "release").glob("*.csv"))
    with finals.open(encoding="utf-8-sig", newline="") as held:
        released = {entry["item"]: entry for entry in csv.DictReader(held)}
    (label,) = [text for key, text in released[worst].items() if key in ("label", "v")]
    assert value_of(label) == value_of(decision)


@pytest.mark.parametrize("name", DIFFERENCE_FUNCTIONS)
def test_a_label_that_cannot_be_is_told_with_its_cell(name, tmp_path, capsys):
    """File, row, column, what is wrong and the mend; every wrong cell in one pass."""
    _, rows, _, wrong, said = CASES[name]
    rows = [list(row) for row in rows]
    rows[1][2] = wrong
    project = write(tmp_path / "p", name, rows)
    assert run(["check", str(project)]) == 1
    held = capsys.readouterr()
    text = " ".join((held.out + held.err).split())
    assert said in text
    assert "row 7" in text
    assert 'column "label"' in text
    assert "mend:" in text
    assert run(["score", str(project)]) == 2
    assert said in " ".join(capsys.readouterr().err.split())


@pytest.mark.parametrize(
    ("lines", "said"),
    [
        ("label,p,q,r\np,0,0.25,1\nq,0.3,0,0.5\nr,1,0.5,0\n", "is not the same both ways"),
        ("label,p,q,r\np,0,-1,1\nq,-1,0,0.5\nr,1,0.5,0\n", "is negative"),
        ("label,p,q,r\np,2,0.25,1\nq,0.25,0,0.5\nr,1,0.5,0\n", "itself"),
        ("label,p,q,r\np,0,near,1\nq,near,0,0.5\nr,1,0.5,0\n", "near"),
        ("label,p,q\np,0,0.25\nq,0.25,0\nr,1,0.5\n", '"r"'),
    ],
)
def test_a_table_that_is_none_is_told_with_its_cell(lines, said, tmp_path, capsys):
    """Asymmetric, negative, not 0 to itself, no number, not square: each with file and row."""
    project = write(tmp_path / "p", "table", CASES["table"][1])
    (project / "differences.csv").write_text(lines, encoding="utf-8")
    assert run(["score", str(project)]) == 2
    text = " ".join(capsys.readouterr().err.split())
    assert said in text
    assert "differences.csv" in text
    assert "mend:" in text


@pytest.mark.parametrize(
    ("word", "said"),
    [
        ("circular", "circular differences need"),
        ("circular:zero", "zero"),
        ("circular:0", "0"),
        ("polar:10,0", "the first of `ends` must be below the second"),
        ("polar:1", "two numbers"),
        ("nominal:3", "nominal differences take no option"),
        ("intervall", 'did you mean "interval"?'),
        ("table:nowhere.csv", "nowhere.csv"),
    ],
)
def test_a_word_that_is_no_function_is_told_with_its_mend(word, said, tmp_path, capsys):
    """As `--difference` on a bare table."""
    project = write(tmp_path / "p", "interval", CASES["interval"][1])
    assert run(["score", str(project / "labels.csv"), "--difference", word]) == 2
    text = " ".join(capsys.readouterr().err.split())
    assert said in text
    assert "mend:" in text


@pytest.mark.parametrize(
    ("name", "distance"), [("jaccard", "jaccard_distance"), ("masi", "masi_distance")]
)
def test_the_choruses_of_the_sample_equal_nltk(name, distance, capsys):
    """Sets from the file to alpha: NLTK's agreement task with its own distance, to 12 digits."""
    metrics = pytest.importorskip("nltk.metrics")
    from nltk.metrics.agreement import AnnotationTask

    file = SAMPLES / "marsh_calls" / "choruses.csv"
    with file.open(encoding="utf-8", newline="") as held:
        triples = [
            (entry["listener"], entry["clip"],
             frozenset(part.strip() for part in entry["birds"].split(";")))
            for entry in csv.DictReader(held)
        ]  # fmt: skip
    several = {clip for _, clip, _ in triples if sum(item == clip for _, item, _ in triples) > 1}
    task = AnnotationTask(
        [triple for triple in triples if triple[1] in several], getattr(metrics, distance)
    )
    found = json_of(capsys, "score", file, "--difference", f"{name}:;")["variables"][0]
    assert found["alpha"] == pytest.approx(task.alpha(), rel=1e-12)


@pytest.mark.parametrize("name", DIFFERENCE_FUNCTIONS)
def test_so_many_labels_are_refused_only_where_every_two_are_compared(
    name, tmp_path, monkeypatch, capsys
):
    """With the limit at two labels: functions with a closed form go on, the others say the limit."""
    monkeypatch.setattr("relook.project.setup.loading.MOST_COMPARED", 2)
    project = write(tmp_path / "p", name, CASES[name][1])
    closed = name in ("nominal", "ordinal", "interval", "circular")
    assert run(["score", str(project)]) == (0 if closed else 2)
    text = " ".join(capsys.readouterr().err.split())
    assert ("compare every two of them, which is done up to 2" in text) == (not closed)
    assert DIFFERENCE_FUNCTIONS[name].compares_every_two != closed


def test_the_figures_in_the_readme_of_the_choruses(capsys):
    """0.074 as single labels, 0.541 by Jaccard, 0.443 by MASI, as the sample's README says."""
    folder = SAMPLES / "marsh_calls"
    text = (folder / "README.md").read_text(encoding="utf-8")
    for word in (None, "jaccard:;", "masi:;"):
        how = () if word is None else ("--difference", word)
        found = json_of(capsys, "score", folder / "choruses.csv", *how)["variables"][0]["alpha"]
        assert f"{found:.3f}" in text


def test_undeclared_elements_of_a_set_are_told(tmp_path, capsys):
    """The slip among the choruses, with its cell and the mend."""
    file = SAMPLES / "marsh_calls" / "choruses.csv"
    birds = "bittern,Cetti's warbler,cuckoo,moorhen,reed warbler,sedge warbler,water rail,none"
    how = ("--difference", "masi:;", "--declare", f"birds={birds}", "--into", str(tmp_path / "m"))
    assert run(["new", str(file), *how, "--yes", "--quiet"]) == 0
    assert run(["check", str(tmp_path / "m")]) == 1
    held = capsys.readouterr()
    text = " ".join((held.out + held.err).split())
    assert '"bitern" is not a declared label' in text
    assert 'change the cell to "bittern"' in text
