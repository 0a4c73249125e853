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
    pads: tuple[str, ...]

    def ask(self, function: str, combination: str | None, wanted: str | None = None) -> str:
        """Return the formula that asks `function` for what is `wanted` of this beam; no combination: all loads."""
        parts = [self.line, self.loads, wanted, self.stiffness, combination]
        return f"={function}({','.join(part for part in parts if part is not None)})"

    def length(self) -> str:
        """Return the formula of the length: the total of a unit load over the whole beam."""
        return f'=beam_result({self.line},"udl 1","total load",{self.stiffness})'
