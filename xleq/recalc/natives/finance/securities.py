"""Securities that pay at maturity, accrued interest, and treasury bills."""

from __future__ import annotations

import math

from xleq.recalc.context import Context
from xleq.recalc.natives.finance.daycount import Calendar, checked_basis, checked_day, checked_frequency
from xleq.recalc.natives.tools import tool


def _years(context: Context, start: float, end: float, basis: float) -> float:
    calendar = Calendar(checked_basis(basis), context.date_1904)
    first, last = checked_day(start, context.date_1904), checked_day(end, context.date_1904)
    if first >= last:
        raise ValueError
    return calendar.year_fraction(first, last)


@tool("DISC", "number number number number number?", context=True)
def disc(
    context: Context, settlement: float, maturity: float, price: float, redemption: float, basis: float = 0.0
) -> float:
    """Discount rate."""
    if price <= 0.0 or redemption <= 0.0:
        raise ValueError
    return (redemption - price) / redemption / _years(context, settlement, maturity, basis)


@tool("PRICEDISC", "number number number number number?", context=True)
def pricedisc(
    context: Context, settlement: float, maturity: float, rate: float, redemption: float, basis: float = 0.0
) -> float:
    """Price of a discounted security."""
    if rate <= 0.0 or redemption <= 0.0:
        raise ValueError
    return redemption - rate * redemption * _years(context, settlement, maturity, basis)


@tool("YIELDDISC", "number number number number number?", context=True)
def yielddisc(
    context: Context, settlement: float, maturity: float, price: float, redemption: float, basis: float = 0.0
) -> float:
    """Yield of a discounted security."""
    return intrate(context, settlement, maturity, price, redemption, basis)


@tool("INTRATE", "number number number number number?", context=True)
def intrate(
    context: Context, settlement: float, maturity: float, paid: float, redemption: float, basis: float = 0.0
) -> float:
    """Interest rate of a fully invested security."""
    if paid <= 0.0 or redemption <= 0.0:
        raise ValueError
    return (redemption - paid) / paid / _years(context, settlement, maturity, basis)


@tool("RECEIVED", "number number number number number?", context=True)
def received(
    context: Context, settlement: float, maturity: float, paid: float, rate: float, basis: float = 0.0
) -> float:
    """Amount received at maturity."""
    if paid <= 0.0 or rate <= 0.0:
        raise ValueError
    return paid / (1.0 - rate * _years(context, settlement, maturity, basis))


def _at_maturity(
    context: Context, settlement: float, maturity: float, issue: float, basis: float
) -> tuple[float, float, float]:
    """Years from issue to maturity, from issue to settlement, and from settlement to maturity.

    All in years of the length that the first year has.
    """
    calendar = Calendar(checked_basis(basis), context.date_1904)
    bought, end, begin = (checked_day(d, context.date_1904) for d in (settlement, maturity, issue))
    if not begin < bought < end:
        raise ValueError
    year = calendar.year_length(begin, bought)
    return (
        calendar.days(begin, end) / year,
        calendar.days(begin, bought) / year,
        calendar.days(bought, end) / year,
    )


@tool("PRICEMAT", "number number number number number number?", context=True)
def pricemat(
    context: Context, settlement: float, maturity: float, issue: float, rate: float, yield_: float,
    basis: float = 0.0,
) -> float:  # fmt: skip
    """Price of a security that pays interest at maturity."""
    if rate < 0.0 or yield_ < 0.0:
        raise ValueError
    whole, gone, left = _at_maturity(context, settlement, maturity, issue, basis)
    return 100.0 * ((1.0 + whole * rate) / (1.0 + left * yield_) - gone * rate)


@tool("YIELDMAT", "number number number number number number?", context=True)
def yieldmat(
    context: Context, settlement: float, maturity: float, issue: float, rate: float, paid: float,
    basis: float = 0.0,
) -> float:  # fmt: skip
    """Yield of a security that pays interest at maturity."""
    if rate < 0.0 or paid <= 0.0:
        raise ValueError
    whole, gone, left = _at_maturity(context, settlement, maturity, issue, basis)
    owed = paid / 100.0 + gone * rate
    return (1.0 + whole * rate - owed) / owed / left


