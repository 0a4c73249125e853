"""What an add-in file holds: the VBA of xlwings in which version, the beam functions, and what else."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path

from beamfuncs.hosts.excel_addin.vba import MODULE
from beamfuncs.hosts.excel_addin.vbaproject import NotRead, constant, declarations, modules


@dataclass(frozen=True)
class Addin:
    """An add-in file, read: `functions` are the declarations of the beam functions in it, by name."""

    modules: frozenset[str]
    xlwings: str
    project: str
    functions: dict[str, str]

    @property
    def complete(self) -> bool:
        """Whether the module with the beam functions was imported."""
        return MODULE in self.modules

    @property
    def others(self) -> frozenset[str]:
        """The modules beside that of the beam functions."""
        return self.modules - {MODULE}


def read_addin(path: Path) -> Addin:
    """Read an add-in file; raises `NotRead` where it is none with the VBA of xlwings, OSError where it is not there."""
    found = modules(path)
    for source in found.values():
        version = constant(source, "XLWINGS_VERSION")
        if version:
            project = constant(source, "PROJECT_NAME") or ""
            return Addin(frozenset(found), version, project, declarations(found.get(MODULE, "")))
    raise NotRead(f"{path}: does not hold the VBA of xlwings")
