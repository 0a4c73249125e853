"""A workbook filled without a spreadsheet program: its formulas evaluated, the values stored beside them."""

from __future__ import annotations

import re
from collections.abc import Callable, Collection, Iterable, Iterator, Mapping
from contextlib import contextmanager
from dataclasses import dataclass, field, replace
from functools import cached_property
from html import escape, unescape
from pathlib import Path
from typing import NamedTuple, TypeVar

from beamfuncs.errors import VALUE, ErrorValue
from beamfuncs.hosts.calc.naming import SERVICE
from beamfuncs.hosts.excel_addin.places import ADDIN
from beamfuncs.hosts.headless.archive import MOST_BYTES
from beamfuncs.hosts.headless.bounds import why_refused
from beamfuncs.hosts.headless.calls import Calls
from beamfuncs.hosts.headless.conditional import CRITERION, guarded
from beamfuncs.hosts.headless.engine import (
    CIRCULAR,
    FITTED,
    NO_ROOM,
    Call,
    Engine,
    EngineError,
    Function,
    unknown_functions,
)
from beamfuncs.hosts.headless.formulas import TOLD, Speller, called, with_positions
from beamfuncs.hosts.headless.freezing import frozen
from beamfuncs.hosts.headless.grid import Area, Place, cell_name
from beamfuncs.hosts.headless.layout import MOST_FORMULAS, MOST_IN_ARRAYS, Cell, Layout, SheetError, read
from beamfuncs.hosts.headless.lifting import why_not_lifted
from beamfuncs.hosts.headless.markup import decoded
from beamfuncs.hosts.headless.names import Names, defined_names
from beamfuncs.hosts.headless.package import NotAWorkbook, Package, Sheet
from beamfuncs.hosts.headless.plain import packed
from beamfuncs.hosts.headless.reasons import Reasons, source_of
from beamfuncs.hosts.headless.splice import CellValue, filled, for_engine, written
from beamfuncs.hosts.headless.stored import USERS, Comparison, Difference, Filled, Found, shown, stored_value
from beamfuncs.hosts.headless.view import View, find
from beamfuncs.hosts.headless.writing import NotWritten
from beamfuncs.trust import Trust

T = TypeVar("T")

LONGEST_TEXT = 32_767
"""The most characters that a cell holds."""

_DEFINED_NAME = re.compile(rb"(<(?:[\w.-]+:)?definedName\b[^>]*>)([^<]*)(?=</)")
_ITERATES = re.compile(rb"""(<(?:[\w.-]+:)?calcPr\b[^>]*?)\s+iterate\s*=\s*["'](?:1|true)["']""")
_CALCULATED_ON_LOAD = re.compile(rb"""<(?:[\w.-]+:)?calcPr\b[^>]*\bfullCalcOnLoad\s*=\s*["'](?:1|true)["']""")
_TOO_LONG = f"the text is longer than the {LONGEST_TEXT} characters that a cell holds"
_WHAT_IF = "a what-if table is not evaluated here: its stored values are kept"
_ASKS_TO_CALCULATE = "the workbook asks to be calculated anew when it is opened: its stored values may be old"
_TOO_MANY = f"the arrays of the workbook spill into more than {MOST_IN_ARRAYS:,} cells"
_BREAKS_OFF = "the formula cannot be evaluated here"
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
class ListedCell:
    """A cell that calls our functions, or the array that it fills: what a report tells of it."""

    sheet: str
    cells: str
    formula: str
    values: list[list[CellValue]]
    faults: tuple[CellFault, ...]
    calls: tuple[Call, ...]


@dataclass(frozen=True)
class Report:
    """What was done: the file written, how many cells of each kind got their value, and the errors.

    `original` is the dated copy of a workbook that was filled in place.
    """

    target: Path
    beam_cells: int
    recomputed: int
    errors: list[CellFault] = field(default_factory=list)
    differences: list[Difference] = field(default_factory=list)
    original: Path | None = None


