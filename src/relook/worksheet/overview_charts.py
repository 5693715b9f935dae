"""Native charts of the overview, drawn by the spreadsheet program from the cells beside them."""

from __future__ import annotations

import math

from openpyxl.chart import BarChart, Reference, ScatterChart, Series
from openpyxl.chart.axis import ChartLines
from openpyxl.chart.legend import Legend
from openpyxl.chart.shapes import GraphicalProperties
from openpyxl.chart.text import RichText, Text
from openpyxl.chart.title import Title
from openpyxl.drawing.line import LineProperties
from openpyxl.drawing.text import (
    CharacterProperties,
    Font,
    Paragraph,
    ParagraphProperties,
    RegularTextRun,
)
from openpyxl.worksheet.worksheet import Worksheet as OpenpyxlSheet

from relook.worksheet import palette
from relook.worksheet.looks import FONT

_BLUE, _VERMILLION = palette.OKABE_ITO[5], palette.OKABE_ITO[6]


def add_bars(
    sheet: OpenpyxlSheet,
    anchor: str,
    *,
    title: str,
    value_title: str,
    names: tuple[int, int, int],
    values: int,
) -> None:
    """Draw horizontal bars, the first row on top.

    Parameters
    ----------
    sheet : openpyxl worksheet
    anchor : str
        The cell of the chart's top left corner.
    title, value_title : str
        Of the chart and of the axis of values.
    names : (int, int, int)
        Column, first row and last row of the names.
    values : int
        Column of the values.
    """
    column, first, last = names
    chart = BarChart()
    chart.type = "bar"
    chart.add_data(Reference(sheet, min_col=values, min_row=first, max_row=last))
    chart.set_categories(Reference(sheet, min_col=column, min_row=first, max_row=last))
    chart.legend = None
    chart.gapWidth = 45
    series = chart.series[0]
    series.graphicalProperties = GraphicalProperties(solidFill=_BLUE)
    series.invertIfNegative = False
    chart.x_axis.scaling.orientation = "maxMin"
    chart.y_axis.crosses = "max"
    chart.y_axis.number_format = "0%"
    chart.y_axis.scaling.min = 0
    chart.height = min(16, round(3.6 + 0.62 * (last - first + 1)))
    chart.width = 17
    _dress(chart, title, value_title, None)
    sheet.add_chart(chart, anchor)


def add_prospect(
    sheet: OpenpyxlSheet,
    anchor: str,
    *,
    title: str,
    rows: tuple[int, int],
    steps: int,
    low: int,
    least: float,
) -> None:
    """Draw both ends of the prospect as lines over the number of settled items.

    Parameters
    ----------
    sheet : openpyxl worksheet
    anchor : str
    title : str
    rows : (int, int)
        The table's header, which names the lines, and its last row.
    steps, low : int
        Column of the numbers of settled items, and of the low end; the high end stands right of it.
    least : float
        The least value drawn; the axis begins at the tenth below it and ends at 1.
    """
    header, last = rows
    chart = ScatterChart()
    chart.style, chart.scatterStyle = 13, "lineMarker"
    along = Reference(sheet, min_col=steps, min_row=header + 1, max_row=last)
    dashed = LineProperties(solidFill=_VERMILLION, w=22_000, prstDash="sysDash")
    for column, line in ((low, dashed), (low + 1, LineProperties(solidFill=_BLUE, w=22_000))):
        ends = Reference(sheet, min_col=column, min_row=header, max_row=last)
        series = Series(ends, along, title_from_data=True)
        series.graphicalProperties = GraphicalProperties(ln=line)
        series.smooth = False
        series.marker.symbol = "none"
        chart.series.append(series)
    chart.height, chart.width = 10, 18
    chart.legend = Legend()
    chart.legend.position = "b"
    chart.y_axis.number_format = "0.0#"
    chart.y_axis.scaling.min = max(-1.0, math.floor(least * 10 - 1e-9) / 10)
    chart.y_axis.scaling.max = 1.0
    chart.x_axis.scaling.min = 0
    chart.x_axis.scaling.max = max(1, last - header - 1)
    chart.x_axis.number_format = "0"
    chart.x_axis.majorGridlines = None
    _dress(chart, title, "agreement", "items settled, from the top of the queue")
    sheet.add_chart(chart, anchor)


def _dress(
    chart: BarChart | ScatterChart, title: str, value_title: str, name_title: str | None
) -> None:
    """Give a chart its type, and axes that do not vanish."""
    chart.title = _title(title, 1100, bold=True)
    chart.y_axis.title = _title(value_title, 900, bold=False)
    chart.x_axis.title = _title(name_title, 900, bold=False) if name_title else None
    for axis in (chart.x_axis, chart.y_axis):
        axis.delete = False
        axis.txPr = RichText(
            p=[Paragraph(pPr=ParagraphProperties(defRPr=_letters(900, bold=False)))]
        )
        axis.graphicalProperties = GraphicalProperties(ln=LineProperties(solidFill=palette.GREY))
    chart.y_axis.majorGridlines = ChartLines(
        spPr=GraphicalProperties(ln=LineProperties(solidFill=palette.RULE, w=6_000))
    )
    chart.graphical_properties = GraphicalProperties(ln=LineProperties(noFill=True))


def _title(text: str, size: int, *, bold: bool) -> Title:
    run = RegularTextRun(rPr=_letters(size, bold=bold), t=text)
    return Title(tx=Text(rich=RichText(p=[Paragraph(r=[run])])), overlay=False)


def _letters(size: int, *, bold: bool) -> CharacterProperties:
    return CharacterProperties(sz=size, b=bold, solidFill=palette.INK, latin=Font(typeface=FONT))
