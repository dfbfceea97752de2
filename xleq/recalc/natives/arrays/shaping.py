"""TAKE, DROP, HSTACK, TOCOL, WRAPROWS and their kin."""

from __future__ import annotations

from collections.abc import Sequence

from xleq.cells import BLANK, MAX_ROW, NA, NUM, VALUE, CellError, Missing, Value
from xleq.recalc.coerce import to_number
from xleq.recalc.natives.arrays.making import size, taken_columns, taken_rows
from xleq.recalc.natives.table import native
from xleq.recalc.operands import Argument, Array, Fail


def _kept(count: float | None, total: int) -> range:
    """Indices that TAKE keeps: the first, or the last where negative."""
    if count is None:
        return range(total)
    n = int(count)
    if n == 0:
        raise Fail(CellError("#CALC!", "the array would be empty"))
    return range(min(n, total)) if n > 0 else range(max(total + n, 0), total)


def _left(count: float | None, total: int) -> range:
    """Indices that DROP leaves."""
    n = int(count or 0.0)
    left = range(n, total) if n >= 0 else range(max(total + n, 0))
    if not left:
        raise Fail(CellError("#CALC!", "the array would be empty"))
    return left


@native("TAKE", "array number~ number~")
def take(table: Array, rows: float | None = None, columns: float | None = None) -> Array:
    """First rows and columns; the last ones where a number is negative."""
    if rows is None and columns is None:
        raise Fail(VALUE)
    return taken_columns(taken_rows(table, _kept(rows, table.height)), _kept(columns, table.width))


@native("DROP", "array number~ number~")
def drop(table: Array, rows: float | None = None, columns: float | None = None) -> Array:
    """All but the first rows and columns; all but the last ones where a number is negative."""
    if rows is None and columns is None:
        raise Fail(VALUE)
    return taken_columns(taken_rows(table, _left(rows, table.height)), _left(columns, table.width))


def _chosen(choices: Sequence[Argument], total: int) -> list[int]:
    """Indices named by numbers, negative ones from the end."""
    indices = []
    for choice in choices:
        for v in choice.flat if isinstance(choice, Array) else [choice]:
            number = to_number(v)  # type: ignore[arg-type]
            if isinstance(number, CellError):
                raise Fail(number)
            n = int(number)
            if n == 0 or abs(n) > total:
                raise Fail(CellError("#VALUE!", "the array has no such row or column"))
            indices.append(n - 1 if n > 0 else total + n)
    return indices


@native("CHOOSECOLS", "array list list*")
def choosecols(table: Array, *choices: Argument) -> Array:
    """Some columns, in the order named."""
    return taken_columns(table, _chosen(choices, table.width))


@native("CHOOSEROWS", "array list list*")
def chooserows(table: Array, *choices: Argument) -> Array:
    """Some rows, in the order named."""
    return taken_rows(table, _chosen(choices, table.height))


def _filler(value: Value | Missing) -> Value:
    return NA if isinstance(value, Missing) else value


@native("EXPAND", "array number~ number~ any?")
def expand(
    table: Array, rows: float | None = None, columns: float | None = None, pad: Value | Missing = NA
) -> Array:
    """The array in a larger one, the rest filled."""
    height = table.height if rows is None else int(rows)
    width = table.width if columns is None else int(columns)
    if height < table.height or width < table.width:
        raise Fail(CellError("#VALUE!", "the new size is smaller than the array"))
    size(height, width)
    return _padded(table, height, width, _filler(pad))


def _padded(table: Array, height: int, width: int, filler: Value) -> Array:
    rows = [[*row, *[filler] * (width - table.width)] for row in table.rows()]
    rows += [[filler] * width for _ in range(height - table.height)]
    return Array.of_rows(rows)


@native("HSTACK", "array array*")
def hstack(*tables: Array) -> Array:
    """Arrays side by side; the shorter ones end in #N/A."""
    height = max(t.height for t in tables)
    blocks = [_padded(t, height, t.width, NA).rows() for t in tables]
    return Array.of_rows([[v for block in blocks for v in block[r]] for r in range(height)])


@native("VSTACK", "array array*")
def vstack(*tables: Array) -> Array:
    """Arrays one below the other; the narrower ones end in #N/A."""
    width = max(t.width for t in tables)
    return Array.of_rows([row for t in tables for row in _padded(t, t.height, width, NA).rows()])


def _strung(table: Array, ignore: float, by_column: bool) -> list[Value]:
    """All values in one line; 1 leaves out blanks, 2 errors, 3 both."""
    skipped = int(ignore)
    if skipped not in (0, 1, 2, 3):
        raise Fail(VALUE)
    w, flat = table.width, table.flat
    values = [v for c in range(w) for v in flat[c::w]] if by_column else flat
    kept = [
        v
        for v in values
        if not (skipped & 1 and v is BLANK) and not (skipped & 2 and isinstance(v, CellError))
    ]
    if not kept:
        raise Fail(CellError("#CALC!", "the array would be empty"))
    return kept


@native("TOCOL", "array number~ logical~")
def tocol(table: Array, ignore: float = 0.0, by_column: bool = False) -> Array:
    """All values in one column."""
    return Array.column(_strung(table, ignore, by_column))


@native("TOROW", "array number~ logical~")
def torow(table: Array, ignore: float = 0.0, by_column: bool = False) -> Array:
    """All values in one row."""
    return Array.row(_strung(table, ignore, by_column))


def _wrapped(vector: Array, count: float, pad: Value | Missing) -> list[list[Value]]:
    if vector.height != 1 and vector.width != 1:
        raise Fail(CellError("#VALUE!", "a row or a column is wanted"))
    n = int(count)
    if not 1 <= n <= MAX_ROW:
        raise Fail(NUM)
    flat = list(vector.flat)
    flat += [_filler(pad)] * (-len(flat) % n)
    return [flat[i : i + n] for i in range(0, len(flat), n)]


@native("WRAPROWS", "array number any?")
def wraprows(vector: Array, count: float, pad: Value | Missing = NA) -> Array:
    """A row or column broken into rows."""
    return Array.of_rows(_wrapped(vector, count, pad))


@native("WRAPCOLS", "array number any?")
def wrapcols(vector: Array, count: float, pad: Value | Missing = NA) -> Array:
    """A row or column broken into columns."""
    columns = _wrapped(vector, count, pad)
    return Array.of_rows([[column[r] for column in columns] for r in range(len(columns[0]))])
