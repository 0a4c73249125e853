"""Workbooks that go to and fro between Calc and Excel's file format, and to a colleague who lacks the extension."""

from __future__ import annotations

import os
import re
import shutil
import zipfile
from collections.abc import Iterator
from pathlib import Path

import openpyxl
import pytest
from calc_office import ODS, XLSX, CalcOffice, running
from openpyxl.styles import Font
from openpyxl.workbook.defined_name import DefinedName
from openpyxl.worksheet.formula import ArrayFormula
from openpyxl.worksheet.worksheet import Worksheet
from test_calc_functions import seen
from unfilled import Value, stored, without_values

from beamfuncs.hosts.calc import rewriting
from beamfuncs.hosts.headless.filling import fill

KESTREL_QUAY = Path(__file__).parent.parent / "workbooks" / "kestrel_quay.xlsx"
CHANGED = "Schedule", "C9"
BEAM, LOADS = "fixed 8 pinned", "udl 12"
SHOWN = {
    "A3": 60.0,
    "A4": 120.0,
    "A5": "#N/A",
    "A6": 8.0,
    "A7": BEAM,
    "A8": 'reaction(A1,"udl",1)',
    "A9": "reaction(1)",
    "A10": 36.0,
    "C1": -42.0,
    "C2": 30.0,
    "C3": "#VALUE!",
}
"""What the cells of `schedule` show."""
SHOWN_BESIDE_UNKNOWN = {**SHOWN, "A10": "#NAME?"}
"""What they show in a workbook with functions that Calc does not know: formulas that have a name are left."""


