"""Where the derivative of many polynomials is zero, in closed form or by brackets that Newton's method closes in on."""

from __future__ import annotations

from collections.abc import Iterator
from itertools import pairwise

import numpy as np

from beamfuncs.batch.columns import Array

MOST_STEPS = 100
NEAR = 1e-9
"""A step shorter than this part of a bracket is the last: Newton's method squares what is left of the error."""


def evaluate(polynomial: tuple[Array, ...], s: Array) -> Array:
    """Return the values of polynomials at `s`, their coefficients being given from the lowest power.

    >>> evaluate((np.array([1.0]), np.array([2.0]), np.array([3.0])), np.array([2.0])).tolist()
    [17.0]
    """
    if len(polynomial) == 1:
        return polynomial[0]
    value = polynomial[-1] * s
    value += polynomial[-2]
    for coefficient in polynomial[-3::-1] if len(polynomial) > 2 else ():
        value *= s
        value += coefficient
    return value


def derivative(polynomial: tuple[Array, ...]) -> tuple[Array, ...]:
    """Return the derivatives of polynomials."""
    return tuple(power * coefficient for power, coefficient in enumerate(polynomial) if power)


def crossings(polynomial: tuple[Array, ...], h: Array, sign: int) -> Iterator[tuple[Array, Array]]:
    """Yield places inside (0, h) where polynomials may be largest (`sign` 1) or smallest (-1), with their values there.

    The value is `-sign` times infinity where there is no such place.
    """
    slope = derivative(polynomial)
    for s in roots(slope, h, -sign):
        inside = (s > 0.0) & (s < h)
        yield s, np.where(inside, evaluate(polynomial, np.where(inside, s, 0.0)), -sign * np.inf)


def roots(polynomial: tuple[Array, ...], h: Array, way: int = 0) -> list[Array]:
    """Return roots from left to right, NaN or beyond (0, h) where there is none.

    With `way` 1 or -1 those may be left out at which the polynomial does not rise, or fall.
    """
    with np.errstate(divide="ignore", invalid="ignore", over="ignore"):
        if len(polynomial) < 2:
            return []
        if len(polynomial) == 2:
            return [-polynomial[0] / polynomial[1]]
        if len(polynomial) == 3:
            return _of_quadratic(*polynomial)
        return _bracketed(polynomial, h, way)


def _of_quadratic(c: Array, b: Array, a: Array) -> list[Array]:
    """Return both roots of c + b s + a s^2, without a difference of nearly equal numbers."""
    q = -0.5 * (b + np.copysign(np.sqrt(b * b - 4.0 * a * c), b))
    one, two = q / a, c / q
    # Where one of them is not finite the other is the root of what is left, a straight line.
    one = np.where(np.isfinite(one), one, two)
    return [np.fmin(one, two), np.fmax(one, two)]


def _bracketed(polynomial: tuple[Array, ...], h: Array, way: int) -> list[Array]:
    """Return the roots between the roots of the derivative, where a polynomial rises or falls all the way."""
    places = [np.zeros_like(h)]
    for s in roots(derivative(polynomial), h):
        # What is no root leaves an interval of no extent.
        places.append(np.fmin(np.fmax(s, places[-1]), h))
    places.append(h)
    values = [polynomial[0], *(evaluate(polynomial, s) for s in places[1:])]
    found = []
    for n, (a, b) in enumerate(pairwise(places)):
        at_a, at_b = values[n], values[n + 1]
        crosses = (at_a < 0.0) != (at_b < 0.0)
        if way:
            crosses &= way * at_b >= way * at_a
        root = np.where((at_b == 0.0) & (b < h), b, np.nan)
        crosses &= (at_a != 0.0) & (at_b != 0.0)
        if crosses.any():
            own = tuple(coefficient[crosses] for coefficient in polynomial)
            root[crosses] = _closed_in(own, a[crosses], b[crosses], at_a[crosses], at_b[crosses])
        found.append(root)
    return found


def _closed_in(polynomial: tuple[Array, ...], a: Array, b: Array, at_a: Array, at_b: Array) -> Array:
    """Return the roots in brackets: Newton's method from where the chord is zero, and halving where it leaves them."""
    slope = derivative(polynomial)
    rises = at_a < 0.0
    s = a + (b - a) * (at_a / (at_a - at_b))
    near = NEAR * (b - a)
    found, open_ = s, None
    for _ in range(MOST_STEPS):
        value = evaluate(polynomial, s)
        left = (value < 0.0) == rises
        a, b = np.where(left, s, a), np.where(left, b, s)
        step = s - value / evaluate(slope, s)
        step = np.where((step >= a) & (step <= b), step, (a + b) / 2)
        going = np.abs(step - s) > near
        s = step
        if open_ is None:
            found = s
        else:
            found[open_] = s
        left_over = np.count_nonzero(going)
        if not left_over:
            break
        if 2 * left_over < len(s):
            # Only those that are not there yet are closed in on further.
            open_ = np.flatnonzero(going) if open_ is None else open_[going]
            s, a, b, rises, near = s[going], a[going], b[going], rises[going], near[going]
            polynomial = tuple(coefficient[going] for coefficient in polynomial)
            slope = tuple(coefficient[going] for coefficient in slope)
    return found
