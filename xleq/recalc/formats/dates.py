"""Serial numbers as sections of dates and times show them."""

from __future__ import annotations

import math
from typing import Final

from xleq.errors import InputError
from xleq.recalc.days import MONTHS, SECONDS, WEEKDAYS, day_parts, is_day, weekday
from xleq.recalc.formats.sections import Section, Token

#: Seconds short of midnight that still count as the next day where only the date is shown.
_ALMOST: Final = 1e-4


def date_section(x: float, section: Section, date_1904: bool) -> str:
    """Text of a serial number as a date, a time or an elapsed time.

    Raises
    ------
    InputError
        If the date system has no such day.
    """
    tokens = section.tokens
    elapsed = {t.text[0] for t in tokens if t.kind == "elapsed"}
    if x < 0 and not (elapsed or date_1904):
        raise InputError("a negative number is not a date")
    places = max((len(t.text) for t in tokens if t.kind == "fraction"), default=0)
    total = abs(x) * SECONDS
    if elapsed or section.has("hour", "minute", "second"):
        ticks = math.floor(total * 10**places + 0.5)
    else:
        ticks = math.floor(total + _ALMOST)
    seconds, fraction = divmod(ticks, 10**places)
    day = seconds // SECONDS
    if not is_day(day, date_1904):
        raise InputError(f"{x:g} is beyond the last date, 31 December 9999")
    clock = _Clock(day, seconds, f"{fraction:0{places}d}" if places else "", elapsed, section, date_1904)
    text = "".join(clock.shown(t) for t in tokens)
    return "-" + text if x < 0 else text


class _Clock:
    """The parts of one moment."""

    def __init__(
        self, day: int, seconds: int, fraction: str, elapsed: set[str], section: Section, date_1904: bool
    ) -> None:
        self.day, self.seconds, self.fraction, self.elapsed = day, seconds, fraction, elapsed
        self.twelve = section.has("half")
        self.date_1904 = date_1904
        self.hour = seconds // 3600 % 24

    def shown(self, token: Token) -> str:
        kind, width = token.kind, len(token.text)
        if kind == "elapsed":
            return str(self._elapsed(token.text[0])).zfill(width)
        if kind == "hour":
            hour = self._elapsed("h") if "h" in self.elapsed else self.hour
            if self.twelve:
                hour = hour % 12 or 12
            return str(hour).zfill(min(width, 2))
        if kind == "minute":
            minute = self._elapsed("m") if "m" in self.elapsed else self.seconds // 60 % 60
            return str(minute).zfill(min(width, 2))
        if kind == "second":
            second = self._elapsed("s") if "s" in self.elapsed else self.seconds % 60
            return str(second).zfill(min(width, 2))
        if kind == "fraction":
            return "." + self.fraction[:width]
        if kind == "half":
            return self._half(token.text)
        if kind in ("year", "month", "day", "buddhist"):
            return self._date_part(token)
        return "" if kind == "era" else token.text

    def _elapsed(self, unit: str) -> int:
        return self.seconds // {"h": 3600, "m": 60, "s": 1}[unit]

    def _half(self, text: str) -> str:
        first, _, second = text.partition("/")
        chosen = second if self.hour >= 12 else first
        return chosen if len(first) == 1 else chosen.upper()

    def _date_part(self, token: Token) -> str:
        width = len(token.text)
        year, month, day = (
            day_parts(self.day, self.date_1904) if is_day(self.day, self.date_1904) else (0, 0, 0)
        )
        if token.kind == "year":
            short = width <= 2 and token.text[0] in "yY"
            return f"{year % 100:02d}" if short else str(year)
        if token.kind == "buddhist":
            return f"{(year + 543) % 100:02d}" if width <= 2 else str(year + 543)
        if token.kind == "day":
            if width <= 2:
                return str(day).zfill(width)
            name = WEEKDAYS[weekday(self.day, self.date_1904)]
            return name[:3] if width == 3 else name
        if width <= 2:
            return str(month).zfill(width)
        name = MONTHS[month - 1]
        return name[:3] if width == 3 else name[0] if width == 5 else name
