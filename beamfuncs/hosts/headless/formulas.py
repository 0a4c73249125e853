"""A cell's formula, respelt for the engine: who calls is told, and tables become plain areas.

The engine tells a function neither which cell calls it nor knows tables. So each call of ours gets
three hidden leading arguments, the number of the sheet, the row and the column of the calling cell
(`reaction(A1, B1, 1)` in the third sheet's D2 becomes `reaction.at(3,2,4,A1, B1, 1)`), and
`Beams[Span]` becomes `'Schedule'!$C$2:$C$20`. So do whole rows (`2:3` becomes `A2:XFD3`), one area through
several sheets (`SUM(Plan:Roof!B2)`), names that stand for formulas, and references to other workbooks, which are never
opened (`elsewhere.at(3,2,4)`, an error). A call of ours by way of our add-in for Excel (`[1]!reaction(A1, B1, 1)`) is a
call of ours. The workbook's own formulas are never touched.
"""

from __future__ import annotations

import re
from collections.abc import Collection, Mapping, Sequence
from dataclasses import dataclass

from beamfuncs.errors import VALUE
from beamfuncs.hosts.headless.bounds import why_refused
from beamfuncs.hosts.headless.grid import Area, column_name, column_number, sheet_prefix
from beamfuncs.hosts.headless.names import LONGEST_MEANING, Names

REF, NAME = "#REF!", "#NAME?"
TOLD = ".at"
"""Ends the name of a function that is told which cell calls it."""

ELSEWHERE = "elsewhere"
"""A function of the engine alone: what another workbook holds, which is an error."""

UNKNOWN = "unknown"
"""A function of the engine alone: one that it does not know, which is an error."""

MOST_NAMES, DEEPEST_NAMES = 1_000, 50
"""So many names, and so deep in one another, are replaced in one formula; what is left is the engine's to judge."""

_AREA = r"(?:\$?[A-Z]{1,3}\$?[0-9]+(?::\$?[A-Z]{1,3}\$?[0-9]+)?|\$?[A-Z]{1,3}:\$?[A-Z]{1,3}|\$?[0-9]+:\$?[0-9]+)"
_OTHER_BOOK = r"(?:'(?:[^']|'')*\[[^\[\]']+\](?:[^']|'')*'|(?<![\w\]])\[[^\[\]]+\][^\W\d]?[\w.]*)"
_TAKES_SHEETS = "SUM|AVERAGE|AVERAGEA|COUNT|COUNTA|MAX|MAXA|MIN|MINA|PRODUCT"
"""Functions to which it is all one whether areas come as one argument or as several."""

