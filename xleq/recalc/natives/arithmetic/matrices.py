"""Products, inverses and determinants of matrices."""

from __future__ import annotations

import math
from typing import TYPE_CHECKING

from xleq.cells import NUM, VALUE
from xleq.recalc.natives.gather import finite, strict_numbers
from xleq.recalc.natives.table import native
from xleq.recalc.operands import Array, Fail

if TYPE_CHECKING:
    import numpy as np
    from numpy.typing import NDArray


def _matrix(array: Array) -> NDArray[np.float64]:
    strict_numbers(array)
    return array.numbers


def _square(array: Array) -> NDArray[np.float64]:
    if array.height != array.width:
        raise Fail(VALUE)
    return _matrix(array)


def array_of(matrix: NDArray[np.float64]) -> Array:
    """Array of a matrix [height, width]; #NUM! where an element is not finite."""
    return Array(matrix.shape[0], matrix.shape[1], [finite(x) for x in matrix.ravel().tolist()])


@native("MMULT", "array array")
def mmult(left: Array, right: Array) -> Array:
    """Matrix product; blanks, text and unfitting sizes are #VALUE!."""
    a, b = _matrix(left), _matrix(right)
    if left.width != right.height:
        raise Fail(VALUE)
    import numpy as np

    with np.errstate(all="ignore"):
        return array_of(a @ b)


@native("MINVERSE", "array")
def minverse(array: Array) -> Array:
    """Inverse matrix; #NUM! where there is none."""
    import numpy as np

    matrix = _square(array)
    try:
        return array_of(np.linalg.inv(matrix).astype(np.float64))
    except np.linalg.LinAlgError:
        raise Fail(NUM) from None


@native("MDETERM", "array")
def mdeterm(array: Array) -> float:
    """Determinant."""
    import numpy as np

    return finite(float(np.linalg.det(_square(array))))


@native("MUNIT", "number")
def munit(size: float) -> Array:
    """Unit matrix."""
    n = math.trunc(size)
    if not 1 <= n <= 5000:
        raise Fail(VALUE)
    flat = [0.0] * (n * n)
    flat[:: n + 1] = [1.0] * n
    return Array(n, n, flat)
