"""One table of calls that every host must answer as the functions do, to the last bit.

No expected value stands here: what is expected is what the function itself answers in Python. Arguments are what a
cell gives: text, a number, None for one that is left out, rows of cells for a range (whose blank cells are None), and
an error value, which stands in a cell of its own. No number has more than 15 digits, and no text in a formula more than
255 characters: a worksheet holds no more. An argument that a function cannot do without is left out only where a 0 in
its place gives the same error, for some hosts hand over that.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import TypeAlias

from openpyxl.utils import get_column_letter

from beamfuncs.catalogue import catalogue
from beamfuncs.errors import BeamError, ErrorValue

Cell: TypeAlias = str | float | None
Argument: TypeAlias = Cell | list[list[Cell]]
Entry: TypeAlias = float | str
"""What a cell shows: a number, a text, or an `ErrorValue`."""

REF, DIV, NAME = ErrorValue("#REF!"), ErrorValue("#DIV/0!"), ErrorValue("#NAME?")
SHEET = "Data"


@dataclass(frozen=True)
class Row:
    """A call. Its ranges and error values stand in cells of a sheet `Data`, side by side, the rest in the formula."""

    function: str
    arguments: tuple[Argument, ...]

    @property
    def placed(self) -> list[list[list[Cell]] | None]:
        """For each argument the range that it fills on the sheet, None for one that stands in the formula."""
        ranges = ([[a]] if isinstance(a, ErrorValue) else a for a in self.arguments)
        return [a if isinstance(a, list) else None for a in ranges]

    @property
    def height(self) -> int:
        """The rows that the ranges take on the sheet."""
        return max((len(rows) for rows in self.placed if rows is not None), default=0)

    def cells(self, top: int) -> dict[str, Cell]:
        """The cells of the ranges by their names, the first row of each being row `top` of the sheet."""
        found = {}
        for rows, left in zip(self.placed, self._columns, strict=True):
            for i, row in enumerate(rows or []):
                found |= {f"{get_column_letter(left + j)}{top + i}": cell for j, cell in enumerate(row)}
        return found

    def formula(self, top: int, separator: str = ",", sheet: str = f"{SHEET}!") -> str:
        """The call as a worksheet formula, its ranges being where `cells` puts them."""
        words = []
        for argument, rows, left in zip(self.arguments, self.placed, self._columns, strict=True):
            if rows is None:
                words.append(literal(argument))
            else:
                first = f"{get_column_letter(left)}{top}"
                last = f"{get_column_letter(left + len(rows[0]) - 1)}{top + len(rows) - 1}"
                words.append(f"{sheet}{first}" if first == last else f"{sheet}{first}:{last}")
        return f"={self.function}({separator.join(words)})"

    @property
    def _columns(self) -> list[int]:
        """The leftmost column of each argument's range: a blank column lies between two."""
        columns, free = [], 1
        for rows in self.placed:
            columns.append(free)
            free += len(rows[0]) + 1 if rows else 0
        return columns

    def __str__(self) -> str:
        return f"{self.function}({', '.join('' if a is None else repr(a) for a in self.arguments)})"


def literal(argument: object) -> str:
    """An argument as it is typed into a formula."""
    if argument is None:
        return ""
    if isinstance(argument, str):
        return '"' + argument.replace('"', '""') + '"'
    return f"{argument:.15G}"


def answer(row: Row) -> Entry | list[list[Entry]]:
    """What the function answers, a `BeamError` turned into the error value that a cell shows."""
    try:
        result = catalogue()[row.function].function(*row.arguments)
    except BeamError as error:
        return ErrorValue(error.value)
    return [[shown(entry) for entry in line] for line in result] if isinstance(result, list) else result


def shown(entry: Entry | BeamError) -> Entry:
    """An entry of an array as its cell shows it."""
    return ErrorValue(entry.value) if isinstance(entry, BeamError) else entry


