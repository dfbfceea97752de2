"""Cash flows: present values and internal rates of return."""

from __future__ import annotations

import math
from collections.abc import Callable
from typing import Any

from xleq.cells import DIV0, MISSING, NUM, VALUE
from xleq.recalc.natives.finance.roots import rate_of_zero
from xleq.recalc.natives.gather import check_errors, direct_number, guarded, numbers_of
from xleq.recalc.natives.table import native
from xleq.recalc.operands import Argument, Array, Fail


@native("NPV", "number list list*")
@guarded
def npv(rate: float, *flows: Argument) -> float:
    """Net present value, one period before the first flow."""
    return sum((flow / (1.0 + rate) ** i for i, flow in enumerate(numbers_of(flows), 1)), 0.0)


@native("IRR", "list number~")
@guarded
def irr(flows: Argument, guess: float = 0.1) -> float:
    """Internal rate of return, searched from a guess."""
    numbers = numbers_of([flows])
    if guess <= -1.0:
        raise Fail(VALUE)
    if not numbers or min(numbers) >= 0.0 or max(numbers) <= 0.0:
        raise Fail(NUM)

    def value(rate: float) -> float:
        total, factor = 0.0, 1.0
        for flow in numbers:
            total += flow * factor
            factor /= 1.0 + rate
        return total

    return rate_of_zero(value, guess)


@native("MIRR", "list number number")
@guarded
def mirr(flows: Argument, borrowing: float, investing: float) -> float:
    """Modified internal rate of return."""
    numbers = numbers_of([flows])
    n = len(numbers)
    gains = sum(x * (1.0 + investing) ** (n - 1 - i) for i, x in enumerate(numbers) if x > 0.0)
    losses = sum(x / (1.0 + borrowing) ** i for i, x in enumerate(numbers) if x < 0.0)
    if gains == 0.0 or losses == 0.0 or n < 2:
        raise Fail(DIV0)
    return float((gains / -losses) ** (1.0 / (n - 1))) - 1.0


def _strict(value: Any) -> float:
    if type(value) is not float:
        raise Fail(NUM)
    return value


def _converted(value: Any) -> float:
    return direct_number(value, logicals=False)


def _dated(flows: Argument, dates: Argument, read: Callable[[Any], float]) -> tuple[list[float], list[float]]:
    """Amounts, and years since the first date."""
    columns: list[list[float]] = []
    for argument in (flows, dates):
        values = [argument]
        if isinstance(argument, Array):
            check_errors(argument)
            values = list(argument.flat)
        columns.append([read(v) for v in values])
    amounts, days = columns[0], [float(math.trunc(d)) for d in columns[1]]
    if len(amounts) != len(days) or any(d < days[0] or d < 0.0 for d in days):
        raise Fail(NUM)
    return amounts, [(d - days[0]) / 365.0 for d in days]


@native("XNPV", "number list list")
@guarded
def xnpv(rate: float, flows: Argument, dates: Argument) -> float:
    """Net present value of dated flows on the first date."""
    amounts, years = _dated(flows, dates, _strict)
    if rate <= 0.0:
        raise Fail(NUM)
    return math.fsum(a / (1.0 + rate) ** t for a, t in zip(amounts, years, strict=True))


@native("XIRR", "list list number~")
@guarded
def xirr(flows: Argument, dates: Argument, guess: float = 0.1) -> float:
    """Internal rate of return of dated flows, searched from a guess."""
    amounts, years = _dated(flows, dates, _converted)
    if guess <= -1.0 or not amounts or min(amounts) >= 0.0 or max(amounts) <= 0.0:
        raise Fail(NUM)

    def value(rate: float) -> float:
        return math.fsum(a / (1.0 + rate) ** t for a, t in zip(amounts, years, strict=True))

    return rate_of_zero(value, guess)


@native("FVSCHEDULE", "number list")
@guarded
def fvschedule(principal: float, rates: Argument) -> float:
    """Future value under rates that change from period to period."""
    total = principal
    values: list[Any] = list(rates.flat) if isinstance(rates, Array) else [rates]
    for value in values:
        if value is not MISSING:
            total *= 1.0 + direct_number(value, logicals=False)
    return total
