"""Malformed input gets the stated error value and a reason; nothing hangs, and nothing returns a number."""

from __future__ import annotations

import datetime
import math
import time
from decimal import Decimal
from typing import Any

import numpy as np
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from beamfuncs import functions as f
from beamfuncs.beam import MARK_KINDS
from beamfuncs.catalogue import catalogue
from beamfuncs.errors import NA, NUM, VALUE, BeamError, ErrorValue
from beamfuncs.fields import FIELDS
from beamfuncs.loads import LOAD_KINDS
from beamfuncs.notation import HEADERS, STIFFNESS_TERMS

BEAM, LOADS, EI = "fixed 8 pinned", "udl 12", 24000

# argument, what is read, error value, a piece of the reason that says what would be right
BEAMS = [
    (None, VALUE, "e.g. 'fixed 8 pinned'"),
    ("", VALUE, "blank"),
    ("   \n", VALUE, "blank"),
    ([[None, ""], ["", None]], VALUE, "blank"),
    (8, VALUE, "the number 8"),
    (0.0, VALUE, "a line of marks and lengths"),
    (True, VALUE, "truth value"),
    (np.bool_(True), VALUE, "truth value"),
    (datetime.datetime(2026, 3, 1), VALUE, "date"),
    (datetime.date(2026, 3, 1), VALUE, "date"),
    (object(), VALUE, "text, a number or nothing"),
    ("pinned", VALUE, "alone"),
    ("8", VALUE, "starts with a mark"),
    ("pinned 5", VALUE, "ends with a mark"),
    ("5 pinned", VALUE, "starts with a mark"),
    ("pinned 5 6 roller", VALUE, "without a mark between"),
    ("pinned roller", VALUE, "without a length between"),
    ("fixed 6,5 pinned", VALUE, "write decimals with a point"),
    ("fixed 1,200 pinned", VALUE, "write decimals with a point"),
    ("fixed 6.5.2 pinned", VALUE, "neither a length nor a mark"),
    ("fixed -8 pinned", NUM, "greater than 0"),
    ("fixed 0 pinned", NUM, "greater than 0"),
    ("fixed 1e400 pinned", NUM, "larger than a number can hold"),
    ("fixed 1e200 pinned", NUM, "between 1e-30 and 1e+30"),
    ("fixed 1e-90 pinned", NUM, "between 1e-30 and 1e+30"),
    ("pinned 1e-13 pinned 1 pinned", NUM, "next to nothing"),
    ("fixed 8 spring(1e31)", NUM, "between 1e-30 and 1e+30"),
    ("fixed nan pinned", VALUE, "neither a length nor a mark"),
    ("fixed inf pinned", VALUE, "neither a length nor a mark"),
    ("fixed ８ pinned", VALUE, "neither a length nor a mark"),
    ("fixed ٨ pinned", VALUE, "neither a length nor a mark"),
    ("fixed 8m pinned", VALUE, "neither a length nor a mark"),
    ("fixed eight pinned", VALUE, "neither a length nor a mark"),
    ("fixd 8 pinned", VALUE, "fixed, pinned, roller"),
    ("fixed 8 pinned, 2 free", VALUE, "parted by blanks"),
    ("fixed 8 pinned;", VALUE, "neither a length nor a mark"),
    ("hinge 8 pinned", VALUE, "belongs inside"),
    ("fixed 8 step", VALUE, "belongs inside"),
    ("fixed 4 free 4 fixed", VALUE, "at an end only"),
    ("fixed 8 spring", VALUE, "e.g. 'spring(2500)'"),
    ("fixed 8 spring()", VALUE, "a spring stiffness"),
    ("fixed 8 spring(1,2)", VALUE, "a blank after the comma"),
    ("fixed 8 spring(1, 2, 3)", VALUE, "kv and kr"),
    ("fixed 8 spring(2500", VALUE, "stiffness"),
    ("fixed 8 spring(-1)", NUM, "greater than 0"),
    ("fixed 8 spring(1e400)", NUM, "larger than a number can hold"),
    ("fixed 8 spring(soft)", VALUE, "a spring stiffness"),
    ([["fixed", 8, "pinned", 3]], VALUE, "ends with a mark"),
    ([["fixed 8", "pinned"]], VALUE, "one mark or length a cell"),
    ([["fixed", math.nan, "pinned"]], NUM, "greater than 0"),
    ([["fixed", math.inf, "pinned"]], NUM, "check the units"),
    ([["fixed", Decimal("sNaN"), "pinned"]], NUM, "larger than a number can hold"),
    ([["fixed", "6,5", "pinned"]], VALUE, "write decimals with a point"),
    ([["fixed", True, "pinned"]], VALUE, "truth value"),
    ([["fixed", datetime.date(2026, 3, 1), "pinned"]], VALUE, "date"),
    ([["fixed", [8], "pinned"]], VALUE, "rows of cells"),
    ([[["fixed"], 8, "pinned"]], VALUE, "rows of cells"),
    ([["fixed", 8], "pinned"], VALUE, "list of rows"),
    (ErrorValue("#REF!"), "#REF!", "mend that cell"),
    ([["fixed", ErrorValue("#DIV/0!"), "pinned"]], "#DIV/0!", "mend that cell"),
    ("x" * 40_000, VALUE, "neither a length nor a mark"),
    ("fixed " + "9" * 40_000 + " pinned", NUM, "larger than a number can hold"),
    ("pinned 8 free", NUM, "mechanism"),
    ("free 8 free", NUM, "mechanism"),
    ("guided 8 guided", NUM, "mechanism"),
    ("pinned 3 hinge 5 pinned", NUM, "from x = 0 to 3 can turn about x = 0"),
    ("fixed 3 hinge 2 hinge 2 hinge 3 fixed", NUM, "from x = 3 to 5 can turn about x = 3"),
    ("fixed 4 pinned 2 hinge 3 free", NUM, "from x = 6 to 9 can turn about x = 6"),
    ("spring(0) 8 pinned", NUM, "mechanism"),
    ("spring(1e-20) 8 spring(1e-20)", NUM, "powers of ten"),
]

