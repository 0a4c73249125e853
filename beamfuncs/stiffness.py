"""The direct stiffness method: element matrices, assembly, banded solve and load vectors, one column a load case.

Two freedoms a node, deflection w (down) and rotation (clockwise); a hinge has a rotation on either side. An element's
end couples m follow from its end rotations tau against its chord: m = k (tau - tau0), where tau0 are the end
rotations that its loads would give it on simple supports.

Method: direct stiffness, e.g. J. S. Przemieniecki, Theory of Matrix Structural Analysis, McGraw-Hill 1968, ch. 5-6,
with the shear-flexible element of section 5.6. Iterative refinement: N. J. Higham, Accuracy and Stability of
Numerical Algorithms, 2nd ed., SIAM 2002, ch. 12.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass, field
from math import frexp, inf, isfinite, ldexp
from typing import NamedTuple, TypeAlias

import numpy as np
from numpy.typing import NDArray
from scipy.linalg.lapack import dpbtrf, dpbtrs

from beamfuncs.beam import Beam
from beamfuncs.errors import BeamError, impossible
from beamfuncs.loads import (
    Couple,
    Curvature,
    Distributed,
    Inner,
    Kink,
    Load,
    Loads,
    Point,
    Rotation,
    Settlement,
    Slip,
)
from beamfuncs.stability import mechanism

Array: TypeAlias = NDArray[np.float64]

BANDS = 4
"""The diagonal of the matrix and the three bands below it: an element's four freedoms are neighbours."""
SETTLED = 1e-13
SETTLED_MOTION = 1e-10
"""The relative size of a last correction to couples, and to motions, that ends the refinement.

The error that is left is smaller: a correction is wrong by its own relative error only. Motions of a beam that rocks on
soft springs settle no further than the rounding of its loads lets them.
"""
SOFTEST = 1e-7
"""Springs may stretch as far as the beam would bend, divided by this: beyond it, bending drowns in rounding."""
NOISE = 1e-13
"""End couples below this part of the largest one that met in the solve are rounding, and are zero."""
MOST_CORRECTIONS = 12


class Piece(NamedTuple):
    """A load on one element: its extent from the element's left end, its sizes there, and the column of its case."""

    kind: type[Load | Kink | Slip]
    start: float
    end: float
    size: float
    end_size: float
    column: int

    def at(self, s: float) -> float:
        """Return the size at `s`."""
        return self.size + (self.end_size - self.size) * (s - self.start) / (self.end - self.start)


class Element(NamedTuple):
    """One length between two marks: its data, its freedoms, and its stiffnesses without dimension."""

    length: float
    EI: float
    GA: float | None
    wi: int
    ti: int
    wj: int
    tj: int
    L: float
    bow: float
    sway: float

    def couples(self, u: Sequence[float]) -> tuple[float, float]:
        """Return the end couples that motions of the freedoms raise."""
        chord = (u[self.wj] - u[self.wi]) / self.L
        return self.resisting(u[self.ti] - chord, u[self.tj] - chord)

    def resisting(self, i: float, j: float) -> tuple[float, float]:
        """Return the end couples of end rotations against the chord: `bow` resists opposite ones, `sway` equal ones."""
        swaying, bowing = self.sway * (i + j), self.bow * (i - j)
        return swaying + bowing, swaying - bowing


class Combined(NamedTuple):
    """A combination of columns.

    `ends` holds for each element the shear, moment, slope and deflection at its left end, then at its right; the
    reactions stand one a mark.
    """

    ends: list[list[float]]
    reactions: list[float]
    reaction_moments: list[float]
    total: float


