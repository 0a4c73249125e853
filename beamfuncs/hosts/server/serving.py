"""The server process: it listens for hosts of its user, a thread a connection, and ends when nobody asks any more."""

from __future__ import annotations

import logging
import os
import secrets
import signal
import sys
import threading
import time
from collections.abc import Iterator
from contextlib import contextmanager, suppress
from dataclasses import dataclass, field
from importlib.metadata import version
from multiprocessing import AuthenticationError
from multiprocessing.connection import Listener, answer_challenge, deliver_challenge
from typing import TYPE_CHECKING, Any

from beamfuncs.hosts.calc.component.beamfuncs_client import messages, places, wire
from beamfuncs.hosts.calc.component.beamfuncs_client.connecting import ANOTHER_SERVES
from beamfuncs.hosts.calc.component.beamfuncs_client.messages import LARGEST, NotUnderstoodError
from beamfuncs.hosts.calc.component.beamfuncs_client.places import Lock, Running
from beamfuncs.hosts.server import IDLE, logs
from beamfuncs.hosts.server.answering import answered, asked

if TYPE_CHECKING:
    from beamfuncs.hosts.calc.component.beamfuncs_client.wire import Wire

GREETING = 10.0
"""Seconds in which whoever connects must have proved that it knows the key, and have greeted."""
WRITING = 60.0
"""Seconds for which a host may leave an answer unread."""
ANOTHER_ENDS = 5.0
"""Seconds that are waited for another server that is about to end."""
FINISHING = 2.0
"""Seconds that the calls under way have left when the server is told to stop."""
PIECE = 1024 * 1024
"""Bytes of answers that are sent together."""
SILENT = 1.0
"""Seconds for which answers are held back to be sent together."""
WAITING = 128
"""Connections that wait to be accepted."""
DONE, UNUSABLE = 0, 2

log = logging.getLogger(__name__)


def serve(idle: float = IDLE) -> int:
    """Serve until stopped or idle; return the exit status: not 0 where another server serves already."""
    try:
        lock = Lock(Lock.SERVING)
        if not lock.take(ANOTHER_ENDS):
            print("another function server of this user runs", file=sys.stderr)
            return ANOTHER_SERVES
    except (places.UnusableError, OSError) as error:
        print(error, file=sys.stderr)
        return UNUSABLE
    with suppress(OSError):
        places.forget()  # what a killed server left: the number of its process may be another's by now
    logs.begin()
    try:
        Server(idle).run()
    except Exception:
        log.exception("the server fails")
        raise
    finally:
        lock.free()
    return DONE


@dataclass(eq=False)
class _Host:
    """Whoever has connected."""

    connection: Wire
    since: float = field(default_factory=time.monotonic)
    greeted: bool = False


