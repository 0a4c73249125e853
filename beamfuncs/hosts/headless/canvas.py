"""A sheet of SVG to draw on: lines, arrows, and labels that keep clear of each other and of the edges."""

from __future__ import annotations

import math
import re
from collections import defaultdict
from collections.abc import Iterable
from html import escape
from typing import NamedTuple, TypeAlias

Point: TypeAlias = "tuple[float, float]"

INK = "#1a1a1a"
FONT_SIZE = 11.0
LINE_HEIGHT = 13.0
PADDING = 6.0
STRIP = 16.0
_FORBIDDEN = re.compile("[\x00-\x08\x0b\x0c\x0e-\x1f\ud800-\udfff\ufffe\uffff]")
_WIDE = {"m": 0.86, "w": 0.74, "M": 0.86, "W": 0.96, "@": 1.02, "%": 0.9, "−": 0.6, "+": 0.6, "=": 0.6}
_NARROW = frozenset(" .,:;'!|()[]ijlftrI-/")


class Box(NamedTuple):
    """A rectangle of the drawing."""

    left: float
    top: float
    right: float
    bottom: float

    @property
    def strips(self) -> range:
        """The numbers of the upright strips of the sheet in which it lies."""
        return range(int(self.left // STRIP), int(self.right // STRIP) + 1)

    def meets(self, other: Box) -> bool:
        return (
            self.left < other.right and other.left < self.right and self.top < other.bottom and other.top < self.bottom
        )


class Canvas:
    """Collects the elements of a drawing and how far they reach, so that nothing is cut off."""

    def __init__(self, width: float) -> None:
        self.width = width
        self._elements: list[str] = []
        self._labels: list[str] = []
        self._taken: defaultdict[int, list[Box]] = defaultdict(list)  # by the strips of the sheet that they lie in
        self._top, self._bottom = math.inf, -math.inf

    # --- lines ---

    def line(self, points: Iterable[Point], **style: object) -> None:
        """Draw a line from point to point."""
        self._draw("polyline", points, {"fill": "none", "stroke": INK, "stroke_width": 1} | style)

    def strokes(self, lines: Iterable[tuple[Point, Point]], **style: object) -> None:
        """Draw straight lines that are alike."""
        lines = list(lines)
        if lines:
            self._reach(*(y for line in lines for _, y in line))
            path = "".join(f"M{_short(a)} {_short(b)}L{_short(c)} {_short(d)}" for (a, b), (c, d) in lines)
            self._elements.append(f'<path d="{path}"{_attributes({"stroke": INK, "stroke_width": 1} | style)}/>')

    def polygon(self, points: Iterable[Point], **style: object) -> None:
        self._draw("polygon", points, {"fill": "#fff", "stroke": INK, "stroke_width": 1} | style)

    def circle(self, x: float, y: float, radius: float, **style: object) -> None:
        self._reach(y - radius, y + radius)
        attributes = {"fill": "#fff", "stroke": INK, "stroke_width": 1} | style
        place = f'cx="{_short(x)}" cy="{_short(y)}" r="{_short(radius)}"'
        self._elements.append(f"<circle {place}{_attributes(attributes)}/>")

    def arrows(self, lines: Iterable[tuple[Point, Point]], head: float, **style: object) -> None:
        """Draw lines that are alike with a filled head at the end of each."""
        shafts, heads = [], []
        for start, end in lines:
            length = math.dist(start, end)
            way = (end[0] - start[0]) / length, (end[1] - start[1]) / length
            shafts.append((start, (end[0] - head * way[0], end[1] - head * way[1])))
            heads.append(_head(end, way, head))
        self.strokes(shafts, **style)
        self._fill_heads(heads, style)

    def turn(self, x: float, y: float, radius: float, clockwise: bool, **style: object) -> None:
        """Draw an open circle with a head: over the top to the right where it is clockwise, else to the left."""
        way = 1 if clockwise else -1
        angles = [math.radians(-225 + 270 * n / 20) for n in range(21)]
        points = [(x + way * radius * math.cos(a), y + radius * math.sin(a)) for a in angles]
        self.line(points[:-2], **style)
        heading = points[-1][0] - points[-3][0], points[-1][1] - points[-3][1]
        size = math.hypot(*heading)
        self._fill_heads([_head(points[-1], (heading[0] / size, heading[1] / size), 6.0)], style)

    def _fill_heads(self, heads: Iterable[list[Point]], style: dict[str, object]) -> None:
        path = "".join(f"M{'L'.join(f'{_short(x)} {_short(y)}' for x, y in head)}Z" for head in heads)
        if path:
            self._elements.append(f'<path d="{path}"{_attributes({"fill": style.get("stroke", INK)})}/>')

    def _draw(self, tag: str, points: Iterable[Point], style: dict[str, object]) -> None:
        points = list(points)
        self._reach(*(y for _, y in points))
        text = " ".join(f"{_short(x)},{_short(y)}" for x, y in points)
        self._elements.append(f'<{tag} points="{text}"{_attributes(style)}/>')

    # --- labels ---

    def keep_clear(self, box: Box) -> None:
        """Let no label stand in `box`."""
        for strip in box.strips:
            self._taken[strip].append(box)

    def label(self, text: str, places: Iterable[Point], anchor: str = "middle", **style: object) -> bool:
        """Write a label at the first of the `places` where it is clear of the others; say whether it found one.

        A place is the middle of the line of text, or its start or end as `anchor` says.
        """
        long = width_of(text)
        for x, y in places:
            left = x - {"start": 0.0, "middle": 0.5, "end": 1.0}[anchor] * long
            left = max(2.0, min(left, self.width - 2.0 - long))
            box = Box(left - 1.5, y - LINE_HEIGHT / 2, left + long + 1.5, y + LINE_HEIGHT / 2)
            if not any(box.meets(taken) for strip in box.strips for taken in self._taken[strip]):
                self.keep_clear(box)
                self._write(text, left, y, box, style)
                return True
        return False

    def _write(self, text: str, left: float, y: float, box: Box, style: dict[str, object]) -> None:
        self._reach(box.top, box.bottom)
        size = _short(box.right - box.left), _short(box.bottom - box.top - 2)
        self._labels.append(
            f'<rect x="{_short(box.left)}" y="{_short(box.top + 1)}" width="{size[0]}" height="{size[1]}"'
            ' fill="#fff" fill-opacity="0.85"/>'
            f'<text x="{_short(left)}" y="{_short(y + 0.36 * FONT_SIZE)}"{_attributes({"fill": INK} | style)}>'
            f"{escaped(text)}</text>"
        )

    def _reach(self, *ys: float) -> None:
        self._top, self._bottom = min(self._top, *ys), max(self._bottom, *ys)

    # --- the drawing ---

    def svg(self, title: str) -> str:
        """Return the drawing; `title` says in words what it shows."""
        top, height = self._top - PADDING, self._bottom - self._top + 2 * PADDING
        return (
            '<svg xmlns="http://www.w3.org/2000/svg" role="img"'
            f' width="{_short(self.width)}" height="{_short(height)}"'
            f' viewBox="0 {_short(top)} {_short(self.width)} {_short(height)}"'
            f' font-family="Arial, Helvetica, sans-serif" font-size="{_short(FONT_SIZE)}">'
            f"<title>{escaped(title)}</title>"
            f'<rect x="0" y="{_short(top)}" width="{_short(self.width)}" height="{_short(height)}" fill="#fff"/>'
            f"{''.join(self._elements)}{''.join(self._labels)}</svg>\n"
        )


def escaped(text: str) -> str:
    """Return text as it may stand in HTML and XML: nothing in it is a tag, and no character is forbidden there.

    >>> escaped('<b a="1">\\x00&')
    '&lt;b a=&quot;1&quot;&gt;\\ufffd&amp;'
    """
    return escape(_FORBIDDEN.sub("\ufffd", text))


def width_of(text: str) -> float:
    """Return about how long a text is: no font is at hand, so rather too long than too short."""
    return FONT_SIZE * sum(_WIDE.get(c, 0.32 if c in _NARROW else 0.72 if c.isupper() else 0.58) for c in text)


def _head(tip: Point, way: Point, length: float) -> list[Point]:
    """Return the corners of an arrow's head."""
    (x, y), (dx, dy) = tip, way
    half = 0.42 * length
    back_x, back_y = x - length * dx, y - length * dy
    return [tip, (back_x - half * dy, back_y + half * dx), (back_x + half * dy, back_y - half * dx)]


def _attributes(style: dict[str, object]) -> str:
    return "".join(f' {name.replace("_", "-")}="{value}"' for name, value in style.items())


def _short(number: float) -> str:
    """Return a coordinate to a tenth.

    >>> _short(12.04), _short(-0.04)
    ('12', '0')
    """
    return f"{round(number, 1) + 0.0:.1f}".removesuffix(".0")
