"""How the parts of a package are joined: relations between them, and the types of their contents.

A relation or a type is spliced in or out; every other byte of these parts stays as it was.
"""

from __future__ import annotations

import posixpath
import re
from collections.abc import Mapping
from html import escape, unescape
from typing import NamedTuple

from beamfuncs.hosts.headless.package import CONTENT_TYPES, NotAWorkbook

RELATIONSHIPS = "http://schemas.openxmlformats.org/package/2006/relationships"
DECLARATION = '<?xml version="1.0" encoding="UTF-8" standalone="yes"?>\n'
_RELATION = re.compile(rb"<(?:[\w.-]+:)?Relationship\b[^>]*?(?:/>|>\s*</(?:[\w.-]+:)?Relationship\s*>)")
_DECLARED = re.compile(rb"<(?:[\w.-]+:)?(?:Override|Default)\b[^>]*?(?:/>|>\s*</(?:[\w.-]+:)?(?:Override|Default)\s*>)")
_ATTRIBUTE = re.compile(r"""([\w.:-]+)\s*=\s*(?:"([^"]*)"|'([^']*)')""")
_ROOT = re.compile(rb"""<([\w.-]+:)?(?:Relationships|Types)\b[^>]*>""")


class Relation(NamedTuple):
    """A relation of a part: its id, the last word of its kind, and the name of the part it leads to."""

    id: str
    kind: str
    target: str


class Wiring:
    """The relations and content types of a package's parts, and the parts changed or added on the way."""

    def __init__(self, parts: Mapping[str, bytes]) -> None:
        self._parts = parts
        self.changed: dict[str, bytes | None] = {}

    def part(self, name: str) -> bytes | None:
        """Return a part as it stands now, None where there is none."""
        return self.changed[name] if name in self.changed else self._parts.get(name)

    def names(self) -> list[str]:
        """Return the names of all parts."""
        return list(dict.fromkeys((*self._parts, *self.changed)))

    def free_name(self, pattern: str) -> str:
        """Return the first name of a pattern such as `xl/comments{}.xml` that no part has, in any case of letters."""
        taken = {name.casefold() for name in self.names()}
        numbers = iter(range(1, len(taken) + 2))
        return next(name for n in numbers if (name := pattern.format(n)).casefold() not in taken)

    def relations(self, part: str) -> list[Relation]:
        """Return the relations of a part to other parts of the package."""
        folder = posixpath.dirname(part)
        found = []
        for element in _RELATION.findall(self.part(_listed(part)) or b""):
            attributes = _attributes(element)
            if attributes.get("TargetMode") != "External":
                target = posixpath.normpath(posixpath.join("/", folder, attributes.get("Target", ""))).lstrip("/")
                found.append(Relation(attributes.get("Id", ""), attributes.get("Type", "").rpartition("/")[2], target))
        return found

    def relate(self, part: str, kind: str, target: str) -> str:
        """Add a relation from a part to another, and return its id; `kind` is its full name."""
        listed = _listed(part)
        xml = self.part(listed) or f'{DECLARATION}<Relationships xmlns="{RELATIONSHIPS}"/>'.encode()
        taken = {_attributes(element).get("Id") for element in _RELATION.findall(xml)}
        new_id = next(name for n in range(1, len(taken) + 2) if (name := f"rId{n}") not in taken)
        path = posixpath.relpath(target, posixpath.dirname(part))
        self.changed[listed] = _appended(xml, "Relationship", Id=new_id, Type=kind, Target=path)
        return new_id

    def declare(self, part: str, content_type: str) -> None:
        """Say what a new part contains."""
        xml = self.part(CONTENT_TYPES) or b""
        self.changed[CONTENT_TYPES] = _appended(xml, "Override", PartName=f"/{part}", ContentType=content_type)

    def declare_ending(self, ending: str, content_type: str) -> None:
        """Say what the parts with some ending contain, unless that is said already."""
        xml = self.part(CONTENT_TYPES) or b""
        known = {_attributes(element).get("Extension", "").casefold() for element in _DECLARED.findall(xml)}
        if ending not in known:
            self.changed[CONTENT_TYPES] = _appended(xml, "Default", Extension=ending, ContentType=content_type)

    def drop(self, part: str, of: str) -> None:
        """Leave out a part to which `of` is related."""
        ids = {relation.id for relation in self.relations(of) if relation.target == part}
        listed = _listed(of)
        self.changed[listed] = _RELATION.sub(
            lambda found: b"" if _attributes(found[0]).get("Id") in ids else found[0], self.part(listed) or b""
        )
        self.changed[CONTENT_TYPES] = _DECLARED.sub(
            lambda found: b"" if _attributes(found[0]).get("PartName") == f"/{part}" else found[0],
            self.part(CONTENT_TYPES) or b"",
        )
        self.changed[part] = None


def _listed(part: str) -> str:
    """Return the name of the part that lists the relations of a part."""
    folder, name = posixpath.split(part)
    return posixpath.join(folder, "_rels", f"{name}.rels")


def _attributes(element: bytes) -> dict[str, str]:
    return {name: unescape(a or b) for name, a, b in _ATTRIBUTE.findall(element.decode("utf-8", "replace"))}


def _appended(xml: bytes, tag: str, **attributes: str) -> bytes:
    """Return a list of relations or types with one more."""
    root = _ROOT.search(xml)
    if root is None:
        raise NotAWorkbook("a list of relations or types has no beginning")
    prefix = root[1] or b""
    words = "".join(f' {name}="{escape(value)}"' for name, value in attributes.items())
    new = b"<" + prefix + f"{tag}{words}/>".encode()
    if root[0].endswith(b"/>"):
        name = root[0][1:].split()[0].rstrip(b"/>")
        opened = root[0][:-2].rstrip() + b">"
        return xml[: root.start()] + opened + new + b"</" + name + b">" + xml[root.end() :]
    end = xml.rindex(b"</")
    return xml[:end] + new + xml[end:]