def fill(
    source: str | Path,
    target: str | Path | None = None,
    functions: Mapping[str, Function] | None = None,
    progress: Callable[[int, int], None] = lambda done, of: None,
    listing: str | Path | None = None,
    trust: Trust = Trust.STORED,
    freeze: bool = False,
    in_place: bool = False,
) -> Report:
    """Fill a workbook's formulas with their values and write it to `target`.

    Without a `target` it is written beside the source: `plan.xlsx` to `plan.filled.xlsx`. The
    source is never written to. `functions` are ours unless others are given; `progress` is told how
    many of the cells that call them have done so. The file `listing`, a .csv, .json or .html, tells of
    each of these cells where it is wanted, and `progress` is told again how many are in it. Raises
    `NotFilled` when nothing could be done. `trust` says whose value is taken where an ordinary cell
    stores another than the engine gives. With `freeze`, formulas that call the functions give way to
    their values, and are kept in notes (`plan.frozen.xlsx`). With `in_place` the workbook itself is
    filled, and what it was stands in a dated copy beside it.
    """
    source = Path(source)
    done = "frozen" if freeze else "filled"
    target = source.with_suffix(f".{done}{source.suffix}") if target is None else Path(target)
    with refusing(source):
        if in_place:
            target = source
        else:
            _check(source, target)
        functions = catalogued() if functions is None else functions
        if listing is not None:
            listing = _checked_listing(Path(listing))
        filling = Filling(Package.read(source), functions, None if listing is None else Calls())
        filling.evaluate(progress)
        filling.settle(trust)
        report = Report(
            target, len(filling.beam_cells), filling.recomputed, list(filling.faults()), filling.differences()
        )
        cells = filling.listed(report.errors) if listing is not None or freeze else []
        if listing is not None:
            from beamfuncs.hosts.headless import reporting

            reporting.write(listing, reporting.Listing(source, report, cells, functions), progress)
        filled_parts = filling.parts()
        if in_place:
            return replace(report, original=filling.package.rewrite(filled_parts))
        filling.package.write(target, frozen(filling.package, filled_parts, cells) if freeze else filled_parts)
    return report


def view_of(source: Path, name: str) -> View:
    """Return the part of a workbook that `name` means; raises `NotFilled` where there is none."""
    with refusing(source):
        found = find(Package.read(source), name)
    if found is None:
        raise NotFilled(f"{source}: has no sheet, defined name or area that is called {name}")
    return found


@contextmanager
def refusing(source: Path) -> Iterator[None]:
    """Turn what goes wrong with a workbook into `NotFilled`."""
    if not source.is_file():
        raise NotFilled(f"{source}: {'is a folder' if source.is_dir() else 'there is no such file'}")
    try:
        yield
    except OSError as error:
        raise NotFilled(f"{error.filename or source}: {(error.strerror or str(error)).lower()}") from error
    except NotWritten as error:
        raise NotFilled(str(error)) from error
    except (NotAWorkbook, EngineError) as error:
        raise NotFilled(f"{source}: {error}") from error
    except NotFilled:
        raise
    except Exception as error:
        # One workbook that nobody foresaw must not end the check of a folder of others.
        fault = f"{type(error).__name__}: {error}"
        raise NotFilled(f"{source}: a fault of this program, which is worth a report ({fault})") from error


def _check(source: Path, target: Path) -> None:
    if target.exists() and target.samefile(source):
        raise NotFilled(f"{target}: is the workbook itself, which is never written over; --in-place fills it")
    if target.suffix.lower() != source.suffix.lower():
        raise NotFilled(f"{target}: the filled workbook must end in {source.suffix} as well")
    if not target.parent.is_dir():
        raise NotFilled(f"{target.parent}: there is no such folder to write to")


def _checked_listing(listing: Path) -> Path:
    from beamfuncs.hosts.headless.reporting import FORMS

    if listing.suffix.lower() not in FORMS:
        raise NotFilled(f"{listing}: a report must end in {', '.join(FORMS)}")
    if not listing.parent.is_dir():
        raise NotFilled(f"{listing.parent}: there is no such folder to write to")
    return listing


def catalogued() -> dict[str, Function]:
    from beamfuncs.catalogue import catalogue

    return {name: entry.function for name, entry in catalogue().items()}


class _Value(NamedTuple):
    """What a cell is to hold, and the cell whose formula gives it: itself, or the first of an array."""

    value: CellValue
    giver: Place
    reason: str = ""


