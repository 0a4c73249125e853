"""From a call in bytes to its answer in bytes; the functions are those of the catalogue."""

from __future__ import annotations

import logging
from collections.abc import Sequence
from functools import cache
from math import inf
from typing import Any

from beamfuncs.catalogue import catalogue
from beamfuncs.errors import BeamError, ErrorValue, quoted, unreadable
from beamfuncs.hosts.calc.component.beamfuncs_client import messages
from beamfuncs.hosts.calc.component.beamfuncs_client.messages import LARGEST, NotUnderstoodError

UNKNOWN = "#NAME?"

log = logging.getLogger(__name__)


def asked(message: bytes) -> Any:
    """Return what a host asks, the error values among its arguments as the functions know them."""
    return messages.decoded(message, error=lambda value, reason: ErrorValue(value))


def answered(call: Any) -> bytes:
    """Return the answer to a call in bytes: what the function returns, or the error that says why it does not."""
    match call:
        case [str(name), list(arguments)]:
            return _answered(name, arguments)
    raise NotUnderstoodError(f"no call: {quoted(call)}")


def _answered(name: str, arguments: Sequence[Any]) -> bytes:
    try:
        answer = messages.encoded(_called(name, arguments))
        if len(answer) + 2 > LARGEST:
            raise unreadable(f"{name}: the answer takes more than {LARGEST} bytes; ask for less at a time")
    except BeamError as error:
        log.info("%s: %s %s", name, error.value, error.reason)
        answer = messages.encoded(error)
    except Exception as error:
        log.exception("%s: unexpected, with %s", name, quoted(arguments, 2000))
        answer = messages.encoded(unreadable(f"{name}: unexpected, {type(error).__name__}: {error}"))
    return answer


def _called(name: str, arguments: Sequence[Any]) -> Any:
    entry = catalogue().get(name)
    if entry is None:
        raise BeamError(UNKNOWN, f"no function is called {quoted(name)}")
    least, most = _count(name)
    if not least <= len(arguments) <= most:
        raise unreadable(f"{name}: given {len(arguments)} arguments; it is called as {entry.call}")
    answer = entry.function(*arguments)
    if isinstance(answer, list):
        _note(name, answer)
    return answer


@cache
def _count(name: str) -> tuple[int, float]:
    """Return how many arguments a function takes at least, and at most."""
    arguments = catalogue()[name].arguments
    repeats = any(argument.repeats for argument in arguments)
    return sum(not argument.optional for argument in arguments), inf if repeats else len(arguments)


def _note(name: str, rows: list[list[Any]]) -> None:
    """Log the errors that stand in an array, the first with its reason."""
    errors = [entry for row in rows for entry in row if isinstance(entry, BeamError)]
    if errors:
        log.info("%s: %d entries in error, the first %s %s", name, len(errors), errors[0].value, errors[0].reason)
