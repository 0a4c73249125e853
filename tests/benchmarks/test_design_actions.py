"""What design actions cost: patterns by the number of spans, many combinations beside one solve. Run: pytest
tests/benchmarks

Timings depend on the machine; read the ratios within one run. No test here fails for being slow.
"""

from __future__ import annotations

from collections.abc import Callable
from time import perf_counter
from typing import Any

import pytest

from beamfuncs import functions as f
from beamfuncs import governing, notation, solving

EI = 24000.0
PATTERNS = "G: udl 5 each span; Q: udl 12 each span"
TRAIN = "axles 80 80 40 spaced 1.2 3.2 both ways"
LISTED = [[f"{1 + n / 20} G + {1.5 - n / 40} Q"] for n in range(20)]
CACHED = (
    solving.combined,
    solving.columns,
    solving._adverse,
    governing._of_one,
    notation.read_line,
    notation.read_beam,
    notation.read_clauses,
    notation.read_loads,
    notation.read_combination,
    notation.read_combinations,
)


def spans(number: int) -> str:
    """A continuous beam of equal spans."""
    return "pinned" + " 6 pinned" * number


def cold(call: Callable[[], Any]) -> Callable[[], Any]:
    """Return the call, every cache being emptied before it."""

    def run() -> Any:
        for cached in CACHED:
            cached.cache_clear()
        return call()

    return run


def seconds(call: Callable[[], Any], times: int = 7) -> float:
    """The median time of some calls."""
    taken = []
    for _ in range(times):
        start = perf_counter()
        call()
        taken.append(perf_counter() - start)
    return sorted(taken)[times // 2]


@pytest.mark.benchmark(group="envelope of patterns, two factors, 4 places a span")
@pytest.mark.parametrize("number", [10, 20, 40, 80])
def test_pattern_envelope_by_spans(benchmark: Any, number: int) -> None:
    """The whole table of shear, moment and deflection, highest and lowest."""
    benchmark.extra_info["spans"] = number
    benchmark(cold(lambda: f.envelope(spans(number), PATTERNS, "1.35/1.0 G + 1.5 Q", 4 * number + 1, EI)))


@pytest.mark.benchmark(group="highest moment of patterns anywhere, two factors")
@pytest.mark.parametrize("number", [10, 20, 40, 80])
def test_pattern_extreme_by_spans(benchmark: Any, number: int) -> None:
    """One extreme along the whole beam."""
    benchmark.extra_info["spans"] = number
    benchmark(cold(lambda: f.highest(spans(number), PATTERNS, "moment max", "1.35/1.0 G + 1.5 Q", EI)))


@pytest.mark.benchmark(group="highest moment of a train of three axles both ways")
@pytest.mark.parametrize("number", [1, 3, 10])
@pytest.mark.parametrize("phrase", ["moment at 2.4", "moment max"])
def test_train(benchmark: Any, number: int, phrase: str) -> None:
    """At one place, and anywhere on the beam."""
    benchmark(cold(lambda: f.highest(spans(number), TRAIN, phrase, None, EI)))


def test_ratios_are_printed(capsys: pytest.CaptureFixture[str]) -> None:
    """Prints patterns by the number of spans, and 20 combinations on 10 spans as a ratio to one solve.

    A place costs in proportion to the spans, the envelope to their square: each span has places, each place all parts.
    """
    loads = "G: udl 5; Q: udl 12; Q: point 40 at 3 in span 3"
    solve = seconds(cold(lambda: f.moment_max(spans(10), loads, None, EI, "1.35 G + 1.5 Q")), 21)
    rows = [f"one cold solve of 10 spans and its largest moment: {1e3 * solve:.2f} ms"]
    for name, text in (("loads that are always there", loads), ("patterns", PATTERNS)):
        for phrase in ("moment max", "reaction 2", "moment min"):
            ask = f.lowest if phrase.endswith("min") else f.highest
            many = seconds(cold(lambda ask=ask, text=text, phrase=phrase: ask(spans(10), text, phrase, LISTED, EI)))
            rows.append(f"20 combinations, {name}, {phrase}: {many / solve:.1f} cold solves")
    ways = {
        "one place": lambda n: f.highest(spans(n), PATTERNS, "moment at 8", "1.35/1.0 G + 1.5 Q", EI),
        "envelope, 4 places a span": lambda n: f.envelope(spans(n), PATTERNS, "1.35/1.0 G + 1.5 Q", 4 * n + 1, EI),
    }
    for name, ask in ways.items():
        taken = {n: seconds(cold(lambda ask=ask, n=n: ask(n)), 5) for n in (10, 20, 40, 80)}
        rows.append(f"patterns, {name}: " + ", ".join(f"{n} spans {1e3 * took:.1f} ms" for n, took in taken.items()))
    with capsys.disabled():
        print("\n" + "\n".join(rows))
    assert len(rows) == 9
