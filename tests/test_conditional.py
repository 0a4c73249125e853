"""Conditional sums and counts: errors that meet the criteria are given, several criteria at once are refused."""

from __future__ import annotations

from pathlib import Path

import pytest
from books import build, values

from beamfuncs.hosts.headless.conditional import guarded
from beamfuncs.hosts.headless.filling import fill

PADS = {
    **{f"A{row}": pad for row, pad in enumerate(["P1", "P2", "P1", "P3", "P2"], 1)},
    **{f"B{row}": value for row, value in enumerate([10.5, "=1/0", 4, 7, 2], 1)},
    **{f"C{row}": float(row) for row in range(1, 6)},
}
SEVERAL = "several criteria at once are not evaluated here: give each a formula of its own"


@pytest.mark.parametrize(
    ("formula", "expected"),
    [
        ("SUM(A1:A9)", "SUM(A1:A9)"),
        ('SUMIF(A:A,"x")', 'SUMIF(A:A,c("x"))'),
        ('sumif(A:A, "x", B:B)', '(sumif(A:A,c("x"), B:B)+0*MAXIFS( B:B,A:A,c("x")))'),
        ("AVERAGEIF(A:A,D1,B:B)", "(AVERAGEIF(A:A,c(D1),B:B)+0*MAXIFS(B:B,A:A,c(D1)))"),
        ("SUMIFS(S,A,1,B,2)", "(SUMIFS(S,A,c(1),B,c(2))+0*MAXIFS(S,A,c(1),B,c(2)))"),
        ("AVERAGEIFS(S,A,1)", "(AVERAGEIFS(S,A,c(1))+0*MAXIFS(S,A,c(1)))"),
        ("COUNTIF(A,1)+COUNTIFS(A,1,B,2)", "COUNTIF(A,c(1))+COUNTIFS(A,c(1),B,c(2))"),
        ("_xlfn.MAXIFS(S,A,1)", "_xlfn.MAXIFS(S,A,c(1))"),
        ("IF(A1,COUNTIF(B:B,MAX(1,{2,3})),(1))", "IF(A1,COUNTIF(B:B,c(MAX(1,{2,3}))),(1))"),
        ("COUNTIF(A,COUNTIF(B,1))", "COUNTIF(A,c(COUNTIF(B,c(1))))"),
        ('COUNTIF(\'S,(\'!A:A,"a,("")")&"SUMIF(A,1)"', 'COUNTIF(\'S,(\'!A:A,c("a,("")"))&"SUMIF(A,1)"'),
        ("COUNTIF([1]S!A:A,1)", "COUNTIF([1]S!A:A,c(1))"),
        ("MYSUMIFS(A,1,2)+COUNT(1)", "MYSUMIFS(A,1,2)+COUNT(1)"),
        ("COUNTIF(A,1", "COUNTIF(A,1"),
        ("COUNTIF(A,1))+1", "COUNTIF(A,1))+1"),
    ],
)
def test_only_criteria_are_guarded(formula: str, expected: str) -> None:
    """Each criterion is handed through; sums and means are joined by what shows an error; the rest stays."""
    assert guarded(formula, "c(") == expected


def test_a_total_is_in_error_when_a_cell_that_belongs_to_it_is(tmp_path: Path) -> None:
    """A conditional sum or mean over a cell in error is that error; over other cells it is their sum or mean."""
    cells = PADS | {
        "D1": '=SUMIFS(B1:B5,A1:A5,"P2")',
        "D2": '=SUMIF(A:A,"P2",B:B)',
        "D3": '=AVERAGEIFS(B:B,A:A,"P2",C:C,">1")',
        "D4": '=AVERAGEIF(A1:A5,"P2",B1:B5)',
        "E1": '=SUMIFS(B1:B5,A1:A5,"P1")',
        "E2": '=SUMIF(A:A,"P1",B:B)',
        "E3": '=AVERAGEIFS(B:B,A:A,"P1",C:C,">1")',
        "E4": "=AVERAGEIF(A1:A5,A1,B1:B5)",
        "E5": '=SUMIFS(B:B,A:A,"P2",C:C,">2")',
        "E6": '=SUMIF(A1:A5,"P1",C1)',
        "E7": '=SUMIF(C1:C5,">2")',
        "E8": '=SUMIFS(B:B,A:A,"P9")',
        "E9": '=COUNTIFS(A:A,"P2",C:C,"<>5")',
        "E10": '=COUNTIF(A1:A5,"p*")',
    }
    report = fill(build(tmp_path / "book.xlsx", cells), functions={})
    got = values(report.target)
    assert [got[f"D{row}"] for row in range(1, 5)] == ["#DIV/0!"] * 4
    assert [got[f"E{row}"] for row in range(1, 11)] == [14.5, 14.5, 4, 7.25, 2, 4, 12, 0, 1, 5]
    assert {fault.cell: fault.reason for fault in report.errors if fault.cell != "B2"} == dict.fromkeys(
        ("D1", "D2", "D3", "D4"), "takes #DIV/0! from Plan!B2"
    )


