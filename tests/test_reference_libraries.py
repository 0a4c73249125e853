"""The functions against two general libraries that solve the same differential equation their own
way: scipy's collocation for boundary value problems, and sympy's exact algebra."""

from __future__ import annotations

from collections.abc import Callable
from itertools import pairwise

import numpy as np
import pytest
import sympy as sp
from numpy.typing import NDArray
from scipy.integrate import solve_bvp

from beamfuncs.functions import beam_result

Array = NDArray[np.float64]

# --- scipy: EI v'''' = q as a boundary value problem ---------------------------------------------

COLLOCATION = 1e-10
"""The relative residual asked of the collocation."""
AGREEMENT = 1e-10
"""Of the peak of each field: what the collocation delivers with that residual."""

RIGID = {"fixed": "vr", "pinned": "v", "roller": "v", "guided": "r"}
"""Whether a mark holds the deflection v and the rotation r."""


class Boundary:
    """A beam as a boundary value problem: each part between breaks is stretched onto 0..1, and the
    states (v, phi, M, V) of all parts make one first-order system.

    `marks` holds (x, kind) or (x, "spring", kv, kr); `loads` holds (x0, x1, q0, q1); the rest say
    what happens at a place: forces, couples, and (settlement, rotation) of the supports.
    """

    def __init__(
        self,
        marks: list[tuple],
        ei: list[float],
        ga: list[float] | None = None,
        spread: list[tuple[float, float, float, float]] = (),
        points: dict[float, float] | None = None,
        couples: dict[float, float] | None = None,
        moved: dict[float, tuple[float, float]] | None = None,
        curvature: tuple[float, float, float] = (0.0, 0.0, 0.0),
    ) -> None:
        self.marks = {mark[0]: mark[1:] for mark in marks}
        self.points, self.couples, self.moved = points or {}, couples or {}, moved or {}
        breaks = {*self.marks, *self.points, *self.couples}
        breaks |= {x for load in (*spread, curvature) for x in load[:2]}
        self.breaks = sorted(breaks)
        parts = list(pairwise(self.breaks))
        places = sorted(self.marks)
        length = [max(i for i, x in enumerate(places[:-1]) if x <= a) for a, _ in parts]
        self.h = np.array([b - a for a, b in parts])
        self.ei = np.array([ei[i] for i in length])
        self.ga = np.array([ga[i] for i in length]) if ga else np.full(len(parts), np.inf)
        self.q = np.zeros((2, len(parts)))
        for x0, x1, q0, q1 in spread:
            for k, part in enumerate(parts):
                if x0 <= part[0] and part[1] <= x1:
                    self.q[:, k] += np.interp(part, (x0, x1), (q0, q1))
        start, end, bent = curvature
        self.kappa = np.array([bent if start <= a and b <= end else 0.0 for a, b in parts])
        # Forces are solved in this unit, so that all four fields are of like size.
        self.unit = float(max(self.ei))

    def slopes(self, t: Array, y: Array) -> Array:
        """The derivatives of all states with respect to the stretched place t."""
        _, phi, m, s = y.reshape(4, len(self.h), -1)
        h, ei, ga, kappa = (a[:, None] for a in (self.h, self.ei, self.ga, self.kappa))
        q = self.q[0, :, None] * (1 - t) + self.q[1, :, None] * t
        bend, slide = m * self.unit / ei + kappa, s * self.unit / ga
        return np.stack([h * (phi + slide), -h * bend, h * s, -h * q / self.unit]).reshape(y.shape)

    def residuals(self, start: Array, end: Array) -> Array:
        """What must vanish at every break, left to right."""
        a, b = start.reshape(4, -1), end.reshape(4, -1)
        outside = np.zeros(4)
        out: list[float] = []
        for k, x in enumerate(self.breaks):
            kind, *spring = self.marks.get(x, ("",))
            first, last = k == 0, k == len(self.h)
            left = outside if first else b[:, k - 1]
            right = outside if last else a[:, k]
            here = left if last else right
            v0, phi0 = self.moved.get(x, (0.0, 0.0))
            kv, kr = spring or (0.0, 0.0)
            up = (right[3] - left[3]) * self.unit + self.points.get(x, 0.0)
            turn = (right[2] - left[2]) * self.unit - self.couples.get(x, 0.0)
            if not first and not last:
                out.append(right[0] - left[0])
                out.append(left[2] if kind == "hinge" else right[1] - left[1])
            holds = RIGID.get(kind, "")
            sunk, turned = here[0] - v0, here[1] - phi0
            out.append(sunk if "v" in holds else (up - kv * sunk) / self.unit)
            out.append(turned if "r" in holds else (turn + kr * turned) / self.unit)
        return np.array(out)

    def solve(self) -> Callable[[int, float], Array]:
        """The states inside each part, as a function of its number and the stretched place."""
        mesh = np.linspace(0, 1, 9)
        guess = np.zeros((4 * len(self.h), mesh.size))
        answer = solve_bvp(self.slopes, self.residuals, mesh, guess, tol=COLLOCATION, max_nodes=20000)
        assert answer.success, answer.message
        scale = np.array([1.0, 1.0, self.unit, self.unit])
        return lambda k, t: answer.sol(t).reshape(4, -1)[:, k] * scale


