"""What stands in a part of a filled workbook, as text for people to read."""

from __future__ import annotations

import io
from datetime import date
from itertools import chain
from pathlib import Path
from typing import Any, NamedTuple

from beamfuncs.hosts.headless.grid import LAST_COLUMN, LAST_ROW, Area, area, column_name
from beamfuncs.hosts.headless.markup import tree
from beamfuncs.hosts.headless.package import Package
from beamfuncs.hosts.headless.plain import packed

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
    for element in tree(package.parts[package.workbook_part]).iter():
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

    parts = packed(Package.read(book).computed_from())
    loaded = openpyxl.load_workbook(io.BytesIO(parts), read_only=True, data_only=True, keep_links=False)
    sheet: Any = loaded[view.sheet]
    sheet.reset_dimensions()
    wanted = area(view.area) if view.area else Area(1, 1, LAST_ROW, LAST_COLUMN)
    filled: dict[int, dict[int, str]] = {}
    for cell in chain.from_iterable(sheet.iter_rows()):
        if (text := _text(cell.value)) and wanted.holds(cell.row, cell.column):
            filled.setdefault(cell.row, {})[cell.column] = text
    columns = sorted(set().union(*filled.values()))
    letters = ["", *map(column_name, columns)]
    return [letters, *([str(row), *(texts.get(c, "") for c in columns)] for row, texts in filled.items())]


def _text(value: object) -> str:
    if value is None:
        return ""
    if isinstance(value, float):
        return f"{value:.{DIGITS}g}"
    if isinstance(value, date):
        return value.isoformat()[:10]
    return " ".join(str(value).split())