LOADS_READ = [
    (None, VALUE, "'udl 0' for an unloaded beam"),
    ("", VALUE, "'udl 0' for an unloaded beam"),
    (" ; \n ;", VALUE, "'udl 0' for an unloaded beam"),
    ([[None], [""]], VALUE, "'udl 0' for an unloaded beam"),
    (0.0, VALUE, "write a load such as 'udl 0'"),
    (12, VALUE, "write a load such as 'udl 12'"),
    (False, VALUE, "truth value"),
    (ErrorValue("#N/A"), NA, "mend that cell"),
    ("udl", VALUE, "ends where the size"),
    ("udl twelve", VALUE, "'twelve' is not a number"),
    ("udl 6,5", VALUE, "write decimals with a point"),
    ("udl 1e400", NUM, "larger than a number can hold"),
    ("udl 1e61", NUM, "check the units"),
    ("varying 0 to -1e-61", NUM, "check the units"),
    ("udl 12 from 3 to 3", NUM, "has no length"),
    ("udl 12 from 4 to 4.000000000005", NUM, "has no length"),
    ([["load", "size", "from", "to"], ["udl", 12, 0, 0]], NUM, "has no length"),
    ("load 12", VALUE, "udl, varying, point"),
    ("udl 12 kN/m", VALUE, "'kN/m'"),
    ("udl 12 from 2", VALUE, "go together"),
    ("udl 12 from", VALUE, "ends where a number is due"),
    ("udl 12 from 6 to 2", NUM, "runs backwards"),
    ("udl 12 from 2 to 12", NA, "ends beyond the beam (length 8)"),
    ("udl 12 from -2 to 4", NA, "starts beyond the beam"),
    ("udl 12 at 3", VALUE, "write e.g. 'udl 12 from 2 to 6'"),
    ("udl 12 in span 2", NA, "the beam has 1 span"),
    ("udl 12 in span 0", NA, "span 0 is not there"),
    ("udl 12 in span 1.5", VALUE, "not a span number"),
    ("udl 12 from 1 to 9 in span 1", NA, "ends beyond the span 1 (length 8)"),
    ("udl 12 from 1 to 2 from 3 to 4", VALUE, "twice"),
    ("varying 12", VALUE, "second size after 'to'"),
    ("varying 0 to", VALUE, "ends where a number is due"),
    ("varying 0 12", VALUE, "is not understood"),
    ("point 40", VALUE, "needs one place"),
    ("point 40 at", VALUE, "ends where a number is due"),
    ("point 40 at 9", NA, "place 9 is not on the beam (length 8)"),
    ("point 40 at -1", NA, "not on the beam"),
    ("point 40 at 3 at 4", VALUE, "twice"),
    ("point 40 from 1 to 2", VALUE, "takes no 'from'"),
    ("settle 0.01", VALUE, "needs one place"),
    ("settle 0.01 at 8", VALUE, "at support 2"),
    ("settle 0.01 at support 3", NA, "the beam has 2 supports"),
    ("settle 0.01 at support two", VALUE, "not a support number"),
    ("rotate 0.01 at support 2", NA, "holds no rotation"),
    ("G udl 5", VALUE, "'G' is not a load"),
    ("G:", VALUE, "ends where a load is due"),
    ("1G: udl 5", VALUE, "a case is a letter"),
    ("G: H: udl 5", VALUE, "a case is a letter"),
    ("udl 12, point 3 at 4", VALUE, "clauses are parted by ';'"),
    ("udl from 0 to 3", VALUE, "stands where the size"),
    ("udl 1 200", VALUE, "is not understood"),
    ([["udl 12"], [3]], VALUE, "stands among texts"),
    ([["load", "size"]], VALUE, "blank"),
    ([["load", "size"], ["udl", None]], VALUE, "no size"),
    ([["load", "size"], [None, 12]], VALUE, "no load"),
    ([["load", "size", "place"], ["udl", 12, 3]], VALUE, "headers are load, case, size"),
    ([["load", "size", "size"], ["udl", 12, 3]], VALUE, "stands twice"),
    ([["load", "size", None], ["udl", 12, 3]], VALUE, "no header"),
    ([["load", "size", "at"], ["point", "4,5", 3]], VALUE, "write decimals with a point"),
    ([["load", "size", "case"], ["udl", 12, 3]], VALUE, "a case is a letter"),
    ([["load", "size", "span"], ["udl", 12, 1.5]], VALUE, "not a whole number"),
    ([["load", "size"], ["udl", math.nan]], NUM, "not finite"),
    ("y" * 40_000, VALUE, "is not a load"),
    ("udl 12 each", VALUE, "'each' in"),
    ("udl 12 each beam", VALUE, "'each' in"),
    ("udl 12 each span each load", VALUE, "twice"),
    ("udl 12 in span 1 each span", VALUE, "'each span' and one span or support exclude each other"),
    ("point 3 at support 1 each span", VALUE, "exclude each other"),
    ("point 40 each span", VALUE, "needs one place"),
    ("point 40 at 9 each span", NA, "not on the span 1 (length 8)"),
    ("udl 4 from 1 to 9 each span", NA, "ends beyond the span 1"),
    ("udl 12 both ways", VALUE, "'both' in"),
    ([["load", "size", "each"], ["udl", 5, "spans"]], VALUE, "write span or load"),
    ([["load", "size", "each", "span"], ["udl", 5, "span", 1]], VALUE, "exclude each other"),
    ("axles", VALUE, "ends where the load of an axle is due"),
    ("axles spaced 2", VALUE, "'spaced' is not a number"),
    ("axles 80 spaced", VALUE, "ends where a distance between axles is due"),
    ("axles 80 spaced 2", VALUE, "1 axles with 1 distances"),
    ("axles 80 80", VALUE, "write e.g. 'axles 80 80 40 spaced 1.2 3.2'"),
    ("axles 80 80 spaced 1 2", VALUE, "2 axles with 2 distances"),
    ("axles 80 80 spaced 0", NUM, "more than 0"),
    ("axles 80 80 spaced -1.2", NUM, "more than 0"),
    ("axles 80 80 spaced 1,2", VALUE, "write decimals with a point"),
    ("axles 80,5", VALUE, "write decimals with a point"),
    ("axles eighty", VALUE, "'eighty' is not a number"),
    ("axles 1e61", NUM, "check the units"),
    ("axles 80 lane udl 1e-61", NUM, "check the units"),
    ("axles 80 lane udl", VALUE, "ends where the load of the lane is due"),
    ("axles 80 lane 9", VALUE, "lane udl 9"),
    ("axles 80 lane udl 9 lane udl 8", VALUE, "'lane' in"),
    ("axles 80 both ways both ways", VALUE, "'both' in"),
    ("axles 80 80 spaced 1.2 both", VALUE, "'both' in"),
    ("axles 80 at 3", VALUE, "'at' in"),
    ("axles 80 each span", VALUE, "'each' in"),
    ("axles" + " 80" * 101 + " spaced" + " 1" * 100, NUM, "at most 100"),
]

