"""Formulas that fill several cells: array formulas with their padding, spills, what-if data tables."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from typing import TYPE_CHECKING

from xleq.cells import BLANK, MAX_COLUMN, MAX_ROW, CellError, Value, parse_address
from xleq.recalc.operands import Area, Array, Operand, Ref
from xleq.recalc.program.operators import stretched
from xleq.recalc.sheets.columns import CHANGED, KEPT, Cells, Spot, Unsupported
from xleq.workbook import Formula, FormulaKind

if TYPE_CHECKING:
    from xleq.recalc.sheets.evaluate import Cell, Engine


class Spreader:
    """Puts results into the cells that they fill.

    Parameters
    ----------
    engine : Engine
    areas : mapping
        (sheet, row, column) of dynamic formulas → area that they are known to fill.
    """

    def __init__(self, engine: Engine, areas: Mapping[Cell, Area]) -> None:
        self.engine = engine
        self.areas = areas
        #: Areas that dynamic formulas filled.
        self.spills: dict[Cell, Area] = {}
        #: Dynamic formulas that fill cells which nobody expected them to.
        self.grown: dict[Cell, Area] = {}
        self._owners: dict[int, dict[Spot, Spot]] = {}

    def area(self, cell: Cell, formula: Formula) -> Area:
        """The area that a formula is expected to fill."""
        known = self.areas.get(cell)
        if known is not None:
            return known
        if formula.area is None or formula.kind is FormulaKind.PLAIN:
            return Area(*cell, *cell[1:])
        return Area(cell[0], *formula.area)

    def cells(self, index: int) -> Cells:
        """The cells of a sheet before anything is evaluated."""
        sheet = self.engine.book.sheets[index]
        waiting: dict[Spot, Spot] = {spot: spot for spot in sheet.formulas}
        for spot, formula in sheet.formulas.items():
            if formula.kind is not FormulaKind.PLAIN:
                area = self.area((index, *spot), formula)
                for child in _spots(area):
                    waiting.setdefault(child, spot)
        for sheet_index, row, column in self.engine.inputs:
            if sheet_index == index:
                waiting.pop((row, column), None)
        values = {}
        for spot, value in sheet.stored.items():
            if spot not in waiting:
                if type(value) is CellError and not value.origin:
                    value = CellError(value.code, value.reason, self.engine.name_of((index, *spot)))
                values[spot] = value
        self._owners[index] = waiting
        return Cells(index, values, waiting)

    def filled_by(self, cell: Cell) -> list[Spot]:
        """Cells that a formula is expected to fill."""
        sheet, row, column = cell
        formula = self.engine.book.sheets[sheet].formulas[(row, column)]
        if formula.kind is FormulaKind.PLAIN:
            return [(row, column)]
        owners = self._owners[sheet]
        return [s for s in _spots(self.area(cell, formula)) if owners.get(s) == (row, column)]

    def fill(self, cell: Cell, formula: Formula, result: Operand, bits: int) -> None:
        """Put a result into the cells of an array formula, of a spill or of a data table."""
        if isinstance(result, Ref):
            raise Unsupported("a reference to several areas where values are wanted")
        if formula.dynamic:
            self._spill(cell, formula, result, bits)
            return
        area = self.area(cell, formula)
        self.engine.names.spills[cell] = area
        height, width = area.bottom - area.top + 1, area.right - area.left + 1
        whole = result if isinstance(result, Array) else Array(1, 1, [result])
        self._put(cell, area, padded(whole, height, width), bits)

    def _put(self, cell: Cell, area: Area, values: list[Value], bits: int) -> None:
        from xleq.recalc.sheets.evaluate import single_value

        owners = self._owners[cell[0]]
        for spot, value in zip(_spots(area), values, strict=True):
            if owners.get(spot, cell[1:]) == cell[1:]:
                self.engine.finish((cell[0], *spot), single_value(value), bits)

    def _spill(self, cell: Cell, formula: Formula, result: Operand, bits: int) -> None:
        sheet, row, column = cell
        expected = self.area(cell, formula)
        if not isinstance(result, Array):
            area, values = Area(*cell, row, column), [result]
        else:
            area = Area(sheet, row, column, row + result.height - 1, column + result.width - 1)
            values = list(result.flat)
        blocker = self._blocker(cell, area)
        if blocker:
            area = Area(*cell, row, column)
            values = [CellError("#SPILL!", blocker)]
        store = self.engine.stores[sheet]
        owners = self._owners[sheet]
        for spot in _spots(expected):
            if not _holds(area, spot) and owners.get(spot) == (row, column):
                was_blank = self.engine.book.sheets[sheet].stored.get(spot, BLANK) is BLANK
                self.engine.results[sheet][spot] = BLANK
                store.put(spot, BLANK, 0 if was_blank or not self.engine.settings.check else CHANGED)
        for spot in _spots(area):
            owners.setdefault(spot, (row, column))
        self.spills[cell] = area
        self.engine.names.spills[cell] = area
        if area.bottom > expected.bottom or area.right > expected.right:
            self.grown[cell] = area
        self._put(cell, area, values, bits)  # type: ignore[arg-type]

    def _blocker(self, cell: Cell, area: Area) -> str:
        """Why a spill cannot fill its area; empty if it can."""
        if area.bottom > MAX_ROW or area.right > MAX_COLUMN:
            return "the result runs over the edge of the sheet"
        sheet = cell[0]
        store, owners = self.engine.stores[sheet], self._owners[sheet]
        for spot in _spots(area):
            owner = owners.get(spot)
            if owner is None:
                if store.value(spot) is BLANK:
                    continue
            elif owner == cell[1:]:
                continue
            return f"{self.engine.name_of((sheet, *spot))} is not empty"
        return ""

    def formula_text(self, sheet: int, row: int, column: int) -> str | None:
        """Formula text of a cell, with its equals sign; braces around an array formula."""
        if sheet >= len(self.engine.book.sheets):
            return None
        formula = self.engine.book.sheets[sheet].formulas.get((row, column))
        if formula is None or formula.text is None:
            return None
        text = formula.text
        if formula.origin != (row, column):
            from openpyxl.formula.translate import Translator

            from xleq.cells import address_text

            translator = Translator("=" + text, address_text(*formula.origin))
            text = translator.translate_formula(address_text(row, column))[1:]
        if formula.kind is FormulaKind.ARRAY and not formula.dynamic:
            return "{=" + text + "}"
        return "=" + text


class DataTables:
    """What-if tables: the formula at the edge evaluated again for every pair of inputs."""

    def __init__(self, engine: Engine) -> None:
        self.engine = engine

    def values(self, cell: Cell, formula: Formula) -> Array:
        """The values of a data table.

        Raises
        ------
        Unsupported
            If an input cell has been deleted.
        """
        table = formula.table
        if table is None or formula.area is None:
            raise Unsupported("the file does not tell the data table's inputs")
        if table.first_deleted or table.second_deleted:
            raise Unsupported("an input cell of the data table was deleted")
        sheet = cell[0]
        area = Area(sheet, *formula.area)
        flat: list[Value] = []
        for row, column in _spots(area):
            inputs: dict[Cell, Value] = {}
            source: Cell
            above, left = (sheet, area.top - 1, column), (sheet, row, area.left - 1)
            if table.two_way:
                inputs[(sheet, *parse_address(table.first))] = self._read(above)
                inputs[(sheet, *parse_address(table.second))] = self._read(left)
                source = (sheet, area.top - 1, area.left - 1)
            elif table.by_row:
                inputs[(sheet, *parse_address(table.first))] = self._read(above)
                source = left
            else:
                inputs[(sheet, *parse_address(table.first))] = self._read(left)
                source = above
            flat.append(self._evaluated(inputs, source))
        return Array(area.bottom - area.top + 1, area.right - area.left + 1, flat)

    def _read(self, cell: Cell) -> Value:
        at = self.engine.at
        return self.engine.read_area(at, Area(*cell, *cell[1:])).flat[0]

    def _evaluated(self, inputs: Mapping[Cell, Value], source: Cell) -> Value:
        from dataclasses import replace

        from xleq.recalc.sheets.evaluate import Engine as Another

        # needed before the inputs are changed, so that what is held against them is known
        self._read(source)
        engine = self.engine
        settings = replace(engine.settings, check=False)
        other = Another(
            engine.book, engine.functions, settings, {**engine.inputs, **inputs}, engine.spread.areas
        )
        store = other.stores[source[0]]
        spot = source[1:]
        if not store.is_final(spot):
            other.settle((source[0], *store.waiting[spot]))
        if store.bits(spot) & KEPT:
            raise Unsupported(f"depends on {engine.name_of(source)}")
        return store.value(spot)


def padded(array: Array, height: int, width: int) -> list[Value]:
    """An array's values in the area of an array formula: cut, stretched, and #N/A where it has none.

    Examples
    --------
    >>> [str(v) for v in padded(Array.row([1.0, 2.0]), 2, 3)]
    ['1.0', '2.0', '#N/A', '1.0', '2.0', '#N/A']
    """
    if array.height > height or array.width > width:
        rows = [row[:width] for row in array.rows()[:height]]
        array = Array.of_rows(rows)
    return stretched(array, height, width)


def _spots(area: Area) -> Iterator[Spot]:
    for row in range(area.top, area.bottom + 1):
        for column in range(area.left, area.right + 1):
            yield (row, column)


def _holds(area: Area, spot: Spot) -> bool:
    return area.top <= spot[0] <= area.bottom and area.left <= spot[1] <= area.right