class Server:
    """Listens, answers, and watches over the time."""

    def __init__(self, idle: float) -> None:
        self._idle = idle
        self._version = version("beamfuncs")
        self._key = secrets.token_bytes(32)
        self._began = self._active = time.monotonic()
        self._hosts: set[_Host] = set()
        self._under_way = 0
        self._calls = 0
        self._count = threading.Lock()
        self._ending = threading.Event()

    def run(self) -> None:
        """Serve until the end."""
        for number in (signal.SIGTERM, signal.SIGINT):
            signal.signal(number, lambda *_: self._ending.set())
        address = _free_address()
        with Listener(address, backlog=WAITING) as listener:  # without its key: proving waits in a thread of its own
            if sys.platform != "win32":
                os.chmod(address, 0o600)
            here = Running(address, self._key, os.getpid(), self._version)
            places.tell(here)
            log.info("serves: beamfuncs %s, at %s", self._version, address)
            threading.Thread(target=self._accept, args=(listener,), daemon=True).start()
            try:
                self._watch(here)
            finally:
                self._ending.set()
                if _is_found(here):
                    places.forget()
        until = time.monotonic() + FINISHING
        while self._under_way and time.monotonic() < until:
            time.sleep(places.POLLED)
        with self._count:
            for host in self._hosts:  # no call is taken any more, and each host knows it
                wire.shut(host.connection)

    def _accept(self, listener: Listener) -> None:
        """Give each connection a thread."""
        while not self._ending.is_set():
            try:
                host = _Host(listener.accept())
                threading.Thread(target=self._talk, args=(host,), daemon=True).start()
            except (OSError, RuntimeError) as error:  # out of files or threads: those who are connected go on
                if not self._ending.is_set():
                    log.warning("a connection is not accepted: %s", error)
                    time.sleep(places.POLLED)

    def _watch(self, here: Running) -> None:
        """Return when the server is stopped, idle, or can no longer be found; shut out who does not greet."""
        while not self._ending.wait(min(1.0, self._idle / 4)):
            now = time.monotonic()
            with self._count:
                for host in self._hosts:
                    if not host.greeted and now - host.since > GREETING:
                        wire.shut(host.connection)
            if not self._under_way and now - self._active > self._idle:
                log.info("ends: no message for %g s", self._idle)
                return
            if not _is_found(here):
                log.info("ends: its own files have been taken away")
                return
        log.info("ends: it has been stopped")

    # --- one host -----------------------------------------------------------------------------------------

    def _talk(self, host: _Host) -> None:
        """Answer one host until it hangs up; whatever it does ends only its own connection."""
        with self._count:
            self._hosts.add(host)
        try:
            self._greet(host)
            while True:
                message = host.connection.recv_bytes(LARGEST)
                with self._at_work():
                    self._answer(host.connection, asked(message))
        except (EOFError, ConnectionError):
            if not host.greeted:
                log.warning("a connection has ended before it greeted")
        except BlockingIOError:
            if host.greeted:
                log.warning("a host did not read its answers for %g s", WRITING)
            else:
                log.warning("a connection said nothing for %g s", GREETING)
        except AuthenticationError:
            log.warning("a connection did not know the key")
        except (NotUnderstoodError, OSError) as error:
            log.warning("a host is hung up on: %s", error)
        except Exception:
            log.exception("a host is hung up on")
        finally:
            with self._count:
                self._hosts.discard(host)
                host.connection.close()

    def _greet(self, host: _Host) -> None:
        """Let both sides prove that they know the key, and greet."""
        connection = host.connection
        if not wire.of_this_user(connection):
            raise NotUnderstoodError("it is another user's")
        wire.limit(connection, GREETING, WRITING)
        deliver_challenge(connection, self._key)
        answer_challenge(connection, self._key)
        match asked(connection.recv_bytes(LARGEST)):
            case {"protocol": float(protocol), "version": str(theirs)}:
                if wrong := messages.mismatch(theirs, self._version):
                    log.warning("%s", wrong)
                connection.send_bytes(messages.encoded(messages.hello(self._version)))
                if protocol != messages.PROTOCOL:
                    raise NotUnderstoodError(f"it speaks protocol {protocol:g}, not {messages.PROTOCOL}")
            case _:
                raise NotUnderstoodError("it does not greet")
        wire.limit(connection, wire.NO_LIMIT, WRITING)
        host.greeted = True

    def _answer(self, connection: Wire, message: Any) -> None:
        match message:
            case list(calls):
                for piece in self._pieces(calls):
                    connection.send_bytes(b"[" + b",".join(piece) + b"]")
            case {"do": "status"}:
                connection.send_bytes(messages.encoded(self._status()))
            case {"do": "stop"}:
                connection.send_bytes(messages.encoded({"stops": True}))
                self._ending.set()
            case _:
                raise NotUnderstoodError("neither calls nor something to do")

    def _pieces(self, calls: list[Any]) -> Iterator[list[bytes]]:
        """Yield the answers, as many together as are there in a short time and go into one message."""
        piece: list[bytes] = []
        size, since = 0, time.monotonic()
        for call in calls:
            answer = answered(call)
            if piece and size + len(answer) > PIECE:
                yield piece
                piece, size, since = [], 0, time.monotonic()
            piece.append(answer)
            size += len(answer) + 1
            if time.monotonic() - since > SILENT:
                yield piece
                piece, size, since = [], 0, time.monotonic()
        if piece:
            yield piece
        with self._count:
            self._calls += len(calls)

    @contextmanager
    def _at_work(self) -> Iterator[None]:
        with self._count:
            self._under_way += 1
        try:
            yield
        finally:
            with self._count:
                self._under_way -= 1
                self._active = time.monotonic()

    def _status(self) -> dict[str, Any]:
        return {
            "pid": os.getpid(),
            "version": self._version,
            "seconds": time.monotonic() - self._began,
            "hosts": len(self._hosts) - 1,  # without the one that asks
            "calls": self._calls,
        }


def _is_found(here: Running) -> bool:
    """Tell whether hosts still find this server."""
    try:
        return places.running() == here
    except places.UnusableError:
        return False
    except OSError:  # out of files, for now
        return True


def _free_address() -> str:
    """Return an address in the user's folder; what servers left there that were killed is removed."""
    name = secrets.token_hex(4)
    if sys.platform == "win32":
        return rf"\\.\pipe\beamfuncs-{name}"
    for left in places.folder().glob("socket-*"):
        left.unlink(missing_ok=True)
    return str(places.folder() / f"socket-{name}")
