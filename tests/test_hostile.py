"""Files made to do harm: each is refused with one clear line, or is an error in its cell; nothing is followed."""

from __future__ import annotations

import os
import random
import socket
import struct
import zipfile
from collections.abc import Callable
from pathlib import Path

import pytest
from books import FIRST_SHEET, MAIN, build, from_xml, parts, rewrite, values
from openpyxl.worksheet.table import Table
from typer.testing import CliRunner

from beamfuncs import cli
from beamfuncs.hosts.headless import archive, filling, package
from beamfuncs.hosts.headless.bounds import DEEPEST_NESTING, LONGEST_FORMULA
from beamfuncs.hosts.headless.filling import NotFilled, Report, fill
from beamfuncs.hosts.headless.layout import MOST_IN_ARRAYS

FUNCTIONS: dict[str, Callable[..., object]] = {"twice": lambda number: 2 * float(number)}
WORKBOOK, TEXTS = "xl/workbook.xml", "xl/sharedStrings.xml"
GIB = 1 << 30


def refusal(path: Path) -> str:
    """The one line with which a file is refused, on the command line as in Python; nothing is written."""
    before = sorted(path.parent.iterdir())
    with pytest.raises(NotFilled) as refused:
        fill(path, functions=FUNCTIONS)
    line = str(refused.value)
    assert "\n" not in line
    assert line.startswith(f"{path}: ")
    done = CliRunner().invoke(cli.app, ["fill", str(path)])
    assert (done.exit_code, done.stdout, done.stderr) == (2, "", f"beamfuncs: {line}\n")
    assert sorted(path.parent.iterdir()) == before
    return line.removeprefix(f"{path}: ")


def reasons(report: Report) -> dict[str, str]:
    """Why each cell is in error."""
    return {fault.cell: fault.reason for fault in report.errors}


def good(path: Path) -> Path:
    """A workbook with which nothing is wrong."""
    return build(path, {"A1": "=twice(3)", "A2": "text"})


def with_directory(path: Path, change: Callable[[bytearray, int], None], make: Callable[[Path], Path] = good) -> Path:
    """Change the record of the first sheet in the directory of a workbook's zip file."""
    data = bytearray(make(path).read_bytes())
    at = data.index(b"PK\1\2")
    while FIRST_SHEET.encode() != data[at + 46 : at + 46 + len(FIRST_SHEET)]:
        at = data.index(b"PK\1\2", at + 1)
    change(data, at)
    path.write_bytes(data)
    return path


# --- zip files ------------------------------------------------------------------------------------


def bomb(path: Path, part: str = FIRST_SHEET, size: int = 40) -> Path:
    """A workbook one part of which unpacks to a thousand times its size, which is given in MB."""
    others = parts(good(path))
    others.pop(part, None)
    with zipfile.ZipFile(path, "w", zipfile.ZIP_DEFLATED) as zipped:
        for name, content in others.items():
            zipped.writestr(name, content)
        with zipped.open(part, "w") as stream:
            for _ in range(size):
                stream.write(bytes(1 << 20))
    return path


@pytest.mark.parametrize("part", [FIRST_SHEET, WORKBOOK, "_rels/.rels", "xl/_rels/workbook.xml.rels", "xl/styles.xml"])
def test_zip_bombs_are_refused(tmp_path: Path, part: str) -> None:
    """A part that is needed and unpacks to far more than its packed size is refused before it is unpacked."""
    path = bomb(tmp_path / "bomb.xlsx", part)
    assert path.stat().st_size < 100_000
    assert refusal(path) == f"its part {part} unpacks to more than 200 times its size"


def test_a_bomb_that_nothing_needs_does_not_go_off(tmp_path: Path) -> None:
    """A part that nothing is computed from is copied as it lies, never unpacked."""
    report = fill(bomb(tmp_path / "bomb.xlsx", "xl/media/image1.png"), functions=FUNCTIONS)
    assert values(report.target)["A1"] == 6


