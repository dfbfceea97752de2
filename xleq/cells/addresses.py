"""A1 addresses. Rows and columns count from 1, as in the sheet."""

from __future__ import annotations

import re
from functools import lru_cache
from typing import Final, NamedTuple

from xleq.errors import ParseError

MAX_ROW: Final = 1_048_576
MAX_COLUMN: Final = 16_384

_CELL = re.compile(r"\$?([A-Za-z]{1,3})\$?([1-9][0-9]{0,6})")
_PLAIN_SHEET = re.compile(r"[^\W\d][\w.]*")
_LOOKS_LIKE_CELL = re.compile(r"[A-Za-z]{1,3}[0-9]+|[Rr][0-9]*|[Cc][0-9]*|[Rr][0-9]*[Cc][0-9]*")


class CellAddress(NamedTuple):
    """A cell of a workbook: sheet name, row and column from 1."""

    sheet: str
    row: int
    column: int

    def __str__(self) -> str:
        return f"{quote_sheet(self.sheet)}!{address_text(self.row, self.column)}"


@lru_cache(maxsize=MAX_COLUMN)
def column_letters(column: int) -> str:
    """Letters of a column number.

    Examples
    --------
    >>> column_letters(1), column_letters(28), column_letters(16384)
    ('A', 'AB', 'XFD')
    """
    letters = ""
    while column:
        column, rest = divmod(column - 1, 26)
        letters = chr(65 + rest) + letters
    return letters


@lru_cache(maxsize=MAX_COLUMN)
def column_number(letters: str) -> int:
    """Number of a column from its letters.

    Examples
    --------
    >>> column_number("A"), column_number("ab"), column_number("XFD")
    (1, 28, 16384)
    """
    number = 0
    for letter in letters.upper():
        number = 26 * number + ord(letter) - 64
    return number


def address_text(row: int, column: int) -> str:
    """Relative A1 text of a cell.

    Examples
    --------
    >>> address_text(7, 2)
    'B7'
    """
    return f"{column_letters(column)}{row}"


def parse_address(text: str) -> tuple[int, int]:
    """Row and column of an A1 cell address; dollar signs are allowed.

    Raises
    ------
    ParseError
        If it is not the address of one cell on the largest sheet.

    Examples
    --------
    >>> parse_address("$B$7")
    (7, 2)
    """
    match = _CELL.fullmatch(text)
    if match:
        row, column = int(match[2]), column_number(match[1])
        if row <= MAX_ROW and column <= MAX_COLUMN:
            return row, column
    raise ParseError(text, 0, "a cell address such as B7")


def quote_sheet(name: str) -> str:
    """Sheet name as it stands before the exclamation mark, quoted where needed.

    Examples
    --------
    >>> quote_sheet("Loop"), quote_sheet("T x P map"), quote_sheet("B7"), quote_sheet("Op's")
    ('Loop', "'T x P map'", "'B7'", "'Op''s'")
    """
    if _PLAIN_SHEET.fullmatch(name) and not _LOOKS_LIKE_CELL.fullmatch(name):
        return name
    return "'" + name.replace("'", "''") + "'"
