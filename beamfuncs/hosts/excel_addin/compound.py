"""The streams in a compound file, as Microsoft's open specification MS-CFB lays them out.

A compound file is a small file system: sectors of equal size, a table that gives for each sector the one that
follows it, and a directory. Short streams share the sectors of one stream, in a finer division with its own table.
"""

from __future__ import annotations

import struct
from collections.abc import Sequence

SIGNATURE = bytes.fromhex("d0cf11e0a1b11ae1")
_SIGNS = 0xFFFFFFFA
"""From here up the number of a sector is none, but says that a chain ends or a sector is free."""
_ENTRY = 128
_STREAM, _ROOT = 2, 5


class Damaged(ValueError):
    """This is no compound file, or not a whole one."""


def streams(data: bytes) -> dict[str, bytes]:
    """Return the streams of a compound file by name, of whatever folder in it."""
    try:
        return _streams(data)
    except (struct.error, IndexError):
        raise Damaged("not a whole compound file") from None


def _streams(data: bytes) -> dict[str, bytes]:
    if data[:8] != SIGNATURE:
        raise Damaged("not a compound file")
    size_bits, small_bits = struct.unpack_from("<HH", data, 0x1E)
    (directory,) = struct.unpack_from("<I", data, 0x30)
    threshold, small_directory = struct.unpack_from("<II", data, 0x38)
    sectors = _cut(data, 1 << size_bits)[1:]
    parts = [one for one in struct.unpack_from("<109I", data, 0x4C) if one < _SIGNS]
    following = _numbers(b"".join(sectors[one] for one in parts))
    entries = [_entry(one) for one in _cut(_chain(directory, following, sectors), _ENTRY)]
    shared = b"".join(_chain(first, following, sectors) for _, kind, first, _ in entries if kind == _ROOT)
    small_sectors = _cut(shared, 1 << small_bits)
    small_following = _numbers(_chain(small_directory, following, sectors))
    return {
        name: (
            _chain(first, small_following, small_sectors) if length < threshold else _chain(first, following, sectors)
        )[:length]
        for name, kind, first, length in entries
        if kind == _STREAM
    }


def _entry(data: bytes) -> tuple[str, int, int, int]:
    """Return name, kind, first sector and length from an entry of the directory."""
    name_length, kind = struct.unpack_from("<HB", data, 64)
    first, length = struct.unpack_from("<II", data, 116)
    return data[: max(name_length - 2, 0)].decode("utf-16-le", "replace"), kind, first, length


def _cut(data: bytes, size: int) -> list[bytes]:
    return [data[at : at + size] for at in range(0, len(data), size)]


def _numbers(data: bytes) -> Sequence[int]:
    return struct.unpack(f"<{len(data) // 4}I", data[: len(data) // 4 * 4])


def _chain(first: int, following: Sequence[int], sectors: list[bytes]) -> bytes:
    """Return the sectors that follow one another, in one piece."""
    found: list[bytes] = []
    while first < _SIGNS:
        found.append(sectors[first])
        first = following[first]
        if len(found) > len(sectors):
            raise Damaged("a chain of sectors has no end")
    return b"".join(found)
