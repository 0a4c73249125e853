"""Values stored by the program that saved a workbook, against the engine's: which stand, and what is said of it."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import pytest
from books import FIRST_SHEET, build, from_xml, parts, rewrite, store, values
from openpyxl.worksheet.formula import ArrayFormula

from beamfuncs.errors import ErrorValue
from beamfuncs.hosts.headless import filling
from beamfuncs.hosts.headless.filling import CellFault, NotFilled, Report, fill
from beamfuncs.hosts.headless.stored import Difference, agree
from beamfuncs.trust import Trust

BOTH = pytest.mark.parametrize("trust", list(Trust))


def twice(number: Any) -> float:
    """Stands for a beam function."""
    return 2 * float(number)


def filled(path: Path, trust: Trust = Trust.STORED) -> tuple[dict[str, Any], Report]:
    """The values of the first sheet of a filled copy, and the report."""
    report = fill(path, functions={"twice": twice}, trust=trust)
    return values(report.target), report


def book(path: Path, cells: dict[str, object], stored: dict[str, object], names: dict[str, str] | None = None) -> Path:
    """A workbook as a spreadsheet program saved it, with what it stored."""
    return store(build(path, cells, names), stored)


def told(report: Report) -> dict[str, tuple[object, object, bool, bool]]:
    """Stored value, engine's value, whether kept and whether volatile, of every difference."""
    return {f"{one.sheet}!{one.cell}": (one.stored, one.computed, one.kept, one.volatile) for one in report.differences}


# --- whose value stands ---------------------------------------------------------------------------

WRONG = {"A1": 5, "B1": "=A1*2", "C1": "=B1+1", "D1": "=twice(C1)", "E1": "=D1/2"}


def test_a_stored_value_stands_and_all_else_follows_from_it(tmp_path: Path) -> None:
    """By default the stored value of an ordinary cell is taken, by formulas and beam functions downstream too."""
    got, report = filled(book(tmp_path / "book.xlsx", WRONG, {"B1": 11, "C1": 12, "D1": "#NAME?", "E1": "#NAME?"}))
    assert got == {"A1": 5, "B1": 11, "C1": 12, "D1": 24, "E1": 12}
    assert report.differences == [Difference("Plan", "B1", 11, 10, "=A1*2", False, True, "", ["Plan!D1"])]
    assert (report.beam_cells, report.recomputed, report.errors) == (1, 2, [])


def test_the_engine_s_value_stands_when_it_is_trusted(tmp_path: Path) -> None:
    """With trust in the engine it is the other way round, and every cell that differs is listed."""
    path = book(tmp_path / "book.xlsx", WRONG, {"B1": 11, "C1": 12, "D1": "#NAME?", "E1": "#NAME?"})
    got, report = filled(path, Trust.ENGINE)
    assert got == {"A1": 5, "B1": 10, "C1": 11, "D1": 22, "E1": 11}
    assert told(report) == {"Plan!B1": (11, 10, False, False), "Plan!C1": (12, 11, False, False)}
    assert [one.used_by for one in report.differences] == [["Plan!D1"], ["Plan!D1"]]


def test_what_follows_from_a_stored_value_is_evaluated_from_it(tmp_path: Path) -> None:
    """A cell that stores nothing takes its value from the stored one above it; one that stores another is listed."""
    cells = {"A1": 5, "B1": "=A1*2", "C1": "=B1+1", "C2": "=B1+2", "C3": "=SUM(B:B)", "D1": "=twice(1)"}
    got, report = filled(book(tmp_path / "book.xlsx", cells, {"B1": 11, "C2": 14, "C3": 11}))
    assert (got["C1"], got["C2"], got["C3"]) == (12, 14, 11)
    assert told(report) == {"Plan!B1": (11, 10, True, False), "Plan!C2": (14, 13, True, False)}


def test_long_chains_of_differences_come_to_an_end(tmp_path: Path) -> None:
    """Each cell of a chain may differ by itself: all stored values stand."""
    cells: dict[str, object] = {"A1": "=1+1", "B1": "=twice(A40)"}
    cells |= {f"A{row}": f"=A{row - 1}+1" for row in range(2, 41)}
    stored = {f"A{row}": 10 * row for row in range(1, 41)}
    got, report = filled(book(tmp_path / "book.xlsx", cells, stored))
    assert {name: got[name] for name in stored} == stored
    assert got["B1"] == 800
    assert len(report.differences) == 40


