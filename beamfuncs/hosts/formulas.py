"""A cell's formula, respelt for the engine: who calls is told, and tables become plain areas.

The engine tells a function neither which cell calls it nor knows tables. So each call of ours gets
three hidden leading arguments, the number of the sheet, the row and the column of the calling cell
(`reaction(A1, B1, 1)` in the third sheet's D2 becomes `reaction.at(3,2,4,A1, B1, 1)`), and
`Beams[Span]` becomes `'Schedule'!$C$2:$C$20`. The workbook's own formulas are never touched.
"""

from __future__ import annotations

import re
from collections.abc import Collection, Mapping
from dataclasses import dataclass

from beamfuncs.errors import VALUE
from beamfuncs.hosts.grid import Area, column_name, sheet_prefix

REF = "#REF!"
TOLD = ".at"
"""Ends the name of a function that is told which cell calls it."""

_PIECE = re.compile(
    r"""
      "(?:[^"]|"")*"                                    # a text
    | '(?:[^']|'')*'                                    # the quoted name of a sheet
    | (?:_xlfn\.|_xludf\.)*(?P<call>[^\W\d][\w.]*)\(\s*(?P<bare>\))?
    | (?P<table>[^\W\d][\w.\\]*)\[(?P<part>(?:'.|[^\[\]']|\[(?:'.|[^\[\]'])*\])*)\]
    """,
    re.VERBOSE | re.DOTALL,
)
_ITEM = re.compile(r"\[((?:'.|[^\[\]'])*)\]", re.DOTALL)


@dataclass(frozen=True)
class Table:
    """Where a table stands, and its columns' headers from left to right."""

    name: str
    sheet: str
    area: Area
    columns: tuple[str, ...]
    header_rows: int = 1
    total_rows: int = 0

    @property
    def data(self) -> Area:
        area = self.area
        return area._replace(top=area.top + self.header_rows, bottom=area.bottom - self.total_rows)


class Speller:
    """Respells the formulas of one workbook.

    >>> Speller({"reaction"}, []).respell('Reaction(A2, "reaction(")', "3,2,4")
    ('reaction.at(3,2,4,A2, "reaction(")', True)
    """

    def __init__(self, functions: Collection[str], tables: Collection[Table]) -> None:
        self._functions = {name.casefold() for name in functions}
        self._tables: Mapping[str, Table] = {table.name.casefold(): table for table in tables}
        names = "|".join(map(re.escape, self._functions)) or r"(?!)"
        self._worth_it = re.compile(rf"\[|\b(?:{names})\(", re.IGNORECASE)

    def respell(self, formula: str, place: str, row: int = 0) -> tuple[str, bool]:
        """Return the formula for the engine and whether it calls one of our functions.

        `place` is the text of the hidden arguments, `row` the row that `[#This Row]` means.
        """
        if not self._worth_it.search(formula):
            return formula, False
        calls = False

        def piece(found: re.Match[str]) -> str:
            nonlocal calls
            if found["call"]:
                name = found["call"].casefold()
                if name not in self._functions:
                    return found[0]
                calls = True
                return f"{name}{TOLD}({place})" if found["bare"] else f"{name}{TOLD}({place},"
            if found["table"]:
                table = self._tables.get(found["table"].casefold())
                return found[0] if table is None else plain_reference(table, found["part"], row)
            return found[0]

        return _PIECE.sub(piece, formula), calls


def plain_reference(table: Table, part: str, row: int) -> str:
    """Return the area that `part`, the text between a table's outer brackets, names from `row`.

    >>> beams = Table("Beams", "Plan", Area(1, 1, 4, 2), ("Mark", "Span"))
    >>> plain_reference(beams, "[#This Row],[Span]", 3), plain_reference(beams, "Depth", 3)
    ("'Plan'!$B3", '#REF!')
    """
    items = _ITEM.findall(part) or [part.removeprefix("@")]
    marks = {item.casefold() for item in items if item.startswith("#")}
    names = [_unescaped(item).casefold() for item in items if item and item[0] not in "#@"]
    headers = [column.casefold() for column in table.columns]
    try:
        numbers = [headers.index(name) for name in names] or [0, len(headers) - 1]
    except ValueError:
        return REF
    if part.startswith("@") or "@" in items or "#this row" in marks:
        if row not in table.data.rows:
            return VALUE
        top = bottom = row
    else:
        rows = [rows for rows in _rows(table, marks or {"#data"}) if rows]
        if not rows:
            return REF
        top, bottom = rows[0][0], rows[-1][-1]
    left, right = (column_name(table.area.left + n) for n in (min(numbers), max(numbers)))
    mark = "" if top == bottom == row else "$"  # its own row moves along in a shared formula
    first, last = f"${left}{mark}{top}", f"${right}{mark}{bottom}"
    return sheet_prefix(table.sheet) + (first if first == last else f"{first}:{last}")


def _rows(table: Table, marks: set[str]) -> list[range]:
    area, data = table.area, table.data
    if "#all" in marks:
        return [area.rows]
    parts = {
        "#headers": range(area.top, data.top),
        "#data": data.rows,
        "#totals": range(data.bottom + 1, area.bottom + 1),
    }
    return [rows for mark, rows in parts.items() if mark in marks]


def _unescaped(item: str) -> str:
    return re.sub(r"'(.)", r"\1", item, flags=re.DOTALL)
