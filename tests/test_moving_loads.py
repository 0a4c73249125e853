"""Trains of axles and lane loads: never less than any position of a fine sweep gives, and reached where it is said."""

from __future__ import annotations

import re
from dataclasses import dataclass
from functools import cache
from typing import Any

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from numpy.typing import NDArray

from beamfuncs.cells import frozen
from beamfuncs.functions import beam_result, governing, highest, influence, lowest
from beamfuncs.governing import SIDES, extreme
from beamfuncs.notation import read_combinations
from beamfuncs.results import read_phrase
from beamfuncs.solving import adverse

Array = NDArray[np.float64]
FIELDS = ("shear", "moment", "slope", "deflection")
CLOSE = 1e-9
"""Of the largest answer in play."""
NUDGES = (0.0, -1e-9, 1e-9)
"""Parts of the length: an axle is as near a section as one likes, on either side of it."""

law = settings(max_examples=20, deadline=None, derandomize=True)


@dataclass(frozen=True)
class Bridge:
    """A beam, its permanent load, a train as numbers, the places that are asked about, and how loads are combined."""

    line: str
    stiffness: str | float | None
    permanent: str
    axles: tuple[float, ...]
    spacings: tuple[float, ...]
    both_ways: bool
    places: tuple[str, ...]
    combination: str | None = None

    @property
    def train(self) -> str:
        """The train as it is written."""
        words = ["axles", *map(repr, self.axles)]
        words += ["spaced", *map(repr, self.spacings)] if self.spacings else []
        return self.case + " ".join([*words, "both ways"] if self.both_ways else words)

    @property
    def loads(self) -> str:
        """Permanent load and train."""
        return f"{self.permanent}; {self.train}"

    @property
    def case(self) -> str:
        """The case of the train, before its colon."""
        return "Q: " if self.combination else ""

    @property
    def marks(self) -> list[str]:
        """The marks of the line, springs without their stiffness."""
        return re.sub(r"\([^)]*\)", "", self.line).split()[::2]

    @property
    def lengths(self) -> list[float]:
        """The lengths of the line."""
        return [float(word) for word in re.sub(r"\([^)]*\)", "", self.line).split()[1::2]]

    @property
    def length(self) -> float:
        return sum(self.lengths)

    @property
    def supports(self) -> int:
        """How many marks are supports."""
        return sum(mark not in ("free", "hinge", "step") for mark in self.marks)

    @property
    def of_a_place(self) -> list[str]:
        """Every reaction and reaction moment, and every field at each place, on both sides inside the beam."""
        supports = range(1, self.supports + 1)
        sides = {"0": ("",), repr(self.length): ("",)}
        return [
            *(f"{what} {n}" for what in ("reaction", "reaction moment") for n in supports),
            *(f"{field} at {x}{side}" for x in self.places for side in sides.get(x, ("", " left")) for field in FIELDS),
        ]

    def along(self, word: str) -> list[str]:
        """The extreme of every field in the beam, and of all but the slope in each span."""
        in_spans = [f" in span {n}" for n in range(1, self.supports)]
        return [f"{field} {word}{where}" for field in FIELDS for where in ("", *(in_spans if field != "slope" else []))]

    def placed(self, first: float, reversed_: bool) -> str:
        """The loads with the train standing still: point loads for the axles that are on the beam."""
        way = -1.0 if reversed_ else 1.0
        places = [first + way * offset for offset in (0.0, *np.cumsum(self.spacings).tolist())]
        near = 1e-12 * self.length  # sums of spacings round off
        standing = [
            f"{self.case}point {force!r} at {min(max(x, 0.0), self.length)!r}"
            for force, x in zip(self.axles, places, strict=True)
            if -near <= x <= self.length + near
        ]
        return "; ".join([self.permanent, *(standing or [f"{self.case}udl 0"])])

    def standing(self, first: float, reversed_: bool, phrases: list[str]) -> list[float]:
        """What the ordinary functions answer for a train that stands still."""
        rows = [[phrase] for phrase in phrases]
        column: Any = beam_result(self.line, self.placed(first, reversed_), rows, self.stiffness, self.combination)
        return [row[0] for row in column]

    def moving(self, side: str, phrases: list[str]) -> Array:
        """What the functions answer for the train that moves."""
        ask, rows = (highest if side == "highest" else lowest), [[phrase] for phrase in phrases]
        column: Any = ask(self.line, self.loads, rows, self.combination, self.stiffness)
        return np.array(column, dtype=float)[:, 0]