FREE = [
    ("udl 12 each span", VALUE, "ask for the highest or the lowest"),
    ("udl 12 each load", VALUE, "ask for the highest or the lowest"),
    ("G: udl 5; Q: point 40 at 3 each span", VALUE, "ask for the highest or the lowest"),
    ("udl 5; axles 80", VALUE, "ask for the highest or the lowest"),
    ([["load", "size", "each"], ["udl", 5, "load"]], VALUE, "ask for the highest or the lowest"),
]
"""Loads that act only where they are adverse, which no function can place without being asked for what."""

SUPPORTS = [
    (None, VALUE, "blank"),
    (0, NA, "the beam has 2 supports"),
    (3, NA, "the beam has 2 supports"),
    (-1, NA, "the beam has 2 supports"),
    (1.5, VALUE, "not a whole number"),
    ("two", VALUE, "'two' is not a whole number"),
    ("1,0", VALUE, "decimals with a point"),
    (math.nan, NUM, "not finite"),
    (math.inf, NUM, "not finite"),
    (True, VALUE, "truth value"),
    (10**400, NUM, "larger than a number can hold"),
    ([[1, 2]], VALUE, "give one cell"),
    (ErrorValue("#NAME?"), "#NAME?", "mend that cell"),
]

PLACES = [
    (None, VALUE, "blank"),
    (8.1, NA, "not on the beam (length 8)"),
    (-0.1, NA, "not on the beam (length 8)"),
    (math.nan, NUM, "not finite"),
    (-math.inf, NUM, "not finite"),
    ("3,5", VALUE, "decimals with a point"),
    ("middle", VALUE, "not a place"),
    (False, VALUE, "truth value"),
    (datetime.time(3, 0), VALUE, "date or time"),
]

