"""Whatever happens while a workbook is written, the old or the new file is there whole."""

from __future__ import annotations

import errno
import os
import random
import shutil
import signal
import subprocess
import sys
import tempfile
import time
import zipfile
from collections.abc import Callable, Iterator
from pathlib import Path

import pytest

from xleq.errors import LockedBookError
from xleq.workbook import Book, Results, SheetResults, open_book, write_book
from xleq.workbook.writing import placing

BookMaker = Callable[..., Path]
N_ROWS = 40
posix = pytest.mark.skipif(os.name != "posix", reason="works through signals and limits of POSIX systems")


@pytest.fixture
def loop(make_book: BookMaker) -> Path:
    rows = "".join(f'<row r="{n}"><c r="A{n}"><f>X</f><v>0</v></c></row>' for n in range(1, N_ROWS + 1))
    random_bytes = random.Random(1).randbytes(300_000)
    return make_book({"Loop": f"<sheetData>{rows}</sheetData>"}, parts={"xl/media/image1.png": random_bytes})


def all_set_to(value: float) -> Results:
    return {0: SheetResults({(n, 1): value for n in range(1, N_ROWS + 1)})}


def values(book: Book) -> set[object]:
    return set(book.sheets[0].stored.values())


def only(path: Path, *more: str) -> None:
    """Nothing stands in the folder but the workbook and these."""
    assert sorted(p.name for p in path.parent.iterdir()) == sorted([path.name, *more])


def test_writing_in_place_keeps_every_older_file_as_a_backup(loop: Path) -> None:
    first = loop.read_bytes()
    done = write_book(open_book(loop), all_set_to(1.0), in_place=True)
    assert (done.path, done.backup, done.n_cells) == (loop, loop.with_name("loop.backup.xlsx"), N_ROWS)
    second = loop.read_bytes()
    again = write_book(open_book(loop), all_set_to(2.0), in_place=True)
    assert again.backup == loop.with_name("loop.backup-2.xlsx")
    only(loop, "loop.backup.xlsx", "loop.backup-2.xlsx")
    assert done.backup.read_bytes() == first
    assert again.backup.read_bytes() == second
    assert values(open_book(loop)) == {2.0}
    write_book(open_book(loop), all_set_to(3.0), in_place=True, keep_backup=False)
    only(loop, "loop.backup.xlsx", "loop.backup-2.xlsx")


