"""Special cases of the logic, information and array functions.

Expected values agree with LibreOffice 25.2 where it has the function and follows the same rule.
"""

import pytest

from tests.recalc.formulas import shown


@pytest.mark.parametrize(
    ("formula", "value"),
    [
        ("=IF(TRUE,1,1/0)", 1.0),
        ("=IF(FALSE,1/0)", False),
        ("=IF(1/0,1,2)", "#DIV/0!"),
        ('=IF("TRUE",1,2)', 1.0),
        ('=IF("x",1,2)', "#VALUE!"),
        ('=IF(0.1,"y","n")', "y"),
        ("=IFS(FALSE,1/0,TRUE,2)", 2.0),
        ("=IFS(FALSE,1)", "#N/A"),
        ('=SWITCH(2,1,1/0,2,"b")', "b"),
        ('=SWITCH("B","a",1,"b",2)', 2.0),
        ("=IFERROR(5,1/0)", 5.0),
        ('=IFNA(1/0,"n")', "#DIV/0!"),
    ],
)
def test_only_the_branch_that_is_taken_is_evaluated(formula, value):
    assert shown(formula) == value


@pytest.mark.parametrize(
    ("formula", "value"),
    [
        ("=IF({1,0,1},{10,20,30},{1,2,3})", [[10.0, 2.0, 30.0]]),
        ("=IF({1;0},{10,20},1)", [[10.0, 20.0], [1.0, 1.0]]),
        ("=IFERROR({1,2,3}/{1,0,1},100)", [[1.0, 100.0, 3.0]]),
        ('=IFS({1,0},"a",TRUE,"b")', [["a", "b"]]),
        ('=SWITCH({1,2,3},1,"a",2,"b","c")', [["a", "b", "c"]]),
        ("=IF({1,1,1},{1,2})", [[1.0, 2.0, "#N/A"]]),
    ],
)
def test_each_element_of_an_array_chooses_for_itself(formula, value):
    assert shown(formula) == value


@pytest.mark.parametrize(
    ("formula", "value"),
    [
        ("=AND(1,2,3)", True),
        ("=AND(TRUE,0)", False),
        ("=OR({0,0})", False),
        ("=OR(FALSE,1/0)", "#DIV/0!"),
        ("=XOR(TRUE,TRUE,TRUE)", True),
        ('=AND("TRUE")', True),
        ('=AND("x")', "#VALUE!"),
        ('=OR("",TRUE)', True),
        ('=AND({"x",1})', True),
        ('=NOT("TRUE")', False),
    ],
)
def test_logicals_come_from_numbers_and_words(formula, value):
    assert shown(formula) == value


@pytest.mark.parametrize(
    ("formula", "value"),
    [
        ('=ISNUMBER("1")', False),
        ('=ISTEXT("")', True),
        ("=ISBLANK(A1)", True),
        ('=ISBLANK("")', False),
        ("=ISERR(NA())", False),
        ("=ISNA(NA())", True),
        ("=ISREF(A1)", True),
        ("=ISREF(1)", False),
        ('=ISEVEN("4")', True),
        ("=ISEVEN(TRUE)", "#VALUE!"),
        ("=ISODD(-3.9)", True),
        ("=TYPE(TRUE)", 4.0),
        ("=TYPE(NA())", 16.0),
        ("=ERROR.TYPE(1)", "#N/A"),
        ('=ISNUMBER({1,"a"})', [[True, False]]),
    ],
)
def test_kinds_are_told_apart(formula, value):
    assert shown(formula) == value


@pytest.mark.parametrize(
    ("formula", "value"),
    [
        ("=SEQUENCE(2,3,10,5)", [[10.0, 15.0, 20.0], [25.0, 30.0, 35.0]]),
        ("=SEQUENCE(0)", "#CALC!"),
        ("=FILTER({1,2,3},{1,0,1})", [[1.0, 3.0]]),
        ('=FILTER({1,2},{0,0},"no")', "no"),
        ("=FILTER({1,2},{0,0})", "#CALC!"),
        ("=FILTER({1;2},{1,0})", "#VALUE!"),
    ],
)
def test_arrays_are_made_and_filtered(formula, value):
    assert shown(formula) == value


