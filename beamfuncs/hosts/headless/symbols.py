"""The common signs for supports and other marks of a beam, drawn at the height 0 of its axis."""

from __future__ import annotations

from typing import Literal, TypeAlias

from beamfuncs.beam import Beam, Mark
from beamfuncs.hosts.headless.canvas import Box, Canvas, Point

End: TypeAlias = "Literal[-1, 0, 1]"
"""Whether a mark stands at the left end of the beam, inside, or at the right end."""

THIN = 0.8
HALF_WALL, HALF_RAIL = 15.0, 12.0


def mark_sign(canvas: Canvas, x: float, mark: Mark, end: End, scale: float) -> float:
    """Draw the sign of a mark, and return how far it reaches below the axis."""
    match mark.kind:
        case "fixed":
            reach = _wall(canvas, x, end) if end else _clamp(canvas, x, scale)
        case "guided":
            reach = _slide(canvas, x, end)
        case "pinned":
            reach = _triangle(canvas, x, scale)
            _ground(canvas, x, reach, scale)
        case "roller":
            base = _triangle(canvas, x, 0.8 * scale)
            for side in (-1, 1):
                canvas.circle(x + side * 4.5 * scale, base + 2.6 * scale, 2.6 * scale)
            reach = base + 5.2 * scale
            _ground(canvas, x, reach, scale)
        case "spring":
            reach = _coil(canvas, x, scale, turning=mark.kr > 0.0)
            _ground(canvas, x, reach, scale)
        case "hinge":
            canvas.circle(x, 0, 4.5, stroke_width=1.4)
            return 6.0
        case "step":
            canvas.line([(x, -10), (x, 10)], stroke_width=1.4)
            return 10.0
        case _:
            return 4.0
    return reach + 4.0 * scale


def spring_words(mark: Mark) -> str:
    """Return the stiffnesses of a spring."""
    turning = f", kr {mark.kr:.6g}" if mark.kr else ""
    return f"kv {mark.kv:.6g}{turning}"


def thicknesses(beam: Beam) -> list[float]:
    """Return how thick each length is drawn: by its stiffness where that is given, else changing at each step."""
    if beam.stiffness:
        sizes = sorted(set(beam.stiffness.EI))
        step = min(2.5, 5.0 / len(sizes))
        return [3.0 + step * sizes.index(size) for size in beam.stiffness.EI]
    thickness, result = 3.0, []
    for mark in beam.marks[:-1]:
        if mark.kind == "step":
            thickness = 8.5 - thickness
        result.append(thickness)
    return result


def _wall(canvas: Canvas, x: float, end: End) -> float:
    canvas.line([(x, -HALF_WALL), (x, HALF_WALL)], stroke_width=2.2)
    _hatch(canvas, [(x, y) for y in range(-15, 12, 5)], (5.0 * end, 5.0))
    canvas.keep_clear(Box(x - 6, -HALF_WALL, x + 6, HALF_WALL))
    return HALF_WALL


def _clamp(canvas: Canvas, x: float, scale: float) -> float:
    """An inner support that holds deflection and rotation: a block around the beam, on the ground."""
    half, base = 6.0 * scale, 14.0 * scale
    canvas.polygon([(x - half, -9), (x + half, -9), (x + half, base), (x - half, base)], fill="#8c8c8c")
    _ground(canvas, x, base, scale)
    return base


def _slide(canvas: Canvas, x: float, end: End) -> float:
    """A support that holds rotation alone: rollers between the beam and a wall, inside the beam one on either side."""
    for side in [end] if end else [-1, 1]:
        wall = x + side * 7.0
        if end:
            canvas.line([(x, -10), (x, 10)], stroke_width=2.2)
        for y in (-6.5, 6.5):
            canvas.circle(x + side * 3.6, y, 2.6)
        canvas.line([(wall, -HALF_RAIL), (wall, HALF_RAIL)], stroke_width=1.4)
        _hatch(canvas, [(wall, y) for y in range(-12, 9, 4)], (4.0 * side, 4.0))
    canvas.keep_clear(Box(x - 11, -HALF_RAIL, x + 11, HALF_RAIL))
    return HALF_RAIL


def _triangle(canvas: Canvas, x: float, scale: float) -> float:
    base = 15.0 * scale
    canvas.polygon([(x, 2), (x - 8.5 * scale, base), (x + 8.5 * scale, base)], stroke_width=1.3)
    return base


def _coil(canvas: Canvas, x: float, scale: float, turning: bool) -> float:
    half, top, pitch = 6.0 * scale, 4.0, 3.0 * scale
    zigzag = [(x + (-half if n % 2 else half), top + pitch * (n + 0.5)) for n in range(6)]
    base = top + 6 * pitch + 3.0 * scale
    canvas.line([(x, 1), (x, top), *zigzag, (x, base - 3.0 * scale), (x, base)], stroke_width=1.3)
    if turning:
        spiral = [_on_circle(x, 0, 3.5 + 0.25 * n, 45.0 * n) for n in range(20)]
        canvas.line(spiral, stroke_width=1.2)
    return base


def _on_circle(x: float, y: float, radius: float, degrees: float) -> Point:
    from math import cos, radians, sin

    return x + radius * cos(radians(degrees)), y + radius * sin(radians(degrees))


def _ground(canvas: Canvas, x: float, y: float, scale: float) -> None:
    half = 11.0 * scale
    canvas.line([(x - half, y), (x + half, y)], stroke_width=1.3)
    _hatch(canvas, [(x - half + n * half / 2.5, y) for n in range(1, 6)], (-4.0 * scale, 4.0 * scale))
    canvas.keep_clear(Box(x - half, 0, x + half, y + 4.0 * scale))


def _hatch(canvas: Canvas, starts: list[Point], way: Point) -> None:
    canvas.strokes((((x, y), (x + way[0], y + way[1])) for x, y in starts), stroke_width=THIN)
