"""The result phrase: read, and answered on a solved beam."""

from __future__ import annotations

import re
from collections.abc import Iterator
from dataclasses import dataclass, field, replace
from functools import cached_property, lru_cache
from math import isfinite

from beamfuncs.beam import Beam
from beamfuncs.cells import Cell, decimal_comma, number, whole
from beamfuncs.errors import absent, impossible, quoted, unreadable
from beamfuncs.fields import DEFLECTION, FIELDS, LEFT, RIGHT, SLOPE, Fields, fields
from beamfuncs.influence import Held, Section
from beamfuncs.loads import Loads
from beamfuncs.stiffness import Solution

REACTION, REACTION_MOMENT, TOTAL_LOAD = "reaction", "reaction moment", "total load"
OVER_LENGTH = " over length"
SIGNS = {"max": 1, "min": -1}
EXAMPLES = (
    "'reaction 2', 'moment at 3', 'shear at 4 left', 'moment max in span 2', 'position of moment max', 'total load'"
)


@dataclass(frozen=True)
class Phrase:
    """What is asked for: a reaction, a field at a place, the extreme of a field or its position, or the total load."""

    quantity: str
    support: int | None = None
    x: float | None = None
    span: int | None = None
    side: str | None = None
    sign: int | None = None
    position: bool = False
    over_length: bool = False

    def scale(self, beam: Beam) -> float:
        """Return what its result is divided by: 1, or the length of its span or of the beam."""
        if not self.over_length:
            return 1.0
        start, end = beam.extent("phrase", self.span)
        return end - start

    @property
    def of_one_place(self) -> bool:
        """Whether it asks for what one place or one support has: a linear function of the loads."""
        return self.quantity != TOTAL_LOAD and self.sign is None

    def place(self, beam: Beam) -> Section | Held:
        """Return the place and the quantity that a phrase names which asks for no extreme."""
        mark = None if self.support is None else beam.support(self.support, "phrase")
        if self.quantity in (REACTION, REACTION_MOMENT):
            assert mark is not None
            return Held(mark, turns=self.quantity == REACTION_MOMENT)
        x = self.x if mark is None else beam.x[mark]
        assert x is not None
        return section_at(beam, FIELDS.index(self.quantity), x, "phrase", self.span, self.side)


@dataclass(frozen=True)
class Result:
    """A solved beam under one combination of its loads, ready to answer."""

    beam: Beam
    loads: Loads
    factors: tuple[float, ...]
    fields: Fields
    reactions: list[float]
    reaction_moments: list[float]
    total_load: float
    _extremes: dict[tuple[int, int, int | None], tuple[float, float]] = field(default_factory=dict, compare=False)

    @classmethod
    def of(cls, solution: Solution, factors: tuple[float, ...]) -> Result:
        """Return the result of a linear combination of the columns of a solution."""
        ends, reactions, reaction_moments, total = solution.combined(factors)
        for value in (*reactions, *reaction_moments, total):
            _finite(value)
        along = fields(solution, ends, factors)
        return cls(solution.beam, solution.loads, factors, along, reactions, reaction_moments, total)

    # --- whether the stiffness is known where it counts --------------------------------------------------

    @cached_property
    def forces_need(self) -> str | None:
        """What makes the forces depend on the stiffness that is not given, or None."""
        factors = dict(zip(self.loads.columns, self.factors, strict=True))
        return forces_need(
            self.beam, any(load.imposed and load.size and factors[load.case, load.part] for load in self.loads.loads)
        )

    def check_forces(self) -> None:
        """Raise where the forces depend on a stiffness that is not given."""
        check_forces(self.forces_need)

    def check(self, which: int) -> None:
        """Raise where a field depends on a stiffness that is not given."""
        check_field(self.beam, which)
        self.check_forces()

    # --- answers ------------------------------------------------------------------------------------------

    def reaction(self, support: int, argument: str = "support") -> float:
        """Return the reaction of a support, upward positive."""
        return self._at_support(self.reactions, support, argument)

    def reaction_moment(self, support: int, argument: str = "support") -> float:
        """Return the reaction moment of a support, clockwise positive."""
        return self._at_support(self.reaction_moments, support, argument)

    def _at_support(self, values: list[float], support: int, argument: str) -> float:
        index = self.beam.support(support, argument)
        self.check_forces()
        return values[index]

    def value(
        self, which: int, x: float, argument: str = "x", span: int | None = None, side: str | None = None
    ) -> float:
        """Return a field at a place counted from the left end, or from the left support of a span.

        Without a side it is the right one, at the right end of the beam or of a named span the left one.
        """
        section = section_at(self.beam, which, x, argument, span, side)
        self.check(which)
        return _finite(self.fields.value(which, section.x, section.side))

    def extreme(self, which: int, sign: int, argument: str = "span", span: int | None = None) -> tuple[float, float]:
        """Return the largest (`sign` 1) or smallest (-1) value of a field in a span or the beam, and its place."""
        known = self._extremes.get((which, sign, span))
        if known is None:
            start, end = self.beam.extent(argument, span)
            self.check(which)
            value, place = self.fields.extreme(which, sign, start, end)
            known = self._extremes[which, sign, span] = (_finite(value), place)
        return known

    def answer(self, phrase: Phrase) -> float:
        """Return what a phrase asks for."""
        return self._answer(phrase) / phrase.scale(self.beam)

    def _answer(self, phrase: Phrase) -> float:
        if phrase.quantity == TOTAL_LOAD:
            return self.total_load
        if phrase.sign is not None:
            value, place = self.extreme(FIELDS.index(phrase.quantity), phrase.sign, "phrase", phrase.span)
            return place if phrase.position else value
        asked = phrase.place(self.beam)
        if isinstance(asked, Section):
            self.check(asked.which)
            return _finite(self.fields.value(asked.which, asked.x, asked.side))
        self.check_forces()
        return (self.reaction_moments if asked.turns else self.reactions)[asked.mark]

    def contraflexure(self) -> list[float]:
        """Return the places where the moment changes sign."""
        self.check_forces()
        places = self.fields.contraflexure()
        if not places:
            raise absent("contraflexure: the moment does not change its sign anywhere along the beam")
        return places

    def diagram(self, points: int) -> Iterator[list[float]]:
        """Yield rows of x and every field, at evenly spaced places and on both sides of every jump."""
        self.check_forces()
        for x, side in self.fields.stations(points):
            yield [x, *(_finite(self.fields.value(which, x, side)) for which in range(len(FIELDS)))]


