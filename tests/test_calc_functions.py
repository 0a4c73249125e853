"""Every function in a real LibreOffice Calc: the golden table, errors, blanks, arrays, dependants."""

from __future__ import annotations

from collections.abc import Iterator
from typing import Any

import pytest
from calc_office import CalcOffice, running
from golden import GOLDEN, SHEET, Row, answer, bits_of, rows_of

from beamfuncs.catalogue import catalogue
from beamfuncs.errors import ErrorValue

ERROR_IN_RANGE = 504
"""What the office answers itself, without asking us, where a range holds an error."""


@pytest.fixture(scope="module")
def calc(tmp_path_factory: pytest.TempPathFactory) -> Iterator[CalcOffice]:
    """An office with the extension."""
    folder = tmp_path_factory.mktemp("calc")
    with running(folder / "profile", folder / "server") as office:
        yield office


@pytest.fixture
def book(calc: CalcOffice) -> Iterator[int]:
    """An empty workbook."""
    number = calc.new()
    yield number
    calc.close(number)


def seen(rows: list[list[Any]]) -> list[list[Any]]:
    """Cells as the golden table has them: an error is what the office shows of it."""
    return [[ErrorValue(cell[1]) if isinstance(cell, list) else cell for cell in row] for row in rows]


def has_error_in_range(row: Row) -> bool:
    """Whether a range of more than one cell holds an error."""
    ranges = [argument for argument in row.arguments if isinstance(argument, list)]
    return any(isinstance(cell, ErrorValue) for rows in ranges for line in rows for cell in line)


def entered(calc: CalcOffice, book: int, rows: tuple[Row, ...]) -> list[str]:
    """Enter calls one below the other, each as an array formula of the size of its answer; return their ranges.

    A call that gives one cell stands in column Z as an ordinary formula as well.
    """
    calc.add_sheet(book, SHEET)
    top, places = 1, []
    for row in rows:
        expected, formula = rows_of(answer(row)), row.formula(top, ";", f"${SHEET}.")
        calc.enter(book, {place: _typed(cell) for place, cell in row.cells(top).items()}, SHEET)
        place = f"A{top}:{'ABCDEFGH'[len(expected[0]) - 1]}{top + len(expected) - 1}"
        calc.enter_array(book, place, formula)
        places.append(place)
        if place.endswith(f":A{top}"):
            calc.enter(book, {f"Z{top}": formula})
            places[-1] = f"Z{top}:Z{top}"
        top += max(len(expected), row.height) + 1
    return places


def _typed(cell: Any) -> Any:
    return f"={cell}" if isinstance(cell, ErrorValue) else cell


def test_golden(calc: CalcOffice, book: int) -> None:
    """Every row of the table gives in Calc what it gives in Python, to the last bit, in an array formula or not.

    Where a range holds an error, Calc may answer an error of its own without asking.
    """
    wrong = []
    for row, place in zip(GOLDEN, entered(calc, book, GOLDEN), strict=True):
        expected = bits_of(rows_of(answer(row)))
        for where in {place, place.replace("Z", "A")}:
            shown = calc.read(book, where)
            own = all(isinstance(cell, list) and cell[0] == ERROR_IN_RANGE for line in shown for cell in line)
            if not (has_error_in_range(row) and own) and bits_of(seen(shown)) != expected:
                wrong.append((str(row), where, expected, shown))
    assert wrong == []
    assert {row.function for row in GOLDEN} == set(catalogue())


def test_errors_go_on(calc: CalcOffice, book: int) -> None:
    """An error goes through SUM with its own value, whole or as an entry of an array, and IFERROR answers it."""
    cells = {
        "A1": '=moment_at("fixed 8 pinned"; "udl 12"; "3,5")',
        "A2": '=moment_max("pinned 6 free"; "udl 12")',
        "A3": '=reaction("fixed 8 pinned"; "udl 12"; 9)',
        "B1": "=SUM(A1; 1)",
        "B2": "=SUM(A2; 1)",
        "B3": "=SUM(A3; 1)",
        "C1": "=IFERROR(A1; 7)",
        "C2": "=IFERROR(A2; 7)",
        "C3": "=IFERROR(A3; 7)",
        "D1": 1.0,
        "D2": "three",
        "D3": 99.0,
        "G1": "=SUM(E1; 1)",
        "G2": "=SUM(E2; 1)",
        "G3": "=SUM(E3; 1)",
        "H1": "=IFERROR(E3; 7)",
    }
    calc.enter(book, cells)
    calc.enter_array(book, "E1:E3", '=moment_at("fixed 8 pinned"; "udl 12"; D1:D3)')
    errors = ["#VALUE!", "#NUM!", "#N/A"]
    assert seen(calc.read(book, "A1:A3")) == seen(calc.read(book, "B1:B3")) == [[error] for error in errors]
    assert calc.read(book, "C1:C3") == [[7.0]] * 3
    assert seen(calc.read(book, "E1:E3")) == [[-42.0], ["#VALUE!"], ["#N/A"]]
    assert seen(calc.read(book, "G1:G3")) == [[-41.0], ["#VALUE!"], ["#N/A"]]
    assert calc.read(book, "H1") == [[7.0]]


