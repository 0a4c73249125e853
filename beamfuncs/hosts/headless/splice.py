"""Fresh values spliced into the XML of a sheet beside the formulas; every other byte stays as it was."""

from __future__ import annotations

import math
import re
from bisect import bisect
from collections.abc import Iterable, Mapping
from typing import TypeAlias

from beamfuncs.errors import VALUE, ErrorValue
from beamfuncs.hosts.headless.grid import Area, cell_name
from beamfuncs.hosts.headless.layout import Cell, Layout, opening, read

CellValue: TypeAlias = "float | str | bool | ErrorValue | None"
Splice: TypeAlias = "tuple[int, int, bytes]"
"""The bytes from the first position up to the second are replaced by the third."""

STORED_ERRORS = {"#NULL!", "#DIV/0!", "#VALUE!", "#REF!", "#NAME?", "#NUM!", "#N/A", "#GETTING_DATA"}
"""The error values that the file format knows; any other is stored as `#VALUE!`."""

_TYPE = re.compile(rb"""\st\s*=\s*(?:"[^"]*"|'[^']*')""")
_EXTENT = re.compile(rb"""(\sref\s*=\s*)(?:"[^"]*"|'[^']*')""")
_TO_CODE = re.compile("[\x00-\x08\x0b-\x1f\ud800-\udfff\ufffe\uffff]|_(?=x[0-9A-Fa-f]{4}_)")
_SAFE_WHOLE = 1e15


def for_engine(xml: bytes, layout: Layout, spelling: Mapping[tuple[int, int], str]) -> bytes:
    """Return the sheet as the engine is to see it, each cell's formula spelt as `spelling` has it.

    Stored values of formulas are left out, and so are those that an array filled: they would stand
    in the array's way. Formula cells without a spelling keep what is stored, as a constant.
    """
    splices = []
    prefix = layout.prefix
    for place, cell in layout.cells.items():
        if place in spelling:
            formula = opening(xml, cell.formula_start)[0]
            if not formula.endswith(b"/>"):
                formula += _escaped(spelling[place]) + b"</%sf>" % prefix
            splices.append((cell.start, cell.end, _new_cell(prefix, place, b"", formula)))
        elif cell.formula_start < 0:
            splices.append((cell.start, cell.end, _new_cell(prefix, place)))
        else:
            splices.append((cell.formula_start, cell.formula_end, b""))
    return spliced(xml, splices)


def filled(
    xml: bytes,
    layout: Layout,
    values: Mapping[tuple[int, int], CellValue],
    extents: Mapping[tuple[int, int], Area],
) -> bytes:
    """Return the sheet with `values` stored, and with the new `extents` of its spilling arrays.

    None clears a cell. Where a cell already stores its value, no byte changes.
    """
    missing = {place for place, value in values.items() if value is not None} - set(layout.cells)
    if missing:
        layout = read(xml, whole_rows={row for row, _ in missing})
        missing -= set(layout.cells)
    splices = [
        stored
        for place, value in values.items()
        if place in layout.cells
        for stored in _store(xml, layout.prefix, layout.cells[place], value)
    ]
    splices += [_resize(xml, layout.cells[place], extent) for place, extent in extents.items()]
    splices += _insert(xml, layout, {place: values[place] for place in sorted(missing)})
    return spliced(xml, splices)


def written(value: CellValue) -> tuple[str, str]:
    """Return the type and the text that store a value in the file.

    >>> written(0.1), written(-0.0), written("a"), written(True), written(ErrorValue("#SPILL!"))
    (('', '0.1'), ('', '0'), ('str', 'a'), ('b', '1'), ('e', '#VALUE!'))
    """
    if isinstance(value, ErrorValue):
        return "e", value if value in STORED_ERRORS else VALUE
    if isinstance(value, bool):
        return "b", "1" if value else "0"
    if isinstance(value, str):
        return "str", _TO_CODE.sub(lambda found: f"_x{ord(found[0]):04X}_", value)
    number = float(value or 0.0)
    if not math.isfinite(number):
        raise ValueError("a cell holds finite numbers only")
    whole = abs(number) < _SAFE_WHOLE and number.is_integer()
    return "", str(int(number)) if whole else repr(number)


