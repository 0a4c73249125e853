"""The factor between two compound units, its dimension checked."""

from __future__ import annotations

import re
from functools import lru_cache
from typing import Any

from beamfuncs.cells import Frozen
from beamfuncs.errors import quoted, unreadable

LONGEST = 40
TRADE_UNITS = {
    "kNm": "kN * m",
    "MNm": "MN * m",
    "Nm": "N * m",
    "Nmm": "N * mm",
    "kNmm": "kN * mm",
    "kNcm": "kN * cm",
    "kipft": "kip * ft",
    "kipin": "kip * in",
    "lbft": "lbf * ft",
    "lbin": "lbf * in",
    "k": "kip",
    "klf": "kip / ft",
    "plf": "lbf / ft",
    "psf": "lbf / ft ** 2",
    "ksf": "kip / ft ** 2",
    "tonf": "tonne * g_0",
}
"""Spellings of the trade that the unit library does not know, or takes for something else."""

_WORD = re.compile(
    r"\s*(?:(?P<unit>[A-Za-zµ°]+)(?:\s*(?:\^|\*\*)?\s*(?P<power>-?[0-9]|[²³⁴]))?|(?P<sign>[*·×/()]|1(?![0-9])))"
)
_SUPERSCRIPTS = {"²": "2", "³": "3", "⁴": "4"}


def factor(from_unit: Frozen, to_unit: Frozen) -> float:
    """Return the factor from one unit to another.

    >>> factor("kNm2", "kN cm²")
    10000.0
    """
    source, target = _unit("from_unit", from_unit), _unit("to_unit", to_unit)
    if source.dimensionality != target.dimensionality:
        raise unreadable(
            f"to_unit: {quoted(to_unit)} is {target.dimensionality}, but {quoted(from_unit)} is {source.dimensionality}"
        )
    return float(_registry().convert(1.0, source, target))


def _unit(argument: str, unit: Frozen) -> Any:
    """Return the unit that a text names: names, powers, products and quotients, nothing else."""
    from pint.errors import PintError

    if not isinstance(unit, str):
        raise unreadable(f"{argument}: {quoted(unit)}; write a unit such as 'kN/m'")
    expression = _expression(argument, unit)
    try:
        parsed = _registry().parse_units(expression)
    except (PintError, ValueError, TypeError, AttributeError, SyntaxError):
        raise unreadable(
            f"{argument}: {quoted(unit)} is not a unit that is known; write e.g. 'kN/m', 'kip ft', 'N/mm²'"
        ) from None
    if (
        not _registry()._units_are_multiplicative(parsed)
        if hasattr(_registry(), "_units_are_multiplicative")
        else False
    ):
        raise unreadable(f"{argument}: {quoted(unit)} has a zero of its own and no factor")
    return parsed


def _expression(argument: str, unit: str) -> str:
    words = []
    position = 0
    text = unit.strip()
    if len(text) > LONGEST:
        raise unreadable(f"{argument}: {quoted(unit)} is longer than {LONGEST} characters")
    while position < len(text):
        found = _WORD.match(text, position)
        if found is None:
            raise unreadable(
                f"{argument}: {quoted(unit)} is not understood at {quoted(text[position:], 10)}; write e.g. 'kN/m'"
            )
        position = found.end()
        if found["sign"]:
            words.append("*" if found["sign"] in "·×" else found["sign"])
            continue
        if words and words[-1] not in ("*", "/", "("):
            words.append("*")
        name = TRADE_UNITS.get(found["unit"], found["unit"])
        power = found["power"]
        if power and found["unit"] in TRADE_UNITS:
            # 'kNm2' is kN·m², as it is written on paper: the power belongs to the last factor.
            words.append(f"({name} ** {_SUPERSCRIPTS.get(power, power)})")
        elif power:
            words.append(f"{name} ** {_SUPERSCRIPTS.get(power, power)}")
        else:
            words.append(f"({name})")
    return " ".join(words)


@lru_cache(1)
def _registry() -> Any:
    import pint

    return pint.UnitRegistry()
