"""Where a LibreOffice is on this machine, and the user's profile of it."""

from __future__ import annotations

import os
import shutil
import subprocess
import sys
from collections.abc import Iterator
from dataclasses import dataclass
from functools import cached_property
from pathlib import Path

PATIENCE = 60
"""Seconds that a program of the office may take to tell of itself."""


@dataclass(frozen=True)
class Office:
    """An office, by the folder that holds its programs."""

    program: Path

    @property
    def soffice(self) -> Path:
        """The office itself; on Windows the one that ends when its work is done."""
        return self.program / ("soffice.com" if sys.platform == "win32" else "soffice")

    @property
    def unopkg(self) -> Path:
        """The tool for extensions."""
        return self.program / ("unopkg.com" if sys.platform == "win32" else "unopkg")

    @cached_property
    def version(self) -> str:
        """What the office says it is."""
        said = _output([str(self.soffice), "--version"])
        return said.splitlines()[0].strip() if said and said.strip() else "of an unknown version"

    @cached_property
    def python(self) -> Path | None:
        """A Python that can talk to the office: its own, or the system's; None where there is none."""
        own = [self.program / "python", self.program / "python.exe", self.program.parent / "Resources" / "python"]
        system = [Path(found) for found in (shutil.which("python3", path="/usr/bin"), shutil.which("python3")) if found]
        for python in (*own, *system):
            if python.is_file() and _output([str(python), "-c", "import uno"]) is not None:
                return python
        return None


def offices() -> Iterator[Office]:
    """Yield the offices of this machine, the one that is found first by its name before all others."""
    seen = set()
    for program in _programs():
        office = Office(program)
        if office.soffice.is_file() and program not in seen:
            seen.add(program)
            yield office


def profile() -> Path:
    """Return the folder of the user's profile."""
    if sys.platform == "win32":
        return Path(os.environ.get("APPDATA") or Path.home()) / "LibreOffice" / "4"
    if sys.platform == "darwin":
        return Path.home() / "Library" / "Application Support" / "LibreOffice" / "4"
    configuration = os.environ.get("XDG_CONFIG_HOME", "")
    return (Path(configuration) if os.path.isabs(configuration) else Path.home() / ".config") / "libreoffice" / "4"


def lock(profile: Path) -> Path:
    """Return the file that stands in a profile while the office runs in it."""
    return profile / ".lock"


def _programs() -> Iterator[Path]:
    for name in ("soffice", "libreoffice"):
        found = shutil.which(name)
        if found:
            yield Path(found).resolve().parent
    if sys.platform == "win32":
        for variable in ("ProgramFiles", "ProgramFiles(x86)"):
            if os.environ.get(variable):
                yield Path(os.environ[variable]) / "LibreOffice" / "program"
    elif sys.platform == "darwin":
        for folder in (Path("/Applications"), Path.home() / "Applications"):
            yield folder / "LibreOffice.app" / "Contents" / "MacOS"
    else:
        for folder in (Path("/usr/lib"), Path("/usr/lib64"), Path("/usr/local/lib")):
            yield folder / "libreoffice" / "program"
        for folder in sorted(Path("/opt").glob("libreoffice*"), reverse=True):
            yield folder / "program"


def _output(command: list[str]) -> str | None:
    """Return what a program prints, None where it fails."""
    try:
        done = subprocess.run(command, capture_output=True, text=True, check=False, timeout=PATIENCE)
    except (OSError, subprocess.TimeoutExpired):
        return None
    return None if done.returncode else done.stdout
