"""Generators of stable beams for the property tests, each as exact numbers and as cell texts.

Every number is a short decimal, so the text of a cell and the rational number of the exact model
are the same number. The ranges are those an engineer meets in kN and m.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from decimal import Context, Decimal
from fractions import Fraction
from itertools import pairwise
from math import floor, log10

from exact import (
    HOLDS_DEFLECTION,
    HOLDS_ROTATION,
    Couple,
    Curvature,
    Load,
    Mark,
    Mechanism,
    Model,
    Point,
    Rotate,
    Settle,
    Spread,
    solve,
)
from hypothesis import strategies as st

FORCES: tuple[type[Load], ...] = (Spread, Point, Couple)
IMPOSED: tuple[type[Load], ...] = (Settle, Rotate, Curvature)
CASES = ("G", "Q", "S1")


def written(number: Fraction) -> str:
    """The plain decimal text of a number whose decimals end."""
    text = format(Context(prec=60).divide(number.numerator, number.denominator), "f")
    if Fraction(Decimal(text)) != number:
        raise ValueError(f"{number} is no short decimal")
    return text


@dataclass(frozen=True)
class Clause:
    """A load, the case it stands under, and whether its place is written within a span."""

    load: Load
    case: str = ""
    in_span: bool = False


@dataclass(frozen=True, repr=False)
class Beam:
    """A beam with its loads, to be had as an exact `model` and as the texts of four cells."""

    marks: tuple[Mark, ...]
    lengths: tuple[Fraction, ...]
    ei: tuple[Fraction, ...]
    ga: tuple[Fraction, ...] | None
    clauses: tuple[Clause, ...]
    factors: tuple[tuple[str, Fraction], ...] = ()
    """The factor of each case of the combination; empty where loads stand under no case."""

    def __repr__(self) -> str:
        """The cells, by which a failing example is tried again at once."""
        return f"Beam{self.cells}"

    @property
    def model(self) -> Model:
        """The exact model, its loads multiplied by the factors of their cases."""
        factors = dict(self.factors)
        loads = tuple(
            resized(c.load, factors.get(c.case, Fraction(0)) if factors else Fraction(1)) for c in self.clauses
        )
        return Model(self.marks, self.lengths, self.ei, self.ga, loads)

    @property
    def cells(self) -> tuple[str, str, str, str]:
        """The texts of the beam, its loads, its stiffness and its combination."""
        return self.line, self.loads, self.stiffness, self.combination

    @property
    def line(self) -> str:
        """The beam line."""
        parts = [marked(self.marks[0])]
        for length, mark in zip(self.lengths, self.marks[1:], strict=True):
            parts += [written(length), marked(mark)]
        return " ".join(parts)

    @property
    def loads(self) -> str:
        """The clauses of the loads."""
        return "; ".join(f"{c.case}: {self.clause(c)}" if c.case else self.clause(c) for c in self.clauses)

    @property
    def stiffness(self) -> str:
        """The stiffness, as short as its numbers allow."""
        ei = terms(self.ei)
        return ei if self.ga is None else f"EI {ei}; GA {terms(self.ga)}"

    @property
    def combination(self) -> str:
        """The combination, blank where loads stand under no case."""
        return " + ".join(f"{written(factor)} {case}" for case, factor in self.factors)

    @property
    def restrained(self) -> dict[str, Fraction]:
        """A size of each field to measure errors by where the exact field is zero: what the loads
        would raise if resisted.

        Forces and couples count in full, and imposed movements as if the shortest of the beam's
        lengths, with the largest of its stiffnesses, were held at both ends against them.
        """
        ei, short, whole = max(self.ei), min(self.lengths), sum(self.lengths)
        force = Fraction(0)
        for load in self.model.loads:
            match load:
                case Spread():
                    force += (abs(load.first) + abs(load.last)) * (load.end - load.start)
                case Point():
                    force += abs(load.size)
                case Couple():
                    force += abs(load.size) / short
                case Settle():
                    force += 12 * ei * abs(load.size) / short**3
                case Rotate():
                    force += 6 * ei * abs(load.size) / short**2
                case Curvature():
                    force += ei * abs(load.size) / short
        return {
            "shear": force,
            "moment": force * whole,
            "slope": force * whole**2 / min(self.ei),
            "deflection": force * whole**3 / min(self.ei),
        }

    def clause(self, clause: Clause) -> str:
        """One load in words, without its case."""
        load, model = clause.load, Model(self.marks, self.lengths, self.ei, self.ga, ())
        size = written(load.first if isinstance(load, Spread) else load.size)
        match load:
            case Settle() | Rotate():
                kind = type(load).__name__.lower()
                return f"{kind} {size} at support {model.supports.index(load.mark) + 1}"
            case Point() | Couple():
                kind = type(load).__name__.lower()
                span, start, _ = self.span_of(load.at, load.at, clause.in_span)
                return f"{kind} {size} at {written(load.at - start)}{span}"
            case Curvature():
                head = f"curvature {size}"
            case Spread() if load.first == load.last:
                head = f"udl {size}"
            case Spread():
                head = f"varying {size} to {written(load.last)}"
        span, start, end = self.span_of(load.start, load.end, clause.in_span)
        if (load.start, load.end) == (start, end):
            return head + span
        return f"{head} from {written(load.start - start)} to {written(load.end - start)}{span}"

    def span_of(self, start: Fraction, end: Fraction, wanted: bool) -> tuple[str, Fraction, Fraction]:
        """The words, the start and the end of the span that holds a load, or of the whole beam."""
        model = Model(self.marks, self.lengths, self.ei, self.ga, ())
        at = [model.places[i] for i in model.supports]
        for number, (a, b) in enumerate(pairwise(at), 1):
            if wanted and a <= start and end <= b:
                return f" in span {number}", a, b
        return "", model.places[0], model.places[-1]

    def in_units(self, force: Fraction | int, length: Fraction | int) -> Beam:
        """The same beam in units that are `force` and `length` times smaller."""
        f, k = Fraction(force), Fraction(length)

        def load(x: Load) -> Load:
            match x:
                case Spread():
                    return Spread(x.first * f / k, x.last * f / k, x.start * k, x.end * k)
                case Point():
                    return Point(x.size * f, x.at * k)
                case Couple():
                    return Couple(x.size * f * k, x.at * k)
                case Settle():
                    return Settle(x.size * k, x.mark)
                case Rotate():
                    return x
                case Curvature():
                    return Curvature(x.size / k, x.start * k, x.end * k)

        return replace(
            self,
            marks=tuple(replace(m, kv=m.kv * f / k, kr=m.kr * f * k) for m in self.marks),
            lengths=tuple(x * k for x in self.lengths),
            ei=tuple(x * f * k * k for x in self.ei),
            ga=tuple(x * f for x in self.ga) if self.ga else None,
            clauses=tuple(replace(c, load=load(c.load)) for c in self.clauses),
        )

    def mirrored(self) -> Beam:
        """The beam seen from behind: what was at x is at its length less x."""
        end, last = sum(self.lengths), len(self.marks) - 1

        def load(x: Load) -> Load:
            match x:
                case Spread():
                    return Spread(x.last, x.first, end - x.end, end - x.start)
                case Point():
                    return Point(x.size, end - x.at)
                case Couple():
                    return Couple(-x.size, end - x.at)
                case Settle():
                    return Settle(x.size, last - x.mark)
                case Rotate():
                    return Rotate(-x.size, last - x.mark)
                case Curvature():
                    return Curvature(x.size, end - x.end, end - x.start)

        return replace(
            self,
            marks=self.marks[::-1],
            lengths=self.lengths[::-1],
            ei=self.ei[::-1],
            ga=self.ga[::-1] if self.ga else None,
            clauses=tuple(replace(c, load=load(c.load)) for c in self.clauses),
        )


def resized(load: Load, factor: Fraction) -> Load:
    """The load times a factor."""
    if isinstance(load, Spread):
        return replace(load, first=load.first * factor, last=load.last * factor)
    return replace(load, size=load.size * factor)


def marked(mark: Mark) -> str:
    """A mark as it stands in a beam line."""
    if mark.kind != "spring":
        return mark.kind
    stiffness = [mark.kv, mark.kr] if mark.kr else [mark.kv]
    return f"spring({', '.join(map(written, stiffness))})"


def terms(stiffness: tuple[Fraction, ...]) -> str:
    """One number, or one for each length; several whole numbers end in a point, lest they be read as one."""
    if len(set(stiffness)) == 1:
        return written(stiffness[0])
    return " ".join(text if "." in text else f"{text}." for text in map(written, stiffness))


def stable(beam: Beam) -> bool:
    """Whether the exact conditions determine the unloaded beam."""
    try:
        solve(Model(beam.marks, beam.lengths, beam.ei, None, ()))
    except Mechanism:
        return False
    return True


def steadied(beam: Beam) -> Beam:
    """The beam made stable: hinges pinned one by one, then the left end fixed."""
    marks = list(beam.marks)
    while not stable(beam):
        loose = [i for i, mark in enumerate(marks) if mark.kind == "hinge"]
        marks[loose[-1] if loose else 0] = Mark("pinned" if loose else "fixed")
        beam = replace(beam, marks=tuple(marks))
    return beam


def decimals(least: int, most: int, places: int) -> st.SearchStrategy[Fraction]:
    """Numbers from `least` to `most` with so many decimal places."""
    unit = 10**places
    return st.integers(least * unit, most * unit).map(lambda n: Fraction(n, unit))


def magnitudes(least: int, most: int) -> st.SearchStrategy[Fraction]:
    """Numbers of two digits, spread evenly over the powers of ten from `least` to `most`."""
    return st.builds(
        lambda digits, power: Fraction(digits) * Fraction(10) ** power,
        st.integers(10, 99),
        st.integers(least - 1, most - 2),
    )


def beside(size: Fraction, least: int, most: int) -> st.SearchStrategy[Fraction]:
    """Numbers between those powers of ten, of which `size` is no more than some powers away.

    A stiffness so drawn is neither nothing nor rigid beside the beam that it acts on.
    """
    power = floor(log10(size))
    low = max(least, min(power - 2, most - 1))
    return magnitudes(low, max(low + 1, min(power + 3, most)))


ENDS = ("fixed", "pinned", "roller", "guided", "free", "spring")
INNER = ("pinned", "roller", "hinge", "hinge", "step", "spring", "fixed", "guided")


@st.composite
def a_load(draw: st.DrawFn, model: Model, kind: type[Load]) -> Load | None:
    """A load of the kind, somewhere on the beam; None where the beam has no place for it."""
    end = model.places[-1]
    anywhere = st.builds(
        lambda i, part: model.places[i] + model.lengths[i] * part,
        st.integers(0, len(model.lengths) - 1),
        st.integers(0, 20).map(lambda n: Fraction(n, 20)),
    )
    size = decimals(-99, 99, 1)
    if kind is Point:
        return Point(draw(size), draw(anywhere))
    if kind is Couple:
        hinges = {x for x, m in zip(model.places, model.marks, strict=True) if m.kind == "hinge"}
        return Couple(draw(size), draw(anywhere.filter(lambda x: x not in hinges)))
    if kind is Settle or kind is Rotate:
        held = [
            i
            for i, mark in enumerate(model.marks)
            if mark.kind in (HOLDS_DEFLECTION if kind is Settle else HOLDS_ROTATION)
            or (mark.kv if kind is Settle else mark.kr)
        ]
        return kind(draw(decimals(-1, 1, 4)) / 10, draw(st.sampled_from(held))) if held else None
    held_spans = [model.places[i] for i in model.supports]
    start, stop = draw(
        st.one_of(
            st.just((Fraction(0), end)),
            st.sampled_from([*pairwise(held_spans), (Fraction(0), end)]),
            st.tuples(anywhere, anywhere).filter(lambda p: p[0] != p[1]).map(sorted).map(tuple),
        )
    )
    if kind is Curvature:
        return Curvature(draw(decimals(-1, 1, 2)) / 100, start, stop)
    first = draw(size)
    return Spread(first, draw(st.one_of(st.just(first), size)), start, stop)


@st.composite
def beams(
    draw: st.DrawFn,
    most_lengths: int = 8,
    kinds: tuple[type[Load], ...] = (*FORCES, *IMPOSED),
    shear_flexible: bool | None = None,
    most_loads: int = 5,
    cases: bool = True,
) -> Beam:
    """Stable beams with every mark and the given kinds of load.

    `shear_flexible` says whether GA is given (None: either); `cases` allows a combination.
    """
    count = draw(st.integers(1, most_lengths))
    inner, end = st.sampled_from(INNER), st.sampled_from(ENDS)
    kinds_of_marks = [draw(end), *(draw(inner) for _ in range(count - 1)), draw(end)]
    lengths = tuple(draw(st.integers(50, 1200)) / Fraction(100) for _ in range(count))
    uniform = draw(st.booleans())
    one_or_each = [0] * count if uniform else range(count)
    ei = tuple(draw(magnitudes(3, 6)) for _ in set(one_or_each))
    ei = tuple(ei[i] for i in one_or_each)
    with_ga = draw(st.booleans()) if shear_flexible is None else shear_flexible
    ga = None
    if with_ga:
        shear = [draw(beside(ei[i] / lengths[i] ** 2, 3, 7)) for i in set(one_or_each)]
        ga = tuple(shear[i] for i in one_or_each)
    line = []
    for i, kind in enumerate(kinds_of_marks):
        kv = kr = Fraction(0)
        if kind == "spring":
            part = min(i, count - 1)
            kv = draw(beside(ei[part] / lengths[part] ** 3, 1, 6))
            kr = draw(st.just(kr) | beside(ei[part] / lengths[part], 1, 6))
        line.append(Mark(kind, kv, kr))
    beam = steadied(Beam(tuple(line), lengths, ei, ga, ()))

    combined = cases and draw(st.booleans())
    clauses = []
    for _ in range(draw(st.integers(1, most_loads))):
        load = draw(a_load(beam.model, draw(st.sampled_from(kinds))))
        if load is not None:
            case = draw(st.sampled_from(CASES)) if combined else ""
            clauses.append(Clause(load, case, draw(st.booleans())))
    if not clauses:
        # No support can sink or turn: something that any beam can bear.
        end = beam.model.places[-1]
        load = Point(Fraction(10), end) if Point in kinds else Curvature(Fraction(1, 1000), Fraction(0), end)
        clauses.append(Clause(load, CASES[0] if combined else ""))
    factors: tuple[tuple[str, Fraction], ...] = ()
    if combined:
        named = draw(st.lists(st.sampled_from(CASES), min_size=1, unique=True))
        factors = tuple((case, draw(decimals(0, 2, 2))) for case in named)
    return replace(beam, clauses=tuple(clauses), factors=factors)
