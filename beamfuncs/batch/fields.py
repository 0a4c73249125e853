"""The fields along many beams at once: polynomials a stretch, with the breaks of `beamfuncs.fields`."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import NamedTuple

import numpy as np

from beamfuncs.batch.columns import Array
from beamfuncs.batch.roots import crossings, evaluate
from beamfuncs.batch.stiffness import Solved
from beamfuncs.fields import LEFT, MOMENT, SHEAR, TIE
from beamfuncs.loads import Curvature, Distributed, Point

Polynomial = tuple[Array, ...]
"""Coefficients, lowest power first, a row for each stretch and a column for each beam."""


class Extreme(NamedTuple):
    """The extreme of a field on each beam, and the first place of it where that was asked for."""

    value: Array
    place: Array | None


@dataclass
class Fields:
    """Stretches from left to right: where they start, their lengths, the fields' polynomials and right end values."""

    solved: Solved
    first: list[int]
    x: Array
    end: Array
    h: Array
    polynomials: tuple[Polynomial, ...]
    ends: tuple[Array, ...]
    _values: dict[int, list[tuple[Array, Array]]] = field(default_factory=dict)

    def value(self, which: int, rank: int, cut: int, x: Array, side: str) -> Array:
        """Return a field at a place of that rank, behind so many cuts of its length."""
        k = self.first[rank // 2] + cut
        at_cut = rank % 2 == 0
        if cut and not at_cut:
            at_cut = bool(abs(self.solved.layout.cuts[rank // 2][cut - 1].x[0] - x[0]) <= self.solved.beams.near[0])
        found: Array
        if at_cut:
            found = self.ends[which][k - 1] if side == LEFT else self.polynomials[which][0][k]
        else:
            found = evaluate(tuple(row[k] for row in self.polynomials[which]), x - self.x[k])
        return found

    def extreme(self, which: int, sign: int, marks: tuple[int, int], position: bool) -> Extreme:
        """Return the largest (`sign` 1) or smallest (-1) value of a field between two marks."""
        part = slice(self.first[marks[0]], self.first[marks[1]])
        polynomial = tuple(row[part] for row in self.polynomials[which])
        h = self.h[part]
        inside = list(crossings(polynomial, h, sign))
        values = [polynomial[0], *(value for _, value in inside), self.ends[which][part]]
        if sign < 0:
            values = [-value for value in values]
        best = np.maximum.reduce([value.max(axis=0) for value in values])
        if not position:
            return Extreme(sign * best + 0.0, None)
        equal = best - TIE * self._peak(which)
        place = np.full(best.shape, np.nan)
        places = [self.x[part], *(self.x[part] + s for s, _ in inside), self.end[part]]
        for k in range(len(h)):
            for x, value in zip(places, values, strict=True):
                first = np.isnan(place) & (value[k] >= equal)
                place = np.where(first, x[k], place)
        return Extreme(sign * best + 0.0, place)

    def _peak(self, which: int) -> Array:
        peak: Array = evaluate(tuple(map(np.abs, self.polynomials[which])), self.h).max(axis=0)
        return peak


def fields(solved: Solved, bent: bool) -> Fields:
    """Return the fields of solved beams; slopes and deflections where the beams' `bent` line is wanted."""
    beams, layout = solved.beams, solved.layout
    count = beams.count
    first = [0]
    for cuts in layout.cuts:
        first.append(first[-1] + len(cuts) + 1)
    stretches = first[-1]
    wanted = 4 if bent else 2
    slanted = any(piece.end_size is not None for pieces in solved.pieces for piece in pieces)
    x, end, h = (np.empty((stretches, count)) for _ in range(3))
    q, dq, kappa = (np.zeros((stretches, count)) for _ in range(3))
    start = [np.empty((stretches, count)) for _ in range(wanted)]
    ends = [np.empty((stretches, count)) for _ in range(wanted)]
    EI, GA = np.empty((stretches, count)), None if beams.GA is None else np.empty((stretches, count))
    for e, cuts in enumerate(layout.cuts):
        k, last = first[e], first[e + 1]
        marks = [np.zeros(count), *(cut.s for cut in cuts), beams.lengths[e]]
        for n in range(len(marks) - 1):
            x[k + n] = beams.x[e] + marks[n]
            np.subtract(marks[n + 1], marks[n], out=h[k + n])
        end[k : last - 1] = x[k + 1 : last]
        end[last - 1] = beams.x[e + 1]
        EI[k:last] = beams.EI[e]
        if GA is not None and beams.GA is not None:
            GA[k:last] = beams.GA[e]
        for piece in solved.pieces[e]:
            if piece.kind is Curvature:
                kappa[k + piece.first : k + piece.last] += piece.size
            elif piece.kind is Distributed:
                if piece.end_size is None:
                    q[k + piece.first : k + piece.last] += piece.size
                    continue
                rate = (piece.end_size - piece.size) / (piece.end - piece.start)
                for n in range(piece.first, piece.last):
                    q[k + n] += piece.size + rate * (marks[n] - piece.start)
                    dq[k + n] += rate
    polynomials: list[Polynomial] = []
    for e, cuts in enumerate(layout.cuts):
        state = [solved.left[which][e] for which in range(wanted)]
        for n in range(len(cuts) + 1):
            k = first[e] + n
            for which in range(wanted):
                start[which][k] = state[which]
            if n == len(cuts):
                for which in range(wanted):
                    ends[which][k] = solved.right[which][e]
                break
            rows = (EI[k], None if GA is None else GA[k])
            local = _polynomials([row[k] for row in start], q[k], dq[k] if slanted else None, kappa[k], *rows)
            state = [evaluate(polynomial, h[k]) for polynomial in local]
            for which in range(wanted):
                ends[which][k] = state[which]
            for piece in solved.pieces[e]:
                if piece.first == piece.last == n + 1:
                    if piece.kind is Point:
                        state[SHEAR] = state[SHEAR] - piece.size
                    else:
                        state[MOMENT] = state[MOMENT] + piece.size
    polynomials = _polynomials(start, q, dq if slanted else None, kappa, EI, GA)
    return Fields(solved, first, x, end, h, tuple(polynomials), tuple(ends))


def _polynomials(
    start: list[Array], q: Array, dq: Array | None, kappa: Array, EI: Array, GA: Array | None
) -> list[Polynomial]:
    """Return the polynomials of the fields whose values at the left end are given; see `beamfuncs.fields`."""
    V, M = start[:2]
    shear: Polynomial = (V, -q)
    moment: Polynomial = (M, V, -q / 2)
    if dq is not None:
        shear, moment = (*shear, -dq / 2), (*moment, -dq / 6)
    if len(start) == 2:
        return [shear, moment]
    phi, v = start[2:]
    bend = -(M / EI + kappa)
    slope: Polynomial = (phi, bend, -V / (2 * EI), q / (6 * EI))
    deflection: Polynomial = (v, phi, bend / 2, slope[2] / 3, slope[3] / 4)
    if dq is not None:
        slope = (*slope, dq / (24 * EI))
        deflection = (*deflection, slope[4] / 5)
    if GA is not None:
        sheared = [phi + V / GA, bend / 2 - q / (2 * GA)]
        if dq is not None:
            sheared.append(deflection[3] - dq / (6 * GA))
        deflection = (v, *sheared, *deflection[1 + len(sheared) :])
    return [shear, moment, slope, deflection]
