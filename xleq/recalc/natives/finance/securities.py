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
    """Accrued interest of a security that pays coupons."""
    calendar, per_year = Calendar(checked_basis(basis), context.date_1904), checked_frequency(frequency)
    begin, coupon, end = (checked_day(d, context.date_1904) for d in (issue, first, settlement))
    if rate <= 0.0 or par <= 0.0 or begin >= end:
        raise ValueError
    if not from_issue and end > coupon:
        begin = coupon
    return par * rate / per_year * calendar.periods_between(begin, end, coupon, per_year)


def _bill_days(settlement: float, maturity: float) -> int:
    start, end = math.trunc(settlement), math.trunc(maturity)
    if start < 0 or not 0 < end - start <= 366:
        raise ValueError
    return end - start


@tool("TBILLPRICE", "number number number")
def tbillprice(settlement: float, maturity: float, discount: float) -> float:
    """Price of a treasury bill."""
    price = 100.0 * (1.0 - discount * _bill_days(settlement, maturity) / 360.0)
    if discount <= 0.0 or price < 0.0:
        raise ValueError
    return price


@tool("TBILLYIELD", "number number number")
def tbillyield(settlement: float, maturity: float, price: float) -> float:
    """Yield of a treasury bill."""
    if price <= 0.0:
        raise ValueError
    return (100.0 - price) / price * 360.0 / _bill_days(settlement, maturity)


@tool("TBILLEQ", "number number number")
def tbilleq(settlement: float, maturity: float, discount: float) -> float:
    """Bond-equivalent yield of a treasury bill."""
    days = _bill_days(settlement, maturity)
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
