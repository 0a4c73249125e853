"""What an installation changed, written before it changes anything, so that it can be undone whenever it ended."""

from __future__ import annotations

import json
from dataclasses import asdict, dataclass
from pathlib import Path
from typing import Any

from beamfuncs.hosts.headless.writing import replace


class Damaged(ValueError):
    """The receipt cannot be read; the message says so in one line."""


@dataclass(frozen=True)
class Receipt:
    """The state to go back to. Names are of files in this program's own folder."""

    digest: str = ""
    """Of the add-in that was put in place; blank where the one that stood there was left."""
    others: tuple[str, ...] = ()
    """The modules in it beside that of the beam functions."""
    former: str = ""
    """The file that keeps another add-in of that name, which stood there before."""
    older: tuple[str, ...] = ()
    """Files that keep add-ins of earlier installations, with the module that was imported into them."""
    settings: str = ""
    """Our lines in the settings file, byte for byte (as Latin-1)."""
    settings_made: bool = False
    folders: tuple[str, ...] = ()
    """Those that were not there."""

    def write(self, path: Path) -> None:
        """Write the receipt, whole or not at all."""
        replace(path, [json.dumps(asdict(self), indent=2).encode()])


def read_receipt(path: Path) -> Receipt | None:
    """Return the receipt of an installation, or None where there is none; raises `Damaged`."""
    try:
        fields: dict[str, Any] = json.loads(path.read_bytes())
        for name, value in fields.items():
            fields[name] = tuple(value) if isinstance(value, list) else value
        return Receipt(**fields)
    except FileNotFoundError:
        return None
    except (ValueError, TypeError, AttributeError):
        raise Damaged(f"{path}: is damaged; see there what was installed, and remove that by hand") from None
