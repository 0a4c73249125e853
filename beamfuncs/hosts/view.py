"""What stands in a part of a filled workbook, as text for people to read."""

from __future__ import annotations

from datetime import date
from pathlib import Path
from typing import NamedTuple
from xml.etree import ElementTree

from beamfuncs.hosts.grid import area, column_name
from beamfuncs.hosts.package import Package

DIGITS = 6


class View(NamedTuple):
    """A part of a workbook: a sheet, and the area shown, or all of it."""

    sheet: str
    area: str | None


def find(package: Package, name: str) -> View | None:
    """Return the part of a workbook that a sheet's name, a defined name or `Sheet!A1:F9` means, if there is one."""
    sheets = {sheet.name.casefold(): sheet.name for sheet in package.sheets}
    if name.casefold() in sheets:
        return View(sheets[name.casefold()], None)
    for element in ElementTree.fromstring(package.parts[package.workbook_part]).iter():
        if element.tag.endswith("}definedName") and element.get("name", "").casefold() == name.casefold():
            name = element.text or ""
    sheet, _, cells = name.rpartition("!")
    sheet = sheet.strip("'").replace("''", "'").casefold()
    try:
        return View(sheets[sheet], str(area(cells)))
    except (KeyError, ValueError):
        return None


def rows(book: Path, view: View) -> list[list[str]]:
    """Return the values of a part of a workbook, row by row, without rows and columns that hold nothing.

    The first row holds the letters of the columns, the first column the numbers of the rows.
    """
    import openpyxl

    sheet = openpyxl.load_workbook(book, data_only=True)[view.sheet]
    first = area(view.area or sheet.dimensions)
    values = sheet.iter_rows(first.top, first.bottom, first.left, first.right, values_only=True)
    cells = [[_text(value) for value in row] for row in values]
    columns = [c for c in range(len(first.columns)) if any(row[c] for row in cells)]
    letters = ["", *(column_name(first.left + c) for c in columns)]
    return [letters, *([str(first.top + r), *(row[c] for c in columns)] for r, row in enumerate(cells) if any(row))]


def _text(value: object) -> str:
    if value is None:
        return ""
    if isinstance(value, float):
        return f"{value:.{DIGITS}g}"
    if isinstance(value, date):
        return value.isoformat()[:10]
    return " ".join(str(value).split())