BRIDGES = {
    "simple span": Bridge("pinned 10 roller", 2e4, "udl 0", (80.0, 80.0, 40.0), (1.2, 3.2), True, ("0", "2.5", "5")),
    "a train longer than a span": Bridge(
        *("pinned 5 pinned 8 pinned", 2e4, "G: udl 4", (60.0, 120.0), (6.5,), False),
        *(("2", "5", "9"), "1.35 G + 1.5 Q"),
    ),
    "overhangs": Bridge(
        *("free 1.5 pinned 6 pinned 2 free", 24000, "udl 3", (50.0, 30.0), (2.0,), False),
        ("0", "1.5", "4.5", "9.5"),
    ),
    "built in, hinge": Bridge(
        *("fixed 4 hinge 3 pinned 5 fixed", 15000, "udl 2; point 10 at 6", (40.0, 70.0, 20.0), (1.5, 2.5), False),
        ("0", "4", "7"),
    ),
    "step, springs, shear flexibility": Bridge(
        *("spring(900, 400) 3 step 5 spring(2500) 6 guided", "EI 2e4 3e4 2.5e4; GA 4e4", "udl 0"),
        *((90.0, 45.0), (1.8,), False, ("0", "8", "14.0")),
    ),
    "an axle that lifts": Bridge("pinned 7 pinned 4 free", 1e4, "udl 1", (30.0, -20.0), (2.5,), False, ("3", "7", "9")),
    "one axle": Bridge("fixed 6 free", 1e4, "couple 5 at 3", (30.0,), (), True, ("0", "3", "6.0")),
}


@cache
def swept(name: str) -> tuple[list[str], Array]:
    """The phrases, and the answers for every position, a row each: in steps of a thousandth of the longest span, from
    off the beam on one side to off it on the other."""
    bridge = BRIDGES[name]
    phrases = [*bridge.of_a_place, *bridge.along("max"), *bridge.along("min")]
    total, step = sum(bridge.spacings), max(bridge.lengths) / 1000
    rows = []
    for reversed_ in (False, True) if bridge.both_ways else (False,):
        start, way = (0.0, -1.0) if reversed_ else (-total, 1.0)
        positions = np.arange(start - step, start + bridge.length + total + 2 * step, step)
        on_a_tip = [
            x - way * offset for x in (0.0, bridge.length) for offset in (0.0, *np.cumsum(bridge.spacings).tolist())
        ]
        rows += [bridge.standing(first, reversed_, phrases) for first in [*positions.tolist(), *on_a_tip]]
    return phrases, np.array(rows)


def kind(phrase: str) -> str:
    """The field that is asked for, or which kind of reaction."""
    return phrase[: phrase.index(" ", 9)] if phrase.startswith("reaction m") else phrase.split()[0]


@cache
def sizes(name: str) -> dict[str, float]:
    """The largest answer of each kind."""
    phrases, table = swept(name)
    found: dict[str, float] = {}
    for phrase, values in zip(phrases, table.T, strict=True):
        found[kind(phrase)] = max(found.get(kind(phrase), 0.0), float(np.abs(values).max()))
    return found


def asked(bridge: Bridge, side: str) -> list[str]:
    """The phrases that have such an extreme."""
    return [*bridge.of_a_place, *bridge.along("max" if side == "highest" else "min")]


@pytest.mark.parametrize("side", SIDES)
@pytest.mark.parametrize("name", BRIDGES)
def test_no_position_of_a_sweep_gives_more(name: str, side: str) -> None:
    """Reactions, shear, moment, slope and deflection at a place, anywhere in a span and anywhere in the beam: no
    position goes beyond the answer, and the best comes as near as the value changes between two positions."""
    bridge, sign = BRIDGES[name], SIDES[side]
    phrases, table = swept(name)
    for phrase, exact in zip(asked(bridge, side), bridge.moving(side, asked(bridge, side)), strict=True):
        values, size = table[:, phrases.index(phrase)], sizes(name)[kind(phrase)]
        change = 2 * np.quantile(np.abs(np.diff(values)), 0.995)
        best = sign * max(sign * values)
        assert sign * (best - exact) <= CLOSE * size, (phrase, exact, best)
        assert sign * (exact - best) <= change + CLOSE * size, (phrase, exact, best)


