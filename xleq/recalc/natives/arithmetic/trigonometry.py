"""Angles and hyperbolic functions."""

from __future__ import annotations

import math

from xleq.recalc.natives.arithmetic.vectors import elementwise
from xleq.recalc.natives.table import native

#: Angles from here on are refused, as the spreadsheet does.
LARGEST_ANGLE = 134_217_728.0


def _angle(x: float) -> float:
    if abs(x) >= LARGEST_ANGLE:
        raise ValueError
    return x


@native("SIN", "number", vector=elementwise("sin", LARGEST_ANGLE))
def sin(x: float) -> float:
    """Sine."""
    return math.sin(_angle(x))


@native("COS", "number", vector=elementwise("cos", LARGEST_ANGLE))
def cos(x: float) -> float:
    """Cosine."""
    return math.cos(_angle(x))


@native("TAN", "number", vector=elementwise("tan", LARGEST_ANGLE))
def tan(x: float) -> float:
    """Tangent."""
    return math.tan(_angle(x))


@native("COT", "number")
def cot(x: float) -> float:
    """Cotangent."""
    return 1.0 / math.tan(_angle(x))


@native("SEC", "number")
def sec(x: float) -> float:
    """Secant."""
    return 1.0 / math.cos(_angle(x))


@native("CSC", "number")
def csc(x: float) -> float:
    """Cosecant."""
    return 1.0 / math.sin(_angle(x))


@native("ASIN", "number", vector=elementwise("arcsin"))
def asin(x: float) -> float:
    """Angle of a sine, -π/2 to π/2."""
    return math.asin(x)


@native("ACOS", "number", vector=elementwise("arccos"))
def acos(x: float) -> float:
    """Angle of a cosine, 0 to π."""
    return math.acos(x)


@native("ATAN", "number", vector=elementwise("arctan"))
def atan(x: float) -> float:
    """Angle of a tangent, -π/2 to π/2."""
    return math.atan(x)


@native("ATAN2", "number number")
def atan2(x: float, y: float) -> float:
    """Angle of the point (x, y), above -π to π."""
    if x == 0.0 and y == 0.0:
        raise ZeroDivisionError
    return math.atan2(y, x)


@native("ACOT", "number")
def acot(x: float) -> float:
    """Angle of a cotangent, 0 to π."""
    return math.atan2(1.0, x)


@native("SINH", "number", vector=elementwise("sinh"))
def sinh(x: float) -> float:
    """Hyperbolic sine."""
    return math.sinh(x)


@native("COSH", "number", vector=elementwise("cosh"))
def cosh(x: float) -> float:
    """Hyperbolic cosine."""
    return math.cosh(x)


@native("TANH", "number", vector=elementwise("tanh"))
def tanh(x: float) -> float:
    """Hyperbolic tangent."""
    return math.tanh(x)


@native("COTH", "number")
def coth(x: float) -> float:
    """Hyperbolic cotangent."""
    return 1.0 / math.tanh(x)


def _inverse_cosh(x: float) -> float:
    return 1.0 / math.cosh(x) if abs(x) < 700.0 else 2.0 * math.exp(-abs(x))


@native("SECH", "number")
def sech(x: float) -> float:
    """Hyperbolic secant."""
    return _inverse_cosh(x)


@native("CSCH", "number")
def csch(x: float) -> float:
    """Hyperbolic cosecant."""
    if abs(x) < 700.0:
        return 1.0 / math.sinh(x)
    return math.copysign(_inverse_cosh(x), x)


@native("ASINH", "number", vector=elementwise("arcsinh"))
def asinh(x: float) -> float:
    """Inverse hyperbolic sine."""
    return math.asinh(x)


@native("ACOSH", "number", vector=elementwise("arccosh"))
def acosh(x: float) -> float:
    """Inverse hyperbolic cosine."""
    return math.acosh(x)


@native("ATANH", "number", vector=elementwise("arctanh"))
def atanh(x: float) -> float:
    """Inverse hyperbolic tangent."""
    return math.atanh(x)


@native("ACOTH", "number")
def acoth(x: float) -> float:
    """Inverse hyperbolic cotangent; |x| must exceed 1."""
    if abs(x) <= 1.0:
        raise ValueError
    return math.atanh(1.0 / x)


@native("DEGREES", "number", vector=elementwise("degrees"))
def degrees(x: float) -> float:
    """Degrees from radians."""
    return math.degrees(x)


@native("RADIANS", "number", vector=elementwise("radians"))
def radians(x: float) -> float:
    """Radians from degrees."""
    return math.radians(x)
