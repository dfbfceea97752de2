"""Formulas evaluated on demand, with a stack of their own, so that chains may be as long as they like."""

from __future__ import annotations

import random
import time
from collections.abc import Callable, Mapping
from dataclasses import dataclass, replace
from datetime import datetime
from typing import Any, NamedTuple

from xleq.cells import (
    BLANK,
    CALC,
    REF,
    STORED_ERRORS,
    VALUE,
    Blank,
    CellError,
    Value,
    address_text,
    quote_sheet,
)
from xleq.errors import FormulaError, LimitError
from xleq.recalc.context import Context
from xleq.recalc.operands import Area, Array, Operand, Ref
from xleq.recalc.program.compile import Compiler
from xleq.recalc.program.references import Run
from xleq.recalc.sheets.arrays import DataTables, Spreader
from xleq.recalc.sheets.columns import CHANGED, KEPT, MARKED, VOLATILE, Blocked, Spot, Unsupported
from xleq.recalc.sheets.indirect import reference_named
from xleq.recalc.sheets.names import Names
from xleq.recalc.syntax import tree
from xleq.recalc.syntax.fills import relative_key, row_template
from xleq.recalc.syntax.parse import parse
from xleq.workbook import Book, Formula, FormulaKind

Cell = tuple[int, int, int]


#: Relative difference that a fresh number may have from the stored one. [-]
TOLERANCE = 1e-9
#: The same where Excel's own approximation is poor: its Bessel functions are good to five digits at worst.
_POOR_TOLERANCE = 3e-5


class Program(NamedTuple):
    """A formula compiled: its tree, and a closure that serves every cell it was filled to."""

    node: tree.Node
    run: Run
    array: bool
    tolerance: float


@dataclass(frozen=True, slots=True)
class Disagreement:
    """A formula that does not reproduce its stored value from stored inputs.

    Parameters
    ----------
    cell : tuple of int
        Sheet, row, column.
    stored, fresh : Value
        The value of the file and the one computed here.
    """

    cell: Cell
    stored: Value
    fresh: Value


@dataclass(frozen=True, slots=True)
class Settings:
    """What evaluation takes from outside.

    Parameters
    ----------
    now : datetime
        Time of the recalculation.
    seed : int
        Of the random numbers.
    seconds : float
        Longest time that it may take. [s]
    check : bool
        Whether stored values are compared with fresh ones, and kept where they disagree.
    """

    now: datetime
    seed: int = 0
    seconds: float = 3600.0
    check: bool = True


