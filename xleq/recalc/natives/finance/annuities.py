"""Loans and annuities of equal payments: money paid out is negative, money received positive."""

from __future__ import annotations

import math

from xleq.recalc.natives.finance.roots import rate_of_zero
from xleq.recalc.natives.table import native
from xleq.recalc.natives.tools import tool


def _growth(rate: float, periods: float) -> float:
    base = 1.0 + rate
    if base < 0.0 and periods != math.trunc(periods):
        raise ValueError
    return float(base**periods)


def _annuity(rate: float, periods: float, start: float) -> float:
    """Value at the end of one unit paid each period."""
    if rate == 0.0:
        return periods
    if abs(rate) < 1e-4:
        grown = math.expm1(periods * math.log1p(rate)) / rate
    else:
        grown = (_growth(rate, periods) - 1.0) / rate
    return grown * (1.0 + rate if start else 1.0)


@native("FV", "number number number number? number?")
def fv(rate: float, periods: float, payment: float, present: float = 0.0, start: float = 0.0) -> float:
    """Future value."""
    return -(present * _growth(rate, periods) + payment * _annuity(rate, periods, start)) + 0.0


@native("PV", "number number number number? number?")
def pv(rate: float, periods: float, payment: float, future: float = 0.0, start: float = 0.0) -> float:
    """Present value."""
    return -(future + payment * _annuity(rate, periods, start)) / _growth(rate, periods) + 0.0


@native("PMT", "number number number number? number?")
def pmt(rate: float, periods: float, present: float, future: float = 0.0, start: float = 0.0) -> float:
    """Payment of each period."""
    if periods == 0.0 or rate <= -1.0:
        raise ValueError
    return -(future + present * _growth(rate, periods)) / _annuity(rate, periods, start) + 0.0


@native("IPMT", "number number number number number? number?")
def ipmt(
    rate: float, period: float, periods: float, present: float, future: float = 0.0, start: float = 0.0
) -> float:
    """Interest within the payment of one period."""
    if not 1.0 <= period < periods + 1.0:
        raise ValueError
    if start and period == 1.0:
        return 0.0
    payment = pmt(rate, periods, present, future, start)
    interest = fv(rate, period - 1.0, payment, present, start) * rate
    return interest / (1.0 + rate) if start else interest


@native("PPMT", "number number number number number? number?")
def ppmt(
    rate: float, period: float, periods: float, present: float, future: float = 0.0, start: float = 0.0
) -> float:
    """Repayment within the payment of one period."""
    interest = ipmt(rate, period, periods, present, future, start)
    return pmt(rate, periods, present, future, start) - interest


@native("NPER", "number number number number? number?")
def nper(rate: float, payment: float, present: float, future: float = 0.0, start: float = 0.0) -> float:
    """Number of periods."""
    if rate == 0.0:
        return -(present + future) / payment
    if rate <= -1.0:
        raise ValueError
    scaled = payment * (1.0 + rate if start else 1.0)
    top, bottom = scaled - future * rate, scaled + present * rate
    if bottom == 0.0:
        raise ValueError
    return math.log(top / bottom) / math.log1p(rate)


@native("RATE", "number number number number? number? number~")
def rate(
    periods: float,
    payment: float,
    present: float,
    future: float = 0.0,
    start: float = 0.0,
    guess: float = 0.1,
) -> float:
    """Interest rate of each period, found from a guess; #NUM! where the search does not end."""
    if periods <= 0.0 or guess <= -1.0:
        raise ValueError

    def excess(r: float) -> float:
        return present * _growth(r, periods) + payment * _annuity(r, periods, start) + future

    return rate_of_zero(excess, guess)


def _checked(rate: float, periods: float, present: float, first: float, last: float, start: float) -> None:
    if rate <= 0.0 or periods <= 0.0 or present <= 0.0 or start not in (0.0, 1.0):
        raise ValueError
    if not 1 <= math.trunc(first) <= math.trunc(last) <= periods:
        raise ValueError


@tool("CUMIPMT", "number number number number number number")
def cumipmt(rate: float, periods: float, present: float, first: float, last: float, start: float) -> float:
    """Interest paid over some periods."""
    _checked(rate, periods, present, first, last, start)
    return math.fsum(
        ipmt(rate, float(i), periods, present, 0.0, start)
        for i in range(math.trunc(first), math.trunc(last) + 1)
    )


@tool("CUMPRINC", "number number number number number number")
def cumprinc(rate: float, periods: float, present: float, first: float, last: float, start: float) -> float:
    """Repayment over some periods."""
    _checked(rate, periods, present, first, last, start)
    return math.fsum(
        ppmt(rate, float(i), periods, present, 0.0, start)
        for i in range(math.trunc(first), math.trunc(last) + 1)
    )


@native("ISPMT", "number number number number")
def ispmt(rate: float, period: float, periods: float, present: float) -> float:
    """Interest of a period counted from 0 when equal parts are repaid."""
    return present * rate * (period / periods - 1.0)


@tool("EFFECT", "number number")
def effect(nominal: float, per_year: float) -> float:
    """Effective yearly rate."""
    n = math.trunc(per_year)
    if nominal <= 0.0 or n < 1:
        raise ValueError
    return float((1.0 + nominal / n) ** n) - 1.0


@tool("NOMINAL", "number number")
def nominal(effective: float, per_year: float) -> float:
    """Nominal yearly rate."""
    n = math.trunc(per_year)
    if effective <= 0.0 or n < 1:
        raise ValueError
    return float((1.0 + effective) ** (1.0 / n) - 1.0) * n


@native("PDURATION", "number number number")
def pduration(rate: float, present: float, future: float) -> float:
    """Periods until an investment has grown to a value."""
    if rate <= 0.0 or present <= 0.0 or future <= 0.0:
        raise ValueError
    return (math.log(future) - math.log(present)) / math.log1p(rate)


@native("RRI", "number number number")
def rri(periods: float, present: float, future: float) -> float:
    """Rate of growth per period."""
    if periods <= 0.0 or present == 0.0 or future / present < 0.0:
        raise ValueError
    return float((future / present) ** (1.0 / periods)) - 1.0


def _fraction(value: float) -> tuple[int, float]:
    parts = math.trunc(value)
    if parts < 0:
        raise ValueError
    if parts == 0:
        raise ZeroDivisionError
    return parts, 10.0 ** math.ceil(math.log10(parts)) if parts > 1 else 10.0


@tool("DOLLARDE", "number number")
def dollarde(price: float, fraction: float) -> float:
    """Decimal price from one whose decimals count a fraction."""
    parts, scale = _fraction(fraction)
    whole = math.trunc(price)
    return whole + (price - whole) * scale / parts


@tool("DOLLARFR", "number number")
def dollarfr(price: float, fraction: float) -> float:
    """Price whose decimals count a fraction from a decimal one."""
    parts, scale = _fraction(fraction)
    whole = math.trunc(price)
    return whole + (price - whole) * parts / scale
