"""A workbook filled without a spreadsheet program: its formulas evaluated, the values stored beside them."""

from __future__ import annotations

import re
from collections.abc import Callable, Iterable, Iterator, Mapping
from contextlib import contextmanager
from dataclasses import dataclass, field
from functools import cached_property
from html import escape, unescape
from pathlib import Path
from typing import NamedTuple, TypeVar

from beamfuncs.errors import VALUE, ErrorValue
from beamfuncs.hosts.conditional import CRITERION, guarded
from beamfuncs.hosts.engine import FITTED, NO_ROOM, Engine, EngineError, Function, Place
from beamfuncs.hosts.formulas import TOLD, Speller
from beamfuncs.hosts.grid import Area, cell_name
from beamfuncs.hosts.layout import Cell, Layout, SheetError, read
from beamfuncs.hosts.package import NotAWorkbook, Package, Sheet
from beamfuncs.hosts.reasons import reason, source_of
from beamfuncs.hosts.splice import CellValue, filled, for_engine, written
from beamfuncs.hosts.view import View, find

T = TypeVar("T")

LONGEST_TEXT = 32_767
"""The most characters that a cell holds."""

_DEFINED_NAME = re.compile(rb"(<(?:[\w.-]+:)?definedName\b[^>]*>)([^<]*\[[^<]*)(?=</)")
_TOO_LONG = f"the text is longer than the {LONGEST_TEXT} characters that a cell holds"
_WHAT_IF = "a what-if table is not evaluated here: its stored values are kept"
_NARROW = "it gives an array, for which an ordinary cell has no room: enter it as an array formula"


class NotFilled(ValueError):
    """Nothing was done; the message says why in one line."""


@dataclass(frozen=True)
class CellFault:
    """A cell whose value is an error, and why; `formula` is the workbook's own."""

    sheet: str
    cell: str
    value: str
    reason: str
    formula: str


@dataclass(frozen=True)
class Report:
    """What was done: the file written, how many cells of each kind got their value, and the errors."""

    target: Path
    beam_cells: int
    recomputed: int
    errors: list[CellFault] = field(default_factory=list)


def fill(
    source: str | Path,
    target: str | Path | None = None,
    functions: Mapping[str, Function] | None = None,
    progress: Callable[[int, int], None] = lambda done, of: None,
) -> Report:
    """Fill a workbook's formulas with their values and write it to `target`.

    Without a `target` it is written beside the source: `plan.xlsx` to `plan.filled.xlsx`. The
    source is never written to. `functions` are ours unless others are given; `progress` is told how
    many of the cells that call them have done so. Raises `NotFilled` when nothing could be done.
    """
    source = Path(source)
    target = source.with_suffix(f".filled{source.suffix}") if target is None else Path(target)
    with _refusing(source):
        _check(source, target)
        filling = _Filling(Package.read(source), _catalogued() if functions is None else functions)
        filling.evaluate(progress)
        report = Report(target, len(filling.beam_cells), filling.other_cells, list(filling.faults()))
        filling.package.write(target, filling.parts())
    return report


def view_of(source: Path, name: str) -> View:
    """Return the part of a workbook that `name` means; raises `NotFilled` where there is none."""
    with _refusing(source):
        found = find(Package.read(source), name)
    if found is None:
        raise NotFilled(f"{source}: has no sheet, defined name or area that is called {name}")
    return found


@contextmanager
def _refusing(source: Path) -> Iterator[None]:
    """Turn what goes wrong with a workbook into `NotFilled`."""
    if not source.is_file():
        raise NotFilled(f"{source}: {'is a folder' if source.is_dir() else 'there is no such file'}")
    try:
        yield
    except OSError as error:
        raise NotFilled(f"{error.filename or source}: {(error.strerror or str(error)).lower()}") from error
    except (NotAWorkbook, EngineError) as error:
        raise NotFilled(f"{source}: {error}") from error


