"""SUBTOTAL and AGGREGATE: statistics of the rows that show, without other subtotals."""

from __future__ import annotations

import math
import re
from collections.abc import Callable, Iterator
from typing import Any, Final

from xleq.cells import NUM, VALUE, CellError, Value
from xleq.recalc.context import Context
from xleq.recalc.natives.arithmetic.sums import product, sum_
from xleq.recalc.natives.gather import direct_number
from xleq.recalc.natives.statistics.averages import average, count, counta, max_, median, min_, mode
from xleq.recalc.natives.statistics.ranks import (
    large,
    percentile,
    percentile_exc,
    quartile,
    quartile_exc,
    small,
)
from xleq.recalc.natives.statistics.spread import stdev, stdevp, var, varp
from xleq.recalc.natives.table import native
from xleq.recalc.operands import Area, Array, Fail, Ref

_OF_LIST: Final[dict[int, Callable[..., float]]] = {
    1: average, 2: count, 3: counta, 4: max_, 5: min_, 6: product, 7: stdev, 8: stdevp, 9: sum_, 10: var,
    11: varp, 12: median, 13: mode,
}  # fmt: skip
_OF_ARRAY: Final[dict[int, Callable[[Array, float], float]]] = {
    14: large, 15: small, 16: percentile, 17: quartile, 18: percentile_exc, 19: quartile_exc,
}  # fmt: skip
_NESTED = re.compile(r"(?<![\w.])(?:SUBTOTAL|AGGREGATE)\s*\(", re.IGNORECASE)


def _shown(
    context: Context, area: Area, *, hidden: bool, filtered: bool, nested: bool, errors: bool
) -> Iterator[Value]:
    """Values of an area, without those of hidden rows, filtered rows, nested subtotals or errors as asked."""
    array, book = context.read(Ref((area,))), context.book
    for i in range(array.height):
        row = area.top + i
        if (hidden and book.is_hidden_row(area.sheet, row)) or (
            filtered and book.is_filtered_row(area.sheet, row)
        ):
            continue
        for j in range(array.width):
            value = array.at(i, j)
            if errors and isinstance(value, CellError):
                continue
            if nested and isinstance(value, float | CellError):
                formula = book.formula_at(area.sheet, row, area.left + j)
                if formula is not None and _NESTED.search(formula):
                    continue
            yield value


@native("SUBTOTAL", "number range range*", context=True)
def subtotal(context: Context, function: float, *refs: Ref) -> float:
    """One of eleven statistics of rows that no filter hides; from 101 on, of rows that nothing hides."""
    number = math.trunc(function)
    hidden = number > 100
    call = _OF_LIST.get(number - 100 if hidden else number)
    if call is None or number % 100 > 11:
        raise Fail(VALUE)
    values = [
        v
        for ref in refs
        for area in ref.areas
        for v in _shown(context, area, hidden=hidden, filtered=True, nested=True, errors=False)
    ]
    return call(Array.column(values))


@native("AGGREGATE", "number number matrix matrix*", context=True)
def aggregate(context: Context, function: float, options: float, *operands: Any) -> float:
    """One of nineteen statistics, without hidden rows, errors or nested subtotals as the options say."""
    number, option = math.trunc(function), math.trunc(options)
    if not 0 <= option <= 7:
        raise Fail(VALUE)
    errors = option in (2, 3, 6, 7)

    def values_of(operand: Any) -> list[Value]:
        if isinstance(operand, Ref):
            return [
                v
                for area in operand.areas
                for v in _shown(
                    context, area, hidden=option in (1, 3, 5, 7), filtered=option != 4, nested=option < 4,
                    errors=errors,
                )
            ]  # fmt: skip
        values = list(operand.flat) if isinstance(operand, Array) else [direct_number(operand)]
        return [v for v in values if not (errors and isinstance(v, CellError))]

    if number in _OF_LIST:
        if not all(isinstance(operand, Ref) for operand in operands):
            raise Fail(VALUE)
        return _OF_LIST[number](Array.column([v for operand in operands for v in values_of(operand)]))
    if number not in _OF_ARRAY or len(operands) != 2:
        raise Fail(VALUE)
    if isinstance(operands[1], Array):
        raise Fail(NUM)
    k = operands[1] if not isinstance(operands[1], Ref) else context.read(operands[1]).flat[0]
    return _OF_ARRAY[number](Array.column(values_of(operands[0])), direct_number(k))
