"""Bessel functions of whole order.

The spreadsheet's own are polynomials good to about eight digits; these are good to fifteen.
"""

from __future__ import annotations

import math

from xleq.cells import NUM, Value
from xleq.recalc.natives.gather import direct_number, finite
from xleq.recalc.natives.table import native
from xleq.recalc.operands import Fail


def _given(x: Value, order: Value, *, positive: bool) -> tuple[float, int]:
    argument = direct_number(x, logicals=False)
    n = math.trunc(direct_number(order, logicals=False))
    if n < 0 or (positive and argument <= 0.0):
        raise Fail(NUM)
    return argument, n


@native("BESSELJ", "value value")
def besselj(x: Value, order: Value) -> float:
    """Bessel function of the first kind."""
    from scipy.special import jv

    argument, n = _given(x, order, positive=False)
    return finite(float(jv(n, argument)))


@native("BESSELY", "value value")
def bessely(x: Value, order: Value) -> float:
    """Bessel function of the second kind."""
    from scipy.special import yv

    argument, n = _given(x, order, positive=True)
    return finite(float(yv(float(n), argument)))


@native("BESSELI", "value value")
def besseli(x: Value, order: Value) -> float:
    """Modified Bessel function of the first kind."""
    from scipy.special import iv

    argument, n = _given(x, order, positive=False)
    return finite(float(iv(n, argument)))


@native("BESSELK", "value value")
def besselk(x: Value, order: Value) -> float:
    """Modified Bessel function of the second kind."""
    from scipy.special import kv

    argument, n = _given(x, order, positive=True)
    return finite(float(kv(float(n), argument)))
