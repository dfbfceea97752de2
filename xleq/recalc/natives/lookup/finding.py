"""Where a value stands in a list: exactly, by wildcards, as the nearest one, or by bisection.

Positions count from 0. Bisection takes its steps as the spreadsheet does, so that lists which are not sorted
give the same answer; only values of the kind that is looked for take part.
"""

from __future__ import annotations

import re
from bisect import bisect_left, bisect_right
from collections.abc import Callable, Sequence
from typing import TYPE_CHECKING, Any, Final

from xleq.cells import BLANK, VALUE, CellError, Value
from xleq.recalc.coerce import collation_key, compare, near
from xleq.recalc.operands import (
    LOGICAL_KIND,
    NUMBER_KIND,
    TEXT_KIND,
    Array,
    Fail,
    lookup_key,
)
from xleq.recalc.patterns import has_wildcard, line_pattern, wildcard_pattern
from xleq.recalc.sheets.columns import View

if TYPE_CHECKING:
    import numpy as np
    from numpy.typing import NDArray

_KIND: Final[dict[type, int]] = {float: NUMBER_KIND, str: TEXT_KIND, bool: LOGICAL_KIND}
#: Longest text that can be looked for.
_LONGEST: Final = 255
#: So many equal values in a row are walked one by one.
_NEIGHBOURS: Final = 8
#: Lists up to this length get an index at once.
_SHORT: Final = 32

#: A list that is asked so few times is searched without an index.
_FEW_TIMES: Final = 2

#: Positions of values, and the values or keys at them.
Run = tuple[Sequence[int], "Sequence[Value] | NDArray[np.float64]"]
Keyed = tuple[list[int], list[tuple[int, Any]]]


def _run(values: Array, wanted: Value) -> Run:
    """Positions and values of the kind of the wanted one."""
    kind = _KIND[type(wanted)]

    def make(array: Array) -> Run:
        of_kind = array.kinds.ravel() == kind
        if of_kind.all():
            return range(of_kind.size), array.numbers.ravel() if kind == NUMBER_KIND else array.flat
        places: list[int] = of_kind.nonzero()[0].tolist()
        return places, [array.flat[i] for i in places]

    return values.remembered(f"run {kind}", make)


def _key(value: Value) -> tuple[int, Any]:
    """Key in the order of all kinds: numbers, texts, logicals."""
    return _KIND[type(value)], collation_key(value) if isinstance(value, str) else value


def _keyed(values: Array) -> Keyed:
    """Positions and keys of all values that are neither blank nor errors, as they stand."""
    places = [i for i, v in enumerate(values.flat) if type(v) in _KIND]
    return places, [_key(values.flat[i]) for i in places]


def _keyed_backwards(values: Array) -> Keyed:
    places, keys = values.remembered("keyed", _keyed)
    return places[::-1], keys[::-1]


def _sorted(values: Array) -> Keyed:
    """The same in order; equal values by their positions."""
    places, keys = values.remembered("keyed", _keyed)
    order = sorted(range(len(keys)), key=keys.__getitem__)
    return [places[i] for i in order], [keys[i] for i in order]


def _last_index(values: Array) -> dict[object, int]:
    return {lookup_key(v): i for i, v in enumerate(values.flat)}


def _joined(values: Array) -> str:
    """All texts without case, each between two separators that no text holds."""
    return _SEPARATOR + _SEPARATOR.join(v.lower() for v in _run(values, "")[1]) + _SEPARATOR  # type: ignore[union-attr]


_SEPARATOR: Final = "\0"


def exact(values: Array, wanted: Value, wildcards: bool) -> int | None:
    """First position of a value, text without case."""
    if isinstance(wanted, str) and wildcards and has_wildcard(wanted):
        joined = values.remembered("joined", _joined)
        match = line_pattern(wanted.lower(), _SEPARATOR).search(joined)
        return _run(values, "")[0][joined.count(_SEPARATOR, 0, match.start())] if match else None
    found = _scanned(values, wanted)
    return values.index().get(lookup_key(wanted)) if found is None else found if found >= 0 else None


def _scanned(values: Array, wanted: Value) -> int | None:
    """Position by one pass of numpy, −1 for none; None where an index is the better way.

    Ranges that grow or move from cell to cell are asked once, and an index of each would cost far more.
    """
    n = values.height * values.width
    asked = values.remembered("asked", lambda _: [0])
    asked[0] += 1
    if n <= _SHORT or asked[0] > _FEW_TIMES:
        return None
    if type(wanted) is float:
        hits = values.numbers.ravel() == wanted
    elif type(wanted) is str and values.width == 1 and isinstance(values, View):
        words, lexicon = values.words()
        hits = words.ravel() == lexicon.find(wanted) if lexicon.find(wanted) >= 0 else None
        if hits is None:
            return -1
    else:
        return None
    at = int(hits.argmax())
    return at if hits[at] else -1


