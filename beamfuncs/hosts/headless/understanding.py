"""What a call of one of our functions understood of the arguments that it got."""

from __future__ import annotations

import inspect
from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Any

from beamfuncs.cells import Argument
from beamfuncs.errors import BeamError
from beamfuncs.functions import beam_reads, loads_read
from beamfuncs.hosts.headless.engine import Call, Function

SOLVING = {"beam", "loads", "stiffness", "combination"}
"""The arguments of a function that solves a beam."""
EVERY_LOAD_ONCE = "every load once"
_UNTOLD = "not understood: "


@dataclass(frozen=True)
class Arguments:
    """The arguments of a call that describe a beam, None where they were not given."""

    beam: Argument
    loads: Argument
    stiffness: Argument
    combination: Argument


@dataclass(frozen=True)
class Understood:
    """What was understood, in sentences; blank where a call has no such argument.

    `line` is the beam without its stiffness. `solved` says whether the call asks for results of a beam that was read.
    """

    beam: str = ""
    loads: str = ""
    combination: str = ""
    line: str = ""
    solved: bool = False
    arguments: Arguments | None = field(default=None, compare=False)

    @property
    def stiffness_given(self) -> bool:
        return self.beam != self.line


class Reader:
    """Reads the arguments of calls; what was read before is remembered."""

    def __init__(self, functions: Mapping[str, Function]) -> None:
        self._names = {name: list(inspect.signature(function).parameters) for name, function in functions.items()}
        self._sentences: dict[str, tuple[str, bool]] = {}

    def understood(self, call: Call) -> Understood:
        """Return what a call understood of its beam, loads and combination."""
        names = self._names[call.function]
        given: dict[str, Any] = dict(zip(names, call.arguments, strict=False))
        if "beam" not in names or not given:
            return Understood()
        stiffness = _given(given.get("stiffness"))
        arguments = Arguments(given.get("beam"), given.get("loads"), stiffness, _given(given.get("combination")))
        line, line_read = self._sentence("beam", arguments.beam, None)
        beam, beam_read = self._sentence("beam", arguments.beam, stiffness)
        if "loads" not in names:
            return Understood(beam, line=line)
        loads, loads_understood = self._sentence("loads", arguments.beam, arguments.loads) if line_read else ("", False)
        solving = names[0] == "beam" and set(names) >= SOLVING
        combination = ""
        if solving:
            text = " ".join(str(arguments.combination).split())
            combination = EVERY_LOAD_ONCE if arguments.combination is None else text
        return Understood(beam, loads, combination, line, solving and beam_read and loads_understood, arguments)

    def _sentence(self, what: str, beam: Argument, other: Argument) -> tuple[str, bool]:
        """Return the sentence about a beam or its loads, and whether they could be read."""
        key = f"{what} {beam!r} {other!r}"
        if key not in self._sentences:
            try:
                self._sentences[key] = (beam_reads if what == "beam" else loads_read)(beam, other), True
            except BeamError as error:
                self._sentences[key] = f"{_UNTOLD}{error.reason}", False
        return self._sentences[key]


def _given(value: Argument) -> Argument:
    """Return None for an argument that counts as not given: a blank, or the 0 that a host puts for one."""
    return None if isinstance(value, float | str) and not isinstance(value, bool) and value in (0.0, "") else value
