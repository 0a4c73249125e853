"""The actions that are combined: rows of cases and what each is, as an engineer writes them."""

from __future__ import annotations

import re
import unicodedata
from collections.abc import Iterator
from dataclasses import dataclass
from decimal import Decimal
from typing import TypeAlias

from beamfuncs.cells import Cell, Frozen, as_text, decimal_comma, is_number, number
from beamfuncs.errors import BeamError, impossible, quoted, unreadable
from beamfuncs.notation import CASE

MOST_ACTIONS = 100
EXAMPLE = "write e.g. 'G permanent; Q office; S snow; W wind'"
PSI = ("psi0", "psi1", "psi2")
HEADERS = ("case", "action", *PSI)
"""The columns of a table of actions, in the order that they have without a header row."""

_SIGNED = rf"-?\s*{CASE}"
_CASES = rf"{_SIGNED}(?:\s*(?:\+|\bor\b)\s*{_SIGNED})*"
_CLAUSE = re.compile(rf"({_CASES})(?: ?:| |$)(.*)", re.IGNORECASE)

Way: TypeAlias = tuple[tuple[int, str], ...]
"""Cases that act together, each with its sign."""
Psi: TypeAlias = tuple[Decimal | None, ...]
"""Own psi0, psi1 and psi2, None where not given."""


@dataclass(frozen=True)
class Action:
    """An action: the ways in which its cases may act, what it is, and its own psi factors."""

    where: str
    text: str
    ways: tuple[Way, ...]
    kind: str
    psi: Psi = (None, None, None)

    @property
    def cases(self) -> frozenset[str]:
        """The names of its cases, in small letters."""
        return frozenset(case.casefold() for way in self.ways for _, case in way)


def read_actions(actions: Frozen) -> tuple[Action, ...]:
    """Return the actions that a text or a range describes.

    >>> [action.kind for action in read_actions("G permanent; W1 or W2: wind 0.5 0.2 0")]
    ['permanent', 'wind']
    """
    if isinstance(actions, float):
        raise unreadable(f"actions: the number {actions:g}; {EXAMPLE}")
    found = tuple(_table(actions) if isinstance(actions, tuple) else _clauses("actions", actions))
    if not found:
        raise unreadable(f"actions: blank; {EXAMPLE}")
    if len(found) > MOST_ACTIONS:
        raise impossible(
            f"actions: {len(found)} of them; give at most {MOST_ACTIONS}, cases that act together in one row"
        )
    named: dict[str, str] = {}
    for action in found:
        for case in sorted(action.cases):
            if case in named:
                raise unreadable(
                    f"{action.where}: case {case!r} stands in {named[case]!r} too; a case belongs to one action"
                )
            named[case] = action.text
    return found


def read_ways(where: str, text: str) -> tuple[Way, ...]:
    """Return the ways in which cases may act: `or` parts them, `+` joins cases into one.

    >>> read_ways("actions", "W1 or W2 + W3")
    (((1, 'W1'),), ((1, 'W2'), (1, 'W3')))
    """
    text = " ".join(text.split())
    if not re.fullmatch(_CASES, text, re.IGNORECASE):
        raise unreadable(
            f"{where}: {quoted(text, 40)} is no case; a case is a letter and then letters, digits or _, e.g. 'W',"
            " 'W1 or W2', 'G1 + G2'"
        )
    ways = []
    for way in re.split(r"\bor\b", text, flags=re.IGNORECASE):
        names = [case.strip() for case in way.split("+")]
        ways.append(tuple((-1 if name[0] == "-" else 1, name.lstrip("- ")) for name in names))
    for way in ways:
        if len({case.casefold() for _, case in way}) < len(way):
            raise unreadable(
                f"{where}: {quoted(text, 40)} joins a case to itself; join different cases, e.g. 'G1 + G2'"
            )
    return tuple(dict.fromkeys(ways))


def twice(action: Action, before: Action, kind: str) -> BeamError:
    """Return the error of two rows of an action that is one by nature."""
    one, other = before.text, action.text
    return unreadable(
        f"{action.where}: {one} and {other} are both {kind}; write '{one} or {other}' in one row if they exclude each"
        f" other, '{one} + {other}' if they act together"
    )


