"""SEQUENCE, FILTER, SORT, UNIQUE and their kin."""

from __future__ import annotations

from collections.abc import Sequence
from functools import cmp_to_key
from itertools import pairwise

from xleq.cells import BLANK, CALC, MISSING, VALUE, CellError, Missing, Value
from xleq.recalc.coerce import compare, to_logical, to_number
from xleq.recalc.natives.information import ERROR_NUMBERS
from xleq.recalc.natives.table import native
from xleq.recalc.operands import Argument, Array, Fail, Operand, lookup_key

#: Most elements of an array that a formula may make.
LARGEST = 2**24


def size(rows: float, columns: float) -> tuple[int, int]:
    """Height and width of an array to be made.

    Raises
    ------
    Fail
        #VALUE! if one is negative, #CALC! if one is 0.
    """
    height, width = int(rows), int(columns)
    if height < 0 or width < 0 or height * width > LARGEST:
        raise Fail(CellError("#VALUE!", "an array of this size cannot be made"))
    if height == 0 or width == 0:
        raise Fail(CellError("#CALC!", "the array would be empty"))
    return height, width


@native("SEQUENCE", "number~ number~ number~ number~")
def sequence(rows: float = 1.0, columns: float = 1.0, start: float = 1.0, step: float = 1.0) -> Array:
    """Numbers in equal steps, row by row."""
    height, width = size(rows, columns)
    return Array(height, width, [start + i * step for i in range(height * width)])


def taken_rows(table: Array, rows: Sequence[int]) -> Array:
    """Some rows of an array, in the order given."""
    w, flat = table.width, table.flat
    return Array(len(rows), w, [v for r in rows for v in flat[r * w : (r + 1) * w]])


def taken_columns(table: Array, columns: Sequence[int]) -> Array:
    """Some columns of an array, in the order given."""
    w, flat = table.width, table.flat
    return Array(table.height, len(columns), [flat[r * w + c] for r in range(table.height) for c in columns])


def _taken(table: Array, indices: Sequence[int], across: bool) -> Array:
    return (taken_columns if across else taken_rows)(table, indices)


@native("FILTER", "array array operand?")
def filter_(table: Array, include: Array, if_empty: Argument = MISSING) -> Operand:
    """Rows, or columns, beside a TRUE."""
    if include.width == 1 and include.height == table.height:
        across = False
    elif include.height == 1 and include.width == table.width:
        across = True
    else:
        raise Fail(CellError("#VALUE!", "the conditions are not as many as the rows or columns"))
    kept = []
    for i, value in enumerate(include.flat):
        test = to_logical(value)
        if isinstance(test, CellError):
            raise Fail(test)
        if test:
            kept.append(i)
    if kept:
        return _taken(table, kept, across)
    if isinstance(if_empty, Missing):
        raise Fail(CellError("#CALC!", "no row or column is left"))
    assert not callable(if_empty)
    return if_empty


def _ordered(keys: Sequence[tuple[Sequence[Value], int]], count: int) -> list[int]:
    """Indices in the order of several keys, each with 1 or −1; equal ones keep their order.

    Numbers, texts, logicals, errors; blanks come last whichever the direction.
    """
    order = list(range(count))
    for values, direction in reversed(keys):
        blanks = [i for i in order if values[i] is BLANK]
        filled = [i for i in order if values[i] is not BLANK]
        if all(type(v) is float for v in values):
            signed = [direction * v for v in values]  # type: ignore[operator]
            filled.sort(key=signed.__getitem__)
        else:
            ranks = _ranks(values)
            filled.sort(key=[direction * r for r in ranks].__getitem__)
        order = filled + blanks
    return order


def _ranks(values: Sequence[Value]) -> list[int]:
    """Place of each value among the different ones."""

    def order(i: int, j: int) -> int:
        return _compared(values[i], values[j])

    ranked = sorted((i for i, v in enumerate(values) if v is not BLANK), key=cmp_to_key(order))
    ranks = [0] * len(values)
    for before, i in pairwise(ranked):
        ranks[i] = ranks[before] + (order(before, i) != 0)
    return ranks


def _error_rank(value: Value) -> int:
    """Order of errors among themselves, after every other value."""
    return ERROR_NUMBERS.get(value.code, 99) if isinstance(value, CellError) else 0


def _compared(a: Value, b: Value) -> int:
    if isinstance(a, CellError) or isinstance(b, CellError):
        return _error_rank(a) - _error_rank(b)
    return compare(a, b)


def _direction(number: float) -> int:
    if number not in (1.0, -1.0):
        raise Fail(CellError("#VALUE!", "the sort order is 1 or -1"))
    return int(number)


def _numbers(argument: Argument, default: float) -> list[float]:
    """Numbers of an argument that may be one or several."""
    if isinstance(argument, Missing):
        return [default]
    values = argument.flat if isinstance(argument, Array) else [argument]
    numbers = []
    for v in values:
        number = to_number(v)  # type: ignore[arg-type]
        if isinstance(number, CellError):
            raise Fail(number)
        numbers.append(number)
    return numbers


@native("SORT", "array list? list? logical~")
def sort(
    table: Array, index: Argument = MISSING, order: Argument = MISSING, by_column: bool = False
) -> Array:
    """Rows, or columns, in the order of one or more of them."""
    across = by_column
    indices = [int(i) for i in _numbers(index, 1.0)]
    directions = [_direction(d) for d in _numbers(order, 1.0)]
    if len(directions) == 1:
        directions *= len(indices)
    lines, count = (table.height, table.width) if across else (table.width, table.height)
    if len(directions) != len(indices) or not all(1 <= i <= lines for i in indices):
        raise Fail(VALUE)
    w = table.width
    keys = [
        (table.flat[(i - 1) * w : i * w] if across else table.flat[i - 1 :: w], d)
        for i, d in zip(indices, directions, strict=True)
    ]
    return _taken(table, _ordered(keys, count), across)


@native("SORTBY", "array (array number)*")
def sortby(table: Array, *criteria: Array | float) -> Array:
    """Rows, or columns, in the order of other arrays."""
    keys: list[tuple[Sequence[Value], int]] = []
    across = False
    for i in range(0, len(criteria), 2):
        by = criteria[i]
        direction = criteria[i + 1] if i + 1 < len(criteria) else 1.0
        assert isinstance(by, Array)
        assert isinstance(direction, float)
        across = by.height == 1 and by.width > 1
        if (by.width != table.width) if across else (by.width != 1 or by.height != table.height):
            raise Fail(CellError("#VALUE!", "the arrays to sort by differ in length"))
        keys.append((by.flat, _direction(direction)))
    if not keys:
        raise Fail(VALUE)
    return _taken(table, _ordered(keys, table.width if across else table.height), across)


@native("UNIQUE", "array logical~ logical~")
def unique(table: Array, by_column: bool = False, once: bool = False) -> Array:
    """Different rows, or columns; or only those that occur once."""
    w, flat = table.width, table.flat
    if by_column:
        lines = [tuple(lookup_key(v) for v in flat[c::w]) for c in range(w)]
    else:
        lines = [tuple(lookup_key(v) for v in flat[r * w : (r + 1) * w]) for r in range(table.height)]
    first: dict[tuple[object, ...], int] = {}
    count: dict[tuple[object, ...], int] = {}
    for i, line in enumerate(lines):
        first.setdefault(line, i)
        count[line] = count.get(line, 0) + 1
    kept = [i for line, i in first.items() if not once or count[line] == 1]
    if not kept:
        raise Fail(CALC)
    return _taken(table, kept, by_column)