@pytest.mark.parametrize("side", SIDES)
@pytest.mark.parametrize("name", BRIDGES)
def test_the_position_that_governs_gives_the_answer(name: str, side: str) -> None:
    """Point loads where the train governs give the answer in the ordinary functions: it is never more than a train can
    do. A train that is not on the beam leaves the permanent load."""
    bridge, sign = BRIDGES[name], SIDES[side]
    result = adverse(bridge.line, bridge.loads, bridge.stiffness)
    combinations = read_combinations(frozen("combinations", bridge.combination))
    for phrase, exact in zip(asked(bridge, side), bridge.moving(side, asked(bridge, side)), strict=True):
        found = extreme(result, read_phrase(phrase), combinations, sign).governing
        assert found.value == exact
        [position] = found.positions
        first, reversed_ = (
            (-sum(bridge.spacings) - 1.0, False) if position is None else (position.first_axle, position.reversed)
        )
        near = [bridge.standing(first + nudge * bridge.length, reversed_, [phrase])[0] for nudge in NUDGES]
        size = sizes(name)[kind(phrase)]
        assert sign * max(sign * value for value in near) == pytest.approx(exact, rel=0, abs=1e-7 * size), phrase


@pytest.mark.parametrize("name", ["simple span", "a train longer than a span", "overhangs"])
def test_governing_names_the_position(name: str) -> None:
    """The words say where the first axle stands and to which side the others, which again gives the answer."""
    bridge = BRIDGES[name]
    for phrase in [*bridge.of_a_place[:6], "moment max", "moment max in span 1"]:
        [exact] = bridge.moving("highest", [phrase])
        said = governing(bridge.line, bridge.loads, phrase, bridge.combination, bridge.stiffness)
        assert said.startswith((bridge.combination or "every load once") + "; ")
        if "not on the beam" in said:
            first, others = -1e3, "right"
        else:
            found = re.search(r"(?:Q|axles): first axle at x = (\S+), the others to its (\w+)", said)
            assert found, said
            first, others = float(found[1]), found[2]
        near = [
            bridge.standing(first + nudge * bridge.length, others == "left", [phrase])[0]
            for nudge in (*NUDGES, -1e-5, 1e-5)
        ]
        assert max(near) == pytest.approx(exact, rel=1e-4), said


def test_a_perturbed_answer_fails() -> None:
    """An axle lighter by a ten thousandth falls below the sweep, and what a heavier one gives is not reached: both
    bounds bite."""
    bridge = BRIDGES["simple span"]
    phrases, table = swept("simple span")
    best = max(table[:, phrases.index("moment max")])
    assert highest(bridge.line, "axles 79.992 80 40 spaced 1.2 3.2 both ways", "moment max") < best * (1 - 1e-5)
    heavier = highest(bridge.line, "axles 80.008 80 40 spaced 1.2 3.2 both ways", "moment max")
    assert heavier > highest(bridge.line, bridge.loads, "moment max") * (1 + 1e-5)


# --- closed forms -----------------------------------------------------------------------------------


def absolute_maximum(length: float, axles: tuple[float, ...], spacings: tuple[float, ...]) -> float:
    """The absolute maximum moment of a train on a simple span, by the rule of the centre line.

    The moment under an axle is greatest where the centre line of the span halves the distance between that axle and
    the resultant of all axles then on the span: R/L (L/2 + e/2)² less the moments of the axles to its left about it,
    e being how far the axle is to the right of the resultant. This is tried for each axle with each group of
    neighbours, and counts where that very group is on the span then.
    """
    at = [0.0, *np.cumsum(spacings).tolist()]
    best = 0.0
    for first in range(len(axles)):
        for last in range(first, len(axles)):
            group = range(first, last + 1)
            resultant = sum(axles[i] for i in group)
            middle = sum(axles[i] * at[i] for i in group) / resultant
            for under in group:
                e = at[under] - middle
                where = [length / 2 + e / 2 + x - at[under] for x in at]
                if [0.0 <= x <= length for x in where] == [i in group for i in range(len(axles))]:
                    left = sum(axles[i] * (at[under] - at[i]) for i in group if i < under)
                    best = max(best, resultant / length * (length / 2 + e / 2) ** 2 - left)
    return best


