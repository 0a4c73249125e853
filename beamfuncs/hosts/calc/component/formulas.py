"""Formulas as text: whether one calls a function by its plain name, and plain names for others.

The office's own names of the functions are long ones. Excel writes `[1]!reaction(...)` for a function of an add-in: the
number counts the workbook's links to other files, and the office keeps it as it is written.
"""

from __future__ import annotations

import re
from typing import Callable, Collection, Dict, Iterable, Mapping

_TEXTS = re.compile(r'"[^"]*"|\'[^\']*\'')
"""Texts, and names of sheets, between their marks; a doubled mark inside ends one and begins the next."""


def calls_to(names: Iterable[str]) -> Callable[[str], bool]:
    """Return a test of whether a formula calls one of these functions by its plain name.

    >>> test = calls_to(["moment_at"])
    >>> [test(f) for f in ("=2*MOMENT_AT(1)", "=my.moment_at(1)", "=[1]!moment_at(1)", '="moment_at(1)"', "=moment_at")]
    [True, False, False, False, False]
    """
    call = re.compile(r"(?<![\w.])(?<!\]!)(?:{})\s*\(".format("|".join(map(re.escape, names))), re.IGNORECASE)
    return lambda formula: bool(call.search(formula)) and bool(call.search(_TEXTS.sub('""', formula)))


def calls_unknown(names: Iterable[str]) -> Callable[[str], bool]:
    """Return a test of whether a formula calls a function that neither the office knows nor is among these.

    The office shows the names of functions that it does not know in small letters. What a numbered link leads to is
    unknown too.

    >>> test = calls_unknown(["moment_at"])
    >>> [test(f) for f in ("=moment_at(1)", "=SUM($Sheet1.A1)", "=IF(_xlfn.xlookup(1;A1:A3;B1:B3);1;2)", '="of x(1)"')]
    [False, False, True, False]
    >>> test("=[1]!moment_at(1)")
    True
    """
    known, call = frozenset(names), re.compile(r"\[\d+\]|(?<![\w.$])[a-z_][\w.]*(?=\s*\()")
    return lambda formula: not known.issuperset(call.findall(_TEXTS.sub('""', formula)))


def shortened(names: Mapping[str, str]) -> "Callable[[str], str]":
    """Return what puts the plain names of functions in the place of their long ones, given by long name.

    >>> shortened({"BEAMFUNCS.CALC.FUNCTIONS.MOMENTAT": "moment_at"})("2*BEAMFUNCS.CALC.FUNCTIONS.MOMENTAT(A1)")
    '2*moment_at(A1)'
    """
    plain: Dict[str, str] = {name.upper(): short for name, short in names.items()}
    call = re.compile(r"(?<![\w.])(?:{})(?=\s*\()".format("|".join(map(re.escape, plain))), re.IGNORECASE)
    return lambda formula: call.sub(lambda found: plain[found[0].upper()], formula)


def unlinked(names: Iterable[str], links: Collection[int]) -> Callable[[str], str]:
    """Return what takes the links of these numbers from before the plain names of functions.

    >>> unlinked(["moment_at"], {2})('=[2]!Moment_At(A1)+[1]!moment_at(A1)&"[2]!moment_at("')
    '=Moment_At(A1)+[1]!moment_at(A1)&"[2]!moment_at("'
    """
    if not links:
        return lambda formula: formula
    numbers, plain = "|".join(map(str, links)), "|".join(map(re.escape, names))
    link = re.compile(r"({})|\[(?:{})\]!(?=(?:{})\s*\()".format(_TEXTS.pattern, numbers, plain), re.IGNORECASE)
    return lambda formula: link.sub(lambda found: found[1] or "", formula)