@tool("ACCRINTM", "number number number number~ number?", context=True)
def accrintm(
    context: Context, issue: float, settlement: float, rate: float, par: float = 1000.0, basis: float = 0.0
) -> float:
    """Accrued interest of a security that pays at maturity."""
    if rate <= 0.0 or par <= 0.0:
        raise ValueError
    return par * rate * _years(context, issue, settlement, basis)


@tool("ACCRINT", "number number number number number~ number number? logical~", context=True)
def accrint(
    context: Context,
    issue: float,
    first: float,
    settlement: float,
    rate: float,
    par: float,
    frequency: float,
    basis: float = 0.0,
    from_issue: bool = True,
) -> float:
    """Accrued interest of a security that pays coupons.

    Without `from_issue` whole coupon periods before that of the first coupon are left out.
    """
    calendar, per_year = Calendar(checked_basis(basis), context.date_1904), checked_frequency(frequency)
    begin, coupon, end = (checked_day(d, context.date_1904) for d in (issue, first, settlement))
    if rate <= 0.0 or par <= 0.0 or begin >= end:
        raise ValueError
    months, last = 12 // per_year, calendar.is_month_end(coupon)
    length = calendar.period_length(calendar.shifted(coupon, -months, last), coupon, per_year)
    k = -1  # the period from which on days count; before it whole periods count as such
    if from_issue:
        while calendar.shifted(coupon, months * (k + 1), last) < end:
            k += 1
    opening = calendar.shifted(coupon, months * k, last)
    if begin >= opening:
        return par * rate / per_year * calendar.days(begin, end) / length
    whole, to = 0, opening
    while (before := calendar.shifted(coupon, months * (k - whole - 1), last)) >= begin:
        whole, to = whole + 1, before
    periods = calendar.days(begin, to) / calendar.period_length(before, to, per_year)
    periods += calendar.days(opening, end) / length
    return par * rate / per_year * (periods + whole * from_issue)


def _bill_days(context: Context, settlement: float, maturity: float) -> int:
    """Days of a bill, which runs for a year at most."""
    start, end = (checked_day(d, context.date_1904) for d in (settlement, maturity))
    if not start < end <= Calendar(0, context.date_1904).shifted(start, 12, False):
        raise ValueError
    return end - start


@tool("TBILLPRICE", "number number number", context=True)
def tbillprice(context: Context, settlement: float, maturity: float, discount: float) -> float:
    """Price of a treasury bill."""
    price = 100.0 * (1.0 - discount * _bill_days(context, settlement, maturity) / 360.0)
    if discount <= 0.0 or price < 0.0:
        raise ValueError
    return price


@tool("TBILLYIELD", "number number number", context=True)
def tbillyield(context: Context, settlement: float, maturity: float, price: float) -> float:
    """Yield of a treasury bill."""
    if price <= 0.0:
        raise ValueError
    return (100.0 - price) / price * 360.0 / _bill_days(context, settlement, maturity)


@tool("TBILLEQ", "number number number", context=True)
def tbilleq(context: Context, settlement: float, maturity: float, discount: float) -> float:
    """Bond-equivalent yield of a treasury bill."""
    days = _bill_days(context, settlement, maturity)
    if discount <= 0.0:
        raise ValueError
    if days <= 182:
        rate = 365.0 * discount / (360.0 - discount * days)
    else:
        price = 1.0 - discount * days / 360.0
        t = days / (366.0 if days == 366 else 365.0)
        rate = (-2.0 * t + 2.0 * math.sqrt(t * t - (2.0 * t - 1.0) * (1.0 - 1.0 / price))) / (2.0 * t - 1.0)
    if rate < 0.0:
        raise ValueError
    return rate
