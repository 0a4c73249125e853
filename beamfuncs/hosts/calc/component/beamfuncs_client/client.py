"""The worksheet functions, answered by the function server of the same user, which is started where none runs.

A crash of the server is survived: it is started again and asked once more. A server that hangs over a call is ended.
"""

from __future__ import annotations

import threading
import time
from collections.abc import Iterator, Sequence
from contextlib import suppress
from typing import TYPE_CHECKING, Any

from .connecting import HungError, Line, LostError, NotReachedError, connected, end_hung
from .messages import LARGEST, Failed, encoded
from .places import UnusableError

if TYPE_CHECKING:
    from .messages import Answer, Call

FAILURE = "#VALUE!"
"""The error value where the server has no answer to give."""
PIECE = 1024 * 1024
"""Bytes of calls that are sent in one message; one call may be longer."""
AGAIN_AFTER = 10.0
"""Seconds for which a server that cannot be reached is not tried again: a sheet has thousands of cells."""
RESTED = 60.0
"""Seconds without a call after which the server may have ended for want of work."""


class Functions:
    """The functions of the catalogue, by name; several threads may use them."""

    def __init__(self, version: str) -> None:
        """Remember the version of the host's own side; nothing is connected or started before the first call."""
        self._version = version
        self._line: Line | None = None
        self._lock = threading.Lock()
        self._used = 0.0
        self._refusal = ""
        self._refused_until = 0.0

    def call(self, name: str, arguments: Sequence[Any]) -> Any:
        """Return what a function answers: a number, a text, or rows; raise `Failed`, with error value and reason.

        Arguments are cells (number, text, None for a blank) and ranges (lists or tuples of rows), with `CellError` for
        an error value among them. In rows, an entry that cannot be answered is a `Failed` that is not raised.
        """
        with self._lock:
            answer = self._alone((name, arguments))
        if isinstance(answer, Failed):
            raise answer
        return answer

    def calls(self, calls: Sequence[Call]) -> list[Answer]:
        """Return the answers to several calls asked at once; a call without an answer has its `Failed` there."""
        answers: list[Answer] = []
        with self._lock:
            with suppress(LostError, HungError, NotReachedError):
                self._ask(calls, answers)
            # Whichever call it was takes no other down with it: the rest are asked one by one.
            for call in calls[len(answers) :]:
                answers.append(self._alone(call))
        return answers

    def close(self) -> None:
        """Hang up; a later call connects again."""
        with self._lock:
            self._hang_up()

    def _alone(self, call: Call) -> Answer:
        """Return the answer to one call, asked a second time where the server is lost over it."""
        answers: list[Answer] = []
        why = ""
        for _ in range(2):
            try:
                self._ask([call], answers)
                return answers[0]
            except LostError as error:
                why = f"the function server ended twice over it ({error})"
            except (HungError, NotReachedError) as error:
                why = str(error)
                break
        return Failed(FAILURE, f"{call[0]}: {why}")

    def _ask(self, calls: Sequence[Call], answers: list[Answer]) -> None:
        """Append the answers to the calls as they come; raise where the server is not reached, lost, or hangs."""
        for piece in _pieces(calls):
            if len(piece) == 1 and len(piece[0]) + 2 > LARGEST:
                answers.append(Failed(FAILURE, f"the arguments take more than {LARGEST} bytes"))
                continue
            line = self._connected()
            try:
                line.send(b"[" + b",".join(piece) + b"]")
                due = len(answers) + len(piece)
                while len(answers) < due:
                    answers.extend(_checked(line.receive(), due - len(answers)))
            except HungError:
                self._hang_up()
                with suppress(UnusableError, OSError):
                    end_hung(line.server)
                raise
            except BaseException:  # an answer that is still to come must not be taken for that of a later call
                self._hang_up()
                raise
            self._used = time.monotonic()

    def _connected(self) -> Line:
        """Return the line to the server, connected anew where need be."""
        now = time.monotonic()
        if self._line and now - self._used > RESTED and not self._line.is_open():
            self._hang_up()
        if self._line is None:
            if now < self._refused_until:
                raise NotReachedError(self._refusal)
            try:
                self._line = connected(self._version)
            except NotReachedError as error:
                self._refusal, self._refused_until = str(error), time.monotonic() + AGAIN_AFTER
                raise
        return self._line

    def _hang_up(self) -> None:
        if self._line:
            self._line.close()
            self._line = None


def _pieces(calls: Sequence[Call]) -> Iterator[list[bytes]]:
    """Yield the calls in bytes, as many together as go into one message."""
    piece: list[bytes] = []
    size = 0
    for name, arguments in calls:
        call = encoded([name, arguments])
        if piece and size + len(call) > PIECE:
            yield piece
            piece, size = [], 0
        piece.append(call)
        size += len(call) + 1
    if piece:
        yield piece


def _checked(answers: Any, due: int) -> list[Answer]:
    """Return answers from the server, unless they are none."""
    if not isinstance(answers, list) or not 0 < len(answers) <= due:
        raise LostError("it answers what was not asked")
    return answers
