"""A workbook file as a package: its sheets and tables, and a copy with a few parts replaced.

Every part that is not replaced keeps its bytes: charts, drawings, macros, styles and all the rest.
"""

from __future__ import annotations

import io
import os
import posixpath
import re
import secrets
import zipfile
import zlib
from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field
from pathlib import Path
from typing import BinaryIO
from xml.etree import ElementTree

from beamfuncs.hosts.formulas import Table
from beamfuncs.hosts.grid import area

OLD_BINARY = b"\xd0\xcf\x11\xe0\xa1\xb1\x1a\xe1"
ENCRYPTED = "EncryptedPackage".encode("utf-16-le")
_DAMAGE = (zipfile.BadZipFile, zlib.error, EOFError, NotImplementedError, RuntimeError)
_CODED = re.compile("_x([0-9A-Fa-f]{4})_")


class NotAWorkbook(ValueError):
    """The file cannot be read as a workbook; the message says why in one line."""


@dataclass(frozen=True)
class Sheet:
    """A worksheet's name, the name of its part, and the part's bytes."""

    name: str
    part: str
    xml: bytes = field(repr=False)


@dataclass(frozen=True)
class Package:
    """A workbook file, read: its parts, and the `sheets` and `tables` among them."""

    entries: tuple[zipfile.ZipInfo, ...] = field(repr=False)
    parts: Mapping[str, bytes] = field(repr=False)
    workbook_part: str
    sheets: tuple[Sheet, ...]
    tables: tuple[Table, ...]
    counts_from_1904: bool

    @classmethod
    def read(cls, path: Path) -> Package:
        """Read a workbook, or raise `NotAWorkbook` or an OSError."""
        data = path.read_bytes()
        if data.startswith(OLD_BINARY):
            protected = "it is protected by a password; save it without one"
            raise NotAWorkbook(protected if ENCRYPTED in data else "it is in an older binary format; save it as .xlsx")
        try:
            with zipfile.ZipFile(io.BytesIO(data)) as archive:
                entries = tuple(archive.infolist())
                parts = {entry.filename: archive.read(entry) for entry in entries}
        except _DAMAGE as error:
            raise NotAWorkbook(f"it is not a workbook or is damaged ({error})") from error
        try:
            return cls(entries, parts, *_contents(parts))
        except KeyError as error:
            raise NotAWorkbook(f"it is not a workbook or is damaged (it has no {error.args[0]})") from error
        except NotAWorkbook:
            raise
        except (ElementTree.ParseError, ValueError) as error:
            raise NotAWorkbook(f"its XML is damaged ({error})") from error

    def copy(self, replaced: Mapping[str, bytes]) -> bytes:
        """Return the package with the bytes of some parts replaced, uncompressed."""
        stream = io.BytesIO()
        self._copy_to(stream, replaced, compressed=False)
        return stream.getvalue()

    def write(self, target: Path, replaced: Mapping[str, bytes]) -> None:
        """Write the package with the bytes of some parts replaced; the file appears complete or not at all."""
        temporary = target.with_name(f".{target.name}.{secrets.token_hex(4)}")
        try:
            with temporary.open("xb") as stream:
                self._copy_to(stream, replaced, compressed=True)
                stream.flush()
                os.fsync(stream.fileno())
            temporary.replace(target)
        except BaseException:
            temporary.unlink(missing_ok=True)
            raise

    def _copy_to(self, stream: BinaryIO, replaced: Mapping[str, bytes], compressed: bool) -> None:
        with zipfile.ZipFile(stream, "w") as copy:
            for entry in self.entries:
                same = zipfile.ZipInfo(entry.filename, entry.date_time)
                same.compress_type = entry.compress_type if compressed else zipfile.ZIP_STORED
                same.external_attr = entry.external_attr
                same.create_system = entry.create_system
                copy.writestr(same, replaced.get(entry.filename, self.parts[entry.filename]))


def _contents(parts: Mapping[str, bytes]) -> tuple[str, tuple[Sheet, ...], tuple[Table, ...], bool]:
    """Return the workbook's part, its sheets and tables, and whether its dates count from 1904."""
    root = _relations(parts, "").values()
    workbook_part = next((target for kind, target in root if kind == "officeDocument"), "workbook")
    if workbook_part.endswith(".bin"):
        raise NotAWorkbook("it is in a binary format; save it as .xlsx")
    workbook = ElementTree.fromstring(parts[workbook_part])
    if _tag(workbook) != "workbook":
        raise NotAWorkbook(f"it is not a workbook but a {_tag(workbook)}")
    related = _relations(parts, workbook_part)
    sheets: list[Sheet] = []
    tables: list[Table] = []
    for element in _children(workbook, "sheets"):
        kind, part = related[next((value for name, value in element.items() if name.endswith("}id")), "sheet")]
        if kind != "worksheet":
            continue
        sheet = Sheet(element.get("name", ""), part, parts[part])
        sheets.append(sheet)
        tables += [
            _table(ElementTree.fromstring(parts[target]), sheet.name)
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
        columns=tuple(_decoded(column.get("name", "")) for column in _children(element, "tableColumns")),
        header_rows=int(element.get("headerRowCount", 1)),
        total_rows=int(element.get("totalsRowCount", 0)),
    )


def _relations(parts: Mapping[str, bytes], part: str) -> dict[str, tuple[str, str]]:
    """Return kind and target of each relation of a part, by its id; of the package itself where it is blank."""
    folder, name = posixpath.split(part)
    listed = posixpath.join(folder, "_rels", f"{name}.rels")
    if listed not in parts:
        return {}
    relations = {}
    for element in ElementTree.fromstring(parts[listed]):
        if element.get("TargetMode") != "External":
            kind = element.get("Type", "").rpartition("/")[2]
            target = posixpath.normpath(posixpath.join("/", folder, element.get("Target", "")))
            relations[element.get("Id", "")] = kind, target.lstrip("/")
    return relations


def _children(element: ElementTree.Element, name: str) -> Iterator[ElementTree.Element]:
    for child in element:
        if _tag(child) == name:
            yield from child


def _tag(element: ElementTree.Element) -> str:
    return element.tag.rpartition("}")[2]


def _decoded(name: str) -> str:
    return _CODED.sub(lambda found: chr(int(found[1], 16)), name)
