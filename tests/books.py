"""Small workbooks for the tests of the headless mode: built by openpyxl, or from the XML of one sheet."""

from __future__ import annotations

import re
import zipfile
from collections.abc import Mapping
from pathlib import Path
from typing import Any

import openpyxl
from openpyxl.workbook.defined_name import DefinedName

MAIN = "http://schemas.openxmlformats.org/spreadsheetml/2006/main"
FIRST_SHEET = "xl/worksheets/sheet1.xml"


def build(path: Path, cells: Mapping[str, object], names: Mapping[str, str] | None = None) -> Path:
    """Write a workbook: `cells` by their names, of the sheet `Plan` unless they name another (`Data!B2`)."""
    book = openpyxl.Workbook()
    book.remove(book.worksheets[0])
    book.create_sheet("Plan")
    for name, value in cells.items():
        sheet, _, cell = name.rpartition("!")
        if sheet and sheet not in book.sheetnames:
            book.create_sheet(sheet)
        book[sheet or "Plan"][cell] = value
    for name, meaning in (names or {}).items():
        book.defined_names[name] = DefinedName(name, attr_text=meaning)
    book.save(path)
    return path


def from_xml(path: Path, rows: str, root: str = f'<worksheet xmlns="{MAIN}">') -> Path:
    """Write a workbook whose only sheet has these rows, given as XML."""
    build(path, {})
    tag = root[1:].split()[0]
    prefix = tag.removesuffix("worksheet")
    data = f"{root}<{prefix}sheetData>{rows}</{prefix}sheetData></{tag}>"
    return rewrite(path, FIRST_SHEET, lambda xml: data.encode())


def rewrite(path: Path, part: str, change: Any) -> Path:
    """Change the bytes of one part of a package."""
    with zipfile.ZipFile(path) as archive:
        parts = {name: archive.read(name) for name in archive.namelist()}
    parts[part] = change(parts.get(part, b""))
    with zipfile.ZipFile(path, "w", zipfile.ZIP_DEFLATED) as archive:
        for name, content in parts.items():
            archive.writestr(name, content)
    return path


def parts(path: Path) -> dict[str, bytes]:
    """The bytes of every part of a package."""
    with zipfile.ZipFile(path) as archive:
        return {name: archive.read(name) for name in archive.namelist()}


def values(path: Path, sheet: str = "Plan") -> dict[str, Any]:
    """The values stored in a sheet, by cell, read by openpyxl; blank cells left out."""
    rows = openpyxl.load_workbook(path, data_only=True)[sheet].iter_rows()
    return {cell.coordinate: cell.value for row in rows for cell in row if cell.value is not None}


def formulas(path: Path, part: str = FIRST_SHEET) -> list[bytes]:
    """Every formula element of a sheet, byte for byte."""
    return re.findall(rb"<f\b(?:[^>]*/>|.*?</f>)", parts(path)[part], re.DOTALL)


def store(path: Path, stored: Mapping[str, object], part: str = FIRST_SHEET, asks_to_calculate: bool = False) -> Path:
    """Let formula cells of a sheet hold values, as a spreadsheet program stores them: errors as texts with `#`.

    Such a program does not ask for the workbook to be calculated when it is opened, as openpyxl does.
    """

    def change(xml: bytes) -> bytes:
        for name, value in stored.items():
            kind, text = "", str(value)
            if isinstance(value, bool):
                kind, text = ' t="b"', str(int(value))
            elif isinstance(value, str):
                kind = ' t="e"' if value.startswith("#") else ' t="str"'
                text = value.replace("&", "&amp;").replace("<", "&lt;")
            cell = rf'<c r="{name}"[^>]*?(?: t="\w+")?>(<f.*?</f>|)<v\s*/?>(?:[^<]*</v>)?</c>'
            new = rf'<c r="{name}"{kind}>\g<1><v>{text}</v></c>'
            xml, count = re.subn(cell.encode(), new.encode(), xml)
            assert count == 1, name
        return xml

    rewrite(path, part, change)
    if not asks_to_calculate:
        rewrite(path, "xl/workbook.xml", lambda xml: xml.replace(b' fullCalcOnLoad="1"', b""))
    return path
