"""The values worth writing at a line of shear or moment: where it jumps or turns, and its extremes."""

from __future__ import annotations

from bisect import bisect_left
from collections.abc import Sequence
from dataclasses import dataclass
from itertools import pairwise

from beamfuncs.beam import Beam
from beamfuncs.fields import LEFT, MOMENT, RIGHT
from beamfuncs.loads import Couple, Point
from beamfuncs.results import Result

NOTHING = 1e-9
"""A value below this part of the largest is no peak."""
BESIDE = 1e-3
"""How far beside a place, as a part of the shortest length, is looked whether a line turns there."""
MOST_LENGTHS = 120
"""In a beam of more lengths the extremes of the whole are looked for, not those of each length."""
MOST_PEAKS = 60


@dataclass(frozen=True)
class Peak:
    """A value to be written at a line, and the side of a jump on which it stands."""

    x: float
    value: float
    side: str = ""


def peaks(result: Result, which: int) -> list[Peak]:
    """Return the values of a field worth writing: where it jumps or turns, and the extremes between the marks.

    The largest and the smallest come first, then the others by their size.
    """
    beam, fields = result.beam, result.fields
    jumping = Couple if which == MOMENT else Point
    places = sorted({load.x for load in result.loads.loads if isinstance(load, jumping)})
    found = [
        Peak(x, fields.value(which, x, side), side)
        for x in places
        if not _among(beam.x, x, beam)
        for side in (LEFT, RIGHT)
    ]
    for start, end in pairwise(beam.x):
        found += [
            Peak(start, fields.value(which, start, RIGHT), RIGHT),
            Peak(end, fields.value(which, end, LEFT), LEFT),
        ]
    for start, end in pairwise(beam.x) if len(beam.lengths) <= MOST_LENGTHS else [(0.0, beam.length)]:
        for sign in (1, -1):
            value, x = fields.extreme(which, sign, start, end)
            if not _among(beam.x, x, beam) and not _among(places, x, beam):
                found.append(Peak(x, value))
    largest = max(abs(peak.value) for peak in found)
    found = [
        peak for peak in _joined(found, beam) if abs(peak.value) > NOTHING * largest and _turns(result, which, peak)
    ]
    if not found:
        return [Peak(beam.length / 2, 0.0)]
    first = {max(found, key=lambda peak: peak.value), min(found, key=lambda peak: peak.value)}
    return sorted(found, key=lambda peak: (peak not in first, -abs(peak.value)))[:MOST_PEAKS]


def _among(places: Sequence[float], x: float, beam: Beam) -> bool:
    """Whether a place is one of some, which stand from left to right."""
    index = bisect_left(places, x - beam.near)
    return index < len(places) and places[index] <= x + beam.near


def _joined(peaks: Sequence[Peak], beam: Beam) -> list[Peak]:
    """Return the peaks with the two sides of a mark made one where the field does not jump there."""
    joined: list[Peak] = []
    for peak in sorted(peaks, key=lambda peak: (peak.x, peak.side == RIGHT)):
        last = joined[-1] if joined else None
        equal = last and abs(last.value - peak.value) <= NOTHING * max(abs(last.value), abs(peak.value))
        if last and equal and peak.x - last.x <= beam.near:
            joined[-1] = Peak(peak.x, peak.value)
        else:
            joined.append(peak)
    return joined


def _turns(result: Result, which: int, peak: Peak) -> bool:
    """Whether a field jumps at a peak, or is no larger or no smaller there than just beside it."""
    beside = BESIDE * min(result.beam.lengths)
    if peak.side or not beside < peak.x < result.beam.length - beside:
        return True
    before, after = (result.fields.value(which, peak.x + step) for step in (-beside, beside))
    flat = NOTHING * abs(peak.value)
    if max(abs(before - peak.value), abs(after - peak.value)) <= flat:
        return False  # on a level stretch, whose ends are peaks already
    return (before - peak.value) * (after - peak.value) >= 0.0
