"""What the extension does to formulas and files, without an office: entering anew, plain names, frozen values."""

from __future__ import annotations

import os
import re
import stat
import struct
import zipfile
from pathlib import Path
from typing import Any

import openpyxl
import pytest
from typer.testing import CliRunner

from beamfuncs.catalogue import catalogue
from beamfuncs.cli import app
from beamfuncs.hosts.calc import freezing, naming, packing, rewriting
from beamfuncs.hosts.calc.component import answers, entering, errors, saving
from beamfuncs.hosts.calc.component.beamfuncs_client.messages import Failed
from beamfuncs.hosts.calc.component.formulas import calls_to

LONG = {naming.long_name(name): name for name in catalogue()}
CALLS = calls_to(catalogue())
PREFIX = "BEAMFUNCS.CALC.FUNCTIONS."


class Answering:
    """Stands in for the client of the function server: a result, or an error to raise."""

    def __init__(self, answer: Any) -> None:
        self.answer = answer

    def call(self, name: str, arguments: object) -> Any:
        """The answer, whatever is asked."""
        if isinstance(self.answer, Exception):
            raise self.answer
        return self.answer


@pytest.mark.parametrize("value", errors.CODES)
def test_an_error_is_a_number_with_its_code(value: str) -> None:
    """Whole or in an array, an error value is a number that is none, in whose bits the office finds the error."""
    alone = answers.cell(Answering(Failed(value, "why")), "reaction", [])
    ((first, second),) = answers.rows(Answering([[1.5, Failed(value, "why")]]), "reaction", [])
    assert first == 1.5
    for number in (alone, second):
        assert number != number
        assert _code(float(number)) == errors.CODES[value]


def _code(number: float) -> int:
    return int(struct.unpack("<Q", struct.pack("<d", number))[0]) & 0xFFFFFFFF


def test_an_error_that_the_office_lacks() -> None:
    """An error value that only newer programs know is `#VALUE!`; so is a failure of the extension itself."""
    for answer in (Failed("#SPILL!", "why"), RuntimeError("broken")):
        assert _code(float(answers.cell(Answering(answer), "reaction", []))) == errors.CODES["#VALUE!"]


def test_numbers_and_texts() -> None:
    """A number is a float, a text is itself, an array is rows, and one number where rows are due is one row."""
    assert answers.cell(Answering(""), "fault", []) == ""
    assert answers.rows(Answering(2.0), "moment_at", []) == ((2.0,),)
    assert answers.rows(Answering([[1.0, 2.0], [3.0, 4.0]]), "moment_at", []) == ((1.0, 2.0), (3.0, 4.0))


@pytest.mark.parametrize("rows", [1, 2, 3, 10, 1000, 10_000])
def test_pieces(rows: int) -> None:
    """The pieces of a run hold every row once, in numbers that grow as its square root, and are first entered apart."""
    found = list(entering.pieces(rows))
    assert sorted(row for first, stop in found for row in range(first, stop)) == list(range(rows))
    assert len(found) <= 2 * rows**0.5 + 4
    entered: set[int] = set()
    largest = int(rows**0.5)
    for first, stop in found:
        if stop - first > 1:
            assert not {first - 1, stop} & entered
            assert stop - first < largest
        entered.update(range(first, stop))


def test_runs_end_at_other_formulas() -> None:
    """Only cells that call a function are entered anew; arrays are left to be entered as arrays."""
    column = ["=reaction(1)", "=1+1", "=1+MOMENT_MAX (A1)", "{=reaction(1)}", "=reaction(2)", f"={PREFIX}REACTION(1)"]
    assert list(entering.runs([[one] for one in column], CALLS)) == [(0, 0, 0), (0, 2, 2), (0, 4, 4)]


# --- names in a file ------------------------------------------------------------------------------------


