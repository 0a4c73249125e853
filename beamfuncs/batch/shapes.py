"""Shapes: a beam, its loads and their factors as read once, with slots for the numbers that differ from row to row.

A form is read by the notation itself, with a number of its own in the place of each slot; where that number turns up
in what was read is the slot. So a form means what the notation says that it means, and no text is built for a row.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property, lru_cache

import numpy as np

from beamfuncs.batch.columns import SLOT, Array, Flags, Indices
from beamfuncs.beam import LARGEST, RIGID, SMALLEST, Beam, Stiffness
from beamfuncs.cells import Frozen
from beamfuncs.errors import BeamError
from beamfuncs.loads import LARGEST as LARGEST_LOAD
from beamfuncs.loads import LOAD_KINDS, Clause, Combination, has_two_factors
from beamfuncs.loads import SMALLEST as SMALLEST_LOAD
from beamfuncs.notation import read_anew_beam, read_clauses, read_combination
from beamfuncs.stability import mechanism

_FIRST, _STEP = 1.0 + 2.0**-25, 2.0**-20
"""What is read in the place of the slots: exact in binary, near 1, increasing, and nothing that anybody writes."""


@dataclass(frozen=True)
class Shape:
    """What rows have in common. In `beam`, `clauses` and `combination` a number of `slots` stands for a slot."""

    beam: Beam
    clauses: tuple[Clause, ...]
    combination: Combination | None
    slots: dict[float, int]

    def number(self, number: float, values: Array) -> Array | float:
        """Return a number of the shape in each row: the values of its slot, or the one number that it is."""
        slot = self.slots.get(number)
        if slot is not None:
            found: Array = values[slot]
            return found
        slot = self.slots.get(-number)
        return number if slot is None else -values[slot]

    def numbers(self, numbers: tuple[float, ...], values: Array) -> Array:
        """Return numbers of the shape, a row for each, a column for each beam."""
        found = np.empty((len(numbers), values.shape[1]))
        for row, number in zip(found, numbers, strict=True):
            row[:] = self.number(number, values)
        return found

    def factor(self, case: str | None, values: Array) -> Array | float:
        """Return the factor of a case in each row."""
        if self.combination is None:
            return 1.0
        return next(
            (self.number(factor, values) for name, factor, _ in self.combination if name == (case or "").casefold()),
            0.0,
        )

    @cached_property
    def sprung(self) -> bool:
        return any(mark.sprung for mark in self.beam.marks)


@lru_cache(4096)
def shape(beam: Frozen, loads: Frozen, stiffness: Frozen, combination: Frozen) -> Shape | None:
    """Return the shape of four forms, their slots numbered in this order; None where they have no common solution.

    >>> found = shape(f"fixed {SLOT} pinned", "udl 12", None, None)
    >>> found.number(found.beam.lengths[0], np.array([[6.0, 8.0]])).tolist()
    [6.0, 8.0]
    """
    slots: dict[float, int] = {}

    def filled(form: Frozen) -> Frozen:
        if not isinstance(form, str):
            return form
        head, *rest = form.split(SLOT)
        words = [head]
        for piece in rest:
            value = _FIRST + len(slots) * _STEP
            slots[value] = len(slots)
            words += [repr(value), piece]
        return "".join(words)

    try:
        parts = [filled(form) for form in (beam, loads, stiffness, combination)]
        line = read_anew_beam(parts[0], parts[2])
        written = read_clauses.__wrapped__(parts[1])
        clauses = tuple(clause for clause in written if isinstance(clause, Clause) and not clause.each)
        factors = read_combination.__wrapped__(parts[3])
        found = Shape(line, clauses, factors, slots)
        # A case that is named twice has the sum of two factors: that is no slot.
        own = combination.count(SLOT) if isinstance(combination, str) else 0
        told = sum(abs(factor) in slots for _, factor, _ in factors or ())
        return found if clauses == written and told == own and _can_be_batched(found) else None
    except BeamError:
        return None


def _can_be_batched(found: Shape) -> bool:
    beam, factors = found.beam, found.combination
    if mechanism(beam) or has_two_factors(factors):
        return False
    if factors is not None and any(clause.case is None for clause in found.clauses):
        return False
    for clause in found.clauses:
        if clause.kind in ("settle", "rotate"):
            LOAD_KINDS[clause.kind].place(clause, beam)
        elif clause.support is not None:
            clause.spot(beam)
        beam.extent(clause.where, clause.span)
    return True


@dataclass(frozen=True)
class Beams:
    """Beams of one shape, a column a beam; where `sound` is false a number is out of range."""

    shape: Shape
    values: Array
    lengths: Array
    x: Array
    EI: Array
    GA: Array | None
    kv: tuple[Array | float, ...]
    kr: tuple[Array | float, ...]

    @classmethod
    def of(cls, shape: Shape, values: Array) -> Beams:
        """Return the beams with these values of the slots, a row for each slot."""
        beam = shape.beam
        lengths = shape.numbers(beam.lengths, values)
        x = np.zeros((len(lengths) + 1, values.shape[1]))
        for place, before, length in zip(x[1:], x, lengths, strict=False):
            np.add(before, length, out=place)
        stiffness = beam.stiffness or Stiffness((1.0,) * len(lengths))
        EI = shape.numbers(stiffness.EI, values)
        GA = shape.numbers(stiffness.GA, values) if stiffness.GA else None
        kv = tuple(_spring(shape, mark.kv, values) for mark in beam.marks)
        kr = tuple(_spring(shape, mark.kr, values) for mark in beam.marks)
        return cls(shape, values, lengths, x, EI, GA, kv, kr)

    @property
    def count(self) -> int:
        return int(self.values.shape[1])

    @cached_property
    def near(self) -> Array:
        """The distance under which two places are one, of each beam."""
        near: Array = 1e-12 * self.x[-1]
        return near

    def sound(self) -> Flags:
        """Tell of each beam whether its lengths and stiffnesses are in range."""
        good: Flags = np.all(within(self.lengths) & (self.lengths > self.near), axis=0)
        if self.shape.beam.stiffness:
            good &= within(self.EI).all(axis=0)
        if self.GA is not None:
            good &= within(self.GA).all(axis=0)
        for spring in (*self.kv, *self.kr):
            if isinstance(spring, np.ndarray):
                good &= within(spring)
        return good

    def rows(self, rows: Indices) -> Beams:
        """Return some of the beams."""
        return Beams.of(self.shape, self.values[:, rows])


def _spring(shape: Shape, stiffness: float, values: Array) -> Array | float:
    if stiffness in (0.0, RIGID):
        return stiffness
    return np.broadcast_to(np.asarray(shape.number(stiffness, values)), values.shape[1:])


def within(sizes: Array) -> Flags:
    """Tell of lengths or stiffnesses whether they are in range."""
    inside: Flags = (sizes >= SMALLEST) & (sizes <= LARGEST)
    return inside


def bearable(sizes: Array) -> Flags:
    """Tell of sizes of loads whether they are in range."""
    size = np.abs(sizes)
    fits: Flags = (size == 0.0) | ((size >= SMALLEST_LOAD) & (size <= LARGEST_LOAD))
    return fits
