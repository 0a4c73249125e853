"""The functions against exact rational arithmetic, itself first checked against closed forms."""

from __future__ import annotations

from collections import Counter
from dataclasses import dataclass, replace
from fractions import Fraction as F
from itertools import pairwise

import pytest
from beams import Beam, Clause, beams, written
from exact import (
    Couple,
    Curvature,
    Load,
    Mark,
    Mechanism,
    Model,
    Point,
    Rotate,
    Settle,
    Solution,
    Spread,
    solve,
)
from hypothesis import given, settings

from beamfuncs import functions

TOLERANCE = 1e-11
"""Of the peak of each field over the whole beam."""
LONG_BEAM_TOLERANCE = 1e-9

# --- the exact solver against closed forms -----------------------------------------------------

L, EI, GA, W, P, C = F(7), F(1300), F(900), F(11), F(17), F(5)
DELTA, THETA, KAPPA = F(1, 40), F(1, 300), F(1, 500)


def solved(line: str, *loads: Load, ei: F = EI, ga: F | None = None) -> Solution:
    """The exact solution of marks and lengths such as `fixed 7 pinned`, of one stiffness."""
    words = line.split()
    marks = tuple(Mark(word) for word in words[::2])
    lengths = tuple(F(word) for word in words[1::2])
    count = len(lengths)
    return solve(Model(marks, lengths, (ei,) * count, (ga,) * count if ga else None, loads))


def udl(size: F, start: F = F(0), end: F = L) -> Spread:
    """A uniform load."""
    return Spread(size, size, start, end)


@pytest.mark.parametrize("ga", [None, GA])
def test_exact_simple_beam_under_a_uniform_load(ga: F | None) -> None:
    """wL/2, wL²/8, wL³/24EI and 5wL⁴/384EI, the last with wL²/8GA where shear counts."""
    beam = solved("pinned 7 roller", udl(W), ga=ga)
    assert beam.reaction(1) == beam.reaction(2) == (W * L / 2, 0)
    middle = beam.at(L / 2)
    assert middle.moment == W * L**2 / 8
    assert middle.shear == middle.slope == 0
    shear_part = W * L**2 / (8 * ga) if ga else 0
    assert middle.deflection == 5 * W * L**4 / (384 * EI) + shear_part
    assert beam.at(F(0)).slope == -beam.at(L, "left").slope == W * L**3 / (24 * EI)


def test_exact_simple_beam_under_a_point_load_off_the_middle() -> None:
    """Pb/L and Pa/L, Pab/L under the load, deflection Pa²b²/3EIL there, shear jump -P."""
    a, b = F(2), L - 2
    beam = solved("roller 7 pinned", Point(P, a))
    assert [beam.reaction(k)[0] for k in (1, 2)] == [P * b / L, P * a / L]
    assert beam.at(a).moment == P * a * b / L
    assert beam.at(a).deflection == P * a**2 * b**2 / (3 * EI * L)
    assert beam.at(a).shear - beam.at(a, "left").shear == -P


def test_exact_simple_beam_under_a_couple() -> None:
    """The moment jumps by +C at a clockwise couple, and the left support is pulled down by C/L."""
    beam = solved("pinned 7 pinned", Couple(C, L / 2))
    assert [beam.reaction(k)[0] for k in (1, 2)] == [-C / L, C / L]
    assert [beam.at(L / 2, "left").moment, beam.at(L / 2).moment] == [-C / 2, C / 2]
    assert beam.at(L / 2).slope == C * L / (12 * EI)
    assert beam.at(L / 2).deflection == 0


def test_exact_built_in_beam_under_a_point_load() -> None:
    """Pab²/L² and Pa²b/L² hog at the ends; the reaction moments turn with the sign rule."""
    a, b = F(2), L - 2
    beam = solved("fixed 7 fixed", Point(P, a))
    assert beam.reaction(1)[1] == -P * a * b**2 / L**2
    assert beam.reaction(2)[1] == P * a**2 * b / L**2
    assert beam.reaction(1)[0] == P * b**2 * (3 * a + b) / L**3
    assert beam.at(a).deflection == P * a**3 * b**3 / (3 * EI * L**3)