def as_calc_writes(path: Path) -> Path:
    """A workbook with long names in a cell, an array, a text, a condition, a name; and the macros that Calc lists."""
    book = openpyxl.Workbook()
    sheet = book.worksheets[0]
    sheet["A1"] = f'={PREFIX}MOMENTAT("fixed 8 pinned","udl 12",{PREFIX}REACTION(B1,B2,1))'
    sheet["A2"] = f"{PREFIX}REACTION(1)"
    sheet["A3"] = "=1+1"
    book.save(path)
    with zipfile.ZipFile(path) as archive:
        parts = {name: archive.read(name) for name in archive.namelist()}
    macro = b'<definedName function="true" name="beamfuncs.calc.Functions.momentAt" vbProcedure="true"></definedName>'
    kept = f'<definedName name="Far">{PREFIX}REACTION(Sheet!$B$1,Sheet!$B$2,1)</definedName>'.encode()
    names = b"<definedNames>" + kept + macro + b"</definedNames>"
    parts["xl/workbook.xml"] = re.sub(rb"<definedNames\s*/>|(?=<calcPr)", names, parts["xl/workbook.xml"], count=1)
    condition = (
        "<conditionalFormatting sqref='A1'><cfRule type='expression' priority='1'>"
        f"<formula>{PREFIX}REACTION(B1,B2,1)&gt;5</formula></cfRule></conditionalFormatting>"
    ).encode()
    sheet_name = "xl/worksheets/sheet1.xml"
    parts[sheet_name] = parts[sheet_name].replace(b"</sheetData>", b"</sheetData>" + condition)
    with zipfile.ZipFile(path, "w", zipfile.ZIP_DEFLATED) as archive:
        for name, content in parts.items():
            archive.writestr(name, content)
    return path


def contents(path: Path) -> dict[str, bytes]:
    """The parts of a workbook."""
    with zipfile.ZipFile(path) as archive:
        assert archive.testzip() is None
        return {name: archive.read(name) for name in archive.namelist()}


@pytest.mark.parametrize("through", ["the extension", "the command"])
def test_plain_names(tmp_path: Path, through: str) -> None:
    """Long names in formulas become plain, the macros go, and nothing else changes: texts, order, mode, and time."""
    path = as_calc_writes(tmp_path / "saved.xlsx")
    path.chmod(0o640)
    os.utime(path, ns=(1_700_000_000_123_456_789, 1_700_000_000_123_456_789))
    before, stood = contents(path), path.stat()
    done = saving.put_plain_names(str(path), LONG) if through == "the extension" else rewriting.plain(path)
    assert done
    after = contents(path)
    assert list(after) == list(before)
    assert [name for name in before if before[name] != after[name]] == ["xl/worksheets/sheet1.xml", "xl/workbook.xml"]
    sheet, workbook = after["xl/worksheets/sheet1.xml"].decode(), after["xl/workbook.xml"].decode()
    assert '<f>moment_at("fixed 8 pinned","udl 12",reaction(B1,B2,1))</f>' in sheet
    assert "<formula>reaction(B1,B2,1)&gt;5</formula>" in sheet
    assert '<definedName name="Far">reaction(Sheet!$B$1,Sheet!$B$2,1)</definedName></definedNames>' in workbook
    assert openpyxl.load_workbook(path).worksheets[0]["A2"].value == f"{PREFIX}REACTION(1)"
    assert stat.S_IMODE(path.stat().st_mode) == 0o640
    if through == "the extension":
        assert path.stat().st_mtime_ns == stood.st_mtime_ns
    assert os.listdir(tmp_path) == ["saved.xlsx"]


def test_a_file_with_plain_names_is_left(tmp_path: Path) -> None:
    """A file without long names keeps every byte; so does one that is no zip file, as one with a password is not."""
    path = tmp_path / "plain.xlsx"
    book = openpyxl.Workbook()
    book.worksheets[0]["A1"] = "=reaction(1)"
    book.save(path)
    content, secret = path.read_bytes(), tmp_path / "secret.xlsx"
    secret.write_bytes(b"\xd0\xcf\x11\xe0")
    assert not saving.put_plain_names(str(path), LONG)
    assert not saving.put_plain_names(str(secret), LONG)
    assert path.read_bytes() == content
    with pytest.raises(rewriting.NotRewritten, match="damaged"):
        rewriting.plain(secret)


@pytest.mark.parametrize("fails", ["fsync", "replace"])
def test_a_file_is_whole_or_as_it_was(tmp_path: Path, monkeypatch: pytest.MonkeyPatch, fails: str) -> None:
    """Where the disk is full or the file is held, it keeps its bytes, and nothing is left beside it."""
    path = as_calc_writes(tmp_path / "saved.xlsx")
    content = path.read_bytes()

    def failing(*_: object) -> None:
        raise OSError("no room")

    monkeypatch.setattr(saving.os, fails, failing)
    with pytest.raises(OSError, match="no room"):
        saving.put_plain_names(str(path), LONG)
    assert path.read_bytes() == content
    assert os.listdir(tmp_path) == ["saved.xlsx"]


