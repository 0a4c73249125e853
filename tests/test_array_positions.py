"""Array formulas that ask areas for their rows, and those that are in a circle."""

from __future__ import annotations

from pathlib import Path

from books import build, values
from openpyxl.worksheet.formula import ArrayFormula

from beamfuncs.hosts.headless.filling import fill


def test_an_area_asked_for_its_rows_makes_no_circle(tmp_path: Path) -> None:
    """`ROW(1:3)` in the rows 1 to 3, and an area that holds the array itself, are asked for their places alone."""
    cells = {
        "A1": ArrayFormula("A1:A3", "=ROW($A$1:$A$3)*2"),
        "B1": ArrayFormula("B1:B3", "=ROW(1:3)+0"),
        "D1": ArrayFormula("D1:F1", "=COLUMN($D:$F)"),
        "G1": "=SUM(A1:A3)",
    }
    report = fill(build(tmp_path / "book.xlsx", cells))
    got = values(report.target)
    assert [got[cell] for cell in ("A1", "A2", "A3", "B1", "B2", "B3")] == [2, 4, 6, 1, 2, 3]
    assert [got[cell] for cell in ("D1", "E1", "F1", "G1")] == [4, 5, 6, 12]
    assert not report.errors


def test_an_array_in_a_circle_is_in_error_in_all_its_cells(tmp_path: Path) -> None:
    """A blank in the second cell would count as 0 in what builds on it."""
    cells = {"A1": ArrayFormula("A1:A3", "=C1*{1;2;3}"), "C1": "=A1+1", "E1": "=A2+1", "F1": "=SUM(A2:A3)"}
    report = fill(build(tmp_path / "book.xlsx", cells))
    assert {fault.cell for fault in report.errors} == {"A1", "A2", "A3", "C1", "E1", "F1"}
    reasons = {fault.cell: fault.reason for fault in report.errors}
    assert "circular reference: Plan!A1 -> Plan!C1 -> Plan!A1" in reasons["A1"]
