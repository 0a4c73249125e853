"""The foundations: every bearing, the totals by support mark, and the proof of the sums."""

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
BEARING_HEADS = (
    ("A", "Beam", ""),
    ("B", "Member", ""),
    ("C", "Support", ""),
    ("D", "Pad", ""),
    ("E", "Reaction, G", "kN"),
    ("F", "Reaction, Q", "kN"),
    ("G", "G + Q", "kN"),
    ("H", "Strength", "kN"),
    ("I", "Fixing moment, charact.", "kNm"),
)
PAD_HEADS = (
    ("K", "Pad", ""),
    ("L", "Bearings", ""),
    ("M", "Total G", "kN"),
    ("N", "Total Q", "kN"),
    ("O", "G + Q", "kN"),
    ("P", "Strength", "kN"),
    ("Q", "Fixing moments, sum", "kNm"),
    ("R", "Pressure allowed", "kN/m²"),
    ("S", "Depth", "m"),
    ("T", "Area needed", "m²"),
    ("U", "Square, side", "m"),
    ("V", "Concrete", "m³"),
)
SUMMED = (("M", "E"), ("N", "F"), ("O", "G"), ("P", "H"), ("Q", "I"))
"""The columns of the pads that sum a column of the bearings."""
UNIT_WEIGHT = 24.0


def draw(sheet: Worksheet, design: Design) -> None:
    """Draw the bearings, the pads and the proof."""
    design.issue.draw(
        sheet,
        4,
        NAME,
        "Reactions of every bearing, summed by support mark. G and Q are characteristic values.",
        left="A:I",
        block=("L:M", "N:P", "Q:R", "S:V"),
    )
    paper.widths(sheet, (7, 28, 9, 7, 11, 11, 11, 11, 13, 3, 7, 10, 11, 11, 11, 11, 11, 11))
    for letter in "STUV":
        sheet.column_dimensions[letter].width = 10
    paper.heights(sheet, {4: 20, 5: 30, 6: 14})
    for letter, head, unit in BEARING_HEADS + PAD_HEADS:
        look = paper.GIVEN_HEAD if letter in "RS" else paper.FOUND_HEAD
        paper.put(sheet, f"{letter}5", head, look)
        paper.put(sheet, f"{letter}6", unit, paper.UNIT)
    last = _bearings(sheet, design)
    total = _pads(sheet, design, last)
    _proof(sheet, design, last, total)
    assert sheet.parent is not None
    sheet.parent.defined_names["Pads"] = DefinedName("Pads", attr_text=f"'{NAME}'!$K$5:$Q${total}")
    paper.heights(sheet, dict.fromkeys(range(FIRST, last + 1), 16))
    sheet.freeze_panes = f"A{FIRST}"
    paper.page(sheet, f"A1:V{last}", design.issue.footer)


def _bearings(sheet: Worksheet, design: Design) -> int:
    """Write one row a bearing and return the last of them."""
    paper.put(sheet, "A4:I4", "Bearings", paper.SECTION)
    row = FIRST
    for beam in understood.every_beam(design):
        for support, pad in enumerate(beam.pads, 1):
            number = f"$C{row}"
            name = f'=LEFT({beam.where},FIND(";",{beam.where}&";")-1)'
            strength = beam.ask("reaction", schedule.combination("strength"), number)
            moment = beam.ask("reaction_moment", schedule.combination("characteristic"), number)
            paper.put(sheet, f"A{row}", f"={beam.mark}", paper.MARK)
            paper.put(sheet, f"B{row}", name, paper.ONE_LINE)
            paper.put(sheet, f"C{row}", support, paper.COUNT)
            paper.put(sheet, f"D{row}", f"={pad}", paper.MARK)
            paper.put(sheet, f"E{row}", beam.ask("reaction", '"1 G"', number), FORCE)
            paper.put(sheet, f"F{row}", beam.ask("reaction", '"1 Q"', number), FORCE)
            paper.put(sheet, f"G{row}", f"=E{row}+F{row}", FORCE)
            paper.put(sheet, f"H{row}", strength, FORCE)
            paper.put(sheet, f"I{row}", moment, FORCE)
            row += 1
    return row - 1


