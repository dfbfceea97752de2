"""Day numbers: serial ↔ year, month, day, in the 1900 and the 1904 date system.

The 1900 system counts 1 January 1900 as day 1 and knows a day 60, 29 February 1900, that never was; day 0
shows as 0 January 1900. The 1904 system counts 1 January 1904 as day 0.
(source: Microsoft, "Differences between the 1900 and the 1904 date system in Excel")
"""

from __future__ import annotations

from datetime import date
from typing import Final

#: 31 December 9999 in the 1900 system.
LAST_DAY: Final = 2_958_465
#: What the same day has less in the 1904 system.
SHIFT_1904: Final = 1462
SECONDS: Final = 86_400

_BEFORE_1900: Final = date(1899, 12, 30).toordinal()
_AFTER_FALSE_DAY: Final = 60

MONTHS: Final = (
    "January", "February", "March", "April", "May", "June", "July",
    "August", "September", "October", "November", "December",
)  # fmt: skip
WEEKDAYS: Final = ("Sunday", "Monday", "Tuesday", "Wednesday", "Thursday", "Friday", "Saturday")


def is_day(day: int, date_1904: bool = False) -> bool:
    """Whether the day number is one that the date system has.

    Examples
    --------
    >>> is_day(2958465), is_day(2958466), is_day(-1)
    (True, False, False)
    """
    return 0 <= day <= LAST_DAY - (SHIFT_1904 if date_1904 else 0)


def day_parts(day: int, date_1904: bool = False) -> tuple[int, int, int]:
    """Year, month and day of month of a day number that `is_day`.

    Examples
    --------
    >>> day_parts(43831), day_parts(60), day_parts(0), day_parts(0, date_1904=True)
    ((2020, 1, 1), (1900, 2, 29), (1900, 1, 0), (1904, 1, 1))
    """
    if date_1904:
        day += SHIFT_1904
    if day == _AFTER_FALSE_DAY:
        return 1900, 2, 29
    if day == 0:
        return 1900, 1, 0
    d = date.fromordinal(_BEFORE_1900 + day + (day < _AFTER_FALSE_DAY))
    return d.year, d.month, d.day


def day_number(year: int, month: int, day: int, date_1904: bool = False) -> int | None:
    """Day number of a date; months and days outside their range count on or back.

    None where the date system has no such day.

    Examples
    --------
    >>> day_number(2020, 1, 1), day_number(2020, 14, -1), day_number(1900, 2, 29), day_number(1900, 3, 1)
    (43831, 44226, 60, 61)
    >>> day_number(1899, 12, 31), day_number(1899, 12, 30)
    (0, None)
    """
    years, month = divmod(month - 1, 12)
    year += years
    if not 1900 <= year <= 9999:
        if year == 1899 and month == 11 and day >= 31:
            return day_number(1900, 1, day - 31, date_1904)
        return None
    number = date(year, month + 1, 1).toordinal() - _BEFORE_1900
    number += day - 1 - (number < _AFTER_FALSE_DAY)
    if date_1904:
        number -= SHIFT_1904
    return number if is_day(number, date_1904) else None


def month_length(year: int, month: int) -> int:
    """Days of a month, the false 29 February 1900 included.

    Examples
    --------
    >>> month_length(1900, 2), month_length(2023, 2), month_length(2023, 12)
    (29, 28, 31)
    """
    if month == 2:
        return 29 if is_leap(year) or year == 1900 else 28
    return 30 if month in (4, 6, 9, 11) else 31


def is_leap(year: int) -> bool:
    """Whether the Gregorian year has 366 days."""
    return year % 4 == 0 and (year % 100 != 0 or year % 400 == 0)


def weekday(day: int, date_1904: bool = False) -> int:
    """Day of the week, 0 for Sunday; days up to 60 follow the false calendar of the 1900 system.

    Examples
    --------
    >>> weekday(43831), weekday(1)
    (3, 0)
    """
    return (day + (SHIFT_1904 if date_1904 else 0) - 1) % 7


def clock(serial: float) -> tuple[int, int, int]:
    """Hour, minute and second of the fraction of a day, to the nearest second; 24:00:00 becomes 0:00:00.

    Examples
    --------
    >>> clock(0.75), clock(43831.5000001), clock(0.999999999)
    ((18, 0, 0), (12, 0, 0), (0, 0, 0))
    """
    seconds = round((serial % 1.0) * SECONDS) % SECONDS
    return seconds // 3600, seconds // 60 % 60, seconds % 60
