"""The line beam: marks and lengths from left to right, and the stiffness of each length."""

from __future__ import annotations

from bisect import bisect_left, bisect_right
from dataclasses import dataclass
from functools import cached_property
from itertools import accumulate, pairwise
from math import inf, isfinite

from beamfuncs.errors import BeamError, absent, impossible, unreadable

RIGID = inf


SMALLEST, LARGEST = 1e-30, 1e30
"""Lengths and stiffnesses lie between these, so that no product of them leaves the range of numbers."""


def check_size(what: str, size: float) -> None:
    """Raise where a length or a stiffness is not greater than 0, or beyond all reason."""
    if not size > 0.0:
        raise impossible(f"{what} is {size:g}; it must be greater than 0")
    if not SMALLEST <= size <= LARGEST:
        raise impossible(f"{what} is {size:g}; it must lie between {SMALLEST:g} and {LARGEST:g}: check the units")


@dataclass(frozen=True)
class MarkKind:
    """What a mark does to the beam: the stiffness that holds it, whether it counts as a support, where it may stand."""

    kv: float
    kr: float
    support: bool = True
    at_end: bool = True
    inside: bool = True


MARK_KINDS = {
    "fixed": MarkKind(RIGID, RIGID),
    "pinned": MarkKind(RIGID, 0.0),
    "roller": MarkKind(RIGID, 0.0),
    "guided": MarkKind(0.0, RIGID),
    "spring": MarkKind(0.0, 0.0),  # its stiffnesses are read from the line
    "free": MarkKind(0.0, 0.0, support=False, inside=False),
    "hinge": MarkKind(0.0, 0.0, support=False, at_end=False),
    "step": MarkKind(0.0, 0.0, support=False, at_end=False),
}
MARK_ALIASES = {"fix": "fixed", "pin": "pinned"}

NEAR = 1e-12
"""Places nearer than this part of the beam's length are one place: sums of lengths round off."""


@dataclass(frozen=True)
class Mark:
    """One mark: its kind, and the vertical [force/length] and rotational [force·length] stiffness that holds it."""

    kind: str
    kv: float
    kr: float

    @classmethod
    def of(cls, kind: str) -> Mark:
        """Return the mark of that kind."""
        return cls(kind, MARK_KINDS[kind].kv, MARK_KINDS[kind].kr)

    @classmethod
    def spring(cls, kv: float, kr: float = 0.0) -> Mark:
        """Return a spring support of vertical stiffness `kv` and rotational stiffness `kr`."""
        for name, stiffness in (("kv", kv), ("kr", kr)):
            if stiffness != 0.0:
                check_size(f"beam: spring {name}", stiffness)
        return cls("spring", kv, kr)

    @property
    def support(self) -> bool:
        return MARK_KINDS[self.kind].support

    @property
    def hinge(self) -> bool:
        return self.kind == "hinge"

    @property
    def sprung(self) -> bool:
        return 0.0 < self.kv < inf or 0.0 < self.kr < inf


@dataclass(frozen=True)
class Stiffness:
    """Bending stiffness `EI` [force·length²] of each length, and shear stiffness `GA` [force] where it counts."""

    EI: tuple[float, ...]
    GA: tuple[float, ...] | None = None