def test_backups_are_copies_where_a_file_cannot_have_two_names(
    loop: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    def refuse(*_: object) -> None:
        raise OSError(errno.EPERM, "Operation not permitted")

    monkeypatch.setattr(os, "link", refuse)
    first = loop.read_bytes()
    for n in (1.0, 2.0):
        write_book(open_book(loop), all_set_to(n), in_place=True)
    only(loop, "loop.backup.xlsx", "loop.backup-2.xlsx")
    assert loop.with_name("loop.backup.xlsx").read_bytes() == first


def test_nothing_is_touched_in_place_when_nothing_changes(loop: Path) -> None:
    before = loop.stat()
    done = write_book(open_book(loop), all_set_to(0.0), in_place=True)
    assert (done.backup, done.n_cells, done.parts) == (None, 0, ())
    assert loop.stat() == before
    only(loop)


@posix
@pytest.mark.parametrize("mode", [0o600, 0o640, 0o664])
def test_permissions_are_kept(loop: Path, mode: int) -> None:
    loop.chmod(mode)
    write_book(open_book(loop), all_set_to(1.0), in_place=True)
    write_book(open_book(loop), all_set_to(2.0), loop.with_name("new.xlsx"))
    assert [p.stat().st_mode & 0o777 for p in (loop, loop.with_name("new.xlsx"))] == [mode, mode]


@posix
def test_a_link_stays_a_link_to_the_new_file(loop: Path) -> None:
    link = loop.with_name("today.xlsx")
    link.symlink_to(loop)
    done = write_book(open_book(link), all_set_to(1.0), in_place=True)
    assert link.is_symlink()
    assert done.path == loop.resolve()
    assert values(open_book(link)) == {1.0}


@pytest.mark.parametrize("lock", ["~$loop.xlsx", ".~lock.loop.xlsx#"])
def test_a_workbook_open_elsewhere_is_not_written(loop: Path, lock: str) -> None:
    loop.with_name(lock).touch()
    with pytest.raises(LockedBookError, match="open elsewhere"):
        write_book(open_book(loop), all_set_to(1.0), in_place=True)
    assert values(open_book(loop)) == {0.0}
    write_book(open_book(loop), all_set_to(1.0), loop.with_name("new.xlsx"))
    loop.with_name("~$new.xlsx").touch()
    with pytest.raises(LockedBookError, match="open elsewhere"):
        write_book(open_book(loop), all_set_to(2.0), loop.with_name("new.xlsx"))
    assert values(open_book(loop.with_name("new.xlsx"))) == {1.0}


def test_a_full_disk_leaves_the_old_file_and_nothing_else(
    loop: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    for call in ("fsync", "replace"):
        with monkeypatch.context() as patch:

            def full(*_: object) -> None:
                raise OSError(errno.ENOSPC, "No space left on device")

            patch.setattr(os, call, full)
            with pytest.raises(LockedBookError, match="No space left on device; nothing was changed"):
                write_book(open_book(loop), all_set_to(1.0), in_place=True)
        assert values(open_book(loop)) == {0.0}
        only(loop)


SMALL_FILES = """
import resource, signal, sys
from xleq.errors import LockedBookError
from xleq.workbook import SheetResults, open_book, write_book
book = open_book(sys.argv[1])
signal.signal(signal.SIGXFSZ, signal.SIG_IGN)
resource.setrlimit(resource.RLIMIT_FSIZE, (100_000, 100_000))
try:
    write_book(book, {0: SheetResults({(1, 1): 5.0})}, in_place=True)
except LockedBookError as error:
    sys.exit(str(error))
"""


@posix
def test_a_write_cut_short_by_the_system_leaves_the_old_file_and_nothing_else(loop: Path) -> None:
    done = subprocess.run(
        [sys.executable, "-c", SMALL_FILES, str(loop)], capture_output=True, text=True, check=False
    )
    assert done.returncode == 1
    assert done.stderr == f"{loop} cannot be written: File too large; nothing was changed\n"
    assert values(open_book(loop)) == {0.0}
    only(loop)


@pytest.fixture
def closed(loop: Path) -> Iterator[Path]:
    """The workbook in a folder that all can read and nobody can write."""
    folder = Path(tempfile.mkdtemp())
    path = Path(shutil.copy(loop, folder))
    path.chmod(0o666)
    folder.chmod(0o555)
    yield path
    folder.chmod(0o755)
    shutil.rmtree(folder)


def test_a_read_only_folder_is_refused_in_one_line(closed: Path, ordinary_user: None) -> None:
    book = open_book(closed)
    for where in ({"in_place": True}, {"out": closed.with_name("new.xlsx")}):
        with pytest.raises(LockedBookError, match="Permission denied; nothing was changed"):
            write_book(book, all_set_to(1.0), **where)  # type: ignore[arg-type]
    only(closed)


def test_a_read_only_file_and_a_missing_folder_are_refused(loop: Path) -> None:
    loop.chmod(0o444)
    with pytest.raises(LockedBookError, match="read-only"):
        write_book(open_book(loop), all_set_to(1.0), in_place=True)
    with pytest.raises(LockedBookError, match="No such file or directory"):
        write_book(open_book(loop), all_set_to(1.0), loop.parent / "none" / "new.xlsx")
    (loop.parent / "folder.xlsx").mkdir()
    with pytest.raises(LockedBookError, match="nothing was changed"):
        write_book(open_book(loop), all_set_to(1.0), loop.parent / "folder.xlsx")
    only(loop, "folder.xlsx")


def test_an_interruption_leaves_the_old_file_and_nothing_else(
    loop: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    def interrupt(*_: object) -> None:
        raise KeyboardInterrupt

    for name in ("_keep_permissions", "_back_up", "_rename"):
        with monkeypatch.context() as patch:
            patch.setattr(placing, name, interrupt)
            with pytest.raises(KeyboardInterrupt):
                write_book(open_book(loop), all_set_to(1.0), in_place=True, keep_backup=name != "_rename")
        assert values(open_book(loop)) == {0.0}
        only(loop)


@posix
def test_strays_of_killed_runs_are_removed_but_not_files_still_being_written(loop: Path) -> None:
    import fcntl

    stray = loop.with_name(".loop.xlsx.00000000.xleq-part")
    other = loop.with_name(".other.xlsx.00000000.xleq-part")
    busy = loop.with_name(".loop.xlsx.11111111.xleq-part")
    for path in (stray, other, busy):
        path.touch()
    with busy.open("rb") as file:
        fcntl.flock(file, fcntl.LOCK_EX)
        write_book(open_book(loop), all_set_to(1.0), in_place=True, keep_backup=False)
    only(loop, other.name, busy.name)


WRITER = """
import sys
from xleq.workbook import SheetResults, open_book, write_book
print("ready", flush=True)
n = 0.0
while True:
    n += 1
    write_book(open_book(sys.argv[1]), {0: SheetResults({(r, 1): n for r in range(1, 41)})}, in_place=True,
               keep_backup=sys.argv[2] == "1")
"""


def kill_at_random(loop: Path, times: int) -> None:
    chance = random.Random(20)
    for n in range(times):
        command = [sys.executable, "-c", WRITER, str(loop), str(n % 2)]
        with subprocess.Popen(command, stdout=subprocess.PIPE) as run:
            assert run.stdout is not None
            assert run.stdout.readline() == b"ready\n"
            time.sleep(chance.uniform(0.0, 0.06))
            run.send_signal(signal.SIGKILL)
        for path in loop.parent.glob("loop*.xlsx"):
            with zipfile.ZipFile(path) as archive:
                assert archive.testzip() is None
            assert len(values(open_book(path))) == 1, "a file is a mixture of two runs"
    write_book(open_book(loop), all_set_to(-1.0), in_place=True, keep_backup=False)
    assert not list(loop.parent.glob(".*"))
    backups = {path.stat().st_ino for path in loop.parent.glob("loop.backup*.xlsx")}
    assert loop.stat().st_ino not in backups


@posix
def test_the_file_is_whole_after_ten_kills_at_random_instants(loop: Path) -> None:
    kill_at_random(loop, 10)


@posix
@pytest.mark.slow
def test_the_file_is_whole_after_a_hundred_kills_at_random_instants(loop: Path) -> None:
    kill_at_random(loop, 100)
