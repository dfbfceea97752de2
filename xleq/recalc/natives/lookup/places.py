"""References: INDEX, OFFSET, INDIRECT, ADDRESS, ROW and their kin."""

from __future__ import annotations

import re
from typing import Final

from xleq.cells import (
    MAX_COLUMN,
    MAX_ROW,
    REF,
    VALUE,
    CellError,
    Missing,
    Value,
    column_letters,
    quote_sheet,
)
from xleq.recalc.context import Context
from xleq.recalc.natives.lookup.blocks import Block
from xleq.recalc.natives.table import native
from xleq.recalc.operands import Area, Argument, Array, Computed, Fail, Operand, Ref

#: Up to so many numbers are made one by one.
_FEW: Final = 64


@native("INDEX", "operand number? number? number?", context=True)
def index(
    context: Context,
    table: Argument,
    row: float = 0.0,
    column: float | None = None,
    area: float = 1.0,
) -> Operand:
    """Cell, row or column of a reference or an array."""
    which = int(area)
    if which < 1:
        raise Fail(VALUE)
    areas = table.areas if isinstance(table, Ref) else (None,)
    if which > len(areas):
        raise Fail(REF)
    block = Block(context, Ref((table.areas[which - 1],)) if isinstance(table, Ref) else table)
    r, c = int(row), int(column or 0.0)
    if column is None and block.height == 1:
        r, c = 1 if r else 0, r
    elif column is None and block.width > 1 and block.is_reference and r:
        raise Fail(CellError("#REF!", "the table has several columns and none is named"))
    if r < 0 or c < 0:
        raise Fail(VALUE)
    if r > block.height or c > block.width:
        raise Fail(CellError("#REF!", "the row or column lies outside the table"))
    top, bottom = (r - 1, r - 1) if r else (0, block.height - 1)
    left, right = (c - 1, c - 1) if c else (0, block.width - 1)
    return block.taken(top, left, bottom, right)


@native("OFFSET", "range number number number~ number~", volatile=True)
def offset(
    start: Ref, rows: float, columns: float, height: float | None = None, width: float | None = None
) -> Ref:
    """Reference moved by rows and columns, with another size where one is given."""
    if len(start.areas) != 1:
        raise Fail(VALUE)
    a = start.areas[0]
    top, left = a.top + int(rows), a.left + int(columns)
    h = a.bottom - a.top + 1 if height is None else int(height)
    w = a.right - a.left + 1 if width is None else int(width)
    if h == 0 or w == 0:
        raise Fail(CellError("#REF!", "a reference has at least one row and column"))
    bottom, right = top + h - (1 if h > 0 else -1), left + w - (1 if w > 0 else -1)
    top, bottom, left, right = min(top, bottom), max(top, bottom), min(left, right), max(left, right)
    if top < 1 or left < 1 or bottom > MAX_ROW or right > MAX_COLUMN:
        raise Fail(CellError("#REF!", "the reference leaves the sheet"))
    return Ref((Area(a.sheet, top, left, bottom, right),))


@native("INDIRECT", "text logical?", context=True, volatile=True)
def indirect(context: Context, text: str, a1: bool = True) -> Ref:
    """Reference that a text names."""
    return context.reference(text, a1)


@native("ADDRESS", "number number number~ logical~ text?")
def address(row: float, column: float, fixed: float = 1.0, a1: bool = True, sheet: str | None = None) -> str:
    """Text of a cell's address; `fixed` 1 both, 2 the row, 3 the column, 4 neither."""
    r, c, which = int(row), int(column), int(fixed)
    if which not in (1, 2, 3, 4):
        raise Fail(VALUE)
    row_fixed, column_fixed = which in (1, 2), which in (1, 3)
    if not (1 <= r <= MAX_ROW and 1 <= c <= MAX_COLUMN):
        raise Fail(CellError("#VALUE!", "the sheet has no such row or column"))
    if a1:
        cell = f"{'$' * column_fixed}{column_letters(c)}{'$' * row_fixed}{r}"
    else:
        cell = f"R{r if row_fixed else f'[{r}]'}C{c if column_fixed else f'[{c}]'}"
    if sheet is None:
        return cell
    return f"{quote_sheet(sheet) if sheet else ''}!{cell}"


