"""What counts in a list: values given directly against values in ranges, blanks, text, errors."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import pytest

from xleq.cells import VALUE

MIXED = {"A1": 1, "A2": "2", "A3": True, "A5": "x", "A6": 5}


@pytest.mark.parametrize(
    ("formula", "value"),
    [
        # source: Microsoft, documentation of SUM, COUNT, AVERAGE and AVERAGEA: text and logicals in a
        # reference are ignored, those typed into the list of arguments are counted
        ("SUM(A1:A6)", 6.0),
        ('SUM(1,"2",TRUE)', 4.0),
        ('SUM(1,"x")', "#VALUE!"),
        ("SUM(A2,A3)", 0.0),
        ("SUM(1,,2)", 3.0),
        ('SUM({1,TRUE,"3"})', 1.0),
        ("COUNT(A1:A6)", 2.0),
        ('COUNT(1,"2",TRUE,"x")', 3.0),
        ("COUNT(1,,2)", 3.0),
        ("COUNT(1/0,1)", 1.0),
        ("COUNTA(A1:A6)", 5.0),
        ('COUNTA(1/0,"")', 2.0),
        ("COUNTBLANK(A1:A7)", 2.0),
        ("AVERAGE(A1:A6)", 3.0),
        ("AVERAGEA(A1:A6)", 7.0 / 5.0),
        ("MIN(A1:A6)", 1.0),
        ("MIN(A4)", 0.0),
        ("MIN(5,,7)", 0.0),
        ("MAX(A2:A5)", 0.0),
        ("MAXA(A2:A5)", 1.0),
        ("MINA(A1:A6)", 0.0),
        ("MAX(TRUE,0)", 1.0),
        ("PRODUCT(A1:A6)", 5.0),
        ("PRODUCT(A2:A4)", 0.0),
        ("SUMSQ(A1:A6)", 26.0),
        ("MEDIAN(A1:A6)", 3.0),
        ("STDEV(A1)", "#DIV/0!"),
        ("STDEVP(A1)", 0.0),
        ("AVERAGE(A2:A5)", "#DIV/0!"),
        ("MEDIAN(A2:A5)", "#NUM!"),
        ("MODE(A1:A6)", "#N/A"),
        ("VARA(A1:A6)", pytest.approx(4.3)),
        ("LARGE(A1:A6,3)", "#NUM!"),
        ("GCD(A1,A2)", 1.0),
        ("GCD(A1:A3)", "#VALUE!"),
    ],
)
def test_lists_take_what_the_documentation_says(evaluate: Any, formula: str, value: Any) -> None:
    assert evaluate(formula, MIXED) == value


def test_the_first_error_in_a_list_is_the_result(evaluate: Any) -> None:
    cells = {"A1": "=NA()", "A2": "=1/0", "B1": 1}
    assert evaluate("SUM(B1,A1:A2)", cells) == "#N/A"
    assert evaluate("SUM(A2,A1)", {"A1": "=NA()", "A2": VALUE}) == "#VALUE!"
    assert evaluate("SUM(1/0,A1)", cells) == "#DIV/0!"
    assert evaluate("COUNT(A1:A2,1)", cells) == 1.0


@pytest.mark.parametrize(
    "name",
    ["SUM", "SUMSQ", "AVERAGE", "MIN", "MAX", "MEDIAN", "STDEV", "VARP", "COUNT", "COUNTA", "DEVSQ", "SKEW"],
)
def test_long_ranges_give_what_short_ones_do(evaluate: Any, name: str) -> None:
    pattern = [3.5, -1.0, "x", True, None, 2.25, 8.0, 0.5]
    long = {f"A{i + 1}": pattern[i % 8] for i in range(96)}
    typed = ",".join(str(v) for i in range(96) if isinstance(v := pattern[i % 8], float))
    if name == "COUNTA":
        assert evaluate("COUNTA(A1:A96)", long) == 84.0
    else:
        assert evaluate(f"{name}(A1:A96)", long) == pytest.approx(evaluate(f"{name}({typed})"), rel=1e-14)


@pytest.mark.parametrize("k", [1, 2, 17, 60])
def test_places_in_long_ranges_are_those_of_the_ordered_list(evaluate: Any, k: int) -> None:
    numbers = [float(37 * i % 101) for i in range(80)]
    cells = {f"A{i + 1}": x for i, x in enumerate(numbers)}
    assert evaluate(f"SMALL(A1:A80,{k})", cells) == sorted(numbers)[k - 1]
    assert evaluate(f"LARGE(A1:A80,{k})", cells) == sorted(numbers)[-k]
    assert evaluate(f"RANK(A{k},A1:A80)", cells) == 1.0 + sum(x > numbers[k - 1] for x in numbers)


def test_ranks_as_documented(evaluate: Any) -> None:
    # source: Microsoft, documentation of RANK, RANK.EQ and RANK.AVG (from memory)
    cells = {"A2": 7, "A3": 3.5, "A4": 3.5, "A5": 1, "A6": 2}
    assert evaluate("RANK(A3,A2:A6,1)", cells) == 3.0
    assert evaluate("RANK.EQ(A2,A2:A6,1)", cells) == 5.0
    assert evaluate("RANK.EQ(6,A2:A6)", cells) == "#N/A"
    warm = {f"B{i + 2}": x for i, x in enumerate([89, 88, 92, 101, 94, 97, 95])}
    assert evaluate("RANK.AVG(94,B2:B8)", warm) == 4.0
    assert evaluate("RANK.AVG(3.5,A2:A6)", cells) == 2.5


def test_a_share_of_a_whole(evaluate: Any) -> None:
    assert evaluate("PERCENTOF({1,2},{1,2,3,4})") == pytest.approx(0.3)
    assert evaluate("PERCENTOF({1,2},{0})") == "#DIV/0!"


def test_sumproduct_takes_text_as_zero_and_wants_equal_sizes(evaluate: Any) -> None:
    cells = {"A1": 2, "A2": "x", "A3": 4, "B1": 3, "B2": 5, "B3": True}
    assert evaluate("SUMPRODUCT(A1:A3,B1:B3)", cells) == 6.0
    assert evaluate("SUMPRODUCT(A1:A3,B1:B2)", cells) == "#VALUE!"
    assert evaluate("SUMPRODUCT((B1:B2>2)*B1:B2)", cells) == 8.0


def test_sums_run_from_left_to_right(evaluate: Any) -> None:
    cells = {f"A{i + 1}": 0.1 for i in range(100)}
    total = 0.0
    for _ in range(100):
        total += 0.1
    assert evaluate("SUM(A1:A100)", cells) == total


def test_pairs_leave_out_places_where_one_is_no_number(evaluate: Any) -> None:
    cells = {"A1": [1, 2], "A2": ["x", 9], "A3": [2, 4], "A4": [3, None], "A5": [4, 8]}
    assert evaluate("SLOPE(B1:B5,A1:A5)", cells) == pytest.approx(2.0)
    assert evaluate("CORREL(A1:A5,B1:B4)", cells) == "#N/A"
    assert evaluate("SUMXMY2(A1:A5,B1:B5)", cells) == 1.0 + 4.0 + 16.0


@pytest.mark.parametrize(
    ("formula", "value"),
    [
        # array functions take arrays in a plain formula, SUM and its kin do not
        ("SUM(A1:A5*2)", 6.0),
        ("MAX(A1:A5*2)", 6.0),
        ("LARGE(A1:A5*2,1)", 6.0),
        ("PERCENTILE(A1:A5*2,0.5)", 6.0),
        ("SUMPRODUCT(A1:A5*2)", 30.0),
        ("MDETERM(A1:A1*2)", 2.0),
        ("AGGREGATE(14,6,A1:A5/(A1:A5<5),1)", 4.0),
        ("SUMX2PY2(A1:A5*1,A1:A5*0)", 55.0),
    ],
)
def test_a_plain_formula_meets_ranges_as_excel_does(formula: str, value: float) -> None:
    from datetime import datetime

    from xleq.cells import CellAddress
    from xleq.recalc import recalculate
    from xleq.workbook.records import Book, Formula, Sheet

    sheet = Sheet("S", 0, "")
    for i in range(1, 6):
        sheet.stored[(i, 1)] = float(i)
    sheet.formulas[(3, 3)] = Formula(formula, (3, 3))
    done = recalculate(Book(Path(), (sheet,)), {}, now=datetime(2026, 1, 1), trust_fresh=True)
    assert done.values[CellAddress("S", 3, 3)] == value
