"""The calls of our functions that a workbook's cells made, noted where a report is wanted."""

from __future__ import annotations

from beamfuncs.hosts.headless.engine import Call
from beamfuncs.hosts.headless.grid import Place

MOST_CALLS = 20
"""Of one cell that makes more different calls, the first are kept."""


class Calls:
    """The different calls of each cell; in a new round of evaluation a cell's new calls replace its old ones."""

    def __init__(self) -> None:
        self._kept: dict[Place, list[Call]] = {}
        self._renewed: set[Place] = set()

    def begin_round(self) -> None:
        self._renewed.clear()

    def note(self, place: Place, call: Call) -> None:
        if place not in self._renewed:
            self._renewed.add(place)
            self._kept[place] = []
        kept = self._kept[place]
        if len(kept) < MOST_CALLS and call not in kept:
            kept.append(call)

    def of(self, place: Place) -> tuple[Call, ...]:
        return tuple(self._kept.get(place, ()))
