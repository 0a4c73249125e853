"""The members of a zip file: unpacked within bounds, and copied as they lie where their content stays.

A member whose content changes is packed anew, with its own name, date and attributes. All others keep
their packed bytes, flags, extra fields, comments, order and gaps, zip64 records included.
"""

from __future__ import annotations

import struct
import zlib
from collections.abc import Iterator, Mapping
from typing import NamedTuple

MOST_BYTES = 512 << 20
"""A file, and all that is unpacked from it, may be this large."""
TIGHTEST = 200
"""A member may be this many times as large as its packed bytes ..."""
SMALL = 10 << 20
"""... but may be packed as tightly as it likes up to this size."""
MOST_MEMBERS = 65_535

STORED, DEFLATED = 0, 8
_ENCRYPTED, _SIZES_FOLLOW, _NAME_IN_UTF8 = 0x1, 0x8, 0x800
_IN_ZIP64, _IN_ZIP64_SHORT, _ZIP64 = 0xFFFFFFFF, 0xFFFF, 1

_LOCAL = struct.Struct("<4s5H3L2H")
_CENTRAL = struct.Struct("<4s6H3L5H2L")
_END = struct.Struct("<4s4H2LH")
_END64 = struct.Struct("<4sQ2H2L4Q")
_LOCATOR = struct.Struct("<4sLQL")
_LOCAL_MARK, _CENTRAL_MARK, _END_MARK = b"PK\3\4", b"PK\1\2", b"PK\5\6"
_END64_MARK, _LOCATOR_MARK = b"PK\6\6", b"PK\6\7"
_LONGEST_COMMENT = 0xFFFF
_VERSION = 20
_FIRST_DAY = 0x21
"""1 January 1980, the date of members that are added: the same input gives the same bytes."""


class NotAWorkbook(ValueError):
    """The file cannot be read as a workbook; the message says why in one line."""


class _Member(NamedTuple):
    """A member: its record in the directory, and where it lies in the file."""

    name: str
    record: bytes
    start: int
    packed_size: int
    size: int

    @property
    def flags(self) -> int:
        return int(_CENTRAL.unpack_from(self.record)[3])

    @property
    def method(self) -> int:
        return int(_CENTRAL.unpack_from(self.record)[4])

    @property
    def checksum(self) -> int:
        return int(_CENTRAL.unpack_from(self.record)[7])


