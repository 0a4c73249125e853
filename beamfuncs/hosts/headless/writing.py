"""Files that appear whole or not at all.

A file is written under a name of its own beside its target, brought to the disk and then renamed. What
a killed run leaves behind is called `.beamfuncs-` and eight letters, `.part`; it is never read, and the
next run in the folder takes away what is an hour old.
"""

from __future__ import annotations

import os
import re
import secrets
import stat
import time
from collections.abc import Callable, Iterable
from contextlib import suppress
from datetime import datetime
from itertools import count
from pathlib import Path

LEFT_OVER = re.compile(r"\.beamfuncs-[0-9a-f]{8}\.part")
DATED = re.compile(r".*\.\d{4}-\d\d-\d\dT\d\d-\d\d-\d\d(?:-\d+)?\.xls[xm]", re.IGNORECASE)
_OLD = 3600.0
"""After so many seconds what was left behind belongs to no run that is still at work."""
_LOCKS = ".~lock.{}#", "~${}"
"""What spreadsheet programs put beside a workbook that is open in them."""


class NotWritten(ValueError):
    """The file was not written; the message says why in one line."""


def is_no_input(path: Path) -> bool:
    """Return whether a file beside workbooks is none: left over, a lock, or a dated copy.

    >>> [is_no_input(Path(name)) for name in ("plan.xlsx", "~$plan.xlsx", "plan.2026-12-01T13-45-10.xlsx")]
    [False, True, True]
    """
    return path.name.startswith((".", "~$")) or bool(DATED.fullmatch(path.name))


def replace(target: Path, pieces: Iterable[bytes], ready: Callable[[], None] = lambda: None) -> None:
    """Write a file whole; `ready` is called when only the renaming is left to do.

    A file that stood there keeps its permissions, and a link stays a link. Raises `NotWritten` where
    the target is open in a spreadsheet program or must not be written, or an OSError that names the target.
    """
    target = Path(os.path.realpath(target))
    _refuse_to_overwrite(target)
    temporary = target.with_name(f".beamfuncs-{secrets.token_hex(4)}.part")
    try:
        _take_away_left_overs(target.parent)
        _write(temporary, pieces, target)
        ready()
        temporary.replace(target)
        _sync_folder(target.parent)
    except OSError as error:
        error.filename, error.filename2 = str(target), None
        raise
    finally:
        with suppress(OSError):
            temporary.unlink(missing_ok=True)


def keep_dated(original: Path, content: bytes) -> Path:
    """Write the content of a workbook beside it, under its name with the date and time, and return where.

    Nothing is overwritten: `plan.2026-12-01T13-45-10.xlsx`, or with `-2`, `-3` ... behind the seconds.
    """
    original = Path(os.path.realpath(original))
    dated = f"{original.stem}.{datetime.now():%Y-%m-%dT%H-%M-%S}"
    temporary = original.with_name(f".beamfuncs-{secrets.token_hex(4)}.part")
    try:
        _write(temporary, [content], original)
        for number in count(1):
            copy = original.with_name(f"{dated}{f'-{number}' if number > 1 else ''}{original.suffix}")
            with suppress(FileExistsError):
                _rename_to_new(temporary, copy)
                break
        _sync_folder(original.parent)
    except OSError as error:
        error.filename, error.filename2 = str(original), None
        raise
    finally:
        with suppress(OSError):
            temporary.unlink(missing_ok=True)
    return copy


def _refuse_to_overwrite(target: Path) -> None:
    for lock in _LOCKS:
        if target.with_name(lock.format(target.name)).exists():
            lock_name = lock.format(target.name)
            raise NotWritten(f"{target}: is open in a spreadsheet program; close it (or delete a stale {lock_name})")
    if target.exists() and not os.access(target, os.W_OK):
        raise NotWritten(f"{target}: must not be written to")


def _write(path: Path, pieces: Iterable[bytes], model: Path) -> None:
    """Write a new file to the disk, with the permissions and, where allowed, the owner of a model."""
    with path.open("xb") as stream:
        with suppress(FileNotFoundError):
            kept = model.stat()
            if hasattr(os, "fchown"):
                with suppress(PermissionError):
                    os.fchown(stream.fileno(), kept.st_uid, kept.st_gid)
            path.chmod(stat.S_IMODE(kept.st_mode))
        for piece in pieces:
            stream.write(piece)
        stream.flush()
        os.fsync(stream.fileno())


def _rename_to_new(path: Path, new: Path) -> None:
    """Rename a file, or raise FileExistsError where the new name is taken."""
    try:
        os.link(path, new)
    except FileExistsError:
        raise
    except OSError as error:  # a file system without links
        if new.exists():
            raise FileExistsError from error
        path.rename(new)


def _sync_folder(folder: Path) -> None:
    if os.name == "posix":
        with suppress(OSError):  # the file is in place; some file systems cannot sync a folder
            handle = os.open(folder, os.O_RDONLY)
            try:
                os.fsync(handle)
            finally:
                os.close(handle)


def _take_away_left_overs(folder: Path) -> None:
    with os.scandir(folder) as entries:
        for entry in entries:
            if LEFT_OVER.fullmatch(entry.name):
                with suppress(OSError):
                    if time.time() - entry.stat().st_mtime > _OLD:
                        os.unlink(entry.path)
