"""Patterns, two factors and combinations: the extreme is that of all patterns written out one by one."""

from __future__ import annotations

import re
from collections.abc import Iterable, Iterator, Mapping, Sequence
from dataclasses import dataclass
from itertools import pairwise, product
from typing import Any

import numpy as np
import pytest
from beams import Beam, beams
from hypothesis import given, settings
from hypothesis import strategies as st
from numpy.typing import NDArray

from beamfuncs.errors import BeamError
from beamfuncs.functions import (
    beam_result,
    diagram,
    envelope,
    governing,
    highest,
    lowest,
    reaction_cases,
    reactions,
)
from beamfuncs.governing import SIDES

Array = NDArray[np.float64]
FIELDS = ("shear", "moment", "slope", "deflection")
CLOSE = 1e-9
"""Of the largest answer of its kind."""

law = settings(max_examples=20, deadline=None, derandomize=True)


# --- patterns written out ---------------------------------------------------------------------------


@dataclass(frozen=True)
class Line:
    """A beam line, its stiffness, and where its spans and overhangs start and end."""

    text: str
    stiffness: str

    @property
    def marks(self) -> list[str]:
        """The marks, springs without their stiffness."""
        return re.sub(r"\([^)]*\)", "", self.text).split()[::2]

    @property
    def at(self) -> list[float]:
        """The place of each mark."""
        lengths = [float(word) for word in re.sub(r"\([^)]*\)", "", self.text).split()[1::2]]
        return [sum(lengths[:n]) for n in range(len(lengths) + 1)]

    @property
    def supports(self) -> list[float]:
        """The place of each support."""
        return [x for x, mark in zip(self.at, self.marks, strict=True) if mark not in ("free", "hinge", "step")]

    @property
    def parts(self) -> list[tuple[float, float]]:
        """Spans and overhangs."""
        return list(pairwise(sorted({0.0, *self.supports, self.at[-1]})))

    @property
    def of_a_place(self) -> list[str]:
        """Reactions, reaction moments, and every field on both sides of each mark and inside each length."""
        inside = [a + (b - a) * part for a, b in pairwise(self.at) for part in (0.3, 0.55)]
        places = [f"{x!r} {side}" for x in self.at[1:-1] for side in ("left", "right")]
        numbers = range(1, len(self.supports) + 1)
        return [
            *(f"{what} {n}" for what in ("reaction", "reaction moment") for n in numbers),
            *(f"{field} at {x}" for x in ("0", *places, *map(repr, inside), repr(self.at[-1])) for field in FIELDS),
        ]

    def along(self, word: str) -> list[str]:
        """The extreme of each field in the beam and in each span."""
        spans = ["", *(f" in span {n}" for n in range(1, len(self.supports)))]
        return [f"{field} {word}{span}" for field in FIELDS for span in spans]

    def asked(self, side: str) -> list[str]:
        """Everything that has such an extreme."""
        return [*self.of_a_place, *self.along("max" if side == "highest" else "min"), "total load"]


LINES = {
    "two spans": Line("pinned 5 pinned 8 pinned", "2e4"),
    "overhangs": Line("free 1.5 pinned 6 pinned 7 pinned 2 free", "24000"),
    "built in, hinges": Line("fixed 4 hinge 3 pinned 5 pinned 2 hinge 4 fixed", "15000"),
    "step, springs, shear flexibility": Line(
        "spring(900, 400) 3 step 5 spring(2500) 6 guided", "EI 2e4 3e4 2.5e4; GA 4e4"
    ),
    "six spans": Line("pinned 5 pinned 6 pinned 4 pinned 7 pinned 5 pinned 6 pinned", "2e4"),
    "cantilever": Line("fixed 3 free", "1e4"),
}
EACH_SPAN = {
    "udl 12 each span": "udl 12 from {0} to {1}",
    "varying 0 to 9 each span": "varying 0 to 9 from {0} to {1}",
    "curvature 1e-3 each span": "curvature 1e-3 from {0} to {1}",
    "udl -4 each span": "udl -4 from {0} to {1}",
}
"""Clauses that act on each span and overhang, and one of them written out."""
IN_EACH_SPAN = {
    "point 30 at 1.5 each span": "point 30 at 1.5 in span {0}",
    "udl 7 from 1 to 2.5 each span": "udl 7 from 1 to 2.5 in span {0}",
    "couple -8 at 1 each span": "couple -8 at 1 in span {0}",
}
"""Clauses with a place in the span: they act on spans only."""


