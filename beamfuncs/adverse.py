"""The highest and the lowest of a result, every free part of the loads being there only where it is adverse.

What the parts do to a result is added up, each with that one of its two factors which makes more of it: superposition,
linear in the number of parts. Along the beam the sum is a polynomial between the places where some part changes its
sign, so that its extremes are at these places, at the ends, or where the derivative is zero.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass, field
from functools import cached_property
from typing import NamedTuple, cast

import numpy as np

from beamfuncs import anywhere
from beamfuncs.beam import Beam
from beamfuncs.fields import Fields, fields
from beamfuncs.influence import Held, InfluenceLine, Section, influence_lines
from beamfuncs.loads import Combination, Factors, Loads, Train
from beamfuncs.parts import Parts, chosen_factors
from beamfuncs.stiffness import Array, Solution
from beamfuncs.trains import Position, extremes

HIGHEST, LOWEST = 1, -1


class Governing(NamedTuple):
    """An extreme, and what makes it.

    `chosen` holds the factor of each column of the loads, `positions` where each train stands (None: it is absent), `x`
    the place, where one is sought.
    """

    value: float
    chosen: tuple[float, ...]
    positions: tuple[Position | None, ...]
    x: float | None = None


@dataclass(frozen=True, eq=False)
class Adverse:
    """A solved beam, ready to answer for the extremes of its results. It is itself alone: its hash is its identity."""

    solution: Solution
    _lines: dict[Section | Held, InfluenceLine] = field(default_factory=dict)
    _positions: dict[tuple[Section | Held, Train], tuple[Position, Position]] = field(default_factory=dict)
    _parts: dict[tuple[int, float, float], Parts] = field(default_factory=dict)

    @property
    def beam(self) -> Beam:
        return self.solution.beam

    @property
    def loads(self) -> Loads:
        return self.solution.loads

    # --- one result ---------------------------------------------------------------------------------------

    def at(self, result: Section | Held, combination: Combination | None, sign: int) -> Governing:
        """Return the extreme of a result of one place, the highest (`sign` 1) or the lowest (-1)."""
        columns, trains = self.loads.ranges(combination)
        return self.extreme(result, columns, trains, sign)

    def total(self, combination: Combination | None, sign: int) -> Governing:
        """Return the extreme of the total load, what stands on the beam of trains not counted."""
        columns, _ = self.loads.ranges(combination)
        value, chosen = chosen_factors(self.solution.columns[:, -1], columns, sign)
        return Governing(value, chosen, ())

    def extreme(
        self, result: Section | Held, columns: Sequence[Factors], trains: Sequence[Factors], sign: int
    ) -> Governing:
        """Return the extreme of a result of one place under columns and trains with these factors."""
        value, chosen = chosen_factors(self._column_values(result), columns, sign)
        positions: list[Position | None] = []
        for train, factors in zip(self.loads.trains, trains, strict=True):
            if not any(factors):
                positions.append(None)
                continue
            options: list[tuple[float, Position | None]] = [(0.0, None)]
            options += [(factor * p.value, p) for p in self._extremes(result, train) for factor in factors]
            moved, position = max(options, key=lambda option: sign * option[0])
            value += moved + _lane(self.line(result), train, factors, sign)
            positions.append(position)
        return Governing(value + 0.0, chosen, tuple(positions))

    def _extremes(self, result: Section | Held, train: Train) -> tuple[Position, Position]:
        if (result, train) not in self._positions:
            self._positions[result, train] = extremes(self.line(result), train)
        return self._positions[result, train]

    def line(self, result: Section | Held) -> InfluenceLine:
        """Return the influence line of a result."""
        if result not in self._lines:
            self._lines[result] = influence_lines(self.beam, [result])[0]
        return self._lines[result]

    def prepare(self, results: Sequence[Section | Held]) -> None:
        """Find the influence lines of many results at once, where there are trains."""
        if self.loads.trains:
            new = [result for result in results if result not in self._lines]
            self._lines.update(zip(new, influence_lines(self.beam, new), strict=True))

    def _column_values(self, result: Section | Held) -> Array:
        if isinstance(result, Section):
            return self._fields_at(result)
        marks, values = len(self.beam.marks), 8 * len(self.beam.lengths)
        return self.solution.columns[:, values + result.mark + marks * result.turns]

    def _fields_at(self, section: Section) -> Array:
        value = self._along.value(section.which, section.x, section.side)
        return np.broadcast_to(np.asarray(value, float), (len(self.loads.columns),))

    def stations(self, number: int) -> Iterator[tuple[float, str]]:
        """Yield evenly spaced places and every break, from left to right, with both sides of every jump."""
        return self._along.stations(number)

    @cached_property
    def _along(self) -> Fields:
        """The fields of all columns at once: every number in them is a vector, an entry a column."""
        columns = self.solution.columns
        ends = [list(columns[:, 8 * e : 8 * e + 8].T) for e in range(len(self.beam.lengths))]
        return fields(self.solution, cast("list[list[float]]", ends), cast("list[float]", list(np.eye(len(columns)))))

    # --- anywhere in a span or the beam -------------------------------------------------------------------

    def anywhere(self, which: int, combination: Combination | None, sign: int, start: float, end: float) -> Governing:
        """Return the largest value of a field between two marks under the loads that make it largest (`sign` 1), or
        the smallest under those that make it smallest (-1)."""
        columns, trains = self.loads.ranges(combination)
        if self.loads.trains:
            x, side = anywhere.place(self, which, columns, trains, sign, start, end)
            return self.extreme(Section(which, x, side), columns, trains, sign)._replace(x=x)
        value, x, chosen = self.along(which, start, end).largest(columns, sign)
        return Governing(sign * value + 0.0, chosen, (), x)

    def along(self, which: int, start: float, end: float) -> Parts:
        """Return a field of all columns between two marks."""
        if (which, start, end) not in self._parts:
            shape = (len(self.loads.columns),)
            stretches = [
                (s.x, s.length, np.array([np.broadcast_to(np.asarray(c, float), shape) for c in s.polynomials[which]]))
                for s in self._along.within(start, end)
            ]
            self._parts[which, start, end] = Parts.of(stretches)
        return self._parts[which, start, end]


def _lane(line: InfluenceLine, train: Train, factors: Factors, sign: int) -> float:
    if not train.lane:
        return 0.0
    return sign * sum(max(sign * factor * train.lane * area for factor in (*factors, 0.0)) for area in line.areas)
