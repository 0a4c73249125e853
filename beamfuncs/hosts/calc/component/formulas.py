"""Formulas as text: whether one calls a function by its plain name, and plain names for the office's long ones."""

from __future__ import annotations

import re
from typing import Callable, Dict, Iterable, Mapping

_TEXTS = re.compile(r'"[^"]*"|\'[^\']*\'')
"""Texts, and names of sheets, between their marks; a doubled mark inside ends one and begins the next."""


def calls_to(names: Iterable[str]) -> Callable[[str], bool]:
    """Return a test of whether a formula calls one of these functions by its plain name.

    >>> test = calls_to(["moment_at"])
    >>> [test(f) for f in ("=2*MOMENT_AT(A1)", "=my.moment_at(A1)", '="moment_at(1)"', "=moment_at")]
    [True, False, False, False]
    """
    call = re.compile(r"(?<![\w.])(?:{})\s*\(".format("|".join(map(re.escape, names))), re.IGNORECASE)
    return lambda formula: bool(call.search(formula)) and bool(call.search(_TEXTS.sub('""', formula)))


def calls_unknown(names: Iterable[str]) -> Callable[[str], bool]:
    """Return a test of whether a formula calls a function that neither the office knows nor is among these.

    The office shows the names of functions that it does not know in small letters.

    >>> test = calls_unknown(["moment_at"])
    >>> [test(f) for f in ("=moment_at(1)", "=SUM($Sheet1.A1)", "=IF(_xlfn.xlookup(1;A1:A3;B1:B3);1;2)", '="of x(1)"')]
    [False, False, True, False]
    """
    known, call = frozenset(names), re.compile(r"(?<![\w.$])[a-z_][\w.]*(?=\s*\()")
    return lambda formula: not known.issuperset(call.findall(_TEXTS.sub('""', formula)))


def shortened(names: Mapping[str, str]) -> "Callable[[str], str]":
    """Return what puts the plain names of functions in the place of their long ones, given by long name.

    >>> shortened({"BEAMFUNCS.CALC.FUNCTIONS.MOMENTAT": "moment_at"})("2*BEAMFUNCS.CALC.FUNCTIONS.MOMENTAT(A1)")
    '2*moment_at(A1)'
    """
    plain: Dict[str, str] = {name.upper(): short for name, short in names.items()}
    call = re.compile(r"(?<![\w.])(?:{})(?=\s*\()".format("|".join(map(re.escape, plain))), re.IGNORECASE)
    return lambda formula: call.sub(lambda found: plain[found[0].upper()], formula)
