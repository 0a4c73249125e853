"""The look of an issued sheet: its inks and fills, its title block, its page and its cell rules."""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from datetime import date
from typing import Literal

from openpyxl import Workbook
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
HATCH = "AEB8BF"
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

    size: float = 12
    bold: bool = False
    italic: bool = False
    ink: str = INK
    fill: str | None = None
    pattern: Literal["solid", "lightUp"] = "solid"
    across: str = "left"
    down: str = "center"
    wrap: bool = False
    shrink: bool = False
    indent: int = 0
    border: Border | None = GRID
    number: str = "General"


PROJECT = Look(size=20, bold=True, ink=HARBOUR, border=None)
TITLE = Look(size=14, bold=True, border=None)
SUBTITLE = Look(italic=True, ink=QUIET, border=None)
LEGEND = Look(size=11, italic=True, ink=QUIET, indent=1, border=None)
SECTION = Look(bold=True, ink=HARBOUR, border=Border(bottom=FIRM))
PROSE = Look(wrap=True, border=None)
STRONG_PROSE = Look(bold=True, wrap=True, border=None)
BLOCK_LABEL = Look(size=11, ink=QUIET, fill=MIST, indent=1, border=BOX)
BLOCK_VALUE = Look(bold=True, indent=1, border=BOX)
BLOCK_DATE = Look(bold=True, indent=1, border=BOX, number="d mmmm yyyy")
GIVEN_HEAD = Look(size=11, bold=True, ink=WHITE, fill=DRIFTWOOD, across="center", wrap=True, border=BOX)
FOUND_HEAD = Look(size=11, bold=True, ink=WHITE, fill=HARBOUR, across="center", wrap=True, border=BOX)
UNIT = Look(size=11, italic=True, ink=QUIET, fill=MIST, across="center", wrap=True, border=BOX)
MARK = Look(bold=True, across="center")
TEXT = Look(wrap=True, indent=1)
SMALL_TEXT = Look(size=11, wrap=True, indent=1)
ONE_LINE = Look(size=11, indent=1)
LINE_TEXT = Look(size=11, fill=MIST, wrap=True, indent=1)
COUNT = Look(across="center", number="0")
SUM_MARK = Look(bold=True, fill=MIST, across="center")
INPUT_TEXT = Look(fill=SAND, across="center")
INPUT_PHRASE = Look(fill=SAND, indent=1)
ABSENT = Look(ink=QUIET, across="center")
NOT_USED = Look(ink=QUIET, fill=HATCH, pattern="lightUp", across="center")
FOOTNOTE = Look(size=11, italic=True, ink=QUIET, indent=1, border=None)
STATUS = Look(bold=True, across="center", shrink=True)
FAULT = Look(size=10, ink=ALARM, down="top", wrap=True)
NOTHING = "0.000;-0.000;0.000"
"""The number format of a difference that should be nothing."""


def given(number: str) -> Look:
    """Return the look of a number the engineer types."""
    return Look(fill=SAND, across="right", number=_off_the_edge(number))


def found(number: str, *, bold: bool = False, fill: str | None = None) -> Look:
    """Return the look of a number a formula finds."""
    return Look(across="right", number=_off_the_edge(number), bold=bold, fill=fill, shrink=True)


def _off_the_edge(number: str) -> str:
    """Return a number format that leaves the width of a bracket free at the right."""
    return ";".join(f"{part}_)" for part in number.split(";"))


def put(sheet: Worksheet, cell: str, value: Value, look: Look, *, merged: bool = True) -> None:
    """Write `value` into `cell`; a block such as `A1:C1` is drawn alike, and merged."""
    first = cell.split(":")[0]
    sheet[first] = value
    block = sheet[cell] if ":" in cell else ((sheet[cell],),)
    for row in block:
        for each in row:
            each.font = Font(name=FACE, size=look.size, bold=look.bold, italic=look.italic, color=look.ink)
            each.alignment = Alignment(
                horizontal=look.across,
                vertical=look.down,
                wrap_text=look.wrap,
                shrink_to_fit=look.shrink,
                indent=look.indent,
            )
            each.number_format = look.number
            if look.fill:
                each.fill = PatternFill(look.pattern, fgColor=look.fill)
            if look.border:
                each.border = look.border
    if ":" in cell and merged:
        sheet.merge_cells(cell)


def array(sheet: Worksheet, block: str, formula: str) -> None:
    """Write one array formula over `block`, whose cells keep their looks."""
    sheet[block.split(":")[0]] = ArrayFormula(block, formula)


def measure_in_digits_of_the_face(book: Workbook) -> None:
    """Let the widths of columns count digits of the face used here: they count those of the style Normal."""
    book._named_styles["Normal"].font = Font(name=FACE, size=11)  # type: ignore[attr-defined]


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
        heights(sheet, {1: 28, 2: 22, 3: 20})


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
    """Let only what `rule` accepts into `cells`, parted by blanks, and say why another entry is refused."""
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


def nothing() -> DataValidation:
    """Return the rule that refuses every entry."""
    return DataValidation(type="custom", formula1="FALSE", allow_blank=True)


def alarm_unless_nothing(sheet: Worksheet, cells: str) -> None:
    """Colour those of `cells` that hold another number than 0, or an error."""
    first = cells.split(":")[0]
    alarm_when(sheet, cells, f"IF(ISERROR({first}),TRUE,ABS({first})>0.001)")


def alarm_when(sheet: Worksheet, cells: str, condition: str) -> None:
    """Colour `cells` where `condition`, written for the first of them, is true."""
    alarm = DifferentialStyle(font=Font(color=ALARM), fill=PatternFill("solid", bgColor=BLUSH))
    rule = Rule(type="expression", formula=[condition], dxf=alarm)
    sheet.conditional_formatting.add(cells, rule)


def fade_when(sheet: Worksheet, cells: str, condition: str) -> None:
    """Write white on white in `cells` where `condition`, written for the first of them, is true."""
    faded = DifferentialStyle(font=Font(color=WHITE))
    sheet.conditional_formatting.add(cells, Rule(type="expression", formula=[condition], dxf=faded))
