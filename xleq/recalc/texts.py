"""Numbers as text and text as numbers, as formulas convert them in the US-English locale."""

from __future__ import annotations

import math
import re
from collections.abc import Iterator
from contextlib import contextmanager
from contextvars import ContextVar
from decimal import ROUND_HALF_UP, Decimal
from functools import lru_cache
from typing import Final, NamedTuple

from xleq.recalc.days import MONTHS, SECONDS, day_number, month_length

#: Longest plain notation; what would be longer is written with an exponent.
_LONGEST: Final = 20
#: Longest text that is read as a number, a date or a time.
_LONGEST_NUMBER: Final = 255
_SMALLEST_NORMAL: Final = 2.2250738585072014e-308


class Calendar(NamedTuple):
    """How dates in texts are read.

    Parameters
    ----------
    year : int or None
        The current year, for dates that name none; without it such dates are not read.
    date_1904 : bool
        Whether serial numbers count from 1904.
    """

    year: int | None = None
    date_1904: bool = False


_PLAIN_CALENDAR: Final = Calendar()
_CALENDAR: Final[ContextVar[Calendar]] = ContextVar("calendar", default=_PLAIN_CALENDAR)


def calendar() -> Calendar:
    """How dates in texts are read at present."""
    return _CALENDAR.get()


@contextmanager
def reading_dates(year: int | None, date_1904: bool) -> Iterator[None]:
    """Read dates in texts as a workbook does, wherever a text is taken as a number.

    Every operator and every argument may meet such a text, so the workbook's calendar is not handed to each.

    Examples
    --------
    >>> with reading_dates(2011, date_1904=True):
    ...     parse_number("1/2/1904"), parse_number("5-Jul")
    (1.0, 39267.0)
    """
    token = _CALENDAR.set(Calendar(year, date_1904))
    try:
        yield
    finally:
        _CALENDAR.reset(token)


@lru_cache(maxsize=4096)
def number_text(x: float) -> str:
    """Text of a number as it is joined to other text: 15 significant digits, no trailing zeros.

    Plain notation up to 20 characters, else an exponent of at least two digits; 14 digits where the exponent
    is beyond ±98. (source: renderings observed in Excel and tabulated with the tests of Apache POI)

    Examples
    --------
    >>> number_text(0.1 + 0.2), number_text(1e20), number_text(1e-5), number_text(-2.5e-30)
    ('0.3', '1E+20', '0.00001', '-2.5E-30')
    """
    if -1e15 < x < 1e15 and x == int(x):
        return str(int(x))
    if abs(x) < _SMALLEST_NORMAL:
        return "0"
    mantissa, power = f"{abs(x):.14e}".split("e")
    digits, exponent = mantissa.replace(".", ""), int(power)
    if abs(exponent) > 98:
        shorter = Decimal(digits).scaleb(-1).quantize(Decimal(1), ROUND_HALF_UP)
        digits, exponent = str(shorter)[:14], exponent + (shorter >= 10**14)
    digits = digits.rstrip("0")
    sign = "-" if x < 0 else ""
    if exponent < 0 and 1 - exponent + len(digits) <= _LONGEST:
        return f"{sign}0.{'0' * (-exponent - 1)}{digits}"
    if 0 <= exponent < _LONGEST:
        whole = digits.ljust(exponent + 1, "0")
        rest = whole[exponent + 1 :]
        return sign + whole[: exponent + 1] + ("." + rest if rest else "")
    fraction = "." + digits[1:] if len(digits) > 1 else ""
    return f"{sign}{digits[0]}{fraction}E{'-' if exponent < 0 else '+'}{abs(exponent):02d}"


_PLAIN = re.compile(r"[+-]?[0-9]{1,15}(?:\.[0-9]{0,14})?")
_NUMBER = re.compile(
    r"(?P<open>\()? *+(?P<sign>[+-])? *+(?P<money>[$€])? *+(?P<sign2>[+-])? *+(?P<before>%)? *+"
    r"(?P<whole>[0-9]+(?:,[0-9]{3,})*|(?=\.[0-9]))(?P<point>\.[0-9]*)?(?:E(?P<power>[+-]?[0-9]+))?"
    r" *+(?P<after>%)? *+(?P<euro>€)? *+(?P<close>\))? *+(?P<after2>%)?",
    re.IGNORECASE,
)
_FRACTION = re.compile(r"(?P<sign>[+-])? *+(?P<whole>[0-9]+) ++(?P<top>[0-9]{1,5})/(?P<bottom>[0-9]{1,5})")