def _rows(ref: Ref) -> range:
    area = _only(ref)
    return range(area.top, area.bottom + 1)


def _columns(ref: Ref) -> range:
    area = _only(ref)
    return range(area.left, area.right + 1)


def _counted(numbers: range, across: bool) -> Operand:
    """The numbers as a value, a column, or a row."""
    if len(numbers) == 1:
        return float(numbers[0])
    if len(numbers) <= _FEW:
        return (Array.row if across else Array.column)(float(n) for n in numbers)
    import numpy as np

    data = np.arange(numbers.start, numbers.stop, dtype=np.float64)
    return Computed(data.reshape((1, -1) if across else (-1, 1)))


def _only(ref: Ref) -> Area:
    if len(ref.areas) != 1:
        raise Fail(REF)
    return ref.areas[0]


@native("ROW", "range?", context=True)
def row(context: Context, ref: Ref | None = None) -> Operand:
    """Row numbers of a reference, or of the formula's cell."""
    if ref is None:
        return float(context.row)
    return _counted(_rows(ref), across=False)


@native("COLUMN", "range?", context=True)
def column(context: Context, ref: Ref | None = None) -> Operand:
    """Column numbers of a reference, or of the formula's cell."""
    if ref is None:
        return float(context.column)
    return _counted(_columns(ref), across=True)


def _size(argument: Argument) -> tuple[int, int]:
    if isinstance(argument, CellError):
        raise Fail(argument)
    if isinstance(argument, Ref):
        return len(_rows(argument)), len(_columns(argument))
    if isinstance(argument, Array):
        return argument.height, argument.width
    if isinstance(argument, Missing):
        raise Fail(VALUE)
    return 1, 1


@native("ROWS", "operand")
def rows(table: Argument) -> float:
    """Number of rows."""
    return float(_size(table)[0])


@native("COLUMNS", "operand")
def columns(table: Argument) -> float:
    """Number of columns."""
    return float(_size(table)[1])


@native("AREAS", "range")
def areas(ref: Ref) -> float:
    """Number of areas of a reference."""
    return float(len(ref.areas))


@native("TRANSPOSE", "array")
def transpose(table: Array) -> Array:
    """Rows as columns."""
    flat, w = table.flat, table.width
    return Array(w, table.height, [v for c in range(w) for v in flat[c::w]])


_PREFIX = re.compile(r"_xl(?:fn|ws|pm|op|udf)\.")
_SPILL = re.compile(r"ANCHORARRAY\(([^()]*)\)")
_SINGLE = re.compile(r"SINGLE\(([^()]*)\)")


def shown_formula(formula: str) -> str:
    """Formula as the spreadsheet shows it, without the prefixes that files put before newer functions.

    Examples
    --------
    >>> shown_formula('=_xlfn.CONCAT("_xlfn.",_xlfn.ANCHORARRAY(A1))')
    '=CONCAT("_xlfn.",A1#)'
    """
    pieces = formula.split('"')
    for i in range(0, len(pieces), 2):
        if "_xl" in pieces[i]:
            plain = _PREFIX.sub("", pieces[i])
            pieces[i] = _SINGLE.sub(r"@\1", _SPILL.sub(r"\1#", plain))
    return '"'.join(pieces)


@native("FORMULATEXT", "range", context=True)
def formulatext(context: Context, ref: Ref) -> Operand:
    """Formula of a cell as text."""

    def text(area: Area) -> Value:
        formula = context.formula_at(Ref((area,)))
        if formula is None:
            return CellError("#N/A", "the cell holds no formula")
        return shown_formula(formula)

    area = _only(ref)
    rows, columns = _rows(ref), _columns(ref)
    if len(rows) * len(columns) == 1:
        return text(area)
    cells = [text(Area(area.sheet, r, c, r, c)) for r in rows for c in columns]
    return Array(len(rows), len(columns), cells)


@native("HYPERLINK", "text any?")
def hyperlink(link: str, shown: Value | Missing | None = None) -> Value:
    """What the cell of a link shows."""
    return link if shown is None or isinstance(shown, Missing) else shown
