"""Values that a cell can hold.

Numbers are always `float` (never `int`), text is `str`, logicals are `bool`, an empty cell is the
singleton `BLANK`, and a failure is a `CellError`: a value too, with a reason and an origin.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Final, TypeAlias


class Blank:
    """The type of an empty cell; its only instance is `BLANK`."""

    __slots__ = ()

    def __repr__(self) -> str:
        return "BLANK"

    def __bool__(self) -> bool:
        return False

    def __reduce__(self) -> str:
        return "BLANK"


class Missing:
    """The type of an argument that a formula leaves out; its only instance is `MISSING`."""

    __slots__ = ()

    def __repr__(self) -> str:
        return "MISSING"

    def __bool__(self) -> bool:
        return False

    def __reduce__(self) -> str:
        return "MISSING"


@dataclass(frozen=True, slots=True)
class CellError:
    """A spreadsheet error value.

    Two errors are equal when their codes are: the reason and the origin explain, they don't distinguish.

    Parameters
    ----------
    code : str
        What the cell shows, for example ``#NUM!``.
    reason : str
        Why, in words a user understands; empty where the code says it all.
    origin : str
        Address of the cell where it arose; empty until it is known.

    Examples
    --------
    >>> CellError("#NUM!", "K must be positive") == NUM
    True
    """

    code: str
    reason: str = field(default="", compare=False)
    origin: str = field(default="", compare=False)

    def __str__(self) -> str:
        return self.code


BLANK: Final = Blank()
MISSING: Final = Missing()

Value: TypeAlias = float | str | bool | Blank | CellError
#: A rectangular block, rows first.
Grid: TypeAlias = list[list[Value]]

NULL: Final = CellError("#NULL!")
DIV0: Final = CellError("#DIV/0!")
VALUE: Final = CellError("#VALUE!")
REF: Final = CellError("#REF!")
NAME: Final = CellError("#NAME?")
NUM: Final = CellError("#NUM!")
NA: Final = CellError("#N/A")
SPILL: Final = CellError("#SPILL!")
CALC: Final = CellError("#CALC!")

#: Every error code that a workbook can store, with its plain singleton.
ERRORS: Final[dict[str, CellError]] = {
    e.code: e
    for e in (
        NULL, DIV0, VALUE, REF, NAME, NUM, NA, SPILL, CALC,
        CellError("#GETTING_DATA"), CellError("#FIELD!"), CellError("#BLOCKED!"),
        CellError("#CONNECT!"), CellError("#UNKNOWN!"), CellError("#BUSY!"), CellError("#EXTERNAL!"),
        CellError("#PYTHON!"),
    )
}  # fmt: skip

#: Codes that a cell itself can store; the newer errors are #VALUE! there, and told apart by other parts.
STORED_ERRORS: Final = frozenset(
    ("#NULL!", "#DIV/0!", "#VALUE!", "#REF!", "#NAME?", "#NUM!", "#N/A", "#GETTING_DATA")
)


def error_named(code: str) -> CellError:
    """The error value that shows as `code`; an unknown code is kept as it is.

    Examples
    --------
    >>> error_named("#N/A") is NA
    True
    """
    return ERRORS.get(code) or CellError(code)
