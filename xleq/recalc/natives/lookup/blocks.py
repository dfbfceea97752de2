"""A table that a lookup searches: a reference, of which only the parts that matter are read, or an array."""

from __future__ import annotations

from xleq.cells import VALUE, CellError, Value
from xleq.recalc.context import Context
from xleq.recalc.operands import Area, Argument, Array, Fail, Operand, Ref


class Block:
    """A table of `height` rows and `width` columns; rows and columns count from 0.

    Raises
    ------
    Fail
        If the argument is an error, or a reference to several areas.
    """

    __slots__ = ("_area", "_array", "_context", "height", "width")

    def __init__(self, context: Context, argument: Argument) -> None:
        self._context = context
        self._area: Area | None = None
        self._array: Array | None = None
        if isinstance(argument, Ref):
            if len(argument.areas) != 1:
                raise Fail(VALUE)
            area = self._area = argument.areas[0]
            self.height = area.bottom - area.top + 1
            self.width = area.right - area.left + 1
            return
        if isinstance(argument, CellError):
            raise Fail(argument)
        if not isinstance(argument, Array):
            if not isinstance(argument, float | str | bool):
                raise Fail(VALUE)
            argument = Array(1, 1, [argument])
        self._array = argument
        self.height, self.width = argument.height, argument.width

    @property
    def is_reference(self) -> bool:
        """Whether the table lies in cells."""
        return self._area is not None

    def part(self, top: int, left: int, bottom: int, right: int) -> Ref | Array:
        """Some rows and columns of the table, ends included."""
        if self._area is not None:
            a = self._area
            return Ref((Area(a.sheet, a.top + top, a.left + left, a.top + bottom, a.left + right),))
        array = self._array
        assert array is not None
        flat, w = array.flat, array.width
        values = [v for r in range(top, bottom + 1) for v in flat[r * w + left : r * w + right + 1]]
        return Array(bottom - top + 1, right - left + 1, values)

    def values(self, top: int, left: int, bottom: int, right: int) -> Array:
        """Values of a part; of whole columns and rows only what lies in the used range."""
        array = self._array
        if array is not None and (top, left, bottom, right) == (0, 0, array.height - 1, array.width - 1):
            return array
        part = self.part(top, left, bottom, right)
        return self._context.read(part) if isinstance(part, Ref) else part

    def all_values(self) -> Array:
        """Values of the table, at most those of the used range."""
        return self.values(0, 0, self.height - 1, self.width - 1)

    def column(self, column: int) -> Array:
        """Values of a column."""
        return self.values(0, column, self.height - 1, column)

    def row(self, row: int) -> Array:
        """Values of a row."""
        return self.values(row, 0, row, self.width - 1)

    def value(self, row: int, column: int) -> Value:
        """Value at a row and column."""
        return self.values(row, column, row, column).flat[0]

    def vector(self, otherwise: CellError) -> Array:
        """Values of a table that is one row or one column; otherwise ends the call with the error."""
        if self.height != 1 and self.width != 1:
            raise Fail(otherwise)
        return self.all_values()

    def taken(self, top: int, left: int, bottom: int, right: int) -> Operand:
        """A part; the value itself where it is one element of an array."""
        if self._array is not None and top == bottom and left == right:
            return self._array.at(top, left)
        return self.part(top, left, bottom, right)

    def line(self, index: int, across: bool) -> Operand:
        """The column, or the row, at an index: a single cell of a row or a column."""
        if across:
            return self.taken(0, index, self.height - 1, index)
        return self.taken(index, 0, index, self.width - 1)