# --- text -----------------------------------------------------------------------------------------


def _clauses(where: str, text: str | None) -> Iterator[Action]:
    clauses = [" ".join(clause.split()) for clause in re.split(r"[;\n\r]", text or "") if clause.strip()]
    for count, clause in enumerate(clauses, 1):
        yield _clause(f"{where}, clause {count}" if len(clauses) > 1 else where, clause)


def _clause(where: str, text: str) -> Action:
    parts = _CLAUSE.fullmatch(text)
    if parts is None:
        raise unreadable(f"{where}: {quoted(text)} does not begin with a case; {EXAMPLE}")
    words = parts[2].split()
    sizes: list[Cell] = []
    while words and len(sizes) < len(PSI) and (is_number(words[-1]) or re.fullmatch("[0-9]+,[0-9]+", words[-1])):
        if "," in words[-1]:
            raise decimal_comma(where, words[-1])
        sizes.insert(0, words.pop())
    return _action(where, parts[1], " ".join(words), sizes)


# --- table ----------------------------------------------------------------------------------------


def _table(rows: tuple[tuple[Cell, ...], ...]) -> Iterator[Action]:
    columns: tuple[str, ...] | None = None
    for row_number, row in enumerate(rows, 1):
        where = f"actions, row {row_number}"
        filled = [cell for cell in row if cell is not None]
        if not filled:
            continue
        if columns is None:
            columns = _header(row)
            if columns:
                continue
            columns = HEADERS
        if len(filled) == 1 and isinstance(filled[0], str):
            yield from _clauses(where, filled[0])
            continue
        cells = dict(zip(columns, row, strict=False))
        for column, cell in enumerate(row):
            if cell is not None and not (column < len(columns) and columns[column]):
                raise unreadable(f"{where}: {quoted(cell)} in column {column + 1}; columns are {', '.join(HEADERS)}")
        case, kind = cells.get("case"), cells.get("action")
        if not isinstance(case, str):
            raise unreadable(
                f"{where}: {'no case' if case is None else f'case {case:g}'}; give the name of a load case, e.g. 'G'"
            )
        if isinstance(kind, float):
            raise unreadable(
                f"{where}: action {kind:g}; say what {case.strip()} is, e.g. 'permanent', 'office', 'wind'"
            )
        yield _action(where, case, kind or "", [cells.get(psi) for psi in PSI])


def _header(row: tuple[Cell, ...]) -> tuple[str, ...] | None:
    """Return the header of each column, "" where it has none, or None where the row is none of headers."""
    # Compatibility forms make a subscript digit a digit, so that ψ₀ is read as psi0.
    words = tuple(
        re.sub(r"[\s_]", "", unicodedata.normalize("NFKC", cell).lower()).replace("ψ", "psi")
        if isinstance(cell, str)
        else ""
        for cell in row
    )
    if not {"case", "action"} & set(words):
        return None
    for word, cell in zip(words, row, strict=True):
        if (word or cell is not None) and word not in HEADERS:
            raise unreadable(f"actions: header {quoted(cell, 30)} is not known; headers are {', '.join(HEADERS)}")
        if word and words.count(word) > 1:
            raise unreadable(f"actions: header '{word}' stands twice; each header stands once")
    if "case" not in words:
        raise unreadable("actions: no header 'case'; give a column with the names of the load cases")
    return words


def _action(where: str, cases: str, kind: str, sizes: list[Cell]) -> Action:
    psi = tuple(
        None if size is None else _psi(f"{where}, {name}", size) for name, size in zip(PSI, sizes, strict=False)
    )
    psi += (None,) * (len(PSI) - len(psi))
    return Action(where, cases.strip(), read_ways(where, cases), " ".join(kind.lower().split()), psi)


def _psi(where: str, cell: Cell) -> Decimal:
    size = number(where, cell)
    if not 0 <= size <= 1:
        raise impossible(f"{where}: {size:g}; a psi factor lies between 0 and 1")
    return Decimal(as_text(size))
