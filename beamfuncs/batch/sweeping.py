"""Sweeps: one question asked of a column of beams, in chunks, the rows of equal shape solved together."""

from __future__ import annotations

import re
from collections.abc import Callable, Iterator, Mapping, Sequence
from dataclasses import dataclass, field
from typing import TypeAlias

import numpy as np

from beamfuncs.batch.answers import FEWEST, Asked, answers
from beamfuncs.batch.columns import SLOT, Array, Column, Indices, combinations, same, stiffnesses, texts
from beamfuncs.batch.shapes import Shape, shape
from beamfuncs.cells import Argument, Frozen, as_text, flat, frozen, is_range
from beamfuncs.errors import BeamError, impossible, quoted, unreadable
from beamfuncs.notation import is_load_table, read_anew, read_combination
from beamfuncs.results import Result, read_phrase
from beamfuncs.stiffness import solve

Progress: TypeAlias = Callable[[int, int], None]
"""Told how many rows are done, and of how many."""
Columns: TypeAlias = Mapping[str, Sequence[object] | Array]

NAMES = ("beam", "loads", "stiffness", "combination")

CHUNK = 32_768
"""Rows that are read together."""
BLOCK = 4_096
"""Beams that are solved together: their numbers stay in the processor's cache."""


@dataclass
class Swept:
    """The results of a sweep: a row for each beam, NaN where there is an error, and the errors by row and column.

    `singly` counts the rows that were solved one by one: those in error, and those of a rare shape.
    """

    values: Array
    errors: dict[tuple[int, int], BeamError] = field(default_factory=dict)
    singly: int = 0

    def rows(self) -> list[list[float | BeamError]]:
        """Return rows of numbers, an entry without one being the error that says why."""
        rows: list[list[float | BeamError]] = self.values.tolist()
        for (row, column), error in self.errors.items():
            rows[row][column] = error
        return rows


def sweep(
    beams: Argument | Array,
    loads: Argument | Array,
    phrases: Argument | Array,
    stiffness: Argument | Array = None,
    combination: Argument | Array = None,
    *,
    progress: Progress | None = None,
    chunk: int = CHUNK,
    fewest: int = FEWEST,
) -> Swept:
    """Return the results that phrases name for a column of beams; what is no column counts for every row.

    `progress` is told of every `chunk` of rows. Fewer beams of a kind than `fewest` are solved one by one.

    >>> sweep(["fixed 8 pinned", "fixed 4 pinned"], "udl 12", ["reaction 1", "moment max"]).values.tolist()
    [[60.0, 54.0], [30.0, 13.5]]
    """
    line = _cells("beams", beams, None)
    lines: list[object] = [line.value] if isinstance(line, _One) else line
    count = len(lines)
    asked = _phrases(phrases)
    given: list[list[object] | _One] = [
        lines,
        _cells("loads", loads, count),
        _cells("stiffness", stiffness, count),
        _cells("combination", combination, count),
    ]
    swept = Swept(np.full((count, len(asked)), np.nan))
    readers = (texts, texts, stiffnesses, combinations)
    for start in range(0, count, chunk):
        rows = slice(start, min(start + chunk, count))
        columns = [
            read(cells[rows]) if isinstance(cells, list) else _same(cells, rows)
            for read, cells in zip(readers, given, strict=True)
        ]

        def one(row: int) -> tuple[object, ...]:
            return tuple(cells[row] if isinstance(cells, list) else cells.value for cells in given)

        _swept(swept, rows.start, _blocks(columns), asked, one, fewest)
        if progress:
            progress(rows.stop, count)
    return swept


