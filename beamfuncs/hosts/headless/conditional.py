"""Conditional sums and counts, guarded where the engine would give a wrong number instead of an error.

The engine leaves out of SUMIF, SUMIFS, AVERAGEIF and AVERAGEIFS any cell that is in error, though it
meets the criteria: a total would lack what it cannot know. Its MAXIFS does give the error, so

    SUMIFS(F:F, A:A, B2)   becomes   (SUMIFS(F:F,A:A,c)+0*MAXIFS(F:F,A:A,c))

where `c` stands for `criterion.at(0,2,5,B2)`, which refuses what the engine takes for a criterion that
nothing meets: several criteria at once, such as {1,2} or B2:B9. Where the ranges of SUMIFS and the like are of unlike
size, of which the engine makes something, the call becomes `unlike.at(0,2,5)`, an error. Only the
engine's copy is so written.
"""

from __future__ import annotations

import re
from dataclasses import dataclass, field

from beamfuncs.hosts.headless.grid import column_number

CRITERION = "criterion"
"""A function of the engine alone: one criterion handed through, several refused."""

UNLIKE = "unlike"
"""A function of the engine alone: the error of ranges that do not go together."""

_SAME_ORDER = {"SUMIFS", "AVERAGEIFS"}
_SUM_LAST = {"SUMIF", "AVERAGEIF"}
_FIRST_CRITERION = {"SUMIF": 1, "AVERAGEIF": 1, "COUNTIF": 1, "COUNTIFS": 1}
MOST_ROWS = 1_048_576

_RANGES_ALIKE = {"SUMIFS", "AVERAGEIFS", "MAXIFS", "MINIFS", "COUNTIFS"}
_RANGE = re.compile(
    r"""(?:(?:'(?:[^']|'')*'|[\w.]+)!)?
        (?:(?P<l>\$?)(?P<left>[A-Z]{1,3})(?P<t>\$?)(?P<top>[0-9]+)
           (?::(?P<r>\$?)(?P<right>[A-Z]{1,3})(?P<b>\$?)(?P<bottom>[0-9]+))?
          |(?P<c>\$?)(?P<first>[A-Z]{1,3}):(?P<d>\$?)(?P<last>[A-Z]{1,3}))""",
    re.VERBOSE | re.IGNORECASE,
)
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
    if name in _RANGES_ALIKE and len(_sizes(name, arguments)) > 1:
        return f"{told.replace(CRITERION, UNLIKE, 1).rstrip(',')})"
    for index in range(_FIRST_CRITERION.get(name, 2), len(arguments), 2):
        arguments[index] = f"{told}{arguments[index].strip()})"
    if name in _SUM_LAST and len(arguments) == 3:
        summed = [arguments[2], *arguments[:2]]
    elif name in _SAME_ORDER:
        summed = arguments
    else:
        return f"{call.opening}{','.join(arguments)})"
    return f"({call.opening}{','.join(arguments)})+0*MAXIFS({','.join(summed)}))"


def _sizes(name: str, arguments: list[str]) -> set[tuple[int, int]]:
    """Return the different sizes of a call's ranges, of those that are written plainly."""
    ranges = arguments[::2] if name == "COUNTIFS" else [arguments[0], *arguments[1::2]]
    return {size for size in map(_size, ranges) if size}


def _size(text: str) -> tuple[int, int] | None:
    """Return the numbers of rows and columns of a plain range that keeps its size wherever its formula is copied to.

    >>> _size("Plan!$B$2:$C$5"), _size("B:B"), _size("$B$2:B5"), _size("Spans")
    ((4, 2), (1048576, 1), None, None)
    """
    found = _RANGE.fullmatch(text.strip())
    if not found:
        return None
    if found["first"]:
        return (MOST_ROWS, _count(found["first"], found["last"])) if found["c"] == found["d"] else None
    if not found["right"]:
        return 1, 1
    if (found["l"], found["t"]) != (found["r"], found["b"]):
        return None
    rows = abs(int(found["bottom"]) - int(found["top"])) + 1
    return rows, _count(found["left"], found["right"])


def _count(first: str, last: str) -> int:
    return abs(column_number(last) - column_number(first)) + 1