def written_out(line: Line, clause: str) -> list[str]:
    """The clause on each span and overhang by itself."""
    if clause in EACH_SPAN:
        return [EACH_SPAN[clause].format(repr(a), repr(b)) for a, b in line.parts]
    return [IN_EACH_SPAN[clause].format(n) for n in range(1, len(line.supports))]


def answers(line: Line, loads: str, phrases: Sequence[str], combination: str | None = None) -> list[float]:
    """What the ordinary functions answer."""
    column: Any = beam_result(line.text, loads, [[phrase] for phrase in phrases], line.stiffness, combination)
    return [row[0] for row in column]


def free(line: Line, loads: str, side: str, phrases: Sequence[str], combinations: Any = None) -> Array:
    """What `highest` or `lowest` answers."""
    ask: Any = highest if side == "highest" else lowest
    column = ask(line.text, loads, [[phrase] for phrase in phrases], combinations, line.stiffness)
    return np.array(column, dtype=float)[:, 0]


def kind(phrase: str) -> str:
    """The field that is asked for, a reaction as a shear and a reaction moment as a moment."""
    first, second, *_ = phrase.split()
    return {"reaction": "moment" if second == "moment" else "shear"}.get(first, first)


def compare(
    line: Line,
    loads: str,
    combinations: Any,
    patterns: Iterable[tuple[str, str | None]],
    rounding: Mapping[str, float] | None = None,
) -> None:
    """Assert that the extremes are those over all patterns, each given with the combination it is asked under.

    `rounding` is what is left of each kind of answer where it is nothing.
    """
    phrases = [*line.of_a_place, *line.along("max"), *line.along("min"), "total load"]
    table = np.array([answers(line, pattern, phrases, combination) for pattern, combination in patterns])
    sizes: dict[str, float] = {}
    for phrase, column in zip(phrases, table.T, strict=True):
        sizes[kind(phrase)] = max(sizes.get(kind(phrase), 0.0), float(np.abs(column).max()))
    for side, sign in SIDES.items():
        asked = line.asked(side)
        for phrase, exact in zip(asked, free(line, loads, side, asked, combinations), strict=True):
            best = sign * max(sign * table[:, phrases.index(phrase)])
            near = CLOSE * sizes[kind(phrase)] + (rounding or {}).get(kind(phrase), 0.0)
            assert abs(exact - best) <= near, (side, phrase, exact, best)


def subsets(clauses: Sequence[str]) -> Iterator[str]:
    """Every choice of the clauses, as they are written together."""
    for there in product((True, False), repeat=len(clauses)):
        yield "; ".join(["udl 0", *(clause for clause, present in zip(clauses, there, strict=True) if present)])


@pytest.mark.parametrize(
    ("name", "clause"),
    [
        *((name, clause) for name in LINES for clause in EACH_SPAN),
        *((name, clause) for name in LINES for clause in IN_EACH_SPAN if name != "cantilever"),
    ],
)
def test_every_pattern_of_a_load(name: str, clause: str) -> None:
    """A load on each span: all of its patterns, each written out and solved by itself."""
    line = LINES[name]
    compare(line, clause, None, ((pattern, None) for pattern in subsets(written_out(line, clause))))


@pytest.mark.parametrize("name", LINES)
def test_patterns_beside_what_is_always_there(name: str) -> None:
    """Each span's load, single loads that may be absent, and loads that are always there: all their patterns."""
    line = LINES[name]
    end = line.at[-1]
    always = f"udl 3; point 10 at {end / 3!r}"
    single = [f"point 25 at {end / 2.2!r}", f"udl 6 from {end / 4!r} to {end / 1.5!r}"]
    loads = "; ".join([always, "udl 5 each span", *(f"{clause} each load" for clause in single)])
    parts = [*written_out(Line(line.text, line.stiffness), "udl 12 each span"), *single]
    parts = [part.replace("udl 12", "udl 5") for part in parts]
    compare(line, loads, None, ((f"{always}; {pattern}", None) for pattern in subsets(parts)))


