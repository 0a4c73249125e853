"""The table of calls that all hosts share: what it must hold, and a workbook filled with every one of its rows."""

from __future__ import annotations

from itertools import pairwise
from math import isfinite, nextafter
from typing import Any

import openpyxl
import pytest
from books import build
from golden import GOLDEN, Row, answer, bits, bits_of, literal, rows_of
from openpyxl.utils import get_column_letter
from openpyxl.worksheet.formula import ArrayFormula

from beamfuncs.catalogue import Entry, catalogue
from beamfuncs.errors import NA, NUM, VALUE, ErrorValue
from beamfuncs.hosts.headless.filling import fill

IDS = [f"{row.function}-{number}" for number, row in enumerate(GOLDEN)]
ANSWERED = [(row, rows_of(answer(row))) for row in GOLDEN]


def given_after(row: Row, position: int) -> bool:
    """Whether an argument is left out although one behind it is given."""
    given = [n for n, argument in enumerate(row.arguments) if argument not in (None, [[None]])]
    return position < len(row.arguments) and position not in given and max(given, default=-1) > position


# --- what the table holds -------------------------------------------------------------------------


@pytest.mark.parametrize("entry", catalogue().values(), ids=lambda entry: entry.name)
def test_every_function_has_rows_that_answer_and_rows_that_fail(entry: Entry) -> None:
    """No function of the catalogue is missing, and each but `fault`, which never fails, shows an error too."""
    answers = [rows for row, rows in ANSWERED if row.function == entry.name]
    errors = [rows for rows in answers if isinstance(rows[0][0], ErrorValue)]
    assert len(answers) > len(errors)
    assert errors or entry.name == "fault"


@pytest.mark.parametrize("entry", catalogue().values(), ids=lambda entry: entry.name)
def test_every_optional_argument_is_left_out_at_the_end_and_in_the_middle(entry: Entry) -> None:
    """Of each function there are rows that end before each optional argument, and rows that skip one."""
    rows = [row for row in GOLDEN if row.function == entry.name]
    optional = [n for n, argument in enumerate(entry.arguments) if argument.optional and not argument.repeats]
    for position in optional:
        assert any(len(row.arguments) <= position for row in rows), f"{entry.name}: never ends before {position}"
        assert any(len(row.arguments) > position for row in rows), f"{entry.name}: never gives {position}"
        if position < len(entry.arguments) - 1:
            assert any(given_after(row, position) for row in rows), f"{entry.name}: never skips {position}"


@pytest.mark.parametrize("value", [VALUE, NUM, NA])
def test_every_kind_of_error_comes_as_a_whole_and_as_a_single_entry(value: str) -> None:
    """Each of the three error values is the whole answer of some row, and a lone entry among numbers in another."""
    answers = [[entry for line in rows for entry in line] for _, rows in ANSWERED]
    errors = [[entry for entry in entries if isinstance(entry, ErrorValue)] for entries in answers]
    assert [value] in answers
    assert any(found == [value] for found, entries in zip(errors, answers, strict=True) if len(entries) > 1)


def test_the_table_holds_every_shape_of_argument() -> None:
    """Rows, columns, blocks, single cells and blank cells come as ranges; error values come alone and in ranges."""
    ranges = [a for row in GOLDEN for a in row.arguments if isinstance(a, list)]
    shapes = {(min(len(rows), 2), min(len(rows[0]), 2)) for rows in ranges}
    assert shapes == {(1, 1), (1, 2), (2, 1), (2, 2)}
    assert any(rows == [[None]] for rows in ranges)
    assert any(None in line and len(rows) > 1 for rows in ranges for line in rows)
    assert any(isinstance(a, ErrorValue) for row in GOLDEN for a in row.arguments)
    assert any(isinstance(cell, ErrorValue) for rows in ranges for line in rows for cell in line)
    kinds = {type(a) for row in GOLDEN for a in row.arguments}
    assert kinds == {str, float, type(None), list, ErrorValue}


