"""The operators of formulas, on cell values and on arrays of them."""

from __future__ import annotations

import math
from collections.abc import Callable
from functools import cache
from typing import TYPE_CHECKING, Any, Final, TypeAlias

from xleq.cells import BLANK, NA, CellError, Value
from xleq.recalc.coerce import compare, near, to_number, to_text
from xleq.recalc.operands import (
    BLANK_KIND,
    ERROR_KIND,
    NUMBER_KIND,
    Array,
    Computed,
    lookup_key,
)

if TYPE_CHECKING:
    import numpy as np
    from numpy.typing import NDArray

#: What an operator takes and gives.
Term: TypeAlias = Value | Array
Binary: TypeAlias = Callable[[Value, Value], Value]
Vector: TypeAlias = Callable[[Any, Any], Any]

_DIVIDED: Final = CellError("#DIV/0!", "divided by zero")
_TOO_LARGE: Final = CellError("#NUM!", "the result is too large")


def _finite(number: float) -> Value:
    return number if number - number == 0.0 else _TOO_LARGE


def add(a: Value, b: Value) -> Value:
    """Sum of two values."""
    x, y = to_number(a), to_number(b)
    if type(x) is not float:
        return x
    return y if type(y) is not float else _finite(x + y)


def subtract(a: Value, b: Value) -> Value:
    """Difference of two values."""
    x, y = to_number(a), to_number(b)
    if type(x) is not float:
        return x
    return y if type(y) is not float else _finite(x - y)


def multiply(a: Value, b: Value) -> Value:
    """Product of two values."""
    x, y = to_number(a), to_number(b)
    if type(x) is not float:
        return x
    return y if type(y) is not float else _finite(x * y)


def divide(a: Value, b: Value) -> Value:
    """Quotient of two values."""
    x, y = to_number(a), to_number(b)
    if type(x) is not float:
        return x
    if type(y) is not float:
        return y
    return _finite(x / y) if y else _DIVIDED


def power(a: Value, b: Value) -> Value:
    """Power of two values; 0^0 is #NUM!, and a negative number has odd roots.

    Examples
    --------
    >>> power(2.0, 10.0), power(-8.0, 1 / 3)
    (1024.0, -2.0)
    >>> power(0.0, 0.0).code, power(-8.0, 0.3).code, power(0.0, -1.0).code
    ('#NUM!', '#NUM!', '#DIV/0!')
    """
    x, y = to_number(a), to_number(b)
    if type(x) is not float:
        return x
    if type(y) is not float:
        return y
    if x == 0.0:
        if y == 0.0:
            return CellError("#NUM!", "zero to the power zero")
        return 0.0 if y > 0.0 else _DIVIDED
    try:
        if x > 0.0 or y == math.trunc(y):
            return math.pow(x, y)
        root = round(1.0 / y)
        if root % 2 and near(root * y, 1.0):
            return -math.pow(-x, y)
    except OverflowError:
        return _TOO_LARGE
    return CellError("#NUM!", "a negative number to a power that is neither whole nor an odd root")


def join(a: Value, b: Value) -> Value:
    """The two texts in one."""
    x, y = to_text(a), to_text(b)
    if type(x) is CellError:
        return x
    if type(y) is CellError:
        return y
    text = str(x) + str(y)
    return text if len(text) <= 32767 else CellError("#VALUE!", "a text of more than 32767 characters")


def _comparison(holds: Callable[[int], bool]) -> Binary:
    def compared(a: Value, b: Value) -> Value:
        if type(a) is CellError:
            return a
        if type(b) is CellError:
            return b
        for value in (a, b):
            if not isinstance(value, float | str | bool) and value is not BLANK:
                return CellError("#VALUE!", "a function cannot be compared")
        return holds(compare(a, b))

    return compared


