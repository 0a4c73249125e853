"""What a host must know of each worksheet function, derived from its signature and docstring."""

from __future__ import annotations

import inspect
from collections.abc import Callable
from dataclasses import dataclass
from functools import cache
from typing import Any

from beamfuncs import functions
from beamfuncs.documentation import parameters, sections

CATEGORY = "Beam"
RETURNS = {
    "float": "number",
    "str": "text",
    "float | Rows": "number or array",
    "Rows": "array",
    "Table": "array",
    "Texts": "array",
}
"""The shape of a result, by the function's return annotation."""


@dataclass(frozen=True)
class Argument:
    """An argument: its name, its help, whether it may be left out, and whether it may be given many times."""

    name: str
    help: str
    optional: bool
    repeats: bool


@dataclass(frozen=True)
class Entry:
    """A worksheet function as a host shows it."""

    name: str
    function: Callable[..., Any]
    summary: str
    arguments: tuple[Argument, ...]
    returns: str
    documentation: str
    category: str = CATEGORY

    @property
    def call(self) -> str:
        """The call as it is typed, optional arguments in square brackets."""
        words = [a.name + ", ..." * a.repeats for a in self.arguments]
        shown = [f"[{word}]" if a.optional else word for word, a in zip(words, self.arguments, strict=True)]
        return f"{self.name}({', '.join(shown)})"


@cache
def catalogue() -> dict[str, Entry]:
    """Return every worksheet function by its name, in the order in which they are written.

    >>> catalogue()["reaction"].call
    'reaction(beam, loads, support, [stiffness], [combination])'
    """
    return {
        name: _entry(name, function)
        for name, function in vars(functions).items()
        if getattr(function, "__worksheet__", False) and not name.startswith("_")
    }


def _entry(name: str, function: Callable[..., Any]) -> Entry:
    documentation = inspect.cleandoc(function.__doc__ or "")
    told = sections(documentation)
    help_of = parameters(told["Parameters"])
    signature = inspect.signature(function)
    arguments = tuple(
        Argument(p.name, help_of[p.name], p.default is not p.empty, p.kind is p.VAR_POSITIONAL)
        for p in signature.parameters.values()
    )
    returns = RETURNS[str(signature.return_annotation)]
    return Entry(name, function, told[""].splitlines()[0], arguments, returns, documentation)
