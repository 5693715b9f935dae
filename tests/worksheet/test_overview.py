"""The lead's workbook."""

from __future__ import annotations

import io
import shutil
import subprocess
from dataclasses import replace
from pathlib import Path

import pytest
from openpyxl import load_workbook

from reference.made_sheets import converted, formulas_of, parts_of
from relook.worksheet.overview import (
    CoderRow,
    Figure,
    GroupRow,
    LabelPairRow,
    Overview,
    ProspectRow,
    RankedRow,
    write_overview,
)

LABELS = ("delay", "crew", "=1+1")


def made_overview(coders: tuple[str, ...] = ("ana", "bo", "cy")) -> Overview:
    ranking = tuple(
        RankedRow(
            rank=at + 1,
            item=f"=r{at}",
            variable="topic",
            contribution=0.012345678901 / (at + 1),
            share=0.1,
            cumulative_share=0.1 * (at + 1),
            alpha_cost=None if at == 1 else 0.02,
            doubt=0.25 if at == 0 else None,
            consensus="delay",
            tie=at == 2,
            settled_alpha=0.6,
            text="The boat was late.",
            labels=tuple((coder, LABELS[(at + n) % 3]) for n, coder in enumerate(coders)),
            adjudicators=("Ada", "Ben"),
        )
        for at in range(4)
    )
    return Overview(
        title="Ferry remarks",
        round=1,
        stamp="2031-02-03T04:05:06Z",
        figures=(
            Figure(variable="topic", name="alpha", value=0.5512, conditions="200 items"),
            Figure(variable="tone", name="alpha", value=None, conditions="nothing pairable"),
            Figure(name="items queued", value=4, conditions="bound by --top"),
        ),
        notes=("The queue was bound by --top 4.",),
        ranking=ranking,
        coders=tuple(
            CoderRow(
                variable="topic", coder=coder, contribution=0.1, share=1 / 3, n_labels=200,
                share_of_labels=1 / 3, involved=0.6, own_alpha=0.5,
            )
            for coder in coders
        ),
        label_pairs=(
            LabelPairRow(variable="topic", first="crew", second="delay", contribution=0.2, share=0.8),
            LabelPairRow(variable="topic", first="=1+1", second="delay", contribution=0.05, share=0.2),
        ),
        label_order=(("topic", LABELS),),
        groups=(
            GroupRow(variable="topic", column="route", group="north", n_items=90,
                     contribution=0.1, share=0.4),
        ),
        prospect=tuple(
            ProspectRow(variable="topic", n_settled=at, low=0.5 + at / 100, high=0.5 + at / 50)
            for at in range(5)
        ),
    )  # fmt: skip


def grid(data: bytes, title: str) -> list[list[object]]:
    sheet = load_workbook(io.BytesIO(data))[title]
    return [[cell.value for cell in row] for row in sheet.iter_rows()]


def test_the_sheets_are_those_that_have_something_to_say() -> None:
    """A sheet per table; an empty overview keeps its summary and ranking."""
    assert load_workbook(io.BytesIO(write_overview(made_overview()))).sheetnames == [
        "Summary", "Ranking", "Coders", "Label pairs", "Heat table", "Groups", "Prospect",
    ]  # fmt: skip
    empty = Overview(title="", round=1, stamp="2031-02-03T04:05:06Z")
    assert load_workbook(io.BytesIO(write_overview(empty))).sheetnames == ["Summary", "Ranking"]


def test_figures_stand_with_their_conditions_and_undefined_is_a_dash() -> None:
    """Full precision in the cell, a dash for undefined, whole numbers shown whole."""
    data = write_overview(made_overview())
    rows = grid(data, "Summary")
    assert rows[4] == ["topic: alpha", 0.5512, "200 items"]
    assert rows[5] == ["tone: alpha", "–", "nothing pairable"]
    assert rows[6] == ["items queued", 4, "bound by --top"]
    sheet = load_workbook(io.BytesIO(data))["Summary"]
    assert [sheet.cell(row, 2).number_format for row in (5, 7)] == ["0.0000", "#,##0"]
    assert any("not a reliability" in str(row[0]) for row in rows)