def test_exact_cantilever_under_a_triangular_load() -> None:
    """A load w0 at the built-in end falling to nothing: -w0L²/6, tip w0L⁴/30EI and w0L³/24EI."""
    beam = solved("fixed 7 free", Spread(W, F(0), F(0), L))
    assert beam.reaction(1) == (W * L / 2, -W * L**2 / 6)
    tip = beam.at(L, "left")
    assert (tip.deflection, tip.slope) == (W * L**4 / (30 * EI), W * L**3 / (24 * EI))
    assert tip.moment == tip.shear == 0


def test_exact_cantilever_with_loads_at_its_tip() -> None:
    """Shear and moment just left of the free end carry the force and minus the couple there."""
    beam = solved("fixed 7 free", Point(P, L), Couple(C, L), ga=GA)
    tip = beam.at(L, "left")
    assert (tip.shear, tip.moment) == (P, -C)
    assert tip.deflection == P * L**3 / (3 * EI) + C * L**2 / (2 * EI) + P * L / GA
    assert tip.slope == P * L**2 / (2 * EI) + C * L / EI


def test_exact_propped_beam_under_a_partial_uniform_load() -> None:
    """Left reaction qL/8 b²(6-b²) and moment -qL²/8 b²(2-b²) for a load from a to the prop."""
    for a in (F(0), F(2), F(7, 2), F(6)):
        beam, b = solved("fixed 7 pinned", udl(W, a)), 1 - a / L
        assert beam.reaction(1)[0] == W * L / 8 * b**2 * (6 - b**2)
        assert beam.reaction(1)[1] == -W * L**2 / 8 * b**2 * (2 - b**2)


def test_exact_two_equal_spans() -> None:
    """3/8, 10/8 and 3/8 of wL, and -wL²/8 over the middle support."""
    beam = solved("pinned 7 pinned 7 pinned", udl(W, end=2 * L))
    assert [beam.reaction(k)[0] / (W * L) for k in (1, 2, 3)] == [F(3, 8), F(10, 8), F(3, 8)]
    assert beam.at(L).moment == -W * L**2 / 8


@pytest.mark.parametrize("ga", [None, GA])
def test_exact_settlement_and_rotation_of_built_in_ends(ga: F | None) -> None:
    """12EId/L³ and 6EId/L², and (4+f)EIt/L and (2-f)EIt/L, over 1+f, f = 12EI/GAL²."""
    f = 12 * EI / (ga * L**2) if ga else F(0)
    sunk = solved("fixed 7 fixed", Settle(DELTA, 1), ga=ga)
    assert sunk.reaction(1)[0] == -sunk.reaction(2)[0] == 12 * EI * DELTA / L**3 / (1 + f)
    assert sunk.reaction(1)[1] == sunk.reaction(2)[1] == -6 * EI * DELTA / L**2 / (1 + f)
    turned = solved("fixed 7 fixed", Rotate(THETA, 0), ga=ga)
    assert turned.reaction(1)[1] == (4 + f) * EI * THETA / L / (1 + f)
    assert turned.reaction(2)[1] == (2 - f) * EI * THETA / L / (1 + f)


def test_exact_free_curvature() -> None:
    """A simple beam takes it free of force and sags by kL²/8; a built-in one answers -EIk."""
    free = solved("pinned 7 pinned", Curvature(KAPPA, F(0), L))
    assert free.at(L / 2).deflection == KAPPA * L**2 / 8
    assert free.at(L / 2).moment == free.reaction(1)[0] == 0
    held = solved("fixed 7 fixed", Curvature(KAPPA, F(0), L))
    assert held.at(F(3)).moment == -EI * KAPPA
    assert held.at(F(3)).deflection == 0
    part = solved("fixed 7 free", Curvature(KAPPA, F(2), F(5)))
    assert part.at(L, "left").slope == -3 * KAPPA
    assert part.at(L, "left").deflection == -KAPPA * 3 * (L - F(7, 2))


def test_exact_springs() -> None:
    """A spring sinks by R/kv below its base and turns by its moment over kr from its base."""
    kv, kr = F(40), F(60)
    marks = (Mark("pinned"), Mark("spring", kv))
    beam = solve(Model(marks, (L,), (EI,), None, (udl(W), Settle(DELTA, 1))))
    assert beam.at(L, "left").deflection == W * L / 2 / kv + DELTA
    marks = (Mark("spring", kv, kr), Mark("free"))
    beam = solve(Model(marks, (L,), (EI,), None, (Point(P, L), Rotate(THETA, 0))))
    assert beam.reaction(1) == (P, -P * L)
    assert beam.at(F(0)).deflection == P / kv
    assert beam.at(F(0)).slope == P * L / kr + THETA


