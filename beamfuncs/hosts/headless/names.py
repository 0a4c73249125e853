"""Defined names, of which the engine's copy of a workbook gets the meaning where the engine does not know it.

The engine knows names of cells, areas and constants. A name for a formula it does not tell which cell
calls, nor does it know names that move along with the cell (`Plan!A1` without `$`), or that are called
by the sheet where they hold (`Plan!Line`).
"""

from __future__ import annotations

import re
from collections.abc import Iterator, Sequence
from typing import NamedTuple
from xml.etree import ElementTree

from beamfuncs.hosts.headless.archive import NotAWorkbook
from beamfuncs.hosts.headless.grid import cell_name

LONGEST_MEANING = 32_000
"""A name that grows longer than this with the names inside it is left as it is."""

_PLAIN = re.compile(
    r"""
      [^()+\-*/^&=<>,]*!\$[A-Z]{1,3}\$[0-9]+(?::\$[A-Z]{1,3}\$[0-9]+)?
    | [^()+\-*/^&=<>,]*!(?:\$[A-Z]{1,3}:\$[A-Z]{1,3}|\$[0-9]+:\$[0-9]+)
    | '(?:[^']|'')*'!\$[A-Z]{1,3}(?:\$[0-9]+)?(?::\$[A-Z]{1,3}(?:\$[0-9]+)?)?
    | [+-]?[0-9.]+(?:E[+-]?[0-9]+)?
    | "(?:[^"]|"")*" | TRUE | FALSE | \#[A-Z/0!?]+
    | [^\W\d][\w.\\]*\[.*\]
    """,
    re.VERBOSE | re.IGNORECASE | re.DOTALL,
)
_QUOTED = re.compile(r""""(?:[^"]|"")*"|'(?:[^']|'')*'""")
_MOVING = re.compile(r"(?<![$\w.])(?:[A-Z]{1,3}\$?[0-9]+|\$[A-Z]{1,3}[0-9]+)\b(?!\()", re.IGNORECASE)
_BUILT_IN = "_xlnm."
_TRUE = "1", "true"


class Name(NamedTuple):
    """A defined name; it holds in the whole workbook unless it has a `sheet` of its own."""

    name: str
    sheet: str | None
    formula: str

    @property
    def is_known(self) -> bool:
        """Tell whether the engine knows what the name means wherever it stands alone."""
        return self.sheet is None and _PLAIN.fullmatch(self.formula) is not None


class Names:
    """The names of a workbook, by what a cell of each sheet means by them."""

    def __init__(self, names: Sequence[Name] = ()) -> None:
        self._names = {(one.name.casefold(), (one.sheet or "").casefold()): one for one in names}
        self.all = {one.name for one in names}
        self.unknown = {one.name for one in names if not one.is_known}
        """The names that the engine does not know, or not on every sheet."""

    def meaning(self, name: str, sheet: str, row: int, column: int, called_by_sheet: bool = False) -> str | None:
        """Return what a name stands for in a cell of a sheet, None if it is no name or the engine knows it."""
        name = name.casefold()
        found = self._names.get((name, sheet.casefold())) or self._names.get((name, ""))
        if found is None or (found.is_known and not called_by_sheet):
            return None
        formula = found.formula
        if not _MOVING.search(_QUOTED.sub("", formula)):
            return formula
        from openpyxl.formula.translate import Translator

        return str(Translator(f"={formula}", "A1").translate_formula(cell_name(row, column))).removeprefix("=")


def defined_names(workbook: bytes) -> Iterator[Name]:
    """Yield the defined names in a workbook's part, but for those that programs keep for themselves."""
    elements = list(ElementTree.fromstring(workbook).iter())
    sheets = [element.get("name", "") for element in elements if element.tag.endswith("}sheet")]
    for element in elements:
        if not element.tag.endswith("}definedName"):
            continue
        name, text = element.get("name", ""), (element.text or "").strip()
        if not text or name.startswith(_BUILT_IN) or element.get("function") in _TRUE:
            continue
        sheet = element.get("localSheetId")
        if sheet is not None and not (sheet.isdecimal() and int(sheet) < len(sheets)):
            raise NotAWorkbook(f"it is damaged (the name {name} belongs to sheet {sheet}, which is not there)")
        yield Name(name, None if sheet is None else sheets[int(sheet)], text)
