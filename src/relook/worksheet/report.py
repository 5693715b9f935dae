"""A workbook of tables, each with its notes and, where it helps, a chart of its own cells.

For the lead. Everything in it is a plain value made elsewhere; only where things stand on the page
is decided here.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

from openpyxl import Workbook
from openpyxl.utils import get_column_letter
from openpyxl.worksheet.worksheet import Worksheet as OpenpyxlSheet

from relook.cells.writing import put_text
from relook.worksheet import palette
from relook.worksheet.looks import Look, Looks
from relook.worksheet.overview_charts import add_bars
from relook.worksheet.overview_model import Figure
from relook.worksheet.overview_table import (
    FIGURE,
    TableColumn,
    Value,
    finish,
    write_note,
    write_table,
)
from relook.worksheet.packing import new_workbook, packed
from relook.worksheet.page import set_height

MOST_BARS = 20


@dataclass(frozen=True, slots=True, kw_only=True)
class ReportChart:
    """Bars of one column of shares, named by another; columns are counted from 1.

    The rows of one variable, which the first column names, have a chart of their own.
    """

    title: str
    value_title: str
    names: int
    values: int


@dataclass(frozen=True, slots=True, kw_only=True)
class ReportTable:
    """One sheet: a table, sentences below it, a chart beside it.

    Attributes
    ----------
    title : str
        Of the sheet.
    columns : tuple of TableColumn
    rows : tuple of tuple
        None is undefined and written as a dash.
    notes : tuple of str
    chart : ReportChart or None
    """

    title: str
    columns: tuple[TableColumn, ...]
    rows: tuple[tuple[Value, ...], ...]
    notes: tuple[str, ...] = ()
    chart: ReportChart | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class Report:
    """A whole workbook.

    Attributes
    ----------
    title, subtitle : str
    stamp : str
        ISO time to record in it.
    figures : tuple of Figure
        The first sheet.
    notes : tuple of str
        Below the figures.
    tables : tuple of ReportTable
        A sheet each; those without rows are left out.
    """

    title: str
    subtitle: str
    stamp: str
    figures: tuple[Figure, ...]
    notes: tuple[str, ...] = ()
    tables: tuple[ReportTable, ...] = ()


def write_report(report: Report) -> bytes:
    """Write a report as an .xlsx file.

    Parameters
    ----------
    report : Report

    Returns
    -------
    bytes
        The same ones for the same report.
    """
    book = new_workbook(f"{report.title}: {report.subtitle}")
    looks = Looks(book)
    footer = f"{report.title} · {report.subtitle} · for the lead only: names coders"
    _write_summary(book, looks, report, footer)
    for table in report.tables:
        if table.rows:
            _write_table_sheet(book, looks, table, footer)
    book.active = 0
    return packed(book, report.stamp)


def _write_summary(book: Workbook, looks: Looks, report: Report, footer: str) -> None:
    sheet = book.create_sheet("Summary")
    page = Look(below=None, wrap=False, down="center", across="left", indent=1)
    put_text(sheet, 1, 1, report.title, looks[replace(page, size=20, bold=True)])
    set_height(sheet, 1, 34)
    put_text(sheet, 2, 1, report.subtitle, looks[replace(page, size=11, colour=palette.GREY)])
    several = len({figure.variable for figure in report.figures}) > 1
    columns = [
        TableColumn("figure", 44),
        TableColumn("value", 14, FIGURE, bold=True),
        TableColumn("conditions", 90),
    ]
    rows: list[Sequence[Value]] = [
        (
            f"{figure.variable}: {figure.name}" if several and figure.variable else figure.name,
            figure.value,
            figure.conditions,
        )
        for figure in report.figures
    ]
    last = write_table(sheet, looks, columns, rows, top=4)
    for row, note in enumerate(report.notes, start=last + 2):
        write_note(sheet, looks, row, note, (1, 3), size=10.5)
    finish(sheet, footer, freeze=None)


def _write_table_sheet(book: Workbook, looks: Looks, table: ReportTable, footer: str) -> None:
    sheet = book.create_sheet(table.title)
    last = write_table(sheet, looks, table.columns, table.rows)
    for row, note in enumerate(table.notes, start=last + 2):
        write_note(sheet, looks, row, note, (1, len(table.columns)))
    if table.chart is not None:
        _draw(sheet, table, table.chart)
    finish(sheet, footer)


def _draw(sheet: OpenpyxlSheet, table: ReportTable, chart: ReportChart) -> None:
    """Draw a chart for each run of rows of one variable, below one another."""
    variables = [str(row[0]) for row in table.rows]
    starts = [at for at, name in enumerate(variables) if at == 0 or variables[at - 1] != name]
    letter = get_column_letter(len(table.columns) + 2)
    corner = 3  # the first row is repeated on every page, a chart must not begin in it
    for begin, end in zip(starts, [*starts[1:], len(variables)], strict=True):
        title = f"{chart.title}: {variables[begin]}" if len(starts) > 1 else chart.title
        add_bars(
            sheet,
            f"{letter}{corner}",
            title=title,
            value_title=chart.value_title,
            names=(chart.names, begin + 2, min(end, begin + MOST_BARS) + 1),
            values=chart.values,
        )
        corner += 34