def test_settlements_that_may_be() -> None:
    """Imposed movements that may be absent: `each load` with a settlement and a rotation."""
    line = Line("fixed 5 pinned 6 pinned", "2e4")
    clauses = ["settle 0.01 at support 2", "settle -0.005 at support 3", "rotate 0.001 at support 1"]
    loads = "; ".join(["udl 4", *(f"{clause} each load" for clause in clauses)])
    compare(line, loads, None, ((f"udl 4; {pattern}", None) for pattern in subsets(clauses)))


# --- combinations and two factors ----------------------------------------------------------------------

COMBINATIONS = ["1.35 G + 1.5 Q + 0.9 W", "1.0 G + 1.5 Q", "1.35 G + 1.05 Q - 1.5 W", "0.9 G + 1.5 W"]


@pytest.mark.parametrize("name", ["two spans", "overhangs", "built in, hinges", "step, springs, shear flexibility"])
def test_every_combination_of_every_pattern(name: str) -> None:
    """All combinations of all patterns of two cases, a third being always there: the worst of all of them."""
    line = LINES[name]
    always = "G: udl 6; G: point 12 at 2; W: udl -3"
    loads = f"{always}; Q: udl 10 each span; Q: point 30 at 1.5 each span"
    parts = [part.replace("udl 12", "Q: udl 10") for part in written_out(line, "udl 12 each span")]
    parts += [f"Q: {part}" for part in written_out(line, "point 30 at 1.5 each span")]
    patterns = [f"{always}; Q: udl 0; {pattern.removeprefix('udl 0; ')}" for pattern in subsets(parts)]
    patterns = [pattern.replace("; udl 0", "") for pattern in patterns]
    every = ((pattern, combination) for pattern in patterns for combination in COMBINATIONS)
    compare(line, loads, [[one] for one in COMBINATIONS], every)


@pytest.mark.parametrize("name", ["two spans", "overhangs", "step, springs, shear flexibility", "cantilever"])
def test_two_factors_span_by_span(name: str) -> None:
    """A permanent load written `each span` has on each span the adverse or the favourable factor: all choices of them,
    with all patterns of the variable load."""
    line = LINES[name]
    spans = len(line.parts)
    permanent = [f"udl {{}} from {a!r} to {b!r}" for a, b in line.parts]
    variable = [f"udl 15.0 from {a!r} to {b!r}" for a, b in line.parts]

    def patterns() -> Iterator[tuple[str, None]]:
        for sizes in product((1.35 * 6, 0.9 * 6), repeat=spans):
            own = "; ".join(clause.format(repr(size)) for clause, size in zip(permanent, sizes, strict=True))
            yield from ((f"{own}; {pattern}", None) for pattern in subsets(variable))

    compare(line, "G: udl 6 each span; Q: udl 10 each span", "1.35/0.9 G + 1.5 Q", patterns())


@pytest.mark.parametrize("name", LINES)
def test_two_factors_of_a_whole_case(name: str) -> None:
    """A permanent case not written `each span` has one factor as a whole, the worse of the two; a favourable factor of
    a variable case is what its loads count where they help."""
    line = LINES[name]
    always = "G: udl 6; G: point 12 at 2"
    two = ((f"{always}; Q: udl 9", f"{factor} G + 1.5 Q") for factor in (1.35, 1.0))
    compare(line, f"{always}; Q: udl 9", "1.35/1.0 G + 1.5 Q", two)
    parts = [f"udl {{}} from {a!r} to {b!r}" for a, b in line.parts]
    helped = (
        "; ".join(part.format(repr(12 * factor)) for part, factor in zip(parts, one, strict=True))
        for one in product((1.5, 0.3), repeat=len(parts))
    )
    compare(line, "Q: udl 12 each span", "1.5/0.3 Q", ((pattern, None) for pattern in helped))


