"""One beam in depth: laid out over cells, its loads in a table, its results in arrays."""

from __future__ import annotations

from dataclasses import replace

from openpyxl.utils import get_column_letter
from openpyxl.worksheet.worksheet import Worksheet

from sheets import charts, paper, schedule
from sheets.called import Called
from sheets.charts import Line, Place
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
STATION = 26
"""The row of the first station."""
POINTS = 21
"""The number of evenly spaced stations; the functions add marks, load ends and both sides of every jump."""
STATIONS = 38
"""The rows that the stations may take."""
SHEAR, MOMENT, DEFLECTION = "BCD"
"""The columns of the stations that are drawn."""
CHARTS = (
    (Place("G38", 34.6, 6.4), "Shear [kN], strength, against x [m]", SHEAR, paper.HARBOUR),
    (Place("G51", 34.6, 6.4), "Moment [kNm], strength, sagging downward, against x [m]", MOMENT, paper.HARBOUR),
    (Place("L23", 20, 8.2), "Deflection [mm], characteristic, against x [m]", DEFLECTION, paper.ALARM),
)

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
    paper.widths(sheet, [13.5] * 18)
    last = STATION + STATIONS - 1
    paper.heights(sheet, dict.fromkeys(range(TABLE, STATION), 16))
    paper.heights(sheet, dict.fromkeys(range(STATION, last + 1), 14.8))
    paper.heights(sheet, {4: 8, 5: 18, 6: 17, 7: 19, 8: 17, 9: 8, 10: 18, 11: 34, 12: 18, 22: 8, 23: 18, 24: 34})
    called = cells_of(beam)
    _line(sheet, beam, called)
    _loads(sheet, design)
    _supports(sheet, beam, called)
    _phrases(sheet, called)
    _stations(sheet, called)
    for place, title, column, ink in CHARTS:
        lines = (Line(column, title, ink),)
        charts.along(sheet, place, title, "A", (STATION, last), lines, upward=column == SHEAR)
    sheet.freeze_panes = "A5"
    paper.page(sheet, f"A1:R{last}", design.issue.footer)


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
    paper.put(sheet, "N7:O7", called.length(), paper.found("0.00", bold=True))


def _loads(sheet: Worksheet, design: Design) -> None:
    """Write the load table: the header row that the functions know, the units above it."""
    beam = design.laid_out
    others = {
        member.mark: f"{schedule.NAME}!{schedule.cells_of(row)['other']}"
        for row, member in enumerate(design.members, schedule.FIRST)
    }
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
            if isinstance(entry, str) and entry.startswith("="):
                entry, look = entry.format(**others), paper.found("General")
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
        paper.alarm_unless_nothing(sheet, f"{letter}{last + 3}")
    paper.put(sheet, f"K{last + 4}:L{last + 4}", "Fault (blank: none)", paper.BLOCK_LABEL)
    fault = f"M{last + 4}:R{last + 4}"
    paper.put(sheet, fault, called.ask("fault", STRENGTH), paper.FAULT)
    paper.alarm_when(sheet, fault, f"IF(ISERROR($M${last + 4}),TRUE,LEN($M${last + 4})>0)")


def _phrases(sheet: Worksheet, called: Called) -> None:
    """Write the result phrases and the two arrays of their answers."""
    paper.put(sheet, "G23:J23", "Results by phrase (array formulas)", paper.SECTION)
    paper.put(sheet, "G24:H24", "phrase", paper.GIVEN_HEAD)
    last = PHRASE + len(PHRASES) - 1
    asked = f"$G${PHRASE}:$G${last}"
    for row, (phrase, unit, digits) in enumerate(PHRASES, PHRASE):
        paper.put(sheet, f"G{row}:H{row}", phrase, replace(paper.INPUT_PHRASE, size=11))
        for letter in "IJ":
            paper.put(sheet, f"{letter}{row}", None, replace(paper.found(f'{digits}" {unit}"'), size=11))
    for letter, head, combination in (
        ("I", "strength", STRENGTH),
        ("J", "characteristic", CHARACTERISTIC),
    ):
        paper.put(sheet, f"{letter}24", head, paper.FOUND_HEAD)
        formula = called.ask("beam_result", combination, asked)
        paper.array(sheet, f"{letter}{PHRASE}:{letter}{last}", formula)


def _stations(sheet: Worksheet, called: Called) -> None:
    """Write shear and moment as `diagram` tabulates them, and the deflection at its places.

    The table has rows to spare, which repeat the right end.
    """
    heading = "Along the beam (both sides of every jump)"
    paper.put(sheet, "A23:E23", heading, paper.SECTION)
    columns = (
        ("A", "x", "m", "0.00"),
        ("B", "Shear, strength", "kN", "0.0"),
        ("C", "Moment, strength", "kNm", "0.0"),
        ("D", "Deflection, charact.", "mm", "0.00"),
    )
    last = STATION + STATIONS - 1
    for letter, head, unit, digits in columns:
        paper.put(sheet, f"{letter}24", head, paper.FOUND_HEAD)
        paper.put(sheet, f"{letter}25", unit, paper.UNIT)
        for row in range(STATION, last + 1):
            paper.put(sheet, f"{letter}{row}", None, replace(paper.found(digits), size=11))
    paper.put(sheet, "E24", "Rows needed", paper.FOUND_HEAD)
    table = called.ask("diagram", STRENGTH, str(POINTS)).removeprefix("=")
    paper.put(sheet, "E25", f"=ROWS({table})", paper.COUNT)
    paper.alarm_when(sheet, "E25", f"IF(ISERROR($E$25),TRUE,$E$25>{STATIONS})")
    for row in range(STATION, last + 1):
        station = f"MIN({row - STATION + 1},$E$25)"
        for number, letter in enumerate("ABC", 1):
            sheet[f"{letter}{row}"] = f"=INDEX({table},{station},{number})"
        deflection = called.ask("deflection_at", CHARACTERISTIC, f"$A{row}").removeprefix("=")
        sheet[f"D{row}"] = f"=1000*{deflection}"
    paper.fade_when(sheet, f"A{STATION}:D{last}", f"ROW()-{STATION - 1}>$E$25")
