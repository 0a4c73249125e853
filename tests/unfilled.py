"""Copies of workbooks whose formulas have lost their stored values, to be worked out afresh; and values to compare."""

from __future__ import annotations

import re
import zipfile
from pathlib import Path
from typing import NamedTuple
from xml.etree import ElementTree

_FORMULA_CELL = re.compile(
    rb"(<(?:\w+:)?c\b[^>]*>)\s*(<(?:\w+:)?f\b(?:[^>]*/>|(?:[^>]*[^/])?>.*?</(?:\w+:)?f>))"
    rb"\s*<(?:\w+:)?v\b(?:[^>]*/>|.*?</(?:\w+:)?v>)",
    re.DOTALL,
)
_TYPE = re.compile(rb'\st="[^"]*"')
_CODED = re.compile("_x([0-9A-Fa-f]{4})_")


class Value(NamedTuple):
    """What a formula's cell stores: `text` as in the file, but for a truth value, which is a number."""

    formula: str
    text: str
    is_error: bool

    def agrees(self, other: Value, relative: float) -> bool:
        """Whether both store the same: numbers within a relative difference, anything else to the letter."""
        if self.text == other.text or self.is_error or other.is_error:
            return self.text == other.text and self.is_error == other.is_error
        try:
            return abs(float(self.text) - float(other.text)) <= relative * abs(float(self.text))
        except ValueError:
            return False


def sheets(path: Path) -> dict[str, str]:
    """The worksheets' names, by the names of their parts; those that are not where they should be left out."""
    with zipfile.ZipFile(path) as archive:
        names = {name.replace("\\", "/").casefold(): name for name in archive.namelist()}
        book = ElementTree.fromstring(archive.read(names["xl/workbook.xml"]))
        listed = ElementTree.fromstring(archive.read(names["xl/_rels/workbook.xml.rels"]))
    targets = {
        one.get("Id"): one.get("Target", "").removeprefix("/xl/")
        for one in listed
        if one.get("Type", "").endswith("/worksheet")
    }
    titles = {
        next((value for key, value in one.items() if key.endswith("}id")), ""): one.get("name", "")
        for one in book.iter()
        if one.tag.endswith("}sheet")
    }
    parts = {names.get(f"xl/{target}".casefold(), ""): titles.get(id or "", "") for id, target in targets.items()}
    parts.pop("", None)
    return parts


def without_values(source: Path, target: Path) -> int:
    """Write a copy of a workbook in which no formula has a value; return how many had."""
    count = 0
    worksheets = sheets(source)

    def bare(found: re.Match[bytes]) -> bytes:
        nonlocal count
        count += 1
        return _TYPE.sub(b"", found[1]) + found[2]

    with zipfile.ZipFile(source) as archive, zipfile.ZipFile(target, "w", zipfile.ZIP_DEFLATED) as copy:
        for name in archive.namelist():
            xml = archive.read(name)
            copy.writestr(name, _FORMULA_CELL.sub(bare, xml) if name in worksheets else xml)
    return count


def stored(path: Path) -> dict[tuple[str, str], Value]:
    """What each formula's cell stores, by sheet and cell; a formula that another cell shares reads as blank."""
    found = {}
    with zipfile.ZipFile(path) as archive:
        for part, title in sheets(path).items():
            for cell in ElementTree.fromstring(archive.read(part)).iter():
                inside = {one.tag.rpartition("}")[2]: one.text or "" for one in cell}
                if cell.tag.endswith("}c") and "f" in inside:
                    text = _CODED.sub(lambda code: chr(int(code[1], 16)), inside.get("v", ""))
                    found[title, cell.get("r", "")] = Value(inside["f"], text, cell.get("t") == "e")
    return found
