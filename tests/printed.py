"""Combinations of actions as standards print them, read without the product: sums of factors, with alternatives."""

from __future__ import annotations

import re
from fractions import Fraction
from typing import TypeAlias

Factors: TypeAlias = dict[str, Fraction]
"""The factor of each case, exactly as printed."""

_TOKEN = re.compile(r"\s*([0-9.]+|[^\W\d]\w*|[-+()])")


def printed(text: str) -> list[Factors]:
    """Return every combination that a printed line allows.

    >>> printed("1.2 D + 0.5 (Lr or S)") == [
    ...     {"D": Fraction("1.2"), "Lr": Fraction("0.5")}, {"D": Fraction("1.2"), "S": Fraction("0.5")}
    ... ]
    True
    """
    tokens = _TOKEN.findall(text)
    assert "".join(tokens) == "".join(text.split()), text
    found = _alternatives(tokens)
    assert not tokens, text
    return found


def _alternatives(tokens: list[str]) -> list[Factors]:
    found = _sums(tokens)
    while tokens[:1] == ["or"]:
        tokens.pop(0)
        found += _sums(tokens)
    return found


def _sums(tokens: list[str]) -> list[Factors]:
    found: list[Factors] = [{}]
    while tokens and tokens[0] not in (")", "or"):
        factor = Fraction(1)
        while tokens[0] in ("+", "-"):
            factor *= -1 if tokens.pop(0) == "-" else 1
        if tokens[0][0].isdigit():
            factor *= Fraction(tokens.pop(0))
        token = tokens.pop(0)
        if token == "(":
            inside = _alternatives(tokens)
            assert tokens.pop(0) == ")"
        else:
            inside = [{token: Fraction(1)}]
        found = [left | {case: factor * size for case, size in right.items()} for left in found for right in inside]
    return found
