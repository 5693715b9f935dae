"""A check finds everything in one pass, errors first."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import pytest

from relook.tables.checking import check_tables
from relook.tables.findings import MOST, Findings
from relook.tables.guessing import guess
from relook.tables.results import problems_csv
from relook.tables.schema import ItemSource, LabelSource, Variable
from relook.tables.twins import likely_slips, near_twins


def found(
    root: Path, text: str, *, items: str | None = None, show: tuple[str, ...] = (), **said: Any
) -> list[tuple[str, str]]:
    """Return (severity, message) of every problem."""
    (root / "l.csv").write_text(text, encoding="utf-8")
    source = None
    if items is not None:
        (root / "i.csv").write_text(items, encoding="utf-8")
        source = ItemSource(files=(Path("i.csv"),), key="item", show=show)
    variable = Variable(name="label", **said)
    held = LabelSource(files=(Path("l.csv"),), item="item", coder="coder")
    return [(p.severity, p.message) for p in check_tables(held, [variable], source, root).problems]


def table(rows: list[tuple[object, str, str]]) -> str:
    """Return a long label table."""
    return "item,coder,label\n" + "".join(f"{i},{c},{label}\n" for i, c, label in rows)


def steady(n: int = 30) -> list[tuple[object, str, str]]:
    """Return labels with nothing to remark on: n items, two coders, two labels."""
    words = ["ferry", "boat"]
    return [(i, c, words[(i + (i % 7 == 0 and c == "y")) % 2]) for i in range(n) for c in "xy"]


def test_a_sound_table_gives_nothing(tmp_path: Path) -> None:
    """No false alarm on plain labels."""
    assert found(tmp_path, table(steady())) == []


@pytest.mark.parametrize(
    ("first", "second", "how"),
    [
        ("Reed warbler", "reed warbler", "upper and lower case"),
        ("reed  warbler", "reed warbler", "spaces"),
        ("reed\u00a0warbler", "reed warbler", "spaces"),
        ("caf\u00e9", "cafe\u0301", "the Unicode form"),
        ("bittern", "bitt\u0435rn", "letters or marks that look alike"),
        ("Cetti's", "Cetti’s", "letters or marks that look alike"),
        ("reed-warbler", "reed warbler", "hyphens, underscores or a full stop"),
        ("zero\u200bwidth", "zerowidth", "spaces"),
    ],
)
def test_twins_are_told_by_what_they_differ_in(first: str, second: str, how: str) -> None:
    """Each kind of hidden difference is named; the more used text is the one to keep."""
    (pair,) = near_twins({first: 5, second: 2})
    assert (pair.kept, pair.other, pair.how) == (first, second, how)


def test_words_that_differ_are_no_twins() -> None:
    """Different words, and numbers written differently, are left alone."""
    assert near_twins({"reed": 3, "read": 2, "1": 1, "10": 1, "1.0": 1}) == []


def test_a_slip_is_one_letter_from_a_common_label() -> None:
    """Rare and one letter away; numbers and short words are not judged."""
    counts = {"sedge warbler": 40, "sedge wabler": 1, "snipe": 30, "snipes": 9, "12345": 1}
    assert likely_slips(counts) == [("sedge wabler", "sedge warbler")]


def test_warnings_of_each_kind_are_found(tmp_path: Path) -> None:
    """Twins, mixed kinds, a coder with one label, one who always says the same, ids without entry."""
    rows = [
        *steady(),
        (0, "z", "ferry"),
        *((i, "w", "boat") for i in range(6)),
        (3, "v", "Ferry"),
        (4, "v", "7"),
    ]
    items = "item,text,by\n" + "".join(f"0{i},words,x\n" for i in range(9))
    got = found(tmp_path, table(rows), items=items, show=("text", "by"))
    said = " | ".join(message for _, message in got)
    severities = [severity for severity, _ in got]
    assert severities == sorted(severities, key=["error", "warning", "note"].index)
    assert len(set(severities)) == 2
    for piece in (
        'the labels "ferry" (30 times) and "Ferry" (1) differ only by upper and lower case',
        'mix numbers ("7") and words',
        'coder "z" gave one label only',
        'coder "w" gave the same label of "label" every time: "boat", 6 times',
        "30 labelled items without an entry in the item table",
        "9 items of the item table without a label",
        "the shown column seems to name coders",
    ):
        assert piece in said


def test_a_column_that_gives_labels_away_is_told(tmp_path: Path) -> None:
    """A shown column that repeats the labels is a warning."""
    words = ["ferry", "boat"]
    items = "item,topic\n" + "".join(f"{i},{words[i % 2]}\n" for i in range(30))
    got = found(tmp_path, table(steady()), items=items, show=("topic",))
    assert [m for s, m in got if "gives them away" in m and s == "warning"]


def test_coders_who_never_differ_stand_out(tmp_path: Path) -> None:
    """Two coders alike in every one of 40 items while a third differs from both."""
    words = ["a", "b", "c"]
    rows = [(i, c, words[(i * (5 if c == "z" else 1)) % 3]) for i in range(40) for c in "xyz"]
    got = [message for _, message in found(tmp_path, table(rows)) if "to all 40 items" in message]
    assert len(got) == 1
    assert 'coders "x" and "y"' in got[0]


def test_small_and_empty_tables_are_remarked_on(tmp_path: Path) -> None:
    """Too few items, items with one label, one value only."""
    got = " | ".join(
        m for _, m in found(tmp_path, table([(1, "x", "a"), (1, "y", "a"), (2, "x", "a")]))
    )
    assert "only 1 item with two labels" in got
    assert "1 item with one label" in got
    assert 'has one label only, "a", so alpha is undefined' in got


def test_errors_do_not_keep_a_check_from_the_rest(tmp_path: Path) -> None:
    """An undeclared label is an error, and the twins are found all the same."""
    rows = [*steady(), (1, "z", "frry"), (2, "z", "Boat")]
    got = found(tmp_path, table(rows), labels=("ferry", "boat", "Boat"))
    assert got[0] == ("error", '"frry" is not a declared label')
    assert any("differ only by" in message for _, message in got)


def test_problems_beyond_the_limit_are_counted() -> None:
    """The last line says how many are not listed."""
    findings = Findings()
    for at in range(MOST + 3):
        findings.add(f"problem {at}")
    every = findings.sorted()
    assert len(every) == MOST + 1
    assert every[-1].message == "3 more errors are not listed"


def test_the_marsh_calls_have_what_their_readme_says() -> None:
    """One error, the near twins, the slip, and the clips on one side only."""
    root = Path(__file__).parents[2] / "sample_projects" / "marsh_calls"
    held = guess(["coders/*", "recordings.csv"], None, root)
    problems = check_tables(held.source, held.variables, held.items, root).problems
    errors = [p for p in problems if p.severity == "error"]
    assert [str(p.where) for p in errors] == [
        'coders/Quill, Tobias.csv, row 63, column "CALL HEARD"'
    ]
    said = " | ".join(p.message for p in problems)
    for piece in (
        '"Sedge warbler" in row 87',
        '"reed  warbler"',
        '"bitt\u0435rn"',
        '"sedge wabler"',
        '"0364"',
        '"0900"',
    ):
        assert piece in said


def test_problems_as_csv_have_a_column_for_each_part(tmp_path: Path) -> None:
    """Severity, place, message and mend, blank where there is none."""
    findings = Findings()
    findings.add("what, exactly", mend='say "so"')
    assert problems_csv(findings.sorted()).decode() == (
        'severity,file,sheet,row,column,message,mend\nerror,,,,,"what, exactly","say ""so"""\n'
    )
