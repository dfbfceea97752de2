"""Rates at which a value vanishes."""

from __future__ import annotations

import math
from collections.abc import Callable

_STEPS = 60
#: Newton's method may land this close to -1 only by running away from the root that is meant.
_RUNAWAY = -0.98
_GRID = 0.05
_RANGE = 160


def rate_of_zero(value: Callable[[float], float], guess: float) -> float:
    """The rate above -1 at which a value vanishes, by Newton's method, else the one nearest to the guess.

    Raises
    ------
    ValueError
        If there is none between -0.9997 and 3000.

    Examples
    --------
    >>> round(rate_of_zero(lambda r: -100.0 + 110.0 / (1.0 + r), 0.5), 12)
    0.1
    """
    rate = _newton(value, guess)
    if rate is not None:
        return rate
    brackets: list[tuple[float, float]] = []
    low, at_low = 0.0, math.nan
    for i in range(-_RANGE, _RANGE + 1):
        high = math.expm1(i * _GRID)
        at_high = _tried(value, high)
        if at_low * at_high <= 0.0:
            brackets.append((low, high))
        low, at_low = high, at_high
    if not brackets:
        raise ValueError
    return _halved(value, *min(brackets, key=lambda b: abs(0.5 * (b[0] + b[1]) - guess)))


def _tried(value: Callable[[float], float], rate: float) -> float:
    try:
        return value(rate)
    except (OverflowError, ZeroDivisionError):
        return math.nan


def _newton(value: Callable[[float], float], guess: float) -> float | None:
    rate = guess
    for _ in range(_STEPS):
        step = 1e-6 * max(abs(rate), 1e-2)
        here = _tried(value, rate)
        if here == 0.0:
            return rate
        slope = (_tried(value, rate + step) - _tried(value, rate - step)) / (2.0 * step)
        if slope == 0.0 or not math.isfinite(here / slope):
            return None
        change = here / slope
        while rate - change <= -1.0:
            change /= 2.0
        rate -= change
        if rate < _RUNAWAY < guess:
            return None
        if abs(change) <= 1e-14 + 1e-13 * abs(rate):
            return rate
    return rate if abs(change) < 1e-10 else None


def _halved(value: Callable[[float], float], low: float, high: float) -> float:
    at_low = value(low)
    for _ in range(200):
        middle = 0.5 * (low + high)
        if middle in (low, high):
            break
        here = value(middle)
        if here == 0.0:
            return middle
        if (here < 0.0) == (at_low < 0.0):
            low, at_low = middle, here
        else:
            high = middle
    return 0.5 * (low + high)
