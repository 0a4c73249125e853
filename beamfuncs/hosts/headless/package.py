"""A workbook file as a package: its sheets and tables, and the file with a few parts replaced.

All that is not replaced keeps its packed bytes: charts, drawings, macros, styles and all the rest. Only
parts that are read are ever unpacked.
"""

from __future__ import annotations

import posixpath
import re
from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field
from pathlib import Path
from urllib.parse import unquote
from xml.etree import ElementTree

from beamfuncs.hosts.headless import writing
from beamfuncs.hosts.headless.archive import MOST_BYTES, Archive
from beamfuncs.hosts.headless.archive import NotAWorkbook as NotAWorkbook
from beamfuncs.hosts.headless.formulas import Table
from beamfuncs.hosts.headless.grid import area
from beamfuncs.hosts.headless.markup import Encoding, decoded, plain, tree, written

OLD_BINARY = b"\xd0\xcf\x11\xe0\xa1\xb1\x1a\xe1"
ENCRYPTED = "EncryptedPackage".encode("utf-16-le")
ZIP = b"PK"
OPEN_DOCUMENT = b"application/vnd.oasis.opendocument.spreadsheet"
CONTENT_TYPES = "[Content_Types].xml"
_COMPUTED = {"worksheet", "sharedStrings", "styles"}
"""The kinds of parts that a workbook is evaluated from."""
_SIGNATURES = "_xmlsignatures/"
_MARKUP = (".xml", ".rels")


class Parts(Mapping[str, bytes]):
    """The parts of a package by their names, those in XML as UTF-8 in whatever encoding they are written."""

    def __init__(self, archive: Archive) -> None:
        self.archive = archive
        self._plain: dict[str, tuple[bytes, Encoding]] = {}

    def __getitem__(self, name: str) -> bytes:
        if not name.endswith(_MARKUP):
            return self.archive[name]
        if name not in self._plain:
            packed = self.archive[name]
            try:
                self._plain[name] = plain(packed)
            except NotAWorkbook as error:
                raise NotAWorkbook(f"its part {name} cannot be read: {error}") from error
        return self._plain[name][0]

    def __iter__(self) -> Iterator[str]:
        return iter(self.archive)

    def __len__(self) -> int:
        return len(self.archive)

    def as_written(self, name: str, content: bytes) -> bytes:
        """Return new content of a part in the part's own encoding."""
        return written(content, self._plain[name][1]) if name in self._plain else content


@dataclass(frozen=True)
class Sheet:
    """A worksheet's name, the name of its part, and the part's bytes."""

    name: str
    part: str
    xml: bytes = field(repr=False)


@dataclass(frozen=True)
class Package:
    """A workbook file, read: its parts, and the `sheets` and `tables` among them."""

    path: Path
    parts: Parts = field(repr=False)
    workbook_part: str
    sheets: tuple[Sheet, ...]
    tables: tuple[Table, ...]
    counts_from_1904: bool

    @classmethod
    def read(cls, path: Path) -> Package:
        """Read a workbook, or raise `NotAWorkbook` or an OSError."""
        if path.stat().st_size > MOST_BYTES:
            raise NotAWorkbook(f"it is too large: more than {MOST_BYTES >> 20} MB")
        data = path.read_bytes()
        if not data.startswith(ZIP):
            raise NotAWorkbook(_instead(data))
        parts = Parts(Archive(data))
        if OPEN_DOCUMENT in parts.get("mimetype", b""):
            raise NotAWorkbook("it is an .ods: save it as .xlsx, or use `beamfuncs calc freeze`")
        try:
            return cls(path, parts, *_contents(parts))
        except KeyError as error:
            raise NotAWorkbook(f"it is not a workbook or is damaged (it has no {error.args[0]})") from error
        except NotAWorkbook:
            raise
        except (ElementTree.ParseError, ValueError) as error:
            raise NotAWorkbook(f"its XML is damaged ({error})") from error

    def links_to(self, file: str) -> set[int]:
        """Return the numbers, as formulas give them in brackets, of the links to a file of this name in any folder."""
        links = _children(tree(self.parts[self.workbook_part]), "externalReferences")
        related = _relations(self.parts, self.workbook_part)
        found = set()
        for number, link in enumerate(links, 1):
            _, part = related.get(_id(link), ("", ""))
            targets = (target for _, target in _relations(self.parts, part, outside=True).values())
            if any(_file_name(target) == file.casefold() for target in targets):
                found.add(number)
        return found

    def computed_from(self) -> dict[str, bytes]:
        """Return the parts that the workbook is evaluated from; all others are left packed."""
        related = [target for kind, target in _relations(self.parts, self.workbook_part).values() if kind in _COMPUTED]
        listed = [CONTENT_TYPES, _relations_part(""), self.workbook_part, _relations_part(self.workbook_part), *related]
        wanted = {name.casefold() for name in listed}
        return {name: self.parts[name] for name in self.parts if name.casefold() in wanted}

    def write(self, target: Path, replaced: Mapping[str, bytes | None]) -> None:
        """Write the package with the bytes of some parts replaced; the file appears complete or not at all.

        A part that the package has not got is added to it, one replaced by None is left out. Where that
        changes nothing, the file is the same to the last byte.
        """
        writing.replace(target, self._with(self._changed(replaced)))

    def rewrite(self, replaced: Mapping[str, bytes | None]) -> Path | None:
        """Write the package over the file it was read from, and return the dated copy of what stood there.

        Where no byte would change the file is left alone and there is no copy.
        """
        changed = self._changed(replaced)
        if not changed:
            return None
        kept: list[Path] = []

        def ready() -> None:
            if self.path.read_bytes() != self.parts.archive.data:
                raise writing.NotWritten(f"{self.path}: was changed by another program meanwhile")
            kept.append(writing.keep_dated(self.path, self.parts.archive.data))

        writing.replace(self.path, self._with(changed), ready)
        return kept[0]

    def _changed(self, replaced: Mapping[str, bytes | None]) -> dict[str, bytes | None]:
        """Return what is replaced by other bytes than stood there, each part in its own encoding."""
        changed: dict[str, bytes | None] = {}
        for name, content in replaced.items():
            if content is None:
                changed |= {name: None} if name in self.parts else {}
            elif name not in self.parts or content != self.parts[name]:
                changed[name] = self.parts.as_written(name, content)
        if changed and any(name.casefold().startswith(_SIGNATURES) for name in self.parts):
            raise NotAWorkbook("it is signed, and new values would break the signature; take the signature away first")
        return changed

    def _with(self, changed: Mapping[str, bytes | None]) -> Iterator[bytes]:
        archive = self.parts.archive
        return archive.with_contents(changed) if changed else iter([archive.data])


