"""Operations on the bits of whole numbers below 2^48, and step functions."""

from __future__ import annotations

import math

from xleq.cells import Value
from xleq.recalc.natives.gather import direct_number
from xleq.recalc.natives.table import native

_END = 2.0**48


def _bits(x: float) -> int:
    if not 0.0 <= x < _END or x != math.trunc(x):
        raise ValueError
    return int(x)


@native("BITAND", "number number")
def bitand(x: float, y: float) -> float:
    """Bits set in both."""
    return float(_bits(x) & _bits(y))


@native("BITOR", "number number")
def bitor(x: float, y: float) -> float:
    """Bits set in either."""
    return float(_bits(x) | _bits(y))


@native("BITXOR", "number number")
def bitxor(x: float, y: float) -> float:
    """Bits set in one of the two."""
    return float(_bits(x) ^ _bits(y))


@native("BITLSHIFT", "number number")
def bitlshift(x: float, places: float) -> float:
    """Bits moved to the left; a negative number of places to the right."""
    bits, shift = _bits(x), math.trunc(places)
    if abs(shift) > 53:
        raise ValueError
    moved = bits << shift if shift >= 0 else bits >> -shift
    return float(_bits(float(moved)))


@native("BITRSHIFT", "number number")
def bitrshift(x: float, places: float) -> float:
    """Bits moved to the right; a negative number of places to the left."""
    return bitlshift(x, -places)


@native("DELTA", "value value?")
def delta(x: Value, y: Value = 0.0) -> float:
    """1 where two numbers are equal, else 0."""
    return float(direct_number(x, logicals=False) == direct_number(y, logicals=False))


@native("GESTEP", "value value?")
def gestep(x: Value, step: Value = 0.0) -> float:
    """1 where a number reaches a step, else 0."""
    return float(direct_number(x, logicals=False) >= direct_number(step, logicals=False))
