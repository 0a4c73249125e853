"""Design actions on one beam: combinations, loads on each span by itself, and a train of axles that crosses it."""

from __future__ import annotations

from dataclasses import replace

from openpyxl.worksheet.datavalidation import DataValidation
from openpyxl.worksheet.worksheet import Worksheet

from sheets import charts, paper
from sheets.charts import Line, Place
from sheets.design import Crossed, Design
from sheets.paper import Look

NAME = "Actions"

ASIDE = Look(size=11, italic=True, ink=paper.QUIET, wrap=True, indent=1, border=None)
JOINED = replace(paper.ONE_LINE, fill=paper.MIST)
GOVERNS = replace(paper.ONE_LINE, size=10, shrink=True)

Entry = tuple[str, str, str | float, Look]
"""An input or what follows from it: heading, unit, value and look."""

# The inputs, and the texts joined from them ----------------------------------------------------------

LENGTHS = ("$B$8", "$C$8", "$D$8", "$E$8")
"""The cells of the spans and of the overhang."""
EI, TOTAL = "$H$8", "$I$8"
G, Q = "$A$11", "$B$11"
AXLES, SPACINGS = ("$C$11", "$D$11", "$E$11"), ("$F$11", "$G$11")
LINE, LOADS = "$N$7", "$N$8"
SUPPORTS = len(LENGTHS)
FAULT = "$N$10"

# The actions and their combinations ------------------------------------------------------------------

ACTIONS = "$A$14:$E$17"
STRENGTH, SERVICE, FACTORS = "$H$15", "$H$16", "$H$17"
LIST = 19
"""The row of the first combination."""
MOST = 12
"""The rows that a list of combinations may take."""
LAST = LIST + MOST - 1

# The results -----------------------------------------------------------------------------------------

RESULT = 15
"""The row of the first result by phrase."""
AT_STRENGTH = (
    *(("highest", f"moment max in span {n}") for n in (1, 2, 3)),
    *(("lowest", f"moment at support {n}") for n in (2, 3, 4)),
    ("highest", "shear at support 1"),
    *(
        (side, f"shear at support {n} {of}")
        for n in (2, 3, 4)
        for side, of in (("lowest", "left"), ("highest", "right"))
    ),
    *((side, f"reaction {n}") for side in ("highest", "lowest") for n in (1, 2, 3, 4)),
)
TIP = f'="deflection at "&SUBSTITUTE(ROUND({TOTAL},6),",",".")'
"""The tip, its place with a decimal point in every locale."""
IN_SERVICE = (
    *(("highest", f"deflection max in span {n}") for n in (1, 2, 3)),
    ("highest", TIP),
    ("lowest", TIP),
)
IN_SERVICE_FROM = RESULT + len(AT_STRENGTH) + 1
RESULTS_TO = IN_SERVICE_FROM + len(IN_SERVICE) - 1

CASES = 32
"""The row of the header of the table of reactions by case."""
PROOF = CASES + SUPPORTS + 2

# Along the beam --------------------------------------------------------------------------------------

STATION = 47
"""The row of the first station."""
PARTS = 6
"""The parts into which the stations divide a span."""
TIP_PARTS = 2
STATIONS = (len(LENGTHS) - 1) * (PARTS + 1) + TIP_PARTS + 1
END = STATION + STATIONS - 1
INFLUENCE, NEEDED = "$I$45", "$H$46"
POINTS = 17
RESULTS_OFFERED = (
    *(f"reaction {n}" for n in (1, 2, 3, 4)),
    "moment at 4 in span 2",
    "moment at support 2",
    "moment at support 3",
    "shear at support 2 left",
    "shear at 4 in span 2",
    "deflection at 4 in span 2",
)