SPANS = [
    (2, NA, "the beam has 1 span"),
    (-1, NA, "the beam has 1 span"),
    (0.5, VALUE, "not a whole number"),
    ("first", VALUE, "not a whole number"),
    (True, VALUE, "truth value"),
]

STIFFNESSES = [
    (-1, NUM, "greater than 0"),
    (math.nan, NUM, "not finite"),
    (math.inf, NUM, "not finite"),
    (1e31, NUM, "check the units"),
    ("1e-31", NUM, "check the units"),
    ("2,4e4", VALUE, "decimals with a point"),
    ("24000 25000", VALUE, "2 values of EI for 1 lengths; give one"),
    ([[1, 2, 3]], VALUE, "3 values of EI"),
    ("GA 5e5", VALUE, "has no EI"),
    ("24 500", VALUE, "write 24500 without a blank"),
    ("1.35 G + 1.5 Q", VALUE, "if this is the combination"),
    ("EI", VALUE, "0 values of EI"),
    ("EI 1; EI 2", VALUE, "given twice"),
    ("EI 24000; GA 0", NUM, "GA is 0"),
    ("EI 24000; GJ 5", VALUE, "EI, GA"),
    ("stiff", VALUE, "EI, GA"),
    (True, VALUE, "truth value"),
    (ErrorValue("#DIV/0!"), "#DIV/0!", "mend that cell"),
]

COMBINATIONS = [
    (1.5, VALUE, "write one text"),
    ("1,35 G", VALUE, "decimals with a point"),
    ("1.35", VALUE, "'1.35 G + 1.5 Q'"),
    ("1.35 G 1.5 Q", VALUE, "'1.35 G + 1.5 Q'"),
    ("1.35 G +", VALUE, "'1.35 G + 1.5 Q'"),
    ("G ++ Q", VALUE, "'1.35 G + 1.5 Q'"),
    ("1.35 G + * Q", VALUE, "'1.35 G + 1.5 Q'"),
    ("*G", VALUE, "'1.35 G + 1.5 Q'"),
    ("1e400 G", NUM, "larger than a number can hold"),
    ("1e308 G + 1e308 G", NUM, "more than a number can hold"),
    ([["G", "Q"]], VALUE, "a range"),
    (True, VALUE, "truth value"),
    *(
        (text, VALUE, "'1.35 G + 1.5 Q'")
        for text in ("1.35/ G", "/1.0 G", "1.35/1.0/0.9 G", "1.35/1.0", "1.35/G", "1.35//1.0 G")
    ),
    ("1.35/1.0 G + G", VALUE, "names G twice"),
    ("G + 1.35/1.0 G", VALUE, "names G twice"),
    ("1.35/1e400 G", NUM, "larger than a number can hold"),
]
"""What is no combination, in any function."""

SINGLE = [row for row in COMBINATIONS if not isinstance(row[0], list)]
"""The same without the range, which is a list of combinations for other functions."""

ONE_FACTOR = [("1.35/1.0 G", VALUE, "give one, or ask for the highest or the lowest")]
"""What is none where one answer is asked for."""

