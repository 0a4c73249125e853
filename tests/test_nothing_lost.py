"""Nothing of a workbook is lost when it is filled: parts, and the sheets outside their values, keep their bytes."""

from __future__ import annotations

import io
import re
import struct
import zipfile
import zlib
from collections.abc import Callable, Iterator
from pathlib import Path
from typing import Any

import openpyxl
import pytest
from books import FIRST_SHEET, MAIN, build, from_xml, parts, rewrite, values
from openpyxl.chart import LineChart, Reference
from openpyxl.comments import Comment
from openpyxl.formatting.rule import CellIsRule
from openpyxl.styles import PatternFill
from openpyxl.worksheet.datavalidation import DataValidation
from openpyxl.worksheet.formula import ArrayFormula

from beamfuncs.hosts.headless.filling import NotFilled, Report, fill
from beamfuncs.hosts.headless.package import NotAWorkbook, Package

SCHEDULE = Path(__file__).parent.parent / "workbooks" / "kestrel_quay.xlsx"

FOREIGN = {
    "xl/vbaProject.bin": bytes(range(256)) * 40,
    "xl/vbaProjectSignature.bin": b"signature of the macros",
    "xl/media/image1.png": b"\x89PNG\r\n\x1a\n" + bytes(range(256)),
    "xl/printerSettings/printerSettings1.bin": b"\0\1" * 300,
    "xl/pivotCache/pivotCacheRecords1.xml": b"<pivotCacheRecords><!-- < & not even XML --></pivotCacheRecords>",
    "xl/threadedComments/threadedComment1.xml": b"<ThreadedComments/>",
    "xl/webextensions/webextension1.xml": b"<we:webextension/>",
    "xl/calcChain.xml": b'<calcChain><c r="A1"/></calcChain>',
    "customXml/item1.xml": b"\xff\xfe is in no known encoding",
    "xl/charts/empty.xml": b"",
    "xl/externalLinks/externalLink1.xml": b"<!DOCTYPE x><x/>",
}


def twice(number: Any) -> float:
    """Twice a number, for tests that need no beam."""
    return 2 * float(number)


def grid(rows: Any) -> list[list[object]]:
    """Rows of two numbers each."""
    return [[10.0 * row, 10.0 * row + 1] for row in range(1, int(rows) + 1)]


FUNCTIONS: dict[str, Callable[..., object]] = {"twice": twice, "grid": grid, "say": lambda: " ö € <&\n>\t"}


def rich(path: Path) -> Path:
    """A workbook with a chart, a comment, a validation, a conditional format, and parts of other programs."""
    book = openpyxl.Workbook()
    sheet = book.worksheets[0]
    sheet.title = "Plan"
    for row in range(1, 6):
        sheet[f"A{row}"] = row
        sheet[f"B{row}"] = f"=twice(A{row})"
    sheet["D1"] = ArrayFormula("D1:E2", "=grid(2)")
    sheet["F1"] = "=say()"
    sheet["A1"].comment = Comment("checked by nobody", "office")
    sheet.add_data_validation(DataValidation(type="list", formula1='"pinned,fixed"', sqref="A9"))
    sheet.conditional_formatting.add("B1:B5", CellIsRule("greaterThan", ["4"], fill=PatternFill(bgColor="FFEE00")))
    chart = LineChart()
    chart.add_data(Reference(sheet, min_col=2, min_row=1, max_row=5))
    sheet.add_chart(chart, "H2")
    book.create_sheet("Notes")["A1"] = "no formula here"
    book.save(path)
    return path


class Unseekable(io.RawIOBase):
    """A stream such as a pipe: a zip file written to it has data descriptors behind its members."""

    def __init__(self) -> None:
        self.bytes = bytearray()

    def writable(self) -> bool:
        """Say that it can be written to."""
        return True

    def write(self, data: Any) -> int:
        """Take what is written."""
        self.bytes += bytes(data)
        return len(data)


