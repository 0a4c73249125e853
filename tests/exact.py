"""An independent solver of line beams in exact rational arithmetic, for the tests alone.

It integrates the beam's differential equations along every length and states the conditions of
continuity, support and equilibrium at every mark as one linear system over `fractions.Fraction`.
There is no stiffness matrix and no rounding: what comes out is the exact answer.

Signs: load, deflection and settlement positive downward, reaction upward, sagging moment, and
couple, slope and reaction moment clockwise. Along a stretch that carries the load q

    V' = -q,   M' = V,   phi' = -(M/EI + kappa),   v' = phi + V/GA

with kappa the imposed free curvature (sagging positive) and 1/GA = 0 where no GA is given.
"""

from __future__ import annotations

from bisect import bisect_left, bisect_right
from collections.abc import Iterable
from dataclasses import dataclass
from fractions import Fraction
from functools import cached_property
from itertools import accumulate, pairwise
from typing import Literal, NamedTuple

Side = Literal["left", "right"]
ZERO, ONE = Fraction(0), Fraction(1)

HOLDS_DEFLECTION = {"fixed", "pinned", "roller"}
HOLDS_ROTATION = {"fixed", "guided"}
SUPPORTS = HOLDS_DEFLECTION | HOLDS_ROTATION | {"spring"}


class Mechanism(ValueError):
    """The conditions do not determine the beam: some part of it can move."""


@dataclass(frozen=True)
class Mark:
    """One mark of the beam line; a spring has `kv`, and `kr` where it holds rotation too."""

    kind: str
    kv: Fraction = ZERO
    kr: Fraction = ZERO


@dataclass(frozen=True)
class Spread:
    """A load from `start` to `end` that varies linearly from `first` to `last`."""

    first: Fraction
    last: Fraction
    start: Fraction
    end: Fraction


@dataclass(frozen=True)
class Point:
    """A force at a place."""

    size: Fraction
    at: Fraction


@dataclass(frozen=True)
class Couple:
    """A couple at a place."""

    size: Fraction
    at: Fraction


@dataclass(frozen=True)
class Settle:
    """A settlement of the support (the base of a spring) at a mark, by the mark's index."""

    size: Fraction
    mark: int


@dataclass(frozen=True)
class Rotate:
    """A rotation of the support (the base of a spring) at a mark, by the mark's index."""

    size: Fraction
    mark: int


@dataclass(frozen=True)
class Curvature:
    """A free curvature imposed from `start` to `end`."""

    size: Fraction
    start: Fraction
    end: Fraction


Load = Spread | Point | Couple | Settle | Rotate | Curvature


@dataclass(frozen=True)
class Model:
    """A beam of `len(lengths) + 1` marks with a stiffness for each length, and its loads."""

    marks: tuple[Mark, ...]
    lengths: tuple[Fraction, ...]
    ei: tuple[Fraction, ...]
    ga: tuple[Fraction, ...] | None
    loads: tuple[Load, ...]

    @cached_property
    def places(self) -> tuple[Fraction, ...]:
        """The x of every mark."""
        return tuple(accumulate(self.lengths, initial=ZERO))

    @cached_property
    def supports(self) -> tuple[int, ...]:
        """The index of every mark that is a support, left to right."""
        return tuple(i for i, mark in enumerate(self.marks) if mark.kind in SUPPORTS)

    @cached_property
    def breakpoints(self) -> tuple[Fraction, ...]:
        """Every x where a field may jump or change its polynomial."""
        ends: set[Fraction] = set(self.places)
        for load in self.loads:
            match load:
                case Spread() | Curvature():
                    ends |= {load.start, load.end}
                case Point() | Couple():
                    ends.add(load.at)
        return tuple(sorted(ends))

    def total(self, kind: type[Point] | type[Couple], at: Fraction) -> Fraction:
        """The sum of the forces, or of the couples, that act just at `at`."""
        return sum((x.size for x in self.loads if isinstance(x, kind) and x.at == at), ZERO)

    def moved(self, kind: type[Settle] | type[Rotate], mark: int) -> Fraction:
        """The settlement, or the rotation, imposed at a mark."""
        return sum((x.size for x in self.loads if isinstance(x, kind) and x.mark == mark), ZERO)


