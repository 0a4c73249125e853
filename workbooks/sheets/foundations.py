"""The foundations: every bearing, the loads and the sizes of the pads, and the proof of the sums."""

from __future__ import annotations

from openpyxl.workbook.defined_name import DefinedName
from openpyxl.worksheet.worksheet import Worksheet

from sheets import paper, schedule, understood
from sheets.design import Design

NAME = "Foundations"
FIRST = 7
"""The row of the first bearing, and of the first pad."""
FORCE = paper.found("#,##0.0")
TOTAL = paper.found("#,##0.0", bold=True, fill=paper.MIST)
NOTHING = paper.found(paper.NOTHING)
COUNTED = paper.Look(bold=True, fill=paper.MIST, across="center", number="0")

BEARING_CASES = dict(zip(schedule.CASES, "EFGH", strict=True))
"""The columns of the reactions of the bearings, by case."""
PAD_CASES = dict(zip(schedule.CASES, "PQRS", strict=True))
"""The columns of the loads of the pads, by case."""
BEARING_HEADS = (
    ("A", "Beam", ""),
    ("B", "Member", ""),
    ("C", "No.", ""),
    ("D", "Pad", ""),
    *((letter, f"Reaction, {case}", "kN") for case, letter in BEARING_CASES.items()),
    ("I", "Reaction, all loads", "kN"),
    ("J", "In other cases", "kN"),
    ("K", "Reaction, strength", "kN"),
    ("L", "Fixing moment", "kNm"),
)
PAD_HEADS = (
    ("N", "Pad", ""),
    ("O", "Bearings", ""),
    *((letter, case, "kN") for case, letter in PAD_CASES.items()),
    ("T", "N max", "kN"),
    ("U", "N min", "kN"),
    ("V", "Nd max", "kN"),
    ("W", "Nd min", "kN"),
    ("X", "Σ|M|", "kNm"),
)
SIZE_HEADS = (
    ("N", "Pad", ""),
    ("O:P", "Pressure allowed", "kN/m²"),
    ("Q", "Depth", "m"),
    ("R", "e = M / N", "m"),
    ("S", "Area", "m²"),
    ("T", "Side", "m"),
    ("U", "Concrete", "m³"),
    ("V:X", "Remark", ""),
)
UNIT_WEIGHT = 24.0
RELIEVING = 1.0
BY_HAND = "moment: design by hand"


def draw(sheet: Worksheet, design: Design) -> None:
    """Draw the bearings, the pads and the proof."""
    design.issue.draw(
        sheet,
        5,
        NAME,
        "Reactions of every bearing, summed by support mark. Values by case are characteristic.",
        left="A:L",
        block=("O:P", "Q:S", "T:U", "V:X"),
    )
    paper.widths(sheet, (6.5, 26, 6.5, 6, *[10] * 8, 3, 7, 10, *[10] * 9))
    last = _bearings(sheet, design)
    paper.heights(sheet, dict.fromkeys(range(FIRST, last + 1), 19))
    paper.heights(sheet, {4: 21, 5: 34, 6: 17})
    total = _loads(sheet, design, last)
    end = _sizes(sheet, design)
    _proof(sheet, design, last, total, end + 2)
    sheet.freeze_panes = f"A{FIRST}"
    paper.page(sheet, f"A1:X{last}", design.issue.footer)


def _bearings(sheet: Worksheet, design: Design) -> int:
    """Write one row a bearing and return the last of them."""
    paper.put(sheet, "A4:L4", "Bearings", paper.SECTION)
    _heads(sheet, BEARING_HEADS, 5)
    row = FIRST
    for beam in understood.every_beam(design):
        for support, pad in enumerate(beam.pads, 1):
            number = f"$C{row}"
            name = f'=LEFT({beam.where},FIND(";",{beam.where}&";")-1)'
            paper.put(sheet, f"A{row}", f"={beam.mark}", paper.MARK)
            paper.put(sheet, f"B{row}", name, paper.ONE_LINE)
            paper.put(sheet, f"C{row}", support, paper.COUNT)
            paper.put(sheet, f"D{row}", f"={pad}", paper.MARK)
            for case, letter in BEARING_CASES.items():
                paper.put(sheet, f"{letter}{row}", beam.ask("reaction", f'"1 {case}"', number), FORCE)
            paper.put(sheet, f"I{row}", beam.ask("reaction", None, number), FORCE)
            paper.put(sheet, f"J{row}", f"=ROUND(I{row}-SUM(E{row}:H{row}),9)", NOTHING)
            strength = beam.ask("reaction", schedule.combination("strength"), number)
            paper.put(sheet, f"K{row}", strength, FORCE)
            moments = (beam.ask("reaction_moment", f'"1 {case}"', number)[1:] for case in schedule.CASES)
            paper.put(sheet, f"L{row}", "=" + "+".join(f"ABS({moment})" for moment in moments), FORCE)
            row += 1
    paper.alarm_unless_nothing(sheet, f"J{FIRST}:J{row - 1}")
    unknown = f"COUNTIF($N${FIRST}:$N${FIRST + len(design.pads) - 1},$D{FIRST})=0"
    paper.alarm_when(sheet, f"D{FIRST}:D{row - 1}", unknown)
    return row - 1


