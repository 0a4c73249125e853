"""The engine's copy of a workbook, in the one spelling of packages that the engine reads.

The names of parts differ in case from program to program, and a strict workbook names its vocabularies
otherwise. Both are respelt here; the workbook itself keeps its own.
"""

from __future__ import annotations

import io
import posixpath
import re
import zipfile
from collections.abc import Mapping

CONTENT_TYPES = "[Content_Types].xml"
_USUAL = {
    b"http://purl.oclc.org/ooxml/spreadsheetml/main": b"http://schemas.openxmlformats.org/spreadsheetml/2006/main",
    b"http://purl.oclc.org/ooxml/officeDocument/relationships": (
        b"http://schemas.openxmlformats.org/officeDocument/2006/relationships"
    ),
}
"""The vocabularies of strict workbooks, and what others call them."""

_STRICT = re.compile(b"|".join(map(re.escape, _USUAL)))
_TARGET = re.compile(rb"""\bTarget\s*=\s*["']([^"'&]*)["']""")


def packed(parts: Mapping[str, bytes]) -> bytes:
    """Return the bytes of a package with these parts, for the engine."""
    names = {name.casefold(): name for name in (CONTENT_TYPES, *_related(parts))}
    stream = io.BytesIO()
    with zipfile.ZipFile(stream, "w") as package:
        for name, content in parts.items():
            usual = content
            if name.endswith((".xml", ".rels")):
                usual = _STRICT.sub(lambda found: _USUAL[found[0]], content)
            package.writestr(names.get(name.casefold(), name), usual)
    return stream.getvalue()


def _related(parts: Mapping[str, bytes]) -> list[str]:
    """Return the names of parts as the parts that refer to them spell them."""
    names = []
    for listed, content in parts.items():
        folder, name = posixpath.split(listed)
        if name.endswith(".rels") and posixpath.basename(folder) == "_rels":
            base = posixpath.join("/", posixpath.dirname(folder))
            for target in _TARGET.findall(content):
                spelt = posixpath.normpath(posixpath.join(base, target.decode(errors="replace")))
                names.append(spelt.lstrip("/"))
    return names