def odd(path: Path, streamed: bool = False) -> Path:
    """The rich workbook in a zip file that uses what zip files have: comments, extra fields, dates, other packing."""
    contents = parts(rich(path)) | FOREIGN
    stream = Unseekable() if streamed else io.BytesIO()
    with zipfile.ZipFile(stream, "w") as archive:  # type: ignore[arg-type]
        for number, (name, content) in enumerate(contents.items()):
            entry = zipfile.ZipInfo(name, (1999 + number % 20, 1 + number % 12, 3, 4, 5, 6))
            plain = number % 3 == 0 or (streamed and name == FIRST_SHEET)
            entry.compress_type = zipfile.ZIP_STORED if plain else zipfile.ZIP_DEFLATED
            entry.comment = f"part {number}".encode()
            entry.extra = struct.pack("<2H4s", 0xCAFE, 4, b"kept")
            entry.create_system, entry.external_attr, entry.internal_attr = number % 4, number << 16, number % 2
            with archive.open(entry, "w", force_zip64=number % 2 == 0) as member:
                member.write(content)
        archive.writestr(zipfile.ZipInfo("xl/folder/"), b"")
        archive.comment = b"comment of the whole"
    path.write_bytes(stream.bytes if isinstance(stream, Unseekable) else stream.getvalue())
    return path


def wide(path: Path) -> Path:
    """The rich workbook as a zip64 file: every size and place, and the directory itself, in 64 bits."""
    file, directory = io.BytesIO(), b""
    contents = parts(rich(path)) | FOREIGN
    full, short = 0xFFFFFFFF, 0xFFFF
    for name, content in contents.items():
        packer = zlib.compressobj(wbits=-15)
        packed = packer.compress(content) + packer.flush()
        called, start = name.encode(), file.tell()
        about = (45, 0x800, 8, 0x4321, 0x5432, zlib.crc32(content))
        extra = struct.pack("<2H2Q", 1, 16, len(content), len(packed))
        file.write(struct.pack("<4s5H3L2H", b"PK\3\4", *about, full, full, len(called), len(extra)))
        file.write(called + extra + packed)
        extra = struct.pack("<2H4s", 0xCAFE, 4, b"kept")
        extra += struct.pack("<2H3Q", 1, 24, len(content), len(packed), start)
        directory += struct.pack(
            "<4s6H3L5H2L", b"PK\1\2", 45, *about, full, full, len(called), len(extra), 0, 0, 0, 0, full
        )
        directory += called + extra
    start, count = file.tell(), len(contents)
    file.write(directory)
    end = file.tell()
    file.write(struct.pack("<4sQ2H2L4Q", b"PK\6\6", 44, 45, 45, 0, 0, count, count, len(directory), start))
    file.write(struct.pack("<4sLQL", b"PK\6\7", 0, end, 1))
    file.write(struct.pack("<4s4H2LH", b"PK\5\6", 0, 0, short, short, full, full, 0))
    path.write_bytes(file.getvalue())
    return path


def streamed(path: Path) -> Path:
    """The odd workbook as a program writes it to a pipe."""
    return odd(path, streamed=True)


KEPT = ("date_time", "compress_type", "comment", "create_system", "create_version", "external_attr", "internal_attr")


def described(path: Path) -> Iterator[tuple[str, list[object], bytes]]:
    """Name, directory record and packed bytes of each member, read by the standard library; not the filled sheet's."""
    data = path.read_bytes()
    with zipfile.ZipFile(path) as archive:
        for entry in archive.infolist():
            lengths = struct.unpack_from("<2H", data, entry.header_offset + 26)
            stop = entry.header_offset + 30 + sum(lengths) + entry.compress_size
            packed = data[entry.header_offset : stop] if entry.filename != FIRST_SHEET else b""
            extra = entry.extra.partition(b"\1\0")[0]  # a zip64 field holds the place in the file
            yield entry.filename, [extra, *(getattr(entry, name) for name in KEPT)], packed


