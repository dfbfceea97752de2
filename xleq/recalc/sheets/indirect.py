"""References given as text, in A1 or R1C1 style."""

from __future__ import annotations

import re
from typing import TYPE_CHECKING, Final

from xleq.cells import MAX_COLUMN, MAX_ROW, CellError
from xleq.errors import FormulaError
from xleq.recalc.context import Context
from xleq.recalc.operands import Area, Fail, Ref
from xleq.recalc.sheets.columns import Unsupported
from xleq.recalc.syntax import tree
from xleq.recalc.syntax.parse import parse, read_place

if TYPE_CHECKING:
    from xleq.recalc.program.compile import Compiler

_R1C1 = re.compile(
    r"R(\[-?[0-9]+\]|[0-9]+)?(C(\[-?[0-9]+\]|[0-9]+)?)?|C(\[-?[0-9]+\]|[0-9]+)?", re.IGNORECASE
)
_REFERENCES: Final = (tree.Cells, tree.Name, tree.Structured)


def reference_named(at: Context, text: str, a1: bool, compiler: Compiler) -> Ref:
    """The reference that a text names.

    Raises
    ------
    Fail
        #REF! if it names none.
    """
    failure = Fail(CellError("#REF!", f"{text!r} names no cells"))
    place_text, mark, rest = text.strip().rpartition("!")
    if not a1:
        place = read_place(place_text + "!") if mark else None
        found = _r1c1(at, rest.strip(), compiler.names.one_sheet(place, at.sheet))
        if found is not None:
            return found
    try:
        node = parse(text.strip(), at.row, at.column)
    except FormulaError:
        raise failure from None
    if not isinstance(node, _REFERENCES) and not (isinstance(node, tree.Postfix) and node.operator == "#"):
        raise failure
    if not a1 and isinstance(node, tree.Cells):
        raise failure
    try:
        operand = compiler.operand(node, True, {})(at)
    except Unsupported:
        raise failure from None
    if isinstance(operand, Ref):
        return operand
    raise failure


def _r1c1(at: Context, text: str, sheet: int | None) -> Ref | None:
    if sheet is None:
        return None
    ends = text.split(":")
    if len(ends) > 2:
        return None
    corners = [_corner(at, end) for end in ends]
    tops: list[int] = []
    lefts: list[int] = []
    for corner in corners:
        if corner is None:
            return None
        rows, columns = corner
        if rows[0] < 1 or rows[1] > MAX_ROW or columns[0] < 1 or columns[1] > MAX_COLUMN:
            return None
        tops += rows
        lefts += columns
    return Ref((Area(sheet, min(tops), min(lefts), max(tops), max(lefts)),))


def _corner(at: Context, text: str) -> tuple[tuple[int, int], tuple[int, int]] | None:
    """Rows and columns that one part of an R1C1 reference spans."""
    match = _R1C1.fullmatch(text)
    if match is None:
        return None
    if text[0] in "Cc":
        column = _place(match[4], at.column)
        return (1, MAX_ROW), (column, column)
    row = _place(match[1], at.row)
    if match[2] is None:
        return (row, row), (1, MAX_COLUMN)
    column = _place(match[3], at.column)
    return (row, row), (column, column)


def _place(text: str | None, own: int) -> int:
    if text is None:
        return own
    return own + int(text[1:-1]) if text[0] == "[" else int(text)
