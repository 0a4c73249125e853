"""A workbook file as a package: read whole, refused clearly, written whole or not at all."""

from __future__ import annotations

import zipfile
from pathlib import Path

import openpyxl
import pytest
from books import build, parts, rewrite
from openpyxl.worksheet.table import Table

from beamfuncs.hosts.headless import package, writing
from beamfuncs.hosts.headless.grid import Area
from beamfuncs.hosts.headless.package import NotAWorkbook, Package

WORKBOOK = "xl/workbook.xml"


def test_sheets_and_tables_are_found(tmp_path: Path) -> None:
    """Worksheets come in the workbook's order, chart sheets left out; tables with their place and headers."""
    book = openpyxl.Workbook()
    sheet = book.worksheets[0]
    sheet.title = "Bo's & Co"
    for row in [["Mark", "Span\nm"], ["B1", 6], ["B2", 7.5]]:
        sheet.append(row)
    sheet.add_table(Table(displayName="Beams", ref="A1:B3"))
    book.create_chartsheet("Chart")
    book.create_sheet("Last")
    book.save(tmp_path / "book.xlsx")
    read = Package.read(tmp_path / "book.xlsx")
    assert [sheet.name for sheet in read.sheets] == ["Bo's & Co", "Last"]
    (table,) = read.tables
    assert (table.name, table.sheet, table.area) == ("Beams", "Bo's & Co", Area(1, 1, 3, 2))
    assert table.columns == ("Mark", "Span\nm")
    assert table.data == Area(2, 1, 3, 2)
    assert not read.counts_from_1904


def test_the_date_system_is_known(tmp_path: Path) -> None:
    """A workbook that counts its dates from 1904 says so."""
    book = openpyxl.Workbook()
    book.epoch = openpyxl.utils.datetime.CALENDAR_MAC_1904
    book.save(tmp_path / "book.xlsx")
    assert Package.read(tmp_path / "book.xlsx").counts_from_1904


def test_a_copy_keeps_every_other_part(tmp_path: Path) -> None:
    """Replacing one part leaves the bytes, the order and the dates of all others."""
    source = build(tmp_path / "book.xlsx", {"A1": 1})
    rewrite(source, "xl/media/image1.png", lambda _: bytes(range(256)))
    read = Package.read(source)
    read.write(tmp_path / "copy.xlsx", {WORKBOOK: b"<new/>"})
    assert parts(tmp_path / "copy.xlsx") == parts(source) | {WORKBOOK: b"<new/>"}
    with zipfile.ZipFile(source) as before, zipfile.ZipFile(tmp_path / "copy.xlsx") as after:
        kept = [(one.filename, one.date_time, one.compress_type) for one in before.infolist()]
        assert [(one.filename, one.date_time, one.compress_type) for one in after.infolist()] == kept


def _text(path: Path) -> None:
    path.write_text("mark,span\n")


def _empty(path: Path) -> None:
    path.write_bytes(b"")


def _older(path: Path) -> None:
    path.write_bytes(package.OLD_BINARY + bytes(512))


def _protected(path: Path) -> None:
    path.write_bytes(package.OLD_BINARY + bytes(512) + package.ENCRYPTED)


def _other_zip(path: Path) -> None:
    with zipfile.ZipFile(path, "w") as archive:
        archive.writestr("readme.txt", "drawings")


def _ods(path: Path) -> None:
    with zipfile.ZipFile(path, "w") as archive:
        archive.writestr("mimetype", "application/vnd.oasis.opendocument.spreadsheet")


def _cut_short(path: Path) -> None:
    build(path, {"A1": 1})
    path.write_bytes(path.read_bytes()[:-30])


def _flipped(path: Path) -> None:
    build(path, {"A1": 1})
    with zipfile.ZipFile(path) as archive:
        start = archive.getinfo(WORKBOOK).header_offset + 60
    data = bytearray(path.read_bytes())
    data[start : start + 40] = bytes(byte ^ 255 for byte in data[start : start + 40])
    path.write_bytes(data)


def _broken_xml(path: Path) -> None:
    rewrite(build(path, {"A1": 1}), WORKBOOK, lambda xml: xml[:-20])


def _document(path: Path) -> None:
    rewrite(build(path, {"A1": 1}), WORKBOOK, lambda _: b'<document xmlns="x"/>')


def _sheet_missing(path: Path) -> None:
    rewrite(build(path, {"A1": 1}), WORKBOOK, lambda xml: xml.replace(b"rId1", b"rId99"))


def _binary(path: Path) -> None:
    rewrite(build(path, {"A1": 1}), "_rels/.rels", lambda xml: xml.replace(b"workbook.xml", b"workbook.bin"))


@pytest.mark.parametrize(
    ("make", "why"),
    [
        (_text, "not a workbook"),
        (_empty, "not a workbook"),
        (_older, "older binary format"),
        (_protected, "password"),
        (_other_zip, "no workbook"),
        (_ods, "an .ods"),
        (_cut_short, "damaged"),
        (_flipped, "damaged"),
        (_broken_xml, "XML is damaged"),
        (_document, "but a document"),
        (_sheet_missing, "damaged"),
        (_binary, "binary format"),
    ],
)
def test_what_is_no_workbook_is_refused(tmp_path: Path, make: object, why: str) -> None:
    """A file that cannot be read is refused with one line that says what it is."""
    path = tmp_path / "book.xlsx"
    make(path)  # type: ignore[operator]
    with pytest.raises(NotAWorkbook, match=why) as refusal:
        Package.read(path)
    assert "\n" not in str(refusal.value)


def test_a_write_that_fails_leaves_nothing(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """When writing breaks off, the target keeps what it held and no other file stays behind."""
    read = Package.read(build(tmp_path / "book.xlsx", {"A1": 1}))
    target = tmp_path / "copy.xlsx"
    target.write_bytes(b"as before")

    def full_disk(_: int) -> None:
        raise OSError(28, "no space left on device")

    monkeypatch.setattr(writing.os, "fsync", full_disk)
    with pytest.raises(OSError, match="no space"):
        read.write(target, {})
    assert target.read_bytes() == b"as before"
    assert sorted(path.name for path in tmp_path.iterdir()) == ["book.xlsx", "copy.xlsx"]
