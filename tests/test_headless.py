"""Workbooks filled without a spreadsheet program: values, arrays, errors and their reasons, and nothing else."""

from __future__ import annotations

import math
from collections.abc import Callable
from pathlib import Path
from typing import Any

import openpyxl
import pytest
from books import FIRST_SHEET, MAIN, build, formulas, from_xml, parts, rewrite, values
from hypothesis import given, settings
from hypothesis import strategies as st
from openpyxl.worksheet.formula import ArrayFormula
from openpyxl.worksheet.table import Table

from beamfuncs.errors import BeamError, ErrorValue
from beamfuncs.functions import deflection_max, diagram, moment_at, moment_max, reaction, reactions
from beamfuncs.hosts.headless.filling import CellFault, NotFilled, Report, fill

UNREADABLE = BeamError("#VALUE!", "beam: 'nonsense' is no beam")
ABSENT = BeamError("#N/A", "x: beyond the end")


def twice(number: Any) -> float:
    """Twice a number, for tests that need no beam."""
    return 2 * float(number)


def refuse(*_: object) -> float:
    """A function that never has an answer."""
    raise UNREADABLE


def grid(rows: Any = 2, columns: Any = 2) -> list[list[object]]:
    """Rows of numbers 11, 12, ... 21, 22, ..., the entry 22 being an error."""
    entries = [[10.0 * (i + 1) + j + 1 for j in range(int(columns))] for i in range(int(rows))]
    return [[ABSENT if entry == 22 else entry for entry in row] for row in entries]


FUNCTIONS: dict[str, Callable[..., object]] = {"twice": twice, "refuse": refuse, "grid": grid}


def filled(path: Path, functions: dict[str, Callable[..., object]] | None = None) -> tuple[dict[str, Any], Report]:
    """The values of the first sheet of a filled copy, and the report."""
    report = fill(path, functions=functions or FUNCTIONS)
    return values(report.target), report


def reasons(report: Report) -> dict[str, tuple[str, str]]:
    """Value and reason of each cell in error."""
    return {f"{fault.sheet}!{fault.cell}": (fault.value, fault.reason) for fault in report.errors}


def arguments_of(path: Path) -> list[object]:
    """What the function `see` is handed by the one cell that calls it."""
    seen: list[object] = []

    def see(*arguments: object) -> float:
        seen.extend(arguments)
        return 1.0

    fill(path, functions={"see": see})
    return seen


# --- values ---------------------------------------------------------------------------------------


def test_every_formula_gets_its_value(tmp_path: Path) -> None:
    """Ordinary formulas, ours, and those that build on ours are all given values; the counts say how many."""
    cells = {
        "A1": 3.5,
        "A2": "pinned",
        "B1": "=A1*2+1/3",
        "B2": '=A2&" "&A1',
        "B3": "=twice(A1)",
        "B4": "=B3^2-twice(B1)",
        "B5": "=SUM(B1,B3:B4)",
        "B6": "=A1>3",
        "B7": '=IF(A1>9,"x","")',
    }
    got, report = filled(build(tmp_path / "book.xlsx", cells))
    assert got["B1"] == 3.5 * 2 + 1 / 3
    assert got["B2"] == "pinned 3.5"
    assert got["B3"] == 7
    assert got["B4"] == 49 - 2 * (3.5 * 2 + 1 / 3)
    assert got["B5"] == pytest.approx(got["B1"] + got["B3"] + got["B4"], rel=1e-15)
    assert got["B6"] is True
    assert b'<c r="B7" t="str"><f>IF(A1&gt;9,"x","")</f><v></v></c>' in parts(report.target)[FIRST_SHEET]
    assert report == Report(tmp_path / "book.filled.xlsx", beam_cells=2, recomputed=5)


