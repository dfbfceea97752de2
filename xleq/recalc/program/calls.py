"""Calls of native functions compiled: arguments by kind, arrays element by element."""

from __future__ import annotations

import inspect
from collections.abc import Callable, Sequence
from functools import lru_cache, partial
from typing import TYPE_CHECKING, Any, Final

from xleq.cells import BLANK, DIV0, MISSING, NA, NUM, VALUE, Blank, CellError, Missing, Value
from xleq.recalc.coerce import NOT_A_VALUE, to_logical, to_number, to_text
from xleq.recalc.context import Context
from xleq.recalc.natives.table import SCALAR_KINDS, Native, Parameter
from xleq.recalc.operands import ERROR_KIND, Array, Computed, Fail, Operand, Ref
from xleq.recalc.program.operators import stretched
from xleq.recalc.program.references import Run, block, constant, contents
from xleq.recalc.sheets.columns import VOLATILE

if TYPE_CHECKING:
    from numpy.typing import NDArray

#: Volatile in the spreadsheet, but with the same arguments they give the same result.
_STEADY: Final = frozenset({"OFFSET", "INDIRECT", "CELL", "INFO", "SHEET", "SHEETS", "FORMULATEXT"})


_PLAIN: Final = frozenset({float, str, bool, CellError, Blank, Array, Ref, Computed})


def plain(result: Any) -> Operand:
    """A result with numpy's numbers and whole numbers as floats.

    Examples
    --------
    >>> plain(3)
    3.0
    """
    if type(result) in _PLAIN or isinstance(result, Array):
        return result  # type: ignore[no-any-return]
    if isinstance(result, int | float):
        return float(result)
    kind = getattr(result, "dtype", None)
    return result.item() if kind is not None else result  # type: ignore[no-any-return]


_EMPTY: Final[dict[str, Value]] = {"number": 0.0, "text": "", "logical": False}


def _number(value: Operand) -> float:
    if type(value) is float:
        return value
    number = to_number(value)  # type: ignore[arg-type]
    if type(number) is float:
        return number
    raise Fail(number)  # type: ignore[arg-type]


def _text(value: Operand) -> str:
    text = to_text(value)  # type: ignore[arg-type]
    if type(text) is str:
        return text
    raise Fail(text)  # type: ignore[arg-type]


def _logical(value: Operand) -> bool:
    logical = to_logical(value)  # type: ignore[arg-type]
    if type(logical) is bool:
        return logical
    raise Fail(logical)


def _value(value: Operand) -> Operand:
    if type(value) is CellError:
        raise Fail(value)
    if type(value) not in _PLAIN:
        raise Fail(NOT_A_VALUE)
    return value


def _any(value: Operand) -> Operand:
    return value if type(value) in _PLAIN else NOT_A_VALUE


def _as_it_is(value: Operand) -> Operand:
    return value


CONVERTERS: Final[dict[str, Callable[[Operand], Any]]] = {
    "number": _number,
    "text": _text,
    "logical": _logical,
    "value": _value,
    "any": _any,
}


@lru_cache(maxsize=1024)
def _defaults(native: Native) -> tuple[Any, ...]:
    """Defaults of the definition's parameters, MISSING where it has none."""
    found = list(inspect.signature(native.call).parameters.values())[native.context :]
    return tuple(MISSING if p.default is p.empty else p.default for p in found)


def omitted(native: Native, index: int) -> Any:
    """What the definition receives for argument number `index` when it is left empty."""
    parameter = native.parameter(index)
    if parameter.empty_is_default:
        return _defaults(native)[index]
    if parameter.kind in _EMPTY:
        return _EMPTY[parameter.kind]
    if index < len(native.parameters) and not parameter.optional and parameter.kind in ("value", "any"):
        return BLANK
    if parameter.kind == "array" and not parameter.optional:
        return Array(1, 1, [BLANK])
    return MISSING


def prepared(parameter: Parameter, run: Run) -> Callable[[Context], Any]:
    """The argument as its kind wants it; scalar kinds are converted later, for they may be arrays."""
    kind = parameter.kind
    if kind in SCALAR_KINDS or kind in ("operand", "matrix"):
        return run
    if kind == "array":
        return lambda at: block(at, run(at))
    if kind == "lazy":
        return lambda at: partial(run, at)
    if kind == "range":

        def reference(at: Context) -> Ref:
            operand = run(at)
            if isinstance(operand, Ref):
                return operand
            raise Fail(operand if isinstance(operand, CellError) else VALUE)

        return reference

    def listed(at: Context) -> Any:
        operand = run(at)
        if not isinstance(operand, Ref):
            return operand
        areas = operand.areas
        if len(areas) == 1:
            return at.book.read_area(at, areas[0])
        return Array.column(v for area in areas for v in at.book.read_area(at, area).flat)

    return listed