def rows_of(answered: Entry | Sequence[Sequence[Entry]]) -> list[list[Entry]]:
    """An answer as the rows of cells that it fills."""
    return [list(row) for row in answered] if isinstance(answered, (list, tuple)) else [[answered]]


def bits(entry: object) -> str:
    """A value with its type, to the last bit: two entries are the same where this is."""
    if isinstance(entry, float):
        return entry.hex()
    return f"error {entry}" if isinstance(entry, ErrorValue) else repr(entry)


def bits_of(rows: Sequence[Sequence[object]]) -> list[list[str]]:
    """The `bits` of every entry."""
    return [[bits(entry) for entry in row] for row in rows]


def call(function: str, *arguments: Argument) -> Row:
    """A row of the table."""
    return Row(function, arguments)


PROPPED = "fixed 8 pinned"
THREE = "fixed 4.3 pinned 5.7 step 1.1 roller 2.9 free"
THREE_LOADS = "G: udl 5.25; Q: point 40 at 3.1; Q: varying 0 to 12 from 4.5 to 9; W: couple 15 at 7"
COMBINED = "1.35 G + 1.5 Q - 0.9 W"
THREE_EI = "24000 3.1e4 18000 24000"
ROW_BEAM: Argument = [["fixed", 4.3, "pinned", None, 5.7, "hinge", 1.1, "roller"]]
COLUMN_BEAM: Argument = [["free"], [1.5], ["spring(2500, 30)"], [6.0], [None], ["guided"]]
BLOCK_BEAM: Argument = [["pinned", 3.7, "step"], [None, None, None], [5.3, "roller", None]]
CLAUSES: Argument = [["G: udl 5.25"], [None], ["Q: point 40 at 3.1; Q: couple 15 at 2.2"]]
TABLE: Argument = [
    ["case", "load", "size", "end size", "from", "to", "at", "span"],
    ["G", "udl", 5.25, None, None, None, None, None],
    [None, None, None, None, None, None, None, None],
    ["Q", "varying", 0.0, 12.0, 1.5, 3.5, None, 1.0],
    ["Q", "point", 40.0, None, None, None, 3.1, None],
]
PLACES: Argument = [[0.0, 0.7, 4.3], [6.1, 11.1, 14.0]]
HOLED: Argument = [[1.1], [None], [2.2], ["three"], [99.0]]
"""Places of which one is blank, one is no number, and one lies beyond the beam."""
BROKEN: Argument = [[1.1, REF, 2.2], [DIV, 3.3, None]]
PHRASES: Argument = [
    ["reaction 2", "reaction moment 1"],
    ["moment at 3", "shear at 4.3 left"],
    ["slope at 0.7", "deflection at 1 in span 2"],
    ["moment max", "moment min in span 2"],
    ["position of moment max", "total load"],
]
HOLED_PHRASES: Argument = [["moment max"], ["reaction 9"], ["bending at 3"], [None], ["shear at support 2 left"]]

FREE_BEAM = "pinned 6.1 roller 4.7 roller 1.9 free"
PATTERNS = "G: udl 4; Q: udl 10 each span; Q: point 30 at 2.2 each load"
TRAIN = "T: axles 80 80 40 spaced 1.2 3.2 both ways"
FREE_PHRASES: Argument = [["reaction 2", "moment at 3"], ["shear at support 2 left", "deflection at 1 in span 2"]]
PLACES_ON_FREE: Argument = [[0.0], [2.2], [12.7]]
LINES: Argument = [
    ["fixed 8 pinned"],
    ["fixed 6.5 pinned"],
    ["fixed 4 pinned"],
    ["fixed 5.1 pinned"],
    ["pinned 5 free"],
]
LOADS_OF_LINES: Argument = [
    ["G: udl 5; Q: point 40 at 3"],
    ["G: udl 5.5; Q: point 44 at 3.3"],
    ["G: udl 6; Q: point 48 at 4.4"],
    ["G: udl 6.5; Q: point 52 at 2.2"],
    ["G: udl 7"],
]
STIFFNESS_OF_LINES: Argument = [[24000.0], [25000.0], ["EI 26000; GA 5e5"], [None], [24000.0]]
OVER: Argument = [
    ["L", "q", "EI", "g", "end"],
    [8.0, 12.0, 24000.0, 1.35, "fixed"],
    [7.5, 12.5, 24000.0, 1.35, "pinned"],
    [7.0, 13.0, 24000.0, 1.0, "fixed"],
    [6.5, 13.5, 31000.0, 1.35, "fixed"],
    [-6.0, 14.0, 31000.0, 1.35, "fixed"],
    [5.5, 14.5, 31000.0, 1.35, "free"],
]
ACTIONS: Argument = [["G", "permanent"], ["Q", "office"], ["W", "wind"]]