_PIECE = re.compile(
    rf"""
      "(?:[^"]|"")*"                                    # a text
    | (?<![\w\]])\[(?P<link>[0-9]+)\]!(?P<linked>[^\W\d][\w.]*)\(\s*(?P<closed>\))?
    | (?P<elsewhere>{_OTHER_BOOK}!(?:{_AREA}|\#REF!|[^\W\d][\w.\\]*(?:\[[^\]]*\])?))
    | \b(?P<over>(?:{_TAKES_SHEETS})\(\s*)
      (?:'(?P<quoted>(?:[^':\[]|'')+:(?:[^':\[]|'')+)'|(?P<plain>[^\W\d][\w.]*:[^\W\d][\w.]*))!(?P<area>{_AREA})
    | (?<![\w.$'\]!])(?:(?P<on>'(?:[^']|'')*'|[^\W\d][\w.]*)!)?(?P<name>[^\W\d][\w.\\?]*)(?![\w.\\?(!\[:])
    | '(?:[^']|'')*'                                    # the quoted name of a sheet
    | (?<![\w.])(?:_xlfn\.|_xludf\.)*(?P<call>[^\W\d][\w.]*)\(\s*(?P<bare>\))?
    | (?<![\w.\\])(?P<table>[^\W\d][\w.\\]*)\[(?P<part>(?:'.|[^\[\]']|\[(?:'.|[^\[\]'])*\])*)\]
    | (?<![\w.$:'"\])])(?P<top>\$?[0-9]+):(?P<bottom>\$?[0-9]+)(?![\w.:(])
    """,
    re.VERBOSE | re.DOTALL | re.IGNORECASE,
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

    def __init__(
        self,
        functions: Collection[str],
        tables: Collection[Table],
        names: Names | None = None,
        sheets: Sequence[str] = (),
        unknown: Collection[str] = (),
        addins: Collection[int] = (),
    ) -> None:
        self._unknown = set(unknown)
        self._addins = addins
        self._functions = {name.casefold() for name in functions}
        self._names = names or Names()
        self._sheets = sheets
        self._meanings = 0
        self._tables: Mapping[str, Table] = {table.name.casefold(): table for table in tables}
        calls = "|".join(map(re.escape, [*self._functions, *self._unknown, "SINGLE"]))
        meant = "".join(rf"|\b{re.escape(name)}\b" for name in self._names.unknown)
        meant += "".join(rf"|!{re.escape(name)}\b" for name in self._names.all)
        several_sheets, rows = r":(?:[^:!'()]|'')+'?!", r"\d:\$?\d"
        self._worth_it = re.compile(rf"\[|\b(?:{calls})\(|{rows}|{several_sheets}{meant}", re.IGNORECASE)

    def respell(self, formula: str, place: str, row: int = 0, column: int = 0, inside: str = "") -> tuple[str, bool]:
        """Return the formula for the engine and whether it calls one of our functions.

        `place` is the text of the hidden arguments, `row` the row that `[#This Row]` means, `inside` the names
        that the formula is the meaning of, each between two blanks.
        """
        if not inside:
            self._meanings = 0
        if not self._worth_it.search(formula):
            return formula, False
        calls = False

        def told(name: str, told_besides: str, closed: str | None) -> str:
            return f"{name}{TOLD}({place}{told_besides}" + (")" if closed else ",")

        def piece(found: re.Match[str]) -> str:
            nonlocal calls
            if found["linked"]:
                name = found["linked"].casefold()
                ours = int(found["link"]) in self._addins and name in self._functions
                calls = calls or ours
                return told(name if ours else ELSEWHERE, "", found["closed"])
            if found["call"]:
                name = found["call"].casefold()
                if name == "single":
                    return "@("
                if name in self._unknown:
                    return told(UNKNOWN, f',"{found["call"]}"', found["bare"])
                if name not in self._functions:
                    return found[0]
                calls = True
                return told(name, "", found["bare"])
            if found["table"]:
                table = self._tables.get(found["table"].casefold())
                return found[0] if table is None else plain_reference(table, found["part"], row)
            if found["elsewhere"]:
                return f"{ELSEWHERE}{TOLD}({place})"
            if found["over"]:
                several = (found["quoted"] or found["plain"]).replace("''", "'")
                areas = self._through_sheets(several, found["area"])
                return found["over"] + areas if areas else found[0]
            if found["top"]:
                return f"$A{found['top']}:$XFD{found['bottom']}"
            if found["name"]:
                on = found["on"] and found["on"].removeprefix("'").removesuffix("'").replace("''", "'")
                meaning, calling = self._meaning(found["name"], on, place, row, column, inside)
                calls = calls or calling
                return meaning or found[0]
            return found[0]

        text = _PIECE.sub(piece, formula)
        return (_with_blanks(text) if calls and _LEFT_OUT.search(text) else text), calls

    def _meaning(self, name: str, on: str | None, place: str, row: int, column: int, inside: str) -> tuple[str, bool]:
        """Return what a name stands for, called by the sheet `on`, and whether it calls ours; or a blank text."""
        formula = self._names.meaning(name, on or self._sheet(place), row, column, called_by_sheet=on is not None)
        self._meanings += 1
        deep = inside.count("  ") > DEEPEST_NAMES or self._meanings > MOST_NAMES
        if formula is None or deep or why_refused(formula):
            return "", False
        mark = f" {on or ''}!{name.casefold()} "
        if mark in inside:
            return NAME, False
        text, calls = self.respell(formula, place, row, column, inside + mark)
        return ("", False) if len(text) > LONGEST_MEANING else (f"({text})", calls)

    def _sheet(self, place: str) -> str:
        number = int(place.partition(",")[0])
        return self._sheets[number] if number < len(self._sheets) else ""

    def _through_sheets(self, several: str, area: str) -> str:
        """Return one area in each of the sheets from a first to a last; a blank text if there are no such."""
        sheets = [sheet.casefold() for sheet in self._sheets]
        first, _, last = several.casefold().partition(":")
        if first not in sheets or last not in sheets:
            return ""
        ends = sorted((sheets.index(first), sheets.index(last)))
        return ",".join(f"{sheet_prefix(sheet)}{area}" for sheet in self._sheets[ends[0] : ends[1] + 1])


_LEFT_OUT = re.compile(r"[(,]\s*[,)]")
_WORD = re.compile(
    rf"""(?P<ours>[^\W\d][\w.]*{re.escape(TOLD)}\()|"(?:[^"]|"")*"|'(?:[^']|'')*'|[(){{}},]|\s+|.""", re.DOTALL
)


def _with_blanks(formula: str) -> str:
    """Return a formula with a blank text for each argument of ours that is left out: the engine would give 0 for it.

    >>> _with_blanks("moment_at.at(0,1,1,A1,,3)+IF(A1,,2)")
    'moment_at.at(0,1,1,A1,"",3)+IF(A1,,2)'
    """
    words: list[str] = []
    ours: list[bool] = []
    due = False
    for found in _WORD.finditer(formula):
        word = found[0]
        if word in ",)" and due and ours and ours[-1]:
            words.append('""')
        if word in "({" or found["ours"]:
            ours.append(found["ours"] is not None)
        elif word in ")}" and ours:
            ours.pop()
        due = word == "," or (due and word.isspace())
        words.append(word)
    return "".join(words)


_POSITION = re.compile(rf'"(?:[^"]|"")*"|\b(?P<what>ROW|COLUMN)\(\s*(?P<area>{_AREA})\s*\)', re.IGNORECASE)
MOST_POSITIONS = 10_000


def with_positions(formula: str) -> str:
    """Return the formula of an array with the rows or columns that it asks for written out.

    To the engine an area that is only asked for its place is one whose values count: `ROW(1:9)` in row 1 is a circle.

    >>> with_positions('ROW($A$2:B4)*2&"ROW(1:2)"'), with_positions("COLUMN(B:C)")
    ('{2;3;4}*2&"ROW(1:2)"', '{2,3}')
    """

    def written(found: re.Match[str]) -> str:
        if not found["what"]:
            return found[0]
        by_rows = found["what"].upper() == "ROW"
        ends = re.findall(r"[0-9]+" if by_rows else "[A-Z]+", found["area"].upper())
        if not ends:
            return found[0]
        first, last = sorted(int(end) if by_rows else column_number(end) for end in (ends[0], ends[-1]))
        if last - first >= MOST_POSITIONS:
            return found[0]
        return "{" + (";" if by_rows else ",").join(map(str, range(first, last + 1))) + "}"

    return _POSITION.sub(written, formula)


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


_CALLED = re.compile(r"(?<![\w.])(?:_xlfn\.|_xludf\.)*([^\W\d][\w.]*)\(")


def called(formula: str) -> set[str]:
    """Return the names of all functions that a formula may call, in small letters.

    >>> sorted(called("SUM(A1,_xlfn.XLOOKUP(B1,C:C,D:D))"))
    ['sum', 'xlookup']
    """
    return {name.casefold() for name in _CALLED.findall(formula)}
