"""Loads: clauses as they are written, the same placed on a beam, trains of axles, and the factors of their cases."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import dataclass, replace
from functools import cached_property
from itertools import accumulate
from typing import ClassVar, TypeAlias

from beamfuncs.beam import Beam
from beamfuncs.errors import absent, impossible, unreadable


@dataclass(frozen=True)
class Distributed:
    """A load [force/length] that varies linearly from `size` at `start` to `end_size` at `end`."""

    start: float
    end: float
    size: float
    end_size: float
    case: str | None
    part: int = 0
    imposed: ClassVar[bool] = False

    @property
    def total(self) -> float:
        return (self.size + self.end_size) / 2 * (self.end - self.start)


@dataclass(frozen=True)
class Point:
    """A force [force] at a place."""

    x: float
    size: float
    case: str | None
    part: int = 0
    imposed: ClassVar[bool] = False

    @property
    def total(self) -> float:
        return self.size


@dataclass(frozen=True)
class Couple:
    """A clockwise couple [force·length] at a place."""

    x: float
    size: float
    case: str | None
    part: int = 0
    imposed: ClassVar[bool] = False
    total: ClassVar[float] = 0.0


class Imposed:
    """A deformation that is imposed: it adds no force, and makes forces only in a statically indeterminate beam."""

    imposed: ClassVar[bool] = True
    total: ClassVar[float] = 0.0


@dataclass(frozen=True)
class Settlement(Imposed):
    """A support that sinks by `size` [length]."""

    mark: int
    size: float
    case: str | None
    part: int = 0


@dataclass(frozen=True)
class Rotation(Imposed):
    """A support that turns clockwise by `size` [radian]."""

    mark: int
    size: float
    case: str | None
    part: int = 0


@dataclass(frozen=True)
class Curvature(Imposed):
    """A free curvature `size` [1/length], sagging positive, imposed from `start` to `end`."""

    start: float
    end: float
    size: float
    case: str | None
    part: int = 0


@dataclass(frozen=True)
class Kink(Imposed):
    """A bend in one place, sagging positive, where the slope jumps: a free curvature without extent."""


@dataclass(frozen=True)
class Slip(Imposed):
    """A step in one place, down to the right, where the deflection jumps: a free shear strain without extent."""


@dataclass(frozen=True)
class Inner:
    """A force, couple, bend or step of size 1 at the distance `s` along an element, and on its side of a mark."""

    element: int
    s: float
    kind: type[Point | Couple | Kink | Slip]
    part: int
    case: ClassVar[None] = None


SMALLEST, LARGEST = 1e-60, 1e60
"""Sizes of loads are zero or lie between these, so that no product of them leaves the range of numbers."""

Load: TypeAlias = Distributed | Point | Couple | Settlement | Rotation | Curvature
"""A load placed on a beam. Its `part` is 0 where it always acts, else the number of a part of a free action: one that
is present where it is adverse and absent elsewhere."""


MOST_AXLES = 100
"""Each axle is held against each break of an influence line: more would take minutes and gigabytes."""


@dataclass(frozen=True)
class Train:
    """Axles that move along the beam together [force], the first at the left unless it goes the other way.

    `spacings` are the distances between neighbours. `lane` is a load [force/length] that stands beside them on as many
    stretches of the beam as are adverse.
    """

    axles: tuple[float, ...]
    spacings: tuple[float, ...]
    both_ways: bool
    lane: float
    case: str | None

    @property
    def offsets(self) -> tuple[tuple[float, ...], ...]:
        """The places of the axles counted from the first one, for each way to go."""
        forward = tuple(accumulate(self.spacings, initial=0.0))
        return (forward, tuple(-offset for offset in forward)) if self.both_ways and self.spacings else (forward,)


@dataclass(frozen=True)
class Axles:
    """A train as it is written. `where` names it in messages."""

    where: str
    axles: tuple[float, ...]
    spacings: tuple[float, ...]
    both_ways: bool = False
    lane: float = 0.0
    case: str | None = None

    example: ClassVar[str] = "axles 80 80 40 spaced 1.2 3.2"

    def __post_init__(self) -> None:
        if len(self.axles) > MOST_AXLES:
            raise impossible(f"{self.where}: {len(self.axles)} axles; a train has at most {MOST_AXLES}")
        for size in (*self.axles, self.lane):
            _check_size(self.where, size)
        if len(self.spacings) != len(self.axles) - 1:
            raise unreadable(
                f"{self.where}: {len(self.axles)} axles with {len(self.spacings)} distances between them;"
                f" write e.g. '{self.example}'"
            )
        if any(spacing <= 0.0 for spacing in self.spacings):
            raise impossible(f"{self.where}: the distances between axles are more than 0")

    @property
    def train(self) -> Train:
        return Train(self.axles, self.spacings, self.both_ways, self.lane, self.case)


EACH = ("span", "load")
"""What a free action is split into: its loads on each span and overhang, or each clause as a whole."""


@dataclass(frozen=True)
class Clause:
    """One load as it is written, before it is placed on a beam. `where` names it in messages."""

    where: str
    kind: str
    size: float
    end_size: float | None = None
    start: float | None = None
    end: float | None = None
    at: float | None = None
    span: int | None = None
    support: int | None = None
    case: str | None = None
    each: str | None = None

    def __post_init__(self) -> None:
        kind = LOAD_KINDS[self.kind]
        example = f"write e.g. '{kind.example}'"
        given = {name for name in _WRITTEN if getattr(self, name) is not None}
        for name in _WRITTEN:
            if name in given and name not in kind.takes:
                raise unreadable(f"{self.where}: '{self.kind}' takes no {_WRITTEN[name]}; {example}")
        if "end_size" in kind.takes and self.end_size is None:
            raise unreadable(f"{self.where}: '{self.kind}' needs a second size after 'to'; {example}")
        if (self.start is None) != (self.end is None):
            raise unreadable(f"{self.where}: 'from' and 'to' go together; {example}")
        if "start" not in kind.takes and len(given & {"at", "support"}) != 1:
            raise unreadable(f"{self.where}: '{self.kind}' needs one place; {example}")
        if {"span", "support"} <= given:
            raise unreadable(f"{self.where}: a support needs no span; {example}")
        if self.each == "span" and given & {"span", "support"}:
            raise unreadable(f"{self.where}: 'each span' and one span or support exclude each other; {example}")
        for size in (self.size, self.end_size or 0.0):
            _check_size(self.where, size)
        if self.start is not None and self.end is not None and self.end < self.start:
            raise impossible(f"{self.where}: {self._extent} runs backwards; the first place is the smaller")

    @property
    def _extent(self) -> str:
        return f"'from {self.start:.12g} to {self.end:.12g}'"

    def on(self, beam: Beam) -> Iterator[Load]:
        """Yield the load placed on a beam: one, or one on each span where it acts on each of them by itself."""
        if self.each != "span":
            yield LOAD_KINDS[self.kind].place(self, beam)
        elif self.at is not None or self.start is not None:
            if not beam.spans:
                raise absent(f"{self.where}: 'each span' with a place is counted in a span, and this beam has none")
            for span in range(1, len(beam.spans) + 1):
                yield from replace(self, each=None, span=span).on(beam)
        else:
            for start, end in beam.parts:
                yield from replace(self, each=None, start=start, end=end).on(beam)

    def stretch(self, beam: Beam) -> tuple[float, float]:
        """Return the two ends of the stretch on which the clause acts."""
        if self.start is not None and self.end is not None:
            start, end = self._place(beam, self.start, "starts"), self._place(beam, self.end, "ends")
            if end - start <= beam.near:
                raise impossible(f"{self.where}: {self._extent} has no length; a load at one place is a point load")
            return start, end
        return beam.extent(self.where, self.span)

    def spot(self, beam: Beam) -> float:
        """Return the place at which the clause acts."""
        if self.support is not None:
            return beam.x[beam.support(self.support, self.where)]
        assert self.at is not None
        return beam.place(self.at, self.where, self.span)

    def _place(self, beam: Beam, x: float, does: str) -> float:
        start, end = beam.extent(self.where, self.span)
        if not -beam.near <= x <= end - start + beam.near:
            name = "beam" if self.span is None else f"span {self.span}"
            raise absent(f"{self.where}: {self._extent} {does} beyond the {name} (length {end - start:.12g})")
        return beam.place(x, self.where, self.span)


def _check_size(where: str, size: float) -> None:
    if size and not SMALLEST <= abs(size) <= LARGEST:
        raise impossible(f"{where}: size {size:g} is not between {SMALLEST:g} and {LARGEST:g}: check the units")


_WRITTEN = {
    "end_size": "second size",
    "start": "'from'",
    "end": "'to'",
    "at": "'at' a place",
    "span": "span",
    "support": "support",
}
"""The parts of a clause that only some kinds of load take, and their names in messages."""


def _distributed(clause: Clause, beam: Beam) -> Distributed:
    start, end = clause.stretch(beam)
    end_size = clause.size if clause.end_size is None else clause.end_size
    return Distributed(start, end, clause.size, end_size, clause.case)


def _point(clause: Clause, beam: Beam) -> Point:
    return Point(clause.spot(beam), clause.size, clause.case)


def _couple(clause: Clause, beam: Beam) -> Couple:
    x = clause.spot(beam)
    mark = beam.mark_at(x)
    if mark is not None and beam.marks[mark].hinge:
        raise unreadable(
            f"{clause.where}: the couple at {x:.12g} stands at a hinge, whose sides turn apart; place it to one side"
        )
    return Couple(x, clause.size, clause.case)


def _settlement(clause: Clause, beam: Beam) -> Settlement:
    assert clause.support is not None
    mark = beam.support(clause.support, clause.where)
    if beam.marks[mark].kv == 0.0 and beam.marks[mark].kind != "spring":
        raise absent(
            f"{clause.where}: support {clause.support} is {beam.marks[mark].kind} and holds no deflection to settle"
        )
    return Settlement(mark, clause.size, clause.case)


def _rotation(clause: Clause, beam: Beam) -> Rotation:
    assert clause.support is not None
    mark = beam.support(clause.support, clause.where)
    if beam.marks[mark].kr == 0.0:
        raise absent(
            f"{clause.where}: support {clause.support} is {beam.marks[mark].kind} and holds no rotation to turn"
        )
    return Rotation(mark, clause.size, clause.case)


def _curvature(clause: Clause, beam: Beam) -> Curvature:
    start, end = clause.stretch(beam)
    return Curvature(start, end, clause.size, clause.case)


STRETCH = frozenset({"start", "end", "span"})
SPOT = frozenset({"at", "span", "support"})
SUPPORT = frozenset({"support"})


@dataclass(frozen=True)
class LoadKind:
    """How a kind of load is placed on a beam, the parts of a clause that it takes, and an example of it."""

    place: Callable[[Clause, Beam], Load]
    takes: frozenset[str]
    example: str


LOAD_KINDS = {
    "udl": LoadKind(_distributed, STRETCH, "udl 12 from 2 to 6"),
    "varying": LoadKind(_distributed, STRETCH | {"end_size"}, "varying 0 to 12 from 2 to 6"),
    "point": LoadKind(_point, SPOT, "point 40 at 3"),
    "couple": LoadKind(_couple, SPOT, "couple 15 at 4"),
    "settle": LoadKind(_settlement, SUPPORT, "settle 0.01 at support 2"),
    "rotate": LoadKind(_rotation, SUPPORT, "rotate 0.001 at support 1"),
    "curvature": LoadKind(_curvature, STRETCH, "curvature 1e-4 from 0 to 8"),
}
LOAD_ALIASES = {"uniform": "udl"}

Combination: TypeAlias = tuple[tuple[str, float, float | None], ...]
"""Cases in small letters, each once, with their factors: where they are adverse, and, where it is given, where they are
favourable."""


def has_two_factors(combination: Combination | None) -> bool:
    """Tell whether some case has an adverse and a favourable factor."""
    return any(favourable is not None for _, _, favourable in combination or ())


Factors: TypeAlias = tuple[float, float]
"""The factor of loads where they are adverse, and where they are favourable."""


@dataclass(frozen=True)
class Loads:
    """The loads on one beam. A value: equal data, equal object, one hash."""

    loads: tuple[Load, ...]
    trains: tuple[Train, ...] = ()
    causes: tuple[Inner, ...] = ()

    @cached_property
    def columns(self) -> tuple[tuple[str | None, int], ...]:
        """The case and the part of each column of results: what is always there together, and each free part."""
        return tuple(dict.fromkeys((load.case, load.part) for load in (*self.loads, *self.causes)))

    @cached_property
    def cases(self) -> tuple[str | None, ...]:
        """The cases that have loads, each once, as they are first written; None for loads without a case."""
        return tuple(dict.fromkeys(load.case for load in (*self.loads, *self.trains)))

    @property
    def free(self) -> bool:
        """Whether some load acts only where it is adverse."""
        return bool(self.trains) or any(load.part for load in self.loads)

    def factors(self, combination: Combination | None) -> tuple[float, ...]:
        """Return the factor of each of `columns`: 1 without a combination, 0 for a case that it does not name."""
        if self.free:
            raise unreadable(
                "loads: 'each span', 'each load' and 'axles' act where they are adverse; ask for the highest or the"
                " lowest of a result"
            )
        for name, _, favourable in combination or ():
            if favourable is not None:
                raise unreadable(
                    f"combination: two factors for {name}, adverse and favourable; give one, or ask for the highest"
                    " or the lowest of a result"
                )
        of_case = self._of_cases(combination)
        return tuple(of_case[case][0] for case, _ in self.columns)

    def ranges(self, combination: Combination | None) -> tuple[tuple[Factors, ...], tuple[Factors, ...]]:
        """Return the two factors of each of `columns` and of each train.

        They are alike where a load is always there with one factor; the favourable one is 0 for what may be absent.
        """
        of_case = self._of_cases(combination)

        def factors(case: str | None, free: bool) -> Factors:
            adverse, favourable = of_case[case]
            return adverse, favourable if favourable is not None else 0.0 if free else adverse

        columns = tuple(factors(case, part > 0) for case, part in self.columns)
        return columns, tuple(factors(train.case, True) for train in self.trains)

    def _of_cases(self, combination: Combination | None) -> dict[str | None, tuple[float, float | None]]:
        if combination is None:
            return dict.fromkeys(self.cases, (1.0, None))
        if None in self.cases:
            number = next(n for n, load in enumerate((*self.loads, *self.trains), 1) if load.case is None)
            raise unreadable(
                f"loads, load {number}: has no case, but a combination is given; write e.g. 'G: udl 5', or leave the"
                " combination blank"
            )
        named = {name: (adverse, favourable) for name, adverse, favourable in combination}
        return {case: named.get((case or "").casefold(), (0.0, None)) for case in self.cases}
