"""Numbers out of the arguments of functions that take lists.

A value given directly counts as the number it converts to. In a range or an array only numbers count, or,
for the functions whose names end in A, also logicals as 1 and 0 and text as 0. Errors end the call.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Iterable, Sequence
from functools import wraps
from typing import TYPE_CHECKING, Any, Final, TypeVar, cast

from xleq.cells import BLANK, DIV0, MISSING, NA, NUM, VALUE, CellError
from xleq.recalc.operands import ERROR_KIND, NUMBER_KIND, Argument, Array, Fail
from xleq.recalc.texts import parse_number

if TYPE_CHECKING:
    import numpy as np
    from numpy.typing import NDArray

#: Arrays up to this many elements are walked in Python; numpy's start costs more there.
SMALL: Final = 64


def direct_number(value: Argument, *, logicals: bool = True) -> float:
    """Number that a value given directly to a list function counts as.

    Raises
    ------
    Fail
        With the error given, or #VALUE! for text that is no number (or a logical where none is taken).

    Examples
    --------
    >>> direct_number("3"), direct_number(True), direct_number(MISSING)
    (3.0, 1.0, 0.0)
    """
    if type(value) is float:
        return value
    if isinstance(value, CellError):
        raise Fail(value)
    if type(value) is bool and logicals:
        return float(value)
    if value is BLANK or value is MISSING:
        return 0.0
    number = parse_number(value) if type(value) is str else None
    if number is None:
        raise Fail(VALUE)
    return number


def check_errors(array: Array) -> None:
    """Ends the call with the first error of the array, if there is one."""
    if array.height * array.width > SMALL:
        if array.span[1] == ERROR_KIND:
            error = array.flat[int((array.kinds.ravel() == ERROR_KIND).argmax())]
            assert isinstance(error, CellError)
            raise Fail(error)
    else:
        for v in array.flat:
            if type(v) is CellError:
                raise Fail(v)


def number_vector(array: Array) -> NDArray[np.float64]:
    """Numbers of an array row by row, as a vector [n_numbers]; not to be written to."""
    check_errors(array)
    if array.span == (NUMBER_KIND, NUMBER_KIND):
        return array.numbers.ravel()
    numbers: NDArray[np.float64] = array.numbers[array.kinds == NUMBER_KIND]
    return numbers


def array_numbers(array: Array) -> list[float]:
    """Numbers of an array row by row."""
    if array.height * array.width > SMALL:
        numbers: list[float] = number_vector(array).tolist()
        return numbers
    check_errors(array)
    return [v for v in array.flat if type(v) is float]


def array_numbers_a(array: Array) -> list[float]:
    """Numbers of an array with logicals as 1 and 0, text as 0."""
    check_errors(array)
    return [
        v if type(v) is float else float(v) if type(v) is bool else 0.0 for v in array.flat if v is not BLANK
    ]


def numbers_of(arguments: Iterable[Argument], *, logicals: bool = True) -> list[float]:
    """All numbers of list arguments, in their order.

    Examples
    --------
    >>> numbers_of([Array.row([1.0, "2", True, BLANK]), "3", True])
    [1.0, 3.0, 1.0]
    """
    numbers: list[float] = []
    for argument in arguments:
        if isinstance(argument, Array):
            numbers += array_numbers(argument)
        else:
            numbers.append(direct_number(argument, logicals=logicals))
    return numbers


def vector_of(arguments: Sequence[Argument]) -> list[float] | NDArray[np.float64]:
    """All numbers of list arguments: a vector [n_numbers] where one large array is given, else a list."""
    if len(arguments) == 1:
        array = arguments[0]
        if isinstance(array, Array) and array.height * array.width > SMALL:
            return number_vector(array)
    return numbers_of(arguments)


def places_in(numbers: NDArray[np.float64], places: Sequence[int]) -> list[float]:
    """What would stand at some places, from 0, if the numbers were in order."""
    import numpy as np

    parted = np.partition(numbers, list(places))
    return [float(parted[i]) for i in places]


def numbers_of_a(arguments: Iterable[Argument]) -> list[float]:
    """All numbers of list arguments as the functions ending in A count them.

    Examples
    --------
    >>> numbers_of_a([Array.row([1.0, "2", True, BLANK]), "3", True])
    [1.0, 0.0, 1.0, 3.0, 1.0]
    """
    numbers: list[float] = []
    for argument in arguments:
        if isinstance(argument, Array):
            numbers += array_numbers_a(argument)
        else:
            numbers.append(direct_number(argument))
    return numbers


def number_pairs(xs: Array, ys: Array) -> tuple[list[float], list[float]]:
    """Numbers of two arrays at the places where both hold one.

    Raises
    ------
    Fail
        With #N/A if they differ in size, or with the first error.
    """
    if xs.height * xs.width != ys.height * ys.width:
        raise Fail(NA)
    check_errors(xs)
    check_errors(ys)
    pairs = [(x, y) for x, y in zip(xs.flat, ys.flat, strict=True) if type(x) is float and type(y) is float]
    return [x for x, _ in pairs], [y for _, y in pairs]


def strict_numbers(array: Array) -> list[float]:
    """Numbers of an array that must hold nothing else; anything else is #VALUE!."""
    check_errors(array)
    numbers = [v for v in array.flat if type(v) is float]
    if len(numbers) != len(array.flat):
        raise Fail(VALUE)
    return numbers


def finite(x: float) -> float:
    """The number; #NUM! if it is infinite or not a number."""
    if not math.isfinite(x):
        raise Fail(NUM)
    return x


def ratio(x: float, y: float) -> float:
    """Quotient x/y; #DIV/0! for a y of 0."""
    if y == 0.0:
        raise Fail(DIV0)
    return x / y


_F = TypeVar("_F", bound=Callable[..., Any])


def guarded(call: _F) -> _F:
    """The function with #NUM! for `ValueError`, `OverflowError` and results that are not finite.

    `ZeroDivisionError` becomes #DIV/0!. The evaluator itself does this for functions of numbers alone.
    """

    @wraps(call)
    def guard(*arguments: Any) -> Any:
        try:
            result = call(*arguments)
        except (ValueError, OverflowError):
            raise Fail(NUM) from None
        except ZeroDivisionError:
            raise Fail(DIV0) from None
        return finite(result) if type(result) is float else result

    return cast(_F, guard)
