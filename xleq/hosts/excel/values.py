"""What crosses between Excel and the worksheet functions.

Excel's automation interface cannot carry an error value out of Python. An error therefore leaves as text, its
code and then its reason (``#NUM! XLEQ_KP: Kc must be positive``), which our VBA turns into the true error.
"""

from __future__ import annotations

from datetime import datetime, timedelta
from decimal import Decimal
from typing import Any, Final, cast

from xleq.cells import BLANK, ERRORS, MISSING, VALUE, CellError, Grid, Missing, Value
from xleq.functions.table import Given

#: Longest text that an array may hand to a cell.
LONGEST_IN_ARRAY: Final = 255
_DAY_0: Final = datetime(1899, 12, 30)
_FIRST_OF_MARCH_1900: Final = 61.0
_ERROR_NUMBERS: Final = range(-2146826288, -2146826200)


def from_excel(item: Any) -> Given:
    """An argument as xlwings reads it: `MISSING`, or a list of rows."""
    if isinstance(item, Missing):
        return MISSING
    rows = item if isinstance(item, list) else [[item]]
    grid: Grid = [[_value(v) for v in row] for row in rows]
    return grid[0][0] if len(grid) == 1 and len(grid[0]) == 1 else grid


def _value(value: Any) -> Value:
    if value is None or value == "":
        return BLANK
    if isinstance(value, str):
        return ERRORS.get(value, value)
    if isinstance(value, bool | float):
        return value
    if isinstance(value, datetime):
        return _serial(value)
    if isinstance(value, int) and value in _ERROR_NUMBERS:
        return VALUE  # a newer error than xlwings has names for
    return float(cast(int | Decimal, value))


def _serial(moment: datetime) -> float:
    """The number that a date cell holds, in the date system that begins in 1900."""
    days = (moment.replace(tzinfo=None) - _DAY_0) / timedelta(days=1)
    # Excel counts a 29 February 1900 that never was.
    return days if days >= _FIRST_OF_MARCH_1900 else days - 1.0


def to_excel(found: Value | Grid) -> list[list[float | str | bool]]:
    """A result as rows of numbers, texts and logicals; errors as text."""
    if not isinstance(found, list):
        return [[_marked(found)]]
    return [[_in_array(_marked(v)) for v in row] for row in found]


def _marked(value: Value) -> float | str | bool:
    if isinstance(value, CellError):
        return f"{value.code} {value.reason}".rstrip()
    return "" if value is BLANK else cast(float | str | bool, value)


def _in_array(value: float | str | bool) -> float | str | bool:
    if not isinstance(value, str) or len(value) <= LONGEST_IN_ARRAY:
        return value
    code = value.partition(" ")[0]
    if code in ERRORS:
        return value[: LONGEST_IN_ARRAY - 1] + "…"
    return f"{VALUE.code} a text of {len(value)} characters is too long for a cell of an array"
