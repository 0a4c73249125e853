"""Why a cell is in error: what our function said, or which cell the error comes from."""

from __future__ import annotations

from collections.abc import Iterator

from beamfuncs.errors import NA, ErrorValue
from beamfuncs.hosts.headless.circles import Circles
from beamfuncs.hosts.headless.engine import CIRCULAR, NO_ROOM, NOT_KNOWN, NOT_READ, Engine, Failure
from beamfuncs.hosts.headless.grid import Place

LARGEST_SEARCHED = 20_000
"""In a range of more cells none is looked for that an error comes from."""

_PLAIN = {
    NOT_READ: "the formula cannot be read",
    NOT_KNOWN: "the formula uses what cannot be evaluated here",
    NO_ROOM: "the array that the formula gives needs cells that are not empty, or has more than 10,000 cells",
    "#NAME?": "the formula uses a function or a name that is not known here",
}


class Reasons:
    """The reasons of the errors in a workbook as the engine has evaluated it last."""

    def __init__(self, engine: Engine) -> None:
        self._engine = engine
        self._circles = Circles(self._circular_above, engine.name)

    def of(self, place: Place, giver: Place, value: ErrorValue) -> str:
        """Return in one line why a cell is in error; `giver` is the cell whose formula gives its value."""
        engine = self._engine
        failure = _failure(engine, place, giver, value)
        if failure:
            return failure.reason
        if value == CIRCULAR:
            return self._circles.reason(giver)
        source = source_of(engine, giver, value)
        if source:
            return f"takes {value} from {engine.name(source)}"
        if value == NA and giver != place:
            return "the array that the formula gives does not reach this cell"
        return _PLAIN.get(value, f"the formula gives {value}")

    def _circular_above(self, place: Place) -> Iterator[Place]:
        """Yield the cells that a cell refers to, itself included, that are in a circle or build on one."""
        for number, area in self._engine.references(place):
            if number == place[0] and area.holds(*place[1:]):
                yield place
            if len(area.rows) * len(area.columns) <= LARGEST_SEARCHED:
                for row, column in area.cells():
                    if self._engine.value((number, row, column)) == CIRCULAR:
                        yield number, row, column


def source_of(engine: Engine, place: Place, value: ErrorValue) -> Place | None:
    """Return the first other cell that the formula of a cell refers to and that holds the same error."""
    for number, area in engine.references(place):
        if len(area.rows) * len(area.columns) > LARGEST_SEARCHED:
            continue
        for row, column in area.cells():
            other = number, row, column
            held = engine.value(other)
            if isinstance(held, ErrorValue) and held == value and other != place:
                return other
    return None


def _failure(engine: Engine, place: Place, giver: Place, value: ErrorValue) -> Failure | None:
    """Return the last failure of a call in the formula that shows in this cell, its own entry's first."""
    entry = place[1] - giver[1], place[2] - giver[2]
    alike = [one for one in reversed(engine.failures.get(giver, [])) if one.value == value]
    return max(alike, key=lambda one: one.entry in (None, entry), default=None)
