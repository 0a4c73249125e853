"""The functions answer as a cell would ask: shapes, sides, spans, sentences, units, caches."""

from __future__ import annotations

import math

import numpy as np
import pytest

from beamfuncs import functions as f
from beamfuncs import solving
from beamfuncs.errors import BeamError, ErrorValue

PROPPED, UDL = "fixed 8 pinned", "udl 12"


def test_the_signs_are_those_of_the_trade() -> None:
    """A cantilever held at its left end under a load down, and under a clockwise couple, gives every sign once."""
    beam, EI = "fixed 2 free", 1000
    down, clockwise = "point 3 at 2", "couple 5 at 2"
    assert f.reaction(beam, down, 1) == 3.0
    assert f.reaction_moment(beam, down, 1) == -6.0
    assert f.shear_at(beam, down, 1) == 3.0
    assert f.moment_at(beam, down, 0) == -6.0
    assert f.deflection_at(beam, down, 2, EI) == pytest.approx(3 * 2**3 / (3 * EI), rel=1e-14)
    assert f.slope_at(beam, down, 2, EI) == pytest.approx(3 * 2**2 / (2 * EI), rel=1e-14)
    assert f.reaction_moment(beam, clockwise, 1) == -5.0
    assert f.moment_at(beam, clockwise, 1) == -5.0
    assert f.slope_at(beam, clockwise, 2, EI) == pytest.approx(5 * 2 / EI, rel=1e-14)
    assert f.deflection_at(beam, "curvature 0.001", 2, EI) == pytest.approx(-0.001 * 2**2 / 2, rel=1e-14)


def test_a_range_gives_an_array_of_its_shape() -> None:
    """x and phrases may be ranges, of any shape, of rows or of numpy."""
    column = f.moment_at(PROPPED, UDL, [[0], [5], [8]])
    assert column == [[-96.0], [54.0], [0.0]]
    assert f.moment_at(PROPPED, UDL, [[0, 5], [8, 5]]) == [[-96.0, 54.0], [0.0, 54.0]]
    assert f.moment_at(PROPPED, UDL, np.array([[0.0], [5.0]])) == [[-96.0], [54.0]]
    assert f.moment_at(PROPPED, UDL, np.float64(5)) == 54.0
    assert f.moment_at(PROPPED, UDL, [[5]]) == [[54.0]]
    assert f.beam_result(PROPPED, UDL, [["reaction 1", "moment max"]]) == [[60.0, 54.0]]


def test_both_sides_of_a_jump_are_reached() -> None:
    """Left and right of a load, a support, a couple and a hinge; right by default, at the far end left."""
    ask = lambda beam, loads, phrase, EI=None: f.beam_result(beam, loads, phrase, EI)  # noqa: E731
    assert ask("pinned 4 roller", "point 6 at 1", "shear at 1 left") == 4.5
    assert ask("pinned 4 roller", "point 6 at 1", "shear at 1 right") == -1.5
    assert ask("pinned 4 roller", "point 6 at 1", "shear at 1") == -1.5
    assert ask("pinned 4 roller", "point 6 at 1", "shear at 4") == -1.5
    assert ask("pinned 4 roller", "couple 6 at 1", "moment at 1 left") == -1.5
    assert ask("pinned 4 roller", "couple 6 at 1", "moment at 1") == 4.5
    assert ask("pinned 4 roller 2 free", "point 6 at 6", "shear at support 2 left") == -3.0
    assert ask("pinned 4 roller 2 free", "point 6 at 6", "shear at support 2") == 6.0
    left, right = (ask("fixed 3 hinge 3 roller", "udl 2", f"slope at 3 {side}", 100) for side in ("left", "right"))
    assert left > 0 > right


def test_spans_and_overhangs() -> None:
    """A span lies between two supports; an overhang belongs to none and is addressed by x."""
    beam, loads = "free 1 pinned 6 pinned 1 free", "udl 10"
    assert f.moment_max(beam, loads, 1) == 40.0
    assert f.moment_min(beam, loads) == -5.0
    assert f.beam_result(beam, loads, "moment at 0 in span 1") == -5.0
    assert f.beam_result(beam, loads, "moment at 3 in span 1") == 40.0
    two_spans = "pinned 4 pinned 4 pinned"
    assert f.beam_result(two_spans, "udl 5", "shear at 4 in span 1") == -12.5
    assert f.beam_result(two_spans, "udl 5", "shear at 0 in span 2") == 12.5
    assert f.beam_result(two_spans, "udl 5", "shear at 4") == 12.5
    assert f.beam_result(two_spans, "udl 5", "shear at 4 in span 1 right") == 12.5
    with pytest.raises(BeamError) as caught:
        f.moment_max("fixed 3 free", loads, 1)
    assert caught.value.value == "#N/A"


