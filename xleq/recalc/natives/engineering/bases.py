"""Binary, octal, decimal and hexadecimal numbers as text, negative ones as two's complement of ten digits."""

from __future__ import annotations

import math
from collections.abc import Callable
from typing import Any, Final

from xleq.cells import MISSING, NUM, VALUE, CellError, Value
from xleq.recalc.coerce import to_text
from xleq.recalc.natives.arithmetic.numerals import digits_of
from xleq.recalc.natives.gather import direct_number
from xleq.recalc.natives.table import native
from xleq.recalc.operands import Fail

_DIGITS: Final = 10
_RADIX: Final = {"BIN": 2, "OCT": 8, "HEX": 16}
#: Numbers of ten digits from this one on are negative; decimal ones must lie within its half.
_SPAN: Final = {"BIN": 2**10, "OCT": 8**10, "HEX": 16**10}


def number_from(value: Value, kind: str) -> int:
    """The number that text of ten digits at most stands for."""
    if type(value) is bool:
        raise Fail(VALUE)
    text = to_text(value)
    if isinstance(text, CellError):
        raise Fail(text)
    text = text.strip().upper() or "0"
    allowed = "0123456789ABCDEF"[: _RADIX[kind]]
    if len(text) > _DIGITS or any(c not in allowed for c in text):
        raise Fail(NUM)
    number = int(text, _RADIX[kind])
    return number - _SPAN[kind] if 2 * number >= _SPAN[kind] else number


def text_of(number: int, kind: str, places: Any) -> str:
    """Digits of a number, filled with zeros to `places` where they are given."""
    span = _SPAN[kind]
    if not -span <= 2 * number < span:
        raise Fail(NUM)
    length = None if places is MISSING else math.trunc(direct_number(places, logicals=False))
    if length is not None and not 1 <= length <= _DIGITS:
        raise Fail(NUM)
    text = digits_of(number % span, _RADIX[kind])
    if number < 0 or length is None:
        return text
    if len(text) > length:
        raise Fail(NUM)
    return text.rjust(length, "0")


def _declare_to_decimal(kind: str) -> Callable[[Value], float]:
    @native(f"{kind}2DEC", "value")
    def to_decimal(value: Value) -> float:
        return float(number_from(value, kind))

    return to_decimal


def _declare_from_decimal(kind: str) -> Callable[..., str]:
    @native(f"DEC2{kind}", "value value?")
    def from_decimal(value: Value, places: Any = MISSING) -> str:
        number = math.floor(direct_number(value, logicals=False))
        return text_of(number, kind, places)

    return from_decimal


def _declare_between(source: str, target: str) -> Callable[..., str]:
    @native(f"{source}2{target}", "value value?")
    def between(value: Value, places: Any = MISSING) -> str:
        return text_of(number_from(value, source), target, places)

    return between


for _kind in _RADIX:
    _declare_to_decimal(_kind)
    _declare_from_decimal(_kind)
    for _other in _RADIX:
        if _other != _kind:
            _declare_between(_kind, _other)