@dataclass(frozen=True)
class Solution:
    """A solved beam: a column of results for each of its loads' `columns`, and the loads of each element."""

    beam: Beam
    loads: Loads
    pieces: tuple[tuple[Piece, ...], ...]
    columns: Array

    def combined(self, factors: Sequence[float]) -> Combined:
        """Return the linear combination of the columns with these factors."""
        values: list[float] = (np.asarray(factors) @ self.columns + 0.0).tolist()
        elements, marks = len(self.beam.lengths), len(self.beam.marks)
        ends = [values[8 * e : 8 * e + 8] for e in range(elements)]
        rest = values[8 * elements :]
        return Combined(ends, rest[:marks], rest[marks:-1], rest[-1])


def solve(beam: Beam, loads: Loads) -> Solution:
    """Return the solution of a beam for each column of its loads; EI = 1 stands in where no stiffness is given."""
    loose = mechanism(beam)
    if loose:
        raise loose
    system = _System(beam)
    cases = [_Case(len(beam.lengths), len(beam.marks)) for _ in loads.columns]
    columns = {column: number for number, column in enumerate(loads.columns)}
    pieces: list[list[Piece]] = [[] for _ in beam.lengths]
    for load in (*loads.loads, *loads.causes):
        column = columns[load.case, load.part]
        for e, piece in _placed(beam, load, column, cases[column]):
            pieces[e].append(piece)
            cases[column].add(e, piece, system.elements[e])
    factor = system.factor()
    columns_of = [system.column(case, factor) for case in cases]
    values = 8 * len(beam.lengths) + 2 * len(beam.marks) + 1
    return Solution(beam, loads, tuple(map(tuple, pieces)), np.array(columns_of).reshape(-1, values))


# --- the loads of a case --------------------------------------------------------------------------


@dataclass
class _Case:
    """The loads of one case: on elements by what they would do on simple supports, on nodes, and of the supports.

    `tau` are the end rotations of each element on simple supports, `moment` is the moment of its loads about its right
    end, `total` their sum.
    """

    elements: int
    nodes: int
    tau: list[list[float]] = field(init=False)
    moment: list[float] = field(init=False)
    total: list[float] = field(init=False)
    force: list[float] = field(init=False)
    couple: list[float] = field(init=False)
    settlement: list[float] = field(init=False)
    rotation: list[float] = field(init=False)

    def __post_init__(self) -> None:
        self.tau = [[0.0, 0.0] for _ in range(self.elements)]
        self.moment, self.total = [0.0] * self.elements, [0.0] * self.elements
        self.force, self.couple = [0.0] * self.nodes, [0.0] * self.nodes
        self.settlement, self.rotation = [0.0] * self.nodes, [0.0] * self.nodes

    def add(self, e: int, piece: Piece, element: Element) -> None:
        """Add what a load on an element would do to it on simple supports."""
        L, EI, GA = element.length, element.EI, element.GA
        half, middle = (piece.end - piece.start) / 2, (piece.start + piece.end) / 2
        if piece.kind is Curvature:
            turn = 2 * half * piece.size
            i, j = turn * (1.0 - middle / L), -turn * middle / L
        elif piece.kind is Kink:
            i, j = piece.size * (1.0 - middle / L), -piece.size * middle / L
        elif piece.kind is Slip:
            i = j = -piece.size / L
        elif piece.kind is Couple:
            rest, C = L - middle, piece.size
            i = C * (rest * rest / 2 - L * L / 6) / (L * EI) + (C / (GA * L) if GA else 0.0)
            j = i - C * (rest - L / 2) / EI
            self.moment[e] -= C
        else:
            if piece.kind is Point:
                force, lean = piece.size, 0.0
            else:
                force, lean = (piece.size + piece.end_size) * half, piece.end_size - piece.size
            i = _turn(L - middle, L, half, force, -lean) / (6 * L * EI)
            j = -_turn(middle, L, half, force, lean) / (6 * L * EI)
            self.moment[e] += force * (L - middle) - lean * half**2 / 3
            self.total[e] += force
        self.tau[e][0] += i
        self.tau[e][1] += j


