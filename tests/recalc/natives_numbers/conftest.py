"""A sheet with some cells, in which formulas are evaluated."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest

from xleq.cells import Value, parse_address
from xleq.recalc.operands import Array
from xleq.recalc.recalculation import evaluate_text
from xleq.workbook.records import Book, Formula, Sheet

Evaluate = Callable[..., Any]


def book_of(cells: dict[str, Any], **of_sheet: Any) -> Book:
    """A book of one sheet; a list fills cells to the right, text with an equals sign is a formula."""
    sheet = Sheet("Sheet1", 0, "", **of_sheet)
    for address, value in cells.items():
        row, column = parse_address(address)
        for offset, item in enumerate(value if isinstance(value, list) else [value]):
            place = (row, column + offset)
            if isinstance(item, str) and item.startswith("="):
                sheet.formulas[place] = Formula(item[1:], place)
            elif item is not None:
                sheet.stored[place] = float(item) if type(item) is int else item
    return Book(Path(), (sheet,))


@pytest.fixture
def evaluate() -> Evaluate:
    """Value of a formula among cells; errors as their codes, arrays as lists of rows."""

    def call(formula: str, cells: dict[str, Any] | None = None, **of_sheet: Any) -> Any:
        found = evaluate_text("=" + formula, book_of(cells or {}, **of_sheet))
        if isinstance(found, Array):
            return [[plain(v) for v in row] for row in found.rows()]
        return plain(found)

    return call


def plain(value: Value) -> Any:
    """The value, an error as its code."""
    return getattr(value, "code", value)
