"""The worksheet functions: what a cell calls, in every host and from Python, with the arguments that a cell would give.

A range is a list of rows, a blank cell None. A function that cannot answer raises `BeamError`; in an array, an entry
that cannot be answered is the `BeamError` itself.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import TypeAlias

from beamfuncs import batch
from beamfuncs.cells import (
    Argument,
    Cell,
    Frozen,
    as_text,
    each,
    flat,
    frozen,
    is_range,
    not_given,
    number,
    whole,
)
from beamfuncs.documentation import worksheet_function
from beamfuncs.errors import BeamError, impossible, quoted, unreadable
from beamfuncs.fields import DEFLECTION, MOMENT, SHEAR, SLOPE
from beamfuncs.governing import SIDES, check, envelope_rows, extreme, reaction_rows, sentence
from beamfuncs.influence import InfluenceLine, Section, influence_lines
from beamfuncs.loads import has_two_factors
from beamfuncs.notation import (
    beam_text,
    clause_text,
    is_load_table,
    read_beam,
    read_clauses,
    read_combination,
    read_combinations,
    read_line,
    read_loads,
)
from beamfuncs.results import check_field, check_forces, forces_need, read_phrase
from beamfuncs.sentences import beam_sentence, loads_sentence
from beamfuncs.solving import adverse, solved
from beamfuncs.unknown import SIDES as SIDES_OF_ROOTS
from beamfuncs.unknown import solve_unknown

Rows: TypeAlias = list[list[float | BeamError]]
"""An array result: rows of numbers; an entry that cannot be answered is the error that says why."""

Table: TypeAlias = list[list[float | str]]
"""An array result with a row of headers."""

POINTS = 21
MOST_POINTS = 100_000

# --- reactions ------------------------------------------------------------------------------------


@worksheet_function
def reaction(
    beam: Argument,
    loads: Argument,
    support: Argument,
    stiffness: Argument = None,
    combination: Argument = None,
) -> float:
    """Return the reaction of one support [force], upward positive.

    Returns
    -------
    The vertical force with which the support holds the beam; negative where it holds it down.

    Examples
    --------
    >>> reaction("fixed 8 pinned", "udl 12", 1)
    60.0
    >>> reaction("pinned 6 roller", "G: udl 5; Q: point 40 at 2", 2, None, "1.35 G + 1.5 Q")
    40.25
    """
    return solved(beam, loads, stiffness, combination).reaction(_one_whole("support", support))


@worksheet_function
def reaction_moment(
    beam: Argument,
    loads: Argument,
    support: Argument,
    stiffness: Argument = None,
    combination: Argument = None,
) -> float:
    """Return the reaction moment of one support [force·length], clockwise positive.

    Returns
    -------
    The couple with which the support holds the beam's rotation; 0 at a support that does not hold it.

    Examples
    --------
    >>> reaction_moment("fixed 8 pinned", "udl 12", 1)
    -96.0
    """
    return solved(beam, loads, stiffness, combination).reaction_moment(_one_whole("support", support))


@worksheet_function
def reactions(beam: Argument, loads: Argument, stiffness: Argument = None, combination: Argument = None) -> Rows:
    """Return a row for each support: number, x [length], reaction [force], reaction moment [force·length].

    Returns
    -------
    Rows from left to right; reactions upward positive, reaction moments clockwise positive.

    Examples
    --------
    >>> reactions("fixed 8 pinned", "udl 12")
    [[1.0, 0.0, 60.0, -96.0], [2.0, 8.0, 36.0, 0.0]]
    """
    result = solved(beam, loads, stiffness, combination)
    result.check_forces()
    return [
        [float(n), result.beam.x[index], result.reactions[index], result.reaction_moments[index]]
        for n, index in enumerate(result.beam.supports, 1)
    ]


# --- fields at a place ----------------------------------------------------------------------------


@worksheet_function
def shear_at(
    beam: Argument, loads: Argument, x: Argument, stiffness: Argument = None, combination: Argument = None
) -> float | Rows:
    """Return the shear force at a place [force], positive where the resultant to the left of the cut acts upward.

    Returns
    -------
    A number, or an array in the shape of a range `x`; at a jump the value to its right, at the right end to its left.

    Examples
    --------
    >>> shear_at("fixed 8 pinned", "udl 12", 8)
    -36.0
    >>> shear_at("fixed 8 pinned", "udl 12", [[0, 5]])
    [[60.0, 0.0]]
    """
    return _at(SHEAR, beam, loads, x, stiffness, combination)


@worksheet_function
def moment_at(
    beam: Argument, loads: Argument, x: Argument, stiffness: Argument = None, combination: Argument = None
) -> float | Rows:
    """Return the bending moment at a place [force·length], sagging positive.

    Returns
    -------
    A number, or an array in the shape of a range `x`; at a jump the value to its right, at the right end to its left.

    Examples
    --------
    >>> moment_at("pinned 8 roller", "G: udl 5; Q: point 40 at 2", 4)
    80.0
    """
    return _at(MOMENT, beam, loads, x, stiffness, combination)


@worksheet_function
def slope_at(
    beam: Argument, loads: Argument, x: Argument, stiffness: Argument = None, combination: Argument = None
) -> float | Rows:
    """Return the slope at a place [radian], clockwise positive.

    Returns
    -------
    A number, or an array in the shape of a range `x`. At a hinge the value to the right of it; with GA given, the
    rotation of the cross-section.

    Examples
    --------
    >>> slope_at("pinned 6 roller", "udl 12", 0, 27000)
    0.004
    """
    return _at(SLOPE, beam, loads, x, stiffness, combination)


@worksheet_function
def deflection_at(
    beam: Argument, loads: Argument, x: Argument, stiffness: Argument = None, combination: Argument = None
) -> float | Rows:
    """Return the deflection at a place [length], downward positive.

    Returns
    -------
    A number, or an array in the shape of a range `x`.

    Examples
    --------
    >>> deflection_at("fixed 4 free", "point 9 at 4", 4, 24000)
    0.008
    """
    return _at(DEFLECTION, beam, loads, x, stiffness, combination)


# --- extremes -------------------------------------------------------------------------------------


@worksheet_function
def shear_max(
    beam: Argument,
    loads: Argument,
    span: Argument = None,
    stiffness: Argument = None,
    combination: Argument = None,
) -> float:
    """Return the largest shear force [force], in one span or the whole beam.

    Returns
    -------
    The algebraic maximum, both sides of every jump included.

    Examples
    --------
    >>> shear_max("fixed 8 pinned", "udl 12")
    60.0
    """
    return _extreme(SHEAR, 1, beam, loads, span, stiffness, combination)


@worksheet_function
def shear_min(
    beam: Argument,
    loads: Argument,
    span: Argument = None,
    stiffness: Argument = None,
    combination: Argument = None,
) -> float:
    """Return the smallest (most negative) shear force [force], in one span or the whole beam.

    Returns
    -------
    The algebraic minimum, both sides of every jump included.

    Examples
    --------
    >>> shear_min("fixed 8 pinned", "udl 12")
    -36.0
    """
    return _extreme(SHEAR, -1, beam, loads, span, stiffness, combination)


@worksheet_function
def moment_max(
    beam: Argument,
    loads: Argument,
    span: Argument = None,
    stiffness: Argument = None,
    combination: Argument = None,
) -> float:
    """Return the largest (sagging) bending moment [force·length], in one span or the whole beam.

    Returns
    -------
    The algebraic maximum, found where the shear is zero, at an end or at a jump.

    Examples
    --------
    >>> moment_max("fixed 8 pinned", "udl 12")
    54.0
    """
    return _extreme(MOMENT, 1, beam, loads, span, stiffness, combination)


@worksheet_function
def moment_min(
    beam: Argument,
    loads: Argument,
    span: Argument = None,
    stiffness: Argument = None,
    combination: Argument = None,
) -> float:
    """Return the smallest (hogging) bending moment [force·length], in one span or the whole beam.

    Returns
    -------
    The algebraic minimum, found where the shear is zero, at an end or at a jump.

    Examples
    --------
    >>> moment_min("fixed 8 pinned", "udl 12")
    -96.0
    """
    return _extreme(MOMENT, -1, beam, loads, span, stiffness, combination)


@worksheet_function
def deflection_max(
    beam: Argument,
    loads: Argument,
    span: Argument = None,
    stiffness: Argument = None,
    combination: Argument = None,
) -> float:
    """Return the largest downward deflection [length], in one span or the whole beam.

    Returns
    -------
    The algebraic maximum, found where the deflected line is level, at an end or at a kink.

    Examples
    --------
    >>> deflection_max("pinned 8 roller", "udl 12", None, 32000)
    0.02
    """
    return _extreme(DEFLECTION, 1, beam, loads, span, stiffness, combination)


@worksheet_function
def deflection_min(
    beam: Argument,
    loads: Argument,
    span: Argument = None,
    stiffness: Argument = None,
    combination: Argument = None,
) -> float:
    """Return the smallest (most upward) deflection [length], in one span or the whole beam.

    Returns
    -------
    The algebraic minimum, found where the deflected line is level, at an end or at a kink.

    Examples
    --------
    >>> deflection_min("fixed 4 free", "point -9 at 4", None, 24000)
    -0.008
    """
    return _extreme(DEFLECTION, -1, beam, loads, span, stiffness, combination)


# --- any result -----------------------------------------------------------------------------------


@worksheet_function
def beam_result(
    beam: Argument,
    loads: Argument,
    phrase: Argument,
    stiffness: Argument = None,
    combination: Argument = None,
) -> float | Rows:
    """Return the result that a phrase names.

    Returns
    -------
    A number, or an array in the shape of a range of phrases. A position counts from the left end of the beam,
    and is the smallest x where the extreme occurs.

    Examples
    --------
    >>> beam_result("fixed 8 pinned", "udl 12", "position of moment max")
    5.0
    >>> beam_result("fixed 8 pinned", "udl 12", [["reaction 1"], ["total load"]])
    [[60.0], [96.0]]
    """
    result = solved(beam, loads, stiffness, combination)
    return _each("phrase", phrase, lambda _, cell: result.answer(read_phrase(cell)))


@worksheet_function
def diagram(
    beam: Argument,
    loads: Argument,
    points: Argument = None,
    stiffness: Argument = None,
    combination: Argument = None,
) -> Rows:
    """Return a table for a chart, a row a place: x, shear, moment, slope, deflection.

    Returns
    -------
    Rows from left to right, two at every jump: its left side, then its right. Where no stiffness is given, the slopes
    and deflections are error values.

    Examples
    --------
    >>> for row in diagram("pinned 4 roller", "point 6 at 2", 3, 1000):
    ...     print(row)
    [0.0, 3.0, 0.0, 0.006, 0.0]
    [2.0, 3.0, 6.0, 0.0, 0.008]
    [2.0, -3.0, 6.0, 0.0, 0.008]
    [4.0, -3.0, 0.0, -0.006, 0.0]
    """
    result = solved(beam, loads, stiffness, combination)
    rows: Rows = [list(row) for row in result.diagram(_number_of(points))]
    for which in (SLOPE, DEFLECTION):
        try:
            result.check(which)
        except BeamError as error:
            for row in rows:
                row[1 + which] = error
    return rows


@worksheet_function
def contraflexure(beam: Argument, loads: Argument, stiffness: Argument = None, combination: Argument = None) -> Rows:
    """Return the places where the bending moment changes its sign [length], in one row.

    Returns
    -------
    A row of x from left to right; `#N/A` where there is none.

    Examples
    --------
    >>> [[x]] = contraflexure("fixed 8 pinned", "udl 12")
    >>> round(x, 9)
    2.0
    """
    return [[*solved(beam, loads, stiffness, combination).contraflexure()]]


# --- over combinations, patterns and moving loads -------------------------------------------------------

from beamfuncs.standards import combinations as combinations  # noqa: E402  (here it stands in the catalogue)


@worksheet_function
def highest(
    beam: Argument, loads: Argument, phrase: Argument, combinations: Argument = None, stiffness: Argument = None
) -> float | Rows:
    """Return the highest value of a result over combinations, patterns of the loads and positions of a train.

    Returns
    -------
    A number, or an array in the shape of a range of phrases. Algebraic: the worst hogging moment is a lowest one.

    Examples
    --------
    >>> highest("pinned 6 pinned 6 pinned", "G: udl 4; Q: udl 8 each span", "reaction 2", "1.35/1.0 G + 1.5 Q")
    130.5
    >>> round(highest("pinned 10 pinned", "axles 145 145 spaced 1.2", "moment max"), 9)
    640.61
    """
    return _extreme_over(SIDES["highest"], beam, loads, phrase, combinations, stiffness)


@worksheet_function
def lowest(
    beam: Argument, loads: Argument, phrase: Argument, combinations: Argument = None, stiffness: Argument = None
) -> float | Rows:
    """Return the lowest (most negative) value of a result over combinations, patterns and positions of a train.

    Returns
    -------
    A number, or an array in the shape of a range of phrases. A reaction below 0 is uplift.

    Examples
    --------
    >>> round(lowest("pinned 4 pinned 2 free", "G: udl 4; Q: udl 9 each span", "reaction 1", "1/1.35 G + Q"), 9)
    1.5
    """
    return _extreme_over(SIDES["lowest"], beam, loads, phrase, combinations, stiffness)


@worksheet_function
def governing(
    beam: Argument,
    loads: Argument,
    phrase: Argument,
    combinations: Argument = None,
    stiffness: Argument = None,
    side: Argument = None,
) -> str:
    """Return what governs a result, in words: the combination, the pattern of the loads, where a train stands.

    Parameters
    ----------
    side
        'highest' or 'lowest'. Blank: highest.

    Returns
    -------
    Text: the combination, which free loads are there, the position of the first axle, and the place of an extreme.

    Examples
    --------
    >>> governing("pinned 6 pinned 6 pinned", "G: udl 4; Q: udl 10 each span", "reaction 1", "1.35 G + 1.5 Q")
    '1.35 G + 1.5 Q; 1.5 Q on 0 to 6'
    >>> governing("pinned 10 pinned", "axles 145 145 spaced 1.2", "moment max")
    'every load once; axles: first axle at x = 4.7, the others to its right; at x = 4.7'
    """
    cell = _one_cell("side", side)
    word = "highest" if not_given(cell) else str(cell).strip().lower()
    if word not in SIDES:
        raise unreadable(f"side: {quoted(cell)}; write {' or '.join(SIDES)}")
    result = adverse(beam, loads, stiffness)
    every = read_combinations(frozen("combinations", combinations))
    return sentence(result, extreme(result, read_phrase(_one_cell("phrase", phrase)), every, SIDES[word]))


@worksheet_function
def envelope(
    beam: Argument,
    loads: Argument,
    combinations: Argument = None,
    points: Argument = None,
    stiffness: Argument = None,
) -> Rows:
    """Return a table for a chart: x, highest and lowest shear, highest and lowest moment, the same for deflection.

    Returns
    -------
    Rows from left to right, two at every jump: its left side, then its right. Each value is the extreme of its own
    place, over combinations, patterns and positions of a train. Without a stiffness the deflections are error values.

    Examples
    --------
    >>> for row in envelope("pinned 4 pinned", "G: udl 2; Q: point 6 at 2", [["G"], ["G + Q"]], 3, 1000):
    ...     print([round(value, 6) for value in row])
    [0.0, 7.0, 4.0, 0.0, 0.0, 0.0, 0.0]
    [2.0, 3.0, 0.0, 10.0, 4.0, 0.014667, 0.006667]
    [2.0, 0.0, -3.0, 10.0, 4.0, 0.014667, 0.006667]
    [4.0, -4.0, -7.0, 0.0, 0.0, 0.0, 0.0]
    """
    result, every = adverse(beam, loads, stiffness), read_combinations(frozen("combinations", combinations))
    missing = unreadable("stiffness: blank; deflection needs it; give EI, e.g. 24000")
    return [
        [missing if one is None else one for one in row] for row in envelope_rows(result, every, _number_of(points))
    ]


@worksheet_function
def reaction_cases(beam: Argument, loads: Argument, stiffness: Argument = None) -> Table:
    """Return a table of the reactions [force] and reaction moments [force·length] of each load case, unfactored.

    Returns
    -------
    A row of headers; then a row for each reaction, and for each reaction moment of a support that holds it: number of
    the support, x, which result, a column for each case. A case with patterns or a train has two, highest and lowest.

    Examples
    --------
    >>> for row in reaction_cases("fixed 8 pinned", "G: udl 12; Q: point 16 at 4"):
    ...     print(row)
    ['support', 'x', 'result', 'G', 'Q']
    [1.0, 0.0, 'reaction', 60.0, 11.0]
    [2.0, 8.0, 'reaction', 36.0, 5.0]
    [1.0, 0.0, 'reaction moment', -96.0, -24.0]
    """
    return list(reaction_rows(adverse(beam, loads, stiffness)))


@worksheet_function
def influence(beam: Argument, phrase: Argument, x: Argument, stiffness: Argument = None) -> float | Rows:
    """Return the ordinate of an influence line: the value of a result where a unit load stands, downward, at a place.

    Returns
    -------
    A number, or an array in the shape of a range `x`; at a jump the value to its right, at the right end to its left.

    Notes
    -----
    The influence line is the deflected line under the motion that does work with the result (Mueller-Breslau 1886).

    Examples
    --------
    >>> influence("pinned 8 pinned", "moment at 4", 2)
    1.0
    >>> influence("pinned 4 pinned 4 pinned", "reaction 2", [[0, 2, 4]])
    [[0.0, 0.6875, 1.0]]
    """
    line = _influence_line(beam, phrase, stiffness)
    whole_beam = read_line(frozen("beam", beam))
    return _each("x", x, lambda where, cell: line.value(whole_beam.place(number(where, cell, "a place"), where)))


@worksheet_function
def influence_line(beam: Argument, phrase: Argument, points: Argument = None, stiffness: Argument = None) -> Rows:
    """Return an influence line as a table for a chart, a row a place: x, and the result where a unit load stands there.

    Returns
    -------
    Rows from left to right, marks and the place of the result added to the evenly spaced ones; two rows at a jump.

    Examples
    --------
    >>> influence_line("pinned 8 pinned", "moment at 2", 5)
    [[0.0, 0.0], [2.0, 1.5], [4.0, 1.0], [6.0, 0.5], [8.0, 0.0]]
    """
    return [list(row) for row in _influence_line(beam, phrase, stiffness).rows(_number_of(points))]


# --- solving for an unknown -----------------------------------------------------------------------------


@worksheet_function
def solve_for(
    beam: Argument,
    loads: Argument,
    phrase: Argument,
    target: Argument,
    stiffness: Argument = None,
    combination: Argument = None,
    low: Argument = None,
    high: Argument = None,
    which: Argument = None,
) -> float:
    """Return the number in the place of a question mark, in beam, loads or stiffness, that brings a result to a target.

    Parameters
    ----------
    target
        What the result is to be, e.g. a resistance, or 1/300 for 'deflection max over length'.
    low
        Where the search begins. Blank: 0.001.
    high
        Where the search ends. Blank: 1e15.
    which
        'smallest' or 'largest' of several answers. Blank: smallest.

    Returns
    -------
    A length, a place, a size or a stiffness; the result at it is the target to the last digits.

    Raises
    ------
    BeamError
        `#VALUE!` where an argument cannot be read or is missing, `#NUM!` where a number or the range is out of order,
        `#N/A` where no number in the range brings the result to the target.

    Notes
    -----
    A scan of forty trials in each power of ten, or 401 in a narrow range; between two of them the root is closed in on
    by Brent's method. Answers nearer to each other than two trials may be missed: give a narrow range.

    Examples
    --------
    >>> round(solve_for("pinned ? roller", "udl 12", "moment max", 96), 9)
    8.0
    >>> round(solve_for("pinned 6 roller", "udl 8", "deflection max over length", 1 / 360, "?"), 6)
    8100.0
    """
    side = _one_cell("which", which)
    word = next(iter(SIDES_OF_ROOTS)) if not_given(side) else str(side).strip().lower()
    if word not in SIDES_OF_ROOTS:
        raise unreadable(f"which: {quoted(side)}; write {' or '.join(SIDES_OF_ROOTS)}")
    ends = _number_or_none("low", low), _number_or_none("high", high)
    return solve_unknown(
        (frozen("beam", beam), frozen("loads", loads), frozen("stiffness", stiffness)),
        read_combination(frozen("combination", combination)),
        read_phrase(_one_cell("phrase", phrase)),
        number("target", _one_cell("target", target)),
        ends,
        word,
    )


# --- many beams at once ---------------------------------------------------------------------------------


@worksheet_function
def sweep(
    beams: Argument, loads: Argument, phrases: Argument, stiffness: Argument = None, combination: Argument = None
) -> Rows:
    """Return results of a whole column of beams at once: a row for each beam, a column for each phrase.

    Parameters
    ----------
    beams
        A column of beam lines, a text a cell: 'fixed 8 pinned'.
    phrases
        What is asked for, a column of results for each: 'reaction 2', 'moment max in span 2', 'total load'.

    Returns
    -------
    Rows as many as beams. A row that has no answer holds error values and leaves the others alone.

    Raises
    ------
    BeamError
        `#VALUE!` where a column is not as long as that of the beams.

    Notes
    -----
    Loads, stiffness and combination are one for all beams, or columns with a cell for each. Beams of one topology are
    solved together: numbers agree with those of the other functions within 4e-13 of the peak of the field, 4e-12 where
    settlements, rotations and curvatures raise forces that cancel. In Python, `beamfuncs.batch.sweep` gives an array.

    Examples
    --------
    >>> sweep([["fixed 8 pinned"], ["pinned 4 pinned"]], "udl 12", [["reaction 1", "moment max"]])
    [[60.0, 54.0], [24.0, 24.0]]
    """
    return batch.sweep(beams, loads, phrases, stiffness, combination).rows()


@worksheet_function
def sweep_over(
    beam: Argument,
    loads: Argument,
    phrases: Argument,
    values: Argument,
    stiffness: Argument = None,
    combination: Argument = None,
) -> Rows:
    """Return results of a beam whose names in braces take the values of each row of a table in turn.

    Parameters
    ----------
    phrases
        What is asked for, a column of results for each: 'reaction 2', 'moment max in span 2', 'total load'.
    values
        Rows of values under a row of names, which stand in braces in beam, loads, stiffness or combination:
        'fixed {L} pinned'.

    Returns
    -------
    Rows as many as those of values. A row that has no answer holds error values and leaves the others alone.

    Raises
    ------
    BeamError
        `#VALUE!` where a name in braces is none of the values.

    Notes
    -----
    Names are one in any case of letters; a value may be a text such as a mark. In Python, `beamfuncs.batch.sweep_over`
    takes a dict of columns too, and gives an array.

    Examples
    --------
    >>> sweep_over("fixed {L} pinned", "udl {q}", [["reaction 1", "moment max"]], [["L", "q"], [8, 12], [4, 12]])
    [[60.0, 54.0], [30.0, 13.5]]
    """
    return batch.sweep_over(beam, loads, phrases, values, stiffness, combination).rows()


# --- text -----------------------------------------------------------------------------------------


@worksheet_function
def beam_line(*part: Argument) -> str:
    """Return the canonical text of a beam line joined from its parts, numbers being taken as numbers in any locale.

    Parameters
    ----------
    part
        Marks, lengths and pieces of a line, in order; a range is read cell by cell, its blanks skipped.

    Returns
    -------
    Text that every function takes as its beam.

    Examples
    --------
    >>> beam_line("fix", 6.5, "pin")
    'fixed 6.5 pinned'
    """
    return beam_text(read_line(_joined(part)))


@worksheet_function
def load_line(*part: Argument) -> str:
    """Return the canonical text of loads joined from their parts, numbers being taken as numbers in any locale.

    Parameters
    ----------
    part
        Words, numbers and pieces of clauses, in order; a range is read cell by cell, its blanks skipped. One range of
        whole clauses, or a load table with its header row, is turned into text.

    Returns
    -------
    Text that every function takes as its loads.

    Examples
    --------
    >>> load_line("G: udl", 5.25, "; Q: point", 40, "at", 3)
    'G: udl 5.25; Q: point 40 at 3'
    """
    only = frozen("part 1", part[0]) if len(part) == 1 else None
    loads = only if is_load_table(only) or _holds_clauses(only) else _joined(part)
    return "; ".join(clause_text(clause) for clause in read_clauses(loads))


@worksheet_function
def beam_reads(beam: Argument, stiffness: Argument = None) -> str:
    """Return one plain sentence that says what was understood of a beam, to print beside the numbers.

    Returns
    -------
    Text: marks with their places and support numbers, spans, stiffness, and how the beam is determinate.

    Examples
    --------
    >>> beam_reads("pin 8 roller", 24000)
    'Beam of length 8: pinned at 0 (support 1), roller at 8 (support 2); span 8; EI = 24000; statically determinate.'
    """
    return beam_sentence(read_beam(frozen("beam", beam), frozen("stiffness", stiffness)))


@worksheet_function
def loads_read(beam: Argument, loads: Argument) -> str:
    """Return one plain sentence that says what was understood of the loads on a beam, to print beside the numbers.

    Returns
    -------
    Text: each load with its case, size and place from the left end, and the total force.

    Examples
    --------
    >>> loads_read("pinned 6 roller", "G: udl 5; Q: point 40 at 2")
    '2 loads: G: distributed 5 from x = 0 to 6; Q: point 40 at x = 2; in all 70 downward, before any factors.'
    """
    line = read_line(frozen("beam", beam))
    return loads_sentence(line, read_loads(frozen("loads", loads), line))


@worksheet_function
def fault(beam: Argument, loads: Argument, stiffness: Argument = None, combination: Argument = None) -> str:
    """Return why a beam cannot be solved, in one line; blank text when all is well.

    Returns
    -------
    Text: which argument, what was read, and what would be right.

    Raises
    ------
    Nothing: what other functions raise, this one says.

    Examples
    --------
    >>> fault("fixed 8 pinned", "udl 12")
    ''
    >>> fault("fixed 8 pinned", "udl 12 from 2 to 12")
    "loads, clause 1: 'from 2 to 12' ends beyond the beam (length 8)"
    """
    try:
        line = read_beam(frozen("beam", beam), frozen("stiffness", stiffness))
        free = read_loads(frozen("loads", loads), line).free
        factors = read_combination(frozen("combination", combination))
        if free or has_two_factors(factors):
            result = adverse(beam, loads, stiffness)
            result.loads.ranges(factors)
            check(result, None)
        else:
            solved(beam, loads, stiffness, combination).check_forces()
    except BeamError as error:
        return error.reason
    return ""


@worksheet_function
def unit_factor(from_unit: Argument, to_unit: Argument) -> float:
    """Return the number by which a quantity in one unit is multiplied to give it in another.

    Parameters
    ----------
    from_unit
        Unit of the quantity at hand, e.g. 'kN/m', 'kip ft', 'N/mm²'.
    to_unit
        Unit wanted, of the same dimension.

    Returns
    -------
    The factor.

    Raises
    ------
    BeamError
        `#VALUE!` where a unit is not known or the dimensions differ.

    Notes
    -----
    Units and their definitions: the library pint.

    Examples
    --------
    >>> unit_factor("kN m", "N mm")
    1000000.0
    """
    from beamfuncs.units import factor

    return factor(frozen("from_unit", from_unit), frozen("to_unit", to_unit))


# --- what the functions share ---------------------------------------------------------------------------


def _at(
    which: int, beam: Argument, loads: Argument, x: Argument, stiffness: Argument, combination: Argument
) -> float | Rows:
    result = solved(beam, loads, stiffness, combination)
    if type(x) is float:
        return result.value(which, x)
    return _each("x", x, lambda where, cell: result.value(which, number(where, cell, "a place"), where))


def _extreme(
    which: int,
    sign: int,
    beam: Argument,
    loads: Argument,
    span: Argument,
    stiffness: Argument,
    combination: Argument,
) -> float:
    result = solved(beam, loads, stiffness, combination)
    number_of_span = None if span is None or not_given(frozen("span", span)) else _one_whole("span", span)
    return result.extreme(which, sign, "span", number_of_span)[0]


def _number_of(points: Argument) -> int:
    """Return the number of places of a table for a chart."""
    number_of_points = POINTS if not_given(frozen("points", points)) else _one_whole("points", points)
    if not 2 <= number_of_points <= MOST_POINTS:
        raise impossible(f"points: {number_of_points}; give from 2 to {MOST_POINTS}")
    return number_of_points


def _extreme_over(
    sign: int, beam: Argument, loads: Argument, phrase: Argument, combinations: Argument, stiffness: Argument
) -> float | Rows:
    result, every = adverse(beam, loads, stiffness), read_combinations(frozen("combinations", combinations))
    return _each("phrase", phrase, lambda _, cell: extreme(result, read_phrase(cell), every, sign).governing.value)


def _influence_line(beam: Argument, phrase: Argument, stiffness: Argument) -> InfluenceLine:
    line = read_beam(frozen("beam", beam), frozen("stiffness", stiffness))
    asked = read_phrase(_one_cell("phrase", phrase))
    if not asked.of_one_place:
        raise unreadable(
            "phrase: an influence line belongs to one place; ask for a reaction or for e.g. 'moment at 3', and for the"
            " highest or lowest of an extreme"
        )
    place = asked.place(line)
    if isinstance(place, Section):
        check_field(line, place.which)
    check_forces(forces_need(line, imposed=False))
    return influence_lines(line, [place])[0]


def _each(argument: str, cells: Argument, answer: Callable[[str, Cell], float]) -> float | Rows:
    """Return the answer for a cell, or for each cell of a range."""
    if is_range(cells):
        return each(argument, cells, answer)
    return answer(argument, _one_cell(argument, cells))


def _number_or_none(argument: str, value: Argument) -> float | None:
    return None if not_given(frozen(argument, value)) else number(argument, _one_cell(argument, value))


def _one_whole(argument: str, value: Argument) -> int:
    return whole(argument, _one_cell(argument, value))


def _one_cell(argument: str, value: Argument) -> Cell:
    cell = frozen(argument, value)
    if isinstance(cell, tuple):
        raise unreadable(f"{argument}: a range of {len(cell)} by {len(cell[0])} cells; give one cell")
    return cell


def _holds_clauses(value: Frozen) -> bool:
    """Tell whether a range holds clauses and not single words: some cell holds a word and more."""
    return isinstance(value, tuple) and any(isinstance(cell, str) and len(cell.split()) > 1 for cell in flat(value))


def _joined(parts: tuple[Argument, ...]) -> str:
    words = []
    for n, part in enumerate(parts, 1):
        value = frozen(f"part {n}", part)
        if value is None:
            raise unreadable(f"part {n}: blank; give a mark, a number or a piece of text")
        words += [
            cell if isinstance(cell, str) else as_text(number(f"part {n}", cell))
            for cell in flat(value)
            if cell is not None
        ]
    return " ".join(words)
