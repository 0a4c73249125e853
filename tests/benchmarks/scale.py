"""A tall schedule: every row another beam, with a joined line, three beam functions and two ordinary formulas."""

from __future__ import annotations

import random
import zipfile
from collections.abc import Iterator
from pathlib import Path

import openpyxl

MAIN = "http://schemas.openxmlformats.org/spreadsheetml/2006/main"
BEAM_CELLS, ORDINARY_CELLS = 3, 3
"""Formulas in a row: those that call a beam function, and the others."""


def schedule(path: Path, rows: int) -> Path:
    """Write the workbook, its formulas without values."""
    book = openpyxl.Workbook()
    book.worksheets[0].title = "Schedule"
    book.save(path)
    with zipfile.ZipFile(path) as archive:
        parts = {name: archive.read(name) for name in archive.namelist()}
    data = "".join(_rows(rows))
    parts["xl/worksheets/sheet1.xml"] = f'<worksheet xmlns="{MAIN}"><sheetData>{data}</sheetData></worksheet>'.encode()
    with zipfile.ZipFile(path, "w", zipfile.ZIP_DEFLATED) as archive:
        for name, content in parts.items():
            archive.writestr(name, content)
    return path


def _rows(rows: int) -> Iterator[str]:
    draw = random.Random(1)
    for n in range(1, rows + 1):
        length, load = 3 + draw.randrange(10**6) / 1e5, 1 + draw.randrange(10**6) / 1e5
        formulas = (
            f'"fixed "&A{n}&" pinned"',
            f'reaction(C{n},"udl "&B{n},1)',
            f'moment_max(C{n},"udl "&B{n})',
            f'deflection_max(C{n},"udl "&B{n},,24000)',
            f"D{n}+E{n}",
            f"F{n}*1000",
        )
        cells = "".join(
            f'<c r="{column}{n}"><f>{formula.replace("&", "&amp;")}</f></c>'
            for column, formula in zip("CDEFGH", formulas, strict=True)
        )
        yield f'<row r="{n}"><c r="A{n}"><v>{length}</v></c><c r="B{n}"><v>{load}</v></c>{cells}</row>'
