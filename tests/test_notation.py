"""The notation is read as written, in text, in ranges and in tables, and written back in canonical form."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from beamfuncs import functions as f
from beamfuncs.cells import as_text, frozen, number
from beamfuncs.errors import BeamError
from beamfuncs.notation import (
    beam_text,
    clause_text,
    read_beam,
    read_clauses,
    read_combination,
    read_combinations,
    read_line,
    read_loads,
)


@pytest.mark.parametrize(
    ("written", "canonical"),
    [
        ("fixed 8 pinned", "fixed 8 pinned"),
        ("FIX 8.0 Pin", "fixed 8 pinned"),
        ("fixed\n8\tpinned", "fixed 8 pinned"),
        ("fixed\u00a08\u00a0pinned", "fixed 8 pinned"),
        ("pinned 3 step 5 spring(2500) 6 fixed", "pinned 3 step 5 spring(2500) 6 fixed"),
        ("pinned 3 Spring ( 2500,  1e4 ) 6 guided", "pinned 3 spring(2500, 10000) 6 guided"),
        ("pinned 3 spring(2500; 800) 6 guided", "pinned 3 spring(2500, 800) 6 guided"),
        ("pinned .5 roller", "pinned 0.5 roller"),
        ("pinned +5. roller", "pinned 5 roller"),
        ("pinned 5e-1 roller", "pinned 0.5 roller"),
    ],
)
def test_a_line_is_read_whatever_its_case_and_blanks(written: str, canonical: str) -> None:
    """Marks are read in any case, with their aliases; blanks of any kind part the words."""
    assert beam_text(read_line(written)) == canonical


@pytest.mark.parametrize(
    "cells",
    [
        [["fixed", 8, "pinned", 2, "free"]],
        [["fixed"], [8], ["pinned"], [2], ["free"]],
        [["fixed", None, 8], ["", "pinned", None], [2.0, "FREE", ""]],
        ["fixed", 8, "pin", 2, "free"],
        ("fixed", "8", "pinned", "2", "free"),
        np.array([["fixed", 8, "pinned"], [2, "free", None]], dtype=object),
    ],
)
def test_a_range_in_reading_order_is_the_same_line(cells: object) -> None:
    """A range of one mark or length a cell, blanks skipped, is the beam of its text."""
    assert read_line(frozen("beam", cells)) == read_line("fixed 8 pinned 2 free")


def test_a_one_cell_range_is_a_text() -> None:
    """A range of one cell is read as the text in it."""
    assert f.reaction([["fixed 8 pinned"]], [["udl 12"]], [[1]]) == 60.0


@pytest.mark.parametrize(
    ("written", "canonical"),
    [
        ("udl 12", "udl 12"),
        ("Uniform 12 FROM 2 TO 6", "udl 12 from 2 to 6"),
        ("G: udl 5; Q: udl 12 in span 2", "G: udl 5; Q: udl 12 in span 2"),
        ("g:udl 5\nG : point 3 at 1", "g: udl 5; g: point 3 at 1"),
        ("varying 0 to 12 from 2 to 6", "varying 0 to 12 from 2 to 6"),
        ("varying 0 to 12 in span 1", "varying 0 to 12 in span 1"),
        ("point -40 at 1.5 in span 2;", "point -40 at 1.5 in span 2"),
        ("point 40 at support 2", "point 40 at support 2"),
        ("couple 15 at 4", "couple 15 at 4"),
        ("settle 0.01 at support 2; rotate 0.001 at support 1", "settle 0.01 at support 2; rotate 0.001 at support 1"),
        ("curvature 1e-4 from 0 to 8", "curvature 0.0001 from 0 to 8"),
        ("udl 1 from 1 to 2 in span 1", "udl 1 from 1 to 2 in span 1"),
        ("Wind_2: udl 3", "Wind_2: udl 3"),
        ("Q: UDL 12 Each  SPAN; point 3 at 1 each load", "Q: udl 12 each span; point 3 at 1 each load"),
        ("udl 12 each load in span 2", "udl 12 in span 2 each load"),
        ("varying 0 to 3 each span from 1 to 2", "varying 0 to 3 from 1 to 2 each span"),
        ("settle 0.01 at support 2 each load", "settle 0.01 at support 2 each load"),
        ("axles 80.0", "axles 80"),
        ("lm: AXLES 80 80 40 SPACED 1.20 3.2 Both Ways", "lm: axles 80 80 40 spaced 1.2 3.2 both ways"),
        ("axles 80 lane udl 9.0 both ways", "axles 80 both ways lane udl 9"),
        ("axles -5 3 spaced 1e-3", "axles -5 3 spaced 0.001"),
    ],
)
def test_clauses_are_read_and_written_back(written: str, canonical: str) -> None:
    """Clauses stand between semicolons or line breaks, each with its case, kind, size and place."""
    assert "; ".join(clause_text(clause) for clause in read_clauses(written)) == canonical
    assert f.load_line(written) == canonical
    assert f.load_line(canonical) == canonical


def test_each_span_makes_a_part_of_every_span_and_overhang() -> None:
    """A load without a place is one on each span and overhang; with a place it is one in each span, counted from its
    left support; `each load` is one part as a whole, and what is always there is no part."""
    beam = read_line("free 1 pinned 2 hinge 4 roller 3 step 2 fixed")
    loads = read_loads("udl 5; udl 3 each span; point 2 at 1 each span; udl 1 each load", beam).loads
    assert [load.part for load in loads] == [0, 1, 2, 3, 4, 5, 6]
    assert [(load.start, load.end) for load in loads[1:4]] == [(0.0, 1.0), (1.0, 7.0), (7.0, 12.0)]
    assert [load.x for load in loads[4:6]] == [2.0, 8.0]
    assert (loads[6].start, loads[6].end) == (0.0, 12.0)


def test_each_stands_in_a_table_too() -> None:
    """The header `each` holds span or load; a blank is a load that is always there."""
    beam = read_line("pinned 5 pinned 8 pinned")
    table = [["load", "Each", "size", "at"], ["udl", " Span", 5, None], ["point", "load", 3, 2], ["udl", None, 1, None]]
    assert read_loads(frozen("loads", table), beam) == read_loads(
        "udl 5 each span; point 3 at 2 each load; udl 1", beam
    )
    assert f.load_line(table) == "udl 5 each span; point 3 at 2 each load; udl 1"


@pytest.mark.parametrize(
    ("written", "offsets"),
    [
        ("axles 80", ((0.0,),)),
        ("axles 80 both ways", ((0.0,),)),
        ("axles 80 40 20 spaced 1.5 3", ((0.0, 1.5, 4.5),)),
        ("axles 80 40 20 spaced 1.5 3 both ways", ((0.0, 1.5, 4.5), (0.0, -1.5, -4.5))),
    ],
)
def test_a_train_stands_to_the_right_of_its_first_axle(written: str, offsets: tuple[tuple[float, ...], ...]) -> None:
    """Axles are written from the first at the left; both ways it may stand the other way about as well."""
    [train] = read_loads(written, read_line("pinned 8 roller")).trains
    assert train.offsets == offsets
    assert train.lane == 0.0


def test_what_is_understood_of_free_loads_and_trains_is_said() -> None:
    """The sentence tells of loads that act where they are adverse, and of the axles, their way and their lane."""
    said = f.loads_read("pinned 8 pinned 2 free", "udl 12 each span; Q: axles 80 40 spaced 1.2 both ways lane udl 9")
    assert "12 from x = 0 to 8 where adverse" in said
    assert "12 from x = 8 to 10 where adverse" in said
    assert "Q: moving axles 80 and 40 spaced 1.2, going both ways, with 9" in said


TEXT = "G: udl 5; Q: varying 0 to 12 from 2 to 6; Q: point 40 at 1.5 in span 1; W: settle 0.01 at support 2"
TABLE = [
    [None, None, None, None, None, None, None, None, None],
    ["At", "case", "LOAD", "size", "end  size", "from", "to", "support", "span"],
    [None, "G", "udl", 5, None, None, None, None, None],
    [None, "Q", "varying", 0, 12, 2, "6", None, None],
    [None] * 9,
    [1.5, "q", "point", 40, None, None, None, None, 1],
    ["", "W", "Settle", 0.01, "", "", "", 2, ""],
]


def test_a_table_and_a_range_of_texts_are_the_same_loads() -> None:
    """Headers stand in any order and case; blank rows are skipped; cases are one in any case."""
    beam = read_line("fixed 8 pinned")
    text = read_loads(TEXT, beam)
    assert read_loads(frozen("loads", TABLE), beam) == text
    assert read_loads(frozen("loads", [[part] for part in TEXT.split(";")]), beam) == text
    assert read_loads(frozen("loads", [[TEXT, None], [None, None]]), beam) == text
    assert f.load_line(TABLE) == f.load_line(TEXT)


def test_equal_text_makes_equal_values_of_one_hash() -> None:
    """Beams and loads are values: what was solved once is found again."""
    one, other = (read_beam.__wrapped__(text, 24000.0) for text in ("fixed 8 pinned", "fix 8.0 pin"))
    assert one == other
    assert hash(one) == hash(other)
    assert read_loads.__wrapped__("udl 12", one) == read_loads.__wrapped__("uniform 12.0", other)


def test_a_position_is_counted_from_the_left_support_of_its_span() -> None:
    """`in span` counts from the span's left support; hinges and steps do not split a span."""
    beam = read_line("free 1 pinned 2 hinge 4 roller 3 step 2 fixed")
    loads = read_loads("point 1 at 1 in span 2; udl 1 in span 1; udl 2 from 1 to 2 in span 2", beam).loads
    assert loads[0].x == 8.0
    assert (loads[1].start, loads[1].end) == (1.0, 7.0)
    assert (loads[2].start, loads[2].end) == (8.0, 9.0)