def test_beams_in_cells_are_solved_as_in_python(tmp_path: Path) -> None:
    """A schedule whose lines are joined from cells holds what the functions answer when called directly."""
    rows = [
        ("pinned 6 roller", "udl 12", None),
        ("fixed 8 pinned", "G: udl 5; Q: point 40 at 3", "1.35 G + 1.5 Q"),
        ("fixed 3.5 pinned 4.25 roller", "udl 7 from 1 to 3.25", None),
    ]
    cells: dict[str, object] = {}
    for number, (line, loads, combination) in enumerate(rows, 1):
        start, length, end = line.split(" ", 1)[0], line.split(" ", 1)[1].rsplit(" ", 1)[0], line.rsplit(" ", 1)[1]
        cells |= {
            f"A{number}": start,
            f"B{number}": length if " " in length else float(length),
            f"C{number}": end,
            f"D{number}": loads,
            f"E{number}": combination,
            f"F{number}": f'=A{number}&" "&B{number}&" "&C{number}',
            f"G{number}": f"=reaction(F{number},D{number},1,,E{number})",
            f"H{number}": f"=moment_max(F{number},D{number},,,E{number})",
            f"I{number}": f"=deflection_max(F{number},D{number},,2500,E{number})",
            f"J{number}": f"=ROUND(H{number}/G{number},3)",
        }
    report = fill(build(tmp_path / "book.xlsx", cells))
    got = values(report.target)
    assert report.errors == []
    assert (report.beam_cells, report.recomputed) == (9, 6)
    for number, (line, loads, combination) in enumerate(rows, 1):
        assert got[f"G{number}"] == reaction(line, loads, 1, None, combination)
        assert got[f"H{number}"] == moment_max(line, loads, None, None, combination)
        assert got[f"I{number}"] == deflection_max(line, loads, None, 2500, combination)
        assert got[f"J{number}"] == round(got[f"H{number}"] / got[f"G{number}"], 3)


@settings(max_examples=25, deadline=None, derandomize=True)
@given(
    numbers=st.lists(st.floats(allow_nan=False, allow_infinity=False, allow_subnormal=False), min_size=5, max_size=5),
    text=st.text(st.characters(exclude_categories=["Cs", "Cc"], exclude_characters="_\ufffe\uffff"), max_size=40),
)
def test_numbers_and_texts_come_back_to_the_last_bit(
    tmp_path_factory: pytest.TempPathFactory, numbers: list[float], text: str
) -> None:
    """What a function returns is what the file holds, whatever the number or the text."""
    path = tmp_path_factory.mktemp("books") / "book.xlsx"
    build(
        path, {"A1": "=give(0)", "A2": "=give(1)", "A3": "=give(2)", "A4": "=give(3)", "A5": "=give(4)", "B1": "=say()"}
    )
    functions: dict[str, Callable[..., object]] = {"give": lambda index: numbers[int(index)], "say": lambda: text}
    got, report = filled(path, functions)
    assert report.errors == []
    assert [got[f"A{row}"] for row in range(1, 6)] == numbers
    assert got.get("B1", "") == text


def test_texts_that_look_like_formulas_stay_texts(tmp_path: Path) -> None:
    """A text result is stored as text whatever it begins with."""
    functions: dict[str, Callable[..., object]] = {"say": lambda: "=1+1\n@<&> "}
    path = build(tmp_path / "book.xlsx", {"A1": "=say()"})
    got, report = filled(path, functions)
    assert got["A1"] == "=1+1\n@<&> "
    assert openpyxl.load_workbook(report.target)["Plan"]["A1"].value == "=say()"


def test_a_blank_shows_as_0(tmp_path: Path) -> None:
    """A formula that only points to a blank cell gives 0, alone, through a function or in an array."""
    cells = {"A1": "=Z9", "A2": "=IF(TRUE,Z9)", "A3": "=INDEX(Z1:Z9,2)", "A4": ArrayFormula("A4:A5", "=Z8:Z9")}
    got, report = filled(build(tmp_path / "book.xlsx", cells))
    assert report.errors == []
    assert got == dict.fromkeys(("A1", "A2", "A3", "A4", "A5"), 0)
    spilt = spilling(tmp_path / "spilt.xlsx", "A1:A2", "Z1:Z2", "")
    assert filled(spilt)[0] == {"A1": 0, "A2": 0, "C1": 0}


def test_dates_count_from_the_workbook_s_own_epoch(tmp_path: Path) -> None:
    """The same day has the number of its own date system, four years and a day apart."""
    cells = {"A1": "=DATE(2024,3,15)", "A2": "=YEAR(A1)"}
    usual = fill(build(tmp_path / "usual.xlsx", cells))
    other = build(tmp_path / "other.xlsx", cells)
    rewrite(other, "xl/workbook.xml", lambda xml: xml.replace(b"<workbookPr", b'<workbookPr date1904="1"', 1))
    assert values(usual.target) == {"A1": 45366, "A2": 2024}
    assert values(fill(other).target) == {"A1": 45366 - 1462, "A2": 2024}


