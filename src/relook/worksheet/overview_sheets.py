"""The sheets of the lead's overview."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import replace

from openpyxl import Workbook
from openpyxl.formatting.rule import ColorScale, FormatObject, Rule
from openpyxl.styles.colors import Color
from openpyxl.utils import get_column_letter
from openpyxl.worksheet.pagebreak import Break
from openpyxl.worksheet.worksheet import Worksheet as OpenpyxlSheet

from relook.cells.writing import put_text
from relook.worksheet import layout, palette
from relook.worksheet.looks import Look, Looks
from relook.worksheet.overview_charts import add_bars, add_prospect
from relook.worksheet.overview_model import LabelPairRow, Overview
from relook.worksheet.overview_table import (
    COUNT,
    FIGURE,
    PERCENT,
    TableColumn,
    Value,
    finish,
    write_note,
    write_table,
)
from relook.worksheet.page import set_height

#: Beyond this many coders their labels stand in one cell.
MOST_CODER_COLUMNS = 12
MOST_BARS = 20
_NOT_A_RELIABILITY = (
    "Agreement in the corrected data is what agreement would be once decisions are put in. It is "
    "not a reliability: the corrected labels were not made independently."
)
_NO_JUDGEMENT = (
    "A part can be large because a coder made many labels, or met the hard items. Compare it with "
    "the share of labels, and read some items, before you conclude anything."
)
_TWO_CODERS = (
    "With two coders each takes part in every disagreement, so their parts are equal by "
    "construction. Look at the label pairs instead."
)


def _footer(overview: Overview) -> str:
    return f"{overview.title} · round {overview.round} · for the lead only: names coders"


def write_summary(book: Workbook, looks: Looks, overview: Overview) -> None:
    """Write the first sheet: the figures, each with its conditions, and what to know of them."""
    sheet = book.create_sheet("Summary")
    page = Look(below=None, wrap=False, down="center", across="left", indent=1)
    title = looks[replace(page, size=20, bold=True)]
    grey = looks[replace(page, size=11, colour=palette.GREY)]
    put_text(sheet, 1, 1, overview.title or "Overview", title)
    set_height(sheet, 1, 34)
    put_text(sheet, 2, 1, f"Overview of round {overview.round}, for the lead only", grey)
    several = len({figure.variable for figure in overview.figures}) > 1
    columns = [TableColumn("figure", 40), TableColumn("value", 14, FIGURE, bold=True)]
    columns.append(TableColumn("conditions", 90))
    rows: list[Sequence[Value]] = []
    for figure in overview.figures:
        name = f"{figure.variable}: {figure.name}" if several and figure.variable else figure.name
        rows.append((name, figure.value, figure.conditions))
    last = write_table(sheet, looks, columns, rows, top=4)
    notes = [*overview.notes, _NOT_A_RELIABILITY]
    for row, note in enumerate(notes, start=last + 2):
        write_note(sheet, looks, row, note, (1, 3), size=10.5)
    finish(sheet, _footer(overview), freeze=None)


def write_ranking(book: Workbook, looks: Looks, overview: Overview) -> None:
    """Write the queue in the order of its ranking, with labels by coder."""
    sheet = book.create_sheet("Ranking")
    rows = overview.ranking
    coders = _in_order(coder for row in rows for coder, _ in row.labels)
    several = len({row.variable for row in rows}) > 1
    shown = {
        "text": any(row.text for row in rows),
        "doubt": any(row.doubt is not None for row in rows),
        "adjudicators": any(row.adjudicators for row in rows),
        "own": 0 < len(coders) <= MOST_CODER_COLUMNS,
        "joint": len(coders) > MOST_CODER_COLUMNS,
    }
    columns = [TableColumn("rank", 7, COUNT), TableColumn("item", 14)]
    columns += [TableColumn("variable", 14)] if several else []
    columns += [TableColumn("text", 48)] if shown["text"] else []
    columns += [
        TableColumn("contribution to D_o", 13, "0.000000"),
        TableColumn("share of D_o", 9, PERCENT),
        TableColumn("cumulative share", 12, PERCENT),
        TableColumn("alpha cost", 10, "0.000000"),
    ]
    columns += [TableColumn("doubt", 8, "0.00")] if shown["doubt"] else []
    columns += [
        TableColumn("consensus", 16, bold=True),
        TableColumn("agreement with this item settled", 14, FIGURE),
    ]
    columns += [TableColumn(coder, 13) for coder in coders] if shown["own"] else []
    columns += [TableColumn("labels by coder", 40)] if shown["joint"] else []
    columns += [TableColumn("sent to", 16)] if shown["adjudicators"] else []
    lines: list[list[Value]] = []
    for row in rows:
        line: list[Value] = [row.rank, row.item]
        line += [row.variable] if several else []
        line += [row.text] if shown["text"] else []
        line += [row.contribution, row.share, row.cumulative_share, row.alpha_cost]
        line += [row.doubt] if shown["doubt"] else []
        line += [f"{row.consensus} (tie)" if row.tie else row.consensus, row.settled_alpha]
        by_coder = dict(row.labels)
        line += [by_coder.get(coder, "") for coder in coders] if shown["own"] else []
        line += ["; ".join(f"{c}: {label}" for c, label in row.labels)] if shown["joint"] else []
        line += [", ".join(row.adjudicators)] if shown["adjudicators"] else []
        lines.append(line)
    last = write_table(sheet, looks, columns, lines)
    sheet.auto_filter.ref = f"A1:{get_column_letter(len(columns))}{max(2, last)}"
    finish(sheet, _footer(overview), freeze="C2")


def write_coders(book: Workbook, looks: Looks, overview: Overview) -> None:
    """Write each coder's part of the disagreement, and draw it where there are three or more."""
    rows = overview.coders
    if not rows:
        return
    sheet = book.create_sheet("Coders")
    columns = [
        TableColumn("variable", 16),
        TableColumn("coder", 16, bold=True),
        TableColumn("labels", 9, COUNT),
        TableColumn("share of labels", 10, PERCENT),
        TableColumn("contribution to D_o", 13, "0.000000"),
        TableColumn("share of D_o", 10, PERCENT),
        TableColumn("share of D_o involved in", 12, PERCENT),
        TableColumn("own alpha", 10, FIGURE),
    ]
    lines = [
        (
            row.variable,
            row.coder,
            row.n_labels,
            row.share_of_labels,
            row.contribution,
            row.share,
            row.involved,
            row.own_alpha,
        )
        for row in rows
    ]
    last = write_table(sheet, looks, columns, lines)
    corner = 3  # the first row is repeated on every page, a chart must not begin in it
    for variable, first, final in _runs([row.variable for row in rows]):
        if final - first + 1 < 3:
            continue
        final = min(final, first + MOST_BARS - 1)
        title = _chart_title("Share of D_o by coder", variable, rows)
        add_bars(
            sheet,
            f"J{corner}",
            title=title,
            value_title="share of the observed disagreement",
            names=(2, first, final),
            values=6,
        )
        corner += 24
    if any(final - first + 1 == 2 for _, first, final in _runs([row.variable for row in rows])):
        write_note(sheet, looks, last + 2, _TWO_CODERS, (1, 8))
    else:
        write_note(sheet, looks, last + 2, _NO_JUDGEMENT, (1, 8))
    finish(sheet, _footer(overview))


