"""The sentences that say what the functions read, to compare with the drawings."""

from __future__ import annotations

from openpyxl.worksheet.worksheet import Worksheet

from sheets import in_depth, paper, schedule
from sheets.called import Called
from sheets.design import Design

NAME = "As understood"
FIRST = 7
"""The row of the first beam."""
HEADS = (
    ("A", "Beam", ""),
    ("B", "The beam", "m, kNm²"),
    ("C", "Its loads", "kN, m, kNm"),
    ("D", "Length", "m"),
    ("E", "Total load, 1 G", "kN"),
    ("F", "Total load, 1 Q", "kN"),
    ("G:H", "Fault (blank: none)", ""),
)


def every_beam(design: Design) -> list[Called]:
    """Return every beam of the workbook as the formulas of other sheets name it."""
    beams = []
    for row, member in enumerate(design.members, schedule.FIRST):
        cells = {key: f"{schedule.NAME}!{cell}" for key, cell in schedule.cells_of(row).items()}
        beams.append(
            Called(
                mark=cells["mark"],
                where=cells["where"],
                line=cells["line"],
                loads=cells["loads"],
                stiffness=cells["EI"],
                lengths=f"{cells['L1']}:{schedule.cells_of(row)['L3']}",
                pads=tuple(cells[f"pad{i}"] for i, _ in enumerate(member.pads, 1)),
            )
        )
    return [*beams, in_depth.cells_of(design.laid_out, f"{in_depth.NAME}!")]


def draw(sheet: Worksheet, design: Design) -> None:
    """Draw the sentences, and the total load of each beam."""
    design.issue.draw(
        sheet,
        2,
        NAME,
        "What the functions read. Compare these sentences with the drawings before using numbers.",
        left="A:B",
        block=("D", "E:F", "G", "H"),
    )
    paper.widths(sheet, (7, 82, 64, 11, 12, 12, 14, 14))
    paper.heights(sheet, {4: 8, 5: 28, 6: 14})
    for columns, head, unit in HEADS:
        paper.put(sheet, paper.in_row(columns, 5), head, paper.FOUND_HEAD)
        paper.put(sheet, paper.in_row(columns, 6), unit, paper.UNIT)
    beams = every_beam(design)
    last = FIRST + len(beams) - 1
    for row, beam in enumerate(beams, FIRST):
        paper.put(sheet, f"A{row}", f"={beam.mark}", paper.MARK)
        paper.put(sheet, f"B{row}", f"=beam_reads({beam.line},{beam.stiffness})", paper.TEXT)
        paper.put(sheet, f"C{row}", f"=loads_read({beam.line},{beam.loads})", paper.TEXT)
        paper.put(sheet, f"D{row}", f"=SUM({beam.lengths})", paper.found("0.00"))
        for letter, case in (("E", '"1 G"'), ("F", '"1 Q"')):
            total = beam.ask("beam_result", case, '"total load"')
            paper.put(sheet, f"{letter}{row}", total, paper.found("#,##0.0"))
        fault = beam.ask("fault", schedule.combination("strength"))
        paper.put(sheet, f"G{row}:H{row}", fault, paper.FAULT)
        sheet.row_dimensions[row].height = 34 if row < last else 62
    paper.alarm_when(sheet, f"G{FIRST}:H{last}", f"LEN($G{FIRST})>0")
    sheet.freeze_panes = f"B{FIRST}"
    paper.page(sheet, f"A1:H{last}", design.issue.footer, titles="5:6")