BOUNDARY_BEAMS = {
    "simple beam, load rising over a part": (
        ("pinned 6 roller", "varying 0 to 30 from 1 to 4", "8000"),
        Boundary([(0, "pinned"), (6, "roller")], [8000], spread=[(1, 4, 0, 30)]),
    ),
    "cantilever, couple and tip load": (
        ("fixed 3 free", "couple 15 at 2; point 20 at 3", "5000"),
        Boundary([(0, "fixed"), (3, "free")], [5000], points={3: 20}, couples={2: 15}),
    ),
    "propped beam, load next to the prop": (
        ("fixed 8 pinned", "udl 12 from 5 to 8", "24000"),
        Boundary([(0, "fixed"), (8, "pinned")], [24000], spread=[(5, 8, 12, 12)]),
    ),
    "three unequal spans, two loads": (
        ("pinned 4 pinned 7 pinned 5 pinned", "udl 10; point 50 at 2 in span 2", "20000"),
        Boundary(
            [(0, "pinned"), (4, "pinned"), (11, "pinned"), (16, "pinned")],
            [20000] * 3,
            spread=[(0, 16, 10, 10)],
            points={6: 50},
        ),
    ),
    "overhangs with a stiffness each": (
        ("free 1.5 pinned 6 pinned 2 free", "udl 8; point 12 at 0", "9000 24000 4000"),
        Boundary(
            [(0, "free"), (1.5, "pinned"), (7.5, "pinned"), (9.5, "free")],
            [9000, 24000, 4000],
            spread=[(0, 9.5, 8, 8)],
            points={0: 12},
        ),
    ),
    "hinge beside a built-in support": (
        ("fixed 4 hinge 3 pinned 5 fixed", "udl 9 from 2 to 10; point 30 at 4", "16000"),
        Boundary(
            [(0, "fixed"), (4, "hinge"), (7, "pinned"), (12, "fixed")],
            [16000] * 3,
            spread=[(2, 10, 9, 9)],
            points={4: 30},
        ),
    ),
    "springs, one holding rotation": (
        ("spring(3000, 900) 5 spring(2500) 4 pinned", "udl 15; couple 20 at 5", "12000"),
        Boundary(
            [(0, "spring", 3000, 900), (5, "spring", 2500, 0), (9, "pinned")],
            [12000] * 2,
            spread=[(0, 9, 15, 15)],
            couples={5: 20},
        ),
    ),
    "sinking and turning supports": (
        (
            "fixed 6 pinned 5 fixed",
            "settle 0.012 at support 2; rotate 0.002 at support 1; settle -0.003 at support 3",
            "30000",
        ),
        Boundary(
            [(0, "fixed"), (6, "pinned"), (11, "fixed")],
            [30000] * 2,
            moved={0: (0, 0.002), 6: (0.012, 0), 11: (-0.003, 0)},
        ),
    ),
    "shear flexibility and a step": (
        ("fixed 2 step 3 pinned 1 free", "udl 40 from 1 to 6", "EI 9000 4000 4000; GA 20000"),
        Boundary(
            [(0, "fixed"), (2, "step"), (5, "pinned"), (6, "free")],
            [9000, 4000, 4000],
            [20000] * 3,
            spread=[(1, 6, 40, 40)],
        ),
    ),
    "guided end and free curvature": (
        ("guided 4 pinned 6 fixed", "curvature 5e-4 from 2 to 7; point 25 at 0", "18000"),
        Boundary(
            [(0, "guided"), (4, "pinned"), (10, "fixed")],
            [18000] * 2,
            points={0: 25},
            curvature=(2, 7, 5e-4),
        ),
    ),
}


