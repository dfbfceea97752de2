"""Database functions on the table of Microsoft's documentation (from memory)."""

from __future__ import annotations

from typing import Any

import pytest

CELLS: dict[str, Any] = {
    "A1": ["Tree", "Height", "Age", "Yield", "Profit", "Height"],
    "A2": ['="=Apple"', ">10", None, None, None, "<16"],
    "A3": ['="=Pear"'],
    "A5": ["Tree", "Height", "Age", "Yield", "Profit"],
    "A6": ["Apple", 18, 20, 14, 105],
    "A7": ["Pear", 12, 12, 10, 96],
    "A8": ["Cherry", 13, 14, 9, 105],
    "A9": ["Apple", 14, 15, 10, 75],
    "A10": ["Pear", 9, 8, 8, 77],
    "A11": ["Apple", 8, 9, 6, 45],
}


@pytest.mark.parametrize(
    ("formula", "value"),
    [
        ('DCOUNT(A5:E11,"Age",A1:F2)', 1.0),
        ('DCOUNTA(A5:E11,"Profit",A1:F2)', 1.0),
        ('DMAX(A5:E11,"Profit",A1:A3)', 105.0),
        ('DMIN(A5:E11,"Profit",A1:B2)', 75.0),
        ('DSUM(A5:E11,"Profit",A1:A2)', 225.0),
        ('DSUM(A5:E11,"Profit",A1:F2)', 75.0),
        ('DPRODUCT(A5:E11,"Yield",A1:B2)', 140.0),
        ('DAVERAGE(A5:E11,"Yield",A1:B2)', 12.0),
        ("DAVERAGE(A5:E11,3,A5:E11)", 13.0),
        ('DSTDEV(A5:E11,"Yield",A1:A3)', pytest.approx(2.966, abs=5e-4)),
        ('DSTDEVP(A5:E11,"Yield",A1:A3)', pytest.approx(2.653, abs=5e-4)),
        ('DVAR(A5:E11,"Yield",A1:A3)', pytest.approx(8.8)),
        ('DVARP(A5:E11,"Yield",A1:A3)', pytest.approx(7.04)),
        ('DGET(A5:E11,"Yield",A1:A3)', "#NUM!"),
        ('DGET(A5:E11,"Yield",A1:F3)', "#NUM!"),
        ("DCOUNT(A5:E11,,A1:A2)", 3.0),
        ('DSUM(A5:E11,"Colour",A1:A2)', "#VALUE!"),
        ("DSUM(A5:E5,1,A1:A2)", "#VALUE!"),
    ],
)
def test_the_orchard(evaluate: Any, formula: str, value: Any) -> None:
    assert evaluate(formula, CELLS) == value


def test_text_without_an_operator_is_met_by_what_begins_with_it(evaluate: Any) -> None:
    cells = CELLS | {"H1": "Tree", "H2": "p", "I1": "Tree", "I2": '="=p"'}
    assert evaluate('DCOUNT(A5:E11,"Age",H1:H2)', cells) == 2.0
    assert evaluate('DCOUNT(A5:E11,"Age",I1:I2)', cells) == 0.0


def test_criteria_that_are_formulas_of_the_row_are_named_not_guessed(evaluate: Any) -> None:
    from xleq.errors import FormulaError

    cells = CELLS | {"H2": "=E6>AVERAGE(E6:E11)"}
    with pytest.raises(FormulaError, match="criteria"):
        evaluate('DCOUNT(A5:E11,"Age",H1:H2)', cells)
