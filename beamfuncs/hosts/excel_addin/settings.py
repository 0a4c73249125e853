"""The settings file that xlwings' VBA reads: lines `"KEY","value"` in the code page of the machine.

VBA takes fields two by two, whatever stands on a line, and the first that fits counts. So our lines stand before
all others, in one piece behind a line that says whose they are: every other byte of the file stays as it was, and
counts again once ours are taken out.
"""

from __future__ import annotations

import re
from collections.abc import Mapping
from pathlib import Path

from beamfuncs.hosts.excel_addin import windows
from beamfuncs.hosts.excel_addin.vba import SERVED

INTERPRETER, ADD_FOLDER, PATHS, DEBUG = "INTERPRETER_WIN", "ADD_WORKBOOK_TO_PYTHONPATH", "PYTHONPATH", "DEBUG UDFS"
SHOWN = INTERPRETER, "UDF MODULES", ADD_FOLDER, PATHS, DEBUG
"""Settings whose values may be seen by anybody: others can be keys and passwords of other add-ins."""
MARK = '"BEAMFUNCS","the next lines are of: beamfuncs excel install"\r\n'

_FIELD = re.compile(r'[ \t]*(?:"([^"]*)"?[^,\r\n]*|([^,\r\n]*))(?:,|\r\n|\r|\n|\Z)')


def wanted(interpreter: Path) -> dict[str, str]:
    """Return the settings for a Python: which it is, what it serves, and that nothing beside a workbook is for it."""
    return {INTERPRETER: str(interpreter), "UDF MODULES": SERVED, ADD_FOLDER: "False"}


def block(values: Mapping[str, str]) -> bytes:
    """Return our lines; raises UnicodeEncodeError where the code page lacks a character."""
    return windows.ansi(MARK + "".join(f'"{key}","{value}"\r\n' for key, value in values.items()))


def without(content: bytes, ours: bytes) -> tuple[bytes, list[str]]:
    """Return settings without our lines, and the keys of those that somebody changed, which are left.

    >>> without(b'"A","1"\\r\\n"B","2"\\r\\n', b'"A","1"\\r\\n')
    (b'"B","2"\\r\\n', [])
    """
    if ours in content:
        return content.replace(ours, b"", 1), []
    mark, *lines = ours.splitlines(keepends=True)
    rest = content.splitlines(keepends=True)
    if mark not in rest:
        return content, []
    rest.remove(mark)
    changed = b""
    for line in lines:
        if line in rest:
            rest.remove(line)
        else:
            changed += line
    left = b"".join(rest)
    standing = read(windows.from_ansi(left))
    return left, [key for key in read(windows.from_ansi(changed)) if key in standing]


def read(text: str) -> dict[str, str]:
    """Return the settings in a text as VBA finds them, by their keys in capitals.

    >>> read('"A","1, 2"\\r\\nb , 3\\r\\n"a","4"')
    {'A': '1, 2', 'B': '3'}
    """
    fields = _fields(text)
    found: dict[str, str] = {}
    for key, value in zip(fields[::2], fields[1::2], strict=False):
        found.setdefault(key.upper(), value)
    return found


def paired(text: str) -> bool:
    """Return whether every key has its value: VBA stops with an error at the end of a file where one has not."""
    return len(_fields(text)) % 2 == 0


def _fields(text: str) -> list[str]:
    found, at = [], 0
    while at < len(text):
        field = _FIELD.match(text, at)
        if field is None:  # cannot be: the pattern fits any text
            break
        found.append(field[1] if field[1] is not None else field[2].rstrip())
        at = field.end()
    return found
