"""The normal distribution, its kin, and the error and gamma functions."""

from __future__ import annotations

import math
from functools import cache
from statistics import NormalDist

from xleq.recalc.natives.gather import guarded
from xleq.recalc.natives.table import native
from xleq.recalc.natives.tools import tool

_ROOT_2 = math.sqrt(2.0)
_ROOT_2PI = math.sqrt(2.0 * math.pi)


def normal_density(z: float) -> float:
    """Density of the standard normal distribution."""
    return math.exp(-0.5 * z * z) / _ROOT_2PI


def normal_below(z: float) -> float:
    """Chance of a standard normal value below z."""
    return 0.5 * math.erfc(-z / _ROOT_2)


@cache
def _standard() -> NormalDist:
    return NormalDist()


def normal_quantile(p: float) -> float:
    """Value below which a standard normal value lies with chance p, 0 < p < 1.

    Raises
    ------
    ValueError
        If p is outside.

    Examples
    --------
    >>> round(normal_quantile(0.908789), 7)
    1.3333347
    """
    if not 0.0 < p < 1.0:
        raise ValueError
    z = _standard().inv_cdf(p)
    if 1e-300 < p < 0.4:  # one step of Newton's method on the logarithm sharpens the tail
        below = normal_below(z)
        z -= below / normal_density(z) * math.log(below / p)
    return z


@native("NORM.DIST NORMDIST", "number number number logical")
@guarded
def norm_dist(x: float, mean: float, deviation: float, cumulative: bool) -> float:
    """Normal distribution."""
    if deviation <= 0.0:
        raise ValueError
    z = (x - mean) / deviation
    return normal_below(z) if cumulative else normal_density(z) / deviation


@native("NORM.INV NORMINV", "number number number")
def norm_inv(p: float, mean: float, deviation: float) -> float:
    """Quantile of the normal distribution."""
    if deviation <= 0.0:
        raise ValueError
    return mean + deviation * normal_quantile(p)


@native("NORM.S.DIST", "number logical")
@guarded
def norm_s_dist(z: float, cumulative: bool) -> float:
    """Standard normal distribution."""
    return normal_below(z) if cumulative else normal_density(z)


@native("NORMSDIST", "number")
def normsdist(z: float) -> float:
    """Standard normal distribution, cumulative."""
    return normal_below(z)


@native("NORM.S.INV NORMSINV", "number")
def norm_s_inv(p: float) -> float:
    """Quantile of the standard normal distribution."""
    return normal_quantile(p)


@native("GAUSS", "number")
def gauss(z: float) -> float:
    """Chance of a standard normal value between 0 and z."""
    return 0.5 * math.erf(z / _ROOT_2)


@native("PHI", "number")
def phi(z: float) -> float:
    """Density of the standard normal distribution."""
    return normal_density(z)


@native("LOGNORM.DIST", "number number number logical")
@guarded
def lognorm_dist(x: float, mean: float, deviation: float, cumulative: bool) -> float:
    """Lognormal distribution."""
    if x <= 0.0 or deviation <= 0.0:
        raise ValueError
    z = (math.log(x) - mean) / deviation
    return normal_below(z) if cumulative else normal_density(z) / (deviation * x)


@native("LOGNORMDIST", "number number number")
def lognormdist(x: float, mean: float, deviation: float) -> float:
    """Lognormal distribution, cumulative."""
    return lognorm_dist(x, mean, deviation, True)


@native("LOGNORM.INV LOGINV", "number number number")
def lognorm_inv(p: float, mean: float, deviation: float) -> float:
    """Quantile of the lognormal distribution."""
    return math.exp(norm_inv(p, mean, deviation))


@native("CONFIDENCE CONFIDENCE.NORM", "number number number")
def confidence(alpha: float, deviation: float, size: float) -> float:
    """Half width of the confidence interval of a mean, deviation known."""
    if not 0.0 < alpha < 1.0 or deviation <= 0.0 or size < 1.0:
        raise ValueError
    return -normal_quantile(alpha / 2.0) * deviation / math.sqrt(math.trunc(size))


@tool("ERF", "number number?")
def erf(lower: float, upper: float | None = None) -> float:
    """Error function, from 0 or between limits."""
    if upper is None:
        return math.erf(lower)
    if lower > 0.5 and upper > 0.5:
        return math.erfc(lower) - math.erfc(upper)
    return math.erf(upper) - math.erf(lower)


@tool("ERF.PRECISE", "number")
def erf_precise(x: float) -> float:
    """Error function."""
    return math.erf(x)


@tool("ERFC ERFC.PRECISE", "number")
def erfc(x: float) -> float:
    """One minus the error function."""
    return math.erfc(x)


@native("GAMMA", "number")
def gamma(x: float) -> float:
    """Gamma function; 0 and negative whole numbers are #NUM!."""
    return math.gamma(x)


@native("GAMMALN GAMMALN.PRECISE", "number")
def gammaln(x: float) -> float:
    """Logarithm of the gamma function, x above 0."""
    if x <= 0.0:
        raise ValueError
    return math.lgamma(x)
