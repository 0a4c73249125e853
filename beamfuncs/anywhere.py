"""Where along a beam a field is largest while a train may stand anywhere.

Place and position are two unknowns. In a cell, where neither the place nor an axle crosses a mark and no axle crosses
the place, the field is one polynomial in both; cells are cut into triangles. On a triangle a polynomial is a mean of
its Bernstein coefficients, so that the largest of them bounds it: triangles that cannot hold the maximum are dropped,
the others halved, until nothing larger than what was found is possible (branch and bound; G. Farin, Triangular
Bernstein-Bezier patches, Computer Aided Geometric Design 3, 1986). Its exact place is then a stationary point of the
cell's polynomial or of one of its edges, or a corner.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from functools import lru_cache
from itertools import pairwise
from math import factorial
from typing import TYPE_CHECKING, Any, NamedTuple

import numpy as np
from numpy.polynomial import Polynomial
from numpy.typing import NDArray

from beamfuncs.beam import Beam
from beamfuncs.errors import impossible
from beamfuncs.fields import DEFLECTION, LEFT, MOMENT, RIGHT, SHEAR, SLOPE, derivative, roots
from beamfuncs.influence import Section, influence_lines
from beamfuncs.loads import Factors
from beamfuncs.parts import Piece
from beamfuncs.stiffness import Array
from beamfuncs.trains import crossings, shifted

if TYPE_CHECKING:
    from beamfuncs.adverse import Adverse

DEGREES = {SHEAR: 0, MOMENT: 1, SLOPE: 2, DEFLECTION: 3}
"""The degree of each field along an element that no load acts on."""
CLOSE = 1e-11
"""What is found falls short of the maximum by less than this part of the largest value met."""
MOST_TRIANGLES = 100_000
NEWTON_STEPS = 5
NODES = 16
"""Places tried in a stretch where a search is all that is possible."""
PEAKS = 8
"""How many of the places that are larger than their neighbours it closes in on."""


class Cell(NamedTuple):
    """A polynomial in the distance `s` along an element and in the position `p` of the first axle from `start`.

    `corners` are (s, p - start) around the cell, `polynomial` holds a row for each power of s, a column for each of p.
    """

    element: int
    corners: list[tuple[float, float]]
    polynomial: Array


def place(
    adverse: Adverse,
    which: int,
    columns: Sequence[Factors],
    trains: Sequence[Factors],
    sign: int,
    start: float,
    end: float,
) -> tuple[float, str]:
    """Return the place, and the side of it, at which `sign` times a field is largest between two marks."""
    pieces = list(adverse.along(which, start, end).pieces(columns, sign))
    if len(trains) > 1 or any(train.lane for train in adverse.loads.trains):

        def value(x: float, side: str) -> float:
            return sign * adverse.extreme(Section(which, x, side), columns, trains, sign).value

        def prepare(places: Sequence[tuple[float, str]]) -> None:
            adverse.prepare([Section(which, x, side) for x, side in places])

        return _searched(pieces, value, prepare)
    beam, (train,), (factors,) = adverse.beam, adverse.loads.trains, trains
    lines = _Lines(beam, which)
    cells = []
    for e, a, b, along in _along(adverse.beam, pieces):
        cells.append(Cell(e, [(a, 0.0), (b, 0.0)], _with(along)))  # the train is not there
        for factor in set(factors) - {0.0}:
            for offsets in train.offsets:
                forces = sign * factor * np.array(train.axles)
                cells += _cells(lines, e, a, b, along, forces, np.array(offsets))
    cell, near = _largest(cells)
    s = _sharpened(cell, near)
    left, right = min(s for s, _ in cell.corners), max(s for s, _ in cell.corners)
    if s >= right - beam.near:
        return beam.x[cell.element] + right, LEFT
    return beam.x[cell.element] + (s if s > left + beam.near else left), RIGHT


def _along(beam: Beam, pieces: Sequence[Piece]) -> Iterator[tuple[int, float, float, Array]]:
    """Yield the element, the two ends in it, and the polynomial of the loads that do not move, piece by piece."""
    for x, length, polynomial in pieces:
        e = beam.length_at(x + length / 2)
        left = x - beam.x[e]
        moved = Polynomial(polynomial)(Polynomial([-left, 1.0]))
        yield e, left, left + length, np.asarray(moved.coef, float)


class _Lines:
    """Influence lines of a field along every element, as polynomials in the place and in the position of the load."""

    def __init__(self, beam: Beam, which: int) -> None:
        self.beam = beam
        self._which = which
        self._known: dict[int, Array] = {}

    def of(self, e: int) -> Array:
        """Return the coefficients [side, element of the load + 1, power of the place, power of the position].

        Place and position count from the left ends of their elements; the first and the last element of the load stand
        for none. On side 0 the load is to the left of the place, on side 1 to its right.
        """
        if e not in self._known:
            beam, size = self.beam, DEGREES[self._which] + 1
            nodes = beam.lengths[e] * (1.0 - np.cos(np.pi * (np.arange(size) + 0.5) / size)) / 2.0
            lines = influence_lines(beam, [Section(self._which, beam.x[e] + s) for s in nodes.tolist()])
            values = np.zeros((2, len(beam.lengths) + 2, size, 4))
            for n, (s, line) in enumerate(zip(nodes, lines, strict=True)):
                pieces = np.array(line.pieces)
                values[0, 1:-1, n] = np.delete(pieces, e + 1, axis=0)
                values[1, 1:-1, n] = np.delete(pieces, e, axis=0)
                values[1, e + 1, n] = shifted(pieces[e + 1], np.array(-s))
            powers = np.vander(nodes / beam.lengths[e], increasing=True)
            scale = beam.lengths[e] ** np.arange(size)
            self._known[e] = np.einsum("ln,vjnk->vjlk", np.linalg.inv(powers) / scale[:, None], values)
        return self._known[e]


def _cells(lines: _Lines, e: int, a: float, b: float, along: Array, forces: Array, offsets: Array) -> Iterator[Cell]:
    """Yield the cells of a piece of an element, the train being somewhere on the beam."""
    beam, table = lines.beam, lines.of(e)
    x = np.array(beam.x)
    starts = np.concatenate([[0.0], x])
    for p0, p1 in pairwise(crossings(x, offsets).tolist()):
        at = np.searchsorted(x, (p0 + p1) / 2 + offsets)  # 0 before the beam, elements + 1 beyond it
        cubics = shifted(table[:, at], (p0 + offsets - starts[at])[:, None]) * forces[:, None, None]
        inside = offsets[at == e + 1] - x[e]  # an axle is to the left of the place where s - p exceeds this
        for low, high in pairwise([-np.inf, *sorted(inside.tolist()), np.inf]):
            corners = _clipped([(a, 0.0), (b, 0.0), (b, p1 - p0), (a, p1 - p0)], low + p0, high + p0)
            if corners:
                left = (offsets - x[e] <= low) | (at <= e)
                moving = np.where(left[:, None, None], cubics[0], cubics[1]).sum(axis=0)
                yield Cell(e, corners, _with(along, moving))


def _with(along: Array, moving: Array | None = None) -> Array:
    """Return the polynomial of what does not move and of what moves."""
    total = np.zeros((max(len(along), 0 if moving is None else len(moving)), 4))
    total[: len(along), 0] = along
    if moving is not None:
        total[: len(moving)] += moving
    return total


def _clipped(corners: list[tuple[float, float]], low: float, high: float) -> list[tuple[float, float]]:
    """Return the corners of the part of a convex polygon where s - p is between two numbers; none where it is thin."""
    for sign, limit in ((1.0, low), (-1.0, -high)):
        kept: list[tuple[float, float]] = []
        over = [sign * (s - p) - limit for s, p in corners]
        for n, corner in enumerate(corners):
            before, last = over[n - 1], corners[n - 1]
            if (before > 0.0) != (over[n] > 0.0) and np.isfinite(before):
                t = before / (before - over[n])
                kept.append((last[0] + t * (corner[0] - last[0]), last[1] + t * (corner[1] - last[1])))
            if over[n] > 0.0:
                kept.append(corner)
        corners = kept
    return corners if len(corners) >= 3 else []


# --- branch and bound -------------------------------------------------------------------------------------


def _largest(cells: Sequence[Cell]) -> tuple[Cell, tuple[float, float]]:
    """Return the cell that holds the largest value of all, and a point that is close to it."""
    size = max(len(cell.polynomial) for cell in cells)
    table = np.zeros((len(cells), size, 4))
    corners, owner = [], []
    for n, cell in enumerate(cells):
        table[n, : len(cell.polynomial)] = cell.polynomial
        first, *rest = [*cell.corners, *cell.corners[-1:]] if len(cell.corners) == 2 else cell.corners
        for second, third in pairwise(rest):
            corners.append((first, second, third))
            owner.append(n)
    degree = size - 1 + 3
    weights, to_bernstein = _lattice(degree)
    triangles, of_cell = np.array(corners), np.array(owner)
    best, found, point = -np.inf, 0, (0.0, 0.0)
    scale = 0.0
    while len(triangles):
        nodes = np.einsum("nv,tvc->tnc", weights, triangles)
        values = _values(table[of_cell], nodes)
        t, n = divmod(int(np.argmax(values)), values.shape[1])
        if values[t, n] > best:
            best, found, point = float(values[t, n]), int(of_cell[t]), tuple(nodes[t, n].tolist())
        scale = max(scale, float(np.abs(values).max()))
        bounds = (values @ to_bernstein).max(axis=1)
        open_ = bounds > best + CLOSE * scale
        if open_.sum() > MOST_TRIANGLES:
            raise impossible(
                "beam: the place of the extreme under the train cannot be told; ask for a place, 'at' an x"
            )
        triangles, of_cell = _halved(triangles[open_], of_cell[open_])
    return cells[found], point


def _sharpened(cell: Cell, near: tuple[float, float]) -> float:
    """Return the place of the maximum that is close to a point: on an edge of its cell, or where the slope is zero."""

    def value(points: Array) -> Array:
        values: Array = _values(cell.polynomial[None], points[None])[0]
        return values

    corners = np.array(cell.corners)
    degree = cell.polynomial.shape[0] + 2
    tried = [np.array(near)]
    for start, end in zip(corners, np.roll(corners, -1, axis=0), strict=True):
        t = np.polynomial.chebyshev.chebpts2(degree + 1) / 2 + 0.5
        along = Polynomial.fit(t, value(start + t[:, None] * (end - start)), degree, domain=[0.0, 1.0]).convert()
        stationary = roots(derivative(tuple(along.coef.tolist())), 1.0)
        tried += [start + u * (end - start) for u in (0.0, *stationary)]
    inner = _stationary(cell.polynomial, near)
    best = tried[int(np.argmax(value(np.array(tried))))]
    if inner is not None and _inside(inner, corners) and value(inner[None])[0] >= value(best[None])[0]:
        best = inner
    return float(best[0])


def _inside(point: Array, corners: Array) -> bool:
    """Tell whether a point is in a convex polygon: to the same side of all its edges."""
    edges, to = np.roll(corners, -1, axis=0) - corners, point - corners
    turns = edges[:, 0] * to[:, 1] - edges[:, 1] * to[:, 0]
    return bool((turns >= 0.0).all() or (turns <= 0.0).all())


def _stationary(polynomial: Array, near: tuple[float, float]) -> Array | None:
    """Return where both derivatives of a polynomial are zero, by Newton's method from a point near it."""
    from numpy.polynomial.polynomial import polyder, polyval2d

    u, v = near

    def at(derivative: NDArray[np.floating[Any]]) -> float:
        return float(polyval2d(u, v, derivative))

    s, p = polyder(polynomial, axis=0), polyder(polynomial, axis=1)
    ss, sp, pp = polyder(s, axis=0), polyder(s, axis=1), polyder(p, axis=1)
    for _ in range(NEWTON_STEPS):
        a, b, c = at(ss), at(sp), at(pp)
        determinant = a * c - b * b
        if determinant == 0.0:
            return None
        du, dv = at(s), at(p)
        u, v = u - (c * du - b * dv) / determinant, v - (a * dv - b * du) / determinant
    return np.array([u, v]) if np.isfinite([u, v]).all() else None


