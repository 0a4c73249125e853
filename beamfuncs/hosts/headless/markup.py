"""XML parts as UTF-8, whatever encoding they are written in, and back; and as trees.

No document type is accepted: none stands in a workbook, and with it go entities, external or nested.
"""

from __future__ import annotations

import re
from typing import NamedTuple
from xml.etree import ElementTree

from beamfuncs.hosts.headless.archive import NotAWorkbook

_MARKS = {b"\xef\xbb\xbf": "utf-8", b"\xff\xfe": "utf-16-le", b"\xfe\xff": "utf-16-be"}
_BARE_UTF16 = {b"<\0": "utf-16-le", b"\0<": "utf-16-be"}
_SINGLE_BYTES = {"us-ascii": "ascii", "iso-8859-1": "iso-8859-1", "windows-1252": "cp1252"}
_DECLARED = re.compile(r"""(<\?xml\s[^>]*?\bencoding\s*=\s*["'])([\w.-]+)""")
_PROLOG = re.compile(rb"(?:\s|<\?.*?\?>|<!--.*?-->)*", re.DOTALL)
_LONGEST_DECLARATION = 1000
_CODED = re.compile("_x([0-9A-Fa-f]{4})_")


class Encoding(NamedTuple):
    """How a part is written: its mark of byte order, its codec, and the encoding that it declares."""

    mark: bytes = b""
    codec: str = "utf-8"
    declared: str = ""


def plain(xml: bytes) -> tuple[bytes, Encoding]:
    """Return a part in UTF-8 and how it was written; refuse one with a document type.

    >>> plain("<?xml version='1.0' encoding='UTF-16'?><a>ö</a>".encode("utf-16-le"))[0].decode()
    "<?xml version='1.0' encoding='UTF-8'?><a>ö</a>"
    """
    encoding = _encoding(xml)
    if encoding.codec != "utf-8":
        try:
            text = xml[len(encoding.mark) :].decode(encoding.codec)
            new = _DECLARED.sub(r"\1UTF-8", text, count=1).encode()
        except UnicodeError as error:
            raise NotAWorkbook(f"it is not written in {encoding.declared or encoding.codec}, as it says") from error
        if written(new, encoding) != xml:
            raise NotAWorkbook(f"its {encoding.declared or encoding.codec} cannot be kept")
        xml = new
    elif encoding.mark:
        xml = xml[len(encoding.mark) :]
    prolog = _PROLOG.match(xml)
    if prolog and xml.startswith(b"<!", prolog.end()):
        raise NotAWorkbook("it declares a document type, which no workbook does")
    return xml, encoding


def written(xml: bytes, encoding: Encoding) -> bytes:
    """Return a part as it was written before `plain`; a character that its encoding lacks becomes a reference."""
    if encoding.codec == "utf-8":
        return encoding.mark + xml
    text = xml.decode()
    if encoding.declared:
        text = _DECLARED.sub(lambda found: found[1] + encoding.declared, text, count=1)
    return encoding.mark + text.encode(encoding.codec, "xmlcharrefreplace")


def tree(xml: bytes) -> ElementTree.Element:
    """Return the root of a part that `plain` returned."""
    return ElementTree.fromstring(xml)


def _encoding(xml: bytes) -> Encoding:
    mark = next((mark for mark in _MARKS if xml.startswith(mark)), b"")
    wide = _MARKS.get(mark) or _BARE_UTF16.get(xml[:2], "")
    head = xml[len(mark) : _LONGEST_DECLARATION].decode(wide or "latin-1", "replace")
    found = _DECLARED.match(head)
    declared = found[2] if found else ""
    name = declared.casefold()
    if wide.startswith("utf-16") and name in {"", "utf-16", "utf-16le", "utf-16be"}:
        return Encoding(mark, wide, declared)
    if not wide.startswith("utf-16") and name in {"", "utf-8"}:
        return Encoding(mark, "utf-8", declared)
    if not wide and name in _SINGLE_BYTES:
        return Encoding(mark, _SINGLE_BYTES[name], declared)
    raise NotAWorkbook(f"it is written in {declared}, which cannot be read here")


def decoded(text: str) -> str:
    """Return a text of a workbook with its coded characters, such as `_x000A_`, as they are.

    >>> decoded("a_x0041__x005F_x0041_")
    'aA_x0041_'
    """
    return _CODED.sub(lambda found: chr(int(found[1], 16)), text) if "_x" in text else text
