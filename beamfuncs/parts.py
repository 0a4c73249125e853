"""Sums of parts, each with that one of its two factors which makes more of it: of values, and along a stretch."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from functools import lru_cache
from itertools import pairwise
from math import comb
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from beamfuncs.fields import derivative, evaluate, roots
from beamfuncs.loads import Factors
from beamfuncs.stiffness import Array

NOISE = 1e-13
"""A value below this part of the largest that is met with it is rounding, and is zero."""


def chosen_factors(values: Array, columns: Sequence[Factors], sign: int) -> tuple[float, tuple[float, ...]]:
    """Return the extreme of the sum of factors times values, and the factor of each that makes it.

    What does nothing gets the smaller of its factors: it is not among those that govern.
    """
    if not columns:
        return 0.0, ()
    factors = np.array(columns)
    rows = np.arange(len(columns))
    chosen = factors[rows, np.argmax(sign * factors * values[:, None], axis=1)]
    idle = np.abs(values) <= NOISE * np.abs(values).max()
    chosen[idle] = factors[rows, np.argmin(np.abs(factors), axis=1)][idle]
    return float(chosen @ values), tuple(chosen.tolist())


class Piece(NamedTuple):
    """The largest sum of the columns along a piece from `x` on: a polynomial in the distance from there."""

    x: float
    length: float
    polynomial: tuple[float, ...]


@dataclass(frozen=True)
class Parts:
    """A field of all columns along a beam, in pieces on which no column changes its sign.

    `polynomials` holds [piece, power, column] in the distance from the `x` of the piece, `positive` which columns are
    above zero.
    """

    x: Array
    lengths: Array
    polynomials: Array
    positive: NDArray[np.bool_]

    @classmethod
    def of(cls, stretches: Sequence[tuple[float, float, Array]]) -> Parts:
        """Return the parts along stretches, each given by its x, its length, and the polynomials of the columns."""
        x, lengths, polynomials = [], [], []
        for start, length, of_columns in stretches:
            control = _bernstein(of_columns.T, np.array(length)).T
            places = {0.0, length}
            for column in np.flatnonzero((control > 0.0).any(axis=0) & (control < 0.0).any(axis=0)):
                places.update(roots(tuple(of_columns[:, column].tolist()), length))
            for a, b in pairwise(sorted(places)):
                x.append(start + a)
                lengths.append(b - a)
                polynomials.append(_moved(of_columns, a))
        every = np.array(polynomials)
        middles = np.vander(np.array(lengths) / 2, every.shape[1], True)
        return cls(np.array(x), np.array(lengths), every, np.einsum("kp,kpn->kn", middles, every) > 0.0)

    def pieces(self, columns: Sequence[Factors], sign: int) -> Iterator[Piece]:
        """Yield the pieces of the largest sum of `sign` times factors times the columns."""
        _, sums = self._sums(columns, sign)
        for x, length, polynomial in zip(self.x.tolist(), self.lengths.tolist(), sums.tolist(), strict=True):
            yield Piece(x, length, tuple(polynomial))

    def largest(self, columns: Sequence[Factors], sign: int) -> tuple[float, float, tuple[float, ...]]:
        """Return the largest of these sums, its place, and the factors that make it.

        A polynomial is a mean of its Bernstein coefficients, so that the largest of them bounds it.
        """
        chosen, sums = self._sums(columns, sign)
        control = _bernstein(sums, self.lengths[:, None])
        k = int(
            np.argmax(np.maximum(control[:, 0], control[:, -1]))
        )  # the first and the last are the values at the ends
        at_end = control[k, -1] > control[k, 0]
        best, place = float(control[k, -1 if at_end else 0]), float(self.x[k] + self.lengths[k] * at_end)
        bounds = control.max(axis=1)
        for n in np.argsort(-bounds, kind="stable").tolist():
            if bounds[n] <= best:
                break
            polynomial = tuple(sums[n].tolist())
            for s in roots(derivative(polynomial), float(self.lengths[n])):
                value = evaluate(polynomial, s)
                if value > best:
                    k, best, place = n, value, float(self.x[n] + s)
        if abs(best) < NOISE * np.abs(control).max():
            best = 0.0
        return best, place, tuple(chosen[k].tolist())

    def _sums(self, columns: Sequence[Factors], sign: int) -> tuple[Array, Array]:
        """Return for each piece the factors that make `sign` times the sum largest, and that polynomial."""
        factors = np.array(columns).reshape(-1, 2)
        chosen = np.where(self.positive == (sign > 0), factors.max(axis=1), factors.min(axis=1))
        return chosen, sign * np.einsum("kpn,kn->kp", self.polynomials, chosen)


def _moved(polynomials: Array, by: float) -> Array:
    """Return polynomials, a row each power, in the distance from `by` (Taylor's series)."""
    powers = len(polynomials)
    shift = np.array([[comb(n, k) * by ** (n - k) if k <= n else 0.0 for n in range(powers)] for k in range(powers)])
    moved: Array = shift @ polynomials
    return moved


def _bernstein(polynomials: Array, lengths: Array) -> Array:
    """Return the coefficients of polynomials, a row each, in the form of S. N. Bernstein (1912) on [0, length]."""
    powers = polynomials.shape[1]
    converted: Array = polynomials * lengths ** np.arange(powers) @ _to_bernstein(powers - 1)
    return converted


@lru_cache
def _to_bernstein(degree: int) -> Array:
    n = degree
    return np.array([[comb(j, k) / comb(n, k) if k <= j else 0.0 for j in range(n + 1)] for k in range(n + 1)])