def _turn(s: float, L: float, half: float, force: float, lean: float) -> float:
    """Return 6 EI L times the rotation of a simply supported element's end at distance L from where `s` counts.

    The load has its middle at `s`, the half-width `half`, the resultant `force`, and its size grows by `lean` over its
    width. A unit force at s gives g = L^2 s - s^3; Taylor's series of this cubic about the middle of the load
    ends with the third derivative, so that the integral of load times g is exact.
    """
    return force * (L * L * s - s**3 - half**2 * s) + lean * half**2 / 3 * (L * L - 3 * s * s - 0.6 * half**2)


def _placed(beam: Beam, load: Load | Inner, column: int, case: _Case) -> Iterator[tuple[int, Piece]]:
    """Put a load on nodes and supports into its case, and yield what acts on elements, cut at the marks."""
    if isinstance(load, Inner):
        yield load.element, Piece(load.kind, load.s, load.s, 1.0, 1.0, column)
    elif isinstance(load, Settlement):
        case.settlement[load.mark] += load.size
    elif isinstance(load, Rotation):
        case.rotation[load.mark] += load.size
    elif isinstance(load, Point | Couple):
        mark = beam.mark_at(load.x)
        if mark is None:
            e = beam.length_at(load.x)
            s = load.x - beam.x[e]
            yield e, Piece(type(load), s, s, load.size, load.size, column)
        elif isinstance(load, Point):
            case.force[mark] += load.size
        else:
            case.couple[mark] += load.size
    else:
        end_size = load.end_size if isinstance(load, Distributed) else load.size
        whole = Piece(type(load), load.start, load.end, load.size, end_size, column)
        for e in range(beam.length_at(load.start), len(beam.lengths)):
            x, end = beam.x[e], beam.x[e + 1]
            if load.end <= x + beam.near:
                break
            a = x if load.start <= x + beam.near else load.start
            b = end if load.end >= end - beam.near else load.end
            if a < b:
                yield (
                    e,
                    Piece(whole.kind, a - x, beam.lengths[e] if b == end else b - x, whole.at(a), whole.at(b), column),
                )


# --- the system -----------------------------------------------------------------------------------


