"""Ordinary formulas as they stand in design workbooks, each with the value that a spreadsheet shows.

Every value is worked by hand from the cells below, as the words beside it say; none is any program's output.

    Given   A1 6   A2 4   A3 blank   A4 text 7.25   A5 TRUE   A6 9 October 2025   A7 text pile   A8 0   A9 -2.5
            A10 =A7*2, an error
    Pads    a table PadTable:  Mark  Load  Side  Row
                               m1    12    1.5   N
                               m2    24    2.5   S
                               m3    36    0.75  N
                               m4    48    3     E
    Names   Factor = Given!$A$1   Share = 0.25   Loads = Pads!$B$2:$B$5   Double = Given!$A$1*2
"""

from __future__ import annotations

import re
import zipfile
from datetime import date
from pathlib import Path
from typing import Any, NamedTuple

import openpyxl
from openpyxl.utils.datetime import CALENDAR_MAC_1904
from openpyxl.workbook.defined_name import DefinedName
from openpyxl.worksheet.formula import ArrayFormula
from openpyxl.worksheet.table import Table

DAYS_TO_1904 = 1462
"""The same day's number is so much less where days count from 1904: four years, one of them leap, and a day."""


class Case(NamedTuple):
    """A formula, the value it has, and how that is worked out; an array's values are a list, one a row."""

    formula: str
    value: Any
    worked: str
    array: bool = False
    """Entered as an array formula, over as many rows as there are values."""
    counts_days: bool = False
    """The value is the number of a day, so that it depends on the workbook's date system."""


CORE = [
    Case("=Given!A1+Given!A2*2", 14, "6 + 4·2"),
    Case("=-Given!A2^2", 16, "a sign binds before a power: (-4)²"),
    Case("=3^2^2", 81, "powers from left to right: 9²"),
    Case("=Given!A1*15%", 0.9, "6·0.15"),
    Case('="pinned "&Given!A2&" roller"', "pinned 4 roller", "a whole number joins without a point"),
    Case('="x"&2/3', "x0.666666666666667", "a number joins with 15 digits, rounded"),
    Case("=Given!A4+1", 8.25, "text that reads as a number is one where it is added"),
    Case("=SUM(Given!A4,1)", 1, "SUM leaves out text in cells"),
    Case('=SUM("7.25",1)', 8.25, "but takes text that is written into it"),
    Case("=Given!A7*2", "#VALUE!", "pile is no number"),
    Case('=IF(Given!A3="",1,2)', 1, "a blank equals empty text"),
    Case("=IF(Given!A3=0,1,2)", 1, "and equals 0"),
    Case("=ISBLANK(Given!A3)", True, "it is blank"),
    Case("=Given!A3", 0, "a blank shows as 0"),
    Case("=SUM(Pads!B2:B5)", 120, "12 + 24 + 36 + 48"),
    Case("=SUM(Pads!B:B)", 120, "the header is text"),
    Case("=MAX(Pads!C2:C5)", 3, "of 1.5, 2.5, 0.75, 3"),
    Case('=INDEX(Pads!A2:C5,MATCH("m3",Pads!A2:A5,0),3)', 0.75, "third row, third column"),
    Case('=VLOOKUP("M2",Pads!A2:D5,3,FALSE)', 2.5, "case does not matter"),
    Case('=_xlfn.XLOOKUP("m9",Pads!A2:A5,Pads!B2:B5,"none")', "none", "there is no m9"),
    Case('=SUMIFS(Pads!B:B,Pads!D:D,"N",Pads!B:B,">12")', 36, "of the two N rows the one above 12"),
    Case("=SUMPRODUCT(Pads!B2:B5,Pads!C2:C5)", 249, "18 + 60 + 27 + 144"),
    Case('=TEXT(2345.5,"#,##0.00")', "2,345.50", "thousands and two places"),
    Case('=TEXT(Given!A6,"yyyy-mm-dd")', "2025-10-09", "the day itself"),
    Case("=_xlfn.LET(_xlpm.x,Given!A1,_xlpm.y,_xlpm.x*2,_xlpm.x+_xlpm.y)", 18, "6 + 12"),
    Case("=Factor*Share", 1.5, "6·0.25"),
    Case("=SUM(Loads)", 120, "the named area"),
    Case("=SUM(PadTable[Load])", 120, "the table's column"),
    Case("=SUM(PadTable[[#All],[Side]])", 7.75, "1.5 + 2.5 + 0.75 + 3, the header left out"),
    Case('=IFERROR(1/0,"none")', "none", "in place of the error"),
    Case("=SUM(Given!A9:A10)", "#VALUE!", "an error goes through a sum"),
    Case("=ROUND(2.675,2)+ROUND(-3.5,0)", -1.32, "halves go away from zero, in decimals: 2.68 - 4"),
    Case("=NOT_A_FUNCTION(1)", "#NAME?", "there is none of that name"),
    Case("=not_a_name+1", "#NAME?", "nor such a name"),
    Case("=Given!A6+1", 45_940, "1 January 2025 is day 45658; 281 days later, and one", counts_days=True),
    Case("=INDEX(Pads!B2:B5,9)", "#REF!", "there are four rows"),
    Case('=VLOOKUP("m9",Pads!A2:D5,2,FALSE)', "#N/A", "not found"),
    Case("=SQRT(-1)", "#NUM!", "no real root"),
    Case("=SUM(Pads!B2:B5*Pads!C2:C5)", [249], "as the sum of products above", array=True),
    Case("=Pads!B2:B5*2", [24, 48, 72, 96], "each of them twice", array=True),
]
"""What the formulas of a design workbook are made of."""

