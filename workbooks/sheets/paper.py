"""The look of an issued sheet: its inks and fills, its title block, its page and its cell rules."""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from datetime import date

from openpyxl.formatting.rule import Rule
from openpyxl.styles import Alignment, Border, Font, PatternFill, Side
from openpyxl.styles.differential import DifferentialStyle
from openpyxl.utils import get_column_letter
from openpyxl.worksheet.datavalidation import DataValidation
from openpyxl.worksheet.formula import ArrayFormula
from openpyxl.worksheet.header_footer import HeaderFooterItem, _HeaderFooterPart
from openpyxl.worksheet.properties import PageSetupProperties
from openpyxl.worksheet.worksheet import Worksheet

Value = str | float | date | ArrayFormula | None

FACE = "Arial"
INK = "22313F"
QUIET = "6B7780"
HARBOUR = "2F4858"
DRIFTWOOD = "7A6A4F"
SAND = "FFF6DF"
MIST = "EEF2F4"
PALE = "D5DBDF"
WHITE = "FFFFFF"
MOSS = "2E6B3E"
ALARM = "A63D2F"
BLUSH = "F8DEDA"

HAIR = Side(style="hair", color="9AA5AC")
THIN = Side(style="thin", color="6B7780")
FIRM = Side(style="medium", color=HARBOUR)
GRID = Border(left=HAIR, right=HAIR, top=HAIR, bottom=HAIR)
BOX = Border(left=THIN, right=THIN, top=THIN, bottom=THIN)


@dataclass(frozen=True)
class Look:
    """How one kind of cell is drawn."""

    size: float = 10
    bold: bool = False
    italic: bool = False
    ink: str = INK
    fill: str | None = None
    across: str = "left"
    down: str = "center"
    wrap: bool = False
    indent: int = 0
    border: Border | None = GRID
    number: str = "General"


PROJECT = Look(size=18, bold=True, ink=HARBOUR, border=None)
TITLE = Look(size=12, bold=True, border=None)
SUBTITLE = Look(italic=True, ink=QUIET, border=None)
SECTION = Look(size=10, bold=True, ink=HARBOUR, border=Border(bottom=FIRM))
PROSE = Look(wrap=True, border=None)
STRONG_PROSE = Look(bold=True, wrap=True, border=None)
BLOCK_LABEL = Look(size=9, ink=QUIET, fill=MIST, indent=1, border=BOX)
BLOCK_VALUE = Look(bold=True, indent=1, border=BOX)
BLOCK_DATE = Look(bold=True, indent=1, border=BOX, number="d mmmm yyyy")
GIVEN_HEAD = Look(size=9, bold=True, ink=WHITE, fill=DRIFTWOOD, across="center", wrap=True, border=BOX)
FOUND_HEAD = Look(size=9, bold=True, ink=WHITE, fill=HARBOUR, across="center", wrap=True, border=BOX)
UNIT = Look(size=9, italic=True, ink=QUIET, fill=MIST, across="center", border=BOX)
MARK = Look(bold=True, across="center")
TEXT = Look(wrap=True, indent=1)
SMALL_TEXT = Look(size=9, wrap=True, indent=1)
ONE_LINE = Look(size=9, indent=1)
LINE_TEXT = Look(size=9, fill=MIST, wrap=True, indent=1)
COUNT = Look(across="center", number="0")
SUM_MARK = Look(bold=True, fill=MIST, across="center")
INPUT_TEXT = Look(fill=SAND, across="center")
INPUT_PHRASE = Look(fill=SAND, indent=1)
ABSENT = Look(ink=QUIET, across="center")
STATUS = Look(bold=True, across="center")
FAULT = Look(size=8, ink=ALARM, wrap=True, indent=1)
NOTHING = "0.000;-0.000;0.000"
"""The number format of a difference that should be nothing."""


def given(number: str) -> Look:
    """Return the look of a number the engineer types."""
    return Look(fill=SAND, across="right", number=number)


def found(number: str, *, bold: bool = False, fill: str | None = None) -> Look:
    """Return the look of a number a formula finds."""
    return Look(across="right", number=number, bold=bold, fill=fill)


def put(sheet: Worksheet, cell: str, value: Value, look: Look, *, merged: bool = True) -> None:
    """Write `value` into `cell`; a block such as `A1:C1` is drawn alike, and merged."""
    first = cell.split(":")[0]
    sheet[first] = value
    block = sheet[cell] if ":" in cell else ((sheet[cell],),)
    for row in block:
        for each in row:
            each.font = Font(name=FACE, size=look.size, bold=look.bold, italic=look.italic, color=look.ink)
            each.alignment = Alignment(
                horizontal=look.across, vertical=look.down, wrap_text=look.wrap, indent=look.indent
            )
            each.number_format = look.number
            if look.fill:
                each.fill = PatternFill("solid", fgColor=look.fill)
            if look.border:
                each.border = look.border
    if ":" in cell and merged:
        sheet.merge_cells(cell)


