"""Conversions between kinds of cell values, and their order, as the spreadsheet has them."""

from __future__ import annotations

from typing import Final

from xleq.cells import BLANK, Blank, CellError, Value
from xleq.recalc.texts import number_text, parse_number

#: Order of punctuation in the spreadsheet's collation; hyphen and apostrophe count least.
_PUNCTUATION: Final = "'- !\"#$%&()*,./:;?@[\\]^_`{|}~+<=>"
#: What a function's value is where a cell value is wanted.
NOT_A_VALUE: Final = CellError("#VALUE!", "a function stands where a value is wanted")
_COLLATION: Final = str.maketrans({c: chr(1 + i) for i, c in enumerate(_PUNCTUATION)})


def to_number(value: Value) -> float | CellError:
    """The number that a value stands for in arithmetic.

    Examples
    --------
    >>> to_number(True), to_number("1.5E1"), to_number("x")
    (1.0, 15.0, CellError(code='#VALUE!', reason="'x' is not a number", origin=''))
    """
    kind = type(value)
    if kind is float or kind is CellError:
        return value  # type: ignore[return-value]
    if kind is bool:
        return 1.0 if value else 0.0
    if kind is str:
        number = parse_number(value)  # type: ignore[arg-type]
        return CellError("#VALUE!", f"{_short(str(value))} is not a number") if number is None else number
    return 0.0 if kind is Blank else NOT_A_VALUE


def to_text(value: Value) -> str | CellError:
    """The text that a value shows as in a concatenation.

    Examples
    --------
    >>> to_text(0.1), to_text(True), to_text(2.0)
    ('0.1', 'TRUE', '2')
    """
    kind = type(value)
    if kind is str or kind is CellError:
        return value  # type: ignore[return-value]
    if kind is float:
        return number_text(value)
    if kind is bool:
        return "TRUE" if value else "FALSE"
    return "" if kind is Blank else NOT_A_VALUE


def to_logical(value: Value) -> bool | CellError:
    """The logical that a value stands for.

    Examples
    --------
    >>> to_logical(0.0), to_logical("true"), to_logical("yes").code
    (False, True, '#VALUE!')
    """
    kind = type(value)
    if kind is bool or kind is CellError:
        return value  # type: ignore[return-value]
    if kind is float:
        return value != 0.0
    if kind is str:
        word = str(value).upper()
        if word in ("TRUE", "FALSE"):
            return word == "TRUE"
        return CellError("#VALUE!", f"{_short(str(value))} is neither TRUE nor FALSE")
    return False if kind is Blank else NOT_A_VALUE


def _short(text: str) -> str:
    return repr(text if len(text) <= 40 else text[:39] + "…")


def near(a: float, b: float) -> bool:
    """Whether two numbers are the same in 15 significant digits, which is all that the spreadsheet compares.

    Examples
    --------
    >>> near(0.1 + 0.2, 0.3), near(1.0, 1.00000000000001), near(0.0, 1e-300)
    (True, False, False)
    """
    if a == b:
        return True
    if abs(a - b) > 1e-14 * abs(a):
        return False
    return f"{a:.14e}" == f"{b:.14e}"


def collation_key(text: str) -> str:
    """Key by which texts are ordered: without case, punctuation before digits before letters.

    Examples
    --------
    >>> sorted(["b", "A", "_c", "1"], key=collation_key)
    ['_c', '1', 'A', 'b']
    """
    return text.lower().translate(_COLLATION)


def compare(a: Value, b: Value) -> int:
    """Order of two values that are not errors: −1, 0 or 1.

    Numbers come before texts before logicals; a blank takes the kind of its partner.

    Examples
    --------
    >>> compare(2.0, "1"), compare("a", "A"), compare(BLANK, 0.0), compare(BLANK, "")
    (-1, 0, 0, 0)
    """
    rank_a, rank_b = _RANK[type(a)], _RANK[type(b)]
    if rank_a == rank_b:
        if rank_a == 1:
            return 0 if near(a, b) else (-1 if a < b else 1)  # type: ignore[arg-type, operator]
        if rank_a == 2:
            if a == b:
                return 0
            x, y = collation_key(a), collation_key(b)  # type: ignore[arg-type]
            return 0 if x == y else (-1 if x < y else 1)
        return (a > b) - (a < b) if rank_a == 3 else 0  # type: ignore[operator]
    if rank_a == 0:
        return compare(_EMPTY[rank_b], b)
    if rank_b == 0:
        return compare(a, _EMPTY[rank_a])
    return -1 if rank_a < rank_b else 1


_RANK: Final[dict[type, int]] = {Blank: 0, float: 1, str: 2, bool: 3}
_EMPTY: Final[dict[int, Value]] = {0: BLANK, 1: 0.0, 2: "", 3: False}


def same(a: Value, b: Value) -> bool:
    """Whether two values that are not errors are equal as ``=`` has it.

    Examples
    --------
    >>> same("Feed", "FEED"), same(1.0, True)
    (True, False)
    """
    return compare(a, b) == 0
