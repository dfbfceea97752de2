"""What the words in formulas mean: sheets, linked books, defined names, tables, spilled ranges."""

from __future__ import annotations

from collections.abc import Mapping
from typing import TYPE_CHECKING, Final

from xleq.cells import REF, CellError, Value
from xleq.errors import FormulaError
from xleq.recalc.context import Context
from xleq.recalc.operands import Area, Operand, Ref
from xleq.recalc.program.references import Run, constant
from xleq.recalc.sheets.columns import Blocked, Cells, Unsupported
from xleq.recalc.syntax import tree
from xleq.recalc.syntax.parse import parse
from xleq.workbook import Book, DefinedName, SheetKind, Table

if TYPE_CHECKING:
    from xleq.recalc.program.compile import Compiler

_NO_ROW: Final = CellError("#VALUE!", "the formula's row is not one of the table's")


class Names:
    """The words of one workbook.

    Parameters
    ----------
    book : Book
    stores : list of Cells
        Cells of each sheet; those of the sheets of linked books are added.
    """

    def __init__(self, book: Book, stores: list[Cells]) -> None:
        self.stores = stores
        #: Areas that dynamic formulas fill, by (sheet, row, column).
        self.spills: dict[tuple[int, int, int], Area] = {}
        self._worksheets = [i for i, s in enumerate(book.sheets) if s.kind is SheetKind.WORKSHEET]
        self._sheets: dict[tuple[str, str], int] = {
            ("", sheet.name.casefold()): index for index, sheet in enumerate(book.sheets)
        }
        self.n_own = len(book.sheets)
        for link in book.links:
            by_sheet: dict[str, dict[tuple[int, int], Value]] = {name: {} for name in link.sheets}
            for (sheet, row, column), value in link.values.items():
                by_sheet.setdefault(sheet, {})[(row, column)] = value
            for name, values in by_sheet.items():
                self._sheets[(str(link.index), name.casefold())] = len(stores)
                stores.append(Cells(len(stores), values, {}))
        self._linked: Mapping[str, Mapping[str, str]] = {
            str(link.index): {k.casefold(): v for k, v in link.names.items()} for link in book.links
        }
        self._global: dict[str, DefinedName] = {}
        self._local: dict[tuple[int, str], DefinedName] = {}
        for defined in book.names:
            if defined.scope is None:
                self._global[defined.name.casefold()] = defined
            else:
                self._local[(defined.scope, defined.name.casefold())] = defined
        self.tables: dict[str, Table] = {table.name.casefold(): table for table in book.tables}
        self._runs: dict[tuple[str, str, int], Run] = {}

    def sheets(self, place: tree.Place | None, own: int) -> list[int]:
        """Indices of the sheets that a reference names; none if one is missing.

        Raises
        ------
        Unsupported
            If they are in a linked book whose values are not in the file.
        """
        if place is None or not (place.first or place.book):
            return [own]
        book = "" if place.book == "0" else place.book
        first = self._sheets.get((book, place.first.casefold()))
        if first is None and book:
            raise Unsupported(f"the linked book [{book}] has no values of {place.first!r} in this file")
        if not place.last:
            return [] if first is None else [first]
        last = self._sheets.get((book, place.last.casefold()))
        if first is None or last is None:
            return []
        low, high = min(first, last), max(first, last)
        return [i for i in range(low, high + 1) if book or i in self._worksheets]

    def one_sheet(self, place: tree.Place | None, own: int) -> int | None:
        """The sheet of a reference to one sheet; None if it is missing."""
        found = self.sheets(place, own)
        return found[0] if len(found) == 1 else None

    def defined(self, node: tree.Name, own: int) -> DefinedName | None:
        """The defined name that a name means: the sheet's own before the workbook's."""
        word = node.name.casefold()
        sheet: int | None = own
        if node.place is not None:
            if node.place.book not in ("", "0"):
                return None
            if node.place.first:
                sheet = self._sheets.get(("", node.place.first.casefold()))
        return self._local.get((-1 if sheet is None else sheet, word)) or self._global.get(word)

    def has(self, name: str, own: int) -> bool:
        """Whether there is a defined name."""
        return self.defined(tree.Name(None, name), own) is not None

    def plain(self, node: tree.Name, own: int, scope: Mapping[str, int]) -> tree.Node:
        """The cell or constant that a name stands for, where it is as simple as that, else the name."""
        if node.place is None and node.name.lower() in scope:
            return node
        defined = self.defined(node, own)
        if defined is None or defined.is_macro:
            return node
        try:
            found = parse(defined.text)
        except FormulaError:
            return node
        return found if isinstance(found, tree.Cells | tree.Literal) else node

    def run(self, node: tree.Name, own: int, compiler: Compiler) -> Run:
        """A name compiled; what it stands for is compiled at its first use, for it may name itself."""
        place = node.place
        if place is not None and place.book not in ("", "0"):
            return self._linked_name(place.book, node.name, compiler)
        key = (node.name.casefold(), "" if place is None else place.first.casefold(), own)
        known = self._runs.get(key)
        if known is not None:
            return known
        defined = self.defined(node, own)
        if defined is None:
            table = self.tables.get(node.name.casefold())
            if table is None:
                return constant(CellError("#NAME?", f"nothing is named {node.name}"))
            return self.structured(tree.Structured(table.name, (), "", ""), own)
        if defined.is_macro:
            return _unsupported(f"{node.name} is a macro")
        self._runs[key] = found = _late(defined.text, node.name, compiler)
        return found

    def _linked_name(self, book: str, name: str, compiler: Compiler) -> Run:
        text = self._linked.get(book, {}).get(name.casefold(), "")
        if not text:
            return _unsupported(f"the name {name} of the linked book [{book}] has no value in this file")
        node = parse(text)
        if not isinstance(node, tree.Cells) or node.place is None:
            return _unsupported(f"the name {name} of the linked book [{book}] is a formula")
        moved = tree.Cells(
            tree.Place(book, node.place.first, node.place.last), node.rows, node.columns, node.fixed
        )
        return compiler.cells(moved)

    def spilled(self, at: Context, operand: Operand) -> Operand:
        """The area that the formula in a cell fills."""
        if isinstance(operand, CellError):
            return operand
        if not isinstance(operand, Ref) or len(operand.areas) != 1:
            return REF
        area = operand.areas[0]
        spot = (area.top, area.left)
        store = self.stores[area.sheet]
        if not store.is_final(spot):
            raise Blocked([(area.sheet, *store.waiting[spot])])
        value = store.miss(at, *spot) if spot not in store.values else store.values[spot]
        found = self.spills.get((area.sheet, *spot))
        if found is None:
            return value if isinstance(value, CellError) else REF
        return Ref((found,))

    def structured(self, node: tree.Structured, own: int) -> Run:
        """A structured reference."""
        if node.table:
            table = self.tables.get(node.table.casefold())
            if table is None:
                return constant(CellError("#REF!", f"there is no table {node.table}"))
            return _of_table(table, node)

        def run(at: Context) -> Operand:
            for candidate in self.tables.values():
                if candidate.sheet == at.sheet and candidate.area.holds(at.row, at.column):
                    return _of_table(candidate, node)(at)
            return REF

        return run


