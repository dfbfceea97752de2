"""Factorials, combinations, divisors."""

from __future__ import annotations

import math

from xleq.recalc.natives.gather import guarded
from xleq.recalc.natives.table import native
from xleq.recalc.natives.tools import tool, tool_numbers
from xleq.recalc.operands import Argument

_LARGEST_WHOLE = 2.0**53


def _whole(x: float) -> int:
    whole = math.trunc(x)
    if whole < 0:
        raise ValueError
    return whole


def product_from(low: int, high: int) -> float:
    """low·(low+1)·…·high, exact as long as it fits.

    Raises
    ------
    OverflowError
        If it exceeds a double.
    """
    product = 1
    for i in range(low, high + 1):
        product *= i
        if product.bit_length() > 1024:
            raise OverflowError
    return float(product)


def combinations(n: int, k: int) -> float:
    """Ways to choose k of n; a double even where the exact number has thousands of digits.

    Raises
    ------
    ValueError
        If k is more than n.
    OverflowError
        If it exceeds a double.
    """
    if k > n or k < 0:
        raise ValueError
    k = min(k, n - k)
    if k > 2000:
        return math.exp(math.lgamma(n + 1) - math.lgamma(k + 1) - math.lgamma(n - k + 1))
    return float(math.comb(n, k))


@native("FACT", "number")
def fact(x: float) -> float:
    """Factorial."""
    n = _whole(x)
    if n > 170:
        raise ValueError
    return float(math.factorial(n))


@tool("FACTDOUBLE", "number")
def factdouble(x: float) -> float:
    """Product of every second whole number down to 1 or 2.

    Examples
    --------
    >>> factdouble(6.0), factdouble(7.0), factdouble(-1.0)
    (48.0, 105.0, 1.0)
    """
    n = math.trunc(x)
    if n < -1 or n > 300:
        raise ValueError
    return float(math.prod(range(n, 0, -2)))


@native("COMBIN", "number number")
def combin(n: float, k: float) -> float:
    """Combinations without repetition."""
    return combinations(_whole(n), _whole(k))


@native("COMBINA", "number number")
def combina(n: float, k: float) -> float:
    """Combinations with repetition."""
    kinds, chosen = _whole(n), _whole(k)
    if chosen == 0:
        return 1.0
    return combinations(kinds + chosen - 1, chosen) if kinds else 0.0


@native("PERMUT", "number number")
def permut(n: float, k: float) -> float:
    """Permutations without repetition."""
    total, chosen = _whole(n), _whole(k)
    if chosen > total:
        raise ValueError
    return product_from(total - chosen + 1, total)


@native("PERMUTATIONA", "number number")
def permutationa(n: float, k: float) -> float:
    """Permutations with repetition."""
    return float(_whole(n)) ** _whole(k)


def _whole_list(arguments: tuple[Argument, ...]) -> list[int]:
    values = tool_numbers(arguments)
    if any(not 0.0 <= v < _LARGEST_WHOLE for v in values):
        raise ValueError
    return [int(v) for v in values]


@native("GCD", "list*")
@guarded
def gcd(*arguments: Argument) -> float:
    """Greatest common divisor."""
    return float(math.gcd(*_whole_list(arguments)))


@native("LCM", "list*")
@guarded
def lcm(*arguments: Argument) -> float:
    """Least common multiple."""
    multiple = math.lcm(*_whole_list(arguments))
    if multiple >= _LARGEST_WHOLE:
        raise ValueError
    return float(multiple)


@native("MULTINOMIAL", "list*")
@guarded
def multinomial(*arguments: Argument) -> float:
    """Factorial of the sum over the product of the factorials."""
    total, ways = 0, 1
    for k in _whole_list(arguments):
        total += k
        if total > 10_000:
            raise ValueError
        ways *= math.comb(total, k)
    return float(ways)
