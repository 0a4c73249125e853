"""Why a cell is in error: what our function said, or which cell the error comes from."""

from __future__ import annotations

from beamfuncs.errors import NA, ErrorValue
from beamfuncs.hosts.engine import CIRCULAR, NO_ROOM, NOT_KNOWN, NOT_READ, Engine, Failure, Place

LARGEST_SEARCHED = 20_000
"""In a range of more cells none is looked for that an error comes from."""

_PLAIN = {
    CIRCULAR: "the formula refers to its own cell, directly or through others",
    NOT_READ: "the formula cannot be read",
    NOT_KNOWN: "the formula uses what cannot be evaluated here",
    NO_ROOM: "the array that the formula gives needs cells that are not empty",
    "#NAME?": "the formula uses a function or a name that is not known here",
}


def reason(engine: Engine, place: Place, giver: Place, value: ErrorValue) -> str:
    """Return in one line why a cell is in error; `giver` is the cell whose formula gives its value."""
    failure = _failure(engine, place, giver, value)
    if failure:
        return failure.reason
    source = source_of(engine, giver, value)
    if source and value != CIRCULAR:
        return f"takes {value} from {engine.name(source)}"
    if value == NA and giver != place:
        return "the array that the formula gives does not reach this cell"
    return _PLAIN.get(value, f"the formula gives {value}")


def source_of(engine: Engine, place: Place, value: ErrorValue) -> Place | None:
    """Return the first other cell that the formula of a cell refers to and that holds the same error."""
    for number, area in engine.precedents(place):
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
