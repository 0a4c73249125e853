"""Conditional sums and counts, guarded where the engine would give a wrong number instead of an error.

The engine leaves out of SUMIF, SUMIFS, AVERAGEIF and AVERAGEIFS any cell that is in error, though it
meets the criteria: a total would lack what it cannot know. Its MAXIFS does give the error, so

    SUMIFS(F:F, A:A, B2)   becomes   (SUMIFS(F:F,A:A,c)+0*MAXIFS(F:F,A:A,c))

where `c` stands for `criterion.at(0,2,5,B2)`, which refuses what the engine takes for a criterion that
nothing meets: several criteria at once, such as {1,2} or B2:B9. Only the engine's copy is so written.
"""

from __future__ import annotations

import re
from dataclasses import dataclass, field

CRITERION = "criterion"
"""A function of the engine alone: one criterion handed through, several refused."""

_SAME_ORDER = {"SUMIFS", "AVERAGEIFS"}
_SUM_LAST = {"SUMIF", "AVERAGEIF"}
_FIRST_CRITERION = {"SUMIF": 1, "AVERAGEIF": 1, "COUNTIF": 1, "COUNTIFS": 1}
_CALL = re.compile(r"\b(?:SUM|AVERAGE|COUNT|MAX|MIN)IFS?\(", re.IGNORECASE)
_TOKEN = re.compile(
    r"""
      (?P<whole>"(?:[^"]|"")*" | '(?:[^']|'')*' | \[[^\]]*\])
    | (?:_xlfn\.)?\b(?P<call>(?:SUM|AVERAGE|COUNT)IFS? | (?:MAX|MIN)IFS)\(
    | (?P<mark>[(){},])
    """,
    re.VERBOSE | re.IGNORECASE,
)


@dataclass
class _Open:
    """A call, a parenthesis or a brace that is not closed yet: the arguments read, and the one being read."""

    opening: str
    conditional: str = ""
    arguments: list[str] = field(default_factory=list)
    text: str = ""


def guarded(formula: str, told: str) -> str:
    """Return the formula with its conditional sums and counts guarded; `told` begins a call of `criterion`.

    >>> guarded('COUNTIF(A:A,"x")*2', "criterion.at(0,1,1,")
    'COUNTIF(A:A,criterion.at(0,1,1,"x"))*2'
    """
    if not _CALL.search(formula):
        return formula
    stack = [_Open("")]
    position = 0
    for found in _TOKEN.finditer(formula):
        top = stack[-1]
        top.text += formula[position : found.start()]
        position = found.end()
        if found["call"]:
            stack.append(_Open(found[0], found["call"].upper()))
        elif found["whole"]:
            top.text += found[0]
        elif found["mark"] in "({":
            stack.append(_Open(found[0]))
        elif found["mark"] == "," and top.conditional:
            top.arguments.append(top.text)
            top.text = ""
        elif found["mark"] == ",":
            top.text += ","
        elif len(stack) == 1:
            return formula  # not a formula that closes what it opens: the engine says so
        else:
            stack.pop()
            stack[-1].text += _guarded_call(top, told) if top.conditional else top.opening + top.text + found[0]
    return formula if len(stack) > 1 else stack[0].text + formula[position:]


def _guarded_call(call: _Open, told: str) -> str:
    name = call.conditional
    arguments = [*call.arguments, call.text]
    for index in range(_FIRST_CRITERION.get(name, 2), len(arguments), 2):
        arguments[index] = f"{told}{arguments[index].strip()})"
    if name in _SUM_LAST and len(arguments) == 3:
        summed = [arguments[2], *arguments[:2]]
    elif name in _SAME_ORDER:
        summed = arguments
    else:
        return f"{call.opening}{','.join(arguments)})"
    return f"({call.opening}{','.join(arguments)})+0*MAXIFS({','.join(summed)}))"
