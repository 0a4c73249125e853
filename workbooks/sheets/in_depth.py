"""One beam in depth: laid out over cells, its loads in a table, its results in arrays."""

from __future__ import annotations

from openpyxl.chart import Reference, ScatterChart, Series
from openpyxl.chart.axis import ChartLines
from openpyxl.chart.shapes import GraphicalProperties
from openpyxl.chart.text import RichText, Text
from openpyxl.chart.title import Title
from openpyxl.drawing.line import LineProperties
from openpyxl.drawing.text import CharacterProperties, Paragraph, RegularTextRun
from openpyxl.utils import get_column_letter
from openpyxl.worksheet.worksheet import Worksheet

from sheets import paper, schedule
from sheets.called import Called
from sheets.design import Design, LaidOut

NAME = "Runway"
TABLE = 13
"""The row of the first load and of the first support."""
LOAD_ROWS = 9
LOAD_HEADERS = (
    ("load", ""),
    ("size", "kN, kN/m, kNm, m"),
    ("end size", "kN/m"),
    ("from", "m"),
    ("to", "m"),
    ("at", "m"),
    ("span", ""),
    ("support", ""),
    ("case", ""),
)
PHRASE = 25
"""The row of the first phrase."""
PHRASES = (
    ("moment max", "kNm", "0.0"),
    ("position of moment max", "m", "0.000"),
    ("moment min", "kNm", "0.0"),
    ("position of moment min", "m", "0.000"),
    ("moment at 3 in span 1", "kNm", "0.0"),
    ("shear max", "kN", "0.0"),
    ("shear min", "kN", "0.0"),
    ("shear at 1.2 left", "kN", "0.0"),
    ("deflection max", "m", "0.0000"),
    ("position of deflection max", "m", "0.000"),
    ("deflection min", "m", "0.0000"),
    ("total load", "kN", "0.0"),
)
STATION = 27
"""The row of the first station."""
STEPS = 31
"""The number of equal steps between the stations."""


STRENGTH, CHARACTERISTIC = (schedule.combination(kind) for kind in schedule.COMBINATIONS)


def cells_of(beam: LaidOut, sheet: str = "") -> Called:
    """Return the beam as formulas of this sheet name it, or with `sheet` those of others."""
    last = get_column_letter(1 + len(beam.line))
    return Called(
        mark=f"{sheet}$A$7",
        where=f"{sheet}$A$3",
        line=f"{sheet}$B$7:${last}$7",
        loads=f"{sheet}$A${TABLE - 1}:$I${TABLE + LOAD_ROWS - 1}",
        stiffness=f"{sheet}$B$8:${last}$8",
        lengths=f"{sheet}$B$7:${last}$7",
        pads=tuple(f"{sheet}$P${TABLE + i}" for i, _ in enumerate(beam.pads)),
    )


def draw(sheet: Worksheet, design: Design) -> None:
    """Draw the beam, its load table, reactions, results by phrase, stations and diagrams."""
    beam = design.laid_out
    design.issue.draw(
        sheet,
        3,
        f"Beam {beam.mark} in depth",
        beam.where,
        left="A:I",
        block=("K:L", "M:N", "O:P", "Q:R"),
    )
    paper.widths(sheet, [11] * 18)
    paper.heights(sheet, {4: 8, 6: 16, 7: 18, 8: 16, 9: 8, 11: 24, 22: 8})
    called = cells_of(beam)
    _line(sheet, beam, called)
    _loads(sheet, beam)
    _supports(sheet, beam, called)
    _phrases(sheet, called)
    _stations(sheet, called)
    _diagram(sheet, ("L23", 16, 8), "Deflection [mm], characteristic, against x [m]", "E", paper.ALARM)
    _diagram(sheet, ("G39", 26, 9), "Moment [kNm], strength, sagging downward, against x [m]", "C", paper.HARBOUR)
    sheet.freeze_panes = "A5"
    paper.page(sheet, f"A1:R{STATION + STEPS}", design.issue.footer)


