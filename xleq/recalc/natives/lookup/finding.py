"""Where a value stands in a list: exactly, by wildcards, as the nearest one, or by bisection.

Positions count from 0. Bisection takes its steps as the spreadsheet does, so that lists which are not sorted
give the same answer; only values of the kind that is looked for take part.
"""

from __future__ import annotations

import re
from collections.abc import Callable, Iterable, Sequence
from typing import Final

from xleq.cells import BLANK, VALUE, CellError, Value
from xleq.recalc.coerce import compare
from xleq.recalc.operands import (
    BLANK_KIND,
    ERROR_KIND,
    LOGICAL_KIND,
    NUMBER_KIND,
    TEXT_KIND,
    Array,
    Fail,
    lookup_key,
)
from xleq.recalc.patterns import has_wildcard, wildcard_pattern

_KIND: Final[dict[type, int]] = {float: NUMBER_KIND, str: TEXT_KIND, bool: LOGICAL_KIND}
#: Longest text that can be looked for.
_LONGEST: Final = 255
#: So many equal values in a row are walked one by one.
_NEIGHBOURS: Final = 32


def kind_of(value: Value) -> int:
    """Kind of a value that is neither blank nor an error."""
    return _KIND[type(value)]


def exact(values: Array, wanted: Value, wildcards: bool) -> int | None:
    """First position of a value, text without case."""
    if isinstance(wanted, str) and wildcards and has_wildcard(wanted):
        return _matching(values, wildcard_pattern(wanted), range(len(values.flat)))
    return values.index().get(lookup_key(wanted))


def last_exact(values: Array, wanted: Value, wildcards: bool) -> int | None:
    """Last position of a value, text without case."""
    flat = values.flat
    backwards = range(len(flat) - 1, -1, -1)
    if isinstance(wanted, str) and wildcards and has_wildcard(wanted):
        return _matching(values, wildcard_pattern(wanted), backwards)
    key = lookup_key(wanted)
    if key not in values.index():
        return None
    return next(i for i in backwards if lookup_key(flat[i]) == key)


def matching(values: Array, pattern: re.Pattern[str], backwards: bool) -> int | None:
    """First, or last, position of a text in which a regular expression is found."""
    places = range(len(values.flat))
    return _matching(values, pattern, reversed(places) if backwards else places, pattern.search)


def _matching(
    values: Array,
    pattern: re.Pattern[str],
    places: Iterable[int],
    test: Callable[[str], object] | None = None,
) -> int | None:
    flat = values.flat
    test = test or pattern.fullmatch
    for i in places:
        v = flat[i]
        if type(v) is str and test(v):
            return i
    return None


def check_length(wanted: Value) -> None:
    """Ends the call if a text is too long to be looked for."""
    if isinstance(wanted, str) and len(wanted) > _LONGEST:
        raise Fail(CellError("#VALUE!", f"text of more than {_LONGEST} characters cannot be looked up"))


def last_at_most(values: Array, wanted: Value) -> int | None:
    """By bisection in ascending order: the last value that is not above the wanted one."""
    places, run = values.run(kind_of(wanted))
    at = _bisected(run, wanted, descending=False)
    return places[at] if at >= 0 else None


def last_at_least(values: Array, wanted: Value) -> int | None:
    """By bisection in descending order: the last value that is not below the wanted one."""
    places, run = values.run(kind_of(wanted))
    at = _bisected(run, wanted, descending=True)
    return places[at] if at >= 0 else None


def _bisected(run: Sequence[Value], wanted: Value, descending: bool) -> int:
    """Position in a run of one kind; −1 before the first.

    An equal value ends the bisection, and the last of the equal ones beside it is taken.
    """
    low, high = -1, len(run)
    numbers = type(wanted) is float
    while high - low > 1:
        middle = (low + high) // 2
        value = run[middle]
        order = (value > wanted) - (value < wanted) if numbers else compare(value, wanted)  # type: ignore[operator]
        if order == 0:
            equal = middle + 1
            while equal < len(run) and equal - middle < _NEIGHBOURS and compare(run[equal], wanted) == 0:
                equal += 1
            if equal - middle < _NEIGHBOURS:
                return equal - 1
            low = equal - 1  # many of them: bisect on for the last one
        elif (order < 0) != descending:
            low = middle
        else:
            high = middle
    return low


def nearest(values: Array, wanted: Value, larger: bool, backwards: bool) -> int | None:
    """Position of the wanted value or, if there is none, of the next smaller or the next larger one.

    Numbers come before texts before logicals; blanks and errors don't take part.
    """
    flat = values.flat
    if isinstance(wanted, float) and not larger and not backwards and _all_numbers(values):
        return _next_smaller_number(values, wanted)
    best: int | None = None
    for i in range(len(flat) - 1, -1, -1) if backwards else range(len(flat)):
        v = flat[i]
        if v is BLANK or isinstance(v, CellError):
            continue
        order = compare(v, wanted)
        if order == 0:
            return i
        if (order > 0) == larger and (best is None or compare(v, flat[best]) == (-1 if larger else 1)):
            best = i
    return best


def _all_numbers(values: Array) -> bool:
    return bool((values.kinds == NUMBER_KIND).all())


def _next_smaller_number(values: Array, wanted: float) -> int | None:
    import numpy as np

    numbers = values.numbers.ravel()
    below = np.where(numbers <= wanted, numbers, -np.inf)
    at = int(below.argmax())
    return at if numbers[at] <= wanted else None


def sorted_position(values: Array, wanted: Value, nearer: int, descending: bool) -> int | None:
    """By bisection over all kinds: the value, or the next smaller (−1) or next larger (1) one.

    Blanks count as after everything; errors don't take part.
    """
    flat = values.flat
    if wanted is BLANK:
        return next((i for i, v in enumerate(flat) if v is BLANK), None)
    kinds = values.kinds.ravel()
    places = [int(i) for i in ((kinds != BLANK_KIND) & (kinds != ERROR_KIND)).nonzero()[0]]
    if descending:
        places.reverse()
    low, high = -1, len(places)
    while high - low > 1:
        middle = (low + high) // 2
        if compare(flat[places[middle]], wanted) < 0:
            low = middle
        else:
            high = middle
    if high < len(places) and compare(flat[places[high]], wanted) == 0:
        return places[high]
    if nearer == 0:
        return None
    at = low if nearer < 0 else high
    return places[at] if 0 <= at < len(places) else None


def checked_modes(match_mode: float, search_mode: float) -> tuple[int, int]:
    """Match and search mode of XLOOKUP and XMATCH; #VALUE! if they are none or don't go together."""
    match, search = int(match_mode), int(search_mode)
    if match not in (-1, 0, 1, 2, 3) or search not in (1, -1, 2, -2) or (match >= 2 and abs(search) == 2):
        raise Fail(VALUE)
    return match, search