def draw(sheet: Worksheet, design: Design) -> None:
    """Draw inputs, combinations, results, reactions by case, envelope and an influence line."""
    beam = design.crossed
    design.issue.draw(
        sheet,
        4,
        f"Design actions on beam {beam.mark}",
        beam.where,
        left="A:J",
        block=("Q", "R", "S", "T"),
    )
    paper.widths(sheet, (*[9.6] * 10, 3, 9.5, 27, 10, 7, 44, 16, 30, 16, 26))
    paper.heights(sheet, {4: 8, 5: 18, 6: 34, 7: 18, 8: 19, 9: 34, 10: 18, 11: 19, 12: 8})
    paper.heights(sheet, dict.fromkeys(range(13, 43), 16))
    paper.heights(sheet, {CASES - 1: 20, PROOF - 1: 20, 43: 8, 44: 18, 45: 34, 46: 17})
    paper.heights(sheet, dict.fromkeys(range(STATION, END + 1), 15.2))
    _inputs(sheet, beam)
    _texts(sheet)
    _actions(sheet, beam)
    _combinations(sheet)
    _results(sheet, design)
    _cases(sheet)
    _proof(sheet)
    _envelope(sheet)
    _influence(sheet, beam)
    _charts(sheet)
    _guard(sheet)
    sheet.freeze_panes = "A5"
    paper.page(sheet, f"A1:T{END}", design.issue.footer)


def _inputs(sheet: Worksheet, beam: Crossed) -> None:
    """Write what the engineer types of the beam and of its loads."""
    length, load, spacing = paper.given("0.00"), paper.given("0.0"), paper.given("0.00")
    of_beam: list[Entry] = [
        ("Beam", "", beam.mark, paper.MARK),
        *((f"Span {n}", "m", each, length) for n, each in enumerate(beam.lengths[:-1], 1)),
        ("Overhang", "m", beam.lengths[-1], length),
        ("E", "GPa", beam.modulus, paper.given("0")),
        ("I", "cm⁴", beam.inertia, paper.given("#,##0")),
        ("EI", "kNm²", "=$F$8*$G$8/100", paper.found("#,##0")),
        ("Total length", "m", f"=SUM({LENGTHS[0]}:{LENGTHS[-1]})", paper.found("0.00")),
    ]
    of_loads: list[Entry] = [
        ("Line G", "kN/m", beam.permanent, load),
        ("Line Q, each span", "kN/m", beam.variable, load),
        *((f"Axle {n}", "kN", axle, load) for n, axle in enumerate(beam.axles, 1)),
        *((f"Axle {n}\nto axle {n + 1}", "m", each, spacing) for n, each in enumerate(beam.spacings, 1)),
    ]
    paper.put(sheet, "A5:J5", "The beam and its loads", paper.SECTION)
    for row, entries in ((6, of_beam), (9, of_loads)):
        for letter, (head, unit, value, look) in zip("ABCDEFGHI", entries, strict=False):
            paper.put(sheet, f"{letter}{row}", head, paper.GIVEN_HEAD if look.fill else paper.FOUND_HEAD)
            paper.put(sheet, f"{letter}{row + 1}", unit, paper.UNIT)
            paper.put(sheet, f"{letter}{row + 2}", value, look)
    paper.put(sheet, "H9:J11", "The trolley crosses either way; its axle loads hold their dynamic factor.", ASIDE)


def _texts(sheet: Worksheet) -> None:
    """Write the texts joined from the inputs, what the functions read in them, and what is wrong."""
    paper.put(sheet, "L5:T5", "What the functions read", paper.SECTION)
    L1, L2, L3, L4 = LENGTHS
    axles, spacings = ",".join(AXLES), ",".join(SPACINGS)
    texts = (
        (6, "The beam", f"=beam_reads({LINE},{EI})", paper.SMALL_TEXT),
        (7, "Beam line", f'=beam_line("pinned",{L1},"roller",{L2},"roller",{L3},"roller",{L4},"free")', JOINED),
        (
            8,
            "Loads line",
            f'=load_line("G: udl",{G},"; Q: udl",{Q},"each span; T: axles",{axles},"spaced",{spacings},"both ways")',
            JOINED,
        ),
        (9, "Its loads", f"=loads_read({LINE},{LOADS})", replace(paper.SMALL_TEXT, size=10)),
    )
    for row, label, formula, look in texts:
        paper.put(sheet, f"L{row}:M{row}", label, paper.BLOCK_LABEL)
        paper.put(sheet, f"N{row}:T{row}", formula, look)
    paper.put(sheet, "L10:M11", "Fault (blank: none)", paper.BLOCK_LABEL)
    paper.put(sheet, "N10:T11", _fault(), replace(paper.FAULT, size=11))
    paper.alarm_when(sheet, "N10:T11", f"IF(ISERROR({FAULT}),TRUE,LEN({FAULT})>0)")