def test_six_spans_with_two_factors() -> None:
    """Six spans, permanent load by two factors span by span and a variable load: 4096 patterns, by the cases that they
    make."""
    line = LINES["six spans"]
    cases = [f"G{n}: udl 6 in span {n}; Q{n}: udl 10 in span {n}" for n in range(1, 7)]
    phrases = [
        "reaction 1",
        "reaction 3",
        "moment at support 4",
        "moment at 13",
        "shear at support 3 left",
        "moment max",
    ]
    rows = []
    for choice in product(((1.35, 1.5), (1.35, 0.0), (1.0, 1.5), (1.0, 0.0)), repeat=6):
        combination = " + ".join(f"{g} G{n} + {q} Q{n}" for n, (g, q) in enumerate(choice, 1))
        rows.append(answers(line, "; ".join(cases), phrases, combination))
    table = np.array(rows)
    loads, combination = "G: udl 6 each span; Q: udl 10 each span", "1.35/1.0 G + 1.5 Q"
    for side, sign in SIDES.items():
        asked = phrases if side == "highest" else phrases[:-1]
        best = sign * (sign * table[:, : len(asked)]).max(axis=0)
        np.testing.assert_allclose(free(line, loads, side, asked, combination), best, rtol=1e-9)


# --- any beam and any loads ------------------------------------------------------------------------------


def rounding(beam: Beam) -> dict[str, float]:
    """What is left of each field where it is nothing."""
    sheared = 1 + max(beam.ei) / min(beam.ga) / min(beam.lengths) ** 2 if beam.ga else 1
    return {field: 1e-13 * float(sheared * size) for field, size in beam.restrained.items()}


@law
@given(beams(most_lengths=6, most_loads=5, cases=False), st.data())
def test_any_loads_that_may_be_absent(beam: Beam, data: st.DataObject) -> None:
    """Loads of every kind on any beam, some always there, some only where they are adverse."""
    clauses = [beam.clause(clause) for clause in beam.clauses]
    may_be = data.draw(st.lists(st.booleans(), min_size=len(clauses), max_size=len(clauses)), label="each load")
    loads = [f"{clause} each load" if one else clause for clause, one in zip(clauses, may_be, strict=True)]
    always = "; ".join(["udl 0", *(clause for clause, one in zip(clauses, may_be, strict=True) if not one)])
    parts = [clause for clause, one in zip(clauses, may_be, strict=True) if one]
    patterns = ((f"{always}; {pattern}", None) for pattern in subsets(parts))
    compare(Line(beam.line, beam.stiffness), "; ".join(loads), None, patterns, rounding(beam))


@law
@given(beams(most_lengths=5, most_loads=2), st.sampled_from(["udl 12", "udl -4"]))
def test_any_beam_with_a_load_on_each_span(beam: Beam, clause: str) -> None:
    """A load on each span and overhang of any beam, beside combinations of others that are always there."""
    line = Line(beam.line, beam.stiffness)
    parts = [f"udl {clause.split()[1]} from {a!r} to {b!r}" for a, b in line.parts]
    case, combination = ("P: ", f"{beam.combination} + 1.5 P") if beam.combination else ("", None)
    patterns = (
        ("; ".join([beam.loads, f"{case}udl 0", *(case + part for part in there)]), combination)
        for there in (list(filter(None, one)) for one in product(*((part, "") for part in parts)))
    )
    loads = f"{beam.loads}; {case}{clause} each span"
    resisted = {kind: size + 1e-11 for kind, size in rounding(beam).items()}
    compare(line, loads, combination, patterns, resisted)


# --- laws -------------------------------------------------------------------------------------------------

MANY = "G: udl 4; G: point 9 at 2; Q: udl 10 each span; S: udl -3 each load; Q: point 20 at 1.5 each span"
ACROSS = Line("free 2 pinned 6 hinge 2 pinned 5 fixed", "2e4")
BACK = Line("fixed 5 pinned 2 hinge 6 pinned 2 free", "2e4")


def test_a_perturbed_answer_fails() -> None:
    """Comparing by a thousand millionth sees a load that is greater by a ten millionth."""
    patterns = [(pattern, None) for pattern in subsets(written_out(ACROSS, "udl 12 each span"))]
    compare(ACROSS, "udl 12 each span", None, patterns)
    with pytest.raises(AssertionError):
        compare(ACROSS, "udl 12.0000012 each span", None, patterns)


