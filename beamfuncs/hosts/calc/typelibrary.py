"""The type library: shipped beside the source from which it was built, and built anew where the office's tool is."""

from __future__ import annotations

import shutil
import subprocess
import tempfile
from collections.abc import Iterable
from pathlib import Path

from beamfuncs.hosts.calc import idl

FOLDER = Path(__file__).parent / "library"
LIBRARY, SOURCE = FOLDER / "functions.rdb", FOLDER / "functions.idl"
_TOOL = "unoidl-write"
_OFFICE_TYPES = "types.rdb", "types/offapi.rdb"


class NotBuilt(Exception):
    """The type library was not built; the message says why in one line."""


def is_current() -> bool:
    """Tell whether the shipped type library was built from the types of today's catalogue."""
    return SOURCE.read_text(encoding="utf-8") == idl.source()


def shipped() -> bytes:
    """Return the shipped type library; raise where the catalogue has changed since it was built."""
    if not is_current():
        raise NotBuilt(
            "the functions have changed since the type library was built: run `beamfuncs calc build --types`"
        )
    return LIBRARY.read_bytes()


def rebuild(programs: Iterable[Path]) -> None:
    """Build the type library from the catalogue and ship it; `programs` are the program folders of offices."""
    built = build(idl.source(), programs)
    FOLDER.mkdir(exist_ok=True)
    LIBRARY.write_bytes(built)
    SOURCE.write_text(idl.source(), encoding="utf-8")


def build(source: str, programs: Iterable[Path]) -> bytes:
    """Return a type library built from its source by the tool of an office's development kit."""
    tool, program = _kit(programs)
    with tempfile.TemporaryDirectory() as folder:
        (Path(folder) / SOURCE.name).write_text(source, encoding="utf-8")
        types = [str(program / name) for name in _OFFICE_TYPES]
        command = [str(tool), *types, SOURCE.name, LIBRARY.name]
        done = subprocess.run(command, cwd=folder, capture_output=True, text=True, check=False)
        if done.returncode:
            raise NotBuilt(f"{_TOOL}: {done.stderr.strip() or done.returncode}")
        return (Path(folder) / LIBRARY.name).read_bytes()


def _kit(programs: Iterable[Path]) -> tuple[Path, Path]:
    for program in programs:
        tool = shutil.which(_TOOL, path=str(program.parent / "sdk" / "bin")) or shutil.which(_TOOL)
        if tool:
            return Path(tool), program
    raise NotBuilt(f"{_TOOL} is not found; it is part of LibreOffice's development kit (Debian: libreoffice-dev)")
