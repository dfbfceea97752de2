"""Opening a workbook: its archive, its parts, its cells."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field
from os import PathLike
from pathlib import Path

from xleq.errors import DamagedBookError
from xleq.workbook.limits import Limits
from xleq.workbook.markup import Node
from xleq.workbook.package import Package, Relationship, about
from xleq.workbook.reading.links import read_links
from xleq.workbook.reading.metadata import Metadata, read_metadata
from xleq.workbook.reading.parts import (
    read_calculation,
    read_formats,
    read_names,
    read_table,
    read_tabs,
    uses_1904,
)
from xleq.workbook.reading.sheets import read_cells
from xleq.workbook.reading.strings import read_strings
from xleq.workbook.records import Book, Sheet, SheetKind, Table

_SIGNATURES = "_xmlsignatures/"


@dataclass(slots=True)
class _Shared:
    """What every sheet of a workbook is read with."""

    strings: list[str]
    metadata: Metadata
    date_1904: bool
    text_may_be_error: bool
    limits: Limits
    n_cells: int = field(default=0)


def open_book(path: str | PathLike[str], limits: Limits | None = None) -> Book:
    """Read a workbook: structure, formulas, stored values. Nothing is run, followed or fetched.

    Parameters
    ----------
    path : path
        An ``.xlsx``, ``.xlsm``, ``.xltx`` or ``.xltm`` file.
    limits : Limits, optional
        What is too large.

    Returns
    -------
    Book

    Raises
    ------
    MissingBookError
        If there is no such file.
    EncryptedBookError
        If it needs a password.
    LimitError
        If it is over a limit.
    DamagedBookError
        If it is not a readable workbook: another format, a broken archive, broken XML.
    BookError
        If it is a folder or cannot be read.
        The message is one line that begins with the path.
    """
    path = Path(path)
    with about(path), Package(path, limits or Limits()) as package:
        return _read(package)


def workbook_part(package: Package) -> str:
    """Member that holds the workbook's own settings.

    Raises
    ------
    DamagedBookError
        If there is none, or the file is a binary workbook or another kind of document.
    """
    links = package.relationships()
    found = next((link.target for link in links if link.type == "officeDocument"), None)
    if found is None:
        raise DamagedBookError("is a zip archive but not an Excel workbook")
    if found.casefold().endswith(".bin"):
        raise DamagedBookError("is in the binary .xlsb format: save it as .xlsx or .xlsm")
    return package.member(found)


def _read(package: Package) -> Book:
    part = workbook_part(package)
    workbook = package.tree(part)
    if workbook.name != "workbook":
        raise DamagedBookError("is an office document but not an Excel workbook")
    links = package.relationships(part)
    application = _application(package)
    strings_part = _target(package, links, "sharedStrings")
    shared = _Shared(
        strings=read_strings(package, strings_part) if strings_part else [],
        metadata=read_metadata(package, links),
        date_1904=uses_1904(workbook),
        # Other programs store an error as text; in Excel's own files text stays what it is.
        text_may_be_error="excel" not in application.casefold(),
        limits=package.limits,
    )
    formats = read_formats(package, _target(package, links, "styles"))
    sheets, tables = _read_sheets(package, workbook, part, shared, formats)
    return Book(
        path=package.path,
        sheets=sheets,
        names=read_names(workbook, len(sheets)),
        tables=tables,
        links=read_links(package, workbook, part),
        date_1904=shared.date_1904,
        calculation=read_calculation(workbook),
        has_macros=_target(package, links, "vbaProject") is not None,
        is_signed=any(key.startswith(_SIGNATURES) for key in package.member_keys()),
        application=application,
        workbook_part=part,
        stamp=package.stamp,
    )


def _read_sheets(
    package: Package, workbook: Node, part: str, shared: _Shared, formats: Sequence[str]
) -> tuple[tuple[Sheet, ...], tuple[Table, ...]]:
    sheets: list[Sheet] = []
    tables: list[Table] = []
    for index, tab in enumerate(read_tabs(package, workbook, part)):
        sheet = Sheet(tab.name, index, tab.part, tab.kind, tab.state, formats=formats)
        if tab.kind is SheetKind.WORKSHEET:
            read_cells(sheet, package.read(tab.part), shared)
            _read_tables(package, sheet, tables)
        sheets.append(sheet)
    return tuple(sheets), tuple(tables)


def _read_tables(package: Package, sheet: Sheet, tables: list[Table]) -> None:
    for link in package.relationships(sheet.part):
        if link.type == "table" and not link.outside:
            table, filtered = read_table(package, link.target, sheet.index)
            tables.append(table)
            sheet.filtered_rows |= sheet.hidden_rows.intersection(filtered)


def _target(package: Package, links: list[Relationship], kind: str) -> str | None:
    """The member of a kind that the workbook names and the archive holds."""
    return next((k.target for k in links if k.type == kind and not k.outside and package.has(k.target)), None)


def _application(package: Package) -> str:
    for link in package.relationships():
        if link.type in {"extended-properties", "extendedProperties"} and package.has(link.target):
            for node in package.tree(link.target).children:
                if node.name.endswith(" Application"):
                    return node.text
    return ""