def _pads(sheet: Worksheet, design: Design, last: int) -> int:
    """Write the totals by pad and the sizes they need, and return the row of their sums."""
    paper.put(sheet, "K4:V4", "Pads: totals by support mark", paper.SECTION)
    total = FIRST + len(design.pads)
    weight = f"$R${total + 2}"
    marks = f"$D${FIRST}:$D${last}"
    for row, pad in enumerate(design.pads, FIRST):
        paper.put(sheet, f"K{row}", pad.mark, paper.MARK)
        paper.put(sheet, f"L{row}", f"=COUNTIF({marks},$K{row})", paper.COUNT)
        for letter, source in SUMMED:
            values = f"${source}${FIRST}:${source}${last}"
            paper.put(sheet, f"{letter}{row}", f"=SUMIFS({values},{marks},$K{row})", FORCE)
        area = f"=O{row}/(R{row}-{weight}*S{row})"
        paper.put(sheet, f"R{row}", pad.pressure, paper.given("0"))
        paper.put(sheet, f"S{row}", pad.depth, paper.given("0.00"))
        paper.put(sheet, f"T{row}", area, paper.found("0.00"))
        paper.put(sheet, f"U{row}", f"=ROUNDUP(SQRT(T{row}),1)", paper.found("0.0", bold=True))
        paper.put(sheet, f"V{row}", f"=U{row}*U{row}*S{row}", paper.found("0.00"))
    paper.put(sheet, f"K{total}:V{total}", None, paper.SUM_MARK, merged=False)
    sheet[f"K{total}"] = "All"
    for letter in "LMNOPV":
        look = {"L": paper.SUM_MARK, "V": paper.found("0.00", bold=True, fill=paper.MIST)}
        formula = f"=SUM({letter}{FIRST}:{letter}{total - 1})"
        paper.put(sheet, f"{letter}{total}", formula, look.get(letter, TOTAL))
    label = "Unit weight of the pads, taken off the pressure allowed [kN/m³]"
    paper.put(sheet, f"K{total + 2}:Q{total + 2}", label, paper.BLOCK_LABEL)
    paper.put(sheet, f"R{total + 2}", UNIT_WEIGHT, paper.given("0"))
    inputs = f"R{FIRST}:S{total - 1} R{total + 2}"
    paper.allow(sheet, inputs, paper.positive(), "A number above 0.")
    return total


def _proof(sheet: Worksheet, design: Design, last: int, total: int) -> None:
    """Write the sums three ways: as loads, by bearing and by pad."""
    row = total + 5
    read = f"{understood.FIRST}:{{0}}{understood.FIRST + len(design.members)}"
    heading = "Proof: nothing is lost between the loads and the pads"
    paper.put(sheet, f"K{row - 1}:V{row - 1}", heading, paper.SECTION)
    paper.put(sheet, f"K{row}:P{row}", "Sum [kN]", paper.FOUND_HEAD)
    labels = ("Loads on all beams", "Reactions of all bearings", "Totals of all pads")
    for number, label in enumerate((*labels, "Pads less loads"), row + 1):
        paper.put(sheet, f"K{number}:P{number}", label, paper.BLOCK_LABEL)
    for letter, case, source, pads in (("Q", "G", "E", "M"), ("R", "Q", "F", "N")):
        paper.put(sheet, f"{letter}{row}", case, paper.FOUND_HEAD)
        sums = (
            f"=SUM('{understood.NAME}'!{source}{read.format(source)})",
            f"=SUM({source}{FIRST}:{source}{last})",
            f"={pads}{total}",
        )
        for number, formula in enumerate(sums, row + 1):
            paper.put(sheet, f"{letter}{number}", formula, TOTAL)
        difference = f"=ROUND({letter}{row + 3}-{letter}{row + 1},9)"
        look = paper.found(paper.NOTHING, bold=True, fill=paper.MIST)
        paper.put(sheet, f"{letter}{row + 4}", difference, look)
    paper.alarm_when(sheet, f"Q{row + 4}:R{row + 4}", f"ABS(Q{row + 4})>0.001")
    paper.put(sheet, f"K{row + 6}:V{row + 6}", "Notes", paper.SECTION)
    for number, text in enumerate(design.pad_notes, row + 7):
        paper.put(sheet, f"K{number}:V{number}", text, paper.PROSE)
