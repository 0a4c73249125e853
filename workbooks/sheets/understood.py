"""The sentences that say what the functions read, to compare with the drawings."""

from __future__ import annotations

from openpyxl.worksheet.worksheet import Worksheet

from sheets import in_depth, paper, schedule
from sheets.called import Called
from sheets.design import Design

NAME = "As understood"
FIRST = 7
"""The row of the first beam."""
LOADS = dict(zip(schedule.CASES, "EFGH", strict=True))
"""The columns of the total loads by case."""
ALL = "I"
"""The column of the total load in whatever case."""
HEADS = (
    ("A", "Beam", ""),
    ("B", "The beam", "m, kNm²"),
    ("C", "Its loads", "kN, m, kNm"),
    ("D", "Length", "m"),
    *((letter, f"Load, {case}", "kN") for case, letter in LOADS.items()),
    (ALL, "Load, all cases", "kN"),
    ("J", "Fault (blank: none)", ""),
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
        block=("D:E", "F:H", "I", "J"),
    )
    paper.widths(sheet, (7, 75, 72, 8.5, 8.5, 8.5, 8.5, 8.5, 11, 18))
    paper.heights(sheet, {4: 8, 5: 34, 6: 17})
    for columns, head, unit in HEADS:
        paper.put(sheet, paper.in_row(columns, 5), head, paper.FOUND_HEAD)
        paper.put(sheet, paper.in_row(columns, 6), unit, paper.UNIT)
    beams = every_beam(design)
    last = FIRST + len(beams) - 1
    for row, beam in enumerate(beams, FIRST):
        paper.put(sheet, f"A{row}", f"={beam.mark}", paper.MARK)
        paper.put(sheet, f"B{row}", f"=beam_reads({beam.line},{beam.stiffness})", paper.SMALL_TEXT)
        paper.put(sheet, f"C{row}", f"=loads_read({beam.line},{beam.loads})", paper.SMALL_TEXT)
        paper.put(sheet, f"D{row}", beam.length(), paper.found("0.00"))
        for case, letter in LOADS.items():
            total = beam.ask("beam_result", f'"1 {case}"', '"total load"')
            paper.put(sheet, f"{letter}{row}", total, paper.found("#,##0.0"))
        every = beam.ask("beam_result", None, '"total load"')
        paper.put(sheet, f"{ALL}{row}", every, paper.found("#,##0.0", bold=True))
        fault = beam.ask("fault", schedule.combination("strength"))
        paper.put(sheet, f"J{row}", fault, paper.FAULT)
        sheet.row_dimensions[row].height = 41 if row < last else 62
    others = f"ABS(${ALL}{FIRST}-SUM($E{FIRST}:$H{FIRST}))>0.001"
    paper.alarm_when(sheet, f"{ALL}{FIRST}:{ALL}{last}", f"IF(ISERROR(${ALL}{FIRST}),TRUE,{others})")
    paper.alarm_when(sheet, f"J{FIRST}:J{last}", f"IF(ISERROR($J{FIRST}),TRUE,LEN($J{FIRST})>0)")
    sheet.freeze_panes = f"B{FIRST}"
    paper.page(sheet, f"A1:J{last}", design.issue.footer, titles="5:6")