def test_what_is_tightly_packed_but_small_is_read(tmp_path: Path) -> None:
    """A sheet of very many equal cells packs tightly; within the bounds it is read."""
    rows = "".join(f'<row r="{row}">{"<c/>" * 3000}</row>' for row in range(2, 100))
    path = from_xml(tmp_path / "book.xlsx", f'<row r="1"><c r="A1"><f>twice(3)</f></c></row>{rows}')
    with zipfile.ZipFile(path) as zipped:
        sheet = zipped.getinfo(FIRST_SHEET)
    assert sheet.file_size > archive.TIGHTEST * sheet.compress_size
    assert values(fill(path, functions=FUNCTIONS).target)["A1"] == 6


def test_a_record_that_lies_about_the_size(tmp_path: Path) -> None:
    """No more is unpacked than the directory says; what is more or less is damage."""
    for size in (10, 100_000):
        path = with_directory(
            tmp_path / "book.xlsx", lambda data, at, size=size: struct.pack_into("<L", data, at + 24, size)
        )
        assert refusal(path) == (
            "it is not a workbook or is damaged (xl/worksheets/sheet1.xml is not what its directory says)"
        )


def test_all_parts_together_are_bounded(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """Parts that are each small enough may not unpack to more than the bound in all."""
    path = good(tmp_path / "book.xlsx")
    sizes = {name: len(content) for name, content in parts(path).items()}
    needed = sum(sizes[name] for name in READ if name in sizes)
    monkeypatch.setattr(archive, "MOST_BYTES", needed)
    assert fill(path, tmp_path / "out.xlsx", FUNCTIONS).errors == []
    monkeypatch.setattr(archive, "MOST_BYTES", needed - 1)
    assert refusal(path).startswith("it is too large: more than ")


def test_a_huge_file_is_not_read(tmp_path: Path) -> None:
    """The size of the file itself is looked at before it is read."""
    path = tmp_path / "huge.xlsx"
    with path.open("wb") as stream:
        stream.write(b"PK\3\4")
        stream.truncate(700 << 20)
    assert refusal(path) == "it is too large: more than 512 MB"


@pytest.mark.parametrize(
    ("change", "why"),
    [
        (lambda data, at: struct.pack_into("<H", data, at + 8, 1), "is encrypted; save it without a password"),
        (lambda data, at: struct.pack_into("<H", data, at + 10, 14), "is packed in a way that cannot be read here"),
        (lambda data, at: struct.pack_into("<L", data, at + 42, 0), "is not where its directory says"),
        (lambda data, at: struct.pack_into("<L", data, at + 42, 1 << 31), "is not where its directory says"),
        (lambda data, at: struct.pack_into("<L", data, at + 20, 1 << 20), "is not where its directory says"),
        (lambda data, at: struct.pack_into("<L", data, at + 16, 77), "is not what its directory says"),
        (lambda data, at: struct.pack_into("<H", data, at + 28, 60_000), "its directory cannot be read"),
        (lambda data, at: struct.pack_into("<2L", data, at + 20, 2**32 - 1, 2**32 - 1), "its directory cannot be read"),
    ],
)
def test_records_that_are_wrong(tmp_path: Path, change: Callable[[bytearray, int], None], why: str) -> None:
    """An encrypted part, an unknown packing, a wrong place, size or checksum: each is refused."""
    assert why in refusal(with_directory(tmp_path / "book.xlsx", change))


@pytest.mark.parametrize("name", ["../../evil.xml", "/etc/evil.xml", "xl\\..\\evil.xml", "xl/../../evil", "a\0b"])
def test_names_that_lead_out_of_the_file_are_refused(tmp_path: Path, name: str) -> None:
    """A part whose name would be a place outside is refused."""
    path = good(tmp_path / "book.xlsx")
    place = "x" * len(name)
    rewrite(path, place, lambda _: b"evil")
    path.write_bytes(path.read_bytes().replace(place.encode(), name.encode()))
    spelt = name.replace("\\", "/")
    assert refusal(path) == f"the name of its part {spelt!r} leads out of the file"


def test_two_parts_of_one_name_are_refused(tmp_path: Path) -> None:
    """Which of two would count differs from program to program: neither is taken."""
    path = good(tmp_path / "book.xlsx")
    with pytest.warns(UserWarning, match="Duplicate"), zipfile.ZipFile(path, "a") as zipped:
        zipped.writestr(FIRST_SHEET, f'<worksheet xmlns="{MAIN}"/>')
    assert refusal(path) == f"two of its parts are called {FIRST_SHEET}"


def test_parts_that_share_their_bytes_are_refused(tmp_path: Path) -> None:
    """Parts that lie in one another, a way to make a bomb of a small file, are damage."""

    def into_the_next(data: bytearray, at: int) -> None:
        other = data.index(b"PK\1\2")
        struct.pack_into("<L", data, at + 42, struct.unpack_from("<L", data, other + 42)[0])

    assert "is not where its directory says" in refusal(with_directory(tmp_path / "book.xlsx", into_the_next))


def test_files_cut_short_anywhere_are_refused(tmp_path: Path) -> None:
    """Whatever is missing at the end, one line says so."""
    whole = good(tmp_path / "whole.xlsx").read_bytes()
    path = tmp_path / "cut.xlsx"
    for length in range(2, len(whole), len(whole) // 40):
        path.write_bytes(whole[:length])
        assert "damaged" in refusal(path)


def test_spoilt_bytes_never_end_in_a_crash(tmp_path: Path) -> None:
    """Of files with a few wrong bytes each is filled or refused with one line."""
    whole = good(tmp_path / "whole.xlsx").read_bytes()
    path, chance = tmp_path / "spoilt.xlsx", random.Random(3)
    lines: list[str] = []
    for _ in range(150):
        data = bytearray(whole)
        # In the directory a wrong byte does the most.
        for at in chance.choices(
            range(len(data)), [1 if i < whole.index(b"PK\1\2") else 8 for i in range(len(data))], k=3
        ):
            data[at] = chance.randrange(256)
        path.write_bytes(data)
        try:
            fill(path, tmp_path / "out.xlsx", FUNCTIONS)
        except NotFilled as error:
            lines.append(str(error))
    assert len(lines) > 25
    assert "\n" not in "".join(lines)


# --- files that are something else -----------------------------------------------------------------


def other_document(path: Path, kind: str) -> None:
    """A document of another kind, as a text or a presentation program saves it."""
    with zipfile.ZipFile(path, "w") as zipped:
        office = "http://schemas.openxmlformats.org/officeDocument/2006/relationships/officeDocument"
        relation = f'<Relationship Id="r1" Type="{office}" Target="content/main.xml"/>'
        zipped.writestr("_rels/.rels", f'<Relationships xmlns="x">{relation}</Relationships>')
        zipped.writestr("content/main.xml", f'<x:{kind} xmlns:x="y"/>')


@pytest.mark.parametrize(
    ("content", "why"),
    [
        (package.OLD_BINARY + bytes(600), "it is in an older binary format; save it as .xlsx"),
        (package.OLD_BINARY + bytes(600) + package.ENCRYPTED, "it is protected by a password; save it without one"),
        (b"mark,span\nB1,6\n", "it is not a workbook but text; open it in a spreadsheet program and save it as .xlsx"),
        (b"<html><table>", "it is not a workbook but text; open it in a spreadsheet program and save it as .xlsx"),
        (b"", "it is not a workbook but empty"),
        (b"%PDF-1.7\n\0\0", "it is not a workbook or is damaged (no zip file)"),
        (b"PK\5\6" + bytes(18), "it is not a workbook or is damaged (it has no workbook)"),
        ("document", "it is not a workbook but a document"),
        ("presentation", "it is not a workbook but a presentation"),
    ],
)
def test_files_that_are_something_else(tmp_path: Path, content: bytes | str, why: str) -> None:
    """An older binary, a protected, a text, a text document: each is told from a workbook by what is in it."""
    path = tmp_path / "book.xlsx"
    if isinstance(content, str):
        other_document(path, content)
    else:
        path.write_bytes(content)
    assert refusal(path) == why


# --- XML ------------------------------------------------------------------------------------------

LAUGHS = b'<!DOCTYPE x [<!ENTITY a "aaaaaaaaaa">' + b"".join(
    b'<!ENTITY %c "%s">' % (98 + step, b"&%c;" % (97 + step) * 10) for step in range(9)
)
DOCTYPES = {
    "laughs": LAUGHS + b"]>",
    "entity": b'<!DOCTYPE x [<!ENTITY a SYSTEM "file:///etc/hostname">]>',
    "external": b'<!DOCTYPE x SYSTEM "http://127.0.0.1/x.dtd">',
    "behind a comment": b"<!-- -->\n<?a b?> <!DOCTYPE x>",
}


def full(path: Path) -> Path:
    """A workbook with all kinds of parts that are read."""
    import openpyxl

    book = openpyxl.Workbook()
    sheet = book.worksheets[0]
    for row in [["Mark", "Span"], ["B1", 6], ["B2", "=SUM(Beams[Span])"]]:
        sheet.append(row)
    sheet.add_table(Table(displayName="Beams", ref="A1:B2"))
    book.save(path)
    return with_texts(path)


def with_texts(path: Path) -> Path:
    """Give a workbook a part for its texts."""
    kind = "http://schemas.openxmlformats.org/officeDocument/2006/relationships/sharedStrings"
    relation = f'<Relationship Id="texts" Type="{kind}" Target="sharedStrings.xml"/></Relationships>'.encode()
    rewrite(path, "xl/_rels/workbook.xml.rels", lambda xml: xml.replace(b"</Relationships>", relation))
    return rewrite(path, TEXTS, lambda _: f'<sst xmlns="{MAIN}"/>'.encode())


READ = [
    "[Content_Types].xml",
    "_rels/.rels",
    WORKBOOK,
    "xl/_rels/workbook.xml.rels",
    "xl/styles.xml",
    TEXTS,
    FIRST_SHEET,
    "xl/worksheets/_rels/sheet1.xml.rels",
    "xl/tables/table1.xml",
]


@pytest.mark.parametrize("doctype", list(DOCTYPES))
@pytest.mark.parametrize("part", READ)
def test_document_types_are_refused_in_every_part_that_is_read(tmp_path: Path, part: str, doctype: str) -> None:
    """Entities, nested or external, need a document type, and none is accepted: whatever stands before it."""
    path = full(tmp_path / "book.xlsx")
    for encoding in ("utf-8", "utf-16"):

        def declare(xml: bytes, encoding: str = encoding) -> bytes:
            root = xml.partition(b"?>")[2] or xml
            return (DOCTYPES[doctype] + root).decode().encode(encoding)

        hostile = tmp_path / f"{encoding}.xlsx"
        hostile.write_bytes(path.read_bytes())
        rewrite(hostile, part, declare)
        assert (
            refusal(hostile) == f"its part {part} cannot be read: it declares a document type, which no workbook does"
        )


def test_deeply_nested_elements(tmp_path: Path) -> None:
    """A hundred thousand elements in one another are no way to exhaust anything."""
    deep = b"<a>" * 100_000 + b"</a>" * 100_000
    path = good(tmp_path / "book.xlsx")
    for part in (WORKBOOK, FIRST_SHEET):
        hostile = tmp_path / f"{len(part)}.xlsx"
        hostile.write_bytes(path.read_bytes())
        end = b"</workbook>" if part == WORKBOOK else b"</worksheet>"
        rewrite(hostile, part, lambda xml, end=end: xml.replace(end, deep + end))
        assert "depth" in refusal(hostile)


# --- sheets ---------------------------------------------------------------------------------------

FORMULA = '<row r="1"><c r="A1"><f>twice(B1)</f></c><c r="B1"><v>3</v></c></row>'


@pytest.mark.parametrize(
    ("before", "row", "after"),
    [
        ('<dimension ref="A1:XFD1048576"/>', "", ""),
        ("", '<row r="1048576"><c r="C1048576"><v>1</v></c></row>', ""),
        ("", '<row r="9"><c r="XFD9"><v>1</v></c></row>', ""),
        ("", "", '<mergeCells count="1"><mergeCell ref="A2:XFD1048576"/></mergeCells>'),
        ("", '<row r="2"><c r="A2"><f t="shared" si="0" ref="A2:XFD1048576">B1</f></c></row>', ""),
    ],
)
def test_sheets_that_say_they_are_large(tmp_path: Path, before: str, row: str, after: str) -> None:
    """A dimension, a far cell, a merged area or a shared formula as large as the sheet cost nothing."""
    path = from_xml(tmp_path / "book.xlsx", FORMULA + row)
    rewrite(path, FIRST_SHEET, lambda xml: xml.replace(b"<sheetData>", before.encode() + b"<sheetData>"))
    rewrite(path, FIRST_SHEET, lambda xml: xml.replace(b"</sheetData>", b"</sheetData>" + after.encode()))
    assert CliRunner().invoke(cli.app, ["fill", str(path), "--show", "Plan"]).exit_code == 1
    report = fill(path, functions=FUNCTIONS)
    assert report.errors == []
    assert b"twice(B1)</f><v>6</v>" in parts(report.target)[FIRST_SHEET]


@pytest.mark.parametrize(
    ("row", "why"),
    [
        ('<row r="1048576"><c r="XFD1048576"/></row>', "its cells reach to XFD1048576"),
        ('<row r="1048577"><c r="A1048577"/></row>', "beyond the last row"),
        ('<row r="2"><c r="XFE2"/></row>', "beyond the last row or column"),
        ('<row r="99999999999999999999"><c/></row>', "beyond the last row"),
        (f'<row r="{"9" * 5000}"><c/></row>', "limit"),
        ('<row r="2"><c r="$A$2"/></row>', "names no column"),
        ('<row r="2"><c r="A2"><f t="array" ref="A2:XFD1048576">B1</f></c></row>', "more than 1,000,000 cells"),
        ('<row r="2"><c r="A2" cm="1"><f t="array" ref="A2:XFD1048576">B1</f></c></row>', "more than 1,000,000 cells"),
        ('<row r="2"><c r="A2"><f t="array" ref="A2:XFE2">B1</f></c></row>', "lies beyond the last cell"),
        ('<row r="2"><c r="A2"><f>1</f></c><c r="A2"><f>2</f></c></row>', "two of its cells are called A2"),
    ],
)
def test_sheets_that_are_too_large(tmp_path: Path, row: str, why: str) -> None:
    """Cells beyond the last of a sheet, cells too far apart to be added up in time, and endless arrays are refused."""
    line = refusal(from_xml(tmp_path / "book.xlsx", FORMULA + row))
    assert line.startswith("sheet Plan cannot be read: ")
    assert why in line


def test_very_many_arrays_one_beside_the_other(tmp_path: Path) -> None:
    """Arrays that each are allowed may not fill more than the bound in all."""
    rows = "".join(f'<row r="{n}"><c r="A{n}"><f t="array" ref="A{n}:XFD{n}">B1</f></c></row>' for n in range(2, 70))
    line = refusal(from_xml(tmp_path / "book.xlsx", FORMULA + rows))
    assert f"its array formulas fill more than {MOST_IN_ARRAYS:,} cells, A" in line


def test_an_array_that_spills_beyond_measure(tmp_path: Path) -> None:
    """A spilling array of millions of cells is an error in its cell, and in those that use it."""
    rows = (
        '<row r="1"><c r="A1" cm="1"><f t="array" ref="A1">SEQUENCE(1000000,4)</f></c>'
        '<c r="J1"><f>SUM(A1:D9)</f></c><c r="K1"><f>twice(4)</f></c></row>'
    )
    report = fill(from_xml(tmp_path / "book.xlsx", rows), functions=FUNCTIONS)
    assert list(reasons(report)) == ["A1", "J1"]
    assert values(report.target) == {"A1": "#VALUE!", "J1": "#VALUE!", "K1": 8}


def test_arrays_that_spill_beyond_measure_together(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """Of spilling arrays that fill too many cells in all, those beyond the bound are errors and cleared."""
    monkeypatch.setattr(filling, "MOST_IN_ARRAYS", 100)
    cells = "".join(
        f'<c r="{column}1" cm="1"><f t="array" ref="{column}1:{column}2">SEQUENCE(40)</f></c>' for column in "ABC"
    )
    rows = f'<row r="1">{cells}<c r="J1"><f>SUM(A1:A40)</f></c><c r="K1"><f>SUM(C1:C40)</f></c></row>'
    rows += '<row r="2"><c r="B2"><v>7</v></c><c r="C2"><v>7</v></c></row>'
    report = fill(from_xml(tmp_path / "book.xlsx", rows), functions=FUNCTIONS)
    assert reasons(report) == {"C1": filling._TOO_MANY, "K1": "takes #VALUE! from Plan!C1"}
    got = values(report.target)
    assert [got.get(cell) for cell in ("A40", "B40", "C2", "J1", "K1")] == [40, 40, None, 820, "#VALUE!"]
    assert b'<f t="array" ref="C1">' in parts(report.target)[FIRST_SHEET]


# --- formulas and names ---------------------------------------------------------------------------

TOO_LONG = f"the formula is longer than {LONGEST_FORMULA:,} characters"
TOO_DEEP = f"the formula is nested more than {DEEPEST_NESTING} deep"
NOT_READ = "the formula cannot be read"


@pytest.mark.parametrize(
    ("formula", "why"),
    [
        ("1" + "+1" * 100_000, TOO_LONG),
        ("twice(" + "1+" * 100_000 + "1)", TOO_LONG),
        ("(" * 10_000 + "1" + ")" * 10_000, TOO_LONG),
        ("(" * 8_000 + "1" + ")" * 8_000, TOO_DEEP),
        ("ABS(" * 3_000 + "1" + ")" * 3_000, TOO_DEEP),
        ("{" * 8_000 + "1" + "}" * 8_000, TOO_DEEP),
        ("twice(" * 2_000 + "1" + ")" * 2_000, TOO_DEEP),
        ("-" * 10_000 + "1", NOT_READ),
        ("1" + "^1" * 8_000, NOT_READ),
        ("1" + "%" * 10_000, NOT_READ),
        ("A9" + ":A9" * 5_000, NOT_READ),
        ("twice(" + ".a" * 8_000, NOT_READ),
        ("twice(" + "_xlfn." * 2_700, NOT_READ),
        ("twice(" + "[" * 16_000, NOT_READ),
        ("twice(" + '"' * 15_001, NOT_READ),
        ("twice(" + "'" * 15_001, NOT_READ),
        ("SUMIF(" * 2_700, TOO_DEEP),
    ],
)
def test_formulas_that_no_one_wrote(tmp_path: Path, formula: str, why: str) -> None:
    """A formula of endless length or depth is an error in its cell, with its reason; the rest is filled."""
    path = build(tmp_path / "book.xlsx", {"A1": f"={formula}", "A2": "=A1+1", "A3": "=twice(4)"})
    report = fill(path, functions=FUNCTIONS)
    assert reasons(report) == {"A1": why, "A2": reasons(report)["A2"]}
    assert values(report.target) == {"A1": "#VALUE!", "A2": "#VALUE!", "A3": 8}


def test_a_shared_formula_that_no_one_wrote(tmp_path: Path) -> None:
    """All cells that share it are in error for the same reason."""
    deep = "(" * 5_000 + "1" + ")" * 5_000
    shared = '<c r="B1"><f t="shared" si="0"/></c><c r="C1"><f>1+1</f></c>'
    path = from_xml(
        tmp_path / "book.xlsx", f'<row r="1"><c r="A1"><f t="shared" si="0" ref="A1:B1">{deep}</f></c>{shared}</row>'
    )
    report = fill(path, functions=FUNCTIONS)
    assert reasons(report) == {"A1": TOO_DEEP, "B1": TOO_DEEP}
    assert values(report.target)["C1"] == 2


def test_deep_but_possible_formulas_are_evaluated(tmp_path: Path) -> None:
    """Sixty functions in one another, and two hundred terms, have their value."""
    cells = {"A1": "=" + "ABS(" * 60 + "-5" + ")" * 60, "A2": "=1" + "+1" * 200, "A3": "=twice(" * 1 + "((((4)))))"}
    report = fill(build(tmp_path / "book.xlsx", cells), functions=FUNCTIONS)
    assert report.errors == []
    assert values(report.target) == {"A1": 5, "A2": 201, "A3": 8}


@pytest.mark.parametrize("call", ["", "+twice(0)"])
@pytest.mark.parametrize(
    "names",
    [
        {"N_0": "N_0+1"},
        {"N_0": "N_1+1", "N_1": "N_0+1"},
        {"N_0": "(" * 10_000 + "1" + ")" * 10_000},
        {"N_0": "1" + "+1" * 100_000},
        {f"N_{i}": f"N_{i + 1}+N_{i + 1}" for i in range(60)} | {"N_60": "1"},
        {f"N_{i}": f"N_{i + 1}+1" for i in range(3_000)} | {"N_3000": "1"},
        {f"N_{i}": "+".join(f"N_{j}" for j in range(30) if j != i) for i in range(30)},
    ],
)
def test_names_that_lead_nowhere(tmp_path: Path, names: dict[str, str], call: str) -> None:
    """Names that stand for themselves, for endless formulas or for ever more names: a value or an error, and an end."""
    cells = {"A1": "=twice(N_0)", "A2": "=N_0*2", "A3": "=twice(4)"}
    report = fill(
        build(tmp_path / "book.xlsx", cells, {name: text + call for name, text in names.items()}), functions=FUNCTIONS
    )
    got = values(report.target)
    assert got["A3"] == 8
    for cell in ("A1", "A2"):
        if cell in reasons(report):
            assert str(got[cell]).startswith("#")
        else:
            assert got[cell] == 2 * {60: 2.0**60, 3000: 3001}[len(names) - 1]


# --- nothing is followed --------------------------------------------------------------------------


@pytest.mark.skipif(not hasattr(os, "mkfifo"), reason="NOT RUN: this system has no pipes with names")
def test_no_external_link_is_followed(tmp_path: Path) -> None:
    """Links to a file and to the web are never opened: the pipe would block for ever, the server sees no one."""
    pipe = tmp_path / "prices.xlsx"
    os.mkfifo(pipe)
    with socket.create_server(("127.0.0.1", 0)) as server:
        server.setblocking(False)
        web = f"http://127.0.0.1:{server.getsockname()[1]}"
        cells = {
            "A1": "=[1]Prices!A1",
            "A2": f"='{tmp_path}/[prices.xlsx]Prices'!A1",
            "A3": f'=WEBSERVICE("{web}/a")',
            "A4": f'=HYPERLINK("{web}/b","there")',
            "A5": f"='{web}/[c.xlsx]Prices'!A1",
            "A6": "=twice([2]Prices!A1)",
            "A7": "=twice(4)",
        }
        path = build(tmp_path / "book.xlsx", cells)
        office = "http://schemas.openxmlformats.org/officeDocument/2006/relationships"
        for number, target in ((1, pipe.as_uri()), (2, f"{web}/d.xlsx")):
            link = f'<Relationship Id="rId1" Type="{office}/externalLinkPath" Target="{target}" TargetMode="External"/>'
            rels = f'<Relationships xmlns="http://schemas.openxmlformats.org/package/2006/relationships">{link}'
            book = f'<externalLink xmlns="{MAIN}"><externalBook xmlns:r="{office}" r:id="rId1"/></externalLink>'
            related = (
                f'<Relationship Id="ext{number}" Type="{office}/externalLink" Target="externalLinks/{number}.xml"/>'
            )
            named = f'<externalReference r:id="ext{number}" xmlns:r="{office}"/>'
            for part, change in {
                f"xl/externalLinks/{number}.xml": lambda _, book=book: book.encode(),
                f"xl/externalLinks/_rels/{number}.xml.rels": lambda _, rels=rels: f"{rels}</Relationships>".encode(),
                "xl/_rels/workbook.xml.rels": lambda xml, one=related: xml.replace(
                    b"</Relationships>", f"{one}</Relationships>".encode()
                ),
                WORKBOOK: lambda xml, one=named: xml.replace(
                    b"</sheets>", f"</sheets><externalReferences>{one}</externalReferences>".encode()
                ),
            }.items():
                rewrite(path, part, change)
        report = fill(path, functions=FUNCTIONS)
        with pytest.raises(BlockingIOError):
            server.accept()
    assert values(report.target)["A7"] == 8
    assert set(reasons(report)) >= {"A1", "A2", "A3", "A5", "A6"}
    link = "xl/externalLinks/1.xml"
    assert parts(report.target)[link] == parts(path)[link]


@pytest.mark.parametrize("text", ["=1+1", "+1", "-1", "@A1", "=cmd|' /C calc'!A0", "\t=1", "'=1"])
def test_texts_that_look_like_formulas_stay_texts(tmp_path: Path, text: str) -> None:
    """A text result is stored as text, in a single cell and in an array, whatever it begins with."""
    rows = '<row r="1"><c r="A1"><f>say()</f></c><c r="B1"><f t="array" ref="B1:C1">both()</f></c></row>'
    functions: dict[str, Callable[..., object]] = {"say": lambda: text, "both": lambda: [[text, text]]}
    report = fill(from_xml(tmp_path / "book.xlsx", rows), functions=functions)
    assert [values(report.target)[cell] for cell in ("A1", "B1", "C1")] == [text] * 3
    sheet = parts(report.target)[FIRST_SHEET]
    assert sheet.count(b"<f") == 2
    assert sheet.count(b't="str"') == 3


# --- memory ---------------------------------------------------------------------------------------


def test_memory_is_bounded(tmp_path: Path) -> None:
    """With half a gigabyte more than the program itself takes, none of these files exhausts the memory."""
    resource = pytest.importorskip("resource", reason="NOT RUN: this system bounds no process")
    rows = "".join(f'<row r="{n}"><c r="A{n}"><f t="array" ref="A{n}:XFD{n}">B1</f></c></row>' for n in range(2, 70))
    hostile = [
        bomb(tmp_path / "1.xlsx", size=480),
        rewrite(with_texts(good(tmp_path / "2.xlsx")), TEXTS, lambda _: bytes(100 << 20)),
        rewrite(good(tmp_path / "3.xlsx"), WORKBOOK, lambda xml: LAUGHS + b"]>" + xml),
        from_xml(tmp_path / "4.xlsx", '<row r="1048576"><c r="XFD1048576"><f>SUM(A1:XFD1048575)</f></c></row>'),
        from_xml(tmp_path / "5.xlsx", '<row r="1"><c r="A1"><f t="array" ref="A1:XFD1048576">B1</f></c></row>'),
        from_xml(tmp_path / "6.xlsx", rows),
        with_directory(
            tmp_path / "9.xlsx",
            lambda data, at: struct.pack_into("<L", data, at + 24, 1000),
            lambda path: bomb(path, size=480),
        ),
        with_directory(tmp_path / "7.xlsx", lambda data, at: struct.pack_into("<L", data, at + 24, 500 << 20)),
        with_directory(
            tmp_path / "8.xlsx", lambda data, at: struct.pack_into("<2L", data, at + 20, 4 << 20, 500 << 20)
        ),
    ]
    fill(good(tmp_path / "good.xlsx"), functions=FUNCTIONS)
    child = os.fork()
    if child == 0:  # pragma: no cover
        status = 99
        try:
            taken = int(Path("/proc/self/statm").read_text().split()[0]) * os.sysconf("SC_PAGE_SIZE")
            resource.setrlimit(resource.RLIMIT_AS, (taken + GIB // 2,) * 2)
            for path in hostile:
                with pytest.raises(NotFilled):
                    fill(path, functions=FUNCTIONS)
            status = 0
        finally:
            os._exit(status)
    assert os.waitstatus_to_exitcode(os.waitpid(child, 0)[1]) == 0
