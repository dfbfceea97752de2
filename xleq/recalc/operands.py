"""What a formula computes with: cell values, arrays of them, references, and a way to stop with an error."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Final, TypeAlias

from xleq.cells import BLANK, CellError, Grid, Missing, Value

if TYPE_CHECKING:
    import numpy as np
    from numpy.typing import NDArray

#: Codes in `Array.kinds`.
BLANK_KIND: Final = 0
NUMBER_KIND: Final = 1
TEXT_KIND: Final = 2
LOGICAL_KIND: Final = 3
ERROR_KIND: Final = 4

_KIND_OF: Final[dict[type, int]] = {
    float: NUMBER_KIND,
    str: TEXT_KIND,
    bool: LOGICAL_KIND,
    CellError: ERROR_KIND,
}


class Fail(Exception):  # noqa: N818 - not a program error: it carries a cell error out of nested calls
    """Ends the evaluation of a function with an error value."""

    def __init__(self, error: CellError) -> None:
        super().__init__(error)
        self.error = error


class Array:
    """A rectangular block of values, rows first.

    Parameters
    ----------
    height, width : int
    flat : sequence of Value
        The values row by row; `height * width` of them.
    """

    __slots__ = ("_kinds", "_numbers", "flat", "height", "width")

    def __init__(self, height: int, width: int, flat: Sequence[Value]) -> None:
        self.height = height
        self.width = width
        self.flat = flat
        self._numbers: NDArray[np.float64] | None = None
        self._kinds: NDArray[np.uint8] | None = None

    @classmethod
    def of_rows(cls, rows: Sequence[Sequence[Value]]) -> Array:
        """The array with these rows, all of one length."""
        return cls(len(rows), len(rows[0]), [v for row in rows for v in row])

    @classmethod
    def column(cls, values: Iterable[Value]) -> Array:
        """One column."""
        flat = list(values)
        return cls(len(flat), 1, flat)

    @classmethod
    def row(cls, values: Iterable[Value]) -> Array:
        """One row."""
        flat = list(values)
        return cls(1, len(flat), flat)

    @classmethod
    def filled(cls, height: int, width: int, value: Value) -> Array:
        """The same value everywhere."""
        return cls(height, width, [value] * (height * width))

    def at(self, row: int, column: int) -> Value:
        """The value at row and column, both from 0."""
        return self.flat[row * self.width + column]

    def rows(self) -> Grid:
        """The values as a list of rows."""
        w, flat = self.width, self.flat
        return [list(flat[i : i + w]) for i in range(0, len(flat), w)]

    @property
    def numbers(self) -> NDArray[np.float64]:
        """float64 [height, width]; nan wherever the value is not a number."""
        if self._numbers is None:
            self._split()
        assert self._numbers is not None
        return self._numbers

    @property
    def kinds(self) -> NDArray[np.uint8]:
        """uint8 [height, width]: BLANK_KIND, NUMBER_KIND, TEXT_KIND, LOGICAL_KIND or ERROR_KIND."""
        if self._kinds is None:
            self._split()
        assert self._kinds is not None
        return self._kinds

    def _split(self) -> None:
        import numpy as np

        nan = float("nan")
        shape = (self.height, self.width)
        self._kinds = np.array([_KIND_OF.get(type(v), BLANK_KIND) for v in self.flat], np.uint8).reshape(
            shape
        )
        self._numbers = np.array([v if type(v) is float else nan for v in self.flat], np.float64).reshape(
            shape
        )

    def first_error(self) -> CellError | None:
        """The first error value, row by row, if there is one."""
        for v in self.flat:
            if type(v) is CellError:
                return v
        return None

    def __repr__(self) -> str:
        return f"Array({self.height}×{self.width}: {list(self.flat[:6])!r}…)"


@dataclass(frozen=True, slots=True)
class Area:
    """A rectangle of cells on one sheet; rows and columns count from 1, ends included."""

    sheet: int
    top: int
    left: int
    bottom: int
    right: int


@dataclass(frozen=True, slots=True)
class Ref:
    """A reference: one area, or several (a union, or the same area on several sheets)."""

    areas: tuple[Area, ...]


#: What an expression evaluates to.
Operand: TypeAlias = Value | Array | Ref
#: What a function may find in place of an argument that is left empty.
Argument: TypeAlias = Operand | Missing | Callable[[], Operand]


def spilled(value: Operand) -> Value:
    """The top left value of an array, or the value itself.

    Examples
    --------
    >>> spilled(Array.row([1.0, 2.0]))
    1.0
    """
    if isinstance(value, Array):
        return value.flat[0] if value.flat else BLANK
    assert not isinstance(value, Ref)
    return value
