"""Workbooks computed without being written: what they store is compared with what comes out."""

from __future__ import annotations

import os
from collections.abc import Iterable, Iterator, Mapping
from concurrent.futures import BrokenExecutor, ProcessPoolExecutor
from dataclasses import dataclass, field
from pathlib import Path

from beamfuncs.hosts.headless.engine import Function
from beamfuncs.hosts.headless.filling import CellFault, Filling, NotFilled, catalogued, refusing
from beamfuncs.hosts.headless.package import Package
from beamfuncs.hosts.headless.splice import CellValue
from beamfuncs.hosts.headless.stored import Difference
from beamfuncs.hosts.headless.writing import is_no_input
from beamfuncs.trust import Trust

ENDINGS = {".xlsx", ".xlsm"}


@dataclass(frozen=True)
class StaleCell:
    """A beam cell, or one that builds on it, whose stored value is not what is computed; None is nothing."""

    sheet: str
    cell: str
    stored: CellValue
    computed: CellValue
    formula: str


@dataclass(frozen=True)
class Checked:
    """What was found in one workbook; `unread` says why nothing was."""

    book: Path
    unread: str = ""
    beam_cells: int = 0
    stale: list[StaleCell] = field(default_factory=list)
    errors: list[CellFault] = field(default_factory=list)
    differences: list[Difference] = field(default_factory=list)

    @property
    def passes(self) -> bool:
        return not (self.unread or self.stale or self.errors)


def workbooks(paths: Iterable[Path]) -> Iterator[Path]:
    """Yield each file once, and in place of a folder the workbooks in it and in its folders, in order of their names.

    A folder without workbooks stands for itself: to check it says so.
    """
    seen: set[Path] = set()
    for path in paths:
        for book in list(_inside(path)) or [path] if path.is_dir() else [path]:
            if book.absolute() not in seen:
                seen.add(book.absolute())
                yield book


def check(book: Path, trust: Trust = Trust.STORED, functions: Mapping[str, Function] | None = None) -> Checked:
    """Compute a workbook and compare; nothing is written, and what cannot be read is told, not raised."""
    try:
        if book.is_dir():
            raise NotFilled(f"{book}: there are no workbooks in this folder")
        with refusing(book):
            filling = Filling(Package.read(book), catalogued() if functions is None else functions)
            filling.evaluate(lambda done, of: None)
            filling.settle(trust)
            stale = [StaleCell(*one) for one in filling.stale()]
            return Checked(book, "", len(filling.beam_cells), stale, list(filling.faults()), filling.differences())
    except NotFilled as error:
        return Checked(book, str(error).removeprefix(f"{book}: "))


def check_all(books: Iterable[Path], trust: Trust = Trust.STORED, jobs: int = 1) -> Iterator[Checked]:
    """Check workbooks and yield what is found in the order of the books.

    As many as `jobs` are checked at a time, but no more than there are processors: more would only take memory.
    """
    books = list(books)
    workers = min(jobs, len(books), os.cpu_count() or 1)
    if workers <= 1:
        yield from (check(book, trust) for book in books)
        return
    pool = ProcessPoolExecutor(workers)
    try:
        waiting = [(book, pool.submit(check, book, trust)) for book in books]
        for book, future in waiting:
            try:
                yield future.result()
            except BrokenExecutor:
                yield Checked(book, "the process that checked it, or another, broke off")
    finally:
        pool.shutdown(cancel_futures=True)


def _inside(folder: Path) -> Iterator[Path]:
    for parent, folders, names in os.walk(folder):
        folders.sort()
        for name in sorted(names):
            if Path(name).suffix.lower() in ENDINGS and not is_no_input(Path(name)):
                yield Path(parent, name)