def without_values(xml: bytes) -> bytes:
    """A sheet's XML with the types and the values of its formulas, and of what arrays fill, taken out."""
    xml = re.sub(rb'(<c r="(?:[BF]\d|[DE][12])"[^>]*?) t="\w+"', rb"\1", xml)
    return re.sub(rb"<v\b[^>]*>[^<]*</v>|<v ?/>", b"", xml)


@pytest.mark.parametrize("make", [rich, odd, streamed, wide])
def test_every_other_part_keeps_its_packed_bytes(tmp_path: Path, make: Callable[[Path], Path]) -> None:
    """All but the filled sheet keep their packed bytes; all keep their dates, comments, attributes and order."""
    path = make(tmp_path / "book.xlsx")
    before = path.read_bytes()
    report = fill(path, functions=FUNCTIONS)
    assert path.read_bytes() == before
    assert report.errors == []
    assert list(described(report.target)) == list(described(path))
    old, new = parts(path), parts(report.target)
    assert [name for name in old if old[name] != new[name]] == [FIRST_SHEET]
    with zipfile.ZipFile(path) as one, zipfile.ZipFile(report.target) as other:
        assert one.comment == other.comment
        assert other.testzip() is None


def test_names_with_backslashes_are_kept(tmp_path: Path) -> None:
    """A workbook whose parts are named with backslashes, as old programs do, is filled and keeps the names."""
    path = tmp_path / "book.xlsx"
    contents = parts(rich(path))
    with zipfile.ZipFile(path, "w") as archive:
        for name, content in contents.items():
            archive.writestr(zipfile.ZipInfo(name.replace("/", "\\")), content)
    assert FIRST_SHEET not in parts(path)
    report = fill(path, functions=FUNCTIONS)
    assert report.errors == []
    assert list(parts(report.target)) == list(parts(path))
    assert b"<v>10</v>" in parts(report.target)[FIRST_SHEET.replace("/", "\\")]


@pytest.mark.parametrize("make", [rich, odd, streamed, wide])
def test_the_filled_part_is_an_ordinary_member(tmp_path: Path, make: Callable[[Path], Path]) -> None:
    """Before the filled sheet stand its own sizes and checksum: nothing in 64 bits, and nothing follows it."""
    target = fill(make(tmp_path / "book.xlsx"), functions=FUNCTIONS).target
    with zipfile.ZipFile(target) as archive:
        entry = archive.getinfo(FIRST_SHEET)
    data = target.read_bytes()
    _, flags, *_, checksum, packed, size, name, extra = struct.unpack_from("<2H6xLLL2H", data[4:], entry.header_offset)
    start = entry.header_offset + 30 + name
    assert (checksum, packed, size) == (entry.CRC, entry.compress_size, entry.file_size)
    assert not flags & 8
    assert not entry.flag_bits & 8
    assert not data[start : start + extra].startswith(b"\1\0")
    assert b"\1\0\x10\0" not in data[start : start + extra]
    assert data[start + extra + packed :].startswith(b"PK")


def test_the_comparison_of_parts_bites(tmp_path: Path) -> None:
    """A part packed anew, or one more bit in its attributes, would be seen."""
    path = odd(tmp_path / "book.xlsx")
    copy = tmp_path / "again.xlsx"
    copy.write_bytes(path.read_bytes())
    again = rewrite(copy, "xl/calcChain.xml", lambda xml: xml)
    assert parts(path) == parts(again)
    assert list(described(path)) != list(described(again))


