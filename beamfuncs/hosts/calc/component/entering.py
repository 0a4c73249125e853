"""Formulas of a workbook that was loaded, entered anew where they call a function by its plain name.

The office does not resolve such names when it reads a workbook of another program, but it does when a formula is
entered. No other cell is touched, nothing can be undone that the user did not do, and the workbook counts as unchanged.
"""

from __future__ import annotations

from contextlib import contextmanager
from typing import Any, Callable, Dict, Iterator, List, Sequence, Set, Tuple

from . import journal

FORMULAS = 16
"""The office's flag for cells that hold formulas."""

Test = Callable[[str], bool]
Area = Tuple[int, int, int]
"""A column, and the first and last row, of cells one below the other."""
Array = Tuple[Any, str]
"""The range of an array formula, and the formula."""


def enter_anew(document: Any, calls: Test) -> int:
    """Enter every formula of a document anew for which the test holds; return how many there were."""
    sheets = [document.Sheets.getByIndex(n) for n in range(document.Sheets.Count)]
    names = [names for names in (document.NamedRanges, *(sheet.NamedRanges for sheet in sheets)) if names.hasElements()]
    found = [(block, areas, arrays) for sheet in sheets for block, areas, arrays in _found(sheet, calls)]
    named = [name for some in names for name in _elements(some) if calls("=" + name.Content)]
    if not found and not named:
        return 0
    with _quietly(document):
        for name in named:
            name.setContent(name.Content)
        for block, areas, arrays in found:
            for area in areas:
                _enter(block, area)
            for cells, formula in arrays:
                _enter_array(cells, formula)
    return len(named) + sum(last - first + 1 for _, areas, _ in found for _, first, last in areas)


def runs(formulas: Sequence[Sequence[str]], calls: Test) -> Iterator[Area]:
    """Yield the runs of plain formulas, one below the other, for which the test holds.

    >>> list(runs([["=f(1)", "=1"], ["=f(2)", "{=f(3)}"]], lambda formula: "f(" in formula))
    [(0, 0, 1)]
    """
    for column in range(len(formulas[0])):
        first = None
        for row, formula in enumerate([*(line[column] for line in formulas), ""]):
            wanted = formula.startswith("=") and calls(formula)
            if wanted and first is None:
                first = row
            elif not wanted and first is not None:
                yield column, first, row - 1
                first = None


def _found(sheet: Any, calls: Test) -> Iterator[Tuple[Any, List[Area], List[Array]]]:
    """Yield each block of formulas with the runs in it that call a function, and its array formulas that do."""
    for block in _elements(sheet.queryContentCells(FORMULAS)):
        formulas = block.getFormulaArray()
        areas = list(runs(formulas, calls))
        arrays = _arrays(sheet, block, formulas, calls)
        if areas or arrays:
            yield block, areas, arrays


def _arrays(sheet: Any, block: Any, formulas: Sequence[Sequence[str]], calls: Test) -> List[Array]:
    """Return the array formulas in a block that call a function."""
    arrays: Dict[str, Array] = {}
    covered: Set[Tuple[int, int]] = set()
    for row, line in enumerate(formulas):
        for column, formula in enumerate(line):
            if formula.startswith("{") and (row, column) not in covered and calls(formula):
                cursor = sheet.createCursorByRange(block.getCellByPosition(column, row))
                cursor.collapseToCurrentArray()
                arrays[cursor.AbsoluteName] = cursor, formula[1:-1]
                height, width = cursor.Rows.Count, cursor.Columns.Count
                covered.update((row + i, column + j) for i in range(height) for j in range(width))
    return list(arrays.values())


def _enter(block: Any, area: Area) -> None:
    """Enter a run at once, as the time of one cell after another would grow with the square of their number."""
    column, first, last = area
    cells = block.getCellRangeByPosition(column, first, column, last)
    formulas = cells.getFormulaArray()
    try:
        cells.setFormulaArray(formulas)
    except Exception:  # a protected sheet takes them one by one
        for row, (formula,) in enumerate(formulas):
            cells.getCellByPosition(0, row).setFormula(formula)


def _enter_array(cells: Any, formula: str) -> None:
    try:
        cells.setArrayFormula(formula)
    except Exception:
        journal.failure("entering the array formula of {}".format(cells.AbsoluteName))


def _elements(container: Any) -> List[Any]:
    return [container.getByIndex(n) for n in range(container.Count)]


@contextmanager
def _quietly(document: Any) -> Iterator[None]:
    """Compute once at the end, draw nothing meanwhile, keep no undo, and leave the document marked as it was."""
    automatic = document.isAutomaticCalculationEnabled()
    undo = document.getUndoManager()
    document.disableSetModified()
    document.addActionLock()
    document.enableAutomaticCalculation(False)
    undo.lock()
    try:
        yield
    finally:
        undo.unlock()
        document.enableAutomaticCalculation(automatic)
        if not automatic:
            document.calculate()  # the cells entered alone: all others are as they were saved
        document.removeActionLock()
        document.enableSetModified()
