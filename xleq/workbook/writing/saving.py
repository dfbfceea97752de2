"""Writing results into a copy of a workbook, or into the workbook itself."""

from __future__ import annotations

import re
from dataclasses import dataclass
from os import PathLike
from pathlib import Path
from typing import IO, Final

from xleq.errors import BookError, DamagedBookError, LockedBookError, SignedBookError
from xleq.workbook.collecting import collection_paused
from xleq.workbook.limits import Limits
from xleq.workbook.markup import bare, feed, new_parser
from xleq.workbook.package import Package, about
from xleq.workbook.records import Book, Results
from xleq.workbook.writing.archive import copy_archive
from xleq.workbook.writing.edits import edits_of
from xleq.workbook.writing.patching import in_utf8, patched
from xleq.workbook.writing.placing import open_elsewhere, place
from xleq.workbook.writing.scanning import START_TAG

_ON_LOAD: Final = re.compile(rb"\sfullCalcOnLoad\s*=\s*(?:\"[^\"]*\"|'[^']*')")
#: What stands after `calcPr` in a workbook part.
_AFTER_CALCULATION: Final = frozenset(
    (
        "oleSize",
        "customWorkbookViews",
        "pivotCaches",
        "smartTagPr",
        "smartTagTypes",
        "webPublishing",
        "fileRecoveryPr",
        "webPublishObjects",
        "extLst",
    )
)


@dataclass(frozen=True, slots=True)
class Written:
    """What a write did.

    Parameters
    ----------
    path : Path
        The file.
    backup : Path or None
        Where the old file is kept, after a write in place.
    n_cells : int
        Cells that were rewritten, created or emptied.
    parts : tuple of str
        Members of the archive that changed.
    """

    path: Path
    backup: Path | None
    n_cells: int
    parts: tuple[str, ...]


def write_book(
    book: Book,
    results: Results,
    out: str | PathLike[str] | None = None,
    *,
    in_place: bool = False,
    keep_backup: bool = True,
    recalculate_on_load: bool | None = None,
    limits: Limits | None = None,
) -> Written:
    """Put results into a copy of the workbook; every other byte of every member stays as it is.

    Parameters
    ----------
    book : Book
        As `open_book` gave it. The file must not have changed since.
    results : dict
        Index of a sheet → its `SheetResults`.
    out : path, optional
        Where the copy goes; a file there is replaced. Not the workbook itself.
    in_place : bool
        Replace the workbook itself instead. When nothing changes, it is not touched.
    keep_backup : bool
        In place only: keep the old file as ``name.backup.xlsx``, ``name.backup-2.xlsx`` …
    recalculate_on_load : bool, optional
        Whether the file asks Excel to calculate it when it is opened; None leaves what it says.
    limits : Limits, optional
        As for `open_book`.

    Returns
    -------
    Written

    Raises
    ------
    SignedBookError
        If the workbook is signed.
    LockedBookError
        If the target is open elsewhere or cannot be written, or the workbook changed since it was read.
    InputError
        If a result does not belong where it is to go.
    BookError
        If the workbook can no longer be read, or `out` is the workbook itself.
        Whatever is raised, nothing has been written.
    """
    source = Path(book.path)
    target = _target(source, out, in_place)
    with about(source):
        if book.is_signed:
            raise SignedBookError("is digitally signed, and a change would break the signature")
        package = Package(source, limits or Limits())
    with package:
        with about(source), collection_paused():
            _refuse_changed(package.stamp, book)
            changed, n_cells = _changes(book, results, package, recalculate_on_load)
        if in_place and not changed:
            return Written(target, None, 0, ())

        def fill(file: IO[bytes]) -> None:
            with about(source):
                copy_archive(package.zip, file, changed)
                package.zip.close()  # where an open file cannot be replaced
                status = source.stat()
                _refuse_changed((status.st_size, status.st_mtime_ns), book)

        backup = place(target, fill, source, in_place and keep_backup)
    return Written(target, backup, n_cells, tuple(changed))


