"""What a formula computes with: cell values, arrays of them, references, and a way to stop with an error."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Sequence
from typing import TYPE_CHECKING, Any, Final, NamedTuple, TypeAlias, TypeVar

from xleq.cells import BLANK, CellError, Grid, Missing, Value
from xleq.recalc.lexicon import Lexicon

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


_NAN: Final = float("nan")

_T = TypeVar("_T")


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

    __slots__ = (
        "_codes",
        "_flat",
        "_index",
        "_kinds",
        "_notes",
        "_numbers",
        "_span",
        "_words",
        "height",
        "width",
    )

    def __init__(self, height: int, width: int, flat: Sequence[Value]) -> None:
        self.height = height
        self.width = width
        self._flat: Sequence[Value] | None = flat
        self._numbers: NDArray[np.float64] | None = None
        self._kinds: NDArray[np.uint8] | None = None
        self._index: dict[object, int] | None = None
        self._words: tuple[NDArray[np.int32], Lexicon] | None = None
        self._notes: dict[str, Any] | None = None
        self._codes: NDArray[np.int64] | None = None
        self._span: tuple[int, int] | None = None

    @classmethod
    def of_rows(cls, rows: Sequence[Sequence[Value]]) -> Array:
        """The array with these rows, all of one length."""
        return Array(len(rows), len(rows[0]), [v for row in rows for v in row])

    @classmethod
    def column(cls, values: Iterable[Value]) -> Array:
        """One column."""
        flat = list(values)
        return Array(len(flat), 1, flat)

    @classmethod
    def row(cls, values: Iterable[Value]) -> Array:
        """One row."""
        flat = list(values)
        return Array(1, len(flat), flat)

    @classmethod
    def filled(cls, height: int, width: int, value: Value) -> Array:
        """The same value everywhere."""
        return Array(height, width, [value] * (height * width))

    @property
    def flat(self) -> Sequence[Value]:
        """The values row by row."""
        if self._flat is None:
            self._flat = self._unpack()
        return self._flat

    def _unpack(self) -> Sequence[Value]:
        raise AssertionError("an array without values")

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

    @property
    def span(self) -> tuple[int, int]:
        """Least and greatest kind among the values."""
        if self._span is None:
            kinds = self.kinds
            self._span = (int(kinds.min()), int(kinds.max())) if kinds.size else (BLANK_KIND, BLANK_KIND)
        return self._span

    def _split(self) -> None:
        import numpy as np

        flat = self.flat
        shape = (self.height, self.width)
        kind_of = _KIND_OF.get
        self._kinds = np.array([kind_of(type(v), BLANK_KIND) for v in flat], np.uint8).reshape(shape)
        self._numbers = np.array([v if type(v) is float else _NAN for v in flat], np.float64).reshape(shape)

    def coerced(self) -> NDArray[np.float64]:
        """float64 [height, width]: logicals as 1 and 0, blanks as 0; nan for texts and errors."""
        import numpy as np

        if self.span == (NUMBER_KIND, NUMBER_KIND):
            return self.numbers
        kinds = self.kinds
        values = np.where(kinds == BLANK_KIND, 0.0, self.numbers)
        logical = kinds == LOGICAL_KIND
        if logical.any():
            flat = self.flat
            positions = np.flatnonzero(logical).tolist()
            values.reshape(-1)[positions] = [float(bool(flat[i])) for i in positions]
        return values

    def index(self) -> dict[object, int]:
        """Position, row by row, of the first value with each key; see `lookup_key`."""
        if self._index is None:
            found: dict[object, int] = {}
            for position, value in enumerate(self.flat):
                found.setdefault(lookup_key(value), position)
            self._index = found
        return self._index

    def codes(self) -> NDArray[np.int64]:
        """int64 [height, width]: at each place the position of the first value with the same key."""
        if self._codes is None:
            import numpy as np

            index = self.index()
            codes = np.array([index[lookup_key(v)] for v in self.flat], np.int64)
            self._codes = codes.reshape(self.height, self.width)
        return self._codes

    def words(self) -> tuple[NDArray[np.int32], Lexicon]:
        """Number of each text in a lexicon, as int32 [height, width], -1 for what is no text; the lexicon."""
        if self._words is None:
            import numpy as np

            lexicon = Lexicon()
            add = lexicon.add
            numbers = np.array([add(v) if type(v) is str else -1 for v in self.flat], np.int32)
            self._words = numbers.reshape(self.height, self.width), lexicon
        return self._words

    def remembered(self, name: str, make: Callable[[Array], _T]) -> _T:
        """What `make` finds about this array, kept under a name: orders and indexes for lookups."""
        if self._notes is None:
            self._notes = {}
        if name not in self._notes:
            self._notes[name] = make(self)
        return self._notes[name]  # type: ignore[no-any-return]

    def first_error(self) -> CellError | None:
        """The first error value, row by row, if there is one."""
        for v in self.flat:
            if type(v) is CellError:
                return v
        return None

    def __repr__(self) -> str:
        return f"Array({self.height}×{self.width}: {list(self.flat[:6])!r}…)"


def lookup_key(value: Value) -> object:
    """Key under which exact lookups find a value: text without case, logicals apart from numbers.

    Examples
    --------
    >>> lookup_key("Ab") == lookup_key("aB"), lookup_key(True) == lookup_key(1.0)
    (True, False)
    """
    kind = type(value)
    if kind is str:
        return str(value).lower()
    if kind is bool:
        return (value,)
    return value


class Computed(Array):
    """An array of numbers, or of logicals, held by numpy alone until its values are asked for.

    Parameters
    ----------
    data : array [height, width]
        float64, finite; or bool.
    """

    __slots__ = ("_data",)

    def __init__(self, data: NDArray[np.float64] | NDArray[np.bool_]) -> None:
        self.height, self.width = data.shape
        self._data = data
        self._flat = None
        self._numbers = None
        self._kinds = None
        self._index = None
        self._notes = None
        self._codes = None
        self._words = None
        kind = LOGICAL_KIND if data.dtype == bool else NUMBER_KIND
        self._span = (kind, kind)

    def _unpack(self) -> Sequence[Value]:
        return self._data.ravel().tolist()

    def _split(self) -> None:
        import numpy as np

        if self._data.dtype == np.bool_:
            self._kinds = np.full(self._data.shape, LOGICAL_KIND, np.uint8)
            self._numbers = np.full(self._data.shape, _NAN)
        else:
            self._kinds = np.full(self._data.shape, NUMBER_KIND, np.uint8)
            self._numbers = self._data.astype(np.float64, copy=False)

    def coerced(self) -> NDArray[np.float64]:
        """float64 [height, width]: logicals as 1 and 0."""
        import numpy as np

        return self._data.astype(np.float64, copy=False)

    def both(self, other: Computed) -> Computed | None:
        """Product with another array of logicals of the same shape; None if that is not what they are."""
        import numpy as np

        a, b = self._data, other._data
        if a.dtype != np.bool_ or b.dtype != np.bool_ or a.shape != b.shape:
            return None
        return Computed(np.logical_and(a, b).astype(np.float64))


class Area(NamedTuple):
    """A rectangle of cells on one sheet; rows and columns count from 1, ends included."""

    sheet: int
    top: int
    left: int
    bottom: int
    right: int


class Ref(NamedTuple):
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
