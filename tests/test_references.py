"""What an office's workbooks hand to beam functions: tables, names, other sheets, whole columns, spilled arrays."""

from __future__ import annotations

import re
from pathlib import Path

import openpyxl
import pytest
from books import build, formulas, from_xml, rewrite, values
from openpyxl.workbook.defined_name import DefinedName
from openpyxl.worksheet.table import Table

from beamfuncs.hosts.headless.filling import CellFault, fill

LINE, LOADS = "pinned 6 roller", "udl 4"
"""Reactions of 12, a moment of 18."""

CELLS = {
    "A1": "pinned",
    "A2": 6,
    "A3": "roller",
    "B1": LOADS,
    "C1": LINE,
    "Over there!A1": LINE,
    "Over there!B1": "point 10 at 3",
    "Rows!A1": "pinned",
    "Rows!B1": 6,
    "Rows!C1": "roller",
    "Rows!A2": LOADS,
}
NAMES = {
    "Line": "Plan!$A$1:$A$3",
    "Column": "Plan!$A:$A",
    "Loads": "Plan!$B$1",
    "Four": "4",
    "Text": '"udl 4"',
    "Joined": '"udl "&Four',
    "First_reaction": "reaction(Line,Loads,1)",
    "Both": "First_reaction+reaction(Line,Joined,2)",
    "To_the_left": "Plan!C1",
    "Left_of_it": "moment_max(Plan!C1,Plan!$B$1)",
    "Picked": "OFFSET(Plan!$A$1,0,0,3,1)",
    "Elsewhere": "[1]Sheet1!$A$1",
}


@pytest.mark.parametrize(
    ("formula", "expected"),
    [
        ("=reaction(A1:A3,B1,1)", 12),
        ("=reaction(A:A,B1,1)", 12),
        ("=reaction($A:$A,B:B,1)", 12),
        ("=reaction('Over there'!A1,'Over there'!B1,1)", 5),
        ("=reaction('Over there'!A:A,'Over there'!B:B,1)", 5),
        ("=reaction(Rows!1:1,Rows!2:2,1)", 12),
        ("=reaction(Rows!$1:$1,Rows!$A$2,1)", 12),
        ("=reaction(Line,Loads,1)", 12),
        ("=reaction(Column,Text,1)", 12),
        ("=reaction(LINE,joined,1)", 12),
        ("=reaction(Plan!Line,'Plan'!Loads,1)", 12),
        ("=reaction('Over there'!Line,Rows!Text,1)", 12),
        ("=First_reaction*2", 24),
        ("=SUM(first_reaction,Both)", 36),
        ("=reaction(Picked,B1,1)", 12),
        ("=reaction(OFFSET(A1,0,0,3,1),B1,1)", 12),
        ('=reaction(INDIRECT("A1:A3"),B1,1)', 12),
        ("=reaction(A1:INDEX(A:A,3),B1,1)", 12),
        ("=reaction(IF(TRUE,A1:A3,C1),B1,1)", 12),
        ("=reaction(CHOOSE(2,A1:A3,C1),B1,1)", 12),
        ("=reaction(INDEX(A1:C3,0,1),INDEX(A1:C3,1,2),1)", 12),
        ("=reaction(C1,_xlfn.SINGLE(B1:B9),1)", 12),
        ("=reaction(_xlfn.LET(_xlpm.line,A1:A3,_xlpm.line),B1,1)", 12),
        ("=SUM(Plan:Rows!A2)", 6),
    ],
)
def test_every_kind_of_reference_is_an_argument(formula: str, expected: float, tmp_path: Path) -> None:
    """Ranges, whole columns and rows, other sheets, names for areas, constants, texts and formulas."""
    report = fill(build(tmp_path / "book.xlsx", CELLS | {"E1": formula}, NAMES))
    assert report.errors == []
    assert values(report.target)["E1"] == pytest.approx(expected, rel=1e-12)
    assert report.beam_cells == (0 if formula.startswith("=SUM(Plan:") else 1)


def test_a_name_that_calls_a_beam_function_counts_as_a_beam_cell(tmp_path: Path) -> None:
    """What a name stands for is computed for the cell that uses it, its error listed there with its reason."""
    cells = CELLS | {"E1": "=First_reaction", "E2": "=E1+1", "E3": "=Broken", "E4": "=Missing"}
    names = NAMES | {"Broken": "reaction(Line,Loads,7)", "Missing": "[1]Sheet1!$A$1+1"}
    path = build(tmp_path / "book.xlsx", cells, names)
    report = fill(path)
    got = values(report.target)
    assert (got["E1"], got["E2"], report.beam_cells) == (12, 13, 2)
    first, second = report.errors
    assert (first.cell, first.value, first.formula) == ("E3", "#N/A", "=Broken")
    assert "support" in first.reason
    assert second == CellFault(
        "Plan", "E4", "#REF!", "refers to another workbook, which is not opened here", "=Missing"
    )
    assert formulas(report.target) == formulas(path)


