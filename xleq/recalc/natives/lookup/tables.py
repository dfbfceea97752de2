"""MATCH, VLOOKUP and their kin."""

from __future__ import annotations

from xleq.cells import BLANK, NA, VALUE, CellError, Missing, Value
from xleq.recalc.context import Context
from xleq.recalc.expressions import is_quick, regular_expression
from xleq.recalc.natives.lookup import finding
from xleq.recalc.natives.lookup.blocks import Block
from xleq.recalc.natives.table import native
from xleq.recalc.operands import Argument, Array, Fail, Operand
from xleq.recalc.sheets.columns import Unsupported


def _sought(wanted: Value | Missing) -> Value:
    """What the older functions look for: a blank counts as 0."""
    if isinstance(wanted, Missing) or wanted is BLANK:
        return 0.0
    finding.check_length(wanted)
    return wanted


def _found(position: int | None) -> int:
    if position is None:
        raise Fail(CellError("#N/A", "the value is not found"))
    return position


def _approximate(values: Array, wanted: Value) -> int:
    return _found(finding.last_at_most(values, wanted))


@native("MATCH", "value operand number?", context=True)
def match(context: Context, wanted: Value, table: Argument, kind: float = 1.0) -> float:
    """Position of a value in a row or column."""
    values = Block(context, table).vector(NA)
    wanted = _sought(wanted)
    if kind == 0:
        return _found(finding.exact(values, wanted, True)) + 1.0
    if kind > 0:
        return _approximate(values, wanted) + 1.0
    return _found(finding.last_at_least(values, wanted)) + 1.0


def _index(number: float, size: int) -> int:
    if number < 1:
        raise Fail(CellError("#VALUE!", "the number of the column or row is less than 1"))
    if number >= size + 1:
        raise Fail(CellError("#REF!", "the table has fewer columns or rows"))
    return int(number) - 1


def _table(context: Context, argument: Argument) -> Block:
    if isinstance(argument, str):
        raise Fail(CellError("#VALUE!", "the table must be a range or an array"))
    return Block(context, argument)


@native("VLOOKUP", "value operand number logical?", context=True)
def vlookup(
    context: Context, wanted: Value, table: Argument, column: float, approximate: bool = True
) -> Value:
    """Value in a column of the row whose first value is found."""
    block = _table(context, table)
    index = _index(column, block.width)
    wanted, first = _sought(wanted), block.column(0)
    row = _approximate(first, wanted) if approximate else _found(finding.exact(first, wanted, True))
    return block.value(row, index)


@native("HLOOKUP", "value operand number logical?", context=True)
def hlookup(context: Context, wanted: Value, table: Argument, row: float, approximate: bool = True) -> Value:
    """Value in a row of the column whose first value is found."""
    block = _table(context, table)
    index = _index(row, block.height)
    wanted, first = _sought(wanted), block.row(0)
    column = _approximate(first, wanted) if approximate else _found(finding.exact(first, wanted, True))
    return block.value(index, column)


@native("LOOKUP", "value operand operand?", context=True)
def lookup(context: Context, wanted: Value, table: Argument, results: Argument | None = None) -> Value:
    """Value beside the last one that is not above the wanted one, in an ascending list."""
    block = Block(context, table)
    wanted = _sought(wanted)
    across = block.width > block.height
    position = _approximate(block.row(0) if across else block.column(0), wanted)
    if results is None or isinstance(results, Missing):
        return block.value(block.height - 1, position) if across else block.value(position, block.width - 1)
    result = Block(context, results)
    if result.height != 1 and result.width != 1:
        raise Fail(NA)
    if position >= max(result.height, result.width):
        raise Fail(NA)
    return result.value(0, position) if result.width > 1 else result.value(position, 0)


def _position(
    block: Block, values: Array, wanted: Value | Missing, match_mode: float, search_mode: float
) -> int | None:
    """Where XMATCH and XLOOKUP find a value."""
    mode, search = finding.checked_modes(match_mode, search_mode)
    if isinstance(wanted, Missing):
        wanted = BLANK
    if abs(search) == 2:
        return finding.sorted_position(values, wanted, mode, search < 0)
    backwards = search < 0
    if wanted is BLANK:
        # Blank cells beyond the used range are found before those inside (seen in stored values).
        size = max(block.height, block.width)
        if len(values.flat) < size:
            return size - 1 if backwards else len(values.flat)
        return (finding.last_exact if backwards else finding.exact)(values, BLANK, False)
    if mode in (-1, 1):
        return finding.nearest(values, wanted, mode > 0, backwards)
    if mode == 3:
        if not isinstance(wanted, str):
            raise Fail(VALUE)
        expression = regular_expression(wanted)
        if not is_quick(wanted, max((len(v) for v in values.flat if isinstance(v, str)), default=0)):
            raise Unsupported("the regular expression could take too long on these texts")
        return finding.matching(values, expression, backwards)
    return (finding.last_exact if backwards else finding.exact)(values, wanted, mode == 2)


@native("XMATCH", "value operand number~ number~", context=True)
def xmatch(
    context: Context,
    wanted: Value | Missing,
    table: Argument,
    match_mode: float = 0.0,
    search_mode: float = 1.0,
) -> float:
    """Position of a value in a row or column."""
    block = Block(context, table)
    return _found(_position(block, block.vector(VALUE), wanted, match_mode, search_mode)) + 1.0


@native("XLOOKUP", "value operand operand operand? number~ number~", context=True)
def xlookup(
    context: Context,
    wanted: Value | Missing,
    table: Argument,
    results: Argument,
    if_not_found: Argument | None = None,
    match_mode: float = 0.0,
    search_mode: float = 1.0,
) -> Operand:
    """Cell, or row or column of cells, beside the value that is found."""
    block, result = Block(context, table), Block(context, results)
    values = block.vector(VALUE)
    across = block.width > 1 or (block.height == 1 and result.width == 1)
    if (block.width != result.width) if across else (block.height != result.height):
        raise Fail(CellError("#VALUE!", "the two arrays differ in length"))
    position = _position(block, values, wanted, match_mode, search_mode)
    if position is not None:
        return result.line(position, across)
    if if_not_found is None or isinstance(if_not_found, Missing):
        raise Fail(CellError("#N/A", "the value is not found"))
    assert not callable(if_not_found)
    return if_not_found