def _instead(data: bytes) -> str:
    """Return what a file is that is no package."""
    if data.startswith(OLD_BINARY):
        protected = "it is protected by a password; save it without one"
        return protected if ENCRYPTED in data else "it is in an older binary format; save it as .xlsx"
    if not data:
        return "it is not a workbook but empty"
    if b"\0" in data[:1000]:
        return "it is not a workbook or is damaged (no zip file)"
    return "it is not a workbook but text; open it in a spreadsheet program and save it as .xlsx"


def _contents(parts: Mapping[str, bytes]) -> tuple[str, tuple[Sheet, ...], tuple[Table, ...], bool]:
    """Return the workbook's part, its sheets and tables, and whether its dates count from 1904."""
    root = _relations(parts, "").values()
    workbook_part = next((target for kind, target in root if kind == "officeDocument"), "workbook")
    if workbook_part.endswith(".bin"):
        raise NotAWorkbook("it is in a binary format; save it as .xlsx")
    workbook = tree(parts[workbook_part])
    if _tag(workbook) != "workbook":
        raise NotAWorkbook(f"it is not a workbook but a {_tag(workbook)}")
    related = _relations(parts, workbook_part)
    sheets: list[Sheet] = []
    tables: list[Table] = []
    for element in _children(workbook, "sheets"):
        kind, part = related[_id(element) or "sheet"]
        if kind != "worksheet":
            continue
        sheet = Sheet(element.get("name", ""), part, parts[part])
        sheets.append(sheet)
        tables += [
            _table(tree(parts[target]), sheet.name)
            for kind, target in _relations(parts, part).values()
            if kind == "table"
        ]
    from_1904 = any(element.get("date1904") in {"1", "true"} for element in workbook if _tag(element) == "workbookPr")
    return workbook_part, tuple(sheets), tuple(tables), from_1904


def _table(element: ElementTree.Element, sheet: str) -> Table:
    return Table(
        name=element.get("displayName") or element.get("name") or "",
        sheet=sheet,
        area=area(element.get("ref", "")),
        columns=tuple(decoded(column.get("name", "")) for column in _children(element, "tableColumns")),
        header_rows=int(element.get("headerRowCount", 1)),
        total_rows=int(element.get("totalsRowCount", 0)),
    )


def _relations(parts: Mapping[str, bytes], part: str, outside: bool = False) -> dict[str, tuple[str, str]]:
    """Return kind and target of each relation of a part, by its id; of the package itself where it is blank.

    Those to other parts of the package, or as they are written, those to files `outside`.
    """
    folder = posixpath.dirname(part)
    listed = _relations_part(part)
    if listed not in parts:
        return {}
    relations = {}
    for element in tree(parts[listed]):
        kind = element.get("Type", "").rpartition("/")[2]
        if (element.get("TargetMode") == "External") is not outside:
            continue
        if outside:
            relations[element.get("Id", "")] = kind, element.get("Target", "")
        else:
            target = posixpath.normpath(posixpath.join("/", folder, element.get("Target", "")))
            relations[element.get("Id", "")] = kind, target.lstrip("/")
    return relations


def _id(element: ElementTree.Element) -> str:
    """Return the id by which an element names a relation."""
    return next((value for name, value in element.items() if name.endswith("}id")), "")


def _file_name(target: str) -> str:
    return re.split(r"[/\\]", unquote(target))[-1].casefold()


def _relations_part(part: str) -> str:
    folder, name = posixpath.split(part)
    return posixpath.join(folder, "_rels", f"{name}.rels")


def _children(element: ElementTree.Element, name: str) -> Iterator[ElementTree.Element]:
    for child in element:
        if _tag(child) == name:
            yield from child


def _tag(element: ElementTree.Element) -> str:
    return element.tag.rpartition("}")[2]
