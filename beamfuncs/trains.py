"""A train of axles on an influence line: the position at which a result is largest, and smallest.

While no axle crosses a break of the line, the result is a cubic in the position of the first axle. So the extremes are
at a crossing or where the derivative is zero: these positions are tried, and no others.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from beamfuncs.beam import NEAR
from beamfuncs.influence import InfluenceLine
from beamfuncs.loads import Train
from beamfuncs.stiffness import Array

NOISE = 1e-13
"""Values below this part of what the axles could do together are rounding, and are zero."""


class Position(NamedTuple):
    """The value of a result, where the first axle stands then, and whether the others stand to its left.

    `just_off` tells that an axle stands on an end of the beam and counts as just beyond it.
    """

    value: float
    first_axle: float
    just_off: bool
    reversed: bool


def extremes(line: InfluenceLine, train: Train) -> tuple[Position, Position]:
    """Return the positions of the largest and the smallest value; of equal ones the first."""
    found: list[Position] = []
    for way, offsets in enumerate(train.offsets):
        found += _positions(line, np.array(offsets), np.array(train.axles), way > 0)
    return max(found, key=lambda p: p.value), min(found, key=lambda p: p.value)


def _positions(line: InfluenceLine, offsets: Array, axles: Array, reversed_: bool) -> tuple[Position, Position]:
    """Return the positions of the largest and the smallest value with the axles at these offsets from the first."""
    breaks, cubics, outside = sums(line, offsets, axles)
    lengths = np.diff(breaks)
    at = np.concatenate([np.zeros((len(lengths), 1)), lengths[:, None], _stationary(cubics, lengths)], axis=1)
    values = _cubic(cubics, at)
    values[np.abs(values) < NOISE * np.abs(axles).sum() * line.size] = 0.0
    places = breaks[:-1, None] + at
    stands = places[:, :, None] + offsets
    near = NEAR * line.x[-1]
    on_tip = (np.abs(stands) <= near) | (np.abs(stands - line.x[-1]) <= near)
    just_off = (on_tip & outside[:, None, :]).any(axis=2)
    tip_places, tip_values = _on_the_tips(line, offsets, axles)
    every = np.concatenate([values.ravel(), tip_values])
    where = np.concatenate([places.ravel(), tip_places])
    off = np.concatenate([just_off.ravel(), np.zeros(len(tip_places), bool)])
    order = np.lexsort((off, where))
    every, where, off = every[order], where[order], off[order]
    high, low = (
        Position(float(every[k]), float(where[k]), bool(off[k]), reversed_)
        for k in (int(np.argmax(every)), int(np.argmin(every)))
    )
    return high, low


def sums(line: InfluenceLine, offsets: Array, axles: Array) -> tuple[Array, Array, NDArray[np.bool_]]:
    """Return the positions of the first axle at which an axle crosses a break, the cubic between each two of them, and
    which axles are beyond the beam there.

    The cubics count from the left one of the two.
    """
    x = np.array(line.x)
    breaks = crossings(x, offsets)
    middles = (breaks[:-1] + breaks[1:]) / 2
    piece = np.searchsorted(x, middles[:, None] + offsets)  # 0 before the beam, len(x) beyond it
    starts = np.concatenate([[0.0], x])[piece]
    cubics = axles[:, None] * line.coefficients[piece]
    outside = (piece == 0) | (piece == len(x))
    return breaks, shifted(cubics, breaks[:-1, None] + offsets - starts).sum(axis=1), outside


def crossings(x: Array, offsets: Array) -> Array:
    """Return the positions of the first axle at which an axle stands at one of the places, those that are one once."""
    positions = np.unique(x[:, None] - offsets)
    apart: Array = positions[np.concatenate([[True], np.diff(positions) > NEAR * x[-1]])]
    return apart


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