@pytest.mark.parametrize(
    ("train", "length", "axles", "spacings", "moment"),
    [
        ("two equal axles: P (L - d/2)²/(2L)", 10.0, (145.0, 145.0), (1.2,), 145 * 9.4**2 / 20),
        ("two unlike: R (L - d P2/R)²/(4L)", 10.0, (60.0, 40.0), (4.0,), 100 * (10 - 1.6) ** 2 / 40),
        ("one of them off the span: P L/4", 10.0, (60.0, 40.0), (9.0,), 60 * 10 / 4),
        ("three axles", 12.0, (35.0, 145.0, 145.0), (4.3, 4.3), None),
        ("three axles, the light one off the span", 6.0, (35.0, 145.0, 145.0), (4.3, 1.8), 145 * 5.1**2 / 12),
    ],
)
def test_absolute_maximum_moment_by_hand(
    train: str, length: float, axles: tuple[float, ...], spacings: tuple[float, ...], moment: float | None
) -> None:
    """The greatest moment on a simple span stands where the centre line is midway between an axle and the resultant."""
    written = f"axles {' '.join(map(str, axles))} spaced {' '.join(map(str, spacings))}"
    exact = absolute_maximum(length, axles, spacings)
    if moment is not None:
        assert exact == pytest.approx(moment, rel=1e-12)
    assert highest(f"pinned {length} roller", written, "moment max") == pytest.approx(exact, rel=1e-10), train


def test_the_place_of_the_absolute_maximum() -> None:
    """Two axles 60 and 40, 4 apart, on a span of 10: the heavier 0.8 from the middle, the resultant as far."""
    said = governing("pinned 10 roller", "axles 60 40 spaced 4", "moment max")
    assert said == "every load once; axles: first axle at x = 4.2, the others to its right; at x = 4.2"
    said = governing("pinned 10 roller", "axles 40 60 spaced 4 both ways", "moment max")
    assert "first axle at x = 1.8, the others to its right; at x = 5.8" in said or (
        "first axle at x = 8.2, the others to its left; at x = 4.2" in said
    )


TENTHS = st.integers(1, 120).map(lambda n: n / 10)


@st.composite
def trains(draw: st.DrawFn, most: int = 4) -> tuple[tuple[float, ...], tuple[float, ...]]:
    """Axles and the distances between them."""
    axles = draw(st.lists(st.integers(5, 200).map(float), min_size=1, max_size=most))
    return tuple(axles), tuple(draw(TENTHS) for _ in axles[1:])


def written(train: tuple[tuple[float, ...], tuple[float, ...]], more: str = "") -> str:
    """A train as it is written."""
    axles, spacings = train
    spaced = f"spaced {' '.join(map(str, spacings))}" if spacings else ""
    return f"axles {' '.join(map(str, axles))} {spaced} {more}"


@law
@given(st.integers(30, 250).map(lambda n: n / 10), trains())
def test_absolute_maximum_moment(length: float, train: tuple[tuple[float, ...], tuple[float, ...]]) -> None:
    """Any train on a simple span: the rule of the centre line, and the end shear with an axle on the support."""
    line = f"pinned {length} roller"
    exact = absolute_maximum(length, *train)
    assert highest(line, written(train), "moment max") == pytest.approx(exact, rel=1e-9)
    assert lowest(line, written(train), "moment min") == pytest.approx(0.0, abs=1e-9 * exact)
    axles, spacings = train
    at = np.array([0.0, *np.cumsum(spacings)])
    shear = max((np.array(axles) * np.clip(1 - (at - a) / length, 0, 1) * (at >= a)).sum() for a in at)
    assert highest(line, written(train), "shear max") == pytest.approx(shear, rel=1e-10)
    assert highest(line, written(train), "reaction 1") == pytest.approx(shear, rel=1e-10)


