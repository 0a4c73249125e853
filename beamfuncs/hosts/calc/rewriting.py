"""Workbooks that Calc saved, rewritten: plain names in the Excel kind, values in place of beam formulas in an .ods."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from pathlib import Path

from beamfuncs.catalogue import catalogue
from beamfuncs.hosts.calc import freezing
from beamfuncs.hosts.calc.component import saving
from beamfuncs.hosts.calc.naming import long_name
from beamfuncs.hosts.headless import writing
from beamfuncs.hosts.headless.archive import Archive, NotAWorkbook

_WORKBOOK, _CONTENT = "xl/workbook.xml", "content.xml"


class NotRewritten(Exception):
    """Nothing was written; the message says why in one line."""


def plain(book: Path) -> bool:
    """Give a workbook of the Excel kind plain names in place of Calc's long ones; tell whether it had any."""
    names = {long_name(name): name for name in catalogue()}

    def changed(archive: Archive) -> Mapping[str, bytes]:
        if _WORKBOOK not in archive:
            raise NotRewritten(f"{book}: no workbook of the Excel kind")
        return saving.plain_parts(archive, archive.__getitem__, names)

    return _rewritten(book, book, changed) > 0


def freeze(book: Path, out: Path | None = None) -> tuple[Path, int]:
    """Write a copy of an .ods whose beam formulas have given way to their values; return where, and how many did."""
    count = 0

    def changed(archive: Archive) -> Mapping[str, bytes]:
        nonlocal count
        if _CONTENT not in archive or _WORKBOOK in archive:
            raise NotRewritten(f"{book}: no .ods; for the Excel kind there is `beamfuncs freeze`")
        content, count = freezing.frozen(archive[_CONTENT])
        return {_CONTENT: content}

    target = out or book.with_name(f"{book.stem}.frozen{book.suffix}")
    if target.exists() and target.samefile(book):
        raise NotRewritten(f"{target}: is the workbook itself")
    _rewritten(book, target, changed)
    return target, count


def _rewritten(book: Path, target: Path, changed: Callable[[Archive], Mapping[str, bytes]]) -> int:
    """Write a workbook with other contents of some of its parts; return of how many."""
    if not book.is_file():
        raise NotRewritten(f"{book}: {'is a folder' if book.is_dir() else 'there is no such file'}")
    try:
        archive = Archive(book.read_bytes())
        contents = changed(archive)
        if contents or target != book:
            writing.replace(target, archive.with_contents(contents))
    except NotAWorkbook as error:
        raise NotRewritten(f"{book}: {error}") from None
    except (writing.NotWritten, OSError) as error:
        raise NotRewritten(str(error)) from None
    return len(contents)