# --- what is handed over --------------------------------------------------------------------------


def test_each_kind_of_argument_arrives_as_a_function_expects_it(tmp_path: Path) -> None:
    """Text, number, truth, blank, error and range arrive plainly; an argument left out in the middle as 0."""
    cells = {
        "A1": "fixed 8 pinned",
        "A2": 2.5,
        "A3": True,
        "A5": "=1/0",
        "B1": "=NA()",
        "D1": '=See(A1,A2,A3,A4,A5,,A1:B2,"text",{1,2;3,4})',
    }
    assert arguments_of(build(tmp_path / "book.xlsx", cells)) == [
        "fixed 8 pinned",
        2.5,
        True,
        None,
        ErrorValue("#DIV/0!"),
        "",
        [["fixed 8 pinned", ErrorValue("#N/A")], [2.5, None]],
        "text",
        [[1.0, 2.0], [3.0, 4.0]],
    ]


@pytest.mark.parametrize("formula", ["moment_at(A1,B1,)", "moment_at(A1,B1,,)", "reaction(A1, ,1)", "reaction(,B1,1)"])
def test_an_argument_left_out_is_blank_and_not_0(formula: str, tmp_path: Path) -> None:
    """The engine gives 0 for it, which would be the moment at the left end."""
    cells = {
        "A1": "fixed 8 pinned",
        "B1": "udl 12",
        "C1": f"={formula}",
        "C2": "=deflection_max(A1,B1,,24000)+IF(1=1,,5)",
    }
    report = fill(build(tmp_path / "book.xlsx", cells))
    assert [(fault.cell, fault.value) for fault in report.errors] == [("C1", "#VALUE!")]
    assert "blank" in report.errors[0].reason
    assert values(report.target)["C2"] == deflection_max("fixed 8 pinned", "udl 12", None, 24000)


def test_error_arguments_are_error_values_not_texts(tmp_path: Path) -> None:
    """An error that comes in can be told from a text of the same letters."""
    seen = arguments_of(build(tmp_path / "book.xlsx", {"A1": "=#REF!", "A2": "#REF!", "B1": '=see(A1,"#REF!",A1:A1)'}))
    assert [type(one) for one in seen] == [ErrorValue, str, ErrorValue]


def test_names_other_sheets_and_whole_columns_are_arguments(tmp_path: Path) -> None:
    """A defined name, a range of another sheet and a whole column hand over their cells."""
    cells = {
        "B1": "=see(Line,Loads,Data!B2,Data!A:A,Data!A1:B2,Const)",
        "Data!A1": "pinned",
        "Data!A2": 6,
        "Data!A3": "roller",
        "Data!B2": "udl 4",
    }
    names = {"Line": "Data!$A$1:$A$3", "Loads": "Data!$B$2", "Const": "0.25"}
    assert arguments_of(build(tmp_path / "book.xlsx", cells, names)) == [
        [["pinned"], [6.0], ["roller"]],
        "udl 4",
        "udl 4",
        [["pinned"], [6.0], ["roller"]],
        [["pinned", None], [6.0, "udl 4"]],
        0.25,
    ]


def test_tables_are_arguments_and_have_names(tmp_path: Path) -> None:
    """References to a table, in formulas and in defined names, hand over the table's cells."""
    path = build(tmp_path / "book.xlsx", {}, {"Spans": "Beams[Span]"})
    book = openpyxl.load_workbook(path)
    data = book.create_sheet("Bo's data")
    for row in [["Mark", "Span", "Twice", "Sum"], ["B1", 6, None, None], ["B2", 7.5, None, None]]:
        data.append(row)
    for row in (2, 3):
        data[f"C{row}"] = "=twice(Beams[[#This Row],[Span]])"
        data[f"D{row}"] = "=SUM(Beams[Span])"
    data.add_table(Table(displayName="Beams", ref="A1:D3"))
    book["Plan"]["A1"] = "=twice(SUM(Spans))"
    book["Plan"]["A2"] = "=COUNTA(Beams[#All])"
    book.save(path)
    report = fill(path, functions=FUNCTIONS)
    assert report.errors == []
    got = values(report.target, "Bo's data")
    assert (got["C2"], got["C3"], got["D2"]) == (12, 15, 13.5)
    assert values(report.target) == {"A1": 27, "A2": 12}


