"""Time between dates: days, years, working days."""

from __future__ import annotations

from bisect import bisect_left

from xleq.cells import BLANK, MISSING, NUM, VALUE, CellError, Missing, Value
from xleq.recalc.coerce import to_number
from xleq.recalc.context import Context
from xleq.recalc.days import SECONDS, day_parts, is_day, is_leap, month_length, weekday
from xleq.recalc.natives.dates.parts import date_number, day_of, plain_number
from xleq.recalc.natives.table import native
from xleq.recalc.operands import Argument, Array, Fail

Parts = tuple[int, int, int]

#: DAYS360 alone takes a time within it of midnight as the next day.
_HALF_SECOND = 0.5 / SECONDS


@native("DAYS", "number number", context=True)
def days(context: Context, end: float, start: float) -> float:
    """Days from start to end."""
    return float(day_of(end, context.date_1904) - day_of(start, context.date_1904))


def _both(context: Context, start: float, end: float) -> tuple[Parts, Parts]:
    old = context.date_1904
    return day_parts(day_of(start, old), old), day_parts(day_of(end, old), old)


def _span_360(start: Parts, end: Parts, first_day: int, last_day: int) -> int:
    return 360 * (end[0] - start[0]) + 30 * (end[1] - start[1]) + last_day - first_day


def _ends_february(date: Parts) -> bool:
    return date[1] == 2 and date[2] == month_length(date[0], 2)


@native("DAYS360", "number number logical~", context=True)
def days360(context: Context, start: float, end: float, european: bool = False) -> float:
    """Days between dates in years of twelve months of 30 days."""
    a, b = _both(context, start + _HALF_SECOND, end + _HALF_SECOND)
    first, last = min(a[2], 30), b[2]
    if european:
        last = min(last, 30)
    else:
        if _ends_february(a):
            first = 30
        if last == 31 and first == 30:
            last = 30
    return float(_span_360(a, b, first, last))


def _year_length(a: Parts, b: Parts) -> float:
    """Average length of the years from a to b that the actual/actual basis takes."""
    within_a_year = a[0] == b[0] or (a[0] + 1 == b[0] and (a[1], a[2]) >= (b[1], b[2]))
    if within_a_year:
        if a[0] == b[0]:
            leap = is_leap(a[0])
        else:
            leap = (is_leap(a[0]) and (a[1], a[2]) <= (2, 29)) or (is_leap(b[0]) and (b[1], b[2]) >= (2, 29))
        return 366.0 if leap else 365.0
    years = range(a[0], b[0] + 1)
    return sum(366 if is_leap(y) else 365 for y in years) / len(years)


def year_fraction(start: int, end: int, basis: int, date_1904: bool = False) -> float:
    """Years between two days on a day-count basis.

    Basis 0 US 30/360, 1 actual/actual, 2 actual/360, 3 actual/365, 4 European 30/360.
    (source: Microsoft, "YEARFRAC function"; OpenFormula 1.2, 4.11.7)
    """
    start, end = min(start, end), max(start, end)
    a, b = day_parts(start, date_1904), day_parts(end, date_1904)
    if basis == 1:
        return (end - start) / _year_length(a, b)
    if basis in (2, 3):
        return (end - start) / (360.0 if basis == 2 else 365.0)
    first, last = min(a[2], 30), b[2]
    if basis == 4:
        last = min(last, 30)
    elif first == 30 and last == 31:
        last = 30
    elif _ends_february(a):  # a last of February does not shorten a 31st
        first = 30
        last = 30 if _ends_february(b) else last
    return _span_360(a, b, first, last) / 360.0


@native("YEARFRAC", "value value number~", context=True)
def yearfrac(context: Context, start: Value | Missing, end: Value | Missing, basis: float = 0.0) -> float:
    """Years between two dates on a day-count basis."""
    old = context.date_1904
    a, b = day_of(plain_number(start), old), day_of(plain_number(end), old)
    if int(basis) not in (0, 1, 2, 3, 4):
        raise Fail(NUM)
    return year_fraction(a, b, int(basis), old)


