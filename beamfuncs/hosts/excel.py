"""The functions as Excel calls them: the module that xlwings serves to the add-in.

Cells are read as they stand in Excel and results are handed back so that the add-in can show genuine error values:
a number is a float, text is text, and an int is never a result but the code of an error value. No exception leaves.
"""

from __future__ import annotations

import inspect
import logging
import math
import reprlib
from collections.abc import Callable, Iterable
from contextlib import suppress
from decimal import Decimal
from functools import lru_cache
from logging.handlers import RotatingFileHandler
from typing import Any

import xlwings
from xlwings.conversion import Accessor, Pipeline

from beamfuncs.catalogue import Entry, catalogue
from beamfuncs.errors import VALUE, BeamError, ErrorValue, impossible, unreadable
from beamfuncs.hosts.excel_addin.places import log_file

_CODES = {
    2000: "#NULL!",
    2007: "#DIV/0!",
    2015: "#VALUE!",
    2023: "#REF!",
    2029: "#NAME?",
    2036: "#NUM!",
    2042: "#N/A",
    2043: "#GETTING_DATA",
    2045: "#SPILL!",
    2046: "#CONNECT!",
    2047: "#BLOCKED!",
    2048: "#UNKNOWN!",
    2049: "#FIELD!",
    2050: "#CALC!",
}
"""Excel's error values by their number (the XlCVError enumeration of its object model)."""
_NUMBERS = {text: code for code, text in _CODES.items()}
_UNKNOWN = "#ERR{}!"
_ERROR_BAND = range(-0x7FF60000, -0x7FF50000)
"""COM hands an error value over as the int 0x800A0000 + its code, signed."""

_MANY = 100_000
"""A range of more cells is cut at the end of what its sheet uses: whole columns are often given."""
_LOG_SIZE, _OLD_LOGS, _LONGEST_CALL = 1_000_000, 1, 300

_log = logging.getLogger(__name__)
_brief = reprlib.Repr()  # the first cells of a range: each of ten thousand entries in error writes its call
_brief.maxstring = _brief.maxother = 100


def _served(entry: Entry) -> Callable[..., object]:
    """Return a worksheet function as xlwings calls it."""

    def answer(*arguments):  # type: ignore[no-untyped-def]  # xlwings would convert by annotations
        try:
            return _shown(entry.function(*map(_argument, arguments)), entry, arguments)
        except BeamError as error:
            return _failed(error, entry, arguments)
        except Exception as error:
            return _failed(BeamError(VALUE, f"{type(error).__name__}: {error}"), entry, arguments)

    answer.__name__ = answer.__qualname__ = entry.name
    answer.__doc__ = entry.summary
    answer.__signature__ = inspect.Signature(list(_parameters(entry)))  # type: ignore[attr-defined]
    for argument in entry.arguments:
        answer = xlwings.arg(argument.name, convert=_AsItStands, doc=argument.help)(answer)
    return xlwings.func(category=entry.category)(answer)


def _parameters(entry: Entry) -> Iterable[inspect.Parameter]:
    for argument in entry.arguments:
        if argument.repeats:
            yield inspect.Parameter(argument.name, inspect.Parameter.VAR_POSITIONAL)
        else:
            default = None if argument.optional else inspect.Parameter.empty
            yield inspect.Parameter(argument.name, inspect.Parameter.POSITIONAL_OR_KEYWORD, default=default)


# --- in -------------------------------------------------------------------------------------------


class _AsItStands(Accessor):
    """Read an argument without xlwings' conversions, in which error cells and blank ones are the same."""

    @classmethod
    def reader(cls, options: object) -> Pipeline:
        return Pipeline([_read])


def _read(context: Any) -> None:
    if context.range is not None:
        try:
            context.value = _values(context.range.api)
        except Exception as error:  # Excel may refuse to be read
            context.value = unreadable(f"these cells cannot be read ({type(error).__name__}: {error})")


def _values(reference: Any) -> object:
    """Return the values of a range as COM gives them; for one that is no rectangle, the error that says so."""
    areas = reference.Areas.Count
    if areas > 1:
        return unreadable(f"a reference to {areas} areas was given; give one rectangle of cells")
    if reference.CountLarge > _MANY:
        sheet, used = reference.Worksheet, reference.Worksheet.UsedRange
        top, left = reference.Row, reference.Column
        rows = max(1, min(used.Row + used.Rows.Count - top, reference.Rows.Count))
        columns = max(1, min(used.Column + used.Columns.Count - left, reference.Columns.Count))
        last = sheet.Cells(top + rows - 1, left + columns - 1)
        reference = sheet.Range(sheet.Cells(top, left), last)  # pywin32 gives one cell for Resize(rows, columns)
    return _exact(reference.Value, lambda: reference.Value2)


def _exact(values: object, plain: Callable[[], object]) -> object:
    """Return the values, amounts of money with all their digits: as such they come cut to four decimals."""
    if isinstance(values, Decimal):
        return plain()
    if isinstance(values, tuple) and any(isinstance(one, Decimal) for row in values for one in row):
        rows: Any = plain()
        return tuple(
            tuple(full if isinstance(one, Decimal) else one for one, full in zip(row, digits, strict=True))
            for row, digits in zip(values, rows, strict=True)
        )
    return values


def _argument(value: object) -> Any:
    """Return what was read as the functions take it."""
    if isinstance(value, (tuple, list)):
        return [_argument(one) for one in value]
    if isinstance(value, int) and value in _ERROR_BAND:
        code = value - _ERROR_BAND.start
        return ErrorValue(_CODES.get(code, _UNKNOWN.format(code)))
    return value


# --- out ------------------------------------------------------------------------------------------


def _shown(result: object, entry: Entry, arguments: tuple[object, ...]) -> object:
    """Return a result as the add-in takes it."""
    if isinstance(result, list):
        return [_shown(one, entry, arguments) for one in result]
    if isinstance(result, BeamError):
        return _failed(result, entry, arguments)
    if isinstance(result, str):
        return result
    number = float(result)  # type: ignore[arg-type]
    if not math.isfinite(number):
        return _failed(impossible("the result is not a finite number"), entry, arguments)
    return number


def _failed(error: BeamError, entry: Entry, arguments: tuple[object, ...]) -> int:
    """Return the code of an error value, its reason written to the log."""
    call = f"{entry.name}({', '.join(map(_brief.repr, arguments))})"
    _note(f"{error.value} {error.reason} | {call[:_LONGEST_CALL]}")
    if error.value in _NUMBERS:
        return _NUMBERS[error.value]
    digits = "".join(filter(str.isdigit, error.value))
    return int(digits or _NUMBERS[VALUE])


@lru_cache(1000)
def _note(line: str) -> None:
    """Write a line to the log: once, and not at every recalculation."""
    with suppress(OSError):  # a log that cannot be written must not cost the answer
        if not _log.handlers:
            log_file().parent.mkdir(parents=True, exist_ok=True)
            log = RotatingFileHandler(log_file(), maxBytes=_LOG_SIZE, backupCount=_OLD_LOGS, encoding="utf-8")
            log.setFormatter(logging.Formatter("%(asctime)s %(message)s"))
            _log.addHandler(log)
            _log.propagate = False
        _log.error(line)


def __dir__() -> list[str]:
    """Hide the functions from xlwings' own import of functions: its VBA would show the code of an error as a number."""
    return []


globals().update({name: _served(entry) for name, entry in catalogue().items()})