@pytest.mark.parametrize("row", GOLDEN, ids=IDS)
def test_a_worksheet_can_hold_the_row(row: Row) -> None:
    """Ranges are rectangles, numbers have at most 15 digits, and texts in a formula at most 255 characters."""
    for argument in row.arguments:
        rows = rows_of(argument)
        assert {len(line) for line in rows} == {len(rows[0])}
        for cell in (cell for line in rows for cell in line):
            assert isinstance(cell, (str, float, type(None)))
            if isinstance(cell, float):
                assert float(literal(cell)) == cell
        assert not isinstance(argument, str) or len(argument) <= 255
    assert len(row.formula(1)) < 8192


@pytest.mark.parametrize("row", GOLDEN, ids=IDS)
def test_the_expected_answer_is_numbers_texts_and_error_values(row: Row) -> None:
    """What hosts are compared with is a rectangle of finite numbers, texts or error values."""
    rows = rows_of(answer(row))
    assert {len(line) for line in rows} == {len(rows[0])}
    for entry in (entry for line in rows for entry in line):
        assert type(entry) in (float, str, ErrorValue)
        assert not isinstance(entry, float) or isfinite(entry)


def test_bits_tell_neighbouring_numbers_and_kinds_apart() -> None:
    """The comparison sees the last bit, the sign of zero, and whether a text is an error value."""
    different = [0.1, nextafter(0.1, 1), 0.0, -0.0, 1.0, 1, True, "1.0", "#N/A", ErrorValue("#N/A"), None]
    assert all(bits(a) != bits(b) for n, a in enumerate(different) for b in different[:n])


# --- a workbook that holds the table --------------------------------------------------------------


@pytest.fixture(scope="module")
def filled(tmp_path_factory: pytest.TempPathFactory) -> list[list[list[object]]]:
    """What a workbook with every row, each entered as an array formula over its answer's cells, is filled with."""
    cells: dict[str, object] = {}
    places = []
    top = {"Plan": 1, "Data": 1}
    for row, rows in ANSWERED:
        height, width = len(rows), len(rows[0])
        first, last = f"A{top['Plan']}", f"{get_column_letter(width)}{top['Plan'] + height - 1}"
        cells |= {f"Data!{name}": value for name, value in row.cells(top["Data"]).items() if value is not None}
        formula = row.formula(top["Data"])
        cells[first] = formula if first == last else ArrayFormula(f"{first}:{last}", formula)
        places.append((top["Plan"], height, width))
        top = {"Plan": top["Plan"] + height, "Data": top["Data"] + row.height}
    path = build(tmp_path_factory.mktemp("golden") / "golden.xlsx", {"Data!A1": None, **cells})
    sheet = openpyxl.load_workbook(fill(path).target, data_only=True)["Plan"]

    def read(cell: Any) -> object:
        if cell.data_type == "e":
            return ErrorValue(cell.value)
        return float(cell.value) if type(cell.value) is int else cell.value or ""

    return [
        [[read(sheet.cell(start + i, 1 + j)) for j in range(width)] for i in range(height)]
        for start, height, width in places
    ]


@pytest.mark.parametrize("number", range(len(GOLDEN)), ids=IDS)
def test_a_filled_workbook_holds_what_the_function_answers(number: int, filled: list[list[list[object]]]) -> None:
    """Every number is the function's own to the last bit, every text and every error value is the same."""
    assert bits_of(filled[number]) == bits_of(rows_of(answer(GOLDEN[number])))


def test_ranges_of_a_row_do_not_touch() -> None:
    """Ranges that stand side by side keep a blank column between them, and formulas name the cells that hold them."""
    row = Row("moment_at", ([["fixed", 8.0, "pinned"]], "udl 12", [[1.0], [2.0]], [[None]]))
    assert row.formula(5) == '=moment_at(Data!A5:C5,"udl 12",Data!E5:E6,Data!G5)'
    assert row.formula(5, ";", "$Data.") == '=moment_at($Data.A5:C5;"udl 12";$Data.E5:E6;$Data.G5)'
    assert row.cells(5) == {"A5": "fixed", "B5": 8.0, "C5": "pinned", "E5": 1.0, "E6": 2.0, "G5": None}
    assert row.height == 2
    assert [a < b for a, b in pairwise(sorted(row.cells(5)))] == [True] * 5
