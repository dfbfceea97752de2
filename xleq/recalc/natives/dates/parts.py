"""Dates and times put together and taken apart."""

from __future__ import annotations

from xleq.cells import NUM, CellError, Missing, Value
from xleq.recalc.coerce import to_number
from xleq.recalc.context import Context
from xleq.recalc.days import (
    SECONDS,
    SHIFT_1904,
    clock,
    day_number,
    day_parts,
    is_day,
    month_length,
    weekday,
)
from xleq.recalc.natives.table import native
from xleq.recalc.operands import Fail
from xleq.recalc.texts import parse_date, parse_time


def day_of(serial: float, date_1904: bool) -> int:
    """Day number of a serial number.

    Raises
    ------
    Fail
        #NUM! if the date system has no such day.
    """
    day = int(serial // 1)
    if not is_day(day, date_1904):
        raise Fail(CellError("#NUM!", f"{serial:g} is not the number of a date"))
    return day


def date_number(year: int, month: int, day: int, date_1904: bool) -> float:
    """Serial number of a date; #NUM! if the date system has none."""
    number = day_number(year, month, day, date_1904)
    if number is None:
        raise Fail(CellError("#NUM!", "there is no such date"))
    return float(number)


@native("DATE", "number number number", context=True)
def date(context: Context, year: float, month: float, day: float) -> float:
    """Serial number of a date; years before 1900 count from 1900."""
    y = int(year)
    if not 0 <= y < 10_000 or abs(month) > 1e6 or abs(day) > 1e7:
        raise Fail(NUM)
    return date_number(y + 1900 if y < 1900 else y, int(month // 1), int(day // 1), context.date_1904)


@native("TIME", "number number number")
def time(hour: float, minute: float, second: float) -> float:
    """Fraction of a day."""
    parts = (hour, minute, second)
    if any(abs(p) >= 32_768 for p in parts):
        raise Fail(NUM)
    seconds = int(hour) * 3600 + int(minute) * 60 + int(second)
    if seconds < 0:
        raise Fail(NUM)
    return seconds % SECONDS / SECONDS


def _not_a_date(text: str) -> Fail:
    return Fail(CellError("#VALUE!", f"{text[:40]!r} is not a date or time"))


@native("DATEVALUE", "text", context=True)
def datevalue(context: Context, text: str) -> float:
    """Serial number of a date in text."""
    serial = parse_date(text, year=context.now().year, date_1904=context.date_1904)
    if serial is None:
        if parse_time(text.strip(" ")) is None:
            raise _not_a_date(text)
        return 0.0
    return serial // 1.0


@native("TIMEVALUE", "text", context=True)
def timevalue(context: Context, text: str) -> float:
    """Fraction of a day of a time in text."""
    serial = parse_time(text.strip(" "))
    if serial is None:
        serial = parse_date(text, year=context.now().year, date_1904=context.date_1904)
    if serial is None:
        raise _not_a_date(text)
    milliseconds = round(serial * SECONDS * 1000) % (SECONDS * 1000)
    return milliseconds / (SECONDS * 1000)


@native("YEAR", "number", context=True)
def year(context: Context, serial: float) -> float:
    """Year of a date."""
    return float(day_parts(day_of(serial, context.date_1904), context.date_1904)[0])


@native("MONTH", "number", context=True)
def month(context: Context, serial: float) -> float:
    """Month of a date."""
    return float(day_parts(day_of(serial, context.date_1904), context.date_1904)[1])


@native("DAY", "number", context=True)
def day(context: Context, serial: float) -> float:
    """Day of the month of a date."""
    return float(day_parts(day_of(serial, context.date_1904), context.date_1904)[2])


def _clock(serial: float) -> tuple[int, int, int]:
    if serial < 0 or serial >= 2_958_466:
        raise Fail(NUM)
    return clock(serial)


@native("HOUR", "number")
def hour(serial: float) -> float:
    """Hour of a time."""
    return float(_clock(serial)[0])


@native("MINUTE", "number")
def minute(serial: float) -> float:
    """Minute of a time."""
    return float(_clock(serial)[1])


@native("SECOND", "number")
def second(serial: float) -> float:
    """Second of a time."""
    return float(_clock(serial)[2])


#: First day of the week, 0 for Sunday, for each number that names one.
_WEEK_STARTS = {1: 0, 2: 1, 17: 0, **{n: n - 10 for n in range(11, 17)}}


@native("WEEKDAY", "number number~", context=True)
def weekday_(context: Context, serial: float, kind: float = 1.0) -> float:
    """Number of the day of the week."""
    number = weekday(day_of(serial, context.date_1904), context.date_1904)
    if int(kind) == 3:
        return float((number - 1) % 7)
    start = _WEEK_STARTS.get(int(kind))
    if start is None:
        raise Fail(NUM)
    return float((number - start) % 7 + 1)


@native("WEEKNUM", "value number~", context=True)
def weeknum(context: Context, argument: Value | Missing, kind: float = 1.0) -> float:
    """Week of the year; the first one holds 1 January, or by ISO 8601 the first Thursday."""
    old, serial = context.date_1904, plain_number(argument)
    if int(kind) == 21:
        return isoweeknum(context, serial)
    start = _WEEK_STARTS.get(int(kind))
    if start is None:
        raise Fail(NUM)
    number = day_of(serial, old)
    first = _new_year(number, old)
    return float((number - first + (weekday(first, old) - start) % 7) // 7 + 1)


def _new_year(number: int, date_1904: bool) -> int:
    found = day_number(day_parts(number, date_1904)[0], 1, 1, date_1904)
    assert found is not None
    return found


@native("ISOWEEKNUM", "number", context=True)
def isoweeknum(context: Context, serial: float) -> float:
    """Week of the year by ISO 8601."""
    old = context.date_1904
    number = day_of(serial, old)
    thursday = number + 3 - (weekday(number, old) - 1) % 7
    if thursday < (0 if old else 1):
        return 52.0
    if not is_day(thursday, old):
        return 52.0
    return float((thursday - _new_year(thursday, old)) // 7 + 1)


def plain_number(value: Value | Missing) -> float:
    """Number of an argument of the functions that take no logicals."""
    if isinstance(value, Missing):
        return 0.0
    if isinstance(value, bool):
        raise Fail(CellError("#VALUE!", "a logical is not a date or a number of days"))
    number = to_number(value)
    if isinstance(number, CellError):
        raise Fail(number)
    return number


def _shifted(context: Context, serial: float, months: float) -> tuple[int, int, int]:
    """Year, month and day of a date with months added, the month perhaps outside 1 to 12."""
    y, m, d = day_parts(day_of(serial, context.date_1904), context.date_1904)
    if abs(months) > 200_000:
        raise Fail(NUM)
    years, m = divmod(m - 1 + int(months), 12)
    return y + years, m + 1, d


@native("EDATE", "value value", context=True)
def edate(context: Context, serial: Value | Missing, months: Value | Missing) -> float:
    """The same day some months later, or the last day of that month."""
    y, m, d = _shifted(context, plain_number(serial), plain_number(months))
    return date_number(y, m, min(d, month_length(y, m)), context.date_1904)


@native("EOMONTH", "value value", context=True)
def eomonth(context: Context, serial: Value | Missing, months: Value | Missing) -> float:
    """Last day of the month some months later."""
    y, m, _ = _shifted(context, plain_number(serial), plain_number(months))
    return date_number(y, m, month_length(y, m), context.date_1904)


def _now(context: Context) -> tuple[int, float]:
    now = context.now()
    number = day_number(now.year, now.month, now.day, False)
    if number is None:
        raise Fail(NUM)
    seconds = now.hour * 3600 + now.minute * 60 + now.second + now.microsecond / 1e6
    return number - (SHIFT_1904 if context.date_1904 else 0), seconds / SECONDS


@native("NOW", context=True, volatile=True)
def now(context: Context) -> float:
    """Date and time of the recalculation."""
    number, fraction = _now(context)
    return number + fraction


@native("TODAY", context=True, volatile=True)
def today(context: Context) -> float:
    """Date of the recalculation."""
    return float(_now(context)[0])