def test_positions_are_the_smallest_x_of_the_extreme() -> None:
    """Where an extreme occurs more than once, or all along a stretch, its first place is given."""
    ask = f.beam_result
    assert ask("fixed 6 fixed", "udl 2", "position of moment min") == 0.0
    assert ask("pinned 9 roller", "point 4 at 3; point 4 at 6", "position of moment max") == 3.0
    unloaded = "udl 0 in span 1; udl 2.2 in span 2"
    assert ask("guided 0.5 roller 3.3 fixed", unloaded, "position of shear max in span 1") == 0.0
    assert ask("pinned 6 pinned 6 pinned", "udl 1", "position of moment min") == 6.0
    assert ask("pinned 6 pinned 6 pinned", "udl 1", "position of moment max in span 2") == pytest.approx(6 + 3.75)


def test_a_diagram_has_both_sides_of_every_jump_and_all_breaks() -> None:
    """Rows run from left to right; marks and load ends are added to the even places."""
    rows = f.diagram("pinned 4 hinge 4 fixed", "point 6 at 1; udl 2 from 3 to 5", 3, 1000)
    assert [row[0] for row in rows] == [0.0, 1.0, 1.0, 3.0, 4.0, 4.0, 5.0, 8.0]
    assert rows[1][1] - rows[2][1] == pytest.approx(6.0)
    assert all(len(row) == 5 and all(type(value) is float for value in row) for row in rows)
    assert len(f.diagram("pinned 4 roller", "udl 1", None, 1)) == f.POINTS


def test_a_diagram_without_stiffness_keeps_shear_and_moment() -> None:
    """Slopes and deflections are errors in their entries; the forces stand."""
    for row in f.diagram("pinned 4 roller", "udl 1", 5):
        assert all(type(value) is float for value in row[:3])
        assert all(isinstance(value, BeamError) and "stiffness" in value.reason for value in row[3:])


def test_contraflexure_is_a_row_or_an_error() -> None:
    """The places where the moment changes sign; a beam that only sags has none."""
    [[first, second]] = f.contraflexure("fixed 6 fixed", "udl 1")
    assert (first, second) == pytest.approx((3 - math.sqrt(3), 3 + math.sqrt(3)))
    with pytest.raises(BeamError) as caught:
        f.contraflexure("pinned 6 roller", "udl 1")
    assert caught.value.value == "#N/A"


def test_cases_are_combined() -> None:
    """A case that is not named counts 0; a named case without loads is fine; blank takes every load once."""
    beam, loads = "pinned 8 roller", "G: udl 5; Q: udl 3; G: point 8 at 4"
    ask = lambda combination: f.reaction(beam, loads, 1, None, combination)  # noqa: E731
    assert ask(None) == 36.0
    assert ask("G") == 24.0
    assert ask("q") == 12.0
    assert ask("1.5 G - 0.5 Q + 9 W") == 30.0
    assert ask("W") == 0.0
    assert f.beam_result(beam, loads, "total load", None, "G") == 48.0


def test_stiffness_is_not_needed_where_the_result_does_not_depend_on_it() -> None:
    """Statically determinate forces never need it; those of a uniform continuous beam need none either."""
    assert f.reaction("spring(100) 4 pinned", "point 8 at 1", 1) == 6.0
    assert f.reaction("spring(1e-12) 4 spring(1e-12)", "point 8 at 1", 1) == 6.0
    assert f.reaction("fixed 8 pinned", "udl 12; settle 0 at support 2", 1) == 60.0
    assert f.moment_max("pinned 3 step 5 roller", "settle 0.01 at support 2") == 0.0
    assert f.moment_min("pinned 5 pinned 5 pinned", "udl 8") == pytest.approx(-25.0, rel=1e-14)
    assert f.reaction("fixed 8 pinned", "G: udl 12; S: settle 1 at support 2", 1, None, "G") == 60.0


def test_an_unloaded_beam_is_udl_0() -> None:
    """Zero loads give zeros, not noise and not minus zero."""
    rows = f.reactions("fixed 3 pinned 4 spring(50) 2 free", "udl 0", 100)
    assert [str(value) for row in rows for value in row[2:]] == ["0.0"] * 6
    assert str(f.moment_max("fixed 3 pinned", "udl 0")) == "0.0"


def test_zero_ends_are_zero() -> None:
    """Moments at free and pinned ends, and deflections at supports, are zero and no rounding of it."""
    beam, loads = (
        "pinned 3.1 pinned 4.7 pinned 1.3 free",
        "udl 12.3; point 7.7 at 1.9; varying 1.1 to 3.3 from 2 to 6.6",
    )
    assert f.moment_at(beam, loads, 0, 1e4) == 0.0
    assert f.moment_at(beam, loads, 9.1, 1e4) == 0.0
    assert f.shear_at(beam, loads, 9.1, 1e4) == 0.0
    assert [f.deflection_at(beam, loads, x, 1e4) for x in (0, 3.1, 3.1 + 4.7)] == [0.0, 0.0, 0.0]


