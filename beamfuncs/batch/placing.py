"""Loads placed on many beams of one shape, and the beams sorted into groups in which every place lies alike.

A place has a rank: 2 i at mark i, 2 e + 1 inside length e. In a group the ranks of all places are equal, and so is the
order of the places inside each length, so that what follows need not look at single beams.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from itertools import combinations
from typing import NamedTuple, TypeAlias

import numpy as np

from beamfuncs.batch.columns import Array, Flags, Indices
from beamfuncs.batch.shapes import Beams, Shape, bearable
from beamfuncs.loads import LOAD_KINDS, Clause, Couple, Curvature, Distributed, Point, Rotation, Settlement
from beamfuncs.results import Phrase

Kind: TypeAlias = type[Distributed | Point | Couple | Curvature | Settlement | Rotation]
KINDS: dict[str, Kind] = {
    "udl": Distributed,
    "varying": Distributed,
    "point": Point,
    "couple": Couple,
    "curvature": Curvature,
    "settle": Settlement,
    "rotate": Rotation,
}


class Place(NamedTuple):
    """A place on each beam; its rank where it is a mark of the shape."""

    x: Array
    rank: int | None = None


class Load(NamedTuple):
    """A load on each beam, its sizes multiplied by the factor of its case; `end_size` None where it is uniform."""

    kind: Kind
    size: Array
    end_size: Array | None
    start: Place
    end: Place


@dataclass(frozen=True)
class Cut:
    """A place inside a length: the place itself, and its distance from the left end of the length."""

    x: Array
    s: Array


@dataclass(frozen=True)
class Layout:
    """How the places of a group lie: the rank of each, the cuts of each length, and which cut each place is."""

    ranks: tuple[int, ...]
    cuts: tuple[tuple[Cut, ...], ...]
    cut: tuple[int, ...]


def loads_on(beams: Beams) -> tuple[list[Load], Flags]:
    """Return the loads on each beam, and whether each beam can bear them as they are written."""
    shape, values = beams.shape, beams.values
    good = np.ones(beams.count, dtype=bool)
    loads = []
    for clause in shape.clauses:
        factor = shape.factor(clause.case, values)
        sizes: list[Array] = []
        for written in (clause.size, clause.end_size):
            if written is not None:
                size = _each(beams, shape.number(written, values))
                good &= bearable(size)
                sizes.append(size * factor)
        start, end, lies = _places(beams, clause)
        good &= lies
        loads.append(Load(KINDS[clause.kind], sizes[0], sizes[1] if len(sizes) > 1 else None, start, end))
    good &= np.isfinite(sum((load.size for load in loads), np.zeros(beams.count)))
    return loads, good


def _each(beams: Beams, value: Array | float) -> Array:
    return value if isinstance(value, np.ndarray) else np.full(beams.count, value)


def _places(beams: Beams, clause: Clause) -> tuple[Place, Place, Flags]:
    """Return where a load starts and ends on each beam, and whether it lies on it."""
    beam, shape, values = beams.shape.beam, beams.shape, beams.values
    good = np.ones(beams.count, dtype=bool)
    if clause.kind in ("settle", "rotate"):
        support = LOAD_KINDS[clause.kind].place(clause, beam)
        assert isinstance(support, Settlement | Rotation)
        there = Place(beams.x[support.mark], 2 * support.mark)
        return there, there, good
    if clause.support is not None:
        mark = beam.support(clause.support, clause.where)
        there = Place(beams.x[mark], 2 * mark)
        return there, there, good & (not (clause.kind == "couple" and beam.marks[mark].hinge))
    first, last = ends_of(shape, clause.span)
    if clause.at is not None:
        there, good = placed(beams, _each(beams, shape.number(clause.at, values)), clause.span)
        if clause.kind == "couple":
            for hinge, x in zip((mark.hinge for mark in beam.marks), beams.x, strict=True):
                if hinge:
                    good &= np.abs(there.x - x) > 2.0 * beams.near
        return there, there, good
    if clause.start is None or clause.end is None:
        return Place(beams.x[first], 2 * first), Place(beams.x[last], 2 * last), good
    written = [_each(beams, shape.number(x, values)) for x in (clause.start, clause.end)]
    (start, starts), (end, ends) = (placed(beams, x, clause.span) for x in written)
    good = starts & ends & (written[0] <= written[1]) & (end.x - start.x > beams.near)
    return start, end, good


def ends_of(shape: Shape, span: int | None) -> tuple[int, int]:
    """Return the marks at the ends of a span, or of the whole beam."""
    return (0, len(shape.beam.lengths)) if span is None else shape.beam.span(span, "span")


def placed(beams: Beams, x: Array, span: int | None) -> tuple[Place, Flags]:
    """Return a place counted from the left end or from the left support of a span, and whether it lies there."""
    first, last = ends_of(beams.shape, span)
    start, end = beams.x[first], beams.x[last]
    good = (x >= -beams.near) & (x <= end - start + beams.near)
    return Place(np.clip(start + x, start, end)), good


def asked(beams: Beams, phrases: Sequence[Phrase | None]) -> tuple[list[Place | None], Flags]:
    """Return the place on each beam that each phrase asks for, if it does, and whether all lie on the beam."""
    good = np.ones(beams.count, dtype=bool)
    places: list[Place | None] = []
    for phrase in phrases:
        if phrase is None or phrase.x is None:
            places.append(None)
        else:
            place, lies = placed(beams, np.full(beams.count, phrase.x), phrase.span)
            places.append(place)
            good &= lies
    return places, good


def groups(beams: Beams, ends: Sequence[Place], others: Sequence[Place]) -> Iterator[Indices | None]:
    """Yield the beams of each group in which the places lie alike; None where all beams do."""
    moving = [place for place in (*ends, *others) if place.rank is None]
    cutting = sum(place.rank is None for place in ends)
    if not moving:
        yield None
        return
    near, last = beams.near, len(beams.lengths)
    code = np.zeros(beams.count, dtype=np.int64)
    most = 1

    def add(digit: np.ndarray, base: int) -> None:
        nonlocal code, most
        if most > 2**62 // base:
            found, code = np.unique(code, return_inverse=True)
            most = len(found)
        code = code * base + digit
        most *= base

    ranks = [_rank(beams, place) for place in moving]
    for rank in ranks:
        add(rank, 2 * last + 1)
    for a, b in combinations(range(len(moving)), 2):
        inside = (ranks[a] == ranks[b]) & (ranks[a] % 2 == 1)
        if a < cutting and inside.any():
            ahead = moving[b].x - moving[a].x
            add(np.where(inside, (ahead > near) + 2 * (ahead < -near), 0), 3)
    if (code == code[0]).all():
        yield None
        return
    _, member = np.unique(code, return_inverse=True)
    order = np.argsort(member, kind="stable")
    yield from np.split(order, np.flatnonzero(np.diff(member[order])) + 1)


def _rank(beams: Beams, place: Place) -> Indices:
    after = sum((place.x > x + beams.near).astype(np.int8) for x in beams.x)
    reached = sum((place.x >= x - beams.near).astype(np.int8) for x in beams.x)
    return np.asarray(after + reached - 1)


def layout(beams: Beams, ends: Sequence[Place], others: Sequence[Place]) -> Layout:
    """Return how places lie in a group, by the first of its beams: the ends of loads cut lengths, others do not."""
    one, near = beams.x[:, 0], float(beams.near[0])
    places = [*ends, *others]
    ranks = tuple(
        int((place.x[0] > one + near).sum() + (place.x[0] >= one - near).sum() - 1)
        if place.rank is None
        else place.rank
        for place in places
    )
    cut_of = [0] * len(places)
    cuts: list[tuple[Cut, ...]] = []
    for e, left in enumerate(beams.x[:-1]):
        inside = sorted((place.x[0], n) for n, place in enumerate(places) if ranks[n] == 2 * e + 1)
        found: list[Cut] = []
        latest = -np.inf
        for x, n in inside:
            if n < len(ends) and x - latest > near:
                found.append(Cut(places[n].x, places[n].x - left))
                latest = x
            cut_of[n] = len(found)
        for x, n in inside:
            # A place just before a cut is at the cut.
            if n >= len(ends):
                cut_of[n] = sum(bool(x >= cut.x[0] - near) for cut in found)
        cuts.append(tuple(found))
    return Layout(ranks, tuple(cuts), tuple(cut_of))
