"""Columns of texts: each distinct text is cut into its form and its numbers, so that equal forms are read once."""

from __future__ import annotations

import re
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import TypeAlias

import numpy as np
from numpy.typing import NDArray

from beamfuncs.cells import Frozen, is_number
from beamfuncs.notation import may_be_thousands

Array: TypeAlias = NDArray[np.float64]
Indices: TypeAlias = NDArray[np.intp]
Flags: TypeAlias = NDArray[np.bool_]

SLOT = "\ue000"
"""Stands in a form where a number stood."""
_NEXT = "\ue001"
_PRIVATE = re.compile(f"[{SLOT}{_NEXT}]")


def _cutter(first: str, before: str) -> re.Pattern[str]:
    """Return what cuts texts at words that look like numbers; those that count supports or spans stay.

    A pattern that begins with what a number begins with is looked for fast: what stands before it is looked at after.
    """
    counts = "".join(
        f"(?<!{''.join(f'[{letter}{letter.upper()}]' for letter in word)} {first})" for word in ("support", "span")
    )
    return re.compile(rf"({first}(?<=[{before}\s;(={_NEXT}]{first}){counts}[0-9.eE+\-]*)(?=[\s;){_NEXT}]|,\s)")


_SIGNED = _cutter(r"[+\-.0-9]", "")
_UNSIGNED = _cutter("[.0-9]", r"+\-")
"""In a combination the sign parts two terms and stays."""


@dataclass(frozen=True)
class Column:
    """What an argument is in each row: the index of its form, -1 where there is none, and where its numbers begin."""

    forms: tuple[Frozen, ...]
    form: Indices
    first: Indices
    numbers: Array

    def slots(self, form: int, rows: Indices) -> Array:
        """Return the numbers of rows that have that form, a row of numbers for each slot."""
        text = self.forms[form]
        count = text.count(SLOT) if isinstance(text, str) else 0
        found: Array = self.numbers[self.first[rows] + np.arange(count)[:, None]]
        return found


def texts(cells: Sequence[object], doubtful: Callable[[str], bool] | None = None, signed: bool = True) -> Column:
    """Return a column of texts; what is no text, and a text that is `doubtful`, has no form.

    >>> column = texts(["fixed 8 pinned", "fixed 6.5 pinned", None])
    >>> column.form.tolist(), column.numbers.tolist()
    ([0, 0, -1], [8.0, 6.5])
    """
    index: dict[str, int] = {}
    row = np.array([index.setdefault(cell, len(index)) if type(cell) is str else -1 for cell in cells], dtype=np.intp)
    if not index:
        none = np.full(len(cells), -1)
        return Column((), none, none, np.zeros(0))
    distinct: list[str] = list(index)
    joined = _NEXT.join(["", *distinct, ""])
    if joined.count(_NEXT) != len(distinct) + 1 or SLOT in joined:
        distinct = ["" if _PRIVATE.search(text) else text for text in distinct]
        joined = _NEXT.join(["", *distinct, ""])
    parts = (_SIGNED if signed else _UNSIGNED).split(joined)
    cut = SLOT.join(parts[::2]).split(_NEXT)[1:-1]
    counts = np.array([form.count(SLOT) for form in cut])
    first = np.cumsum(counts) - counts
    numbers = _numbers(parts[1::2])
    refused = set(np.searchsorted(first, np.flatnonzero(np.isnan(numbers)), side="right") - 1)
    forms: dict[str, int] = {}
    form = np.array(
        [
            -1
            if not text or n in refused or (doubtful and doubtful(distinct[n]))
            else forms.setdefault(text, len(forms))
            for n, text in enumerate(cut)
        ]
    )
    return Column(tuple(forms), np.where(row < 0, -1, form[row]), first[row], numbers)


def _numbers(words: list[str]) -> Array:
    """Return the numbers that words are, NaN for one that is none."""
    try:
        return np.array(list(map(float, words)))
    except ValueError:
        return np.array([float(word) if is_number(word) else np.nan for word in words])


def stiffnesses(cells: Sequence[object]) -> Column:
    """Return a column of stiffnesses: numbers, texts, and blanks or zeros for what is not given."""
    return _mixed(cells, texts(cells, may_be_thousands), numbers_too=True)


def combinations(cells: Sequence[object]) -> Column:
    """Return a column of combinations: texts, and blanks or zeros for what is not given."""
    return _mixed(cells, texts(cells, signed=False), numbers_too=False)


def _mixed(cells: Sequence[object], column: Column, numbers_too: bool) -> Column:
    """Add to a column of texts the cells that are blank or 0, and those that are numbers."""
    form, first = column.form.copy(), column.first.copy()
    forms: list[Frozen] = [*column.forms, None, SLOT]
    sizes = np.array([cell if type(cell) in (float, int) else np.nan for cell in cells], dtype=float)
    blank = np.array([cell is None or (isinstance(cell, str) and not cell.strip()) for cell in cells])
    form[blank | (sizes == 0.0)] = len(forms) - 2
    if numbers_too:
        given = np.isfinite(sizes) & (sizes != 0.0)
        form[given] = len(forms) - 1
        first[given] = len(column.numbers) + np.flatnonzero(given)
    return Column(tuple(forms), form, first, np.concatenate([column.numbers, sizes]))


def same(value: Frozen, rows: int) -> Column:
    """Return a column that has one value in every row, none of its numbers being a slot."""
    zeros = np.zeros(rows, dtype=np.intp)
    form = zeros - 1 if isinstance(value, str) and _PRIVATE.search(value) else zeros
    return Column((value,), form, zeros, np.zeros(0))
