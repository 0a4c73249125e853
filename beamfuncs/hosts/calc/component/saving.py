"""A saved workbook of the Excel kind in which the office's long names give way to plain ones.

The file is replaced whole or not at all, and keeps its time, so that the office takes it for the one that it saved.
"""

from __future__ import annotations

import os
import re
import secrets
import shutil
import zipfile
from contextlib import suppress
from typing import Callable, Dict, Iterable, Mapping

from .formulas import shortened

_BYTES = "utf-8", "surrogateescape"
_PARTS = re.compile(r"xl/(?:workbook\.xml|worksheets/[^/]+\.xml|tables/[^/]+\.xml)", re.IGNORECASE)
_FORMULA = re.compile(
    rb"<((?:[\w.-]+:)?(?:f|formula[12]?|definedName|calculatedColumnFormula|totalsRowFormula))\b[^<>]*(?<!/)>[^<]+(?=</\1>)"
)
_MACRO = re.compile(rb"""<definedName\b[^<>]*\sname="([^"]*)"[^<>]*(?:/>|>\s*</definedName>)""")
"""A macro of that name without content, which the office also lists for each function that is used."""
_NO_NAMES = re.compile(rb"<definedNames>\s*</definedNames>")


def plain_parts(parts: Iterable[str], read: Callable[[str], bytes], names: Mapping[str, str]) -> Dict[str, bytes]:
    """Return those parts of a workbook that change, with plain names in their formulas; `names` by long name."""
    short = shortened(names)
    changed = {}
    for part in parts:
        if _PARTS.fullmatch(part):
            content = read(part)
            plain = _FORMULA.sub(lambda found: short(found[0].decode(*_BYTES)).encode(*_BYTES), content)
            plain = _NO_NAMES.sub(b"", _MACRO.sub(lambda found: _kept(found, names), plain))
            if plain != content:
                changed[part] = plain
    return changed


def _kept(found: "re.Match[bytes]", names: Mapping[str, str]) -> bytes:
    return b"" if found[1].decode(*_BYTES).upper() in names else found[0]


def put_plain_names(path: str, names: Mapping[str, str]) -> bool:
    """Put plain names into a file that the office has just saved; return whether there were any long ones."""
    if not zipfile.is_zipfile(path):  # one with a password
        return False
    path = os.path.realpath(path)
    temporary = os.path.join(os.path.dirname(path), ".beamfuncs-{}.part".format(secrets.token_hex(4)))
    try:
        with zipfile.ZipFile(path) as archive:
            changed = plain_parts(archive.namelist(), archive.read, names)
            if not changed:
                return False
            with open(temporary, "xb", opener=_private) as stream:
                with zipfile.ZipFile(stream, "w", zipfile.ZIP_DEFLATED) as copy:
                    for member in archive.infolist():
                        content = changed.get(member.filename) or archive.read(member)
                        copy.writestr(member, content)
                stream.flush()
                os.fsync(stream.fileno())
        _like(temporary, path)
        os.replace(temporary, path)
    finally:
        with suppress(OSError):
            os.unlink(temporary)
    return True


def _private(path: str, flags: int) -> int:
    """Open a file that nobody else can read while it is written."""
    return os.open(path, flags, 0o600)


def _like(path: str, model: str) -> None:
    """Give a file the times, the permissions and, where that is allowed, the owner of another."""
    kept = os.stat(model)
    if hasattr(os, "chown"):
        with suppress(PermissionError):
            os.chown(path, kept.st_uid, kept.st_gid)
    shutil.copystat(model, path)
