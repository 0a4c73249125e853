"""A filled workbook handed over to a reader without our functions: their formulas give way to values, kept in notes."""

from __future__ import annotations

import re
from collections.abc import Callable, Collection, Iterable, Iterator, Mapping
from functools import partial
from html import escape, unescape
from typing import TYPE_CHECKING

from beamfuncs.hosts.headless.grid import Area, area, cell_name
from beamfuncs.hosts.headless.layout import Cell, opening, read
from beamfuncs.hosts.headless.notes import noted
from beamfuncs.hosts.headless.package import Package
from beamfuncs.hosts.headless.splice import Splice, spliced
from beamfuncs.hosts.headless.wiring import Wiring

if TYPE_CHECKING:
    from beamfuncs.hosts.headless.filling import ListedCell

MOST_FAULTS = 100
"""Of an array with more cells in error, the first have a note of their own."""
_SPILL_REFERENCE = b"ANCHORARRAY("
_SPILT = re.compile(
    r"(?:_xlfn\.)?ANCHORARRAY\(\s*(?P<sheet>(?:'(?:[^']|'')*'|[\w.]+)!)?(?P<cell>\$?[A-Z]{1,3}\$?[0-9]+)\s*\)",
    re.IGNORECASE,
)
_NAME = re.compile(rb"(?<=>)[^<]*ANCHORARRAY\([^<]*(?=</(?:[\w.-]+:)?definedName>)")
_DYNAMIC = re.compile(rb"""\scm\s*=\s*(?:"[^"]*"|'[^']*')""")


def frozen(package: Package, parts: dict[str, bytes], cells: Collection[ListedCell]) -> dict[str, bytes | None]:
    """Return the parts of a filled workbook without the formulas of `cells`, whose values stay.

    Every formula is kept in a note on its cell, with the reason where its value is an error. A reference to
    what such a formula spills (`C2#`) becomes one to the cells themselves. The order of calculation that the
    file remembers is dropped, as it names cells that have no formula any more; a spreadsheet makes it anew.
    """
    wiring = Wiring(package.parts)
    wiring.changed.update(parts)
    by_sheet: dict[str, list[ListedCell]] = {}
    for cell in cells:
        by_sheet.setdefault(cell.sheet, []).append(cell)
    for sheet in package.sheets:
        listed = by_sheet.get(sheet.name)
        if listed:
            xml = _without_formulas(wiring.part(sheet.part) or b"", [area(cell.cells) for cell in listed])
            notes = {place: note for cell in listed for place, note in _notes(cell)}
            wiring.changed[sheet.part] = noted(wiring, sheet.part, xml, notes)
    _respell(wiring, package, {(one.sheet.casefold(), one.cells.partition(":")[0]): one.cells for one in cells})
    if by_sheet:
        for relation in wiring.relations(package.workbook_part):
            if relation.kind == "calcChain":
                wiring.drop(relation.target, package.workbook_part)
    return wiring.changed


def _without_formulas(xml: bytes, extents: Iterable[Area]) -> bytes:
    layout = read(xml)
    cells = (layout.cells[extent.top, extent.left] for extent in extents)
    return spliced(xml, (splice for cell in cells for splice in _frozen(xml, cell)))


def _frozen(xml: bytes, cell: Cell) -> Iterator[Splice]:
    if cell.dynamic:
        tag = opening(xml, cell.start)
        yield tag.start(), tag.end(), _DYNAMIC.sub(b"", tag[0])
    yield cell.formula_start, cell.formula_end, b""


def _respell(wiring: Wiring, package: Package, extents: Mapping[tuple[str, str], str]) -> None:
    """Let formulas and names that refer to what a formula spilt refer to its cells; `extents` by sheet, first cell."""

    def respelt(formula: str, sheet: str) -> str:
        def plain(found: re.Match[str]) -> str:
            named = (found["sheet"] or sheet).removesuffix("!")
            named = named.removeprefix("'").removesuffix("'").replace("''", "'").casefold()
            cells = extents.get((named, found["cell"].replace("$", "").upper()))
            return found[0] if cells is None else (found["sheet"] or "") + area(cells).fixed

        return _SPILT.sub(plain, formula)

    for sheet in package.sheets:
        xml = wiring.part(sheet.part) or b""
        if _SPILL_REFERENCE in xml:
            wiring.changed[sheet.part] = _respelt_sheet(xml, partial(respelt, sheet=sheet.name))
    names = wiring.part(package.workbook_part) or b""
    if _SPILL_REFERENCE in names:
        wiring.changed[package.workbook_part] = _NAME.sub(
            lambda found: escape(respelt(unescape(found[0].decode()), ""), quote=False).encode(), names
        )


def _respelt_sheet(xml: bytes, respelt: Callable[[str], str]) -> bytes:
    splices = []
    for cell in read(xml).formulas():
        new = respelt(cell.formula or "")
        if cell.formula and new != cell.formula and not cell.shared:
            start = opening(xml, cell.formula_start).end()
            splices.append((start, xml.rindex(b"<", start, cell.formula_end), escape(new, quote=False).encode()))
    return spliced(xml, splices)


def _notes(cell: ListedCell) -> Iterator[tuple[tuple[int, int], str]]:
    """Yield the notes of a formula by row and column: on its first cell, and on the others that are in error."""
    extent = area(cell.cells)
    first = cell_name(extent.top, extent.left)
    reasons = {fault.cell: f"{fault.value}: {fault.reason}" for fault in cell.faults}
    values = "this value" if cell.cells == first else f"the values of {cell.cells}"
    lines = [f"beamfuncs computed {values} from", cell.formula]
    yield (extent.top, extent.left), "\n".join([*lines, *([reasons.pop(first)] if first in reasons else [])])
    for name in list(reasons)[:MOST_FAULTS]:
        place = area(name)
        yield (place.top, place.left), f"beamfuncs: {reasons[name]}\nThe formula stands in the note on {first}."