def test_cantilever_and_overhang() -> None:
    """An axle on the very tip: moment P L at the root, the whole axle in the shear, P a²(L + a)/(3 EI) down."""
    assert lowest("fixed 6 free", "axles 30 20 spaced 2", "moment at 0") == pytest.approx(-(30 * 4 + 20 * 6))
    assert lowest("fixed 6 free", "axles 30 20 spaced 2", "reaction moment 1") == pytest.approx(-(30 * 4 + 20 * 6))
    assert lowest("fixed 6 free", "axles 30 20 spaced 7", "moment min") == pytest.approx(-(30 * 6))
    assert highest("fixed 6 free", "axles 30 20 spaced 2", "shear at 6") == pytest.approx(30.0)
    assert highest("fixed 6 free", "axles 30 20 spaced 2", "shear max") == pytest.approx(50.0)
    tip = 30 * 2**2 * (8 + 2) / 3 / 1e4
    assert highest("pinned 8 pinned 2 free", "axles 30", "deflection at 10", None, 1e4) == pytest.approx(tip)
    assert highest("pinned 8 pinned 2 free", "axles 30", "deflection max in span 1", None, 1e4) == pytest.approx(
        30 * 8**3 / 48 / 1e4
    )
    assert lowest("pinned 8 pinned 2 free", "axles 30", "reaction 1") == pytest.approx(-30 * 2 / 8)
    assert lowest("pinned 8 pinned 2 free", "axles 30", "moment min in span 1") == pytest.approx(-60.0)


# --- the lane -----------------------------------------------------------------------------------------


def area(line: str, phrase: str, length: float, stiffness: float) -> tuple[float, float]:
    """The areas above and below zero of an influence line, by the midpoint rule over unit loads of the solver."""
    n = 2000
    places = (np.arange(n) + 0.5) * length / n
    values = np.array([beam_result(line, f"point 1 at {x!r}", phrase, stiffness) for x in places.tolist()])
    return np.maximum(values, 0.0).sum() * length / n, np.minimum(values, 0.0).sum() * length / n


@pytest.mark.parametrize("phrase", ["reaction 2", "moment at 3", "shear at 3", "deflection at 10"])
def test_a_lane_lies_where_it_is_adverse(phrase: str) -> None:
    """The lane adds its load times the area of the influence line that is adverse; the train goes on as without it."""
    line, length, EI = "pinned 7 pinned 5 free", 12.0, 1e4
    above, below = area(line, phrase, length, EI)
    train = "axles 80 40 spaced 2 both ways"
    for ask, part in ((highest, above), (lowest, below)):
        alone, with_lane = (ask(line, loads, phrase, None, EI) for loads in (train, f"{train} lane udl 9"))
        assert with_lane - alone == pytest.approx(9 * part, abs=9e-5 * (above - below))
        assert ask(line, "axles 0 lane udl 9", phrase, None, EI) == pytest.approx(9 * part, abs=9e-5 * (above - below))


def test_areas_of_known_lines() -> None:
    """Two equal spans: 3/8, 10/8 and 7/16 of a span's load, and the hogging moment of both spans, w l²/8."""
    line, lane = "pinned 5 pinned 5 pinned", "axles 0 lane udl 8"
    assert highest(line, lane, "reaction 2") == pytest.approx(50.0)
    assert highest(line, lane, "reaction 1") == pytest.approx(40 * 7 / 16)
    assert lowest(line, lane, "reaction 1") == pytest.approx(-40 / 16)
    assert lowest(line, lane, "moment at support 2") == pytest.approx(-8 * 25 / 8)
    assert highest(line, lane, "moment at support 2") == 0.0


@pytest.mark.parametrize(
    ("line", "span_1", "loads"),
    [
        ("pinned 6 pinned 8 pinned", 6.0, "axles 80 40 spaced 2 lane udl 9"),
        ("fixed 6 pinned 4 free", 6.0, "udl 3; axles 60 lane udl 5"),
        ("pinned 6 pinned 8 pinned", 6.0, "A: axles 80 40 spaced 2; B: axles 30"),
        ("pinned 5 hinge 3 pinned 6 fixed", 8.0, "udl 2 each span; axles 80 lane udl 4; axles 20 both ways"),
    ],
)
def test_a_lane_and_several_trains_anywhere(line: str, span_1: float, loads: str) -> None:
    """The extreme along the beam and in a span is no less than at any of many places, and near the largest of them.

    It is found by a search; each place by itself is exact.
    """
    end, step, EI = sum(map(float, line.split()[1::2])), 0.05, 1e4
    for field in ("moment", "shear", "deflection"):
        for ask, word in ((highest, "max"), (lowest, "min")):
            places = [f"{x!r}" for x in np.arange(0.0, end, step).tolist()]
            ends = [f"{span_1!r} left", repr(end)]  # the last of span 1, and of the beam
            every: Any = ask(line, loads, [[f"{field} at {x}"] for x in (*places, *ends)], None, EI)
            values = np.array(every, dtype=float)[:, 0]
            in_span_1 = np.array([*(float(x) < span_1 - step / 2 for x in places), True, False])
            sign = 1 if word == "max" else -1
            for where, inside in (("", in_span_1 | True), (" in span 1", in_span_1)):
                found = ask(line, loads, f"{field} {word}{where}", None, EI)
                best = max(sign * values[inside])
                size, change = np.abs(values).max(), 2 * np.quantile(np.abs(np.diff(values)), 0.99)
                assert sign * found >= best - 1e-7 * size, (field, word, where)
                assert sign * found <= best + change, (field, word, where)