def write_label_pairs(book: Workbook, looks: Looks, overview: Overview) -> None:
    """Write the label pairs, heaviest first, and a heat table of each variable."""
    rows = overview.label_pairs
    if not rows:
        return
    sheet = book.create_sheet("Label pairs")
    columns = [
        TableColumn("variable", 16),
        TableColumn("pair", 34, bold=True),
        TableColumn("contribution to D_o", 13, "0.000000"),
        TableColumn("share of D_o", 10, PERCENT),
    ]
    lines = [
        (row.variable, f"{row.first} / {row.second}", row.contribution, row.share) for row in rows
    ]
    write_table(sheet, looks, columns, lines)
    corner = 3  # the first row is repeated on every page, a chart must not begin in it
    for variable, first, final in _runs([row.variable for row in rows]):
        add_bars(
            sheet,
            f"F{corner}",
            title=_chart_title("Share of D_o by pair of labels", variable, rows),
            value_title="share of the observed disagreement",
            names=(2, first, min(final, first + MOST_BARS - 1)),
            values=4,
        )
        corner += 34
    finish(sheet, _footer(overview))
    _write_heat(book, looks, overview)


def _write_heat(book: Workbook, looks: Looks, overview: Overview) -> None:
    sheet = book.create_sheet("Heat table")
    declared = dict(overview.label_order)
    top = 1
    for variable in _in_order(row.variable for row in overview.label_pairs):
        pairs = [row for row in overview.label_pairs if row.variable == variable]
        met = _in_order(label for row in pairs for label in (row.first, row.second))
        labels = [label for label in declared.get(variable, ()) if label in met]
        labels += [label for label in met if label not in labels]
        top = _heat_table(sheet, looks, top, variable, labels, pairs) + 3
    finish(sheet, _footer(overview), freeze=None)