def test_nobody_else_reads_it_meanwhile(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """While a file that is the user's alone is written anew, what is beside it is the user's alone too."""
    path = as_calc_writes(tmp_path / "saved.xlsx")
    path.chmod(0o600)
    modes: set[int] = set()
    monkeypatch.setattr(
        saving.os, "fsync", lambda _: modes.update(stat.S_IMODE(one.stat().st_mode) for one in tmp_path.iterdir())
    )
    assert saving.put_plain_names(str(path), LONG)
    assert modes == {0o600}


def test_the_command_refuses_what_is_open(tmp_path: Path) -> None:
    """A workbook that is open in an office, or is none of the Excel kind, is not rewritten."""
    path = as_calc_writes(tmp_path / "saved.xlsx")
    (tmp_path / ".~lock.saved.xlsx#").touch()
    with pytest.raises(rewriting.NotRewritten, match="open in a spreadsheet program"):
        rewriting.plain(path)
    with zipfile.ZipFile(tmp_path / "other.xlsx", "w") as archive:
        archive.writestr("content.xml", "")
    with pytest.raises(rewriting.NotRewritten, match="no workbook of the Excel kind"):
        rewriting.plain(tmp_path / "other.xlsx")


# --- values in the place of formulas --------------------------------------------------------------------


def test_frozen_cells() -> None:
    """A cell that calls a function keeps its value and notes its formula; an error stays one; other cells keep all."""
    value = 'office:value-type="float" office:value="60"'
    call = f"of:={PREFIX}REACTION([.A1];&quot;udl 12&quot;;1)"
    error = 'office:value-type="string" office:string-value="" calcext:value-type="error"'
    other = f'<table:table-cell table:formula="of:=[.A1]*2" {value}><text:p>60</text:p></table:table-cell>'
    array = 'table:number-matrix-columns-spanned="1" table:number-matrix-rows-spanned="3"'
    noted = "<office:annotation><text:p>mine</text:p></office:annotation>"
    content = (
        f'<table:table-cell table:formula="{call}" {value}><text:p>60</text:p></table:table-cell>{other}'
        f'<table:table-cell {array} table:formula="{call}" {error}><text:p>#N/A</text:p></table:table-cell>'
        f'<table:table-cell table:formula="of:=reaction(1)" {error}><text:p>Err:504</text:p></table:table-cell>'
        f'<table:table-cell table:formula="{call}" {value}>{noted}<text:p>60</text:p></table:table-cell>'
        f'<table:table-cell table:formula="of:={PREFIX}FAULT([.A1])"/>'
    )
    note = '<office:annotation><text:p>beamfuncs computed this value from =reaction([.A1];"udl 12";1)</text:p>'
    frozen, count = freezing.frozen(content.encode())
    assert count == 5
    assert frozen.decode() == (
        f"<table:table-cell {value}>{note}</office:annotation><text:p>60</text:p></table:table-cell>{other}"
        f'<table:table-cell table:formula="of:=#N/A" {error}>{note}</office:annotation><text:p>#N/A</text:p>'
        "</table:table-cell>"
        f'<table:table-cell table:formula="of:=#VALUE!" {error}>{note.partition("=")[0]}=reaction(1)</text:p>'
        "</office:annotation><text:p>Err:504</text:p></table:table-cell>"
        f"<table:table-cell {value}>{noted}<text:p>60</text:p></table:table-cell>"
        f"<table:table-cell>{note.partition('=')[0]}=fault([.A1])</text:p></office:annotation></table:table-cell>"
    )


def test_frozen_arrays() -> None:
    """Each error of an array that gives way stays one, so that SUM passes it on; those of another array are its own."""
    error = '<table:table-cell office:value-type="string" calcext:value-type="error"'
    size = 'table:number-matrix-columns-spanned="1" table:number-matrix-rows-spanned="3"'
    ours, theirs = (
        f'<table:table-cell {size} table:formula="of:={f}" office:value="1"/>' for f in ("shear(1)", "[.Z1]")
    )
    ours = ours.replace("shear(1)", f"{PREFIX}MOMENTAT(1)")
    shown = "><text:p>#N/A</text:p></table:table-cell>"
    blank = '<table:table-cell table:number-columns-repeated="2"/>'
    below = f"<table:table-row>{blank}{error}{shown}{error}{shown}</table:table-row>"
    content = (
        f'<table:table table:name="S"><table:table-row>{blank}{ours}{theirs}</table:table-row>{below}{below}{below}'
    )
    frozen, count = freezing.frozen(content.encode())
    assert count == 1
    kept = error.replace("<table:table-cell", '<table:table-cell table:formula="of:=#N/A"') + shown
    changed = f"<table:table-row>{blank}{kept}{error}{shown}</table:table-row>"
    assert frozen.decode().endswith(f"{theirs}</table:table-row>{changed}{changed}{below}")


def test_frozen_by_way_of_names() -> None:
    """A cell that calls a function by way of a formula with a name holds its value alone, like one that calls it."""
    names = "".join(
        f'<table:named-expression table:name="{name}" table:expression="{formula}"/>'
        for name, formula in {"Twice": "2*Far", "Far": f"{PREFIX}REACTION([$S.$A$1])", "Other": "2*[$S.$A$1]"}.items()
    )
    cells = [
        f'<table:table-cell table:formula="of:={one}" office:value="1"><text:p>1</text:p>'
        for one in ("Twice+1", "FAR", "Other", "Farther", "&quot;Far&quot;")
    ]
    frozen, count = freezing.frozen(("".join(cells) + names).encode())
    assert count == 2
    assert frozen.decode().endswith("".join(cells[2:]) + names)
    assert b"from =Twice+1<" in frozen


# --- the commands ---------------------------------------------------------------------------------------


def test_the_commands(tmp_path: Path) -> None:
    """`plain`, `freeze` and `build` tell what they wrote, and in one line why they wrote nothing."""
    saved, ods, extension = tmp_path / "saved.xlsx", tmp_path / "saved.ods", tmp_path / "beamfuncs.oxt"
    as_calc_writes(saved)
    with zipfile.ZipFile(ods, "w") as archive:
        archive.writestr("content.xml", '<table:table-cell table:formula="of:=reaction(1)" office:value="60"/>')
    assert run("plain", saved) == (0, f"{saved}: plain names\n")
    assert run("plain", saved) == (0, f"{saved}: nothing to do\n")
    assert run("plain", ods) == (2, f"beamfuncs: {ods}: no workbook of the Excel kind\n")
    frozen = tmp_path / "saved.frozen.ods"
    assert run("freeze", ods) == (0, f"{frozen}: 1 beam formula frozen\n")
    assert b"table:formula" not in contents(frozen)["content.xml"]
    assert run("freeze", ods, "-o", ods) == (2, f"beamfuncs: {ods}: is the workbook itself\n")
    assert run("freeze", saved)[0] == 2
    assert run("build", "-o", extension) == (0, f"{extension}: written\n")
    assert extension.read_bytes() == packing.packed()
    assert run("build", "-o", tmp_path / "nowhere" / "beamfuncs.oxt")[0] == 2


def test_workbooks_that_the_other_commands_do_not_take(tmp_path: Path) -> None:
    """One line says what to do with a workbook that has the office's long names, with an .ods, and with no file."""
    saved, ods, missing = as_calc_writes(tmp_path / "saved.xlsx"), tmp_path / "saved.ods", tmp_path / "missing.xlsx"
    with zipfile.ZipFile(ods, "w") as archive:
        archive.writestr("mimetype", "application/vnd.oasis.opendocument.spreadsheet")
    long = f"it has Calc's long function names: run `beamfuncs calc plain {saved}` first"
    for book, why in (saved, long), (ods, "it is an .ods: save it as .xlsx, or use `beamfuncs calc freeze`"):
        for command, told in ("fill", f"beamfuncs: {book}: {why}"), ("check", f"{book}: cannot be read: {why}"):
            result = CliRunner().invoke(app, [command, str(book)])
            assert (result.exit_code, result.output) == (2, told + "\n")
    assert sorted(tmp_path.iterdir()) == [ods, saved]
    assert run("plain", missing) == (2, f"beamfuncs: {missing}: there is no such file\n")
    assert run("freeze", missing) == (2, f"beamfuncs: {missing}: there is no such file\n")


def run(*words: object) -> tuple[int, str]:
    """The exit status and the words of a command of `beamfuncs calc`."""
    result = CliRunner().invoke(app, ["calc", *map(str, words)])
    return result.exit_code, result.output
