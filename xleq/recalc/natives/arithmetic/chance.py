"""Random numbers, drawn from the generator of the recalculation."""

from __future__ import annotations

import math

from xleq.cells import VALUE
from xleq.recalc.context import Context
from xleq.recalc.natives.table import native
from xleq.recalc.natives.tools import tool
from xleq.recalc.operands import Array, Fail

_MOST = 1_000_000


@native("RAND", context=True, volatile=True)
def rand(context: Context) -> float:
    """A number from 0 to below 1."""
    return context.random()


def _whole_between(context: Context, low: int, high: int) -> float:
    return float(low + math.floor(context.random() * (high - low + 1)))


@tool("RANDBETWEEN", "number number", context=True, volatile=True)
def randbetween(context: Context, low: float, high: float) -> float:
    """A whole number between limits, both included."""
    first, last = math.ceil(low), math.floor(high)
    if first > last:
        raise ValueError
    return _whole_between(context, first, last)


@native("RANDARRAY", "number~ number~ number~ number~ logical?", context=True, volatile=True)
def randarray(
    context: Context,
    rows: float = 1.0,
    columns: float = 1.0,
    low: float = 0.0,
    high: float = 1.0,
    whole: bool = False,
) -> Array:
    """A block of random numbers."""
    height, width = math.trunc(rows), math.trunc(columns)
    if height < 1 or width < 1 or height * width > _MOST or low > high:
        raise Fail(VALUE)
    if not whole:
        return Array(height, width, [low + context.random() * (high - low) for _ in range(height * width)])
    first, last = math.trunc(low), math.trunc(high)
    if first != low or last != high:
        raise Fail(VALUE)
    return Array(height, width, [_whole_between(context, first, last) for _ in range(height * width)])
