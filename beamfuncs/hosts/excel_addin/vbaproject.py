"""The VBA modules in a workbook, read without running anything.

A workbook keeps its macros in `xl/vbaProject.bin`, a compound file with a stream for each module: its compiled form,
and behind it the source, compressed as Microsoft's open specification MS-OVBA says in section 2.4.1.
"""

from __future__ import annotations

import re
from pathlib import Path
from zipfile import BadZipFile, ZipFile

from beamfuncs.hosts.excel_addin.compound import Damaged, streams

PART = "xl/vbaProject.bin"
LARGEST = 32 << 20
"""A larger project is not read: a hundred times what an add-in with functions needs."""
_START = re.compile(rb"\x01.[\xb0-\xbf]\0Attribut", re.DOTALL)
"""How every compressed source begins: a sign, the head of a chunk, and eight characters that repeat nothing."""


class NotRead(ValueError):
    """The file holds no VBA that can be read; the message says why in one line."""


def modules(workbook: Path) -> dict[str, str]:
    """Return the source of each VBA module in a workbook by its name; OSError where the file cannot be opened."""
    try:
        with ZipFile(workbook) as archive:
            if archive.getinfo(PART).file_size > LARGEST:
                raise NotRead(f"{workbook}: its VBA project is larger than {LARGEST >> 20} MB")
            project = streams(archive.read(PART))
        starts = {name: [found.start() for found in _START.finditer(stream)] for name, stream in project.items()}
        return {name: _source(project[name][found[-1] :]) for name, found in starts.items() if found}
    except KeyError:
        raise NotRead(f"{workbook}: holds no VBA project") from None
    except BadZipFile:
        raise NotRead(f"{workbook}: is not a workbook with macros (.xlam, .xlsm)") from None
    except (Damaged, IndexError, EOFError, NotImplementedError, RuntimeError):
        raise NotRead(f"{workbook}: its VBA project is damaged") from None


def constant(source: str, name: str) -> str | None:
    """Return the text that a VBA source gives to a public constant.

    >>> constant('Public Const XLWINGS_VERSION As String = "0.1.2"', "XLWINGS_VERSION")
    '0.1.2'
    """
    found = re.search(rf'^\s*Public Const {name} As String = "([^"]*)"', source, re.MULTILINE | re.IGNORECASE)
    return found[1] if found else None


def declarations(source: str) -> dict[str, str]:
    """Return how each public function of a VBA source is declared, however the editor spaced and cased it.

    >>> declarations("Public Function Reaction(Beam,  Optional Span As Variant) As Variant")
    {'reaction': 'beam,optionalspanasvariant'}
    """
    found = re.findall(r"^[ \t]*Public Function (\w+)[ \t]*\((.*)\)", source, re.MULTILINE | re.IGNORECASE)
    return {name.casefold(): re.sub(r"\s+", "", arguments).casefold() for name, arguments in found}


def _source(container: bytes) -> str:
    """Undo the compression: chunks in which a byte of flags tells eight characters from copies of earlier ones."""
    out = bytearray()
    at = 1
    while at + 2 <= len(container):
        header = int.from_bytes(container[at : at + 2], "little")
        end = min(at + (header & 0xFFF) + 3, len(container))
        _append_chunk(out, container[at + 2 : end], compressed=bool(header & 0x8000))
        at = end
    return out.decode("latin-1")


def _append_chunk(out: bytearray, chunk: bytes, compressed: bool) -> None:
    if not compressed:
        out += chunk
        return
    start, at = len(out), 0
    while at < len(chunk):
        flags = chunk[at]
        at += 1
        for bit in range(8):
            if at >= len(chunk):
                return
            if not flags >> bit & 1:
                out.append(chunk[at])
                at += 1
                continue
            token = int.from_bytes(chunk[at : at + 2], "little")
            at += 2
            length_bits = 16 - max((len(out) - start - 1).bit_length(), 4)
            back = (token >> length_bits) + 1
            for _ in range((token & (1 << length_bits) - 1) + 3):
                out.append(out[-back])