GOLDEN: tuple[Row, ...] = (
    # reactions
    call("reaction", PROPPED, "udl 12", 1.0),
    call("reaction", PROPPED, "udl 12", "2"),
    call("reaction", THREE, THREE_LOADS, 2.0, THREE_EI, COMBINED),
    call("reaction", "pinned 6 roller", "G: udl 5; Q: point 40 at 2", 2.0, None, "1.35 G + 1.5 Q"),
    call("reaction", ROW_BEAM, CLAUSES, 3.0, 24000.0),
    call("reaction", BLOCK_BEAM, TABLE, 1.0, [[2.1e4, 3.1e4]], [["1.35 G + 1.5 Q"]]),
    call("reaction", [[PROPPED]], [["udl 12"]], [[2.0]], [[None]], [[None]]),
    call("reaction", PROPPED, "udl 12", 3.0),
    call("reaction", "fixed 6,5 pinned", "udl 12", 1.0),
    call("reaction", "pinned 6 free", "udl 12", 1.0),
    call("reaction", "pinned -6 roller", "udl 12", 1.0),
    call("reaction", REF, "udl 12", 1.0),
    call("reaction", PROPPED, DIV, 1.0),
    call("reaction", PROPPED, "udl 12", NAME),
    call("reaction", [["fixed", REF, "pinned"]], "udl 12", 1.0),
    call("reaction", PROPPED, None, 1.0),
    call("reaction", None, "udl 12", 1.0),
    call("reaction_moment", PROPPED, "udl 12", 1.0),
    call("reaction_moment", THREE, TABLE, 1.0, [[24000.0], [3.1e4], [18000.0], [24000.0]], "1.35 G + 1.5 Q"),
    call("reaction_moment", COLUMN_BEAM, "udl 12.1", 1.0, 27000.0),
    call("reaction_moment", COLUMN_BEAM, "Q: udl 12.1", 1.0, 27000.0, "1.5 Q"),
    call("reaction_moment", COLUMN_BEAM, "Q: udl 12.1", 1.0, None, "1.5 Q"),
    call("reaction_moment", "fixed 3.1 free", "Q: udl 12.1", 1.0, None, "1.5 Q"),
    call("reaction_moment", PROPPED, "udl 12", 0.0),
    call("reactions", PROPPED, "udl 12"),
    call("reactions", THREE, THREE_LOADS, THREE_EI, COMBINED),
    call("reactions", THREE, THREE_LOADS, THREE_EI),
    call("reactions", "pinned 3.3 pinned 4.7 roller", "G: udl 7; Q: udl 3 in span 2", None, "1.35 G + 1.5 Q"),
    call("reactions", ROW_BEAM, CLAUSES, "EI 24000; GA 5e5"),
    call("reactions", THREE, THREE_LOADS),
    call("reactions", "pinned 4 hinge 3 hinge 4 roller", "udl 3"),
    # fields at a place
    call("shear_at", PROPPED, "udl 12", 5.3),
    call("shear_at", THREE, THREE_LOADS, PLACES, THREE_EI, COMBINED),
    call("shear_at", THREE, THREE_LOADS, PLACES, THREE_EI),
    call("shear_at", "pinned 9 roller", "G: point 40 at 3", PLACES, None, "1.35 G"),
    call("shear_at", PROPPED, "udl 12", HOLED),
    call("shear_at", PROPPED, "udl 12", 8.5),
    call("moment_at", PROPPED, "udl 12", 5.3),
    call("moment_at", PROPPED, "udl 12", "2.5"),
    call("moment_at", ROW_BEAM, TABLE, PLACES, 24000.0, "G"),
    call("moment_at", ROW_BEAM, TABLE, PLACES, 24000.0),
    call("moment_at", PROPPED, "Q: udl 12", [[0.0, 1.1, 2.2, 3.3]], None, "1.5 Q"),
    call("moment_at", PROPPED, "udl 12", BROKEN),
    call("moment_at", PROPPED, "udl 12", [[1.1, "1e400"], [2.2, 3.3]]),
    call("moment_at", PROPPED, "udl 12", [["three"]]),
    call("moment_at", PROPPED, "udl 12", [["three", 1.1], [2.2, 3.3]]),
    call("moment_at", PROPPED, "udl 12", [[1.1, 2.2], [None, 3.3]]),
    call("moment_at", PROPPED, "udl 12", [[2.2]]),
    call("moment_at", PROPPED, "udl 12 from 2 to 12", [[1.1], [2.2]]),
    call("moment_at", PROPPED, "udl 12", "2,5"),
    call("moment_at", PROPPED, "Q: udl 12", 3.0, None, "1.35 G + oops"),
    call("slope_at", "pinned 6.3 roller", "udl 12", 0.0, 27000.0),
    call("slope_at", THREE, CLAUSES, PLACES, THREE_EI, "1.35 G + 1.5 Q"),
    call("slope_at", THREE, "settle 0.01 at support 2", [[0.7, 4.3], [None, -1.0]], 27000.0),
    call("slope_at", "pinned 6.3 roller", "udl 12", 0.0),
    call("slope_at", "pinned 6.3 roller", "Q: udl 12", [[0.0, 1.0]], None, "1.5 Q"),
    call("deflection_at", "fixed 4.1 free", "point 9 at 4.1", 4.1, 24000.0),
    call("deflection_at", THREE, CLAUSES, HOLED, "EI 24000; GA 5e5", "G + Q"),
    call("deflection_at", "fixed 8 roller", "curvature 1e-4 from 0 to 8", [[2.0, 3.0, 4.0]], 24000.0),
    call("deflection_at", "fixed 4.1 free", "point 9 at 4.1", 4.1),
    call("deflection_at", "fixed 4.1 free", "Q: point 9 at 4.1", 4.1, None, "1.5 Q"),
    call("deflection_at", "fixed 4.1 free", "point 9 at 4.1", 4.1, 0.0),
    call("deflection_at", "fixed 4.1 free", "point 9 at 4.1", 4.1, -24000.0),
    # extremes
    call("shear_max", PROPPED, "udl 12"),
    call("shear_max", THREE, THREE_LOADS, 2.0, THREE_EI, COMBINED),
    call("shear_max", THREE, THREE_LOADS, None, THREE_EI, COMBINED),
    call("shear_max", PROPPED, "Q: udl 12.3", 1.0, None, "1.5 Q"),
    call("shear_max", "free 3 fixed", "udl 12", 1.0),
    call("shear_min", PROPPED, "udl 12"),
    call("shear_min", THREE, THREE_LOADS, 1.0, THREE_EI),
    call("shear_min", PROPPED, "Q: udl 12.3", None, None, "1.5 Q"),
    call("shear_min", PROPPED, "udl 12", 2.0),
    call("moment_max", PROPPED, "udl 12"),
    call("moment_max", BLOCK_BEAM, TABLE, None, 27000.0),
    call("moment_max", BLOCK_BEAM, TABLE, [[None]], [[27000.0]], "1.35 G + 1.5 Q"),
    call("moment_max", BLOCK_BEAM, TABLE, 1.0, None, "1.35 G + 1.5 Q"),
    call("moment_max", THREE, TABLE, 0.0, THREE_EI, "G"),
    call("moment_max", PROPPED, "udl 12", "one"),
    call("moment_max", PROPPED, "udl 12", [[1.0, 2.0]]),
    call("moment_max", PROPPED, "udl 12", 1.5),
    call("moment_min", PROPPED, "udl 12"),
    call("moment_min", THREE, THREE_LOADS, 2.0, THREE_EI, COMBINED),
    call("moment_min", PROPPED, "Q: udl 12.3", None, None, "1.5 Q"),
    call("moment_min", PROPPED, "udl twelve"),
    call("deflection_max", "pinned 8.1 roller", "udl 12", None, 32000.0),
    call("deflection_max", THREE, THREE_LOADS, 2.0, THREE_EI, COMBINED),
    call("deflection_max", "pinned 8.1 roller", "Q: udl 12", None, None, "1.5 Q"),
    call("deflection_max", "pinned 8.1 roller", "udl 12"),
    call("deflection_min", "fixed 4.1 free", "point -9 at 4.1", None, 24000.0),
    call("deflection_min", THREE, THREE_LOADS, None, THREE_EI, COMBINED),
    call("deflection_min", THREE, THREE_LOADS, 1.0, None, COMBINED),
    call("deflection_min", PROPPED, "udl 12", 2.0, 24000.0),
    call("deflection_min", "pinned 8.1 roller", "udl 12"),
    # any result
    call("beam_result", PROPPED, "udl 12", "position of moment max"),
    call("beam_result", THREE, THREE_LOADS, PHRASES, THREE_EI, COMBINED),
    call("beam_result", THREE, THREE_LOADS, PHRASES, THREE_EI),
    call("beam_result", PROPPED, "G: udl 5.25", PHRASES, None, "1.35 G"),
    call("beam_result", PROPPED, "udl 12", HOLED_PHRASES),
    call("beam_result", PROPPED, "udl 12", "reaction 3"),
    call("beam_result", PROPPED, "udl 12", "bending at 3"),
    call("beam_result", "guided 4 roller 2 free", "udl 12", "moment max"),
    call("beam_result", "free 4 free", "udl 12", "moment max"),
    call("diagram", PROPPED, "udl 12"),
    call("diagram", THREE, THREE_LOADS, 5.0, THREE_EI, COMBINED),
    call("diagram", THREE, THREE_LOADS, None, THREE_EI),
    call("diagram", THREE, THREE_LOADS, None, [[24000.0]], COMBINED),
    call("diagram", "pinned 6.3 roller", "Q: udl 12", None, None, "1.5 Q"),
    call("diagram", PROPPED, "udl 12", 1.0),
    call("diagram", PROPPED, "udl 12", "few"),
    call("contraflexure", PROPPED, "udl 12"),
    call("contraflexure", THREE, THREE_LOADS, THREE_EI, COMBINED),
    call("contraflexure", THREE, THREE_LOADS, THREE_EI),
    call("contraflexure", PROPPED, "Q: udl 12", None, "1.5 Q"),
    call("contraflexure", "pinned 8 roller", "udl 12"),
    # over combinations, patterns and moving loads
    call("combinations", "EN 1990 6.10", "G permanent; Q office; W wind"),
    call("combinations", "EN 1990 6.10", ACTIONS, "W"),
    call("combinations", "EN 1990 6.10b", ACTIONS, None, "xi 0.9"),
    call("combinations", "ASCE 7-22 allowable", "D dead; L live"),
    call("combinations", "EN 1990 6.10", "G permanent; Q office", "S"),
    call("combinations", "no standard", "G permanent"),
    call("highest", FREE_BEAM, PATTERNS, "moment max", "1.35/1.0 G + 1.5 Q", 24000.0),
    call("highest", FREE_BEAM, PATTERNS, FREE_PHRASES, [["1.35 G"], [None], ["1.35 G + 1.5 Q"]], "EI 24000; GA 5e5"),
    call("highest", FREE_BEAM, PATTERNS, "reaction 1"),
    call("highest", FREE_BEAM, PATTERNS, "reaction 1", "1.5 Q"),
    call("highest", FREE_BEAM, PATTERNS, "deflection max", None, 24000.0),
    call("highest", FREE_BEAM, TRAIN, FREE_PHRASES, None, 24000.0),
    call("highest", FREE_BEAM, PATTERNS, "moment min"),
    call("highest", FREE_BEAM, PATTERNS, "deflection max"),
    call("lowest", FREE_BEAM, PATTERNS, "moment min", "1.35/1.0 G + 1.5 Q", 24000.0),
    call("lowest", FREE_BEAM, TRAIN, FREE_PHRASES, "1.35 T", 24000.0),
    call("lowest", FREE_BEAM, TRAIN, "reaction 1"),
    call("lowest", FREE_BEAM, TRAIN, "reaction 1", None, 24000.0),
    call("lowest", FREE_BEAM, TRAIN, "reaction 9"),
    call("governing", FREE_BEAM, PATTERNS, "moment max", "1.35/1.0 G + 1.5 Q", 24000.0, "highest"),
    call("governing", FREE_BEAM, TRAIN, "reaction 1", None, None, "lowest"),
    call("governing", FREE_BEAM, TRAIN, "reaction 1", "1.5 T", None, "lowest"),
    call("governing", FREE_BEAM, TRAIN, "moment max", None, 24000.0),
    call("governing", FREE_BEAM, PATTERNS, "reaction 1"),
    call("governing", FREE_BEAM, PATTERNS, "reaction 1", "1.5 Q"),
    call("governing", FREE_BEAM, PATTERNS, "reaction 1", "1.5 Q", None, "most"),
    call("envelope", FREE_BEAM, PATTERNS),
    call("envelope", FREE_BEAM, PATTERNS, [["1.35 G"], ["1.35 G + 1.5 Q"]], 5.0, 24000.0),
    call("envelope", FREE_BEAM, PATTERNS, "1.5 Q"),
    call("envelope", FREE_BEAM, PATTERNS, None, 5.0),
    call("envelope", FREE_BEAM, TRAIN, "1.5 T", None, 24000.0),
    call("envelope", FREE_BEAM, PATTERNS, "1.35 G +"),
    call("reaction_cases", FREE_BEAM, PATTERNS),
    call("reaction_cases", "fixed 8.1 pinned", TRAIN, 24000.0),
    call("reaction_cases", FREE_BEAM, "axles 80 80 spaced"),
    call("influence", FREE_BEAM, "moment at 3", 2.2),
    call("influence", FREE_BEAM, "deflection at 3", PLACES_ON_FREE, 24000.0),
    call("influence", FREE_BEAM, "shear at support 2 left", 20.0),
    call("influence_line", FREE_BEAM, "shear at 3"),
    call("influence_line", FREE_BEAM, "reaction 2", 5.0),
    call("influence_line", FREE_BEAM, "reaction moment 1", None, 24000.0),
    call("influence_line", FREE_BEAM, "slope at 3", 5.0, 24000.0),
    call("influence_line", FREE_BEAM, "moment max"),
    # many beams at once
    call("sweep", LINES, "udl 12", "moment max"),
    call("sweep", LINES, TABLE, [["reaction 1", "moment at 3", "deflection max"]], 24000.0),
    call("sweep", LINES, LOADS_OF_LINES, [["reaction 1", "moment max"]], None, COMBINED),
    call("sweep", LINES, LOADS_OF_LINES, [["reaction 1", "slope max"]], STIFFNESS_OF_LINES, "1.35 G + 1.5 Q"),
    call("sweep", PROPPED, "udl 12", [["reaction 1", "moment at 9", "reaction 4", "total loads"]]),
    call("sweep", LINES, CLAUSES, "moment max"),
    call("sweep", [["fixed 8 pinned"], [REF], ["free 8 free"], [None]], "udl 12", [["reaction 1", "moment max"]]),
    call("sweep_over", "fixed {L} pinned", "udl {q}", [["reaction 1", "moment max"]], OVER),
    call("sweep_over", "fixed {L} pinned", "udl {q}", "deflection max over length", OVER, "EI {EI}"),
    call("sweep_over", "{end} {L} pinned", "G: udl {q}", "moment min", OVER, None, "{g} G"),
    call("sweep_over", "fixed {L} pinned", "udl {q}", "moment max", [["L"], [8.0]]),
    # solving for an unknown
    call("solve_for", "pinned ? roller", "udl 12", "moment max", 96.5),
    call("solve_for", "pinned 6.3 roller", "udl 8", "deflection max over length", 0.0025, "?"),
    call("solve_for", [["pinned"], ["?"], ["roller"]], "Q: udl 12", "moment max", 96.5, None, "1.5 Q"),
    call("solve_for", "pinned ? roller", "udl 12", "deflection max", 0.02, 24000.0, None, 2.0),
    call("solve_for", "pinned ? roller", "udl 12", "moment max", 96.5, None, None, None, 20.0),
    call("solve_for", "pinned 6 roller", "point 40 at ?", "moment max", 50.0, None, None, 0.1, None, "largest"),
    call("solve_for", "pinned 6 roller", "point 40 at ?", "moment max", 61.0),
    call("solve_for", "pinned 6 roller", "udl 12", "moment max", 54.0),
    call("solve_for", "pinned ? roller", "udl 12", "moment max", "much"),
    # text
    call("beam_line", "fix", 6.5, "pin"),
    call("beam_line", "fix", 6.5, "pin", 2.75, "hinge 1.25 roller"),
    call("beam_line", COLUMN_BEAM),
    call("beam_line", [["fixed", 3.1, None]], "pinned", [[2.2], [None], ["free"]]),
    call("beam_line", "fixed", 6.5, 7.5, "pinned"),
    call("beam_line", "fixed", [[6.5, REF]], "pinned"),
    call("load_line", "G: udl", 5.25, "; Q: point", 40.0, "at", 3.0),
    call("load_line", TABLE),
    call("load_line", CLAUSES),
    call("load_line", "udl", DIV),
    call("load_line", "heavy", 12.0),
    call("beam_reads", "pin 8 roller", 24000.0),
    call("beam_reads", BLOCK_BEAM),
    call("beam_reads", COLUMN_BEAM, "EI 24000; GA 5e5"),
    call("beam_reads", 'pinned 6 "roller"'),
    call("loads_read", "pinned 6 roller", "G: udl 5; Q: point 40 at 2"),
    call("loads_read", ROW_BEAM, TABLE),
    call("loads_read", "pinned 6 roller", "point 40 at 7"),
    call("loads_read", "pinned 6 roller", "udl 5 in span 2"),
    call("fault", PROPPED, "udl 12"),
    call("fault", PROPPED, "udl 12 from 2 to 12"),
    call("fault", THREE, THREE_LOADS),
    call("fault", THREE, THREE_LOADS, THREE_EI, COMBINED),
    call("fault", THREE, THREE_LOADS, THREE_EI),
    call("fault", THREE, THREE_LOADS, None, COMBINED),
    call("fault", 'fixed 8 "pinned"', "udl 12"),
    call("fault", [["fixed", None], [8.0, "pined"]], TABLE),
    call("unit_factor", "kN m", "N mm"),
    call("unit_factor", "kip ft", "kNm"),
    call("unit_factor", "N/mm²", "kN/m²"),
    call("unit_factor", "kN", "m"),
    call("unit_factor", "cubit", "m"),
    call("unit_factor", "kN", REF),
)
