"""A diagnosis of the functions in Excel, to read or to send: what was found, and what to do where it is wrong."""

from __future__ import annotations

import os
import platform
from collections.abc import Mapping
from pathlib import Path
from tempfile import TemporaryFile

from beamfuncs.hosts.excel_addin import machine, macros, server, settings, windows
from beamfuncs.hosts.excel_addin.addin import Addin, read_addin
from beamfuncs.hosts.excel_addin.findings import Finding
from beamfuncs.hosts.excel_addin.places import PROJECT, Places
from beamfuncs.hosts.excel_addin.vba import MODULE, module_text
from beamfuncs.hosts.excel_addin.vbaproject import NotRead, declarations

INSTALL = "run `beamfuncs excel install`"


def findings(places: Places, environment: Mapping[str, str] = os.environ) -> list[Finding]:
    """Return all that was found, in the order in which one thing needs the other."""
    found = _settings(places)
    python = Path(os.path.expandvars(found[settings.INTERPRETER])) if settings.INTERPRETER in found else None
    return [
        Finding("Windows", platform.platform()),
        Finding("beamfuncs", str(machine.installed("beamfuncs"))),
        *machine.findings(python or machine.interpreter()),
        *_settings_findings(places, found, python),
        _startup(places),
        *_addin(places),
        *macros.findings(),
        _synchronised(python or machine.interpreter(), environment),
        *([_server(python, found)] if python else []),
        Finding("log of cells in error", f"{places.log}{'' if places.log.exists() else ' (none so far)'}"),
    ]


# --- settings -------------------------------------------------------------------------------------


def _text(places: Places) -> str | None:
    try:
        return windows.from_ansi(places.settings.read_bytes())
    except OSError:
        return None


def _settings(places: Places) -> dict[str, str]:
    return settings.read(_text(places) or "")


def _settings_findings(places: Places, found: dict[str, str], python: Path | None) -> list[Finding]:
    text = _text(places)
    if text is None:
        return [Finding("settings", f"{places.settings} is not there (#VALUE! in every cell)", INSTALL)]
    told = ", ".join(f"{key} = {found[key]}" for key in settings.SHOWN if key in found)
    return [Finding("settings", f"{places.settings}: {told}", _settings_remedy(places, text, found, python))]


def _settings_remedy(places: Places, text: str, found: dict[str, str], python: Path | None) -> str:
    if python is None:
        return f"they do not say which Python to start: {INSTALL}"
    if not settings.paired(text):
        return f'give every line of {places.settings} the form "KEY","value", and leave no line in it blank'
    if not python.is_file():
        return f"the Python that they name is not there: {INSTALL} from the environment that is"
    if os.path.normcase(python.parent) != os.path.normcase(machine.interpreter().parent):
        return f"they name the Python of another environment than this: {INSTALL} from the one that Excel is to use"
    if found.get(settings.DEBUG, "").casefold() == "true":
        return f"take out the line {settings.DEBUG}: Excel waits for a Python that is started by hand"
    if found.get(settings.ADD_FOLDER, "True").casefold() == "true":
        return f"modules beside a workbook, also in a synchronised folder, go before those installed: {INSTALL}"
    return ""


# --- the add-in -----------------------------------------------------------------------------------


def _startup(places: Places) -> Finding:
    try:
        with TemporaryFile(dir=places.startup):
            return Finding("startup folder", f"{places.startup}, can be written to")
    except FileNotFoundError:
        return Finding("startup folder", f"{places.startup} is not there", INSTALL)
    except OSError as error:
        told = f"{places.startup} cannot be written to ({(error.strerror or str(error)).lower()})"
        return Finding("startup folder", told, "ask the administrator for the right to write there")


def _addin(places: Places) -> list[Finding]:
    path = places.addin
    try:
        found = read_addin(path)
    except FileNotFoundError:
        return [Finding("add-in", f"{path} is not there (#NAME? in every cell)", INSTALL)]
    except (NotRead, OSError) as error:
        return [Finding("add-in", f"{error} (#NAME? in every cell)", INSTALL)]
    told = f"{path}, with the VBA of xlwings {found.xlwings}{_in_use(path)}"
    mend = ""
    if found.xlwings != machine.pinned():
        mend = f"#VALUE! in every cell, since this Python has xlwings {machine.pinned()}: {INSTALL}, then import anew"
    elif found.project != PROJECT:
        mend = f"it reads the settings of {found.project}: {INSTALL}"
    return [Finding("add-in", told, mend), _functions(found, places.module), _download_mark(path)]


def _functions(found: Addin, module: Path) -> Finding:
    """Return whether the imported module has every function, declared as it is now."""
    if not found.complete:
        told = f"no module {MODULE} in the add-in (#NAME? in every cell)"
        return Finding("functions", told, f"import {module}: {INSTALL}, which tells the steps")
    wanted = declarations(module_text())
    lacking = [name for name in wanted if name not in found.functions]
    differing = [name for name in wanted if found.functions.get(name, wanted[name]) != wanted[name]]
    if not lacking + differing:
        return Finding("functions", f"{len(wanted)} in the add-in")
    told = "; ".join(
        f"{what}: {', '.join(names)}"
        for what, names in (
            ("not in the add-in (#NAME?)", lacking),
            ("with other arguments (#VALUE! or a wrong number)", differing),
        )
        if names
    )
    mend = f"the module is of another version: {INSTALL}, remove {MODULE} from the add-in, and import {module} anew"
    return Finding("functions", told, mend)


def _in_use(path: Path) -> str:
    try:
        with path.open("r+b"):
            return ""
    except PermissionError:
        return ", in use: close Excel before you install or uninstall"


def _download_mark(path: Path) -> Finding:
    """Return whether Windows keeps a note beside the add-in that it came from elsewhere."""
    try:
        mark = Path(f"{path}:Zone.Identifier").read_text(errors="replace")
    except OSError:
        return Finding("download mark", "none on the add-in")
    told = f"the add-in is marked as downloaded ({' '.join(mark.split())}): Excel may block its macros"
    return Finding("download mark", told, f"right-click {path} > Properties > Unblock")


# --- around it ------------------------------------------------------------------------------------


def _synchronised(python: Path, environment: Mapping[str, str]) -> Finding:
    folders = sorted({value for name, value in environment.items() if name.upper().startswith("ONEDRIVE") and value})
    told = f"{', '.join(folders) or 'none'} (workbooks may lie there)"
    if any(Path(os.path.normcase(folder)) in Path(os.path.normcase(python)).parents for folder in folders):
        mend = (
            f"Python lies in one, where files can be locked or missing: make the environment at {machine.ENVIRONMENT}"
        )
        return Finding("synchronised folders", told, mend)
    return Finding("synchronised folders", told)


def _server(python: Path, found: dict[str, str]) -> Finding:
    fault = server.fault(python, found.get(settings.PATHS, ""))
    if not fault:
        return Finding(
            "server", "answers a function (called without COM, over which Excel calls it: that is not tried)"
        )
    mend = (
        "in the folder of beamfuncs, pip install --force-reinstall . with that Python, Excel closed; if this line"
        " stays, send this diagnosis"
    )
    return Finding("server", f"{python}: {fault} (#VALUE! in every cell)", mend)
