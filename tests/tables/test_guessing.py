"""Layouts are told from bare tables, said, and open to correction."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import pytest

from relook.tables.guessing import Guess, Overrides, guess
from relook.tables.labels import read_labels


def guessed(root: Path, files: dict[str, str], **told: Any) -> Guess:
    """Write files and guess what they mean."""
    for name, text in files.items():
        (root / name).write_text(text, encoding="utf-8")
    return guess(list(files), Overrides(**told), root)


LONG = "item_id,coder,stance\n1,x,for\n1,y,against\n2,x,for\n2,y,for\n"
WIDE = "doc,ann1,ann2,ann3\n1,pos,neg,pos\n2,neg,neg,\n3,pos,pos,neg\n4,neg,pos,pos\n"
GRID = "id,tone_a,tone_b,topic_a,topic_b\n1,1,2,x,y\n2,2,2,y,y\n3,1,1,x,x\n"
COUNTS = "item,yes,no,unsure\n1,3,1,0\n2,4,0,0\n3,0,3,1\n4,0,0,4\n"


@pytest.mark.parametrize(
    ("text", "layout", "item", "coder", "coders", "pattern", "variables"),
    [
        (LONG, "long", "item_id", "coder", (), None, ["stance"]),
        (WIDE, "by-coder", "doc", None, ("ann1", "ann2", "ann3"), None, ["label"]),
        (GRID, "by-coder", "id", None, (), "{variable}_{coder}", ["tone", "topic"]),
        (COUNTS, "counts", "item", None, (), None, ["label"]),
        (
            "a_tone,b_tone,a_pace,b_pace,n\nhi,hi,1,2,k\nlo,hi,2,2,l\nlo,lo,1,1,m\n",
            "by-coder", "n", None, (), "{coder}_{variable}", ["tone", "pace"],
        ),
        (
            "stance_c1,stance_c2,item\nfor,against,1\nfor,for,2\nagainst,for,3\n",
            "by-coder", "item", None, (), "{variable}_{coder}", ["stance"],
        ),
        (
            "item,coder 1,coder 2\n1,for,against\n2,for,for\n3,against,for\n",
            "by-coder", "item", None, ("coder 1", "coder 2"), None, ["label"],
        ),
        (
            "a,b,c\n1,x,1\n1,y,2\n2,x,1\n2,y,1\n3,x,1\n3,y,2\n",
            "long", "a", "b", (), None, ["c"],
        ),
        (
            "item,who,date,tone,pace\n1,x,2031-01-01,hi,2\n1,y,2031-01-02,lo,2\n2,x,2031-01-01,lo,1\n2,y,2031-01-01,lo,2\n",
            "long", "item", "who", (), None, ["tone", "pace"],
        ),
    ],
)  # fmt: skip
def test_layouts_are_told(
    tmp_path: Path,
    text: str,
    layout: str,
    item: str,
    coder: str | None,
    coders: tuple[str, ...],
    pattern: str | None,
    variables: list[str],
) -> None:
    """Each common shape is recognised, and what is guessed can be read."""
    held = guessed(tmp_path, {"t.csv": text})
    source = held.source
    found = (source.layout, source.item, source.coder, source.coders, source.columns)
    assert found == (layout, item, coder, coders, pattern)
    assert [variable.name for variable in held.variables] == variables
    data = read_labels(source, held.variables, tmp_path)
    assert all(one.labels.n_labels > 0 for one in data.variables.values())


def test_one_file_per_coder(tmp_path: Path) -> None:
    """Files that hold the same items once each are one coder's each, headers spelt differently."""
    held = guessed(
        tmp_path,
        {
            "ann.csv": "Clip ID,call\n1,heron\n2,rail\n3,heron\n",
            "bo.csv": "clip_id,Call\n1,heron\n2,heron\n3,NA\n",
        },
    )
    data = read_labels(held.source, held.variables, tmp_path)
    assert (held.source.coder_from, data.coders) == ("file", ("ann", "bo"))
    assert data.variables["call"].n_missing == 1


@pytest.mark.parametrize(
    ("labels", "level", "hint"),
    [
        (["1", "2", "3", "1"], "nominal", "interval if equal steps"),
        (["1.5", "2", "3", "1.5"], "ordinal", "interval if equal steps"),
        (["for", "against", "for", "for"], "nominal", "ordinal"),
        (["a;b", "b", "a;b", "b;a"], "nominal", "jaccard:;"),
    ],
)
def test_the_weakest_level_is_taken_and_the_flag_named(
    tmp_path: Path, labels: list[str], level: str, hint: str
) -> None:
    """Numbers may be codes; what else they may be is said with the flag that says so."""
    rows = "".join(f"{at // 2},{'xy'[at % 2]},{label}\n" for at, label in enumerate(labels))
    held = guessed(tmp_path, {"t.csv": "item,coder,label\n" + rows})
    assert held.variables[0].difference == level
    line = next(line for line in held.said if line.startswith("difference function"))
    assert hint in line
    assert line.endswith("(change: --difference)")


