"""A zip archive read with suspicion and written with unchanged members copied as they are, still compressed.

The standard library's reader can neither copy a member without unpacking it nor refuse an archive before it
has believed the whole directory; both are needed here, so the directory is read by hand.
"""

from __future__ import annotations

import struct
import zlib
from collections.abc import Iterable, Iterator
from dataclasses import dataclass
from typing import NoReturn

from cant.errors import FileError, Place

MAX_MEMBERS = 5_000
MAX_MEMBER_BYTES = 400_000_000
MAX_TOTAL_BYTES = 512_000_000
MAX_RATIO = 250
SMALL_MEMBER_BYTES = 4_000_000
"""Members up to this size may be compressed at any ratio."""

STORED = 0
DEFLATED = 8

_LOCAL = struct.Struct("<4s5H3I2H")
_CENTRAL = struct.Struct("<4s6H3I5H2I")
_END = struct.Struct("<4s4H2IH")
_END64_LOCATOR = struct.Struct("<4sIQI")
_END64 = struct.Struct("<4sQ2H2I4Q")
_UNKNOWN_32 = 0xFFFFFFFF
_UTF8_NAME = 0x0800
_ENCRYPTED = 0x0041
_ZIP64_EXTRA = 1


@dataclass(frozen=True, slots=True)
class Member:
    """One entry of the directory.

    Attributes
    ----------
    name : str
        Name with forward slashes.
    raw_name : bytes
        Name as it stands in the archive.
    flags, method, time, date : int
        Fields of the zip format.
    crc, compressed, size, offset : int
        Checksum, sizes in bytes, and where the local header begins.
    """

    name: str
    raw_name: bytes
    flags: int
    method: int
    time: int
    date: int
    crc: int
    compressed: int
    size: int
    offset: int


class Archive:
    """The members of a zip file, in the order of its directory.

    Parameters
    ----------
    data : bytes
        The whole file.
    file : str
        Its name, for messages.

    Raises
    ------
    FileError
        Damaged, encrypted, or built to do harm; decided from the directory alone.
    """

    def __init__(self, data: bytes, file: str = "") -> None:
        self.data = data
        self.place = Place(file)
        members = list(self._directory())
        self.members = {member.name: member for member in members}
        self._check(members)

    def __contains__(self, name: str) -> bool:
        return name in self.members

    def read(self, name: str) -> bytes:
        """Unpack a member, never beyond the size its directory entry states.

        Raises
        ------
        FileError
            The content does not keep to size or checksum.
        """
        member = self.members[name]
        packed = self.packed(member)
        try:
            if member.method == STORED:
                content = bytes(packed)
            else:
                engine = zlib.decompressobj(-15)
                content = engine.decompress(packed, member.size + 1)
        except zlib.error:
            self._damaged(f"its part {name} cannot be unpacked")
        if len(content) != member.size or zlib.crc32(content) != member.crc:
            self._damaged(f"its part {name} does not have the stated size and checksum")
        return content

    def pieces(self, name: str) -> Iterator[bytes]:
        """Unpack a member, in pieces of any size."""
        yield self.read(name)

    def packed(self, member: Member) -> memoryview:
        """Give a member's bytes as they are stored."""
        start = self._content_start(member)
        return memoryview(self.data)[start : start + member.compressed]

    def _content_start(self, member: Member) -> int:
        header = self.data[member.offset : member.offset + _LOCAL.size]
        if len(header) < _LOCAL.size or header[:4] != b"PK\x03\x04":
            self._damaged(f"its part {member.name} is not where its directory says")
        fields = _LOCAL.unpack(header)
        return member.offset + _LOCAL.size + int(fields[9]) + int(fields[10])

    def _directory(self) -> Iterator[Member]:
        count, size, start, end = self._end_record()
        if count > MAX_MEMBERS:
            message = f"is refused because it holds {count} parts; a workbook has at most {MAX_MEMBERS}"
            raise FileError(message, self.place)
        if start + size != end:
            self._damaged("its directory is not where it should be")
        at = start
        for _ in range(count):
            member, at = self._entry(at, start)
            yield member
        if at != start + size:
            self._damaged("its directory does not have the stated length")

    def _end_record(self) -> tuple[int, int, int, int]:
        """Give count of entries, size and start of the directory, and where it must end."""
        at = self.data.rfind(b"PK\x05\x06", max(0, len(self.data) - _END.size - 0xFFFF))
        if at < 0 or at + _END.size > len(self.data):
            self._damaged("it is cut off or not a complete zip archive")
        _, disk, disk2, here, count, size, start, _ = _END.unpack_from(self.data, at)
        locator = at - _END64_LOCATOR.size
        if locator >= 0 and self.data[locator : locator + 4] == b"PK\x06\x07":
            end64 = _END64_LOCATOR.unpack_from(self.data, locator)[2]
            if end64 + _END64.size > locator or self.data[end64 : end64 + 4] != b"PK\x06\x06":
                self._damaged("its directory is not where it should be")
            record = _END64.unpack_from(self.data, end64)
            return int(record[7]), int(record[8]), int(record[9]), int(end64)
        if disk or disk2 or here != count:
            self._damaged("it is one part of an archive in several volumes")
        return int(count), int(size), int(start), at

    def _entry(self, at: int, limit: int) -> tuple[Member, int]:
        if at + _CENTRAL.size > len(self.data) or self.data[at : at + 4] != b"PK\x01\x02":
            self._damaged("its directory is broken")
        fields = _CENTRAL.unpack_from(self.data, at)
        flags, method, time, date, crc, compressed, size, name_length, extra_length, comment = fields[3:13]
        offset = int(fields[16])
        name_at = at + _CENTRAL.size
        raw_name = self.data[name_at : name_at + name_length]
        extra = self.data[name_at + name_length : name_at + name_length + extra_length]
        size, compressed, offset = _zip64(extra, size, compressed, offset)
        name = raw_name.decode("utf-8" if flags & _UTF8_NAME else "cp437", "replace").replace("\\", "/")
        if offset + _LOCAL.size + compressed > limit:
            self._damaged(f"its part {name} lies outside of the file")
        member = Member(name, raw_name, flags, method, time, date, crc, compressed, size, offset)
        return member, name_at + name_length + extra_length + comment

    def _check(self, members: list[Member]) -> None:
        if len(self.members) != len(members):
            self._refused("two of its parts have the same name")
        if sum(member.size for member in members) > MAX_TOTAL_BYTES:
            self._refused(f"unpacked it would be larger than {MAX_TOTAL_BYTES // 1_000_000} MB")
        end = 0
        for member in sorted(members, key=lambda one: one.offset):
            if member.offset < end:
                self._refused("its parts overlap")
            end = member.offset + _LOCAL.size + len(member.raw_name) + member.compressed
            self._check_member(member)

    def _check_member(self, member: Member) -> None:
        parts = member.name.split("/")
        if member.name.startswith("/") or ".." in parts or ":" in parts[0] or "\0" in member.name:
            self._refused(f"a part is named {member.name!r}, which points out of the file")
        if member.flags & _ENCRYPTED:
            message = "is password-protected; open it, save it without a password, and try again"
            raise FileError(message, self.place)
        if member.method not in (STORED, DEFLATED):
            self._refused(f"its part {member.name} is compressed in a way that workbooks do not use")
        if member.size > MAX_MEMBER_BYTES:
            self._refused(
                f"its part {member.name} would unpack to more than {MAX_MEMBER_BYTES // 1_000_000} MB"
            )
        if member.size > SMALL_MEMBER_BYTES and member.size > MAX_RATIO * member.compressed:
            self._refused(f"its part {member.name} would unpack to far more than a workbook's does")

    def _damaged(self, what: str) -> NoReturn:
        message = f"is damaged: {what}; open it in a spreadsheet program and save it anew"
        raise FileError(message, self.place) from None

    def _refused(self, why: str) -> NoReturn:
        message = f"is refused for safety: {why}; save it anew from a spreadsheet program"
        raise FileError(message, self.place)


