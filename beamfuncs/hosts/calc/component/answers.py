"""A call from a cell: what the office hands over is asked of the server, and what comes back is made fit for cells.

The office hands over numbers, texts, ranges as tuples of rows, and None for an argument that is left out.
"""

from __future__ import annotations

from typing import Any, Protocol, Sequence, Tuple, Union

from . import errors, journal
from .beamfuncs_client.messages import Failed

Cell = Union[float, str]
Rows = Tuple[Tuple[Cell, ...], ...]


class Functions(Protocol):
    """Who answers: the client of the function server."""

    def call(self, name: str, arguments: Sequence[Any]) -> Any:
        """Return a number, a text or rows; raise `Failed`."""


def cell(functions: Functions, name: str, arguments: Sequence[Any]) -> Cell:
    """Return a function's number or text, or its error as the office has it."""
    return _fit(_answer(functions, name, arguments))


def rows(functions: Functions, name: str, arguments: Sequence[Any]) -> Rows:
    """Return a function's answer as rows, one number being one row of one."""
    answer = _answer(functions, name, arguments)
    if isinstance(answer, list):
        return tuple(tuple(_fit(entry) for entry in row) for row in answer)
    return ((_fit(answer),),)


def _answer(functions: Functions, name: str, arguments: Sequence[Any]) -> Any:
    try:
        return functions.call(name, arguments)
    except Failed as failed:
        return failed
    except Exception:
        journal.failure("asking for {}".format(name))
        return Failed("#VALUE!", "the extension failed")


def _fit(entry: Any) -> Cell:
    if isinstance(entry, Failed):
        return errors.as_number(entry.value)
    return entry if isinstance(entry, str) else float(entry)