def test_where_nothing_differs_no_byte_changes(tmp_path: Path) -> None:
    """Numbers within the last digits, and texts joined from such, stay as the saving program wrote them."""
    cells = {
        "A1": "=1/3",
        "A2": '="x"&1/3',
        "A3": "=0.1+0.2",
        "A4": "=1/3>0",
        "A5": '=""',
        "A6": "=1/0",
        "B1": "=twice(A1)",
    }
    stored = {
        "A1": "0.33333333333333298",
        "A2": "x0.333333333333333",
        "A3": 0.30000000000000004,
        "A4": True,
        "A6": "#DIV/0!",
    }
    path = book(tmp_path / "book.xlsx", cells, stored)
    rewrite(path, FIRST_SHEET, lambda xml: xml.replace(b' t="str"><f>1/3</f>', b"><f>1/3</f>"))
    got, report = filled(path)
    sheet = parts(report.target)[FIRST_SHEET]
    assert report.differences == []
    assert b"<v>0.33333333333333298</v>" in sheet
    assert got["A2"] == "x0.333333333333333"
    assert got["B1"] == pytest.approx(2 / 3, rel=1e-15)


@pytest.mark.parametrize(
    ("stored", "computed", "alike"),
    [
        (1.0, 1 + 0.9e-9, True),
        (1.0, 1 + 1.1e-9, False),
        (-2e30, -2e30 * (1 + 1.1e-9), False),
        (0.0, 1e-300, False),
        (0.0, None, False),
        (None, None, True),
        ("span 6.5", "span 6.5", True),
        ("span 6.33333333333333 m", "span 6.333333333333333 m", True),
        ("span 6.3333333333333 m", "span 6.3333333333334 m", False),
        ("1 and 2", "1 and 3", False),
        ("1 and 2", "1 or 2", False),
        ("a", "A", False),
        (True, 1.0, False),
        (True, True, True),
        ("1", 1.0, False),
        (ErrorValue("#N/A"), ErrorValue("#N/A"), True),
        (ErrorValue("#N/A"), ErrorValue("#REF!"), False),
        (ErrorValue("#VALUE!"), ErrorValue("#SPILL!"), True),
        (ErrorValue("#N/A"), "#N/A", False),
        ("#N/A", ErrorValue("#N/A"), False),
    ],
)
def test_what_counts_as_the_same(stored: Any, computed: Any, alike: bool) -> None:
    """Numbers to 1e-9, numbers inside texts to 1e-14, all else exactly, and nothing of another kind."""
    assert agree(stored, computed) is alike


# --- what is known to have changed ----------------------------------------------------------------


@pytest.mark.parametrize(
    ("way", "above"),
    [
        ("=A2+1", "=twice(1)"),
        ("=A2+1", "=twice(1)*0+7"),
        ("=A3+1", "=twice(1)"),
        ("=SUM(A1:A9)", "=twice(1)"),
        ("=SUM(A:A)", "=twice(1)"),
        ("=SUM(2:2)", "=twice(1)"),
        ("=SUM(Over)", "=twice(1)"),
        ("=Sum_of_over", "=twice(1)"),
        ("=OFFSET(A1,1,0)", "=twice(1)"),
        ('=INDIRECT("A"&2)+1', "=twice(1)"),
        ("=SUM(A1:INDEX(A:A,3))", "=twice(1)"),
        ("=Data!A1+1", "=twice(1)"),
        ("=A2+1", "=1+1"),
        ("=A2+1", "=TODAY()"),
    ],
)
def test_a_changed_input_makes_a_stored_value_old(way: str, above: str, tmp_path: Path) -> None:
    """A cell above which is a beam, stores nothing or is volatile: what was stored is not taken."""
    cells = {"A1": 1, "A2": above, "A3": "=A2", "B5": way, "B6": "=twice(B5)", "Data!A1": "=Plan!A2"}
    names = {"Over": "Plan!$A$1:$A$3", "Sum_of_over": "SUM(Plan!$A$1:$A$3)"}
    stored: dict[str, object] = {"B5": -1, "A3": -1}
    if above == "=TODAY()":
        stored["A2"] = 40000
    got, report = filled(book(tmp_path / "book.xlsx", cells, stored, names))
    assert got["B5"] > 0
    assert got["B6"] == 2 * got["B5"]
    assert not any(one.kept for one in report.differences)