class State(NamedTuple):
    """The four fields at one side of a place."""

    deflection: Fraction
    slope: Fraction
    moment: Fraction
    shear: Fraction


@dataclass(frozen=True)
class Stretch:
    """A part of a length between two breakpoints: its stiffness and what it carries."""

    start: Fraction
    end: Fraction
    ei: Fraction
    ga: Fraction | None
    load: Fraction
    """q at the start."""
    load_rate: Fraction
    """dq/dx."""
    curvature: Fraction

    def along(self, state: State, h: Fraction) -> State:
        """The state at the distance `h` from the start, where it is `state`."""
        v, phi, m, s = state
        q, r = self.load, self.load_rate
        shear = s - h * (q + h * r / 2)
        moment_rise = h * (s - h * (q / 2 + h * r / 6))
        slope = phi - h * self.curvature
        slope -= h * (m + h * (s / 2 - h * (q / 6 + h * r / 24))) / self.ei
        deflection = v + h * (phi - h * self.curvature / 2)
        deflection -= h * h * (m / 2 + h * (s / 6 - h * (q / 24 + h * r / 120))) / self.ei
        if self.ga is not None:
            deflection += moment_rise / self.ga
        return State(deflection, slope, m + moment_rise, shear)


Row = dict[int, Fraction]
"""A linear form in the unknowns by their number; the number -1 stands for the constant term."""
CONSTANT = -1


def combined(*terms: tuple[Fraction | int, Row]) -> Row:
    """The sum of factor times form, without its zeros."""
    out: Row = {}
    for factor, row in terms:
        for column, value in row.items():
            out[column] = out.get(column, ZERO) + factor * value
    return {column: value for column, value in out.items() if value}


def eliminated(equations: Iterable[Row], unknowns: int) -> list[Fraction]:
    """The unknowns for which every form is zero: sparse elimination in the natural order."""
    waiting: list[list[Row]] = [[] for _ in range(unknowns)]

    def file(row: Row) -> None:
        """Put the row where its first unknown is eliminated."""
        columns = [column for column in row if column != CONSTANT]
        if columns:
            waiting[min(columns)].append(row)
        elif row:
            raise Mechanism("the conditions contradict each other")

    for row in equations:
        file(row)
    pivots: list[Row] = []
    for column, rows in enumerate(waiting):
        if not rows:
            raise Mechanism(f"nothing determines the unknown {column}")
        pivot, *others = sorted(rows, key=len)
        pivots.append(combined((1 / pivot[column], pivot)))
        for row in others:
            file(combined((1, row), (-row[column], pivots[-1])))
    answer = [ZERO] * unknowns
    for column in reversed(range(unknowns)):
        known = ((c, value) for c, value in pivots[column].items() if c != column)
        answer[column] = -sum((value if c == CONSTANT else value * answer[c] for c, value in known), ZERO)
    return answer


def stretches(model: Model) -> list[list[Stretch]]:
    """The stretches of every length, left to right."""
    spreads = [x for x in model.loads if isinstance(x, Spread)]
    curvatures = [x for x in model.loads if isinstance(x, Curvature)]
    out = []
    for i, (left, right) in enumerate(pairwise(model.places)):
        cuts = [x for x in model.breakpoints if left <= x <= right]
        out.append([])
        for a, b in pairwise(cuts):
            load = rate = ZERO
            for x in spreads:
                if x.start <= a and b <= x.end:
                    slant = (x.last - x.first) / (x.end - x.start)
                    load += x.first + slant * (a - x.start)
                    rate += slant
            bent = sum((x.size for x in curvatures if x.start <= a and b <= x.end), ZERO)
            ga = model.ga[i] if model.ga else None
            out[-1].append(Stretch(a, b, model.ei[i], ga, load, rate, bent))
    return out


def walked(model: Model, parts: list[Stretch], state: State) -> list[State]:
    """The state at the start of each stretch of a length, and last the one at its far end.

    Forces and couples inside the length are passed; those at its two marks belong to the marks.
    """
    out = [state]
    for part in parts:
        v, phi, m, s = part.along(out[-1], part.end - part.start)
        if part is not parts[-1]:
            m += model.total(Couple, part.end)
            s -= model.total(Point, part.end)
        out.append(State(v, phi, m, s))
    return out


