"""The highest and the lowest of a result over combinations of the loads, and what governs it in words."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from functools import lru_cache
from typing import NamedTuple, TypeAlias

from beamfuncs.adverse import HIGHEST, LOWEST, Adverse, Governing
from beamfuncs.errors import BeamError, unreadable
from beamfuncs.fields import DEFLECTION, FIELDS, MOMENT, SHEAR
from beamfuncs.influence import Held, Section
from beamfuncs.loads import Combination, Couple, Load, Point, Rotation, Settlement, has_two_factors
from beamfuncs.results import TOTAL_LOAD, Phrase, Result, check_field, check_forces, forces_need

Combinations: TypeAlias = Sequence[tuple[str, Combination | None]]
"""The texts of combinations, and what they say."""

SIDES = {"highest": HIGHEST, "lowest": LOWEST}
KEPT = 4_096
"""How many extremes are kept: `governing` asks again for what `highest` has found."""
ENVELOPE = (SHEAR, MOMENT, DEFLECTION)


class Governed(NamedTuple):
    """The extreme of a result over combinations: the text of the one that governs, and what it is made of."""

    combination: str
    governing: Governing


def extreme(beam: Adverse, phrase: Phrase, combinations: Combinations, sign: int) -> Governed:
    """Return the highest (`sign` 1) or the lowest (-1) of what a phrase asks for; of equal ones the first."""
    if phrase.position:
        raise unreadable("phrase: a position has no highest or lowest value; 'governing' tells where an extreme is")
    check(beam, None if phrase.quantity not in FIELDS else FIELDS.index(phrase.quantity))
    best: Governed | None = None
    for text, combination in combinations:
        found = Governed(text, _of_one(beam, phrase, combination, sign))
        if best is None or sign * found.governing.value > sign * best.governing.value:
            best = found
    assert best is not None
    return best


def check(beam: Adverse, which: int | None) -> None:
    """Raise where a result depends on a stiffness that is not given."""
    if which is not None:
        check_field(beam.beam, which)
    imposed = any(load.imposed and load.size for load in beam.loads.loads)
    check_forces(forces_need(beam.beam, imposed))


@lru_cache(KEPT)
def _of_one(beam: Adverse, phrase: Phrase, combination: Combination | None, sign: int) -> Governing:
    found = _unscaled(beam, phrase, combination, sign)
    return found._replace(value=found.value / phrase.scale(beam.beam))


def _unscaled(beam: Adverse, phrase: Phrase, combination: Combination | None, sign: int) -> Governing:
    if phrase.quantity == TOTAL_LOAD:
        if beam.loads.trains:
            raise unreadable("phrase: the total load of a train that moves on and off the beam is not told")
        return beam.total(combination, sign)
    if phrase.sign is None:
        return beam.at(phrase.place(beam.beam), combination, sign)
    which = FIELDS.index(phrase.quantity)
    start, end = beam.beam.extent("phrase", phrase.span)
    if phrase.sign == sign:
        return beam.anywhere(which, combination, sign, start, end)
    if beam.loads.free or has_two_factors(combination):
        name, other = ("highest", "max") if sign == HIGHEST else ("lowest", "min")
        raise unreadable(
            f"phrase: the {name} of '{phrase.quantity} {other}' is told, not that of the opposite extreme, where loads"
            " are free or have two factors"
        )
    factors = beam.loads.factors(combination)
    value, x = Result.of(beam.solution, factors).fields.extreme(which, phrase.sign, start, end)
    return Governing(value, factors, (), x)


def envelope_rows(beam: Adverse, combinations: Combinations, points: int) -> Iterator[list[float | BeamError]]:
    """Yield rows of x and the highest and lowest shear, moment and deflection, an error where no stiffness is given."""
    check(beam, None)
    told = list(ENVELOPE)
    missing: list[float | BeamError] = []
    try:
        check_field(beam.beam, DEFLECTION)
    except BeamError as error:
        told.remove(DEFLECTION)
        missing += [error] * len(SIDES)
    stations = list(beam.stations(points))
    beam.prepare([Section(which, x, side) for which in told for x, side in stations])
    for x, side in stations:
        row: list[float | BeamError] = [x]
        for which in told:
            for sign in SIDES.values():
                values = (beam.at(Section(which, x, side), one, sign).value for _, one in combinations)
                row.append(sign * max(sign * value for value in values) + 0.0)
        yield row + missing


def reaction_rows(beam: Adverse) -> Iterator[list[float | str]]:
    """Yield a row of headers, and for each reaction and reaction moment a row: the value of each case by itself."""
    check(beam, None)
    loads, marks = beam.loads, beam.beam.marks
    free = {case for case, part in loads.columns if part} | {train.case for train in loads.trains}
    asked = [(case, side) for case in loads.cases for side in (SIDES if case in free else ("",))]
    yield ["support", "x", "result", *(f"{case or 'loads'} {side}".strip() for case, side in asked)]
    for turns in (False, True):
        for number, mark in enumerate(beam.beam.supports, 1):
            if not turns or marks[mark].kr > 0.0:
                values = [_alone(beam, Held(mark, turns), case, SIDES.get(side, HIGHEST)) for case, side in asked]
                yield [float(number), beam.beam.x[mark], "reaction moment" if turns else "reaction", *values]


def _alone(beam: Adverse, result: Held, case: str | None, sign: int) -> float:
    """Return the extreme of a result under the loads of one case, unfactored."""
    columns = [(float(one == case), float(one == case and part == 0)) for one, part in beam.loads.columns]
    trains = [(float(train.case == case), 0.0) for train in beam.loads.trains]
    return beam.extreme(result, columns, trains, sign).value


# --- in words -------------------------------------------------------------------------------------------


def sentence(beam: Adverse, governed: Governed) -> str:
    """Return what governs a result: the combination, which free loads are there, where a train and the result stand."""
    text, governing = governed
    told = [text, *_parts(beam, text, governing), *_trains(beam, governing)]
    if governing.x is not None:
        told.append(f"at x = {governing.x:.6g}")
    return "; ".join(told)


def _parts(beam: Adverse, text: str, governing: Governing) -> Iterator[str]:
    """Yield for each case that has free parts which of them are there, and with which factor."""
    of_column = dict(zip(beam.loads.columns, governing.chosen, strict=True))
    for case in beam.loads.cases:
        free = [load for load in beam.loads.loads if load.case == case and load.part]
        by_factor: dict[float, list[str]] = {}
        for load in free:
            by_factor.setdefault(of_column[case, load.part], []).append(_where(beam, load))
        told = [
            f"{'' if factor == 1.0 else f'{factor:g} '}{case or 'load'} on {', '.join(places)}"
            for factor, places in by_factor.items()
            if factor
        ]
        if (case, 0) in of_column and "/" in text:
            yield f"{of_column[case, 0]:g} {case}"
        if free:
            yield " and ".join(told) if told else f"no {case or 'free load'}"


def _where(beam: Adverse, load: Load) -> str:
    match load:
        case Point() | Couple():
            return f"{load.x:.6g}"
        case Settlement() | Rotation():
            return f"support {beam.beam.supports.index(load.mark) + 1}"
    return f"{load.start:.6g} to {load.end:.6g}"


def _trains(beam: Adverse, governing: Governing) -> Iterator[str]:
    for train, position in zip(beam.loads.trains, governing.positions, strict=False):
        name = train.case or "axles"
        if position is None:
            yield f"{name}: not on the beam"
        else:
            others = "" if len(train.axles) == 1 else f", the others to its {'left' if position.reversed else 'right'}"
            off = ", an axle just off the end of the beam" if position.just_off else ""
            lane = ", its lane load where adverse" if train.lane else ""
            yield f"{name}: first axle at x = {position.first_axle:.6g}{others}{off}{lane}"