ARITHMETIC: Final[dict[str, Binary]] = {"+": add, "-": subtract, "*": multiply, "/": divide, "^": power}
COMPARISONS: Final[dict[str, Binary]] = {
    "=": _comparison(lambda c: c == 0),
    "<>": _comparison(lambda c: c != 0),
    "<": _comparison(lambda c: c < 0),
    ">": _comparison(lambda c: c > 0),
    "<=": _comparison(lambda c: c <= 0),
    ">=": _comparison(lambda c: c >= 0),
}
SCALAR: Final[dict[str, Binary]] = {**ARITHMETIC, **COMPARISONS, "&": join}


def snapped(total: float, a: float, b: float) -> float:
    """Zero where a sum or difference a + b cancels in all of 15 digits, else the total.

    Examples
    --------
    >>> 0.3 - 0.1 - 0.2, snapped(0.3 - 0.1 - 0.2, 0.3 - 0.1, -0.2)
    (-2.7755575615628914e-17, 0.0)
    """
    return 0.0 if total != 0.0 and near(a, -b) else total


def _vector_power(x: Any, y: Any) -> Any:
    import numpy as np

    return np.where(np.isnan(x) | np.isnan(y) | (x == 0.0), np.nan, np.power(x, y))


@cache
def _vectors() -> dict[str, Vector]:
    import numpy as np

    return {"+": np.add, "-": np.subtract, "*": np.multiply, "/": np.divide, "^": _vector_power}


def apply(operator: str, a: Term, b: Term) -> Term:
    """An infix operator on values or arrays; arrays are worked element by element.

    Examples
    --------
    >>> apply("*", Array.column([1.0, "x"]), 2.0).flat[0]
    2.0
    """
    scalar = SCALAR[operator]
    if not isinstance(a, Array) and not isinstance(b, Array):
        return scalar(a, b)
    if operator in COMPARISONS:
        found = _compare_arrays(operator, a, b)
        if found is not None:
            return found
    elif operator != "&":
        return _arithmetic(scalar, _vectors()[operator], a, b)
    return each(scalar, a, b)


def _sizes(a: Term, b: Term) -> tuple[int, int]:
    height = max(a.height if isinstance(a, Array) else 1, b.height if isinstance(b, Array) else 1)
    width = max(a.width if isinstance(a, Array) else 1, b.width if isinstance(b, Array) else 1)
    return height, width


def _fit(a: Term, height: int, width: int) -> bool:
    """Whether the operand stretches to this size without gaps."""
    return not isinstance(a, Array) or (a.height in (1, height) and a.width in (1, width))


def stretched(a: Term, height: int, width: int) -> list[Value]:
    """The operand's values at each place of a larger array; #N/A where it has none."""
    if not isinstance(a, Array):
        return [a] * (height * width)
    flat = a.flat
    if a.height == height and a.width == width:
        return list(flat)
    found: list[Value] = []
    for row in range(height):
        if a.height == 1:
            r = 0
        elif row < a.height:
            r = row
        else:
            found += [NA] * width
            continue
        line = flat[r * a.width : (r + 1) * a.width]
        if a.width == 1:
            found += [line[0]] * width
        else:
            found += [*line[:width], *[NA] * (width - a.width)]
    return found


def each(scalar: Binary, a: Term, b: Term) -> Array:
    """A function of two values on each pair of elements."""
    height, width = _sizes(a, b)
    pairs = zip(stretched(a, height, width), stretched(b, height, width), strict=True)
    return Array(height, width, [scalar(x, y) for x, y in pairs])