def test_the_reason_for_recomputing_is_said(tmp_path: Path) -> None:
    """Cells not kept and not below a beam are listed with what has changed above them."""
    cells = {
        "A1": "=1+1",
        "B1": "=A1+1",
        "C1": "=B1*3",
        "D1": "=TODAY()",
        "E1": "=D1+1",
        "F1": "=twice(C1)",
        "F2": "=F1+1",
    }
    _, report = filled(
        book(tmp_path / "book.xlsx", cells, {"B1": 9, "C1": 27, "D1": 40000, "E1": 40001, "F1": 1, "F2": 1})
    )
    reasons = {one.cell: (one.kept, one.volatile, one.reason) for one in report.differences}
    assert reasons == {
        "B1": (False, False, "Plan!A1 has no stored value"),
        "C1": (False, False, "Plan!A1 has no stored value"),
        "D1": (False, True, "Plan!D1 is volatile"),
        "E1": (False, True, "Plan!D1 is volatile"),
    }


def test_below_a_volatile_cell_that_has_not_changed_stored_values_stand(tmp_path: Path) -> None:
    """Volatile cells are told apart; one that gives what it gave before has changed nothing."""
    cells = {"A1": "=OFFSET(A2,0,0)", "A2": 4, "B1": "=A1+1", "C1": "=twice(B1)"}
    got, report = filled(book(tmp_path / "book.xlsx", cells, {"A1": 4, "B1": 7}))
    assert (got["B1"], got["C1"]) == (7, 14)
    assert told(report) == {"Plan!B1": (7, 5, True, True)}


def test_a_reference_that_closes_a_circle_is_never_trusted(tmp_path: Path) -> None:
    """A number stored for a circular reference, as by a program that iterates, does not stand."""
    cells = {"A1": "=B1+1", "B1": "=A1/2", "C1": "=A1+1", "D1": "=twice(C1)"}
    got, report = filled(book(tmp_path / "book.xlsx", cells, {"A1": 2, "B1": 1, "C1": 3, "D1": 6}))
    assert [got[name] for name in ("A1", "B1", "C1", "D1")] == ["#VALUE!"] * 4
    assert {fault.cell for fault in report.errors} == {"A1", "B1", "C1", "D1"}


def test_what_is_inside_arrays_is_compared_and_kept_whole(tmp_path: Path) -> None:
    """An array formula of which one entry differs keeps all that it stored; the entry is listed."""
    cells = {"A1": 1, "A2": 2, "B1": ArrayFormula("B1:B2", "=A1:A2*10"), "C1": "=twice(B2)", "D1": "=SUM(B1:B2)"}
    path = store(build(tmp_path / "book.xlsx", cells | {"B2": 21}), {"B1": 10})
    got, report = filled(path)
    assert (got["B1"], got["B2"], got["C1"], got["D1"]) == (10, 21, 42, 31)
    assert told(report) == {"Plan!B2": (21, 20, True, False)}


def test_a_spilled_array_keeps_its_stored_extent(tmp_path: Path) -> None:
    """A spilling formula that gives another number of entries than stored stands as it was stored."""
    anchor = '<c r="A1" cm="1"><f t="array" ref="A1:A2">_xlfn.SEQUENCE(3)</f><v>1</v></c>'
    rows = f'<row r="1">{anchor}<c r="C1"><f>SUM(_xlfn.ANCHORARRAY(A1))</f></c><c r="D1"><f>twice(C1)</f></c></row>'
    path = from_xml(tmp_path / "book.xlsx", f'{rows}<row r="2"><c r="A2"><v>5</v></c></row>')
    got, report = filled(path)
    assert (got["A1"], got["A2"], got["C1"], got["D1"]) == (1, 5, 6, 12)
    assert b'ref="A1:A2"' in parts(report.target)[FIRST_SHEET]
    got, report = filled(path, Trust.ENGINE)
    assert (got["A1"], got["A2"], got["A3"], got["C1"], got["D1"]) == (1, 2, 3, 6, 12)


# --- what the engine cannot evaluate --------------------------------------------------------------


