"""The beams of the Kestrel Quay schedule worked by hand: reactions from closed forms, the rest by statics
and by integrating the moment, with no stiffness matrix."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace
from itertools import pairwise
from math import sqrt
from typing import NamedTuple

import numpy as np
from numpy.polynomial import Polynomial

X = Polynomial([0.0, 1.0])


@dataclass(frozen=True)
class Row:
    """The inputs of one row of the schedule; a blank is 0."""

    L1: float
    L2: float
    L3: float
    E: float
    I: float  # noqa: E741
    g: float
    q: float
    start: float
    end: float
    gp: float
    qp: float
    at: float
    other: float

    @property
    def EI(self) -> float:
        return self.E * 1e6 * self.I * 1e-8

    @property
    def nodes(self) -> tuple[float, ...]:
        return 0.0, self.L1, self.L1 + self.L2, self.L1 + self.L2 + self.L3

    @property
    def length(self) -> float:
        return self.nodes[-1]


class Spread(NamedTuple):
    """A line load that varies from `size` at `start` to `end_size` at `end`."""

    start: float
    end: float
    size: float
    end_size: float

    @property
    def total(self) -> float:
        return (self.size + self.end_size) / 2 * (self.end - self.start)

    @property
    def centre(self) -> float:
        """Where the resultant acts."""
        half = (self.end - self.start) / 2
        lever = half * (self.end_size - self.size) / (3 * (self.size + self.end_size))
        return (self.start + self.end) / 2 + lever


class Force(NamedTuple):
    """A force downward or a clockwise couple, at `x`."""

    x: float
    size: float


@dataclass(frozen=True)
class Loading:
    """What acts on a beam at one combination, with what its supports and its material do by themselves."""

    spreads: tuple[Spread, ...] = ()
    forces: tuple[Force, ...] = ()
    couples: tuple[Force, ...] = ()
    settlement: float = 0.0
    curvature: float = 0.0

    @property
    def total(self) -> float:
        return sum(each.total for each in self.spreads) + sum(each.size for each in self.forces)


class Held(NamedTuple):
    """The reactions of the supports, upward, and the fixing moments, clockwise."""

    reactions: tuple[float, ...]
    moments: tuple[float, ...]


def loading(mark: str, row: Row, G: float, Q: float, S: float, T: float) -> Loading:
    """Return what acts on a beam when each of its cases is taken so many times."""
    permanent = Spread(0.0, row.length, row.g, row.g)
    variable = Spread(0.0, row.length, row.q, row.q)
    if mark == "B10":
        variable = variable._replace(start=row.start, end=row.end)
    if mark == "B13":
        permanent, variable = permanent._replace(size=0.0), variable._replace(size=0.0)
    spreads = [
        spread._replace(size=factor * spread.size, end_size=factor * spread.end_size)
        for spread, factor in ((permanent, G), (variable, Q))
        if factor * spread.end_size
    ]
    force = G * row.gp + Q * row.qp
    return Loading(
        tuple(spreads),
        (Force(row.at, force),) if force else (),
        (Force(row.at, Q * row.other),) if mark == "B14" else (),
        S * row.other / 1000 if mark == "B9" else 0.0,
        T * row.other if mark == "B17" else 0.0,
    )


# The supports: the nodes where they stand, which of them are built in, and the hinge ---------------

SUPPORTS = {
    "B1": (0, 1), "B2": (0, 1), "B3": (1, 2), "B4": (0, 1), "B5": (0, 1), "B6": (0, 1, 2),
    "B7": (0, 1, 3), "B8": (0, 1, 2), "B9": (0, 1, 2), "B10": (0, 1), "B11": (0,), "B12": (0, 3),
    "B13": (0, 1), "B14": (0, 1), "B15": (0, 1), "B16": (0, 1, 2), "B17": (0, 1), "B18": (0, 2),
}  # fmt: skip
BUILT_IN = {"B4": (0,), "B5": (0, 1), "B10": (0,), "B11": (0,), "B17": (0,), "B18": (0,)}
HINGE = {"B7": 2, "B18": 1}


# The reactions in closed form ---------------------------------------------------------------------

Form = Callable[[Row, Loading], Held]


def _line_load(load: Loading) -> float:
    """Return the load over the whole length."""
    return sum(each.end_size for each in load.spreads if each.start == 0.0)


def _force(load: Loading) -> float:
    return sum(each.size for each in load.forces)


def simple(row: Row, load: Loading) -> Held:
    """Moments about the left support."""
    L = row.length
    right = sum(each.total * each.centre for each in load.spreads) / L
    right += (sum(each.x * each.size for each in load.forces) + sum(c.size for c in load.couples)) / L
    return Held((load.total - right, right), (0.0, 0.0))


def overhanging(row: Row, load: Loading) -> Held:
    """Moments about the left support; the load lies on the overhang too, the force at its tip."""
    w, P, L, a = _line_load(load), _force(load), row.L1, row.L2
    right = (w * (L + a) ** 2 / 2 + P * (L + a)) / L
    return Held((load.total - right, right), (0.0, 0.0))


def overhanging_twice(row: Row, load: Loading) -> Held:
    """Moments about the left support, the overhangs being of any length."""
    a, L = row.L1, row.L2
    right = _line_load(load) * row.length * (row.length / 2 - a) / L
    return Held((load.total - right, right), (0.0, 0.0))


def propped(row: Row, load: Loading) -> Held:
    """Uniform load: 5/8 and 3/8 of it; imposed curvature k: a prop force of -3 EI k / 2 L."""
    w, L = _line_load(load), row.L1
    prop = 3 * w * L / 8 - 3 * row.EI * load.curvature / (2 * L)
    fixed = w * L - prop
    return Held((fixed, prop), (prop * L - w * L**2 / 2, 0.0))


def propped_partly(row: Row, load: Loading) -> Held:
    """Uniform load from a to the prop: with b = 1 - a/L, qL/8 b²(6-b²) and -qL²/8 b²(2-b²) at the left."""
    L = row.L1
    fixed = moment = 0.0
    for spread in load.spreads:
        b = 1 - spread.start / L
        fixed += spread.size * L / 8 * b**2 * (6 - b**2)
        moment -= spread.size * L**2 / 8 * b**2 * (2 - b**2)
    return Held((fixed, load.total - fixed), (moment, 0.0))


def built_in(row: Row, load: Loading) -> Held:
    """Uniform load: wL/2 and wL²/12; force at a, b from the right: Pb²(3a+b)/L³, Pab²/L² and Pa²b/L²."""
    w, P, L, a = _line_load(load), _force(load), row.L1, row.at
    b = L - a
    left = w * L / 2 + P * b**2 * (3 * a + b) / L**3
    at_left = -w * L**2 / 12 - P * a * b**2 / L**2
    at_right = -w * L**2 / 12 - P * a**2 * b / L**2
    return Held((left, load.total - left), (at_left, -at_right))


def two_spans(row: Row, load: Loading) -> Held:
    """Clapeyron's three moments, with the moment of the overhang L3 and the settlement s of the middle:
    2 M (L1+L2) + m L2 = -w (L1³+L2³)/4 + 6 EI s (1/L1 + 1/L2)."""
    w, a, b, c = _line_load(load), row.L1, row.L2, row.L3
    m = -w * c**2 / 2
    sinking = 6 * row.EI * load.settlement * (1 / a + 1 / b)
    M = (-w * (a**3 + b**3) / 4 + sinking - m * b) / (2 * (a + b))
    left = w * a / 2 + M / a
    right = w * b / 2 + (M - m) / b + w * c
    return Held((left, load.total - left - right, right), (0.0, 0.0, 0.0))


def hinged(row: Row, load: Loading) -> Held:
    """The drop-in part L3 hangs on the overhang L2, whose moment lifts the left support."""
    w, L, a = _line_load(load), row.L1, row.L2
    drop = w * row.L3 / 2
    left = w * L / 2 - (drop * a + w * a**2 / 2) / L
    return Held((left, load.total - left - drop, drop), (0.0, 0.0, 0.0))


def sprung(row: Row, load: Loading) -> Held:
    """A simple span L on a spring k at a: wa(L³-2La²+a³)/24EI - Sa²b²/3EIL = S/k."""
    w, a, b, L = _line_load(load), row.L1, row.L2, row.length
    sag = w * a * (L**3 - 2 * L * a**2 + a**3) / (24 * row.EI)
    spring = sag / (a**2 * b**2 / (3 * row.EI * L) + 1 / row.other)
    left = w * L / 2 - spring * b / L
    return Held((left, spring, w * L - spring - left), (0.0, 0.0, 0.0))


def cantilever(row: Row, load: Loading) -> Held:
    """All of the load, and its moment about the wall."""
    w, L = _line_load(load), row.L1
    return Held((load.total,), (-w * L**2 / 2 - sum(P * x for x, P in load.forces),))


def cantilever_with_hinge(row: Row, load: Loading) -> Held:
    """The part beyond the hinge hangs on the tip of the cantilever."""
    w, L = _line_load(load), row.L1
    drop = w * row.L2 / 2
    return Held((w * L + drop, drop), (-w * L**2 / 2 - drop * L, 0.0))


FORMS: dict[str, Form] = {
    "B1": simple, "B2": overhanging, "B3": overhanging_twice, "B4": propped, "B5": built_in,
    "B6": two_spans, "B7": hinged, "B8": sprung, "B9": two_spans, "B10": propped_partly,
    "B11": cantilever, "B12": simple, "B13": simple, "B14": simple, "B15": simple,
    "B16": two_spans, "B17": propped, "B18": cantilever_with_hinge,
}  # fmt: skip


# The rest by statics and integration --------------------------------------------------------------


@dataclass(frozen=True)
class Answer:
    """What the schedule says of one beam at one combination."""

    reactions: tuple[float, ...]
    moments: tuple[float, ...]
    moment_max: float
    moment_min: float
    shear: float
    deflection: float


def worked(mark: str, row: Row, G: float, Q: float, S: float, T: float) -> Answer:
    """Return everything about a beam: reactions by its closed form, then moments, then deflections."""
    load = loading(mark, row, G, Q, S, T)
    held = FORMS[mark](row, load)
    at = [row.nodes[node] for node in SUPPORTS[mark]]
    jumps = {*row.nodes, *at, *(f.x for f in load.forces + load.couples)}
    jumps |= {edge for spread in load.spreads for edge in (spread.start, spread.end)}
    stretches = list(pairwise(sorted(jumps)))
    moments = [_moment(start, at, held, load) for start, _ in stretches]
    shears = [moment.deriv() for moment in moments]
    deflections = _deflections(mark, row, load, held, stretches, moments)
    M = [value for each in zip(moments, stretches, strict=True) for value in _extremes(*each)]
    V = [value for each in zip(shears, stretches, strict=True) for value in _extremes(*each)]
    v = [value for each in zip(deflections, stretches, strict=True) for value in _extremes(*each)]
    return Answer(held.reactions, held.moments, max(M), min(M), max(map(abs, V)), max(map(abs, v)))


def _moment(start: float, at: list[float], held: Held, load: Loading) -> Polynomial:
    """Return the moment on the stretch that begins at `start`, from all that acts to its left."""
    M = Polynomial([0.0])
    for x, R, C in zip(at, held.reactions, held.moments, strict=True):
        if x <= start:
            M += R * (X - x) + C
    for x, P in load.forces:
        if x <= start:
            M -= P * (X - x)
    for x, C in load.couples:
        if x <= start:
            M += C
    for spread in load.spreads:
        if spread.end <= start:
            M -= spread.total * (X - spread.centre)
        elif spread.start <= start:
            rise = (spread.end_size - spread.size) / (spread.end - spread.start)
            M -= spread.size * (X - spread.start) ** 2 / 2 + rise * (X - spread.start) ** 3 / 6
    return M


def _deflections(
    mark: str,
    row: Row,
    load: Loading,
    held: Held,
    stretches: list[tuple[float, float]],
    moments: list[Polynomial],
) -> list[Polynomial]:
    """Integrate -M/EI twice on every stretch; the constants follow from supports and continuity.

    There are more conditions than constants where the beam is indeterminate: that they all hold
    proves the closed form of its reactions.
    """
    n = len(stretches)
    bent = [
        (-moment / _stiffness(mark, row, start) - load.curvature).integ(2)
        for moment, (start, _) in zip(moments, stretches, strict=True)
    ]
    conditions: list[tuple[list[tuple[int, float]], float]] = []

    def level(i: int, x: float) -> tuple[list[tuple[int, float]], float]:
        return [(2 * i, 1.0), (2 * i + 1, x)], float(bent[i](x))

    def less(one: list[tuple[int, float]]) -> list[tuple[int, float]]:
        return [(unknown, -factor) for unknown, factor in one]

    hinge = row.nodes[HINGE[mark]] if mark in HINGE else None
    for i in range(1, n):
        x = stretches[i][0]
        (left, left_value), (right, right_value) = level(i - 1, x), level(i, x)
        conditions.append((left + less(right), right_value - left_value))
        if x != hinge:
            kink = float(bent[i].deriv()(x) - bent[i - 1].deriv()(x))
            conditions.append(([(2 * i - 1, 1.0), (2 * i + 1, -1.0)], kink))
    for number, node in enumerate(SUPPORTS[mark]):
        x = row.nodes[node]
        i = next(k for k, (start, end) in enumerate(stretches) if start <= x <= end)
        unknowns, value = level(i, x)
        sinks = load.settlement if number == 1 else 0.0
        if mark == "B8" and number == 1:
            sinks = held.reactions[1] / row.other
        conditions.append((unknowns, sinks - value))
        if node in BUILT_IN.get(mark, ()):
            conditions.append(([(2 * i + 1, 1.0)], -float(bent[i].deriv()(x))))
    matrix, wanted = np.zeros((len(conditions), 2 * n)), np.zeros(len(conditions))
    for equation, (unknowns, value) in enumerate(conditions):
        for unknown, factor in unknowns:
            matrix[equation, unknown] += factor
        wanted[equation] = value
    constants, *_ = np.linalg.lstsq(matrix, wanted, rcond=None)
    assert np.allclose(matrix @ constants, wanted, rtol=0.0, atol=1e-10), f"{mark} does not fit"
    return [bent[i] + constants[2 * i] + constants[2 * i + 1] * X for i in range(n)]


def _stiffness(mark: str, row: Row, x: float) -> float:
    if mark == "B12" and row.nodes[1] <= x < row.nodes[2]:
        return replace(row, I=row.other).EI
    return row.EI


def _extremes(field: Polynomial, stretch: tuple[float, float]) -> list[float]:
    """Return the values of a field at the ends of a stretch and where it is level."""
    start, end = stretch
    slope = field.deriv().trim(1e-12)
    roots = slope.roots() if slope.degree() else np.array([])
    level = [float(x.real) for x in roots if abs(x.imag) < 1e-9 and start < x.real < end]
    return [float(field(x)) for x in (start, *level, end)]


# Deflections that the handbooks give in closed form -------------------------------------------------

TABLED: dict[str, Callable[[Row, Loading], float]] = {
    "B1": lambda row, load: 5 * _line_load(load) * row.L1**4 / (384 * row.EI),
    "B4": lambda row, load: (39 + 55 * sqrt(33)) / 65536 * _line_load(load) * row.L1**4 / row.EI,
    "B11": lambda row, load: (_line_load(load) / 8 + _force(load) / (3 * row.L1)) * row.L1**4 / row.EI,
    "B13": lambda row, load: _triangular(row, _line_load(load)),
}


def _triangular(row: Row, w: float) -> float:
    """Simple span, load from 0 to w: wx(3x⁴-10L²x²+7L⁴)/360LEI, largest at x = L √(1-√(8/15))."""
    L = row.L1
    x = L * sqrt(1 - sqrt(8 / 15))
    return w * x * (3 * x**4 - 10 * L**2 * x**2 + 7 * L**4) / (360 * L * row.EI)
