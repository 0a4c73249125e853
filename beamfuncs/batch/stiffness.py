"""The direct stiffness method for many beams at once: the elements and the refinement of `beamfuncs.stiffness`.

The matrix is block tridiagonal, a block a mark. It is eliminated from left to right for all beams of a group together
(block elimination: G. H. Golub and C. F. Van Loan, Matrix Computations, 4th ed. 2013, section 4.5), entry by entry,
so that freedoms that are held and entries that are zero cost nothing.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from itertools import combinations_with_replacement, pairwise
from typing import NamedTuple

import numpy as np

from beamfuncs.batch.columns import Array, Flags
from beamfuncs.batch.placing import Kind, Layout, Load
from beamfuncs.batch.shapes import Beams
from beamfuncs.loads import Couple, Curvature, Distributed, Point, Rotation, Settlement
from beamfuncs.stiffness import NOISE, SETTLED, SETTLED_MOTION

MOST_CORRECTIONS = 4
"""Beams that have not settled then are left to be solved one by one."""
SOFT = 1e-5
"""Springs softer than this part of what the beam resists with are left to be solved one by one."""


class Piece(NamedTuple):
    """A load on one length: between which of its cuts it acts, from where to where, and its sizes there."""

    kind: Kind
    first: int
    last: int
    start: Array
    end: Array
    size: Array
    end_size: Array | None


@dataclass(frozen=True)
class Solved:
    """Solved beams: the fields at the left and right ends of each length, and the reactions at each mark."""

    beams: Beams
    layout: Layout
    pieces: list[list[Piece]]
    left: tuple[Array, Array, Array, Array]
    right: tuple[Array, Array, Array, Array]
    reactions: list[Array]
    reaction_moments: list[Array]
    total: Array
    good: Flags


class _Loading:
    """What loads do to lengths on simple supports, and to marks; see `beamfuncs.stiffness._Case`."""

    def __init__(self, beams: Beams) -> None:
        shape, marks = beams.lengths.shape, beams.x.shape
        self.tau_i, self.tau_j = np.zeros(shape), np.zeros(shape)
        self.moment, self.total = np.zeros(shape), np.zeros(shape)
        self.force, self.couple = np.zeros(marks), np.zeros(marks)
        self.settlement, self.rotation = np.zeros(marks), np.zeros(marks)

    def add(self, beams: Beams, e: int, piece: Piece) -> None:
        """Add what a load on a length would do to it on simple supports."""
        L, EI = beams.lengths[e], beams.EI[e]
        if piece.kind is Curvature:
            turn = (piece.end - piece.start) * piece.size
            far = (piece.start + piece.end) / (2 * L)
            self.tau_i[e] += turn * (1.0 - far)
            self.tau_j[e] -= turn * far
            return
        middle = (piece.start + piece.end) / 2
        rest = L - middle
        if piece.kind is Couple:
            C = piece.size
            i = C * (rest * rest / 2 - L * L / 6) / (L * EI)
            if beams.GA is not None:
                i += C / (beams.GA[e] * L)
            self.tau_i[e] += i
            self.tau_j[e] += i - C * (rest - L / 2) / EI
            self.moment[e] -= C
            return
        force, lean = piece.size, None
        square = L * L
        if piece.kind is Distributed:
            half = (piece.end - piece.start) / 2
            square = square - half**2
            if piece.end_size is None:
                force = 2 * piece.size * half
            else:
                force = (piece.size + piece.end_size) * half
                lean = (piece.end_size - piece.size) * half**2 / 3
        turn_i = force * rest * (square - rest * rest)
        turn_j = force * middle * (square - middle * middle)
        if lean is not None:
            about = L * L - 0.6 * half**2
            turn_i -= lean * (about - 3 * rest * rest)
            turn_j += lean * (about - 3 * middle * middle)
        unit = 6 * L * EI
        self.tau_i[e] += turn_i / unit
        self.tau_j[e] -= turn_j / unit
        self.moment[e] += force * rest if lean is None else force * rest - lean
        self.total[e] += force


def _cut(beams: Beams, layout: Layout, loads: Sequence[Load], loading: _Loading) -> list[list[Piece]]:
    """Put loads on marks into the loading, and return what acts on each length, cut at the marks."""
    pieces: list[list[Piece]] = [[] for _ in beams.lengths]
    for number, load in enumerate(loads):
        first, last = layout.ranks[2 * number], layout.ranks[2 * number + 1]
        mark = first // 2
        if load.kind is Settlement:
            loading.settlement[mark] += load.size
        elif load.kind is Rotation:
            loading.rotation[mark] += load.size
        elif load.kind in (Point, Couple):
            if first % 2:
                cut = layout.cut[2 * number]
                s = load.start.x - beams.x[mark]
                pieces[mark].append(Piece(load.kind, cut, cut, s, s, load.size, None))
            else:
                (loading.force if load.kind is Point else loading.couple)[mark] += load.size
        else:
            for e in range(mark, (last + 1) // 2):
                starts, ends = first == 2 * e + 1, last == 2 * e + 1
                a = load.start.x - beams.x[e] if starts else np.zeros(beams.count)
                b = load.end.x - beams.x[e] if ends else beams.lengths[e]
                sizes: tuple[Array, Array | None] = (load.size, None)
                if load.end_size is not None:
                    rate = (load.end_size - load.size) / (load.end.x - load.start.x)
                    at_start = load.size if first >= 2 * e else load.size + rate * (beams.x[e] - load.start.x)
                    at_end = load.end_size if last <= 2 * e + 2 else load.size + rate * (beams.x[e + 1] - load.start.x)
                    sizes = at_start, at_end
                piece = Piece(
                    load.kind,
                    layout.cut[2 * number] if starts else 0,
                    layout.cut[2 * number + 1] if ends else len(layout.cuts[e]) + 1,
                    a,
                    b,
                    *sizes,
                )
                pieces[e].append(piece)
    for e, of_length in enumerate(pieces):
        for piece in of_length:
            loading.add(beams, e, piece)
    return pieces


def solve(beams: Beams, layout: Layout, loads: Sequence[Load]) -> Solved:
    """Return the solution of each beam under all its loads; EI = 1 stands in where no stiffness is given."""
    loading = _Loading(beams)
    pieces = _cut(beams, layout, loads, loading)
    system = _System(beams)
    u, i, j, good = system.solved(loading)
    marks, last = beams.shape.beam.marks, len(beams.lengths) - 1
    M0, M1 = i * system.unit_length, -j * system.unit_length
    # What a released end carries is known, and needs no rounding.
    for e, (near, far) in enumerate(pairwise(marks)):
        if near.kr == 0.0 and (near.hinge or e == 0):
            M0[e] = loading.couple[e]
        if far.kr == 0.0 and (far.hinge or e == last):
            M1[e] = -loading.couple[e + 1]
    V0 = (M1 - M0 + loading.moment) / beams.lengths
    V1 = V0 - loading.total
    if marks[0].kv == 0.0:
        V0[0] = -loading.force[0]
    if marks[-1].kv == 0.0:
        V1[last] = loading.force[-1]
    phi0, phi1 = u[system.ti] * system.unit_rotation, u[system.tj] * system.unit_rotation
    v0, v1 = u[system.wi] * system.unit_deflection, u[system.wj] * system.unit_deflection
    nothing = np.zeros(beams.count)
    reactions, reaction_moments = [], []
    for n, mark in enumerate(marks):
        after = (V0[n], M0[n]) if n <= last else (nothing, nothing)
        before = (V1[n - 1], M1[n - 1]) if n else (nothing, nothing)
        reactions.append(after[0] - before[0] + loading.force[n] if mark.kv > 0.0 else nothing)
        reaction_moments.append(after[1] - before[1] - loading.couple[n] if mark.kr > 0.0 else nothing)
    total = loading.force.sum(axis=0) + loading.total.sum(axis=0)
    return Solved(
        beams,
        layout,
        pieces,
        (V0, M0, phi0, v0),
        (V1, M1, phi1, v1),
        reactions,
        reaction_moments,
        total,
        good,
    )


class _System:
    """Elements, freedoms and the eliminated matrix of beams of one shape; see `beamfuncs.stiffness._System`."""

    def __init__(self, beams: Beams) -> None:
        marks, stiffness = beams.shape.beam.marks, beams.shape.beam.stiffness
        self.unit_length = _powers_of_two(beams.lengths.max(axis=0))
        self.unit_rotation = self.unit_length**2 / _powers_of_two(beams.EI.max(axis=0))
        self.unit_deflection = self.unit_length * self.unit_rotation
        self.L = beams.lengths / self.unit_length
        self.lengths = beams.lengths
        self.bow = beams.EI * (self.unit_rotation / self.unit_length**2) / self.L
        self.sway = 3.0 * self.bow
        if beams.GA is not None:
            self.sway = self.sway / (1.0 + 12.0 * beams.EI / beams.GA / beams.lengths**2)

        self.w, self.left, self.right = [], [], []
        self.held: set[int] = set()
        self.springs: list[tuple[int, Array]] = []
        self.size = 0
        for mark, kv, kr in zip(marks, beams.kv, beams.kr, strict=True):
            w = self.size + mark.hinge
            self.w.append(w)
            self.left.append(self.size if mark.hinge else w + 1)
            self.right.append(w + 1)
            self.size = w + 2
            for freedom, spring, unit in (
                (w, kv, self.unit_deflection),
                (w + 1, kr, self.unit_rotation / self.unit_length),
            ):
                if isinstance(spring, np.ndarray):
                    if stiffness:
                        self.springs.append((freedom, spring * unit))
                    else:
                        self.held.add(freedom)
                elif spring:
                    self.held.add(freedom)
        self.wi, self.wj = self.w[:-1], self.w[1:]
        self.ti, self.tj = self.right[:-1], self.left[1:]
        self.free = [freedom for freedom in range(self.size) if freedom not in self.held]
        self.rigid = all(w in self.held for w in self.w)
        self._eliminate()

    def couples(self, u: Array, still: bool = False) -> tuple[Array, Array]:
        """Return the end couples that motions raise; `still` where no deflection is among them."""
        i, j = u[self.ti], u[self.tj]
        if not still:
            chord = (u[self.wj] - u[self.wi]) / self.L
            i, j = i - chord, j - chord
        return self.resisting(i, j)

    def resisting(self, i: Array, j: Array) -> tuple[Array, Array]:
        """Return the end couples of end rotations against the chord."""
        swaying, bowing = self.sway * (i + j), self.bow * (i - j)
        return swaying + bowing, swaying - bowing

    def _eliminate(self) -> None:
        """Eliminate the matrix: L D L' in the natural order, D being `pivots` and L `below`."""
        near, far = self.sway + self.bow, self.sway - self.bow
        turn = 2.0 * self.sway / self.L
        lift = 2.0 * turn / self.L
        entries: dict[tuple[int, int], Array] = {}
        free = set(self.free)

        def add(row: int, column: int, stiffness: Array) -> None:
            if row in free and column in free:
                place = max(row, column), min(row, column)
                entries[place] = entries[place] + stiffness if place in entries else stiffness

        for e, (wi, ti, wj, tj) in enumerate(zip(self.wi, self.ti, self.wj, self.tj, strict=True)):
            for row, column, stiffness in (
                (wi, wi, lift[e]),
                (wj, wj, lift[e]),
                (ti, ti, near[e]),
                (tj, tj, near[e]),
                (ti, wi, turn[e]),
                (wj, wi, -lift[e]),
                (wj, ti, -turn[e]),
                (tj, wi, turn[e]),
                (tj, ti, far[e]),
                (tj, wj, -turn[e]),
            ):
                add(row, column, stiffness)
        for freedom, stiffness in self.springs:
            add(freedom, freedom, stiffness)
        self.pivots: dict[int, Array] = {}
        self.below: dict[int, list[tuple[int, Array]]] = {}
        for column in self.free:
            pivot = self.pivots[column] = entries[column, column]
            rows = [row for row in range(column + 1, min(column + 5, self.size)) if (row, column) in entries]
            factors = {row: entries[row, column] / pivot for row in rows}
            self.below[column] = list(factors.items())
            for low, high in combinations_with_replacement(rows, 2):
                add(high, low, -factors[high] * entries[low, column])

    def _eliminated(self, forces: Array) -> None:
        """Put the motions that forces cause in the place of them."""
        for column in self.free:
            for row, factor in self.below[column]:
                forces[row] -= factor * forces[column]
        for column in reversed(self.free):
            forces[column] /= self.pivots[column]
            for row, factor in self.below[column]:
                forces[column] -= factor * forces[row]

    def solved(self, loading: _Loading) -> tuple[Array, Array, Array, Flags]:
        """Return the freedoms, the end couples, and which beams have settled; see `beamfuncs.stiffness`."""
        count = self.L.shape[1]
        u, applied = np.zeros((self.size, count)), np.zeros((self.size, count))
        base = np.zeros((self.size, count)) if self.springs or loading.settlement.any() or loading.rotation.any() else u
        if base is not u:
            base[self.w] = loading.settlement / self.unit_deflection
            base[self.right] = loading.rotation / self.unit_rotation
        applied[self.w] += loading.force
        applied[self.right] += loading.couple / self.unit_length
        for freedom, stiffness in self.springs:
            applied[freedom] += stiffness * base[freedom]
        if base is not u:
            for freedom in self.held:
                u[freedom] = base[freedom]
        support = loading.moment / self.lengths
        for e, (wi, wj) in enumerate(zip(self.wi, self.wj, strict=True)):
            applied[wi] += support[e]
            applied[wj] += loading.total[e] - support[e]
        tau = loading.tau_i / self.unit_rotation, loading.tau_j / self.unit_rotation
        fixed = self.resisting(*tau)
        if base is u:
            i, j = -fixed[0], -fixed[1]
        else:
            moved = self.couples(u)
            i, j = moved[0] - fixed[0], moved[1] - fixed[1]
        largest = np.maximum(_largest(i, j), np.abs(loading.moment / self.unit_length).max(axis=0))
        if self.free:
            largest = np.maximum(largest, np.abs(applied[self.free]).max(axis=0))
        largest_motion = np.maximum(np.abs(u).max(axis=0), _largest(*tau))
        good = np.zeros(count, dtype=bool)
        for _ in range(MOST_CORRECTIONS):
            du = self._correction(applied, u, i, j)
            di, dj = self.couples(du, self.rigid)
            i, j, u = i + di, j + dj, u + du
            largest = np.maximum(largest, _largest(i, j))
            largest_motion = np.maximum(largest_motion, np.abs(u).max(axis=0))
            settled = _largest(di, dj) <= SETTLED * largest
            good = settled & (np.abs(du).max(axis=0) <= SETTLED_MOTION * largest_motion)
            if good.all():
                break
        for freedom, stiffness in self.springs:
            good &= stiffness > SOFT * self.bow.max(axis=0)
            good &= np.abs(u[freedom] - base[freedom]) * SOFT * self.bow.min(axis=0) <= largest
        good &= np.isfinite(largest) & np.isfinite(largest_motion)
        noise = NOISE * largest
        return u, np.where(np.abs(i) > noise, i, 0.0), np.where(np.abs(j) > noise, j, 0.0), good

    def _correction(self, applied: Array, u: Array, i: Array, j: Array) -> Array:
        """Return the motions that the forces out of balance at the marks cause."""
        forces = applied.copy()
        for freedom, stiffness in self.springs:
            forces[freedom] -= stiffness * u[freedom]
        shear = None if self.rigid else (i + j) / self.L
        for e, (wi, ti, wj, tj) in enumerate(zip(self.wi, self.ti, self.wj, self.tj, strict=True)):
            if shear is not None:
                forces[wi] -= shear[e]
                forces[wj] += shear[e]
            forces[ti] -= i[e]
            forces[tj] -= j[e]
        for freedom in self.held:
            forces[freedom] = 0.0
        self._eliminated(forces)
        return forces


def _largest(i: Array, j: Array) -> Array:
    largest: Array = np.maximum(np.abs(i).max(axis=0), np.abs(j).max(axis=0))
    return largest


def _powers_of_two(sizes: Array) -> Array:
    power: Array = np.ldexp(1.0, np.frexp(sizes)[1])
    return power
