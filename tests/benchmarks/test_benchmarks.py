"""What an answer costs, beside the bare library call at its heart. Run: pytest tests/benchmarks

Timings depend on the machine; read the ratios within one run. No test here fails for being slow.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np
import pytest
from scipy.linalg import solveh_banded

from beamfuncs import functions as f
from beamfuncs import notation, solving
from beamfuncs.notation import read_beam
from beamfuncs.stiffness import BANDS, _System

BEAM = "fixed 6 pinned 8 pinned 5.5 roller"
LOADS = "G: udl 5; Q: udl 12 from 2 to 9; Q: point 40 at 3 in span 3"
EI, COMBINATION = 24000.0, "1.35 G + 1.5 Q"
READERS = (
    notation.read_line,
    notation.read_beam,
    notation.read_clauses,
    notation.read_loads,
    notation.read_combination,
)


def forget() -> None:
    """Empty every cache, so that the next answer is a cold one."""
    for cached in (solving.combined, solving.columns, *READERS):
        cached.cache_clear()


def cold(call: Callable[[], Any]) -> Callable[[], Any]:
    """Return the call, every cache being emptied before it."""

    def run() -> Any:
        forget()
        return call()

    return run


def bands() -> np.ndarray:
    """Return the matrix of the three-span beam in scipy's banded form, freedoms that are held taken out."""
    system = _System(read_beam(BEAM, EI))
    full = np.zeros((system.size, system.size))
    for element in system.elements:
        freedoms = [element.wi, element.ti, element.wj, element.tj]
        for column in range(4):
            u = [float(n == freedoms[column]) for n in range(system.size)]
            i, j = element.couples(u)
            shear = (i + j) / element.L
            full[freedoms, freedoms[column]] += (shear, i, -shear, j)
    free = [n for n in range(system.size) if n not in system.held]
    full = full[np.ix_(free, free)]
    return np.array([np.pad(np.diagonal(full, -k), (0, k)) for k in range(BANDS) if k < len(free)])


@pytest.mark.benchmark(group="one three-span beam with three loads")
class TestThreeSpans:
    """Reading, solving and answering one beam, cold and warm."""

    def test_bare_solveh_banded(self, benchmark: Any) -> None:
        """The floor: scipy's banded solve of the beam's own matrix, two load cases."""
        matrix = bands()
        right = np.ones((matrix.shape[1], 2))
        benchmark(solveh_banded, matrix, right, lower=True)

    def test_cold_answer(self, benchmark: Any) -> None:
        """Text read, beam solved, combined, and its largest moment found."""
        benchmark(cold(lambda: f.moment_max(BEAM, LOADS, None, EI, COMBINATION)))

    def test_warm_place(self, benchmark: Any) -> None:
        """A further place on the same beam."""
        f.moment_at(BEAM, LOADS, 3.3, EI, COMBINATION)
        benchmark(f.moment_at, BEAM, LOADS, 3.3, EI, COMBINATION)

    def test_warm_phrase(self, benchmark: Any) -> None:
        """A further phrase on the same beam."""
        f.beam_result(BEAM, LOADS, "moment max in span 2", EI, COMBINATION)
        benchmark(f.beam_result, BEAM, LOADS, "moment max in span 2", EI, COMBINATION)

    def test_warm_combination(self, benchmark: Any) -> None:
        """A further combination of the same columns."""
        f.moment_max(BEAM, LOADS, None, EI, COMBINATION)

        def another() -> float:
            solving.combined.cache_clear()
            return f.moment_max(BEAM, LOADS, None, EI, "G + Q")

        benchmark(another)


@pytest.mark.benchmark(group="cold answer, by the number of spans")
@pytest.mark.parametrize("spans", [1, 10, 100, 1000])
def test_cost_by_spans(benchmark: Any, spans: int) -> None:
    """The cost of a cold answer grows in proportion to the spans."""
    line = "pinned" + " 5 pinned" * spans
    benchmark.extra_info["spans"] = spans
    benchmark(cold(lambda: f.moment_max(line, "G: udl 5; Q: point 3 at 2", None, EI, COMBINATION)))
