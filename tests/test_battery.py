"""The battery of ordinary formulas through `fill`: what is right stays right, and what is wrong is known by name."""

from __future__ import annotations

from itertools import chain
from pathlib import Path
from typing import Any

import pytest
from battery import CORE, DAYS_TO_1904, EXTRA, SPILLS, Case, build, row_of
from books import values
from second_opinion import second_opinion

from beamfuncs.hosts.headless.filling import Report, fill
from beamfuncs.hosts.headless.grid import area, cell_name

MISSES = {
    '="x"&2/3': "x0.6666666666666666",  # 16 digits where a spreadsheet joins 15
    "=0.1+0.2=0.3": False,  # compared to the last bit
    '="1,234"+1': "#VALUE!",  # nor a thousands mark in text
}
"""The formulas that do not get a spreadsheet's value, and what they get."""

RELATIVE = 1e-14


@pytest.fixture(scope="module", params=[False, True], ids=["days from 1900", "days from 1904"])
def filled(request: pytest.FixtureRequest, tmp_path_factory: pytest.TempPathFactory) -> tuple[bool, Report]:
    """The battery, filled; and whether its days count from 1904."""
    path = build(tmp_path_factory.mktemp("battery") / "battery.xlsx", request.param)
    return request.param, fill(path)


def expected(case: Case, counts_from_1904: bool) -> list[Any]:
    """The values of a formula's cells."""
    if case.counts_days and counts_from_1904:
        return [case.value - DAYS_TO_1904]
    return case.value if case.array else [case.value]


def same(value: Any, other: Any) -> bool:
    """Whether two values are equal: numbers to their last digit but one, and each kind only with its own."""
    if isinstance(value, bool) or isinstance(other, bool) or not isinstance(value, int | float):
        return type(value) is type(other) and value == other
    return isinstance(other, int | float) and abs(value - other) <= RELATIVE * abs(other)


def stored(report: Report) -> dict[str, list[Any]]:
    """The values that the filled battery holds, by formula."""
    cells = values(report.target, "Calc")
    return {
        case.formula: [cells.get(f"A{row_of(n) + k}") for k in range(len(case.value) if case.array else 1)]
        for n, case in enumerate(CORE + EXTRA)
    }


def test_every_formula_has_its_value_but_those_known_to_miss(filled: tuple[bool, Report]) -> None:
    """The core is right but for one, the rest but for three; each miss is just the one that is told of."""
    counts_from_1904, report = filled
    got = stored(report)
    wrong = {
        case.formula: got[case.formula]
        for case in CORE + EXTRA
        if not all(map(same, got[case.formula], expected(case, counts_from_1904)))
    }
    assert wrong == {formula: [value] for formula, value in MISSES.items()}
    assert [case.formula for case in CORE if case.formula in MISSES] == ['="x"&2/3']


def test_a_miss_that_is_an_error_is_listed(filled: tuple[bool, Report]) -> None:
    """Every error in the workbook is listed with a reason: the right ones, and the misses that are errors."""
    report = filled[1]
    right = {case.formula for case in CORE + EXTRA if str(case.value).startswith("#")}
    missed = {formula for formula, value in MISSES.items() if str(value).startswith("#")}
    assert {fault.formula for fault in report.errors} == right | missed | {"=A7*2"}
    assert all(fault.reason for fault in report.errors)


def test_arrays_spill(filled: tuple[bool, Report]) -> None:
    """Each spilling formula fills just its cells, and what refers to all that it fills has them."""
    cells = values(filled[1].target, "Calc")
    top = {name: value for name, value in cells.items() if not name.startswith("A")}
    right = {}
    for anchor, (_, extent, rows, _) in SPILLS.items():
        place = area(extent or anchor)
        right |= {cell_name(*cell): value for cell, value in zip(place.cells(), chain(*rows), strict=True)}
    assert top == right


def test_the_comparison_bites() -> None:
    """A value a few digits off, of another kind, or an error's text is not the same."""
    assert same(0.9, 0.8999999999999999)
    assert not same(0.9, 0.9 + 2e-14)
    assert not same(1, True)
    assert not same("1", 1)
    assert not same(None, 0)
    assert not same("#N/A", "#REF!")


def test_another_engine_works_out_the_same(tmp_path: Path) -> None:
    """A second engine has the value worked by hand for every formula, and `fill`'s where that is right."""
    path = build(tmp_path / "battery.xlsx")
    theirs, ours = second_opinion(path), stored(fill(path))
    assert theirs is not None
    for number, case in enumerate(CORE + EXTRA):
        theirs_here = theirs["Calc", f"A{row_of(number)}"]
        assert same(theirs_here, expected(case, False)[0]), case
        assert case.formula in MISSES or same(ours[case.formula][0], theirs_here), case
