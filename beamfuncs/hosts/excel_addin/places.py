"""Where Excel, xlwings' add-in and this program keep their files in a user's profile.

Nothing here is looked for or made: these are the places as Windows' own variables name them. On other
systems they stand in the folders that are usual there, so that the log has its place everywhere.
"""

from __future__ import annotations

import os
import sys
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path

ADDIN = "beamfuncs.xlam"
PROJECT = "myaddin"
"""`PROJECT_NAME` in the VBA of xlwings' template for add-ins: the settings are looked for under this name."""


@dataclass(frozen=True)
class Places:
    """The files of one user: `profile` is the home folder, `roaming` and `local` hold programs' data."""

    profile: Path
    roaming: Path
    local: Path

    @property
    def startup(self) -> Path:
        """The folder from which Excel opens every workbook at its start: a trusted location by default."""
        return self.roaming / "Microsoft" / "Excel" / "XLSTART"

    @property
    def addin(self) -> Path:
        """The add-in with the beam functions."""
        return self.startup / ADDIN

    @property
    def staged(self) -> Path:
        """Where the add-in is written before it is moved: Excel opens whatever lies in the startup folder."""
        return self.startup.parent / f"{ADDIN}.part"

    @property
    def settings(self) -> Path:
        """What the add-in's VBA reads: which Python to start."""
        return self.profile / f".{PROJECT}" / f"{PROJECT}.conf"

    @property
    def own(self) -> Path:
        """The folder that is this program's alone; it goes when it is empty."""
        return self.local / "beamfuncs"

    @property
    def log(self) -> Path:
        """Why cells are in error, a line each."""
        return self.own / "excel.log"

    @property
    def receipt(self) -> Path:
        """What an installation changed, so that it can be undone."""
        return self.own / "installed.json"

    @property
    def module(self) -> Path:
        """The VBA module that is imported into the add-in by hand."""
        return self.own / "beamfuncs.bas"


def places(environment: Mapping[str, str] = os.environ) -> Places:
    """Return the places of the user to whom an environment belongs.

    >>> places({"USERPROFILE": "home", "LOCALAPPDATA": "local"}).log.as_posix()
    'local/beamfuncs/excel.log'
    """

    def folder(variable: str, usual: Path) -> Path:
        return Path(environment[variable]) if environment.get(variable) else usual

    profile = folder("USERPROFILE", Path.home())
    if sys.platform == "win32":
        usual = profile / "AppData" / "Roaming", profile / "AppData" / "Local"
    else:
        usual = folder("XDG_CONFIG_HOME", profile / ".config"), folder("XDG_STATE_HOME", profile / ".local" / "state")
    return Places(profile, folder("APPDATA", usual[0]), folder("LOCALAPPDATA", usual[1]))


def log_file() -> Path:
    """Return where the Excel host writes why cells are in error; the folder may have to be made."""
    return places().log