def test_a_place_that_is_a_sum_of_lengths_is_the_mark() -> None:
    """0.1 + 0.2 is not 0.3 in binary; a place within rounding of a mark is that mark."""
    beam = "pinned 0.1 pinned 0.2 pinned 0.1 free"
    assert f.reaction(beam, "point 5 at 0.3", 3) == 5.0
    assert f.moment_min(beam, "point 5 at 0.3") == 0.0
    assert f.beam_result(beam, "point 5 at 0.4", "shear at 0.3 right") == pytest.approx(5.0)
    assert f.moment_at(beam, "point 5 at 0.4", 0.4) == 0.0


def test_springs_settle_with_their_base() -> None:
    """A support's settlement moves the base of its spring."""
    assert f.deflection_at("spring(200) 4 roller", "settle 0.01 at support 1", 0, 1e4) == pytest.approx(0.01)
    assert f.reaction("fixed 4 spring(3)", "settle 1 at support 2", 2, 64) == pytest.approx(-1.5)


def test_fault_gives_the_reason_or_blank_text() -> None:
    """`fault` is blank text where all is well, else the reason; it raises nothing, not even for an error value."""
    assert f.fault(PROPPED, UDL) == ""
    assert f.fault(PROPPED, UDL, 24000, None) == ""
    assert f.fault("pinned 8 free", UDL).startswith("beam: a mechanism")
    assert f.fault(PROPPED, None).startswith("loads: blank")
    assert f.fault(ErrorValue("#REF!"), UDL) == "beam: is the error value #REF! itself; mend that cell"
    assert f.fault(PROPPED, "settle 0.01 at support 1").startswith("stiffness: blank")
    assert f.fault(PROPPED, UDL, None, "1,35 G").startswith("combination: '1,35'")


def test_sentences_say_what_was_understood() -> None:
    """The sentences name every mark, span, stiffness and load, with places from the left end."""
    assert f.beam_reads("free 1 pin 6 spring(50, 8) 2 hinge 3 fix", "EI 2 3 4 5; GA 9") == (
        "Beam of length 12: free at 0, pinned at 1 (support 1), spring kv = 50, kr = 8 at 7 (support 2), hinge at 9,"
        " fixed at 12 (support 3); spans 6 and 5; EI = 2, 3, 4 and 5, GA = 9; statically indeterminate to degree 2."
    )
    assert "a mechanism" in f.beam_reads("pinned 3 free")
    assert "no span between supports" in f.beam_reads("fixed 3 free")
    assert f.loads_read(
        "fixed 4 pinned 4 fixed",
        "G: varying 1 to 3 in span 2; couple -2 at 1; settle 0.01 at support 2; rotate 0.1 at support 1; curvature 0.2",
    ) == (
        "5 loads: G: distributed 1 to 3 from x = 4 to 8; clockwise couple -2 at x = 1; support 2 sinks by 0.01;"
        " support 1 turns clockwise by 0.1; free curvature 0.2 (sagging positive) from x = 0 to 8;"
        " in all 8 downward, before any factors."
    )


@pytest.mark.parametrize(
    ("source", "target", "factor"),
    [
        ("kN m", "N mm", 1e6),
        ("kNm2", "N mm2", 1e9),
        ("kNm²", "kN·m^2", 1.0),
        ("N/mm²", "MPa", 1.0),
        ("GPa cm4", "kNm2", 0.01),
        ("1/m", "1/mm", 1e-3),
        ("m-1", "1/mm", 1e-3),
        ("kN.m", "kN-m", 1.0),
        ("kip", "lbf", 1000.0),
        ("k", "kip", 1.0),
        ("kip ft", "kipin", 12.0),
        ("klf", "plf", 1000.0),
        ("ksf", "psf", 1000.0),
        # The international inch and pound (1959) and standard gravity (CGPM 1901) are exact by definition.
        ("ft", "m", 0.3048),
        ("lbf", "N", 0.45359237 * 9.80665),
        ("psf", "Pa", 0.45359237 * 9.80665 / 0.3048**2),
    ],
)
def test_unit_factors(source: str, target: str, factor: float) -> None:
    """Compound units in the spellings of the trade, by their definitions."""
    assert f.unit_factor(source, target) == pytest.approx(factor, rel=1e-14)
    assert f.unit_factor(target, source) == pytest.approx(1 / factor, rel=1e-14)


def test_a_beam_is_solved_once_however_many_cells_ask(monkeypatch: pytest.MonkeyPatch) -> None:
    """Another place, phrase or combination of the same beam and loads starts from the solved columns."""
    solved = []
    monkeypatch.setattr(solving, "solve", lambda *data, solve=solving.solve: solved.append(1) or solve(*data))
    beam, loads = "fixed 7.25 pinned 3.5 roller", "G: udl 5.125; Q: point 3 at 2"
    for x in range(5):
        f.moment_at(beam, loads, x, 24000, "1.35 G + 1.5 Q")
    f.deflection_max(beam, loads, None, 24000, "G + Q")
    f.reactions([["fixed", 7.25, "pinned", 3.5, "roller"]], loads, 24000.0)
    assert len(solved) == 1


def test_the_caches_are_bounded() -> None:
    """A sweep over many beams cannot fill the memory."""
    for cached in (solving.combined, solving.columns):
        assert cached.cache_info().maxsize == solving.KEPT