@pytest.mark.parametrize("formula", ["=no_such_function(A1)", "=[1]Sheet1!A1+A1", '=GETPIVOTDATA("x",A1)'])
def test_a_formula_that_cannot_be_evaluated_keeps_its_value_and_is_listed_as_an_error(
    formula: str, tmp_path: Path
) -> None:
    """Its stored value stands, for nothing above it has changed; the list of errors says so."""
    path = book(tmp_path / "book.xlsx", {"A1": 1, "B1": formula, "C1": "=twice(B1)"}, {"B1": 8})
    got, report = filled(path)
    assert (got["B1"], got["C1"]) == (8, 16)
    (fault,) = report.errors
    assert (fault.cell, fault.formula) == ("B1", formula)
    assert fault.value.startswith("#")
    assert fault.reason.endswith("; its stored value 8 is kept")
    got, report = filled(path, Trust.ENGINE)
    assert [fault.cell for fault in report.errors] == ["B1", "C1"]
    assert str(got["B1"]).startswith("#")


@pytest.mark.parametrize("formula", ["=no_such_function(A1)", "=SUM(no_such_name,1)", "=SUM(A1,"])
def test_a_formula_that_cannot_be_evaluated_is_an_error_when_a_beam_is_above_it(formula: str, tmp_path: Path) -> None:
    """What builds on a beam, or may do so, is never a number from another day."""
    got, report = filled(book(tmp_path / "book.xlsx", {"A1": "=twice(2)", "B1": formula}, {"A1": 4, "B1": 8}))
    assert str(got["B1"]).startswith("#")
    assert [fault.cell for fault in report.errors] == ["B1"]


def test_a_stored_error_stands_and_is_listed(tmp_path: Path) -> None:
    """An error that the saving program found where the engine has a value is kept, and is an error."""
    path = book(tmp_path / "book.xlsx", {"A1": "=1+1", "B1": "=twice(A1)"}, {"A1": "#N/A"})
    got, report = filled(path)
    assert got["A1"] == "#N/A"
    assert report.errors[0] == CellFault(
        "Plan", "A1", "#N/A", "it is the stored value, which is kept; evaluated here it is 2", "=1+1"
    )


def test_placeholders_are_no_values(tmp_path: Path) -> None:
    """A 0 stored by a program that asks for calculation on opening is none; other values stand, and that is said."""
    cells = {"A1": 4, "B1": "=A1+1", "B2": "=A1+2", "C1": "=twice(B1)"}
    path = store(build(tmp_path / "book.xlsx", cells), {"B1": 0, "B2": 9, "C1": 0}, asks_to_calculate=True)
    got, report = filled(path)
    assert got == {"A1": 4, "B1": 5, "B2": 9, "C1": 10}
    (one,) = report.differences
    assert (one.cell, one.kept) == ("B2", True)
    assert "asks to be calculated anew" in one.reason


@BOTH
def test_a_second_filling_changes_no_byte(trust: Trust, tmp_path: Path) -> None:
    """Whatever was decided on stored values, it is decided alike of a filled workbook."""
    cells = WRONG | {
        "B2": "=1/3",
        "B3": "=nothing_known(A1)",
        "B4": "=B4+1",
        "B5": '="x"&B2',
        "B6": "=B5&D1",
        "C2": "=B7*2",
    }
    cells |= {"B7": "=1+1", "F1": ArrayFormula("F1:F2", "=B1:B2*10"), "F2": 1}
    stored = {
        "B1": 11,
        "B2": "0.33333333333333298",
        "B3": 8,
        "B4": 3,
        "B6": "old",
        "C1": 12,
        "C2": 5,
        "D1": "#NAME?",
        "F1": 110,
    }
    first = fill(book(tmp_path / "book.xlsx", cells, stored), functions={"twice": twice}, trust=trust)
    second = fill(first.target, functions={"twice": twice}, trust=trust)
    assert parts(second.target) == parts(first.target)
    assert second.errors == first.errors


@BOTH
def test_without_beams_stored_values_stay(trust: Trust, tmp_path: Path) -> None:
    """In a workbook that calls no beam function what is stored stays, volatile or not, unless the engine is trusted."""
    cells = {"A1": "=TODAY()", "A2": "=1+1", "A3": "=A2+A1", "A4": "=A2*2"}
    stored = {"A1": 40000, "A2": 3, "A3": 40003}
    got, report = filled(book(tmp_path / "book.xlsx", cells, stored), trust)
    if trust is Trust.STORED:
        assert got == stored | {"A4": 6}
        assert told(report)["Plan!A2"] == (3, 2, True, False)
    else:
        assert (got["A2"], got["A4"]) == (2, 4)
        assert got["A1"] > 45000


