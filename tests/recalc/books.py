"""Small workbooks for tests, written as dictionaries from address to what is typed there."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from datetime import datetime
from pathlib import Path
from typing import Any

from xleq.cells import CellAddress, Value, parse_address
from xleq.recalc import Recalculation, recalculate
from xleq.workbook import Area, Book, Formula, FormulaKind, Sheet

NOW = datetime(2026, 3, 4, 12, 0)


@dataclass(frozen=True)
class Block:
    """A formula that fills cells: an array formula, or a dynamic one."""

    text: str
    area: str
    dynamic: bool = False


def area(text: str) -> Area:
    """Area of an A1 range."""
    first, _, last = text.partition(":")
    return Area(*parse_address(first), *parse_address(last or first))


def typed(content: Any, place: tuple[int, int]) -> Formula | None:
    """The formula that a text beginning with = or a block stands for."""
    if isinstance(content, Block):
        return Formula(
            content.text.lstrip("="), place, FormulaKind.ARRAY, area(content.area), content.dynamic
        )
    if isinstance(content, Formula):
        return content
    if isinstance(content, str) and content.startswith("="):
        return Formula(content[1:], place)
    return None


def book(
    sheets: Mapping[str, Mapping[str, Any]], stored: Mapping[str, Value] | None = None, **settings: Any
) -> Book:
    """A workbook with these sheets; `stored` gives stored values of formulas by ``Sheet!A1`` address."""
    made = []
    for index, (name, cells) in enumerate(sheets.items()):
        sheet = Sheet(name, index, f"xl/worksheets/sheet{index + 1}.xml")
        for address, content in cells.items():
            place = parse_address(address)
            formula = typed(content, place)
            if formula is not None:
                sheet.formulas[place] = formula
            else:
                sheet.stored[place] = float(content) if type(content) is int else content
        made.append(sheet)
    found = Book(Path("made.xlsx"), tuple(made), **settings)
    for address, value in (stored or {}).items():
        sheet_name, _, cell = address.rpartition("!")
        sheet = found.sheet_named(sheet_name)
        assert sheet is not None
        sheet.stored[parse_address(cell)] = value
    return found


def fresh(cells: Mapping[str, Any] | Book, **options: Any) -> dict[str, Value]:
    """Fresh values by address, of a book or of one sheet called S; other sheets' with their names."""
    done = result(cells, **options)
    return {str(a).removeprefix("S!"): v for a, v in done.values.items()}


def result(
    cells: Mapping[str, Any] | Book, functions: Mapping[str, Any] | None = None, **options: Any
) -> Recalculation:
    """A recalculation of a book or of one sheet called S."""
    made = cells if isinstance(cells, Book) else book({"S": cells})
    return recalculate(made, functions or {}, now=NOW, **options)


def at(address: str) -> CellAddress:
    """Address on sheet S."""
    return CellAddress("S", *parse_address(address))
