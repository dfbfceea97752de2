"""Cells of a sheet while it is recalculated, and numpy columns of them for ranges.

A cell is *final* (its value is in `values`), *doubtful* (final too, but something is held against it) or
*waiting* (a formula that has not been evaluated, or a cell that one of them fills). What is none of these
is blank.
"""

from __future__ import annotations

from collections import OrderedDict
from collections.abc import Iterable, Sequence
from typing import TYPE_CHECKING, Final

import numpy as np

from xleq.cells import BLANK, MAX_COLUMN, MAX_ROW, Value
from xleq.recalc.lexicon import Lexicon
from xleq.recalc.operands import _KIND_OF, BLANK_KIND, Area, Array

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from xleq.recalc.context import Context

#: Row and column.
Spot = tuple[int, int]

#: What can be held against a cell: its value differs from the stored one; it, or something it depends on,
#: disagrees with its stored value; it kept its stored value.
CHANGED: Final = 1
MARKED: Final = 2
KEPT: Final = 4
#: Noted while a cell is evaluated: its value is not a matter of its inputs' stored values alone.
VOLATILE: Final = 8

_WAITING_KIND: Final = 9
#: Areas of at most so many cells are gathered cell by cell.
_SMALL: Final = 48
#: Larger areas are not read.
_LARGEST: Final = 2**24
#: So many areas are remembered as arrays.
_REMEMBERED: Final = 128
_NAN: Final = float("nan")


class Blocked(Exception):  # noqa: N818 - no error: the evaluation must begin again once these cells are final
    """Cells that have to be evaluated first, as (sheet, row, column)."""

    def __init__(self, cells: list[tuple[int, int, int]]) -> None:
        super().__init__(cells)
        self.cells = cells


class Unsupported(Exception):  # noqa: N818 - no error of the program: the cell keeps its stored value
    """Something that is not computed here, and why."""


class Column:
    """One column of a sheet from row 1 to its last used row, kept up to date as cells become final."""

    __slots__ = ("_words", "changes", "kinds", "lexicon", "numbers", "trust", "values")

    def __init__(self, values: list[Value | None], trust: dict[int, int]) -> None:
        self.values = values
        kind_of = _KIND_OF.get
        self.kinds = np.array(
            [_WAITING_KIND if v is None else kind_of(type(v), BLANK_KIND) for v in values], np.uint8
        )
        self.numbers = np.array([v if type(v) is float else _NAN for v in values], np.float64)
        self.trust: NDArray[np.uint8] | None = None
        self.changes = 0
        self.lexicon = Lexicon()
        self._words: NDArray[np.int32] | None = None
        for row, bits in trust.items():
            self.hold(row, bits)

    def words(self) -> NDArray[np.int32]:
        """Number of each text in the lexicon; -1 for what is no text."""
        if self._words is None:
            add = self.lexicon.add
            self._words = np.array([add(v) if type(v) is str else -1 for v in self.values], np.int32)
        return self._words

    def put(self, row: int, value: Value) -> None:
        """Make a cell final, or change it."""
        at = row - 1
        if self.values[at] is not None:
            self.changes += 1
        self.values[at] = value
        self.kinds[at] = _KIND_OF.get(type(value), BLANK_KIND)
        self.numbers[at] = value if type(value) is float else _NAN
        if self._words is not None:
            self._words[at] = self.lexicon.add(value) if type(value) is str else -1

    def hold(self, row: int, bits: int) -> None:
        """Note what is held against a cell."""
        if self.trust is None:
            self.trust = np.zeros(len(self.values), np.uint8)
        self.trust[row - 1] = bits


