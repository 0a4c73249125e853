"""Whether the Python that Excel would start answers a function.

The program goes the way of xlwings' VBA, from its search path to the class whose method Excel calls, all but the
step through COM: what passes between two programs of Windows is not tried here.
"""

from __future__ import annotations

import subprocess
from pathlib import Path

from beamfuncs.hosts.excel_addin.vba import SERVED

EXPECTED = 60.0
"""What the left, built-in end of `fixed 8 pinned` carries of a load of 12: 5/8 of 12·8."""
PATIENCE = 60.0
"""Seconds: the first start after an installation reads some hundred files."""
_SIGN = "beamfuncs answers "

PROGRAM = f"""\
import sys
import xlwings.utils
xlwings.utils.prepare_sys_path(sys.argv[1])
from xlwings.com_server import XLPython
print("{_SIGN}" + repr(XLPython().CallUDF("{SERVED}", "reaction", ("fixed 8 pinned", "udl 12", 1.0))))
"""


def fault(python: Path, search_path: str = "") -> str:
    """Return why a Python does not answer a function as it must, in one line; blank where it does."""
    command = [str(python), "-B", "-c", PROGRAM, f"False;;;;;;{search_path}"]
    try:
        done = subprocess.run(command, capture_output=True, text=True, errors="replace", timeout=PATIENCE, check=False)
    except subprocess.TimeoutExpired:
        return f"no answer in {PATIENCE:.0f} seconds"
    except OSError as error:
        return f"cannot be started: {(error.strerror or str(error)).lower()}"
    answers = [line.removeprefix(_SIGN) for line in done.stdout.splitlines() if line.startswith(_SIGN)]
    if not answers:
        return (done.stderr.strip().splitlines() or ["ended without a word"])[-1]
    return "" if answers[-1] == repr(EXPECTED) else f"answers {answers[-1]} for {EXPECTED!r}"
