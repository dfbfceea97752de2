"""Discrete distributions: binomial, Poisson, hypergeometric."""

from __future__ import annotations

import math

from xleq.recalc.natives.arithmetic.counting import combinations
from xleq.recalc.natives.gather import guarded
from xleq.recalc.natives.statistics.continuous import beta_below, gamma_above
from xleq.recalc.natives.table import native

#: Beyond it too few digits would be left.
_MOST_TRIALS = 2**31 - 1


def _share(p: float) -> float:
    if not 0.0 <= p <= 1.0:
        raise ValueError
    return p


def binomial(k: int, n: int, p: float) -> float:
    """Chance of k successes in n trials."""
    if p in (0.0, 1.0):
        return float(k == n * p)
    if n < 1000:
        return math.comb(n, k) * p**k * (1.0 - p) ** (n - k)
    ways = math.lgamma(n + 1) - math.lgamma(k + 1) - math.lgamma(n - k + 1)
    return math.exp(ways + k * math.log(p) + (n - k) * math.log1p(-p))


def binomial_up_to(k: int, n: int, p: float) -> float:
    """Chance of at most k successes in n trials."""
    if k >= n:
        return 1.0
    if k < 0:
        return 0.0
    if n <= 60:
        return math.fsum(binomial(i, n, p) for i in range(k + 1))
    return beta_below(1.0 - p, n - k, k + 1.0)


@native("BINOM.DIST BINOMDIST", "number number number logical")
@guarded
def binom_dist(successes: float, trials: float, p: float, cumulative: bool) -> float:
    """Binomial distribution."""
    k, n = math.trunc(successes), math.trunc(trials)
    if not 0 <= k <= n <= _MOST_TRIALS:
        raise ValueError
    return binomial_up_to(k, n, _share(p)) if cumulative else binomial(k, n, _share(p))


@native("BINOM.DIST.RANGE", "number number number number?")
def binom_dist_range(trials: float, p: float, low: float, high: float | None = None) -> float:
    """Chance of a number of successes, or of one between two numbers."""
    n, first = math.trunc(trials), math.trunc(low)
    last = first if high is None else math.trunc(high)
    if not 0 <= first <= last <= n <= _MOST_TRIALS:
        raise ValueError
    if last - first <= 60:
        return math.fsum(binomial(k, n, _share(p)) for k in range(first, last + 1))
    return binomial_up_to(last, n, _share(p)) - binomial_up_to(first - 1, n, _share(p))


@native("BINOM.INV CRITBINOM", "number number number")
def binom_inv(trials: float, p: float, alpha: float) -> float:
    """Smallest number of successes whose cumulative chance reaches alpha."""
    n = math.trunc(trials)
    if not 0 <= n <= _MOST_TRIALS or not 0.0 < alpha < 1.0 or not 0.0 < p < 1.0:
        raise ValueError
    low, high = 0, n
    while low < high:
        middle = (low + high) // 2
        if binomial_up_to(middle, n, p) >= alpha:
            high = middle
        else:
            low = middle + 1
    return float(low)


@native("NEGBINOM.DIST", "number number number logical")
@guarded
def negbinom_dist(failures: float, successes: float, p: float, cumulative: bool) -> float:
    """Chance of a number of failures before a number of successes."""
    k, r = math.trunc(failures), math.trunc(successes)
    if k < 0 or r < 1 or not 0.0 < p < 1.0:
        raise ValueError
    chance = p
    if cumulative:
        return beta_below(chance, float(r), k + 1.0)
    if k + r < 1000:
        return combinations(k + r - 1, k) * chance**r * (1.0 - chance) ** k
    ways = math.lgamma(k + r) - math.lgamma(k + 1) - math.lgamma(r)
    return math.exp(ways + r * math.log(chance) + k * math.log1p(-chance))


@native("NEGBINOMDIST", "number number number")
def negbinomdist(failures: float, successes: float, p: float) -> float:
    """Chance of a number of failures before a number of successes."""
    return negbinom_dist(failures, successes, p, False)


@native("POISSON POISSON.DIST", "number number logical")
@guarded
def poisson(events: float, mean: float, cumulative: bool) -> float:
    """Poisson distribution."""
    k = math.trunc(events)
    if k < 0 or mean < 0.0:
        raise ValueError
    if cumulative:
        return gamma_above(mean, k + 1.0)
    if mean == 0.0:
        return float(k == 0)
    return math.exp(k * math.log(mean) - mean - math.lgamma(k + 1))


def _hypergeometric(k: int, sample: int, successes: int, population: int) -> float:
    if not max(0, sample - population + successes) <= k <= min(sample, successes):
        return 0.0
    if population <= 2000:
        ways = math.comb(successes, k) * math.comb(population - successes, sample - k)
        return ways / math.comb(population, sample)

    def log_ways(n: int, m: int) -> float:
        return math.lgamma(n + 1) - math.lgamma(m + 1) - math.lgamma(n - m + 1)

    return math.exp(
        log_ways(successes, k) + log_ways(population - successes, sample - k) - log_ways(population, sample)
    )


@native("HYPGEOM.DIST", "number number number number logical")
@guarded
def hypgeom_dist(k: float, sample: float, successes: float, population: float, cumulative: bool) -> float:
    """Hypergeometric distribution."""
    found, drawn = math.trunc(k), math.trunc(sample)
    good, all_ = math.trunc(successes), math.trunc(population)
    if all_ <= 0 or not 0 < drawn <= all_ or not 0 < good <= all_:
        raise ValueError
    if not max(0, drawn - all_ + good) <= found <= min(drawn, good):
        raise ValueError
    if cumulative:
        return math.fsum(_hypergeometric(i, drawn, good, all_) for i in range(found + 1))
    return _hypergeometric(found, drawn, good, all_)


@native("HYPGEOMDIST", "number number number number")
def hypgeomdist(k: float, sample: float, successes: float, population: float) -> float:
    """Hypergeometric distribution, a single number of successes."""
    return hypgeom_dist(k, sample, successes, population, False)