@pytest.mark.parametrize("make", [rich, odd, streamed, wide])
def test_the_sheet_changes_in_its_values_only(tmp_path: Path, make: Callable[[Path], Path]) -> None:
    """The XML of the filled sheet is the same outside the values of formula cells, and these are right."""
    path = make(tmp_path / "book.xlsx")
    report = fill(path, functions=FUNCTIONS)
    old, new = parts(path)[FIRST_SHEET], parts(report.target)[FIRST_SHEET]
    arrays = [rb'<c r="E1"><v>11</v></c>', rb'<row r="2">']
    assert all(piece in new for piece in arrays)
    for added in (rb'<c r="E1"></c>', rb'<c r="D2"></c><c r="E2"></c>'):
        assert without_values(new).count(added) == 1
        new = without_values(new).replace(added, b"")
    assert new == without_values(old)
    got = values(report.target)
    assert [got[f"B{row}"] for row in range(1, 6)] == [2, 4, 6, 8, 10]
    assert [got[cell] for cell in ("D1", "E1", "D2", "E2")] == [10, 11, 20, 21]


@pytest.mark.parametrize("make", [rich, odd, streamed, wide])
def test_filling_a_filled_file_changes_no_byte_of_it(tmp_path: Path, make: Callable[[Path], Path]) -> None:
    """The file that a second filling writes is the first one to the last byte."""
    first = fill(make(tmp_path / "book.xlsx"), functions=FUNCTIONS)
    second = fill(first.target, functions=FUNCTIONS)
    assert second.target != first.target
    assert second.target.read_bytes() == first.target.read_bytes()


def test_the_schedule_filled_twice(tmp_path: Path) -> None:
    """The example workbook, filled twice, is the same file; and filled anew, the same again."""
    first = fill(SCHEDULE, tmp_path / "first.xlsx").target
    assert fill(first, tmp_path / "second.xlsx").target.read_bytes() == first.read_bytes()
    assert fill(SCHEDULE, tmp_path / "third.xlsx").target.read_bytes() == first.read_bytes()


def test_macros_and_their_signature_stay(tmp_path: Path) -> None:
    """A workbook with macros is filled as any other; the macros and their signature keep their bytes."""
    report = fill(odd(tmp_path / "book.xlsm"), functions=FUNCTIONS)
    assert report.target == tmp_path / "book.filled.xlsm"
    new = parts(report.target)
    assert {name: new[name] for name in FOREIGN} == FOREIGN


def test_parts_that_are_not_needed_are_never_unpacked(tmp_path: Path) -> None:
    """A part that nothing is computed from may be damaged: it is copied as it lies."""
    path = odd(tmp_path / "book.xlsx")
    with zipfile.ZipFile(path) as archive:
        start = archive.getinfo("xl/vbaProject.bin").header_offset + 60
    data = bytearray(path.read_bytes())
    data[start : start + 9] = b"corrupted"
    path.write_bytes(data)
    target = fill(path, functions=FUNCTIONS).target
    assert list(described(target)) == list(described(path))


def test_parts_are_added_and_left_out(tmp_path: Path) -> None:
    """A part that is new stands at the end, one replaced by None is gone; the others keep their packed bytes."""
    for make in (odd, streamed, wide):
        path, target = make(tmp_path / "book.xlsx"), tmp_path / "out.xlsx"
        Package.read(path).write(target, {"xl/new ö.xml": b"<new/>", "xl/calcChain.xml": None, "xl/none.xml": None})
        old = parts(path)
        del old["xl/calcChain.xml"]
        assert parts(target) == old | {"xl/new ö.xml": b"<new/>"}
        assert list(parts(target))[-1] == "xl/new ö.xml"
        with zipfile.ZipFile(target) as archive:
            assert archive.testzip() is None


# --- signatures -----------------------------------------------------------------------------------


def signed(path: Path) -> Path:
    """Put a digital signature's part into a workbook."""
    return rewrite(path, "_xmlsignatures/sig1.xml", lambda _: b"<Signature/>")