EXTRA = [
    Case('="b"="B"', True, "case does not matter"),
    Case('=2<"a"', True, "any number comes before any text"),
    Case('=_xlfn.TEXTJOIN(", ",TRUE,Pads!A2:A5)', "m1, m2, m3, m4", "joined"),
    Case('=LEFT("purlin",3)&MID("purlin",4,1)&LEN("purlin")', "purl6", "pur, l, and six letters"),
    Case('=COUNTIF(Pads!A2:A5,"m*")', 4, "all four begin with m"),
    Case('=CHOOSE(2,"a","b")', "b", "the second"),
    Case('=INDIRECT("Given!A"&2)', 4, "the cell that the text names"),
    Case("=OFFSET(Given!A1,1,0)", 4, "one row down"),
    Case("=0.1+0.2=0.3", True, "equal in the 15 digits that count"),
    Case("=SUM(Given:Pads!A1)", 6, "A1 of both sheets: 6, and text"),
    Case("=Double", 12, "the formula behind the name"),
    Case('=SUMIF(Pads!A:A,"m1",Pads!B:B)', 12, "one row"),
    Case("=AND(TRUE,Given!A1>4)", True, "6 > 4"),
    Case('=IF(Given!A1>4,"ok",1/0)', "ok", "what is not taken is not worked out"),
    Case("=YEAR(Given!A6)*100+MONTH(Given!A6)", 202_510, "2025 and 10"),
    Case('=TEXT(0.375,"0.0%")', "37.5%", "a hundred times, one place"),
    Case('=1E3&""', "1000", "a whole number joins without an exponent"),
    Case('=IFERROR(MATCH(99,Pads!B2:B5,0),"nf")', "nf", "there is no 99"),
    Case("=MATCH(30,Pads!B2:B5)", 2, "24 is the last that is not above 30"),
    Case("=COUNTBLANK(Given!A1:A9)", 1, "A3"),
    Case("=SUM(PadTable[@Load])", "#VALUE!", "this row meets no row of the table"),
    Case('=SUBSTITUTE("a-b","-","/")', "a/b", "one dash"),
    Case('=TEXT(-5,"0;(0)")', "(5)", "a negative in brackets"),
    Case('="t"&TRUE', "tTRUE", "a truth joins by its name"),
    Case('="1,234"+1', 1235, "text with a thousands mark is a number"),
]
"""What is seen now and then."""

FIRST_ROW = 11
"""The formulas begin below the rows of `PadTable`, one each sixth row: an array has room."""
ROWS_APART = 6

SPILLS: dict[str, tuple[str, str, list[list[Any]], str]] = {
    "D1": ('_xlfn._xlws.FILTER(Pads!A2:A5,Pads!D2:D5="N")', "D1:D2", [["m1"], ["m3"]], "the two N rows"),
    "E1": ("_xlfn.SEQUENCE(2,2)", "E1:F2", [[1, 2], [3, 4]], "1 to 4 by rows"),
    "H1": ("SUM(_xlfn.ANCHORARRAY(E1))", "", [[10]], "1 + 2 + 3 + 4"),
    "I1": ("Pads!B2:B5*2", "I1:I4", [[24], [48], [72], [96]], "each of them twice"),
}
"""Spilling formulas by their cells: formula, the cells that they fill, their values, how worked."""

