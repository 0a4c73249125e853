"""How a command ends: its exit status, and the one line that says why nothing was done."""

from __future__ import annotations

import sys
from typing import NoReturn

import typer

DONE, DONE_WITH_ERRORS, NOTHING_DONE = 0, 1, 2


def give_up(reason: str) -> NoReturn:
    """End the program with one line and the status for nothing done."""
    print(f"beamfuncs: {' '.join(reason.split())}", file=sys.stderr)
    raise typer.Exit(NOTHING_DONE)
