"""A beam as formulas name it."""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True)
class Called:
    """The cells in which a beam stands, and those of the pads under its supports."""

    mark: str
    where: str
    line: str
    loads: str
    stiffness: str
    lengths: str
    pads: tuple[str, ...]

    def ask(self, function: str, combination: str, wanted: str | None = None) -> str:
        """Return the formula that asks `function` for what is `wanted` of this beam."""
        parts = [self.line, self.loads, wanted, self.stiffness, combination]
        return f"={function}({','.join(part for part in parts if part is not None)})"