def _line(sheet: Worksheet, beam: LaidOut, called: Called) -> None:
    """Write the beam over a row of cells, and the stiffness of each length under it."""
    heading = "The beam, one mark or one length a cell; the stiffness under each length"
    paper.put(sheet, "A5:R5", heading, paper.SECTION)
    paper.put(sheet, "A6", "Beam", paper.GIVEN_HEAD)
    paper.put(sheet, "A7", beam.mark, paper.MARK)
    paper.put(sheet, "A8", "EI [kNm²]", paper.UNIT)
    stiffness = iter(beam.stiffness)
    for column, part in enumerate(beam.line, 2):
        letter = get_column_letter(column)
        if isinstance(part, str):
            paper.put(sheet, f"{letter}6", "mark", paper.GIVEN_HEAD)
            paper.put(sheet, f"{letter}7", part, paper.INPUT_TEXT)
            paper.put(sheet, f"{letter}8", None, paper.ABSENT)
        else:
            paper.put(sheet, f"{letter}6", "length [m]", paper.GIVEN_HEAD)
            paper.put(sheet, f"{letter}7", part, paper.given("0.00"))
            paper.put(sheet, f"{letter}8", next(stiffness), paper.given("#,##0"))
    paper.put(sheet, "N6:O6", "Total length [m]", paper.FOUND_HEAD)
    paper.put(sheet, "N7:O7", f"=SUM({called.line})", paper.found("0.00", bold=True))


def _loads(sheet: Worksheet, beam: LaidOut) -> None:
    """Write the load table: the header row that the functions know, the units above it."""
    paper.put(sheet, "A10:I10", "Its loads, one a row; blank rows are skipped", paper.SECTION)
    for column, (header, unit) in enumerate(LOAD_HEADERS, 1):
        letter = get_column_letter(column)
        paper.put(sheet, f"{letter}11", unit, paper.UNIT)
        paper.put(sheet, f"{letter}12", header, paper.GIVEN_HEAD)
        word = header in ("load", "span", "support", "case")
        entries = [row[column - 1] for row in beam.loads]
        entries += [None] * (LOAD_ROWS - len(entries))
        for row, entry in enumerate(entries, TABLE):
            look = paper.INPUT_TEXT if word else paper.given("General")
            paper.put(sheet, f"{letter}{row}", entry, look)


def _supports(sheet: Worksheet, beam: LaidOut, called: Called) -> None:
    """Write the array of reactions at strength, the characteristic ones, and the sums."""
    heading = "Its reactions (the first four columns are one array formula)"
    paper.put(sheet, "K10:R10", heading, paper.SECTION)
    columns = (
        ("K", "Support", "", "0"),
        ("L", "x", "m", "0.00"),
        ("M", "Reaction, strength", "kN", "0.0"),
        ("N", "Moment, strength", "kNm", "0.0"),
        ("O", "Reaction, charact.", "kN", "0.0"),
    )
    last = TABLE + len(beam.pads) - 1
    for letter, head, unit, digits in columns:
        paper.put(sheet, f"{letter}11", head, paper.FOUND_HEAD)
        paper.put(sheet, f"{letter}12", unit, paper.UNIT)
        for row in range(TABLE, last + 1):
            paper.put(sheet, f"{letter}{row}", None, paper.found(digits))
    paper.array(sheet, f"K{TABLE}:N{last}", called.ask("reactions", STRENGTH))
    paper.put(sheet, "P11", "Pad", paper.GIVEN_HEAD)
    paper.put(sheet, "P12", None, paper.UNIT)
    for row, pad in enumerate(beam.pads, TABLE):
        sheet[f"O{row}"] = called.ask("reaction", CHARACTERISTIC, f"$K{row}")
        paper.put(sheet, f"P{row}", pad, paper.INPUT_TEXT)
    for row, label in enumerate(("Sum of reactions", "Total load", "Difference"), last + 1):
        paper.put(sheet, f"K{row}:L{row}", label, paper.BLOCK_LABEL)
    total, nothing = paper.found("0.0", bold=True), paper.found(paper.NOTHING, bold=True)
    for letter, combination in (("M", STRENGTH), ("O", CHARACTERISTIC)):
        paper.put(sheet, f"{letter}{last + 1}", f"=SUM({letter}{TABLE}:{letter}{last})", total)
        load = called.ask("beam_result", combination, '"total load"')
        paper.put(sheet, f"{letter}{last + 2}", load, total)
        difference = f"=ROUND({letter}{last + 1}-{letter}{last + 2},9)"
        paper.put(sheet, f"{letter}{last + 3}", difference, nothing)
    paper.put(sheet, f"K{last + 4}:L{last + 4}", "Fault (blank: none)", paper.BLOCK_LABEL)
    fault = f"M{last + 4}:R{last + 4}"
    paper.put(sheet, fault, called.ask("fault", STRENGTH), paper.FAULT)
    paper.alarm_when(sheet, fault, f"LEN($M${last + 4})>0")