@dataclass(frozen=True)
class Beam:
    """A line beam: n + 1 marks around n lengths. A value: equal data, equal object, one hash."""

    marks: tuple[Mark, ...]
    lengths: tuple[float, ...]
    stiffness: Stiffness | None = None

    def __post_init__(self) -> None:
        if len(self.marks) != len(self.lengths) + 1 or not self.lengths:
            raise unreadable("beam: a line has marks and lengths in turn, e.g. 'fixed 8 pinned'")
        for number, length in enumerate(self.lengths, 1):
            check_size(f"beam: length {number}", length)
            if length <= self.near:
                raise impossible(
                    f"beam: length {number} is {length:g}, next to nothing beside the whole, {self.length:g}"
                )
        last = len(self.lengths)
        for place, mark in enumerate(self.marks):
            kind = MARK_KINDS[mark.kind]
            if not kind.at_end and place in (0, last):
                raise unreadable(f"beam: '{mark.kind}' stands at an end; it belongs inside, between two lengths")
            if not kind.inside and place not in (0, last):
                raise unreadable(f"beam: '{mark.kind}' stands inside the line; it belongs at an end only")

    @cached_property
    def x(self) -> tuple[float, ...]:
        """The place of each mark, from the left end [length]."""
        return tuple(accumulate(self.lengths, initial=0.0))

    @property
    def length(self) -> float:
        return self.x[-1]

    @cached_property
    def near(self) -> float:
        """The distance under which two places are one [length]."""
        return NEAR * self.length

    @cached_property
    def supports(self) -> tuple[int, ...]:
        """The index of the mark of each support; support n is `supports[n - 1]`."""
        return tuple(index for index, mark in enumerate(self.marks) if mark.support)

    @cached_property
    def spans(self) -> tuple[tuple[int, int], ...]:
        """The indices of the two marks that bound each span; span n is `spans[n - 1]`."""
        return tuple(pairwise(self.supports))

    @cached_property
    def parts(self) -> tuple[tuple[float, float], ...]:
        """Where each span and each overhang starts and ends."""
        ends = sorted({0.0, *(self.x[index] for index in self.supports), self.length})
        return tuple(pairwise(ends))

    @cached_property
    def restraints(self) -> int:
        """The number of support reactions and reaction moments."""
        return sum((mark.kv > 0.0) + (mark.kr > 0.0) for mark in self.marks)

    @cached_property
    def redundancy(self) -> int:
        """The degree of static indeterminacy; meaningful where the beam is no mechanism."""
        return self.restraints - 2 - sum(mark.hinge for mark in self.marks)

    def support(self, number: int, argument: str) -> int:
        """Return the index of the mark of support `number`."""
        if not 1 <= number <= len(self.supports):
            raise absent(
                f"{argument}: support {number} is not there; the beam has {_count(len(self.supports), 'support')}"
            )
        return self.supports[number - 1]

    def span(self, number: int, argument: str) -> tuple[int, int]:
        """Return the indices of the marks that bound span `number`."""
        if not 1 <= number <= len(self.spans):
            raise absent(
                f"{argument}: span {number} is not there; the beam has {_count(len(self.spans), 'span')}"
                " (a span lies between two supports)"
            )
        return self.spans[number - 1]

    def extent(self, argument: str, span: int | None = None) -> tuple[float, float]:
        """Return the two ends of a span, or of the whole beam."""
        first, last = (0, -1) if span is None else self.span(span, argument)
        return self.x[first], self.x[last]

    def place(self, x: float, argument: str, span: int | None = None) -> float:
        """Return the place `x` [length] from the left end, counted from the left end or the left support of `span`."""
        start, end = self.extent(argument, span)
        if not isfinite(x):
            raise impossible(f"{argument}: place {x:g} is not finite")
        if not -self.near <= x <= end - start + self.near:
            raise not_on(argument, x, span, end - start)
        return min(max(start + x, start), end)

    def mark_at(self, x: float) -> int | None:
        """Return the index of the mark that stands at `x`, if one does."""
        index = bisect_left(self.x, x - self.near)
        return index if index < len(self.x) and self.x[index] <= x + self.near else None

    def length_at(self, x: float) -> int:
        """Return the index of the length on which `x` lies; at a mark, of the one to its right."""
        return min(bisect_right(self.x, x + self.near), len(self.lengths)) - 1


def not_on(argument: str, x: float, span: int | None, length: float) -> BeamError:
    """Return the error of a place that does not lie on a beam, or on a span, of that length."""
    whole = "beam" if span is None else f"span {span}"
    return absent(f"{argument}: place {x:.12g} is not on the {whole} (length {length:.12g})")


def _count(number: int, noun: str) -> str:
    return f"{number or 'no'} {noun}{'s' * (number != 1)}"
