"""Solving for an unknown: the number in the place of a `?` that brings a result to a target.

The result is worked out along a scan. Between two neighbours whose results lie on either side of the target the root is
bracketed, and closed in on without derivatives (R. P. Brent, Algorithms for Minimization without Derivatives, 1973,
ch. 4). Where the result comes near the target and turns back, its turning point is looked for first.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator
from itertools import pairwise

import numpy as np

from beamfuncs.cells import Cell, Frozen, as_text, flat
from beamfuncs.errors import BeamError, absent, impossible, unreadable
from beamfuncs.loads import Combination
from beamfuncs.notation import read_anew
from beamfuncs.results import Phrase, Result
from beamfuncs.stiffness import solve

MARK = "?"
LOW, HIGH = 1e-3, 1e15
"""The range of the unknown where none is given."""
A_DECADE = 40
"""Trials in each power of ten of a wide range; a range of one power of ten or less has ten times as many in all."""
NARROW = 10.0
EXACT = 1e-9
"""A root is one where the result is nearer to the target than this part of what it is at the ends of its bracket."""
SIDES = {"smallest": 0, "largest": -1}

Given = tuple[Frozen, Frozen, Frozen]
"""Beam, loads and stiffness."""
Result_of = Callable[[float], float]


def solve_unknown(
    given: Given,
    combination: Combination | None,
    phrase: Phrase,
    target: float,
    ends: tuple[float | None, float | None],
    which: str,
) -> float:
    """Return the smallest or the largest number in a range that brings the result of a phrase to a target."""
    marks = sum(cell.count(MARK) for value in given for cell in flat(value) if isinstance(cell, str))
    if marks != 1:
        raise unreadable(
            f"solve_for: {marks} question marks in beam, loads and stiffness; write one in the place of one number,"
            " e.g. 'fixed ? pinned'"
        )
    low, high = (usual if end is None else end for end, usual in zip(ends, (LOW, HIGH), strict=True))
    if not low < high:
        raise impossible(f"low, high: {low:g} to {high:g} is no range; low is the smaller")

    def result(value: float) -> float:
        return _answer(given, combination, phrase, value)

    found = _roots(result, target, _scan(low, high))
    if not found:
        raise absent(
            f"solve_for: no number from {low:g} to {high:g} brings the result to {target:g}; it is"
            f" {_told(result, low)} and {_told(result, high)} at the ends"
        )
    return found[SIDES[which]]


def _answer(given: Given, combination: Combination | None, phrase: Phrase, value: float) -> float:
    beam, loads, stiffness = (_with(one, value) for one in given)
    line, placed = read_anew(beam, loads, stiffness)
    return Result.of(solve(line, placed), placed.factors(combination)).answer(phrase)


def _with(given: Frozen, value: float) -> Frozen:
    """Return an argument with the number in the place of its question mark."""

    def replaced(cell: Cell) -> Cell:
        if not isinstance(cell, str) or MARK not in cell:
            return cell
        return value if cell.strip() == MARK else cell.replace(MARK, as_text(value))

    if isinstance(given, tuple):
        return tuple(tuple(map(replaced, row)) for row in given)
    return replaced(given)


def _scan(low: float, high: float) -> list[float]:
    if low > 0.0 and high / low > NARROW:
        places = np.geomspace(low, high, int(np.ceil(A_DECADE * np.log10(high / low))) + 1)
    else:
        places = np.linspace(low, high, 10 * A_DECADE + 1)
    return [float(place) for place in places]


def _roots(result: Result_of, target: float, scan: list[float]) -> list[float]:
    """Return the roots from left to right; where the result cannot be worked out there is none."""

    def miss(value: float) -> float:
        return result(value) - target

    tried = [(value, _or_none(miss, value)) for value in scan]
    found = {value for value, at in tried if at == 0.0}
    for (a, at_a), (b, at_b) in pairwise(tried):
        if at_a and at_b and (at_a < 0.0) != (at_b < 0.0):
            found.update(_between(miss, a, b, at_a, at_b))
    for (a, at_a), (_, at_m), (b, at_b) in zip(tried, tried[1:], tried[2:], strict=False):
        if at_a and at_m and at_b and _turns(at_a, at_m, at_b):
            found.update(_about_a_turn(miss, a, b, at_a, at_b))
    return sorted(found)


def _or_none(miss: Result_of, value: float) -> float | None:
    try:
        return miss(value)
    except BeamError:
        return None


def _between(miss: Result_of, a: float, b: float, at_a: float, at_b: float) -> Iterator[float]:
    """Yield the root in a bracket; none where the result jumps over the target."""
    from scipy.optimize import brentq

    try:
        root = float(brentq(miss, a, b, xtol=4e-16 * max(abs(a), abs(b)), rtol=1e-15, maxiter=200))
        if abs(miss(root)) <= EXACT * max(abs(at_a), abs(at_b)):
            yield root
    except BeamError:
        return


def _turns(at_a: float, at_m: float, at_b: float) -> bool:
    """Tell whether three neighbours on one side of the target come nearest to it in the middle."""
    same = (at_a < 0.0) == (at_m < 0.0) == (at_b < 0.0)
    return same and abs(at_m) <= min(abs(at_a), abs(at_b))


def _about_a_turn(miss: Result_of, a: float, b: float, at_a: float, at_b: float) -> Iterator[float]:
    """Yield the roots on either side of the place where the result comes nearest to the target."""
    from scipy.optimize import minimize_scalar

    sign = 1.0 if at_a > 0.0 else -1.0
    try:
        turn = minimize_scalar(
            lambda value: sign * miss(value), bounds=(a, b), method="bounded", options={"xatol": 1e-12 * b}
        )
    except BeamError:
        return
    nearest = float(turn.fun)
    if abs(nearest) <= EXACT * max(abs(at_a), abs(at_b)):
        yield float(turn.x)
    elif nearest < 0.0:
        yield from _between(miss, a, float(turn.x), at_a, sign * nearest)
        yield from _between(miss, float(turn.x), b, sign * nearest, at_b)


def _told(result: Result_of, value: float) -> str:
    try:
        return f"{result(value):.6g}"
    except BeamError as error:
        return f"an error ({error.reason[:40]})"
