"""Sums and products of lists and of arrays side by side."""

from __future__ import annotations

import math
from collections.abc import Callable
from typing import TYPE_CHECKING

from xleq.cells import VALUE
from xleq.recalc.natives.gather import (
    SMALL,
    check_errors,
    direct_number,
    finite,
    number_pairs,
    number_vector,
    numbers_of,
    ratio,
)
from xleq.recalc.natives.table import native
from xleq.recalc.operands import NUMBER_KIND, Argument, Array, Fail

if TYPE_CHECKING:
    import numpy as np
    from numpy.typing import NDArray


def running_total(total: float, array: Array) -> float:
    """`total` plus the numbers of an array, added from left to right as the spreadsheet does."""
    if array.height * array.width <= SMALL:
        check_errors(array)
        for v in array.flat:
            if type(v) is float:
                total += v
        return total
    import numpy as np

    numbers = number_vector(array)
    if numbers.size == 0:
        return total
    if total == 0.0:
        return float(np.add.accumulate(numbers)[-1])
    return float(np.add.accumulate(np.concatenate(((total,), numbers)))[-1])


@native("SUM", "list*")
def sum_(*arguments: Argument) -> float:
    """Sum."""
    total = 0.0
    for argument in arguments:
        if isinstance(argument, Array):
            total = running_total(total, argument)
        else:
            total += direct_number(argument)
    return finite(total)


@native("PERCENTOF", "array array")
def percentof(part: Array, whole: Array) -> float:
    """Sum of a part over the sum of the whole."""
    return finite(ratio(running_total(0.0, part), running_total(0.0, whole)))


@native("SUMSQ", "list*")
def sumsq(*arguments: Argument) -> float:
    """Sum of squares."""
    return finite(sum(x * x for x in numbers_of(arguments)))


@native("PRODUCT", "list*")
def product(*arguments: Argument) -> float:
    """Product; 0 where there is no number at all."""
    numbers = numbers_of(arguments)
    return finite(math.prod(numbers)) if numbers else 0.0


def _factors(array: Array) -> NDArray[np.float64]:
    import numpy as np

    if array.span == (NUMBER_KIND, NUMBER_KIND):
        return array.numbers
    check_errors(array)
    return np.where(array.kinds == NUMBER_KIND, array.numbers, 0.0)


@native("SUMPRODUCT", "array array*")
def sumproduct(first: Array, *others: Array) -> float:
    """Sum of the products of the elements at one place; what is not a number counts as 0."""
    if any((a.height, a.width) != (first.height, first.width) for a in others):
        raise Fail(VALUE)
    if first.height * first.width <= SMALL:
        for array in (first, *others):
            check_errors(array)
        total = 0.0
        for values in zip(first.flat, *(a.flat for a in others), strict=True):
            term = 1.0
            for v in values:
                term *= v if type(v) is float else 0.0
            total += term
        return finite(total)
    import numpy as np

    products = _factors(first)
    with np.errstate(all="ignore"):
        for array in others:
            products = products * _factors(array)
        return finite(float(products.sum()))


def _pairwise(xs: Array, ys: Array, term: Callable[[float, float], float]) -> float:
    return finite(sum((term(x, y) for x, y in zip(*number_pairs(xs, ys), strict=True)), 0.0))


@native("SUMX2MY2", "array array")
def sumx2my2(xs: Array, ys: Array) -> float:
    """Sum of x² - y²."""
    return _pairwise(xs, ys, lambda x, y: x * x - y * y)


@native("SUMX2PY2", "array array")
def sumx2py2(xs: Array, ys: Array) -> float:
    """Sum of x² + y²."""
    return _pairwise(xs, ys, lambda x, y: x * x + y * y)


@native("SUMXMY2", "array array")
def sumxmy2(xs: Array, ys: Array) -> float:
    """Sum of (x - y)²."""
    return _pairwise(xs, ys, lambda x, y: (x - y) * (x - y))