def test_shared_formulas_are_each_cell_s_own(tmp_path: Path) -> None:
    """Cells that share one formula text evaluate it from where they stand, and fail for themselves."""
    rows = "".join(
        f'<row r="{n}"><c r="A{n}"><v>{n}</v></c><c r="B{n}"><f t="shared" si="0"{first}</c></row>'
        for n, first in [(1, ' ref="B1:B3">half(A1)+$A$3</f>'), (2, "/><v>0</v>"), (3, "></f>")]
    )

    def half(number: float) -> float:
        if number == 2:
            raise ABSENT
        return number / 2

    path = from_xml(tmp_path / "book.xlsx", rows)
    got, report = filled(path, {"half": half})
    assert (got["B1"], got["B3"]) == (3.5, 4.5)
    assert report.errors == [CellFault("Plan", "B2", "#N/A", ABSENT.reason, "=half(A2)+$A$3")]
    assert report.beam_cells == 3


STRICT = "http://purl.oclc.org/ooxml/spreadsheetml/main"


@pytest.mark.parametrize(
    ("root", "rows"),
    [
        (f'<x:worksheet xmlns:x="{MAIN}">', "<x:row><x:c><x:v>3</x:v></x:c><x:c><x:f>twice(A1)</x:f></x:c></x:row>"),
        (f'<worksheet xmlns="{MAIN}">', "<row><c><v>3</v></c><c><f>twice(A1)</f></c></row>"),
        (f'<worksheet xmlns="{STRICT}">', '<row r="1"><c r="A1"><v>3</v></c><c r="B1"><f>twice(A1)</f></c></row>'),
    ],
)
def test_sheets_in_other_spellings_are_filled(tmp_path: Path, root: str, rows: str) -> None:
    """A sheet with a namespace prefix, with cells that are not named, or in the strict namespace is filled too."""
    report = fill(from_xml(tmp_path / "book.xlsx", rows, root), functions=FUNCTIONS)
    assert report.errors == []
    prefix = root[1:].split("worksheet")[0]
    assert f"twice(A1)</{prefix}f><{prefix}v>6</{prefix}v>".encode() in parts(report.target)[FIRST_SHEET]


def test_sheets_of_any_name_are_filled(tmp_path: Path) -> None:
    """Sheet names with quotes, spaces and signs work, in references and in the list of errors."""
    cells = {"Bo's < & > 1.2!A1": "=twice(B1)", "Bo's < & > 1.2!B1": 4, "A1": "='Bo''s < & > 1.2'!A1/0"}
    report = fill(build(tmp_path / "book.xlsx", cells), functions=FUNCTIONS)
    assert values(report.target, "Bo's < & > 1.2")["A1"] == 8
    assert reasons(report) == {"Plan!A1": ("#DIV/0!", "the formula gives #DIV/0!")}


# --- errors and their reasons ---------------------------------------------------------------------


