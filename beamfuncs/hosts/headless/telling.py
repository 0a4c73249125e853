"""What is said of stored values, in words for people to read."""

from __future__ import annotations

from beamfuncs.errors import ErrorValue
from beamfuncs.hosts.headless.checking import Checked, StaleCell
from beamfuncs.hosts.headless.splice import CellValue, written
from beamfuncs.hosts.headless.stored import Difference

LONGEST_TEXT = 60


def difference(one: Difference) -> str:
    """Return in one line what a cell stored, what is computed, which of the two is taken, why, and who uses it.

    >>> difference(Difference("Plan", "B1", 11.0, 10.0, "=A1*2", False, True, "", ["Plan!D1", "Plan!D2"]))
    'stores 11, computed 10; the stored value is kept; used by Plan!D1, Plan!D2'
    """
    taken = "the stored value is kept" if one.kept else "the computed value is taken"
    reason = f" ({one.reason})" if one.reason else ""
    users = f"; used by {', '.join(one.used_by).replace(', ...', ' and more')}" if one.used_by else ""
    return f"{_values(one.stored, one.computed)}; {taken}{reason}{users}"


def stale(one: StaleCell) -> str:
    """Return in a few words what a stale cell stores and what is computed."""
    return _values(one.stored, one.computed)


def summary(one: Checked) -> str:
    """Return in one line what was found in a workbook.

    >>> from pathlib import Path
    >>> summary(Checked(Path("plan.xlsx"), beam_cells=1))
    '1 beam cell, up to date'
    """
    if one.unread:
        return f"cannot be read: {one.unread}"
    found = [
        f"{len(cells)} {what}"
        for cells, what in (
            (one.stale, "stale"),
            (one.errors, "in error"),
            (one.differences, "stored otherwise than computed"),
        )
        if cells
    ]
    beams = "1 beam cell" if one.beam_cells == 1 else f"{one.beam_cells} beam cells"
    return ", ".join([beams, *(["up to date"] if one.passes else []), *found])


def _values(stored: CellValue, computed: CellValue) -> str:
    stores = "stores nothing" if stored is None else f"stores {_shown(stored)}"
    return f"{stores}, computed {'nothing' if computed is None else _shown(computed)}"


def _shown(value: CellValue) -> str:
    text = written(value)[1]
    if isinstance(value, str) and not isinstance(value, ErrorValue) and not text.startswith("#"):
        text = " ".join(text.split())
        return f'"{text[: LONGEST_TEXT - 3]}..."' if len(text) > LONGEST_TEXT else f'"{text}"'
    return {"b": "TRUE" if value else "FALSE"}.get(written(value)[0], text)
