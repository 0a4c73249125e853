"""The macro workbook: the sheets of the example workbook, the VBA project of xlwings' template, its settings."""

from __future__ import annotations

import re
import subprocess
import sys
from importlib.util import find_spec
from pathlib import Path, PureWindowsPath
from posixpath import dirname, join, normpath
from typing import Any
from xml.etree import ElementTree

import pytest
from books import parts
from office import Office
from oletools.olevba import VBA_Parser
from openpyxl import load_workbook
from openpyxl.worksheet.formula import ArrayFormula

from beamfuncs.hosts.excel_addin.places import places
from beamfuncs.hosts.excel_addin.templates import template
from beamfuncs.hosts.excel_addin.vba import SERVED
from beamfuncs.hosts.headless.filling import fill

WORKBOOKS = Path(__file__).parents[1] / "workbooks"
SCRIPT, COMMITTED = WORKBOOKS / "kestrel_quay.py", WORKBOOKS / "kestrel_quay.xlsm"
TEMPLATE = template("quickstart_standalone.xlsm")
VBA = "xl/vbaProject.bin"
SETTINGS = "xlwings.conf"
READER = template("xlwings.bas").read_text(encoding="utf-8")
"""The VBA that reads the settings; the add-in holds the same."""
RELATIONSHIPS = "{http://schemas.openxmlformats.org/package/2006/relationships}Relationship"
TYPES = "{http://schemas.openxmlformats.org/package/2006/content-types}"


