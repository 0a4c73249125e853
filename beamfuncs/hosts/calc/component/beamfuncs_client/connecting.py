"""From a host to the function server: a line to the one that runs, or to one that is started for it.

Several hosts may ask at the same moment: the one that holds the lock starts the server, the others find it.
"""

from __future__ import annotations

import os
import signal
import subprocess
import sys
import time
from contextlib import suppress
from multiprocessing import AuthenticationError
from multiprocessing.connection import Client, answer_challenge, deliver_challenge
from typing import Any

from . import messages, places, wire
from .places import Lock, Running, UnusableError

GREETING = 10.0
"""Seconds in which a server greets."""
PATIENCE = 60.0
"""Seconds without a word from a server that is asked, after which it counts as hung."""
STARTING = 60.0
"""Seconds in which a server is up: the first start after an installation reads much from a disk."""
ENDING = 3.0
"""Seconds in which a server ends that is told to."""
ANOTHER_SERVES = 3
"""The exit status of a server that found another one."""

_children: list[subprocess.Popen[bytes]] = []
"""The servers that this process started: the system keeps an ended one until it is asked after."""
_newest: set[str] = set()
"""The versions, older than the host's, of servers that were started just now: the package is as old."""


class LostError(Exception):
    """The server is gone, or what it says makes no sense."""


class HungError(Exception):
    """The server is there and says nothing."""


class NotReachedError(Exception):
    """There is no server to ask; the text says why, and what to do."""


class Line:
    """A connection to the server, on which both sides have proved that they know the key, and have greeted."""

    def __init__(self, server: Running, version: str) -> None:
        """Connect; raise `LostError` where the server is gone, `HungError` where it does not greet."""
        self.server = server
        try:
            self._connection = Client(server.address)
        except OSError as error:
            raise LostError(str(error)) from None
        try:
            self._be_patient(GREETING)
            self._prove(server.key)
            greeting = self.ask(messages.hello(version))
            if not isinstance(greeting, dict) or not isinstance(greeting.get("version"), str):
                raise LostError("it does not greet")
            self.version: str = greeting["version"]
            self._be_patient(PATIENCE)
        except BaseException:
            self.close()
            raise

    def _be_patient(self, seconds: float) -> None:
        self._patience = seconds
        wire.limit(self._connection, seconds, seconds)

    def _prove(self, key: bytes) -> None:
        if not wire.of_this_user(self._connection):
            raise LostError("it is another user's")
        try:
            if not self._connection.poll(self._patience):
                raise self._hung()
            answer_challenge(self._connection, key)
            deliver_challenge(self._connection, key)
        except BlockingIOError:
            raise self._hung() from None
        except (AuthenticationError, EOFError, OSError) as error:
            raise LostError(str(error) or "it hung up") from None

    def ask(self, message: Any) -> Any:
        """Send a message and return the answer."""
        self.send(messages.encoded(message))
        return self.receive()

    def send(self, message: bytes) -> None:
        """Send a message in bytes."""
        try:
            self._connection.send_bytes(message)
        except BlockingIOError:
            raise self._hung() from None
        except OSError as error:
            raise LostError(str(error)) from None

    def receive(self) -> Any:
        """Return the next message of the server."""
        try:
            return messages.decoded(wire.received(self._connection, self._patience, messages.LARGEST))
        except BlockingIOError:
            raise self._hung() from None
        except (EOFError, OSError, messages.NotUnderstoodError) as error:
            raise LostError(str(error) or "it hung up") from None

    def is_open(self) -> bool:
        """Tell whether the server has not hung up."""
        try:
            return not self._connection.poll()
        except (EOFError, OSError):
            return False

    def close(self) -> None:
        """Hang up."""
        self._connection.close()

    def _hung(self) -> HungError:
        return HungError(f"the function server has said nothing for {self._patience:g} seconds")