def _values(polynomials: Array, nodes: Array) -> Array:
    """Return the values of a polynomial of each triangle at its nodes."""
    s, p = nodes[..., 0], nodes[..., 1]
    total = np.zeros_like(s)
    for row in np.moveaxis(polynomials, 1, 0)[::-1]:
        cubic = ((row[:, 3, None] * p + row[:, 2, None]) * p + row[:, 1, None]) * p + row[:, 0, None]
        total = total * s + cubic
    return total


def _halved(triangles: Array, of_cell: Array) -> tuple[Array, Array]:
    """Cut each triangle through the middle of its longest edge, so that none stays long however often it is cut."""
    others = np.roll(triangles, -1, axis=1)
    edge = np.argmax(((others - triangles) ** 2).sum(axis=2), axis=1)
    rows = np.arange(len(triangles))
    a, b, c = (triangles[rows, (edge + n) % 3] for n in range(3))
    middle = (a + b) / 2
    halves = np.concatenate([np.stack([a, middle, c], axis=1), np.stack([middle, b, c], axis=1)])
    return halves, np.concatenate([of_cell, of_cell])


@lru_cache
def _lattice(degree: int) -> tuple[Array, Array]:
    """Return nodes of a triangle, as means of its corners, and what turns values there into Bernstein coefficients."""
    n = degree
    powers = [(i, j, n - i - j) for i in range(n + 1) for j in range(n + 1 - i)]
    weights = np.array(powers) / n
    basis = [
        [factorial(n) / (factorial(i) * factorial(j) * factorial(k)) * u**i * v**j * w**k for i, j, k in powers]
        for u, v, w in weights
    ]
    return weights, np.linalg.inv(np.array(basis)).T