def sweep_over(
    beam: Argument,
    loads: Argument,
    phrases: Argument | Array,
    values: Argument | Array | Columns,
    stiffness: Argument = None,
    combination: Argument = None,
    *,
    progress: Progress | None = None,
    chunk: int = CHUNK,
    fewest: int = FEWEST,
) -> Swept:
    """Return the results that phrases name for a beam whose names in braces take the values of each row in turn.

    `values` are rows under a row of names, or a dict of columns.

    >>> sweep_over("fixed {L} pinned", "udl {q}", "moment max", {"L": [8, 4], "q": [12, 6]}).values.tolist()
    [[54.0], [6.75]]
    """
    parts = [frozen(name, part) for name, part in zip(NAMES, (beam, loads, stiffness, combination), strict=True)]
    columns = _named_columns(values)
    count = len(next(iter(columns.values()), ()))
    asked = _phrases(phrases)
    form = _Form.of(parts, columns)
    swept = Swept(np.full((count, len(asked)), np.nan))
    for start in range(0, count, chunk):
        stop = min(start + chunk, count)
        _swept(swept, start, form.blocks(slice(start, stop)), asked, form.row, fewest)
        if progress:
            progress(stop, count)
    return swept


# --- rows ------------------------------------------------------------------------------------------------


@dataclass(frozen=True)
class _Block:
    """Rows of one shape, counted from the first of the chunk, and the values of its slots; no shape if unreadable."""

    rows: Indices
    shape: Shape | None
    values: Array


def _swept(
    swept: Swept,
    start: int,
    blocks: Iterator[_Block],
    asked: list[Asked],
    one: Callable[[int], tuple[object, ...]],
    fewest: int,
) -> None:
    """Answer the rows of a chunk: together where they have a shape in common, else one by one."""
    for block in blocks:
        rows = block.rows + start
        if block.shape is None or len(rows) < fewest:
            _singly(swept, rows, asked, one)
            continue
        for first in range(0, len(rows), BLOCK):
            part = slice(first, first + BLOCK)
            found = answers(block.shape, block.values[:, part], asked, fewest)
            swept.values[rows[part]] = found.values
            done = rows[part][found.done]
            for column, error in enumerate(found.errors):
                if error is not None:
                    swept.errors |= {(row, column): error for row in done.tolist()}
            for lack in found.missing:
                for n, row in enumerate(lack.beams.tolist()):
                    if found.done[row]:
                        place = int(rows[first + row]), lack.entry
                        swept.errors[place] = lack.error(n)
                        swept.values[place] = np.nan
            if not found.done.all():
                _singly(swept, rows[part][~found.done], asked, one)


def _singly(swept: Swept, rows: Indices, asked: list[Asked], one: Callable[[int], tuple[object, ...]]) -> None:
    for row in rows.tolist():
        swept.singly += 1
        for column, answer in enumerate(_row(one, row, asked)):
            if isinstance(answer, BeamError):
                swept.values[row, column] = np.nan
                swept.errors[row, column] = answer
            else:
                swept.values[row, column] = answer


def _row(one: Callable[[int], tuple[object, ...]], row: int, asked: list[Asked]) -> list[float | BeamError]:
    """Return the answers of one row as the other functions give them."""
    try:
        beam, loads, stiffness, combination = (frozen(*pair) for pair in zip(NAMES, one(row), strict=True))
        line, placed = read_anew(beam, loads, stiffness)
        factors = placed.factors(read_combination.__wrapped__(combination))
        result = Result.of(solve(line, placed), factors)
    except BeamError as error:
        return [error] * len(asked)
    found: list[float | BeamError] = []
    for phrase in asked:
        try:
            found.append(phrase if isinstance(phrase, BeamError) else result.answer(phrase))
        except BeamError as error:
            found.append(error)
    return found


# --- arguments -------------------------------------------------------------------------------------------


@dataclass(frozen=True)
class _One:
    """An argument that counts for every row."""

    value: Frozen


def _listed(cells: object) -> list[object]:
    listed: list[object] = cells.tolist() if hasattr(cells, "tolist") else list(cells)  # type: ignore[call-overload]
    return listed