_DYNAMIC = (
    '<metadata xmlns="http://schemas.openxmlformats.org/spreadsheetml/2006/main" '
    'xmlns:xda="http://schemas.microsoft.com/office/spreadsheetml/2017/dynamicarray"><metadataTypes count="1">'
    '<metadataType name="XLDAPR" minSupportedVersion="120000" cellMeta="1"/></metadataTypes>'
    '<futureMetadata name="XLDAPR" count="1"><bk><extLst><ext uri="{bdbb8cdc-fa1e-496e-a857-3c3f30c029c3}">'
    '<xda:dynamicArrayProperties fDynamic="1" fCollapsed="0"/></ext></extLst></bk></futureMetadata>'
    '<cellMetadata count="1"><bk><rc t="1" v="0"/></bk></cellMetadata></metadata>'
)


def row_of(number: int) -> int:
    """The row where the formula of this number stands."""
    return FIRST_ROW + ROWS_APART * number


def build(path: Path, counts_from_1904: bool = False) -> Path:
    """Write the workbook: the formulas in column A of `Calc`, the spilling ones in its first rows."""
    book = openpyxl.Workbook()
    if counts_from_1904:
        book.epoch = CALENDAR_MAC_1904
    book.remove(book.worksheets[0])
    calc, given, pads = (book.create_sheet(name) for name in ("Calc", "Given", "Pads"))
    for row, value in enumerate([6, 4, None, "7.25", True, date(2025, 10, 9), "pile", 0, -2.5, "=A7*2"], 1):
        given.cell(row, 1).value = value
    for line in [("Mark", "Load", "Side", "Row"), ("m1", 12, 1.5, "N"), ("m2", 24, 2.5, "S"), ("m3", 36, 0.75, "N")]:
        pads.append(line)
    pads.append(("m4", 48, 3, "E"))
    pads.add_table(Table(displayName="PadTable", ref="A1:D5"))
    names = {"Factor": "Given!$A$1", "Share": "0.25", "Loads": "Pads!$B$2:$B$5", "Double": "Given!$A$1*2"}
    for name, meaning in names.items():
        book.defined_names[name] = DefinedName(name, attr_text=meaning)
    for number, case in enumerate(CORE + EXTRA):
        cell = calc.cell(row_of(number), 1)
        if case.array:
            cell.value = ArrayFormula(f"A{cell.row}:A{cell.row + len(case.value) - 1}", case.formula)
        else:
            cell.value = case.formula
    for name, (formula, *_) in SPILLS.items():
        calc[name] = f"={formula}"
    book.save(path)
    return _spilling(path)


def _spilling(path: Path) -> Path:
    """Mark the cells of `SPILLS` as those of a spreadsheet whose arrays spill."""
    with zipfile.ZipFile(path) as archive:
        parts = {name: archive.read(name).decode() for name in archive.namelist() if not name.endswith("/")}
    sheet = "xl/worksheets/sheet1.xml"
    for name, (_, extent, *_) in SPILLS.items():
        if extent:
            old = rf'<c r="{name}"(?: s="\d+")?><f>(.*?)</f>'
            parts[sheet], count = re.subn(
                old, rf'<c r="{name}" cm="1"><f t="array" ref="{extent}">\1</f>', parts[sheet], flags=re.DOTALL
            )
            assert count == 1, name
    kind = "application/vnd.openxmlformats-officedocument.spreadsheetml.sheetMetadata+xml"
    parts["[Content_Types].xml"] = parts["[Content_Types].xml"].replace(
        "</Types>", f'<Override PartName="/xl/metadata.xml" ContentType="{kind}"/></Types>'
    )
    relation = "http://schemas.openxmlformats.org/officeDocument/2006/relationships/sheetMetadata"
    parts["xl/_rels/workbook.xml.rels"] = parts["xl/_rels/workbook.xml.rels"].replace(
        "</Relationships>", f'<Relationship Id="metadata" Type="{relation}" Target="metadata.xml"/></Relationships>'
    )
    parts["xl/metadata.xml"] = _DYNAMIC
    with zipfile.ZipFile(path, "w", zipfile.ZIP_DEFLATED) as archive:
        for name, content in parts.items():
            archive.writestr(name, content)
    return path
