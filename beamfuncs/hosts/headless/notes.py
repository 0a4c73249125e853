"""Notes on cells: put into the comments part of a sheet and the drawing that shows them, or added to those there are.

What stands in these parts already keeps its bytes; so do threaded comments, which live in parts of their own.
"""

from __future__ import annotations

import re
from collections.abc import Mapping
from html import escape
from xml.parsers import expat

from beamfuncs.hosts.headless.grid import area, cell_name
from beamfuncs.hosts.headless.package import NotAWorkbook
from beamfuncs.hosts.headless.splice import Splice, spliced, written
from beamfuncs.hosts.headless.wiring import DECLARATION, Wiring

AUTHOR = "beamfuncs"
IDS_IN_A_BLOCK = 1024
LAST_ROW, LAST_COLUMN = 1_048_576, 16_384
WIDTH, LONGEST_LINE, TALLEST = 5, 46, 24
"""Of a note: columns, characters a line, and the most rows."""

_TRANSITIONAL = "http://schemas.openxmlformats.org/"
_STRICT = "http://purl.oclc.org/ooxml/"
_COMMENTS_TYPE = "application/vnd.openxmlformats-officedocument.spreadsheetml.comments+xml"
_DRAWING_TYPE = "application/vnd.openxmlformats-officedocument.vmlDrawing"
_AFTER_DRAWING = {
    *("legacyDrawingHF", "drawingHF", "picture", "oleObjects", "controls", "webPublishItems", "tableParts", "extLst"),
    "AlternateContent",
}
"""What stands behind the drawing of the notes in a sheet."""
_LEGACY = re.compile(rb"""<(?:[\w.-]+:)?legacyDrawing\s[^>]*?[\w.-]+:id\s*=\s*["']([^"']*)["']""")
_BLOCKS = re.compile(rb"""(<(?:[\w.-]+:)?idmap\b[^>]*?\bdata\s*=\s*["'])([^"']*)""")
_END_OF_DRAWING = re.compile(rb"</(?:[\w.-]+:)?xml\s*>\s*$")
_SPACES = b' xmlns:v="urn:schemas-microsoft-com:vml" xmlns:o="urn:schemas-microsoft-com:office:office"' + (
    b' xmlns:x="urn:schemas-microsoft-com:office:excel"'
)
_BOX_DEFINED = re.compile(rb"""\sid\s*=\s*["']_x0000_t202["']""")
_BOX = (
    b'<v:shapetype%s id="_x0000_t202" coordsize="21600,21600" o:spt="202" path="m,l,21600r21600,l21600,xe">'
    b'<v:stroke joinstyle="miter"/><v:path gradientshapeok="t" o:connecttype="rect"/></v:shapetype>'
)


def noted(wiring: Wiring, sheet_part: str, sheet: bytes, notes: Mapping[tuple[int, int], str]) -> bytes:
    """Put notes on cells, given by row and column, and return the sheet with its drawing of notes.

    A note that a cell has already is kept, and the new text written below it.
    """
    base = _STRICT if _STRICT.encode() in sheet[:4096] else _TRANSITIONAL
    part = next((one.target for one in wiring.relations(sheet_part) if one.kind == "comments"), None)
    if part is None:
        part = wiring.free_name("xl/comments{}.xml")
        space = base + ("spreadsheetml/main" if base == _STRICT else "spreadsheetml/2006/main")
        xml = f'{DECLARATION}<comments xmlns="{space}"><authors/><commentList/></comments>'.encode()
        wiring.declare(part, _COMMENTS_TYPE)
        wiring.relate(sheet_part, _kind(base, "comments"), part)
    else:
        xml = wiring.part(part) or b""
    comments = _Comments(xml)
    wiring.changed[part] = comments.with_notes(notes)
    new = [place for place in notes if cell_name(*place) not in comments.texts]
    return _drawn(wiring, sheet_part, sheet, base, {place: notes[place] for place in new}) if new else sheet


def _kind(base: str, name: str) -> str:
    return f"{base}officeDocument/{'' if base == _STRICT else '2006/'}relationships/{name}"


# --- the texts ------------------------------------------------------------------------------------