def _column(name: str, listed: list[object]) -> list[object]:
    """Return the cells of a column; a plain list or an array of one dimension is a column too."""
    if not any(is_range(row) for row in listed):
        return listed
    rows = [_listed(row) if is_range(row) else [row] for row in listed]
    if any(len(row) != 1 for row in rows):
        raise unreadable(f"{name}: a range of several columns; give one column, a cell for each beam")
    return [row[0] for row in rows]


def _cells(name: str, cells: object, count: int | None) -> list[object] | _One:
    """Return a column of as many cells as there are beams, or what counts for all of them: a cell, a row, a table."""
    if not is_range(cells):
        return _One(frozen(name, cells))
    listed = _listed(cells)
    wide = bool(listed) and is_range(listed[0]) and len(_listed(listed[0])) > 1
    if wide and (len(listed) == 1 or is_load_table(frozen(name, cells))):
        return _One(frozen(name, cells))
    column = _column(name, listed)
    if count is None:
        return column
    if len(column) == 1:
        return _One(frozen(name, column[0]))
    if len(column) != count:
        raise unreadable(f"{name}: {len(column)} cells beside {count} beams; give one, or one for each beam")
    return column


def _same(one: _One, rows: slice) -> Column:
    return same(one.value, rows.stop - rows.start)


def _phrases(phrases: object) -> list[Asked]:
    asked: list[Asked] = []
    value = phrases.tolist() if hasattr(phrases, "tolist") else phrases
    for cell in flat(frozen("phrases", value)):
        try:
            asked.append(read_phrase(cell))
        except BeamError as error:
            asked.append(error)
    return asked


def _blocks(columns: list[Column]) -> Iterator[_Block]:
    """Yield the rows of a chunk by the forms of their four texts."""
    code = np.zeros(len(columns[0].form), dtype=np.int64)
    bad = np.zeros(len(code), dtype=bool)
    for column in columns:
        code = code * max(len(column.forms), 1) + np.maximum(column.form, 0)
        bad |= column.form < 0
    code[bad] = -1
    kinds, member = np.unique(code, return_inverse=True)
    order = np.argsort(member, kind="stable")
    for kind, rows in zip(kinds, np.split(order, np.flatnonzero(np.diff(member[order])) + 1), strict=True):
        if kind < 0:
            yield _Block(rows, None, np.zeros((0, len(rows))))
            continue
        forms = [int(column.form[rows[0]]) for column in columns]
        found = shape(*(column.forms[form] for column, form in zip(columns, forms, strict=True)))
        slots = [column.slots(form, rows) for column, form in zip(columns, forms, strict=True)]
        yield _Block(rows, found, np.concatenate(slots))


# --- names in braces -------------------------------------------------------------------------------------

_NAME = re.compile(r"\{([^{}]*)\}")
_COUNTING = re.compile(r"(?:support|span)\s+\{([^{}]*)\}", re.IGNORECASE)


def _named_columns(values: object) -> dict[str, list[object] | Array]:
    """Return the columns of values by their names in small letters."""
    columns: dict[str, list[object] | Array] = {}
    if isinstance(values, Mapping):
        named = {str(name): column for name, column in values.items()}
    else:
        listed = _listed(values) if is_range(values) else []
        if not listed or not is_range(listed[0]):
            raise unreadable("values: give rows of values under a row of names, e.g. L and q")
        header, *rows = map(_listed, listed)
        named = {}
        for n, name in enumerate(header):
            if isinstance(name, str) and name.strip():
                if name.strip().casefold() in (known.strip().casefold() for known in named):
                    raise unreadable(f"values: the name {quoted(name)} stands twice; each stands once")
                named[name] = [row[n] for row in rows]
    for name, column in named.items():
        columns[name.strip().casefold()] = _numbers(column)
    if len({len(column) for column in columns.values()}) > 1:
        raise unreadable("values: columns of unequal length; give a value of each name in every row")
    if not columns:
        raise unreadable("values: no names in the first row; write e.g. L and q over their values")
    return columns