def test_every_error_has_its_reason(tmp_path: Path) -> None:
    """The list names sheet, cell, value, reason and formula; a function's own words come first, then the source."""
    cells = {
        "A1": "nonsense",
        "B1": "=refuse(A1)",
        "B2": "=B1+1",
        "B3": "=SUM(B1:B2)",
        "B4": "=1/0",
        "B5": "=Data!A1*2",
        "B6": "=no_such_function(1)",
        "B7": "=no_such_name",
        "B8": "=B9",
        "B9": "=B8+1",
        "B10": "=IFERROR(refuse(A1),5)",
        "B11": "=IFERROR(refuse(A1),1/0)",
        "B12": "=twice(1,2,3)",
        "B13": "=twice()",
        "B14": "=twice(A1)",
        "B15": "=infinite()",
        "B16": "=SUM((A2,A3))",
        "B17": "=SUM(1,",
        "B18": "=Elsewhere!B18",
        "B19": "=NA()",
        "Data!A1": "=#REF!",
        "Data!A2": "=refuse()+refuse()",
    }
    path = build(tmp_path / "book.xlsx", cells)
    got, report = filled(path, FUNCTIONS | {"infinite": lambda: math.inf})
    assert got["B10"] == 5
    found = reasons(report)
    assert found.pop("Plan!B14") == (
        "#VALUE!",
        "twice broke off: ValueError: could not convert string to float: 'nonsense'",
    )
    assert found == {
        "Plan!B1": ("#VALUE!", UNREADABLE.reason),
        "Plan!B2": ("#VALUE!", "takes #VALUE! from Plan!B1"),
        "Plan!B3": ("#VALUE!", "takes #VALUE! from Plan!B1"),
        "Plan!B4": ("#DIV/0!", "the formula gives #DIV/0!"),
        "Plan!B5": ("#REF!", "takes #REF! from Data!A1"),
        "Plan!B6": ("#NAME?", "the formula uses no_such_function, a function that is not known here"),
        "Plan!B7": ("#NAME?", "the formula uses a function or a name that is not known here"),
        "Plan!B8": ("#VALUE!", "circular reference: Plan!B8 -> Plan!B9 -> Plan!B8"),
        "Plan!B9": ("#VALUE!", "circular reference: Plan!B9 -> Plan!B8 -> Plan!B9"),
        "Plan!B11": ("#DIV/0!", "the formula gives #DIV/0!"),
        "Plan!B12": ("#VALUE!", "twice: takes 1 arguments, 3 given"),
        "Plan!B13": ("#VALUE!", "twice: takes 1 arguments, 0 given"),
        "Plan!B15": ("#NUM!", "the result is not a finite number"),
        "Plan!B16": ("#VALUE!", "the formula uses what cannot be evaluated here"),
        "Plan!B17": ("#VALUE!", "the formula cannot be read"),
        "Plan!B18": ("#REF!", "the formula gives #REF!"),
        "Plan!B19": ("#N/A", "the formula gives #N/A"),
        "Data!A1": ("#REF!", "the formula gives #REF!"),
        "Data!A2": ("#VALUE!", UNREADABLE.reason),
    }
    assert report.errors[0] == CellFault("Plan", "B1", "#VALUE!", UNREADABLE.reason, "=refuse(A1)")
    assert {name: got[name] for name in ("B1", "B4", "B6", "B8")} == {
        "B1": "#VALUE!",
        "B4": "#DIV/0!",
        "B6": "#NAME?",
        "B8": "#VALUE!",
    }


def test_each_entry_of_an_array_has_its_own_reason(tmp_path: Path) -> None:
    """Two entries that fail with the same value are listed each with what was said of it."""

    def failing() -> list[list[object]]:
        return [[BeamError("#N/A", "first"), 1.0, BeamError("#N/A", "third")]]

    path = build(tmp_path / "book.xlsx", {"A1": ArrayFormula("A1:C1", "=failing()")})
    assert reasons(filled(path, {"failing": failing})[1]) == {
        "Plan!A1": ("#N/A", "first"),
        "Plan!C1": ("#N/A", "third"),
    }


def test_the_reason_is_that_of_the_last_evaluation(tmp_path: Path) -> None:
    """What a function said about values that were put right afterwards is forgotten."""

    def read(value: object) -> float:
        raise BeamError("#VALUE!", f"read {value}")

    path = build(tmp_path / "book.xlsx", {"A1": "=grid(2,1)", "B1": "=read(A2)"})
    assert reasons(filled(path, FUNCTIONS | {"read": read})[1]) == {"Plan!B1": ("#VALUE!", "read None")}


def test_a_reference_that_is_never_followed_is_no_circle(tmp_path: Path) -> None:
    """A formula that would refer to itself only on the way it does not take has its value."""
    got, report = filled(build(tmp_path / "book.xlsx", {"A1": "=IF(B1=0,7,A1)"}))
    assert (got, report.errors) == ({"A1": 7}, [])


def test_errors_are_genuine_error_values(tmp_path: Path) -> None:
    """A failing cell holds an error value that formulas can tell from text."""
    path = build(tmp_path / "book.xlsx", {"A1": "=refuse()", "A2": "=ISERROR(A1)", "A3": "=ISTEXT(A1)"})
    got, report = filled(path)
    assert (got["A2"], got["A3"]) == (True, False)
    assert openpyxl.load_workbook(report.target, data_only=True)["Plan"]["A1"].data_type == "e"


def test_the_functions_own_reasons_are_listed(tmp_path: Path) -> None:
    """A beam that cannot be solved is listed with what `BeamError` says when the function is called from Python."""
    report = fill(build(tmp_path / "book.xlsx", {"A1": "=reaction(B1,B2,4)", "B1": "pinned 6 roller", "B2": "udl 1"}))
    with pytest.raises(BeamError) as refusal:
        reaction("pinned 6 roller", "udl 1", 4)
    assert reasons(report) == {"Plan!A1": (refusal.value.value, refusal.value.reason)}


