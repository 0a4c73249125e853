"""The plain names in a workbook that was loaded, made the functions, which the office does not do when it reads a file.

They become the functions where a formula is compiled anew, and the office compiles all whose names it does not know
when a name is defined. So a name is defined and taken away again: one step for any number of cells. Where it does not
know other functions, names or sheets either, this would replace what is stored of those by errors: there our formulas
are entered piece by piece, and formulas with a name of their own are left. Piece by piece are entered too those that
Excel stored by way of its add-in, as `[1]!reaction(...)`.

No other formula or format is touched, there is nothing to undo, and the workbook counts as unchanged.
"""

from __future__ import annotations

from contextlib import contextmanager
from math import isqrt
from typing import Any, Callable, Collection, Iterable, Iterator, List, Sequence, Set, Tuple

from .formulas import calls_to, has_unknown, unlinked

FORMULAS = 16
"""The office's flag for cells that hold formulas."""
PASSING = "beamfuncs_"
"""The name that is defined for a moment; it grows until no other is like it."""

Test = Callable[[str], bool]
Rows = Sequence[Sequence[str]]
Block = Tuple[Any, Any, Rows]
"""A sheet, a block of cells with formulas in it, and the formulas."""
Run = Tuple[int, int, int]
"""A column, and the first and the last row, of cells one below the other."""


def enter_anew(document: Any, names: Sequence[str], links: Collection[int] = ()) -> bool:
    """Make plain names in the formulas of a document the functions of these names; tell whether there were any.

    `links` are the numbers of the document's links to the Excel add-in: a name behind one of them counts as plain.
    """
    ours, plain_name = calls_to(names), unlinked(names, links)
    sheets = _elements(document.Sheets)
    stored = [block for sheet in sheets for block in _blocks(sheet)]
    blocks = [_spelt(block, plain_name) for block in stored]
    plain = [block for block in blocks if _any(block, ours)]
    linked = [_spelt(block, plain_name) for block in stored if _any(block, lambda one: plain_name(one) != one)]
    defined = [(one, plain_name(one.Content)) for part in (document, *sheets) for one in _elements(part.NamedRanges)]
    named = [(one, content) for one, content in defined if ours("=" + content)]
    if plain or named:
        unknown = has_unknown([*names, *(one.Name for one, _ in defined), *document.DatabaseRanges.ElementNames])
        with _quietly(document):
            if any(_any(block, unknown) for block in blocks) or any(unknown(content) for _, content in defined):
                for block in plain:
                    _enter_pieces(block, ours)
            else:
                _compile_all(document)
                for block in linked:
                    _enter_pieces(block, ours)
                for name, content in named:
                    name.setContent(content)
    return bool(plain or named)


def runs(formulas: Rows, calls: Test) -> Iterator[Run]:
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


def pieces(rows: int) -> Iterator[Tuple[int, int]]:
    """Yield the parts of a run in the order in which to enter them, each by its first row and the one after its last.

    A formula that is entered above or below equal ones takes a time in proportion to their number: so a run is entered
    in pieces of as many rows as there are pieces, a row between each two, and then the rows between.

    >>> list(pieces(9))
    [(7, 9), (4, 6), (1, 3), (6, 7), (3, 4), (0, 1)]
    """
    size = max(1, isqrt(rows))
    starts = range(0, rows, size)[::-1]
    yield from ((start + 1, min(start + size, rows)) for start in starts if start + 1 < min(start + size, rows))
    yield from ((start, start + 1) for start in starts)


def _compile_all(document: Any) -> None:
    """Let the office compile every formula with a name that it does not know."""
    names, name = document.NamedRanges, PASSING
    while names.hasByName(name):
        name += "_"
    names.addNewByName(name, "1", document.Sheets.getByIndex(0).getCellByPosition(0, 0).CellAddress, 0)
    names.removeByName(name)


def _enter_pieces(block: Block, calls: Test) -> None:
    _, cells, formulas = block
    for column, first, last in runs(formulas, calls):
        for start, stop in pieces(last - first + 1):
            _enter(cells, column, first + start, [(formulas[first + row][column],) for row in range(start, stop)])
    for array, formula in _arrays(block, calls):
        array.setArrayFormula(formula)  # which a protected sheet passes over


def _enter(cells: Any, column: int, row: int, formulas: Rows) -> None:
    try:
        cells.getCellRangeByPosition(column, row, column, row + len(formulas) - 1).setFormulaArray(tuple(formulas))
    except Exception:  # a protected sheet takes them one at a time
        for below, (formula,) in enumerate(formulas):
            cells.getCellByPosition(column, row + below).setFormula(formula)


def _arrays(block: Block, calls: Test) -> Iterator[Tuple[Any, str]]:
    """Yield the array formulas in a block that call a function, with their ranges."""
    sheet, cells, formulas = block
    covered: Set[Tuple[int, int]] = set()
    for row, line in enumerate(formulas):
        for column, formula in enumerate(line):
            if formula.startswith("{") and (row, column) not in covered and calls(formula):
                array = sheet.createCursorByRange(cells.getCellByPosition(column, row))
                array.collapseToCurrentArray()
                height, width = array.Rows.Count, array.Columns.Count
                covered.update((row + i, column + j) for i in range(height) for j in range(width))
                yield array, formula[1:-1]


def _blocks(sheet: Any) -> Iterator[Block]:
    for cells in _elements(sheet.queryContentCells(FORMULAS)):
        yield sheet, cells, cells.getFormulaArray()


def _spelt(block: Block, spelling: Callable[[str], str]) -> Block:
    sheet, cells, formulas = block
    return sheet, cells, tuple(tuple(map(spelling, line)) for line in formulas)


def _any(block: Block, test: Test) -> bool:
    formulas: Iterable[str] = (formula for line in block[2] for formula in line)
    return any(map(test, formulas))


def _elements(container: Any) -> List[Any]:
    return [container.getByIndex(n) for n in range(container.Count)]


@contextmanager
def _quietly(document: Any) -> Iterator[None]:
    """Draw nothing, keep no undo and the heights of rows, and leave the document marked as it was.

    It computes by itself meanwhile, as a cell of an array that is looked at while it does not is given the value of the
    array's first cell, and keeps it. For the heights of rows the office would look at their cells, again and again.
    """
    automatic, heights = document.isAutomaticCalculationEnabled(), document.IsAdjustHeightEnabled
    undo = document.getUndoManager()
    document.disableSetModified()
    document.addActionLock()
    document.enableAutomaticCalculation(True)
    document.IsAdjustHeightEnabled = False
    undo.lock()
    try:
        yield
        if not automatic:
            document.calculate()  # the cells entered alone: all others are as they were saved
    finally:
        undo.unlock()
        document.IsAdjustHeightEnabled = heights
        document.enableAutomaticCalculation(automatic)
        document.removeActionLock()
        document.enableSetModified()