def test_the_worst_of_a_list_is_the_worst_of_its_combinations() -> None:
    """A range of combinations gives the worst answer of each by itself; blanks in it are skipped."""
    for side, choose in (("highest", np.max), ("lowest", np.min)):
        asked = ACROSS.asked(side)
        single = np.array([free(ACROSS, MANY, side, asked, one) for one in COMBINATIONS])
        together = free(ACROSS, MANY, side, asked, [COMBINATIONS[:2], [None, COMBINATIONS[2]], ["", COMBINATIONS[3]]])
        np.testing.assert_array_equal(together, choose(single, axis=0))


def test_what_is_always_there_adds_up() -> None:
    """At a place the extreme is that of the free loads and the answer of the others; two free cases add up too."""
    asked = ACROSS.of_a_place
    for side in SIDES:
        alone = [
            np.array(answers(ACROSS, "udl 4; point 9 at 2", asked)),
            free(ACROSS, "udl 10 each span", side, asked),
            free(ACROSS, "udl -3 each load", side, asked),
        ]
        together = free(ACROSS, "udl 4; point 9 at 2; udl 10 each span; udl -3 each load", side, asked)
        np.testing.assert_allclose(together, sum(alone), rtol=1e-9, atol=1e-9)


def test_loads_without_patterns_give_the_ordinary_answer() -> None:
    """Loads that are always there have one answer, the highest and the lowest; the opposite extreme is told too."""
    for side in SIDES:
        asked = [*ACROSS.of_a_place, *ACROSS.along("max"), *ACROSS.along("min"), "total load"]
        found = free(ACROSS, "G: udl 4; Q: point 9 at 2", side, asked, "1.35 G + 1.5 Q")
        ordinary = answers(ACROSS, "G: udl 4; Q: point 9 at 2", asked, "1.35 G + 1.5 Q")
        np.testing.assert_allclose(found, ordinary, rtol=1e-9, atol=1e-12)


def test_the_opposite_sign_is_the_other_side() -> None:
    """Loads upward instead of downward turn the highest into the lowest, with the other sign."""
    asked = ACROSS.of_a_place
    up = "udl -10 each span; point -9 at 2 each load"
    np.testing.assert_allclose(
        free(ACROSS, up, "lowest", asked),
        -free(ACROSS, "udl 10 each span; point 9 at 2 each load", "highest", asked),
        rtol=1e-12,
    )


def test_scale() -> None:
    """Half as large again a load, or a factor of 1.5, or both together with the stiffness: answers in proportion."""
    asked = ACROSS.asked("highest")
    one = free(ACROSS, "Q: udl 10 each span", "highest", asked)
    np.testing.assert_allclose(free(ACROSS, "Q: udl 15 each span", "highest", asked), 1.5 * one, rtol=1e-12)
    np.testing.assert_allclose(free(ACROSS, "Q: udl 10 each span", "highest", asked, "1.5 Q"), 1.5 * one, rtol=1e-12)
    stiff = Line(ACROSS.text, "3e4")
    bent = [phrase.startswith(("slope", "deflection")) for phrase in asked]
    scaled = np.where(bent, one, 1.5 * one)
    np.testing.assert_allclose(free(stiff, "udl 15 each span", "highest", asked), scaled, rtol=1e-9, atol=1e-12)


def test_mirror() -> None:
    """The beam seen from behind: reactions, moments and deflections as they were, shears and slopes turned about."""
    here = ["reaction 1", "moment at 4", "deflection at 3", "deflection at 0", "moment max in span 2", "deflection max"]
    there = [
        "reaction 3",
        "moment at 11",
        "deflection at 12",
        "deflection at 15",
        "moment max in span 1",
        "deflection max",
    ]
    for side in SIDES:
        asked = here if side == "highest" else here[:4]
        np.testing.assert_allclose(
            free(ACROSS, "udl 10 each span", side, asked),
            free(BACK, "udl 10 each span", side, there[: len(asked)]),
            rtol=1e-9,
        )
    turned = free(BACK, "udl 10 each span", "lowest", ["shear at 11 left", "slope at 11", "reaction moment 1"])
    found = free(ACROSS, "udl 10 each span", "highest", ["shear at 4", "slope at 4", "reaction moment 3"])
    np.testing.assert_allclose(found, -turned, rtol=1e-9)


# --- what governs ---------------------------------------------------------------------------------------