class Archive(Mapping[str, bytes]):
    """The contents of a zip file by the names of its members, each unpacked when it is asked for."""

    def __init__(self, data: bytes) -> None:
        self.data = data
        self._contents: dict[str, bytes] = {}
        self._unpacked = 0
        try:
            self._directory, self._end, self._members = _read_directory(data)
        except (struct.error, IndexError, UnicodeDecodeError) as error:
            raise _damaged("its directory cannot be read") from error
        in_file = sorted(self._members.values(), key=lambda member: member.start)
        stops = [*(member.start for member in in_file[1:]), self._directory]
        self._stops = {member.name: stop for member, stop in zip(in_file, stops, strict=False)}

    def __getitem__(self, name: str) -> bytes:
        if name not in self._contents:
            self._contents[name] = self._unpack(self._members[name])
        return self._contents[name]

    def __iter__(self) -> Iterator[str]:
        return iter(self._members)

    def __len__(self) -> int:
        return len(self._members)

    def with_contents(self, contents: Mapping[str, bytes | None]) -> Iterator[bytes]:
        """Yield the file, piece by piece, with other contents of some members: None leaves a member out.

        New members stand at the end.
        """
        in_file = sorted(self._members.values(), key=lambda member: member.start)
        position = in_file[0].start if in_file else 0
        yield self.data[:position]
        records: dict[str, bytes] = {}
        for member in in_file:
            record, pieces = member.record, [self.data[member.start : self._stops[member.name]]]
            if member.name in contents:
                content = contents[member.name]
                if content is None:
                    continue
                record, pieces = self._repacked(member, content)
            records[member.name] = _moved(record, position)
            position += sum(map(len, pieces))
            yield from pieces
        directory = [records[name] for name in self._members if name in records]
        for name, content in contents.items():
            if content is not None and name not in self._members:
                record, pieces = _packed(name, content)
                directory.append(_moved(record, position))
                position += sum(map(len, pieces))
                yield from pieces
        yield from directory
        yield _new_end(self.data[self._end :], len(directory), sum(map(len, directory)), position)

    def _unpack(self, member: _Member) -> bytes:
        """Return the content of a member; no more is unpacked than its record and the bounds allow."""
        self._unpacked += member.size
        if self._unpacked > MOST_BYTES:
            raise NotAWorkbook(f"it is too large: more than {MOST_BYTES >> 20} MB when unpacked")
        if member.size > max(SMALL, TIGHTEST * member.packed_size):
            raise NotAWorkbook(f"its part {member.name} unpacks to more than {TIGHTEST} times its size")
        start, _ = self._content_start(member)
        packed = self.data[start : start + member.packed_size]
        if member.method == STORED:
            content = packed
        elif member.method == DEFLATED:
            content = _inflated(packed, member)
        else:
            raise NotAWorkbook(f"its part {member.name} is packed in a way that cannot be read here")
        if len(content) != member.size or zlib.crc32(content) != member.checksum:
            raise _damaged(f"{member.name} is not what its directory says")
        return content

    def _content_start(self, member: _Member) -> tuple[int, bytes]:
        """Return where the packed bytes of a member begin, and the extra field that stands before them."""
        try:
            mark, *_, name_length, extra_length = _LOCAL.unpack_from(self.data, member.start)
        except struct.error as error:
            raise _damaged(f"{member.name} is not where its directory says") from error
        name_start = member.start + _LOCAL.size
        extra_start = name_start + name_length
        start = extra_start + extra_length
        name = self.data[name_start:extra_start]
        if (
            mark != _LOCAL_MARK
            or name != _name_in(member.record)
            or start + member.packed_size > self._stops[member.name]
        ):
            raise _damaged(f"{member.name} is not where its directory says")
        return start, self.data[extra_start:start]

    def _repacked(self, member: _Member, content: bytes) -> tuple[bytes, list[bytes]]:
        """Return a member's new record and the pieces that it is in the file, with another content."""
        _, extra = self._content_start(member)
        fields = list(_CENTRAL.unpack_from(member.record))
        needed, flags, method, time, date = fields[2:7]
        flags &= ~_SIZES_FOLLOW
        packed = _deflated(content) if method == DEFLATED else content
        sizes = zlib.crc32(content), len(packed), len(content)
        name, extra = _name_in(member.record), _without_zip64(extra)
        local = _LOCAL.pack(_LOCAL_MARK, needed, flags, method, time, date, *sizes, len(name), len(extra))
        rest = _CENTRAL.size + len(name)
        kept = _without_zip64(member.record[rest : rest + fields[11]])
        comment = member.record[rest + fields[11] :]
        # What the directory kept of the member in zip64 now stands in the record itself.
        fields[3], fields[7:10], fields[11], fields[13], fields[16] = flags, sizes, len(kept), 0, 0
        return _CENTRAL.pack(*fields) + name + kept + comment, [local + name + extra, packed]


def _read_directory(data: bytes) -> tuple[int, int, dict[str, _Member]]:
    """Return where the directory begins, where its end records begin, and the members it lists."""
    end = data.rfind(_END_MARK, max(0, len(data) - _END.size - _LONGEST_COMMENT))
    if end < 0:
        raise _damaged("no zip file, or cut short")
    *_, count, size, start, _ = _END.unpack_from(data, end)
    tail = end
    if data[end - _LOCATOR.size : end].startswith(_LOCATOR_MARK):
        tail = _LOCATOR.unpack_from(data, end - _LOCATOR.size)[2]
        mark, *_, count, size, start = _END64.unpack_from(data, tail)
        if mark != _END64_MARK:
            raise _damaged("its directory cannot be read")
    if start + size > tail:
        raise _damaged("cut short")
    if count > MOST_MEMBERS:
        raise NotAWorkbook(f"it has more than {MOST_MEMBERS:,} parts")
    members: dict[str, _Member] = {}
    starts: set[int] = set()
    position = start
    for _ in range(count):
        member, position = _read_record(data, position, tail)
        if member.name in members:
            raise NotAWorkbook(f"two of its parts are called {member.name}")
        if member.start in starts or member.start >= start:
            raise _damaged(f"{member.name} is not where its directory says")
        members[member.name] = member
        starts.add(member.start)
    return start, position, members


def _read_record(data: bytes, position: int, limit: int) -> tuple[_Member, int]:
    """Return the member that a record of the directory is about, and where the next record begins."""
    mark, _, _, flags, _, _, _, _, packed_size, size, *lengths, _, _, _, start = _CENTRAL.unpack_from(data, position)
    end = position + _CENTRAL.size + sum(lengths)
    if mark != _CENTRAL_MARK or end > limit:
        raise _damaged("its directory cannot be read")
    record = data[position:end]
    name = _name_in(record).decode("utf-8" if flags & _NAME_IN_UTF8 else "cp437")
    name = name.replace("\\", "/")  # as old programs write it
    if "\0" in name or name.startswith("/") or ".." in name.split("/"):
        raise NotAWorkbook(f"the name of its part {name!r} leads out of the file")
    if flags & _ENCRYPTED:
        raise NotAWorkbook(f"its part {name} is encrypted; save it without a password")
    wide = list(_zip64_numbers(record))
    size, packed_size, start = (wide.pop(0) if short == _IN_ZIP64 else short for short in (size, packed_size, start))
    return _Member(name, record, start, packed_size, size), end