class View(Array):
    """The cells of some columns between two rows, read when they are asked for.

    Parameters
    ----------
    columns : sequence of Column
    first, last : int
        Rows.
    tail : int
        Number of blank rows below `last`.
    """

    __slots__ = ("_columns", "_first", "_last", "_tail", "stamp")

    def __init__(self, columns: Sequence[Column], first: int, last: int, tail: int) -> None:
        self.height = last - first + 1 + tail
        self._tail = tail
        self.width = len(columns)
        self._columns = columns
        self._first = first - 1
        self._last = last
        self._flat = None
        self._numbers = None
        self._kinds = None
        self._index = None
        self._notes = None
        self._codes = None
        self._span = None
        self._words = None
        self._words = None
        self.stamp = sum(c.changes for c in columns)

    def _unpack(self) -> Sequence[Value]:
        parts = [c.values[self._first : self._last] for c in self._columns]
        flat = parts[0] if len(parts) == 1 else [v for row in zip(*parts, strict=True) for v in row]
        return flat + [BLANK] * (self._tail * self.width) if self._tail else flat  # type: ignore[return-value]

    def _split(self) -> None:
        a, b = self._first, self._last
        if len(self._columns) == 1:
            column = self._columns[0]
            self._numbers = column.numbers[a:b].reshape(-1, 1)
            self._kinds = column.kinds[a:b].reshape(-1, 1)
        else:
            self._numbers = np.column_stack([c.numbers[a:b] for c in self._columns])
            self._kinds = np.column_stack([c.kinds[a:b] for c in self._columns])
        if self._tail:
            below = ((0, self._tail), (0, 0))
            self._numbers = np.pad(self._numbers, below, constant_values=_NAN)
            self._kinds = np.pad(self._kinds, below, constant_values=BLANK_KIND)

    def words(self) -> tuple[NDArray[np.int32], Lexicon]:
        """Number of each text in a lexicon, as int32 [height, width], -1 for what is no text; the lexicon."""
        if len(self._columns) > 1 or self._tail:
            return super().words()
        column = self._columns[0]
        return column.words()[self._first : self._last].reshape(-1, 1), column.lexicon