def last_exact(values: Array, wanted: Value, wildcards: bool) -> int | None:
    """Last position of a value, text without case."""
    if isinstance(wanted, str) and wildcards and has_wildcard(wanted):
        return _last_match(values, wildcard_pattern(wanted).fullmatch)
    return values.remembered("last", _last_index).get(lookup_key(wanted))


def matching(values: Array, pattern: re.Pattern[str], backwards: bool) -> int | None:
    """First, or last, position of a text in which a regular expression is found."""
    if backwards:
        return _last_match(values, pattern.search)
    return next((i for i, v in zip(*_run(values, ""), strict=True) if pattern.search(str(v))), None)


def _last_match(values: Array, test: Callable[[str], object]) -> int | None:
    places, texts = _run(values, "")
    return next((places[i] for i in range(len(texts) - 1, -1, -1) if test(str(texts[i]))), None)


def check_length(wanted: Value) -> None:
    """Ends the call if a text is too long to be looked for."""
    if isinstance(wanted, str) and len(wanted) > _LONGEST:
        raise Fail(CellError("#VALUE!", f"text of more than {_LONGEST} characters cannot be looked up"))


def last_at_most(values: Array, wanted: Value) -> int | None:
    """By bisection in ascending order: the last value that is not above the wanted one."""
    places, run = _run(values, wanted)
    at = _bisected(run, wanted, descending=False)
    return places[at] if at >= 0 else None


def last_at_least(values: Array, wanted: Value) -> int | None:
    """By bisection in descending order: the last value that is not below the wanted one."""
    places, run = _run(values, wanted)
    at = _bisected(run, wanted, descending=True)
    return places[at] if at >= 0 else None


def _bisected(run: Sequence[Value] | NDArray[np.float64], wanted: Value, descending: bool) -> int:
    """Position in a run of one kind; −1 before the first.

    An equal value ends the bisection, and the last of the equal ones beside it is taken.
    """
    low, high = -1, len(run)
    numbers = type(wanted) is float

    def same(value: Any) -> bool:
        return compare(float(value) if numbers else value, wanted) == 0

    while high - low > 1:
        middle = (low + high) // 2
        value = float(run[middle]) if numbers else run[middle]  # type: ignore[arg-type]
        order = (value > wanted) - (value < wanted) if numbers else compare(value, wanted)  # type: ignore[operator]
        if order == 0:
            equal = middle + 1
            while equal < len(run) and equal - middle < _NEIGHBOURS and same(run[equal]):
                equal += 1
            if equal - middle < _NEIGHBOURS:
                return equal - 1
            low = equal - 1  # many of them: bisect on for the last one
        elif (order < 0) != descending:
            low = middle
        else:
            high = middle
    return low


def _equal_from(keys: Sequence[tuple[int, Any]], key: tuple[int, Any]) -> tuple[int, bool]:
    """First place in an order that is not below a key, and whether the key is there; to 15 digits."""
    at = bisect_left(keys, key)
    while at and _same(keys[at - 1], key):
        at -= 1
    return at, at < len(keys) and _same(keys[at], key)


def _same(a: tuple[int, Any], b: tuple[int, Any]) -> bool:
    return a == b or (a[0] == b[0] == NUMBER_KIND and near(a[1], b[1]))


def nearest(values: Array, wanted: Value, larger: bool, backwards: bool) -> int | None:
    """Position of the wanted value or, if there is none, of the next smaller or the next larger one.

    Numbers come before texts before logicals; blanks and errors don't take part.
    """
    places, keys = values.remembered("sorted", _sorted)
    at, found = _equal_from(keys, _key(wanted))
    if not found and not larger:
        at -= 1
    if not 0 <= at < len(keys):
        return None
    # Of equal values the order holds the first one first.
    if backwards:
        return places[bisect_right(keys, keys[at]) - 1]
    return places[bisect_left(keys, keys[at])]


def sorted_position(values: Array, wanted: Value, nearer: int, descending: bool) -> int | None:
    """By bisection over all kinds: the value, or the next smaller (−1) or next larger (1) one.

    Blanks count as after everything; errors don't take part.
    """
    if wanted is BLANK:
        return values.index().get(lookup_key(BLANK))
    if descending:
        places, keys = values.remembered("backwards", _keyed_backwards)
    else:
        places, keys = values.remembered("keyed", _keyed)
    at, found = _equal_from(keys, _key(wanted))
    if not found:
        if nearer == 0:
            return None
        at -= nearer < 0
    return places[at] if 0 <= at < len(places) else None


def checked_modes(match_mode: float, search_mode: float) -> tuple[int, int]:
    """Match and search mode of XLOOKUP and XMATCH; #VALUE! if they are none or don't go together."""
    match, search = int(match_mode), int(search_mode)
    if match not in (-1, 0, 1, 2, 3) or search not in (1, -1, 2, -2) or (match >= 2 and abs(search) == 2):
        raise Fail(VALUE)
    return match, search
