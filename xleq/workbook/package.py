"""The archive that a workbook is: opened under limits, its parts found by their relationships."""

from __future__ import annotations

import posixpath
import struct
import zipfile
import zlib
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path
from types import TracebackType
from typing import Final, NamedTuple
from urllib.parse import unquote

from xleq.errors import BookError, DamagedBookError, EncryptedBookError, LimitError, MissingBookError
from xleq.workbook.limits import Limits
from xleq.workbook.markup import Node, parse

_COMPOUND_FILE: Final = bytes.fromhex("D0CF11E0A1B11AE1")
_ENCRYPTED_FLAG: Final = 1
#: What the zip reader raises on damaged archives; it has no error class of its own for all of it.
_ZIP_ERRORS: Final = (
    zipfile.BadZipFile,
    zlib.error,
    EOFError,
    struct.error,
    NotImplementedError,
    UnicodeDecodeError,
    ValueError,
    OverflowError,
    RuntimeError,
    IndexError,
)


@contextmanager
def about(path: Path) -> Iterator[None]:
    """Put the file's path before the message of a `BookError`."""
    try:
        yield
    except BookError as error:
        raise type(error)(f"{path} {error}") from error


class Relationship(NamedTuple):
    """A link from one part to another: id, last word of its type, member name or outside target."""

    id: str
    type: str
    target: str
    outside: bool


class Package:
    """An open archive.

    Parameters
    ----------
    path : Path
        The file.
    limits : Limits
        What is too large.

    Raises
    ------
    BookError
        One of its classes, if the file is missing, not a readable archive, encrypted or over a limit.
        Messages do not name the file: the caller does, with `about`.
    """

    def __init__(self, path: Path, limits: Limits) -> None:
        self.limits = limits
        self.path = path
        try:
            stat = path.stat()
            self.stamp = (stat.st_size, stat.st_mtime_ns)
            self._refuse_by_signature(stat.st_size)
            self.zip = zipfile.ZipFile(path)
        except FileNotFoundError as error:
            raise MissingBookError("there is no such file") from error
        except OSError as error:
            raise BookError(f"cannot be read: {error.strerror or error}") from error
        except _ZIP_ERRORS as error:
            raise DamagedBookError(
                f"is not a readable zip archive, as a workbook must be: {error}"
            ) from error
        try:
            self._by_key = self._checked_entries()
        except BookError:
            self.zip.close()
            raise

    def __enter__(self) -> Package:
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        self.zip.close()

    def _refuse_by_signature(self, size: int) -> None:
        if self.path.is_dir():
            raise BookError("is a folder, not a workbook")
        if not self.path.is_file():
            raise BookError("is not an ordinary file")
        if size > self.limits.file_size:
            raise LimitError(f"has {size} bytes; the limit (file_size) is {self.limits.file_size}")
        with self.path.open("rb") as file:
            head = file.read(8)
            if head == _COMPOUND_FILE:
                self._refuse_compound_file(head + file.read())
        if not head:
            raise DamagedBookError("is empty")

    @staticmethod
    def _refuse_compound_file(data: bytes) -> None:
        if "EncryptedPackage".encode("utf-16-le") in data:
            raise EncryptedBookError("is encrypted: remove its password in Excel and save it again")
        if any(name.encode("utf-16-le") in data for name in ("Workbook", "Book")):
            raise DamagedBookError("is in the old .xls format: save it as .xlsx or .xlsm")
        raise DamagedBookError("is a compound file without a workbook")

    def _checked_entries(self) -> dict[str, zipfile.ZipInfo]:
        limits, entries = self.limits, self.zip.infolist()
        if len(entries) > limits.entries:
            raise LimitError(f"has {len(entries)} members; the limit (entries) is {limits.entries}")
        total = sum(entry.file_size for entry in entries)
        if total > limits.total_size:
            raise LimitError(f"unpacks to {total} bytes; the limit (total_size) is {limits.total_size}")
        by_key: dict[str, zipfile.ZipInfo] = {}
        for entry in entries:
            self._refuse_entry(entry)
            key = key_of(entry.filename)
            if key in by_key:
                raise DamagedBookError(f"has two members named {entry.filename!r}")
            by_key[key] = entry
        return by_key

    def _refuse_entry(self, entry: zipfile.ZipInfo) -> None:
        name = entry.filename
        steps = name.replace("\\", "/").split("/")
        if not name or ".." in steps or steps[0] == "" or steps[0].endswith(":") or "\0" in name:
            raise DamagedBookError(f"has a member outside the archive: {name!r}")
        if not 0 <= entry.header_offset <= self.zip.start_dir:
            raise DamagedBookError(f"says that {name!r} lies where no member can")
        if entry.flag_bits & _ENCRYPTED_FLAG:
            raise EncryptedBookError(f"has an encrypted member, {name!r}")
        if entry.compress_type not in (zipfile.ZIP_STORED, zipfile.ZIP_DEFLATED):
            raise DamagedBookError(f"packs {name!r} by a method that workbooks do not use")
        if entry.file_size > self.limits.ratio_from:
            ratio = entry.file_size / max(entry.compress_size, 1)
            if ratio > self.limits.ratio:
                raise LimitError(
                    f"packs {name!r} {ratio:.0f} times smaller; the limit (ratio) is {self.limits.ratio:g}"
                )

    def has(self, part: str) -> bool:
        """Whether there is such a member; case does not matter."""
        return key_of(part) in self._by_key

    def member_keys(self) -> list[str]:
        """Member names in the form that `key_of` gives."""
        return list(self._by_key)

    def member(self, part: str) -> str:
        """Name of a member as the archive spells it."""
        entry = self._by_key.get(key_of(part))
        if entry is None:
            raise DamagedBookError(f"lacks its part {part!r}")
        return entry.filename

    def read(self, part: str) -> bytes:
        """All bytes of a member."""
        entry = self._by_key[key_of(self.member(part))]
        try:
            return self.zip.read(entry)
        except OSError as error:
            raise BookError(f"cannot be read: {error.strerror or error}") from error
        except _ZIP_ERRORS as error:
            raise DamagedBookError(f"has a damaged member, {entry.filename!r}: {error}") from error

    def tree(self, part: str) -> Node:
        """A small XML part as a tree."""
        return parse(self.read(part), part, self.limits.xml_depth)

    def relationships(self, part: str = "") -> list[Relationship]:
        """Relationships of a part, or of the whole package; none where the archive lists none."""
        folder, name = posixpath.split(part)
        rels = posixpath.join(folder, "_rels", f"{name}.rels")
        if not self.has(rels):
            return []
        found = []
        for node in self.tree(rels).children:
            outside = node.get("TargetMode") == "External"
            target = node.get("Target")
            kind = node.get("Type").rstrip("/").rpartition("/")[2]
            found.append(
                Relationship(node.get("Id"), kind, target if outside else _inside(folder, target), outside)
            )
        return found


def key_of(name: str) -> str:
    r"""A member name as it is compared: slashes forward, case folded.

    Examples
    --------
    >>> key_of("xl\\Workbook.xml")
    'xl/workbook.xml'
    """
    return name.replace("\\", "/").casefold()


def _inside(folder: str, target: str) -> str:
    """Member name of a relative or absolute target seen from a part's folder."""
    target = unquote(target.replace("\\", "/").partition("#")[0])
    path = target.lstrip("/") if target.startswith("/") else posixpath.join(folder, target)
    path = posixpath.normpath(path)
    if path.startswith("../"):
        raise DamagedBookError(f"refers to a part outside the archive: {target!r}")
    return path
