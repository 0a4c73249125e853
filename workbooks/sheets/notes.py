"""The notes: signs, notation, basis and cautions."""

from __future__ import annotations

from openpyxl.worksheet.worksheet import Worksheet

from sheets import paper
from sheets.design import Design

NAME = "Notes"
FIRST = 5
SIDES = (("A", "B"), ("D", "E:H"))
"""The columns of the words and of the texts, on the left and on the right."""
ONE_LINE = 90
"""The most characters that a line of text holds."""


def draw(sheet: Worksheet, design: Design) -> None:
    """Draw the notes in two columns."""
    design.issue.draw(
        sheet,
        6,
        NAME,
        "Signs, notation, basis and cautions of this workbook.",
        left="A:B",
        block=("E", "F", "G", "H"),
    )
    paper.widths(sheet, (23, 82, 3, 23, 14, 32, 14, 22))
    paper.heights(sheet, {4: 8})
    bottom = FIRST
    for (words, texts), sections in zip(SIDES, design.notes, strict=True):
        row = FIRST
        for title, lines in sections:
            paper.put(sheet, f"{words}{row}:{texts[-1]}{row}", title, paper.SECTION)
            for word, text in lines:
                row += 1
                paper.put(sheet, f"{words}{row}", word, paper.STRONG_PROSE)
                paper.put(sheet, paper.in_row(texts, row), text, paper.PROSE)
                height = 7 + 16 * -(-len(text) // ONE_LINE)
                others = sheet.row_dimensions[row].height or 0
                sheet.row_dimensions[row].height = max(others, height)
            bottom = max(bottom, row)
            row += 2
    paper.page(sheet, f"A1:H{bottom}", design.issue.footer)
