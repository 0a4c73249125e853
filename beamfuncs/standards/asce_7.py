"""ASCE/SEI 7, Minimum design loads: basic combinations for strength and for allowable stress design, 7-16 and 7-22."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from decimal import Decimal
from functools import cache
from itertools import islice, product

from beamfuncs.cells import Frozen, not_given
from beamfuncs.errors import quoted, unreadable
from beamfuncs.standards.actions import Action, twice
from beamfuncs.standards.listing import MOST, Terms, acting, selections

# A combination a line: alternatives stand between bars, a load that acts or not in square brackets, those that act
# together are joined by `&`. The load for which the combination is written acts: without it, the effect lies between
# those of two other combinations. Where that may be either of two loads, a combination has two lines.

_QUAKE = "{0} Ev & {0} Eh | {0} Ev & -{0} Eh"
_QUAKE_UP = "-{0} Ev & {0} Eh | -{0} Ev & -{0} Eh"

LISTS = {
    "7-16 strength": (  # 2.3.1, combinations 1 to 5; 2.3.6, 6 and 7
        "1.4 D",
        "1.2 D + 1.6 L + [0.5 Lr | 0.5 S | 0.5 R]",
        "1.2 D + 1.6 Lr | 1.6 S | 1.6 R + [1 L | 0.5 W]",
        "1.2 D + 1 W + [1 L] + [0.5 Lr | 0.5 S | 0.5 R]",
        "0.9 D + [1 W]",
        f"1.2 D + {_QUAKE.format(1)} + [1 L] + [0.2 S]",
        f"0.9 D + {_QUAKE_UP.format(1)}",
    ),
    "7-16 allowable": (  # 2.4.1, combinations 1 to 7; 2.4.5, 8 to 10
        "1 D",
        "1 D + 1 L",
        "1 D + 1 Lr | 1 S | 1 R",
        "1 D + 0.75 L + 0.75 Lr | 0.75 S | 0.75 R",
        "1 D + 0.6 W",
        "1 D + 0.75 L + 0.45 W + [0.75 Lr | 0.75 S | 0.75 R]",
        "1 D + 0.45 W + 0.75 Lr | 0.75 S | 0.75 R",
        "0.6 D + [0.6 W]",
        f"1 D + {_QUAKE.format(0.7)}",
        f"1 D + {_QUAKE.format(0.525)} + 0.75 L + [0.75 S]",
        f"1 D + {_QUAKE.format(0.525)} + 0.75 S",
        f"0.6 D + {_QUAKE_UP.format(0.7)}",
    ),
    "7-22 strength": (  # 2.3.1, combinations 1 to 5; 2.3.6, 6 and 7
        "1.4 D",
        "1.2 D + 1.6 L + [0.5 Lr | 0.3 S | 0.5 R]",
        "1.2 D + 1.6 Lr | 1 S | 1.6 R + [1 L | 0.5 W]",
        "1.2 D + 1 W | 1 WT + [1 L] + [0.5 Lr | 0.3 S | 0.5 R]",
        "0.9 D + [1 W | 1 WT]",
        f"1.2 D + {_QUAKE.format(1)} + [1 L] + [0.15 S]",
        f"0.9 D + {_QUAKE_UP.format(1)}",
    ),
    "7-22 allowable": (  # 2.4.1, combinations 1 to 7; 2.4.5, 8 to 10
        "1 D",
        "1 D + 1 L",
        "1 D + 1 Lr | 0.7 S | 1 R",
        "1 D + 0.75 L + 0.75 Lr | 0.525 S | 0.75 R",
        "1 D + 0.6 W | 0.6 WT",
        "1 D + 0.75 L + 0.45 W | 0.45 WT + [0.75 Lr | 0.525 S | 0.75 R]",
        "1 D + 0.45 W | 0.45 WT + 0.75 Lr | 0.525 S | 0.75 R",
        "0.6 D + [0.6 W | 0.6 WT]",
        f"1 D + {_QUAKE.format(0.7)}",
        f"1 D + {_QUAKE.format(0.525)} + 0.75 L + [0.1 S]",
        f"1 D + {_QUAKE.format(0.525)} + 0.1 S",
        f"0.6 D + {_QUAKE_UP.format(0.7)}",
    ),
}
"""The combinations, by edition and method."""

METHODS = {
    "strength": "strength",
    "strength design": "strength",
    "lrfd": "strength",
    "allowable": "allowable",
    "allowable stress": "allowable",
    "allowable stress design": "allowable",
    "asd": "allowable",
}
"""What a method may be called."""

LETTERS = {letter.lower(): letter for letter in ("D", "L", "Lr", "S", "R", "W", "WT", "Eh", "Ev")} | {
    "e": "Eh",
    "dead": "D",
    "permanent": "D",
    "live": "L",
    "roof live": "Lr",
    "snow": "S",
    "rain": "R",
    "wind": "W",
    "tornado": "WT",
    "earthquake": "Eh",
    "seismic": "Eh",
}
"""What a load may be called."""

IN_PARTS = ("L", "Lr")
"""Loads of which several rows are parts, any of which act."""


@dataclass(frozen=True)
class Load:
    """A load of a combination: its alternatives, each of one or more letters with a factor, and whether it must act."""

    alternatives: tuple[tuple[tuple[Decimal, str], ...], ...]
    acts: bool


@cache
def _loads(line: str) -> tuple[Load, ...]:
    loads = []
    for text in line.split(" + "):
        alternatives = [[part.split() for part in choice.split("&")] for choice in text.strip("[]").split("|")]
        parts = tuple(tuple((Decimal(factor), letter) for factor, letter in choice) for choice in alternatives)
        loads.append(Load(parts, not text.startswith("[")))
    return tuple(loads)


def combined(name: str, actions: Sequence[Action], leading: Frozen, factors: Frozen) -> Iterator[Terms]:
    """Yield the combinations of an edition and a method."""
    for argument, value in (("leading", leading), ("factors", factors)):
        if not not_given(value):
            raise unreadable(f"{argument}: ASCE 7 has none to choose; leave it blank")
    rows = _rows(name, actions)
    for line in LISTS[name]:
        sides = [_sides(load, rows) for load in _loads(line)]
        for choice in product(*sides):
            yield tuple(term for terms in choice for term in terms)


def _sides(load: Load, rows: Mapping[str, Sequence[Action]]) -> list[Terms]:
    """Return the ways in which a load of a combination acts, absent first where it may be; none where it must act."""
    ways: list[Terms] = [] if load.acts else [()]
    for alternative in load.alternatives:
        given = [(factor, row) for factor, letter in alternative for row in rows.get(letter, ())]
        in_parts = alternative[0][1] in IN_PARTS
        chosen = selections(given, 1) if in_parts else [tuple(given)] if given else []
        every = (terms for these in chosen for terms in acting(these))
        ways += islice(every, MOST + 1)  # more are refused where they are listed
    is_dead = load.alternatives[0][0][1] == "D"
    return ways or ([()] if is_dead else [])


def _rows(name: str, actions: Sequence[Action]) -> dict[str, list[Action]]:
    """Return the actions by the letter of their load."""
    known = {letter for line in LISTS[name] for load in _loads(line) for way in load.alternatives for _, letter in way}
    rows: dict[str, list[Action]] = {}
    for action in actions:
        letter = LETTERS.get((action.kind or action.text).lower(), "")
        if letter not in known:
            letters = [letter for letter in dict.fromkeys(LETTERS.values()) if letter in known]
            raise unreadable(
                f"{action.where}: {quoted(action.kind or action.text, 30)} is not known; ASCE {name} takes"
                f" {', '.join(letters)}, or dead, live, roof live, snow, rain, wind,"
                f"{' tornado,' * ('WT' in known)} earthquake"
            )
        if any(psi is not None for psi in action.psi):
            raise unreadable(f"{action.where}: ASCE 7 has no psi factors; leave them blank")
        rows.setdefault(letter, []).append(action)
        if len(rows[letter]) > 1 and letter not in ("D", *IN_PARTS):
            raise twice(action, rows[letter][0], letter)
    return rows
