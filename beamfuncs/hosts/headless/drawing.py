"""A drawing of one beam: its supports and loads, and the lines of its shear and moment, as SVG text.

Lengths are to scale along the beam; the heights of loads and lines are to scale within one drawing. The shear is drawn
upward where positive, the moment on the tension side: sagging below the axis.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Iterator, Sequence
from itertools import groupby, pairwise

from beamfuncs.beam import Beam
from beamfuncs.cells import Argument, as_text, frozen
from beamfuncs.errors import BeamError
from beamfuncs.fields import LEFT, MOMENT, RIGHT, SHEAR
from beamfuncs.hosts.headless.canvas import INK, LINE_HEIGHT, Box, Canvas, Point, width_of
from beamfuncs.hosts.headless.peaks import Peak, peaks
from beamfuncs.hosts.headless.symbols import End, mark_sign, spring_words, thicknesses
from beamfuncs.loads import Couple, Curvature, Distributed, Load, Loads, Rotation, Settlement
from beamfuncs.loads import Point as PointLoad
from beamfuncs.notation import beam_text, read_beam, read_combination, read_loads
from beamfuncs.results import Result
from beamfuncs.solving import solved

WIDTH = 620.0
MARGIN = 40.0
MOST_LOADS = 40
"""Of more loads the first are drawn, and the rest counted."""
STATIONS, STATIONS_A_LENGTH, MOST_STATIONS = 121, 12, 3001
LONGEST_NAME = 24
LONGEST_NUMBER = 9
LONGEST_LINE = 90

SHEAR_COLOUR, SHEAR_FILL = "#00558c", "#dcebf5"
MOMENT_COLOUR, MOMENT_FILL = "#a03c00", "#fbe6d8"
"""Blue and vermilion: told apart in every common kind of colour vision; the shear is hatched as well."""
LOAD_FILL, GREY, DASHES = "#e6e6e6", "#6e6e6e", "4 3"

BLOCK = 22.0
"""Height of the largest distributed load."""
LOWEST_ARROW = 6.0
LANE = BLOCK + LINE_HEIGHT + 5
CLEAR = 13.0
"""What is left free between the axis and a load."""
STEM = 30.0
LINES = 70.0
"""Height of the shear line, and of the moment line, from its least to its largest value."""
STRAIGHT = 0.08
"""How far a line may be drawn from where it is."""


def drawing(beam: Argument, loads: Argument, stiffness: Argument = None, combination: Argument = None) -> str:
    """Return a drawing of a beam under its loads, as the text of an SVG.

    The arguments are those of the worksheet functions. Raises `BeamError` where they cannot be read; where the beam is
    read but cannot be solved, the drawing says why in place of the lines.
    """
    line = read_beam(frozen("beam", beam), frozen("stiffness", stiffness))
    placed = read_loads(frozen("loads", loads), line)
    factors = placed.factors(read_combination(frozen("combination", combination)))
    figure = _Figure(line, placed, dict(zip(placed.cases, factors, strict=True)))
    try:
        result = solved(beam, loads, stiffness, combination)
        result.check_forces()
    except BeamError as error:
        figure.say(f"No shear and moment lines: {error.reason}")
    else:
        under = " ".join(str(combination).split()) if combination else ""
        figure.say(f"Shear V and moment M under {under}" if under else "Shear V and moment M, every load taken once")
        figure.lines(result)
    return figure.canvas.svg(f"Beam {beam_text(line)} with its loads")


class _Figure:
    """Draws from the axis of the beam, at height 0, up to the loads and down to the lines."""

    def __init__(self, beam: Beam, loads: Loads, factors: dict[str | None, float]) -> None:
        self.canvas = Canvas(WIDTH)
        self.beam = beam
        self._factors = factors
        drawn = loads.loads[:MOST_LOADS]
        self._distributed = [load for load in drawn if isinstance(load, Distributed)]
        self._lanes = _lanes([(load.start, load.end) for load in self._distributed])
        self._draw_beam()
        points = [(load, self._top(load)) for load in drawn if isinstance(load, PointLoad)]
        for load, top in points:
            self.canvas.keep_clear(Box(self._at(load.x) - 3, top, self._at(load.x) + 3, 0.0))
        self._draw_distributed()
        self._draw_points(points)
        self._y = self._draw_supports() + 4.0
        self._draw_couples([load for load in drawn if isinstance(load, Couple)])
        self._draw_moved([load for load in drawn if isinstance(load, Settlement | Rotation)])
        self._draw_curvatures([load for load in drawn if isinstance(load, Curvature)])
        self._draw_lengths()
        if len(loads.loads) > len(drawn):
            self.say(f"and {len(loads.loads) - len(drawn)} more loads, not drawn")

    def say(self, text: str) -> None:
        """Write lines of text below what is drawn so far."""
        for line in _broken(text):
            self._y += LINE_HEIGHT
            self.canvas.label(line, [(MARGIN, self._y)], "start", fill=INK)

    def _at(self, x: float) -> float:
        return MARGIN + x / self.beam.length * (WIDTH - 2 * MARGIN)

    # --- the beam ---

    def _draw_beam(self) -> None:
        for (a, b), thickness in zip(pairwise(self.beam.x), thicknesses(self.beam), strict=True):
            half = thickness / 2
            left, right = self._at(a), self._at(b)
            self.canvas.polygon([(left, -half), (right, -half), (right, half), (left, half)], fill=INK, stroke="none")

    def _draw_supports(self) -> float:
        """Draw marks and the numbers of the supports, and return how far down they reach."""
        places = [self._at(x) for x in self.beam.x]
        scale = min(1.0, max(0.35, min(b - a for a, b in pairwise(places)) / 26.0))
        numbers = {index: number for number, index in enumerate(self.beam.supports, 1)}
        lowest = 0.0
        for index, (x, mark) in enumerate(zip(places, self.beam.marks, strict=True)):
            end: End = -1 if index == 0 else 1 if index == len(places) - 1 else 0
            reach = mark_sign(self.canvas, x, mark, end, scale)
            if index in numbers:
                words = f"{numbers[index]}: {spring_words(mark)}" if mark.kind == "spring" else f"{numbers[index]}"
                self.canvas.label(words, _down(x, reach + 8.0, 2), font_weight="bold")
            lowest = max(lowest, reach + 8.0 + LINE_HEIGHT / 2)
        return lowest

    def _draw_lengths(self) -> None:
        """Draw the line of dimensions."""
        self._y += 14.0
        y, ticks = self._y, [self._at(x) for x in self.beam.x]
        self.canvas.line([(ticks[0], y), (ticks[-1], y)], stroke=GREY, stroke_width=0.8)
        self.canvas.strokes(((x - 3, y + 3), (x + 3, y - 3)) for x in ticks)
        narrow = any(
            b - a < width_of(_size(size)) + 10 for size, (a, b) in zip(self.beam.lengths, pairwise(ticks), strict=True)
        )
        second_row = False
        for size, run in groupby(range(len(self.beam.lengths)), lambda n: (self.beam.lengths[n], 0 if narrow else n)):
            first, *_, last = [*run] * 2
            middle = (ticks[first] + ticks[last + 1]) / 2
            count = last - first + 1
            words = _size(size[0]) if count == 1 else f"{count} × {_size(size[0])}"
            if width_of(words) + 8 > ticks[last + 1] - ticks[first] or not self.canvas.label(words, [(middle, y)]):
                second_row |= self.canvas.label(words, [(middle, y + LINE_HEIGHT)])
        self._y += LINE_HEIGHT * (1 + second_row)

    # --- loads ---

    def _words(self, load: Load, what: str) -> str:
        case = f"{load.case[:LONGEST_NAME]}: " if load.case else ""
        return case + what

    def _arrow(self, x: float, top: float, bottom: float, down: bool, head: float, style: dict[str, object]) -> None:
        self.canvas.arrows([_upright(x, top, bottom, down)], head, **style)

    def _style(self, load: Load) -> dict[str, object]:
        """A load that the combination leaves out is dashed."""
        return {} if self._factors[load.case] else {"stroke": GREY, "stroke_dasharray": DASHES}

    def _draw_distributed(self) -> None:
        largest = max((max(abs(load.size), abs(load.end_size)) for load in self._distributed), default=0.0)
        for load, lane in zip(self._distributed, self._lanes, strict=True):
            base = -CLEAR - lane * LANE
            left, right = self._at(load.start), self._at(load.end)

            def along(share: float, load: Distributed = load) -> float:
                return load.size + share * (load.end_size - load.size)

            def height(share: float, along: Callable[[float], float] = along) -> float:
                return BLOCK * abs(along(share)) / largest if largest else 0.0

            shares = [0.0, 1.0]
            if load.size * load.end_size < 0.0:
                shares.insert(1, load.size / (load.size - load.end_size))
            tops = [(left + share * (right - left), base - height(share)) for share in shares]
            style = self._style(load)
            self.canvas.polygon([(left, base), *tops, (right, base)], fill=LOAD_FILL, stroke_width=0.9, **style)
            count = max(2, round((right - left) / 20.0))
            arrows = [
                _upright(left + share * (right - left), base - height(share), base, down=along(share) > 0.0)
                for share in (n / count for n in range(count + 1))
                if height(share) >= LOWEST_ARROW
            ]
            self.canvas.arrows(arrows, 4.5, **({"stroke_width": 0.8} | style))
            self._label_distributed(load, left, right, base, height)

    def _label_distributed(
        self, load: Distributed, left: float, right: float, base: float, height: Callable[[float], float]
    ) -> None:
        constant = load.size == load.end_size
        turning = load.size * load.end_size < 0.0
        sizes = [_size(size if turning else abs(size)) for size in (load.size, load.end_size)]
        size = sizes[0] if constant else " to ".join(sizes)
        whole = load.start <= self.beam.near and load.end >= self.beam.length - self.beam.near
        where = "" if whole else f", {_size(load.start)} to {_size(load.end)}"
        shares = (0.5, 0.35, 0.65, 0.2, 0.8, 0.08, 0.92)
        top = base - max(height(0.0), height(1.0)) - LINE_HEIGHT / 2 - 1.0
        spots = [(left + share * (right - left), top - up) for up in (0, 6, LINE_HEIGHT) for share in shares]
        self.canvas.label(self._words(load, size + where), spots)

    def _top(self, load: PointLoad) -> float:
        """Return where the arrow of a force begins: above the distributed loads at its place."""
        over = [
            lane
            for lane, block in zip(self._lanes, self._distributed, strict=True)
            if self._at(block.start) - 4 <= self._at(load.x) <= self._at(block.end) + 4
        ]
        return -CLEAR - (max(over, default=-1) + 1) * LANE - STEM

    def _draw_points(self, loads: Sequence[tuple[PointLoad, float]]) -> None:
        for load, top in loads:
            x = self._at(load.x)
            self._arrow(x, top, -3.0, load.size >= 0.0, 8.0, {"stroke_width": 1.8} | self._style(load))
            words = self._words(load, f"{_size(abs(load.size))} at {_size(load.x)}")
            self.canvas.label(words, _up(x, top - LINE_HEIGHT / 2, 6))

    def _draw_couples(self, loads: Sequence[Couple]) -> None:
        for load in loads:
            x = self._at(load.x)
            self.canvas.turn(x, 0.0, 13.0, load.size >= 0.0, **{"stroke_width": 1.6} | self._style(load))
            words = self._words(load, f"couple {_size(abs(load.size))} at {_size(load.x)}")
            beside = [(x + aside, 21.0) for aside in (0.0, 25.0, -25.0, 50.0, -50.0)]
            self.canvas.label(words, [*beside, *_down(x, 21.0 + LINE_HEIGHT, 5)])
        if loads:
            self._y = max(self._y, 21.0 + LINE_HEIGHT)

    def _draw_moved(self, loads: Sequence[Settlement | Rotation]) -> None:
        """Draw the supports' own movements, one below the other where a support has several."""
        begun: dict[int, int] = {}
        for load in loads:
            row = begun[load.mark] = begun.get(load.mark, -1) + 1
            x, y = self._at(self.beam.x[load.mark]), self._y + 26.0 * row
            style = {"stroke_width": 1.4} | self._style(load)
            if isinstance(load, Settlement):
                self._arrow(x, y, y + 20.0, load.size >= 0.0, 7.0, style)
                what = f"{'sinks' if load.size >= 0.0 else 'rises'} {_size(abs(load.size))}"
            else:
                self.canvas.turn(x, y + 11.0, 8.0, load.size >= 0.0, **style)
                what = f"turns {_size(abs(load.size))}"
            self.canvas.keep_clear(Box(x - 10, y, x + 10, y + 22.0))
            words = self._words(load, what)
            right = [(x + 16.0, y + 10.0 + down) for down in (0.0, LINE_HEIGHT)]
            if not (x < WIDTH - 130 and self.canvas.label(words, right, "start")):
                self.canvas.label(words, [(x - 16.0, place) for _, place in right], "end")
        self._y += 26.0 * (max(begun.values()) + 1) if begun else 0.0

    def _draw_curvatures(self, loads: Sequence[Curvature]) -> None:
        """Draw the bow that each free curvature would give its stretch."""
        lanes = _lanes([(load.start, load.end) for load in loads])
        for load, lane in zip(loads, lanes, strict=True):
            left, right = self._at(load.start), self._at(load.end)
            y, bow = self._y + 10.0 + 32.0 * lane, 7.0 if load.size >= 0.0 else -7.0
            shares = [n / 16 for n in range(17)]
            points = [(left + s * (right - left), y + bow * (4 * s * (1 - s) - 0.5)) for s in shares]
            self.canvas.line(points, stroke_width=1.6, **{"stroke_dasharray": "7 2 1.5 2"} | self._style(load))
            for x, at in (points[0], points[-1]):
                self.canvas.line([(x, at - 4), (x, at + 4)])
            words = self._words(load, f"free curvature {_size(load.size)}, {_size(load.start)} to {_size(load.end)}")
            self.canvas.label(words, [((left + right) / 2, y + 13.0 + down) for down in (0.0, 4.0, LINE_HEIGHT)])
        self._y += 32.0 * (max(lanes) + 1) if lanes else 0.0

    # --- lines ---

    def lines(self, result: Result) -> None:
        """Draw the lines of shear and moment."""
        stations = min(max(STATIONS, STATIONS_A_LENGTH * len(self.beam.lengths)), MOST_STATIONS)
        rows = list(result.diagram(stations))
        self._y += 5.0
        self._line("V", [(row[0], row[1 + SHEAR]) for row in rows], peaks(result, SHEAR), up=1)
        self._line("M", [(row[0], row[1 + MOMENT]) for row in rows], peaks(result, MOMENT), up=-1)

    def _line(self, name: str, points: Sequence[Point], values: Iterable[Peak], up: int) -> None:
        """Draw one line about its axis; `up` is 1 where positive values stand above it."""
        heights = [up * value for _, value in points]
        largest, least = max(0.0, *heights), min(0.0, *heights)
        scale = LINES / (largest - least) if largest > least else 0.0
        axis = self._y + LINE_HEIGHT + 6.0 + largest * scale
        colour, fill = (SHEAR_COLOUR, SHEAR_FILL) if up > 0 else (MOMENT_COLOUR, MOMENT_FILL)
        left, right = self._at(0.0), self._at(self.beam.length)
        exact = [(self._at(x), axis - up * value * scale) for x, value in points]
        curve = _thinned(exact)
        self.canvas.polygon([(left, axis), *curve, (right, axis)], fill=fill, stroke="none")
        if up > 0:
            hatching = (((x, axis), (x, y)) for x, y in _every(exact, 7.0))
            self.canvas.strokes(hatching, stroke=colour, stroke_width=0.5)
        self.canvas.line([(left, axis), (right, axis)], stroke=INK, stroke_width=0.9)
        self.canvas.line(
            [(left, axis), *curve, (right, axis)], stroke=colour, stroke_width=1.7, stroke_linejoin="round"
        )
        for (a, ya), (b, yb) in pairwise([(left, axis), *curve, (right, axis)]):
            self.canvas.keep_clear(Box(a - 0.5, min(ya, yb) - 0.5, b + 0.5, max(ya, yb) + 0.5))
        self.canvas.label(name, [(MARGIN - 24.0, axis)], font_weight="bold", font_size=13)
        for peak in values:
            self._write_peak(peak, axis, up * peak.value * scale, colour)
        self._y = axis - least * scale + LINE_HEIGHT

    def _write_peak(self, peak: Peak, axis: float, height: float, colour: str) -> None:
        """Write a value outside the line; where there is no room, inside it, or beyond the axis if it is low."""
        x, away = self._at(peak.x), 1.0 if height >= 0.0 else -1.0
        anchor, shift = {LEFT: ("end", -3.5), RIGHT: ("start", 3.5)}.get(peak.side, ("middle", 0.0))
        half = LINE_HEIGHT / 2 + 1.5
        ys = [axis - height - away * (half + up) for up in (0.0, 3.0, 6.0)]
        ys.append(axis - height + away * half if abs(height) > 2 * half else axis + away * half)
        self.canvas.label(_value(peak.value), [(x + shift, y) for y in ys], anchor, fill=colour)


