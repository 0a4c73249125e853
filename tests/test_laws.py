"""Laws that every solved beam obeys, whatever its numbers: equilibrium, reciprocity, superposition,
symmetry, scale, limits, and the differential relations between the fields."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import replace
from fractions import Fraction as F
from itertools import count, pairwise
from typing import Any

import numpy as np
import pytest
from beams import CASES, FORCES, Beam, Clause, beams, decimals, resized, stable, written
from exact import HOLDS_DEFLECTION, HOLDS_ROTATION, Couple, Curvature, Load, Mark, Point, Rotate, Settle, Spread
from hypothesis import assume, given, settings
from hypothesis import strategies as st
from numpy.polynomial import Polynomial
from numpy.typing import NDArray

from beamfuncs.functions import beam_result, reaction, reaction_moment, reactions

Array = NDArray[np.float64]
FIELDS = ("deflection", "slope", "moment", "shear")
CLOSE = 1e-10
"""Of the largest size in play: far above rounding, far below any slip."""
ROUNDING = 1e-14
"""Of what the loads would raise if resisted: what is left of a field that is zero."""

law = settings(max_examples=60, deadline=None, derandomize=True)


def answers(beam: Beam, phrases: Iterable[str]) -> Array:
    """The answers to phrases about a beam."""
    rows = [["total load"], *([phrase] for phrase in phrases)]
    line, loads, stiffness, combination = beam.cells
    column: Any = beam_result(line, loads, rows, stiffness, combination)
    return np.array([row[0] for row in column[1:]], dtype=float)


def places(beam: Beam) -> list[F]:
    """Every break, and two places in each stretch between."""
    cuts = beam.model.breakpoints
    return sorted({*cuts, *(a + (b - a) * n / 4 for a, b in pairwise(cuts) for n in (1, 2))})


def sides(beam: Beam) -> list[tuple[F, str]]:
    """Both sides of every place, from the inside at the ends of the beam."""
    end = sum(beam.lengths)
    return [(x, s) for x in places(beam) for s in ("left", "right") if x != (0 if s == "left" else end)]


def field(beam: Beam, name: str) -> Array:
    """A field at both sides of every place."""
    return answers(beam, [f"{name} at {written(x)} {side}" for x, side in sides(beam)])


def peak(values: Array) -> float:
    """The largest size."""
    return float(np.abs(values).max(initial=0.0))


def slack(beam: Beam, name: str, *values: Array) -> float:
    """How far two computations of a field of the beam may differ, the larger of which is given."""
    return CLOSE * sum(map(peak, values)) + ROUNDING * float(beam.restrained[name])


def carrying(beam: Beam, *loads: Load, case: str = "") -> Beam:
    """The beam under these loads only."""
    return replace(beam, clauses=tuple(Clause(load, case) for load in loads), factors=())


def held(beam: Beam) -> tuple[Array, Array, Array]:
    """The place, the reaction and the reaction moment of every support."""
    line, loads, stiffness, combination = beam.cells
    rows: Any = reactions(line, loads, stiffness, combination)
    _, x, force, moment = np.array(rows, dtype=float).T
    return x, force, moment


# --- equilibrium ---------------------------------------------------------------------------------


@law
@given(beams())
def test_reactions_balance_the_loads(beam: Beam) -> None:
    """The reactions add up to the load, and the moments about the left end cancel."""
    force = moment = force_size = moment_size = F(0)
    for load in beam.model.loads:
        match load:
            case Spread():
                h = load.end - load.start
                here = (load.first + load.last) / 2 * h
                about = here * load.start + (load.first + 2 * load.last) / 6 * h**2
            case Point():
                here, about = load.size, load.size * load.at
            case Couple():
                here, about = F(0), load.size
            case _:
                continue
        force, moment = force + here, moment + about
        force_size, moment_size = force_size + abs(here), moment_size + abs(about)
    x, up, turn = held(beam)
    force_size += F(np.abs(up).sum())
    moment_size += F((np.abs(up) * x).sum() + np.abs(turn).sum())
    left_force = ROUNDING * float(beam.restrained["shear"])
    left_moment = ROUNDING * float(beam.restrained["moment"])
    assert abs(up.sum() - float(force)) <= CLOSE * force_size + left_force
    assert abs((up * x).sum() - turn.sum() - float(moment)) <= CLOSE * moment_size + left_moment
    (total,) = answers(beam, ["total load"])
    assert abs(total - float(force)) <= CLOSE * force_size


@law
@given(beams())
def test_shear_and_moment_jump_by_what_acts_there(beam: Beam) -> None:
    """The shear jumps by +R at a support and -P at a load, the moment by +C and the reaction
    moment, and neither jumps anywhere else; the deflection never does."""
    model = beam.model
    _, up, turn = held(beam)
    by_place = {model.places[i]: n for n, i in enumerate(model.supports)}
    inside = places(beam)[1:-1]
    phrases = [f"{name} at {written(at)} {s}" for name in FIELDS for at in inside for s in ("left", "right")]
    values = answers(beam, phrases).reshape(4, len(inside), 2)
    jumps = values[:, :, 1] - values[:, :, 0]
    close = {name: slack(beam, name, values[k]) for k, name in enumerate(FIELDS)}
    close["shear"] += CLOSE * peak(up)
    close["moment"] += CLOSE * peak(turn)
    for k, at in enumerate(inside):
        n = by_place.get(at)
        expected_shear = (up[n] if n is not None else 0.0) - float(model.total(Point, at))
        expected_moment = (turn[n] if n is not None else 0.0) + float(model.total(Couple, at))
        assert abs(jumps[3, k] - expected_shear) <= close["shear"]
        assert abs(jumps[2, k] - expected_moment) <= close["moment"]
        assert abs(jumps[0, k]) <= close["deflection"]
        mark = beam.marks[model.places.index(at)].kind if at in model.places else ""
        assert mark == "hinge" or abs(jumps[1, k]) <= close["slope"]


# --- reciprocity ---------------------------------------------------------------------------------

actions = {"force": (Point, "deflection"), "couple": (Couple, "slope")}


an_action = st.tuples(st.sampled_from(sorted(actions)), st.integers(0, 99))


@law
@given(beams(most_loads=1), an_action, an_action)
def test_reciprocity_of_forces_and_couples(beam: Beam, one: tuple[str, int], other: tuple[str, int]) -> None:
    """What a unit action at one place moves at another, the same action there moves here."""
    model = beam.model
    hinges = [x for x, m in zip(model.places, model.marks, strict=True) if m.kind == "hinge"]
    spots = [x for x in places(beam) if x not in hinges]
    pairs = [(kind, spots[n % len(spots)]) for kind, n in (one, other)]
    moved, size = [], 1.0
    for kind, at in pairs:
        action, field_moved = actions[kind]
        loaded = carrying(beam, action(F(1), at))
        moved.append(answers(loaded, [f"{actions[k][1]} at {written(x)}" for k, x in pairs]))
        size *= float(loaded.restrained[field_moved])
    # The cross terms cannot exceed the mean of the direct ones, whose sizes measure the error.
    own = np.sqrt(max(moved[0][0], 0.0) * max(moved[1][1], 0.0))
    close = CLOSE * own + ROUNDING * np.sqrt(size)
    assert abs(moved[0][1]) <= own + close
    assert abs(moved[0][1] - moved[1][0]) <= close


@law
@given(beams(most_loads=1), st.integers(0, 99), st.integers(0, 99))
def test_reciprocity_of_reactions_and_imposed_movements(beam: Beam, support: int, place: int) -> None:
    """A support that sinks by 1 draws the influence line of its reaction, and one that turns by 1
    that of its reaction moment with the sign changed."""
    model = beam.model
    number = support % len(model.supports) + 1
    index = model.supports[number - 1]
    at = places(beam)[place % len(places(beam))]
    mark = beam.marks[index]
    for kind, phrase, sign, holds in (
        (Settle, "reaction", 1, mark.kind in HOLDS_DEFLECTION or mark.kv),
        (Rotate, "reaction moment", -1, mark.kind in HOLDS_ROTATION or mark.kr),
    ):
        if not holds:
            continue
        moved = carrying(beam, kind(F(1), index))
        line = field(moved, "deflection")
        (here,) = answers(moved, [f"deflection at {written(at)}"])
        (force,) = answers(carrying(beam, Point(F(1), at)), [f"{phrase} {number}"])
        assert abs(here - sign * force) <= CLOSE * peak(line)


# --- superposition -------------------------------------------------------------------------------


@law
@given(beams(cases=False), st.integers(1, 4))
def test_effects_of_loads_add_up(beam: Beam, cut: int) -> None:
    """All loads together do what the loads of two groups do apart."""
    loads = [clause.load for clause in beam.clauses]
    # Loads of no size keep the places at which the three are compared alike.
    first = carrying(beam, *loads[:cut], *(resized(x, F(0)) for x in loads[cut:]))
    second = carrying(beam, *(resized(x, F(0)) for x in loads[:cut]), *loads[cut:])
    for name in FIELDS:
        a, b, both = (field(part, name) for part in (first, second, beam))
        assert peak(a + b - both) <= slack(beam, name, a, b)
    for n, name in ((1, "shear"), (2, "moment")):
        a, b, both = (held(part)[n] for part in (first, second, beam))
        assert peak(a + b - both) <= slack(beam, name, a, b)


a_case = st.sampled_from(CASES)


@law
@given(beams(cases=False), st.tuples(*[decimals(0, 2, 2)] * 3), st.lists(a_case, min_size=5, max_size=5))
def test_a_combination_is_the_sum_of_its_cases(beam: Beam, factors: tuple[F, F, F], drawn: list[str]) -> None:
    """1.35 G + 1.5 Q is 1.35 times G alone and 1.5 times Q alone; a case not named counts nothing."""
    clauses = tuple(replace(c, case=case) for c, case in zip(beam.clauses, drawn, strict=False))
    beam = replace(beam, clauses=clauses)

    def under(*combination: tuple[str, F]) -> Beam:
        return replace(beam, factors=combination)

    alone = [under((case, F(1))) for case in CASES]
    together = under(*zip(CASES, factors, strict=True))
    two = under((CASES[0], F(1)), (CASES[2], F(1)))
    for name in FIELDS:
        parts = [field(part, name) for part in alone]
        weighed = [float(f) * part for f, part in zip(factors, parts, strict=True)]
        close = 2 * slack(under(), name, *parts)
        assert peak(sum(weighed) - field(together, name)) <= close
        assert peak(parts[0] + parts[2] - field(two, name)) <= close
        assert peak(sum(parts) - field(under(), name)) <= close


# --- symmetry and scale --------------------------------------------------------------------------


@law
@given(beams())
def test_a_mirrored_beam_has_mirrored_answers(beam: Beam) -> None:
    """Seen from behind, moment and deflection stay, shear and slope and couples change sign."""
    mirror = beam.mirrored()
    end = sum(beam.lengths)
    other = {"left": "right", "right": "left"}
    for name, sign in (("deflection", 1), ("slope", -1), ("moment", 1), ("shear", -1)):
        seen = [f"{name} at {written(end - x)} {other[side]}" for x, side in sides(beam)]
        here, there = field(beam, name), answers(mirror, seen)
        assert peak(here - sign * there) <= slack(beam, name, here)
    (_, up, turn), (_, up_there, turn_there) = held(beam), held(mirror)
    assert peak(up - up_there[::-1]) <= slack(beam, "shear", up)
    assert peak(turn + turn_there[::-1]) <= slack(beam, "moment", turn)


@law
@given(beams(), decimals(-3, 3, 1).filter(bool))
def test_answers_are_proportional_to_the_loads(beam: Beam, factor: F) -> None:
    """Loads multiplied by a factor multiply every answer by it."""
    clauses = tuple(replace(c, load=resized(c.load, factor)) for c in beam.clauses)
    more = replace(beam, clauses=clauses)
    for name in FIELDS:
        here, there = field(beam, name), field(more, name)
        assert peak(there - float(factor) * here) <= slack(beam, name, here, there)


@law
@given(beams(), st.sampled_from([F(1, 8), F(1, 5), F(4), F(10), F(1000)]))
def test_a_larger_beam_has_larger_answers(beam: Beam, size: F) -> None:
    """Lengths k times as long, under loads and stiffnesses that keep the dimensions, give the same
    forces and slopes, moments and deflections k times as large."""
    larger = beam.in_units(1, size)
    for name, power in (("deflection", 1), ("slope", 0), ("moment", 1), ("shear", 0)):
        here, there = field(beam, name), field(larger, name)
        assert peak(there - float(size) ** power * here) <= slack(larger, name, there)


def stiffened(beam: Beam, factor: F) -> Beam:
    """The beam with every stiffness multiplied."""
    return replace(
        beam,
        marks=tuple(replace(m, kv=m.kv * factor, kr=m.kr * factor) for m in beam.marks),
        ei=tuple(x * factor for x in beam.ei),
        ga=tuple(x * factor for x in beam.ga) if beam.ga else None,
    )


@law
@given(beams(kinds=FORCES), decimals(1, 50, 1))
def test_loads_bend_a_stiffer_beam_less(beam: Beam, factor: F) -> None:
    """All stiffnesses k times as large: the same forces, the movements divided by k."""
    for name, power in (("deflection", -1), ("slope", -1), ("moment", 0), ("shear", 0)):
        here, there = field(beam, name), field(stiffened(beam, factor), name)
        assert peak(there - float(factor) ** power * here) <= slack(beam, name, here)


@law
@given(beams(kinds=(Settle, Rotate, Curvature)), decimals(1, 50, 1))
def test_imposed_movements_strain_a_stiffer_beam_more(beam: Beam, factor: F) -> None:
    """All stiffnesses k times as large: the same movements, forces k times as large."""
    stiffer = stiffened(beam, factor)
    for name, power in (("deflection", 0), ("slope", 0), ("moment", 1), ("shear", 1)):
        here, there = field(beam, name), field(stiffer, name)
        assert peak(there - float(factor) ** power * here) <= slack(stiffer, name, there)


@law
@given(beams(kinds=FORCES, shear_flexible=False))
def test_forces_of_a_uniform_beam_need_no_stiffness(beam: Beam) -> None:
    """Without springs and steps, loads raise the same forces whatever the stiffness is."""
    pinned = ("spring", "step")
    marks = tuple(Mark("pinned") if m.kind in pinned else m for m in beam.marks)
    beam = replace(beam, marks=marks, ei=beam.ei[:1] * len(beam.ei))
    assume(stable(beam))
    line, loads, stiffness, combination = beam.cells
    for name in ("shear", "moment"):
        phrases = [[f"{name} at {written(x)} {side}"] for x, side in sides(beam)]
        known: Any = beam_result(line, loads, phrases, stiffness, combination)
        blank: Any = beam_result(line, loads, phrases, None, combination)
        a, b = np.array(known, dtype=float), np.array(blank, dtype=float)
        assert peak(a - b) <= slack(beam, name, a)
    for n, name in ((2, "shear"), (3, "moment")):
        table: Any = [reactions(line, loads, s, combination) for s in (stiffness, None)]
        a, b = (np.array([row[n] for row in rows]) for rows in table)
        assert peak(a - b) <= slack(beam, name, a)


# --- limits --------------------------------------------------------------------------------------


@law
@given(beams(kinds=FORCES))
def test_a_stiff_enough_spring_is_a_rigid_support(beam: Beam) -> None:
    """As the springs in the place of rigid supports stiffen, the answers close in on the rigid ones,
    ten times nearer for ten times the stiffness."""
    assume(any(m.kind in HOLDS_DEFLECTION for m in beam.marks))
    shortest, ei = min(beam.lengths), max(beam.ei)

    def on_springs(factor: F) -> Beam:
        kv, kr = ei / shortest**3 * factor, ei / shortest * factor
        # Short decimals, so that they can be written.
        kv, kr = F(round(kv)), F(round(kr))
        swap = {"fixed": Mark("spring", kv, kr)}
        swap |= dict.fromkeys(("pinned", "roller"), Mark("spring", kv))
        return replace(beam, marks=tuple(swap.get(m.kind, m) for m in beam.marks))

    for name in FIELDS:
        rigid, size = field(beam, name), float(beam.restrained[name])
        near, nearer = (peak(field(on_springs(F(10) ** n), name) - rigid) for n in (4, 5))
        assert near <= 1e-2 * size
        assert nearer <= near / 5 or nearer <= 1e-9 * size


@pytest.mark.parametrize(
    ("short", "limit"),
    [
        ("pinned 6 pinned {} free", "pinned 6 pinned"),
        ("fixed 6 spring(400) {} free", "fixed 6 spring(400)"),
        ("guided 6 spring(400, 50) {} free", "guided 6 spring(400, 50)"),
        ("fixed 6 step {} pinned", "fixed 6 pinned"),
        ("fixed 6 step {} guided", "fixed 6 guided"),
        ("fixed 6 hinge {} fixed", "fixed 6 pinned"),
        ("fixed 6 hinge {} guided", "fixed 6 free"),
        ("pinned 6 hinge {} fixed", "pinned 6 pinned"),
        ("fixed 6 pinned {} pinned", "fixed 6 fixed"),
        ("pinned 6 roller {} guided", "pinned 6 fixed"),
        ("pinned 6 spring(400) {} fixed", "pinned 6 fixed"),
    ],
)
def test_a_length_that_shrinks_to_nothing_leaves_its_limit(short: str, limit: str) -> None:
    """Two pins drawn together build a beam in, an overhang drawn in is none: the difference goes
    with the length."""
    lengths = (0.1, 0.01, 0.001)
    for phrase in ("shear at 2", "moment at 2", "slope at 2", "deflection at 2", "reaction 1"):
        exact = beam_result(limit, "udl 12", phrase, 24000)
        slips = [
            abs(beam_result(short.format(e), f"udl 12 from 0 to {6 + e!r}", phrase, 24000) - exact) for e in lengths
        ]
        assert slips[2] <= 2e-3 * abs(exact)
        for wide, narrow in pairwise(slips):
            assert narrow <= wide / 5 or narrow <= 1e-9 * abs(exact)


@law
@given(decimals(1, 10, 2), decimals(1, 90, 1), st.sampled_from([F(1, 100), F(1, 10000)]))
def test_a_load_over_a_vanishing_part_is_a_point_load(length: F, size: F, part: F) -> None:
    """A uniform load drawn together about a place tends to the force it adds up to."""
    line = f"fixed {written(length)} pinned"
    a, b = length / 2 - part / 2, length / 2 + part / 2
    spread = f"udl {written(size / part)} from {written(a)} to {written(b)}"
    point = f"point {written(size)} at {written(length / 2)}"
    for phrase in ("reaction 1", "reaction moment 1", f"deflection at {written(length / 4)}"):
        exact = beam_result(line, point, phrase, 5000)
        assert beam_result(line, spread, phrase, 5000) == pytest.approx(exact, rel=float(part) ** 2)


# --- the fields as derivatives of one another ----------------------------------------------------


@law
@given(beams(shear_flexible=False))
def test_fields_are_derivatives_of_one_another(beam: Beam) -> None:
    """Within every stretch V = dM/dx, slope = dv/dx and M = -EI (v'' + imposed curvature)."""
    model = beam.model
    cuts = model.breakpoints
    nodes = [F(n, 8) for n in range(1, 8)]
    at = [a + (b - a) * t for a, b in pairwise(cuts) for t in nodes]
    phrases = [f"{name} at {written(x)}" for name in FIELDS for x in at]
    values = answers(beam, phrases).reshape(4, len(cuts) - 1, len(nodes))
    v_peak, slope_peak, m_peak, s_peak = np.abs(values).max(axis=(1, 2))
    t = np.array(nodes, dtype=float)

    def along(samples: Array, degree: int) -> Polynomial:
        return Polynomial.fit(t, samples, degree, domain=[0, 1])

    for k, (a, b) in enumerate(pairwise(cuts)):
        h = float(b - a)
        length = next(i for i, x in enumerate(model.places[1:]) if b <= x)
        bent = sum(float(x.size) for x in model.loads if isinstance(x, Curvature) and x.start <= a and b <= x.end)
        deflection, slope, moment, shear = values[:, k]
        dm = along(moment, 3).deriv()(t)
        assert peak(dm - h * shear) <= 1e-9 * (m_peak + h * s_peak)
        dv = along(deflection, 5)
        assert peak(dv.deriv()(t) - h * slope) <= 1e-9 * (v_peak + h * slope_peak)
        curved = -h * h * (moment / float(beam.ei[length]) + bent)
        assert peak(dv.deriv(2)(t) - curved) <= 1e-9 * (v_peak + peak(curved))


# --- extremes ------------------------------------------------------------------------------------


@law
@given(beams())
def test_extremes_are_never_exceeded_and_are_attained(beam: Beam) -> None:
    """No dense sample passes an extreme, the extreme stands at its position, none lies beyond."""
    model = beam.model
    supports = [model.places[i] for i in model.supports]
    ranges = [("", F(0), sum(beam.lengths))]
    ranges += [(f" in span {n}", a, b) for n, (a, b) in enumerate(pairwise(supports), 1)]
    for name in ("shear", "moment", "deflection"):
        for words, a, b in ranges:
            at = sorted({a, b, *(a + (b - a) * n / 32 for n in range(33))})
            at += [x for x in model.breakpoints if a < x < b]
            inner = [(x, s) for x in at for s in ("left", "right") if x != (a if s == "left" else b)]
            asked = [f"{name} {e}{words}" for e in ("max", "min")]
            found = answers(
                beam,
                asked
                + [f"position of {phrase}" for phrase in asked]
                + [f"{name} at {written(x)} {s}" for x, s in inner],
            )
            (most, least), where, dense = found[:2], found[2:4], found[4:]
            close = slack(beam, name, found[:2])
            assert dense.max() <= most + close
            assert dense.min() >= least - close
            for extreme, x in zip((most, least), where, strict=True):
                assert float(a) - 1e-9 <= x <= float(b) + 1e-9
                inside = 1e-9 < x < float(ranges[0][2]) - 1e-9
                around = ("left", "right") if inside else ("",)
                beside = answers(beam, [f"{name} at {float(x)!r} {s}" for s in around])
                assert min(abs(beside - extreme)) <= close


@pytest.mark.parametrize(
    ("line", "loads", "phrase", "place"),
    [
        ("pinned 9 pinned", "point 10 at 3; point 10 at 6", "moment max", 3),
        ("pinned 6 pinned", "couple 5 at 0; couple -5 at 6", "moment max", 0),
        ("pinned 4 pinned 4 pinned", "udl 8", "moment max", 1.5),
        ("fixed 6 fixed", "udl 8", "moment min", 0),
        ("fixed 6 fixed", "udl 8", "shear max", 0),
        ("fixed 6 fixed", "udl 8", "shear min", 6),
        ("free 2 pinned 4 pinned 2 free", "udl 8", "moment min", 2),
        ("pinned 6 pinned", "udl 0", "moment max", 0),
    ],
)
def test_the_position_of_an_extreme_is_the_first(line: str, loads: str, phrase: str, place: float) -> None:
    """Where an extreme occurs more than once, or all along a part, its smallest x is returned."""
    assert beam_result(line, loads, f"position of {phrase}", 20000) == pytest.approx(place, abs=1e-9)


def test_reaction_functions_give_what_the_table_of_reactions_gives() -> None:
    """One support at a time, or all in rows: the same numbers."""
    cell = ("fixed 4 pinned 5 spring(900, 300)", "udl 11; couple 4 at 6")
    for number, _, force, moment in reactions(*cell, 7000):
        assert reaction(*cell, number, 7000) == force
        assert reaction_moment(*cell, number, 7000) == moment


# --- the laws bite -------------------------------------------------------------------------------

LOADED = Beam(
    marks=(Mark("fixed"), Mark("pinned"), Mark("hinge"), Mark("spring", F(900), F(300)), Mark("free")),
    lengths=(F(4), F(5), F(2), F(1)),
    ei=(F(24000), F(30000), F(30000), F(24000)),
    ga=None,
    clauses=tuple(
        Clause(load)
        for load in (
            Spread(F(30), F(30), F(0), F(12)),
            Spread(F(0), F(80), F(2), F(8)),
            Point(F(90), F(6)),
            Couple(F(50), F(3)),
        )
    ),
)
SUNK = carrying(LOADED, Settle(F(1, 100), 1), Rotate(F(1, 500), 0), Curvature(F(1, 1000), F(1), F(6)))
BITES = (
    (test_reactions_balance_the_loads, "held", 0, (LOADED,)),
    (test_reactions_balance_the_loads, "answers", 0, (LOADED,)),
    (test_shear_and_moment_jump_by_what_acts_there, "held", 0, (LOADED,)),
    (test_shear_and_moment_jump_by_what_acts_there, "answers", 0, (LOADED,)),
    (test_reciprocity_of_forces_and_couples, "answers", 1, (LOADED, ("force", 15), ("force", 11))),
    (test_reciprocity_of_forces_and_couples, "answers", 0, (LOADED, ("force", 2), ("couple", 2))),
    (test_reciprocity_of_reactions_and_imposed_movements, "answers", 1, (LOADED, 1, 8)),
    (test_effects_of_loads_add_up, "answers", 1, (LOADED, 2)),
    (test_a_combination_is_the_sum_of_its_cases, "answers", 3, (LOADED, (F(1), F(2), F(1)), ["G", "Q", "S1", "Q"])),
    (test_a_mirrored_beam_has_mirrored_answers, "answers", 1, (LOADED,)),
    (test_answers_are_proportional_to_the_loads, "answers", 1, (LOADED, F(2))),
    (test_a_larger_beam_has_larger_answers, "answers", 1, (LOADED, F(10))),
    (test_loads_bend_a_stiffer_beam_less, "answers", 1, (LOADED, F(3))),
    (test_imposed_movements_strain_a_stiffer_beam_more, "answers", 1, (SUNK, F(3))),
    (test_fields_are_derivatives_of_one_another, "answers", 0, (LOADED,)),
    (test_fields_are_derivatives_of_one_another, "answers", 0, (SUNK,)),
    (test_extremes_are_never_exceeded_and_are_attained, "answers", 0, (LOADED,)),
)


@pytest.mark.parametrize(("law_tested", "source", "call", "arguments"), BITES, ids=lambda x: getattr(x, "__name__", ""))
def test_every_law_finds_a_slip_of_1e_8(
    law_tested: Any, source: str, call: int, arguments: tuple[Any, ...], monkeypatch: pytest.MonkeyPatch
) -> None:
    """A law that holds for a beam fails once the largest number of one answer is off by 1e-8."""
    law_tested.hypothesis.inner_test(*arguments)
    honest, calls = globals()[source], count()

    def slipping(*args: Any) -> Any:
        answer = honest(*args)
        if next(calls) == call:
            numbers = answer if source == "answers" else answer[1]
            numbers[np.abs(numbers).argmax()] *= 1 + 1e-8
        return answer

    monkeypatch.setitem(globals(), source, slipping)
    with pytest.raises(AssertionError):
        law_tested.hypothesis.inner_test(*arguments)