LISTS = [
    (1.5, VALUE, "write one text"),
    ([["1.35 G"], [3]], VALUE, "the number 3"),
    ([["1.35 G", "G Q"]], VALUE, "'1.35 G + 1.5 Q'"),
    ([["1.35 G"], [True]], VALUE, "row 2, column 1: TRUE is a truth value"),
    ([["1.35 G"], [ErrorValue("#REF!")]], "#REF!", "mend that cell"),
]

SOUGHT = [
    ("position of moment max", VALUE, "'governing' tells where"),
    ("moment min", VALUE, "not that of the opposite extreme"),
    ("moment min in span 1", VALUE, "not that of the opposite extreme"),
    ("total load", VALUE, "the total load of a train"),
]
"""Phrases that have no highest value under a train."""

SIDES_ASKED = [
    ("up", VALUE, "write highest or lowest"),
    (3, VALUE, "write highest or lowest"),
    (True, VALUE, "truth value"),
    ([["highest", "lowest"]], VALUE, "give one cell"),
]

POINTS = [
    (1, NUM, "give from 2 to 100000"),
    (1e6, NUM, "give from 2 to 100000"),
    (2.5, VALUE, "not a whole number"),
    ("many", VALUE, "not a whole number"),
]

PHRASES = [
    (None, VALUE, "blank"),
    (3, VALUE, "the number 3"),
    ("momentum max", VALUE, "is not understood"),
    ("moment", VALUE, "is not understood"),
    ("moment maximum", VALUE, "is not understood"),
    ("moment at", VALUE, "is not understood"),
    ("moment at 3,5", VALUE, "decimals with a point"),
    ("moment at 9", NA, "not on the beam"),
    ("moment at 1e400", NUM, "larger than a number can hold"),
    ("moment at 0 left", NA, "no beam to the left"),
    ("moment at 8 right", NA, "no beam to the right"),
    ("moment at 1 in span 2", NA, "the beam has 1 span"),
    ("moment max in span 0", NA, "span 0 is not there"),
    ("moment max in span 1.5", VALUE, "not a span number"),
    ("reaction 3", NA, "the beam has 2 supports"),
    ("reaction", VALUE, "is not understood"),
    ("reaction one", VALUE, "not a support number"),
    ("position of reaction 1", VALUE, "is not understood"),
    ("total", VALUE, "is not understood"),
    ("moment at support 5", NA, "the beam has 2 supports"),
]

ONE_PLACE = [
    *(row for row in PHRASES if " max" not in str(row[0])),
    ("moment max in span 1", VALUE, "belongs to one place"),
    ("position of moment max", VALUE, "belongs to one place"),
    ("total load", VALUE, "belongs to one place"),
]
"""Phrases that have no influence line."""

UNITS = [
    (("kN", "m"), VALUE, "different dimensions"),
    (("lb/ft", "kN/m"), VALUE, "a force is lbf"),
    (("florin", "kN"), VALUE, "no known unit"),
    (("kN", None), VALUE, "blank; write a unit"),
    (("kN", 3), VALUE, "write a unit"),
    (("2**10**10**10", "m"), VALUE, "no known unit"),
    (("kN/", "kN"), VALUE, "no known unit"),
    (("kN m 10", "kN m"), VALUE, "no known unit"),
    (("", "kN"), VALUE, "write a unit"),
    (("degC", "kelvin"), VALUE, "different zeros"),
    (("m" * 1000, "m"), VALUE, "up to 40 characters"),
    (("kN;m", "kN m"), VALUE, "no known unit"),
]

ORDINARY: list[Any] = [
    lambda loads: f.reaction(BEAM, loads, 1),
    lambda loads: f.reactions(BEAM, loads),
    lambda loads: f.moment_at(BEAM, loads, 3),
    lambda loads: f.moment_max(BEAM, loads),
    lambda loads: f.beam_result(BEAM, loads, "total load"),
    lambda loads: f.diagram(BEAM, loads),
    lambda loads: f.contraflexure(BEAM, loads),
]
"""Functions that give the one answer of loads that are there."""

ADVERSE: list[Any] = [f.highest, f.lowest, f.governing]

