"""Writes a workbook so that the same sheets give the same bytes, whenever they are built."""

from __future__ import annotations

from datetime import date, datetime, time
from io import BytesIO
from pathlib import Path
from zipfile import ZIP_DEFLATED, ZipFile, ZipInfo

from openpyxl import Workbook
from openpyxl.writer.excel import ExcelWriter


def write(book: Workbook, target: Path, issued: date) -> None:
    """Write a workbook whose only date is that of its issue."""
    book.properties.created = book.properties.modified = datetime.combine(issued, time())
    made = BytesIO()
    ExcelWriter(book, ZipFile(made, "w")).save()
    with ZipFile(made) as parts, ZipFile(target, "w") as archive:
        for name in parts.namelist():
            entry = ZipInfo(name, (issued.year, issued.month, issued.day, 0, 0, 0))
            archive.writestr(entry, parts.read(name), ZIP_DEFLATED)
