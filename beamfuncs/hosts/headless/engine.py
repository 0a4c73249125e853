"""The one door to the formula engine: nothing else in beamfuncs knows formualizer.

A workbook is handed over as the bytes of a package, its calls of our functions respelt so that each
tells which cell calls it (see `formulas`). The engine drops the text of an error; so the reason of
every failing call is kept here, by the cell that called.
"""

from __future__ import annotations

import inspect
import math
from collections import defaultdict
from collections.abc import Callable, Iterable, Iterator, Mapping, Sequence
from typing import NamedTuple, TypeAlias

import formualizer as fz

from beamfuncs.errors import NA, NUM, VALUE, BeamError, ErrorValue
from beamfuncs.hosts.headless.conditional import CRITERION, UNLIKE
from beamfuncs.hosts.headless.formulas import ELSEWHERE, NAME, REF, TOLD, UNKNOWN
from beamfuncs.hosts.headless.grid import Area, Place, area, cell_name, sheet_prefix
from beamfuncs.hosts.headless.splice import CellValue

Function: TypeAlias = Callable[..., object]

CIRCULAR = ErrorValue("#CIRC!")
NOT_READ = ErrorValue("#ERROR!")
NOT_KNOWN = ErrorValue("#N/IMPL!")
NO_ROOM = ErrorValue("#SPILL!")
WHOLE_ROW = 16_384
"""Columns."""
LONGEST_ARRAY = 16_000
"""Characters."""
MOST_REFERENCES = 10_000
"""Of a formula with more references the rest is not looked at."""
FITTED = "fitted"
"""A function of the engine alone: an array cut and padded to the extent of an array formula."""

_KINDS = {
    "#NULL!": "Null",
    "#DIV/0!": "Div",
    VALUE: "Value",
    "#REF!": "Ref",
    "#NAME?": "Name",
    NUM: "Num",
    NA: "Na",
    "#CALC!": "Calc",
    NOT_READ: "Error",
    NO_ROOM: "Spill",
    CIRCULAR: "Circ",
    NOT_KNOWN: "NImpl",
}
_ERRORS = {kind: ErrorValue(value) for value, kind in _KINDS.items()}


class EngineError(RuntimeError):
    """The engine cannot take the workbook; the message says why in one line."""


class Call(NamedTuple):
    """A call of one of our functions, with the arguments that it got."""

    function: str
    arguments: tuple[object, ...]


class Failure(NamedTuple):
    """An error that one of our functions gave: in which entry, if in one of an array's."""

    value: str
    reason: str
    entry: tuple[int, int] | None = None


