"""Cells that a formula names, whether or not its evaluation reads them."""

from __future__ import annotations

from collections.abc import Iterator
from typing import TYPE_CHECKING, NamedTuple

from xleq.cells import CellAddress
from xleq.errors import FormulaError
from xleq.recalc.context import Context
from xleq.recalc.depth import deep
from xleq.recalc.operands import Area, Ref
from xleq.recalc.program.references import area_of
from xleq.recalc.sheets.columns import Unsupported
from xleq.recalc.syntax import tree
from xleq.recalc.syntax.parse import parse
from xleq.workbook import Area as BookArea
from xleq.workbook import Book

if TYPE_CHECKING:
    from xleq.recalc.sheets.evaluate import Cell, Engine


class Named(NamedTuple):
    """An area that a formula names.

    Parameters
    ----------
    sheet : str
        Name of its sheet.
    area : Area
        Whole rows and columns as they are written.
    """

    sheet: str
    area: BookArea


class Precedents:
    """What the formulas of a workbook name.

    Parameters
    ----------
    book : Book
    """

    def __init__(self, book: Book) -> None:
        from datetime import datetime

        from xleq.recalc.sheets.evaluate import Engine, Settings

        self._engine = Engine(book, {}, Settings(datetime(2000, 1, 1), check=False), {}, {})

    def of(self, address: CellAddress) -> list[Named]:
        """Areas that the formula of a cell names, in the order of its text; none for a constant.

        Names and tables are followed. What INDIRECT and OFFSET find is not known from the text.
        """
        sheet = self._engine.book.sheet_named(address.sheet)
        if sheet is None:
            return []
        names = self._engine.sheet_names
        return [
            Named(names[area.sheet], BookArea(*area[1:]))
            for area in areas_of(self._engine, (sheet.index, address.row, address.column))
            if area.sheet < len(names)
        ]

    def tree(self, address: CellAddress) -> tree.Node | None:
        """Syntax tree of a cell's formula, references relative to the cell; None where there is none."""
        sheet = self._engine.book.sheet_named(address.sheet)
        formula = None if sheet is None else sheet.formulas.get((address.row, address.column))
        if sheet is None or formula is None:
            return None
        try:
            with deep():
                return self._engine.program((sheet.index, address.row, address.column), formula).node
        except (Unsupported, RecursionError):
            return None


def areas_of(engine: Engine, cell: Cell) -> list[Area]:
    """Areas that a cell's formula names, those behind names and tables too."""
    sheet, row, column = cell
    formula = engine.book.sheets[sheet].formulas.get((row, column))
    if formula is None or formula.text is None:
        return []
    try:
        with deep():
            node = engine.program(cell, formula).node
    except (Unsupported, RecursionError):
        return []
    at = Context(engine, sheet, row, column, False)
    return list(dict.fromkeys(_areas(engine, node, at)))


def _areas(engine: Engine, whole: tree.Node, at: Context) -> Iterator[Area]:
    # with a stack of its own: a long sum is a deep tree
    stack: list[tuple[tree.Node, frozenset[str]]] = [(whole, frozenset())]
    while stack:
        node, seen = stack.pop()
        inner: tuple[tree.Node, ...] = ()
        match node:
            case tree.Cells():
                yield from _of_cells(engine, node, at)
            case tree.Structured():
                found = engine.names.structured(node, at.sheet)(at)
                if isinstance(found, Ref):
                    yield from found.areas
            case tree.Name():
                word = node.name.casefold()
                meaning = _meaning(engine, node, at)
                if meaning is not None and word not in seen:
                    inner, seen = (meaning,), seen | {word}
                elif meaning is None and word in engine.names.tables:
                    table = engine.names.tables[word]
                    yield Area(table.sheet, *table.area)
            case tree.Prefix() | tree.Postfix():
                inner = (node.operand,)
            case tree.Infix():
                inner = (node.left, node.right)
            case tree.Call():
                inner = node.arguments
            case tree.Apply():
                inner = (node.function, *node.arguments)
            case _:
                pass
        stack.extend((child, seen) for child in reversed(inner))


def _of_cells(engine: Engine, node: tree.Cells, at: Context) -> list[Area]:
    try:
        return [area_of(sheet, node)(at) for sheet in engine.names.sheets(node.place, at.sheet)]
    except Unsupported:
        return []


def _meaning(engine: Engine, node: tree.Name, at: Context) -> tree.Node | None:
    """Tree of what a defined name stands for; None where there is none that can be read."""
    defined = engine.names.defined(node, at.sheet)
    if defined is None or defined.is_macro:
        return None
    try:
        return parse(defined.text)
    except FormulaError:
        return None