class Engine:
    """A workbook being recalculated.

    Parameters
    ----------
    book : Book
    functions : mapping
        Worksheet functions by name in capitals; each takes its arguments as one list.
    settings : Settings
    inputs : mapping
        (sheet, row, column) → constant in place of what the file has there.
    areas : mapping
        (sheet, row, column) of dynamic formulas → area that they are known to fill.
    """

    def __init__(
        self,
        book: Book,
        functions: Mapping[str, Callable[[list[Any]], Any]],
        settings: Settings,
        inputs: Mapping[Cell, Value],
        areas: Mapping[Cell, Area],
    ) -> None:
        self.book = book
        self.functions = functions
        self.settings = settings
        self.inputs = inputs
        self.date_1904 = book.date_1904
        self.sheet_names = tuple(sheet.name for sheet in book.sheets)
        self.kept: dict[Cell, str] = {}
        self.marked: dict[Cell, Cell] = {}
        self.disagreements: list[Disagreement] = []
        self.unchecked: list[Cell] = []
        self.results: list[dict[Spot, Value]] = [{} for _ in book.sheets]
        self.spread = Spreader(self, areas)
        self.stores = [self.spread.cells(index) for index in range(len(book.sheets))]
        self.names = Names(book, self.stores)
        self.compilers = [Compiler(i, self.stores, self.names, functions) for i in range(len(book.sheets))]
        self._programs: dict[object, Program | str] = {}
        #: By sheet and column, the last formula met: the next one below is often the same, filled down.
        self._above: dict[tuple[int, int], tuple[str, tuple[int, ...], Program]] = {}
        self._random = random.Random(settings.seed)
        self._deadline = time.monotonic() + settings.seconds
        self._count = 0
        self.at = Context(self, 0, 1, 1, False)
        for (sheet, row, column), value in inputs.items():
            stored = book.sheets[sheet].stored.get((row, column), BLANK)
            is_new = settings.check and not identical(value, stored)
            self.stores[sheet].put((row, column), value, CHANGED if is_new else 0)

    # what formulas may ask

    def now(self) -> datetime:
        """Time of the recalculation."""
        return self.settings.now

    def random(self) -> float:
        """Next random number in [0, 1)."""
        return self._random.random()

    def read_area(self, at: Context, area: Area) -> Array:
        """Values of an area."""
        return self.stores[area.sheet].read(at, area)

    def clip(self, area: Area) -> Area:
        """The area within the used range."""
        return self.stores[area.sheet].clip(area)

    def reference(self, at: Context, text: str, a1: bool) -> Ref:
        """The reference that a text names."""
        return reference_named(at, text, a1, self.compilers[at.sheet])

    def formula_at(self, sheet: int, row: int, column: int) -> str | None:
        """Formula text of a cell, with its equals sign."""
        return self.spread.formula_text(sheet, row, column)

    def is_hidden_row(self, sheet: int, row: int) -> bool:
        """Whether a row is not shown."""
        return row in self.book.sheets[sheet].hidden_rows

    def is_filtered_row(self, sheet: int, row: int) -> bool:
        """Whether a row is hidden by a filter."""
        return row in self.book.sheets[sheet].filtered_rows

    def number_format(self, sheet: int, row: int, column: int) -> str:
        """Number-format code of a cell."""
        return self.book.sheets[sheet].format_of(row, column)

    # evaluation

    def everything(self) -> None:
        """Evaluate every formula of the book."""
        for sheet in self.book.sheets:
            store = self.stores[sheet.index]
            values, doubtful = store.values, store.doubtful
            for spot, master in list(store.waiting.items()):
                if spot not in values and spot not in doubtful:
                    cell = (sheet.index, *master)
                    try:
                        self.compute(cell)
                    except Blocked:
                        self.settle(cell)

    def settle(self, target: Cell) -> None:
        """Make a formula's cell final, and first all that it needs.

        Raises
        ------
        LimitError
            If the time is over.
        """
        stack = [target]
        active: dict[Cell, None] = {}
        while stack:
            cell = stack[-1]
            if self.stores[cell[0]].is_final(cell[1:]):
                stack.pop()
                active.pop(cell, None)
                continue
            try:
                self.compute(cell)
            except Blocked as blocked:
                active[cell] = None
                needs = list(dict.fromkeys(blocked.cells))
                circular = next((c for c in needs if c in active), None)
                if circular is not None:
                    order = list(active)
                    self.circle(order[order.index(circular) :])
                else:
                    stack.extend(reversed(needs))

    def compute(self, cell: Cell) -> None:
        """Evaluate a formula whose inputs are final.

        Raises
        ------
        Blocked
            If they are not.
        """
        self._count += 1
        if self._count & 63 == 0 and time.monotonic() > self._deadline:
            raise LimitError(f"takes longer to recalculate; the limit (seconds) is {self.settings.seconds:g}")
        sheet, row, column = cell
        formula = self.book.sheets[sheet].formulas[(row, column)]
        at = self.place(cell, array=False)
        try:
            if formula.kind is FormulaKind.DATA_TABLE:
                self.spread.fill(cell, formula, DataTables(self).values(cell, formula), at.trust)
                return
            program = self.program(cell, formula)
            at.array_mode = program.array
            result = program.run(at)
            if at.trust & KEPT:
                self.keep(cell, f"depends on {self.name_of(at.cause or cell)}")
            elif program.array:
                self.spread.fill(cell, formula, result, at.trust)
            else:
                self.finish(cell, single_value(result), at.trust, program.tolerance)
        except Unsupported as reason:
            self.keep(cell, str(reason))
        except RecursionError:
            self.keep(cell, "the formula is nested too deeply")

    def place(self, cell: Cell, array: bool) -> Context:
        """The context, set to a cell."""
        at = self.at
        at.sheet, at.row, at.column = cell
        at.array_mode = array
        at.locals = ()
        at.trust = 0
        at.depth = 0
        at.cause = None
        return at

    def program(self, cell: Cell, formula: Formula) -> Program:
        """The compiled formula of a cell.

        Raises
        ------
        Unsupported
            If the text is no formula that is understood.
        """
        sheet = cell[0]
        if formula.text is None:
            raise Unsupported("the file does not tell the formula")
        array = formula.kind is FormulaKind.ARRAY
        key: object
        if formula.group is not None:
            key = (sheet, formula.group)
        else:
            above = self._above.get((sheet, cell[2]))
            if above is not None and above[2].array is array:
                template, distances, program = above
                if formula.text == template % tuple([cell[1] + d for d in distances]):
                    return program
            key = (sheet, relative_key(formula.text, *formula.origin), array)
        known = self._programs.get(key)
        if known is None:
            try:
                node = parse(formula.text, *formula.origin)
                run = self.compilers[sheet].formula(node, array)
                known = Program(node, run, array, tolerance_of(formula.text))
            except (FormulaError, Unsupported) as reason:
                known = str(reason)
            self._programs[key] = known
        if isinstance(known, str):
            raise Unsupported(known)
        if formula.group is None:
            self._above[(sheet, cell[2])] = (*row_template(formula.text, cell[1]), known)
        return known

    def finish(self, cell: Cell, value: Value, bits: int, tolerance: float = TOLERANCE) -> None:
        """Make a cell final with its fresh value, or with its stored one where they disagree."""
        sheet, row, column = cell
        spot = (row, column)
        if type(value) is CellError and not value.origin:
            value = replace(value, origin=self.name_of(cell))
        store = self.stores[sheet]
        self.results[sheet][spot] = value
        if not self.settings.check:
            store.put(spot, value, bits & KEPT)
            return
        stored = self.book.sheets[sheet].stored.get(spot, BLANK)
        marked = bits & MARKED
        if marked:
            self.marked[cell] = self.at.cause or cell
        is_same = identical(value, stored)
        if bits & (CHANGED | VOLATILE) or stored is BLANK:
            if bits & CHANGED and not bits & VOLATILE:
                self.unchecked.append(cell)
            store.put(spot, value, marked if is_same else marked | CHANGED)
        elif is_same or agree(value, stored, tolerance):
            if type(value) is not CellError:
                value = stored
            self.results[sheet][spot] = value
            store.put(spot, value, marked)
        else:
            self.disagreements.append(Disagreement(cell, stored, value))
            self.results[sheet][spot] = stored
            store.put(spot, stored, MARKED)

    def keep(self, cell: Cell, reason: str) -> None:
        """Let a formula's cells keep their stored values."""
        self.kept[cell] = reason
        sheet = self.book.sheets[cell[0]]
        for spot in self.spread.filled_by(cell):
            self.stores[cell[0]].put(spot, sheet.stored.get(spot, BLANK), KEPT)

    def circle(self, cells: list[Cell]) -> None:
        """Settle formulas that need each other: iterate where the file says so, else keep them."""
        if self.book.calculation.iterate:
            from xleq.recalc.sheets.circles import iterate

            iterate(self, cells)
            return
        path = " → ".join(self.name_of(c) for c in [*cells[:6], cells[0]])
        for cell in cells:
            self.keep(cell, f"circular reference {path}")

    def name_of(self, cell: Cell) -> str:
        """Address of a cell with its sheet."""
        if cell[0] >= len(self.sheet_names):
            return f"a linked book's {address_text(cell[1], cell[2])}"
        return f"{quote_sheet(self.sheet_names[cell[0]])}!{address_text(cell[1], cell[2])}"


