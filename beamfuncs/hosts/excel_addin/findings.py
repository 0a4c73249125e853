"""One line of a diagnosis."""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True)
class Finding:
    """What was looked at, what it was found to be, and what to do about it where something is wrong."""

    what: str
    told: str
    mend: str = ""

    @property
    def line(self) -> str:
        """All of it in one line."""
        return f"{self.what}: {self.told}{'; ' if self.mend else ''}{self.mend}"