def test_a_search_looks_at_every_hill() -> None:
    """Of two places where a lane and two trains lift the beam almost alike, the one that is lifted more is found."""
    line, stiffness = "spring(29, 330000) 2.52 hinge 3.6 pinned 3.54 spring(4100, 20000)", "EI 3200; GA 1200"
    imposed = "rotate 0.00121 at support 1; settle 0.02342 at support 3"
    loads = f"{imposed}; axles 121 lane udl 13; axles 30 20 spaced 2 both ways"
    found = lowest(line, loads, "deflection min", None, stiffness)
    assert found <= lowest(line, loads, "deflection at 7.689", None, stiffness)
    assert found < lowest(line, loads, "deflection at 2.52", None, stiffness) - 1e-4


# --- laws -----------------------------------------------------------------------------------------------


LINE, EI = "fixed 5 pinned 7 hinge 2 pinned 2 free", 2e4
MIRRORED = "free 2 pinned 2 hinge 7 pinned 5 fixed"
ASKED = ["reaction 2", "reaction moment 1", "moment at 5", "shear at 8", "deflection at 16", "moment max", "shear max"]


def answers(ask: Any, loads: str, phrases: list[str], line: str = LINE, combination: str | None = None) -> Array:
    """The answers to several phrases."""
    return np.array(ask(line, loads, [[p] for p in phrases], combination, EI), dtype=float)[:, 0]


@law
@given(trains(3))
def test_both_ways_is_the_worse_of_two_trains(train: tuple[tuple[float, ...], tuple[float, ...]]) -> None:
    """A train both ways gives the worse of the train and of the train written backwards."""
    axles, spacings = train
    forward, backward = written(train), written((axles[::-1], spacings[::-1]))
    for ask, choose in ((highest, np.maximum), (lowest, np.minimum)):
        phrases = ASKED if ask is highest else ASKED[:-2]
        one, other = answers(ask, forward, phrases), answers(ask, backward, phrases)
        both = answers(ask, written(train, "both ways"), phrases)
        np.testing.assert_allclose(both, choose(one, other), rtol=1e-9, atol=1e-9)


@law
@given(trains(3))
def test_mirror(train: tuple[tuple[float, ...], tuple[float, ...]]) -> None:
    """The beam seen from behind, under the train written backwards, answers the same, shears with the other sign."""
    axles, spacings = train
    backward = written((axles[::-1], spacings[::-1]))
    here = ["reaction 1", "reaction 2", "moment at 3", "deflection at 8", "moment max in span 2", "deflection max"]
    there = ["reaction 3", "reaction 2", "moment at 13", "deflection at 8", "moment max in span 1", "deflection max"]
    np.testing.assert_allclose(
        answers(highest, written(train), here), answers(highest, backward, there, MIRRORED), rtol=1e-9, atol=1e-9
    )
    np.testing.assert_allclose(
        answers(highest, written(train), ["shear at 3", "reaction moment 1"]),
        -answers(lowest, backward, ["shear at 13 left", "reaction moment 3"], MIRRORED),
        rtol=1e-9,
        atol=1e-9,
    )


@law
@given(trains(3), st.sampled_from([-2.0, 0.5, 1.5, 3.0]))
def test_axles_and_factors_scale(train: tuple[tuple[float, ...], tuple[float, ...]], factor: float) -> None:
    """A factor of the case does what the same factor of the axles does; a negative one turns highest into lowest."""
    axles, spacings = train
    scaled = (tuple(factor * axle for axle in axles), spacings)
    one = answers(highest, written(scaled), ASKED)
    np.testing.assert_allclose(
        answers(highest, "Q: " + written(train), ASKED, LINE, f"{factor} Q"), one, rtol=1e-9, atol=1e-9
    )
    if factor > 0:
        np.testing.assert_allclose(one, factor * answers(highest, written(train), ASKED), rtol=1e-9, atol=1e-9)
    else:
        other = answers(lowest, written(train), ASKED[:-2])
        np.testing.assert_allclose(one[:-2], factor * other, rtol=1e-9, atol=1e-9)


