"""Cells that a formula names, whether or not its evaluation reads them."""

from __future__ import annotations

from collections.abc import Iterator
from typing import TYPE_CHECKING

from xleq.errors import FormulaError
from xleq.recalc import tree
from xleq.recalc.columns import Unsupported
from xleq.recalc.context import Context
from xleq.recalc.operands import Area, Ref
from xleq.recalc.parse import parse
from xleq.recalc.references import area_of

if TYPE_CHECKING:
    from xleq.recalc.evaluate import Cell, Engine


def areas_of(engine: Engine, cell: Cell) -> list[Area]:
    """Areas that a cell's formula names, those behind names and tables too."""
    sheet, row, column = cell
    formula = engine.book.sheets[sheet].formulas.get((row, column))
    if formula is None or formula.text is None:
        return []
    try:
        node = engine.program(cell, formula).node
    except Unsupported:
        return []
    at = Context(engine, sheet, row, column, False)
    return list(dict.fromkeys(_areas(engine, node, at, frozenset())))


def _areas(engine: Engine, node: tree.Node, at: Context, seen: frozenset[str]) -> Iterator[Area]:
    match node:
        case tree.Cells():
            try:
                sheets = engine.names.sheets(node.place, at.sheet)
            except Unsupported:
                return
            for sheet in sheets:
                yield area_of(sheet, node)(at)
        case tree.Structured():
            found = engine.names.structured(node, at.sheet)(at)
            if isinstance(found, Ref):
                yield from found.areas
        case tree.Name():
            word = node.name.casefold()
            defined = engine.names.defined(node, at.sheet)
            if defined is not None and word not in seen and not defined.is_macro:
                try:
                    inner = parse(defined.text)
                except FormulaError:
                    return
                yield from _areas(engine, inner, at, seen | {word})
            elif word in engine.names.tables:
                table = engine.names.tables[word]
                yield Area(table.sheet, *table.area)
        case tree.Prefix() | tree.Postfix():
            yield from _areas(engine, node.operand, at, seen)
        case tree.Infix():
            yield from _areas(engine, node.left, at, seen)
            yield from _areas(engine, node.right, at, seen)
        case tree.Call():
            for argument in node.arguments:
                yield from _areas(engine, argument, at, seen)
        case tree.Apply():
            yield from _areas(engine, node.function, at, seen)
            for argument in node.arguments:
                yield from _areas(engine, argument, at, seen)
        case _:
            return