def _fault() -> str:
    """Return the formula that says what is wrong with the beam, its loads, or anything on the sheet."""

    def list_fault(name: str, first: str, count: str, most: int) -> str:
        return f'IF(ISERROR({first})," [{name}: error]",IF({count}>{most}," [{name}: rows missing]",""))'

    found = (
        f"N{RESULT}:N{RESULTS_TO}",
        f"D{CASES + 1}:H{CASES + SUPPORTS}",
        f"H{PROOF + 1}:J{PROOF + 3}",
        f"C{STATION}:G{END}",
        f"I{STATION}:J{END}",
    )
    astray = f'IF(ABS($C${END}-{TOTAL})>0.000001," [envelope: not as long as the beam]","")'
    parts = (
        f"fault({LINE},{LOADS},{EI})",
        list_fault("strength list", f"$B${LIST}", f"$E${LIST - 1}", MOST),
        list_fault("service list", f"$G${LIST}", f"$J${LIST - 1}", MOST),
        list_fault("influence line", f"$I${STATION}", NEEDED, STATIONS),
        f'IF(ISERROR(SUM({",".join(found)}))," [error on the sheet]",{astray})',
    )
    return "=" + "&".join(parts)


def _actions(sheet: Worksheet, beam: Crossed) -> None:
    """Write the table of actions, whose header row the functions know, and what list is made of them."""
    paper.put(sheet, "A13:J13", "Its actions, and the combinations that a standard makes of them", paper.SECTION)
    for letter, head in zip("ABCDE", ("case", "action", "psi0", "psi1", "psi2"), strict=True):
        paper.put(sheet, f"{letter}14", head, paper.GIVEN_HEAD)
    for row, (case, action, *psi) in enumerate(beam.actions, 15):
        for letter, value in zip("ABCDE", (case, action, *psi, None, None, None), strict=False):
            word = letter in "AB"
            look = replace(paper.INPUT_TEXT, size=11) if word else paper.given("0.0")
            paper.put(sheet, f"{letter}{row}", value, look)
    paper.put(sheet, "F14:J14", "List; national annex and local code decide", paper.GIVEN_HEAD)
    for row, label, value in (
        (15, "Strength", beam.strength),
        (16, "Service", beam.service),
        (17, "Own factors", None),
    ):
        paper.put(sheet, f"F{row}:G{row}", label, paper.BLOCK_LABEL)
        paper.put(sheet, f"H{row}:J{row}", value, paper.INPUT_TEXT)


def _combinations(sheet: Worksheet) -> None:
    """Write the two lists, a combination a row; rows to spare are blank, which the functions skip."""
    for label, number, first, last, formula in (
        ("strength", "A", "B", "E", f"combinations({STRENGTH},{ACTIONS},,{FACTORS})"),
        ("service", "F", "G", "J", f"combinations({SERVICE},{ACTIONS})"),
    ):
        count = f"${last}${LIST - 1}"
        before = chr(ord(last) - 1)
        paper.put(sheet, f"{number}{LIST - 1}:{before}{LIST - 1}", f"Combinations, {label}", paper.FOUND_HEAD)
        cell = f"{last}{LIST - 1}"
        paper.put(sheet, cell, f"=ROWS({formula})", replace(paper.COUNT, size=11, number='0" in all"'))
        paper.alarm_when(sheet, cell, f"IF(ISERROR(${first}${LIST}),TRUE,{count}>{MOST})")
        for k, row in enumerate(range(LIST, LAST + 1), 1):
            paper.put(sheet, f"{number}{row}", k, replace(paper.ABSENT, size=11))
            text = f'=IF({k}>{count},"",INDEX({formula},{k},1))'
            paper.put(sheet, f"{first}{row}:{last}{row}", text, paper.ONE_LINE)
        paper.fade_when(sheet, f"{number}{LIST}:{number}{LAST}", f"${number}{LIST}>{count}")