def array(sheet: Worksheet, block: str, formula: str) -> None:
    """Write one array formula over `block`, whose cells keep their looks."""
    sheet[block.split(":")[0]] = ArrayFormula(block, formula)


def widths(sheet: Worksheet, sizes: Iterable[float]) -> None:
    """Set the column widths from column A on."""
    for column, size in enumerate(sizes, 1):
        sheet.column_dimensions[get_column_letter(column)].width = size


def heights(sheet: Worksheet, sizes: Mapping[int, float]) -> None:
    """Set the heights of the rows named."""
    for row, size in sizes.items():
        sheet.row_dimensions[row].height = size


@dataclass(frozen=True)
class TitleBlock:
    """What every sheet of one issue says about itself."""

    project: str
    reference: str
    revision: str
    issued: date
    sheets: int

    @property
    def footer(self) -> str:
        """The line at the foot of every printed page."""
        return f"{self.project} · {self.reference} · revision {self.revision} · invented project, for example only"

    def draw(
        self,
        sheet: Worksheet,
        number: int,
        title: str,
        subtitle: str,
        *,
        left: str,
        block: Sequence[str],
    ) -> None:
        """Draw the headings in the columns `left`, the title block in four column groups.

        `left` and each of `block` is a column or a group of columns such as `A:P`.
        """
        for row, (text, look) in enumerate([(self.project, PROJECT), (title, TITLE), (subtitle, SUBTITLE)], 1):
            put(sheet, in_row(left, row), text, look)
        entries: list[list[tuple[str, Value]]] = [
            [("Reference", f"{self.reference}-{number}"), ("Revision", self.revision)],
            [("Date", self.issued), ("Sheet", f"{number} of {self.sheets}")],
            [("Prepared", None), ("Checked", None)],
        ]
        for row, pairs in enumerate(entries, 1):
            for (label, value), names, values in zip(pairs, block[::2], block[1::2], strict=True):
                put(sheet, in_row(names, row), label, BLOCK_LABEL)
                look = BLOCK_DATE if isinstance(value, date) else BLOCK_VALUE
                put(sheet, in_row(values, row), value, look)
        heights(sheet, {1: 26, 2: 20, 3: 18})


def in_row(columns: str, row: int) -> str:
    """Return the cell or the block that the columns `A` or `A:P` have in `row`."""
    first, _, last = columns.partition(":")
    return f"{first}{row}:{last}{row}" if last else f"{first}{row}"


def _small(text: str) -> _HeaderFooterPart:
    return _HeaderFooterPart(text, size=8)


def page(sheet: Worksheet, area: str, footer: str, titles: str | None = None) -> None:
    """Set up the printed page: landscape A3, one page wide, numbered."""
    sheet.print_area = area
    sheet.page_setup.orientation = "landscape"
    sheet.page_setup.paperSize = 8
    sheet.page_setup.fitToWidth = 1
    sheet.page_setup.fitToHeight = 0
    sheet.sheet_properties.pageSetUpPr = PageSetupProperties(fitToPage=True)
    sheet.print_options.horizontalCentered = True
    if titles:
        sheet.print_title_rows = titles
    margins = sheet.page_margins
    margins.left = margins.right = 0.45
    margins.top, margins.bottom = 0.6, 0.6
    margins.header = margins.footer = 0.3
    sheet.HeaderFooter.oddHeader = HeaderFooterItem(right=_small("&A"))
    sheet.HeaderFooter.oddFooter = HeaderFooterItem(left=_small(footer), right=_small("Page &P of &N"))
    sheet.sheet_view.showGridLines = False


def allow(sheet: Worksheet, cells: str, rule: DataValidation, message: str) -> None:
    """Let only what `rule` accepts into `cells`, and say why another entry is refused."""
    rule.error, rule.errorTitle = message, "Not accepted"
    rule.showErrorMessage = True
    sheet.add_data_validation(rule)
    for block in cells.split():
        rule.add(block)


def positive() -> DataValidation:
    """Return the rule of a number above zero; a blank is accepted."""
    return DataValidation(type="decimal", operator="greaterThan", formula1="0", allow_blank=True)


def any_number() -> DataValidation:
    """Return the rule of any number; a blank is accepted."""
    return DataValidation(type="decimal", operator="between", formula1="-1E9", formula2="1E9", allow_blank=True)


def one_of(words: Iterable[str]) -> DataValidation:
    """Return the rule of a word out of a short list; a blank is accepted."""
    return DataValidation(type="list", formula1=f'"{",".join(words)}"', allow_blank=True)


def alarm_when(sheet: Worksheet, cells: str, condition: str) -> None:
    """Colour `cells` where `condition`, written for the first of them, is true."""
    alarm = DifferentialStyle(font=Font(color=ALARM), fill=PatternFill("solid", bgColor=BLUSH))
    rule = Rule(type="expression", formula=[condition], dxf=alarm)
    sheet.conditional_formatting.add(cells, rule)
