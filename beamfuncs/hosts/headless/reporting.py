"""A report of a filled workbook's beam cells: a table for a spreadsheet, data for a script, or a page to print."""

from __future__ import annotations

import csv
import io
import json
from collections.abc import Callable, Mapping
from dataclasses import dataclass
from datetime import date
from pathlib import Path
from typing import TYPE_CHECKING, TypeAlias

from beamfuncs.errors import ErrorValue
from beamfuncs.hosts.headless import writing
from beamfuncs.hosts.headless.engine import Function
from beamfuncs.hosts.headless.understanding import Reader, Understood

if TYPE_CHECKING:
    from beamfuncs.hosts.headless.filling import ListedCell, Report

Progress: TypeAlias = Callable[[int, int], None]

LISTED_VALUES = 4
"""Of an array of more values only the range is told."""
LISTED_FAULTS = 3
BETWEEN = " | "
COLUMNS = ("sheet", "cell", "formula", "value", "error", "reason", "beam", "loads", "combination")
_BEGINS_A_FORMULA = ("=", "+", "-", "@", "\t", "\r", "\n")


@dataclass(frozen=True)
class Listing:
    """What a report is about: the workbook, what was done with it, and every beam cell."""

    source: Path
    done: Report
    cells: list[ListedCell]
    functions: Mapping[str, Function]

    def understood(self, reader: Reader, cell: ListedCell) -> list[Understood]:
        """Return what the calls of a cell understood, each different thing once."""
        found = (reader.understood(call) for call in cell.calls)
        return list(dict.fromkeys(one for one in found if one.beam or one.loads))


def write(path: Path, listing: Listing, progress: Progress = lambda done, of: None) -> None:
    """Write a report in the form that the ending of `path` names; it appears complete or not at all."""
    text = FORMS[path.suffix.lower()](listing, progress)
    writing.replace(path, iter([text.encode("utf-8", "replace")]))


# --- what the forms share -------------------------------------------------------------------------


def single(cell: ListedCell) -> bool:
    """Whether a cell is no array of several."""
    return len(cell.values) == 1 and len(cell.values[0]) == 1


def in_words(cell: ListedCell) -> str:
    """Return the values of an array in a few words."""
    values = [value for row in cell.values for value in row]
    numbers = [value for value in values if isinstance(value, float) and not isinstance(value, bool)]
    if len(values) <= LISTED_VALUES:
        return "; ".join(
            str(value) if isinstance(value, str) else f"{value:.12g}" for value in values if value is not None
        )
    size = f"{len(cell.values)} by {len(cell.values[0])}"
    told = [f"{len(numbers)} numbers from {min(numbers):.6g} to {max(numbers):.6g}"] if numbers else []
    texts = len(values) - len(numbers) - len(cell.faults)
    told += [f"{texts} other values"] if texts else []
    told += [f"{len(cell.faults)} in error"] if cell.faults else []
    return f"{size}: {', '.join(told)}"


def error(cell: ListedCell) -> str:
    """Return the error value of a cell, of an array the first; blank text where there is none."""
    return cell.faults[0].value if cell.faults else ""


def reason(cell: ListedCell) -> str:
    """Return why a cell is in error, of an array which of its cells and why."""
    if single(cell):
        return cell.faults[0].reason if cell.faults else ""
    told = [f"{fault.cell}: {fault.value} {fault.reason}" for fault in cell.faults[:LISTED_FAULTS]]
    more = len(cell.faults) - len(told)
    return "; ".join(told) + (f"; and {more} more" if more else "")


# --- a table for a spreadsheet --------------------------------------------------------------------


def _csv(listing: Listing, progress: Progress) -> str:
    """Return the rows of a table, after a byte order mark by which spreadsheets know UTF-8.

    A text that would begin a formula there is told with an apostrophe before it; numbers are plain.
    """
    reader = Reader(listing.functions)
    stream = io.StringIO()
    writer = csv.writer(stream)
    writer.writerow(COLUMNS)
    for done, cell in enumerate(listing.cells, 1):
        understood = listing.understood(reader, cell)
        value = cell.values[0][0] if single(cell) else in_words(cell)
        texts = [
            error(cell),
            reason(cell),
            BETWEEN.join(dict.fromkeys(one.beam for one in understood)),
            BETWEEN.join(dict.fromkeys(one.loads for one in understood if one.loads)),
            BETWEEN.join(dict.fromkeys(one.combination for one in understood if one.combination)),
        ]
        before = map(_harmless, (cell.sheet, cell.cells, cell.formula))
        writer.writerow([*before, _in_csv(value), *map(_harmless, texts)])
        progress(done, len(listing.cells))
    return f"\ufeff{stream.getvalue()}"


def _in_csv(value: object) -> object:
    if isinstance(value, ErrorValue):
        return ""
    if isinstance(value, bool):
        return str(value).upper()
    return _harmless(value) if isinstance(value, str) else value


def _harmless(text: str) -> str:
    """Return a text that no spreadsheet takes for a formula.

    >>> _harmless("=1+1"), _harmless("fixed 8 pinned")
    ("'=1+1", 'fixed 8 pinned')
    """
    return f"'{text}" if text.startswith(_BEGINS_A_FORMULA) else text


# --- data for a script ----------------------------------------------------------------------------


def _json(listing: Listing, progress: Progress) -> str:
    """Return a list of objects, numbers as numbers; an array's values are a list of rows, an error in it is null."""
    reader = Reader(listing.functions)
    rows = []
    for done, cell in enumerate(listing.cells, 1):
        values = [[None if isinstance(value, ErrorValue) else value for value in row] for row in cell.values]
        calls = zip(cell.calls, map(reader.understood, cell.calls), strict=True)
        rows.append(
            {
                "sheet": cell.sheet,
                "cell": cell.cells,
                "formula": cell.formula,
                "value": values[0][0] if single(cell) else values,
                "error": error(cell) or None,
                "reason": reason(cell) or None,
                "calls": [
                    {"function": call.function, "beam": one.beam, "loads": one.loads, "combination": one.combination}
                    for call, one in calls
                ],
            }
        )
        progress(done, len(listing.cells))
    return json.dumps(rows, indent=1, ensure_ascii=False, allow_nan=False) + "\n"


def _html(listing: Listing, progress: Progress) -> str:
    from beamfuncs.hosts.headless.page import page

    return page(listing, date.today(), progress)


FORMS: dict[str, Callable[[Listing, Progress], str]] = {".csv": _csv, ".json": _json, ".html": _html}
"""How a report is written, by the ending of its file."""
