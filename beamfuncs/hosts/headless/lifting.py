"""Formulas whose arrays the engine does not work through: refused, for it would give a wrong number instead.

Inside SUMPRODUCT, and in array formulas, a spreadsheet asks LEN(A1:A9) or ISERROR(A1:A9) cell by cell; the engine
asks it of one cell only, or of none, without an error.
"""

from __future__ import annotations

import re

ASKED_OF_ONE = {
    *("ISNUMBER", "ISTEXT", "ISBLANK", "ISERROR", "ISERR", "ISNA", "ISLOGICAL", "ISNONTEXT", "ISEVEN", "ISODD"),
    *("NOT", "N", "T", "LEN", "LEFT", "RIGHT", "MID", "TRIM", "CLEAN", "EXACT", "UPPER", "LOWER", "PROPER", "SEARCH"),
    *("FIND", "SUBSTITUTE", "REPLACE", "REPT", "CODE", "CHAR", "TEXT", "VALUE"),
}
_LIFTING = re.compile(r"\bSUMPRODUCT\(", re.IGNORECASE)
_TOKEN = re.compile(
    r"""
      "(?:[^"]|"")*" | '(?:[^']|'')*'!?
    | (?:_xlfn\.)?(?P<call>[^\W\d][\w.]*)\(
    | (?P<bracket>[(){}])
    | (?P<area>[:\[])
    | \$?[A-Za-z]{1,3}\$?[0-9]+\b | \b(?:TRUE|FALSE)\b
    | (?P<name>[^\W\d][\w.\\]*)(?!!)
    """,
    re.VERBOSE | re.IGNORECASE,
)


def why_not_lifted(formula: str, in_array: bool) -> str:
    """Return why a formula is not handed to the engine, a blank text if it is; `in_array`: it is an array formula.

    >>> why_not_lifted("SUMPRODUCT(--ISERROR(A1:A9))", False)
    'ISERROR of a range inside an array is not worked out cell by cell here: give each cell a formula'
    >>> why_not_lifted("SUMPRODUCT(A1:A9*B1:B9)+LEN(A1)", False)
    ''
    """
    if not in_array and not _LIFTING.search(formula):
        return ""
    open_calls: list[tuple[str, bool]] = []
    areas: list[bool] = []
    for found in _TOKEN.finditer(formula):
        if found["call"] or found["bracket"] in ("(", "{"):
            name = (found["call"] or "").upper()
            lifted = in_array or name == "SUMPRODUCT" or bool(open_calls and open_calls[-1][1])
            open_calls.append((name, lifted))
            areas.append(found["bracket"] == "{")
        elif found["bracket"] and open_calls:
            (name, lifted), area = open_calls.pop(), areas.pop()
            if area and lifted and name in ASKED_OF_ONE:
                return (
                    f"{name} of a range inside an array is not worked out cell by cell here: give each cell a formula"
                )
            if area and areas:
                areas[-1] = True
        elif (found["area"] or found["name"]) and areas:
            areas[-1] = True
    return ""
