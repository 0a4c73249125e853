"""What the command line asks of the server that runs."""

from __future__ import annotations

from contextlib import closing
from importlib.metadata import version
from typing import Any

from beamfuncs.hosts.calc.component.beamfuncs_client import places
from beamfuncs.hosts.calc.component.beamfuncs_client.connecting import ENDING, HungError, LostError, end_hung, found
from beamfuncs.hosts.calc.component.beamfuncs_client.places import Lock


def status() -> dict[str, Any] | None:
    """Return what the server tells of itself, None where none runs; raise `HungError` where it says nothing."""
    line = found(version("beamfuncs"))
    if line is None:
        return None
    with closing(line):
        try:
            told: dict[str, Any] = line.ask({"do": "status"})
        except LostError:
            return None
    return told


def stop() -> bool:
    """Stop the server, by force where it does not listen; tell whether one ran."""
    server = places.running()
    if server is None:
        return False
    try:
        line = found(version("beamfuncs"))
        if line is None:
            return False
        with closing(line):
            line.ask({"do": "stop"})
    except (LostError, HungError):
        pass
    lock = Lock(Lock.SERVING)
    if lock.take(ENDING):
        lock.free()
        return True
    return end_hung(server)
