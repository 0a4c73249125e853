"""What a function returns when it cannot answer: one of a worksheet's own error values, with its reason."""

from __future__ import annotations

VALUE = "#VALUE!"
"""An argument cannot be read or is missing."""
NUM = "#NUM!"
"""The beam is a mechanism, or a number is not finite or out of range."""
NA = "#N/A"
"""What is asked for is not there: a support, a span, a place beyond the beam."""

LONGEST_REASON = 254


class ErrorValue(str):
    """An error value such as `#REF!` that stands in a cell, as a host hands it to a function.

    >>> ErrorValue("#REF!")
    ErrorValue('#REF!')
    """

    __slots__ = ()

    def __repr__(self) -> str:
        return f"ErrorValue({str(self)!r})"


class BeamError(ValueError):
    """Why a function has no answer: `value` is the cell's error value, `reason` one line of text.

    >>> error = unreadable("beam: blank; write a line such as 'fixed 8 pinned'")
    >>> error.value
    '#VALUE!'
    """

    def __init__(self, value: str, reason: str) -> None:
        line = " ".join(reason.split())
        if len(line) > LONGEST_REASON:
            line = line[: LONGEST_REASON - 3] + "..."
        super().__init__(line)
        self.value = value
        self.reason = line


def unreadable(reason: str) -> BeamError:
    """Return the `#VALUE!` error of an argument that cannot be read or is missing."""
    return BeamError(VALUE, reason)


def impossible(reason: str) -> BeamError:
    """Return the `#NUM!` error of a mechanism or of a number out of range."""
    return BeamError(NUM, reason)


def absent(reason: str) -> BeamError:
    """Return the `#N/A` error of a support, span or place that is not there."""
    return BeamError(NA, reason)


def handed_on(argument: str, error: ErrorValue) -> BeamError:
    """Return the error of an argument that is an error value itself, passed on unchanged."""
    return BeamError(str(error), f"{argument}: is the error value {error} itself; mend that cell")


def quoted(read: object, longest: int = 60) -> str:
    """Return what was read between quotation marks, shortened for a message.

    >>> quoted("fixed 6,5 pinned")
    "'fixed 6,5 pinned'"
    """
    text = read if isinstance(read, str) else repr(read)
    text = " ".join(text.split())
    return f"'{text[: longest - 3]}...'" if len(text) > longest else f"'{text}'"
