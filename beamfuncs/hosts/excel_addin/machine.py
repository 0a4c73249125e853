"""What the functions need of a machine: Excel, a Python for it, and xlwings with a library of Excel's bitness."""

from __future__ import annotations

import platform
import re
import sys
from importlib.metadata import PackageNotFoundError, requires, version
from pathlib import Path

from beamfuncs.hosts.excel_addin import windows
from beamfuncs.hosts.excel_addin.findings import Finding

ENVIRONMENT = r"%LOCALAPPDATA%\beamfuncs\venv"
"""Where an environment for Excel is well placed: on the machine itself, and never synchronised."""
_NEEDED_MODULES = "pythoncom", "win32com.client"


def interpreter() -> Path:
    """Return the Python of this environment that Excel is to start: the one without a window, where there is one."""
    own = Path(sys.executable)
    windowless = own.with_name("pythonw.exe")
    return windowless if windowless.is_file() else own


def pinned() -> str:
    """Return the one version of xlwings that this version of beamfuncs works with."""
    for needed in requires("beamfuncs") or ():
        found = re.fullmatch(r"xlwings\s*==\s*([\w.]+).*", needed)
        if found:
            return found[1]
    raise LookupError("the metadata of beamfuncs pin no version of xlwings")


def installed(distribution: str) -> str | None:
    """Return the version of a distribution in this environment, or None where it is not there."""
    try:
        return version(distribution)
    except PackageNotFoundError:
        return None


def library(bits: int) -> str:
    """Return the name of xlwings' library for an Excel of so many bits, as the VBA of the pinned version has it."""
    return f"xlwings{bits}-{pinned()}.dll"


def find_library(python: Path, bits: int) -> Path | None:
    """Return the library where xlwings' VBA looks for it: beside a Python, or one folder up."""
    for folder in (python.parent, python.parent.parent):
        if (folder / library(bits)).is_file():
            return folder / library(bits)
    return None


def findings(python: Path) -> list[Finding]:
    """Return what was found of all that is needed, for an Excel that starts this Python."""
    program = windows.excel()
    bits = 0
    try:
        bits = windows.bitness(program) if program else 0
    except (OSError, ValueError) as error:
        unread = Finding("Excel", str(error), "repair Office (Windows Settings > Apps)")
    else:
        unread = Finding("Excel", "not found in the registry", "install Excel; `beamfuncs fill` needs none")
    excel = Finding("Excel", f"{windows.excel_version()}, {bits} bits, {program}") if bits else unread
    return [excel, _python(python), _xlwings(), _pywin32(), *([_library(python, bits)] if bits else [])]


def _python(python: Path) -> Finding:
    told = f"{platform.python_version()}, {windows.own_bitness()} bits, {python}"
    place = f"make the environment at {ENVIRONMENT}, or at {{}} if your user name is in the way"
    if "windowsapps" in sys.base_prefix.casefold():
        told += ": it comes from the Microsoft Store, and what it writes into AppData no other program sees"
        return Finding("Python", told, "make the environment with a Python from python.org")
    try:
        windows.ansi(str(python))
    except UnicodeEncodeError as error:
        lacking = error.object[error.start]
        told += f": VBA cannot name this path, because the code page of Windows lacks {lacking!r}"
        return Finding("Python", told, place.format(r"C:\beamfuncs\venv"))
    if "%" in str(python):
        told += ": VBA takes a % in a path for the name of a variable"
        return Finding("Python", told, place.format(r"C:\beamfuncs\venv"))
    return Finding("Python", told)


def _xlwings() -> Finding:
    found, needed = installed("xlwings"), pinned()
    mend = "" if found == needed else f'beamfuncs works with {needed} alone: pip install "xlwings=={needed}"'
    return Finding("xlwings", found or "not installed", mend)


def _pywin32() -> Finding:
    lacking = [name for name in _NEEDED_MODULES if not windows.has_module(name)]
    told = installed("pywin32") or "not installed"
    if lacking:
        return Finding("pywin32", f"{told}, cannot import {lacking[0]}", "pip install --force-reinstall pywin32")
    return Finding("pywin32", told)


def _library(python: Path, bits: int) -> Finding:
    what = f"xlwings' library for Excel of {bits} bits"
    found = find_library(python, bits)
    if found:
        return Finding(what, str(found))
    told = f"{library(bits)} is missing in {python.parent} and in {python.parent.parent} (#VALUE! in every cell)"
    if windows.own_bitness() == 32:
        mend = "bitness: xlwings brings it to a Python of 64 bits only; make the environment with one"
    else:
        mend = (
            f'pip install --force-reinstall "xlwings=={pinned()}"; if it stays away, take a Python from python.org: '
            "xlwings has it for versions that it is built for"
        )
    return Finding(what, told, mend)
