"""Bonds with coupons: coupon dates, prices, yields, durations, also with an odd first or last coupon."""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass

from xleq.recalc.context import Context
from xleq.recalc.natives.finance.daycount import Calendar, checked_basis, checked_day, checked_frequency
from xleq.recalc.natives.tools import tool
from xleq.recalc.sheets.columns import Unsupported


@dataclass(frozen=True, slots=True)
class Place:
    """Where a settlement lies among the coupons of a bond.

    Parameters
    ----------
    before, after : int
        Coupon dates around it.
    count : int
        Coupons from `after` on.
    length, gone, left : float
        Days of the coupon period, before and after the settlement.
    """

    before: int
    after: int
    count: int
    length: float
    gone: float
    left: float


def _place(context: Context, settlement: float, maturity: float, frequency: float, basis: float) -> Place:
    calendar, per_year = Calendar(checked_basis(basis), context.date_1904), checked_frequency(frequency)
    start, end = (checked_day(d, context.date_1904) for d in (settlement, maturity))
    if start >= end:
        raise ValueError
    before, after, count = calendar.coupons_around(start, end, per_year)
    length = calendar.period_length(before, after, per_year)
    gone = float(calendar.days(before, start))
    left = length - gone if calendar.basis in (0, 4) else float(after - start)
    return Place(before, after, count, length, gone, left)


def _declare_coupon(name: str, part: Callable[[Place], float]) -> None:
    @tool(name, "number number number number?", context=True)
    def coupon(
        context: Context, settlement: float, maturity: float, frequency: float, basis: float = 0.0
    ) -> float:
        return float(part(_place(context, settlement, maturity, frequency, basis)))


_declare_coupon("COUPPCD", lambda p: p.before)
_declare_coupon("COUPNCD", lambda p: p.after)
_declare_coupon("COUPNUM", lambda p: p.count)
_declare_coupon("COUPDAYS", lambda p: p.length)
_declare_coupon("COUPDAYBS", lambda p: p.gone)
_declare_coupon("COUPDAYSNC", lambda p: p.left)


def _price(place: Place, rate: float, yield_: float, redemption: float, per_year: int) -> float:
    coupon = 100.0 * rate / per_year
    share = 1.0 - place.gone / place.length
    accrued = coupon * place.gone / place.length
    if place.count == 1:
        return (redemption + coupon) / (1.0 + share * yield_ / per_year) - accrued
    factor = 1.0 + yield_ / per_year
    coupons = math.fsum(coupon / factor ** (k + share) for k in range(place.count))
    last = redemption / float(factor ** (place.count - 1 + share))
    return last + coupons - accrued


@tool("PRICE", "number number number number number number number?", context=True)
def price(
    context: Context, settlement: float, maturity: float, rate: float, yield_: float, redemption: float,
    frequency: float, basis: float = 0.0,
) -> float:  # fmt: skip
    """Price of a bond per 100 of face value."""
    if rate < 0.0 or yield_ < 0.0 or redemption <= 0.0:
        raise ValueError
    place = _place(context, settlement, maturity, frequency, basis)
    return _price(place, rate, yield_, redemption, checked_frequency(frequency))


def _solved(price_at: Callable[[float], float], wanted: float, guess: float) -> float:
    """Yield at which a price that falls with it is the wanted one."""
    rate = guess
    for _ in range(200):
        here = price_at(rate) - wanted
        step = 1e-6 * max(abs(rate), 1e-3)
        slope = (price_at(rate + step) - price_at(rate - step)) / (2.0 * step)
        if slope == 0.0:
            raise ValueError
        change = here / slope
        rate = max(rate - change, (rate - 1.0) / 2.0)
        if abs(change) <= 1e-13 * max(abs(rate), 1e-2):
            return rate
    if abs(change) < 1e-9:
        return rate
    raise ValueError


@tool("YIELD", "number number number number number number number?", context=True)
def yield_of(
    context: Context, settlement: float, maturity: float, rate: float, paid: float, redemption: float,
    frequency: float, basis: float = 0.0,
) -> float:  # fmt: skip
    """Yield of a bond from its price per 100 of face value."""
    if rate < 0.0 or paid <= 0.0 or redemption <= 0.0:
        raise ValueError
    place, per_year = _place(context, settlement, maturity, frequency, basis), checked_frequency(frequency)
    if place.count == 1:
        coupon = rate / per_year
        owed = paid / 100.0 + place.gone / place.length * coupon
        left = 1.0 - place.gone / place.length
        return (redemption / 100.0 + coupon - owed) / owed * per_year / left
    return _solved(lambda y: _price(place, rate, y, redemption, per_year), paid, rate or 0.1)


@tool("DURATION", "number number number number number number?", context=True)
def duration(
    context: Context, settlement: float, maturity: float, rate: float, yield_: float, frequency: float,
    basis: float = 0.0,
) -> float:  # fmt: skip
    """Macaulay duration in years."""
    if rate < 0.0 or yield_ < 0.0:
        raise ValueError
    if checked_basis(basis) in (2, 3):
        raise Unsupported("durations on the bases 2 and 3")
    place, per_year = _place(context, settlement, maturity, frequency, basis), checked_frequency(frequency)
    share, factor = place.left / place.length, 1.0 + yield_ / per_year
    flows = [100.0 * rate / per_year] * place.count
    flows[-1] += 100.0
    present = [flow / factor ** (k + share) for k, flow in enumerate(flows)]
    weighted = math.fsum((k + share) * p for k, p in enumerate(present))
    return weighted / math.fsum(present) / per_year


