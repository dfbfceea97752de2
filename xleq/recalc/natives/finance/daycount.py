"""Counting days and coupon periods under the five bases of the spreadsheet.

0: 30/360 as in the United States, 1: actual/actual, 2: actual/360, 3: actual/365, 4: 30/360 as in Europe.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

from xleq.recalc.days import day_number, day_parts, is_day, is_leap, month_length


def checked_day(serial: float, date_1904: bool) -> int:
    """The day of a date.

    Raises
    ------
    ValueError
        If there is no such day.
    """
    day = math.trunc(serial)
    if not is_day(day, date_1904):
        raise ValueError
    return day


def checked_basis(basis: float) -> int:
    """A basis from 0 to 4.

    Raises
    ------
    ValueError
        If it is another number.
    """
    number = math.trunc(basis)
    if not 0 <= number <= 4:
        raise ValueError
    return number


def checked_frequency(frequency: float) -> int:
    """Coupons of a year: 1, 2 or 4.

    Raises
    ------
    ValueError
        If it is another number.
    """
    number = math.trunc(frequency)
    if number not in (1, 2, 4):
        raise ValueError
    return number


@dataclass(frozen=True, slots=True)
class Calendar:
    """A date system and a day-count basis.

    Parameters
    ----------
    basis : int
    date_1904 : bool
    """

    basis: int
    date_1904: bool

    def days_360(self, start: int, end: int) -> int:
        """Days of twelve months of 30 days, by the American rule or, for basis 4, the European one."""
        y1, m1, d1 = day_parts(start, self.date_1904)
        y2, m2, d2 = day_parts(end, self.date_1904)
        if self.basis == 4:
            d1, d2 = min(d1, 30), min(d2, 30)
        else:
            last1 = m1 == 2 and d1 == month_length(y1, 2)
            if last1 and m2 == 2 and d2 == month_length(y2, 2):
                d2 = 30
            if last1 or d1 == 31:
                d1 = 30
            if d2 == 31 and d1 == 30:
                d2 = 30
        return 360 * (y2 - y1) + 30 * (m2 - m1) + d2 - d1

    def days(self, start: int, end: int) -> int:
        """Days between two dates."""
        return self.days_360(start, end) if self.basis in (0, 4) else end - start

    def year_length(self, start: int, end: int) -> float:
        """Days of a year for a span: with basis 1 the length of its year, or the mean of its years."""
        if self.basis != 1:
            return 365.0 if self.basis == 3 else 360.0
        y1, m1, d1 = day_parts(start, self.date_1904)
        y2, m2, d2 = day_parts(end, self.date_1904)
        if y1 == y2:
            return 366.0 if is_leap(y1) else 365.0
        if y2 == y1 + 1 and (m2, d2) <= (m1, d1):
            leap = (is_leap(y1) and (m1, d1) <= (2, 29)) or (is_leap(y2) and (m2, d2) >= (2, 29))
            return 366.0 if leap else 365.0
        return sum(366 if is_leap(y) else 365 for y in range(y1, y2 + 1)) / (y2 - y1 + 1.0)

    def year_fraction(self, start: int, end: int) -> float:
        """Years between two dates."""
        return self.days(start, end) / self.year_length(start, end)

    def shifted(self, day: int, months: int, last: bool) -> int:
        """The day some months on, at the end of its month where `last`.

        Raises
        ------
        ValueError
            If there is no such day.
        """
        year, month, of_month = day_parts(day, self.date_1904)
        years, month = divmod(month - 1 + months, 12)
        length = month_length(year + years, month + 1)
        number = day_number(
            year + years, month + 1, length if last else min(of_month, length), self.date_1904
        )
        if number is None:
            raise ValueError
        return number

    def is_month_end(self, day: int) -> bool:
        """Whether a day is the last of its month."""
        year, month, of_month = day_parts(day, self.date_1904)
        return of_month == month_length(year, month)

    def coupons_around(self, settlement: int, maturity: int, frequency: int) -> tuple[int, int, int]:
        """Coupon dates up to and after a settlement, and the number of coupons from the latter on."""
        months, last = 12 // frequency, self.is_month_end(maturity)
        after, count = maturity, 1
        while True:
            before = self.shifted(maturity, -months * count, last)
            if before <= settlement:
                return before, after, count
            after, count = before, count + 1

    def period_length(self, start: int, end: int, frequency: int) -> float:
        """Days of a coupon period."""
        if self.basis == 1:
            return float(end - start)
        return (365.0 if self.basis == 3 else 360.0) / frequency

    def periods_between(
        self, start: int, end: int, anchor: int, frequency: int, *, by_days: bool = False
    ) -> float:
        """Coupon periods, whole and in part, between two dates; periods are aligned with `anchor`.

        With `by_days` the first one counts by its days even where it is whole.
        """
        months, last = 12 // frequency, self.is_month_end(anchor)
        n = 0
        while self.shifted(anchor, n * months, last) < end:
            n += 1
        total, to = 0.0, self.shifted(anchor, n * months, last)
        while to > start:
            n -= 1
            begin = self.shifted(anchor, n * months, last)
            first, final = max(begin, start), min(to, end)
            if final > first:
                if (first, final) == (begin, to) and not (by_days and first == start):
                    total += 1.0
                else:
                    total += self.days(first, final) / self.period_length(begin, to, frequency)
            to = begin
        return total
