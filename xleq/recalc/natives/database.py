"""Database functions: statistics of a column of a table over the rows that a block of criteria selects.

Rows of the block are alternatives, the columns of a row must all hold. A text without an operator is met by
every text that begins with it.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from typing import Any, Final

from xleq.cells import BLANK, MISSING, NUM, VALUE, CellError, Value
from xleq.recalc.coerce import to_text
from xleq.recalc.context import Context
from xleq.recalc.natives.arithmetic.sums import product, sum_
from xleq.recalc.natives.criteria import read_criterion
from xleq.recalc.natives.statistics.averages import average, count, counta, max_, min_
from xleq.recalc.natives.statistics.spread import stdev, stdevp, var, varp
from xleq.recalc.natives.table import native
from xleq.recalc.operands import Area, Array, Fail, Ref
from xleq.recalc.sheets.columns import Unsupported

_Test = Callable[[list[Value]], bool]


def _name(value: Value) -> str | None:
    """A header as it is compared; None for blanks and errors."""
    text = to_text(value)
    return None if isinstance(text, CellError) or text == "" else text.lower()


def _column_named(headers: list[Value], name: Value) -> int | None:
    wanted = _name(name)
    if wanted is None:
        return None
    return next((i for i, header in enumerate(headers) if _name(header) == wanted), None)


def _field(headers: list[Value], field: Value) -> int:
    """Place of the column that a header or a number from 1 names."""
    if isinstance(field, CellError):
        raise Fail(field)
    if isinstance(field, str):
        place = _column_named(headers, field)
        if place is None:
            raise Fail(VALUE)
        return place
    number = math.trunc(float(field)) if isinstance(field, float | bool) else 0
    if not 1 <= number <= len(headers):
        raise Fail(VALUE)
    return number - 1


def _test(column: int, criterion: Value) -> _Test:
    plain_text = isinstance(criterion, str) and criterion[:1] not in ("=", "<", ">")
    test = read_criterion(criterion)
    if plain_text and isinstance(test.operand, str):
        test = read_criterion(f"{criterion}*")
    return lambda row: test.met_by(row[column])


def _row_tests(context: Context, headers: list[Value], ref: Ref) -> list[list[_Test]]:
    """The tests of each row of a criteria block."""
    block = context.read(ref)
    rows = block.rows()
    names, tests = rows[0], []
    for i, row in enumerate(rows[1:], 1):
        of_row: list[_Test] = []
        for j, criterion in enumerate(row):
            if criterion is BLANK or criterion == "":
                continue
            column = _column_named(headers, names[j])
            if column is not None:
                of_row.append(_test(column, criterion))
            elif isinstance(criterion, str | CellError):
                of_row.append(lambda _row: False)
            else:
                of_row.append(_constant(context, ref.areas[0], i, j, criterion))
        tests.append(of_row)
    return tests


def _constant(context: Context, area: Area, i: int, j: int, criterion: Value) -> _Test:
    """A criterion under no header of the table: the same for every row, unless it is a formula."""
    at = Area(area.sheet, area.top + i, area.left + j, area.top + i, area.left + j)
    if context.formula_at(Ref((at,))) is not None:
        raise Unsupported("database criteria that are formulas of the row")
    met = bool(criterion)
    return lambda _row: met


def _selected(context: Context, table: Array, field: Any, criteria: Ref) -> list[Value]:
    """Values of a column in the selected rows; without a column, a number for each of them."""
    if table.height < 2:
        raise Fail(VALUE)
    headers, *rows = table.rows()
    column = None if field is MISSING else _field(headers, field)
    alternatives = _row_tests(context, headers, criteria)
    chosen = [row for row in rows if any(all(test(row) for test in tests) for tests in alternatives)]
    if column is None:
        return [1.0 for _ in chosen]
    return [row[column] for row in chosen]


@native("DGET", "array any range", context=True)
def dget(context: Context, table: Array, field: Any, criteria: Ref) -> Value:
    """The single value selected; #VALUE! for none, #NUM! for more than one."""
    values = _selected(context, table, field, criteria)
    if not values:
        raise Fail(VALUE)
    if len(values) > 1:
        raise Fail(NUM)
    return values[0]


_STATISTICS: Final[dict[str, Callable[[Array], float]]] = {
    "DSUM": sum_,
    "DPRODUCT": product,
    "DCOUNT": count,
    "DCOUNTA": counta,
    "DAVERAGE": average,
    "DMAX": max_,
    "DMIN": min_,
    "DSTDEV": stdev,
    "DSTDEVP": stdevp,
    "DVAR": var,
    "DVARP": varp,
}


def _declare(name: str, statistic: Callable[[Array], float]) -> None:
    @native(name, "array any~ range", context=True)
    def call(context: Context, table: Array, field: Any = MISSING, criteria: Ref | None = None) -> float:
        if criteria is None or (field is MISSING and name not in ("DCOUNT", "DCOUNTA")):
            raise Fail(VALUE)
        return statistic(Array.column(_selected(context, table, field, criteria)))


for _key, _statistic in _STATISTICS.items():
    _declare(_key, _statistic)
