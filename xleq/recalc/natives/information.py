"""What a value is: ISNUMBER and its kin, TYPE, CELL, SHEET."""

from __future__ import annotations

import re
from typing import Final

from xleq.cells import BLANK, MISSING, NA, VALUE, CellError, Missing, Value, address_text
from xleq.recalc.coerce import to_number
from xleq.recalc.context import Context
from xleq.recalc.natives.logic import term
from xleq.recalc.natives.table import native
from xleq.recalc.operands import Area, Argument, Array, Fail, Operand, Ref
from xleq.recalc.program.lambdas import Lambda
from xleq.recalc.sheets.columns import Unsupported


@native("ISBLANK", "any")
def isblank(value: Value) -> bool:
    """Whether it is an empty cell."""
    return value is BLANK


@native("ISERROR", "any")
def iserror(value: Value) -> bool:
    """Whether it is an error."""
    return isinstance(value, CellError)


@native("ISERR", "any")
def iserr(value: Value) -> bool:
    """Whether it is an error other than #N/A."""
    return isinstance(value, CellError) and value != NA


@native("ISNA", "any")
def isna(value: Value) -> bool:
    """Whether it is #N/A."""
    return value == NA


@native("ISNUMBER", "any")
def isnumber(value: Value) -> bool:
    """Whether it is a number."""
    return type(value) is float


@native("ISTEXT", "any")
def istext(value: Value) -> bool:
    """Whether it is text."""
    return isinstance(value, str)


@native("ISNONTEXT", "any")
def isnontext(value: Value) -> bool:
    """Whether it is anything but text."""
    return not isinstance(value, str)


@native("ISLOGICAL", "any")
def islogical(value: Value) -> bool:
    """Whether it is TRUE or FALSE."""
    return isinstance(value, bool)


@native("ISREF", "operand")
def isref(argument: Argument) -> bool:
    """Whether it is a reference."""
    return isinstance(argument, Ref)


@native("ISFORMULA", "range", context=True)
def isformula(context: Context, ref: Ref) -> Operand:
    """Whether the cells of a reference hold formulas."""
    area = ref.areas[0]
    rows, columns = range(area.top, area.bottom + 1), range(area.left, area.right + 1)
    if not context.array_mode:
        rows, columns = rows[:1], columns[:1]
    found = [
        context.formula_at(Ref((Area(area.sheet, r, c, r, c),))) is not None for r in rows for c in columns
    ]
    return found[0] if len(found) == 1 else Array(len(rows), len(columns), found)


def _whole(value: Value | Missing) -> int:
    if isinstance(value, bool | Missing):
        raise Fail(CellError("#VALUE!", "a number is wanted"))
    number = to_number(value)
    if isinstance(number, CellError):
        raise Fail(number)
    return int(abs(number))


@native("ISEVEN", "value")
def iseven(value: Value) -> bool:
    """Whether the whole part of a number is even."""
    return _whole(value) % 2 == 0


@native("ISODD", "value")
def isodd(value: Value) -> bool:
    """Whether the whole part of a number is odd."""
    return _whole(value) % 2 == 1


_TYPES: Final = ((float, 1.0), (str, 2.0), (bool, 4.0), (CellError, 16.0), (Array, 64.0))


@native("TYPE", "operand", context=True)
def type_(context: Context, argument: Argument) -> float:
    """Number of the kind of a value: 1 number, 2 text, 4 logical, 16 error, 64 array, 128 function."""
    if isinstance(argument, Lambda):
        return 128.0
    value = term(context, argument)
    return next((number for kind, number in _TYPES if isinstance(value, kind)), 1.0)


#: Number of each error, as ERROR.TYPE gives it.
ERROR_NUMBERS: Final = {
    code: number
    for number, code in enumerate(
        (
            "#NULL!", "#DIV/0!", "#VALUE!", "#REF!", "#NAME?", "#NUM!", "#N/A", "#GETTING_DATA",
            "#SPILL!", "#CONNECT!", "#BLOCKED!", "#UNKNOWN!", "#FIELD!", "#CALC!",
        ),
        1,
    )
}  # fmt: skip


@native("ERROR.TYPE", "any")
def error_type(value: Value) -> float:
    """Number of an error; #N/A for anything else."""
    if not isinstance(value, CellError) or value.code not in ERROR_NUMBERS:
        raise Fail(NA)
    return float(ERROR_NUMBERS[value.code])


@native("NA")
def na() -> CellError:
    """The error #N/A."""
    return NA