TABLES: list[tuple[Any, list[Any]]] = [
    (lambda beam: f.reaction(beam, LOADS, 1, EI), BEAMS),
    (lambda loads: f.moment_max(BEAM, loads, None, EI), LOADS_READ),
    (lambda support: f.reaction(BEAM, LOADS, support), SUPPORTS),
    (lambda x: f.moment_at(BEAM, LOADS, x), PLACES),
    (lambda span: f.moment_max(BEAM, LOADS, span), SPANS),
    (lambda stiffness: f.deflection_max(BEAM, LOADS, None, stiffness), STIFFNESSES),
    (lambda combination: f.shear_max(BEAM, "G: udl 12; Q: udl 3", None, EI, combination), COMBINATIONS),
    (lambda phrase: f.beam_result(BEAM, LOADS, phrase, EI), PHRASES),
    (lambda units: f.unit_factor(*units), UNITS),
    *((function, FREE) for function in ORDINARY),
    (lambda combination: f.reaction(BEAM, "G: udl 12", 1, EI, combination), ONE_FACTOR),
    *((lambda one, ask=ask: ask(BEAM, "G: udl 12", "reaction 1", one, EI), SINGLE) for ask in ADVERSE),
    *((lambda one, ask=ask: ask(BEAM, "G: udl 12", "reaction 1", one, EI), LISTS) for ask in ADVERSE),
    (lambda one: f.envelope(BEAM, "G: udl 12", one, None, EI), LISTS),
    *((lambda beam, ask=ask: ask(beam, LOADS, "reaction 1", None, EI), BEAMS) for ask in ADVERSE),
    *((lambda loads, ask=ask: ask(BEAM, loads, "reaction 1", None, EI), LOADS_READ) for ask in ADVERSE),
    *((lambda phrase, ask=ask: ask(BEAM, LOADS, phrase, None, EI), PHRASES) for ask in ADVERSE),
    *((lambda phrase, ask=ask: ask(BEAM, "axles 80", phrase, None, EI), SOUGHT) for ask in (f.highest, f.governing)),
    (lambda stiffness: f.highest(BEAM, LOADS, "deflection max", None, stiffness), STIFFNESSES),
    (lambda side: f.governing(BEAM, LOADS, "reaction 1", None, EI, side), SIDES_ASKED),
    (lambda points: f.envelope(BEAM, LOADS, None, points, EI), POINTS),
    (lambda points: f.influence_line(BEAM, "reaction 1", points, EI), POINTS),
    (lambda beam: f.influence(beam, "moment at 0", 0, EI), BEAMS),
    (lambda phrase: f.influence(BEAM, phrase, 3, EI), ONE_PLACE),
    (lambda phrase: f.influence_line(BEAM, phrase, 3, EI), ONE_PLACE),
    (lambda x: f.influence(BEAM, "reaction 1", x), PLACES),
    (lambda loads: f.reaction_cases(BEAM, loads, EI), LOADS_READ),
]
CASES = [(call, *row) for call, table in TABLES for row in table]


@pytest.mark.parametrize(("call", "read", "value", "reason"), CASES, ids=[repr(row[1])[:40] for row in CASES])
def test_malformed_input_gets_its_error_value_and_a_reason(call: Any, read: Any, value: str, reason: str) -> None:
    """Each malformed argument gives the stated error value and one line that says what would be right."""
    with pytest.raises(BeamError) as caught:
        call(read)
    assert caught.value.value == value, caught.value.reason
    assert reason in caught.value.reason
    assert len(caught.value.reason) < 255
    assert "\n" not in caught.value.reason


def test_the_tables_hold_at_least_80_cases() -> None:
    """The tables are as long as they must be."""
    assert len(CASES) >= 80


ARGUMENT_OF_TABLE = ["beam", "loads", "support", "x", "span", "stiffness", "combination", "phrase"]


@pytest.mark.parametrize(
    ("argument", "call", "read"),
    [(name, call, row[0]) for name, (call, table) in zip(ARGUMENT_OF_TABLE, TABLES, strict=False) for row in table],
)
def test_the_reason_begins_with_the_argument(argument: str, call: Any, read: Any) -> None:
    """The reason names the argument that is at fault."""
    with pytest.raises(BeamError) as caught:
        call(read)
    assert caught.value.reason.startswith(argument)


@pytest.mark.parametrize(
    ("call", "needs"),
    [
        (lambda: f.deflection_max(BEAM, LOADS), "deflection needs it"),
        (lambda: f.slope_at(BEAM, LOADS, 0, 0), "slope needs it"),
        (lambda: f.reaction("spring(100) 4 pinned 4 pinned", LOADS, 1), "springs"),
        (lambda: f.reaction(BEAM, "settle 0.01 at support 1", 1), "imposed settlements"),
        (lambda: f.moment_max("fixed 3 step 5 pinned", LOADS), "a step of the stiffness"),
    ],
)
def test_a_missing_stiffness_is_named_where_the_result_depends_on_it(call: Any, needs: str) -> None:
    """Results that depend on the stiffness say that the argument `stiffness` is missing."""
    with pytest.raises(BeamError, match=f"^stiffness: blank.*{needs}") as caught:
        call()
    assert caught.value.value == VALUE


