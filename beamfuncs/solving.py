"""From the arguments of a cell to its solved beam, each step kept: what is solved once is solved for every cell."""

from __future__ import annotations

from functools import lru_cache

from beamfuncs.adverse import Adverse
from beamfuncs.beam import Beam
from beamfuncs.cells import Argument, Frozen, frozen
from beamfuncs.loads import Loads
from beamfuncs.notation import read_beam, read_combination, read_loads
from beamfuncs.results import Result
from beamfuncs.stiffness import Solution, solve

KEPT = 20_480
"""How many solved beams, and how many of their combinations, are kept: a workbook asks column by column, so that all
beams of a column must be. An entry takes 12 kB for one span, 50 kB for twenty."""

_HASHED = frozenset({str, float, int, type(None)})


def solved(beam: Argument, loads: Argument, stiffness: Argument, combination: Argument) -> Result:
    """Return the solved beam under a combination of its loads."""
    return combined(
        beam if type(beam) in _HASHED else frozen("beam", beam),
        loads if type(loads) in _HASHED else frozen("loads", loads),
        stiffness if type(stiffness) in _HASHED else frozen("stiffness", stiffness),
        combination if type(combination) in _HASHED else frozen("combination", combination),
    )


@lru_cache(KEPT, typed=True)
def combined(beam: Frozen, loads: Frozen, stiffness: Frozen, combination: Frozen) -> Result:
    """Return the solved beam under a combination; equal arguments of equal type are answered from the cache."""
    line = read_beam(frozen("beam", beam), frozen("stiffness", stiffness))
    placed = read_loads(frozen("loads", loads), line)
    factors = placed.factors(read_combination(frozen("combination", combination)))
    return Result.of(columns(line, placed), factors)


def adverse(beam: Argument, loads: Argument, stiffness: Argument) -> Adverse:
    """Return the solved beam whose free loads act where they are adverse."""
    return _adverse(frozen("beam", beam), frozen("loads", loads), frozen("stiffness", stiffness))


@lru_cache(KEPT // 20, typed=True)
def _adverse(beam: Frozen, loads: Frozen, stiffness: Frozen) -> Adverse:
    line = read_beam(beam, stiffness)
    return Adverse(columns(line, read_loads(loads, line)))


@lru_cache(KEPT)
def columns(beam: Beam, loads: Loads) -> Solution:
    """Return the solved columns of a beam, one a load case."""
    return solve(beam, loads)