def _zip64(extra: bytes, size: int, compressed: int, offset: int) -> tuple[int, int, int]:
    """Replace the fields that a zip64 entry leaves to its extra block."""
    at = 0
    while at + 4 <= len(extra):
        kind, length = struct.unpack_from("<2H", extra, at)
        block = extra[at + 4 : at + 4 + length]
        at += 4 + length
        if kind != _ZIP64_EXTRA:
            continue
        values = [value for (value,) in struct.iter_unpack("<Q", block[: len(block) // 8 * 8])]
        chosen = []
        for field in (size, compressed, offset):
            chosen.append(values.pop(0) if field == _UNKNOWN_32 and values else field)
        return int(chosen[0]), int(chosen[1]), int(chosen[2])
    return size, compressed, offset


@dataclass(frozen=True, slots=True)
class Packed:
    """A member ready to be written: its directory fields and its bytes as stored."""

    name: bytes
    flags: int
    method: int
    time: int
    date: int
    crc: int
    size: int
    content: bytes | memoryview

    def unpacked(self) -> bytes:
        """Give the content as it was before it was compressed."""
        return zlib.decompress(self.content, -15) if self.method == DEFLATED else bytes(self.content)


def copied(archive: Archive, name: str) -> Packed:
    """Take over a member without unpacking it."""
    member = archive.members[name]
    flags = member.flags & ~0x0008  # sizes stand in the header, no descriptor follows
    return Packed(
        member.raw_name,
        flags,
        member.method,
        member.time,
        member.date,
        member.crc,
        member.size,
        archive.packed(member),
    )


def packed(name: str, chunks: Iterable[bytes], level: int = 4) -> Packed:
    """Compress a new member.

    Parameters
    ----------
    name : str
        Its name.
    chunks : iterable of bytes
        Its content in pieces.
    level : int
        Effort of the compression, 1 to 9.
    """
    engine = zlib.compressobj(level, zlib.DEFLATED, -15)
    crc = size = 0
    out = []
    for chunk in chunks:
        crc = zlib.crc32(chunk, crc)
        size += len(chunk)
        out.append(engine.compress(chunk))
    out.append(engine.flush())
    first_of_1980 = 0x21
    return Packed(name.encode(), _UTF8_NAME, DEFLATED, 0, first_of_1980, crc, size, b"".join(out))


def archive_pieces(members: Iterable[Packed]) -> list[bytes | memoryview]:
    """Put members together to a zip file, given in pieces so that it need not stand in memory twice."""
    body: list[bytes | memoryview] = []
    directory: list[bytes] = []
    offset = 0
    for one in members:
        shared = (20, one.flags, one.method, one.time, one.date, one.crc, len(one.content), one.size)
        header = _LOCAL.pack(b"PK\x03\x04", *shared, len(one.name), 0) + one.name
        directory.append(
            _CENTRAL.pack(b"PK\x01\x02", 20, *shared, len(one.name), 0, 0, 0, 0, 0, offset) + one.name
        )
        body += (header, one.content)
        offset += len(header) + len(one.content)
    size = sum(map(len, directory))
    end = _END.pack(b"PK\x05\x06", 0, 0, len(directory), len(directory), size, offset, 0)
    return [*body, *directory, end]
