"""What a cell or a range may hold: text, numbers and blanks, made hashable; never truth values or dates."""

from __future__ import annotations

import re
from collections.abc import Callable, Iterable, Iterator, Sequence
from datetime import date, time, timedelta
from decimal import Decimal
from math import isfinite
from numbers import Real
from typing import TypeAlias, TypeVar, cast

from beamfuncs.errors import BeamError, ErrorValue, handed_on, impossible, quoted, unreadable

T = TypeVar("T")

Cell: TypeAlias = str | float | None
"""Text, a number, or a blank."""
Range: TypeAlias = Sequence[Sequence[Cell]]
"""Rows of cells."""
Argument: TypeAlias = Cell | Range
"""What a function takes: one cell or a range."""
Frozen: TypeAlias = Cell | tuple[tuple[Cell, ...], ...]
"""An argument made hashable: a cell, or a tuple of rows of more than one cell."""

NUMBER = r"[+-]?(?:[0-9]+(?:\.[0-9]*)?|\.[0-9]+)(?:[eE][+-]?[0-9]+)?"
_NUMBER = re.compile(NUMBER)
_COMMA = re.compile(r"[+-]?[0-9.]*,[0-9][0-9.,eE+-]*")


def frozen(argument: str, value: object) -> Frozen:
    """Return a cell or range as a hashable value; a one-cell range is its cell, blank text is a blank.

    >>> frozen("beam", [["fixed", 8], ["pinned", ""]])
    (('fixed', 8.0), ('pinned', None))
    >>> frozen("beam", [["fixed 8 pinned"]])
    'fixed 8 pinned'
    """
    if not is_range(value):
        return _cell(argument, value)
    rows = tuple(tuple(_cell(where, cell) for where, cell in row) for row in _rows(argument, value))
    cells = [cell for row in rows for cell in row]
    if len(cells) > 1:
        return rows
    return cells[0] if cells else None


def each(argument: str, value: object, answer: Callable[[str, Cell], T]) -> list[list[T | BeamError]]:
    """Return the answer for each cell of a range; a cell that has none gets the error that says why.

    >>> each("x", [[1.0, "2,5"]], number)[0][1].value
    '#VALUE!'
    """
    answers: list[list[T | BeamError]] = []
    for row in _rows(argument, value):
        answers.append([])
        for where, cell in row:
            try:
                answers[-1].append(answer(where, _cell(where, cell)))
            except BeamError as error:
                answers[-1].append(error)
    return answers


def is_range(value: object) -> bool:
    """Tell whether an argument is a range (rows of cells, or an array) and no single cell."""
    return isinstance(value, (list, tuple)) or getattr(value, "ndim", 0) > 0


def _listed(value: object) -> list[object]:
    listed: list[object] = value.tolist() if hasattr(value, "tolist") else list(cast("Sequence[object]", value))
    return listed


def _rows(argument: str, value: object) -> Iterator[Iterator[tuple[str, object]]]:
    """Yield the rows of a range, each cell with the words that name it; a plain list is one row."""
    rows = _listed(value)
    if not any(is_range(row) for row in rows):
        rows = [rows]
    for r, row in enumerate(rows, 1):
        if not is_range(row):
            raise unreadable(
                f"{argument}, row {r}: {quoted(row)} is a cell where a row is due; a range is a list of rows"
            )
        yield ((f"{argument}, row {r}, column {c}", cell) for c, cell in enumerate(_listed(row), 1))


def _cell(where: str, value: object) -> Cell:
    """Return one cell's value: text, float or None."""
    if value is None:
        return None
    if isinstance(value, ErrorValue):
        raise handed_on(where, value)
    if isinstance(value, BeamError):
        raise BeamError(value.value, f"{where}: {value.reason}")
    if isinstance(value, str):
        return str(value) if value and not value.isspace() else None
    if isinstance(value, bool) or type(value).__name__ in ("bool", "bool_"):
        raise unreadable(f"{where}: {str(value).upper()} is a truth value; give a number or text")
    if isinstance(value, (Real, Decimal)):
        try:
            return float(value)
        except (OverflowError, ValueError):
            raise impossible(f"{where}: {quoted(str(value))} is larger than a number can hold") from None
    if isinstance(value, (date, time, timedelta)):
        raise unreadable(f"{where}: {value} is a date or time; give a number or text")
    if is_range(value):
        raise unreadable(f"{where}: a list stands in a cell; a range is a list of rows of cells")
    raise unreadable(f"{where}: a value of type {type(value).__name__}; a cell holds text, a number or nothing")


def flat(value: Frozen) -> Iterable[Cell]:
    """Return the cells in reading order."""
    return (cell for row in value for cell in row) if isinstance(value, tuple) else (value,)


def rows_of(value: Frozen) -> tuple[tuple[Cell, ...], ...]:
    """Return the argument as rows, one cell being one row."""
    return value if isinstance(value, tuple) else ((value,),)


def is_number(text: str) -> bool:
    """Tell whether text is a number written with a decimal point.

    >>> is_number("6.5"), is_number("6,5"), is_number("six")
    (True, False, False)
    """
    return _NUMBER.fullmatch(text) is not None


def number(where: str, cell: Cell, wanted: str = "a number") -> float:
    """Return the finite number that a cell or a word of text holds.

    >>> number("x", "2.5")
    2.5
    """
    if cell is None:
        raise unreadable(f"{where}: blank; give {wanted}")
    if isinstance(cell, str):
        text = cell.strip()
        if not is_number(text):
            if _COMMA.fullmatch(text):
                raise decimal_comma(where, text)
            raise unreadable(f"{where}: {quoted(text)} is not {wanted}")
        cell = float(text)
        if not isfinite(cell):
            raise impossible(f"{where}: {quoted(text)} is larger than a number can hold")
    if not isfinite(cell):
        raise impossible(f"{where}: {cell} is not finite; give {wanted}")
    return cell


def whole(where: str, cell: Cell, wanted: str = "a whole number") -> int:
    """Return the whole number that a cell or a word holds."""
    value = number(where, cell, wanted)
    if value != int(value):
        raise unreadable(f"{where}: {value:g} is not {wanted}")
    return int(value)


def decimal_comma(where: str, text: str) -> BeamError:
    """Return the error of a number written with a comma, which is never guessed at."""
    return unreadable(
        f"{where}: {quoted(text, 30)} has a comma; write decimals with a point, or let"
        " beam_line, load_line or a range take the number from its cell"
    )


def as_text(value: float) -> str:
    """Return a number as text from which the very same number is read again.

    >>> as_text(8.0), as_text(0.1), as_text(2.5e20)
    ('8', '0.1', '2.5e+20')
    """
    text = repr(float(value))
    return text[:-2] if text.endswith(".0") else text


def not_given(value: Frozen) -> bool:
    """Tell whether an optional argument is blank, or the 0 that some hosts make of a blank."""
    return value is None or value == 0.0