def _heat_table(
    sheet: OpenpyxlSheet,
    looks: Looks,
    top: int,
    variable: str,
    labels: Sequence[str],
    pairs: Sequence[LabelPairRow],
) -> int:
    """Write shares of D_o by pair as a square, symmetric table; return its last row."""
    share = {frozenset((row.first, row.second)): row.share for row in pairs}
    name = f"{variable}: share of D_o by pair of labels"
    put_text(sheet, top, 1, name, looks[Look(size=12, bold=True, below=None, wrap=False)])
    wide = max((min(20.0, layout.display_width(label) + 2) for label in labels), default=8.0)
    columns = [TableColumn("", max(14.0, wide), bold=True)]
    columns += [TableColumn(label, max(8.0, min(12.0, wide)), "0.0%") for label in labels]
    lines: list[list[Value]] = [
        [row_label, *("" if a == b else share.get(frozenset((row_label, column_label)), 0.0)
                      for b, column_label in enumerate(labels))]
        for a, row_label in enumerate(labels)
    ]  # fmt: skip
    last = write_table(sheet, looks, columns, lines, top=top + 1)
    if labels:
        sheet.conditional_formatting.add(
            f"B{top + 2}:{get_column_letter(len(labels) + 1)}{last}",
            Rule(
                type="colorScale",
                colorScale=ColorScale(
                    cfvo=[FormatObject(type="num", val=0), FormatObject(type="max")],
                    color=[Color("FFFFFF"), Color(palette.ramp(8)[-1])],
                ),
            ),
        )
    return last


def write_groups(book: Workbook, looks: Looks, overview: Overview) -> None:
    """Write each group of items and its part of the disagreement."""
    rows = overview.groups
    if not rows:
        return
    sheet = book.create_sheet("Groups")
    columns = [
        TableColumn("variable", 16),
        TableColumn("column", 16),
        TableColumn("group", 26, bold=True),
        TableColumn("items", 9, COUNT),
        TableColumn("contribution to D_o", 13, "0.000000"),
        TableColumn("share of D_o", 10, PERCENT),
        TableColumn("own alpha", 10, FIGURE),
    ]
    lines = [
        (r.variable, r.column, r.group, r.n_items, r.contribution, r.share, r.own_alpha)
        for r in rows
    ]
    last = write_table(sheet, looks, columns, lines)
    sheet.auto_filter.ref = f"A1:G{max(2, last)}"
    finish(sheet, _footer(overview))


def write_prospect(book: Workbook, looks: Looks, overview: Overview) -> None:
    """Write the prospect along the queue, both ends, and draw it."""
    rows = overview.prospect
    if not rows:
        return
    sheet = book.create_sheet("Prospect")
    columns = [
        TableColumn("variable", 16),
        TableColumn("items settled", 9, COUNT),
        TableColumn("cautious end", 11, FIGURE),
        TableColumn("other end", 11, FIGURE),
    ]
    top = 1
    variables = _in_order(row.variable for row in rows)
    for variable in variables:
        lines: list[tuple[str, int, float | None, float | None]] = [
            (r.variable, r.n_settled, r.low, r.high) for r in rows if r.variable == variable
        ]
        last = write_table(sheet, looks, columns, lines, top=top)
        add_prospect(
            sheet,
            f"F{top + 2}",
            title=_chart_title("Prospect: agreement in the corrected data", variable, rows),
            rows=(top, last),
            steps=2,
            low=3,
            least=min((end for line in lines for end in line[2:] if end is not None), default=0.0),
        )
        if variable != variables[-1]:  # the note stays with the last
            sheet.row_breaks.append(Break(id=max(last + 1, top + 23)))
        top = max(last + 2, top + 24)  # the chart is some twenty rows high
    note = (
        "Were every item settled as its consensus label; at the cautious end ties go to the tied "
        "label most used. It can fall. " + _NOT_A_RELIABILITY
    )
    write_note(sheet, looks, top, note, (1, 4))
    finish(sheet, _footer(overview))


def _chart_title(title: str, variable: str, rows: Sequence[object]) -> str:
    several = len({getattr(row, "variable", "") for row in rows}) > 1
    return f"{title}: {variable}" if several else title


def _in_order(texts: Iterable[str]) -> list[str]:
    return list(dict.fromkeys(texts))


def _runs(variables: Sequence[str]) -> list[tuple[str, int, int]]:
    """Return each run of equal variables with its first and last sheet row."""
    runs: list[tuple[str, int, int]] = []
    for row, variable in enumerate(variables, start=2):
        if runs and runs[-1][0] == variable:
            runs[-1] = (variable, runs[-1][1], row)
        else:
            runs.append((variable, row, row))
    return runs