def _late(text: str, name: str, compiler: Compiler) -> Run:
    compiled: list[Run] = []

    def run(at: Context) -> Operand:
        if not compiled:
            try:
                node = parse(text)
            except FormulaError as error:
                raise Unsupported(f"the name {name}: {error}") from None
            compiled.append(compiler.operand(node, True, {}))
        before = at.locals
        at.locals = ()
        try:
            return compiled[0](at)
        finally:
            at.locals = before

    return run


def _unsupported(reason: str) -> Run:
    def run(at: Context) -> Operand:
        raise Unsupported(reason)

    return run


def _of_table(table: Table, node: tree.Structured) -> Run:
    """The part of a table that items and columns name."""
    top, left, bottom, right = table.area
    names = [name.casefold() for name in table.columns]
    ends = []
    for column in (node.first, node.last or node.first):
        if not column:
            ends = [left, right]
            break
        if column.casefold() not in names:
            return constant(CellError("#REF!", f"the table {table.name} has no column {column!r}"))
        ends.append(left + names.index(column.casefold()))
    left, right = min(ends), max(ends)
    first, last = top + table.header_rows, bottom - table.totals_rows
    items = set(node.items)
    if "#this row" in items:

        def this_row(at: Context) -> Operand:
            if not first <= at.row <= last:
                return _NO_ROW
            return Ref((Area(table.sheet, at.row, left, at.row, right),))

        return this_row
    rows: list[tuple[int, int]] = []
    if "#all" in items:
        rows = [(top, bottom)]
    else:
        if "#headers" in items:
            rows.append((top, top) if table.header_rows else (0, 0))
        if "#data" in items or not items:
            rows.append((first, last))
        if "#totals" in items:
            rows.append((bottom, bottom) if table.totals_rows else (0, 0))
    rows = [r for r in rows if r[0]]
    if not rows:
        return constant(CellError("#REF!", f"the table {table.name} has no such row"))
    area = Area(table.sheet, min(r[0] for r in rows), left, max(r[1] for r in rows), right)
    return constant(Ref((area,)))