class Filling:
    """One workbook on its way from its package, through the engine, to its values and faults."""

    def __init__(self, package: Package, functions: Mapping[str, Function], calls: Calls | None = None) -> None:
        self.package = package
        self.calls = calls
        self.beam_cells: set[Place] = set()
        self._functions = functions
        self._layouts = _layouts(package.sheets)
        self._cells: dict[Place, Cell] = {
            (number, *cell.place): cell for number, layout in enumerate(self._layouts) for cell in layout.formulas()
        }
        self._refused: dict[Place, str] = {}
        self._new_extents: dict[Place, Area] = {}

    @property
    def recomputed(self) -> int:
        """How many ordinary formulas there are, but for those that keep another value than the engine's."""
        kept = {one.node for one in self.comparison.found if one.kept}
        return len(self._cells) - len(self.beam_cells) - len(kept)

    # --- through the engine ---

    def evaluate(self, progress: Callable[[int, int], None]) -> None:
        """Let the engine evaluate the workbook, its formulas respelt."""
        done: set[Place] = set()

        def called(place: Place, call: Call) -> None:
            if place not in self.beam_cells:
                return
            if self.calls is not None and call.function in self._functions:
                self.calls.note(place, call)
            if place not in done:
                done.add(place)
                progress(len(done), len(self.beam_cells))

        names = [sheet.name for sheet in self.package.sheets]
        book = self._book_for_engine()
        self.engine = Engine(book, names, self._functions, self.package.counts_from_1904, called)
        try:
            self.engine.evaluate()
        except EngineError:
            self._refuse_what_breaks_off()
            self.engine.evaluate()
        self._refuse_what_is_hidden()
        self._keep_to_one_cell()
        self._keep_arrays_within_bounds()
        self._let_circular_arrays_fail_as_a_whole()
        self.comparison = Comparison(
            engine=self.engine,
            nodes=self._cells,
            arrays=[place for place, cell in self._cells.items() if cell.extent],
            beam_cells=self.beam_cells,
            fills=self._fills,
            refused=self._refused,
            why=lambda place, node, value: self._refused.get(node) or self._reasons.of(place, node, value),
            evaluate=self._evaluate_again,
            placeholders=self._asks_to_be_calculated,
        )

    def settle(self, trust: Trust) -> None:
        """Decide where the stored values of ordinary cells are kept, and let all else follow from it."""
        self.comparison.settle(trust)

    def _fills(self, node: Place) -> Iterator[Filled]:
        """Yield what a formula fills, with what stands there in the file."""
        for place, one in dict(self._values_from(node)).items():
            if place == node or place not in self._cells:
                cell = self._layouts[place[0]].cells.get(place[1:])
                extent = self._cells[node].extent
                before = place == node or (extent is not None and extent.holds(*place[1:]))
                yield Filled(place, before, stored_value(cell) if cell else None, one.value)

    @cached_property
    def _asks_to_be_calculated(self) -> bool:
        return _CALCULATED_ON_LOAD.search(self.package.parts[self.package.workbook_part]) is not None

    @cached_property
    def _reasons(self) -> Reasons:
        return Reasons(self.engine)

    def _evaluate_again(self) -> None:
        self.__dict__.pop("_reasons", None)
        if self.calls is not None:
            self.calls.begin_round()
        self.engine.evaluate()

    def _book_for_engine(self) -> bytes:
        sheets = [sheet.name for sheet in self.package.sheets]
        meanings = Names(list(defined_names(self.package.parts[self.package.workbook_part])))
        unknown = self._unknown_functions()
        speller = Speller(self._functions, self.package.tables, meanings, sheets, unknown, self.package.links_to(ADDIN))
        spelt = _by_sheet(self._spelt(speller), len(self._layouts))
        parts = {
            sheet.part: for_engine(sheet.xml, layout, spellings)
            for sheet, layout, spellings in zip(self.package.sheets, self._layouts, spelt, strict=True)
        }
        # Circles are errors here, also where the program that saved the workbook would go round them.
        names = _ITERATES.sub(rb"\1", self.package.parts[self.package.workbook_part])
        parts[self.package.workbook_part] = _DEFINED_NAME.sub(
            lambda found: found[1] + _respelt_name(found[2], speller), names
        )
        return packed({**self.package.computed_from(), **parts})

    def _spelt(self, speller: Speller) -> Iterator[tuple[Place, str]]:
        """Yield every formula as the engine is to evaluate it, and note which call ours."""
        sharing_calls: set[tuple[int, str]] = set()
        sharing_refused: dict[tuple[int, str], str] = {}
        for (number, *_), cell in self._cells.items():
            if cell.shared and cell.formula:
                sharing_refused[number, cell.shared] = _why_refused(cell)
                if speller.respell(decoded(cell.formula), "0,0,0", cell.row, cell.column)[1]:
                    sharing_calls.add((number, cell.shared))
        length = 0
        for place, cell in self._cells.items():
            number, row, column = place
            why = sharing_refused.get((number, cell.shared), "") if cell.shared else _why_refused(cell)
            if why:
                self._refused[place] = why
                yield place, VALUE
                continue
            told = f"{number},ROW(),COLUMN()" if cell.shared else f"{number},{row},{column}"
            text, calls = speller.respell(decoded(cell.formula or ""), told, row, column)
            if calls or (number, cell.shared) in sharing_calls:
                self.beam_cells.add(place)
            text = guarded(text, f"{CRITERION}{TOLD}({told},")
            if cell.extent:
                text = with_positions(text)
            if cell.extent and not cell.dynamic:
                text = f"{FITTED}{TOLD}({text},{len(cell.extent.rows)},{len(cell.extent.columns)})"
            length += len(text)
            if length > MOST_BYTES:
                raise NotAWorkbook(f"it is too large: its formulas and names exceed {MOST_BYTES >> 20} MB")
            yield place, text

    def _unknown_functions(self) -> set[str]:
        """Return the functions that the workbook calls and neither the engine nor we know."""
        texts = {cell.formula for cell in self._cells.values() if cell.formula}
        names = self.package.parts[self.package.workbook_part].decode(errors="replace")
        named = set().union(called(names), *map(called, texts)) - {name.casefold() for name in self._functions}
        if any(name.startswith(f"{SERVICE}.".casefold()) for name in named):
            book = self.package.path
            raise NotFilled(f"{book}: it has Calc's long function names: run `beamfuncs calc plain {book}` first")
        return unknown_functions(sorted(name for name in named - {"single"} if not name.startswith("_xlpm.")))

    def _refuse_what_is_hidden(self) -> None:
        """Refuse cells that turn what cannot be evaluated here into a number, as IFERROR(Unknown(A1),0) would."""
        while hidden := [
            place
            for place in self.engine.unevaluated - set(self._refused)
            if place in self._cells and not isinstance(self.engine.value(place), ErrorValue)
        ]:
            for place in hidden:
                self._refused[place] = self.engine.failures[place][-1].reason
                self.engine.refuse(place)
            self._evaluate_again()

    def _refuse_what_breaks_off(self) -> None:
        """Refuse the few formulas at which the engine gives up on all others too."""
        while broken := {place for place in self._cells if place not in self._refused and self.engine.breaks(place)}:
            above = {place: list(self.engine.references(place)) for place in broken}
            few = broken if len(broken) < 1000 else ()
            first = {place for place in few if not _refers_to(above[place], broken - {place})}
            for place in first or broken:
                self.engine.refuse(place)
                self._refused[place] = _BREAKS_OFF

    def _keep_to_one_cell(self) -> None:
        """Let no ordinary formula fill more than its own cell, as the engine would have it do."""
        narrowed: set[Place] = set()
        while spilling := [place for place in self._cells if self._spills(place)]:
            for place in spilling:
                if place in narrowed:
                    self.engine.refuse(place)
                    self._refused[place] = _NARROW
                else:
                    self.engine.narrow(place)
                    narrowed.add(place)
            self._evaluate_again()

    def _keep_arrays_within_bounds(self) -> None:
        """Let no arrays spill into more cells in all than a sheet's arrays may fill."""
        filled = 0
        refused = dict(self._refused)
        for place, cell in self._cells.items():
            if cell.extent and cell.dynamic and (extent := self.engine.extent(place)):
                filled += len(extent.rows) * len(extent.columns)
                if filled > MOST_IN_ARRAYS:
                    self.engine.refuse(place)
                    self._refused[place] = _TOO_MANY
        if self._refused != refused:
            self._evaluate_again()

    def _let_circular_arrays_fail_as_a_whole(self) -> None:
        """Put the error of an array in a circle into all its cells: the engine leaves all but the first blank."""
        circular = {
            place: cell.extent
            for place, cell in self._cells.items()
            if cell.extent and not cell.dynamic and self.engine.value(place) == CIRCULAR
        }
        for place in circular:
            self._refused[place] = self._reasons.of(place, place, CIRCULAR)
        for place, extent in circular.items():
            self.engine.set_array(place, [[ErrorValue(VALUE) for _ in extent.columns] for _ in extent.rows])
        if circular:
            self._evaluate_again()

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
        resized = ((place, extent) for place, extent in self._new_extents.items() if place not in self.comparison.kept)
        extents = _by_sheet(resized, count)
        return {
            sheet.part: filled(sheet.xml, layout, values[number], extents[number])
            for number, (sheet, layout) in enumerate(zip(self.package.sheets, self._layouts, strict=True))
        }

    def faults(self) -> Iterator[CellFault]:
        """Yield every cell in error, sheet by sheet."""
        failing = {place: one for place, one in self._values.items() if isinstance(one.value, ErrorValue)}
        kept = {
            one.filled.place: _Value(value, one.node, why) for one in self.comparison.found for value, why in _kept(one)
        }
        for place, (value, giver, why) in sorted({**failing, **kept}.items()) if kept else failing.items():
            assert isinstance(value, ErrorValue)
            why = why or self._reasons.of(place, giver, value)
            yield self._fault(place, written(value)[1], why, self._formula(giver))
        for number, layout in enumerate(self._layouts):
            for cell in layout.what_if_tables():
                yield self._fault((number, *cell.place), cell.value, _WHAT_IF, "")

    def differences(self) -> list[Difference]:
        """Return the ordinary cells whose stored value is not the engine's, sheet by sheet."""
        return [self._difference(one) for one in sorted(self.comparison.found, key=lambda one: one.filled.place)]

    def _difference(self, one: Found) -> Difference:
        number, row, column = one.filled.place
        asks = _ASKS_TO_CALCULATE if one.kept and self._asks_to_be_calculated else ""
        named = [self.engine.name(user) for user in one.users[:USERS]]
        return Difference(
            sheet=self.package.sheets[number].name,
            cell=cell_name(row, column),
            stored=shown(one.filled.stored),
            computed=shown(one.filled.computed),
            formula=self._formula(one.node),
            volatile=one.volatile,
            kept=one.kept,
            reason="; ".join(filter(None, (one.reason, asks))),
            used_by=named + ["..."] * (len(one.users) > USERS),
        )

    def stale(self) -> Iterator[tuple[str, str, CellValue, CellValue, str]]:
        """Yield sheet, cell, stored and computed value and formula of what builds on beams and is stale or missing."""
        for node, one in self.comparison.stale():
            number, row, column = one.place
            sheet = self.package.sheets[number].name
            yield sheet, cell_name(row, column), shown(one.stored), shown(one.computed), self._formula(node)

    def listed(self, faults: Iterable[CellFault]) -> list[ListedCell]:
        """Return every beam cell for a report, sheet by sheet, an array being one."""
        reasons = {(fault.sheet, fault.cell): fault for fault in faults}
        return [self._listed(giver, reasons) for giver in self._cells if giver in self.beam_cells]

    def _listed(self, giver: Place, faults: Mapping[tuple[str, str], CellFault]) -> ListedCell:
        number, row, column = giver
        sheet = self.package.sheets[number].name
        extent = self._new_extents.get(giver) or self._cells[giver].extent or Area(row, column, row, column)
        values = [[self._values[number, row, column].value for column in extent.columns] for row in extent.rows]
        names = (cell_name(*place) for place in extent.cells())
        failing = tuple(faults[sheet, name] for name in names if (sheet, name) in faults)
        calls = () if self.calls is None else self.calls.of(giver)
        return ListedCell(sheet, str(extent), self._formula(giver), values, failing, calls)

    @cached_property
    def _values(self) -> dict[Place, _Value]:
        """The value of every cell that is stored anew."""
        stored_anew = (giver for giver in self._cells if giver not in self.comparison.kept)
        return {place: value for giver in stored_anew for place, value in self._values_from(giver)}

    def _values_from(self, giver: Place) -> Iterator[tuple[Place, _Value]]:
        number, row, column = giver
        cell = self._cells[giver]
        extent = cell.extent or Area(row, column, row, column)
        if cell.extent and cell.dynamic:
            extent = self.engine.extent(giver) or Area(row, column, row, column)
            self._new_extents.pop(giver, None)
            if extent != cell.extent:
                self._new_extents[giver] = extent
                # The cells filled before are cleared; those that are filled anew or by others follow.
                filled_before = (place for place in cell.extent.cells() if place in self._layouts[number].cells)
                yield from (((number, *place), _Value(None, giver)) for place in filled_before)
        for place in ((number, *place) for place in extent.cells()):
            value = self.engine.value(place)
            if giver in self._refused:
                yield place, _Value(value, giver, self._refused[giver])
            elif isinstance(value, str) and len(value) > LONGEST_TEXT:
                yield place, _Value(ErrorValue(VALUE), giver, _TOO_LONG)
            else:
                yield place, _Value(0.0 if value is None else value, giver)

    def _fault(self, place: Place, value: str, why: str, formula: str) -> CellFault:
        number, row, column = place
        return CellFault(self.package.sheets[number].name, cell_name(row, column), value, why, formula)

    @cached_property
    def _shared(self) -> dict[tuple[int, str], Cell]:
        """The cell that has the formula which others share, by the number of its sheet and the formula's own."""
        return {(place[0], cell.shared): cell for place, cell in self._cells.items() if cell.shared and cell.formula}

    def _formula(self, place: Place) -> str:
        """Return a cell's own formula; one that shares another cell's has it from there."""
        cell = self._cells[place]
        if cell.formula:
            return f"={cell.formula}"
        from openpyxl.formula.translate import Translator

        first = self._shared[place[0], cell.shared]
        return str(Translator(f"={first.formula}", cell_name(*first.place)).translate_formula(cell_name(*cell.place)))