def _store(xml: bytes, prefix: bytes, cell: Cell, value: CellValue) -> Iterable[Splice]:
    tag = opening(xml, cell.start)
    bare = _TYPE.sub(b"", tag[0]).rstrip(b"/>")
    if value is None:
        if tag.end() != cell.end:
            yield cell.start, cell.end, bare + b"/>"
        return
    kind, text = written(value)
    if _holds(cell, kind, text):
        return
    yield cell.start, tag.end(), bare + _type(kind) + b">"
    if cell.formula_start < 0:
        yield tag.end(), cell.end, _value(prefix, text) + b"</%sc>" % prefix
    elif cell.value_start < 0:
        yield cell.formula_end, cell.formula_end, _value(prefix, text)
    else:
        yield cell.value_start, cell.value_end, _value(prefix, text)


def _holds(cell: Cell, kind: str, text: str) -> bool:
    if cell.value_start < 0 or kind != ("" if cell.type == "n" else cell.type):
        return False
    if kind or not cell.value:
        return cell.value == text
    try:
        return float(cell.value) == float(text)
    except ValueError:
        return False


def _resize(xml: bytes, cell: Cell, extent: Area) -> Splice:
    tag = opening(xml, cell.formula_start)
    return tag.start(), tag.end(), _EXTENT.sub(rb'\1"%s"' % str(extent).encode(), tag[0])


def _insert(xml: bytes, layout: Layout, values: Mapping[tuple[int, int], CellValue]) -> Iterable[Splice]:
    """Yield the cells that stand nowhere in the sheet yet, each before its right-hand neighbour."""
    prefix = layout.prefix
    cells: dict[int, dict[int, bytes]] = {}
    for (row, column), value in values.items():
        kind, text = written(value)
        new = _new_cell(prefix, (row, column), _type(kind), _value(prefix, text))
        cells.setdefault(row, {})[column] = new
    numbers = sorted(layout.rows)
    neighbours: dict[int, list[Cell]] = {row: [] for row in cells}
    for cell in layout.cells.values():
        if cell.row in neighbours:
            neighbours[cell.row].append(cell)
    for row, new_cells in cells.items():
        content = b"".join(new_cells.values())
        if row not in layout.rows:
            after = bisect(numbers, row)
            at = layout.rows[numbers[after]][0] if after < len(numbers) else layout.end_of_data
            yield at, at, b'<%srow r="%d">%s</%srow>' % (prefix, row, content, prefix)
            continue
        start, end = layout.rows[row]
        closing = xml.rindex(b"<", start, end)
        if closing == start:
            yield end - 2, end, b">%s</%srow>" % (content, prefix)
            continue
        for column, new in new_cells.items():
            right = (cell.start for cell in neighbours[row] if cell.column > column)
            at = min(right, default=closing)
            yield at, at, new


def spliced(xml: bytes, splices: Iterable[Splice]) -> bytes:
    """Return XML with some of its bytes replaced, in any order."""
    pieces: list[bytes] = []
    position = 0
    for start, end, new in sorted(splices, key=lambda splice: splice[:2]):
        pieces += xml[position:start], new
        position = end
    pieces.append(xml[position:])
    return b"".join(pieces)


def _new_cell(prefix: bytes, place: tuple[int, int], attribute: bytes = b"", content: bytes = b"") -> bytes:
    name = cell_name(*place).encode()
    return b'<%sc r="%s"%s>%s</%sc>' % (prefix, name, attribute, content, prefix)


def _type(kind: str) -> bytes:
    return b' t="%s"' % kind.encode() if kind else b""


def _value(prefix: bytes, text: str) -> bytes:
    spaced = b' xml:space="preserve"' if text != text.strip() or "\n" in text else b""
    return b"<%sv%s>%s</%sv>" % (prefix, spaced, _escaped(text), prefix)


def _escaped(text: str) -> bytes:
    text = text.replace("&", "&amp;").replace("<", "&lt;").replace(">", "&gt;")
    return text.encode()