def _target(source: Path, out: str | PathLike[str] | None, in_place: bool) -> Path:
    """Where the result goes; refused when that is open elsewhere, read-only or the wrong kind of file."""
    if in_place == (out is not None):
        raise BookError(f"{source} can be written in place or to another file: say one of the two")
    target = source.resolve() if out is None else Path(out)
    if out is not None:
        if target.exists() and source.exists() and target.samefile(source):
            raise BookError(f"{target} is the workbook itself: write in place to replace it")
        if target.suffix.casefold() != source.suffix.casefold():
            raise BookError(
                f"{target} must end in {source.suffix!r} as {source.name} does, or no program opens it"
            )
    lock = open_elsewhere(target)
    if lock is not None:
        raise LockedBookError(f"{target} is open elsewhere, as the lock file {lock.name!r} beside it says")
    return target


def _refuse_changed(stamp: tuple[int, int], book: Book) -> None:
    if stamp != book.stamp:
        raise LockedBookError("has changed since it was read: read it again")


def _changes(
    book: Book, results: Results, package: Package, recalculate_on_load: bool | None
) -> tuple[dict[str, bytes], int]:
    """New bytes of the members that change, and the number of cells edited."""
    changed: dict[str, bytes] = {}
    n_cells = 0
    for index, found in sorted(results.items()):
        sheet = book.sheets[index]
        edits = edits_of(sheet, found)
        if edits:
            part = f"sheet {sheet.name!r}"
            data = patched(package.read(sheet.part), edits, part)
            feed(new_parser(), part, data)  # a last look: what is written can be read
            changed[sheet.part] = data
            n_cells += len(edits)
    if recalculate_on_load is not None and book.calculation.full_calc_on_load != recalculate_on_load:
        data = in_utf8(package.read(book.workbook_part))
        changed[book.workbook_part] = with_recalculation(data, recalculate_on_load)
    return changed, n_cells


def with_recalculation(data: bytes, wanted: bool) -> bytes:
    """A workbook part that asks, or does not ask, to be calculated when it is opened.

    Examples
    --------
    >>> main = b'<workbook xmlns="http://schemas.openxmlformats.org/spreadsheetml/2006/main">'
    >>> with_recalculation(main + b'<calcPr calcId="1"/><extLst/></workbook>', True)[len(main):]
    b'<calcPr calcId="1" fullCalcOnLoad="1"/><extLst/></workbook>'
    >>> with_recalculation(main + b'<sheets/><extLst/></workbook>', True)[len(main):]
    b'<sheets/><calcPr fullCalcOnLoad="1"/><extLst/></workbook>'
    """
    children: list[tuple[str, int]] = []
    depth = 0
    parser = new_parser()

    def start(name: str, _: dict[str, str]) -> None:
        nonlocal depth
        depth += 1
        if depth <= 2:
            children.append((bare(name), parser.CurrentByteIndex))

    def end(_: str) -> None:
        nonlocal depth
        depth -= 1

    parser.StartElementHandler, parser.EndElementHandler = start, end
    feed(parser, "the workbook part", data)
    at = next((at for name, at in children if name == "calcPr"), None)
    if at is None:
        return _with_new_settings(data, children) if wanted else data
    tag = START_TAG.match(data, at)
    if tag is None:
        raise DamagedBookError("has calculation settings that cannot be found in its bytes")
    text = _ON_LOAD.sub(b"", tag[0])
    if wanted:
        closing = b"/>" if text.endswith(b"/>") else b">"
        text = text.removesuffix(closing).rstrip() + b' fullCalcOnLoad="1"' + closing
    return data[:at] + text + data[tag.end() :]


def _with_new_settings(data: bytes, children: list[tuple[str, int]]) -> bytes:
    tag = data[children[0][1] + 1 : data.index(b"workbook", children[0][1])]
    at = next((at for name, at in children if name in _AFTER_CALCULATION), data.rindex(b"</"))
    return data[:at] + b'<%bcalcPr fullCalcOnLoad="1"/>' % tag + data[at:]
