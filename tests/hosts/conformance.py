"""Formulas for all hosts: every example of the function table, and each argument replaced by odd values."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path
from typing import Final

from openpyxl import Workbook, load_workbook
from openpyxl.worksheet.formula import ArrayFormula

from xleq.cells import BLANK, CellError, Grid, Value
from xleq.functions import TABLE, Function

#: Odd values by name: what stands in the formula.
ODD: Final = {
    "left out": "",
    "empty cell": "Inputs!$A$1",
    "empty text": '""',
    "empty text in a cell": "Inputs!$A$2",
    "error in a cell": "Inputs!$A$3",
    "logical": "TRUE",
    "logical in a cell": "Inputs!$A$4",
    "date in a cell": "Inputs!$A$5",
    "zero": "0",
    "negative": "-1",
    "huge": "1E+308",
    "tiny": "1E-300",
    "text": '"nonsense"',
    "text with a unit": '"1 furlong"',
    "number as text": '"300"',
    "error in a range": "Inputs!$B$1:$B$3",
    "empty range": "Inputs!$C$1:$C$3",
    "block": "Inputs!$D$1:$E$2",
    "range drawn too long": "Inputs!$F$1:$F$4",
    "row": "Inputs!$H$1:$J$1",
    "array": "{1;2;3}",
    "error": "1/0",
    "semicolons": '"; ;"',
    "non-ASCII": '"½ Σ ⇌"',
}


@dataclass(frozen=True, slots=True)
class Case:
    """A formula, where it stands on the sheet, and what is odd about it.

    Parameters
    ----------
    formula : str
    odd : str
        Name of the odd value; "example" where there is none.
    function : str
    argument : str
        The argument that is odd.
    row, n_rows, n_columns : int
        First row, and the cells that it fills.
    """

    formula: str
    odd: str
    function: str
    argument: str
    row: int
    n_rows: int
    n_columns: int

    def cells(self) -> Iterator[tuple[int, int]]:
        """Row and column of every cell that it fills."""
        for i in range(self.n_rows):
            for j in range(self.n_columns):
                yield self.row + i, 1 + j


def split_call(formula: str, name: str) -> tuple[str, list[str], str]:
    """What stands before the call's arguments, the arguments, and what stands after them."""
    start = formula.index(name + "(") + len(name) + 1
    arguments, depth, quoted, last = [], 0, False, start
    for i in range(start, len(formula)):
        character = formula[i]
        if character == '"':
            quoted = not quoted
        if quoted:
            continue
        if character in "({":
            depth += 1
        elif character in ")}" and depth:
            depth -= 1
        elif character == ")":
            arguments.append(formula[last:i].strip())
            return formula[:start], arguments if arguments != [""] else [], formula[i:]
        elif character == "," and not depth:
            arguments.append(formula[last:i].strip())
            last = i + 1
    raise AssertionError(f"{formula} does not end")


def _odd_formulas(function: Function) -> Iterator[tuple[str, str, str]]:
    """Formula, odd value and argument: for each argument an empty cell, 0, and a few others in turn."""
    head, arguments, tail = split_call(function.examples[0].formula, function.name)
    names = list(ODD)
    turn = sum(map(ord, function.name))
    for i, argument in enumerate(function.arguments):
        for step in range(4):
            odd = names[(turn + 7 * i + 6 * step) % len(names)]
            changed = arguments + [""] * (i + 1 - len(arguments))
            changed[i] = ODD[odd]
            yield f"{head}{','.join(changed)}{tail}", odd, argument.name
        for odd in ("empty cell", "zero"):  # what Calc cannot tell apart
            changed = arguments + [""] * (i + 1 - len(arguments))
            changed[i] = ODD[odd]
            yield f"{head}{','.join(changed)}{tail}", odd, argument.name


def first_of(function: Function) -> Value | Grid:
    """What the function's first example shows."""
    return function.examples[0].shows


def cases() -> list[Case]:
    """Every case, each in rows of its own."""
    found, row = [], 1
    for function in TABLE.values():
        asked: list[tuple[str, str, str, Value | Grid]]
        asked = [(e.formula, "example", "", e.shows) for e in function.examples]
        if function.name == "XLEQ_MULTIPLIERS":  # one is enough: Calc hands over a million cells
            asked.append(
                (
                    '=XLEQ_MULTIPLIERS("C(s) + CO2 = 2 CO",Inputs!L:L)',
                    "whole column",
                    "reactions",
                    first_of(function),
                )
            )
        asked += [(*odd, first_of(function)) for odd in _odd_formulas(function)]
        for formula, odd, argument, shows in asked:
            n_rows, n_columns = (len(shows), len(shows[0])) if isinstance(shows, list) else (1, 1)
            found.append(Case(formula, odd, function.name, argument, row, n_rows, n_columns))
            row += n_rows
    return found


def write_book(path: Path, asked: list[Case]) -> None:
    """A workbook of the cases and the cells they refer to."""
    book = Workbook()
    sheet = book.active
    sheet.title = "Cases"
    inputs = book.create_sheet("Inputs")
    for address, value in {
        "A2": '=""', "A3": "=NA()", "A4": True, "A5": 46357.5,
        "B1": 1.0, "B2": "=1/0", "B3": 2.0,
        "D1": 1.0, "E1": 2.0, "D2": 3.0, "E2": 4.0,
        "F1": "CO", "F2": "H2O", "F3": "CO2",
        "H1": 1.0, "I1": 2.0, "J1": 3.0, "L1": "C(s) + O2 = CO2", "L2": "CO + 1/2 O2 = CO2",
    }.items():  # fmt: skip
        inputs[address] = value
    inputs["A5"].number_format = "yyyy-mm-dd hh:mm"
    for case in asked:
        top = sheet.cell(case.row, 1)
        if case.n_rows * case.n_columns == 1:
            top.value = case.formula
            continue
        end = sheet.cell(case.row + case.n_rows - 1, case.n_columns).coordinate
        sheet[top.coordinate] = ArrayFormula(f"{top.coordinate}:{end}", case.formula)
    book.save(path)


def saved_values(path: Path) -> dict[tuple[int, int], Value]:
    """The values of the sheet of cases, as another program saved them."""
    sheet = load_workbook(path, data_only=True)["Cases"]
    return {
        (cell.row, cell.column): _value(cell.value, cell.data_type)
        for row in sheet.iter_rows()
        for cell in row
    }


def _value(value: object, kind: str) -> Value:
    if value is None:
        return BLANK
    if kind == "e":
        return CellError(str(value))
    if isinstance(value, bool | str):
        return value
    assert isinstance(value, int | float)
    return float(value)


def alike(one: Value, other: Value, tolerance: float = 1e-12) -> bool:
    """Whether two hosts show the same: numbers to about the 15 digits that a file holds."""
    if isinstance(one, float) and isinstance(other, float):
        return abs(one - other) <= tolerance * max(abs(one), abs(other))
    if one in (BLANK, "") and other in (BLANK, ""):
        return True
    return type(one) is type(other) and one == other