def test_a_name_may_move_along_with_its_cell(tmp_path: Path) -> None:
    """A name without `$` is meant from where it is used, also in a formula that cells share."""
    rows = "".join(
        f'<row r="{n}"><c r="A{n}"><f t="shared" si="0"{formula}</c>'
        f'<c r="D{n}" t="inlineStr"><is><t>pinned {length} roller</t></is></c></row>'
        for n, length, formula in [(1, 6, ' ref="A1:A2">2*Moment</f>'), (2, 8, "/>")]
    )
    path = from_xml(tmp_path / "book.xlsx", rows)
    name = b'<definedNames><definedName name="Moment">moment_max(Plan!D1,"udl 4")</definedName></definedNames>'
    rewrite(path, "xl/workbook.xml", lambda xml: re.sub(rb"<definedNames ?/>|(?=<calcPr)", name, xml, count=1))
    report = fill(path)
    assert report.errors == []
    got = values(report.target)
    assert (got["A1"], got["A2"], report.beam_cells) == (36, 64, 2)


def test_names_of_one_sheet_hold_there(tmp_path: Path) -> None:
    """A name may mean one thing in the whole workbook, and another on one sheet."""
    path = build(
        tmp_path / "book.xlsx",
        CELLS | {"E1": "=Force", "Rows!E1": "=Force", "E2": "=Rows!Force+Line_load", "E3": "=Plan!Force"},
        {"Force": "reaction(Plan!$C$1,Plan!$B$1,1)", "Line_load": "Plan!$A$2/2"},
    )
    book = openpyxl.load_workbook(path)
    book["Rows"].defined_names["Force"] = DefinedName("Force", attr_text="10*reaction(Plan!$C$1,Plan!$B$1,1)")
    book.save(path)
    report = fill(path)
    got = values(report.target)
    assert (got["E1"], got["E2"], got["E3"]) == (12, 123, 12)
    assert values(report.target, "Rows")["E1"] == 120


def test_tables_are_arguments_of_beam_functions(tmp_path: Path) -> None:
    """A column, this row, headers and a span of columns, from inside and outside the table."""
    path = build(tmp_path / "book.xlsx", {})
    book = openpyxl.load_workbook(path)
    sheet = book["Plan"]
    for row in [
        ["Line", "Load", "R"],
        [LINE, "udl 4", None],
        [LINE, "udl 6", None],
        ["load", "size", "at"],
        ["point", 10, 3],
    ]:
        sheet.append(row)
    for row in (2, 3):
        sheet[f"C{row}"] = "=reaction(Beams[[#This Row],[Line]],Beams[[#This Row],[Load]],1)"
    sheet.add_table(Table(displayName="Beams", ref="A1:C3"))
    sheet.add_table(Table(displayName="Points", ref="A4:C5"))
    sheet["E1"] = "=reaction(A2,Beams[Load],1)"
    sheet["E2"] = "=reaction(A2,Points[#All],1)"
    sheet["E3"] = "=reaction(INDEX(Beams[Line],2),Points[[#Headers],[#Data],[load]:[at]],1)"
    book.save(path)
    report = fill(path)
    assert report.errors == []
    got = values(report.target)
    assert [got[cell] for cell in ("C2", "C3", "E1", "E2", "E3")] == pytest.approx([12, 18, 30, 5, 5], rel=1e-12)


def test_spilled_arrays_are_arguments_of_beam_functions(tmp_path: Path) -> None:
    """`A1#` hands over all that the array of A1 fills, one of ours too, though it fills more than when saved."""
    rows = (
        '<row r="1"><c r="A1" cm="1"><f t="array" ref="A1:A2">_xlfn.SEQUENCE(4)*0+1.5</f></c>'
        '<c r="C1" cm="1"><f t="array" ref="C1:C2">moment_at("pinned 6 roller","udl 4",_xlfn.ANCHORARRAY(A1))</f></c>'
        '<c r="E1"><f>SUM(_xlfn.ANCHORARRAY(C1))</f></c>'
        '<c r="F1"><f>INDEX(moment_at("pinned 6 roller","udl 4",_xlfn.ANCHORARRAY(A1)),4)</f></c>'
        '<c r="G1"><f>SUM(C1:C9)</f></c></row>'
        '<row r="2"><c r="A2"><v>1.5</v></c></row>'
    )
    report = fill(from_xml(tmp_path / "book.xlsx", rows))
    assert report.errors == []
    got = values(report.target)
    moment = 12 * 1.5 - 4 * 1.5**2 / 2
    assert [got[f"C{row}"] for row in range(1, 5)] == [moment] * 4
    assert (got["E1"], got["F1"], got["G1"]) == (4 * moment, moment, 4 * moment)
