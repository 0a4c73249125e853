"""Solving for an unknown: spans, loads, places and stiffnesses from the result that they are to give."""

from __future__ import annotations

import math

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from beamfuncs.errors import BeamError
from beamfuncs.functions import beam_result, solve_for


def closed_forms() -> list[tuple[str, float, tuple[object, ...]]]:
    """Calls and their answers by the formulas of the textbooks: M = q L²/8, w = 5 q L⁴/(384 EI), and so on."""
    q, P, M = 12.0, 40.0, 150.0
    return [
        ("span for a moment", math.sqrt(8 * M / q), ("pinned ? roller", "udl 12", "moment max", M)),
        ("span of a cantilever", math.sqrt(2 * M / q), ("fixed ? free", "udl 12", "moment min", -M)),
        ("built-in moment", math.sqrt(8 * M / q), ("fixed ? pinned", "udl 12", "reaction moment 1", -M)),
        ("load for a moment", 8 * M / 36, ("pinned 6 roller", "udl ?", "moment max", M)),
        ("load upward", -10.0, ("pinned 6 roller", "point ? at 3", "reaction 1", -5.0, None, None, -100.0, 100.0)),
        ("place for a reaction", 1.5, ("pinned 6 roller", "point 40 at ?", "reaction 1", P * 4.5 / 6)),
        (
            "EI for L/300",
            5 * q * 6**3 * 300 / 384,
            ("pinned 6 roller", "udl 12", "deflection max over length", 1 / 300, "?"),
        ),
        (
            "EI for a deflection",
            5 * q * 6**4 / 384 / 0.02,
            ("pinned 6 roller", "udl 12", "deflection max", 0.02, "EI ?; GA 1e30"),
        ),
        # Two spans on a middle spring: R = (5/4) q L / (1 + 6 EI / (k L^3)).
        (
            "spring for a reaction share",
            6 * 20000 / 4**3 / (1.25 / 1.0 - 1.0),
            ("pinned 4 spring(?) 4 pinned", "udl 12", "reaction 2", q * 4, 20000.0),
        ),
    ]


@pytest.mark.parametrize(
    ("answer", "arguments"), [(a, c) for _, a, c in closed_forms()], ids=[n for n, _, _ in closed_forms()]
)
def test_the_unknown_is_that_of_the_closed_form(answer: float, arguments: tuple[object, ...]) -> None:
    """To ten digits; an answer off by a millionth would not pass."""
    found = solve_for(*arguments)  # type: ignore[arg-type]
    assert found == pytest.approx(answer, rel=1e-10)
    assert found * (1 + 1e-6) != pytest.approx(answer, rel=1e-10)


def test_of_several_answers_the_smallest_or_the_largest() -> None:
    """A moving force gives the same moment under it on either side of midspan: M = P x (L - x) / L."""
    call = "pinned 6 roller", "point 40 at ?", "moment max", 50.0, None, None, 0.1, 5.9
    x = 3 - math.sqrt(9 - 50 * 6 / 40)
    assert solve_for(*call) == pytest.approx(x, rel=1e-10)
    assert solve_for(*call, "smallest") == solve_for(*call)
    assert solve_for(*call, "LARGEST") == pytest.approx(6 - x, rel=1e-10)


def test_answers_between_two_trials_are_found() -> None:
    """Just below the largest moment there is, both answers lie closer together than two trials of a wide scan."""
    near = 60.0 * (1 - 1e-6)
    x = 3 - math.sqrt(9 - near * 6 / 40)
    assert 6 - 2 * x < 0.02
    assert solve_for("pinned 6 roller", "point 40 at ?", "moment max", near) == pytest.approx(x, rel=1e-9)
    assert solve_for("pinned 6 roller", "point 40 at ?", "moment max", near, None, None, None, None, "largest") == (
        pytest.approx(6 - x, rel=1e-9)
    )


@pytest.mark.parametrize(
    ("arguments", "value", "words"),
    [
        (("pinned 6 roller", "point 40 at ?", "moment max", 61.0, None, None, 1.0, 5.0), "#N/A", "33.3333 and 33.3333"),
        (("pinned ? roller", "udl 12", "moment max", -1.0), "#N/A", "no number from 0.001"),
        (("pinned 6 roller", "udl 12", "moment max", 54.0), "#VALUE!", "0 question marks"),
        (("pinned ? roller", "udl ?", "moment max", 54.0), "#VALUE!", "2 question marks"),
        (("pinned ? roller", "udl 12", "moment max", 54.0, None, None, 9.0, 3.0), "#NUM!", "9 to 3 is no range"),
        (
            ("pinned ? roller", "udl 12", "moment max", 54.0, None, None, None, None, "next"),
            "#VALUE!",
            "smallest or largest",
        ),
        (("pinned ? roller", "udl 12", "moment max", "much"), "#VALUE!", "target"),
        (("pinned ? roler", "udl 12", "moment max", 54.0), "#N/A", "roler"),
        # A shear jumps over the target at a point load and is nowhere equal to it.
        (("pinned 6 roller", "point 40 at ?", "shear at 3 left", 0.0, None, None, 0.5, 5.5), "#N/A", "no number"),
    ],
)
def test_what_has_no_answer_says_why(arguments: tuple[object, ...], value: str, words: str) -> None:
    """One line: the range, and the results at its ends."""
    with pytest.raises(BeamError) as caught:
        solve_for(*arguments)  # type: ignore[arg-type]
    assert (caught.value.value, words in caught.value.reason) == (value, True), caught.value.reason


@settings(max_examples=40, deadline=None)
@given(span=st.floats(1.5, 12.0), load=st.floats(0.5, 60.0), EI=st.floats(2e3, 2e5))
def test_the_answer_gives_the_target_back(span: float, load: float, EI: float) -> None:
    """What the result is at a number is what the number is found by."""
    beam, loads = f"fixed {span!r} pinned 1 roller", f"udl {load!r}"
    deflection = beam_result(beam, loads, "deflection max in span 1", EI)
    assert solve_for(beam, loads, "deflection max in span 1", deflection, "?") == pytest.approx(EI, rel=1e-9)
    moment = beam_result(beam, loads, "moment min")
    found = solve_for(beam, "udl ?", "moment min", moment)
    assert found == pytest.approx(load, rel=1e-9)


def test_a_question_mark_may_stand_in_a_range() -> None:
    """As a length of a beam, a size in a load table, one of several stiffnesses."""
    assert solve_for([["pinned", "?", "roller"]], "udl 12", "moment max", 96.0) == pytest.approx(8.0, rel=1e-12)
    table = [["load", "size", "at"], ["point", "?", 3.0]]
    assert solve_for("pinned 6 roller", table, "moment max", 60.0) == pytest.approx(40.0, rel=1e-12)