class Cells:
    """The cells of one sheet.

    Parameters
    ----------
    sheet : int
        Index of the sheet.
    values : dict
        (row, column) → constant.
    waiting : dict
        (row, column) → (row, column) of the formula that fills it: the cell itself, or the corner of an
        array formula.
    """

    def __init__(self, sheet: int, values: dict[Spot, Value], waiting: dict[Spot, Spot]) -> None:
        self.sheet = sheet
        self.values = values
        self.waiting = waiting
        self.doubtful: dict[Spot, tuple[Value, int]] = {}
        self.bottom = max((r for r, _ in (*values, *waiting)), default=1)
        self.right = max((c for _, c in (*values, *waiting)), default=1)
        self._columns: dict[int, Column] = {}
        self._waiting_rows: dict[int, list[int]] | None = None
        self._views: OrderedDict[Area, View] = OrderedDict()

    def put(self, spot: Spot, value: Value, bits: int = 0) -> None:
        """Make a cell final with what is held against it."""
        if bits:
            self.doubtful[spot] = (value, bits)
            self.values.pop(spot, None)
        else:
            self.values[spot] = value
            if self.doubtful:
                self.doubtful.pop(spot, None)
        row, number = spot
        if row > self.bottom or number > self.right:
            self.bottom = max(row, self.bottom)
            self.right = max(number, self.right)
            self._columns.clear()
            self._views.clear()
        elif self._columns:
            column = self._columns.get(number)
            if column is not None:
                column.put(row, value)
                if bits or column.trust is not None:
                    column.hold(row, bits)

    def is_final(self, spot: Spot) -> bool:
        """Whether nothing has to be evaluated to know the cell."""
        return spot in self.values or spot in self.doubtful or spot not in self.waiting

    def value(self, spot: Spot) -> Value:
        """The value of a final cell."""
        value = self.values.get(spot)
        if value is not None:
            return value
        doubtful = self.doubtful.get(spot)
        return BLANK if doubtful is None else doubtful[0]

    def bits(self, spot: Spot) -> int:
        """What is held against a cell."""
        doubtful = self.doubtful.get(spot)
        return 0 if doubtful is None else doubtful[1]

    def miss(self, at: Context, row: int, column: int) -> Value:
        """The value of a cell that is not in `values`.

        Raises
        ------
        Blocked
            If it is waiting.
        """
        if not (1 <= row <= MAX_ROW and 1 <= column <= MAX_COLUMN):
            # relative references of names run over the edge to the other side
            row, column = (row - 1) % MAX_ROW + 1, (column - 1) % MAX_COLUMN + 1
            value = self.values.get((row, column))
            if value is not None:
                return value
        doubtful = self.doubtful.get((row, column))
        if doubtful is not None:
            at.trust |= doubtful[1]
            if doubtful[1] >= MARKED and at.cause is None:
                at.cause = (self.sheet, row, column)
            return doubtful[0]
        master = self.waiting.get((row, column))
        if master is not None:
            raise Blocked([(self.sheet, *master)])
        return BLANK

    def clip(self, area: Area) -> Area:
        """The area cut to the used range; its first cell remains."""
        bottom = max(min(area.bottom, self.bottom), area.top)
        right = max(min(area.right, self.right), area.left)
        if bottom == area.bottom and right == area.right:
            return area
        return Area(area.sheet, area.top, area.left, bottom, right)

    def read(self, at: Context, area: Area) -> Array:
        """The values of an area; whole columns and rows are clipped.

        Raises
        ------
        Blocked
            If cells of it are waiting.
        """
        if area.bottom >= MAX_ROW or area.right >= MAX_COLUMN:
            area = self.clip(area)
        _, top, left, bottom, right = area
        height, width = bottom - top + 1, right - left + 1
        if height * width > _LARGEST:
            raise Unsupported(f"a range of {height} × {width} cells")
        if top > self.bottom or left > self.right:
            return Array.filled(height, width, BLANK)
        if height * width <= _SMALL or height < width:
            return self._gather(at, area)
        view = self._views.get(area)
        if view is not None and view.stamp == sum(c.changes for c in view._columns):
            self._views.move_to_end(area)
            self._judge(at, view._columns, top, left, min(bottom, self.bottom))
            return view
        columns = [self.column(number) for number in range(left, right + 1)]
        last = min(bottom, self.bottom)
        self._demand(columns, top, left, last)
        self._judge(at, columns, top, left, last)
        view = View(columns, top, last, bottom - last)
        self._views[area] = view
        if len(self._views) > _REMEMBERED:
            self._views.popitem(last=False)
        return view

    def column(self, number: int) -> Column:
        """A column, made at its first use."""
        column = self._columns.get(number)
        if column is None:
            get = self.values.get
            values: list[Value | None] = [get((row, number), BLANK) for row in range(1, self.bottom + 1)]
            trust: dict[int, int] = {}
            for row in self._rows_waiting().get(number, ()):
                if (row, number) not in self.values:
                    values[row - 1] = None
            for (row, n), (value, bits) in self.doubtful.items():
                if n == number:
                    trust[row] = bits
                    values[row - 1] = value
            column = self._columns[number] = Column(values, trust)
        return column

    def _rows_waiting(self) -> dict[int, list[int]]:
        """Rows of the cells that a formula fills, by column."""
        if self._waiting_rows is None:
            self._waiting_rows = {}
            for row, column in self.waiting:
                self._waiting_rows.setdefault(column, []).append(row)
        return self._waiting_rows

    def _demand(self, columns: Iterable[Column], top: int, left: int, last: int) -> None:
        missing: list[tuple[int, int, int]] = []
        for offset, column in enumerate(columns):
            waiting = column.kinds[top - 1 : last] == _WAITING_KIND
            if waiting.any():
                for position in np.flatnonzero(waiting).tolist():
                    missing.append((self.sheet, *self.waiting[(top + position, left + offset)]))
        if missing:
            raise Blocked(missing)

    def _judge(self, at: Context, columns: Iterable[Column], top: int, left: int, last: int) -> None:
        for offset, column in enumerate(columns):
            if column.trust is None:
                continue
            trust = column.trust[top - 1 : last]
            bits = int(np.bitwise_or.reduce(trust, initial=0))
            at.trust |= bits
            if bits >= MARKED and at.cause is None:
                row = top + int(np.flatnonzero(trust >= MARKED)[0])
                at.cause = (self.sheet, row, left + offset)

    def _gather(self, at: Context, area: Area) -> Array:
        _, top, left, bottom, right = area
        get = self.values.get
        flat: list[Value] = []
        missing: list[tuple[int, int, int]] = []
        for row in range(top, bottom + 1):
            for column in range(left, right + 1):
                value = get((row, column))
                if value is None:
                    try:
                        value = self.miss(at, row, column)
                    except Blocked as blocked:
                        missing += blocked.cells
                        continue
                flat.append(value)
        if missing:
            raise Blocked(missing)
        return Array(bottom - top + 1, right - left + 1, flat)