def test_an_interruption_stops_the_filling(tmp_path: Path) -> None:
    """An interruption inside a function is not swallowed, and no file is written."""

    def interrupted() -> float:
        raise KeyboardInterrupt

    path = build(tmp_path / "book.xlsx", {"A1": "=interrupted()"})
    with pytest.raises(KeyboardInterrupt):
        fill(path, functions={"interrupted": interrupted})
    assert list(tmp_path.iterdir()) == [path]


# --- arrays ---------------------------------------------------------------------------------------


def test_an_array_formula_fills_its_extent(tmp_path: Path) -> None:
    """Each cell of `{=...}` gets its entry; one row or column repeats; what the array lacks is #N/A."""
    cells = {
        "A1": ArrayFormula("A1:B3", "=grid(3,2)"),
        "D1": ArrayFormula("D1:F2", "=grid(1,2)*2"),
        "H1": ArrayFormula("H1:I2", "=grid(3,3)"),
        "K1": ArrayFormula("K1:L2", "=twice(4)"),
        "N1": ArrayFormula("N1", "=SUM(K1:L2*K1:L2)"),
        "A5": ArrayFormula("A5:B6", "=TRANSPOSE(H1:I2)"),
        "D5": "=A1+A3",
    }
    path = build(tmp_path / "book.xlsx", cells)
    got, report = filled(path)
    assert [got[name] for name in ("A1", "B1", "A2", "B2", "A3", "B3")] == [11, 12, 21, "#N/A", 31, 32]
    assert [got[name] for name in ("D1", "E1", "F1", "D2", "E2", "F2")] == [22, 24, "#N/A", 22, 24, "#N/A"]
    assert [got[name] for name in ("H1", "I1", "H2", "I2")] == [11, 12, 21, "#N/A"]
    assert [got[name] for name in ("K1", "L1", "K2", "L2", "N1")] == [8, 8, 8, 8, 256]
    assert [got[name] for name in ("A5", "B5", "A6", "B6")] == [11, 21, 12, "#N/A"]
    assert got["D5"] == 42
    assert "H3" not in got
    lacking = ("#N/A", "the array that the formula gives does not reach this cell")
    assert reasons(report) == {
        "Plan!B2": ("#N/A", ABSENT.reason),
        "Plan!F1": lacking,
        "Plan!F2": lacking,
        "Plan!I2": ("#N/A", ABSENT.reason),
        "Plan!B6": ("#N/A", "takes #N/A from Plan!I2"),
    }
    assert formulas(report.target) == formulas(path)


def test_arrays_of_ours_agree_with_python(tmp_path: Path) -> None:
    """`reactions`, `diagram` and `moment_at` of a range fill cells with the rows that Python gets."""
    line, loads, places = "fixed 4 pinned 5 roller", "udl 3; point 8 at 6", [[0.0], [1.25], [9.0]]
    cells = {
        "A1": line,
        "A2": loads,
        "A3": 0,
        "A4": 1.25,
        "A5": 9,
        "B1": ArrayFormula("B1:E3", "=reactions(A1,A2)"),
        "G1": ArrayFormula("G1:I5", "=diagram(A1,A2,3,1000)"),
        "K1": ArrayFormula("K1:K3", "=moment_at(A1,A2,A3:A5)"),
        "M1": "=INDEX(diagram(A1,A2,3,1000),2,3)",
        "N1": "=reactions(A1,A2)",
    }
    report = fill(build(tmp_path / "book.xlsx", cells))
    got = values(report.target)
    assert report.errors == []
    table = diagram(line, loads, 3, 1000)
    assert [[got[f"{c}{r}"] for c in "BCDE"] for r in (1, 2, 3)] == reactions(line, loads)
    assert [[got[f"{c}{r}"] for c in "GHI"] for r in range(1, 6)] == [row[:3] for row in table[:5]]
    assert [[got[f"K{r}"]] for r in (1, 2, 3)] == moment_at(line, loads, places)
    assert got["M1"] == table[1][2]
    assert got["N1"] == 1


def spilling(path: Path, extent: str, formula: str, rest: str) -> Path:
    """A book whose A1 spills; B1, B2 are constants, further rows as given."""
    anchor = f'<c r="A1" cm="1"><f t="array" ref="{extent}">{formula}</f><v>0</v></c>'
    return from_xml(path, f'<row r="1">{anchor}<c r="C1"><f>SUM(A1:A9)</f></c></row>{rest}')


