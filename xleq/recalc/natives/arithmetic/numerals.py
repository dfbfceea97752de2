"""Numbers written otherwise: Roman, and to a base."""

from __future__ import annotations

import math
from typing import Final

from xleq.cells import NUM, VALUE
from xleq.recalc.natives.table import native
from xleq.recalc.operands import Fail

_ROMAN: Final = {"I": 1, "V": 5, "X": 10, "L": 50, "C": 100, "D": 500, "M": 1000}
_DIGITS: Final = "0123456789ABCDEFGHIJKLMNOPQRSTUVWXYZ"
_SYMBOLS: Final = "MDCLXVI"
_VALUES: Final = (1000, 500, 100, 50, 10, 5, 1)


@native("ROMAN", "number any~")
def roman(x: float, form: object = 0.0) -> str:
    """Roman numeral; forms 1 to 4 are ever more concise.

    A form above 0 lets a symbol be subtracted from symbols further up the scale than the classic rule does.

    Examples
    --------
    >>> [roman(499.0, float(f)) for f in range(5)]
    ['CDXCIX', 'LDVLIV', 'XDIX', 'VDIV', 'ID']
    """
    if type(form) is bool:
        level = 0 if form else 4
    elif type(form) is float:
        level = math.trunc(form)
    else:
        raise Fail(VALUE)
    rest = math.trunc(x)
    if not 0 <= rest <= 3999 or not 0 <= level <= 4:
        raise Fail(VALUE)
    text = ""
    for i in range(0, 7, 2):  # the decades: M, C, X, I
        digit, rest = divmod(rest, _VALUES[i])
        if digit % 5 == 4:
            upper = i - (2 if digit == 9 else 1)
            lower = i
            while (
                lower - i < level
                and lower < 6
                and _VALUES[upper] - _VALUES[lower + 1] <= (digit * _VALUES[i] + rest)
            ):
                lower += 1
            text += _SYMBOLS[lower] + _SYMBOLS[upper]
            rest += digit * _VALUES[i] - (_VALUES[upper] - _VALUES[lower])
        else:
            text += (_SYMBOLS[i - 1] if digit > 4 else "") + _SYMBOLS[i] * (digit % 5)
    return text


@native("ARABIC", "text")
def arabic(text: str) -> float:
    """Value of a Roman numeral; an unknown letter is #VALUE!.

    Examples
    --------
    >>> arabic("LVII"), arabic("-mmxi")
    (57.0, -2011.0)
    """
    numeral = text.strip().upper()
    negative = numeral.startswith("-")
    values = [_ROMAN.get(letter, 0) for letter in numeral.removeprefix("-")]
    if 0 in values or len(numeral) > 255:
        raise Fail(VALUE)
    total = sum(-v if any(w > v for w in values[i + 1 : i + 2]) else v for i, v in enumerate(values))
    return float(-total if negative else total)


def digits_of(number: int, radix: int) -> str:
    """A whole number ≥ 0 to a base of 2 to 36.

    Examples
    --------
    >>> digits_of(255, 16)
    'FF'
    """
    text = ""
    while number:
        number, digit = divmod(number, radix)
        text = _DIGITS[digit] + text
    return text or "0"


@native("BASE", "number number number?")
def base(x: float, radix: float, least: float = 0.0) -> str:
    """Text of a number to a base, filled with zeros to a least length."""
    number, to, length = math.trunc(x), math.trunc(radix), math.trunc(least)
    if not 0 <= number < 2**53 or not 2 <= to <= 36 or not 0 <= length <= 255:
        raise Fail(NUM)
    return digits_of(number, to).rjust(length, "0")


@native("DECIMAL", "text number")
def decimal(text: str, radix: float) -> float:
    """Number from its text to a base.

    Examples
    --------
    >>> decimal("FF", 16.0), decimal("zap", 36.0)
    (255.0, 45745.0)
    """
    digits, to = text.strip().upper(), math.trunc(radix)
    if len(digits) > 255:
        raise Fail(VALUE)
    if not 2 <= to <= 36:
        raise Fail(NUM)
    if to == 16:
        digits = digits.removeprefix("0X").removeprefix("X").removesuffix("H")
    elif to == 2:
        digits = digits.removesuffix("B")
    value = 0
    for digit in digits:
        worth = _DIGITS.find(digit)
        if not 0 <= worth < to:
            raise Fail(NUM)
        value = value * to + worth
    return float(value)
