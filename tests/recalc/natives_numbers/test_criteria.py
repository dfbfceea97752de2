"""Criteria: which cells meet them, alone, in long ranges and in whole columns."""

from __future__ import annotations

import itertools
from typing import Any

import pytest

from xleq.cells import BLANK, DIV0, NA, Value
from xleq.recalc.natives.criteria import read_criterion
from xleq.recalc.operands import Array, Fail

VALUES: list[Value] = [
    5.0, 0.0, -3.5, 23.0, "23", " 23 ", "5%", "", "NH3", "nh3", "N2", "a*b", "what?", "~", "10/1/2020",
    "TRUE", True, False, NA, DIV0, BLANK, "Zinc", "äther",
]  # fmt: skip

CRITERIA: list[Value] = [
    5.0, 0.0, "5", "=5", ">0", ">=0", "<5", "<=5", "<>5", "<>23", "=23", "23", "nh3", "=NH3", "<>nh3", "n*",
    "N?", "*", "?", "??", "~*", "a~*b", "what~?", "~~", "<>n*", ">m", "<=NH3", "", "=", "<>", "<", ">=",
    True, "TRUE", "<>TRUE", "=FALSE", ">FALSE", NA, "#N/A", "<>#N/A", "#DIV/0!", BLANK, "10/1/2020",
    ">10/1/2019", "5%", "<>*", "=*", "1E3", "äTHER",
]  # fmt: skip


@pytest.mark.parametrize("criterion", CRITERIA, ids=repr)
def test_long_ranges_are_judged_as_single_cells_are(criterion: Value) -> None:
    test = read_criterion(criterion)
    values = list(itertools.islice(itertools.cycle(VALUES), 10 * len(VALUES)))
    expected = [test.met_by(v) for v in values]
    assert test.mask(Array.column(values)).ravel().tolist() == expected
    assert test.mask(Array.row(VALUES)).ravel().tolist() == expected[: len(VALUES)]


@pytest.mark.parametrize(
    ("criterion", "met"),
    [
        # source: Microsoft, documentation of COUNTIF, and values that Excel stored (corpus)
        ("=23", [23.0, "23", " 23 "]),
        (23.0, [23.0, "23", " 23 "]),
        ("nh3", ["NH3", "nh3"]),
        ("N?", ["N2"]),
        ("a~*b", ["a*b"]),
        ("what~?", ["what?"]),
        ("=", [BLANK]),
        ("", ["", BLANK]),
        (">4", [5.0, 23.0]),
        ("<0", [-3.5]),
        (True, [True]),
        ("TRUE", [True]),
        ("#N/A", [NA]),
        (">=", []),
        (BLANK, [0.0]),
        ("*", [v for v in VALUES if isinstance(v, str)]),
    ],
    ids=repr,
)
def test_a_criterion_is_met_by(criterion: Value, met: list[Value]) -> None:
    test = read_criterion(criterion)
    assert [v for v in VALUES if test.met_by(v)] == met


def test_different_from_a_number_counts_text_that_reads_as_it(evaluate: Any) -> None:
    cells = {"A1": 23, "A2": "23", "A3": "x", "A5": True}
    assert evaluate('COUNTIF(A1:A5,"<>23")', cells) == 4.0
    assert evaluate('COUNTIF(A1:A5,"=23")', cells) == 2.0


def test_different_from_nothing_counts_empty_text(evaluate: Any) -> None:
    cells = {"A1": 1, "A2": "", "A4": "x"}
    assert evaluate('COUNTIF(A1:A5,"<>")', cells) == 3.0
    assert evaluate('COUNTIF(A1:A5,"")', cells) == 3.0
    assert evaluate('COUNTIF(A1:A5,"=")', cells) == 2.0


def test_whole_columns_count_their_blanks(evaluate: Any) -> None:
    cells = {"A1": 1, "A3": "x", "B7": 2}
    assert evaluate('COUNTIF(A:A,"=")', cells) == 2.0**20 - 2
    assert evaluate('COUNTIF(A:A,"<>x")', cells) == 2.0**20 - 1
    assert evaluate("COUNTIF(A:A,1)", cells) == 1.0
    assert evaluate('COUNTIFS(A:A,"",B:B,"")', cells) == 2.0**20 - 3
    assert evaluate("COUNTBLANK(A:A)", cells) == 2.0**20 - 2
    assert evaluate('SUMIF(A:A,"",B:B)', cells) == 2.0


def test_sums_take_the_shape_of_the_range_that_is_judged(evaluate: Any) -> None:
    cells = {"A1": ["x", 1], "A2": ["y", 2], "A3": ["x", 4], "A4": ["x", 8]}
    assert evaluate('SUMIF(A1:A4,"x",B1)', cells) == 13.0
    assert evaluate('SUMIF(A1:A2,"x",B1:B4)', cells) == 1.0
    assert evaluate('SUMIFS(B1:B4,A1:A3,"x")', cells) == "#VALUE!"
    assert evaluate('AVERAGEIF(A1:A4,"x",B1:B4)', cells) == pytest.approx(13 / 3)
    assert evaluate('AVERAGEIFS(B1:B4,A1:A4,"z")', cells) == "#DIV/0!"
    assert evaluate('MAXIFS(B1:B4,A1:A4,"x",B1:B4,"<8")', cells) == 4.0
    assert evaluate('MINIFS(B1:B4,A1:A4,"z")', cells) == 0.0


def test_only_errors_among_the_chosen_cells_matter(evaluate: Any) -> None:
    cells = {"A1": ["x", 1], "A2": ["y", NA], "A3": ["x", 4]}
    assert evaluate('SUMIF(A1:A3,"x",B1:B3)', cells) == 5.0
    assert evaluate('SUMIF(A1:A3,"y",B1:B3)', cells) == "#N/A"
    assert evaluate('COUNTIF(B1:B3,">0")', cells) == 2.0


def test_an_array_of_criteria_gives_an_array(evaluate: Any) -> None:
    cells = {"A1": "x", "A2": "y", "A3": "x"}
    assert evaluate('COUNTIF(A1:A3,{"x","y","z"})', cells) == [[2.0, 1.0, 0.0]]
    assert evaluate('SUM(COUNTIF(A1:A3,{"x","y","z"}))', cells) == 3.0
    assert evaluate("SUM(1/COUNTIF(A1:A3,A1:A3))", cells) == pytest.approx(2.0)


def test_a_criterion_of_more_than_255_characters_is_refused(evaluate: Any) -> None:
    assert evaluate('COUNTIF(A1:A2,REPT("x",256))') == "#VALUE!"
    with pytest.raises(Fail):
        read_criterion("x" * 256)


def test_criteria_want_a_range(evaluate: Any) -> None:
    assert evaluate('COUNTIF({1,2,3},">1")') == "#VALUE!"
