"""Least squares in several variables: LINEST and its kin.

Solved by orthogonal columns in the order given; a column that the earlier ones already determine gets the
coefficient 0 and costs no degree of freedom.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

from xleq.cells import MISSING, NA, NUM, REF, CellError, Value
from xleq.recalc.coerce import to_logical
from xleq.recalc.natives.gather import strict_numbers
from xleq.recalc.natives.table import native
from xleq.recalc.operands import Array, Fail

if TYPE_CHECKING:
    import numpy as np
    from numpy.typing import NDArray

_DEPENDENT = 1e-11


@dataclass(frozen=True, slots=True)
class Fit:
    """A least-squares fit.

    Parameters
    ----------
    slopes, slope_errors : array [n_variables]
    constant, constant_error : float
    freedom : int
    of_model, of_rest : float
        Sums of squares.
    """

    slopes: NDArray[np.float64]
    slope_errors: NDArray[np.float64]
    constant: float
    constant_error: float
    freedom: int
    of_model: float
    of_rest: float


def _layout(ys: Array, xs: Array | None) -> tuple[NDArray[np.float64], NDArray[np.float64], bool]:
    """Vector y [n], matrix x [n, n_variables], and whether the points run along rows."""
    import numpy as np

    strict_numbers(ys)
    y = ys.numbers.ravel()
    if xs is None:
        return y, np.arange(1.0, y.size + 1.0)[:, None], ys.height == 1 and ys.width > 1
    strict_numbers(xs)
    x = xs.numbers
    if x.shape == ys.numbers.shape:
        return y, x.reshape(-1, 1), ys.height == 1 and ys.width > 1
    if ys.width == 1 and xs.height == ys.height:
        return y, x, False
    if ys.height == 1 and xs.width == ys.width:
        return y, x.T, True
    raise Fail(REF)


def _orthogonal(x: NDArray[np.float64]) -> tuple[list[int], Any, Any]:
    """Columns kept, and Q [n, kept], R [kept, kept] of them."""
    import numpy as np

    kept: list[int] = []
    basis: list[NDArray[np.float64]] = []
    for i in range(x.shape[1]):
        column = x[:, i].copy()
        for _ in range(2):
            for q in basis:
                column -= q * (q @ column)
        size = float(np.linalg.norm(column))
        if size > _DEPENDENT * float(np.linalg.norm(x[:, i])) and len(basis) < x.shape[0]:
            basis.append(column / size)
            kept.append(i)
    if not kept:
        return kept, np.empty((x.shape[0], 0)), np.empty((0, 0))
    q_matrix = np.column_stack(basis)
    return kept, q_matrix, np.triu(q_matrix.T @ x[:, kept])


def fit(y: NDArray[np.float64], x: NDArray[np.float64], constant: bool) -> Fit:
    """Least squares of y [n] on x [n, n_variables], with a constant or through the origin.

    Raises
    ------
    Fail
        #NUM! where the numbers are too large to be squared.
    """
    import numpy as np

    try:
        with np.errstate(over="raise", invalid="raise", divide="raise"):
            return _fit(y, x, constant)
    except FloatingPointError:
        raise Fail(CellError("#NUM!", "the numbers are too large for a regression")) from None


def _fit(y: NDArray[np.float64], x: NDArray[np.float64], constant: bool) -> Fit:
    import numpy as np

    n, variables = x.shape
    mean_x, mean_y = (x.mean(axis=0), float(y.mean())) if constant else (np.zeros(variables), 0.0)
    kept, q, r = _orthogonal(x - mean_x)
    centred = y - mean_y
    slopes, errors = np.zeros(variables), np.zeros(variables)
    slopes[kept] = np.linalg.solve(r, q.T @ centred)
    rest = centred - (x - mean_x) @ slopes
    of_rest = float(rest @ rest)
    of_model = float(centred @ centred) - of_rest
    freedom = n - len(kept) - constant
    inverse = np.linalg.inv(r)
    spread = of_rest / freedom if freedom > 0 else math.nan
    errors[kept] = np.sqrt(spread * (inverse**2).sum(axis=1)) if freedom > 0 else 0.0
    constant_error = math.nan
    if constant and freedom > 0:
        reach = mean_x[kept] @ inverse
        constant_error = math.sqrt(spread * (1.0 / n + float(reach @ reach)))
    return Fit(
        slopes, errors, mean_y - float(mean_x @ slopes), constant_error, freedom, max(of_model, 0.0), of_rest
    )


def _logical(value: Value | Any, default: bool) -> bool:
    if value is MISSING:
        return default
    logical = to_logical(value)
    if isinstance(logical, CellError):
        raise Fail(logical)
    return logical


def _logs(y: NDArray[np.float64]) -> NDArray[np.float64]:
    import numpy as np

    if (y <= 0.0).any():
        raise Fail(NUM)
    return np.log(y)


def _array(argument: Any) -> Array:
    return argument if isinstance(argument, Array) else Array(1, 1, [argument])


def _given(argument: Any) -> Array | None:
    return None if argument is MISSING else _array(argument)


def _report(f: Fit, constant: bool, statistics: bool, exponential: bool) -> Array:
    coefficients = [float(b) for b in f.slopes[::-1]] + [f.constant if constant else 0.0]
    first: list[Value] = [math.exp(b) for b in coefficients] if exponential else list(coefficients)
    if not statistics:
        return Array.row(first)
    second: list[Value] = [float(e) for e in f.slope_errors[::-1]]
    second.append(f.constant_error if constant and f.freedom > 0 else (0.0 if constant else NA))
    total = f.of_model + f.of_rest
    used = len(f.slopes) - int((f.slopes == 0.0).sum()) or 1
    ratio_f: Value = NUM
    deviation: Value = 0.0
    if f.freedom > 0:
        deviation = math.sqrt(f.of_rest / f.freedom)
        if f.of_rest > 0.0:
            ratio_f = (f.of_model / used) / (f.of_rest / f.freedom)
    pad: list[Value] = [NA] * (len(first) - 2)
    rows: list[list[Value]] = [
        first,
        second,
        [f.of_model / total if total else 1.0, deviation, *pad],
        [ratio_f, float(f.freedom), *pad],
        [f.of_model, f.of_rest, *pad],
    ]
    return Array.of_rows(rows)


@native("LINEST", "list list? any? any?")
def linest(ys: Any, xs: Any = MISSING, constant: Any = MISSING, statistics: Any = MISSING) -> Array:
    """Coefficients of the linear fit, last variable first, and with statistics four more rows."""
    y, x, _ = _layout(_array(ys), _given(xs))
    with_constant = _logical(constant, True)
    return _report(fit(y, x, with_constant), with_constant, _logical(statistics, False), False)


@native("LOGEST", "list list? any? any?")
def logest(ys: Any, xs: Any = MISSING, constant: Any = MISSING, statistics: Any = MISSING) -> Array:
    """Bases and factor of the exponential fit, last variable first, and with statistics four more rows."""
    y, x, _ = _layout(_array(ys), _given(xs))
    with_constant = _logical(constant, True)
    return _report(fit(_logs(y), x, with_constant), with_constant, _logical(statistics, False), True)


def _predict(ys: Array, xs: Any, new: Any, constant: Any, exponential: bool) -> Array:
    import numpy as np

    known = _given(xs)
    y, x, along_rows = _layout(ys, known)
    f = fit(_logs(y) if exponential else y, x, _logical(constant, True))
    wanted = _given(new)
    shape: tuple[int, int]
    if wanted is None:
        points, shape = x, (ys.height, ys.width)
    else:
        strict_numbers(wanted)
        points, shape = wanted.numbers, (wanted.height, wanted.width)
        if x.shape[1] == 1:
            points = points.reshape(-1, 1)
        elif along_rows:
            points, shape = points.T, (1, wanted.width)
        else:
            shape = (wanted.height, 1)
        if points.shape[1] != x.shape[1]:
            raise Fail(REF)
    with np.errstate(over="ignore"):
        values = points @ f.slopes + f.constant
        values = np.exp(values) if exponential else values
    if not np.isfinite(values).all():
        raise Fail(NUM)
    return Array(shape[0], shape[1], values.tolist())


@native("TREND", "list list? list? any?")
def trend(ys: Any, xs: Any = MISSING, new: Any = MISSING, constant: Any = MISSING) -> Array:
    """The linear fit at new points."""
    return _predict(_array(ys), xs, new, constant, False)


@native("GROWTH", "list list? list? any?")
def growth(ys: Any, xs: Any = MISSING, new: Any = MISSING, constant: Any = MISSING) -> Array:
    """The exponential fit at new points."""
    return _predict(_array(ys), xs, new, constant, True)