def _arithmetic(scalar: Binary, vector: Vector, a: Term, b: Term) -> Array:
    import numpy as np

    height, width = _sizes(a, b)
    if height * width < 8 or not (_fit(a, height, width) and _fit(b, height, width)):
        return each(scalar, a, b)
    if scalar is multiply and isinstance(a, Computed) and isinstance(b, Computed):
        both = a.both(b)
        if both is not None:
            return both
    x, y = _coerced(a), _coerced(b)
    if x is None or y is None:
        return each(scalar, a, b)
    with np.errstate(all="ignore"):
        result = vector(x, y)
        # a finite sum has finite terms; it costs less than looking at each
        if result.shape == (height, width) and np.isfinite(result.sum()):
            return Computed(result)
    result = np.broadcast_to(result, (height, width))
    bad = ~np.isfinite(result)
    flat: list[Value] = result.ravel().tolist()
    left, right = stretched(a, height, width), stretched(b, height, width)
    for i in np.flatnonzero(bad).tolist():
        flat[i] = scalar(left[i], right[i])
    return Array(height, width, flat)


def _coerced(a: Term) -> NDArray[np.float64] | float | None:
    if isinstance(a, Array):
        return a.coerced()
    number = to_number(a)
    return number if type(number) is float else None


_HOLDS: Final[dict[str, tuple[bool, bool, bool]]] = {
    # less, equal, greater
    "=": (False, True, False),
    "<>": (True, False, True),
    "<": (True, False, False),
    ">": (False, False, True),
    "<=": (True, True, False),
    ">=": (False, True, True),
}
_MIRRORED: Final = {"=": "=", "<>": "<>", "<": ">", ">": "<", "<=": ">=", ">=": "<="}


def _compare_arrays(operator: str, a: Term, b: Term) -> Array | None:
    """Comparison by numpy, or None where it has to go element by element."""
    if not isinstance(a, Array):
        return _compare_arrays(_MIRRORED[operator], b, a)
    if a.height * a.width < 16 or a.span[1] == ERROR_KIND:
        return None
    if isinstance(b, str):
        return _compare_text(operator, a, b)
    if type(b) is float:
        return _compare_numbers(operator, a, b)
    if isinstance(b, Array) and a.span == b.span == (NUMBER_KIND, NUMBER_KIND):
        height, width = _sizes(a, b)
        if _fit(a, height, width) and _fit(b, height, width):
            return _compare_numbers(operator, a, b)
    return None


def _compare_text(operator: str, a: Array, text: str) -> Array | None:
    if operator not in ("=", "<>") or not text:
        return None
    code = a.index().get(lookup_key(text), -1)
    equal = a.codes() == code
    return Computed(equal if operator == "=" else ~equal)


def _compare_numbers(operator: str, a: Array, b: float | Array) -> Array:
    """Numbers and blanks compare by value; texts and logicals are greater than any number."""
    import numpy as np

    x = a.numbers
    if a.span != (NUMBER_KIND, NUMBER_KIND):
        x = np.where(a.kinds == BLANK_KIND, 0.0, np.where(a.kinds == NUMBER_KIND, x, np.inf))
    y: Any = b.numbers if isinstance(b, Array) else b
    result = _relations()[operator](x, y)
    gap = np.abs(x - y)
    close = gap <= 1e-14 * np.abs(y)
    if np.count_nonzero(close) > np.count_nonzero(gap == 0.0):
        _, equal, _ = _HOLDS[operator]
        xs, ys = np.broadcast_to(x, result.shape), np.broadcast_to(y, result.shape)
        for place in zip(*np.nonzero(close), strict=True):
            if near(float(xs[place]), float(ys[place])):
                result[place] = equal
    return Computed(result)


@cache
def _relations() -> dict[str, Vector]:
    import numpy as np

    return {
        "=": np.equal,
        "<>": np.not_equal,
        "<": np.less,
        ">": np.greater,
        "<=": np.less_equal,
        ">=": np.greater_equal,
    }


def negate(a: Term) -> Term:
    """Negative of a value or array."""
    if not isinstance(a, Array):
        number = to_number(a)
        return 0.0 - number if type(number) is float else number
    return apply("-", 0.0, a)


def hundredth(a: Term) -> Term:
    """Hundredth part of a value or array."""
    return apply("/", a, 100.0)
