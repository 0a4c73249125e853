"""Where the cells of one sheet stand in the bytes of its XML.

Nothing is parsed into a tree: one walk of the parser notes the positions of the cells that matter, so
that `splice` can replace a few bytes and leave every other byte as it was.
"""

from __future__ import annotations

import re
from collections.abc import Collection
from dataclasses import dataclass, field
from xml.parsers import expat

from beamfuncs.hosts.headless.grid import LAST_COLUMN, LAST_ROW, Area, area, cell_name, column_number

WHAT_IF = "dataTable"

MOST_FORMULAS = 1_000_000
"""A workbook may have so many cells with formulas."""
MOST_IN_ARRAYS = 1_000_000
"""The array formulas of a sheet may fill so many cells in all."""
LARGEST_SHEET = 200_000_000
"""So many cells may lie between the first of a sheet and its last in use, rows times columns."""

_TAG = re.compile(rb"""<[^<>"']*(?:(?:"[^"]*"|'[^']*')[^<>"']*)*>""")
_PREFIX = re.compile(rb"</?([^\s<>/:]*:)?")


class SheetError(ValueError):
    """The sheet's XML cannot be read."""


@dataclass(slots=True)
class Cell:
    """One cell and where its parts stand in the bytes of the sheet; -1 for a part it has not got.

    `kind` is the formula's: "" ordinary, "array", "shared", "dataTable" (a what-if table). A cell with
    nothing to evaluate has `formula` None; one that shares the formula of another has an empty one.
    """

    row: int
    column: int
    type: str
    dynamic: bool
    start: int
    end: int = -1
    formula: str | None = None
    kind: str = ""
    extent: Area | None = None
    shared: str = ""
    formula_start: int = -1
    formula_end: int = -1
    value_start: int = -1
    value_end: int = -1
    value: str = ""

    @property
    def place(self) -> tuple[int, int]:
        return self.row, self.column


@dataclass
class Layout:
    """The cells of a sheet that matter, in reading order, and the span of bytes of every row."""

    cells: dict[tuple[int, int], Cell] = field(default_factory=dict)
    rows: dict[int, tuple[int, int]] = field(default_factory=dict)
    end_of_data: int = -1
    prefix: bytes = b""
    """The namespace prefix of every tag, with its colon."""

    def formulas(self) -> list[Cell]:
        return [cell for cell in self.cells.values() if cell.formula is not None]

    def what_if_tables(self) -> list[Cell]:
        return [cell for cell in self.cells.values() if cell.kind == WHAT_IF]


def read(xml: bytes, whole_rows: Collection[int] = ()) -> Layout:
    """Return the layout of a sheet: its formula cells, what their arrays fill, and `whole_rows`."""
    return _Reader(xml, whole_rows).layout