@tool("MDURATION", "number number number number number number?", context=True)
def mduration(
    context: Context, settlement: float, maturity: float, rate: float, yield_: float, frequency: float,
    basis: float = 0.0,
) -> float:  # fmt: skip
    """Modified duration in years."""
    years = duration(context, settlement, maturity, rate, yield_, frequency, basis)
    return years / (1.0 + yield_ / checked_frequency(frequency))


@dataclass(frozen=True, slots=True)
class OddFirst:
    """A bond whose first coupon period is longer or shorter than the others.

    Parameters
    ----------
    count : int
        Regular coupons after the first.
    wait : float
        Coupon periods from the settlement to the first coupon.
    accrued, whole : float
        Coupon periods from the issue to the settlement, and to the first coupon.
    """

    count: int
    wait: float
    accrued: float
    whole: float

    def price(self, rate: float, yield_: float, redemption: float, per_year: int) -> float:
        """Price per 100 of face value."""
        coupon, factor = 100.0 * rate / per_year, 1.0 + yield_ / per_year
        value = redemption / float(factor ** (self.count + self.wait))
        value += coupon * self.whole / float(factor**self.wait)
        value += math.fsum(coupon / factor ** (k + self.wait) for k in range(1, self.count + 1))
        return value - coupon * self.accrued


def _odd_first(
    context: Context, settlement: float, maturity: float, issue: float, first: float, frequency: float,
    basis: float,
) -> OddFirst:  # fmt: skip
    calendar, per_year = Calendar(checked_basis(basis), context.date_1904), checked_frequency(frequency)
    bought, end, begin, coupon = (
        checked_day(d, context.date_1904) for d in (settlement, maturity, issue, first)
    )
    if not begin < bought < coupon < end:
        raise ValueError
    last, months = calendar.is_month_end(end), 12 // per_year
    count = 0
    while calendar.shifted(end, -months * count, last) > coupon:
        count += 1
    if calendar.shifted(end, -months * count, last) != coupon:
        raise ValueError
    return OddFirst(
        count,
        calendar.periods_between(bought, coupon, coupon, per_year, by_days=True),
        calendar.periods_between(begin, bought, coupon, per_year),
        calendar.periods_between(begin, coupon, coupon, per_year),
    )


@tool("ODDFPRICE", "number number number number number number number number number?", context=True)
def oddfprice(
    context: Context, settlement: float, maturity: float, issue: float, first: float, rate: float,
    yield_: float, redemption: float, frequency: float, basis: float = 0.0,
) -> float:  # fmt: skip
    """Price of a bond with an odd first coupon."""
    if rate < 0.0 or yield_ < 0.0 or redemption <= 0.0:
        raise ValueError
    bond = _odd_first(context, settlement, maturity, issue, first, frequency, basis)
    return bond.price(rate, yield_, redemption, checked_frequency(frequency))


@tool("ODDFYIELD", "number number number number number number number number number?", context=True)
def oddfyield(
    context: Context, settlement: float, maturity: float, issue: float, first: float, rate: float,
    paid: float, redemption: float, frequency: float, basis: float = 0.0,
) -> float:  # fmt: skip
    """Yield of a bond with an odd first coupon."""
    if rate < 0.0 or paid <= 0.0 or redemption <= 0.0:
        raise ValueError
    bond = _odd_first(context, settlement, maturity, issue, first, frequency, basis)
    per_year = checked_frequency(frequency)
    return _solved(lambda y: bond.price(rate, y, redemption, per_year), paid, rate or 0.1)


def _odd_last(
    context: Context, settlement: float, maturity: float, last: float, frequency: float, basis: float
) -> tuple[float, float, float]:
    """Coupon periods from the last coupon to maturity, to the settlement, and from there to maturity."""
    calendar, per_year = Calendar(checked_basis(basis), context.date_1904), checked_frequency(frequency)
    bought, end, coupon = (checked_day(d, context.date_1904) for d in (settlement, maturity, last))
    if not coupon < bought < end:
        raise ValueError
    if calendar.basis in (2, 3):
        raise Unsupported("bonds with an odd last coupon on the bases 2 and 3")
    return (
        calendar.periods_between(coupon, end, coupon, per_year),
        calendar.periods_between(coupon, bought, coupon, per_year),
        calendar.periods_between(bought, end, coupon, per_year),
    )


@tool("ODDLPRICE", "number number number number number number number number?", context=True)
def oddlprice(
    context: Context, settlement: float, maturity: float, last: float, rate: float, yield_: float,
    redemption: float, frequency: float, basis: float = 0.0,
) -> float:  # fmt: skip
    """Price of a bond with an odd last coupon."""
    if rate < 0.0 or yield_ < 0.0 or redemption <= 0.0:
        raise ValueError
    per_year = checked_frequency(frequency)
    whole, gone, left = _odd_last(context, settlement, maturity, last, frequency, basis)
    coupon = 100.0 * rate / per_year
    return (redemption + whole * coupon) / (1.0 + left * yield_ / per_year) - gone * coupon


@tool("ODDLYIELD", "number number number number number number number number?", context=True)
def oddlyield(
    context: Context, settlement: float, maturity: float, last: float, rate: float, paid: float,
    redemption: float, frequency: float, basis: float = 0.0,
) -> float:  # fmt: skip
    """Yield of a bond with an odd last coupon."""
    if rate < 0.0 or paid <= 0.0 or redemption <= 0.0:
        raise ValueError
    per_year = checked_frequency(frequency)
    whole, gone, left = _odd_last(context, settlement, maturity, last, frequency, basis)
    coupon = 100.0 * rate / per_year
    owed = paid + gone * coupon
    return (redemption + whole * coupon - owed) / owed * per_year / left