def test_only_marks_that_cannot_be_labels_count_as_missing(tmp_path: Path) -> None:
    """A dash and N/A are marks; none and a question mark may be labels."""
    rows = "1,x,-\n1,y,none\n2,x,?\n2,y,N/A\n3,x,none\n3,y,?\n"
    held = guessed(tmp_path, {"t.csv": "item,coder,label\n" + rows})
    assert held.source.missing == ("", "NA", "N/A", "-")


def test_the_item_table_is_found_by_its_keys(tmp_path: Path) -> None:
    """Prose is shown first; a file whose keys match is the item table, another one is not used."""
    items = "key,remark,route\n1,a long remark about the boat,North\n2,another remark about the boat,North\n"
    other = "colour,size\nred,1\nblue,2\n"
    held = guessed(tmp_path, {"t.csv": LONG, "items.csv": items, "other.csv": other})
    assert held.items is not None
    assert (held.items.key, held.items.show[0]) == ("key", "remark")
    assert held.unused == ("other.csv",)
    assert "other.csv: not used, no column holds the items' ids" in held.said


def test_texts_in_the_label_table_are_shown(tmp_path: Path) -> None:
    """A by-coder table with the items' texts is its own item table."""
    text = "id,text,a,b\n1,a text that is long enough to read,p,q\n2,another text that is long enough,q,q\n3,a third text that is long enough,p,p\n"
    held = guessed(tmp_path, {"t.csv": text})
    assert held.items is not None
    assert (held.items.files, held.items.show) == ((Path("t.csv"),), ("text",))


def test_what_is_told_is_not_guessed(tmp_path: Path) -> None:
    """Every override is taken as it is and said as told."""
    held = guessed(
        tmp_path,
        {"t.csv": "k,w,v,z\n1,x,1,p\n1,y,2,q\n2,x,1,p\n2,y,2,p\n"},
        item="k", coder="w", labels=("v",), variable="score", missing=("x",),
        difference={"": "interval"}, duplicates="last", leave_out=("y",),
    )  # fmt: skip
    source, (variable,) = held.source, held.variables
    assert (source.item, source.coder, source.missing) == ("k", "w", ("x",))
    assert (source.duplicates, source.leave_out) == ("last", ("y",))
    assert (variable.name, variable.column, variable.difference) == ("score", "v", "interval")
    assert 'items: column "k" (as told)' in held.said


def test_every_guess_says_from_what_and_how_to_change_it(tmp_path: Path) -> None:
    """Each guessed line gives its ground and its flag."""
    held = guessed(tmp_path, {"t.csv": LONG})
    assert len(held.guesses) >= 5
    assert all(line.because and line.change.startswith("--") for line in held.guesses)


def test_the_marsh_calls_are_told_from_their_mess() -> None:
    """Four spreadsheets with odd headers and an item table, as the sample project has them."""
    root = Path(__file__).parents[2] / "sample_projects" / "marsh_calls"
    held = guess(["coders/*", "recordings.csv"], None, root)
    assert (held.source.coder_from, held.source.item, held.source.remark) == (
        "file",
        "clip id",
        "Notes",
    )
    assert [variable.name for variable in held.variables] == ["call_heard"]
    assert held.source.missing == ("", "NA", "N/A", "-")
    assert held.items is not None
    assert held.items.key == "clip_id"


def test_a_coder_with_a_space_in_the_name_is_one_coder(tmp_path: Path) -> None:
    """Category Bert K. is Bert K.'s column of the one variable that all columns are of."""
    file = tmp_path / "wide.csv"
    file.write_text(
        "Ticket,Text,Category Anna,Category Bert K.,Category Dov\n"
        "1,hello there,Billing,Refund,Billing\n2,hi there you,Refund,Refund,Refund\n"
        "3,what is this,Login,Login,Billing\n4,no idea at all,Billing,Login,Billing\n",
        encoding="utf-8",
    )
    said = " ".join(guess([file]).said)
    assert 'coders: "Anna", "Bert K.", "Dov"' in said
    assert "Category Bert" not in said.replace("Category Bert K.", "")