class _Comments:
    """A comments part, and where its authors, the texts of its comments and the end of their list stand."""

    def __init__(self, xml: bytes) -> None:
        self._xml = xml
        self.texts: dict[str, tuple[int, int]] = {}
        self._authors: list[str] = []
        self._lists: dict[str, tuple[int, int]] = {}
        self._starts: dict[str, int] = {}
        self._reference = ""
        self._author: list[str] | None = None
        self._prefix = b""
        self._parser = parser = expat.ParserCreate()
        parser.StartElementHandler = self._start
        parser.EndElementHandler = self._end
        parser.CharacterDataHandler = self._characters
        try:
            parser.Parse(xml, True)
        except expat.ExpatError as error:
            raise NotAWorkbook(f"the notes of a sheet are damaged ({error})") from error
        if {"authors", "commentList"} - set(self._lists):
            raise NotAWorkbook("the notes of a sheet are damaged (a list is missing)")

    def with_notes(self, notes: Mapping[tuple[int, int], str]) -> bytes:
        """Return the part with notes added."""
        splices: list[Splice] = []
        number = self._authors.index(AUTHOR) if AUTHOR in self._authors else len(self._authors)
        if number == len(self._authors):
            splices.append(self._appended("authors", self._element(b"author", AUTHOR.encode())))
        new = []
        for (row, column), note in notes.items():
            name = cell_name(row, column)
            if name in self.texts:
                splices.append(self._lengthened(*self.texts[name], note))
            else:
                text = self._element(b"text", self._element(b"t", _coded(note), b' xml:space="preserve"'))
                told = f' ref="{name}" authorId="{number}" shapeId="0"'.encode()
                new.append(self._element(b"comment", text, told))
        if new:
            splices.append(self._appended("commentList", b"".join(new)))
        return spliced(self._xml, splices)

    def _element(self, tag: bytes, content: bytes, attributes: bytes = b"") -> bytes:
        name = self._prefix + tag
        return b"<" + name + attributes + b">" + content + b"</" + name + b">"

    def _appended(self, tag: str, new: bytes) -> Splice:
        """Return how a list gets a new end."""
        start, end = self._lists[tag]
        element = self._xml[start:end]
        if element.endswith(b"/>"):
            return start, end, element[:-2].rstrip() + b">" + new + b"</" + self._prefix + tag.encode() + b">"
        at = start + element.rindex(b"</")
        return at, at, new

    def _lengthened(self, start: int, end: int, note: str) -> Splice:
        """Return how a text gets a further paragraph, in a run of its own where it consists of runs."""
        element, more = self._xml[start:end], _coded(f"\n{note}")
        new = self._element(b"t", more, b' xml:space="preserve"')
        runs = element.rfind(b"</" + self._prefix + b"r>")
        plain = element.find(b"</" + self._prefix + b"t>")
        if runs >= 0:
            at = start + element.index(b">", runs) + 1
            return at, at, self._element(b"r", new)
        if plain >= 0:
            return start + plain, start + plain, more
        opened = element[: element.index(b">")].rstrip(b"/ ")
        return start, end, opened + b">" + new + b"</" + self._prefix + b"text>"

    def _start(self, name: str, attributes: dict[str, str]) -> None:
        prefix, _, tag = name.rpartition(":")
        self._starts[tag] = self._parser.CurrentByteIndex
        if tag == "comments":
            self._prefix = f"{prefix}:".encode() if prefix else b""
        elif tag == "comment":
            self._reference = str(area(attributes.get("ref", "A1")))
        elif tag == "author":
            self._author = []

    def _end(self, name: str) -> None:
        tag = name.rpartition(":")[2]
        if tag == "author" and self._author is not None:
            self._authors.append("".join(self._author))
            self._author = None
        elif tag in ("authors", "commentList"):
            self._lists[tag] = self._starts[tag], self._finish(self._starts[tag])
        elif tag == "text":
            self.texts[self._reference] = self._starts[tag], self._finish(self._starts[tag])

    def _characters(self, text: str) -> None:
        if self._author is not None:
            self._author.append(text)

    def _finish(self, start: int) -> int:
        """Return where the element that ends now ends: behind its only tag, or behind its closing one."""
        at = self._parser.CurrentByteIndex
        alone = self._xml.endswith(b"/>", start, at) and self._xml.find(b">", start) == at - 1
        return at if alone else self._xml.index(b">", at) + 1


def _coded(text: str) -> bytes:
    return escape(written(text)[1], quote=False).encode()


# --- the drawing ----------------------------------------------------------------------------------


