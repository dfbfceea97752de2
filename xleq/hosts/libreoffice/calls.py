"""What crosses between Calc and the worksheet functions: UNO values in, UNO values out.

The add-in's one module calls `call` and nothing else; this is the place where the host's ways are undone.
"""

from __future__ import annotations

import struct
from typing import Any, Final, TypeAlias, cast

from xleq.cells import BLANK, MISSING, CellError, Value
from xleq.functions import TABLE, Argument
from xleq.functions import call as call_function
from xleq.functions.table import Given

#: What UNO hands over for a block and takes back: rows of float, str, bool or None.
Block: TypeAlias = tuple[tuple[Any, ...], ...]

#: Calc's own numbers of the errors; it shows any other number as Err:NNN.
_NUMBERS: Final = {
    "#NULL!": 521,
    "#DIV/0!": 532,
    "#VALUE!": 519,
    "#REF!": 524,
    "#NAME?": 525,
    "#NUM!": 503,
    "#N/A": 32767,
}
_CODES: Final = {number: code for code, number in _NUMBERS.items()}
_QUIET_NAN: Final = 0x7FF8000000000000

#: Kinds of argument for which a number is never right: 0 there is an empty cell.
_NEVER_NUMBERS: Final = frozenset({"text", "word", "texts", "want", "options"})


def call(name: str, arguments: tuple[Any, ...]) -> Block:
    """A worksheet function's block, for arguments as Calc hands them over.

    Parameters
    ----------
    name : str
        The worksheet function.
    arguments : tuple
        A value or a block for each declared argument, None where the formula has none.

    Returns
    -------
    tuple of tuple
        One row and column for a single value; errors are NaN with Calc's error number.

    Examples
    --------
    >>> call("XLEQ_GAS_CHANGE", ((("N2 + 3 H2 = 2 NH3",),),))
    ((-2.0,),)
    """
    declared = TABLE[name].arguments
    given = [_from_calc(item, argument) for item, argument in zip(arguments, declared, strict=True)]
    while given and given[-1] is MISSING:
        given.pop()
    found = call_function(name, given)
    rows = found if isinstance(found, list) else [[found]]
    return tuple(tuple(_to_calc(value) for value in row) for row in rows)


def _from_calc(item: Any, argument: Argument) -> Given:
    if item is None:
        return MISSING
    if isinstance(item, tuple):
        return [[_value(v) for v in row] for row in cast(Block, item)]
    value = _value(item)
    # A single empty cell arrives as 0. Where an argument is needed, 0 is refused as empty: a forgotten cell
    # must not count as a Gibbs energy of 0 (text "0" is a 0 that was meant). An optional number stays 0,
    # an error where 0 makes no sense, rather than let a 0 that was computed become a default.
    if value == 0.0 and type(value) is float and _meant_empty(argument):
        return BLANK
    return value


def _meant_empty(argument: Argument) -> bool:
    if not argument.optional or argument.kind in _NEVER_NUMBERS:
        return True
    return argument.kind == "block" and argument.default is None


def _value(value: Any) -> Value:
    # Calc says '' for an empty cell and for empty text alike.
    if value is None or value == "":
        return BLANK
    if isinstance(value, bool | str):
        return value
    number = float(value)
    return number if number == number else _error_in(number)


def _error_in(nan: float) -> CellError:
    bits = struct.unpack("<Q", struct.pack("<d", nan))[0]
    return CellError(_CODES.get(bits & 0xFFFFFFFF, "#VALUE!"))


def _to_calc(value: Value) -> float | str:
    if isinstance(value, CellError):
        return error_number(value.code)
    if value is BLANK:
        return ""
    # UNO carries integers of its own widths; every number goes as a double.
    return value if isinstance(value, str) else float(cast(float, value))


def error_number(code: str) -> float:
    """The NaN that Calc reads as an error value.

    Examples
    --------
    >>> import struct
    >>> struct.pack(">d", error_number("#NUM!")).hex()
    '7ff80000000001f7'
    """
    bits = _QUIET_NAN | _NUMBERS.get(code, _NUMBERS["#VALUE!"])
    return cast(float, struct.unpack("<d", struct.pack("<Q", bits))[0])