@pytest.mark.parametrize(
    ("formula", "value"),
    [
        ("=SORT({3;1;2})", [[1.0], [2.0], [3.0]]),
        ("=SORT({3;1;2},1,-1)", [[3.0], [2.0], [1.0]]),
        ('=SORT({"b";2;TRUE;"A"})', [[2.0], ["A"], ["b"], [True]]),
        ("=SORT({3,1,2},1,1,TRUE)", [[1.0, 2.0, 3.0]]),
        ('=SORT({1,"b";1,"a";0,"c"},{1,2})', [[0.0, "c"], [1.0, "a"], [1.0, "b"]]),
        ('=SORTBY({"a";"b";"c"},{3;1;2})', [["b"], ["c"], ["a"]]),
        ('=SORTBY({"a";"b";"c"},{1;1;0},-1)', [["a"], ["b"], ["c"]]),
        ("=SORT({1;2},3)", "#VALUE!"),
    ],
)
def test_arrays_sort_by_kind_and_keep_the_order_of_equals(formula, value):
    assert shown(formula) == value


@pytest.mark.parametrize(
    ("formula", "value"),
    [
        ("=UNIQUE({1;2;2;3})", [[1.0], [2.0], [3.0]]),
        ("=UNIQUE({1;2;2;3},FALSE,TRUE)", [[1.0], [3.0]]),
        ('=UNIQUE({"a";"A";"b"})', [["a"], ["b"]]),
        ("=UNIQUE({1,1,2},TRUE)", [[1.0, 2.0]]),
        ("=UNIQUE({1;1},,TRUE)", "#CALC!"),
    ],
)
def test_unique_values_ignore_case(formula, value):
    assert shown(formula) == value


@pytest.mark.parametrize(
    ("formula", "value"),
    [
        ("=TAKE({1,2;3,4;5,6},-2)", [[3.0, 4.0], [5.0, 6.0]]),
        ("=TAKE({1,2;3,4},,1)", [[1.0], [3.0]]),
        ("=TAKE({1,2},0)", "#CALC!"),
        ("=DROP({1,2;3,4;5,6},1)", [[3.0, 4.0], [5.0, 6.0]]),
        ("=DROP({1,2;3,4},,-1)", [[1.0], [3.0]]),
        ("=DROP({1,2},1)", "#CALC!"),
        ("=CHOOSECOLS({1,2,3},-1,1)", [[3.0, 1.0]]),
        ("=CHOOSEROWS({1;2;3},{3,1})", [[3.0], [1.0]]),
        ("=CHOOSECOLS({1,2},3)", "#VALUE!"),
        ("=HSTACK({1;2},3)", [[1.0, 3.0], [2.0, "#N/A"]]),
        ("=VSTACK({1,2},3)", [[1.0, 2.0], [3.0, "#N/A"]]),
        ("=EXPAND({1,2},2,3,0)", [[1.0, 2.0, 0.0], [0.0, 0.0, 0.0]]),
        ("=EXPAND({1,2},1,1)", "#VALUE!"),
    ],
)
def test_arrays_are_cut_and_put_together(formula, value):
    assert shown(formula) == value


@pytest.mark.parametrize(
    ("formula", "value"),
    [
        ("=TOCOL({1,2;3,4})", [[1.0], [2.0], [3.0], [4.0]]),
        ("=TOROW({1,2;3,4},0,TRUE)", [[1.0, 3.0, 2.0, 4.0]]),
        ("=TOCOL({1,#N/A},2)", [[1.0]]),
        ("=WRAPROWS({1,2,3},2)", [[1.0, 2.0], [3.0, "#N/A"]]),
        ("=WRAPCOLS({1,2,3},2,0)", [[1.0, 3.0], [2.0, 0.0]]),
        ("=WRAPROWS({1,2;3,4},2)", "#VALUE!"),
        ("=WRAPROWS({1,2},0)", "#NUM!"),
        ("=TRANSPOSE({1,2;3,4})", [[1.0, 3.0], [2.0, 4.0]]),
    ],
)
def test_arrays_are_strung_and_wrapped(formula, value):
    assert shown(formula) == value