def _loads(sheet: Worksheet, design: Design, last: int) -> int:
    """Write the loads of the pads, with the notes that qualify them, and return the row of their sums."""
    paper.put(sheet, "N4:X4", "Pads: loads by support mark", paper.SECTION)
    _heads(sheet, PAD_HEADS, 5)
    total = FIRST + len(design.pads)
    marks = f"$D${FIRST}:$D${last}"
    for row, pad in enumerate(design.pads, FIRST):
        paper.put(sheet, f"N{row}", pad.mark, paper.MARK)
        paper.put(sheet, f"O{row}", f"=COUNTIF({marks},$N{row})", paper.COUNT)
        for letter, source in (*((PAD_CASES[case], BEARING_CASES[case]) for case in schedule.CASES), ("X", "L")):
            values = f"${source}${FIRST}:${source}${last}"
            paper.put(sheet, f"{letter}{row}", f"=SUMIFS({values},{marks},$N{row})", FORCE)
        for kind, highest, lowest in (("", "T", "U"), ("strength", "V", "W")):
            G, *others = (_factored(kind, case, row) for case in schedule.CASES)
            adding = "+".join(f"MAX(0,{each})" for each in others)
            relieving = "+".join(f"MIN(0,{each})" for each in others)
            least = f"MIN({G},{_favourable(design)}*{PAD_CASES['G']}{row})" if kind else G
            paper.put(sheet, f"{highest}{row}", f"={G}+{adding}", FORCE)
            paper.put(sheet, f"{lowest}{row}", f"={least}+{relieving}", FORCE)
    paper.put(sheet, f"N{total}:X{total}", None, paper.SUM_MARK, merged=False)
    sheet[f"N{total}"] = "All"
    for letter in "OPQRSTUVW":
        look = COUNTED if letter == "O" else TOTAL
        paper.put(sheet, f"{letter}{total}", f"=ROUND(SUM({letter}{FIRST}:{letter}{total - 1}),9)", look)
    for row, note in enumerate(design.load_notes, total + 1):
        paper.put(sheet, f"N{row}:X{row}", note, paper.FOOTNOTE)
    assert sheet.parent is not None
    area = f"'{NAME}'!$N$5:$X${total + len(design.load_notes)}"
    sheet.parent.defined_names["Pads"] = DefinedName("Pads", attr_text=area)
    return total


def _factored(kind: str, case: str, row: int) -> str:
    """Return the load of a pad in one case, times its factor where a combination is named."""
    load = f"{PAD_CASES[case]}{row}"
    return f"{schedule.factor(kind, case)}*{load}" if kind else load


def _sizes_row(design: Design) -> int:
    """Return the row of the first pad in the table of sizes."""
    return FIRST + len(design.pads) + len(design.load_notes) + 5


def _favourable(design: Design) -> str:
    """Return the cell of the factor of G where it relieves."""
    return f"$T${_sizes_row(design) + len(design.pads) + 2}"


def _sizes(sheet: Worksheet, design: Design) -> int:
    """Write the sizes that the pads need, and return the last row of their notes."""
    first = _sizes_row(design)
    paper.put(sheet, f"N{first - 3}:X{first - 3}", "Pads: sizes", paper.SECTION)
    _heads(sheet, SIZE_HEADS, first - 2)
    total = first + len(design.pads)
    weight = f"$T${total + 1}"
    for row, pad in enumerate(design.pads, first):
        load = row - first + FIRST
        paper.put(sheet, f"N{row}", f"=N{load}", paper.MARK)
        paper.put(sheet, f"O{row}:P{row}", pad.pressure, paper.given("0"))
        paper.put(sheet, f"Q{row}", pad.depth, paper.given("0.00"))
        paper.put(sheet, f"R{row}", f"=IF(T{load}>0,X{load}/T{load},0)", paper.found("0.00"))
        paper.put(sheet, f"S{row}", f"=T{load}/(O{row}-{weight}*Q{row})", paper.found("0.00"))
        # The side b of a square pad whose area b (b - 2e) about the resultant is the area needed.
        side = f"ROUNDUP(R{row}+SQRT(R{row}^2+S{row}),1)"
        paper.put(sheet, f"T{row}", f'=IF(R{row}>{side}/6,"–",{side})', paper.found("0.0", bold=True))
        paper.put(sheet, f"U{row}", f'=IF(ISTEXT(T{row}),"–",T{row}*T{row}*Q{row})', paper.found("0.00"))
        remark = f'IF(U{load}<0,"uplift: hold down","")'
        paper.put(sheet, f"V{row}:X{row}", f'=IF(ISTEXT(T{row}),"{BY_HAND}",{remark})', paper.ONE_LINE)
    paper.put(sheet, f"N{total}:X{total}", None, paper.SUM_MARK, merged=False)
    sheet[f"N{total}"] = "All"
    volume = f"=SUM(U{first}:U{total - 1})"
    paper.put(sheet, f"U{total}", volume, paper.found("0.00", bold=True, fill=paper.MIST))
    by_hand = f'COUNTIF(V{first}:V{total - 1},"{BY_HAND}")'
    left_out = f'=IF({by_hand}>0,{by_hand}&" by hand, not in the sum","")'
    paper.put(sheet, f"V{total}:X{total}", left_out, paper.ONE_LINE)
    for row, label, value, digits in (
        (total + 1, "Unit weight of the pads, taken off the pressure [kN/m³]", UNIT_WEIGHT, "0"),
        (total + 2, "Factor of G where it relieves, strength", RELIEVING, "0.00"),
    ):
        paper.put(sheet, f"N{row}:S{row}", label, paper.BLOCK_LABEL)
        paper.put(sheet, f"T{row}", value, paper.given(digits))
    for row, note in enumerate(design.size_notes, total + 3):
        paper.put(sheet, f"N{row}:X{row}", note, paper.FOOTNOTE)
    inputs = f"O{first}:Q{total - 1} T{total + 1}:T{total + 2}"
    paper.allow(sheet, inputs, paper.positive(), "A number above 0.")
    remark = f"IF(ISERROR($V{first}),TRUE,LEN($V{first})>0)"
    paper.alarm_when(sheet, f"T{first}:X{total - 1}", remark)
    return total + 2 + len(design.size_notes)