@pytest.mark.parametrize(
    ("call", "needs"),
    [
        (lambda: f.highest(BEAM, "udl 3 each span", "deflection max"), "deflection needs it"),
        (lambda: f.lowest(BEAM, "axles 3", "slope at 0"), "slope needs it"),
        (lambda: f.governing("spring(100) 4 pinned 4 pinned", "axles 3", "reaction 1"), "springs"),
        (lambda: f.highest(BEAM, "settle 0.01 at support 1 each load", "reaction 1"), "imposed settlements"),
        (lambda: f.influence(BEAM, "deflection at 3", 3), "deflection needs it"),
        (lambda: f.influence_line("fixed 3 step 5 pinned", "reaction 1"), "a step of the stiffness"),
        (lambda: f.envelope("spring(100) 4 pinned 4 pinned", "udl 3"), "springs"),
        (lambda: f.reaction_cases("fixed 3 step 5 pinned", "udl 3"), "a step of the stiffness"),
    ],
)
def test_a_missing_stiffness_is_named_where_an_extreme_depends_on_it(call: Any, needs: str) -> None:
    """The same of the functions over patterns and positions."""
    test_a_missing_stiffness_is_named_where_the_result_depends_on_it(call, needs)


def test_fault_takes_loads_that_act_where_they_are_adverse() -> None:
    """What `highest` can answer has no fault; what it cannot has the reason that it gives."""
    assert f.fault(BEAM, "G: udl 3 each span; Q: axles 80 lane udl 9", None, "1.35/1.0 G + 1.5 Q") == ""
    assert f.fault(BEAM, "G: udl 3", None, "1.35/1.0 G") == ""
    assert "has no case" in f.fault(BEAM, "udl 3 each span", None, "1.35 G")
    assert "springs" in f.fault("spring(100) 4 pinned 4 pinned", "axles 80")
    assert "mechanism" in f.fault("pinned 8 free", "axles 80")
    assert "axles with" in f.fault(BEAM, "axles 80 80")


def test_a_load_without_a_case_beside_a_combination_is_an_error() -> None:
    """A combination cannot say by how much a load without a case counts."""
    with pytest.raises(BeamError, match="loads, load 2: has no case"):
        f.reaction(BEAM, "G: udl 5; udl 3", 1, None, "1.35 G")
    for loads in ("G: udl 5; udl 3 each span", "G: udl 5; axles 80"):
        with pytest.raises(BeamError, match="loads, load 2: has no case"):
            f.highest(BEAM, loads, "reaction 1", "1.35 G")


def test_one_value_among_blanks_is_not_spread_over_the_lengths() -> None:
    """A blank in a range of stiffnesses is a stiffness that is missing."""
    with pytest.raises(BeamError, match="one value and blanks for 3 lengths"):
        f.deflection_max("fixed 1 step 1 step 1 free", "udl 1", None, [[1000, None, None]])


