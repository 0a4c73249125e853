"""A connection of two processes of one user: whose the other end is, and how long it may be silent."""

from __future__ import annotations

import os
import socket
import struct
import sys
from contextlib import contextmanager
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from collections.abc import Iterator
    from multiprocessing.connection import Connection

    if sys.platform == "win32":
        from multiprocessing.connection import PipeConnection

        Wire = Connection[Any, Any] | PipeConnection[Any, Any]
    else:
        Wire = Connection[Any, Any]

NO_LIMIT = 0.0


def of_this_user(connection: Wire) -> bool:
    """Tell whether the process at the other end runs for this user, as far as the system can say."""
    peer = _peer(connection)
    return sys.platform == "win32" or peer is None or peer == os.geteuid()


def limit(connection: Wire, reading: float, writing: float) -> None:
    """Let reading and writing fail with BlockingIOError after so many seconds without progress."""
    if sys.platform != "win32":
        with _socket(connection) as shared:
            shared.setsockopt(socket.SOL_SOCKET, socket.SO_RCVTIMEO, _as_time(reading))
            shared.setsockopt(socket.SOL_SOCKET, socket.SO_SNDTIMEO, _as_time(writing))


def received(connection: Wire, seconds: float, longest: int) -> bytes:
    """Return the next message; raise BlockingIOError where none comes in the seconds that were set by `limit`."""
    if sys.platform == "win32" and not connection.poll(seconds):  # there the system knows no such limit
        raise BlockingIOError
    return connection.recv_bytes(longest)


def shut(connection: Wire) -> None:
    """End a connection on which another thread may be waiting, and wake that thread."""
    try:
        if sys.platform == "win32":
            connection.close()
        else:
            with _socket(connection) as shared:
                shared.shutdown(socket.SHUT_RDWR)
    except OSError:
        pass


def _peer(connection: Wire) -> int | None:
    """Return the user of the process at the other end, or None where the system does not tell."""
    if sys.platform != "linux":
        return None
    form = "3i"  # its process, user and group
    with _socket(connection) as shared:
        credentials = shared.getsockopt(socket.SOL_SOCKET, socket.SO_PEERCRED, struct.calcsize(form))
    return int(struct.unpack(form, credentials)[1])


def _as_time(seconds: float) -> bytes:
    whole, part = divmod(seconds, 1)
    return struct.pack("ll", int(whole), int(part * 1e6))


@contextmanager
def _socket(connection: Wire) -> Iterator[socket.socket]:
    """Give the socket of a connection; it stays open."""
    lent = socket.socket(fileno=connection.fileno())
    lent.setblocking(True)  # whatever time limit the host has set for its own sockets
    try:
        yield lent
    finally:
        lent.detach()
