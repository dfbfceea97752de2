"""Depreciation of assets."""

from __future__ import annotations

import math

from xleq.recalc.natives.gather import guarded
from xleq.recalc.natives.table import native
from xleq.recalc.sheets.columns import Unsupported


@native("SLN", "number number number")
def sln(cost: float, salvage: float, life: float) -> float:
    """Straight line."""
    return (cost - salvage) / life


@native("SYD", "number number number number")
def syd(cost: float, salvage: float, life: float, period: float) -> float:
    """Sum of the years' digits."""
    if salvage < 0.0 or life <= 0.0 or not 0.0 < period <= life:
        raise ValueError
    return (cost - salvage) * (life - period + 1.0) * 2.0 / (life * (life + 1.0))


@native("DB", "number number number number number~")
def db(cost: float, salvage: float, life: float, period: float, months: float = 12.0) -> float:
    """Fixed declining balance, its rate rounded to three decimals."""
    years, at, first = math.trunc(life), math.trunc(period), math.trunc(months)
    if cost < 0.0 or salvage < 0.0 or years < 1 or not 1 <= first <= 12:
        raise ValueError
    if not 1 <= at <= years + (first < 12):
        raise ValueError
    if cost == 0.0:
        return 0.0
    rate = math.floor((1.0 - (salvage / cost) ** (1.0 / life)) * 1000.0 + 0.5) / 1000.0
    amount = cost * rate * first / 12.0
    written_off = amount
    for year in range(2, at + 1):
        amount = (cost - written_off) * rate * (1.0 if year <= years else (12.0 - first) / 12.0)
        written_off += amount
    return float(amount)


@native("DDB", "number number number number number~")
def ddb(cost: float, salvage: float, life: float, period: float, factor: float = 2.0) -> float:
    """Declining balance by a factor, not below the salvage value."""
    if cost < 0.0 or salvage < 0.0 or life <= 0.0 or factor <= 0.0 or not 0.0 < period <= life:
        raise ValueError
    rate = min(factor / life, 1.0)
    if rate == 1.0:
        before, after = (cost if period <= 1.0 else 0.0), 0.0
    else:
        before, after = cost * (1.0 - rate) ** (period - 1.0), cost * (1.0 - rate) ** period
    return max(before - max(after, salvage), 0.0)


@native("VDB", "number number number number number number~ logical?")
@guarded
def vdb(
    cost: float,
    salvage: float,
    life: float,
    start: float,
    end: float,
    factor: float = 2.0,
    stay: bool = False,
) -> float:
    """Declining balance between two times, changing to the straight line where that is more."""
    if cost < 0.0 or salvage < 0.0 or life <= 0.0 or factor < 0.0 or not 0.0 <= start <= end <= life:
        raise ValueError
    if start != math.trunc(start) and not stay:
        raise Unsupported("VDB from within a period")
    value, total = cost, 0.0
    for year in range(math.ceil(end)):
        amount = min(value * min(factor / life, 1.0), max(value - salvage, 0.0))
        if not stay:
            amount = max(amount, max(value - salvage, 0.0) / max(life - year, 1.0))
        share = max(min(end, year + 1.0) - max(start, float(year)), 0.0)
        total += amount * share
        value -= amount
    return total