@pytest.mark.parametrize("name", ["two spans", "overhangs", "built in, hinges", "six spans"])
def test_what_governs_gives_the_answer(name: str) -> None:
    """The words name a combination and where the free load is; that, written out, gives the very answer."""
    line = LINES[name]
    loads = "G: udl 4; Q: udl 10 each span"
    for side in SIDES:
        asked = line.asked(side)
        exact = free(line, loads, side, asked, [[one] for one in COMBINATIONS])
        for phrase, value in zip(asked, exact, strict=True):
            said = governing(line.text, loads, phrase, [[one] for one in COMBINATIONS], line.stiffness, side)
            combination, pattern, *where = said.split("; ")
            assert combination in COMBINATIONS
            assert bool(where) == (phrase.split()[1] in ("max", "min"))
            there = re.fullmatch(r"(?:(\S+) )?Q on (.*)", pattern)
            assert there or pattern == "no Q"
            places = re.findall(r"(\S+) to (\S+?)(?:,|$)", there[2]) if there else []
            written = "; ".join(["G: udl 4", "Q: udl 0", *(f"Q: udl 10 from {a} to {b}" for a, b in places)])
            [found] = answers(line, written, [phrase], combination)
            assert found == pytest.approx(value, rel=1e-9, abs=1e-12), said
            if where:
                place = float(where[0].removeprefix("at x = "))
                field = phrase.split()[0]
                sides = ("left", "right") if 0 < place < line.at[-1] else ("left" if place else "right",)
                near = answers(line, written, [f"{field} at {place!r} {side}" for side in sides], combination)
                assert min(abs(one - value) for one in near) <= 1e-4 * abs(value) + 1e-9, said


def test_what_governs_in_words() -> None:
    """The combination, the factor and the spans of the free load, and of a case with two factors which counts."""
    line, loads = "pinned 6 pinned 6 pinned", "G: udl 4; Q: udl 10 each span"
    said = governing(line, loads, "reaction 1", [["1.35 G"], ["1.35/1.0 G + 1.5 Q"]])
    assert said == "1.35/1.0 G + 1.5 Q; 1.35 G; 1.5 Q on 0 to 6"
    said = governing(line, loads, "reaction 1", "1.35/1.0 G + 1.5 Q", None, "lowest")
    assert said == "1.35/1.0 G + 1.5 Q; 1 G; 1.5 Q on 6 to 12"
    assert governing(line, loads, "reaction 1", None, None, "Lowest ").startswith("every load once; ")
    assert governing(line, "udl 3 each span", "reaction 2", None, None, "lowest").endswith("no free load")


# --- tables -----------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("line", "loads", "combinations"),
    [
        (ACROSS, MANY, [[one] for one in COMBINATIONS]),
        (LINES["step, springs, shear flexibility"], "udl 4; udl 10 each span", None),
        (LINES["two spans"], "G: udl 4 each span; Q: axles 80 40 spaced 2 both ways", "1.35/1.0 G + 1.5 Q"),
        (LINES["cantilever"], "point 9 at 2; axles 10 lane udl 3", None),
    ],
)
def test_the_envelope_is_the_highest_and_the_lowest_place_by_place(line: Line, loads: str, combinations: Any) -> None:
    """Each row holds what `highest` and `lowest` answer at its place, of two rows at a jump the first on its left."""
    rows = np.array(envelope(line.text, loads, combinations, 13, line.stiffness), dtype=float)
    places = rows[:, 0]
    for even in np.linspace(0.0, line.at[-1], 13):
        assert np.abs(places - even).min() <= 1e-9
    for mark in line.at:
        assert np.abs(places - mark).min() <= 1e-9
    twice = np.append(np.diff(places) == 0.0, False)
    sides = ["left" if first or place == line.at[-1] else "right" for first, place in zip(twice, places, strict=True)]
    columns = [(field, side) for field in ("shear", "moment", "deflection") for side in SIDES]
    for column, (field, side) in zip(rows.T[1:], columns, strict=True):
        asked = [f"{field} at {place!r} {one}" for place, one in zip(places.tolist(), sides, strict=True)]
        found = free(line, loads, side, asked, combinations)
        np.testing.assert_allclose(column, found, rtol=1e-9, atol=1e-9 * np.abs(column).max(), err_msg=field)
    assert (rows[:, 1::2] >= rows[:, 2::2]).all()