@pytest.mark.parametrize(
    ("written", "expected"),
    [
        ("1.35 G + 1.5 Q", {"g": 1.35, "q": 1.5}),
        ("1.35G+1.5Q", {"g": 1.35, "q": 1.5}),
        ("G - 0.5*W", {"g": 1.0, "w": -0.5}),
        ("-G", {"g": -1.0}),
        ("G + G", {"g": 2.0}),
        ("  .9 G1  ", {"g1": 0.9}),
        ("1e3 G", {"g": 1000.0}),
    ],
)
def test_combinations_are_read(written: str, expected: dict[str, float]) -> None:
    """A combination is a sum of factors and cases; a factor left out is 1."""
    assert {name: factor for name, factor, _ in read_combination(written)} == expected
    assert {favourable for _, _, favourable in read_combination(written)} == {None}


@pytest.mark.parametrize(
    ("written", "expected"),
    [
        ("1.35/1.0 G + 1.5 Q", (("g", 1.35, 1.0), ("q", 1.5, None))),
        ("1.35 / .9*G-1.5/0Q", (("g", 1.35, 0.9), ("q", -1.5, 0.0))),
        ("-1.35/1.0 G", (("g", -1.35, -1.0),)),
    ],
)
def test_two_factors_are_read(written: str, expected: tuple[tuple[str, float, float | None], ...]) -> None:
    """Before the stroke stands the factor where loads are adverse, after it where favourable; a sign is of both."""
    assert read_combination(written) == expected


