"""Places in an ordered list: nth values, ranks, percentiles, frequencies."""

from __future__ import annotations

import math
from bisect import bisect_left

from xleq.cells import DIV0, NA, NUM, VALUE
from xleq.recalc.context import Context
from xleq.recalc.natives.arithmetic.rounding import floor15
from xleq.recalc.natives.gather import SMALL, array_numbers, number_vector, numbers_of, places_in, vector_of
from xleq.recalc.natives.statistics.spread import Numbers
from xleq.recalc.natives.table import native
from xleq.recalc.operands import Argument, Array, Fail, Ref


def nth(numbers: Numbers, k: float, *, largest: bool) -> float:
    """The kth largest or smallest number, k from 1; #NUM! where there is none."""
    place = math.ceil(k)
    if not 1 <= place <= len(numbers):
        raise Fail(NUM)
    if not isinstance(numbers, list):
        return places_in(numbers, [len(numbers) - place if largest else place - 1])[0]
    return sorted(numbers, reverse=largest)[place - 1]


@native("LARGE", "list number")
def large(array: Argument, k: float) -> float:
    """Kth largest number."""
    return nth(vector_of([array]), k, largest=True)


@native("SMALL", "list number")
def small(array: Argument, k: float) -> float:
    """Kth smallest number."""
    return nth(vector_of([array]), k, largest=False)


def _beaten(context: Context, x: float, ref: Ref, order: float) -> tuple[int, int]:
    """How many numbers come before x, and how many equal it."""
    arrays = context.read_areas(ref)
    if len(arrays) == 1 and arrays[0].height * arrays[0].width > SMALL:
        vector = number_vector(arrays[0])
        ties = int((vector == x).sum())
        if not ties:
            raise Fail(NA)
        return int((vector < x if order else vector > x).sum()), ties
    numbers = [n for array in arrays for n in array_numbers(array)]
    ties = numbers.count(x)
    if not ties:
        raise Fail(NA)
    return sum(n < x if order else n > x for n in numbers), ties


@native("RANK RANK.EQ", "number range number?", context=True)
def rank(context: Context, x: float, ref: Ref, order: float = 0.0) -> float:
    """Rank among the numbers of a range, from the largest unless an order is given; ties share the top."""
    return 1.0 + _beaten(context, x, ref, order)[0]


@native("RANK.AVG", "number range number?", context=True)
def rank_avg(context: Context, x: float, ref: Ref, order: float = 0.0) -> float:
    """Rank among the numbers of a range; ties share the mean."""
    before, ties = _beaten(context, x, ref, order)
    return before + (1.0 + ties) / 2.0


def _at(numbers: Numbers, place: float) -> float:
    """Value at a place from 0 of the numbers in order, between neighbours in proportion."""
    below = min(math.floor(place + 1e-13), len(numbers) - 1)
    above = min(below + 1, len(numbers) - 1)
    if isinstance(numbers, list):
        ordered = sorted(numbers)
        low, high = ordered[below], ordered[above]
    else:
        low, high = places_in(numbers, [below, above])
    return low + max(place - below, 0.0) * (high - low)


def percentile_of(numbers: Numbers, share: float) -> float:
    """Value below which a share of the numbers lies, ends included; #NUM! for none."""
    if len(numbers) == 0 or not 0.0 <= share <= 1.0:
        raise Fail(NUM)
    return _at(numbers, share * (len(numbers) - 1))


def percentile_exc_of(numbers: Numbers, share: float) -> float:
    """Value below which a share of the numbers lies, ends excluded; #NUM! where that is outside them."""
    place = share * (len(numbers) + 1)
    if not 0.0 < share < 1.0 or not 1.0 - 1e-12 <= place <= len(numbers) + 1e-12:
        raise Fail(NUM)
    return _at(numbers, max(place - 1.0, 0.0))


@native("PERCENTILE PERCENTILE.INC", "list number")
def percentile(array: Argument, share: float) -> float:
    """Percentile, share from 0 to 1."""
    return percentile_of(vector_of([array]), share)


@native("PERCENTILE.EXC", "list number")
def percentile_exc(array: Argument, share: float) -> float:
    """Percentile, share between 0 and 1."""
    return percentile_exc_of(vector_of([array]), share)


@native("QUARTILE QUARTILE.INC", "list number")
def quartile(array: Argument, quarter: float) -> float:
    """Quartile 0 to 4."""
    return percentile_of(vector_of([array]), math.trunc(quarter) / 4.0)


@native("QUARTILE.EXC", "list number")
def quartile_exc(array: Argument, quarter: float) -> float:
    """Quartile 1 to 3."""
    return percentile_exc_of(vector_of([array]), math.trunc(quarter) / 4.0)


def _place_of(ordered: list[float], x: float) -> float:
    """Place of x from 0 among ordered numbers, between neighbours in proportion."""
    if not ordered:
        raise Fail(NUM)
    if not ordered[0] <= x <= ordered[-1]:
        raise Fail(NA)
    at = bisect_left(ordered, x)
    if ordered[at] == x:
        return float(at)
    return at - 1 + (x - ordered[at - 1]) / (ordered[at] - ordered[at - 1])


def _cut(share: float, digits: float) -> float:
    places = math.trunc(digits)
    if places < 1:
        raise Fail(NUM)
    scale = 10.0 ** min(places, 15)
    return floor15(share * scale) / scale


@native("PERCENTRANK PERCENTRANK.INC", "list number number~")
def percentrank(array: Argument, x: float, digits: float = 3.0) -> float:
    """Share of the numbers below x, ends included, cut to some digits."""
    ordered = sorted(numbers_of([array]))
    place = _place_of(ordered, x)
    return _cut(1.0 if len(ordered) == 1 else place / (len(ordered) - 1), digits)


@native("PERCENTRANK.EXC", "list number number~")
def percentrank_exc(array: Argument, x: float, digits: float = 3.0) -> float:
    """Share of the numbers below x, ends excluded, cut to some digits."""
    ordered = sorted(numbers_of([array]))
    return _cut((_place_of(ordered, x) + 1.0) / (len(ordered) + 1), digits)


@native("FREQUENCY", "list list")
def frequency(data: Argument, bins: Argument) -> Array:
    """How many numbers fall at or below each bin and above the next lower one; the last above all bins."""
    limits = numbers_of([bins])
    numbers = numbers_of([data])
    if not limits:
        return Array.column([float(len(numbers)), 0.0])
    counts = [0.0] * (len(limits) + 1)
    order = sorted(range(len(limits)), key=lambda i: (limits[i], i))
    ordered = [limits[i] for i in order]
    places = [*order, len(limits)]
    for x in numbers:
        counts[places[bisect_left(ordered, x)]] += 1.0
    return Array.column(counts)


@native("PROB", "array array number number?")
def prob(values: Array, chances: Array, low: float, high: float | None = None) -> float:
    """Chance that a value lies between limits, or equals one."""
    if values.height * values.width != chances.height * chances.width:
        raise Fail(NA)
    xs, ps = array_numbers(values), array_numbers(chances)
    if not xs or not ps:
        raise Fail(DIV0)
    if len(xs) != len(ps):
        raise Fail(VALUE)
    if any(not 0.0 < p <= 1.0 for p in ps) or abs(sum(ps) - 1.0) > 1e-9:
        raise Fail(NUM)
    upper = low if high is None else high
    return sum((p for x, p in zip(xs, ps, strict=True) if low <= x <= upper), 0.0)
