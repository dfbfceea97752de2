"""Functions that once came with the analysis add-in, and still read their arguments in its way.

Logicals are refused, in ranges too; text counts where it reads as a number.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable
from functools import wraps
from typing import Any, TypeVar

from xleq.cells import BLANK, MISSING, NA, VALUE
from xleq.recalc.natives.gather import direct_number, guarded
from xleq.recalc.natives.table import native
from xleq.recalc.operands import Argument, Array, Fail

_F = TypeVar("_F", bound=Callable[..., Any])


def tool(names: str, signature: str, *, context: bool = False, volatile: bool = False) -> Callable[[_F], _F]:
    """Declare a function of numbers that refuses logicals; see `native` for the parameters."""
    kinds = signature.split()
    numeric = [i + context for i, kind in enumerate(kinds) if kind.startswith("number")]

    def declare(call: _F) -> _F:
        @wraps(call)
        def converted(*arguments: Any) -> Any:
            given = list(arguments)
            for i in numeric:
                if i < len(given) and type(given[i]) is not float:
                    given[i] = direct_number(given[i], logicals=False)
            return guard(*given)

        guard = guarded(call)
        kinds_taken = signature.replace("number", "value")
        native(names, kinds_taken, context=context, volatile=volatile)(converted)
        return guard

    return declare


def _read(value: Argument) -> float:
    if isinstance(value, str) and value != value.strip():
        try:
            return float(value)
        except ValueError:
            raise Fail(VALUE) from None
    return direct_number(value, logicals=False)


def tool_numbers(arguments: Iterable[Argument]) -> list[float]:
    """All numbers of list arguments.

    Blanks within a range are 0; single blank cells don't count.

    Raises
    ------
    Fail
        #VALUE! for logicals, for text that is no number and where nothing is left, #N/A for an argument
        left empty.

    Examples
    --------
    >>> tool_numbers([Array.row([24.0, "36", BLANK]), Array.row([BLANK]), " 12 "])
    [24.0, 36.0, 0.0, 12.0]
    """
    numbers: list[float] = []
    for argument in arguments:
        if argument is MISSING:
            raise Fail(NA)
        if not isinstance(argument, Array):
            numbers.append(_read(argument))
        elif argument.height * argument.width == 1:
            numbers += [_read(v) for v in argument.flat if v is not BLANK]
        else:
            numbers += [_read(v) for v in argument.flat]
    if not numbers:
        raise Fail(VALUE)
    return numbers
