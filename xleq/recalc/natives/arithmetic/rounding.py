"""Rounding, signs and remainders.

The spreadsheet rounds what it shows, not what the double holds: a value is first taken at 15 significant
digits, so that ``ROUND(2.675, 2)`` is 2.68 although the double lies below the half.
"""

from __future__ import annotations

import math
from decimal import ROUND_DOWN, ROUND_HALF_UP, ROUND_UP, Context, Decimal

from xleq.recalc.natives.arithmetic.vectors import elementwise
from xleq.recalc.natives.table import native
from xleq.recalc.natives.tools import tool

_WIDE = Context(prec=330)
_MOD_LIMIT = 1_125_900_000_000.0


def fifteen(x: float) -> float:
    """The number at 15 significant digits.

    Examples
    --------
    >>> fifteen(0.1 + 0.2)
    0.3
    """
    return float(f"{x:.15g}")


def floor15(x: float) -> float:
    """Largest whole number not above x, where x counts at 15 digits.

    Examples
    --------
    >>> floor15(0.3 / 0.1), floor15(-1.5)
    (3.0, -2.0)
    """
    whole = float(math.floor(x))
    return whole + 1.0 if x - whole > 0.99 and fifteen(x) >= whole + 1.0 else whole


def ceil15(x: float) -> float:
    """Smallest whole number not below x, where x counts at 15 digits."""
    return -floor15(-x)


def _at_digits(x: float, digits: float, rounding: str) -> float:
    places = math.trunc(digits)
    if x == 0.0 or places > 14 - math.floor(math.log10(abs(x))):
        return x
    if places < -320:
        return math.inf if rounding == ROUND_UP else 0.0
    step = Decimal(1).scaleb(-places)
    return float(Decimal(f"{x:.15g}").quantize(step, rounding, _WIDE))


@native("ROUND", "number number")
def round_(x: float, digits: float) -> float:
    """Nearest, halves away from zero.

    Examples
    --------
    >>> round_(2.675, 2.0), round_(-1.475, 2.0), round_(626.3, -3.0)
    (2.68, -1.48, 1000.0)
    """
    if 0.0 <= digits <= 12.0 and abs(x) < 1e9:
        scale = 10.0 ** math.trunc(digits)
        scaled = abs(x) * scale
        whole = math.floor(scaled)
        rest = scaled - whole
        if abs(rest - 0.5) > 1e-4 and scaled < 1e11:
            return math.copysign((whole + (rest > 0.5)) / scale, x) + 0.0
    return _at_digits(x, digits, ROUND_HALF_UP) + 0.0


@native("ROUNDUP", "number number")
def roundup(x: float, digits: float) -> float:
    """Away from zero."""
    return _at_digits(x, digits, ROUND_UP)


@native("ROUNDDOWN", "number number")
def rounddown(x: float, digits: float) -> float:
    """Towards zero."""
    return _at_digits(x, digits, ROUND_DOWN) + 0.0


@native("TRUNC", "number number?")
def trunc(x: float, digits: float = 0.0) -> float:
    """Towards zero, to whole numbers unless digits are given."""
    return _at_digits(x, digits, ROUND_DOWN) + 0.0


@native("INT", "number")
def int_(x: float) -> float:
    """Down to a whole number."""
    return floor15(x)


@native("ABS", "number", vector=elementwise("abs"))
def abs_(x: float) -> float:
    """Absolute value."""
    return abs(x)


@native("SIGN", "number", vector=elementwise("sign"))
def sign(x: float) -> float:
    """1, 0 or -1."""
    return float((x > 0.0) - (x < 0.0))


@native("EVEN", "number")
def even(x: float) -> float:
    """Away from zero to an even number."""
    return math.copysign(2.0 * ceil15(abs(x) / 2.0), x) + 0.0


@native("ODD", "number")
def odd(x: float) -> float:
    """Away from zero to an odd number; 0 gives 1."""
    return math.copysign(2.0 * ceil15((max(abs(x), 1.0) - 1.0) / 2.0) + 1.0, x if x else 1.0)


@native("MOD", "number number")
def mod(x: float, divisor: float) -> float:
    """Remainder with the sign of the divisor."""
    if divisor == 0.0:
        raise ZeroDivisionError
    if abs(x) >= abs(divisor) * _MOD_LIMIT:
        raise ValueError
    return x % divisor + 0.0


@tool("QUOTIENT", "number number")
def quotient(x: float, divisor: float) -> float:
    """Whole part of a division."""
    return float(math.trunc(x / divisor))


@tool("MROUND", "number number")
def mround(x: float, step: float) -> float:
    """Nearest multiple, halves away from zero."""
    if x == 0.0 or step == 0.0:
        return 0.0
    if (x > 0.0) != (step > 0.0):
        raise ValueError
    return step * math.floor(x / step + 0.5)


@native("CEILING", "number number")
def ceiling(x: float, step: float) -> float:
    """Up to a multiple; away from zero where both are negative."""
    if x == 0.0 or step == 0.0:
        return 0.0
    if x > 0.0 > step:
        raise ValueError
    return step * ceil15(x / step) + 0.0


@native("FLOOR", "number number")
def floor(x: float, step: float) -> float:
    """Down to a multiple; towards zero where both are negative."""
    if x == 0.0:
        return 0.0
    if step == 0.0:
        raise ZeroDivisionError
    if x > 0.0 > step:
        raise ValueError
    return step * floor15(x / step) + 0.0


@native("CEILING.MATH", "number number~ number?")
def ceiling_math(x: float, step: float | None = None, mode: float = 0.0) -> float:
    """Up to a multiple of the absolute step; with a mode, negative numbers away from zero."""
    size = 1.0 if step is None else abs(step)
    if size == 0.0:
        return 0.0
    if x < 0.0 and mode != 0.0:
        return -size * ceil15(-x / size)
    return size * ceil15(x / size) + 0.0


@native("FLOOR.MATH", "number number~ number?")
def floor_math(x: float, step: float | None = None, mode: float = 0.0) -> float:
    """Down to a multiple of the absolute step; with a mode, negative numbers towards zero."""
    size = 1.0 if step is None else abs(step)
    if size == 0.0:
        return 0.0
    if x < 0.0 and mode != 0.0:
        return -size * floor15(-x / size) + 0.0
    return size * floor15(x / size) + 0.0


@native("CEILING.PRECISE ISO.CEILING", "number number~")
def ceiling_precise(x: float, step: float = 1.0) -> float:
    """Up to a multiple, whatever the signs."""
    return ceiling_math(x, step)


@native("FLOOR.PRECISE", "number number~")
def floor_precise(x: float, step: float = 1.0) -> float:
    """Down to a multiple, whatever the signs."""
    return floor_math(x, step)
