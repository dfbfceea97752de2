"""What a native function may ask about the place and the workbook in which it is evaluated."""

from __future__ import annotations

from collections.abc import Sequence
from datetime import datetime
from typing import Protocol

from xleq.cells import VALUE, Missing
from xleq.recalc.operands import Area, Array, Fail, Operand, Ref


class Surroundings(Protocol):
    """The workbook as a formula sees it; the evaluator implements it."""

    date_1904: bool
    sheet_names: tuple[str, ...]

    def now(self) -> datetime:
        """Time of the recalculation."""

    def random(self) -> float:
        """Next random number in [0, 1)."""

    def read_area(self, at: Context, area: Area) -> Array:
        """Values of an area."""

    def clip(self, area: Area) -> Area:
        """The area without the empty rows and columns beyond the used range."""

    def reference(self, at: Context, text: str, a1: bool) -> Ref:
        """The reference that a text names."""

    def formula_at(self, sheet: int, row: int, column: int) -> str | None:
        """Formula text of a cell, with its equals sign."""

    def is_hidden_row(self, sheet: int, row: int) -> bool:
        """Whether a row is not shown."""

    def is_filtered_row(self, sheet: int, row: int) -> bool:
        """Whether a row is hidden by a filter."""

    def number_format(self, sheet: int, row: int, column: int) -> str:
        """Number-format code of a cell."""


class Context:
    """The place of a formula, and the workbook around it.

    Parameters
    ----------
    book : Surroundings
    sheet : int
        Index of the sheet, from 0.
    row, column : int
        Place of the formula's cell, from 1.
    array_mode : bool
        Whether the formula is evaluated as an array formula.
    """

    __slots__ = ("array_mode", "book", "cause", "column", "depth", "locals", "row", "sheet", "trust")

    def __init__(self, book: Surroundings, sheet: int, row: int, column: int, array_mode: bool) -> None:
        self.book = book
        self.sheet = sheet
        self.row = row
        self.column = column
        self.array_mode = array_mode
        #: Values of LET names and LAMBDA parameters in scope, innermost last.
        self.locals: tuple[Operand | Missing, ...] = ()
        #: What is known against the cells that were read (`xleq.recalc.sheets.evaluate`).
        self.trust = 0
        #: LAMBDAs that are being called, one within the other.
        self.depth = 0
        #: The first of those cells that is held back: (sheet, row, column).
        self.cause: tuple[int, int, int] | None = None

    @property
    def date_1904(self) -> bool:
        """Whether serial dates count from 1904."""
        return self.book.date_1904

    @property
    def sheet_names(self) -> tuple[str, ...]:
        """Names of the sheets in the order of their tabs."""
        return self.book.sheet_names

    def now(self) -> datetime:
        """Time of the recalculation, the same for every cell."""
        return self.book.now()

    def random(self) -> float:
        """Next random number, 0 ≤ x < 1."""
        return self.book.random()

    def read(self, ref: Ref) -> Array:
        """Values of a reference to one area; whole columns and rows are clipped to the used range.

        Raises
        ------
        Fail
            #VALUE! if the reference has several areas.
        """
        if len(ref.areas) != 1:
            raise Fail(VALUE)
        return self.book.read_area(self, ref.areas[0])

    def read_areas(self, ref: Ref) -> list[Array]:
        """Values of each area of a reference."""
        return [self.book.read_area(self, area) for area in ref.areas]

    def clip(self, area: Area) -> Area:
        """The area cut to the used range of its sheet; at least its first cell remains."""
        return self.book.clip(area)

    def reference(self, text: str, a1: bool = True) -> Ref:
        """The reference that a text names: an address in A1 or R1C1 style, a name or a table.

        Raises
        ------
        Fail
            #REF! if it names none.
        """
        return self.book.reference(self, text, a1)

    def formula_at(self, ref: Ref) -> str | None:
        """Formula text of the first cell of a reference, with its equals sign; None if it has none."""
        area = ref.areas[0]
        return self.book.formula_at(area.sheet, area.top, area.left)

    def call(self, function: Operand, args: Sequence[Operand]) -> Operand:
        """Call the value of a LAMBDA expression.

        Raises
        ------
        Fail
            #VALUE! if it is not a function or takes another number of arguments.
        """
        from xleq.recalc.program.lambdas import call_lambda

        return call_lambda(function, args)

    def is_hidden_row(self, sheet: int, row: int) -> bool:
        """Whether a row is not shown, for whatever reason."""
        return self.book.is_hidden_row(sheet, row)

    def is_filtered_row(self, sheet: int, row: int) -> bool:
        """Whether a row is hidden by a filter."""
        return self.book.is_filtered_row(sheet, row)

    def number_format(self, sheet: int, row: int, column: int) -> str:
        """Number-format code of a cell, for example ``0.00%``."""
        return self.book.number_format(sheet, row, column)