def test_a_signature_is_never_broken(tmp_path: Path) -> None:
    """A signed workbook that would change is refused; one that is filled already is copied with its signature."""
    path = signed(build(tmp_path / "book.xlsx", {"A1": "=twice(3)"}))
    with pytest.raises(NotFilled, match="signed") as refusal:
        fill(path, functions=FUNCTIONS)
    assert "\n" not in str(refusal.value)
    assert list(tmp_path.iterdir()) == [path]
    full = signed(fill(build(tmp_path / "full.xlsx", {"A1": "=twice(3)"}), functions=FUNCTIONS).target)
    assert fill(full, tmp_path / "out.xlsx", FUNCTIONS).target.read_bytes() == full.read_bytes()


# --- encodings ------------------------------------------------------------------------------------

ROWS = '<row r="1"><c r="A1" t="str"><v>Träger</v></c><c r="B1"><f>say()</f></c><c r="C1"><f>A1&amp;"ß"</f></c></row>'


def encoded(path: Path, declared: str, codec: str, mark: bytes = b"") -> Path:
    """A workbook whose sheet is written in another encoding."""
    declaration = f'<?xml version="1.0" encoding="{declared}" standalone="yes"?>\n' if declared else ""
    text = f'{declaration}<worksheet xmlns="{MAIN}"><sheetData>{ROWS}</sheetData></worksheet>'
    return rewrite(from_xml(path, ""), FIRST_SHEET, lambda _: mark + text.encode(codec))


@pytest.mark.parametrize(
    ("declared", "codec", "mark"),
    [
        ("UTF-8", "utf-8", b"\xef\xbb\xbf"),
        ("", "utf-8", b"\xef\xbb\xbf"),
        ("", "utf-8", b""),
        ("utf-16", "utf-16-le", b"\xff\xfe"),
        ("UTF-16", "utf-16-be", b"\xfe\xff"),
        ("", "utf-16-le", b"\xff\xfe"),
        ("ISO-8859-1", "iso-8859-1", b""),
        ("windows-1252", "cp1252", b""),
    ],
)
def test_sheets_keep_their_encoding(tmp_path: Path, declared: str, codec: str, mark: bytes) -> None:
    """A sheet in another encoding is filled in that encoding; outside the values it keeps every byte."""
    path = encoded(tmp_path / "book.xlsx", declared, codec, mark)
    report = fill(path, functions=FUNCTIONS)
    old, new = parts(path)[FIRST_SHEET], parts(report.target)[FIRST_SHEET]
    assert new.startswith(mark)
    text = new[len(mark) :].decode(codec)
    filled = re.sub(r' t="str"(><f>)', r"\1", re.sub(r"(</f>)<v[^>]*>[^<]*</v>", r"\1", text))
    assert filled == old[len(mark) :].decode(codec)
    got = values(report.target)
    assert got["C1"] == "Trägerß"
    assert got["B1"] == " ö € <&\n>\t"
    assert fill(report.target, functions=FUNCTIONS).target.read_bytes() == report.target.read_bytes()


@pytest.mark.parametrize(("declared", "codec"), [("shift_jis", "utf-8"), ("utf-7", "utf-8"), ("UTF-16", "utf-8")])
def test_encodings_that_cannot_be_read_are_refused(tmp_path: Path, declared: str, codec: str) -> None:
    """An encoding that is not known, or not the one it says, is refused with the part's name."""
    with pytest.raises(NotAWorkbook, match=rf"{FIRST_SHEET}.* {declared}"):
        Package.read(encoded(tmp_path / "book.xlsx", declared, codec))


def test_the_workbook_part_in_another_encoding(tmp_path: Path) -> None:
    """Names and relations in UTF-16 are read as well."""
    path = build(tmp_path / "book.xlsx", {"A1": "=twice(Länge)", "B1": 4}, {"Länge": "Plan!$B$1"})
    for part in ("xl/workbook.xml", "xl/_rels/workbook.xml.rels", "_rels/.rels", "xl/styles.xml"):
        rewrite(path, part, lambda xml: xml.decode().encode("utf-16"))
    report: Report = fill(path, functions=FUNCTIONS)
    assert report.errors == []
    assert b"<v>8</v>" in parts(report.target)[FIRST_SHEET]
