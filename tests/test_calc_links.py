"""Workbooks in which Excel stored calls by way of its add-in, `[1]!reaction(...)`, opened in Calc."""

from __future__ import annotations

import re
import zipfile
from collections.abc import Iterator
from pathlib import Path

import openpyxl
import pytest
from calc_office import XLSX, CalcOffice, running
from openpyxl.workbook.defined_name import DefinedName
from openpyxl.worksheet.formula import ArrayFormula
from test_addin_links import MINE, OTHER, linked
from test_calc_workbooks import check_crossed, crossed, in_file
from unfilled import stored

from beamfuncs.hosts.calc.component import linking
from beamfuncs.hosts.excel_addin.places import ADDIN
from beamfuncs.hosts.headless.filling import fill
from beamfuncs.hosts.headless.package import Package

STORED = 5.0
"""What every cell with a formula stores, which none of ours is."""
LINK = b"http://schemas.openxmlformats.org/officeDocument/2006/relationships/externalLinkPath"
IN_STARTUP = b"http://schemas.microsoft.com/office/2006/relationships/xlExternalLinkPath/xlStartup"
"""How Excel names a link to a file anywhere, and one to a file in its startup folder."""
OURS = {
    "A1": '=2*[2]!Reaction("fixed 8 pinned","udl 12",1)',
    "A2": '=[2]!beam_line("fixed",8,"pinned")&"[2]!reaction("',
    "A3": "=[2]!moment_at(B1,B2,[2]!reaction(B1,B2,1)/20)",
    "A4": "=A1+1",
    "A5": "=reaction(B1,B2,2)",
}
SHOWN = {"A1": 120.0, "A2": "fixed 8 pinned[2]!reaction(", "A3": 30.0, "A4": 121.0, "A5": 36.0, "C1": -42.0, "C2": 30.0}
THEIRS = {"D1": '=[1]!reaction("fixed 8 pinned","udl 12",1)', "D2": "=1+[1]!other(B1)", "D3": "=[1]Data!$A$1"}


@pytest.fixture(scope="module")
def calc(tmp_path_factory: pytest.TempPathFactory) -> Iterator[CalcOffice]:
    """An office with the extension."""
    folder = tmp_path_factory.mktemp("calc")
    with running(folder / "profile", folder / "server") as office:
        yield office


def from_excel(path: Path, kind: bytes, formulas: dict[str, str]) -> Path:
    """A workbook with those formulas, an array and a named formula by way of the add-in, each cell storing a value."""
    book = openpyxl.load_workbook(linked(path, {"B1": "fixed 8 pinned", "B2": "udl 12", **formulas}, OTHER, MINE))
    sheet = book["Plan"]
    sheet["E1"], sheet["E2"] = 1, 3
    sheet["C1"] = ArrayFormula("C1:C2", "=[2]!moment_at(B1,B2,E1:E2)")
    book.defined_names["Far"] = DefinedName("Far", attr_text="[2]!reaction(Plan!$B$1,Plan!$B$2,2)")
    book.save(path)
    with zipfile.ZipFile(path) as archive:
        parts = {name: archive.read(name) for name in archive.namelist()}
    sheet_part, link_part = "xl/worksheets/sheet1.xml", "xl/externalLinks/_rels/externalLink2.xml.rels"
    parts[sheet_part] = re.sub(rb"(</f>)<v(?: ?/>|></v>)", rf"\g<1><v>{STORED}</v>".encode(), parts[sheet_part])
    assert parts[sheet_part].count(b"<v>5.0</v>") == len(formulas) + 1
    parts[link_part] = parts[link_part].replace(LINK, kind)
    assert kind in parts[link_part]
    with zipfile.ZipFile(path, "w", zipfile.ZIP_DEFLATED) as archive:
        for name, content in parts.items():
            archive.writestr(name, content)
    return path


def cell(calc: CalcOffice, book: int, place: str) -> object:
    """What a cell shows."""
    return calc.read(book, place)[0][0]


