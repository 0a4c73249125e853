"""Combinations made text: each once, in the order in which they come."""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Sequence
from decimal import Decimal
from itertools import combinations as chosen
from itertools import product
from typing import TypeAlias, TypeVar

from beamfuncs.cells import as_text
from beamfuncs.errors import absent, impossible
from beamfuncs.standards.actions import Action

T = TypeVar("T")

Term: TypeAlias = tuple[Decimal, str]
"""A factor and its case. Factors are decimal numbers, so that 1.5 times 0.7 is 1.05 and is written so."""
Terms: TypeAlias = tuple[Term, ...]

MOST = 10_000
"""Combinations in a list."""


def selections(of: Sequence[T], least: int = 0) -> Iterator[tuple[T, ...]]:
    """Yield every choice of some of them, fewest first.

    >>> list(selections("QSW", 2))
    [('Q', 'S'), ('Q', 'W'), ('S', 'W'), ('Q', 'S', 'W')]
    """
    for count in range(least, len(of) + 1):
        yield from chosen(of, count)


def acting(factored: Iterable[tuple[Decimal, Action]]) -> Iterator[Terms]:
    """Yield the terms of actions with their factors, once for each of the ways in which they act."""
    for ways in product(*([(factor, way) for way in action.ways] for factor, action in factored)):
        yield tuple((factor * sign, case) for factor, way in ways for sign, case in way)


def listed(combinations: Iterable[Terms]) -> list[str]:
    """Return the texts of combinations, terms of factor 0 left out, each combination once."""
    found: dict[frozenset[Term], str] = {}
    for combination in combinations:
        terms = [term for term in combination if term[0]]
        if terms:
            found.setdefault(frozenset(terms), _text(terms))
        if len(found) > MOST:
            raise impossible(
                f"actions: they make more than {MOST} combinations; join cases that act together, 'Q1 + Q2 office', or"
                " give the leading one"
            )
    if not found:
        raise absent("actions: no combination is left, since every factor is 0")
    return list(found.values())


def _text(terms: Sequence[Term]) -> str:
    (first, case), *rest = terms
    words = ["-" * (first < 0) + _factored(first, case)]
    words += [f"{'-' if factor < 0 else '+'} {_factored(factor, case)}" for factor, case in rest]
    return " ".join(words)


def _factored(factor: Decimal, case: str) -> str:
    return case if abs(factor) == 1 else f"{as_text(float(abs(factor)))} {case}"