class Engine:
    """A workbook in the engine, with our functions."""

    def __init__(
        self,
        book: bytes,
        sheets: Sequence[str],
        functions: Mapping[str, Function],
        counts_from_1904: bool = False,
        called: Callable[[Place, Call], None] = lambda place, call: None,
    ) -> None:
        settings = fz.EvaluationConfig()
        settings.enable_parallel = False
        settings.cycle_detection = "runtime"
        settings.date_system = "1904" if counts_from_1904 else "1900"
        try:
            self._book = fz.Workbook.from_bytes(book, config=fz.WorkbookConfig(eval_config=settings))
        except (OSError, ValueError, RuntimeError) as error:
            raise EngineError(_told(error)) from error
        self._book.set_temporal_egress("serial")
        self._sheets = sheets
        self._numbers = {sheet: number for number, sheet in enumerate(sheets)}
        self._called = called
        self._stopped: BaseException | None = None
        self.unevaluated: set[Place] = set()
        """The cells that asked for what cannot be evaluated here, whatever they made of the answer."""
        self.failures: defaultdict[Place, list[Failure]] = defaultdict(list)
        self._book.register_function(FITTED + TOLD, _fitted)
        self._book.register_function(ELSEWHERE + TOLD, self._answering(ELSEWHERE, _elsewhere))
        self._book.register_function(UNKNOWN + TOLD, self._answering(UNKNOWN, _unknown))
        self._book.register_function(UNLIKE + TOLD, self._answering(UNLIKE, _unlike))
        self._book.register_function(CRITERION + TOLD, self._answering(CRITERION, _criterion))
        for name, function in functions.items():
            self._book.register_function(name + TOLD, self._answering(name, function))

    def evaluate(self) -> None:
        """Evaluate every formula; an interruption inside one of our functions is raised again."""
        try:
            self._book.evaluate_all()
        except fz.ExcelEvaluationError as error:
            if self._stopped:
                raise self._stopped from None
            raise EngineError(_told(error)) from error

    def value(self, place: Place) -> CellValue:
        """Return the value of a cell as it stands."""
        return _from_engine(self._book.get_value(*self._cell(place)))

    def name(self, place: Place) -> str:
        """Return the name of a cell with its sheet, for people to read."""
        number, row, column = place
        return f"{self._sheets[number]}!{cell_name(row, column)}"

    def extent(self, place: Place) -> Area | None:
        """Return the cells that the array of an anchor cell fills, None if it fills but its own."""
        spill = self._book.inspect_cell(self._address(place), include_values=False).cell.spill
        if spill is None or spill.extent is None:
            return None
        return area(spill.extent.rpartition("!")[2])

    def narrow(self, place: Place) -> None:
        """Make an ordinary formula that gives an array give one value, as a spreadsheet does.

        Outside any function a range stands for its cell in the formula's own row or column, and an
        array that one of our functions returns for its first entry.
        """
        pieces, depth = ["="], 0
        for token in fz.Tokenizer(self._book.get_formula(*self._cell(place)) or "").tokens():
            a_call, text = token.token_type == fz.TokenType.Func, token.value
            ours = a_call and text.lower().endswith(f"{TOLD}(")
            a_range = token.subtype == fz.TokenSubType.Range
            if depth == 0 and (ours or a_range):
                pieces.append("@")
            if a_call:
                depth += 1 if text.endswith("(") else -1
            pieces.append(text)
        self._book.set_formula(*self._cell(place), "".join(pieces))

    def refuse(self, place: Place) -> None:
        """Let a cell whose formula cannot be evaluated be an error, so that nothing builds on it."""
        self._book.set_formula(*self._cell(place), f"={VALUE}")

    def set_constant(self, place: Place, value: CellValue) -> None:
        """Let a cell hold a value in place of its formula."""
        held = fz.LiteralValue.error(_KINDS.get(value, "Value"), None) if isinstance(value, ErrorValue) else value
        self._book.set_value(*self._cell(place), held)

    def set_array(self, place: Place, rows: list[list[CellValue]]) -> bool:
        """Let a cell spill constants in place of its formula's array, unless there are too many; tell which."""
        written = "={" + ";".join(",".join(map(_constant, row)) for row in rows) + "}"
        short = len(written) <= LONGEST_ARRAY
        if short:
            self._book.set_formula(*self._cell(place), written)
        return short

    def breaks(self, place: Place) -> bool:
        """Tell whether to evaluate a cell breaks off the evaluation of the whole workbook."""
        try:
            self._book.evaluate_cell(*self._cell(place))
        except fz.ExcelEvaluationError:
            if self._stopped:
                raise self._stopped from None
            return True
        return False

    def formula(self, place: Place) -> str:
        """Return the formula of a cell as the engine has it, "" if it has none."""
        return self._book.get_formula(*self._cell(place)) or ""

    def references(self, place: Place) -> list[tuple[int, Area]]:
        """Return the number of the sheet and the area of each reference in a cell's formula."""
        return [known for known in self._inputs(place) if known]

    def knows_inputs(self, place: Place) -> bool:
        """Tell whether `references` has all that a cell's formula refers to."""
        return all(self._inputs(place))

    def _inputs(self, place: Place) -> Iterator[tuple[int, Area] | None]:
        """Yield the sheet and the area of each reference in a cell's formula, None for one that cannot be followed."""
        report = self._book.precedents(self._address(place), max_links=MOST_REFERENCES)
        for precedent in report.precedents:
            reference = precedent.reference
            named = reference.resolution
            if named and named.kind == fz.NameResolutionKind.Literal:
                continue
            text = reference.address or reference.resolved or (named and (named.address or named.resolved))
            sheet, _, cells = (text or "").rpartition("!")
            number = self._numbers.get(sheet.removeprefix("'").removesuffix("'").replace("''", "'"))
            if number is not None:
                yield number, area(cells)
            elif reference.kind != fz.ReferenceKind.Range or not reference.declared:
                yield None
        if report.truncation.incomplete:
            yield None

    def _cell(self, place: Place) -> tuple[str, int, int]:
        number, row, column = place
        return self._sheets[number], row, column

    def _address(self, place: Place) -> str:
        number, row, column = place
        return sheet_prefix(self._sheets[number]) + cell_name(row, column)

    def _answering(self, name: str, function: Function) -> Function:
        """Return what the engine calls: our function between the engine's values and its own."""
        fewest, most = _arity(function)

        def answer(sheet: float, row: float, column: float, *arguments: object) -> object:
            place = int(sheet), int(row), int(column)
            if name in (ELSEWHERE, UNKNOWN):
                self.unevaluated.add(place)
            try:
                given = tuple(map(_argument, arguments))
                self._called(place, Call(name, given))
                if not fewest <= len(arguments) <= most:
                    raise BeamError(VALUE, _count_of_arguments(name, fewest, most, len(arguments)))
                result = function(*given)
            except BeamError as error:
                return self._failed(place, error)
            except Exception as error:
                fault = f"{name} broke off: {type(error).__name__}: {error}"
                return self._failed(place, BeamError(VALUE, fault))
            except BaseException as error:
                self._stopped = error
                self._book.cancel()
                return None
            return self._shown(place, result)

        return answer

    def _shown(self, place: Place, result: object, entry: tuple[int, int] | None = None) -> object:
        """Return a result as the engine takes it, its errors noted."""
        if isinstance(result, list):
            return [[self._shown(place, one, (i, j)) for j, one in enumerate(row)] for i, row in enumerate(result)]
        if isinstance(result, BeamError):
            return self._failed(place, result, entry)
        if isinstance(result, str | bool):
            return result
        number = float(result)  # type: ignore[arg-type]
        if not math.isfinite(number):
            return self._failed(place, BeamError(NUM, "the result is not a finite number"), entry)
        return number

    def _failed(self, place: Place, error: BeamError, entry: tuple[int, int] | None = None) -> object:
        self.failures[place].append(Failure(error.value, error.reason, entry))
        return fz.LiteralValue.error(_KINDS.get(error.value, "Value"), None)


