"""What goes between a host and the function server: JSON in UTF-8, every number a double, to the last bit.

A host begins with `hello`. After the server's own `hello` it sends lists of calls, `[[name, [argument, ...]], ...]`,
and gets the answers in the same order, in one list or in several one after another; or it sends `{"do": ...}`.

A cell is a number, a text or null; a range is a list of rows. What JSON has no word for is an object: an error value is
`{"error": "#REF!"}`, in an answer with its `"reason"`; a number that is not finite is `{"number": "nan"}`.
"""

from __future__ import annotations

import json
import math
import re
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from collections.abc import Callable, Sequence

    ErrorMaker = Callable[[str, str], Any]
    """Makes the object that stands for an error value and its reason."""
    Call = tuple[str, Sequence[Any]]
    """The name of a function and its arguments: cells, or ranges as lists of rows; `CellError` for an error value."""

PROTOCOL = 1
LARGEST = 32 * 1024 * 1024
"""Bytes of the largest message: some hundred thousand rows of an array, and far more than a cell asks for."""
LONGEST_REASON = 254
"""Characters of a reason: what a cell's help shows."""


class Failed(Exception):
    """A function has no answer: `value` is the error value of the cell, `reason` one line of text."""

    def __init__(self, value: str, reason: str) -> None:
        line = " ".join(reason.split())
        if len(line) > LONGEST_REASON:
            line = line[: LONGEST_REASON - 3] + "..."
        super().__init__(line)
        self.value = value
        self.reason = line


if TYPE_CHECKING:
    Answer = float | str | list[list[Any]] | Failed
    """A number, a text, rows, or why there is none; an entry of a row that cannot be answered is `Failed` itself."""


class CellError:
    """An error value such as `#REF!` among the arguments."""

    reason = ""

    def __init__(self, value: str) -> None:
        self.value = value


class NotUnderstoodError(ValueError):
    """A message is no message of this protocol."""


def encoded(message: Any) -> bytes:
    """Return a message in bytes.

    >>> encoded([0.1, None, CellError("#REF!")])
    b'[0.1,null,{"error":"#REF!"}]'
    """
    try:
        return _ENCODER.encode(message).encode()
    except ValueError:
        return _ENCODER.encode(_worded(message)).encode()


def decoded(message: bytes, error: ErrorMaker = Failed) -> Any:
    """Return what a message says; `error` makes the objects that stand for error values.

    >>> decoded(b'[1, "udl 12", {"error": "#N/A", "reason": "support: 4 of 3"}]')
    [1.0, 'udl 12', Failed('support: 4 of 3')]
    """

    def untagged(tagged: dict[str, Any]) -> Any:
        if isinstance(tagged.get("error"), str):
            return error(tagged["error"], str(tagged.get("reason", "")))
        if isinstance(tagged.get("number"), str):
            return float(tagged["number"])
        return tagged

    try:
        return json.loads(message.decode(), object_hook=untagged, parse_int=float, parse_constant=_refused)
    except (ValueError, RecursionError) as reason:
        raise NotUnderstoodError(f"not understood: {reason}") from None


def hello(version: str) -> dict[str, Any]:
    """Return how either side begins."""
    return {"protocol": PROTOCOL, "version": version}


def mismatch(extension: str, package: str) -> str | None:
    """Return what is wrong, and what to do, where an extension and the package that computes are not of one version.

    >>> mismatch("0.2.0", "0.2.0")
    >>> mismatch("0.2.0", "0.10.0")  # doctest: +ELLIPSIS
    'the extension in the office (0.2.0) is older than the package beamfuncs (0.10.0): run `beamfuncs calc install`...
    """
    if extension == package:
        return None
    if ordered(extension) < ordered(package):
        return (
            f"the extension in the office ({extension}) is older than the package beamfuncs ({package}):"
            " run `beamfuncs calc install`, then restart the office"
        )
    return (
        f"the package beamfuncs ({package}) is older than the extension in the office ({extension}): update the package"
        " with pip, or run `beamfuncs calc install` for an extension of its version, then restart the office"
    )


def ordered(version: str) -> list[int]:
    """Return the numbers of a version, by which versions are put in order."""
    return [int(number) for number in re.findall(r"[0-9]+", version)]


def _tagged(value: Any) -> Any:
    """Return an error value as an object; in the package an error has the same two attributes."""
    try:
        return {"error": value.value, "reason": value.reason} if value.reason else {"error": value.value}
    except AttributeError:
        raise TypeError(f"a value of type {type(value).__name__} cannot be sent") from None


def _worded(value: Any) -> Any:
    """Return a message in which the numbers that are not finite are objects."""
    if isinstance(value, float) and not math.isfinite(value):
        return {"number": repr(float(value))}
    if isinstance(value, (list, tuple)):
        return [_worded(one) for one in value]
    return value


def _refused(constant: str) -> float:
    raise ValueError(f"{constant} stands for a number")


_ENCODER = json.JSONEncoder(allow_nan=False, check_circular=False, separators=(",", ":"), default=_tagged)