@native("DATEDIF", "number number text", context=True)
def datedif(context: Context, start: float, end: float, unit: str) -> float:
    """Whole years, months or days between two dates."""
    old = context.date_1904
    first, last = day_of(start, old), day_of(end, old)
    if first > last:
        raise Fail(CellError("#NUM!", "the first date lies after the second"))
    a, b = day_parts(first, old), day_parts(last, old)
    months = 12 * (b[0] - a[0]) + b[1] - a[1] - (b[2] < a[2])
    word = unit.upper()
    if word == "D":
        return float(last - first)
    if word == "M":
        return float(months)
    if word == "Y":
        return float(months // 12)
    if word == "YM":
        return float(months % 12)
    if word == "MD":
        if b[2] >= a[2]:
            return float(b[2] - a[2])
        return last - date_number(b[0], b[1] - 1, a[2], old)
    if word == "YD":
        year = a[0] + ((b[1], b[2]) < (a[1], a[2]))
        return date_number(year, b[1], b[2], old) - first
    raise Fail(CellError("#NUM!", 'the unit is "Y", "M", "D", "MD", "YM" or "YD"'))


#: Rest days, as the positions of a week from Monday, of each number that names them.
_WEEKENDS = {
    1: (5, 6), 2: (6, 0), 3: (0, 1), 4: (1, 2), 5: (2, 3), 6: (3, 4), 7: (4, 5),
    11: (6,), 12: (0,), 13: (1,), 14: (2,), 15: (3,), 16: (4,), 17: (5,),
}  # fmt: skip


class _Workdays:
    """Counts working days."""

    def __init__(self, rest: tuple[int, ...], holidays: set[int], date_1904: bool) -> None:
        self.old = date_1904
        #: Working days among the first i days of a week that begins on a Monday.
        self.upto = [sum(d not in rest for d in range(i)) for i in range(8)]
        self.per_week = self.upto[7]
        self.holidays = sorted(h for h in holidays if self._position(h) not in rest)

    def _position(self, day: int) -> int:
        return (weekday(day, self.old) - 1) % 7

    def before(self, day: int) -> int:
        """Working days from a fixed Monday to before a day, holidays taken off."""
        position = self._position(day)
        weeks = (day - position) // 7
        return weeks * self.per_week + self.upto[position] - bisect_left(self.holidays, day)

    def between(self, first: int, last: int) -> int:
        """Working days from the first to the last day, both included."""
        if first > last:
            return -self.between(last, first)
        return self.before(last + 1) - self.before(first)

    def after(self, start: int, count: int) -> int:
        """The day that many working days after, or before, the start."""
        low, high = (
            (start, start + 7 * (count + len(self.holidays) + 2))
            if count > 0
            else (start + 7 * (count - len(self.holidays) - 2), start)
        )
        if count > 0:  # the first day by whose end so many have passed
            done = self.before(start + 1) + count
            while high - low > 1:
                middle = (low + high) // 2
                low, high = (low, middle) if self.before(middle + 1) >= done else (middle, high)
            return high
        left = self.before(start) + count  # the last day at whose beginning no more remain
        while high - low > 1:
            middle = (low + high) // 2
            low, high = (middle, high) if self.before(middle) <= left else (low, middle)
        return low


def _holidays(argument: Argument, date_1904: bool) -> set[int]:
    if isinstance(argument, Missing):
        return set()
    values = argument.flat if isinstance(argument, Array) else [argument]
    found = set()
    for v in values:
        if v is BLANK:
            continue
        number = to_number(v)  # type: ignore[arg-type]
        if isinstance(number, CellError):
            raise Fail(number)
        found.add(day_of(number, date_1904))
    return found


def _rest_days(weekend: Value | Missing) -> tuple[int, ...]:
    if isinstance(weekend, Missing) or weekend is BLANK:
        return _WEEKENDS[1]
    if isinstance(weekend, CellError):
        raise Fail(weekend)
    if isinstance(weekend, str):
        if len(weekend) != 7 or set(weekend) - {"0", "1"}:
            raise Fail(CellError("#VALUE!", "a weekend text is seven characters 0 or 1, from Monday"))
        return tuple(i for i, c in enumerate(weekend) if c == "1")
    number = to_number(weekend)
    rest = _WEEKENDS.get(int(number)) if isinstance(number, float) else None
    if rest is None:
        raise Fail(NUM)
    return rest


@native("NETWORKDAYS", "value value list?", context=True)
def networkdays(
    context: Context, start: Value | Missing, end: Value | Missing, holidays: Argument = MISSING
) -> float:
    """Working days from one date to another, both included, Saturday and Sunday free."""
    return networkdays_intl(context, start, end, MISSING, holidays)


@native("NETWORKDAYS.INTL", "value value value? list?", context=True)
def networkdays_intl(
    context: Context,
    start: Value | Missing,
    end: Value | Missing,
    weekend: Value | Missing = MISSING,
    holidays: Argument = MISSING,
) -> float:
    """Working days from one date to another, both included."""
    old = context.date_1904
    first, last = day_of(plain_number(start), old), day_of(plain_number(end), old)
    return float(_Workdays(_rest_days(weekend), _holidays(holidays, old), old).between(first, last))


@native("WORKDAY", "value value list?", context=True)
def workday(
    context: Context, start: Value | Missing, count: Value | Missing, holidays: Argument = MISSING
) -> float:
    """The date some working days later, Saturday and Sunday free."""
    return workday_intl(context, start, count, MISSING, holidays)


@native("WORKDAY.INTL", "value value value? list?", context=True)
def workday_intl(
    context: Context,
    start: Value | Missing,
    count: Value | Missing,
    weekend: Value | Missing = MISSING,
    holidays: Argument = MISSING,
) -> float:
    """The date some working days later."""
    old = context.date_1904
    first, n = day_of(plain_number(start), old), int(plain_number(count))
    rest = _rest_days(weekend)
    if len(rest) == 7:
        raise Fail(VALUE)
    if n == 0:
        return float(first)
    if abs(n) > 3_000_000:
        raise Fail(NUM)
    found = _Workdays(rest, _holidays(holidays, old), old).after(first, n)
    if not is_day(found, old):
        raise Fail(NUM)
    return float(found)