def _lanes(extents: Sequence[tuple[float, float]]) -> list[int]:
    """Return for each extent the first lane in which it overlaps no earlier one.

    >>> _lanes([(0, 4), (2, 6), (4, 8)])
    [0, 1, 0]
    """
    lanes: list[list[tuple[float, float]]] = []
    chosen = []
    for start, end in extents:
        free = (n for n, lane in enumerate(lanes) if all(end <= a or b <= start for a, b in lane))
        lane = next(free, len(lanes))
        if lane == len(lanes):
            lanes.append([])
        lanes[lane].append((start, end))
        chosen.append(lane)
    return chosen


def _every(curve: Sequence[Point], step: float) -> Iterator[Point]:
    """Yield the points of a curve about `step` apart."""
    last = curve[0][0]
    for x, y in curve:
        if x - last >= step:
            last = x
            yield x, y


def _upright(x: float, top: float, bottom: float, down: bool) -> tuple[Point, Point]:
    """Return the two ends of an upright arrow, its head last."""
    return ((x, top), (x, bottom)) if down else ((x, bottom), (x, top))


def _thinned(curve: Sequence[Point]) -> list[Point]:
    """Return a curve without the points that a straight line goes through all the same."""
    kept = [curve[0]]
    begin = 0
    for n in range(2, len(curve)):
        (x, y), (a, b) = curve[begin], curve[n]
        between = curve[begin + 1 : n]
        bent = a == x or any(abs(y + (b - y) * (p - x) / (a - x) - q) > STRAIGHT for p, q in between)
        if bent:
            begin = n - 1
            kept.append(curve[begin])
    return [*kept, curve[-1]]


def _up(x: float, y: float, rows: int) -> list[Point]:
    return [(x, y - LINE_HEIGHT * row) for row in range(rows)]


def _down(x: float, y: float, rows: int) -> list[Point]:
    return [(x, y + LINE_HEIGHT * row) for row in range(rows)]


def _size(number: float) -> str:
    """Return a number that was given, cut to six digits where it is long.

    >>> _size(1234567.0), _size(-0.125), _size(1 / 3)
    ('1234567', '−0.125', '0.333333')
    """
    text = as_text(number)
    return _with_minus(text if len(text) <= LONGEST_NUMBER else f"{number:.6g}")


def _value(number: float) -> str:
    """Return a result for a drawing: four digits, the whole part of a large number kept.

    >>> _value(-96.0), _value(12.34567), _value(123456.7), _value(0.0)
    ('−96', '12.35', '123457', '0')
    """
    return _with_minus(f"{number:.0f}" if 1e4 <= abs(number) < 1e9 else f"{number + 0.0:.4g}")


def _with_minus(text: str) -> str:
    return f"−{text[1:]}" if text.startswith("-") else text


def _broken(text: str) -> list[str]:
    from textwrap import wrap

    return wrap(text, LONGEST_LINE)[:4]
