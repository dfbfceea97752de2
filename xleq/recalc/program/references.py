"""References compiled: readers of single cells, areas, and the operators between references."""

from __future__ import annotations

from collections.abc import Callable
from typing import TYPE_CHECKING, Final, TypeAlias

from xleq.cells import BLANK, MAX_COLUMN, MAX_ROW, NULL, VALUE, CellError
from xleq.recalc.coerce import NOT_A_VALUE
from xleq.recalc.context import Context
from xleq.recalc.operands import Area, Array, Operand, Ref

if TYPE_CHECKING:
    from xleq.recalc.sheets.columns import Cells
    from xleq.recalc.syntax import tree

#: A compiled expression.
Run: TypeAlias = Callable[[Context], Operand]

_OUTSIDE: Final = CellError("#VALUE!", "the formula's row and column don't meet the range")


def constant(value: Operand) -> Run:
    """An expression that always has this value."""
    return lambda at: value


def reader(store: Cells, node: tree.Cells) -> Run:
    """Reads the single cell of a reference."""
    get = store.values.get
    miss = store.miss
    assert node.rows is not None
    assert node.columns is not None
    r, c = node.rows[0], node.columns[0]
    fixed_row, fixed_column = node.fixed[0], node.fixed[2]
    if fixed_row and fixed_column:
        spot = (r, c)

        def read_fixed(at: Context) -> Operand:
            value = get(spot)
            return miss(at, r, c) if value is None else value

        return read_fixed
    if fixed_row:

        def read_in_row(at: Context) -> Operand:
            column = at.column + c
            value = get((r, column))
            return miss(at, r, column) if value is None else value

        return read_in_row
    if fixed_column:

        def read_in_column(at: Context) -> Operand:
            row = at.row + r
            value = get((row, c))
            return miss(at, row, c) if value is None else value

        return read_in_column

    def read(at: Context) -> Operand:
        row, column = at.row + r, at.column + c
        value = get((row, column))
        return miss(at, row, column) if value is None else value

    return read


def area_of(sheet: int, node: tree.Cells) -> Callable[[Context], Area]:
    """The area of a reference on one sheet, corners in order."""
    rows, columns = node.rows, node.columns
    fixed_top, fixed_bottom, fixed_left, fixed_right = node.fixed
    if all(node.fixed):
        r = (1, MAX_ROW) if rows is None else (min(rows), max(rows))
        c = (1, MAX_COLUMN) if columns is None else (min(columns), max(columns))
        area = Area(sheet, r[0], c[0], r[1], c[1])
        return lambda at: area

    def find(at: Context) -> Area:
        if rows is None:
            top, bottom = 1, MAX_ROW
        else:
            top = rows[0] if fixed_top else (at.row + rows[0] - 1) % MAX_ROW + 1
            bottom = rows[1] if fixed_bottom else (at.row + rows[1] - 1) % MAX_ROW + 1
            if top > bottom:
                top, bottom = bottom, top
        if columns is None:
            left, right = 1, MAX_COLUMN
        else:
            left = columns[0] if fixed_left else (at.column + columns[0] - 1) % MAX_COLUMN + 1
            right = columns[1] if fixed_right else (at.column + columns[1] - 1) % MAX_COLUMN + 1
            if left > right:
                left, right = right, left
        return Area(sheet, top, left, bottom, right)

    return find


def is_cell(node: tree.Cells) -> bool:
    """Whether a reference is to a single cell of one sheet wherever the formula stands."""
    return (
        node.rows is not None
        and node.columns is not None
        and node.rows[0] == node.rows[1]
        and node.columns[0] == node.columns[1]
        and node.fixed[0] == node.fixed[1]
        and node.fixed[2] == node.fixed[3]
        and (node.place is None or not node.place.last)
    )


def intersected(at: Context, operand: Operand) -> Operand:
    """A reference reduced to the cell in the formula's row or column; anything else as it is."""
    if not isinstance(operand, Ref):
        return operand
    if len(operand.areas) != 1:
        return VALUE
    area = operand.areas[0]
    row, column = area.top, area.left
    if area.bottom > area.top:
        if area.right > area.left or not area.top <= at.row <= area.bottom:
            return _OUTSIDE
        row = at.row
    elif area.right > area.left:
        if not area.left <= at.column <= area.right:
            return _OUTSIDE
        column = at.column
    return at.book.read_area(at, Area(area.sheet, row, column, row, column)).flat[0]


def contents(at: Context, operand: Operand) -> Operand:
    """A reference read: a value where it is one cell, else an array; anything else as it is."""
    if not isinstance(operand, Ref):
        return operand
    if len(operand.areas) != 1:
        return VALUE
    array = at.book.read_area(at, operand.areas[0])
    return array.flat[0] if array.height == 1 and array.width == 1 else array


def block(at: Context, operand: Operand) -> Array:
    """Whatever it is, as an array."""
    found = contents(at, operand)
    if isinstance(found, Array):
        return found
    if isinstance(found, float | str | bool | CellError) or found is BLANK:
        return Array(1, 1, [found])
    return Array(1, 1, [NOT_A_VALUE])


def single(at: Context, operand: Operand) -> Operand:
    """What ``@`` makes of an operand: one value."""
    operand = intersected(at, operand)
    if isinstance(operand, Array):
        return operand.flat[0] if operand.flat else BLANK
    return operand


def _need_reference(operand: Operand) -> Ref | CellError:
    if isinstance(operand, Ref):
        return operand
    return operand if isinstance(operand, CellError) else VALUE


def spanned(left: Operand, right: Operand) -> Operand:
    """The smallest area that holds both references."""
    a, b = _need_reference(left), _need_reference(right)
    if isinstance(a, CellError):
        return a
    if isinstance(b, CellError):
        return b
    areas = a.areas + b.areas
    sheet = areas[0].sheet
    if any(x.sheet != sheet for x in areas):
        return VALUE
    return Ref(
        (
            Area(
                sheet,
                min(x.top for x in areas),
                min(x.left for x in areas),
                max(x.bottom for x in areas),
                max(x.right for x in areas),
            ),
        )
    )


def common(left: Operand, right: Operand) -> Operand:
    """Cells that both references have; #NULL! where there are none."""
    a, b = _need_reference(left), _need_reference(right)
    if isinstance(a, CellError):
        return a
    if isinstance(b, CellError):
        return b
    found = []
    for x in a.areas:
        for y in b.areas:
            top, left_end = max(x.top, y.top), max(x.left, y.left)
            bottom, right_end = min(x.bottom, y.bottom), min(x.right, y.right)
            if x.sheet == y.sheet and top <= bottom and left_end <= right_end:
                found.append(Area(x.sheet, top, left_end, bottom, right_end))
    return Ref(tuple(found)) if found else NULL


def united(left: Operand, right: Operand) -> Operand:
    """Both references together."""
    a, b = _need_reference(left), _need_reference(right)
    if isinstance(a, CellError):
        return a
    if isinstance(b, CellError):
        return b
    return Ref(a.areas + b.areas)