@pytest.mark.parametrize("name", BOUNDARY_BEAMS)
def test_fields_agree_with_collocation(name: str) -> None:
    """Deflection, slope, moment and shear at five places of every part."""
    (line, loads, stiffness), problem = BOUNDARY_BEAMS[name]
    states = problem.solve()
    where = [
        (k, t, a + t * (b - a)) for k, (a, b) in enumerate(pairwise(problem.breaks)) for t in (0.0, 0.2, 0.5, 0.9, 1.0)
    ]
    solved = np.array([states(k, t) for k, t, _ in where])
    names = ("deflection", "slope", "moment", "shear")
    phrases = [[f"{field} at {x!r} {'left' if t == 1.0 else 'right'}" for field in names] for _, t, x in where]
    answered = np.array(beam_result(line, loads, phrases, stiffness))
    peaks = np.abs(solved).max(axis=0)
    assert (np.abs(answered - solved) <= AGREEMENT * peaks).all(), np.abs(answered - solved).max(axis=0) / peaks
    assert (np.abs(answered * (1 + 3 * AGREEMENT) - solved).max(axis=0) > AGREEMENT * peaks).all()


# --- sympy: the exact answer as a formula --------------------------------------------------------

x, L, a, b, q, P, EI, GA, k, d = sp.symbols("x L a b q P EI GA k d", positive=True)
LIKE = 1e-12


def integrated(load: sp.Expr, name: str) -> tuple[sp.Expr, list[sp.Symbol]]:
    """The deflection of a stretch from EI v'''' = load, and its four constants."""
    constants = list(sp.symbols(f"{name}:4"))
    v = load / EI
    for c in constants:
        v = sp.integrate(v, x) + c
    return v, constants


def moment(v: sp.Expr) -> sp.Expr:
    """The bending moment of a deflection."""
    return -EI * sp.diff(v, x, 2)


def shear(v: sp.Expr) -> sp.Expr:
    """The shear force of a deflection."""
    return sp.diff(moment(v), x)


def joined(u: sp.Expr, v: sp.Expr, place: sp.Expr, force: sp.Expr | int = 0) -> list[sp.Expr]:
    """What vanishes where two stretches meet under a force."""
    fields: list[Callable[[sp.Expr], sp.Expr]] = [lambda w: w, lambda w: sp.diff(w, x), moment]
    jumps = [(f(v) - f(u)).subs(x, place) for f in fields]
    return [*jumps, (shear(v) - shear(u)).subs(x, place) + force]


def determined(conditions: list[sp.Expr], constants: list[sp.Symbol]) -> dict[sp.Symbol, sp.Expr]:
    """The constants for which the conditions vanish."""
    (answer,) = sp.linsolve(conditions, constants)
    return dict(zip(constants, answer, strict=True))