def test_the_ranking_shows_the_arithmetic_and_labels_by_coder() -> None:
    """A column per coder; numbers exact; ties said."""
    rows = grid(write_overview(made_overview()), "Ranking")
    assert rows[0] == [
        "rank", "item", "text", "contribution to D_o", "share of D_o", "cumulative share",
        "alpha cost", "doubt", "consensus", "agreement with this item settled",
        "ana", "bo", "cy", "sent to",
    ]  # fmt: skip
    assert rows[1][:5] == [1, "=r0", "The boat was late.", 0.012345678901, 0.1]
    assert rows[2][6:8] == ["–", "–"]
    assert rows[3][8] == "delay (tie)"
    assert rows[1][10:] == ["delay", "crew", "=1+1", "Ada, Ben"]


def test_a_crowds_labels_stand_in_one_cell() -> None:
    """Beyond twelve coders a column each would be a wall."""
    coders = tuple(f"coder {at}" for at in range(13))
    rows = grid(write_overview(made_overview(coders)), "Ranking")
    assert "labels by coder" in rows[0]
    assert "coder 12: delay" in str(rows[1][rows[0].index("labels by coder")])


def test_two_coders_are_not_drawn_as_a_ranking() -> None:
    """Their parts are equal by construction, and the sheet says so instead of drawing bars."""
    parts = parts_of(write_overview(made_overview(("ana", "bo"))))
    assert not any("by coder" in part for name, part in parts.items() if "charts/" in name)
    said = str(grid(write_overview(made_overview(("ana", "bo"))), "Coders"))
    assert "equal by construction" in said


def test_the_heat_table_is_symmetric_in_the_code_books_order() -> None:
    """Pairs that never met are zero; a label with itself is empty."""
    assert grid(write_overview(made_overview()), "Heat table")[1:] == [
        [None, "delay", "crew", "=1+1"],
        ["delay", None, 0.8, 0.2],
        ["crew", 0.8, None, 0],
        ["=1+1", 0.2, 0, None],
    ]


def test_charts_are_native_and_their_axes_are_there() -> None:
    """Three charts, each with both axes and a title."""
    parts = parts_of(write_overview(made_overview()))
    charts = [part for name, part in sorted(parts.items()) if name.startswith("xl/charts/chart")]
    assert len(charts) == 3
    for chart in charts:
        assert chart.count('delete val="0"') == 2
        assert 'delete val="1"' not in chart
        assert 'smooth val="1"' not in chart
    titles = ("Share of D_o by coder", "Share of D_o by pair of labels", "Prospect")
    for chart, title in zip(charts, titles, strict=True):
        assert title in chart


def test_nothing_in_it_is_a_formula() -> None:
    """Item ids and labels that begin with = stay text here too."""
    assert formulas_of(write_overview(made_overview())) == []


def test_same_overview_same_bytes() -> None:
    """And another stamp changes the properties only."""
    data = write_overview(made_overview())
    assert data == write_overview(made_overview())
    later = parts_of(write_overview(replace(made_overview(), stamp="2032-01-01T00:00:00Z")))
    changed = [name for name, part in parts_of(data).items() if later[name] != part]
    assert changed == ["docProps/core.xml"]


@pytest.mark.libreoffice
def test_charts_are_drawn_by_another_program(tmp_path: Path) -> None:
    """LibreOffice prints titles, axis titles, legend and the names at the axes."""
    pdf = converted(write_overview(made_overview()), tmp_path, "xlsx", "pdf")
    reader = shutil.which("pdftotext")
    if reader is None:
        pytest.skip("pdftotext is not on the path")
    run = subprocess.run([reader, "-", "-"], input=pdf, capture_output=True, check=True)
    said = run.stdout.decode()
    for words in (
        "Share of D_o by coder", "Share of D_o by pair of labels", "share of the observed",
        "Prospect: agreement in the corrected data", "cautious end", "items settled, from the top",
        "crew / delay",
    ):  # fmt: skip
        assert words in said