@pytest.fixture(scope="module")
def built(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """The macro workbook as the script builds it, the other one beside it."""
    return build(tmp_path_factory.mktemp("built"))


def build(folder: Path) -> Path:
    subprocess.run([sys.executable, SCRIPT, folder / "kestrel_quay.xlsx"], check=True, capture_output=True)
    return folder / "kestrel_quay.xlsm"


def modules(path: Path) -> dict[str, str]:
    """The VBA modules of a workbook with their code, as oletools reads them."""
    parser = VBA_Parser(str(path))
    try:
        return {name: code for _, _, name, code in parser.extract_macros()}
    finally:
        parser.close()


def cells(path: Path, *, values: bool = False) -> dict[str, dict[str, tuple[Any, ...]]]:
    """What every cell of every sheet holds and how it looks; with `values`, what its formula came to."""
    book = load_workbook(path, data_only=values)
    return {sheet.title: {cell.coordinate: _told(cell) for row in sheet.iter_rows() for cell in row} for sheet in book}


def _told(cell: Any) -> tuple[Any, ...]:
    value = (cell.value.ref, cell.value.text) if isinstance(cell.value, ArrayFormula) else cell.value
    look = (cell.font, cell.fill, cell.border, cell.alignment)
    return value, cell.number_format, *(repr(one) for one in look)


def settings(path: Path) -> dict[str, Any]:
    """The settings as the VBA of xlwings reads them: from A1 down to the first blank, the keys in capitals."""
    sheet = load_workbook(path)[SETTINGS]
    found: dict[str, Any] = {}
    row = 1
    while sheet.cell(row, 1).value is not None:
        key = str(sheet.cell(row, 1).value).upper()
        assert key not in found, f"{key} twice: the VBA stops there"
        found[key] = sheet.cell(row, 2).value
        row += 1
    return found


@pytest.mark.parametrize("filled", [False, True])
def test_the_vba_project_is_the_template_s_byte_for_byte(built: Path, tmp_path: Path, filled: bool) -> None:
    """As committed, as built, and after `fill`: not a byte of it is touched."""
    given = parts(TEMPLATE)[VBA]
    for path in (COMMITTED, built):
        book = fill(path, tmp_path / "filled.xlsm").target if filled else path
        assert parts(book)[VBA] == given


def test_the_modules_are_the_template_s_and_no_others() -> None:
    """No macro of our own is in it: the functions are imported by the user."""
    found = modules(COMMITTED)
    assert found == modules(TEMPLATE)
    documents = {"ThisWorkbook.cls", "Sheet1.cls", "Sheet2.cls"}
    assert set(found) == documents | {"Module1.bas", "xlwings.bas", "Dictionary.cls"}
    assert "Function" not in found["Module1.bas"]


def test_the_document_modules_have_their_workbook_and_sheets() -> None:
    """Each module of a document belongs to one sheet or the workbook, and no other sheet claims one."""
    book = load_workbook(COMMITTED, keep_vba=True)
    named = {sheet.title: sheet.sheet_properties.codeName for sheet in book}
    assert named == dict.fromkeys(book.sheetnames) | {book.sheetnames[0]: "Sheet1", SETTINGS: "Sheet2"}
    documents = {name.removesuffix(".cls") for name in modules(COMMITTED) if name.endswith(".cls")} - {"Dictionary"}
    assert {book.code_name} | {name for name in named.values() if name} == documents


def test_the_package_is_a_macro_enabled_workbook() -> None:
    """The content types say so, every relationship leads to a part, and none leads out of the file."""
    package = parts(COMMITTED)
    types = ElementTree.fromstring(package["[Content_Types].xml"])
    overrides = {one.get("PartName"): one.get("ContentType") for one in types.iter(f"{TYPES}Override")}
    defaults = {one.get("Extension"): one.get("ContentType") for one in types.iter(f"{TYPES}Default")}
    assert overrides["/xl/workbook.xml"] == "application/vnd.ms-excel.sheet.macroEnabled.main+xml"
    assert overrides.get(f"/{VBA}", defaults["bin"]) == "application/vnd.ms-office.vbaProject"
    leads = []
    for name, content in package.items():
        if name.endswith(".rels"):
            folder = dirname(dirname(name))
            for one in ElementTree.fromstring(content).iter(RELATIONSHIPS):
                assert one.get("TargetMode") != "External", name
                leads.append(normpath(join("/", folder, one.attrib["Target"])).lstrip("/"))
    assert set(leads) <= set(package)
    assert leads.count(VBA) == 1
    assert not [name for name in package if "externalLink" in name or "customUI" in name]


def test_nothing_personal_is_left_of_the_template() -> None:
    """No path and no author of the template's maker stands in any part but its VBA project."""
    personal = re.compile(rb"felix|zumstein|[a-z]:\\|/users/|\\users\\|absPath", re.IGNORECASE)
    assert any(personal.search(content) for content in parts(TEMPLATE).values())
    package = parts(COMMITTED)
    assert [name for name, content in package.items() if name != VBA and personal.search(content)] == []
    assert load_workbook(COMMITTED).properties.creator == "beamfuncs example"


def test_the_settings_are_those_that_xlwings_reads() -> None:
    """Every key is one that its VBA asks for, and the sheet has the name under which it looks for them."""
    project = re.search(r'PROJECT_NAME As String = "(\w+)"', READER)
    assert project
    assert f"{project[1]}.conf" == SETTINGS
    assert "d.Add UCase(cell.Value), cell.Offset(0, 1).Value" in READER
    asked = set(re.findall(r'GetConfig\("([^"]+)"', READER))
    found = settings(COMMITTED)
    assert set(found) <= asked
    assert set(found) == {
        "INTERPRETER_WIN",
        "PYTHONPATH",
        "UDF MODULES",
        "DEBUG UDFS",
        "SHOW CONSOLE",
        "ADD_WORKBOOK_TO_PYTHONPATH",
    }


def test_the_settings_lead_to_the_functions_on_every_machine() -> None:
    """The Python below the user's own profile, the module that is served, nothing from beside the workbook."""
    found = settings(COMMITTED)
    here = places({"LOCALAPPDATA": "%LOCALAPPDATA%"}).own
    assert PureWindowsPath(found["INTERPRETER_WIN"]) == PureWindowsPath(here / "venv" / "Scripts" / "pythonw.exe")
    assert found["UDF MODULES"] == SERVED
    assert find_spec(SERVED)
    assert found["PYTHONPATH"] is None
    assert [found[key] for key in ("DEBUG UDFS", "SHOW CONSOLE", "ADD_WORKBOOK_TO_PYTHONPATH")] == [False] * 3


def test_what_stands_beside_the_settings_is_not_taken_for_one() -> None:
    """A blank cell ends the settings; below it stand the instructions."""
    sheet = load_workbook(COMMITTED)[SETTINGS]
    end = len(settings(COMMITTED)) + 1
    assert sheet.cell(end, 1).value is None
    assert sheet.cell(end + 1, 1).value
    assert all(sheet.cell(row, 4).value for row in range(1, end))


def test_its_sheets_are_those_of_the_workbook_without_macros(built: Path) -> None:
    """The same sheets, cells, formulas and looks; the settings are one sheet more."""
    with_macros, without = cells(built), cells(built.with_suffix(".xlsx"))
    assert list(with_macros) == [*without, SETTINGS]
    del with_macros[SETTINGS]
    assert with_macros == without
    assert sum(str(value[0]).startswith("=") for sheet in without.values() for value in sheet.values()) > 500


def test_the_committed_workbook_is_what_the_script_builds(built: Path) -> None:
    """Every cell with its look, and the same parts."""
    assert cells(COMMITTED) == cells(built)
    assert list(parts(COMMITTED)) == list(parts(built))


def test_building_twice_gives_the_same_bytes(built: Path, tmp_path: Path) -> None:
    """Both workbooks, to the last byte: nothing in them depends on the time or on chance."""
    again = build(tmp_path)
    for suffix in (".xlsm", ".xlsx"):
        assert again.with_suffix(suffix).read_bytes() == built.with_suffix(suffix).read_bytes()


def test_filling_it_gives_the_values_of_the_workbook_without_macros(built: Path, tmp_path: Path) -> None:
    """No cell in error, and each value that of the .xlsx."""
    reports = [fill(built.with_suffix(suffix), tmp_path / f"filled{suffix}") for suffix in (".xlsm", ".xlsx")]
    assert [report.errors for report in reports] == [[], []]
    assert reports[0].beam_cells == reports[1].beam_cells > 400
    with_macros, without = (cells(report.target, values=True) for report in reports)
    del with_macros[SETTINGS]
    assert with_macros == without


def test_libreoffice_prints_it(tmp_path: Path) -> None:
    """It opens without complaint, each of its sheets a page."""
    office = Office(tmp_path / "office")
    (tmp_path / "out").mkdir()
    (printed,) = office.printed([fill(COMMITTED, tmp_path / "filled.xlsm").target], tmp_path / "out")
    pages = re.findall(rb"/Type\s*/Page\b(?!s)", printed.read_bytes())
    assert len(pages) == len(load_workbook(COMMITTED).sheetnames)
