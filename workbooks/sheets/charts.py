"""Charts of what varies along a beam: one or more columns of a table against the column of x."""

from __future__ import annotations

from collections.abc import Sequence
from typing import NamedTuple

from openpyxl.chart import Reference, ScatterChart, Series
from openpyxl.chart.axis import ChartLines
from openpyxl.chart.legend import Legend
from openpyxl.chart.shapes import GraphicalProperties
from openpyxl.chart.text import RichText, Text
from openpyxl.chart.title import Title
from openpyxl.drawing.line import LineProperties
from openpyxl.drawing.text import CharacterProperties, Paragraph, RegularTextRun
from openpyxl.utils import column_index_from_string
from openpyxl.worksheet.worksheet import Worksheet

from sheets import paper


class Line(NamedTuple):
    """One line of a chart: the column that it draws, its name and its ink."""

    column: str
    name: str
    ink: str


class Place(NamedTuple):
    """The cell at the upper left corner of a chart, its width and its height [cm]."""

    anchor: str
    width: float
    height: float


def along(
    sheet: Worksheet,
    place: Place,
    title: str,
    x: str,
    rows: tuple[int, int],
    lines: Sequence[Line],
    *,
    upward: bool,
    digits: str = "0",
) -> None:
    """Draw columns of a table against its column `x`; several lines are named in a legend."""
    chart = ScatterChart(scatterStyle="lineMarker")
    for line in lines:
        y, stations = (_column(sheet, column, rows) for column in (line.column, x))
        series = Series(y, stations, title=line.name)
        series.marker.symbol = "none"
        series.smooth = False
        series.graphicalProperties.line.solidFill = line.ink
        series.graphicalProperties.line.width = 22_000
        chart.series.append(series)
    chart.legend = Legend() if len(lines) > 1 else None
    if chart.legend:
        chart.legend.position = "b"
    chart.title = _heading(title)
    if not upward:
        chart.y_axis.scaling.orientation = "maxMin"
    chart.x_axis.delete = chart.y_axis.delete = False
    chart.x_axis.tickLblPos = "low" if upward else "high"
    chart.roundedCorners = False
    for axis in (chart.x_axis, chart.y_axis):
        axis.majorGridlines = ChartLines(GraphicalProperties(ln=LineProperties(solidFill=paper.PALE)))
    chart.x_axis.number_format, chart.y_axis.number_format = "0", digits
    chart.width, chart.height = place.width, place.height  # type: ignore[assignment]
    sheet.add_chart(chart, place.anchor)


def _column(sheet: Worksheet, letter: str, rows: tuple[int, int]) -> Reference:
    column = column_index_from_string(letter)
    return Reference(sheet, column, rows[0], column, rows[1])


def _heading(text: str) -> Title:
    """Return the title of a chart in the size of the sheet's own headings."""
    look = CharacterProperties(sz=1000, b=True, solidFill=paper.INK)
    run = RegularTextRun(rPr=look, t=text)
    return Title(tx=Text(rich=RichText(p=[Paragraph(r=[run])])), overlay=False)
