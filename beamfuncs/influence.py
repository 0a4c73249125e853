"""Influence lines: the value of one result while a unit load, downward, moves along the beam.

Method: the influence line of a result is the deflected line of the beam under the motion that does work with it: a
support that sinks, a bend or a step of the line where moment or shear is asked for (H. F. B. Mueller-Breslau, Die
neueren Methoden der Festigkeitslehre, 1886), and by reciprocity (J. C. Maxwell 1864, E. Betti 1872) a unit load or a
couple where a deflection or a slope is asked for.
"""

from __future__ import annotations

from bisect import bisect_right
from collections.abc import Iterator, Sequence
from dataclasses import dataclass, replace
from functools import cached_property
from itertools import pairwise

import numpy as np

from beamfuncs.beam import NEAR, Beam
from beamfuncs.fields import DEFLECTION, LEFT, MOMENT, RIGHT, SHEAR, SLOPE, Polynomial, Stretch, evaluate, fields, roots
from beamfuncs.loads import Couple, Inner, Kink, Load, Loads, Point, Rotation, Settlement, Slip
from beamfuncs.stiffness import Array, solve

CAUSES: dict[int, type[Point | Couple | Kink | Slip]] = {SHEAR: Slip, MOMENT: Kink, SLOPE: Couple, DEFLECTION: Point}


@dataclass(frozen=True)
class Section:
    """A field at a place of the beam, on one side of it."""

    which: int
    x: float
    side: str = RIGHT


@dataclass(frozen=True)
class Held:
    """The reaction of the support at a mark, or its reaction moment where it `turns`."""

    mark: int
    turns: bool = False


@dataclass(frozen=True)
class InfluenceLine:
    """Cubic pieces between `x` and the next, each in the distance from its left end; zero beyond the beam.

    `ends` are the ordinates at the right ends of the pieces, `tips` those at the very ends of the beam: a load there is
    outside a section just inside. `cut` is the place where the line of a shear jumps by 1; no other line jumps.
    """

    x: tuple[float, ...]
    pieces: tuple[Polynomial, ...]
    ends: tuple[float, ...]
    tips: tuple[float, float]
    cut: float | None

    def value(self, x: float, side: str = RIGHT) -> float:
        """Return the ordinate at a place of the beam, on one side of a jump."""
        near = NEAR * self.x[-1]
        if x >= self.x[-1] - near:
            return self.ends[-1]
        k = max(bisect_right(self.x, x + near) - 1, 0)
        if side == LEFT and k > 0 and x <= self.x[k] + near:
            return self.ends[k - 1]
        return evaluate(self.pieces[k], max(x - self.x[k], 0.0)) + 0.0

    def rows(self, number: int) -> Iterator[tuple[float, float]]:
        """Yield x and ordinate at evenly spaced places and at every break, from left to right, both sides of a jump."""
        near = NEAR * self.x[-1]
        breaks = np.array(self.x)
        even = np.linspace(0.0, self.x[-1], number)
        extra = even[np.abs(even[:, None] - breaks).min(axis=1) > near]
        for x in sorted([*self.x, *extra.tolist()]):
            if x in self.x[1:-1] and self.cut is not None and abs(x - self.cut) <= near:
                yield x, self.value(x, LEFT)
            yield x, self.value(x)

    @cached_property
    def size(self) -> float:
        """The largest ordinate at the breaks and midway between them."""
        places = (*self.x, *((a + b) / 2 for a, b in pairwise(self.x)))
        return max(max(abs(self.value(x, side)) for side in (LEFT, RIGHT)) for x in places)

    @cached_property
    def coefficients(self) -> Array:
        """The coefficients of the pieces, lowest power first, a row each, with a row of zeros before and after."""
        table = np.zeros((len(self.pieces) + 2, 4))
        table[1:-1] = self.pieces
        return table

    @cached_property
    def areas(self) -> tuple[float, float]:
        """The area above zero, and the area below it as a negative number."""
        above = below = 0.0
        for (start, end), piece in zip(pairwise(self.x), self.pieces, strict=True):
            integral = (0.0, *(c / n for n, c in enumerate(piece, 1)))
            for a, b in pairwise((0.0, *roots(piece, end - start), end - start)):
                area = evaluate(integral, b) - evaluate(integral, a)
                above, below = above + max(area, 0.0), below + min(area, 0.0)
        return above, below


def influence_lines(beam: Beam, results: Sequence[Section | Held]) -> list[InfluenceLine]:
    """Return the influence line of each result, all from one factored matrix."""
    causes, loads, signs = [], [], []
    for part, result in enumerate(results, 1):
        load: Load
        if isinstance(result, Section):
            element, s = _inside(beam, result.x, result.side)
            causes.append(Inner(element, s, CAUSES[result.which], part))
            signs.append(1.0)
        else:
            load = (Rotation if result.turns else Settlement)(result.mark, 1.0, None, part)
            loads.append(load)
            signs.append(-1.0 if result.turns else 1.0)
    solution = solve(beam, Loads(tuple(loads), causes=tuple(causes)))
    column_of = {part: number for number, (_, part) in enumerate(solution.loads.columns)}
    lines = []
    for part, (sign, result) in enumerate(zip(signs, results, strict=True), 1):
        column = column_of[part]
        factors = [0.0] * len(signs)
        factors[column] = sign
        own = tuple(tuple(piece for piece in pieces if piece.column == column) for pieces in solution.pieces)
        ends = solution.combined(factors).ends
        along = fields(replace(solution, pieces=own), ends, factors)
        pieces = tuple(stretch.polynomials[DEFLECTION][:4] for stretch in along.stretches)
        at_ends = tuple(_at_end(stretch, result, beam.near) + 0.0 for stretch in along.stretches)
        cut = result.x if isinstance(result, Section) and result.which == SHEAR else None
        lines.append(InfluenceLine((*along.starts, beam.length), pieces, at_ends, (ends[0][3], ends[-1][7]), cut))
    return lines


def _at_end(stretch: Stretch, result: Section | Held, near: float) -> float:
    """Return the ordinate at the right end of a piece; where the left side of a cut stands there, before the step."""
    if isinstance(result, Section) and result.side == LEFT and abs(stretch.end - result.x) <= near:
        return evaluate(stretch.polynomials[DEFLECTION], stretch.length)
    return stretch.ends[DEFLECTION]


def _inside(beam: Beam, x: float, side: str) -> tuple[int, float]:
    """Return the element in which a place lies on its side, and its distance from the element's left end."""
    mark = beam.mark_at(x)
    if mark is None:
        element = beam.length_at(x)
        return element, x - beam.x[element]
    if mark == len(beam.lengths) or (side == LEFT and mark > 0):
        return mark - 1, beam.lengths[mark - 1]
    return mark, 0.0