def test_exact_hinge_guided_and_step() -> None:
    """A hinged span hangs on a cantilever; a guided end halves the arm; a step counts twice."""
    hinged = solved("fixed 4 hinge 3 pinned", Point(P, F(4)))
    assert hinged.reaction(1) == (P, -4 * P)
    assert hinged.reaction(2) == (0, 0)
    assert hinged.at(F(4)).deflection == P * 4**3 / (3 * EI)
    assert hinged.at(F(4), "left").slope == P * 4**2 / (2 * EI)
    assert hinged.at(F(4)).slope == -P * 4**3 / (3 * EI) / 3

    guided = solved("fixed 7 guided", Point(P, L))
    assert guided.at(L, "left").deflection == P * L**3 / (12 * EI)
    assert guided.reaction(2) == (0, -P * L / 2)

    marks = (Mark("fixed"), Mark("step"), Mark("free"))
    stepped = solve(Model(marks, (F(3), F(4)), (2 * EI, EI), None, (Point(P, L),)))
    exact = P * (L**3 - 4**3) / (3 * 2 * EI) + P * 4**3 / (3 * EI)
    assert stepped.at(L, "left").deflection == exact


@pytest.mark.parametrize(
    "line",
    ["pinned 5 free", "guided 5 guided", "pinned 3 hinge 3 pinned", "free 4 fixed 2 hinge 3 free"],
)
def test_exact_mechanisms_are_refused(line: str) -> None:
    """A beam of which a part can move has no solution."""
    with pytest.raises(Mechanism):
        solved(line, Point(P, F(1)))


@settings(max_examples=100, deadline=None, derandomize=True)
@given(beams())
def test_exact_solutions_are_in_equilibrium_and_join_up(beam: Beam) -> None:
    """Forces and moments balance exactly, and the fields join up at every breakpoint."""
    model, solution = beam.model, solve(beam.model)
    force = moment = F(0)
    for k, i in enumerate(model.supports, 1):
        reaction, reaction_moment = solution.reaction(k)
        force += reaction
        moment += reaction * model.places[i] - reaction_moment
    for load in model.loads:
        match load:
            case Spread():
                h, (p, q) = load.end - load.start, (load.first, load.last)
                force -= (p + q) / 2 * h
                moment -= (p + q) / 2 * h * load.start + (p + 2 * q) / 6 * h**2
            case Point():
                force -= load.size
                moment -= load.size * load.at
            case Couple():
                moment -= load.size
    assert force == moment == 0
    hinges = [x for x, m in zip(model.places, model.marks, strict=True) if m.kind == "hinge"]
    for x in model.breakpoints[1:-1]:
        left, right = solution.at(x, "left"), solution.at(x)
        assert left.deflection == right.deflection
        assert x in hinges or left.slope == right.slope
        assert x not in hinges or left.moment == right.moment == 0


# --- the functions against the exact solver ----------------------------------------------------

FIELDS = ("deflection", "slope", "moment", "shear")


@dataclass(frozen=True)
class Units:
    """How many of its units make one kN and one m."""

    force: int
    length: int

    def of(self, field: str) -> F:
        """How many units of that result make one of kN and m."""
        force, length = F(self.force), F(self.length)
        return {
            "reaction": force,
            "shear": force,
            "reaction moment": force * length,
            "moment": force * length,
            "slope": F(1),
            "deflection": length,
        }[field]


KN_M, N_MM = Units(1, 1), Units(1000, 1000)

Question = tuple[str, F, str]
"""A result's name, its x or the number of its support, and the side; no side is the default."""


@dataclass(frozen=True)
class Expected:
    """An exact answer and the size that its error is measured by."""

    value: F
    scale: F


