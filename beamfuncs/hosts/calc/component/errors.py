"""Error values as the office keeps them in a cell: numbers that are none, each with the code of its error."""

from __future__ import annotations

import struct

CODES = {
    "#NUM!": 503,
    "#VALUE!": 519,
    "#NULL!": 521,
    "#REF!": 524,
    "#NAME?": 525,
    "#DIV/0!": 532,
    "#N/A": 32767,
}
"""The office's codes of the error values that spreadsheets share."""

_NOT_A_NUMBER = 0x7FF8000000000000


def as_number(value: str) -> float:
    """Return the number that a cell shows as an error value; one that the office lacks becomes `#VALUE!`.

    >>> as_number("#N/A")
    nan
    """
    code = CODES.get(value, CODES["#VALUE!"])
    return float(struct.unpack("<d", struct.pack("<Q", _NOT_A_NUMBER | code))[0])