def test_a_spilling_array_grows(tmp_path: Path) -> None:
    """More entries than before: the new cells are filled, and the extent in the file follows."""
    path = spilling(tmp_path / "book.xlsx", "A1:A2", "grid(3,1)", '<row r="2"><c r="A2"><v>9</v></c></row>')
    got, report = filled(path)
    assert report.errors == []
    assert got == {"A1": 11, "A2": 21, "A3": 31, "C1": 63}
    assert b'<f t="array" ref="A1:A3">grid(3,1)</f>' in parts(report.target)[FIRST_SHEET]


def test_a_spilling_array_shrinks(tmp_path: Path) -> None:
    """Fewer entries than before: what is left over is cleared, and counts for nothing."""
    rest = '<row r="2"><c r="A2"><v>9</v></c></row><row r="3"><c r="A3" s="0"><v>9</v></c><c r="B3"><v>1</v></c></row>'
    got, report = filled(spilling(tmp_path / "book.xlsx", "A1:A3", "grid(1,1)", rest))
    assert report.errors == []
    assert got == {"A1": 11, "C1": 11, "B3": 1}


def test_a_formula_where_an_array_once_spilled_keeps_its_value(tmp_path: Path) -> None:
    """What has since been entered into a cell that an array filled before is not cleared."""
    rest = '<row r="2"><c r="A2"><f>2+3</f></c></row><row r="3"><c r="A3"><v>9</v></c></row>'
    got, report = filled(spilling(tmp_path / "book.xlsx", "A1:A3", "grid(1,1)", rest))
    assert report.errors == []
    assert got == {"A1": 11, "A2": 5, "C1": 16}


def test_a_spilling_array_that_is_blocked_is_an_error(tmp_path: Path) -> None:
    """An array with no room is an error with its reason; what stands in its way stays."""
    rest = '<row r="2"><c r="A2"><v>9</v></c></row>'
    got, report = filled(spilling(tmp_path / "book.xlsx", "A1", "grid(2,1)", rest))
    assert got == {"A1": "#VALUE!", "A2": 9, "C1": "#VALUE!"}
    assert reasons(report) == {
        "Plan!A1": (
            "#VALUE!",
            "the array that the formula gives needs cells that are not empty, or has more than 10,000 cells",
        ),
        "Plan!C1": ("#VALUE!", "takes #SPILL! from Plan!A1"),
    }


def test_an_ordinary_formula_fills_its_own_cell_only(tmp_path: Path) -> None:
    """Of an array of ours the first entry shows, of a range the cell in the same row; else it is an error."""
    cells = {
        **{f"A{row}": float(row) for row in (1, 2, 3)},
        "B1": "=grid(2,2)",
        "B2": "=A1:A3*10",
        "B3": "=Column+1",
        "C1": "=grid(3,2)+A1:A3",
        "C2": "=grid(2,1)*SUM(A1:A3)",
        "D1": "=SUM(B1:C1,B2:B5)",
        "E1": "=_xlfn.SEQUENCE(2)",
        "F1": "=E1+1",
        "E3": "=COUNT(E2)",
    }
    got, report = filled(build(tmp_path / "book.xlsx", cells, {"Column": "Plan!$A$1:$A$3"}))
    assert (got["B1"], got["B2"], got["B3"], got["C1"]) == (11, 20, 4, 12)
    assert got["C2"] == 11 * 6
    assert got["D1"] == 11 + 20 + 4 + 12
    assert got["E3"] == 0
    assert reasons(report) == {
        "Plan!E1": (
            "#VALUE!",
            "it gives an array, for which an ordinary cell has no room: enter it as an array formula",
        ),
        "Plan!F1": ("#VALUE!", "takes #VALUE! from Plan!E1"),
    }


def test_what_if_tables_are_named_not_computed(tmp_path: Path) -> None:
    """A what-if table keeps its stored values and is listed, for nothing here evaluates it."""
    table = '<c r="A1"><f t="dataTable" ref="A1:A2" dt2D="0" r1="C1"/><v>4</v></c>'
    path = from_xml(tmp_path / "book.xlsx", f'<row r="1">{table}<c r="B1"><f>A1+1</f></c></row>')
    got, report = filled(path)
    assert got == {"A1": 4, "B1": 5}
    assert reasons(report) == {"Plan!A1": ("4", "a what-if table is not evaluated here: its stored values are kept")}


