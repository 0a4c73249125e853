"""The links of a workbook of the Excel kind to other files, read from its file: the office forgets their order."""

from __future__ import annotations

import posixpath
import re
import zipfile
from html import unescape
from typing import Dict, Iterator, Set
from urllib.parse import unquote

_WORKBOOK = "xl/workbook.xml"
_LINK = re.compile(rb"<(?:[\w.-]+:)?externalReference\b[^<>]*>")
_RELATION = re.compile(rb"<(?:[\w.-]+:)?Relationship\b[^<>]*>")
_ATTRIBUTE = re.compile(rb"""(?:[\w.-]+:)?([\w.-]+)\s*=\s*(?:"([^"]*)"|'([^']*)')""")
_LARGEST = 10_000_000
"""The most bytes of a part that is read."""


def links_to(path: str, file: str) -> Set[int]:
    """Return the numbers, as formulas give them in brackets, of the links to a file of this name in any folder.

    Where the workbook cannot be read there are none. No other file is opened.
    """
    try:
        with zipfile.ZipFile(path) as archive:
            targets = list(_targets(archive))
    except (OSError, ValueError, KeyError, NotImplementedError, RuntimeError, zipfile.BadZipFile):
        return set()
    return {number for number, target in enumerate(targets, 1) if _name(target) == file.lower()}


def _targets(archive: zipfile.ZipFile) -> Iterator[str]:
    """Yield what each link leads to, in their order; a blank where that is not said."""
    related = _relations(archive, _WORKBOOK)
    for link in _LINK.findall(_read(archive, _WORKBOOK)):
        part = posixpath.join(posixpath.dirname(_WORKBOOK), related[_attributes(link)["id"]]).lstrip("/")
        yield next(iter(_relations(archive, part).values()), "")


def _relations(archive: zipfile.ZipFile, part: str) -> Dict[str, str]:
    """Return the targets of a part's relations by their ids."""
    folder, name = posixpath.split(part)
    listed = _read(archive, "{}/_rels/{}.rels".format(folder, name))
    relations = map(_attributes, _RELATION.findall(listed))
    return {relation["Id"]: relation["Target"] for relation in relations}


def _attributes(tag: bytes) -> Dict[str, str]:
    return {name.decode(): unescape((one or other).decode()) for name, one, other in _ATTRIBUTE.findall(tag)}


def _read(archive: zipfile.ZipFile, part: str) -> bytes:
    if archive.getinfo(part).file_size > _LARGEST:
        raise ValueError("{}: too large".format(part))
    return archive.read(part)


def _name(target: str) -> str:
    return unquote(target).replace("\\", "/").rpartition("/")[2].lower()