def section_at(
    beam: Beam, which: int, x: float, argument: str = "x", span: int | None = None, side: str | None = None
) -> Section:
    """Return a field at a place counted from the left end, or from the left support of a span.

    Without a side it is the right one, at the right end of the beam or of a named span the left one.
    """
    place = beam.place(x, argument, span)
    if side is None and place >= beam.extent(argument, span)[1] - beam.near:
        side = LEFT
    if side == LEFT and place <= beam.near:
        raise absent(f"{argument}: x = 0 is the left end; there is no beam to the left of it")
    if side == RIGHT and place >= beam.length - beam.near:
        raise absent(f"{argument}: x = {place:.12g} is the right end; there is no beam to the right of it")
    return Section(which, place, side or RIGHT)


def forces_need(beam: Beam, imposed: bool) -> str | None:
    """Return what makes the forces depend on the stiffness that is not given, or None."""
    if beam.stiffness or beam.redundancy == 0:
        return None
    if any(mark.sprung for mark in beam.marks):
        return "springs"
    if any(mark.kind == "step" for mark in beam.marks):
        return "a step of the stiffness"
    return "imposed settlements, rotations or curvatures" if imposed else None


def check_forces(need: str | None) -> None:
    """Raise where the forces depend on a stiffness that is not given."""
    if need:
        raise unreadable(f"stiffness: blank; the forces depend on it (statically indeterminate, {need}); give EI")


def check_field(beam: Beam, which: int) -> None:
    """Raise where slope or deflection is asked for without a stiffness."""
    if which in (SLOPE, DEFLECTION) and not beam.stiffness:
        raise unreadable(f"stiffness: blank; {FIELDS[which]} needs it; give EI, e.g. 24000")


def _finite(value: float) -> float:
    """Return a result, -0.0 made 0.0; raise where it is larger than a number can hold."""
    if not isfinite(value):
        raise impossible("loads: so large that a result is more than a number can hold; check the units")
    return value + 0.0


_REACTION = re.compile(rf"({REACTION_MOMENT}|{REACTION})\s+(\S+)")
_EXTREME = re.compile(rf"(position\s+of\s+)?({'|'.join(FIELDS)})\s+({'|'.join(SIGNS)})(?:\s+in\s+span\s+(\S+))?")
_PLACE = re.compile(
    rf"({'|'.join(FIELDS)})\s+at\s+(?:support\s+(?P<support>\S+)|(?P<x>\S+?)(?:\s+in\s+span\s+(?P<span>\S+))?)"
    rf"(?:\s+(?P<side>{LEFT}|{RIGHT}))?"
)


@lru_cache(1024)
def read_phrase(cell: Cell) -> Phrase:
    """Return what a phrase asks for.

    >>> read_phrase("Moment max in span 2").sign
    1
    """
    if cell is None:
        raise unreadable(f"phrase: blank; write e.g. {EXAMPLES}")
    if not isinstance(cell, str):
        raise unreadable(f"phrase: the number {cell:g}; write e.g. {EXAMPLES}")
    text = " ".join(cell.lower().split())
    if text.endswith(OVER_LENGTH):
        return replace(read_phrase(text.removesuffix(OVER_LENGTH)), over_length=True)
    if text == TOTAL_LOAD:
        return Phrase(TOTAL_LOAD)
    if found := _REACTION.fullmatch(text):
        return Phrase(found[1], support=whole("phrase, support", found[2], "a support number"))
    if found := _EXTREME.fullmatch(text):
        span = whole("phrase, span", found[4], "a span number") if found[4] else None
        return Phrase(found[2], span=span, sign=SIGNS[found[3]], position=bool(found[1]))
    if found := _PLACE.fullmatch(text):
        support, x, span_text = found["support"], found["x"], found["span"]
        return Phrase(
            found[1],
            support=whole("phrase, support", support, "a support number") if support else None,
            x=number("phrase, place", x, "a place") if x else None,
            span=whole("phrase, span", span_text, "a span number") if span_text else None,
            side=found["side"],
        )
    for word in text.split():
        if re.search(r"[0-9],[0-9]", word):
            raise decimal_comma("phrase", word)
    raise unreadable(f"phrase: {quoted(text, 40)} is not understood; write e.g. {EXAMPLES}")
