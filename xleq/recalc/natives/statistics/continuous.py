"""Continuous distributions: exponential, gamma, beta, Weibull, chi-squared, t and F."""

from __future__ import annotations

import math

from xleq.recalc.natives.gather import guarded
from xleq.recalc.natives.table import native

_MOST_FREEDOM = 1e10


def _freedom(x: float) -> float:
    freedom = float(math.trunc(x))
    if not 1.0 <= freedom <= _MOST_FREEDOM:
        raise ValueError
    return freedom


def _chance(p: float, *, zero: bool, one: bool) -> float:
    if not 0.0 <= p <= 1.0 or (p == 0.0 and not zero) or (p == 1.0 and not one):
        raise ValueError
    return p


def _gamma_density(x: float, shape: float, scale: float) -> float:
    if x == 0.0:
        return math.inf if shape < 1.0 else (1.0 / scale if shape == 1.0 else 0.0)
    return math.exp((shape - 1.0) * math.log(x / scale) - x / scale - math.lgamma(shape)) / scale


def gamma_below(x: float, shape: float) -> float:
    """Regularised incomplete gamma function from 0 to x."""
    from scipy.special import gammainc

    return float(gammainc(shape, x))


def gamma_above(x: float, shape: float) -> float:
    """Regularised incomplete gamma function from x on."""
    from scipy.special import gammaincc

    return float(gammaincc(shape, x))


def beta_below(x: float, a: float, b: float) -> float:
    """Regularised incomplete beta function from 0 to x."""
    from scipy.special import betainc

    return float(betainc(a, b, x))


def beta_quantile(p: float, a: float, b: float) -> float:
    """Inverse of the regularised incomplete beta function."""
    from scipy.special import betaincinv

    return float(betaincinv(a, b, p))


@native("EXPON.DIST EXPONDIST", "number number logical")
@guarded
def expon_dist(x: float, rate: float, cumulative: bool) -> float:
    """Exponential distribution."""
    if x < 0.0 or rate <= 0.0:
        raise ValueError
    return -math.expm1(-rate * x) if cumulative else rate * math.exp(-rate * x)


@native("GAMMA.DIST GAMMADIST", "number number number logical")
@guarded
def gamma_dist(x: float, shape: float, scale: float, cumulative: bool) -> float:
    """Gamma distribution."""
    if x < 0.0 or shape <= 0.0 or scale <= 0.0:
        raise ValueError
    return gamma_below(x / scale, shape) if cumulative else _gamma_density(x, shape, scale)


@native("GAMMA.INV GAMMAINV", "number number number")
def gamma_inv(p: float, shape: float, scale: float) -> float:
    """Quantile of the gamma distribution."""
    if shape <= 0.0 or scale <= 0.0:
        raise ValueError
    from scipy.special import gammaincinv

    return scale * float(gammaincinv(shape, _chance(p, zero=True, one=False)))


@native("BETA.DIST", "number number number logical number~ number~")
@guarded
def beta_dist(x: float, a: float, b: float, cumulative: bool, low: float = 0.0, high: float = 1.0) -> float:
    """Beta distribution between limits."""
    if a <= 0.0 or b <= 0.0 or not low <= x <= high or low == high:
        raise ValueError
    share = (x - low) / (high - low)
    if cumulative:
        return beta_below(share, a, b)
    if share in (0.0, 1.0):
        exponent = a if share == 0.0 else b
        if exponent < 1.0:
            raise ValueError
        return (b if share == 0.0 else a) / (high - low) if exponent == 1.0 else 0.0
    logarithm = (a - 1.0) * math.log(share) + (b - 1.0) * math.log1p(-share)
    return math.exp(logarithm + math.lgamma(a + b) - math.lgamma(a) - math.lgamma(b)) / (high - low)


@native("BETADIST", "number number number number~ number~")
def betadist(x: float, a: float, b: float, low: float = 0.0, high: float = 1.0) -> float:
    """Beta distribution, cumulative."""
    return beta_dist(x, a, b, True, low, high)


@native("BETA.INV BETAINV", "number number number number~ number~")
def beta_inv(p: float, a: float, b: float, low: float = 0.0, high: float = 1.0) -> float:
    """Quantile of the beta distribution between limits."""
    if a <= 0.0 or b <= 0.0 or low >= high:
        raise ValueError
    return low + (high - low) * beta_quantile(_chance(p, zero=False, one=True), a, b)


@native("WEIBULL WEIBULL.DIST", "number number number logical")
@guarded
def weibull(x: float, shape: float, scale: float, cumulative: bool) -> float:
    """Weibull distribution."""
    if x < 0.0 or shape <= 0.0 or scale <= 0.0:
        raise ValueError
    power = float((x / scale) ** shape)
    if cumulative:
        return -math.expm1(-power)
    if x == 0.0 and shape < 1.0:
        raise ValueError
    return float(shape / scale * (x / scale) ** (shape - 1.0) * math.exp(-power))


@native("CHISQ.DIST", "number number logical")
@guarded
def chisq_dist(x: float, freedom: float, cumulative: bool) -> float:
    """Chi-squared distribution."""
    return gamma_dist(x, _freedom(freedom) / 2.0, 2.0, cumulative)


@native("CHISQ.DIST.RT CHIDIST", "number number")
def chisq_dist_rt(x: float, freedom: float) -> float:
    """Chance of a chi-squared value above x."""
    if x < 0.0:
        raise ValueError
    return gamma_above(x / 2.0, _freedom(freedom) / 2.0)