def parse_number(text: str) -> float | None:
    """Number that a text stands for where a number is wanted; None if it stands for none.

    Signs, thousands separators, ``$``, ``€``, ``%``, parentheses for negative numbers, exponents, fractions
    such as ``1 1/2``, dates, times, and a date with a time. Digits after the fifteenth count as 0.
    Dates are read as `calendar` says.

    Examples
    --------
    >>> parse_number(" -$1,234.50 "), parse_number("(5%)"), parse_number("1 1/2"), parse_number("pH 7")
    (-1234.5, -0.05, 1.5, None)
    >>> parse_number("1/2/2020"), parse_number("2-Jan-2020"), parse_number("10:30 PM")
    (43832.0, 43832.0, 0.9375)
    """
    text = text.strip(" ")
    if len(text) > _LONGEST_NUMBER:
        return None
    if _PLAIN.fullmatch(text):
        digits = text.lstrip("+-").lstrip("0")
        if len(digits) <= 16:
            return float(text)
    number = _plain_number(text)
    if number is None and text:
        match = _FRACTION.fullmatch(text)
        if match:
            return _fraction(match)
        number = parse_time(text)
        if number is None:
            year, date_1904 = _CALENDAR.get()
            number = parse_date(text, year=year, date_1904=date_1904)
    return number


def _plain_number(text: str) -> float | None:
    match = _NUMBER.fullmatch(text)
    if match is None:
        return None
    m = match.groupdict()
    signs = [s for s in (m["sign"], m["sign2"]) if s]
    percents = [p for p in (m["before"], m["after"], m["after2"]) if p]
    if len(signs) > 1 or len(percents) > 1 or bool(m["open"]) != bool(m["close"]) or (m["open"] and signs):
        return None
    if (m["after2"] and not m["close"]) or (m["money"] and m["euro"]):
        return None
    value = _fifteen_digits((m["whole"] or "").replace(",", ""), (m["point"] or "")[1:], m["power"] or "0")
    if percents:
        value /= 100
    if not math.isfinite(value):
        return None
    return -value if m["open"] or signs == ["-"] else value


def _fifteen_digits(whole: str, fraction: str, power: str) -> float:
    """The number with every digit after the fifteenth significant one as 0."""
    digits = whole + fraction
    leading = len(digits) - len(digits.lstrip("0"))
    kept = digits[: leading + 15].ljust(len(digits), "0")
    if len(power) > 6:
        return math.inf if power[0] != "-" else 0.0
    return float(f"{kept or '0'}E{int(power) - len(fraction)}")


def _fraction(match: re.Match[str]) -> float | None:
    bottom = int(match["bottom"])
    if bottom == 0:
        return None
    value = int(match["whole"]) + int(match["top"]) / bottom
    return -value if match["sign"] == "-" else value


_TIME = re.compile(
    r"(?P<h>[0-9]{1,4})(?::(?P<m>[0-9]{1,2})(?::(?P<s>[0-9]{1,2}))?(?P<f>\.[0-9]*)?|(?= +[AP]))"
    r"(?: +(?P<half>[AP]M?))?",
    re.IGNORECASE,
)


def parse_time(text: str) -> float | None:
    """Fraction of a day that a time of day stands for; hours may pass 23 where no AM or PM follows.

    Examples
    --------
    >>> parse_time("10:30"), parse_time("6:35 pm"), parse_time("36:00"), parse_time("13:00 PM")
    (0.4375, 0.7743055555555556, 1.5, None)
    """
    match = _TIME.fullmatch(text) if len(text) <= _LONGEST_NUMBER else None
    if match is None:
        return None
    hour, minute = int(match["h"]), int(match["m"] or 0)
    second = float((match["s"] or "0") + (match["f"] or ""))
    if match["f"] and not match["s"]:  # minutes, seconds and a decimal fraction of a second
        hour, minute, second = 0, hour, float(match["m"] + match["f"])
    if minute > 59 or second >= 60:
        return None
    if match["half"]:
        if not 0 <= hour <= 12:
            return None
        hour = hour % 12 + (12 if match["half"][0] in "Pp" else 0)
    return (hour * 3600 + minute * 60 + second) / SECONDS