def _check(source: Path, target: Path) -> None:
    if target.exists() and target.samefile(source):
        raise NotFilled(f"{target}: is the workbook itself, which is never written over")
    if target.suffix.lower() != source.suffix.lower():
        raise NotFilled(f"{target}: the filled workbook must end in {source.suffix} as well")
    if not target.parent.is_dir():
        raise NotFilled(f"{target.parent}: there is no such folder to write to")


def _catalogued() -> dict[str, Function]:
    from beamfuncs.catalogue import catalogue

    return {name: entry.function for name, entry in catalogue().items()}


class _Value(NamedTuple):
    """What a cell is to hold, and the cell whose formula gives it: itself, or the first of an array."""

    value: CellValue
    giver: Place
    reason: str = ""


class _Filling:
    """One workbook on its way from its package, through the engine, to its values and faults."""

    def __init__(self, package: Package, functions: Mapping[str, Function]) -> None:
        self.package = package
        self.beam_cells: set[Place] = set()
        self._functions = functions
        self._layouts = [_layout(sheet) for sheet in package.sheets]
        self._cells: dict[Place, Cell] = {
            (number, *cell.place): cell for number, layout in enumerate(self._layouts) for cell in layout.formulas()
        }
        self._refused: set[Place] = set()
        self._new_extents: dict[Place, Area] = {}

    @property
    def other_cells(self) -> int:
        return len(self._cells) - len(self.beam_cells)

    # --- through the engine ---

    def evaluate(self, progress: Callable[[int, int], None]) -> None:
        """Let the engine evaluate the workbook, its formulas respelt."""
        done: set[Place] = set()

        def called(place: Place) -> None:
            if place in self.beam_cells and place not in done:
                done.add(place)
                progress(len(done), len(self.beam_cells))

        names = [sheet.name for sheet in self.package.sheets]
        book = self._book_for_engine()
        self.engine = Engine(book, names, self._functions, self.package.counts_from_1904, called)
        self.engine.evaluate()
        self._keep_to_one_cell()

    def _book_for_engine(self) -> bytes:
        speller = Speller(self._functions, self.package.tables)
        spelt = _by_sheet(self._spelt(speller), len(self._layouts))
        parts = {
            sheet.part: for_engine(sheet.xml, layout, spellings)
            for sheet, layout, spellings in zip(self.package.sheets, self._layouts, spelt, strict=True)
        }
        names = self.package.parts[self.package.workbook_part]
        parts[self.package.workbook_part] = _DEFINED_NAME.sub(
            lambda found: found[1] + _respelt_name(found[2], speller), names
        )
        return self.package.copy(parts)

    def _spelt(self, speller: Speller) -> Iterator[tuple[Place, str]]:
        """Yield every formula as the engine is to evaluate it, and note which call ours."""
        sharing_calls: set[tuple[int, str]] = set()
        for place, cell in self._cells.items():
            number, row, column = place
            told = f"{number},ROW(),COLUMN()" if cell.shared else f"{number},{row},{column}"
            text, calls = speller.respell(cell.formula or "", told, row)
            if calls and cell.shared:
                sharing_calls.add((number, cell.shared))
            if calls or (number, cell.shared) in sharing_calls:
                self.beam_cells.add(place)
            text = guarded(text, f"{CRITERION}{TOLD}({told},")
            if cell.extent and not cell.dynamic:
                text = f"{FITTED}{TOLD}({text},{len(cell.extent.rows)},{len(cell.extent.columns)})"
            yield place, text

    def _keep_to_one_cell(self) -> None:
        """Let no ordinary formula fill more than its own cell, as the engine would have it do."""
        narrowed: set[Place] = set()
        while spilling := [place for place in self._cells if self._spills(place)]:
            for place in spilling:
                if place in narrowed:
                    self.engine.refuse(place)
                    self._refused.add(place)
                else:
                    self.engine.narrow(place)
                    narrowed.add(place)
            self.engine.evaluate()

    def _spills(self, place: Place) -> bool:
        if self._cells[place].extent or place in self._refused:
            return False
        if self.engine.extent(place):
            return True
        return self.engine.value(place) == NO_ROOM and not source_of(self.engine, place, NO_ROOM)

    # --- what came out ---

    def parts(self) -> dict[str, bytes]:
        """Return the sheets with their values, by the names of their parts."""
        count = len(self._layouts)
        values = _by_sheet(((place, one.value) for place, one in self._values.items()), count)
        extents = _by_sheet(self._new_extents.items(), count)
        return {
            sheet.part: filled(sheet.xml, layout, values[number], extents[number])
            for number, (sheet, layout) in enumerate(zip(self.package.sheets, self._layouts, strict=True))
        }

    def faults(self) -> Iterator[CellFault]:
        """Yield every cell in error, sheet by sheet."""
        for place, (value, giver, why) in self._values.items():
            if isinstance(value, ErrorValue):
                why = why or reason(self.engine, place, giver, value)
                yield self._fault(place, written(value)[1], why, self._formula(giver))
        for number, layout in enumerate(self._layouts):
            for cell in layout.what_if_tables():
                yield self._fault((number, *cell.place), cell.value, _WHAT_IF, "")

    @cached_property
    def _values(self) -> dict[Place, _Value]:
        """The value of every cell that is stored anew."""
        return {place: value for giver in self._cells for place, value in self._values_from(giver)}

    def _values_from(self, giver: Place) -> Iterator[tuple[Place, _Value]]:
        number, row, column = giver
        cell = self._cells[giver]
        extent = cell.extent or Area(row, column, row, column)
        if cell.extent and cell.dynamic:
            extent = self.engine.extent(giver) or Area(row, column, row, column)
            if extent != cell.extent:
                self._new_extents[giver] = extent
                # The cells filled before are cleared; those that are filled anew or by others follow.
                filled_before = (place for place in cell.extent.cells() if place in self._layouts[number].cells)
                yield from (((number, *place), _Value(None, giver)) for place in filled_before)
        for place in ((number, *place) for place in extent.cells()):
            value = self.engine.value(place)
            if giver in self._refused:
                yield place, _Value(value, giver, _NARROW)
            elif isinstance(value, str) and len(value) > LONGEST_TEXT:
                yield place, _Value(ErrorValue(VALUE), giver, _TOO_LONG)
            else:
                yield place, _Value(0.0 if value is None else value, giver)

    def _fault(self, place: Place, value: str, why: str, formula: str) -> CellFault:
        number, row, column = place
        return CellFault(self.package.sheets[number].name, cell_name(row, column), str(value), why, formula)

    def _formula(self, place: Place) -> str:
        """Return a cell's own formula; one that shares another cell's has it from there."""
        cell = self._cells[place]
        if cell.formula:
            return f"={cell.formula}"
        from openpyxl.formula.translate import Translator

        first = next(one for one in self._layouts[place[0]].formulas() if one.shared == cell.shared)
        return str(Translator(f"={first.formula}", cell_name(*first.place)).translate_formula(cell_name(*cell.place)))


def _layout(sheet: Sheet) -> Layout:
    try:
        return read(sheet.xml)
    except SheetError as error:
        raise NotAWorkbook(f"sheet {sheet.name} cannot be read: {error}") from error


def _by_sheet(items: Iterable[tuple[Place, T]], count: int) -> list[dict[tuple[int, int], T]]:
    """Return for each sheet what belongs to its cells, by row and column."""
    sheets: list[dict[tuple[int, int], T]] = [{} for _ in range(count)]
    for (number, row, column), item in items:
        sheets[number][row, column] = item
    return sheets


def _respelt_name(text: bytes, speller: Speller) -> bytes:
    """Return what a defined name stands for with its tables' areas in place of their names."""
    plain, _ = speller.respell(unescape(text.decode()), "0,0,0")
    return escape(plain, quote=False).encode()
