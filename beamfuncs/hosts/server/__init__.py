"""The function server: one process a user, in which the functions are computed for the hosts that run elsewhere."""

from __future__ import annotations

import sys

IDLE = 30 * 60.0
"""Seconds without a message after which the server ends; a host that is still there starts another when it asks."""


def starting_command() -> list[str]:
    """Return the command that starts the server with this Python."""
    return [sys.executable, "-m", __name__]
