"""Small parts of a workbook: settings, names, tables, number formats.

They are read from their XML, not through openpyxl's reader: that one finds no sheet in a strict workbook
and tables only while it loads all cells (5 s for 110,000), and each of these parts is a dozen lines. What
is openpyxl's here is the table of built-in number formats; the tests hold every part against openpyxl.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from typing import NamedTuple, overload

from xleq.errors import DamagedBookError, ParseError
from xleq.workbook.markup import Node, unescaped
from xleq.workbook.package import Package
from xleq.workbook.records import Calculation, DefinedName, SheetKind, SheetState, Table, parse_area

#: Built-in formats of East Asian dates (ECMA-376 part 1, 18.8.30); openpyxl leaves them out.
_EAST_ASIAN_DATES = frozenset((*range(27, 37), *range(50, 59)))
_SHORT_DATE = 14


class Tab(NamedTuple):
    """A sheet as the workbook lists it."""

    name: str
    part: str
    kind: SheetKind
    state: SheetState


class NumberFormats(Sequence[str]):
    """Number-format codes by style index.

    Looked up when asked: most runs ask for none, and importing openpyxl costs 0.15 s.
    """

    def __init__(self, ids: Sequence[int], custom: dict[int, str]) -> None:
        self._ids = ids
        self._custom = custom

    def __len__(self) -> int:
        return len(self._ids)

    @overload
    def __getitem__(self, index: int) -> str: ...
    @overload
    def __getitem__(self, index: slice) -> Sequence[str]: ...
    def __getitem__(self, index: int | slice) -> str | Sequence[str]:
        if isinstance(index, slice):
            return NumberFormats(self._ids[index], self._custom)
        number = self._ids[index]
        if number == 0 or number in self._custom:
            return self._custom.get(number, "General")
        from openpyxl.styles.numbers import BUILTIN_FORMATS

        code: str = BUILTIN_FORMATS.get(_SHORT_DATE if number in _EAST_ASIAN_DATES else number, "General")
        return code

    def __iter__(self) -> Iterator[str]:
        return (self[index] for index in range(len(self._ids)))


def read_tabs(package: Package, workbook: Node, part: str) -> list[Tab]:
    """The sheets in the order of their tabs, each with its member of the archive."""
    by_id = {link.id: link for link in package.relationships(part)}
    kinds = {kind.value: kind for kind in SheetKind} | {"xlMacrosheet": SheetKind.MACRO}
    states = {state.value: state for state in SheetState}
    tabs = []
    for node in workbook.inside("sheets", "sheet"):
        name = unescaped(node.get("name"))
        link = by_id.get(node.get("id"))
        if link is None or link.outside or link.type not in kinds:
            raise DamagedBookError(f"has no part for sheet {name!r}")
        state = states.get(node.get("state"), SheetState.VISIBLE)
        tabs.append(Tab(name, package.member(link.target), kinds[link.type], state))
    if not tabs:
        raise DamagedBookError("has no sheets")
    return tabs


def read_names(workbook: Node, n_sheets: int) -> tuple[DefinedName, ...]:
    """Defined names of the workbook and of its sheets; a name of no existing sheet is dropped."""
    names = []
    for node in workbook.inside("definedNames", "definedName"):
        scope_text = node.get("localSheetId")
        scope = int(scope_text) if scope_text.isdecimal() else None
        if node.get("name") and (scope is None or scope < n_sheets):
            is_macro = node.flag("function") or node.flag("vbProcedure") or node.flag("xlm")
            text = unescaped(node.text).removeprefix("=")
            names.append(DefinedName(unescaped(node.get("name")), text, scope, node.flag("hidden"), is_macro))
    return tuple(names)


def read_calculation(workbook: Node) -> Calculation:
    """Calculation settings, with the defaults of the format for what the file leaves out."""
    node = workbook.first("calcPr")
    if node is None:
        return Calculation()
    plain = Calculation()
    try:
        return Calculation(
            iterate=node.flag("iterate"),
            max_iterations=int(node.get("iterateCount", str(plain.max_iterations))),
            max_change=float(node.get("iterateDelta", str(plain.max_change))),
            manual=node.get("calcMode") == "manual",
            full_calc_on_load=node.flag("fullCalcOnLoad"),
            full_precision=node.flag("fullPrecision", True),
            r1c1=node.get("refMode") == "R1C1",
        )
    except ValueError as error:
        raise DamagedBookError(f"has calculation settings that cannot be read: {error}") from error


def uses_1904(workbook: Node) -> bool:
    """Whether serial dates count from 1904."""
    node = workbook.first("workbookPr")
    return node is not None and node.flag("date1904")


def read_table(package: Package, part: str, sheet: int) -> tuple[Table, range]:
    """A table, and the rows that an active filter of it rules (an empty range when none does)."""
    node = package.tree(part)
    try:
        area = parse_area(node.get("ref"))
        header_rows = int(node.get("headerRowCount", "1"))
        totals_rows = int(node.get("totalsRowCount", "0"))
    except (ParseError, ValueError) as error:
        raise DamagedBookError(f"has a table that cannot be read, {part!r}: {error}") from error
    columns = tuple(unescaped(column.get("name")) for column in node.inside("tableColumns", "tableColumn"))
    name = unescaped(node.get("displayName") or node.get("name"))
    filtered = range(0)
    if node.inside("autoFilter", "filterColumn"):
        filtered = range(area.top + header_rows, area.bottom - totals_rows + 1)
    return Table(name, sheet, area, header_rows, totals_rows, columns), filtered


def read_formats(package: Package, part: str | None) -> NumberFormats:
    """Number-format codes of the workbook's cell formats, by style index."""
    if part is None or not package.has(part):
        return NumberFormats([0], {})
    styles = package.tree(part)
    custom = {}
    for node in styles.inside("numFmts", "numFmt"):
        number = node.get("numFmtId")
        if number.isdecimal():
            custom[int(number)] = unescaped(node.get("formatCode"))
    ids = [node.get("numFmtId", "0") for node in styles.inside("cellXfs", "xf")]
    return NumberFormats([int(text) if text.isdecimal() else 0 for text in ids] or [0], custom)
