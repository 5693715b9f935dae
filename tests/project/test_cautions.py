"""What `queue` says before worksheets go out, and what it leaves unsaid."""

from __future__ import annotations

from pathlib import Path

from reference.concluded_project import make_project
from relook.project.figures.ordering import order_items
from relook.project.sending.cautions import cautions_of
from relook.project.setup.loading import load

WORDS = ("agree", "against")


def cautions(folder: Path, labels: dict[str, list[tuple[str, str]]], **options: str) -> list[str]:
    loaded = load(make_project(folder / "p", labels, **options))
    return list(cautions_of(loaded, order_items(loaded, loaded.project.settings.queue, seed=1)))


def table(odd: str = "agree", third: bool = False) -> dict[str, list[tuple[str, str]]]:
    return {
        f"i{at:02d}": [
            ("c1", WORDS[at % 2]),
            ("c2", odd if at == 3 else WORDS[(at // 2) % 2]),
            *([("c3", "agree"), ("c4", "against")] if third and at % 2 else []),
        ]
        for at in range(12)
    }


def test_labels_that_differ_by_next_to_nothing_are_named(tmp_path: Path) -> None:
    """Of "Agree" beside "agree": said first, with what to do; not where labels are numbers."""
    first, *_ = cautions(tmp_path, table(odd="Agree"))
    assert first.startswith("Labels of topic that differ by next to nothing count as different")
    assert '"agree" and "Agree"' in first
    assert not any("next to nothing" in said for said in cautions(tmp_path / "b", table()))


def test_sheets_without_texts_or_meanings_are_told(tmp_path: Path) -> None:
    """No item table and no code book: both are said once."""
    said = cautions(tmp_path, table())
    assert sum("ids and labels alone" in each for each in said) == 1
    assert sum("No code book says what the labels of topic mean" in each for each in said) == 1


def test_unequal_numbers_of_labels_are_told(tmp_path: Path) -> None:
    """Two labels on some disputed items and four on others; with two everywhere nothing."""
    (unequal,) = (each for each in cautions(tmp_path, table(third=True)) if "have 2 to 4" in each)
    assert "--rank-by doubt or intensity does not favour them" in unequal
    assert not any("--rank-by" in each for each in cautions(tmp_path / "b", table()))
