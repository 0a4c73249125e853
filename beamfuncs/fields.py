"""Exact fields of shear, moment, slope and deflection along a beam: values, sides, extremes, roots."""

from __future__ import annotations

from bisect import bisect_left, bisect_right
from collections.abc import Iterator, Sequence
from dataclasses import dataclass, field
from itertools import pairwise
from typing import NamedTuple, TypeAlias

import numpy as np

from beamfuncs.beam import Beam
from beamfuncs.loads import Couple, Distributed, Kink, Point, Slip
from beamfuncs.stiffness import Piece, Solution

FIELDS = ("shear", "moment", "slope", "deflection")
SHEAR, MOMENT, SLOPE, DEFLECTION = range(4)
LEFT, RIGHT = "left", "right"

TIE = 1e-12
"""Values that differ by less than this part of the largest one are equal, as far as rounding can tell."""

Polynomial: TypeAlias = tuple[float, ...]
"""Coefficients, lowest power first."""


class Stretch(NamedTuple):
    """The fields between two neighbouring breaks `x` and `end`, as polynomials in the distance `s` from `x`.

    `polynomials` and `ends` hold one entry for each of `FIELDS`; `ends` are the values at the right end, at a mark
    those of the solve, so that a moment that is zero there is zero and no rounding of a polynomial.
    """

    x: float
    end: float
    length: float
    polynomials: tuple[Polynomial, Polynomial, Polynomial, Polynomial]
    ends: tuple[float, ...]

    def value(self, which: int, s: float) -> float:
        """Return a field's value at `s`, the side inside the stretch being meant at its ends."""
        return self.ends[which] if s >= self.length else evaluate(self.polynomials[which], s)

    def stationary(self, which: int) -> list[float]:
        """Return the places inside where a field has zero derivative."""
        return roots(derivative(self.polynomials[which]), self.length)

    def zeros(self, which: int) -> list[float]:
        """Return the places inside where a field is zero."""
        return roots(self.polynomials[which], self.length)


@dataclass(frozen=True)
class Fields:
    """The fields along a whole beam: stretches from left to right, with the fields that jump where they meet.

    `jumps[k]` names the fields that jump at the left end of stretch k; there is one more for the right end of the beam.
    """

    beam: Beam
    stretches: tuple[Stretch, ...]
    jumps: tuple[frozenset[int], ...]
    starts: tuple[float, ...] = field(init=False)
    _peaks: dict[int, float] = field(default_factory=dict, init=False, compare=False)

    def __post_init__(self) -> None:
        object.__setattr__(self, "starts", tuple(stretch.x for stretch in self.stretches))

    def value(self, which: int, x: float, side: str = RIGHT) -> float:
        """Return a field at `x`, on one side of a jump; at the ends of the beam, inside it."""
        k = max(bisect_right(self.starts, x) - 1, 0)
        stretch = self.stretches[k]
        s = x - stretch.x
        near = self.beam.near
        if stretch.length - s <= near:
            if side == LEFT or k + 1 == len(self.stretches):
                return stretch.ends[which]
            return self.stretches[k + 1].polynomials[which][0]
        if s <= near:
            return self.stretches[k - 1].ends[which] if side == LEFT and k else stretch.polynomials[which][0]
        return evaluate(stretch.polynomials[which], s)

    def peak(self, which: int) -> float:
        """Return a bound on the magnitude of a field, not far above its largest one."""
        if which not in self._peaks:
            bounds = (evaluate(tuple(map(abs, p.polynomials[which])), p.length) for p in self.stretches)
            self._peaks[which] = max(bounds)
        return self._peaks[which]

    def within(self, start: float, end: float) -> tuple[Stretch, ...]:
        """Return the stretches from one mark to another."""
        near = self.beam.near
        return self.stretches[bisect_left(self.starts, start - near) : bisect_left(self.starts, end - near)]

    def extreme(self, which: int, sign: int, start: float, end: float) -> tuple[float, float]:
        """Return the largest (`sign` 1) or smallest (-1) value of a field between two marks, and its first place."""
        candidates = []
        for p in self.within(start, end):
            candidates.append((p.x, p.value(which, 0.0)))
            candidates += [(p.x + s, p.value(which, s)) for s in p.stationary(which)]
            candidates.append((p.end, p.value(which, p.length)))
        best = max(sign * value for _, value in candidates)
        equal = TIE * self.peak(which)
        place = next(x for x, value in candidates if sign * value >= best - equal)
        return sign * best + 0.0, place

    def contraflexure(self) -> list[float]:
        """Return the places where the moment changes sign."""
        places = []
        zero = TIE * self.peak(MOMENT)
        last_sign, last_end = 0, 0.0
        for p in self.stretches:
            for a, b in pairwise((0.0, *p.zeros(MOMENT), p.length)):
                value = evaluate(p.polynomials[MOMENT], (a + b) / 2)
                sign = 0 if abs(value) <= zero else 1 if value > 0.0 else -1
                if sign:
                    if sign == -last_sign:
                        places.append(last_end)
                    last_sign, last_end = sign, p.end if b == p.length else p.x + b
        return places

    def stations(self, number: int) -> Iterator[tuple[float, str]]:
        """Return `number` evenly spaced places and every break, from left to right, with both sides of every jump."""
        near = self.beam.near
        breaks = [*self.starts, self.beam.length]
        even = np.linspace(0.0, self.beam.length, number).tolist()
        extra = [x for x in even if min(abs(x - b) for b in breaks[max(bisect_right(breaks, x) - 1, 0) :][:2]) > near]
        jumps = dict(zip(breaks[1:-1], self.jumps[1:-1], strict=True))
        for x in sorted(breaks + extra):
            if jumps.get(x):
                yield x, LEFT
            yield x, RIGHT


