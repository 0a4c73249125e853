"""What beam cells cost in a real LibreOffice Calc, beside a native closed formula.

Run: pytest -s tests/benchmarks/test_calc.py. Timings depend on the machine; read the ratios within one run. No test
fails for being slow, but one does where the time to open a workbook grows faster than its cells.
"""

from __future__ import annotations

import sys
import time
from collections.abc import Iterator
from pathlib import Path
from statistics import median

import openpyxl
import pytest

sys.path.insert(0, str(Path(__file__).parent.parent))
from calc_office import CalcOffice, running

ROWS = 10_000
REPEATS = 5
WORSE_THAN_LINEAR = 2.0
NATIVE = "=B{n}*A{n}^2/8"
"""The largest moment of a simple beam of length A under a load B, as an engineer types it."""
OURS = {
    "a cell, one beam a row": '=moment_max("pinned "&A{n}&" roller"; "udl "&B{n})',
    "a cell, one beam for all": '=moment_at("pinned 20 roller"; "udl 12"; A{n})',
}


@pytest.fixture(scope="module")
def calc(tmp_path_factory: pytest.TempPathFactory) -> Iterator[CalcOffice]:
    """An office with the extension."""
    folder = tmp_path_factory.mktemp("calc")
    with running(folder / "profile", folder / "server") as office:
        yield office


def timed(calc: CalcOffice, formula: str, first_row: int = 1) -> tuple[float, float]:
    """Seconds to compute a column of a formula for the first time, and again."""
    book = calc.new()
    last = first_row + ROWS - 1
    numbers = [[f"={2 + n / 1000}", f"={1 + n / 7000}"] for n in range(ROWS)]
    calc.enter_block(book, f"A{first_row}:B{last}", numbers)
    calc.calculates_itself(book, False)
    calc.enter_block(book, f"C{first_row}:C{last}", [[formula.format(n=n)] for n in range(first_row, last + 1)])
    began = time.perf_counter()
    calc.calculates_itself(book, True)
    values = calc.data(book, f"C{first_row}:C{last}")
    cold = time.perf_counter() - began
    warm = median(calc.recalculate(book) for _ in range(REPEATS))
    assert all(isinstance(row[0], float) for row in values)
    calc.close(book)
    return cold, warm


def test_recalculation(calc: CalcOffice) -> None:
    """10,000 cells computed for the first time, and again, as ratios to a native formula."""
    native = timed(calc, NATIVE)
    print(f"\n{'':28}{'first':>12}{'again':>12}{'ratios':>16}")
    print(f"{'a native formula':28}{1e6 * native[0] / ROWS:>9.1f} us{1e6 * native[1] / ROWS:>9.1f} us")
    for name, formula in OURS.items():
        cold, warm = timed(calc, formula)
        ratios = f"{cold / native[0]:.1f}, {warm / native[1]:.1f}"
        print(f"{name:28}{1e6 * cold / ROWS:>9.1f} us{1e6 * warm / ROWS:>9.1f} us{ratios:>16}")


def test_an_array(calc: CalcOffice) -> None:
    """One array formula over 10,000 places is one call: what it takes a place."""
    book = calc.new()
    calc.enter_block(book, f"A1:A{ROWS}", [[f"={n / 1000}"] for n in range(ROWS)])
    calc.enter_array(book, f"B1:B{ROWS}", f'=moment_at("pinned 20 roller"; "udl 12"; A1:A{ROWS})')
    warm = median(calc.recalculate(book) for _ in range(REPEATS))
    print(f"\none array formula: {1e6 * warm / ROWS:.1f} us a place")
    calc.close(book)


@pytest.mark.parametrize("kind", ["one column", "every second cell", "a protected sheet", "beside unknown functions"])
def test_opening(calc: CalcOffice, tmp_path: Path, kind: str) -> None:
    """A workbook with ten times as many plain names takes at most twice ten times as long to open and compute."""
    seconds = {}
    for rows in (1_000, ROWS):
        book = openpyxl.Workbook()
        sheet = book.worksheets[0]
        for n in range(1, rows + 1):
            call = f'=moment_at("pinned 20 roller","udl 12",A{n})'
            sheet.append([n / 1000, call if n % 2 or kind != "every second cell" else f"=A{n}*2"])
        if kind == "beside unknown functions":
            sheet["C1"] = "=_xlfn.NEWER(A1)"
        sheet.protection.sheet = kind == "a protected sheet"
        path = tmp_path / f"{rows}.xlsx"
        book.save(path)
        began = time.perf_counter()
        opened = calc.open(path)
        found = [row[0] for row in calc.data(opened, f"B1:B{rows}")]
        seconds[rows] = time.perf_counter() - began
        places = [n / 1000 for n in range(1, rows + 1)]
        moments = [120 * x - 6 * x**2 for x in places]
        if kind == "every second cell":
            moments[1::2] = [2 * x for x in places[1::2]]
        assert found == pytest.approx(moments, rel=1e-12)
        calc.close(opened)
    print(
        f"\n{kind}: " + ", ".join(f"{rows:,} cells have values after {taken:.2f} s" for rows, taken in seconds.items())
    )
    assert seconds[ROWS] / seconds[1_000] < WORSE_THAN_LINEAR * ROWS / 1_000
