"""Rows and columns of a sheet, and the A1 notation that names them."""

from __future__ import annotations

import re
from functools import cache
from typing import NamedTuple, TypeAlias

LAST_ROW, LAST_COLUMN = 1_048_576, 16_384
"""The last row and column that a sheet can have."""

_CELL = re.compile(r"\$?([A-Za-z]{1,3})\$?([1-9][0-9]*)")

Place: TypeAlias = "tuple[int, int, int]"
"""The number of a sheet, the row and the column of a cell."""


class Area(NamedTuple):
    """A rectangle of cells; its last row and column belong to it."""

    top: int
    left: int
    bottom: int
    right: int

    @property
    def rows(self) -> range:
        return range(self.top, self.bottom + 1)

    @property
    def columns(self) -> range:
        return range(self.left, self.right + 1)

    def __str__(self) -> str:
        first, last = cell_name(self.top, self.left), cell_name(self.bottom, self.right)
        return first if first == last else f"{first}:{last}"

    @property
    def fixed(self) -> str:
        """The name of the area that stays when its formula is copied, such as `$B$2:$D$5`."""
        corners = ((self.top, self.left), (self.bottom, self.right))
        first, last = (f"${column_name(column)}${row}" for row, column in corners)
        return first if first == last else f"{first}:{last}"

    def cells(self) -> list[tuple[int, int]]:
        """Return row and column of every cell, in reading order."""
        return [(row, column) for row in self.rows for column in self.columns]

    def holds(self, row: int, column: int) -> bool:
        return self.top <= row <= self.bottom and self.left <= column <= self.right


def area(text: str) -> Area:
    """Return the area that a text such as `B2` or `$B$2:D5` names.

    >>> area("$B$2:D5")
    Area(top=2, left=2, bottom=5, right=4)
    """
    first, _, last = text.partition(":")
    return Area(*_row_and_column(first), *_row_and_column(last or first))


def cell_name(row: int, column: int) -> str:
    """Return the name of one cell.

    >>> cell_name(12, 28)
    'AB12'
    """
    return f"{column_name(column)}{row}"


@cache
def column_name(column: int) -> str:
    """Return the letters of a column counted from 1."""
    letters = ""
    while column:
        column, rest = divmod(column - 1, 26)
        letters = chr(ord("A") + rest) + letters
    return letters


@cache
def column_number(letters: str) -> int:
    """Return the number, from 1, of a column named by its letters."""
    if not letters.isascii() or not letters.isalpha():
        raise ValueError(f"{letters!r} names no column")
    number = 0
    for letter in letters.upper():
        number = number * 26 + ord(letter) - ord("A") + 1
    return number


def sheet_prefix(sheet: str) -> str:
    """Return what stands before a reference to another sheet.

    >>> sheet_prefix("Mo's beams")
    "'Mo''s beams'!"
    """
    return "'" + sheet.replace("'", "''") + "'!"


def _row_and_column(name: str) -> tuple[int, int]:
    found = _CELL.fullmatch(name)
    if not found:
        raise ValueError(f"{name!r} names no cell")
    row, column = int(found[2]), column_number(found[1])
    if row > LAST_ROW or column > LAST_COLUMN:
        raise ValueError(f"{name!r} lies beyond the last cell of a sheet")
    return row, column
