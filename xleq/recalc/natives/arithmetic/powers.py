"""Powers, roots, exponentials and logarithms."""

from __future__ import annotations

import math
from typing import TYPE_CHECKING

from xleq.cells import CellError
from xleq.recalc.natives.arithmetic.vectors import elementwise
from xleq.recalc.natives.table import native
from xleq.recalc.natives.tools import tool
from xleq.recalc.operands import Array, Fail

if TYPE_CHECKING:
    import numpy as np
    from numpy.typing import NDArray


def _power_vector(x: NDArray[np.float64], y: NDArray[np.float64]) -> NDArray[np.float64]:
    import numpy as np

    with np.errstate(all="ignore"):
        return np.where(x > 0.0, x**y, np.nan)


@native("POWER", "number number", vector=_power_vector)
def power(x: float, y: float) -> float:
    """Power x^y, as the operator ``^`` has it.

    Raises
    ------
    ValueError
        For 0 to the power 0, and for a negative number to a power that is neither whole nor an odd root.
    ZeroDivisionError
        For 0 to a negative power.

    Examples
    --------
    >>> power(98.6, 3.2), power(-8.0, 1 / 3)
    (2401077.2220695773, -2.0)
    """
    if x == 0.0 and y == 0.0:
        raise ValueError
    if x >= 0.0 or y == math.trunc(y):
        return float(x**y)
    root = round(1.0 / y)
    if root % 2 and abs(root * y - 1.0) < 1e-14:
        return -float((-x) ** y)
    raise ValueError


@native("SQRT", "number", vector=elementwise("sqrt"))
def sqrt(x: float) -> float:
    """Square root."""
    return math.sqrt(x)


@tool("SQRTPI", "number")
def sqrtpi(x: float) -> float:
    """Square root of x·π."""
    return math.sqrt(x * math.pi)


@native("EXP", "number", vector=elementwise("exp"))
def exp(x: float) -> float:
    """E to the power x."""
    return math.exp(x)


@native("LN", "number", vector=elementwise("log"))
def ln(x: float) -> float:
    """Natural logarithm."""
    return math.log(x)


@native("LOG10", "number", vector=elementwise("log10"))
def log10(x: float) -> float:
    """Decimal logarithm."""
    return math.log10(x)


@native("LOG", "number number~")
def log(x: float, base: float = 10.0) -> float:
    """Logarithm to a base, 10 unless given.

    Examples
    --------
    >>> log(1000.0), log(8.0, 2.0)
    (3.0, 3.0)
    """
    if x <= 0.0 or base <= 0.0:
        raise ValueError
    if base == 10.0:
        return math.log10(x)
    return math.log2(x) if base == 2.0 else math.log(x) / math.log(base)


@native("PI")
def pi() -> float:
    """π."""
    return math.pi


@tool("SERIESSUM", "number number number array")
def seriessum(x: float, first: float, step: float, coefficients: Array) -> float:
    """Sum of a[i]·x^(first + i·step)."""
    total = 0.0
    for i, a in enumerate(coefficients.flat):
        if type(a) is CellError:
            raise Fail(a)
        if type(a) is float:
            exponent = first + i * step
            total += a * (1.0 if exponent == 0.0 else power(x, exponent))
    return total