def native_call(native: Native, arguments: Sequence[Callable[[Context], Any] | Missing]) -> Run:
    """A call with its arguments compiled and prepared; MISSING stands for one left empty."""
    kinds = [native.parameter(i).kind for i in range(len(arguments))]
    if any(isinstance(a, Missing) and k == "range" for a, k in zip(arguments, kinds, strict=True)):
        return constant(CellError("#VALUE!", f"{native.name} wants a reference"))
    fillers = [omitted(native, i) if a is MISSING else None for i, a in enumerate(arguments)]
    runs = [
        a if not isinstance(a, Missing) else (lambda at, v=v: v)
        for a, v in zip(arguments, fillers, strict=True)
    ]
    scalar = [k in SCALAR_KINDS for k in kinds]
    converters = [
        _as_it_is if isinstance(a, Missing) else CONVERTERS.get(k, _as_it_is)
        for a, k in zip(arguments, kinds, strict=True)
    ]
    numeric = bool(kinds) and all(k == "number" for k in kinds)
    if numeric and not native.context and not native.volatile and len(runs) == 1:
        return _of_one_number(native, runs[0])
    has_scalars = any(scalar)
    call = _guarded(native) if numeric else native.call
    own = not any(k in _OUT_OF_SIGHT for k in kinds)
    is_volatile = native.volatile and native.name not in _STEADY
    with_context = native.context

    def run(at: Context) -> Operand:
        if is_volatile:
            at.trust |= VOLATILE
        try:
            values = [step(at) for step in runs]
            if has_scalars:
                for value, is_scalar in zip(values, scalar, strict=True):
                    if is_scalar and isinstance(value, Array):
                        return _mapped(at, native, call, values, converters, scalar)
                values = [convert(value) for convert, value in zip(converters, values, strict=True)]
            result = call(at, *values) if with_context else call(*values)
        except Fail as fail:
            result = fail.error
        if type(result) is float:
            return result
        if type(result) is CellError and own:
            return explained(native.name, result, values)
        return result if type(result) in _PLAIN else plain(result)

    return run


_FEW: Final = 64
#: Kinds of arguments whose errors are not seen from outside the definition.
_OUT_OF_SIGHT: Final = frozenset({"range", "operand", "matrix", "lazy"})


def explained(name: str, error: CellError, arguments: Sequence[Any]) -> CellError:
    """An error with a reason: its own, or that the function gives it for its arguments.

    An error that came with the arguments is left as it is.

    Examples
    --------
    >>> explained("LN", NUM, [-1.0]).reason, explained("LN", NUM, [NUM]).reason
    ('LN gives no value for these arguments', '')
    """
    if error.reason or error.origin or not arguments:
        return error
    for argument in arguments:
        if isinstance(argument, Array):
            # the kinds of a long range are known by column; a short one is looked through faster
            many = argument.height * argument.width > _FEW
            if argument.span[1] == ERROR_KIND if many else error in argument.flat:
                return error
        elif argument == error:
            return error
    return _reasoned(error.code, name)


def _reasoned(code: str, name: str) -> CellError:
    does = "divides by zero with" if code == DIV0.code else "gives no value for"
    return CellError(code, f"{name} {does} these arguments")


def _guarded(native: Native) -> Callable[..., Any]:
    """A function of numbers whose failures are error values."""
    call = native.call
    no_number, divided = _reasoned(NUM.code, native.name), _reasoned(DIV0.code, native.name)

    def guarded(*args: Any) -> Any:
        try:
            result = call(*args)
        except (OverflowError, ValueError):
            return no_number
        except ZeroDivisionError:
            return divided
        if type(result) is float and result - result != 0.0:
            return no_number
        return result

    return guarded


def _of_one_number(native: Native, argument: Run) -> Run:
    call = native.call
    guarded = _guarded(native)

    def run(at: Context) -> Operand:
        value = argument(at)
        try:
            if type(value) is float:
                result = call(value)
                if type(result) is float:
                    if result - result == 0.0:
                        return result
                elif type(result) is not CellError:
                    return plain(result)
            elif isinstance(value, Array):
                return _mapped(at, native, guarded, [value], [_number], [True])
        except (Fail, OverflowError, ValueError, ZeroDivisionError):
            pass  # said by the second call, which has a reason for each
        try:
            result = guarded(_number(value))
        except Fail as fail:
            result = fail.error
        return explained(native.name, result, [value]) if type(result) is CellError else plain(result)

    return run


