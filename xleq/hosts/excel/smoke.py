"""Opens workbooks in a real Excel, recalculates, and compares every formula with the headless value."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any, Final

from xleq.cells import BLANK, CellAddress, CellError, Value
from xleq.hosts.headless import recalculate_file

#: Relative difference of two numbers that are taken as the same.
TOLERANCE: Final = 1e-9
_NO_LINKS: Final = 0
_ERROR_BASE: Final = -2146828288
_ERROR_CODES: Final = {
    2000: "#NULL!",
    2007: "#DIV/0!",
    2015: "#VALUE!",
    2023: "#REF!",
    2029: "#NAME?",
    2036: "#NUM!",
    2042: "#N/A",
}


@dataclass(frozen=True, slots=True)
class Difference:
    """A cell that the two hosts compute differently."""

    cell: CellAddress
    headless: Value
    excel: object


@dataclass(frozen=True, slots=True)
class Comparison:
    """What comparing one workbook found.

    Parameters
    ----------
    book : Path
    n_cells : int
        Cells compared.
    differences : list of Difference
    typed_again : int
        Formulas that Excel knew only after they had been entered again.
    """

    book: Path
    n_cells: int
    differences: list[Difference]
    typed_again: int


def compare(excel: Any, book: Path) -> Comparison:
    """Recalculate a workbook in Excel, without changing the file, and compare it with the headless values."""
    fresh = recalculate_file(book).found.values
    opened = excel.Workbooks.Open(str(book.resolve()), _NO_LINKS, True)
    try:
        excel.CalculateFullRebuild()
        again = _enter_unknown_again(excel, opened, fresh)
        differences = []
        for cell, headless in fresh.items():
            shown = opened.Worksheets(cell.sheet).Cells(cell.row, cell.column).Value2
            if not same(headless, shown):
                differences.append(Difference(cell, headless, told(shown)))
    finally:
        opened.Close(False)
    return Comparison(book, len(fresh), differences, again)


def _enter_unknown_again(excel: Any, opened: Any, fresh: dict[CellAddress, Value]) -> int:
    """Formulas with a name that Excel did not know when it loaded the file."""
    again = 0
    for cell in fresh:
        target = opened.Worksheets(cell.sheet).Cells(cell.row, cell.column)
        if told(target.Value2) == "#NAME?" and target.HasFormula:
            target.Formula2 = target.Formula2
            again += 1
    if again:
        excel.CalculateFull()
    return again


def told(value: object) -> object:
    """A cell's value as Excel's interface gives it, errors by their code."""
    if isinstance(value, int) and not isinstance(value, bool):
        return _ERROR_CODES.get(value - _ERROR_BASE, value)
    return value


def same(headless: Value, shown: object) -> bool:
    """Whether a value that Excel shows is the headless one.

    Examples
    --------
    >>> same(1.0, 1.0 + 1e-12), same(1.0, True), same(CellError("#NUM!"), -2146826252)
    (True, False, True)
    """
    shown = told(shown)
    if isinstance(headless, CellError):
        return shown == headless.code
    if headless is BLANK or headless == "":
        return shown is None or shown == ""
    if isinstance(headless, bool) or isinstance(shown, bool):
        return headless is shown
    if isinstance(headless, float):
        if not isinstance(shown, int | float):
            return False
        return abs(headless - shown) <= TOLERANCE * max(abs(headless), abs(shown))
    return headless == shown


def report(comparisons: Sequence[Comparison], heading: str) -> str:
    """The comparisons as a short text.

    Parameters
    ----------
    comparisons : sequence of Comparison
    heading : str
        First line: which programs were compared.
    """
    lines = [heading, ""]
    for c in comparisons:
        again = f", {c.typed_again} formulas entered again before Excel knew them" if c.typed_again else ""
        lines.append(f"{c.book.name}: {c.n_cells} cells compared, {len(c.differences)} differ{again}")
        lines += [f"  {d.cell}: headless {d.headless!r}, Excel {d.excel!r}" for d in c.differences]
    return "\n".join(lines) + "\n"
