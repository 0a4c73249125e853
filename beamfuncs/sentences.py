"""What was understood of a beam and its loads, in one plain sentence each."""

from __future__ import annotations

from collections.abc import Sequence

from beamfuncs.beam import Beam, Mark
from beamfuncs.loads import Couple, Curvature, Distributed, Load, Loads, Point, Rotation, Settlement, Train
from beamfuncs.stability import mechanism


def beam_sentence(beam: Beam) -> str:
    """Return what was understood of a beam and its stiffness."""
    marks = []
    numbers = {index: number for number, index in enumerate(beam.supports, 1)}
    for index, (x, mark) in enumerate(zip(beam.x, beam.marks, strict=True)):
        name = f" (support {numbers[index]})" if index in numbers else ""
        marks.append(f"{_mark(mark)} at {x:.12g}{name}")
    lengths = [end - start for start, end in (beam.extent("beam", n + 1) for n in range(len(beam.spans)))]
    spans = f"span{'s' * (len(lengths) > 1)} {_listed(lengths)}" if lengths else "no span between supports"
    return f"Beam of length {beam.length:.12g}: {', '.join(marks)}; {spans}; {_stiffness(beam)}; {_statics(beam)}."


def _mark(mark: Mark) -> str:
    if mark.kind != "spring":
        return mark.kind
    turning = f", kr = {mark.kr:.12g}" if mark.kr else ""
    return f"spring kv = {mark.kv:.12g}{turning}"


def _stiffness(beam: Beam) -> str:
    if beam.stiffness is None:
        return "no stiffness given"
    terms = [("EI", beam.stiffness.EI)]
    if beam.stiffness.GA:
        terms.append(("GA", beam.stiffness.GA))
    return ", ".join(f"{name} = {_listed(sizes[:1] if len(set(sizes)) == 1 else sizes)}" for name, sizes in terms)


def _statics(beam: Beam) -> str:
    if mechanism(beam):
        return "a mechanism, which cannot be solved"
    if beam.redundancy == 0:
        return "statically determinate"
    return f"statically indeterminate to degree {beam.redundancy}"


def loads_sentence(beam: Beam, loads: Loads) -> str:
    """Return what was understood of the loads on a beam."""
    words = [_named(load.case, _load(beam, load), free=load.part > 0) for load in loads.loads]
    words += [_named(train.case, _train(train), free=False) for train in loads.trains]
    count = f"{len(words)} load{'s' * (len(words) != 1)}"
    total = sum(load.total for load in loads.loads)
    left_out = ", axles not counted" if loads.trains else ""
    return f"{count}: {'; '.join(words)}; in all {total:.12g} downward{left_out}, before any factors."


def _named(case: str | None, words: str, free: bool) -> str:
    return f"{f'{case}: ' if case else ''}{words}{' where adverse' if free else ''}"


def _train(train: Train) -> str:
    spaced = f" spaced {_listed(train.spacings)}" if train.spacings else ""
    ways = ", going both ways" if train.both_ways else ""
    lane = f", with {train.lane:.12g} along the beam where adverse" if train.lane else ""
    return f"moving axles {_listed(train.axles)}{spaced}{ways}{lane}"


def _load(beam: Beam, load: Load) -> str:
    match load:
        case Distributed():
            size = f"{load.size:.12g}" if load.size == load.end_size else f"{load.size:.12g} to {load.end_size:.12g}"
            return f"distributed {size} from x = {load.start:.12g} to {load.end:.12g}"
        case Point():
            return f"point {load.size:.12g} at x = {load.x:.12g}"
        case Couple():
            return f"clockwise couple {load.size:.12g} at x = {load.x:.12g}"
        case Settlement():
            return f"support {_number(beam, load.mark)} sinks by {load.size:.12g}"
        case Rotation():
            return f"support {_number(beam, load.mark)} turns clockwise by {load.size:.12g}"
        case Curvature():
            return f"free curvature {load.size:.12g} (sagging positive) from x = {load.start:.12g} to {load.end:.12g}"


def _number(beam: Beam, mark: int) -> int:
    return beam.supports.index(mark) + 1


def _listed(numbers: Sequence[float]) -> str:
    words = [f"{number:.12g}" for number in numbers]
    return words[0] if len(words) == 1 else f"{', '.join(words[:-1])} and {words[-1]}"