def _constant(value: CellValue) -> str:
    """Return a value as it is written in a formula."""
    if isinstance(value, ErrorValue):
        return str(value)
    if isinstance(value, str):
        return '"' + value.replace('"', '""') + '"'
    if isinstance(value, bool):
        return "TRUE" if value else "FALSE"
    return repr(value or 0.0)


def _told(error: Exception) -> str:
    return f"it cannot be evaluated ({' '.join(str(error).split())})"


def _argument(value: object) -> object:
    if isinstance(value, list):
        if value and len(value[0]) == WHOLE_ROW:
            value = _without_blank_end(value)
        return [[_from_engine(one) for one in row] for row in value]
    return _from_engine(value)


def _without_blank_end(rows: list[list[object]]) -> list[list[object]]:
    """Return whole rows up to the last column that holds something, as the engine gives whole columns."""
    used = max((number for row in rows for number, value in enumerate(row, 1) if value is not None), default=1)
    return [row[:used] for row in rows]


def _from_engine(value: object) -> CellValue:
    if isinstance(value, dict):
        return _ERRORS.get(value.get("kind", ""), NOT_READ)
    if value is None or isinstance(value, str | bool | float):
        return value
    if isinstance(value, int):
        return float(value)
    return NOT_READ


def _criterion(value: object) -> object:
    """Return the one criterion that a conditional sum is given; a blank cell counts as 0 there."""
    if isinstance(value, list):
        raise BeamError(VALUE, "several criteria at once are not evaluated here: give each a formula of its own")
    if isinstance(value, ErrorValue):
        raise BeamError(str(value), f"the criterion is the error value {value} itself; mend that cell")
    if isinstance(value, str) and value.lstrip("=<>").upper() in _KINDS:
        raise BeamError(VALUE, f"cells that hold {value} are not counted here: count them by ISERROR, each in a cell")
    return 0.0 if value is None else value


def _unlike() -> object:
    raise BeamError(VALUE, "the ranges of a conditional sum or count are of unlike size")


def unknown_functions(names: Iterable[str]) -> set[str]:
    """Return those of the names that are no function of the engine."""
    book = fz.Workbook()
    book.add_sheet("Asked")
    unknown = set()
    for name in names:
        values = []
        for column, spelt in enumerate((name, f"_xlfn.{name}"), 1):
            try:
                book.set_formula("Asked", 1, column, f"={spelt}()")
                book.evaluate_all()
                values.append(_from_engine(book.get_value("Asked", 1, column)))
            except (fz.ExcelEvaluationError, ValueError, RuntimeError):
                values.append(None)
        if all(value == NAME for value in values):
            unknown.add(name)
    return unknown


def _unknown(name: object, *_: object) -> object:
    raise BeamError(NAME, f"the formula uses {name}, a function that is not known here")


def _elsewhere(*_: object) -> object:
    raise BeamError(REF, "refers to another workbook, which is not opened here")


def _fitted(array: object, rows: float, columns: float) -> list[list[object]]:
    """Return an array in the size of an array formula: one row or column repeats, the rest is #N/A."""
    given = array if isinstance(array, list) else [[array]]
    nothing = fz.LiteralValue.error(_KINDS[NA], None)

    def entry(row: int, column: int) -> object:
        row = 0 if len(given) == 1 else row
        column = 0 if len(given[0]) == 1 else column
        if row >= len(given) or column >= len(given[0]):
            return nothing
        value = given[row][column]
        if isinstance(value, dict):
            return fz.LiteralValue.error(value["kind"], None)
        return 0.0 if value is None else value

    return [[entry(i, j) for j in range(int(columns))] for i in range(int(rows))]


def _arity(function: Function) -> tuple[int, float]:
    parameters = inspect.signature(function).parameters.values()
    several = any(parameter.kind is parameter.VAR_POSITIONAL for parameter in parameters)
    named = [parameter for parameter in parameters if parameter.kind is not parameter.VAR_POSITIONAL]
    fewest = sum(parameter.default is parameter.empty for parameter in named)
    return fewest, math.inf if several else len(named)


def _count_of_arguments(name: str, fewest: int, most: float, given: int) -> str:
    limit = f"{fewest} or more" if most == math.inf else f"{fewest} to {most}"
    return f"{name}: takes {fewest if fewest == most else limit} arguments, {given} given"
