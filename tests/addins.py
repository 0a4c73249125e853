"""Add-in files made up for tests: a workbook with nothing but VBA modules of given sources."""

from __future__ import annotations

import struct
from collections.abc import Mapping
from pathlib import Path
from zipfile import ZipFile

SECTOR = 512
SHORT = 4096
"""Streams below this length would go into the stream that short ones share; here none is as short."""
FREE, END, TABLE = 0xFFFFFFFF, 0xFFFFFFFE, 0xFFFFFFFD
ROOT, STREAM = 5, 2


def build_addin(path: Path, modules: Mapping[str, str]) -> Path:
    """Write a workbook that holds these modules, and nothing that a spreadsheet program could show."""
    path.parent.mkdir(parents=True, exist_ok=True)
    with ZipFile(path, "w") as archive:
        archive.writestr("xl/vbaProject.bin", compound({name: _stream(source) for name, source in modules.items()}))
    return path


def _stream(source: str) -> bytes:
    """A module as VBA stores it: something compiled, and the source compressed (here with no copies in it)."""
    padded = source + "' \r\n" * ((SHORT - len(source)) // 4 + 1)
    data = padded.encode("latin-1")
    out = bytearray(b"compiled, with what looks like a source: \x01\x00\xb0\0Attribut\x01")
    for at in range(0, len(data), 3600):
        piece = data[at : at + 3600]
        chunk = b"".join(b"\0" + piece[i : i + 8] for i in range(0, len(piece), 8))
        out += struct.pack("<H", 0xB000 | len(chunk) - 1) + chunk
    return bytes(out)


def compound(streams: Mapping[str, bytes]) -> bytes:
    """A compound file (MS-CFB, version 3) whose root holds these streams."""
    assert all(len(data) >= SHORT for data in streams.values())
    names = sorted(streams, key=lambda name: (len(name), name.upper()))
    sectors: list[bytes] = []
    following: list[int] = []

    def add(data: bytes) -> int:
        first, count = len(sectors), -(-len(data) // SECTOR)
        sectors.extend(data[i * SECTOR : (i + 1) * SECTOR].ljust(SECTOR, b"\0") for i in range(count))
        following.extend([*range(first + 1, first + count), END])
        return first

    starts = {name: add(streams[name]) for name in names}
    entries = [_entry("Root Entry", ROOT, END, 0, child=1)]
    for number, name in enumerate(names, 2):
        right = number if number <= len(names) else FREE
        entries.append(_entry(name, STREAM, starts[name], len(streams[name]), right=right))
    directory = add(b"".join(entries))
    tables = -(-(len(following) + 8) // (SECTOR // 4))
    first_table = len(sectors)
    following += [TABLE] * tables
    following += [FREE] * (tables * SECTOR // 4 - len(following))
    sectors += [struct.pack(f"<{SECTOR // 4}I", *following[i * 128 : (i + 1) * 128]) for i in range(tables)]
    head = bytes.fromhex("d0cf11e0a1b11ae1") + bytes(16) + struct.pack("<HHHHH6x", 0x3E, 3, 0xFFFE, 9, 6)
    numbers = 0, tables, directory, 0, SHORT, END, 0, END, 0
    places = [*range(first_table, first_table + tables), *[FREE] * (109 - tables)]
    return head + struct.pack("<9I109I", *numbers, *places) + b"".join(sectors)


def _entry(name: str, kind: int, first: int, length: int, right: int = FREE, child: int = FREE) -> bytes:
    text = (name + "\0").encode("utf-16-le")
    return struct.pack("<64sHBBIII16x4x16xII4x", text, len(text), kind, 1, FREE, right, child, first, length)
