"""Influence lines: the ordinate is what a unit load at its place gives, and the lines have the shapes of mechanics."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from fractions import Fraction as F
from itertools import pairwise
from typing import Any

import numpy as np
import pytest
from beams import Beam, Clause, beams, decimals, written
from exact import Couple, Point, Settle
from hypothesis import given, settings
from hypothesis import strategies as st
from numpy.polynomial import Polynomial
from numpy.typing import NDArray

from beamfuncs.functions import beam_result, deflection_at, influence, influence_line

Array = NDArray[np.float64]
FIELDS = ("shear", "moment", "slope", "deflection")
CLOSE, ROUNDING = 1e-9, 1e-13
"""Of the largest ordinate; and of what a unit load would raise if resisted, where that is nothing."""
law = settings(max_examples=25, deadline=None, derandomize=True)
unloaded = beams(most_loads=1, kinds=(Point,), cases=False, most_lengths=6)


def phrases(beam: Beam) -> list[str]:
    """Every reaction and reaction moment."""
    supports = range(1, len(beam.model.supports) + 1)
    return [f"reaction {n}" for n in supports] + [f"reaction moment {n}" for n in supports]


def loaded(beam: Beam, x: F, load: type[Point | Couple] = Point) -> Beam:
    """The beam under a unit load alone."""
    return replace(beam, clauses=(Clause(load(F(1), x)),), factors=())


def unit_loads(beam: Beam, asked: Sequence[str], places: Sequence[F]) -> Array:
    """What each phrase answers, a row a place of a unit load: the ordinary solver, load by load."""
    rows = [[phrase] for phrase in asked]
    solved: Any = [beam_result(beam.line, loaded(beam, x).loads, rows, beam.stiffness) for x in places]
    return np.array(solved, dtype=float)[:, :, 0]


def ordinates(beam: Beam, phrase: str, places: Sequence[F]) -> Array:
    """The ordinates at many places, asked as a range."""
    rows: Any = influence(beam.line, phrase, [[float(x) for x in places]], beam.stiffness)
    return np.array(rows[0], dtype=float)


def slack(beam: Beam, phrase: str, *values: Array) -> float:
    """How far two computations of a line may differ."""
    size = max(float(np.abs(v).max(initial=0.0)) for v in values)
    restrained = loaded(beam, F(0)).restrained
    kind = "moment" if phrase.startswith("reaction moment") else phrase.split()[0]
    sheared = 1 + max(beam.ei) / min(beam.ga) / min(beam.lengths) ** 2 if beam.ga else 1
    return CLOSE * size + ROUNDING * float(sheared * restrained["shear" if kind == "reaction" else kind])


@st.composite
def sections(draw: st.DrawFn, beam: Beam) -> tuple[F, str]:
    """A place of the beam, often a mark, and a side of it."""
    end = sum(beam.lengths)
    x = draw(st.sampled_from(beam.model.places) | decimals(0, 1, 3).map(lambda part: end * part))
    side = "right" if x == 0 else "left" if x == end else draw(st.sampled_from(("left", "right")))
    return x, side


def between(beam: Beam, *more: F) -> list[F]:
    """Every mark and three places of each length between them."""
    cuts = sorted({*beam.model.places, *more})
    return [*cuts, *(a + (b - a) * n / 8 for a, b in pairwise(cuts) for n in (1, 4, 6))]


# --- against unit loads -----------------------------------------------------------------------------


@law
@given(beams(most_loads=1, cases=False, most_lengths=6))
def test_reactions_are_what_a_unit_load_gives(beam: Beam) -> None:
    """Every ordinate of every reaction and reaction moment is the answer of the solver under a unit load there."""
    places, asked = between(beam), phrases(beam)
    expected = unit_loads(beam, asked, places)
    for phrase, column in zip(asked, expected.T, strict=True):
        found = ordinates(beam, phrase, places)
        assert np.abs(found - column).max() <= slack(beam, phrase, found, column), phrase


@law
@given(beams(most_loads=1, cases=False, most_lengths=6), st.data())
def test_fields_are_what_a_unit_load_gives(beam: Beam, data: st.DataObject) -> None:
    """The same of shear, moment, slope and deflection, on both sides of any place, a mark or not.

    A load at the very place where shear is asked for is left out: the line jumps there.
    """
    x, side = data.draw(sections(beam), label="section")
    places = [place for place in between(beam, x) if place != x]
    asked = [f"{field} at {written(x)} {side}" for field in FIELDS]
    expected = unit_loads(beam, asked, places)
    for phrase, column in zip(asked, expected.T, strict=True):
        found = ordinates(beam, phrase, places)
        assert np.abs(found - column).max() <= slack(beam, phrase, found, column), phrase


def test_the_tolerance_bites() -> None:
    """A line of a beam that is a thousandth stiffer, or of a place a thousandth off, is not taken for the right one."""
    line, stiffness = "fixed 4 step 3 spring(800) 5 pinned", "2e4 3e4 2e4"
    exact = np.array(influence(line, "moment at 5.5", [list(range(13))], stiffness))
    for other in (
        influence(line, "moment at 5.5", [list(range(13))], "2e4 3.003e4 2e4"),
        influence(line, "moment at 5.5055", [list(range(13))], stiffness),
    ):
        assert np.abs(np.array(other) - exact).max() > 1e3 * CLOSE * np.abs(exact).max()


@pytest.mark.parametrize(
    ("phrase", "same"),
    [
        ("moment at support 2 left", "moment at 4 left"),
        ("shear at 1 in span 2", "shear at 5"),
        ("Deflection at 5 IN span 2", "deflection at 9 left"),
        ("moment at support 2", "moment at 4 right"),
    ],
)
def test_a_place_may_be_named_in_every_way_of_a_phrase(phrase: str, same: str) -> None:
    """A support, a place in a span and a side name the same line as the place from the left end."""
    line = "pinned 4 fixed 5 pinned 2 free"
    assert influence_line(line, phrase, 41, 2e4) == influence_line(line, same, 41, 2e4)


# --- jumps ------------------------------------------------------------------------------------------


@law
@given(unloaded, st.data())
def test_the_line_of_a_shear_jumps_by_one_and_only_there(beam: Beam, data: st.DataObject) -> None:
    """Where the load passes from the left of the section to its right, the shear grows by the load; else it is smooth.

    The table for a chart has both sides, and the ordinate is the right one.
    """
    x, side = data.draw(sections(beam), label="section")
    phrase = f"shear at {written(x)} {side}"
    rows = np.array(influence_line(beam.line, phrase, 5, beam.stiffness), dtype=float)
    twice = [n for n, (a, b) in enumerate(pairwise(rows[:, 0])) if a == b]
    inside = 0 < x < sum(beam.lengths)
    assert len(twice) == inside
    near = slack(beam, phrase, rows[:, 1])
    for n in twice:
        assert rows[n, 0] == pytest.approx(float(x), rel=1e-12)
        assert abs(rows[n + 1, 1] - rows[n, 1] - 1.0) <= near
        assert abs(ordinates(beam, phrase, [x])[0] - rows[n + 1, 1]) <= near
        # a load exactly there is to the right of the left side, and to the left of the right side
        [[there]] = unit_loads(beam, [phrase], [x])
        assert abs(there - rows[n + (side == "left"), 1]) <= near


def test_a_cut_beside_a_mark_is_told_on_both_sides() -> None:
    """Just left of a support a load counts in full, on the support not at all; at the right end the line ends inside.

    Lengths that round make no difference: a mark at 0.1 + 0.2 stands at 0.3.
    """
    rows = influence_line("pinned 4 pinned 4 pinned", "shear at 4 left", 2)
    assert rows == [[0.0, 0.0], [4.0, pytest.approx(-1.0)], [4.0, 0.0], [8.0, 0.0]]
    assert influence_line("pinned 8 pinned", "shear at 8", 3)[-1] == [8.0, pytest.approx(-1.0)]
    assert influence("pinned 8 pinned", "shear at 8", 8) == pytest.approx(-1.0)
    assert influence("pinned 0.1 pinned 0.2 pinned 0.5 pinned", "shear at 0.3 left", 0.3) == 0.0
    assert influence("pinned 0.1 pinned 0.2 pinned 0.5 pinned", "shear at 0.3", 0.3) == pytest.approx(1.0)


@law
@given(unloaded, st.data())
def test_no_other_line_jumps(beam: Beam, data: st.DataObject) -> None:
    """Lines of reactions, moments, slopes and deflections are continuous: one row a place."""
    x, side = data.draw(sections(beam), label="section")
    for phrase in (*phrases(beam), *(f"{field} at {written(x)} {side}" for field in FIELDS[1:])):
        rows = np.array(influence_line(beam.line, phrase, 9, beam.stiffness), dtype=float)
        assert (np.diff(rows[:, 0]) > 0.0).all(), phrase


# --- Mueller-Breslau: the shape of a line is that of the beam, moved in the way of the result ------------


def pieces(beam: Beam, phrase: str, x: F) -> tuple[Polynomial, Polynomial]:
    """The cubics to the left and to the right of an inner place, through four ordinates each."""
    cuts = sorted({*beam.model.places, x})
    n = cuts.index(x)
    found = []
    for start, end in ((cuts[n - 1], x), (x, cuts[n + 1])):
        inside = [start + (end - start) * k / 10 for k in (1, 4, 6, 9)]
        found.append(Polynomial.fit([float(s) for s in inside], ordinates(beam, phrase, inside), 3))
    return found[0], found[1]


@law
@given(unloaded, decimals(0, 1, 2).filter(lambda part: 0 < part < 1), st.data())
def test_shapes_of_moment_and_shear(beam: Beam, part: F, data: st.DataObject) -> None:
    """The line of a moment is bent by a unit angle at its place, without a step; that of a shear is cut there by a unit
    step, its tangents parallel: Mueller-Breslau's principle.

    With shear flexibility a load on the beam distorts it too, so that this is the shape of beams without it.
    """
    beam = replace(beam, ga=None)
    length = data.draw(st.integers(0, len(beam.lengths) - 1), label="length")
    x = beam.model.places[length] + beam.lengths[length] * part
    at = float(x)
    for field, step, angle in (("moment", 0.0, -1.0), ("shear", 1.0, 0.0)):
        phrase = f"{field} at {written(x)}"
        left, right = pieces(beam, phrase, x)
        size = float(np.abs(ordinates(beam, phrase, between(beam))).max()) + 1.0
        short = float(min(beam.lengths)) * min(float(part), 1 - float(part))
        assert abs(right(at) - left(at) - step) <= CLOSE * size
        assert abs(right.deriv()(at) - left.deriv()(at) - angle) <= CLOSE * size / short


@law
@given(unloaded)
def test_shape_of_a_reaction(beam: Beam) -> None:
    """The line of a reaction is the deflected line when its support sinks by one; that of a rigid one is 1 there and 0
    at all other rigid supports."""
    model = beam.model
    rigid = {n: model.marks[i].kind in ("fixed", "pinned", "roller") for n, i in enumerate(model.supports, 1)}
    places = between(beam)
    for n, index in enumerate(model.supports, 1):
        if model.marks[index].kind == "guided":
            continue
        phrase = f"reaction {n}"
        found = ordinates(beam, phrase, places)
        sunk = replace(beam, clauses=(Clause(Settle(F(1), index)),))
        [line] = deflection_at(beam.line, sunk.loads, [[float(x) for x in places]], beam.stiffness)
        size = float(np.abs(found).max())
        assert np.abs(found - np.array(line)).max() <= CLOSE * size
        if rigid[n]:
            for other, at in enumerate(model.supports, 1):
                if rigid[other]:
                    [ordinate] = ordinates(beam, phrase, [model.places[at]])
                    assert abs(ordinate - (other == n)) <= CLOSE * size


@law
@given(unloaded, st.data())
def test_reciprocity(beam: Beam, data: st.DataObject) -> None:
    """What a load at b does at a, a load at a does at b (Maxwell); a couple at a moves b as a load at b turns a."""
    x, side = data.draw(sections(beam), label="section")
    places = between(beam)
    lines = [ordinates(beam, f"deflection at {written(place)}", [x])[0] for place in places]
    across = ordinates(beam, f"deflection at {written(x)}", places)
    assert np.abs(across - np.array(lines)).max() <= slack(beam, "deflection at", across)
    hinges = {place for place, mark in zip(beam.model.places, beam.marks, strict=True) if mark.kind == "hinge"}
    if x not in hinges:
        turned = ordinates(beam, f"slope at {written(x)} {side}", places)
        [moved] = deflection_at(beam.line, loaded(beam, x, Couple).loads, [[float(p) for p in places]], beam.stiffness)
        assert np.abs(turned - np.array(moved)).max() <= slack(beam, "slope at", turned)


# --- closed forms -----------------------------------------------------------------------------------

U = np.linspace(0.0, 1.0, 21)


def asked(line: str, phrase: str, x: Array, stiffness: object = None) -> Array:
    """The ordinates at many places."""
    [row] = influence(line, phrase, [x.tolist()], stiffness)
    return np.array(row, dtype=float)


def test_simple_span() -> None:
    """On a simple span of length 8: reaction 1 - x/L, moment at a, its shear, and the deflection of every textbook."""
    x, a, L, EI = 8 * U, 3.0, 8.0, 2e4
    np.testing.assert_allclose(asked("pinned 8 roller", "reaction 1", x), 1 - x / L, atol=1e-12)
    moment = np.where(x <= a, x * (L - a), a * (L - x)) / L
    np.testing.assert_allclose(asked("pinned 8 roller", "moment at 3", x), moment, atol=1e-12)
    shear = np.where(x < a, -x / L, 1 - x / L)
    np.testing.assert_allclose(asked("pinned 8 roller", "shear at 3", x), shear, atol=1e-12)
    near, far = np.minimum(x, L - x), 4.0
    middle = near * (3 * L * L - 4 * near * near) / 48 / EI
    np.testing.assert_allclose(asked("pinned 8 roller", f"deflection at {far}", x, EI), middle, rtol=1e-10)


def test_two_equal_spans() -> None:
    """Two equal spans: outer reaction 1 - 5u/4 + u³/4 in its span, middle 3u/2 - u³/2, hogging moment (u - u³)/4."""
    line, L = "pinned 5 pinned 5 pinned", 5.0
    np.testing.assert_allclose(asked(line, "reaction 1", L * U), 1 - 1.25 * U + U**3 / 4, atol=1e-12)
    np.testing.assert_allclose(asked(line, "reaction 2", L * U), (3 * U - U**3) / 2, atol=1e-12)
    np.testing.assert_allclose(asked(line, "reaction 3", L * U), -(U - U**3) / 4, atol=1e-12)
    np.testing.assert_allclose(asked(line, "moment at support 2", L * U), -(U - U**3) * L / 4, atol=1e-12)


def test_built_in_span_and_cantilever() -> None:
    """Both ends built in: moment at the left -x(L - x)²/L²; a cantilever: moment a load's arm, tip by x²(3L - x)."""
    x, L, EI = 6 * U, 6.0, 1e4
    np.testing.assert_allclose(asked("fixed 6 fixed", "moment at 0", x), -x * (L - x) ** 2 / L**2, atol=1e-12)
    np.testing.assert_allclose(asked("fixed 6 fixed", "reaction moment 1", x), -x * (L - x) ** 2 / L**2, atol=1e-12)
    np.testing.assert_allclose(asked("fixed 6 free", "moment at 0", x), -x, atol=1e-12)
    tip = x**2 * (3 * L - x) / 6 / EI
    np.testing.assert_allclose(asked("fixed 6 free", "deflection at 6", x, EI), tip, atol=1e-15)


