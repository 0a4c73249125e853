"""A file in which the extension tells what went wrong in the office, beside that of the server."""

from __future__ import annotations

import time
import traceback
from pathlib import Path

from .beamfuncs_client import places

LARGEST = 1 << 20
"""Bytes after which the file begins anew, the old one being kept once."""


def path() -> Path:
    """Return the file."""
    return places.log().with_name("office.log")


def failure(doing: str) -> None:
    """Write down the exception that is being handled, and what was being done; never raise another."""
    try:
        file = path()
        file.parent.mkdir(mode=0o700, parents=True, exist_ok=True)
        if file.exists() and file.stat().st_size > LARGEST:
            file.replace(file.with_name(file.name + ".1"))
        with file.open("a", encoding="utf-8") as stream:
            stream.write("{} {}\n{}".format(time.strftime("%Y-%m-%d %H:%M:%S"), doing, traceback.format_exc()))
    except OSError:
        pass