class _System:
    """A beam's elements and freedoms, its matrix, and the solve for a case.

    Lengths and stiffnesses are divided by powers of two near the longest length and the largest EI: the numbers are
    then near 1 in any units, and the division rounds nothing.
    """

    def __init__(self, beam: Beam) -> None:
        self.beam = beam
        EI = beam.stiffness.EI if beam.stiffness else (1.0,) * len(beam.lengths)
        GA = beam.stiffness.GA if beam.stiffness and beam.stiffness.GA else (None,) * len(beam.lengths)
        self.unit_length = _power_of_two(max(beam.lengths))
        self.unit_rotation = self.unit_length**2 / _power_of_two(max(EI))
        self.unit_deflection = self.unit_length * self.unit_rotation

        # The freedoms: [w, rotation] at a node, [left rotation, w, right rotation] at a hinge. Springs beside an
        # unknown stiffness may as well be rigid: only forces that do not depend on either are answered then.
        self.w: list[int] = []
        self.left: list[int] = []
        self.right: list[int] = []
        self.held: list[int] = []
        self.springs: list[tuple[int, float]] = []
        self.size = 0
        for mark in beam.marks:
            w = self.size + mark.hinge
            self.w.append(w)
            self.left.append(self.size if mark.hinge else w + 1)
            self.right.append(w + 1)
            self.size = w + 2
            for freedom, stiffness, unit in (
                (w, mark.kv, self.unit_deflection),
                (w + 1, mark.kr, self.unit_rotation / self.unit_length),
            ):
                if stiffness == inf or (stiffness > 0.0 and not beam.stiffness):
                    self.held.append(freedom)
                elif stiffness > 0.0:
                    self.springs.append((freedom, stiffness * unit))
        self.elements = [self._element(e, *data) for e, data in enumerate(zip(beam.lengths, EI, GA, strict=True))]

    def _element(self, e: int, length: float, EI: float, GA: float | None) -> Element:
        L = length / self.unit_length
        bow = EI * (self.unit_rotation / self.unit_length**2) / L
        sway = 3.0 * bow / (1.0 + 12.0 * EI / GA / length**2) if GA else 3.0 * bow
        freedoms = (self.w[e], self.right[e], self.w[e + 1], self.left[e + 1])
        return Element(length, EI, GA, *freedoms, L, bow, sway)

    def factor(self) -> Array:
        """Return the banded Cholesky factor of the matrix; a held freedom has 1 on the diagonal and no neighbours."""
        bands = [[0.0] * BANDS for _ in range(self.size)]
        for wi, ti, wj, tj, L, bow, sway in (element[3:] for element in self.elements):
            near, far = sway + bow, sway - bow
            turn = 2.0 * sway / L
            lift = 2.0 * turn / L
            bands[wi][0] += lift
            bands[wj][0] += lift
            bands[ti][0] += near
            bands[tj][0] += near
            for row, column, stiffness in (
                (ti, wi, turn),
                (wj, wi, -lift),
                (wj, ti, -turn),
                (tj, wi, turn),
                (tj, ti, far),
                (tj, wj, -turn),
            ):
                bands[min(row, column)][abs(row - column)] += stiffness
        for freedom, stiffness in self.springs:
            bands[freedom][0] += stiffness
        for freedom in self.held:
            bands[freedom] = [1.0, 0.0, 0.0, 0.0]
            for below in range(1, min(BANDS, freedom + 1)):
                bands[freedom - below][below] = 0.0
        factor: Array
        factor, failed = dpbtrf(np.array(bands).T, lower=1)
        if failed:
            raise _too_unlike()
        return factor

    def column(self, case: _Case, factor: Array) -> list[float]:
        """Return the column of results of a case, in the order of `Combined`."""
        _beam, marks = self.beam, self.beam.marks
        u, couples = self._solved(case, factor)
        last = len(self.elements) - 1
        ends: list[float] = []
        shears, moments = [0.0], [0.0]  # to the left of each mark, and to its right
        for e, (element, (i, j)) in enumerate(zip(self.elements, couples, strict=True)):
            left, right = marks[e], marks[e + 1]
            M0, M1 = i * self.unit_length, -j * self.unit_length
            # What a released end carries is known, and needs no rounding.
            if left.kr == 0.0 and (left.hinge or e == 0):
                M0 = case.couple[e]
            if right.kr == 0.0 and (right.hinge or e == last):
                M1 = -case.couple[e + 1]
            V0 = (M1 - M0 + case.moment[e]) / element.length
            V1 = V0 - case.total[e]
            if e == 0 and left.kv == 0.0:
                V0 = -case.force[e]
            if e == last and right.kv == 0.0:
                V1 = case.force[e + 1]
            rotations = (u[element.ti] * self.unit_rotation, u[element.tj] * self.unit_rotation)
            deflections = (u[element.wi] * self.unit_deflection, u[element.wj] * self.unit_deflection)
            ends += (V0, M0, rotations[0], deflections[0], V1, M1, rotations[1], deflections[1])
            shears += (V0, V1)
            moments += (M0, M1)
        shears.append(0.0)
        moments.append(0.0)
        reactions = [
            shears[2 * n + 1] - shears[2 * n] + case.force[n] if mark.kv > 0.0 else 0.0 for n, mark in enumerate(marks)
        ]
        reaction_moments = [
            moments[2 * n + 1] - moments[2 * n] - case.couple[n] if mark.kr > 0.0 else 0.0
            for n, mark in enumerate(marks)
        ]
        return [*ends, *reactions, *reaction_moments, sum(case.force) + sum(case.total)]

    def _solved(self, case: _Case, factor: Array) -> tuple[list[float], list[tuple[float, float]]]:
        """Return the freedoms and the end couples of each element, without dimension.

        Each correction solves for the forces that are out of balance at the nodes, and adds its couples to those
        found: so these satisfy equilibrium to the last digit, however unlike the elements are.
        """
        base = [0.0] * self.size
        applied = [0.0] * self.size
        for n, (w, turn) in enumerate(zip(self.w, self.right, strict=True)):
            base[w] = case.settlement[n] / self.unit_deflection
            base[turn] = case.rotation[n] / self.unit_rotation
            applied[w] += case.force[n]
            applied[turn] += case.couple[n] / self.unit_length
        for freedom, stiffness in self.springs:
            applied[freedom] += stiffness * base[freedom]
        u = [0.0] * self.size
        for freedom in self.held:
            u[freedom] = base[freedom]
        couples: list[tuple[float, float]] = []
        largest_motion = _largest(u)
        largest = 0.0
        for element, tau, moment, total in zip(self.elements, case.tau, case.moment, case.total, strict=True):
            support = moment / element.length
            applied[element.wi] += support
            applied[element.wj] += total - support
            i, j = tau[0] / self.unit_rotation, tau[1] / self.unit_rotation
            (mi, mj), (fixed_i, fixed_j) = element.couples(u), element.resisting(i, j)
            couples.append((mi - fixed_i, mj - fixed_j))
            largest = max(largest, abs(couples[-1][0]), abs(couples[-1][1]), abs(moment / self.unit_length))
            largest_motion = max(largest_motion, abs(i), abs(j))
        held = set(self.held)
        largest = max([largest, *(abs(force) for freedom, force in enumerate(applied) if freedom not in held)])
        for _ in range(MOST_CORRECTIONS):
            du = self._correction(applied, u, couples, factor)
            correction = 0.0
            for e, element in enumerate(self.elements):
                di, dj = element.couples(du)
                mi, mj = couples[e]
                couples[e] = (mi + di, mj + dj)
                correction = max(correction, abs(di), abs(dj))
                largest = max(largest, abs(mi + di), abs(mj + dj))
            u = [a + b for a, b in zip(u, du, strict=True)]
            largest_motion = max(largest_motion, _largest(u))
            if correction <= SETTLED * largest and _largest(du) <= SETTLED_MOTION * largest_motion:
                stretch = max((abs(u[freedom] - base[freedom]) for freedom, _ in self.springs), default=0.0)
                if stretch * SOFTEST * min(element.bow for element in self.elements) > largest:
                    break
                noise = NOISE * largest
                return u, [(i if abs(i) > noise else 0.0, j if abs(j) > noise else 0.0) for i, j in couples]
        raise _too_unlike()

    def _correction(
        self, applied: list[float], u: list[float], couples: list[tuple[float, float]], factor: Array
    ) -> list[float]:
        """Return the motions that the forces out of balance at the nodes cause."""
        forces = applied.copy()
        for freedom, stiffness in self.springs:
            forces[freedom] -= stiffness * u[freedom]
        for element, (i, j) in zip(self.elements, couples, strict=True):
            shear = (i + j) / element.L
            forces[element.wi] -= shear
            forces[element.ti] -= i
            forces[element.wj] += shear
            forces[element.tj] -= j
        for freedom in self.held:
            forces[freedom] = 0.0
        motions: list[float] = dpbtrs(factor, forces, lower=1)[0].ravel().tolist()
        return motions


def _largest(values: list[float]) -> float:
    largest = max(map(abs, values))
    if not isfinite(largest):
        raise _too_unlike()
    return largest


def _power_of_two(size: float) -> float:
    return ldexp(1.0, frexp(size)[1])


def _too_unlike() -> BeamError:
    return impossible(
        "beam: lengths, springs and stiffnesses are unlike by too many powers of ten for a reliable answer; check them"
    )