@pytest.mark.parametrize("kind", [LINK, IN_STARTUP])
def test_calls_by_way_of_the_add_in_are_live(calc: CalcOffice, tmp_path: Path, kind: bytes) -> None:
    """Cells and arrays come alive; what Calc saves has plain names and no link to the add-in."""
    book = calc.open(from_excel(tmp_path / "excel.xlsx", kind, OURS))
    assert {place: cell(calc, book, place) for place in SHOWN} == SHOWN
    assert not calc.is_modified(book)
    assert calc.undone(book) == []
    calc.enter(book, {"B1": "fixed 4 pinned"})
    assert [cell(calc, book, place) for place in ("A1", "A3", "C2")] == [120.0, 7.5, 12.0]
    calc.save_as(book, tmp_path / "saved.xlsx", XLSX)
    calc.close(book)
    formulas = in_file(tmp_path / "saved.xlsx")
    assert formulas["A1"] == "2*reaction(&quot;fixed 8 pinned&quot;,&quot;udl 12&quot;,1)"
    assert formulas["A3"] == "moment_at(B1,B2,reaction(B1,B2,1)/20)"
    with zipfile.ZipFile(tmp_path / "saved.xlsx") as archive:
        assert not any(b"xlam" in archive.read(name) for name in archive.namelist())
    filled = stored(fill(tmp_path / "saved.xlsx", tmp_path / "filled.xlsx").target)
    assert filled[("Plan", "A1")].text == "120"


def test_a_named_formula_is_live(calc: CalcOffice, tmp_path: Path) -> None:
    """So is the cell that uses it. (Where the link is one to the startup folder the office drops the name itself.)"""
    book = calc.open(from_excel(tmp_path / "excel.xlsx", LINK, {**OURS, "A6": "=Far"}))
    assert cell(calc, book, "A6") == 36.0
    calc.enter(book, {"B1": "fixed 4 pinned"})
    assert cell(calc, book, "A6") == 18.0
    calc.close(book)


@pytest.mark.parametrize("kind", [LINK, IN_STARTUP])
def test_links_to_other_files_are_left(calc: CalcOffice, tmp_path: Path, kind: bytes) -> None:
    """A function of another add-in keeps its formula and its stored value, even if it is called as one of ours."""
    book = calc.open(from_excel(tmp_path / "excel.xlsx", kind, {**OURS, **THEIRS}))
    assert {place: cell(calc, book, place) for place in SHOWN} == SHOWN
    assert [cell(calc, book, place) for place in THEIRS] == [STORED] * len(THEIRS)
    assert calc.formulas(book, "D1") == [['=[1]!reaction("fixed 8 pinned";"udl 12";1)']]
    assert calc.formulas(book, "D2") == [["=1+[1]!other(B1)"]]
    calc.save_as(book, tmp_path / "saved.xlsx", XLSX)
    calc.close(book)
    formulas = in_file(tmp_path / "saved.xlsx")
    assert formulas["D1"] == "[1]!reaction(&quot;fixed 8 pinned&quot;,&quot;udl 12&quot;,1)"
    assert formulas["D2"] == "1+[1]!other(B1)"


@pytest.mark.parametrize("unknown", [False, True])
def test_arrays_in_the_rows_of_calls(calc: CalcOffice, tmp_path: Path, unknown: bool) -> None:
    """Every cell of an array shows its own value, also in rows where calls by way of the add-in are entered anew."""
    path = linked(tmp_path / "crossed.xlsx", {"N1": "=[1]!other(B1)"} if unknown else {}, OTHER, MINE)
    book = openpyxl.load_workbook(path)
    crossed(book.worksheets, "[2]!")
    book.save(path)
    check_crossed(calc, path, 8.0)


@pytest.mark.parametrize(
    "target", [MINE, "beamfuncs.xlam", "../XLSTART/beamfuncs.xlam", "beamfuncs.xlam/x.xlsx", OTHER]
)
def test_the_same_links_as_in_the_headless_mode(tmp_path: Path, target: str) -> None:
    """Calc and `fill` agree on which links lead to the add-in."""
    book = linked(tmp_path / "book.xlsx", {}, OTHER, target, MINE)
    assert linking.links_to(str(book), ADDIN) == Package.read(book).links_to(ADDIN)


def test_a_file_without_links_or_that_is_none(tmp_path: Path) -> None:
    """Then there are no links, and no failure."""
    book = linked(tmp_path / "book.xlsx", {})
    broken = tmp_path / "broken.xlsx"
    broken.write_bytes(linked(tmp_path / "other.xlsx", {}, MINE).read_bytes()[:-200])
    for path in (book, broken, tmp_path / "missing.xlsx"):
        assert linking.links_to(str(path), ADDIN) == set()
