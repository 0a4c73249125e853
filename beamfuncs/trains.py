"""A train of axles on an influence line: the position at which a result is largest, and smallest.

While no axle crosses a break of the line, the result is a cubic in the position of the first axle. So the extremes are
at a crossing or where the derivative is zero: these positions are tried, and no others.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np

from beamfuncs.influence import InfluenceLine
from beamfuncs.loads import Train
from beamfuncs.stiffness import Array

NOISE = 1e-13
"""Values below this part of what the axles could do together are rounding, and are zero."""


class Position(NamedTuple):
    """The value of a result, where the first axle stands then, and whether the others stand to its left."""

    value: float
    first_axle: float
    reversed: bool


def extremes(line: InfluenceLine, train: Train) -> tuple[Position, Position]:
    """Return the positions of the largest and the smallest value; of equal ones the first."""
    found = [_extremes(line, np.array(offsets), np.array(train.axles)) for offsets in train.offsets]
    highest = [Position(*high, reversed=way > 0) for way, (high, _) in enumerate(found)]
    lowest = [Position(*low, reversed=way > 0) for way, (_, low) in enumerate(found)]
    return max(highest, key=lambda p: p.value), min(lowest, key=lambda p: p.value)


def _extremes(line: InfluenceLine, offsets: Array, axles: Array) -> tuple[tuple[float, float], tuple[float, float]]:
    breaks, cubics = sums(line, offsets, axles)
    lengths = np.diff(breaks)
    at = np.concatenate([np.zeros((len(lengths), 1)), lengths[:, None], _stationary(cubics, lengths)], axis=1)
    values = _cubic(cubics, at)
    values[np.abs(values) < NOISE * np.abs(axles).sum() * line.size] = 0.0
    tips = _on_the_tips(line, offsets, axles)
    places = np.concatenate([(breaks[:-1, None] + at).ravel(), tips[0]])
    every = np.concatenate([values.ravel(), tips[1]])
    order = np.argsort(places, kind="stable")
    places, every = places[order], every[order]
    high, low = int(np.argmax(every)), int(np.argmin(every))
    return (float(every[high]), float(places[high])), (float(every[low]), float(places[low]))


def sums(line: InfluenceLine, offsets: Array, axles: Array) -> tuple[Array, Array]:
    """Return the positions of the first axle at which an axle crosses a break, and the cubic between each two of them.

    The cubics count from the left one of the two.
    """
    x = np.array(line.x)
    breaks = np.unique(x[:, None] - offsets)
    breaks = breaks[np.concatenate([[True], np.diff(breaks) > 1e-12 * x[-1]])]
    middles = (breaks[:-1] + breaks[1:]) / 2
    piece = np.searchsorted(x, middles[:, None] + offsets)  # 0 before the beam, len(x) beyond it
    starts = np.concatenate([[0.0], x])[piece]
    cubics = axles[:, None] * line.coefficients[piece]
    return breaks, shifted(cubics, breaks[:-1, None] + offsets - starts).sum(axis=1)


def shifted(cubics: Array, by: Array) -> Array:
    """Return cubics in t where those given are in t + `by` (Taylor's series)."""
    a, b, c, d = np.moveaxis(cubics, -1, 0)
    return np.stack(
        [((d * by + c) * by + b) * by + a, (3 * d * by + 2 * c) * by + b, 3 * d * by + c, d],
        axis=-1,
    )


def _cubic(cubics: Array, at: Array) -> Array:
    a, b, c, d = (cubics[:, n, None] for n in range(4))
    return ((d * at + c) * at + b) * at + a


def _stationary(cubics: Array, lengths: Array) -> Array:
    """Return for each cubic the two places where its derivative is zero, 0 for one that is not inside."""
    b, c, d = cubics[:, 1], 2 * cubics[:, 2], 3 * cubics[:, 3]
    with np.errstate(divide="ignore", invalid="ignore"):
        root = np.sqrt(c * c - 4 * b * d)
        q = -(c + np.copysign(root, c)) / 2  # no difference of nearly equal numbers
        places = np.stack([q / d, b / q], axis=1)
    return np.where((places > 0.0) & (places < lengths[:, None]), places, 0.0)


def _on_the_tips(line: InfluenceLine, offsets: Array, axles: Array) -> tuple[Array, Array]:
    """Return the positions in which one axle stands on the very end of the beam, and the values then.

    Only a section at that end tells them from positions just inside.
    """
    places, values = [], []
    for x, ordinate in zip((line.x[0], line.x[-1]), line.tips, strict=True):
        for offset in offsets:
            first = x - offset
            others = sum(
                force * _ordinate(line, first + other)
                for force, other in zip(axles, offsets, strict=True)
                if other != offset
            )
            places.append(first)
            values.append(others + axles[list(offsets).index(offset)] * ordinate)
    return np.array(places), np.array(values)


def _ordinate(line: InfluenceLine, x: float) -> float:
    return line.value(x) if line.x[0] <= x <= line.x[-1] else 0.0
