"""The log of the server: the reason of every failure, in files of bounded size that only the user reads."""

from __future__ import annotations

import logging
import os
from logging.handlers import RotatingFileHandler

from beamfuncs.hosts.calc.component.beamfuncs_client import places

BYTES = 1024 * 1024
OLDER = 3
"""Files kept beside the newest."""


def begin() -> None:
    """Let what is logged from now on go to the file."""
    path = places.log()
    root = logging.getLogger("beamfuncs")
    root.setLevel(logging.INFO)
    try:
        path.parent.mkdir(mode=0o700, parents=True, exist_ok=True)
        os.close(os.open(path, os.O_CREAT | os.O_WRONLY, 0o600))
        handler = RotatingFileHandler(path, maxBytes=BYTES, backupCount=OLDER, encoding="utf-8", errors="replace")
    except OSError as error:
        root.warning("no log: %s", error)  # the server computes without one
        return
    handler.setFormatter(logging.Formatter("%(asctime)s %(process)d %(levelname)s %(message)s"))
    root.addHandler(handler)
    root.propagate = False
