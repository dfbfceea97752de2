"""Deviations, variances and moments of lists."""

from __future__ import annotations

import math
from typing import TYPE_CHECKING, TypeAlias

from xleq.cells import DIV0, NUM
from xleq.recalc.natives.gather import finite, guarded, numbers_of, numbers_of_a, ratio, vector_of
from xleq.recalc.natives.table import native
from xleq.recalc.operands import Argument, Fail

if TYPE_CHECKING:
    import numpy as np
    from numpy.typing import NDArray


Numbers: TypeAlias = "list[float] | NDArray[np.float64]"


def squares_about_mean(numbers: Numbers) -> float:
    """Sum of the squared deviations from the mean; there is at least one number."""
    if not isinstance(numbers, list):
        deviations = numbers - numbers.sum() / len(numbers)
        return float((deviations * deviations).sum())
    mean = sum(numbers) / len(numbers)
    return sum((x - mean) * (x - mean) for x in numbers)


def variance(numbers: Numbers, freedom: int) -> float:
    """Squared deviations over n - freedom; #DIV/0! where that is not positive."""
    if len(numbers) <= freedom:
        raise Fail(DIV0)
    return finite(squares_about_mean(numbers) / (len(numbers) - freedom))


@native("VAR VAR.S", "list list*")
@guarded
def var(*arguments: Argument) -> float:
    """Variance of a sample."""
    return variance(vector_of(arguments), 1)


@native("VARP VAR.P", "list list*")
@guarded
def varp(*arguments: Argument) -> float:
    """Variance of a population."""
    return variance(vector_of(arguments), 0)


@native("VARA", "list list*")
@guarded
def vara(*arguments: Argument) -> float:
    """Variance of a sample, text as 0 and logicals as 0 and 1."""
    return variance(numbers_of_a(arguments), 1)


@native("VARPA", "list list*")
@guarded
def varpa(*arguments: Argument) -> float:
    """Variance of a population, text as 0 and logicals as 0 and 1."""
    return variance(numbers_of_a(arguments), 0)


@native("STDEV STDEV.S", "list list*")
@guarded
def stdev(*arguments: Argument) -> float:
    """Standard deviation of a sample."""
    return math.sqrt(variance(vector_of(arguments), 1))


@native("STDEVP STDEV.P", "list list*")
@guarded
def stdevp(*arguments: Argument) -> float:
    """Standard deviation of a population."""
    return math.sqrt(variance(vector_of(arguments), 0))


@native("STDEVA", "list list*")
@guarded
def stdeva(*arguments: Argument) -> float:
    """Standard deviation of a sample, text as 0 and logicals as 0 and 1."""
    return math.sqrt(variance(numbers_of_a(arguments), 1))


@native("STDEVPA", "list list*")
@guarded
def stdevpa(*arguments: Argument) -> float:
    """Standard deviation of a population, text as 0 and logicals as 0 and 1."""
    return math.sqrt(variance(numbers_of_a(arguments), 0))


@native("DEVSQ", "list list*")
@guarded
def devsq(*arguments: Argument) -> float:
    """Sum of squared deviations from the mean."""
    numbers = numbers_of(arguments)
    if not numbers:
        raise Fail(NUM)
    return finite(squares_about_mean(numbers))


@native("AVEDEV", "list list*")
@guarded
def avedev(*arguments: Argument) -> float:
    """Mean absolute deviation from the mean."""
    numbers = numbers_of(arguments)
    if not numbers:
        raise Fail(NUM)
    mean = sum(numbers) / len(numbers)
    return sum(abs(x - mean) for x in numbers) / len(numbers)


def _standard_moment(numbers: list[float], power: int, freedom: int) -> float:
    mean = sum(numbers) / len(numbers)
    deviation = math.sqrt(variance(numbers, freedom))
    return sum(ratio(x - mean, deviation) ** power for x in numbers)


@native("SKEW", "list list*")
@guarded
def skew(*arguments: Argument) -> float:
    """Skewness of a sample."""
    numbers = numbers_of(arguments)
    n = len(numbers)
    if n < 3:
        raise Fail(DIV0)
    return _standard_moment(numbers, 3, 1) * n / ((n - 1.0) * (n - 2.0))


@native("SKEW.P", "list list*")
@guarded
def skew_p(*arguments: Argument) -> float:
    """Skewness of a population."""
    numbers = numbers_of(arguments)
    if len(numbers) < 3:
        raise Fail(DIV0)
    return _standard_moment(numbers, 3, 0) / len(numbers)


@native("KURT", "list list*")
@guarded
def kurt(*arguments: Argument) -> float:
    """Excess kurtosis of a sample."""
    numbers = numbers_of(arguments)
    n = len(numbers)
    if n < 4:
        raise Fail(DIV0)
    scale = n * (n + 1.0) / ((n - 1.0) * (n - 2.0) * (n - 3.0))
    return scale * _standard_moment(numbers, 4, 1) - 3.0 * (n - 1.0) ** 2 / ((n - 2.0) * (n - 3.0))


@native("STANDARDIZE", "number number number")
def standardize(x: float, mean: float, deviation: float) -> float:
    """Distance from the mean in standard deviations."""
    if deviation <= 0.0:
        raise ValueError
    return (x - mean) / deviation
