"""Dates that a cell stores as ISO 8601 text."""

from __future__ import annotations

from datetime import date, datetime, time
from typing import Final

_DAY: Final = 86400.0


def serial_of(text: str, date_1904: bool) -> float:
    """Serial number of an ISO 8601 date, time or both.

    Raises
    ------
    ValueError
        If it is none of them.

    Examples
    --------
    >>> serial_of("2024-01-10T12:00:00", False), serial_of("1904-01-02", True), serial_of("06:00:00", False)
    (45301.5, 1.0, 0.25)
    """
    if "-" not in text:
        clock = time.fromisoformat(text)
        return (clock.hour * 3600 + clock.minute * 60 + clock.second + clock.microsecond / 1e6) / _DAY
    moment = datetime.fromisoformat(text).replace(tzinfo=None)
    start = datetime(1904, 1, 1) if date_1904 else datetime(1899, 12, 30)
    passed = moment - start
    serial = passed.days + (passed.seconds + passed.microseconds / 1e6) / _DAY
    # The 1900 count has a 29 February 1900 that never was.
    return serial - 1 if not date_1904 and moment.date() < date(1900, 3, 1) else serial
