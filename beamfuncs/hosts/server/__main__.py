"""Run the function server until it is stopped or has nothing to do: `python -m beamfuncs.hosts.server`."""

from __future__ import annotations

import sys

from beamfuncs.hosts.server.serving import serve

if __name__ == "__main__":
    sys.exit(serve())