def propped() -> tuple[sp.Expr, sp.Expr]:
    """Left reaction and moment of a beam built in at 0, pinned at L, loaded from a to L."""
    u, us = integrated(sp.Integer(0), "u")
    v, vs = integrated(q, "v")
    conditions = [u.subs(x, 0), sp.diff(u, x).subs(x, 0), v.subs(x, L), moment(v).subs(x, L)]
    found = determined(conditions + joined(u, v, a), us + vs)
    u = u.subs(found)
    return sp.simplify(shear(u).subs(x, 0)), sp.simplify(moment(u).subs(x, 0))


def number(formula: sp.Expr, **values: object) -> float:
    """A formula's value for exact numbers."""
    exact = {sp.Symbol(n, positive=True): sp.Rational(str(v)) for n, v in values.items()}
    return float(formula.subs(exact))


def like(answer: object, exact: float) -> bool:
    """Whether an answer is the exact number, up to rounding."""
    assert isinstance(answer, float)
    return abs(answer - exact) <= LIKE * abs(exact)


def test_propped_beam_with_a_load_next_to_the_prop_has_its_closed_form() -> None:
    """Integrating EI v'''' = q gives qL/8 b²(6-b²) and -qL²/8 b²(2-b²), b = 1-a/L."""
    reaction, fixing = propped()
    s = 1 - a / L
    assert sp.simplify(reaction - q * L / 8 * s**2 * (6 - s**2)) == 0
    assert sp.simplify(fixing + q * L**2 / 8 * s**2 * (2 - s**2)) == 0
    assert sp.limit(reaction, a, L) == sp.limit(fixing, a, L) == 0


@pytest.mark.parametrize("start", ["0", "0.8", "2.5", "4", "6.25", "7.9"])
def test_propped_beam_answers_are_the_closed_form(start: str) -> None:
    """Left reaction and moment, by three ways of asking, for loads that start along the beam."""
    reaction, fixing = propped()
    cell = ("fixed 8 pinned", f"udl 12 from {start} to 8")
    numbers = {"q": 12, "L": 8, "a": start}
    assert like(beam_result(*cell, "reaction 1"), number(reaction, **numbers))
    for phrase in ("reaction moment 1", "moment at 0", "moment min"):
        assert like(beam_result(*cell, phrase), number(fixing, **numbers))


def test_propped_beam_trend_and_limit() -> None:
    """Reaction and moment shrink all the way to nothing as the load draws back to the prop."""
    s = sp.Symbol("s", positive=True)
    for formula in propped():
        per_load = sp.simplify(formula.subs(a, L * (1 - s)) / (q * L))
        rise = sp.diff(per_load, s)
        inside = sp.Interval.open(0, 1)
        assert sp.solveset(rise.subs(L, 1), s, inside) == sp.EmptySet

    starts = [*(n / 8 for n in range(64)), 7.9, 7.99, 7.999, 7.9999, 7.99999]
    for phrase, power in (("reaction 1", 1), ("reaction moment 1", 2)):
        answered = [beam_result("fixed 8 pinned", f"udl 12 from {start!r} to 8", phrase) for start in sorted(starts)]
        sizes = np.abs(np.array(answered, dtype=float))
        assert (np.diff(sizes) < 0).all()
        # Next to the prop the closed forms tend to 6/8 qLb² and 2/8 qL²b².
        rest = 12 * 8**power * (1e-5 / 8) ** 2 * (6 if power == 1 else 2) / 8
        assert sizes[-1] == pytest.approx(rest, rel=1e-5)


def test_built_in_beam_under_a_triangular_load() -> None:
    """A load rising from nothing to q: end moments, reactions and the deflection anywhere."""
    v, cs = integrated(q * x / L, "c")
    slope = sp.diff(v, x)
    v = v.subs(determined([f.subs(x, at) for f in (v, slope) for at in (0, L)], cs))
    cell = ("fixed 5.5 fixed", "varying 0 to 21", None)
    numbers = {"q": 21, "L": "5.5", "EI": 7300}
    assert like(beam_result(*cell[:2], "reaction 1"), number(shear(v), x=0, **numbers))
    assert like(beam_result(*cell[:2], "reaction 2"), -number(shear(v), x="5.5", **numbers))
    assert like(beam_result(*cell[:2], "reaction moment 2"), -number(moment(v), x="5.5", **numbers))
    for at in ("0.7", "2.75", "4.1"):
        assert like(beam_result(*cell[:2], f"deflection at {at}", 7300), number(v, x=at, **numbers))


