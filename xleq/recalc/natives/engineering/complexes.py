"""Complex numbers as text, such as ``3+4i``."""

from __future__ import annotations

import cmath
import math
import re
from collections.abc import Callable
from typing import Any, Final

from xleq.cells import BLANK, DIV0, MISSING, NUM, VALUE, CellError, Value
from xleq.recalc.natives.gather import direct_number
from xleq.recalc.natives.table import native
from xleq.recalc.operands import Argument, Array, Fail
from xleq.recalc.texts import number_text

_NUMBER: Final = r"(?:[0-9]+\.?[0-9]*|\.[0-9]+)(?:[eE][+-]?[0-9]+)?"
_FORM = re.compile(
    rf"(?P<real>[+-]?{_NUMBER})?(?:(?P<imaginary>(?(real)[+-]|[+-]?)(?:{_NUMBER})?)(?P<unit>[ij]))?"
)

_Complex = tuple[complex, str]


def read_complex(value: Argument) -> _Complex:
    """The complex number that a value stands for, and its unit: i, j, or nothing where it is real.

    Raises
    ------
    Fail
        #VALUE! for a logical, #NUM! for text that is no complex number, or with the error given.

    Examples
    --------
    >>> read_complex("3-4i"), read_complex("j"), read_complex("1E-3")
    (((3-4j), 'i'), (1j, 'j'), ((0.001+0j), ''))
    """
    if type(value) is float:
        return complex(value), ""
    if value is BLANK or value is MISSING:
        return 0j, ""
    if isinstance(value, CellError):
        raise Fail(value)
    if not isinstance(value, str):
        raise Fail(VALUE)
    match = _FORM.fullmatch(value.strip())
    if match is None or not match[0]:
        raise Fail(NUM)
    real, unit, imaginary = match["real"], match["unit"] or "", match["imaginary"]
    part = 0.0
    if unit:
        part = float(imaginary + "1") if imaginary in ("", "+", "-") else float(imaginary)
    return complex(float(real or 0.0), part), unit


def complex_text(z: complex, unit: str = "i") -> str:
    """Text of a complex number, parts at 15 digits.

    Examples
    --------
    >>> complex_text(3 - 4j), complex_text(1j), complex_text(complex(2)), complex_text(-0.5j, "j")
    ('3-4i', 'i', '2', '-0.5j')
    """
    if not (math.isfinite(z.real) and math.isfinite(z.imag)):
        raise Fail(NUM)
    real, imaginary = number_text(z.real), number_text(z.imag)
    if imaginary in ("0", "-0"):
        return "0" if real == "-0" else real
    part = {"1": "", "-1": "-"}.get(imaginary, imaginary)
    if real in ("0", "-0"):
        return part + unit
    return real + ("" if part.startswith("-") else "+") + part + unit


def _common_unit(units: list[str]) -> str:
    named = {u for u in units if u}
    if len(named) > 1:
        raise Fail(VALUE)
    return named.pop() if named else "i"


@native("COMPLEX", "value value value?")
def complex_(real: Value, imaginary: Value, unit: Any = MISSING) -> str:
    """Text of the complex number with these parts."""
    suffix = "i" if unit is MISSING or unit is BLANK else unit
    if suffix not in ("i", "j"):
        raise Fail(VALUE)
    z = complex(direct_number(real, logicals=False), direct_number(imaginary, logicals=False))
    return complex_text(z, suffix)


@native("IMREAL", "value")
def imreal(value: Value) -> float:
    """Real part."""
    return read_complex(value)[0].real


@native("IMAGINARY", "value")
def imaginary(value: Value) -> float:
    """Imaginary part."""
    return read_complex(value)[0].imag


@native("IMABS", "value")
def imabs(value: Value) -> float:
    """Absolute value."""
    return abs(read_complex(value)[0])


@native("IMARGUMENT", "value")
def imargument(value: Value) -> float:
    """Angle, above -π to π; #DIV/0! for 0."""
    z = read_complex(value)[0]
    if z == 0:
        raise Fail(DIV0)
    return math.atan2(z.imag, z.real)


def _power(z: complex, exponent: float) -> complex:
    if z == 0:
        if exponent <= 0.0:
            raise Fail(NUM)
        return 0j
    if exponent == math.trunc(exponent) and abs(exponent) <= 1024:
        return complex(z ** int(exponent))
    return cmath.rect(abs(z) ** exponent, exponent * cmath.phase(z))


@native("IMPOWER", "value value")
def impower(value: Value, exponent: Value) -> str:
    """Power."""
    z, unit = read_complex(value)
    try:
        return complex_text(_power(z, direct_number(exponent, logicals=False)), unit or "i")
    except OverflowError:
        raise Fail(NUM) from None


def _inverse(function: Callable[[complex], complex]) -> Callable[[complex], complex]:
    return lambda z: 1 / function(z)


_FUNCTIONS: Final[dict[str, Callable[[complex], complex]]] = {
    "IMCONJUGATE": lambda z: z.conjugate(),
    "IMSQRT": lambda z: cmath.rect(math.sqrt(abs(z)), cmath.phase(z) / 2) if z.imag else cmath.sqrt(z),
    "IMEXP": cmath.exp,
    "IMLN": cmath.log,
    "IMLOG10": lambda z: cmath.log(z) / math.log(10.0),
    "IMLOG2": lambda z: cmath.log(z) / math.log(2.0),
    "IMSIN": cmath.sin,
    "IMCOS": cmath.cos,
    "IMTAN": cmath.tan,
    "IMSINH": cmath.sinh,
    "IMCOSH": cmath.cosh,
    "IMSEC": _inverse(cmath.cos),
    "IMCSC": _inverse(cmath.sin),
    "IMCOT": _inverse(cmath.tan),
    "IMSECH": _inverse(cmath.cosh),
    "IMCSCH": _inverse(cmath.sinh),
}


def _declare(name: str, function: Callable[[complex], complex]) -> None:
    @native(name, "value")
    def call(value: Value) -> str:
        z, unit = read_complex(value)
        try:
            return complex_text(function(z), unit or "i")
        except (ValueError, OverflowError, ZeroDivisionError):
            raise Fail(NUM) from None


for _name, _function in _FUNCTIONS.items():
    _declare(_name, _function)


def _all(arguments: tuple[Argument, ...]) -> tuple[list[complex], str]:
    read: list[_Complex] = []
    for argument in arguments:
        if isinstance(argument, Array):
            read += [read_complex(v) for v in argument.flat if v is not BLANK]
        else:
            read.append(read_complex(argument))
    return [z for z, _ in read], _common_unit([unit for _, unit in read])


@native("IMSUM", "list list*")
def imsum(*arguments: Argument) -> str:
    """Sum."""
    numbers, unit = _all(arguments)
    return complex_text(sum(numbers, 0j), unit)


@native("IMPRODUCT", "list list*")
def improduct(*arguments: Argument) -> str:
    """Product."""
    numbers, unit = _all(arguments)
    return complex_text(math.prod(numbers, start=1 + 0j), unit)


@native("IMSUB", "value value")
def imsub(first: Value, second: Value) -> str:
    """Difference."""
    (a, unit_a), (b, unit_b) = read_complex(first), read_complex(second)
    return complex_text(a - b, _common_unit([unit_a, unit_b]))


@native("IMDIV", "value value")
def imdiv(first: Value, second: Value) -> str:
    """Quotient; #NUM! for division by 0."""
    (a, unit_a), (b, unit_b) = read_complex(first), read_complex(second)
    if b == 0:
        raise Fail(NUM)
    return complex_text(a / b, _common_unit([unit_a, unit_b]))