def _numbers(column: object) -> list[object] | Array:
    """Return a column as an array where all of it is numbers, else as the list of its cells."""
    kind = getattr(getattr(column, "dtype", None), "kind", None)
    if kind is not None and kind in "fiu":
        return np.asarray(column, dtype=float)
    cells = _listed(column)
    if all(type(cell) is float or type(cell) is int for cell in cells):
        return np.array(cells, dtype=float)
    return cells


@dataclass(frozen=True)
class _Form:
    """Four texts with names in braces, and the columns of their values."""

    parts: tuple[Frozen, Frozen, Frozen, Frozen]
    columns: dict[str, list[object] | Array]
    slots: tuple[str, ...]
    fixed: tuple[str, ...]

    @classmethod
    def of(cls, parts: list[Frozen], columns: dict[str, list[object] | Array]) -> _Form:
        """Return the form of the arguments; names that stand for texts or count something are `fixed` in a shape."""
        texts_of = list(parts)
        used: list[str] = []
        fixed: dict[str, None] = {}
        for n, (name, text) in enumerate(zip(NAMES, parts, strict=True)):
            if isinstance(text, tuple):
                if any(isinstance(cell, str) and _NAME.search(cell) for cell in flat(text)):
                    if name != "loads" or is_load_table(text):
                        raise unreadable(f"{name}: names in braces stand in one text, not in a range")
                    text = texts_of[n] = "; ".join(str(cell) for cell in flat(text) if cell is not None)
                else:
                    continue
            if not isinstance(text, str):
                continue
            counting = {found[1].strip().casefold() for found in _COUNTING.finditer(text)}
            for found in _NAME.finditer(text):
                key = found[1].strip().casefold()
                if key not in columns:
                    known = ", ".join(columns)
                    raise unreadable(f"{name}: {quoted(found[0], 30)} is no name of the values ({known})")
                if key in counting or isinstance(columns[key], list):
                    fixed[key] = None
                used.append(key)
        one, two, three, four = texts_of
        return cls((one, two, three, four), columns, tuple(key for key in used if key not in fixed), tuple(fixed))

    def blocks(self, chunk: slice) -> Iterator[_Block]:
        """Yield the rows of a chunk by what they have in the places of fixed names."""
        count = chunk.stop - chunk.start
        values = np.empty((len(self.slots), count))
        for row, name in zip(values, self.slots, strict=True):
            row[:] = self.columns[name][chunk]
        if not self.fixed:
            yield _Block(np.arange(count), shape(*map(self._with({}), self.parts)), values)
            return
        members: dict[tuple[tuple[type, object], ...], list[int]] = {}
        for n, cells in enumerate(zip(*(list(self.columns[name][chunk]) for name in self.fixed), strict=True)):
            members.setdefault(tuple((type(cell), cell) for cell in cells), []).append(n)
        for kinds, numbers in members.items():
            rows = np.array(numbers)
            try:
                fixed = {name: cell for name, (_, cell) in zip(self.fixed, kinds, strict=True)}
                found = shape(*map(self._with(fixed), self.parts))
            except BeamError:
                found = None
            yield _Block(rows, found, values[:, rows])

    def row(self, number: int) -> tuple[object, ...]:
        """Return the four arguments of one row."""
        cells = {name: self.columns[name][number] for name in {*self.slots, *self.fixed}}
        return tuple(map(self._with(cells), self.parts))

    def _with(self, cells: dict[str, object]) -> Callable[[Frozen], Frozen]:
        """Return what puts the cells into a text; what has none is a slot."""

        def text_of(found: re.Match[str]) -> str:
            name = found[1].strip().casefold()
            if name not in cells:
                return SLOT
            cell = frozen(f"values, {name}", cells[name])
            if cell is None:
                raise unreadable(f"values, {name}: blank; give a number")
            if isinstance(cell, float) and not np.isfinite(cell):
                raise impossible(f"values, {name}: {cell} is not finite; give a number")
            return as_text(cell) if isinstance(cell, float) else str(cell)

        return lambda text: _NAME.sub(text_of, text) if isinstance(text, str) else text
