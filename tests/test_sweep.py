"""Sweeps answer as the functions do row by row: numbers, errors and reasons."""

from __future__ import annotations

import random
import re
from collections.abc import Iterator

import numpy as np
import pytest
from beams import Beam, beams
from hypothesis import HealthCheck, given, settings

from beamfuncs import batch
from beamfuncs import functions as f
from beamfuncs.errors import NA, NUM, VALUE, BeamError, ErrorValue
from beamfuncs.fields import DEFLECTION, FIELDS, MOMENT, SHEAR, SLOPE
from beamfuncs.results import Result, read_phrase
from beamfuncs.solving import solved

Cells = tuple[str, str, object, str]
"""Beam, loads, stiffness and combination of a row."""

PHRASES = [
    "reaction 1",
    "reaction moment 1",
    "reaction 3",
    "total load",
    *(f"{field} {sign}" for field in FIELDS for sign in ("max", "min")),
    *(f"{field} max in span 2" for field in FIELDS),
    *(f"{field} at 1.7" for field in FIELDS),
    *(f"{field} at support 2 left" for field in FIELDS),
    "shear at 0.9 in span 1 left",
    "moment at 2.3 in span 2",
    "deflection max over length",
    "deflection min in span 1 over length",
    "moment largest",
]
TOLERANCE = 1e-13
"""Of the peak of the field; forces reach 1e-14. See `loose` for motions that cancel."""


def size_of(result: Result, phrase: str) -> float:
    """What an error of a result is measured by: the peak of its field."""
    asked = read_phrase(phrase)
    if asked.quantity == "total load":
        return result.fields.peak(SHEAR)
    which = {"reaction": SHEAR, "reaction moment": MOMENT}.get(asked.quantity)
    return result.fields.peak(FIELDS.index(asked.quantity) if which is None else which) / asked.scale(result.beam)


_NUMBER = re.compile(r"(?<![\w.(-])[0-9.]+(?![\w.])")
WRONG = ("1e400", "0", "-3", "2,5", "six", "", "1e31", "1e-61", "+4.", "5e0")


def altered(text: str, chance: random.Random, wrong: float) -> str:
    """A text in which numbers differ somewhat, and a few are wrong; those that count supports or spans stay."""

    def number(found: re.Match[str]) -> str:
        if re.search(r"(support|span) $", text[: found.start()]) or chance.random() < 0.4:
            return found[0]
        if chance.random() < wrong:
            return chance.choice(WRONG)
        return repr(round(float(found[0]) * chance.uniform(0.8, 1.25), chance.choice((2, 3, 9))))

    return _NUMBER.sub(number, text)


def rows_like(beam: Beam, count: int, chance: random.Random) -> Iterator[Cells]:
    """Rows of the topology of a beam; among them faulty ones, mechanisms, and ones of a stiffness that is not given."""
    for _ in range(count):
        line, loads, stiffness, combination = (altered(text, chance, 0.02) for text in beam.cells)
        given: object = stiffness
        if chance.random() < 0.04:
            line = line.replace("pinned", "hinge", 1) if chance.random() < 0.5 else line.replace("fixed", "free", 1)
        if chance.random() < 0.06:
            given = chance.choice([None, 0.0, 24000.0, "", "24 000", ErrorValue("#REF!"), True])
        yield line, loads, given, combination


def row_by_row(cells: Cells, phrases: list[str]) -> list[float | BeamError]:
    """What the function of a single row answers, its error in every entry where it has none."""
    try:
        answered = f.beam_result(cells[0], cells[1], [phrases], cells[2], cells[3])
    except BeamError as error:
        return [error] * len(phrases)
    assert isinstance(answered, list)
    return answered[0]


def miss(cells: Cells, phrases: list[str], swept: list[float | BeamError], tolerance: float = TOLERANCE) -> str:
    """What of a swept row is not as it is answered by itself; blank text where all is."""
    alone = row_by_row(cells, phrases)
    for phrase, one, many in zip(phrases, alone, swept, strict=True):
        if isinstance(one, BeamError) or isinstance(many, BeamError):
            if not (isinstance(one, BeamError) and isinstance(many, BeamError)):
                return f"{phrase}: {one!r} alone, {many!r} swept"
            if (one.value, one.reason) != (many.value, many.reason):
                return f"{phrase}: {one.reason} alone, {many.reason} swept"
        elif not abs(one - many) <= tolerance * size_of(solved(*cells), phrase):  # type: ignore[arg-type]
            return f"{phrase}: {one!r} alone, {many!r} swept"
    return ""