def _name_in(record: bytes) -> bytes:
    return record[_CENTRAL.size : _CENTRAL.size + _CENTRAL.unpack_from(record)[10]]


def _extras(extra: bytes) -> Iterator[tuple[int, bytes]]:
    """Yield the kind of each extra field and the whole of it; what is no field comes as kind -1."""
    position = 0
    while position + 4 <= len(extra):
        kind, length = struct.unpack_from("<2H", extra, position)
        yield kind, extra[position : position + 4 + length]
        position += 4 + length
    if position < len(extra):
        yield -1, extra[position:]


def _without_zip64(extra: bytes) -> bytes:
    return b"".join(whole for kind, whole in _extras(extra) if kind != _ZIP64)


def _zip64_numbers(record: bytes) -> tuple[int, ...]:
    start = _CENTRAL.size + len(_name_in(record))
    extra = record[start : start + _CENTRAL.unpack_from(record)[11]]
    field = next((whole[4:] for kind, whole in _extras(extra) if kind == _ZIP64), b"")
    return struct.unpack_from(f"<{len(field) // 8}Q", field)


def _moved(record: bytes, start: int) -> bytes:
    """Return a record of the directory whose member begins at another place."""
    fields = list(_CENTRAL.unpack_from(record))
    if fields[16] != _IN_ZIP64:
        fields[16] = start
        return _CENTRAL.pack(*fields) + record[_CENTRAL.size :]
    # Among the numbers kept in zip64 the place stands behind those of the sizes that are kept there too.
    before = sum(size == _IN_ZIP64 for size in fields[8:10])
    position = _CENTRAL.size + fields[10]
    for kind, whole in _extras(record[position : position + fields[11]]):
        if kind == _ZIP64:
            at = position + 4 + 8 * before
            return record[:at] + struct.pack("<Q", start) + record[at + 8 :]
        position += len(whole)
    raise _damaged("its directory cannot be read")


def _new_end(tail: bytes, count: int, size: int, start: int) -> bytes:
    """Return the end records of a file whose directory holds other members, or lies elsewhere."""
    end = tail.rfind(_END_MARK, max(0, len(tail) - _END.size - _LONGEST_COMMENT))
    before = tail[:end]
    fields = list(_END.unpack_from(tail, end))
    elsewhere = _IN_ZIP64_SHORT, _IN_ZIP64_SHORT, _IN_ZIP64, _IN_ZIP64
    news = zip(fields[3:7], elsewhere, (count, count, size, start), strict=True)
    fields[3:7] = [old if old == mark else new for old, mark, new in news]
    if before[-_LOCATOR.size :].startswith(_LOCATOR_MARK):
        at = before.rfind(_END64_MARK)
        wide = list(_END64.unpack_from(before, at))
        wide[6:10] = count, count, size, start
        locator = list(_LOCATOR.unpack_from(before, end - _LOCATOR.size))
        locator[2] = start + size + at
        rest = before[at + _END64.size : end - _LOCATOR.size]
        before = before[:at] + _END64.pack(*wide) + rest + _LOCATOR.pack(*locator)
    return before + _END.pack(*fields) + tail[end + _END.size :]


def _packed(name: str, content: bytes) -> tuple[bytes, list[bytes]]:
    """Return the record of a new member and the pieces that it is in the file."""
    packed, called = _deflated(content), name.encode()
    about = _VERSION, _NAME_IN_UTF8, DEFLATED, 0, _FIRST_DAY, zlib.crc32(content), len(packed), len(content)
    local = _LOCAL.pack(_LOCAL_MARK, *about, len(called), 0)
    record = _CENTRAL.pack(_CENTRAL_MARK, _VERSION, *about, len(called), 0, 0, 0, 0, 0, 0)
    return record + called, [local + called, packed]


def _deflated(content: bytes) -> bytes:
    packer = zlib.compressobj(wbits=-zlib.MAX_WBITS)
    return packer.compress(content) + packer.flush()


def _inflated(packed: bytes, member: _Member) -> bytes:
    """Return the content of a packed member, cut behind the first byte that its record does not allow."""
    unpacker = zlib.decompressobj(wbits=-zlib.MAX_WBITS)
    try:
        return unpacker.decompress(packed, member.size + 1)
    except zlib.error as error:
        raise _damaged(f"{member.name} cannot be unpacked") from error


def _damaged(why: str) -> NotAWorkbook:
    return NotAWorkbook(f"it is not a workbook or is damaged ({why})")