@pytest.fixture(scope="module")
def folder(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A folder for the profile and the server of the office."""
    return tmp_path_factory.mktemp("calc")


@pytest.fixture(scope="module")
def calc(folder: Path) -> Iterator[CalcOffice]:
    """An office with the extension."""
    with running(folder / "profile", folder / "server") as office:
        yield office


@pytest.fixture(scope="module")
def colleague(folder: Path) -> Iterator[CalcOffice]:
    """An office without the extension."""
    with running(folder / "other", folder / "none", extension=False) as office:
        yield office


def schedule(path: Path, unknown: bool = False) -> Path:
    """A workbook with plain names, as another program writes it, perhaps with a function that Calc does not know.

    `F1` holds that one, and its stored value 77; `A3` and `A4` store 5, which they are not.
    """
    book = openpyxl.Workbook()
    sheet = book.worksheets[0]
    sheet["A1"], sheet["B1"] = BEAM, LOADS
    sheet["E1"], sheet["E2"], sheet["E3"] = 1, 3, "three"
    sheet["A3"] = "=reaction(A1,B1,1)"
    sheet["A4"] = "=A3*2"
    sheet["A5"] = "=reaction(A1,B1,9)"
    sheet["A6"] = "=LEN(B1)+2"
    sheet["A7"] = "=BEAM_LINE(A1)"
    sheet["A8"] = """="reaction(A1,""udl"",1)\""""
    sheet["A9"] = "reaction(1)"
    sheet["A10"] = "=Far"
    sheet["C1"] = ArrayFormula("C1:C3", "=moment_at(A1,B1,E1:E3)")
    sheet["A3"].number_format, sheet["A3"].font = '0.0" kN"', Font(bold=True)
    book.defined_names["Far"] = DefinedName("Far", attr_text="reaction(Sheet!$A$1,Sheet!$B$1,2)")
    if unknown:
        sheet["F1"] = "=_xlfn.NEWER(A1,{})"
    book.save(path)
    store(path, {"A3": 5, "A4": 5, "F1": 77})
    return path


def store(path: Path, values: dict[str, float]) -> None:
    """Store values beside formulas of a workbook's first sheet, where there are such."""
    with zipfile.ZipFile(path) as archive:
        parts = {name: archive.read(name) for name in archive.namelist()}
    xml = parts["xl/worksheets/sheet1.xml"].decode()
    for place, value in values.items():
        xml = re.sub(rf'(<c r="{place}"[^>]*><f[^>]*>[^<]*</f>)<v(?: ?/>|></v>)', rf"\g<1><v>{value}</v>", xml)
    parts["xl/worksheets/sheet1.xml"] = xml.encode()
    with zipfile.ZipFile(path, "w", zipfile.ZIP_DEFLATED) as archive:
        for name, content in parts.items():
            archive.writestr(name, content)


ARRAYS = {
    "C3:C11": "@moment_at(B1,C1,B3:B11)",
    "E3:E11": "B3:B11*10",
    "F3:G4": "MMULT({1,0;0,1},{1,2;3,4})",
    "F5:I6": "@reactions(B1,C1)",
    "F8:G9": "TRANSPOSE(B3:C4)",
    "H7:H11": 'B3:B7&" m"',
    "K3:K11": "@moment_at(B1,C1,B3:B11)",
}
"""The array formulas of `crossed`, ours, behind an `@`, and the office's own."""
OTHER_BEAM = "fixed 10 pinned"


def crossed(sheets: list[Worksheet], link: str = "") -> None:
    """Fill sheets with arrays in whose rows stand calls of ours, before, between and behind them."""
    for sheet in sheets:
        sheet["B1"], sheet["C1"] = BEAM, LOADS
        for row in range(3, 12):
            sheet[f"B{row}"] = row - 3
            for column in "ADJ":
                sheet[f"{column}{row}"] = f"={link}shear_at($B$1,$C$1,B{row})"
            sheet[f"L{row}"] = f"=C{row}+E{row}"
        sheet["M5"] = sheet["M9"] = f"={link}moment_max(B1,C1)"
        sheet["K13"], sheet["L13"] = "=SUM(C3:C11)", "=SUM(E3:G11)"
        for place, formula in ARRAYS.items():
            sheet[place.split(":")[0]] = ArrayFormula(place, f"={formula.replace('@', link)}")


def crossed_shows(length: float) -> dict[str, list[list[object]]]:
    """What the formulas of `crossed` show for a beam `fixed length pinned`, by statics and Bernoulli's beam."""
    near, far, fixing = 7.5 * length, 4.5 * length, -1.5 * length**2
    shear = [[near - 12 * x] for x in range(9)]
    moment = [fixing + near * x - 6 * x * x for x in range(9)]
    greatest = [[27 / 32 * length**2]]
    in_rows = {f"{column}3:{column}11": shear for column in "ADJ"}
    in_rows |= {f"{column}3:{column}11": [[one] for one in moment] for column in "CK"}
    return {
        **in_rows,
        "E3:E11": [[10.0 * x] for x in range(9)],
        "F3:G4": [[1.0, 2.0], [3.0, 4.0]],
        "F5:I6": [[1.0, 0.0, near, fixing], [2.0, length, far, 0.0]],
        "F8:G9": [[0.0, 1.0], moment[:2]],
        "H7:H11": [[f"{x} m"] for x in range(5)],
        "L3:L11": [[one + 10.0 * x] for x, one in enumerate(moment)],
        "M5": greatest,
        "M9": greatest,
        "K13:L13": [[sum(moment), 360.0 + 10.0 + 3.0 + length + 1.0 + sum(moment[:2])]],
    }


def other_beam(path: Path) -> None:
    """Change the beam of a workbook in its file, all stored values left as they are."""
    with zipfile.ZipFile(path) as archive:
        parts = {name: archive.read(name).replace(BEAM.encode(), OTHER_BEAM.encode()) for name in archive.namelist()}
    with zipfile.ZipFile(path, "w", zipfile.ZIP_DEFLATED) as archive:
        for name, content in parts.items():
            archive.writestr(name, content)


def check_crossed(calc: CalcOffice, path: Path, length: float, sheets: int = 1) -> None:
    """Open a workbook of `crossed`: every cell shows what it must, and does so when its beam is another."""
    book = calc.open(path)
    for beam, length_now in ((None, length), ("fixed 12 pinned", 12.0)):
        for sheet in range(sheets):
            if beam:
                calc.enter(book, {"B1": beam}, sheet)
                calc.calculate(book)
            for place, expected in crossed_shows(length_now).items():
                assert calc.read(book, place, sheet) == expected, (place, sheet, beam)
    calc.close(book)


def shown(calc: CalcOffice, book: int) -> dict[str, object]:
    """What the cells of `schedule` show in Calc."""
    return {place: seen(calc.read(book, place))[0][0] for place in SHOWN}


def in_file(path: Path) -> dict[str, str]:
    """The formulas of a workbook's first sheet as they stand in its file."""
    with zipfile.ZipFile(path) as archive:
        xml = archive.read("xl/worksheets/sheet1.xml").decode()
    return dict(re.findall(r'<c r="(\w+)"[^>]*><f[^>]*>([^<]*)</f>', xml))


@pytest.mark.parametrize("unknown", [False, True])
def test_a_workbook_of_another_program_is_live(calc: CalcOffice, tmp_path: Path, unknown: bool) -> None:
    """Plain names are the functions as soon as the workbook is open; it is unchanged by that, with nothing to undo."""
    book = calc.open(schedule(tmp_path / "plain.xlsx", unknown))
    assert shown(calc, book) == (SHOWN_BESIDE_UNKNOWN if unknown else SHOWN)
    assert calc.read(book, "F1") == [[77.0 if unknown else None]]
    assert not calc.is_modified(book)
    assert calc.undone(book) == []
    assert calc.named(book) == ["Far"]
    calc.enter(book, {"A1": "fixed 4 pinned"})
    assert calc.read(book, "A3:A4") == [[30.0], [60.0]]
    if not unknown:
        assert calc.read(book, "A10") == [[18.0]]
    assert calc.read(book, "C1:C2") == [[0.0], [12.0]]
    calc.close(book)


@pytest.mark.parametrize("formula", ["=Missing*2", "=Absent!A1", "=New"])
def test_unknown_names_keep_what_is_stored(
    calc: CalcOffice, colleague: CalcOffice, tmp_path: Path, formula: str
) -> None:
    """A cell with a name or sheet that Calc does not know, or a name for what it does not, shows its stored value."""
    path = schedule(tmp_path / "plain.xlsx", True)
    book = openpyxl.load_workbook(path)
    book.worksheets[0]["F1"] = formula
    book.defined_names["New"] = DefinedName("New", attr_text="_xlfn.NEWER(Sheet!$A$1)")
    book.save(path)
    store(path, {"F1": 77})
    copy = Path(shutil.copy(path, tmp_path / "copy.xlsx"))
    for office, opened in ((colleague, colleague.open(copy)), (calc, calc.open(path))):
        assert office.read(opened, "F1") == [[77.0]]
        if office is calc:
            assert calc.read(opened, "A3") == [[60.0]]
        office.close(opened)


def test_other_cells_are_not_touched(calc: CalcOffice, colleague: CalcOffice, tmp_path: Path) -> None:
    """Formulas of other kinds, texts, formats and fonts are the same as in an office without the extension."""
    book = calc.open(schedule(tmp_path / "plain.xlsx"))
    other = colleague.open(schedule(tmp_path / "copy.xlsx"))
    for place in ("A1", "A4", "A6", "A8", "A9", "A10"):
        assert calc.formulas(book, place) == colleague.formulas(other, place)
    for place in SHOWN:
        for name in ("CharWeight", "CellBackColor", "HoriJustify", "CellStyle"):
            assert calc.property(book, place, name) == colleague.property(other, place, name), (place, name)
    assert calc.format(book, "A3") == colleague.format(other, "A3") == '0.0" kN"'
    assert calc.format(book, "A10") == colleague.format(other, "A10") == "General"
    calc.close(book)
    colleague.close(other)


@pytest.mark.parametrize("kind", [XLSX, ODS])
def test_saved_and_opened_again(calc: CalcOffice, tmp_path: Path, kind: str) -> None:
    """A workbook that Calc saved shows the same when it is opened again, and is as live."""
    path = tmp_path / f"saved.{'xlsx' if kind == XLSX else 'ods'}"
    book = calc.open(schedule(tmp_path / "plain.xlsx"))
    calc.save_as(book, path, kind)
    calc.close(book)
    book = calc.open(path)
    assert shown(calc, book) == SHOWN
    assert not calc.is_modified(book)
    calc.enter(book, {"A1": "fixed 4 pinned"})
    assert calc.read(book, "A3") == [[30.0]]
    assert calc.read(book, "C1:C2") == [[0.0], [12.0]]
    calc.close(book)


def test_an_ods_with_plain_names(calc: CalcOffice, tmp_path: Path) -> None:
    """An .ods whose formulas have plain names is live too."""
    saved, path = tmp_path / "saved.ods", tmp_path / "plain.ods"
    book = calc.new()
    calc.enter(book, {"A1": BEAM, "A2": "=reaction(A1; B1; 1)", "B1": LOADS})
    calc.save_as(book, saved, ODS)
    calc.close(book)
    with zipfile.ZipFile(saved) as archive, zipfile.ZipFile(path, "w") as copy:
        for name in archive.namelist():
            content = archive.read(name)
            plain = content.replace(b"of:=BEAMFUNCS.CALC.FUNCTIONS.REACTION(", b"of:=reaction(")
            assert (plain != content) == (name == "content.xml")
            copy.writestr(name, plain)
    book = calc.open(path)
    assert calc.read(book, "A2") == [[60.0]]
    calc.enter(book, {"B1": "udl 24"})
    assert calc.read(book, "A2") == [[120.0]]
    calc.close(book)


def test_saved_with_plain_names(calc: CalcOffice, tmp_path: Path) -> None:
    """What Calc saves for Excel has plain names, in cells, arrays and named formulas; `fill` computes it the same."""
    path = tmp_path / "saved.xlsx"
    book = calc.open(schedule(tmp_path / "plain.xlsx"))
    calc.save_as(book, path, XLSX)
    calc.close(book)
    formulas = in_file(path)
    assert formulas["A3"] == "reaction(A1,B1,1)"
    assert formulas["C1"] == "moment_at(A1,B1,E1:E3)"
    with zipfile.ZipFile(path) as archive:
        assert not any(b"beamfuncs" in archive.read(name).lower() for name in archive.namelist())
        assert b">reaction(" in archive.read("xl/workbook.xml")
    report = fill(path, tmp_path / "filled.xlsx")
    assert {fault.value for fault in report.errors} == {"#N/A", "#VALUE!"}
    values = {cell: value.text for (_, cell), value in stored(report.target).items()}
    assert {cell: value.text for (_, cell), value in stored(path).items()} == values


def test_the_values_in_the_file(calc: CalcOffice, tmp_path: Path) -> None:
    """Errors are stored as Excel knows them, beside the plain formula."""
    path = tmp_path / "saved.xlsx"
    book = calc.new()
    faults = {"A1": "fixed 3,5 pinned", "A2": "pinned 6 free", "A3": BEAM}
    calc.enter(book, {**faults, **{f"B{n}": f'=reaction(A{n}; "udl 12"; 9)' for n in (1, 2, 3)}})
    calc.enter(book, {"B4": "=reaction(A3:A4; D1; D1)", "D1": "=1/0", "B5": "=reaction(D1:D2; 1; 1)"})
    calc.save_as(book, path, XLSX)
    calc.close(book)
    values = {cell: (value.is_error, value.text) for (_, cell), value in stored(path).items()}
    assert [values[f"B{n}"][1] for n in (1, 2, 3, 4, 5)] == ["#VALUE!", "#NUM!", "#N/A", "#DIV/0!", "#VALUE!"]
    assert all(values[f"B{n}"][0] for n in (1, 2, 3, 4, 5))


def test_saving_again_raises_no_question(calc: CalcOffice, tmp_path: Path) -> None:
    """The office takes a file with plain names for the one it saved; a file that another has changed it asks about."""
    path = tmp_path / "saved.xlsx"
    book = calc.open(schedule(tmp_path / "plain.xlsx"))
    assert calc.save_as(book, path, XLSX) == []
    for beam in ("fixed 4 pinned", "fixed 5 pinned"):
        calc.enter(book, {"A1": beam})
        assert calc.save(book) == []
        assert in_file(path)["A3"] == "reaction(A1,B1,1)"
    later = path.stat().st_mtime + 5
    os.utime(path, (later, later))
    calc.enter(book, {"A1": BEAM})
    assert len(calc.save(book)) == 1
    calc.close(book)
    assert [one.name for one in tmp_path.iterdir() if one.name.startswith(".beamfuncs")] == []


def test_a_copy_is_made_plain_by_the_command(calc: CalcOffice, tmp_path: Path) -> None:
    """A copy, of which an extension is not told, opens live with its long names; `calc plain` gives it plain ones."""
    copy = tmp_path / "copy.xlsx"
    book = calc.open(schedule(tmp_path / "plain.xlsx"))
    calc.export(book, copy, XLSX)
    calc.close(book)
    assert "BEAMFUNCS.CALC.FUNCTIONS.REACTION(" in in_file(copy)["A3"]
    book = calc.open(copy)
    assert shown(calc, book) == SHOWN
    calc.close(book)
    assert rewriting.plain(copy)
    assert in_file(copy)["A3"] == "reaction(A1,B1,1)"
    assert not rewriting.plain(copy)
    book = calc.open(copy)
    assert shown(calc, book) == SHOWN
    calc.close(book)


def test_the_example_workbook(calc: CalcOffice, tmp_path: Path) -> None:
    """The Kestrel Quay schedule opens live: a span is changed in Calc, and all cells come to what `fill` computes."""
    fresh, saved = tmp_path / "kestrel_quay.xlsx", tmp_path / "saved.xlsx"
    without_values(KESTREL_QUAY, fresh)
    book = calc.open(fresh)
    calc.save_as(book, saved, XLSX)
    expected = stored(fill(fresh, tmp_path / "filled.xlsx").target)
    found = stored(saved)
    assert len(expected) > 200
    assert differing(expected, found) == {}
    changed = openpyxl.load_workbook(fresh)
    sheet, place = CHANGED
    length = changed[sheet][place].value
    assert isinstance(length, (int, float))
    changed[sheet][place] = length + 0.5
    changed.save(fresh)
    calc.enter(book, {place: length + 0.5}, sheet)
    calc.save(book)
    calc.close(book)
    later = stored(fill(fresh, tmp_path / "filled.xlsx").target)
    assert differing(later, stored(saved)) == {}
    assert len(differing(expected, later)) > 5


Values = dict[tuple[str, str], Value]


def differing(ours: Values, theirs: Values) -> dict[tuple[str, str], tuple[Value, Value]]:
    """The cells that do not hold the same, but for the last digits of a number."""
    return {place: (one, theirs[place]) for place, one in ours.items() if not one.agrees(theirs[place], 1e-9)}


@pytest.mark.parametrize("unknown", [False, True])
@pytest.mark.parametrize("password", ["", "a secret"])
def test_protected_sheets(calc: CalcOffice, tmp_path: Path, password: str, unknown: bool) -> None:
    """The cells of a protected sheet are live too, and the sheet is as protected as before.

    Array formulas of it stay as they are where the workbook calls functions that Calc does not know.
    """
    path = schedule(tmp_path / "plain.xlsx", unknown)
    book = openpyxl.load_workbook(path)
    book.worksheets[0].protection.sheet = True
    if password:
        book.worksheets[0].protection.password = password
    book.save(path)
    opened = calc.open(path)
    arrays = dict.fromkeys(("C1", "C2", "C3"), "#NAME?")
    assert shown(calc, opened) == ({**SHOWN_BESIDE_UNKNOWN, **arrays} if unknown else SHOWN)
    assert calc.is_protected(opened)
    calc.close(opened)


def test_a_workbook_that_computes_when_told(calc: CalcOffice, tmp_path: Path) -> None:
    """In a workbook that is not to compute by itself the cells show their values, and it is left so."""
    path = schedule(tmp_path / "plain.xlsx")
    book = openpyxl.load_workbook(path)
    book.calculation.calcMode = "manual"
    book.save(path)
    opened = calc.open(path)
    assert calc.calculates_itself(opened) is False
    assert calc.read(opened, "A3") == [[60.0]]
    assert seen(calc.read(opened, "C1:C3")) == [[-42.0], [30.0], ["#VALUE!"]]
    calc.close(opened)


@pytest.mark.parametrize("unknown", [False, True])
def test_a_tall_workbook(calc: CalcOffice, tmp_path: Path, unknown: bool) -> None:
    """A tall column of calls, and one in which they alternate with other formulas, are all live."""
    book = openpyxl.Workbook(write_only=True)
    sheet = book.create_sheet()
    for n in range(1, 3001):
        odd = f"=A{n}*2" if n % 2 else f'=reaction("fixed "&A{n}&" pinned","udl 12",1)'
        sheet.append(
            [n, f'=reaction("pinned "&A{n}&" roller","udl 12",1)', odd, '=loads_read("pinned 6 free","udl 1")']
        )
    sheet.append([None, None, None, "=_xlfn.NEWER(A1)" if unknown else "=1"])
    book.save(tmp_path / "tall.xlsx")
    opened = calc.open(tmp_path / "tall.xlsx")
    rows = calc.data(opened, "A1:C3000")
    calc.close(opened)
    assert [row[1] for row in rows] == pytest.approx([6.0 * n for n in range(1, 3001)], rel=1e-12)
    assert [row[2] for row in rows] == pytest.approx([7.5 * n if n % 2 == 0 else 2.0 * n for n in range(1, 3001)])


@pytest.mark.parametrize("manual", [False, True])
@pytest.mark.parametrize("filled", [False, True])
@pytest.mark.parametrize("unknown", [False, True])
def test_arrays_in_the_rows_of_calls(
    calc: CalcOffice, tmp_path: Path, unknown: bool, filled: bool, manual: bool
) -> None:
    """Every cell of an array, ours or the office's own, shows its own value, also in rows where calls are entered."""
    path = tmp_path / "crossed.xlsx"
    book = openpyxl.Workbook()
    crossed([book.worksheets[0], book.create_sheet()])
    if unknown:
        book.create_sheet()["A1"] = "=_xlfn.NEWER(B1,{})"
    book.calculation.calcMode = "manual" if manual else "auto"
    book.save(path)
    if filled:
        fill(path, in_place=True)
        other_beam(path)
    check_crossed(calc, path, 10.0 if filled else 8.0, 2)


def test_a_colleague_sees_the_values(calc: CalcOffice, colleague: CalcOffice, tmp_path: Path) -> None:
    """Without the extension an .xlsx shows stored values, and a frozen copy of an .ods shows them all, with notes."""
    excel, ods = tmp_path / "saved.xlsx", tmp_path / "saved.ods"
    book = calc.open(schedule(tmp_path / "plain.xlsx"))
    calc.save_as(book, excel, XLSX)
    calc.save_as(book, ods, ODS)
    calc.close(book)
    book = colleague.open(excel)
    assert colleague.read(book, "A3:A4") == [[60.0], [120.0]]
    assert colleague.read(book, "A7") == [[BEAM]]
    assert colleague.read(book, "A5")[0][0][0] == 525
    colleague.close(book)
    frozen, count = rewriting.freeze(ods)
    assert (frozen.name, count) == ("saved.frozen.ods", 5)
    for office in (colleague, calc):
        book = office.open(frozen)
        assert shown(office, book) == SHOWN
        office.enter(book, {"G1": "=SUM(C2:C3)"})
        assert seen(office.read(book, "G1")) == [["#VALUE!"]]
        assert office.note(book, "A3") == "beamfuncs computed this value from =reaction([.A1];[.B1];1)"
        office.close(book)
