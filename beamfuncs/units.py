"""The factor between two compound units, its dimension checked."""

from __future__ import annotations

import re
from functools import lru_cache
from threading import Lock
from typing import Any

from beamfuncs.cells import Frozen
from beamfuncs.errors import BeamError, quoted, unreadable

TRADE_UNITS = {
    "Nm": "N m",
    "Nmm": "N mm",
    "kNm": "kN m",
    "kNmm": "kN mm",
    "kNcm": "kN cm",
    "MNm": "MN m",
    "kipft": "kip ft",
    "kipin": "kip in",
    "lbft": "lbf ft",
    "lbin": "lbf in",
    "k": "kip",
    "klf": "kip/ft",
    "plf": "lbf/ft",
    "ksf": "kip/ft2",
    "psf": "lbf/ft2",
    "pcf": "lbf/ft3",
}
"""Spellings of the trade that the unit library does not know, or takes for something else."""

LONGEST = 40
_FACTOR = re.compile(
    r"\s*([*·×./-]?)\s*(?:(1)(?![0-9])|([A-Za-zµ°]+)\s*(?:(?:\^|\*\*)?\s*(-?[0-9]|[²³⁴])(?![0-9]))?)\s*"
)
_SUPERSCRIPTS = str.maketrans("²³⁴", "234")


def factor(from_unit: Frozen, to_unit: Frozen) -> float:
    """Return the factor from one unit to another.

    >>> factor("kNm2", "kN cm²")
    10000.0
    """
    source, target = _unit("from_unit", from_unit), _unit("to_unit", to_unit)
    if source.dimensionality != target.dimensionality:
        hint = "; a force is lbf, kip or N, not lb or kg" if _apart_by_gravity(source, target) else ""
        raise unreadable(f"to_unit: {quoted(to_unit)} and {quoted(from_unit)} are of different dimensions{hint}")
    if _registry().convert(0.0, source, target) != 0.0:
        raise unreadable(f"from_unit: {quoted(from_unit)} and {quoted(to_unit)} count from different zeros")
    return float(_registry().convert(1.0, source, target))


def _apart_by_gravity(source: Any, target: Any) -> bool:
    """Tell whether a mass stands where a force is meant."""
    acceleration = _registry().Unit("m/s**2").dimensionality
    return (source / target).dimensionality in (acceleration, 1 / acceleration)


def _unit(argument: str, text: Frozen) -> Any:
    """Return the unit that a text names: units with powers, joined by blanks, points or strokes, and nothing else."""
    if text is None:
        raise unreadable(f"{argument}: blank; write a unit such as 'kN/m'")
    if not isinstance(text, str) or len(text) > LONGEST:
        raise unreadable(f"{argument}: {quoted(text)}; write a unit such as 'kN/m', in up to {LONGEST} characters")
    unit = _registry().Unit("")
    position = 0
    while position < len(text):
        found = _FACTOR.match(text, position)
        if found is None or (position == 0 and found[1]):
            raise _unknown(argument, text, text[position:])
        operator, _, name, power = found.groups()
        if name:
            part = _named(argument, text, name, int((power or "1").translate(_SUPERSCRIPTS)))
            unit = unit / part if operator == "/" else unit * part
        position = found.end()
    return unit


def _named(argument: str, text: str, name: str, power: int) -> Any:
    from pint.errors import PintError

    if name in TRADE_UNITS:
        # 'kNm2' is kN·m², as it is written on paper: there the power belongs to the last unit.
        *first, last = TRADE_UNITS[name].split()
        unit = _unit(argument, last) ** power
        return _unit(argument, first[0]) * unit if first else unit
    try:
        return _registry().Unit(name) ** power
    except (PintError, ValueError):
        raise _unknown(argument, text, name) from None


def _unknown(argument: str, text: str, part: str) -> BeamError:
    return unreadable(
        f"{argument}: {quoted(part, 20)} in {quoted(text)} is no known unit; write e.g. 'kN/m', 'kip ft', 'N/mm²'"
    )


_MAKING = Lock()


def _registry() -> Any:
    """Return the one registry: units of two do not go together, so threads must not make two."""
    with _MAKING:
        return _made()


@lru_cache(1)
def _made() -> Any:
    import pint

    return pint.UnitRegistry()