class _Reader:
    """Notes positions while the parser walks once through a sheet."""

    def __init__(self, xml: bytes, whole_rows: Collection[int]) -> None:
        self.layout = Layout()
        self._xml = xml
        self._whole_rows = whole_rows
        self._extents: dict[int, int] = {}
        """The columns that arrays fill, and down to which row."""
        self._in_arrays = 0
        self._last_row = self._last_column = 0
        self._row = self._column = self._row_start = self._cell_start = 0
        self._attributes: dict[str, str] = {}
        self._cell: Cell | None = None
        self._text: list[str] = []
        self._names: dict[str, str] = {}
        self._parser = parser = expat.ParserCreate(namespace_separator=" ")
        parser.buffer_text = True
        parser.StartElementHandler = self._start
        parser.EndElementHandler = self._end
        parser.StartDoctypeDeclHandler = _no_doctype
        parser.XmlDeclHandler = _utf8_only
        try:
            parser.Parse(xml, True)
        except (expat.ExpatError, KeyError, ValueError) as error:
            raise SheetError(str(error)) from error

    def _start(self, name: str, attributes: dict[str, str]) -> None:
        if not self._names:
            self._name_tags(name)
        tag = self._names.get(name)
        if tag == "c":
            reference = attributes.get("r")
            if reference is None:
                self._column += 1
            else:
                letters = reference.rstrip("0123456789")
                self._column, self._row = column_number(letters), int(reference[len(letters) :])
            if self._column > self._last_column:
                self._last_column = self._column
            if self._row > self._last_row:
                self._last_row = self._row
            self._cell_start = self._parser.CurrentByteIndex
            self._attributes = attributes
            if self._row in self._whole_rows or self._extents.get(self._column, 0) >= self._row:
                self._keep_cell()
        elif tag == "v" and self._cell:
            self._cell.value_start = self._parser.CurrentByteIndex
            self._collect()
        elif tag == "f":
            cell = self._cell or self._keep_cell()
            cell.formula_start = self._parser.CurrentByteIndex
            cell.kind = attributes.get("t", "").replace("normal", "")
            if cell.kind == "shared":
                cell.shared = attributes["si"]
            elif cell.kind == "array":
                cell.extent = area(attributes["ref"])
            self._collect()
        elif tag == "row":
            self._row, self._column = int(attributes.get("r", self._row + 1)), 0
            self._row_start = self._parser.CurrentByteIndex

    def _end(self, name: str) -> None:
        tag, cell = self._names.get(name), self._cell
        if tag == "v" and cell:
            cell.value = self._collected()
            cell.value_end = self._finish(cell.value_start)
        elif tag == "f" and cell:
            cell.formula_end = self._finish(cell.formula_start)
            text = self._collected()
            if text or cell.shared:
                cell.formula = text
        elif tag == "c":
            if cell:
                self._keep(cell)
            self._cell = None
        elif tag == "row":
            self.layout.rows[self._row] = self._row_start, self._finish(self._row_start)
        elif tag == "sheetData":
            self._check_size()
            self.layout.end_of_data = self._parser.CurrentByteIndex
            self.layout.prefix = _prefix(self._xml, self.layout.end_of_data)

    def _name_tags(self, root: str) -> None:
        """Note the tags that matter in the namespace of the root, of which there are two in use."""
        space = root.rpartition(" ")[0]
        for tag in ("c", "v", "f", "row", "sheetData"):
            self._names[f"{space} {tag}".lstrip()] = tag

    def _keep_cell(self) -> Cell:
        kind, dynamic = self._attributes.get("t", ""), "cm" in self._attributes
        self._cell = Cell(self._row, self._column, kind, dynamic, self._cell_start)
        return self._cell

    def _keep(self, cell: Cell) -> None:
        if cell.place in self.layout.cells:
            raise SheetError(f"two of its cells are called {cell_name(*cell.place)}")
        cell.end = self._finish(cell.start)
        self.layout.cells[cell.place] = cell
        if len(self.layout.cells) > MOST_FORMULAS:
            raise SheetError(f"it has more than {MOST_FORMULAS:,} formulas")
        if cell.extent:
            self._fill(cell.extent)

    def _fill(self, extent: Area) -> None:
        self._in_arrays += len(extent.rows) * len(extent.columns)
        if self._in_arrays > MOST_IN_ARRAYS:
            raise SheetError(f"its array formulas fill more than {MOST_IN_ARRAYS:,} cells, {extent} among them")
        for column in extent.columns:
            self._extents[column] = max(extent.bottom, self._extents.get(column, 0))

    def _check_size(self) -> None:
        if self._last_row > LAST_ROW or self._last_column > LAST_COLUMN:
            raise SheetError("it has cells beyond the last row or column that a sheet can have")
        if self._last_row * self._last_column > LARGEST_SHEET:
            last = cell_name(self._last_row, self._last_column)
            raise SheetError(f"its cells reach to {last}; delete the columns and rows that hold nothing")

    def _finish(self, start: int) -> int:
        """Return where the element ends that ends now.

        At the end of an empty element the parser stands behind its only tag, else before its closing tag.
        """
        at = self._parser.CurrentByteIndex
        empty = self._xml.endswith(b"/>", start, at) and opening(self._xml, start).end() == at
        return at if empty else self._xml.index(b">", at) + 1

    def _collect(self) -> None:
        self._text.clear()
        self._parser.CharacterDataHandler = self._text.append

    def _collected(self) -> str:
        self._parser.CharacterDataHandler = None
        return "".join(self._text)


def opening(xml: bytes, position: int) -> re.Match[bytes]:
    """Return the tag at a position."""
    found = _TAG.match(xml, position)
    assert found is not None, "the parser has found a tag there"
    return found


def _prefix(xml: bytes, position: int) -> bytes:
    """Return the namespace prefix, with its colon, of the tag at a position."""
    found = _PREFIX.match(xml, position)
    return (found and found[1]) or b""


def _utf8_only(_version: str, encoding: str | None, _standalone: int) -> None:
    if (encoding or "utf-8").casefold() not in {"utf-8", "us-ascii"}:
        raise SheetError(f"it is written in {encoding}, not in UTF-8")


def _no_doctype(*_: object) -> None:
    raise SheetError("it declares a document type, which no workbook does")