def fields(solution: Solution, ends: list[list[float]], factors: Sequence[float]) -> Fields:
    """Return the fields of a combination of the columns of a solution, from the combined states at the element ends."""
    stretches: list[Stretch] = []
    jumps: list[frozenset[int]] = []
    at_marks = _jumps_at_marks(solution)
    for e, states in enumerate(ends):
        parts, between = _element(solution.beam, e, states, solution.pieces[e], factors)
        stretches += parts
        jumps += [at_marks[e], *between]
    return Fields(solution.beam, tuple(stretches), (*jumps, at_marks[-1]))


def _element(
    beam: Beam, e: int, states: list[float], pieces: tuple[Piece, ...], factors: Sequence[float]
) -> tuple[list[Stretch], list[frozenset[int]]]:
    """Return the stretches of one element, and the fields that jump between them."""
    length, near = beam.lengths[e], beam.near
    EI = beam.stiffness.EI[e] if beam.stiffness else 1.0
    GA = beam.stiffness.GA[e] if beam.stiffness and beam.stiffness.GA else None
    breaks = [0.0]
    for place in sorted(place for piece in pieces for place in (piece.start, piece.end)):
        if near < place - breaks[-1] and length - place > near:
            breaks.append(place)
    breaks.append(length)
    concentrated: dict[float, list[Piece]] = {}
    for piece in pieces:
        if piece.start == piece.end:
            concentrated.setdefault(_nearest(breaks, piece.start), []).append(piece)
    state, _ = _across(states[:4], concentrated.get(0.0, ()), factors)
    stretches: list[Stretch] = []
    jumps: list[frozenset[int]] = []
    for a, b in pairwise(breaks):
        h, middle = b - a, (a + b) / 2
        q = q_end = kappa = 0.0
        for piece in pieces:
            if piece.start < middle < piece.end:
                if piece.kind is Distributed:
                    q += factors[piece.column] * piece.at(a)
                    q_end += factors[piece.column] * piece.at(b)
                else:
                    kappa += factors[piece.column] * piece.size
        polynomials = _polynomials(state, q, (q_end - q) / h, kappa, EI, GA)
        inside = b < length
        ends = [evaluate(p, h) for p in polynomials] if inside else states[4:]
        x, end = beam.x[e] + a, beam.x[e] + b if inside else beam.x[e + 1]
        stretches.append(Stretch(x, end, h, polynomials, tuple(ends)))
        if inside:
            state, jumping = _across(ends, concentrated.get(b, ()), factors)
            jumps.append(jumping)
    return stretches, jumps


_JUMPING = {Point: SHEAR, Couple: MOMENT, Kink: SLOPE, Slip: DEFLECTION}
_DOWN = {Point, Kink}
"""Those that make their field jump by minus their size."""


