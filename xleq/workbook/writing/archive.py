"""A copy of an archive in which a few members are new and all others are the same bytes.

Members that stay are not unpacked: their headers and packed data are copied as they stand, gaps and all.
"""

from __future__ import annotations

import struct
import zlib
from typing import IO, Final, NamedTuple
from zipfile import ZIP_DEFLATED, BadZipFile, ZipFile, ZipInfo

from xleq.errors import DamagedBookError

_LOCAL: Final = struct.Struct("<4s5H3L2H")
_CENTRAL: Final = struct.Struct("<4s4B4HL2L5H2L")
_END: Final = struct.Struct("<4s4H2LH")
_LOCAL_MARK: Final = b"PK\x03\x04"
_CENTRAL_MARK: Final = b"PK\x01\x02"
_END_MARK: Final = b"PK\x05\x06"
_ZIP64_EXTRA: Final = 1
_SIZES_FOLLOW: Final = 0x08
_LARGEST: Final = 0xFFFFFFFF
_CHUNK: Final = 1 << 20


class _Placed(NamedTuple):
    """Where a member went, and how it is packed."""

    offset: int
    crc: int
    packed: int
    size: int
    flags: int


def copy_archive(source: ZipFile, into: IO[bytes], changed: dict[str, bytes]) -> None:
    """Write a copy of an archive with some members changed.

    Order, names, times, comments, extra fields and method of packing stay, those of changed members too.

    Parameters
    ----------
    source : ZipFile
        The archive, open for reading from a file.
    into : binary file
        Where the copy goes, from its current position 0.
    changed : dict
        Member name → its new bytes.

    Raises
    ------
    DamagedBookError
        If headers in the archive contradict one another.
    """
    file = source.fp
    if file is None:
        raise DamagedBookError("has been closed")
    infos = sorted(source.infolist(), key=lambda info: info.header_offset)
    ends = [info.header_offset for info in infos[1:]] + [source.start_dir]
    placed: dict[str, _Placed] = {}
    _copy(file, into, 0, infos[0].header_offset if infos else source.start_dir)
    for info, end in zip(infos, ends, strict=True):
        offset = into.tell()
        if info.filename in changed:
            placed[info.filename] = _write_member(file, into, info, changed[info.filename])
        else:
            if info.header_offset + _LOCAL.size + info.compress_size > end:
                raise DamagedBookError(f"has overlapping members: {info.filename!r}")
            _copy(file, into, info.header_offset, end)
            placed[info.filename] = _Placed(
                offset, info.CRC, info.compress_size, info.file_size, info.flag_bits
            )
    _write_directory(file, into, source, placed)
    _look_again(into, source, placed)


def _look_again(into: IO[bytes], source: ZipFile, placed: dict[str, _Placed]) -> None:
    """Refuse a copy that does not read back as what was meant: the source's headers were damaged then."""
    wanted = [(name, placed[name].crc, placed[name].size) for name in source.namelist()]
    into.flush()
    try:
        with ZipFile(into) as copy:
            found = [(info.filename, info.CRC, info.file_size) for info in copy.infolist()]
    except (BadZipFile, NotImplementedError, struct.error, ValueError) as error:
        raise DamagedBookError(f"has a damaged list of members: {error}") from error
    if found != wanted:
        raise DamagedBookError("has a damaged list of members")


def _copy(file: IO[bytes], into: IO[bytes], start: int, end: int) -> None:
    file.seek(start)
    left = end - start
    while left > 0:
        chunk = file.read(min(left, _CHUNK))
        if not chunk:
            raise DamagedBookError("ends in the middle of a member")
        into.write(chunk)
        left -= len(chunk)


def _write_member(file: IO[bytes], into: IO[bytes], info: ZipInfo, data: bytes) -> _Placed:
    """A changed member under its old header, with its new sizes."""
    file.seek(info.header_offset)
    fields = list(_LOCAL.unpack(file.read(_LOCAL.size)))
    if fields[0] != _LOCAL_MARK:
        raise DamagedBookError(f"has no header before its member {info.filename!r}")
    name = file.read(fields[9])
    extra = _without_zip64(file.read(fields[10]))
    packed = data
    if info.compress_type == ZIP_DEFLATED:
        packer = zlib.compressobj(6, zlib.DEFLATED, -15)
        packed = packer.compress(data) + packer.flush()
    if max(len(data), len(packed)) >= _LARGEST:
        raise DamagedBookError(f"would have a member over 4 GB: {info.filename!r}")
    offset, crc, flags = into.tell(), zlib.crc32(data), info.flag_bits & ~_SIZES_FOLLOW
    fields[2], fields[6:9], fields[10] = flags, [crc, len(packed), len(data)], len(extra)
    into.write(_LOCAL.pack(*fields) + name + extra)
    into.write(packed)
    return _Placed(offset, crc, len(packed), len(data), flags)


def _write_directory(file: IO[bytes], into: IO[bytes], source: ZipFile, placed: dict[str, _Placed]) -> None:
    """The central directory in its old order with new offsets, and the end record with the old comment."""
    begin = into.tell()
    file.seek(source.start_dir)
    infos = source.infolist()
    for info in infos:
        fields = list(_CENTRAL.unpack(file.read(_CENTRAL.size)))
        if fields[0] != _CENTRAL_MARK:
            raise DamagedBookError("has a damaged list of members")
        name = file.read(fields[12])
        extra = _without_zip64(file.read(fields[13]))
        comment = file.read(fields[14])
        new = placed[info.filename]
        if max(new.offset, new.size, new.packed) >= _LARGEST:
            raise DamagedBookError("would be an archive over 4 GB")
        fields[5] = new.flags
        fields[9:12] = [new.crc, new.packed, new.size]
        fields[13], fields[18] = len(extra), new.offset
        into.write(_CENTRAL.pack(*fields) + name + extra + comment)
    size, count = into.tell() - begin, len(infos)
    into.write(_END.pack(_END_MARK, 0, 0, count, count, size, begin, len(source.comment)) + source.comment)


def _without_zip64(extra: bytes) -> bytes:
    """An extra field without the block that holds 64-bit sizes: all sizes here fit in 32 bits."""
    kept, at = b"", 0
    while at + 4 <= len(extra):
        kind, length = struct.unpack_from("<HH", extra, at)
        if kind != _ZIP64_EXTRA:
            kept += extra[at : at + 4 + length]
        at += 4 + length
    return kept + extra[at:]