LONG = 32_767
ENDLESS = [
    "9" * LONG + "x",
    "x" * LONG,
    "1," * (LONG // 2),
    " ".join("9" * 900),
    "axles " + "1 " * 8000 + "spaced " + "1 " * 7999,
    "spring(" * 4000,
    "a " * 9000,
    "*" * LONG,
]


@pytest.mark.parametrize("text", ENDLESS, ids=lambda text: text[:6])
def test_nothing_hangs_on_long_text(text: str) -> None:
    """The longest text that a cell holds is read, or refused, in time that grows with its length only.

    Reading it by a step that looks at each rest of the text again would take minutes for this.
    """
    before = time.process_time()
    for entry in catalogue().values():
        for a in entry.arguments:
            plausible = {"beam": BEAM, "loads": LOADS, "support": 1, "x": 1, "phrase": "moment max"}
            arguments = [text if b is a else plausible.get(b.name) for b in entry.arguments if b is a or not b.optional]
            if not a.optional:
                outcome(entry.function, arguments)
    for read in (lambda: f.reaction(BEAM, LOADS, 1, text), lambda: f.reaction(BEAM, "G: " + LOADS, 1, None, text)):
        outcome(read, [])
    assert time.process_time() - before < 20


@settings(max_examples=300, deadline=None, derandomize=True)
@given(st.lists(st.floats() | st.floats(1e-3, 1e3), min_size=7, max_size=7), st.sampled_from(["reaction", "fault"]))
def test_any_numbers_in_a_plausible_line_give_an_answer_or_a_beam_error(numbers: list[float], what: str) -> None:
    """Whatever the numbers of a beam that is well written, answers are finite or BeamErrors."""
    a, b, c, d, e, stiffness, x = numbers
    beam = [["fixed", abs(a), "pinned", abs(b), "pinned", abs(c), "free"]]
    loads = [["load", "size", "end size", "at"], ["varying", d, e, None], ["point", d, None, abs(x)]]
    if what == "fault":
        assert isinstance(f.fault(beam, loads, abs(stiffness)), str)
        return
    for function in (f.moment_max, f.shear_min, f.deflection_max):
        result = outcome(function, [beam, loads, None, abs(stiffness)])
        assert isinstance(result, BeamError) or answers(result)
    result = outcome(f.diagram, [beam, loads, None, abs(stiffness)])
    assert isinstance(result, BeamError) or answers(result)


def test_an_error_in_one_entry_of_an_array_leaves_the_others() -> None:
    """An array holds its error in the entry that cannot be answered."""
    [[first, second, third]] = f.moment_at(BEAM, LOADS, [[0, 99, ErrorValue("#REF!")]])
    assert first == -96.0
    assert isinstance(second, BeamError)
    assert second.value == NA
    assert isinstance(third, BeamError)
    assert third.value == "#REF!"


def test_a_truth_value_is_no_number_even_where_the_number_is_cached() -> None:
    """TRUE equals 1 in Python; it must not be answered from the cache of 1."""
    assert f.reaction([["fixed", 1, "pinned"]], LOADS, 1, 1) > 0
    with pytest.raises(BeamError, match="truth value"):
        f.reaction([["fixed", True, "pinned"]], LOADS, 1, 1)
    with pytest.raises(BeamError, match="truth value"):
        f.reaction([["fixed", 1, "pinned"]], LOADS, 1, True)


WORDS = st.text(alphabet=" ;:()+*-.,e0123GQ", max_size=6) | st.sampled_from(
    [
        *(*MARK_KINDS, *LOAD_KINDS, *HEADERS, *FIELDS, *STIFFNESS_TERMS),
        *(
            "axles 80",
            "axles 8 4 spaced 1",
            "both ways",
            "lane udl 9",
            "each span",
            "each load",
            "1.35/1.0 G",
            "spaced",
        ),
        *("load", "case", "in", "support 1", "in span 1", "max", "min", "position of", "total load", "reaction"),
        *(
            "left",
            "right",
            "spring(5)",
            "spring( )",
            "G:",
            "3.5",
            "-1",
            "1e3",
            "1e400",
            "6,5",
            "nan",
            "inf",
            "８",
            "\x00",
        ),
    ]
)
CELLS = st.one_of(
    st.none(),
    st.booleans(),
    st.text(max_size=12),
    st.lists(WORDS, max_size=8).map(" ".join),
    st.floats(),
    st.integers(-3, 12),
    st.sampled_from([ErrorValue("#REF!"), datetime.datetime(2026, 1, 1), Decimal("2.5"), "", BEAM, LOADS, EI]),
)
ARGUMENTS = st.one_of(CELLS, CELLS, st.lists(st.lists(CELLS, max_size=4), max_size=3))


def outcome(function: Any, arguments: list[Any]) -> object:
    """Return what a function answers, or the BeamError that it raises."""
    try:
        return function(*arguments)
    except BeamError as error:
        return error


def answers(result: object) -> bool:
    """Tell whether a result is a finite number, text, or rows of numbers, texts and errors."""
    if isinstance(result, list):
        return all(isinstance(entry, BeamError) or answers(entry) for row in result for entry in row)
    return isinstance(result, str) or (type(result) is float and math.isfinite(result))


@pytest.mark.parametrize("name", catalogue())
@settings(max_examples=60, deadline=None, suppress_health_check=list(HealthCheck), derandomize=True)
@given(data=st.data())
def test_any_cells_give_an_answer_or_a_beam_error(name: str, data: st.DataObject) -> None:
    """Whatever stands in the cells, a function answers or raises BeamError, and nothing else."""
    entry = catalogue()[name]
    plausible = {"beam": BEAM, "loads": LOADS, "stiffness": EI}
    arguments = [
        data.draw(st.one_of(st.just(plausible.get(a.name, 1)), ARGUMENTS), label=a.name) for a in entry.arguments
    ]
    result = outcome(entry.function, arguments)
    if isinstance(result, BeamError):
        assert result.value.startswith("#")
        assert 0 < len(result.reason) < 255
    else:
        assert answers(result)