def test_the_envelope_of_one_combination_is_its_diagram() -> None:
    """Without anything free, highest and lowest are the ordinary diagram; no stiffness, no deflections."""
    line, loads = "pinned 5 pinned 8 pinned", "G: udl 4; Q: point 9 at 2; Q: couple 3 at 9"
    rows = np.array(envelope(line, loads, "1.35 G + 1.5 Q", 9, 2e4), dtype=float)
    ordinary = np.array(diagram(line, loads, 9, 2e4, "1.35 G + 1.5 Q"), dtype=float)
    for columns in ([0, 1, 3, 5], [0, 2, 4, 6]):
        np.testing.assert_allclose(rows[:, columns], ordinary[:, [0, 1, 2, 4]], rtol=1e-9, atol=1e-9)
    for row in envelope(line, loads, "1.35 G + 1.5 Q", 3):
        assert [getattr(entry, "value", None) for entry in row[5:]] == ["#VALUE!", "#VALUE!"]
        assert all(type(entry) is float for entry in row[:5])


def test_reactions_case_by_case() -> None:
    """A column for each case by itself, unfactored; a free case has two, its highest and its lowest."""
    line, stiffness = "fixed 5 pinned 6 spring(900, 300) 2 free", 2e4
    cases = {"G": "udl 4; G: couple 5 at 3", "W": "point -6 at 13", "T": "curvature 1e-3; T: settle 0.01 at support 2"}
    fixed = "; ".join(f"{case}: {clauses}" for case, clauses in cases.items())
    loads = f"{fixed}; Q: udl 10 each span; M: axles 50 30 spaced 2"
    header, *rows = reaction_cases(line, loads, stiffness)
    columns = ["G", "W", "T", "Q highest", "Q lowest", "M highest", "M lowest"]
    assert header == ["support", "x", "result", *columns]
    assert [row[:3] for row in rows] == [
        *([float(n), x, "reaction"] for n, x in ((1, 0.0), (2, 5.0), (3, 11.0))),
        *([float(n), x, "reaction moment"] for n, x in ((1, 0.0), (3, 11.0))),
    ]
    table = np.array([row[3:] for row in rows], dtype=float)
    for column, case in enumerate(cases):
        ordinary = np.array(reactions(line, fixed, stiffness, f"1.0 {case}"), dtype=float)
        expected = [*ordinary[:, 2], ordinary[0, 3], ordinary[2, 3]]
        np.testing.assert_allclose(table[:, column], expected, rtol=1e-9, atol=1e-9)
    asked = [["reaction 1"], ["reaction 2"], ["reaction 3"], ["reaction moment 1"], ["reaction moment 3"]]
    for column, (case, ask) in enumerate(product(("udl 10 each span", "axles 50 30 spaced 2"), (highest, lowest)), 3):
        expected = np.array(ask(line, case, asked, None, stiffness), dtype=float)[:, 0]
        np.testing.assert_allclose(table[:, column], expected, rtol=1e-9, atol=1e-9)


def test_reactions_of_loads_without_a_case() -> None:
    """Loads without a case stand together in one column of their own."""
    header, *rows = reaction_cases("pinned 6 roller", "udl 4; point 6 at 3; Q: udl 2")
    assert header == ["support", "x", "result", "loads", "Q"]
    assert rows == [[1.0, 0.0, "reaction", 15.0, 6.0], [2.0, 6.0, "reaction", 15.0, 6.0]]


def test_a_lane_with_two_factors_may_be_absent() -> None:
    """Its train may be off the beam: a favourable factor forces no lane load onto stretches where it relieves."""
    call = "pinned 6 pinned 6 pinned", "T: axles 10 lane udl 9", "moment at 3"
    assert highest(*call, "1.5/1.0 T") == pytest.approx(highest(*call, "1.5 T"), rel=1e-12)


def test_a_place_in_each_span_needs_a_span() -> None:
    """A cantilever has none: the load would be nowhere without a word."""
    with pytest.raises(BeamError, match="this beam has none") as caught:
        highest("fixed 4 free", "point 4 at 3 each span", "reaction 1")
    assert caught.value.value == "#N/A"
