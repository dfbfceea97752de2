"""Two lists side by side: correlation, covariance, the straight line."""

from __future__ import annotations

import math

from xleq.cells import DIV0, NA
from xleq.recalc.natives.gather import guarded, number_pairs, ratio
from xleq.recalc.natives.table import native
from xleq.recalc.operands import Array, Fail

_Moments = tuple[int, float, float, float, float, float]


def _moments(xs: Array, ys: Array) -> _Moments:
    """n, means of x and y, sums of squared deviations of x and y, sum of their products."""
    x, y = number_pairs(xs, ys)
    n = len(x)
    if n == 0:
        raise Fail(DIV0)
    mx, my = sum(x) / n, sum(y) / n
    sxx = sum((a - mx) * (a - mx) for a in x)
    syy = sum((b - my) * (b - my) for b in y)
    sxy = sum((a - mx) * (b - my) for a, b in zip(x, y, strict=True))
    return n, mx, my, sxx, syy, sxy


@native("CORREL PEARSON", "array array")
@guarded
def correl(xs: Array, ys: Array) -> float:
    """Correlation coefficient."""
    _, _, _, sxx, syy, sxy = _moments(xs, ys)
    return ratio(sxy, math.sqrt(sxx) * math.sqrt(syy))


@native("RSQ", "array array")
@guarded
def rsq(ys: Array, xs: Array) -> float:
    """Square of the correlation coefficient."""
    return correl(xs, ys) ** 2


@native("COVAR COVARIANCE.P", "array array")
@guarded
def covar(xs: Array, ys: Array) -> float:
    """Covariance of a population."""
    n, _, _, _, _, sxy = _moments(xs, ys)
    return sxy / n


@native("COVARIANCE.S", "array array")
@guarded
def covariance_s(xs: Array, ys: Array) -> float:
    """Covariance of a sample."""
    n, _, _, _, _, sxy = _moments(xs, ys)
    return ratio(sxy, n - 1.0)


@native("SLOPE", "array array")
@guarded
def slope(ys: Array, xs: Array) -> float:
    """Slope of the straight line through the points."""
    _, _, _, sxx, _, sxy = _moments(xs, ys)
    return ratio(sxy, sxx)


@native("INTERCEPT", "array array")
@guarded
def intercept(ys: Array, xs: Array) -> float:
    """Where the straight line meets x = 0."""
    _, mx, my, sxx, _, sxy = _moments(xs, ys)
    return my - ratio(sxy, sxx) * mx


@native("FORECAST FORECAST.LINEAR", "number array array")
def forecast(x: float, ys: Array, xs: Array) -> float:
    """The straight line at x."""
    if ys.height * ys.width != xs.height * xs.width:
        raise Fail(NA)
    _, mx, my, sxx, _, sxy = _moments(xs, ys)
    return my + ratio(sxy, sxx) * (x - mx)


@native("STEYX", "array array")
@guarded
def steyx(ys: Array, xs: Array) -> float:
    """Standard error of the straight line."""
    n, _, _, sxx, syy, sxy = _moments(xs, ys)
    if n < 3:
        raise Fail(DIV0)
    return math.sqrt(max(syy - ratio(sxy * sxy, sxx), 0.0) / (n - 2))


@native("FISHER", "number")
def fisher(x: float) -> float:
    """Inverse hyperbolic tangent of a correlation."""
    return math.atanh(x)


@native("FISHERINV", "number")
def fisherinv(y: float) -> float:
    """Correlation from its inverse hyperbolic tangent."""
    return math.tanh(y)