def _results(sheet: Worksheet, design: Design) -> None:
    """Write the extremes by phrase, and what governs each in words."""
    heading = "Design results by phrase: at strength change side or phrase, and the row follows"
    paper.put(sheet, "L13:T13", heading, paper.SECTION)
    for row, (side, phrase) in enumerate(AT_STRENGTH, RESULT):
        moment = f'ISNUMBER(SEARCH("moment",$M{row}))'
        unit = f'=IF({moment},"kNm",IF(ISNUMBER(SEARCH("deflection",$M{row})),"m","kN"))'
        force = f'AND(LEFT($M{row},8)="reaction",NOT({moment}))'
        uplift = f'=IF({force},IF(ROUND(N{row},3)<0,"uplift: hold down",""),"")'
        _result(sheet, row, (side, phrase), (_list("B"), "", "#,##0.0"), (unit, uplift))
    spans = (*LENGTHS[:-1], f"(2*{LENGTHS[-1]})", f"(2*{LENGTHS[-1]})")
    for row, (asked, length) in enumerate(zip(IN_SERVICE, spans, strict=True), IN_SERVICE_FROM):
        ratio = f'=IF(N{row}=0,"","L/"&ROUND(1000*{length}/ABS(N{row}),0))'
        _result(sheet, row, asked, (_list("G"), "1000*", "0.00"), ("mm", ratio))
    for head, name, last in (
        (RESULT - 1, "strength list", IN_SERVICE_FROM - 2),
        (IN_SERVICE_FROM - 1, "service list", RESULTS_TO),
    ):
        paper.put(sheet, f"L{head}", "side", paper.GIVEN_HEAD)
        paper.put(sheet, f"M{head}", "phrase", paper.GIVEN_HEAD if head < RESULT else paper.FOUND_HEAD)
        paper.put(sheet, f"N{head}:O{head}", name, paper.FOUND_HEAD)
        paper.put(sheet, f"P{head}:S{head}", "What governs", paper.FOUND_HEAD)
        paper.put(sheet, f"T{head}", "Remark", paper.FOUND_HEAD)
        alarming = f'IF(ISERROR($N{head + 1}),TRUE,LEFT($T{head + 1},6)="uplift")'
        paper.alarm_when(sheet, f"L{head + 1}:T{last}", alarming)
    paper.put(sheet, f"L{RESULTS_TO + 1}:T{RESULTS_TO + 1}", design.crossed.note, paper.FOOTNOTE)


def _list(letter: str) -> str:
    return f"${letter}${LIST}:${letter}${LAST}"


def _result(
    sheet: Worksheet, row: int, asked: tuple[str, str], answer: tuple[str, str, str], beside: tuple[str, str]
) -> None:
    """Write one result: side and phrase, the value over a list, times what, in digits; its unit and a remark."""
    (side, phrase), (combinations, times, digits), (unit, remark) = asked, answer, beside
    arguments = f"{LINE},{LOADS},$M{row},{combinations},{EI}"
    typed = row < IN_SERVICE_FROM
    paper.put(sheet, f"L{row}", side, replace(paper.INPUT_TEXT, size=11))
    paper.put(sheet, f"M{row}", phrase, replace(paper.ONE_LINE, fill=paper.SAND if typed else None))
    value = f'={times}IF($L{row}="lowest",lowest({arguments}),highest({arguments}))'
    paper.put(sheet, f"N{row}", value, replace(paper.found(digits, bold=True), size=11))
    paper.put(sheet, f"O{row}", unit, replace(paper.ABSENT, size=11))
    paper.put(sheet, f"P{row}:S{row}", f"=governing({arguments},$L{row})", GOVERNS)
    paper.put(sheet, f"T{row}", remark, paper.ONE_LINE)


def _cases(sheet: Worksheet) -> None:
    """Write the table of reactions by case that the designer of the supports asks for."""
    heading = "Reactions by case [kN], unfactored, for the design of the quay wall (one array formula)"
    paper.put(sheet, f"A{CASES - 1}:J{CASES - 1}", heading, paper.SECTION)
    letters = "ABCDEFGH"
    for letter in letters:
        paper.put(sheet, f"{letter}{CASES}", None, replace(paper.FOUND_HEAD, wrap=False, shrink=True))
        digits = {"A": "0", "B": "0.00"}.get(letter, "#,##0.0")
        look = replace(paper.found(digits), size=11) if letter != "C" else paper.ONE_LINE
        for row in range(CASES + 1, CASES + SUPPORTS + 1):
            paper.put(sheet, f"{letter}{row}", None, look)
    block = f"{letters[0]}{CASES}:{letters[-1]}{CASES + SUPPORTS}"
    paper.array(sheet, block, f"=reaction_cases({LINE},{LOADS},{EI})")