def single_value(result: Operand) -> Value:
    """What a cell shows of a result: a blank is 0, an array its first element, a function #CALC!."""
    if isinstance(result, Array):
        result = result.flat[0] if result.flat else BLANK
    kind = type(result)
    if kind is float:
        # one zero only, and nothing that is no number
        if result - result == 0.0:  # type: ignore[operator]
            return result + 0.0  # type: ignore[operator]
        return CellError("#NUM!", "the result is too large")
    if kind is str or kind is bool or kind is CellError:
        return result  # type: ignore[return-value]
    if kind is Blank:
        return 0.0
    if isinstance(result, Ref):
        return REF
    return CellError(CALC.code, "the result is a function")


def identical(a: Value, b: Value) -> bool:
    """Whether a fresh value is the stored one in kind and in every digit.

    A newer error such as #SPILL! is stored as #VALUE! where the file has nothing more to tell.

    Examples
    --------
    >>> identical(1.0, 1.0), identical(1.0, True), identical(CALC, VALUE), identical(VALUE, CALC)
    (True, False, True, False)
    """
    if type(a) is not type(b):
        return False
    return a == b or (b == VALUE and isinstance(a, CellError) and a.code not in STORED_ERRORS)


def tolerance_of(text: str) -> float:
    """Relative difference [-] that a formula's fresh number may have from the stored one."""
    return _POOR_TOLERANCE if "BESSEL" in text.upper() else TOLERANCE


def agree(a: Value, b: Value, tolerance: float = TOLERANCE) -> bool:
    """Whether a fresh value reproduces a stored one.

    Examples
    --------
    >>> agree(1.0, 1.0 + 1e-12), agree(1.0, 1.001), agree(1.0, "1")
    (True, False, False)
    """
    if type(a) is not type(b):
        return False
    if type(a) is float and type(b) is float:
        return abs(a - b) <= tolerance * max(abs(a), abs(b))
    return identical(a, b)
