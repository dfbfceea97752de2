"""Counts, averages and extremes of lists."""

from __future__ import annotations

import math

from xleq.cells import BLANK, NA, NUM
from xleq.recalc.natives.arithmetic.sums import running_total
from xleq.recalc.natives.gather import (
    SMALL,
    array_numbers,
    direct_number,
    finite,
    number_vector,
    numbers_of,
    numbers_of_a,
    places_in,
    ratio,
    vector_of,
)
from xleq.recalc.natives.statistics.spread import Numbers
from xleq.recalc.natives.table import native
from xleq.recalc.operands import BLANK_KIND, NUMBER_KIND, Argument, Array, Fail
from xleq.recalc.texts import parse_number


def count_numbers(array: Array) -> int:
    """How many numbers an array holds."""
    if array.height * array.width <= SMALL:
        return sum(type(v) is float for v in array.flat)
    return int((array.kinds == NUMBER_KIND).sum())


def count_values(array: Array) -> int:
    """How many elements of an array are not blank."""
    if array.height * array.width <= SMALL:
        return sum(v is not BLANK for v in array.flat)
    return int((array.kinds != BLANK_KIND).sum())


@native("COUNT", "list*")
def count(*arguments: Argument) -> float:
    """How many numbers; errors and other values don't count."""
    total = 0
    for a in arguments:
        if isinstance(a, Array):
            total += count_numbers(a)
        elif isinstance(a, str):
            total += parse_number(a) is not None
        else:
            total += type(a) in (float, bool) or not a
    return float(total)


@native("COUNTA", "list*")
def counta(*arguments: Argument) -> float:
    """How many values; empty text and errors count, blanks don't."""
    return float(sum(count_values(a) if isinstance(a, Array) else 1 for a in arguments))


@native("AVERAGE", "list*")
def average(*arguments: Argument) -> float:
    """Arithmetic mean."""
    total, number = 0.0, 0
    for a in arguments:
        if isinstance(a, Array):
            total = running_total(total, a)
            number += count_numbers(a)
        else:
            total += direct_number(a)
            number += 1
    return finite(ratio(total, float(number)))


@native("AVERAGEA", "list*")
def averagea(*arguments: Argument) -> float:
    """Arithmetic mean, text as 0 and logicals as 0 and 1."""
    numbers = numbers_of_a(arguments)
    return finite(ratio(sum(numbers), float(len(numbers))))


@native("MAX", "list*")
def max_(*arguments: Argument) -> float:
    """Largest number; 0 where there is none."""
    best = -math.inf
    for a in arguments:
        if not isinstance(a, Array):
            best = max(best, direct_number(a))
        elif a.height * a.width <= SMALL:
            best = max(best, max(array_numbers(a), default=best))
        elif (numbers := number_vector(a)).size:
            best = max(best, float(numbers.max()))
    return 0.0 if best == -math.inf else best


@native("MIN", "list*")
def min_(*arguments: Argument) -> float:
    """Smallest number; 0 where there is none."""
    best = math.inf
    for a in arguments:
        if not isinstance(a, Array):
            best = min(best, direct_number(a))
        elif a.height * a.width <= SMALL:
            best = min(best, min(array_numbers(a), default=best))
        elif (numbers := number_vector(a)).size:
            best = min(best, float(numbers.min()))
    return 0.0 if best == math.inf else best


@native("MAXA", "list*")
def maxa(*arguments: Argument) -> float:
    """Largest value, text as 0 and logicals as 0 and 1."""
    return max(numbers_of_a(arguments), default=0.0)


@native("MINA", "list*")
def mina(*arguments: Argument) -> float:
    """Smallest value, text as 0 and logicals as 0 and 1."""
    return min(numbers_of_a(arguments), default=0.0)


def median_of(numbers: Numbers) -> float:
    """Middle of the sorted numbers; #NUM! for none."""
    if len(numbers) == 0:
        raise Fail(NUM)
    half = len(numbers) // 2
    if not isinstance(numbers, list):
        low, high = places_in(numbers, [(len(numbers) - 1) // 2, half])
        return (low + high) / 2.0
    ordered = sorted(numbers)
    return ordered[half] if len(numbers) % 2 else (ordered[half - 1] + ordered[half]) / 2.0


@native("MEDIAN", "list*")
def median(*arguments: Argument) -> float:
    """Median."""
    return median_of(vector_of(arguments))


def modes_of(numbers: list[float]) -> list[float]:
    """The most frequent numbers in the order of first appearance; #N/A where none appears twice."""
    counts: dict[float, int] = {}
    for x in numbers:
        counts[x] = counts.get(x, 0) + 1
    most = max(counts.values(), default=1)
    if most < 2:
        raise Fail(NA)
    return [x for x, n in counts.items() if n == most]


@native("MODE MODE.SNGL", "array array*")
def mode(*arguments: Argument) -> float:
    """Most frequent number."""
    return modes_of(numbers_of(arguments))[0]


@native("MODE.MULT", "array array*")
def mode_mult(*arguments: Argument) -> Array:
    """The most frequent numbers, as a column."""
    return Array.column(modes_of(numbers_of(arguments)))


def _positive(arguments: tuple[Argument, ...]) -> list[float]:
    numbers = numbers_of(arguments)
    if not numbers or min(numbers) <= 0.0:
        raise Fail(NUM)
    return numbers


@native("GEOMEAN", "list list*")
def geomean(*arguments: Argument) -> float:
    """Geometric mean."""
    numbers = _positive(arguments)
    return math.exp(math.fsum(map(math.log, numbers)) / len(numbers))


@native("HARMEAN", "list list*")
def harmean(*arguments: Argument) -> float:
    """Harmonic mean."""
    numbers = _positive(arguments)
    return len(numbers) / sum(1.0 / x for x in numbers)


@native("TRIMMEAN", "list number")
def trimmean(array: Argument, share: float) -> float:
    """Mean without a share of the numbers, half of it at either end.

    Examples
    --------
    >>> trimmean(Array.row([4.0, 5.0, 6.0, 7.0, 2.0, 3.0, 4.0, 5.0, 1.0, 2.0, 3.0]), 0.2)
    3.7777777777777777
    """
    numbers = sorted(numbers_of([array]))
    if not 0.0 <= share < 1.0 or not numbers:
        raise Fail(NUM)
    cut = math.floor(len(numbers) * share / 2.0 + 1e-12)
    kept = numbers[cut : len(numbers) - cut]
    return sum(kept) / len(kept)