def expectations(beam: Beam) -> dict[Question, Expected]:
    """Every question asked of a beam, with its exact answer: all sides of all breakpoints, and two
    more places in each stretch."""
    solution = solve(beam.model)
    cuts = beam.model.breakpoints
    inside = [a + (b - a) * part for a, b in pairwise(cuts) for part in (F(1, 4), F(1, 2))]
    asked = [(x, side) for x in cuts[:-1] for side in ("right", "")]
    asked += [(x, "left") for x in cuts[1:]] + [(cuts[-1], "")] + [(x, "") for x in inside]
    states = {(x, side): solution.at(x, "left" if side == "left" or x == cuts[-1] else "right") for x, side in asked}
    reactions = {n: solution.reaction(n) for n in range(1, len(beam.model.supports) + 1)}
    peaks = {f: max(abs(getattr(state, f)) for state in states.values()) for f in FIELDS}
    scales = {f: peaks[f] or size for f, size in beam.restrained.items()}
    scales["reaction"] = max(scales["shear"], *(abs(r[0]) for r in reactions.values()))
    scales["reaction moment"] = max(scales["moment"], *(abs(r[1]) for r in reactions.values()))

    out: dict[Question, Expected] = {}
    for (x, side), state in states.items():
        for f in FIELDS:
            out[f, x, side] = Expected(getattr(state, f), scales[f])
    for n, pair in reactions.items():
        for f, value in zip(("reaction", "reaction moment"), pair, strict=True):
            out[f, F(n), ""] = Expected(value, scales[f])
    return out


def answers(beam: Beam, questions: list[Question], units: Units) -> dict[Question, float]:
    """What the functions say in those units: sides through phrases, the rest by name."""
    line, loads, stiffness, combination = beam.in_units(units.force, units.length).cells
    out: dict[Question, float] = {}
    for field in FIELDS:
        plain = [q for q in questions if q[0] == field and not q[2]]
        xs = [[float(q[1] * units.length)] for q in plain]
        function = getattr(functions, f"{field}_at")
        column = function(line, loads, xs, stiffness, combination)
        out |= {q: row[0] for q, row in zip(plain, column, strict=True)}
    sided = [q for q in questions if q[2]]
    phrases = [[f"{q[0]} at {written(q[1] * units.length)} {q[2]}"] for q in sided]
    column = functions.beam_result(line, loads, phrases, stiffness, combination)
    out |= {q: row[0] for q, row in zip(sided, column, strict=True)}
    for q in questions:
        if q[0].startswith("reaction"):
            function = getattr(functions, q[0].replace(" ", "_"))
            out[q] = function(line, loads, int(q[1]), stiffness, combination)
    return out


def compare(
    answered: dict[Question, float],
    expected: dict[Question, Expected],
    units: Units,
    tolerance: float,
) -> None:
    """Fail where an answer differs from the exact one by more than `tolerance` of its scale."""
    assert answered.keys() == expected.keys()
    for question, exact in expected.items():
        unit = units.of(question[0])
        answer = answered[question]
        assert isinstance(answer, float), f"{question}: {answer!r} is no number"
        error = abs(F(answer) - exact.value * unit)
        assert error <= tolerance * exact.scale * unit, (
            f"{question[0]} at {float(question[1])} {question[2]} in {units}: {answer!r}, exactly "
            f"{float(exact.value * unit)!r}; off by {float(error / (exact.scale * unit) or 0):.1e}"
        )


def test_500_beams_agree_with_exact_arithmetic_in_either_units() -> None:
    """Reactions, moments, shears, slopes and deflections of 500 beams, in kN-m and in N-mm."""
    seen: Counter[str] = Counter()

    @settings(max_examples=500, deadline=None, derandomize=True)
    @given(beams())
    def agree(beam: Beam) -> None:
        seen.update({m.kind for m in beam.marks} | {type(c.load).__name__ for c in beam.clauses})
        seen[f"{len(beam.lengths)} lengths"] += 1
        seen["spring that turns"] += any(m.kr for m in beam.marks)
        seen["GA"] += beam.ga is not None
        seen["combination"] += bool(beam.factors)
        expected = expectations(beam)
        for units in (KN_M, N_MM):
            compare(answers(beam, list(expected), units), expected, units, TOLERANCE)

    agree()
    marks = {"fixed", "pinned", "roller", "guided", "free", "hinge", "step", "spring"}
    loads = {"Spread", "Point", "Couple", "Settle", "Rotate", "Curvature"}
    lengths = {f"{n} lengths" for n in range(1, 9)}
    assert marks | loads | lengths | {"spring that turns", "GA", "combination"} <= seen.keys()
    assert min(seen.values()) > 20


def on_springs(stiffnesses: tuple[int, ...], length: F, ei: tuple[int, ...], *loads: Load) -> Beam:
    """Equal lengths on springs; a spring of stiffness 0 is a pin."""
    return Beam(
        marks=tuple(Mark("spring", F(k)) if k else Mark("pinned") for k in stiffnesses),
        lengths=(length,) * len(ei),
        ei=tuple(map(F, ei)),
        ga=None,
        clauses=tuple(map(Clause, loads)),
    )