def _proof(sheet: Worksheet) -> None:
    """Compare with what ordinary formulas make of the inputs: the loads in all, and the overhang by statics."""
    paper.put(sheet, f"A{PROOF - 1}:J{PROOF - 1}", "Proof by ordinary formulas", paper.SECTION)
    for columns, head in (("A:G", "Compared"), ("H", "found"), ("I", "by hand"), ("J", "difference")):
        paper.put(sheet, paper.in_row(columns, PROOF), head, paper.FOUND_HEAD)
    first, last = CASES + 1, CASES + SUPPORTS
    a = LENGTHS[-1]
    (P1, P2, P3), (s1, s2) = AXLES, SPACINGS

    def on(axle: str, *spacings: str) -> str:
        """The moment of an axle behind one that stands on the tip."""
        return f"{axle}*MAX(0,{'-'.join((a, *spacings))})"

    trolley = (
        f"{P1}*{a}+{on(P2, s1)}+{on(P3, s1, s2)}",
        f"{P2}*{a}+{on(P3, s2)}",
        f"{P2}*{a}+{on(P1, s1)}",
        f"{P3}*{a}+{on(P2, s2)}+{on(P1, s1, s2)}",
    )
    rows = (
        ("G: reactions in all; load × length [kN]", f"SUM(D{first}:D{last})", f"{G}*{TOTAL}"),
        ("Q: highest + lowest, in all; load × length [kN]", f"SUM(E{first}:F{last})", f"{Q}*{TOTAL}"),
        (
            "T: lowest moment at support 4; an axle on the tip [kNm]",
            f'lowest({LINE},{LOADS},"moment at support 4","T",{EI})',
            f"-MAX({','.join(trolley)})",
        ),
    )
    for row, (label, told, by_hand) in enumerate(rows, PROOF + 1):
        paper.put(sheet, f"A{row}:G{row}", label, paper.BLOCK_LABEL)
        paper.put(sheet, f"H{row}", f"={told}", replace(paper.found("#,##0.0"), size=11))
        paper.put(sheet, f"I{row}", f"={by_hand}", replace(paper.found("#,##0.0"), size=11))
        look = replace(paper.found(paper.NOTHING, bold=True), size=11)
        paper.put(sheet, f"J{row}", f"=ROUND(H{row}-I{row},9)", look)
    paper.alarm_unless_nothing(sheet, f"J{PROOF + 1}:J{PROOF + 3}")


def _envelope(sheet: Worksheet) -> None:
    """Write the stations as a beam line of their own, with steps between the supports, and the envelope over it.

    So the rows are as many as they are, whatever the lengths: two at each support inside, one elsewhere.
    """
    paper.put(sheet, "A44:G44", "Envelope, strength: spans in sixths (C to G: one array)", paper.SECTION)
    heads = ("Mark", "Length", "x", "Shear, highest", "Shear, lowest", "Moment, highest", "Moment, lowest")
    units = ("", "m", "m", "kN", "kN", "kNm", "kNm")
    for letter, head, unit in zip("ABCDEFG", heads, units, strict=True):
        paper.put(sheet, f"{letter}45", head, paper.FOUND_HEAD)
        paper.put(sheet, f"{letter}46", unit, paper.UNIT)
    for row, (mark, length) in enumerate(_stations(), STATION):
        paper.put(sheet, f"A{row}", mark, replace(paper.ABSENT, size=11))
        paper.put(sheet, f"B{row}", length, replace(paper.found("0.00"), size=11))
        for letter in "CDEFG":
            digits = "0.00" if letter == "C" else "#,##0.0"
            paper.put(sheet, f"{letter}{row}", None, replace(paper.found(digits), size=11))
    stations = f"$A${STATION}:$B${END}"
    formula = f"=envelope({stations},{LOADS},{_list('B')},2,{EI})"
    paper.array(sheet, f"C{STATION}:G{END}", formula)


