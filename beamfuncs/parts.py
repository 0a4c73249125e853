"""Sums of parts, each with that one of its two factors which makes more of it: of values, and along a stretch."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from functools import lru_cache
from itertools import pairwise
from math import comb
from typing import NamedTuple

import numpy as np

from beamfuncs.fields import derivative, roots
from beamfuncs.loads import Factors
from beamfuncs.stiffness import Array


def chosen_factors(values: Array, columns: Sequence[Factors], sign: int) -> tuple[float, tuple[float, ...]]:
    """Return the extreme of the sum of factors times values, and the factor of each that makes it."""
    if not columns:
        return 0.0, ()
    factors = np.array(columns)
    which = np.argmax(sign * factors * values[:, None], axis=1)
    chosen = factors[np.arange(len(columns)), which]
    return float(chosen @ values), tuple(chosen.tolist())


class Piece(NamedTuple):
    """The largest sum of the columns between two places of a stretch: a polynomial, and the factors that make it."""

    start: float
    end: float
    polynomial: tuple[float, ...]
    factors: Array

    @property
    def stationary(self) -> list[float]:
        """The places inside where the derivative is zero."""
        return [s for s in roots(derivative(self.polynomial), self.end) if s > self.start]


def pieces(polynomials: Array, columns: Sequence[Factors], length: float) -> Iterator[Piece]:
    """Yield the pieces of the largest sum of factors times polynomials along [0, length].

    `polynomials` holds a column for each column of the loads, a row for each power.
    """
    factors = np.array(columns).reshape(-1, 2)
    control = bernstein(polynomials, length)
    positive, negative = (control >= 0.0).all(axis=0), (control <= 0.0).all(axis=0)
    larger, smaller = factors.max(axis=1), factors.min(axis=1)
    chosen = np.where(positive, larger, smaller)
    changing = np.flatnonzero(~positive & ~negative & (larger != smaller))
    places = {0.0, length}
    for column in changing:
        places.update(roots(tuple(polynomials[:, column].tolist()), length))
    for start, end in pairwise(sorted(places)):
        powers = ((start + end) / 2) ** np.arange(len(polynomials))
        of_piece = chosen.copy()
        of_piece[changing] = np.where(powers @ polynomials[:, changing] > 0.0, larger[changing], smaller[changing])
        yield Piece(start, end, tuple((polynomials @ of_piece).tolist()), of_piece)


def upper_bound(polynomials: Array, columns: Sequence[Factors], length: float) -> float:
    """Return what the largest sum nowhere exceeds: the same sum of the polynomials' Bernstein coefficients.

    A polynomial is a mean of its coefficients in that form, and the larger of two multiples is convex.
    """
    factors = np.array(columns).reshape(-1, 2)
    control = bernstein(polynomials, length)
    both = np.maximum(control * factors[:, 0], control * factors[:, 1])
    return float(both.sum(axis=1).max())


def bernstein(polynomials: Array, length: float) -> Array:
    """Return the coefficients of polynomials in Bernstein's form on [0, length] (S. N. Bernstein 1912)."""
    scaled = polynomials * (length ** np.arange(len(polynomials)))[:, None]
    converted: Array = _to_bernstein(len(polynomials) - 1) @ scaled
    return converted


@lru_cache
def _to_bernstein(degree: int) -> Array:
    n = degree
    return np.array([[comb(j, k) / comb(n, k) if k <= j else 0.0 for k in range(n + 1)] for j in range(n + 1)])
