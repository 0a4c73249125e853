"""The macro workbook: the sheets of the workbook with the VBA project of xlwings' template and its settings."""

from __future__ import annotations

from openpyxl import Workbook, load_workbook
from openpyxl.worksheet.worksheet import Worksheet

from beamfuncs.hosts.excel_addin.templates import template
from sheets import paper
from sheets.design import Design, Words

TEMPLATE = "quickstart_standalone.xlsm"
"""It holds xlwings' own VBA and needs no add-in."""
NAME = "xlwings.conf"
"""The name under which xlwings' VBA looks for settings in a workbook."""
TOP = 1
"""The row of the first setting: xlwings reads on from there to the first blank cell."""

SETTINGS: tuple[tuple[str, str | bool | None, str], ...] = (
    (
        "Interpreter_Win",
        r"%LOCALAPPDATA%\beamfuncs\venv\Scripts\pythonw.exe",
        "The Python that answers: the same place in every user's profile, which Windows fills in for the word "
        "between the % signs.",
    ),
    ("PYTHONPATH", None, "Blank: modules are taken from that Python and from nowhere else."),
    ("UDF Modules", "beamfuncs.hosts.excel", "The module that holds the beam functions."),
    ("Debug UDFs", False, "TRUE waits for a Python started by hand, to look for a fault in it."),
    ("Show Console", False, "TRUE shows the window in which Python prints."),
    (
        "Add_Workbook_to_PYTHONPATH",
        False,
        "FALSE: the workbook may lie in any folder; modules are not looked for beside it.",
    ),
)
"""What xlwings' VBA is told: the key, its value, and what it does."""

INSTRUCTIONS: Words = (
    (
        "This sheet",
        "The settings above are for the VBA of xlwings in this workbook; it finds them by the name of the sheet, from "
        "cell A1 down to the first blank cell of column A. Leave them there, and change values only in column B.",
    ),
    (
        "With beamfuncs.xlam",
        "Nothing to do here: that add-in answers the formulas of every workbook, has settings of its own, and does not "
        "read this sheet.",
    ),
    (
        "Without it",
        "Run “beamfuncs excel module -o beamfuncs.bas” with the Python named above, and open this workbook. Press "
        "Alt+F11, choose its project, then File > Import File, beamfuncs.bas, and save: it now carries the functions "
        "for everyone who has that Python.",
    ),
    (
        "Formulas",
        "Plain calls with no path in them, the same as in kestrel_quay.xlsx. Where no functions are installed, stored "
        "values show until the workbook is recalculated, and then #NAME?.",
    ),
)
BESIDE, BELOW = 82, 142
"""The most characters that a line holds of the texts beside the settings and of those below."""

KEY = paper.Look(bold=True, indent=1, fill=paper.MIST)
GIVEN = paper.Look(fill=paper.SAND, indent=1, number='"TRUE";"TRUE";"FALSE";@')
"""A value; a program that shows FALSE as a number is told the word."""
MEANING = paper.Look(wrap=True, indent=1)


def equip(book: Workbook, design: Design) -> None:
    """Add the VBA project and the sheet of settings to a workbook.

    The two sheets that the project has modules for are the first sheet and that of the settings.
    """
    given = load_workbook(template(TEMPLATE), keep_vba=True)
    book.vba_archive = given.vba_archive
    book.code_name = given.code_name
    for sheet, known in zip((book.worksheets[0], book.create_sheet(NAME)), given.worksheets, strict=True):
        sheet.sheet_properties.codeName = known.sheet_properties.codeName
    _draw(book[NAME], design)


def _draw(sheet: Worksheet, design: Design) -> None:
    paper.widths(sheet, (38, 58, 3, 78))
    for row, (key, value, meaning) in enumerate(SETTINGS, TOP):
        paper.put(sheet, f"A{row}", key, KEY)
        paper.put(sheet, f"B{row}", value, GIVEN)
        paper.put(sheet, f"D{row}", meaning, MEANING)
        paper.heights(sheet, {row: _height(meaning, BESIDE)})
    head = TOP + len(SETTINGS) + 1
    paper.put(sheet, f"A{head}:D{head}", "How this workbook finds its functions", paper.SECTION)
    for row, (word, text) in enumerate(INSTRUCTIONS, head + 1):
        paper.put(sheet, f"A{row}", word, paper.STRONG_PROSE)
        paper.put(sheet, f"B{row}:D{row}", text, paper.PROSE)
        paper.heights(sheet, {row: _height(text, BELOW)})
    paper.page(sheet, f"A1:D{head + len(INSTRUCTIONS)}", design.issue.footer)


def _height(text: str, one_line: int) -> float:
    return 7 + 16 * -(-len(text) // one_line)