# --- the file -------------------------------------------------------------------------------------


def test_nothing_but_values_changes(tmp_path: Path) -> None:
    """All parts but the sheets that gain a value keep their bytes, formulas included; the source stays as it was."""
    cells = {
        "A1": "=twice(Data!A1)",
        "A2": '=IF(A1<>0,"a&b",1)',
        "A3": ArrayFormula("A3:B4", "=grid(2,2)"),
        "Data!A1": 3,
        "Data!B1": "text",
    }
    path = build(tmp_path / "book.xlsx", cells)
    rewrite(path, "xl/media/image1.png", lambda _: bytes(range(256)))
    before = path.read_bytes()
    report = fill(path, tmp_path / "out.xlsx", FUNCTIONS)
    assert report.target == tmp_path / "out.xlsx"
    assert path.read_bytes() == before
    old, new = parts(path), parts(report.target)
    assert list(new) == list(old)
    assert [name for name in old if old[name] != new[name]] == [FIRST_SHEET]
    assert formulas(report.target) == formulas(path)
    assert sorted(file.name for file in tmp_path.iterdir()) == ["book.xlsx", "out.xlsx"]


def test_filling_again_changes_nothing(tmp_path: Path) -> None:
    """A filled workbook filled once more keeps every byte of every part."""
    cells = {
        "A1": "=twice(1)/3",
        "A2": '=" a"&CHAR(10)&"b_x000D_"',
        "A3": "=refuse()",
        "A4": ArrayFormula("A4:C6", "=grid(2,2)"),
        "A7": "=A1>0",
        "A8": '=""',
        "A9": "=1E+30*1E+30",
        "A10": "=A11",
    }
    first = fill(build(tmp_path / "book.xlsx", cells), functions=FUNCTIONS)
    second = fill(first.target, functions=FUNCTIONS)
    assert second.target == tmp_path / "book.filled.filled.xlsx"
    assert parts(second.target) == parts(first.target)
    assert second.errors == first.errors


def test_progress_is_told(tmp_path: Path) -> None:
    """Each cell that calls one of ours is told once, out of all that do."""
    told: list[tuple[int, int]] = []
    cells = {"A1": "=twice(1)+twice(2)", "A2": "=twice(A1)", "A3": '=COUNTIF(A1:A2,">0")'}
    fill(
        build(tmp_path / "book.xlsx", cells),
        functions=FUNCTIONS,
        progress=lambda done, of: told.append((done, of)),
    )
    assert told == [(1, 2), (2, 2)]


def test_the_workbook_itself_is_never_the_target(tmp_path: Path) -> None:
    """A target that is the source, by whatever path, is refused and stays as it was."""
    path = build(tmp_path / "book.xlsx", {"A1": "=1+1"})
    before = path.read_bytes()
    link = tmp_path / "link.xlsx"
    link.symlink_to(path)
    for target in (path, tmp_path / "." / "book.xlsx", link):
        with pytest.raises(NotFilled, match="never written over"):
            fill(path, target)
    assert path.read_bytes() == before


@pytest.mark.parametrize(
    ("source", "target", "why"),
    [
        ("none.xlsx", None, "there is no such file"),
        ("", None, "is a folder"),
        ("book.xlsx", "out.xlsm", "must end in .xlsx"),
        ("book.xlsx", "none/out.xlsx", "no such folder"),
        ("book.txt", None, "not a workbook"),
        ("broken.xlsx", None, "sheet Plan cannot be read"),
    ],
)
def test_what_cannot_be_filled_says_why(tmp_path: Path, source: str, target: str | None, why: str) -> None:
    """Nothing is written, and one line says what is wrong with which file."""
    build(tmp_path / "book.xlsx", {"A1": "=1+1"})
    (tmp_path / "book.txt").write_text("a,b\n")
    rewrite(build(tmp_path / "broken.xlsx", {"A1": 1}), FIRST_SHEET, lambda xml: xml[:-30])
    before = sorted(tmp_path.iterdir())
    with pytest.raises(NotFilled, match=why) as refusal:
        fill(tmp_path / source, target and tmp_path / target)
    assert "\n" not in str(refusal.value)
    assert sorted(tmp_path.iterdir()) == before