def _proof(sheet: Worksheet, design: Design, last: int, total: int, top: int) -> None:
    """Write the sums three ways: as loads, whatever their case, by bearing and by pad."""
    heading = "Proof: nothing is lost between the loads and the pads"
    paper.put(sheet, f"N{top}:X{top}", heading, paper.SECTION)
    row = top + 1
    paper.put(sheet, f"N{row}:R{row}", "Sum [kN]", paper.FOUND_HEAD)
    labels = ("Loads on all beams", "Reactions of all bearings", "Totals of all pads", "Pads less loads")
    for number, label in enumerate(labels, row + 1):
        paper.put(sheet, f"N{number}:R{number}", label, paper.BLOCK_LABEL)
    final = understood.FIRST + len(design.members)
    sources = [
        (case, understood.LOADS[case], BEARING_CASES[case], f"={PAD_CASES[case]}{total}") for case in schedule.CASES
    ]
    pads = f"=SUM({min(PAD_CASES.values())}{total}:{max(PAD_CASES.values())}{total})"
    sources.append(("All loads", understood.ALL, "I", pads))
    for letter, (head, read, bearing, pad) in zip("STUVW", sources, strict=True):
        paper.put(sheet, f"{letter}{row}", head, paper.FOUND_HEAD)
        sums = (
            f"=SUM('{understood.NAME}'!{read}{understood.FIRST}:{read}{final})",
            f"=SUM({bearing}{FIRST}:{bearing}{last})",
            pad,
        )
        for number, formula in enumerate(sums, row + 1):
            paper.put(sheet, f"{letter}{number}", formula, TOTAL)
        difference = f"=ROUND({letter}{row + 3}-{letter}{row + 1},9)"
        paper.put(sheet, f"{letter}{row + 4}", difference, paper.found(paper.NOTHING, bold=True, fill=paper.MIST))
    paper.alarm_unless_nothing(sheet, f"S{row + 4}:W{row + 4}")
    factored = "+".join(_factored("strength", case, total) for case in schedule.CASES)
    bearings = f"ROWS(C{FIRST}:C{last})"
    checks = (
        ("Strength: bearings less factors × totals of the pads [kN]", f"ROUND(SUM(K{FIRST}:K{last})-({factored}),9)"),
        ("Bearings without a known pad", f"{bearings}-O{total}"),
        ("Bearings with a load in another case than G, Q, S, T", f"{bearings}-COUNTIF(J{FIRST}:J{last},0)"),
    )
    for number, (label, formula) in enumerate(checks, row + 5):
        paper.put(sheet, f"N{number}:V{number}", label, paper.BLOCK_LABEL)
        look = COUNTED if number > row + 5 else paper.found(paper.NOTHING, bold=True, fill=paper.MIST)
        paper.put(sheet, f"W{number}", f"={formula}", look)
    paper.alarm_unless_nothing(sheet, f"W{row + 5}:W{row + 7}")


def _heads(sheet: Worksheet, heads: tuple[tuple[str, str, str], ...], row: int) -> None:
    """Write the headings of a table in `row`, the units under them."""
    given = ("O:P", "Q") if heads is SIZE_HEADS else ()
    for columns, head, unit in heads:
        look = paper.GIVEN_HEAD if columns in given else paper.FOUND_HEAD
        paper.put(sheet, paper.in_row(columns, row), head, look)
        paper.put(sheet, paper.in_row(columns, row + 1), unit, paper.UNIT)
