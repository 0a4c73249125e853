"""What the engine would work out wrongly without a word is refused, and named."""

from __future__ import annotations

from pathlib import Path

import pytest
from books import build, values

from beamfuncs.hosts.headless.filling import fill
from beamfuncs.hosts.headless.lifting import why_not_lifted

DATA = {"A1": "x1", "A2": "x2", "A3": "x1", "B1": 1.0, "B2": 2.0, "B3": 3.0}


def filled(path: Path, formula: str, more: dict[str, object] | None = None) -> tuple[object, dict[str, str]]:
    """The value of D1 with this formula, and the reasons of all cells in error."""
    report = fill(build(path / "plan.xlsx", {**DATA, **(more or {}), "D1": formula}), path / "out.xlsx")
    return values(path / "out.xlsx")["D1"], {one.cell: one.reason for one in report.errors}


@pytest.mark.parametrize(
    "formula",
    [
        '=SUMPRODUCT(--ISNUMBER(SEARCH("x",A1:A3)))',
        "=SUMPRODUCT(--(LEN(A1:A3)>1))",
        '=SUMPRODUCT(--(LEFT(A1:A3,1)="x"))',
        '=SUMPRODUCT(--EXACT(A1:A3,"x1"))',
        "=SUMPRODUCT(--NOT(ISERROR(A1:A3)))",
        "=SUMPRODUCT(ISERROR(A1:A3)*1)",
        '=IF(SUMPRODUCT(--ISERROR(A1:A3))=0,"OK","CHECK")',
    ],
)
def test_a_question_that_is_asked_of_one_cell_only_is_refused(tmp_path: Path, formula: str) -> None:
    """Inside SUMPRODUCT these would be worked out for one cell, or none: the cell is an error and says so."""
    value, errors = filled(tmp_path, formula)
    assert value == "#VALUE!"
    assert "not worked out cell by cell" in errors["D1"]


@pytest.mark.parametrize(
    ("formula", "value"),
    [
        ('=SUMPRODUCT((A1:A3="x1")*B1:B3)', 4),
        ("=LEN(A1)+SUMPRODUCT(B1:B3)", 8),
        ("=SUMPRODUCT(B1:B3,B1:B3)*LEN(A2)", 28),
        ("=IF(ISNUMBER(B1),SUMPRODUCT(B1:B3),0)", 6),
        ('=SUMPRODUCT(B1:B3)&LEFT("SUMPRODUCT(LEN(A1:A3))",3)', "6SUM"),
    ],
)
def test_sums_of_products_that_are_worked_out_stay(tmp_path: Path, formula: str, value: object) -> None:
    """Comparisons and products of ranges, and questions of single cells, are worked out."""
    assert filled(tmp_path, formula) == (value, {})


def test_array_formulas_are_held_to_the_same() -> None:
    """In an array formula the question is asked cell by cell too, without SUMPRODUCT."""
    assert why_not_lifted("SUM(LEN(A1:A3))", in_array=True)
    assert not why_not_lifted("SUM(LEN(A1:A3))", in_array=False)
    assert not why_not_lifted("SUM(LEN(A1))", in_array=True)


def test_errors_are_not_counted_by_their_text(tmp_path: Path) -> None:
    """COUNTIF of an error value finds none in the engine: refused."""
    value, errors = filled(tmp_path, '=COUNTIF(C1:C3,"#NUM!")', {"C1": '=moment_max("pinned 8 free","udl 1")'})
    assert value == "#VALUE!"
    assert "not counted here" in errors["D1"]


@pytest.mark.parametrize("formula", ["=IFERROR(MyVba(B1),0)", "=IFERROR(PHONETIC(A1),7)", "=IFERROR([1]Other!A1*B1,5)"])
def test_what_cannot_be_evaluated_is_not_hidden_by_iferror(tmp_path: Path, formula: str) -> None:
    """What is not known, or stands in another workbook, is an error of the cell and not what IFERROR puts."""
    value, errors = filled(tmp_path, formula, {"E1": "=D1+1"})
    assert value == "#VALUE!"
    assert "D1" in errors
    assert "takes #VALUE!" in errors["E1"]


def test_an_unknown_function_in_a_branch_that_is_not_taken_does_no_harm(tmp_path: Path) -> None:
    """Only what is asked counts."""
    assert filled(tmp_path, "=IF(B1>0,5,MyVba(1))") == (5, {})


def test_a_beam_error_that_iferror_answers_stays_answered(tmp_path: Path) -> None:
    """What the user guards against in a beam is the user's to decide."""
    assert filled(tmp_path, '=IFERROR(moment_max("pinned 8 free","udl 1"),-1)') == (-1, {})
