"""Putting a finished file in place so that, whatever happens, the old or the new one is there whole.

The new file is written beside its target under a temporary name, held by a lock, flushed to the disk and
renamed over the target. A temporary file that a killed run left behind holds no lock any more: the next
write to the same name removes it.
"""

from __future__ import annotations

import os
import shutil
import stat
from collections.abc import Callable, Iterator
from contextlib import contextmanager, suppress
from pathlib import Path
from typing import IO, Final

from xleq.errors import LockedBookError

_MARK: Final = ".xleq-part"
_MODE: Final = 0o666
_ANY_WRITE: Final = 0o222


def open_elsewhere(path: Path) -> Path | None:
    """The lock file that Excel or LibreOffice keeps beside a workbook while it is open, if there is one."""
    for name in (f"~${path.name}", f".~lock.{path.name}#"):
        lock = path.with_name(name)
        if lock.exists():
            return lock
    return None


def place(path: Path, fill: Callable[[IO[bytes]], None], model: Path, keep: bool) -> Path | None:
    """Write a file whole or not at all.

    Parameters
    ----------
    path : Path
        Where it shall stand; what stands there is replaced.
    fill : callable
        Writes the content into the open file it is given.
    model : Path
        File whose permissions it gets when `path` does not exist yet.
    keep : bool
        Whether the file that is replaced stays under a backup name.

    Returns
    -------
    Path or None
        The backup.

    Raises
    ------
    LockedBookError
        If the folder or the file cannot be written, or the disk is full; nothing has changed then.
        Errors that `fill` raises pass through, and leave nothing behind either.
    """
    try:
        if path.exists() and (not path.stat().st_mode & _ANY_WRITE or not os.access(path, os.W_OK)):
            raise LockedBookError(f"{path} is read-only; nothing was changed")
        _remove_strays(path)
        with _temporary(path) as (file, temporary):
            _keep_permissions(file, path, model)
            fill(file)
            file.flush()
            os.fsync(file.fileno())
            backup = _back_up(path) if keep else None
            try:
                _rename(temporary, path, file)
            except OSError:
                if backup is not None:
                    backup.unlink()
                raise
        _flush_folder(path.parent)
    except OSError as error:
        why = error.strerror or str(error)
        raise LockedBookError(f"{path} cannot be written: {why}; nothing was changed") from error
    return backup


def _temporary_name(path: Path) -> Path:
    return path.with_name(f".{path.name}.{os.urandom(4).hex()}{_MARK}")


@contextmanager
def _temporary(path: Path) -> Iterator[tuple[IO[bytes], Path]]:
    """A locked temporary file beside the target; it is gone afterwards unless it was renamed."""
    while True:
        name = _temporary_name(path)
        with name.open("x+b") as file:
            try:
                _lock(file)
                if not _is_there(name, file):  # a neighbour took it for a stray before it was locked
                    continue
                yield file, name
            finally:
                with suppress(OSError):
                    if _is_there(name, file):
                        name.unlink()
            return


def _is_there(name: Path, file: IO[bytes]) -> bool:
    try:
        return os.path.samestat(name.stat(), os.fstat(file.fileno()))
    except FileNotFoundError:
        return False


def _lock(file: IO[bytes]) -> bool:
    """Hold a lock on an open file until it is closed; False when somebody else holds it."""
    try:
        import fcntl
    except ImportError:  # Windows: an open file cannot be removed there, which serves as well
        return True
    try:
        fcntl.flock(file, fcntl.LOCK_EX | fcntl.LOCK_NB)
    except OSError:
        return False
    return True


def _remove_strays(path: Path) -> None:
    """Remove temporary files that killed runs left for this target."""
    for name in path.parent.glob(f".{_literal(path.name)}.*{_MARK}"):
        with suppress(OSError), name.open("rb") as file:
            if _lock(file):
                name.unlink()


def _literal(name: str) -> str:
    return "".join(f"[{c}]" if c in "*?[" else c for c in name)


def _keep_permissions(file: IO[bytes], path: Path, model: Path) -> None:
    """Those of the file that is replaced; a new file has its model's, and its owner may write it."""
    new = not path.exists()
    status = (model if new else path).stat()
    if hasattr(os, "fchmod"):
        if not new:
            with suppress(PermissionError):
                os.fchown(file.fileno(), status.st_uid, status.st_gid)
        os.fchmod(file.fileno(), (stat.S_IMODE(status.st_mode) & _MODE) | (stat.S_IWUSR if new else 0))


def _back_up(path: Path) -> Path:
    """A second name for the file that stands at `path`; no file is ever overwritten by it.

    ``loop.xlsx`` becomes ``loop.backup.xlsx``, then ``loop.backup-2.xlsx`` and so on. When a run was killed
    after it had made the backup, that one serves.
    """
    number = 1
    while True:
        tail = "" if number == 1 else f"-{number}"
        backup = path.with_name(f"{path.stem}.backup{tail}{path.suffix}")
        if not backup.exists():
            with suppress(FileExistsError):  # somebody was faster: the next number
                return _second_name(path, backup)
        elif os.path.samefile(backup, path):
            return backup
        number += 1


def _second_name(path: Path, backup: Path) -> Path:
    try:
        os.link(path, backup)
    except FileExistsError:
        raise
    except (OSError, NotImplementedError):  # a file system without second names: a copy, whole or not at all
        with path.open("rb") as old, _temporary(path) as (new, temporary):
            shutil.copyfileobj(old, new)
            new.flush()
            os.fsync(new.fileno())
            shutil.copystat(path, temporary)
            _rename(temporary, backup, new)
    return backup


def _rename(temporary: Path, path: Path, file: IO[bytes]) -> None:
    if os.name == "nt":  # an open file cannot be renamed there
        file.close()
    os.replace(temporary, path)


def _flush_folder(folder: Path) -> None:
    """Make the new name last: until the folder is flushed, a power cut could bring the old one back."""
    if os.name == "nt":
        return
    handle = os.open(folder, os.O_RDONLY)
    try:
        os.fsync(handle)
    finally:
        os.close(handle)
