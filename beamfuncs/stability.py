"""Whether a beam can move without bending: which part of it, and how."""

from __future__ import annotations

from dataclasses import dataclass
from itertools import pairwise

from beamfuncs.beam import Beam
from beamfuncs.errors import BeamError, impossible


@dataclass
class _Part:
    """The rigid part of a beam between two hinges or ends: where its deflection is held, and if its rotation is."""

    first: int
    last: int
    held_at: set[float]
    rotation_held: bool

    @property
    def holds(self) -> bool:
        return len(self.held_at) >= 2 or (self.rotation_held and bool(self.held_at))


def mechanism(beam: Beam) -> BeamError | None:
    """Return the error that names the part of the beam that can move without bending, or None if none can.

    Hinges cut the beam into parts that move as rigid bodies. A part stands still when its deflection is held at two
    places, or at one with its rotation held; a part that stands still holds its neighbours at the hinge between. What
    never comes to stand still in this way can move: each further part brings at least as many freedoms as its hinge
    takes away.
    """
    cuts = [0, *(index for index, mark in enumerate(beam.marks) if mark.hinge), len(beam.marks) - 1]
    parts = [
        _Part(
            first,
            last,
            {beam.x[i] for i in range(first, last + 1) if beam.marks[i].kv > 0.0},
            any(beam.marks[i].kr > 0.0 for i in range(first, last + 1)),
        )
        for first, last in pairwise(cuts)
    ]
    # A part's stillness passes through its hinges; two sweeps carry it from any part to both ends.
    for order in (range(len(parts)), range(len(parts) - 1, -1, -1)):
        for k in order:
            for neighbour, hinge in ((k - 1, parts[k].first), (k + 1, parts[k].last)):
                if 0 <= neighbour < len(parts) and parts[neighbour].holds:
                    parts[k].held_at.add(beam.x[hinge])
    loose = [part for part in parts if not part.holds]
    return _named(beam, loose) if loose else None


def _named(beam: Beam, loose: list[_Part]) -> BeamError:
    part = loose[0]
    if part.held_at:
        motion = f"can turn about x = {min(part.held_at):.12g}"
    elif part.rotation_held:
        motion = "can move up and down"
    else:
        motion = "can move up and down, and turn"
    start, end = beam.x[part.first], beam.x[part.last]
    which = "the whole beam" if end - start == beam.length else f"the part from x = {start:.12g} to {end:.12g}"
    linked = " with the parts hinged to it" if len(loose) > 1 else ""
    remedy = ", or leave out a hinge" if any(mark.hinge for mark in beam.marks) else ""
    return impossible(f"beam: a mechanism: {which} {motion}{linked}; hold it with a further support{remedy}")