# --- where no cell is a polynomial ------------------------------------------------------------------------


def _searched(
    pieces: Sequence[Piece],
    value: Callable[[float, str], float],
    prepare: Callable[[Sequence[tuple[float, str]]], None],
) -> tuple[float, str]:
    """Return the place of the largest value found by trying many places and closing in on the best.

    A lane load, and several trains that move by themselves, make no polynomial of the place.
    """
    from scipy.optimize import minimize_scalar

    tried: list[tuple[float, float, str, float, float]] = []
    for x, length, _ in pieces:
        inner = length * (1.0 - np.cos(np.pi * np.arange(1, NODES) / NODES)) / 2
        places = [(x, RIGHT), *((x + s, RIGHT) for s in inner.tolist()), (x + length, LEFT)]
        prepare(places)
        values = [value(at, side) for at, side in places]
        for n, ((at, side), found) in enumerate(zip(places, values, strict=True)):
            before, after = max(n - 1, 0), min(n + 1, len(places) - 1)
            if found >= max(values[before], values[after]):
                tried.append((found, at, side, places[before][0], places[after][0]))
    tried.sort(key=lambda one: -one[0])
    best = tried[0][:3]
    for _, _, _, low, high in tried[:PEAKS]:
        closer = minimize_scalar(
            lambda x: -value(x, RIGHT), bounds=(low, high), method="bounded", options={"xatol": 1e-9}
        )
        if -closer.fun > best[0]:
            best = -closer.fun, float(closer.x), RIGHT
    return best[1], best[2]