def test_several_criteria_at_once_are_refused(tmp_path: Path) -> None:
    """Arrays and ranges of criteria are errors with their reason, not sums over nothing; one of each is a criterion."""
    cells = PADS | {
        "D1": "=SUM(SUMIF(C1:C5,{1,2},C1:C5))",
        "D2": '=SUM(COUNTIFS(A1:A5,{"P1","P2"}))',
        "D3": "=SUMPRODUCT(COUNTIF(A1:A5,A1:A5))",
        "D4": "=SUM(SUMIFS(C1:C5,A1:A5,A1:A2))",
        "E1": "=SUM(SUMIF(C1:C5,{2},C1:C5))",
        "E2": "=COUNTIF(A1:A5,A2:A2)",
        "E3": "=COUNTIF(C1:C5,F1)",
        "E4": "=COUNTIF(A1:A5,B2)",
    }
    report = fill(build(tmp_path / "book.xlsx", cells), functions={})
    got = values(report.target)
    assert (got["E1"], got["E2"], got["E3"]) == (2, 2, 0)
    assert {fault.cell: (fault.value, fault.reason) for fault in report.errors} == {
        "B2": ("#DIV/0!", "the formula gives #DIV/0!"),
        **dict.fromkeys(("D1", "D2", "D3", "D4"), ("#VALUE!", SEVERAL)),
        "E4": ("#DIV/0!", "the criterion is the error value #DIV/0! itself; mend that cell"),
    }


@pytest.mark.parametrize(
    "formula",
    [
        "=SUMIFS(C1:C5,A1:A4,A1)",
        "=SUMIFS(C1:C5,A1:A5,A1,B1:C5,1)",
        "=AVERAGEIFS($C$1:$C$5,Plan!$A$1:$A$6,A1)",
        "=COUNTIFS(A:A,A1,C1:C5,1)",
        "=_xlfn.MAXIFS(C1:C5,A1:E1,A1)",
        "=_xlfn.MINIFS(C1,A1:A2,A1)",
        "=1+IF(TRUE,SUMIFS(C1:C5,'Plan'!A1:B5,A1))",
    ],
)
def test_ranges_of_unlike_size_are_refused(formula: str, tmp_path: Path) -> None:
    """Where the ranges of a conditional sum differ in size it is #VALUE!, as in a spreadsheet."""
    report = fill(build(tmp_path / "book.xlsx", PADS | {"D1": formula}), functions={})
    found = {fault.cell: (fault.value, fault.reason) for fault in report.errors}
    assert found["D1"] == ("#VALUE!", "the ranges of a conditional sum or count are of unlike size")


@pytest.mark.parametrize(
    ("formula", "expected"),
    [
        ("=SUMIFS(C1:C5,A1:A5,A1)", 4),
        ("=SUMIFS(C:C,Plan!$A:$A,A1)", 4),
        ("=SUMIFS($C$1:C5,A$1:A5,A1)", 4),
        ("=SUMIF(A1:A5,A1,C1)", 4),
        ("=SUMIFS(C1:C5,$A1:$A5,A1)", 4),
        ("=COUNTIFS(A1:A5,A1,C1:C5,1)", 1),
    ],
)
def test_ranges_of_one_size_are_not(formula: str, expected: float, tmp_path: Path) -> None:
    """Ranges of one size, however they are written, have their sum; SUMIF takes the size of its first range."""
    report = fill(build(tmp_path / "book.xlsx", PADS | {"D1": formula}), functions={})
    assert values(report.target)["D1"] == expected