@pytest.mark.parametrize(
    "beam",
    [
        on_springs((100, 100), F("7.05"), (33000,), Point(F("15.3"), F("7.05"))),
        on_springs((5500, 5500), F("0.69"), (190000,), Point(F("15.3"), F("0.69"))),
        on_springs((95, 7700), F("2.95"), (45000,), Point(F(7), F(0))),
        on_springs((430000, 0), F("3.31"), (95000,), Point(F("15.3"), F(0))),
        on_springs((66, 630, 66), F("8.32"), (8100,) * 2, *(Settle(F(1, 100), i) for i in range(3))),
        on_springs((10, 9200, 10), F("8.91"), (770000,) * 2, udl(F(3), end=F("17.82"))),
        on_springs((10, 0, 10), F("0.5"), (1000, 10000), udl(F("0.2"), end=F(1))),
    ],
    ids=lambda beam: beam.line,
)
def test_beams_that_move_more_than_they_bend_agree_with_exact_arithmetic(beam: Beam) -> None:
    """A beam that its springs let sink nearly or wholly as a rigid body has an answer like any other."""
    expected = expectations(beam)
    for units in (KN_M, N_MM):
        compare(answers(beam, list(expected), units), expected, units, TOLERANCE)


def hundred_spans() -> Beam:
    """A hundred equal spans, uniformly loaded, with a point load far along."""
    count = 100
    return Beam(
        marks=(Mark("pinned"),) * (count + 1),
        lengths=(F(6),) * count,
        ei=(F(24000),) * count,
        ga=None,
        clauses=(
            Clause(udl(F(12), end=F(600))),
            Clause(Point(F(40), F(202)), in_span=True),
        ),
    )


def test_a_hundred_equal_spans_agree_with_exact_arithmetic() -> None:
    """A long beam loses next to nothing, in kN-m and in N-mm."""
    beam = hundred_spans()
    expected = expectations(beam)
    for units in (KN_M, N_MM):
        compare(answers(beam, list(expected), units), expected, units, LONG_BEAM_TOLERANCE)


SPRUNG = Beam(
    marks=(Mark("fixed"), Mark("hinge"), Mark("spring", F(2500), F(30)), Mark("free")),
    lengths=(F(4), F(3), F(5, 4)),
    ei=(F(24000), F(30000), F(24000)),
    ga=None,
    clauses=(Clause(udl(F(12), end=F(33, 4))), Clause(Point(F(40), F(2)))),
)


@pytest.mark.parametrize("units", [KN_M, N_MM])
@pytest.mark.parametrize("field", [*FIELDS, "reaction", "reaction moment"])
def test_the_comparison_bites(field: str, units: Units) -> None:
    """One answer off by 2e-11 of its field's peak, in either direction, is found out."""
    expected = expectations(SPRUNG)
    right = {q: float(e.value * units.of(q[0])) for q, e in expected.items()}
    compare(right, expected, units, TOLERANCE)
    for question in (q for q in expected if q[0] == field):
        for sign in (1, -1):
            slip = sign * 2e-11 * float(expected[question].scale * units.of(field))
            wrong = right | {question: right[question] + slip}
            with pytest.raises(AssertionError, match=r"off by 2\.0e-11"):
                compare(wrong, expected, units, TOLERANCE)


@pytest.mark.parametrize(
    "slip",
    [
        replace(SPRUNG, lengths=(F(4) * (1 + F(1, 10**9)), F(3), F(5, 4))),
        replace(SPRUNG, ei=(F(24000) * (1 + F(1, 10**9)), F(30000), F(24000))),
        replace(SPRUNG, clauses=(SPRUNG.clauses[0], Clause(Point(F(40) + F(1, 10**8), F(2))))),
        replace(SPRUNG, clauses=(SPRUNG.clauses[0], Clause(Point(F(40), F(2) + F(1, 10**8))))),
    ],
    ids=["length", "stiffness", "size", "place"],
)
def test_the_comparison_tells_a_beam_from_its_neighbour(slip: Beam) -> None:
    """A beam that differs in the ninth digit of one number has other answers."""
    expected, others = expectations(SPRUNG), expectations(slip)
    common = expected.keys() & others.keys()
    assert {q[0] for q in common} == {*FIELDS, "reaction", "reaction moment"}
    answered = {q: float(others[q].value) for q in common}
    with pytest.raises(AssertionError, match="off by"):
        compare(answered, {q: expected[q] for q in common}, KN_M, TOLERANCE)