@native("SHEET", "operand?", context=True)
def sheet(context: Context, argument: Argument = MISSING) -> float:
    """Number of the sheet of a reference, of a name, or of the formula."""
    if isinstance(argument, Missing):
        return float(context.sheet + 1)
    if isinstance(argument, Ref):
        return float(argument.areas[0].sheet + 1)
    if isinstance(argument, CellError):
        raise Fail(argument)
    names = [name.lower() for name in context.sheet_names]
    if not isinstance(argument, str) or argument.lower() not in names:
        raise Fail(CellError("#N/A", "there is no sheet of this name"))
    return float(names.index(argument.lower()) + 1)


@native("SHEETS", "operand?", context=True)
def sheets(context: Context, argument: Argument = MISSING) -> float:
    """Number of sheets of a reference, or of the workbook."""
    if isinstance(argument, Missing):
        return float(len(context.sheet_names))
    if not isinstance(argument, Ref):
        raise Fail(argument if isinstance(argument, CellError) else NA)
    return float(len({area.sheet for area in argument.areas}))


_DATE_CODES: Final = (
    (r"d-mmm-yy(yy)?|dd-mmm-yy", "D1"),
    (r"d-mmm|dd-mmm", "D2"),
    (r"mmm-yy", "D3"),
    (r"m/d/yy(yy)?( h:mm)?|mm-dd-yy|mm/dd/yy(yy)?", "D4"),
    (r"mm/dd", "D5"),
    (r"h:mm:ss am/pm", "D6"),
    (r"h:mm am/pm", "D7"),
    (r"h:mm:ss", "D8"),
    (r"h:mm", "D9"),
)


def format_class(code: str) -> str:
    """What CELL calls a number format: G, F0, ``,2``, C2, P0, S2, D1 to D9; - for colour, () for parentheses.

    (source: Microsoft, "CELL function", table of format codes)

    Examples
    --------
    >>> format_class("General"), format_class("#,##0.00"), format_class("0%"), format_class("d-mmm-yy")
    ('G', ',2', 'P0', 'D1')
    """
    first, _, rest = code.partition(";")
    plain = re.sub(r"\[[^\]]*\]|\\.|_.|\*.|\"[^\"]*\"", "", first).strip().lower()
    suffix = ("-" if re.search(r"\[(?!\$|[<>=])[a-z]", rest, re.IGNORECASE) else "") + (
        "()" if "(" in re.sub(r"_.", "", first) else ""
    )
    for pattern, name in _DATE_CODES:
        if re.fullmatch(pattern, plain):
            return name
    if not re.search(r"[0#]", plain) or "/" in plain or "?" in plain:
        return "G" + suffix
    decimals = re.search(r"\.([0#?]+)", plain)
    places = len(decimals[1]) if decimals else 0
    if "e+" in plain or "e-" in plain:
        return f"S{places}{suffix}"
    if "%" in plain:
        return f"P{places}{suffix}"
    if "$" in first:
        return f"C{places}{suffix}"
    return f"{',' if ',' in plain else 'F'}{places}{suffix}"


@native("CELL", "text range?", context=True, volatile=True)
def cell(context: Context, what: str, ref: Ref | None = None) -> Value:
    """Something about the first cell of a reference."""
    area = ref.areas[0] if ref else Area(context.sheet, context.row, context.column, 0, 0)
    row, column = area.top, area.left
    word = what.lower()
    if word == "address":
        if area.sheet != context.sheet:
            raise Unsupported("CELL gives an address on another sheet with the name of the file")
        letters = address_text(row, column).rstrip("0123456789")
        return f"${letters}${row}"
    if word in ("row", "col"):
        return float(row if word == "row" else column)
    if word in ("contents", "type"):
        value = context.read(Ref((Area(area.sheet, row, column, row, column),))).flat[0]
        if word == "type":
            return "b" if value is BLANK else "l" if isinstance(value, str) else "v"
        return value
    if word in ("format", "color", "parentheses"):
        name = format_class(context.number_format(area.sheet, row, column))
        if word == "format":
            return name
        return float(("-" if word == "color" else "()") in name)
    if word in ("filename", "width", "prefix", "protect"):
        raise Unsupported(f'CELL("{word}") depends on the program that shows the workbook')
    raise Fail(CellError("#VALUE!", f"CELL knows nothing called {what!r}"))


@native("INFO", "text", context=True, volatile=True)
def info(context: Context, what: str) -> Value:
    """Something about the program: only what does not depend on the machine."""
    word = what.lower()
    if word == "numfile":
        return float(len(context.sheet_names))
    if word in ("directory", "origin", "osversion", "recalc", "release", "system"):
        raise Unsupported(f'INFO("{word}") depends on the program that shows the workbook')
    raise Fail(VALUE)
