"""Which formulas are not evaluated at all: those that no spreadsheet program could have written."""

from __future__ import annotations

import re

LONGEST_FORMULA = 16_384
DEEPEST_NESTING = 256

_TEXT = re.compile(r""""[^"]*"|'[^']*'""")
_BRACKET = re.compile(r"[(){}]")


def why_refused(formula: str) -> str:
    """Return why a formula is not handed to the engine, a blank text if it is.

    >>> why_refused("(" * 300 + "1" + ")" * 300)
    'the formula is nested more than 256 deep'
    """
    if len(formula) > LONGEST_FORMULA:
        return f"the formula is longer than {LONGEST_FORMULA:,} characters"
    if formula.count("(") + formula.count("{") > DEEPEST_NESTING and _depth(formula) > DEEPEST_NESTING:
        return f"the formula is nested more than {DEEPEST_NESTING} deep"
    return ""


def _depth(formula: str) -> int:
    depth = deepest = 0
    for found in _BRACKET.finditer(_TEXT.sub("", formula)):
        depth += 1 if found[0] in "({" else -1
        deepest = max(deepest, depth)
    return deepest