def length_ends(model: Model, parts: list[Stretch], first: int) -> tuple[list[Row], list[Row]]:
    """The states at both ends of a length as forms in the four unknowns at its left end."""
    left = [{first + i: ONE} for i in range(4)]
    bare = Stretch(parts[0].start, parts[-1].end, parts[0].ei, parts[0].ga, ZERO, ZERO, ZERO)
    units = [State(*(ONE if i == j else ZERO for i in range(4))) for j in range(4)]
    columns = [bare.along(unit, bare.end - bare.start) for unit in units]
    loaded = walked(model, parts, State(ZERO, ZERO, ZERO, ZERO))[-1]
    right = [combined(*((columns[j][i], left[j]) for j in range(4)), (loaded[i], {CONSTANT: ONE})) for i in range(4)]
    return left, right


def conditions(model: Model, index: int, left: list[Row] | None, right: list[Row] | None) -> list[Row]:
    """The forms that vanish at a mark: two at an end of the beam, four at any other mark.

    `left` and `right` are the states beside it, None beyond the ends of the beam.
    """
    mark = model.marks[index]
    place = model.places[index]
    force, couple = model.total(Point, place), model.total(Couple, place)
    deflection, slope = (right or left)[:2]
    moments = [state[2] if state else {} for state in (left, right)]
    shears = [state[3] if state else {} for state in (left, right)]
    reaction = combined((1, shears[1]), (-1, shears[0]), (1, {CONSTANT: force}))
    reaction_moment = combined((1, moments[1]), (-1, moments[0]), (-1, {CONSTANT: couple}))
    sunk = combined((1, deflection), (-1, {CONSTANT: model.moved(Settle, index)}))
    turned = combined((1, slope), (-1, {CONSTANT: model.moved(Rotate, index)}))

    out = []
    if left and right:
        out.append(combined((1, right[0]), (-1, left[0])))
    if mark.kind in HOLDS_DEFLECTION:
        out.append(sunk)
    else:
        out.append(combined((1, reaction), (-mark.kv, sunk)))
    if mark.kind == "hinge":
        if couple:
            raise ValueError("a couple at a hinge has no side to act on")
        return [*out, *moments]
    if left and right:
        out.append(combined((1, right[1]), (-1, left[1])))
    if mark.kind in HOLDS_ROTATION:
        out.append(turned)
    else:
        out.append(combined((1, reaction_moment), (mark.kr, turned)))
    return out


@dataclass(frozen=True)
class Solution:
    """The exact fields and reactions of a beam."""

    model: Model
    parts: list[Stretch]
    states: list[State]
    """The state at the start of each part."""

    def at(self, x: Fraction, side: Side = "right") -> State:
        """The four fields at a side of x; beyond an end of the beam, the end itself."""
        starts = [part.start for part in self.parts]
        after = bisect_left(starts, x) if side == "left" else bisect_right(starts, x)
        i = max(after - 1, 0)
        return self.parts[i].along(self.states[i], x - self.parts[i].start)

    def reaction(self, support: int) -> tuple[Fraction, Fraction]:
        """The reaction and the reaction moment of a support, numbered from 1."""
        x = self.model.places[self.model.supports[support - 1]]
        left = self.at(x, "left") if x > 0 else State(ZERO, ZERO, ZERO, ZERO)
        right = self.at(x) if x < self.model.places[-1] else State(ZERO, ZERO, ZERO, ZERO)
        return (
            right.shear - left.shear + self.model.total(Point, x),
            right.moment - left.moment - self.model.total(Couple, x),
        )


def solve(model: Model) -> Solution:
    """Solve a beam exactly; raise `Mechanism` when the conditions do not determine it."""
    parts = stretches(model)
    ends = [length_ends(model, p, 4 * i) for i, p in enumerate(parts)]
    beside = zip([None, *(e[1] for e in ends)], [*(e[0] for e in ends), None], strict=True)
    rows = [row for i, (a, b) in enumerate(beside) for row in conditions(model, i, a, b)]
    unknowns = eliminated(rows, 4 * len(parts))
    states = []
    for i, p in enumerate(parts):
        states += walked(model, p, State(*unknowns[4 * i : 4 * i + 4]))[:-1]
    return Solution(model, [part for p in parts for part in p], states)