def _across(
    state: Sequence[float], pieces: Sequence[Piece], factors: Sequence[float]
) -> tuple[list[float], frozenset[int]]:
    """Return the fields to the right of what is concentrated in a place, and which of them differ from those before."""
    after = list(state)
    for piece in pieces:
        size = factors[piece.column] * piece.size
        which = _JUMPING[piece.kind]
        after[which] = after[which] - size if piece.kind in _DOWN else after[which] + size
    return after, frozenset(_JUMPING[piece.kind] for piece in pieces)


def _nearest(breaks: list[float], place: float) -> float:
    """Return the break that is nearest to a place."""
    index = bisect_left(breaks, place)
    return min(breaks[max(index - 1, 0) : index + 1], key=lambda b: abs(b - place))


def _polynomials(
    start: Sequence[float], q: float, dq: float, kappa: float, EI: float, GA: float | None
) -> tuple[Polynomial, Polynomial, Polynomial, Polynomial]:
    """Return the fields under the load q + dq s and the free curvature kappa, from their values at the left end.

    V' = -q, M' = V, phi' = -(M/EI + kappa), v' = phi + V/GA.
    """
    V, M, phi, v = start
    deflection = [v, phi, -(M / EI + kappa) / 2, -V / (6 * EI), q / (24 * EI), dq / (120 * EI)]
    if GA is not None:
        # Not in place: these may be vectors, an entry a column, and `phi` is the slope's own.
        deflection[1] = phi + V / GA
        deflection[2] = deflection[2] - q / (2 * GA)
        deflection[3] = deflection[3] - dq / (6 * GA)
    return (
        (V, -q, -dq / 2),
        (M, V, -q / 2, -dq / 6),
        (phi, -(M / EI + kappa), -V / (2 * EI), q / (6 * EI), dq / (24 * EI)),
        tuple(deflection),
    )


def _jumps_at_marks(solution: Solution) -> list[frozenset[int]]:
    beam = solution.beam
    jumps: list[set[int]] = []
    for mark in beam.marks:
        jumps.append({SHEAR} if mark.kv > 0.0 else set())
        if mark.kr > 0.0:
            jumps[-1].add(MOMENT)
        if mark.hinge:
            jumps[-1].add(SLOPE)
    for load in solution.loads.loads:
        if isinstance(load, Point | Couple):
            index = beam.mark_at(load.x)
            if index is not None:
                jumps[index].add(SHEAR if isinstance(load, Point) else MOMENT)
    return [frozenset(jump) for jump in jumps]


# --- polynomials ----------------------------------------------------------------------------------


def evaluate(polynomial: Polynomial, s: float) -> float:
    """Return the value of a polynomial at `s`.

    >>> evaluate((1.0, 2.0, 3.0), 2.0)
    17.0
    """
    value = 0.0
    for coefficient in reversed(polynomial):
        value = value * s + coefficient
    return value


def derivative(polynomial: Polynomial) -> Polynomial:
    """Return the derivative of a polynomial.

    >>> derivative((1.0, 2.0, 3.0))
    (2.0, 6.0)
    """
    return tuple(power * coefficient for power, coefficient in enumerate(polynomial))[1:]


def roots(polynomial: Polynomial, length: float) -> list[float]:
    """Return the places inside (0, length) where a polynomial is zero, from left to right; none where it is all zero.

    Between two neighbouring roots of its derivative a polynomial is monotone, so that a change of sign brackets
    exactly one root.

    >>> roots((-1.0, 0.0, 1.0), 3.0)
    [1.0]
    """
    while polynomial and polynomial[-1] == 0.0:
        polynomial = polynomial[:-1]
    if len(polynomial) < 2:
        return []
    if len(polynomial) == 2:
        s = -polynomial[0] / polynomial[1]
        return [s] if 0.0 < s < length else []
    found = []
    ends = [0.0, *roots(derivative(polynomial), length), length]
    for a, b in pairwise(ends):
        at_a, at_b = evaluate(polynomial, a), evaluate(polynomial, b)
        if at_a and at_b and (at_a < 0.0) != (at_b < 0.0):
            found.append(_bracketed(polynomial, a, b))
        elif at_b == 0.0 and b < length:
            found.append(b)
    return found


def _bracketed(polynomial: Polynomial, a: float, b: float) -> float:
    from scipy.optimize import brentq

    return float(brentq(lambda s: evaluate(polynomial, s), a, b, xtol=1e-16 * b, rtol=1e-15, maxiter=1000))