_MONTH_NUMBER: Final = {name.lower(): i for i, name in enumerate(MONTHS, 1)} | {
    name[:3].lower(): i for i, name in enumerate(MONTHS, 1)
}
_MONTH: Final = r"(?P<name>[A-Za-z]{3,9})"
_DATES: Final = tuple(
    re.compile(p)
    for p in (
        r"(?P<m>[0-9]{1,2})(?P<sep>[/-])(?P<d>[0-9]{1,2})(?P=sep)(?P<y>[0-9]{4}|[0-9]{1,2})",
        r"(?P<y>[0-9]{4})(?P<sep>[/-])(?P<m>[0-9]{1,2})(?P=sep)(?P<d>[0-9]{1,2})",
        rf"(?P<d>[0-9]{{1,2}})(?:\s*[-/]\s*|\s+|){_MONTH}(?:\s*[-/,]\s*|\s+|)(?P<y>[0-9]{{4}}|[0-9]{{1,2}})",
        rf"{_MONTH}(?:[-/]|\s+|)(?P<d>[0-9]{{1,2}})(?:\s*[-/,]\s*|\s+)(?P<y>[0-9]{{4}}|[0-9]{{1,2}})",
        rf"(?P<y>[0-9]{{4}})[-/\s]{_MONTH}[-/\s](?P<d>[0-9]{{1,2}})",
        rf"{_MONTH}(?:\s*[-/,]\s*|\s+|)(?P<y>[0-9]{{4}})",
        r"(?P<m>[0-9]{1,2})[/-](?P<y>[0-9]{4})",
        r"(?P<y>[0-9]{4})[/-](?P<m>[0-9]{1,2})",
        rf"(?P<d>[0-9]{{1,2}})(?:\s*[-/]\s*|\s+|){_MONTH}",
        rf"{_MONTH}(?:[-/]|\s+|)(?P<short>[0-9]{{1,2}})",
        r"(?P<m>[0-9]{1,2})[/-](?P<short>[0-9]{1,2})",
    )
)
_WITH_TIME = re.compile(r"(?P<date>.*?[0-9A-Za-z]),? +(?P<time>[0-9]{1,2}(?::[0-9:.]*)?(?: +[AaPp][Mm]?)?)")
_TIME_FIRST = re.compile(r"(?P<time>[0-9]{1,2}:[0-9:.]*(?: +[AaPp][Mm]?)?) +(?P<date>.+)")


@lru_cache(maxsize=1024)
def parse_date(text: str, *, year: int | None = None, date_1904: bool = False) -> float | None:
    """Serial number of a date, or of a date with a time; None if the text is neither.

    Month before day; years of two digits are 2000 to 2029 and 1930 to 1999.
    (source: Microsoft, "How Excel works with two-digit year numbers")

    Examples
    --------
    >>> parse_date("8/22/2011"), parse_date("22-MAY-2011"), parse_date("5-JUL", year=2011)
    (40777.0, 40685.0, 40729.0)
    """
    text = text.strip(" ")
    if len(text) > _LONGEST_NUMBER:
        return None
    day = _day(text, year, date_1904)
    if day is not None:
        return float(day)
    for pattern in (_WITH_TIME, _TIME_FIRST):
        match = pattern.fullmatch(text)
        if match:
            day, time = _day(match["date"].strip(" "), year, date_1904), parse_time(match["time"])
            if day is not None and time is not None:
                return day + time
    return None


def _day(text: str, this_year: int | None, date_1904: bool) -> int | None:
    for pattern in _DATES:
        match = pattern.fullmatch(text)
        if match:
            day = _matched_day(match.groupdict(), this_year, date_1904)
            if day is not None:
                return day
    return None


def _matched_day(m: dict[str, str | None], this_year: int | None, date_1904: bool) -> int | None:
    month = _MONTH_NUMBER.get((m["name"] or "").lower()) if "name" in m else int(m["m"] or 0)
    if not month or month > 12:
        return None
    day, written_year = m.get("d") or "1", m.get("y")
    short = m.get("short")
    if short is not None:  # a day of this year where there is such a day, else a year
        if this_year is not None and _checked_day(this_year, month, int(short), date_1904) is not None:
            return _checked_day(this_year, month, int(short), date_1904)
        if this_year is None and int(short) <= 31:
            return None
        written_year = short
    if written_year is None:
        return None if this_year is None else _checked_day(this_year, month, int(day), date_1904)
    number = int(written_year)
    if len(written_year) <= 2:
        number += 2000 if number < 30 else 1900
    return _checked_day(number, month, int(day), date_1904)


def _checked_day(year: int, month: int, day: int, date_1904: bool) -> int | None:
    if not 1 <= day <= month_length(year, month):
        return None
    return day_number(year, month, day, date_1904)