def test_the_users_of_a_stored_value_are_named_the_first_few(tmp_path: Path) -> None:
    """Of many beam cells downstream the first three are named."""
    cells = {"A1": "=1+1"} | {f"B{row}": f"=twice(A$1+{row})" for row in range(1, 9)} | {"C1": "=twice(B1)"}
    _, report = filled(book(tmp_path / "book.xlsx", cells, {"A1": 3}))
    assert report.differences[0].used_by == ["Plan!B1", "Plan!B2", "Plan!B3", "..."]


def test_many_rows_of_running_totals_are_walked_once(tmp_path: Path) -> None:
    """Overlapping ranges and a deep chain, thousands of rows long, are no burden."""
    cells: dict[str, object] = {"A1": "=0.1+0.2=0.3", "D1": "=twice(1)"}
    stored: dict[str, object] = {"A1": True}
    path = tmp_path / "book.xlsx"
    rows = 4000
    for row in range(1, rows + 1):
        cells |= {f"B{row}": f"=IF($A$1,1,{row})", f"C{row}": f"=SUM(B$1:B{row})+0*C{row - 1}" if row > 1 else "=B1"}
        cells[f"E{row}"] = f"=twice(C{row})"
    path = build(path, cells)
    store(path, stored)
    got, report = filled(path)
    assert got[f"E{rows}"] == 2 * rows
    assert told(report) == {"Plan!A1": (True, False, True, False)}


@pytest.mark.parametrize("text", ["nan", "inf", "-inf", "1_2", "0x10"])
def test_what_is_no_number_of_the_file_format_is_not_taken_for_one(tmp_path: Path, text: str) -> None:
    """A stored text that only a programming language takes for a number counts as missing."""
    rows = f'<row r="1"><c r="A1"><v>4</v></c><c r="B1"><f>A1*2</f><v>{text}</v></c></row>'
    found, report = filled(from_xml(tmp_path / "plan.xlsx", rows))
    assert found["B1"] == 8
    assert report.errors == []


def test_a_formula_that_shares_one_that_stands_below_it_is_a_beam_cell(tmp_path: Path) -> None:
    """The order of the cells in the file does not decide what calls a beam function."""
    rows = (
        '<row r="1"><c r="A1"><v>3</v></c><c r="B1"><f t="shared" si="0"/><v>1</v></c></row>'
        '<row r="2"><c r="A2"><v>4</v></c><c r="B2"><f t="shared" ref="B1:B2" si="0">twice(A2)</f><v>1</v></c></row>'
    )
    found, report = filled(from_xml(tmp_path / "plan.xlsx", rows))
    assert (found["B1"], found["B2"], report.beam_cells) == (6, 8, 2)


@pytest.mark.parametrize("sheet", ["9", "-1", "x"])
def test_a_name_of_a_sheet_that_is_not_there_is_damage(tmp_path: Path, sheet: str) -> None:
    """It is said in one line, and nothing is done."""
    path = build(tmp_path / "plan.xlsx", {"A1": 1.0}, {"Load": "$A$1"})
    rewrite(
        path, "xl/workbook.xml", lambda xml: xml.replace(b'name="Load"', f'name="Load" localSheetId="{sheet}"'.encode())
    )
    with pytest.raises(NotFilled, match="damaged"):
        fill(path)


def test_circles_are_errors_also_where_the_workbook_lets_them_iterate(tmp_path: Path) -> None:
    """A workbook that goes round its circles elsewhere has no number here that depends on the number of rounds."""
    path = build(tmp_path / "plan.xlsx", {"A1": "=twice(B1)", "B1": "=1+A1/100"})
    rewrite(path, "xl/workbook.xml", lambda xml: xml.replace(b"<calcPr ", b'<calcPr iterate="1" iterateCount="3" '))
    _, report = filled(path)
    assert {one.cell for one in report.errors} == {"A1", "B1"}
    assert all("circular" in one.reason for one in report.errors)


def test_a_fault_of_this_program_is_one_line(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """What nobody foresaw is no traceback, and does not end the check of a folder."""
    monkeypatch.setattr(filling, "Filling", lambda *_, **__: 1 / 0)
    with pytest.raises(NotFilled, match="ZeroDivisionError"):
        fill(build(tmp_path / "plan.xlsx", {"A1": 1.0}))