def _stations() -> list[tuple[str | None, str | None]]:
    """Return mark and length of each station: read row by row they are the beam, in parts."""
    *spans, overhang = LENGTHS
    rows: list[tuple[str | None, str | None]] = []
    mark: str | None = "pinned"
    for span in spans:
        rows += [(mark, f"={span}/{PARTS}"), *[("step", f"={span}/{PARTS}")] * (PARTS - 1), ("roller", None)]
        mark = None
    rows += [(mark, f"={overhang}/{TIP_PARTS}"), *[("step", f"={overhang}/{TIP_PARTS}")] * (TIP_PARTS - 1)]
    return [*rows, ("free", None)]


def _influence(sheet: Worksheet, beam: Crossed) -> None:
    """Write the influence line of the result that is chosen; rows to spare repeat the right end."""
    paper.put(sheet, "H44:J44", "Influence line of", paper.SECTION)
    paper.put(sheet, "H45", "Rows needed", paper.FOUND_HEAD)
    paper.put(sheet, "I45:J45", beam.influence, replace(paper.INPUT_TEXT, size=11, bold=True, wrap=True))
    table = f"influence_line({LINE},{INFLUENCE},{POINTS},{EI})"
    paper.put(sheet, "H46", f"=ROWS({table})", replace(paper.COUNT, size=11))
    paper.alarm_when(sheet, "H46", f"IF(ISERROR($I${STATION}),TRUE,{NEEDED}>{STATIONS})")
    paper.put(sheet, "I46", "x [m]", paper.UNIT)
    paper.put(sheet, "J46", "ordinate", paper.UNIT)
    for row in range(STATION, END + 1):
        station = f"MIN({row - STATION + 1},{NEEDED})"
        for number, letter, digits in ((1, "I", "0.00"), (2, "J", "0.0000")):
            formula = f"=INDEX({table},{station},{number})"
            paper.put(sheet, f"{letter}{row}", formula, replace(paper.found(digits), size=11))
    paper.fade_when(sheet, f"I{STATION}:J{END}", f"ROW()-{STATION - 1}>{NEEDED}")


def _charts(sheet: Worksheet) -> None:
    rows = (STATION, END)
    highest, lowest = paper.HARBOUR, paper.ALARM
    charts.along(
        sheet,
        Place("L44", 20.9, 14.4),
        "Moment envelope [kNm], strength, sagging downward, against x [m]",
        "C",
        rows,
        (Line("F", "highest", highest), Line("G", "lowest", lowest)),
        upward=False,
    )
    charts.along(
        sheet,
        Place("Q44", 18.5, 7.3),
        "Shear envelope [kN], strength, against x [m]",
        "C",
        rows,
        (Line("D", "highest", highest), Line("E", "lowest", lowest)),
        upward=True,
    )
    charts.along(
        sheet,
        Place("Q57", 18.5, 6.9),
        "Influence line chosen in I45, positive downward, against x [m]",
        "I",
        rows,
        (Line("J", "ordinate", paper.MOSS),),
        upward=False,
        digits="General",
    )


def _guard(sheet: Worksheet) -> None:
    """Guard the inputs."""
    sizes = f"{LENGTHS[0]}:$G$8 {AXLES[0]}:{SPACINGS[-1]}".replace("$", "")
    paper.allow(sheet, sizes, paper.positive(), "A number above 0.")
    paper.allow(sheet, f"{G}:{Q}".replace("$", ""), paper.any_number(), "A number.")
    sides = f"L{RESULT}:L{IN_SERVICE_FROM - 2} L{IN_SERVICE_FROM}:L{RESULTS_TO}"
    paper.allow(sheet, sides, paper.one_of(("highest", "lowest")), "highest or lowest")
    offered = paper.one_of(RESULTS_OFFERED)
    offered.errorStyle = "warning"
    typed = DataValidation(prompt="Blank: recommended. Others as text: G 1.35/1.0; Q 1.5", showInputMessage=True)
    sheet.add_data_validation(typed)
    typed.add(FACTORS.replace("$", ""))
    paper.allow(sheet, INFLUENCE.replace("$", ""), offered, "Any result of one place may be asked for.")
