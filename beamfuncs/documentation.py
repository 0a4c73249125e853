"""The docstrings of the worksheet functions: what they share is written here once and completed into each."""

from __future__ import annotations

import inspect
import re
from collections.abc import Callable
from typing import Any, TypeVar

Function = TypeVar("Function", bound=Callable[..., Any])

PARAMETERS = {
    "beam": "Line of marks and lengths [length], as text 'fixed 8 pinned' or a range with one mark or length a cell.",
    "loads": "Loads as text 'G: udl 5; Q: point 40 at 3', a range of such texts, or a table with a header row."
    " Downward, clockwise and sagging are positive.",
    "stiffness": "EI [force·length²]: one number, one for each length, or text 'EI 24000; GA 5e5'. Blank: not given.",
    "combination": "Factors of the load cases, e.g. '1.35 G + 1.5 Q'. Blank: every load once.",
    "phrase": "What is asked for, or a range of it: 'reaction 2', 'reaction moment 1', 'moment at 3', 'shear at 4"
    " left', 'deflection at 1 in span 2', 'moment at support 2', 'moment max in span 2', 'position of moment max',"
    " 'total load'.",
    "combinations": "Combination or a range of them: '1.35 G + 1.5 Q', '1.35/1.0 G' (adverse/favourable). Blank: every"
    " load once.",
    "points": "Number of evenly spaced places, both ends included; marks and load ends are added to them. Blank or 0:"
    " 21.",
    "x": "Place from the left end [length], or a range of places.",
    "support": "Number of the support, from 1, left to right; free ends, hinges and steps do not count.",
    "span": "Number of the span between two supports, from 1, left to right. Blank or 0: the whole beam.",
}
"""The help of every argument that more than one function takes."""

RAISES = """\
BeamError
    `#VALUE!` where an argument cannot be read or is missing, `#NUM!` where a number is out of range,
    `#N/A` where a support, a span or a place is not there."""

SOLVED_RAISES = f"""\
{RAISES}
    Also `#NUM!` where the beam is a mechanism. `fault` gives the reason."""

SOLVED_NOTES = """\
Linear elastic, small deflections, solved exactly by the direct stiffness method (J. S. Przemieniecki, Theory of
Matrix Structural Analysis, McGraw-Hill 1968). Any consistent units. Verify by independent means."""

FREE_NOTES = """\
A clause that ends in `each span` acts on each span and overhang by itself, one that ends in `each load` as a whole:
there where it is adverse, absent elsewhere. `axles` move over the beam; the whole train counts, and may be off the
beam. With a lane load or several trains, `max` and `min` along the beam are found by a search, not in closed form."""

SECTIONS = ("Parameters", "Returns", "Raises", "Notes", "Examples")
_HEADING = re.compile(r"^(\w+)\n-{3,}\n", re.MULTILINE)


def worksheet_function(function: Function) -> Function:
    """Mark a function as a worksheet function, and complete its docstring with what it shares with others."""
    function.__doc__ = _completed(function)
    function.__worksheet__ = True  # type: ignore[attr-defined]
    return function


def sections(docstring: str) -> dict[str, str]:
    """Return the text of each section of a docstring, the part before the first heading under `""`.

    >>> sections("Return it.\\n\\nReturns\\n-------\\nA number.")
    {'': 'Return it.', 'Returns': 'A number.'}
    """
    summary, *rest = _HEADING.split(inspect.cleandoc(docstring))
    return {"": summary.strip()} | {name: text.strip() for name, text in zip(rest[::2], rest[1::2], strict=True)}


def parameters(text: str) -> dict[str, str]:
    """Return the help of each parameter in a section of parameters.

    >>> parameters("x\\n    Place [length].\\ny\\n    Another.")
    {'x': 'Place [length].', 'y': 'Another.'}
    """
    found: dict[str, str] = {}
    for line in text.splitlines():
        if line and not line[0].isspace():
            found[name := line.strip()] = ""
        elif line.strip():
            found[name] = f"{found[name]} {line.strip()}".strip()
    return found


def _completed(function: Callable[..., Any]) -> str:
    own = sections(function.__doc__ or "")
    told = PARAMETERS | parameters(own.get("Parameters", ""))
    names = list(inspect.signature(function).parameters)
    own["Parameters"] = "\n".join(f"{name}\n    {told[name]}" for name in names)
    if "combinations" in names:
        own.setdefault("Notes", FREE_NOTES)
    solved = {"beam", "loads", "stiffness"} <= set(names)
    own.setdefault("Raises", SOLVED_RAISES if solved else RAISES)
    if solved:
        own["Notes"] = f"{own['Notes']}\n\n{SOLVED_NOTES}" if "Notes" in own else SOLVED_NOTES
    headed = [f"{name}\n{'-' * len(name)}\n{own[name]}" for name in SECTIONS if name in own]
    return "\n\n".join([own[""], *headed]) + "\n"