def test_two_unequal_spans_under_a_uniform_load() -> None:
    """The moment over the middle support is that of the three-moment theorem, -q(a³+b³)/8(a+b)."""
    u, us = integrated(q, "u")
    v, vs = integrated(q, "v")
    ends = [u.subs(x, 0), moment(u).subs(x, 0), v.subs(x, a + b), moment(v).subs(x, a + b)]
    middle = [u.subs(x, a), v.subs(x, a), *joined(u, v, a)[1:3]]
    found = determined(ends + middle, us + vs)
    over = sp.simplify(moment(u).subs(found).subs(x, a))
    assert sp.simplify(over + q * (a**3 + b**3) / (8 * (a + b))) == 0
    left = sp.simplify(shear(u).subs(found).subs(x, 0))
    cell = ("pinned 4.2 pinned 7.7 roller", "udl 13.5")
    numbers = {"q": "13.5", "a": "4.2", "b": "7.7"}
    assert like(beam_result(*cell, "moment at support 2"), number(over, **numbers))
    assert like(beam_result(*cell, "reaction 1"), number(left, **numbers))


def test_cantilever_on_a_spring_under_a_point_load() -> None:
    """The spring at the tip takes P a²(3L-a)/2L³ over 1 + 3EI/kL³."""
    u, us = integrated(sp.Integer(0), "u")
    v, vs = integrated(sp.Integer(0), "v")
    ends = [u.subs(x, 0), sp.diff(u, x).subs(x, 0), moment(v).subs(x, L)]
    ends.append((-shear(v) - k * v).subs(x, L))
    found = determined(ends + joined(u, v, a, P), us + vs)
    spring = sp.simplify(-shear(v).subs(found).subs(x, L))
    closed = P * a**2 * (3 * L - a) / (2 * L**3) / (1 + 3 * EI / (k * L**3))
    assert sp.simplify(spring - closed) == 0
    under = u.subs(found).subs(x, a)
    cell = ("fixed 6 spring(850)", "point 33 at 2.4")
    numbers = {"P": 33, "a": "2.4", "L": 6, "k": 850, "EI": 9100}
    assert like(beam_result(*cell, "reaction 2", 9100), number(spring, **numbers))
    assert like(beam_result(*cell, "deflection at 2.4", 9100), number(under, **numbers))


def test_shear_flexible_built_in_beam_with_a_sinking_end() -> None:
    """With V = M', M = -EI phi' and v' = phi + V/GA the shear is 12EId/L³ over 1 + 12EI/GAL²."""
    at0, at1, force, m0 = sp.symbols("at0 at1 force m0")
    phi = at0 - sp.integrate((m0 + force * x) / EI, x)
    v = at1 + sp.integrate(phi + force / GA, x)
    found = determined([phi.subs(x, 0), v.subs(x, 0), phi.subs(x, L), v.subs(x, L) - d], [at0, at1, m0, force])
    closed = 12 * EI * d / L**3 / (1 + 12 * EI / (GA * L**2))
    assert sp.simplify(found[force] - closed) == 0
    cell = ("fixed 1.6 fixed", "settle 0.004 at support 2")
    stiffness = "EI 5200; GA 31000"
    numbers = {"EI": 5200, "GA": 31000, "L": "1.6", "d": "0.004"}
    assert like(beam_result(*cell, "shear at 0.3", stiffness), number(found[force], **numbers))
    assert like(beam_result(*cell, "reaction moment 1", stiffness), number(found[m0], **numbers))
    for at in ("0.4", "1.1"):
        for field, formula in (("deflection", v), ("slope", phi)):
            exact = number(formula.subs(found), x=at, **numbers)
            assert like(beam_result(*cell, f"{field} at {at}", stiffness), exact)
