"""What phrases ask for, answered on many beams of one shape at once."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import NamedTuple, TypeAlias

import numpy as np

from beamfuncs.batch.columns import Array, Flags, Indices
from beamfuncs.batch.fields import Fields, fields
from beamfuncs.batch.placing import Load, Place, ends_of, groups, layout, loads_on, placed
from beamfuncs.batch.shapes import Beams, Shape
from beamfuncs.batch.stiffness import Solved, solve
from beamfuncs.beam import not_on
from beamfuncs.errors import BeamError
from beamfuncs.fields import DEFLECTION, FIELDS, LEFT, RIGHT, SLOPE
from beamfuncs.loads import Curvature, Rotation, Settlement
from beamfuncs.results import REACTION, REACTION_MOMENT, TOTAL_LOAD, Phrase, check_field, check_forces, forces_need

Asked: TypeAlias = Phrase | BeamError
"""A phrase as read, or why it cannot be."""

FEWEST = 4
"""A group of fewer beams is left to be solved one by one, which is faster then."""


class Missing(NamedTuple):
    """Beams on which the place of a phrase does not lie, and how long each is, or its span."""

    entry: int
    phrase: Phrase
    beams: Indices
    lengths: Array

    def error(self, n: int) -> BeamError:
        """Return why the n-th of the beams has no answer."""
        return not_on("phrase", self.phrase.x or 0.0, self.phrase.span, float(self.lengths[n]))


@dataclass(frozen=True)
class Answers:
    """A row for each beam, an entry for each phrase; where no beam has an answer to it, why.

    Beams that are not `done` are left to be solved one by one: something is wrong with them, or rare.
    """

    values: Array
    errors: tuple[BeamError | None, ...]
    done: Flags
    missing: tuple[Missing, ...] = ()


@dataclass(frozen=True)
class _Question:
    """A phrase, its entry in the answers, and the place of each beam that it asks for, if it does."""

    entry: int
    phrase: Phrase
    place: Place | None


def answers(shape: Shape, values: Array, phrases: Sequence[Asked], fewest: int = FEWEST) -> Answers:
    """Return what phrases ask for of beams of one shape, given the values of its slots."""
    errors = tuple(phrase if isinstance(phrase, BeamError) else _error(shape, phrase) for phrase in phrases)
    found = np.full((values.shape[1], len(phrases)), np.nan)
    done = np.zeros(values.shape[1], dtype=bool)
    with np.errstate(all="ignore"):
        beams = Beams.of(shape, values)
        loads, good = loads_on(beams)
        good &= beams.sound() & np.isfinite(values).all(axis=0)
        if forces_need(shape.beam, True) and not forces_need(shape.beam, False):
            for load in loads:
                if load.kind in (Settlement, Rotation, Curvature):
                    good &= load.size == 0.0
        questions, missing = [], []
        for entry, phrase in enumerate(phrases):
            if isinstance(phrase, Phrase) and (errors[entry] is None or phrase.x is not None):
                place, there = _asked(beams, phrase)
                if not there.all():
                    missing.append(_missing(beams, entry, phrase, good & ~there))
                questions.append(_Question(entry, phrase, place))
        chosen = None if good.all() else np.flatnonzero(good)
        if chosen is not None:
            beams, loads, questions = _some(beams, loads, questions, chosen)
        if not beams.count:
            return Answers(found, errors, done)
        ends = [place for load in loads for place in (load.start, load.end)]
        others = [question.place for question in questions if question.place]
        for rows in groups(beams, ends, others):
            at = chosen if rows is None else rows if chosen is None else chosen[rows]
            count = beams.count if rows is None else len(rows)
            if count >= fewest:
                group = (beams, loads, questions) if rows is None else _some(beams, loads, questions, rows)
                block, sound = _answered(*group, errors)
                if at is None:
                    found, done = block, sound
                else:
                    found[at], done[at] = block, sound
    return Answers(found, errors, done, tuple(missing))


def _missing(beams: Beams, entry: int, phrase: Phrase, lacking: Flags) -> Missing:
    first, last = ends_of(beams.shape, phrase.span)
    rows = np.flatnonzero(lacking)
    return Missing(entry, phrase, rows, beams.x[last][rows] - beams.x[first][rows])


def _error(shape: Shape, phrase: Phrase) -> BeamError | None:
    """Return why no beam of a shape can answer a phrase, if that is so."""
    beam = shape.beam
    try:
        beam.extent("phrase", phrase.span)
        if phrase.support is not None:
            beam.support(phrase.support, "phrase")
        if phrase.quantity in FIELDS:
            check_field(beam, FIELDS.index(phrase.quantity))
        if phrase.quantity != TOTAL_LOAD:
            check_forces(forces_need(beam, imposed=False))
    except BeamError as error:
        return error
    return None


def _asked(beams: Beams, phrase: Phrase) -> tuple[Place | None, Flags]:
    """Return the place on each beam that a phrase asks for, if it does, and whether it lies on the beam."""
    good = np.ones(beams.count, dtype=bool)
    if phrase.x is not None:
        try:
            return placed(beams, np.full(beams.count, phrase.x), phrase.span)
        except BeamError:
            return None, good
    if phrase.support is not None and phrase.quantity in FIELDS:
        mark = beams.shape.beam.supports[phrase.support - 1]
        return Place(beams.x[mark], 2 * mark), good
    return None, good


def _some(
    beams: Beams, loads: list[Load], questions: list[_Question], rows: Indices
) -> tuple[Beams, list[Load], list[_Question]]:
    """Return some of the beams with their loads and places."""

    def place(of: Place) -> Place:
        return Place(of.x[rows], of.rank)

    return (
        beams.rows(rows),
        [
            Load(
                load.kind,
                load.size[rows],
                None if load.end_size is None else load.end_size[rows],
                place(load.start),
                place(load.end),
            )
            for load in loads
        ],
        [_Question(q.entry, q.phrase, q.place and place(q.place)) for q in questions],
    )


def _answered(
    beams: Beams, loads: list[Load], questions: list[_Question], errors: tuple[BeamError | None, ...]
) -> tuple[Array, Flags]:
    """Return the answers of a group, and which of its beams have them."""
    ends = [place for load in loads for place in (load.start, load.end)]
    others = [question.place for question in questions if question.place]
    laid = layout(beams, ends, others)
    solved = solve(beams, laid, loads)
    open_ = [question for question in questions if errors[question.entry] is None]
    along = _along(solved, open_)
    found = np.full((beams.count, len(errors)), np.nan)
    good = solved.good & np.isfinite(solved.total)
    extremes: dict[tuple[str, int | None, int | None], Array] = {}
    number = len(ends)
    for question in questions:
        phrase, place, here = question.phrase, question.place, number
        if place:
            number += 1
            side = _side(beams, phrase, laid.ranks[here])
            if side is None:
                return found, np.zeros(beams.count, dtype=bool)
        if errors[question.entry] is not None:
            continue
        if phrase.quantity == TOTAL_LOAD:
            value = solved.total
        elif place and side:
            assert along is not None
            which = FIELDS.index(phrase.quantity)
            value = along.value(which, laid.ranks[here], laid.cut[here], place.x, side)
        elif phrase.sign is not None:
            assert along is not None
            value = _extreme(along, phrase, extremes, [q.phrase for q in open_])
        else:
            mark = beams.shape.beam.support(phrase.support or 0, "phrase")
            value = (solved.reaction_moments if phrase.quantity == REACTION_MOMENT else solved.reactions)[mark]
        if phrase.over_length:
            first, last = ends_of(beams.shape, phrase.span)
            value = value / (beams.x[last] - beams.x[first])
        np.add(value, 0.0, out=found[:, question.entry])
        good = good & np.isfinite(value)
    return found, good


def _side(beams: Beams, phrase: Phrase, rank: int) -> str | None:
    """Return the side of a place that is meant, None where the beam has none there."""
    end = 2 * ends_of(beams.shape, phrase.span)[1]
    side = phrase.side or (LEFT if rank == end else RIGHT)
    return None if rank == (0 if side == LEFT else 2 * len(beams.lengths)) else side


def _along(solved: Solved, questions: list[_Question]) -> Fields | None:
    """Return the fields, as far as they are asked for."""
    quantities = {question.phrase.quantity for question in questions}
    if not quantities - {REACTION, REACTION_MOMENT, TOTAL_LOAD}:
        return None
    return fields(solved, bent=bool(quantities & {FIELDS[SLOPE], FIELDS[DEFLECTION]}))


def _extreme(
    along: Fields,
    phrase: Phrase,
    known: dict[tuple[str, int | None, int | None], Array],
    phrases: list[Phrase],
) -> Array:
    """Return an extreme or its position; one that is asked for both ways is looked for once."""
    key = phrase.quantity, phrase.sign, phrase.span
    which, marks = FIELDS.index(phrase.quantity), ends_of(along.solved.beams.shape, phrase.span)
    assert phrase.sign is not None
    if key not in known:
        positions = any(p.position and (p.quantity, p.sign, p.span) == key for p in phrases)
        value, place = along.extreme(which, phrase.sign, marks, positions)
        known[key] = value if place is None else np.stack([value, place])
    found = known[key]
    return found if found.ndim == 1 else found[int(phrase.position)]