def _drawn(wiring: Wiring, sheet_part: str, sheet: bytes, base: str, notes: Mapping[tuple[int, int], str]) -> bytes:
    """Add the boxes of notes to the drawing of a sheet's notes, and return the sheet with that drawing."""
    found = _LEGACY.search(sheet)
    targets = {one.id: one.target for one in wiring.relations(sheet_part)}
    blocks = _free_blocks(wiring, len(notes))
    ids = (block * IDS_IN_A_BLOCK + n for block in blocks for n in range(1, IDS_IN_A_BLOCK))
    spaces = _SPACES if found else b""
    named = zip(ids, notes.items(), strict=False)
    boxes = b"".join(_box(f"_x0000_s{number}", place, note, spaces) for number, (place, note) in named)
    listed = ",".join(map(str, blocks)).encode()
    if found:
        part = targets.get(found[1].decode(), "")
        drawing = wiring.part(part) or b""
        end = _END_OF_DRAWING.search(drawing)
        if end is None:
            raise NotAWorkbook("the drawing of a sheet's notes is damaged")
        kind = b"" if _BOX_DEFINED.search(drawing) else _BOX % _SPACES
        drawing = drawing[: end.start()] + kind + boxes + drawing[end.start() :]
        wiring.changed[part] = _BLOCKS.sub(lambda one: one[1] + one[2] + b"," + listed, drawing, count=1)
        return sheet
    part = wiring.free_name("xl/drawings/vmlDrawing{}.vml")
    layout = b'<o:shapelayout v:ext="edit"><o:idmap v:ext="edit" data="%s"/></o:shapelayout>' % listed
    wiring.changed[part] = b"<xml%s>%s%s%s</xml>" % (_SPACES, layout, _BOX % b"", boxes)
    wiring.declare_ending("vml", _DRAWING_TYPE)
    new_id = wiring.relate(sheet_part, _kind(base, "vmlDrawing"), part)
    at, prefix = _place_of_drawing(sheet)
    space = _kind(base, "")[:-1]
    return sheet[:at] + f'<{prefix}legacyDrawing xmlns:r="{space}" r:id="{new_id}"/>'.encode() + sheet[at:]


def _free_blocks(wiring: Wiring, count: int) -> list[int]:
    """Return blocks of ids for `count` boxes that no drawing of the workbook uses."""
    used = {0}
    for name in wiring.names():
        if name.lower().endswith(".vml"):
            for found in _BLOCKS.findall(wiring.part(name) or b""):
                used |= {int(number) for number in found[1].split(b",") if number.strip().isdigit()}
    first = max(used) + 1
    return list(range(first, first + 1 + (count - 1) // (IDS_IN_A_BLOCK - 1)))


def _box(name: str, place: tuple[int, int], note: str, spaces: bytes) -> bytes:
    """Return the hidden box that shows a note beside its cell."""
    row, column = place
    lines = sum(1 + len(line) // LONGEST_LINE for line in note.split("\n"))
    height = min(lines + 1, TALLEST)
    top = max(0, min(row - 2, LAST_ROW - 1 - height))
    left = min(column, LAST_COLUMN - 1 - WIDTH)
    anchor = f"{left}, 12, {top}, 4, {left + WIDTH}, 12, {top + height}, 4"
    return (
        f'<v:shape{spaces.decode()} id="{name}" type="#_x0000_t202" style="position:absolute;visibility:hidden"'
        ' fillcolor="#f2f6f9" o:insetmode="auto"><v:path o:connecttype="none"/><v:textbox/>'
        '<x:ClientData ObjectType="Note"><x:MoveWithCells/><x:SizeWithCells/>'
        f"<x:Anchor>{anchor}</x:Anchor><x:AutoFill>False</x:AutoFill>"
        f"<x:Row>{row - 1}</x:Row><x:Column>{column - 1}</x:Column></x:ClientData></v:shape>"
    ).encode()


def _place_of_drawing(sheet: bytes) -> tuple[int, str]:
    """Return where a sheet's XML takes the drawing of its notes, and the prefix of its tags."""
    depth, prefix, data = 0, "", False
    places: list[int] = []
    parser = expat.ParserCreate()

    def start(name: str, _: dict[str, str]) -> None:
        nonlocal depth, prefix, data
        before, _colon, tag = name.rpartition(":")
        if depth == 0:
            prefix = f"{before}:" if before else ""
        elif depth == 1:
            data = data or tag == "sheetData"
            if data and not places and tag in _AFTER_DRAWING:
                places.append(parser.CurrentByteIndex)
        depth += 1

    def end(_: str) -> None:
        nonlocal depth
        depth -= 1
        if depth == 0 and not places:
            places.append(parser.CurrentByteIndex)

    parser.StartElementHandler, parser.EndElementHandler = start, end
    parser.Parse(sheet, True)
    return places[0], prefix
