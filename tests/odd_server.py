"""The function server with functions that wait, end it or fail, and with other constants: what tests cannot wait for.

python odd_server.py '{"serving.GREETING": 0.5}'
"""

from __future__ import annotations

import importlib
import json
import os
import sys
import time
from pathlib import Path

from beamfuncs import functions
from beamfuncs.cells import Argument
from beamfuncs.documentation import worksheet_function
from beamfuncs.functions import Rows


@worksheet_function
def echo(value: Argument) -> Rows:
    """Return what it is given.

    Parameters
    ----------
    value
        Anything.
    """
    return value  # type: ignore[return-value]


@worksheet_function
def pause(seconds: Argument, file: Argument) -> float:
    """Return the number of the process, after so many seconds; a file tells when it has begun.

    Parameters
    ----------
    seconds
        How long it takes.
    file
        A line is added to this file at the beginning.
    """
    with Path(str(file)).open("a") as begun:
        begun.write("begun\n")
    time.sleep(float(seconds))  # type: ignore[arg-type]
    return float(os.getpid())


@worksheet_function
def crash(times: Argument, file: Argument) -> float:
    """Return the number of the process, which ends instead the first times.

    Parameters
    ----------
    times
        How many times it ends.
    file
        A line is added to this file each time.
    """
    with Path(str(file)).open("a+") as ended:
        ended.seek(0)
        if len(ended.readlines()) < float(times):  # type: ignore[arg-type]
            ended.write("ended\n")
            ended.flush()
            os._exit(9)
    return float(os.getpid())


@worksheet_function
def mistake(beam: Argument) -> float:
    """Return nothing: it is a mistake in the program."""
    raise ZeroDivisionError(f"cannot happen to {beam}")


if __name__ == "__main__":
    from beamfuncs.hosts.server import serving

    for odd in (echo, pause, crash, mistake):
        setattr(functions, odd.__name__, odd)
    for name, value in json.loads(sys.argv[1]).items():
        module, constant = name.split(".")
        setattr(importlib.import_module(f"beamfuncs.hosts.server.{module}"), constant, value)
    sys.exit(serving.serve(**({"idle": float(sys.argv[2])} if len(sys.argv) > 2 else {})))
