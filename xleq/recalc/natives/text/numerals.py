"""Numbers in text: TEXT, VALUE and their kin."""

from __future__ import annotations

import re
from decimal import Decimal, localcontext
from typing import Final

from xleq.cells import BLANK, CellError, Value
from xleq.errors import FormulaError, InputError
from xleq.recalc.coerce import to_text
from xleq.recalc.context import Context
from xleq.recalc.formats import format_value
from xleq.recalc.formats.numbers import exact_digits, rounded
from xleq.recalc.natives.table import native
from xleq.recalc.natives.text.characters import first_or_each, fitting
from xleq.recalc.operands import Argument, Array, Fail, Operand
from xleq.recalc.sheets.columns import Unsupported
from xleq.recalc.texts import parse_number


def value_error(reason: str) -> Fail:
    """#VALUE! with a reason."""
    return Fail(CellError("#VALUE!", reason))


@native("TEXT", "value text", context=True)
def text(context: Context, value: Value, code: str) -> str:
    """Value in a number format."""
    if isinstance(value, str):
        number = parse_number(value)
        value = value if number is None else number
    try:
        return fitting(format_value(0.0 if value is BLANK else value, code, context.date_1904))
    except InputError as error:
        raise value_error(str(error)) from None
    except FormulaError as error:
        raise Unsupported(str(error)) from None


@native("VALUE", "value")
def value(argument: Value) -> float:
    """Number that a text stands for."""
    if isinstance(argument, float):
        return argument
    if argument is BLANK:
        return 0.0
    number = parse_number(argument) if isinstance(argument, str) else None
    if number is None:
        raise value_error("the text is not a number")
    return number


@native("N", "operand", context=True)
def n(context: Context, argument: Argument) -> Operand:
    """Value as a number; text as 0."""

    def number(v: Value) -> Value:
        if isinstance(v, bool):
            return 1.0 if v else 0.0
        return v if isinstance(v, float | CellError) else 0.0

    return first_or_each(context, argument, number)


@native("NUMBERVALUE", "text text~ text~")
def numbervalue(text: str, decimal: str = ".", group: str = ",") -> float:
    """Number in a text with given separators."""
    decimal, group = decimal[:1], group[:1]
    if not decimal or decimal == group:
        raise value_error("the decimal and the group separator must differ")
    text = re.sub(r"\s", "", text)
    percents = len(text) - len(text.rstrip("%"))
    text = text.rstrip("%")
    whole, point, fraction = text.partition(decimal)
    if group and group in fraction:
        raise value_error("a group separator stands after the decimal separator")
    plain = (whole.replace(group, "") if group else whole) + ("." + fraction if point else "")
    if not plain and not percents:
        return 0.0
    number = parse_number(plain) if re.fullmatch(r"[+-]?[0-9.]+(?:[eE][+-]?[0-9]+)?", plain) else None
    if number is None:
        raise value_error("the text is not a number")
    return number / 100.0**percents


#: Digits that a number and its decimals can have together.
_DIGITS: Final = 500


def _fixed(x: float, decimals: float, commas: bool) -> tuple[str, bool]:
    """Digits of the rounded magnitude, and whether the rounded number is negative."""
    places = int(decimals)
    if abs(places) > 127:
        raise value_error("the number of decimals is beyond 127")
    with localcontext(prec=_DIGITS):
        d: Decimal = rounded(exact_digits(abs(x)), places)
        if places < 0:
            d = d.quantize(Decimal(1))
    return f"{d:,f}" if commas else f"{d:f}", x < 0 and d != 0


@native("FIXED", "number number? logical?")
def fixed(x: float, decimals: float = 2.0, no_commas: bool = False) -> str:
    """Rounded number as text, with thousands separated."""
    digits, negative = _fixed(x, decimals, not no_commas)
    return "-" + digits if negative else digits


@native("DOLLAR USDOLLAR", "number number?")
def dollar(x: float, decimals: float = 2.0) -> str:
    """Rounded amount of dollars as text, negative ones in parentheses."""
    digits, negative = _fixed(x, decimals, True)
    return f"(${digits})" if negative else "$" + digits


def _quoted(value: Value, strict: bool) -> str:
    if isinstance(value, CellError):
        return value.code
    if strict and isinstance(value, str):
        return '"' + value.replace('"', '""') + '"'
    plain = to_text(value)
    assert isinstance(plain, str)
    return plain


def _is_strict(form: float) -> bool:
    if int(form) not in (0, 1):
        raise value_error("the format is 0 (concise) or 1 (strict)")
    return int(form) == 1


@native("VALUETOTEXT", "any number~")
def valuetotext(value: Value, form: float = 0.0) -> str:
    """Text of any value; in quotes where strict."""
    return _quoted(value, _is_strict(form))


@native("ARRAYTOTEXT", "array number~")
def arraytotext(values: Array, form: float = 0.0) -> str:
    """Text of all values of an array; as an array constant where strict."""
    strict = _is_strict(form)
    rows = [[_quoted(v, strict) for v in row] for row in values.rows()]
    if strict:
        return fitting("{" + ";".join(",".join(row) for row in rows) + "}")
    return fitting(", ".join(t for row in rows for t in row))
