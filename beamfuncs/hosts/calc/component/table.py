"""What was written into the extension when it was packed: its version, its names, and its functions."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any, Dict, List, NamedTuple

FILE = "functions.json"


class Table(NamedTuple):
    """The names of the services and of the Excel add-in's file, and the functions by the names of their methods."""

    version: str
    service: str
    interface: str
    loaded: str
    saved: str
    addin: str
    functions: Dict[str, Dict[str, Any]]

    @property
    def names(self) -> List[str]:
        """The functions' own names."""
        return [known["name"] for known in self.functions.values()]

    @property
    def long_names(self) -> Dict[str, str]:
        """The functions' own names by the long ones that the office writes into files."""
        return {"{}.{}".format(self.service, method).upper(): self._name(method) for method in self.functions}

    def _name(self, method: str) -> str:
        return str(self.functions[method]["name"])


def read() -> Table:
    """Return the table that stands beside this module in the extension."""
    return Table(**json.loads((Path(__file__).parent / FILE).read_text(encoding="utf-8")))