def test_a_range_of_combinations_is_read_cell_by_cell() -> None:
    """Blanks are skipped; where all is blank every load counts once."""
    found = read_combinations(frozen("combinations", [["1.35 G", None], ["", " G + Q "]]))
    assert [text for text, _ in found] == ["1.35 G", "G + Q"]
    for blank in (None, "", 0.0, [[None, ""]]):
        assert read_combinations(frozen("combinations", blank)) == (("every load once", None),)


@pytest.mark.parametrize("blank", [None, "", "  ", 0, 0.0, [[None]]])
def test_a_blank_combination_or_stiffness_is_not_given(blank: object) -> None:
    """Hosts make nothing or 0 of a blank: both mean 'not given'."""
    assert f.reaction("fixed 8 pinned", "G: udl 12", 1, blank, blank) == 60.0
    assert f.moment_max("fixed 8 pinned", "G: udl 12", blank, blank, blank) == 54.0
    with pytest.raises(BeamError, match="stiffness: blank"):
        f.deflection_max("fixed 8 pinned", "G: udl 12", blank, blank, blank)


@pytest.mark.parametrize(
    ("stiffness", "EI", "GA"),
    [
        (24000, (24000.0, 24000.0), None),
        ("24000", (24000.0, 24000.0), None),
        ("2e4 3e4", (2e4, 3e4), None),
        ("EI = 840. 900.; GA=5e5", (840.0, 900.0), (5e5, 5e5)),
        ([[2e4], [3e4]], (2e4, 3e4), None),
        ([[2e4, None, "3e4"]], (2e4, 3e4), None),
        ("EI 24000; GA 5e5", (24000.0, 24000.0), (5e5, 5e5)),
        ("ga 5e5 6e5; ei 2e4 3e4", (2e4, 3e4), (5e5, 6e5)),
        ([["EI 24000"], ["GA 5e5"]], (24000.0, 24000.0), (5e5, 5e5)),
        ([["EI", 24000], ["GA", 5e5]], (24000.0, 24000.0), (5e5, 5e5)),
    ],
)
def test_stiffness_is_one_number_or_one_a_length_or_named_terms(stiffness: object, EI: object, GA: object) -> None:
    """EI may be one number, one for each length, or a named term beside GA."""
    beam = read_beam("fixed 3 step 5 pinned", frozen("stiffness", stiffness))
    assert beam.stiffness is not None
    assert (beam.stiffness.EI, beam.stiffness.GA) == (EI, GA)


@settings(max_examples=200, deadline=None)
@given(st.floats(1e-30, 1e30), st.floats(1e-60, 1e60) | st.just(0.0) | st.floats(-1e60, -1e-60))
def test_numbers_go_into_text_and_back_without_loss(length: float, size: float) -> None:
    """Joining functions write numbers so that the very same numbers are read again."""
    assert number("x", as_text(size)) == size
    line = f.beam_line("fixed", length, "pinned")
    assert read_line(line).lengths == (length,)
    assert f.beam_line(line) == line
    assert read_clauses(f.load_line("point", size, "at", 0))[0].size == size


def test_joining_functions_take_cells_and_ranges() -> None:
    """Parts are marks, words, numbers, pieces of text and ranges."""
    assert f.beam_line("fixed", 6.5, "pinned 2", "free") == "fixed 6.5 pinned 2 free"
    assert f.beam_line([["fixed", 6.5], ["pinned", None]], 2, "free") == "fixed 6.5 pinned 2 free"
    assert f.load_line([["udl 5", "Q: point 40 at 2.5"]]) == "udl 5; Q: point 40 at 2.5"
    assert f.load_line("G:", "udl", 5, ";", [["Q: point", 40, "at", 2.5]]) == "G: udl 5; Q: point 40 at 2.5"
    with pytest.raises(BeamError, match="part 2: blank"):
        f.beam_line("fixed", None, "pinned")
