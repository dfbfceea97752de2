"""Equilibrium constants as cells hold them: a number, or text where a double cannot hold it.

Inside the program a constant is always ln K, so that 1e-400 passes through any chain of functions.
"""

from __future__ import annotations

import math
import re
import sys
from typing import Final

from xleq.errors import InputError, OutOfRangeError, ParseError

LN10: Final = math.log(10.0)
#: Between these ln K is given as a number: the normal doubles.
_LOWEST: Final = math.log(sys.float_info.min)
_HIGHEST: Final = math.log(sys.float_info.max)

_NUMBER: Final = r"[+-]?(?:\d{1,300}(?:\.\d{0,300})?|\.\d{1,300})(?:[eE][+-]?\d{1,9})?"
_LOGARITHM: Final = re.compile(rf"\s*(ln|log10)\s*(?:K\s*=)?\s*({_NUMBER})\s*", re.IGNORECASE)
_PLAIN: Final = re.compile(r"\s*([+-]?)(\d{1,300}(?:\.\d{0,300})?|\.\d{1,300})(?:[eE]([+-]?\d{1,9}))?\s*")


def read_k(value: float | str) -> float:
    """Ln K of a constant as a cell holds it.

    Parameters
    ----------
    value : float or str
        K > 0 as a number or as number text, or ``"ln -12.3"`` or ``"log10 -60"``.

    Returns
    -------
    float
        ln K. [-]

    Raises
    ------
    ParseError
        If text is none of these.
    OutOfRangeError
        If K is not positive and finite.

    Examples
    --------
    >>> read_k(1.0), read_k("ln -12.3"), round(read_k("log10 -400"), 6), round(read_k("1e-400"), 6)
    (0.0, -12.3, -921.034037, -921.034037)
    """
    if isinstance(value, bool):
        raise InputError("an equilibrium constant is a number above 0, not a logical value")
    if isinstance(value, int | float):
        if not (value > 0.0 and math.isfinite(value)):
            raise OutOfRangeError(f"K is {value:g}; an equilibrium constant must be above 0")
        return math.log(value)
    match = _LOGARITHM.fullmatch(value)
    if match:
        ln_k = float(match[2]) * (1.0 if match[1].lower() == "ln" else LN10)
        if not math.isfinite(ln_k):
            raise OutOfRangeError(f"{value!r} is beyond any equilibrium constant")
        return ln_k
    match = _PLAIN.fullmatch(value)
    if match is None:
        raise ParseError(value, 0, 'K as a number, or as "ln -12.3" or "log10 -60"')
    number = float(value)
    if match[1] == "-" or not any(c in "123456789" for c in match[2]):
        raise OutOfRangeError(f"K is {value.strip()}; an equilibrium constant must be above 0")
    if sys.float_info.min <= number <= sys.float_info.max:
        return math.log(number)
    return math.log(float(match[2])) + int(match[3] or 0) * LN10


def write_k(ln_k: float) -> float | str:
    """A constant as a cell can hold it: a number where a double can, else text that `read_k` takes.

    Parameters
    ----------
    ln_k : float
        Finite. [-]

    Raises
    ------
    OutOfRangeError
        If it is not finite.

    Examples
    --------
    >>> write_k(0.0), write_k(-921.5)
    (1.0, 'ln -921.5')
    """
    if not math.isfinite(ln_k):
        raise OutOfRangeError("ln K is beyond what can be calculated")
    if _LOWEST <= ln_k < _HIGHEST:
        return math.exp(ln_k)
    return f"ln {ln_k!r}"