def test_what_comes_in(calc: CalcOffice, book: int) -> None:
    """Omitted arguments, in the middle too, are not given; blanks of a range are blanks; an error comes out again."""
    calc.enter(
        book,
        {
            "A1": "pinned",
            "A2": 6.0,
            "A4": "roller",
            "B1": "=1/0",
            "C1": '=deflection_max(A1:A4; "udl 12";; 24000)',
            "C2": '=moment_max(A1:A4; "G: udl 12";;; "2 G")',
            "C3": '=moment_max(A1:A4; "udl 12"; F9; F9; F9)',
            "C4": '=moment_max(A1:A4; "udl 12")',
            "C5": '=moment_max(A1:A4; "")',
            "C6": '=moment_max(A1:A4; "udl 12"; B1)',
            "C7": "=moment_max()",
            "C8": "=beam_line(A1; A2; A4)",
            "C9": "=beam_line(A1:A4)",
            "C10": '=moment_max("pinned 6 roller"; "udl " & 12)',
        },
    )
    assert seen(calc.read(book, "C1:C10")) == [
        [pytest.approx(5 * 12 * 6**4 / (384 * 24000), rel=1e-12)],
        [pytest.approx(2 * 12 * 6**2 / 8, rel=1e-12)],
        [pytest.approx(12 * 6**2 / 8, rel=1e-12)],
        [pytest.approx(12 * 6**2 / 8, rel=1e-12)],
        ["#VALUE!"],
        ["#DIV/0!"],
        ["#VALUE!"],
        ["pinned 6 roller"],
        ["pinned 6 roller"],
        [pytest.approx(12 * 6**2 / 8, rel=1e-12)],
    ]


def test_results_in_formulas(calc: CalcOffice, book: int) -> None:
    """What can be an array is a number in an ordinary formula, and is summed whole by SUM."""
    calc.enter(
        book,
        {
            "A1": "fixed 8 pinned",
            "B1": 1.0,
            "B2": 3.0,
            "C1": '=ROUND(moment_at(A1; "udl 12"; 3) * 1.35; 1)',
            "C2": '=IF(moment_at(A1; "udl 12"; 3) > 29; "over"; "under")',
            "C3": '="M = " & moment_at(A1; "udl 12"; 3)',
            "C4": '=SUM(moment_at(A1; "udl 12"; B1:B2))',
            "C5": '=MAX(reactions(A1; "udl 12"))',
            "C6": '=INDEX(reactions(A1; "udl 12"); 2; 3)',
        },
    )
    assert calc.read(book, "C1:C6") == [[40.5], ["over"], ["M = 30"], [-12.0], [60.0], [36.0]]


def test_dependants_follow(calc: CalcOffice, book: int) -> None:
    """A cell is changed: the beam, a function of it, an array, and a formula on another sheet follow."""
    calc.add_sheet(book, "Pads")
    calc.enter(
        book,
        {"A1": "fixed", "A2": 8.0, "A3": "pinned", "B1": '=reaction(A1:A3; "udl 12"; 1)', "B2": "=beam_reads(A1:A3)"},
    )
    calc.enter_array(book, "C1:C2", '=moment_at(A1:A3; "udl 12"; D1:D2)')
    calc.enter(book, {"D1": 0.0, "D2": 4.0})
    calc.enter(book, {"A1": "=2*Sheet1.B1"}, "Pads")
    assert calc.read(book, "A1", "Pads") == [[120.0]]
    assert calc.read(book, "C1:C2") == [[-96.0], [48.0]]
    calc.enter(book, {"A2": 4.0})
    assert calc.read(book, "A1", "Pads") == [[60.0]]
    assert calc.read(book, "C1:C2") == [[-24.0], [0.0]]
    assert "length 4" in calc.read(book, "B2")[0][0]


def test_help(calc: CalcOffice) -> None:
    """The function wizard shows each function and its arguments with the catalogue's own words."""
    shown = calc.texts([name.upper() for name in catalogue()])
    assert shown == {
        name.upper(): [entry.summary, [[argument.name, argument.help] for argument in entry.arguments]]
        for name, entry in catalogue().items()
    }


def test_no_name_is_taken(calc: CalcOffice) -> None:
    """No function has the name of one that Calc has itself."""
    names = calc.names()
    assert [name for name in catalogue() if names.count(name.upper()) != 1] == []
