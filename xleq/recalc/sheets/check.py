"""The stored-value check: a formula, given its inputs' stored values, must give its own stored value."""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING

from xleq.cells import BLANK, Value
from xleq.recalc.operands import Area, Array
from xleq.recalc.sheets.arrays import padded
from xleq.recalc.sheets.columns import VOLATILE, Blocked, Unsupported
from xleq.recalc.sheets.evaluate import Disagreement, Engine, agree, single_value
from xleq.workbook import Formula, FormulaKind

if TYPE_CHECKING:
    from xleq.recalc.sheets.evaluate import Cell


def recheck(engine: Engine) -> list[Disagreement]:
    """Check the formulas whose inputs changed, each on the stored values of its inputs.

    The others were checked while they were evaluated.
    """
    book = engine.book
    other = Engine(book, engine.functions, replace(engine.settings, check=False), {}, {})
    for sheet in book.sheets:
        store = other.stores[sheet.index]
        store.values.update(sheet.stored)
        store.waiting.clear()
        for spot, written in sheet.formulas.items():
            if written.dynamic and written.area is not None:
                other.names.spills[(sheet.index, *spot)] = Area(sheet.index, *written.area)
    found: list[Disagreement] = []
    for cell in engine.unchecked:
        formula = book.sheets[cell[0]].formulas.get(cell[1:])
        if formula is not None and formula.kind is not FormulaKind.DATA_TABLE:
            found += _check(other, cell, formula)
    return found


def _check(engine: Engine, cell: Cell, formula: Formula) -> list[Disagreement]:
    at = engine.place(cell, array=formula.kind is FormulaKind.ARRAY)
    try:
        program = engine.program(cell, formula)
        result = program.run(at)
    except (Unsupported, Blocked, RecursionError):
        return []
    if at.trust & VOLATILE:
        return []
    sheet, row, column = cell
    stored = engine.book.sheets[sheet].stored
    fresh: dict[tuple[int, int], Value] = {}
    if formula.kind is FormulaKind.ARRAY and formula.area is not None and isinstance(result, Array):
        top, left, bottom, right = formula.area
        values = padded(result, bottom - top + 1, right - left + 1)
        fresh = dict(zip(formula.area.places(), map(single_value, values), strict=True))
    else:
        fresh[(row, column)] = single_value(result)
    # a cell without a stored value has nothing to be held against
    return [
        Disagreement((sheet, *spot), stored[spot], value)
        for spot, value in fresh.items()
        if stored.get(spot, BLANK) is not BLANK and not agree(value, stored[spot], program.tolerance)
    ]