def _mapped(
    at: Context,
    native: Native,
    call: Callable[..., Any],
    values: Sequence[Any],
    converters: Sequence[Callable[[Operand], Any]],
    scalar: Sequence[bool],
) -> Operand:
    """The call for each element of the arrays that stand where one value is wanted."""
    arrays = [v for v, s in zip(values, scalar, strict=True) if s and isinstance(v, Array)]
    height, width = max(a.height for a in arrays), max(a.width for a in arrays)
    whole = all(a.height in (1, height) and a.width in (1, width) for a in arrays)
    if native.vector is not None and whole and height * width >= 16:
        found = _by_vector(native.vector, call, values, height, width)
        if found is not None:
            return found
    lists = [
        stretched(v, height, width) if s else [v] * (height * width)
        for v, s in zip(values, scalar, strict=True)
    ]
    missing = None if whole else _uncovered(arrays, height, width)
    results: list[Operand] = []
    for position, args in enumerate(zip(*lists, strict=True)):
        if missing is not None and missing[position]:
            results.append(NA)
            continue
        try:
            given = [convert(v) for convert, v in zip(converters, args, strict=True)]
            results.append(contents(at, plain(call(at, *given) if native.context else call(*given))))
        except Fail as fail:
            results.append(explained(native.name, fail.error, args))
    return gathered(results, height, width)


def gathered(results: Sequence[Operand], height: int, width: int) -> Array:
    """One array of a result for each place; a result that is an array gives the element at its place.

    Examples
    --------
    >>> gathered([Array.column([1.0, 2.0]), Array.column([3.0, 4.0])], 1, 2).rows()
    [[1.0, 3.0], [2.0, 4.0]]
    """
    inner = [r for r in results if isinstance(r, Array)]
    if not inner:
        return Array(height, width, results)  # type: ignore[arg-type]
    tall = height if height > 1 else max(r.height for r in inner)
    wide = width if width > 1 else max(r.width for r in inner)
    flat: list[Value] = []
    for row in range(tall):
        for column in range(wide):
            result = results[(row if height > 1 else 0) * width + (column if width > 1 else 0)]
            flat.append(_element(result, row, column))
    return Array(tall, wide, flat)


def _element(result: Operand, row: int, column: int) -> Value:
    """The element of a result at a place of the array that is made."""
    if not isinstance(result, Array):
        assert not isinstance(result, Ref)
        return result
    r = 0 if result.height == 1 else row
    c = 0 if result.width == 1 else column
    return result.at(r, c) if r < result.height and c < result.width else NA


def _uncovered(arrays: Sequence[Array], height: int, width: int) -> list[bool]:
    found = [False] * (height * width)
    for a in arrays:
        for row in range(height):
            for column in range(width):
                if (a.height > 1 and row >= a.height) or (a.width > 1 and column >= a.width):
                    found[row * width + column] = True
    return found


def _by_vector(
    vector: Callable[..., Any], call: Callable[..., Any], values: Sequence[Any], height: int, width: int
) -> Array | None:
    import numpy as np

    columns: list[NDArray[np.float64] | float] = []
    for value in values:
        if isinstance(value, Array):
            columns.append(value.coerced())
        else:
            number = to_number(value)
            if type(number) is not float:
                return None
            columns.append(number)
    with np.errstate(all="ignore"):
        result = np.broadcast_to(vector(*np.broadcast_arrays(*columns)), (height, width))
    bad = ~np.isfinite(result)
    for column in columns:
        bad = bad | np.isnan(column)
    if not bad.any():
        return Computed(result)
    flat: list[Value] = result.ravel().tolist()
    lists = [stretched(v, height, width) for v in values]
    for i in np.flatnonzero(bad).tolist():
        try:
            flat[i] = call(*[_number(row[i]) for row in lists])
        except Fail as fail:
            flat[i] = fail.error
    return Array(height, width, flat)


def own_call(function: Callable[[list[Any]], Any], arguments: Sequence[Run | Missing]) -> Run:
    """A call of a worksheet function that was passed in, with plain values and rows of several cells."""

    def run(at: Context) -> Operand:
        given: list[Any] = []
        for argument in arguments:
            if isinstance(argument, Missing):
                given.append(MISSING)
                continue
            value = contents(at, argument(at))
            given.append(value.rows() if isinstance(value, Array) else value)
        at.trust |= VOLATILE
        result = function(given)
        if isinstance(result, list):
            if not result or not result[0]:
                return BLANK
            return Array.of_rows([[plain(v) for v in row] for row in result])  # type: ignore[misc]
        return plain(result)

    return run
