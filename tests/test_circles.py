"""Circular references: the chain is told in each cell of the circle, and from where in those that build on it."""

from __future__ import annotations

from pathlib import Path

from books import build

from beamfuncs.hosts.headless.filling import fill


def reasons(path: Path, cells: dict[str, object]) -> dict[str, str]:
    """The reason of each cell in error."""
    report = fill(build(path, cells), functions={})
    assert {fault.value for fault in report.errors} == {"#VALUE!"}
    return {f"{fault.sheet}!{fault.cell}": fault.reason for fault in report.errors}


def test_each_cell_of_a_circle_tells_its_chain(tmp_path: Path) -> None:
    """The chain goes from cell to the cell that it refers to, across sheets, and back to where it began."""
    cells = {"A1": "='Bo''s plan'!B2*2", "Bo's plan!B2": "=SUM(Plan!C1:C3)+Plan!D1", "C2": "=A1+1", "D1": 4}
    assert reasons(tmp_path / "book.xlsx", cells) == {
        "Plan!A1": "circular reference: Plan!A1 -> Bo's plan!B2 -> Plan!C2 -> Plan!A1",
        "Plan!C2": "circular reference: Plan!C2 -> Plan!A1 -> Bo's plan!B2 -> Plan!C2",
        "Bo's plan!B2": "circular reference: Bo's plan!B2 -> Plan!C2 -> Plan!A1 -> Bo's plan!B2",
    }


def test_a_cell_that_refers_to_itself_is_the_shortest_circle(tmp_path: Path) -> None:
    """By its name, or as part of a range or of a whole column."""
    cells = {"A1": "=A1+1", "B9": "=SUM(B1:B9)", "C9": "=SUM(C:C)"}
    assert reasons(tmp_path / "book.xlsx", cells) == {
        f"Plan!{cell}": f"circular reference: Plan!{cell} -> Plan!{cell}" for cell in cells
    }


def test_a_cell_that_builds_on_a_circle_says_on_which(tmp_path: Path) -> None:
    """It is in no circle itself: it names the cell of the circle that it comes to first."""
    cells = {"A1": "=B1", "B1": "=A1", "C1": "=B1+1", "C2": "=C1+1", "C3": "=SUM(C1:C2)", "D1": "=IF(TRUE,1,A1)"}
    found = reasons(tmp_path / "book.xlsx", cells)
    chain = "builds on Plan!B1, in a circular reference: Plan!B1 -> Plan!A1 -> Plan!B1"
    assert {cell: found[f"Plan!{cell}"] for cell in ("C1", "C2", "C3")} == dict.fromkeys(("C1", "C2", "C3"), chain)
    assert "Plan!D1" not in found


def test_two_circles_that_share_a_cell_are_told_by_the_shortest(tmp_path: Path) -> None:
    """Each cell tells its own shortest way back."""
    found = reasons(tmp_path / "book.xlsx", {"A1": "=B1+C1", "B1": "=A1", "C1": "=D1", "D1": "=A1"})
    assert found["Plan!A1"] == "circular reference: Plan!A1 -> Plan!B1 -> Plan!A1"
    assert found["Plan!C1"] == "circular reference: Plan!C1 -> Plan!D1 -> Plan!A1 -> Plan!C1"


def test_a_long_chain_is_cut_in_the_middle(tmp_path: Path) -> None:
    """Of a circle through thousands of cells, and of what builds on it, the reason stays one short line."""
    rows = 3000
    cells: dict[str, object] = {f"A{row}": f"=A{row + 1}" for row in range(1, rows)} | {f"A{rows}": "=A1"}
    cells |= {"B1": "=A7"} | {f"B{row}": f"=B{row - 1}" for row in range(2, rows)}
    found = reasons(tmp_path / "book.xlsx", cells)
    chain = "Plan!A1 -> Plan!A2 -> Plan!A3 -> 2994 more -> Plan!A2998 -> Plan!A2999 -> Plan!A3000 -> Plan!A1"
    assert found["Plan!A1"] == found["Plan!A1500"] == f"circular reference: {chain}"
    assert found[f"Plan!B{rows - 1}"] == f"builds on Plan!A7, in a circular reference: {chain}"