@native("CHISQ.INV", "number number")
def chisq_inv(p: float, freedom: float) -> float:
    """Quantile of the chi-squared distribution."""
    return gamma_inv(p, _freedom(freedom) / 2.0, 2.0)


@native("CHISQ.INV.RT CHIINV", "number number")
def chisq_inv_rt(p: float, freedom: float) -> float:
    """Value above which a chi-squared value lies with chance p."""
    from scipy.special import gammainccinv

    return 2.0 * float(gammainccinv(_freedom(freedom) / 2.0, _chance(p, zero=False, one=True)))


def t_above(x: float, freedom: float) -> float:
    """Chance of a t value above x ≥ 0; the degrees of freedom need not be whole."""
    return 0.5 * beta_below(freedom / (freedom + x * x), freedom / 2.0, 0.5)


@native("T.DIST", "number number logical")
@guarded
def t_dist(x: float, freedom: float, cumulative: bool) -> float:
    """Student's t distribution."""
    n = _freedom(freedom)
    if cumulative:
        return t_above(-x, n) if x < 0.0 else 1.0 - t_above(x, n)
    scale = math.lgamma((n + 1.0) / 2.0) - math.lgamma(n / 2.0) - 0.5 * math.log(n * math.pi)
    return math.exp(scale - (n + 1.0) / 2.0 * math.log1p(x * x / n))


@native("T.DIST.RT", "number number")
def t_dist_rt(x: float, freedom: float) -> float:
    """Chance of a t value above x."""
    n = _freedom(freedom)
    return t_above(x, n) if x >= 0.0 else 1.0 - t_above(-x, n)


@native("T.DIST.2T", "number number")
def t_dist_2t(x: float, freedom: float) -> float:
    """Chance of a t value farther from 0 than x ≥ 0."""
    return tdist(x, freedom, 2.0)


@native("TDIST", "number number number")
def tdist(x: float, freedom: float, tails: float) -> float:
    """Chance of a t value above x ≥ 0, in one tail or two."""
    sides = math.trunc(tails)
    if x < 0.0 or sides not in (1, 2):
        raise ValueError
    return sides * t_above(x, _freedom(freedom))


def t_upper_quantile(p: float, freedom: float) -> float:
    """Value ≥ 0 above which a t value lies with chance p ≤ 0.5."""
    share = beta_quantile(2.0 * p, freedom / 2.0, 0.5)
    if share > 0.5:  # close to the middle the other end of the beta distribution is the sharper one
        from scipy.special import betaincinv

        rest = float(betaincinv(0.5, freedom / 2.0, 1.0 - 2.0 * p))
        return math.sqrt(freedom * rest / (1.0 - rest))
    return math.sqrt(freedom * (1.0 - share) / share)


@native("T.INV", "number number")
def t_inv(p: float, freedom: float) -> float:
    """Quantile of Student's t distribution."""
    chance, n = _chance(p, zero=False, one=False), _freedom(freedom)
    return -t_upper_quantile(chance, n) if chance < 0.5 else t_upper_quantile(1.0 - chance, n)


@native("T.INV.2T TINV", "number number")
def t_inv_2t(p: float, freedom: float) -> float:
    """Value from which a t value lies farther from 0 with chance p."""
    return t_upper_quantile(_chance(p, zero=False, one=True) / 2.0, _freedom(freedom))


@native("CONFIDENCE.T", "number number number")
def confidence_t(alpha: float, deviation: float, size: float) -> float:
    """Half width of the confidence interval of a mean, deviation estimated."""
    n = math.trunc(size)
    if not 0.0 < alpha < 1.0 or deviation <= 0.0 or n < 1:
        raise ValueError
    if n == 1:
        raise ZeroDivisionError
    return t_upper_quantile(alpha / 2.0, n - 1.0) * deviation / math.sqrt(n)


@native("F.DIST", "number number number logical")
@guarded
def f_dist(x: float, above: float, below: float, cumulative: bool) -> float:
    """F distribution; degrees of freedom of the numerator and of the denominator."""
    m, n = _freedom(above), _freedom(below)
    if x < 0.0:
        raise ValueError
    if cumulative:
        return beta_below(m * x / (m * x + n), m / 2.0, n / 2.0)
    if x == 0.0:
        if m == 1.0:
            raise ValueError
        return 1.0 if m == 2.0 else 0.0
    scale = math.lgamma((m + n) / 2.0) - math.lgamma(m / 2.0) - math.lgamma(n / 2.0)
    logarithm = m / 2.0 * math.log(m / n) + (m / 2.0 - 1.0) * math.log(x)
    return math.exp(scale + logarithm - (m + n) / 2.0 * math.log1p(m * x / n))


@native("F.DIST.RT FDIST", "number number number")
def f_dist_rt(x: float, above: float, below: float) -> float:
    """Chance of an F value above x."""
    m, n = _freedom(above), _freedom(below)
    if x < 0.0:
        raise ValueError
    return beta_below(n / (n + m * x), n / 2.0, m / 2.0)


@native("F.INV", "number number number")
def f_inv(p: float, above: float, below: float) -> float:
    """Quantile of the F distribution."""
    m, n = _freedom(above), _freedom(below)
    share = beta_quantile(_chance(p, zero=True, one=False), m / 2.0, n / 2.0)
    return n * share / (m * (1.0 - share))


@native("F.INV.RT FINV", "number number number")
def f_inv_rt(p: float, above: float, below: float) -> float:
    """Value above which an F value lies with chance p."""
    m, n = _freedom(above), _freedom(below)
    share = beta_quantile(_chance(p, zero=False, one=True), n / 2.0, m / 2.0)
    return n * (1.0 - share) / (m * share)
