"""What is asked of Windows: its registry, its code page, and the programs on it.

All questions that only Windows can answer are asked here, in functions that a test can replace.
"""

from __future__ import annotations

import os
import struct
import sys
from importlib import import_module
from pathlib import Path

USER, MACHINE = "HKEY_CURRENT_USER", "HKEY_LOCAL_MACHINE"
APP_PATH = r"Software\Microsoft\Windows\CurrentVersion\App Paths\excel.exe"
CLICK_TO_RUN = r"Software\Microsoft\Office\ClickToRun\Configuration"
CURRENT_EXCEL = r"Software\Classes\Excel.Application\CurVer"
LATEST_OFFICE = "16.0"
"""The number of every Office since 2016 in the registry."""
MACHINES = {0x14C: 32, 0x8664: 64}
"""The processors that programs for Windows are made for, in bits: `Machine` in Microsoft's PE format."""


def here() -> bool:
    """Return whether this is Windows."""
    return sys.platform == "win32"


def registry(root: str, key: str, name: str = "") -> str | int | None:
    """Return a value of the registry, or None where it is not there or must not be read."""
    if sys.platform != "win32":
        return None
    import winreg

    try:
        with winreg.OpenKey(getattr(winreg, root), key) as opened:
            value, _ = winreg.QueryValueEx(opened, name)
    except OSError:
        return None
    return value if isinstance(value, str | int) else None


def ansi(text: str) -> bytes:
    """Return text in the code page that VBA reads files in; raises UnicodeEncodeError where that lacks a character."""
    return text.encode("mbcs" if sys.platform == "win32" else "cp1252")


def from_ansi(content: bytes) -> str:
    """Return the text in a file as VBA reads it."""
    return content.decode("mbcs" if sys.platform == "win32" else "cp1252", "replace")


def has_module(name: str) -> bool:
    """Return whether a module can be imported by this Python."""
    try:
        import_module(name)
    except ImportError:
        return False
    return True


def excel() -> Path | None:
    """Return where EXCEL.EXE is, or None where no Excel is installed."""
    for root in (USER, MACHINE):
        found = registry(root, APP_PATH)
        if isinstance(found, str) and found.strip('" '):
            return Path(os.path.expandvars(found.strip('" ')))
    return None


def office() -> str:
    """Return the number under which the registry keeps the settings of the installed Excel, such as `16.0`."""
    current = registry(MACHINE, CURRENT_EXCEL) or registry(USER, CURRENT_EXCEL)
    number = str(current or "").rpartition(".")[2]
    return f"{number}.0" if number.isdecimal() else LATEST_OFFICE


def excel_version() -> str:
    """Return the version of Excel as exactly as the registry tells it."""
    return str(registry(MACHINE, CLICK_TO_RUN, "VersionToReport") or office())


def bitness(program: Path) -> int:
    """Return for how many bits a program is made; raises ValueError where its file does not tell."""
    with program.open("rb") as stream:
        head = stream.read(0x40)
        if head[:2] == b"MZ" and len(head) == 0x40:
            stream.seek(struct.unpack_from("<I", head, 0x3C)[0])
            signature = stream.read(6)
            if signature[:4] == b"PE\0\0" and len(signature) == 6:
                machine = struct.unpack_from("<H", signature, 4)[0]
                if machine in MACHINES:
                    return MACHINES[machine]
                raise ValueError(f"{program}: is made for a processor that xlwings does not serve (0x{machine:04X})")
    raise ValueError(f"{program}: is not a program for Windows")


def own_bitness() -> int:
    """Return for how many bits this Python is made."""
    return struct.calcsize("P") * 8
