"""SUBTOTAL and AGGREGATE among hidden rows, filtered rows and other subtotals."""

from __future__ import annotations

from typing import Any

import pytest

CELLS = {"A1": 120, "A2": 10, "A3": 150, "A4": 23}


@pytest.mark.parametrize(
    ("formula", "value"),
    [  # source: Microsoft, documentation of SUBTOTAL
        ("SUBTOTAL(9,A1:A4)", 303.0),
        ("SUBTOTAL(1,A1:A4)", 75.75),
        ("SUBTOTAL(2,A1:A4)", 4.0),
        ("SUBTOTAL(4,A1:A4)", 150.0),
        ("SUBTOTAL(6,A1:A4)", 4140000.0),
        ("SUBTOTAL(12,A1:A4)", "#VALUE!"),
        ("SUBTOTAL(0,A1:A4)", "#VALUE!"),
    ],
)
def test_subtotals_as_documented(evaluate: Any, formula: str, value: Any) -> None:
    assert evaluate(formula, CELLS) == value


def test_hidden_rows_count_up_to_function_11_and_filtered_ones_never(evaluate: Any) -> None:
    hidden = {"hidden_rows": frozenset({2, 3}), "filtered_rows": frozenset({3})}
    assert evaluate("SUBTOTAL(9,A1:A4)", CELLS, **hidden) == 153.0
    assert evaluate("SUBTOTAL(109,A1:A4)", CELLS, **hidden) == 143.0
    assert evaluate("SUM(A1:A4)", CELLS, **hidden) == 303.0


def test_other_subtotals_in_the_range_are_left_out(evaluate: Any) -> None:
    cells = CELLS | {"A5": "=SUBTOTAL(9,A1:A4)", "A6": "=SUM(A1:A2)"}
    assert evaluate("SUBTOTAL(9,A1:A6)", cells) == 433.0
    assert evaluate("AGGREGATE(9,0,A1:A6)", cells) == 433.0
    assert evaluate("AGGREGATE(9,4,A1:A6)", cells) == 736.0


def test_aggregate_can_leave_out_errors(evaluate: Any) -> None:
    # source: Microsoft, documentation of AGGREGATE (its example table)
    left = ["=1/0", 72, 30, "=0/0", 31, 96, 32, 81, 33, 53, 34]
    right = [82, 65, 95, 63, 53, 71, 55, 83, 100, 91, 89]
    cells = {f"A{i + 1}": [a, b] for i, (a, b) in enumerate(zip(left, right, strict=True))}
    assert evaluate("AGGREGATE(4,6,A1:A11)", cells) == 96.0
    assert evaluate("AGGREGATE(14,6,A1:A11,3)", cells) == 72.0
    assert evaluate("AGGREGATE(15,6,A1:A11)", cells) == "#VALUE!"
    assert evaluate("AGGREGATE(12,6,A1:A11,B1:B11)", cells) == 68.0
    assert evaluate("MAX(A1:B11)", cells) == "#DIV/0!"
