"""What a row of a sweep costs, beside bare batched elimination. Run: pytest -s tests/benchmarks/test_sweep.py

Three spans, three loads, four results. Timings depend on the machine; read the ratios within one run. No test here
fails for being slow, but one does for growing faster than the rows, and one for memory.
"""

from __future__ import annotations

import resource
import subprocess
import sys
import time
from collections.abc import Callable

import numpy as np
import pytest

from beamfuncs import batch
from beamfuncs import functions as f
from beamfuncs.batch.shapes import Beams, shape
from beamfuncs.batch.stiffness import _System

BEAM = "fixed {a} pinned {b} pinned {c} roller"
LOADS = "G: udl 5; Q: udl {q} from 2 to 9; Q: point {p} at 3 in span 3"
ASKED = ["moment max", "moment min", "reaction 2", "deflection max"]
EI, COMBINATION = 24000.0, "1.35 G + 1.5 Q"
ROWS = 100_000
ROW_BY_ROW = 2_000
WORSE_THAN_LINEAR = 1.5
LARGEST = 1024**3
"""Bytes of memory that a million rows may take."""


def values(rows: int) -> dict[str, np.ndarray]:
    """Spans and loads, different in every row."""
    chance = np.random.default_rng(1)
    spans = {name: chance.uniform(4.0, 9.0, rows).round(3) for name in "abc"}
    return spans | {name: chance.uniform(1.0, 90.0, rows).round(2) for name in "qp"}


def filled(form: str, rows: dict[str, np.ndarray]) -> list[str]:
    """The text of each row."""
    columns = [column.tolist() for column in rows.values()]
    return [form.format(**dict(zip(rows, row, strict=True))) for row in zip(*columns, strict=True)]


def rate(rows: int, call: Callable[[], object], times: int = 3) -> float:
    """Rows a second, the best of some runs."""
    best = float("inf")
    for _ in range(times):
        began = time.perf_counter()
        call()
        best = min(best, time.perf_counter() - began)
    return rows / best


def matrices(rows: dict[str, np.ndarray]) -> np.ndarray:
    """The reduced stiffness matrix of each beam: freedoms that are held taken out."""
    form = shape(BEAM.format(a="\ue000", b="\ue000", c="\ue000"), "udl 1", EI, None)
    assert form is not None
    system = _System(Beams.of(form, np.array([rows[name] for name in "abc"])))
    count = len(rows["a"])
    full = np.zeros((count, system.size, system.size))
    for freedom in range(system.size):
        u = np.zeros((system.size, count))
        u[freedom] = 1.0
        i, j = system.couples(u)
        shear = (i + j) / system.L
        for e, freedoms in enumerate(zip(system.wi, system.ti, system.wj, system.tj, strict=True)):
            for row, force in zip(freedoms, (shear[e], i[e], -shear[e], j[e]), strict=True):
                full[:, row, freedom] += force
    return np.ascontiguousarray(full[:, system.free][:, :, system.free])


def test_rows_a_second(capsys: pytest.CaptureFixture[str]) -> None:
    """Row by row, a sweep of texts, a sweep over values, and the floor; the answers are the same."""
    rows = values(ROWS)
    lines, loads = filled(BEAM, rows), filled(LOADS, rows)
    reduced = matrices(rows)
    right = np.ones((ROWS, reduced.shape[1], 1))

    def one_by_one() -> list[object]:
        pairs = zip(lines[:ROW_BY_ROW], loads[:ROW_BY_ROW], strict=True)
        return [f.beam_result(line, load, [ASKED], EI, COMBINATION) for line, load in pairs]

    rates = {
        "row by row": rate(ROW_BY_ROW, one_by_one, 1),
        "sweep, all texts different": rate(ROWS, lambda: batch.sweep(lines, loads, ASKED, EI, COMBINATION)),
        "sweep, one text of loads": rate(ROWS, lambda: batch.sweep(lines, loads[0], ASKED, EI, COMBINATION)),
        "sweep_over": rate(ROWS, lambda: batch.sweep_over(BEAM, LOADS, ASKED, rows, EI, COMBINATION)),
        "numpy.linalg.solve alone": rate(ROWS, lambda: np.linalg.solve(reduced, right)),
    }
    floor = rates["numpy.linalg.solve alone"]
    with capsys.disabled():
        print(f"\n{'':28}{'rows/s':>12}{'of bare solve':>16}")
        for name, found in rates.items():
            print(f"{name:28}{found:12,.0f}{floor / found:15.1f}x")
    swept = batch.sweep_over(BEAM, LOADS, ASKED, rows, EI, COMBINATION)
    texts = batch.sweep(lines, loads, ASKED, EI, COMBINATION)
    assert np.array_equal(swept.values, texts.values)
    alone = np.array([answer[0] for answer in one_by_one()])  # type: ignore[index]
    assert np.allclose(swept.values[:ROW_BY_ROW], alone, rtol=1e-12, atol=1e-12)


def test_the_cost_grows_with_the_rows(capsys: pytest.CaptureFixture[str]) -> None:
    """From a thousand rows to a hundred thousand the time a row does not grow."""
    found = {}
    for count in (1_000, 10_000, 100_000):
        rows = values(count)
        lines = filled(BEAM, rows)
        found[count] = [
            1e6 / rate(count, lambda rows=rows: batch.sweep_over(BEAM, LOADS, ASKED, rows, EI, COMBINATION)),
            1e6 / rate(count, lambda lines=lines: batch.sweep(lines, "G: udl 5", ASKED, EI, COMBINATION)),
        ]
    with capsys.disabled():
        print(f"\n{'rows':>10}{'sweep_over':>16}{'sweep':>12}   microseconds a row")
        for count, (over, texts) in found.items():
            print(f"{count:10,}{over:16.2f}{texts:12.2f}")
    for smaller, larger in zip(found[10_000], found[100_000], strict=True):
        assert larger < WORSE_THAN_LINEAR * smaller


MILLION = """
import numpy as np
from beamfuncs import batch
lengths = np.linspace(4.0, 9.0, 1_000_000)
found = batch.sweep_over("fixed {a} pinned {a} pinned 6 roller", "udl 5; point {a} at 3", %r, {"a": lengths}, 24000.0)
assert np.isfinite(found.values).all()
"""


def test_a_million_rows_fit_into_a_gigabyte(capsys: pytest.CaptureFixture[str]) -> None:
    """A process of its own that sweeps a million rows holds less than 1 GB at its peak."""
    began = time.perf_counter()
    subprocess.run([sys.executable, "-c", MILLION % ASKED], check=True)
    peak = resource.getrusage(resource.RUSAGE_CHILDREN).ru_maxrss * 1024
    with capsys.disabled():
        print(f"\na million rows: {time.perf_counter() - began:.1f} s, {peak / 1e6:.0f} MB")
    assert peak < LARGEST
