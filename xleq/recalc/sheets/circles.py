"""Formulas that need each other, iterated as the file says."""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING

from xleq.cells import BLANK, Value
from xleq.recalc.precedents import areas_of
from xleq.recalc.sheets.columns import CHANGED, Blocked

if TYPE_CHECKING:
    from xleq.recalc.sheets.evaluate import Cell, Engine


def iterate(engine: Engine, cells: list[Cell]) -> None:
    """Evaluate the formulas of a circle again and again, in the order of the sheet.

    It ends when no number changes by more than the file's limit, or after the file's number of rounds.
    Rounds start from the stored values; a result within the limit of the stored one is the stored one.
    """
    members = sorted(_circle(engine, cells))
    calculation = engine.book.calculation
    for cell in members:
        stored = engine.book.sheets[cell[0]].stored.get(cell[1:], 0.0)
        engine.stores[cell[0]].put(cell[1:], stored)
    settings = engine.settings
    engine.settings = replace(settings, check=False)
    try:
        _rounds(engine, members)
    finally:
        engine.settings = settings
    for cell in members:
        sheet, spot = cell[0], cell[1:]
        store = engine.stores[sheet]
        before = engine.book.sheets[sheet].stored.get(spot, BLANK)
        value = store.value(spot)
        if store.bits(spot) or not settings.check:
            continue
        if _change(before, value) <= calculation.max_change:
            value = before
        engine.results[sheet][spot] = value
        store.put(spot, value, CHANGED if value is not before else 0)


def _rounds(engine: Engine, members: list[Cell]) -> None:
    calculation = engine.book.calculation
    for _ in range(calculation.max_iterations):
        largest = 0.0
        for cell in members:
            before = engine.stores[cell[0]].value(cell[1:])
            _again(engine, cell)
            largest = max(largest, _change(before, engine.stores[cell[0]].value(cell[1:])))
        if largest < calculation.max_change:
            break


def _again(engine: Engine, cell: Cell) -> None:
    while True:
        try:
            engine.compute(cell)
            return
        except Blocked as blocked:
            for needed in blocked.cells:
                engine.settle(needed)


def _change(before: Value, after: Value) -> float:
    if type(before) is float and type(after) is float:
        return abs(after - before)
    return 0.0 if type(before) is type(after) and before == after else float("inf")


def _circle(engine: Engine, cells: list[Cell]) -> set[Cell]:
    """Every waiting formula that the given ones need and that needs one of them."""
    needs: dict[Cell, list[Cell]] = {}
    todo = list(cells)
    while todo:
        cell = todo.pop()
        if cell in needs:
            continue
        needs[cell] = found = []
        for area in areas_of(engine, cell):
            store = engine.stores[area.sheet]
            for spot, master in store.waiting.items():
                if (
                    area.top <= spot[0] <= area.bottom
                    and area.left <= spot[1] <= area.right
                    and not store.is_final(spot)
                ):
                    found.append((area.sheet, *master))
        todo.extend(found)
    inside = set(cells)
    while True:
        more = {c for c, wanted in needs.items() if c not in inside and any(w in inside for w in wanted)}
        if not more:
            return inside
        inside |= more
