"""Another formula engine's values of a workbook: a second opinion where no function of ours is called."""

from __future__ import annotations

from pathlib import Path

import pytest

from beamfuncs.hosts.headless.grid import cell_name


def second_opinion(path: Path) -> dict[tuple[str, str], object] | None:
    """Return the value of every formula by sheet and cell, as the other engine works it out; None if it cannot read."""
    formulon = pytest.importorskip("formulon", reason="NOT RUN: the second formula engine is not installed")
    values: dict[tuple[str, str], object] = {}
    try:
        book = formulon.Workbook.load(path.read_bytes())
    except formulon.FormulonError:
        return None
    with book:
        book.recalc()
        for sheet in range(book.sheet_count()):
            for cell in book.iter_cells(sheet):
                if cell.formula is not None:
                    value = cell.value.to_python()
                    if isinstance(value, formulon.Value):
                        value = formulon.error_display_name(value.error_code)
                    values[book.sheet_name(sheet), cell_name(cell.row + 1, cell.col + 1)] = value
    return values