def connected(version: str) -> Line:
    """Return a line to a server of this version, started where none runs; else raise `NotReachedError`."""
    try:
        line = _current(version)
        if line is None:
            line = _restarted(version)
            if _is_older(line, version):
                _newest.add(line.version)
    except (UnusableError, OSError) as error:
        raise NotReachedError(str(error)) from None
    wrong = messages.mismatch(version, line.version)
    if wrong:
        line.close()
        raise NotReachedError(wrong)
    return line


def found(version: str) -> Line | None:
    """Return a line to the server that runs, None where there is none."""
    server = places.running()
    try:
        return server and Line(server, version)
    except LostError:
        return None


def end(server: Running | None) -> bool:
    """End a server that may hang; tell whether it ran and has ended."""
    lock = Lock(Lock.SERVING)
    if lock.take() or server is None or server != places.running():
        lock.free()
        return False
    for blow in (signal.SIGTERM, getattr(signal, "SIGKILL", signal.SIGTERM)):
        with suppress(OSError):
            os.kill(server.pid, blow)  # it is alive and no other process: it holds the lock
        if lock.take(ENDING):
            lock.free()
            return True
    return False


def end_hung(server: Running | None) -> bool:
    """End a server that hangs, while no host starts another; tell whether it has ended now."""
    lock = Lock(Lock.STARTING)
    try:
        return lock.take(STARTING) and end(server)
    finally:
        lock.free()


def _current(version: str) -> Line | None:
    """Return a line to the server that runs, None where it hangs, or has outlived an update of the package."""
    try:
        line = found(version)
    except HungError:
        return None
    if line and _is_older(line, version) and line.version not in _newest:
        line.close()
        return None
    return line


def _is_older(line: Line, version: str) -> bool:
    return messages.ordered(line.version) < messages.ordered(version)


def _restarted(version: str) -> Line:
    """Return a line to a server that is started, after what stands in its way has been ended."""
    lock = Lock(Lock.STARTING)
    if not lock.take(STARTING):
        raise NotReachedError(f"another program has been starting the function server for {STARTING:g} s")
    try:
        line = _current(version)  # another host may have been the first
        if line is None:
            end(places.running())
            line = _started(version)
        return line
    finally:
        lock.free()


def _started(version: str) -> Line:
    """Start the server and return a line to it."""
    told = places.folder() / "starting.log"
    with told.open("wb") as errors:
        child = _launched(places.command(), errors)
    until = time.monotonic() + STARTING
    try:
        while time.monotonic() < until:
            line = found(version)
            if line:
                return line
            if child.poll() not in (None, ANOTHER_SERVES):
                break
            time.sleep(places.POLLED)
    except HungError as error:
        raise NotReachedError(str(error)) from None
    said = told.read_text(errors="replace").split("\n")
    why = next((line.strip() for line in reversed(said) if line.strip()), "it is not up in time")
    raise NotReachedError(f"the function server does not start ({why}): run `beamfuncs calc check`")


def _launched(command: list[str], errors: Any) -> subprocess.Popen[bytes]:
    """Start a process that outlives this one, in the user's own folder and without this Python's settings."""
    environment = {name: value for name, value in os.environ.items() if not name.startswith("PYTHON")}
    apart: dict[str, Any] = {"start_new_session": True}
    if sys.platform == "win32":
        apart = {"creationflags": subprocess.CREATE_NEW_PROCESS_GROUP | subprocess.CREATE_NO_WINDOW}
    try:
        child = subprocess.Popen(
            command,
            stdin=subprocess.DEVNULL,
            stdout=subprocess.DEVNULL,
            stderr=errors,
            cwd=str(places.folder()),
            env=environment,
            **apart,
        )
    except OSError as error:
        raise NotReachedError(
            f"the function server cannot be started ({command[0]}: {error.strerror}): run `beamfuncs calc install`"
        ) from None
    _children[:] = [one for one in (*_children, child) if one.poll() is None]
    return child