@law
@given(trains(3), trains(2))
def test_trains_of_one_place_add_up(
    first: tuple[tuple[float, ...], tuple[float, ...]], second: tuple[tuple[float, ...], tuple[float, ...]]
) -> None:
    """Two trains and a permanent load move by themselves: at a place their extremes add up."""
    phrases = ASKED[:-2]
    for ask in (highest, lowest):
        both = answers(ask, f"udl 3; {written(first)}; {written(second)}", phrases)
        alone = [answers(ask, loads, phrases) for loads in ("udl 3", written(first), written(second))]
        np.testing.assert_allclose(both, sum(alone), rtol=1e-9, atol=1e-9)


def test_one_axle_gives_the_influence_line() -> None:
    """A single axle of 1 gives the largest and smallest ordinates of the line, and never less than nothing."""
    xs = np.linspace(0.0, 16.0, 3201).tolist()
    for phrase in ASKED[:-2]:
        [ordinates] = influence(LINE, phrase, [xs], EI)
        size = max(map(abs, ordinates))
        high, low = highest(LINE, "axles 1", phrase, None, EI), lowest(LINE, "axles 1", phrase, None, EI)
        assert max(0.0, *ordinates) - 1e-12 * size <= high <= max(0.0, *ordinates) + 0.01 * size
        assert min(0.0, *ordinates) + 1e-12 * size >= low >= min(0.0, *ordinates) - 0.01 * size


def test_an_axle_just_off_the_end_is_told() -> None:
    """Where a train does most while an axle has just left the beam, the words say so: 60 at the middle of the span, and
    40 not on the tip of the overhang, where it would lift the middle."""
    line, train = "pinned 8 pinned 2 free", "axles 60 40 spaced 6"
    assert highest(line, train, "moment at 4") == pytest.approx(60 * 8 / 4)
    said = governing(line, train, "moment at 4")
    assert said == (
        "every load once; axles: first axle at x = 4, the others to its right, an axle just off the end of the beam"
    )


def test_more_axles_on_a_longer_way_are_never_less() -> None:
    """A train whose tail stays off the beam is its head: an axle 1000 behind makes no difference, and adds nothing."""
    for phrase in ASKED:
        alone = highest(LINE, "axles 50 30 spaced 1.5", phrase, None, EI)
        followed = highest(LINE, "axles 50 30 10 spaced 1.5 1000", phrase, None, EI)
        assert followed == pytest.approx(alone, rel=1e-12)


def test_mirrored_spans_are_alike_for_a_train_both_ways() -> None:
    """On three equal spans the outer ones have the same greatest moment, which is that of the beam."""
    line = "pinned 6 pinned 6 pinned 6 pinned"
    train = "axles 80 50 spaced 2 both ways"
    first, third = (highest(line, train, f"moment max in span {n}") for n in (1, 3))
    assert first == pytest.approx(third, rel=1e-12)
    assert highest(line, train, "moment max") == pytest.approx(highest(line, train, "moment max in span 1"), rel=1e-12)


def test_a_flat_extreme_stays_on_the_beam() -> None:
    """Where nothing is lifted, the least deflection is 0, at a place of the beam and not beyond its end."""
    loads = "udl 0; axles 5"
    assert lowest("fixed 0.5 pinned", loads, "deflection min", None, 1000) == 0.0
    assert governing("fixed 0.5 pinned", loads, "deflection min", None, 1000, "lowest").endswith("at x = 0")


def test_slopes_anywhere() -> None:
    """The greatest slope of a simple span is at its end, with the axle at (1 - 1/√3) L: P L²/(9√3 EI)."""
    exact = 80 * 10**2 / (9 * 3**0.5 * 2e4)
    assert highest("pinned 10 roller", "axles 80", "slope max", None, 2e4) == pytest.approx(exact, rel=1e-10)
    assert lowest("pinned 10 roller", "axles 80", "slope min", None, 2e4) == pytest.approx(-exact, rel=1e-10)
    said = governing("pinned 10 roller", "axles 80", "slope max", None, 2e4)
    assert said.endswith(f"first axle at x = {10 * (1 - 3**-0.5):.6g}; at x = 0")
