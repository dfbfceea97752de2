"""Tests of hypotheses: chances that differences are accidental."""

from __future__ import annotations

import math

from xleq.cells import DIV0, NA, NUM
from xleq.recalc.natives.gather import array_numbers, guarded, number_pairs, numbers_of, ratio
from xleq.recalc.natives.statistics.continuous import f_dist, f_dist_rt, gamma_above, t_above
from xleq.recalc.natives.statistics.normal import normal_below
from xleq.recalc.natives.statistics.spread import variance
from xleq.recalc.natives.table import native
from xleq.recalc.operands import Argument, Array, Fail


def _paired(xs: Array, ys: Array) -> tuple[float, float]:
    x, y = number_pairs(xs, ys)
    differences = [a - b for a, b in zip(x, y, strict=True)]
    spread = variance(differences, 1)
    n = len(differences)
    return ratio(abs(sum(differences) / n), math.sqrt(spread / n)), n - 1.0


def _unpaired(xs: Array, ys: Array, *, same: bool) -> tuple[float, float]:
    x, y = array_numbers(xs), array_numbers(ys)
    n, m = len(x), len(y)
    var_x, var_y = variance(x, 1), variance(y, 1)
    difference = abs(sum(x) / n - sum(y) / m)
    if same:
        pooled = ((n - 1) * var_x + (m - 1) * var_y) / (n + m - 2)
        return ratio(difference, math.sqrt(pooled * (1 / n + 1 / m))), n + m - 2.0
    part_x, part_y = var_x / n, var_y / m
    freedom = ratio((part_x + part_y) ** 2, part_x**2 / (n - 1) + part_y**2 / (m - 1))
    return ratio(difference, math.sqrt(part_x + part_y)), freedom


@native("T.TEST TTEST", "array array number number")
@guarded
def t_test(xs: Array, ys: Array, tails: float, form: float) -> float:
    """Student's t test: 1 paired, 2 of one variance, 3 of two variances."""
    sides, kind = math.trunc(tails), math.trunc(form)
    if sides not in (1, 2) or kind not in (1, 2, 3):
        raise Fail(NUM)
    if kind == 1 and xs.height * xs.width != ys.height * ys.width:
        raise Fail(NA)
    t, freedom = _paired(xs, ys) if kind == 1 else _unpaired(xs, ys, same=kind == 2)
    return sides * t_above(t, freedom)


@native("F.TEST FTEST", "array array")
@guarded
def f_test(xs: Array, ys: Array) -> float:
    """Two-tailed chance that two variances differ by accident."""
    x, y = array_numbers(xs), array_numbers(ys)
    f = ratio(variance(x, 1), variance(y, 1))
    if f == 0.0:
        raise Fail(DIV0)
    above = f_dist_rt(f, len(x) - 1.0, len(y) - 1.0)
    return 2.0 * min(above, f_dist(f, len(x) - 1.0, len(y) - 1.0, True))


@native("CHISQ.TEST CHITEST", "array array")
@guarded
def chisq_test(actual: Array, expected: Array) -> float:
    """Chance of differences at least as large as between counts and expectations."""
    height, width = actual.height, actual.width
    if (height, width) != (expected.height, expected.width) or height * width == 1:
        raise Fail(NA)
    found, wanted = number_pairs(actual, expected)
    if any(e < 0.0 for e in wanted):
        raise Fail(NUM)
    total = sum(ratio((a - e) ** 2, e) for a, e in zip(found, wanted, strict=True))
    freedom = (height - 1) * (width - 1) if min(height, width) > 1 else max(height, width) - 1
    return gamma_above(total / 2.0, freedom / 2.0)


@native("Z.TEST ZTEST", "list number number?")
@guarded
def z_test(array: Argument, x: float, deviation: float | None = None) -> float:
    """Chance of a mean above that of the numbers where the true mean is x."""
    numbers = numbers_of([array])
    if not numbers:
        raise Fail(NA)
    if deviation is not None and deviation <= 0.0:
        raise Fail(NUM)
    spread = math.sqrt(variance(numbers, 1)) if deviation is None else deviation
    mean = sum(numbers) / len(numbers)
    return normal_below(-ratio(mean - x, spread / math.sqrt(len(numbers))))