def _refers_to(references: Iterable[tuple[int, Area]], places: Collection[Place]) -> bool:
    return any(place[0] == number and area.holds(*place[1:]) for number, area in references for place in places)


def _kept(one: Found) -> Iterator[tuple[ErrorValue, str]]:
    """Yield the error, if there is one, that a cell shows or would show which keeps its stored value."""
    stored, computed = one.filled.stored, one.filled.computed
    if one.kept and isinstance(stored, ErrorValue):
        yield stored, f"it is the stored value, which is kept; evaluated here it is {written(computed)[1]}"
    elif one.kept and isinstance(computed, ErrorValue):
        yield computed, f"{one.reason}; its stored value {written(stored)[1]} is kept"


def _layouts(sheets: Iterable[Sheet]) -> list[Layout]:
    layouts: list[Layout] = []
    formulas = 0
    for sheet in sheets:
        try:
            layouts.append(read(sheet.xml))
        except SheetError as error:
            raise NotAWorkbook(f"sheet {sheet.name} cannot be read: {error}") from error
        formulas += len(layouts[-1].cells)
        if formulas > MOST_FORMULAS:
            raise NotAWorkbook(f"it has more than {MOST_FORMULAS:,} formulas")
    return layouts


def _by_sheet(items: Iterable[tuple[Place, T]], count: int) -> list[dict[tuple[int, int], T]]:
    """Return for each sheet what belongs to its cells, by row and column."""
    sheets: list[dict[tuple[int, int], T]] = [{} for _ in range(count)]
    for (number, row, column), item in items:
        sheets[number][row, column] = item
    return sheets


def _why_refused(cell: Cell) -> str:
    """Return why a formula is not handed to the engine, a blank text if it is."""
    formula = decoded(cell.formula or "")
    return why_refused(formula) or why_not_lifted(formula, cell.extent is not None)


def _respelt_name(text: bytes, speller: Speller) -> bytes:
    """Return what a defined name stands for with its tables' areas in place of their names."""
    if b"[" not in text:
        return text
    plain, _ = speller.respell(unescape(text.decode()), "0,0,0")
    return escape(plain, quote=False).encode()
