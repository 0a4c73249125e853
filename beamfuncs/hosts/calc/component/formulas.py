"""Formulas as text: whether one calls a function by its plain name, and plain names for others.

The office's own names of the functions are long ones. Excel writes `[1]!reaction(...)` for a function of an add-in: the
number counts the workbook's links to other files, and the office keeps it as it is written.
"""

from __future__ import annotations

import re
from typing import Callable, Collection, Dict, Iterable, Mapping

_TEXTS = re.compile(r'"[^"]*"|\'[^\']*\'')
"""Texts, and names of sheets, between their marks; a doubled mark inside ends one and begins the next."""
_COLUMN = re.compile(r"\[(?!\d+\])[^\[\]]*\]")
"""A column of a table, between its marks."""
_WORD = re.compile(r"\[\d+\]|(?<![\w.$])[^\W\d][\w.]*")


def calls_to(names: Iterable[str]) -> Callable[[str], bool]:
    """Return a test of whether a formula calls one of these functions by its plain name.

    >>> test = calls_to(["moment_at"])
    >>> [test(f) for f in ("=2*MOMENT_AT(1)", "=my.moment_at(1)", "=[1]!moment_at(1)", '="moment_at(1)"', "=moment_at")]
    [True, False, False, False, False]
    """
    call = re.compile(r"(?<![\w.])(?<!\]!)(?:{})\s*\(".format("|".join(map(re.escape, names))), re.IGNORECASE)
    return lambda formula: bool(call.search(formula)) and bool(call.search(_TEXTS.sub('""', formula)))


def uses_of(names: Collection[str]) -> Callable[[str], bool]:
    """Return a test of whether a formula uses one of these defined names.

    >>> [uses_of(["Far"])(f) for f in ("of:=2*FAR", "of:=Farther", "of:=Far(1)", 'of:="Far"', "of:=[$Far.A1]")]
    [True, False, False, False, False]
    """
    if not names:
        return lambda formula: False
    use = re.compile(r"(?<![\w.$])(?:{})(?![\w.(])".format("|".join(map(re.escape, names))), re.IGNORECASE)
    return lambda formula: bool(use.search(_TEXTS.sub('""', formula)))


def has_unknown(known: Iterable[str]) -> Callable[[str], bool]:
    """Return a test of whether a formula has a function, name or sheet that the office does not know, none of these.

    The office shows in small letters what it does not know, and defined names as they were defined. What a numbered
    link leads to is unknown too.

    >>> test = has_unknown(["moment_at", "Far", "beams"])
    >>> [test(f) for f in ("=moment_at(far)", "=SUM($plan.A1)", '="of x(1)"', "=SUM(beams[span])", "=1e-3")]
    [False, False, False, False, False]
    >>> [test(f) for f in ("=IF(_xlfn.xlookup(1;A1:A3;B1:B3);1;2)", "=[1]!moment_at(1)", "=missing*2", "=plan9!A1")]
    [True, True, True, True]
    """
    others = frozenset(word.lower() for word in known)

    def test(formula: str) -> bool:
        words = _WORD.findall(_COLUMN.sub("", _TEXTS.sub('""', formula)))
        return any(word == word.lower() and word not in others for word in words)

    return test


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