def test_hinged_beam() -> None:
    """A span hung to a cantilever by a hinge: straight lines, and nothing from a load that others carry."""
    line = "pinned 6 pinned 2 hinge 4 pinned"
    x = np.array([0.0, 3.0, 6.0, 7.0, 8.0, 10.0, 12.0])
    np.testing.assert_allclose(asked(line, "moment at support 2", x), [0, 0, 0, -1, -2, -1, 0], atol=1e-12)
    np.testing.assert_allclose(asked(line, "reaction 3", x), [0, 0, 0, 0, 0, 0.5, 1], atol=1e-12)
    np.testing.assert_allclose(asked(line, "reaction 1", x), [1, 0.5, 0, -1 / 6, -1 / 3, -1 / 6, 0], atol=1e-12)


# --- the table ----------------------------------------------------------------------------------------


@law
@given(unloaded, st.integers(2, 60), st.data())
def test_the_table_has_every_break_and_the_ordinates(beam: Beam, points: int, data: st.DataObject) -> None:
    """Rows stand from left to right at evenly spaced places, at every mark and at the place of the result; each is
    the ordinate."""
    x, side = data.draw(sections(beam), label="section")
    phrase = f"{data.draw(st.sampled_from(FIELDS), label='field')} at {written(x)} {side}"
    rows = np.array(influence_line(beam.line, phrase, points, beam.stiffness), dtype=float)
    end = float(sum(beam.lengths))
    assert (np.diff(rows[:, 0]) >= 0.0).all()
    for place in (*np.linspace(0.0, end, points), *map(float, beam.model.places), float(x)):
        assert np.abs(rows[:, 0] - place).min() <= 2e-12 * end
    [found] = influence(beam.line, phrase, [rows[:, 0].tolist()], beam.stiffness)
    first_of_two = np.append(np.diff(rows[:, 0]) == 0.0, False)
    near = slack(beam, phrase, rows[:, 1])
    assert np.abs(np.array(found) - rows[:, 1])[~first_of_two].max() <= near


def test_an_array_of_places_keeps_its_shape_and_its_errors() -> None:
    """A range of x gives an array of its shape; a place that is not on the beam is an error in its own entry."""
    [[first, second], [third, fourth]] = influence("pinned 8 pinned", "moment at 4", [[0, 2], [9, 4]])
    assert (first, second, fourth) == (0.0, pytest.approx(1.0), pytest.approx(2.0))
    assert third.value == "#N/A"