def _phrases(sheet: Worksheet, called: Called) -> None:
    """Write the result phrases and the two arrays of their answers."""
    paper.put(sheet, "G23:J23", "Results by phrase (array formulas)", paper.SECTION)
    paper.put(sheet, "G24:H24", "phrase", paper.GIVEN_HEAD)
    last = PHRASE + len(PHRASES) - 1
    asked = f"$G${PHRASE}:$G${last}"
    for row, (phrase, unit, digits) in enumerate(PHRASES, PHRASE):
        paper.put(sheet, f"G{row}:H{row}", phrase, paper.INPUT_PHRASE)
        for letter in "IJ":
            paper.put(sheet, f"{letter}{row}", None, paper.found(f'{digits}" {unit}"'))
    for letter, head, combination in (
        ("I", "strength", STRENGTH),
        ("J", "characteristic", CHARACTERISTIC),
    ):
        paper.put(sheet, f"{letter}24", head, paper.FOUND_HEAD)
        formula = called.ask("beam_result", combination, asked)
        paper.array(sheet, f"{letter}{PHRASE}:{letter}{last}", formula)


def _stations(sheet: Worksheet, called: Called) -> None:
    """Write shear, moment and deflection over a column of stations."""
    paper.put(sheet, "A23:E23", "Along the beam (array formulas on x)", paper.SECTION)
    columns = (
        ("A", "x", "m", "0.00"),
        ("B", "Shear V, strength", "kN", "0.0"),
        ("C", "Moment M, strength", "kNm", "0.0"),
        ("D", "Deflection δ, charact.", "m", "0.00000"),
        ("E", "Deflection δ, charact.", "mm", "0.0"),
    )
    last = STATION + STEPS
    for letter, head, unit, digits in columns:
        paper.put(sheet, f"{letter}24:{letter}{STATION - 2}", head, paper.FOUND_HEAD)
        paper.put(sheet, f"{letter}{STATION - 1}", unit, paper.UNIT)
        for row in range(STATION, last + 1):
            paper.put(sheet, f"{letter}{row}", None, paper.found(digits))
    for row in range(STATION, last + 1):
        sheet[f"A{row}"] = f"=$N$7*{row - STATION}/{STEPS}"
        sheet[f"E{row}"] = f"=1000*D{row}"
    x = f"$A${STATION}:$A${last}"
    for letter, function, combination in (
        ("B", "shear_at", STRENGTH),
        ("C", "moment_at", STRENGTH),
        ("D", "deflection_at", CHARACTERISTIC),
    ):
        block = f"{letter}{STATION}:{letter}{last}"
        paper.array(sheet, block, called.ask(function, combination, x))


def _diagram(sheet: Worksheet, place: tuple[str, int, int], title: str, column: str, ink: str) -> None:
    """Draw one column of the stations against x, downward positive."""
    number = ord(column) - ord("A") + 1
    y, x = (Reference(sheet, each, STATION, each, STATION + STEPS) for each in (number, 1))
    series = Series(y, x, title=title)
    series.marker.symbol = "none"
    series.smooth = False
    series.graphicalProperties.line.solidFill = ink
    series.graphicalProperties.line.width = 22_000
    chart = ScatterChart(scatterStyle="lineMarker")
    chart.series.append(series)
    chart.legend = None
    chart.title = _heading(title)
    chart.y_axis.scaling.orientation = "maxMin"
    chart.x_axis.delete = chart.y_axis.delete = False
    chart.x_axis.tickLblPos = "high"
    chart.roundedCorners = False
    for axis in (chart.x_axis, chart.y_axis):
        axis.majorGridlines = ChartLines(GraphicalProperties(ln=LineProperties(solidFill=paper.PALE)))
    chart.x_axis.number_format = chart.y_axis.number_format = "0"
    anchor, chart.width, chart.height = place
    sheet.add_chart(chart, anchor)


def _heading(text: str) -> Title:
    """Return the title of a chart in the size of the sheet's own headings."""
    look = CharacterProperties(sz=1000, b=True, solidFill=paper.INK)
    run = RegularTextRun(rPr=look, t=text)
    return Title(tx=Text(rich=RichText(p=[Paragraph(r=[run])])), overlay=False)
