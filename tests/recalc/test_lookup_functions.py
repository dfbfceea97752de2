"""Special cases of the lookup and reference functions.

Expected values agree with LibreOffice 25.2 where it has the function and follows the same rule.
"""

import pytest

from tests.recalc.formulas import shown
from xleq.errors import FormulaError
from xleq.recalc import evaluate_text


@pytest.mark.parametrize(
    ("formula", "value"),
    [
        ("=MATCH(2,{1,2,2,3})", 3.0),
        ("=MATCH(2,{1,2,2,3},0)", 2.0),
        ("=MATCH(2.5,{1,2,2,3})", 3.0),
        ("=MATCH(0,{1,2,2,3})", "#N/A"),
        ("=MATCH(2,{3,2,1},-1)", 2.0),
        ("=MATCH(2.5,{3,2,1},-1)", 1.0),
        ("=MATCH(4,{3,2,1},-1)", "#N/A"),
        ("=MATCH(1,{1,2;3,4},0)", "#N/A"),
    ],
)
def test_match_takes_the_last_of_equal_values_in_order(formula, value):
    assert shown(formula) == value


@pytest.mark.parametrize(
    ("formula", "value"),
    [
        ("=MATCH(TRUE,{1,TRUE},0)", 2.0),
        ('=MATCH(1,{"1",1},0)', 2.0),
        ('=MATCH("B",{"a","b"},0)', 2.0),
        ('=MATCH(5,{"b",1,"c",7},1)', 2.0),
        ("=LOOKUP(2,1/({1,0,1,0}=1),{10,20,30,40})", 30.0),
    ],
)
def test_only_values_of_the_same_kind_match(formula, value):
    assert shown(formula) == value


@pytest.mark.parametrize(
    ("formula", "value"),
    [
        ('=MATCH("b*",{"abc","bcd","b"},0)', 2.0),
        ('=VLOOKUP("?",{"a",1;"b",2},2,FALSE)', 1.0),
        ('=MATCH("~*",{"a","*"},0)', 2.0),
        ('=MATCH("*c",{"ab","abc"},0)', 2.0),
        ('=XLOOKUP("b*",{"abc","bcd","be"},{1,2,3},,2,-1)', 3.0),
        ('=XLOOKUP("b*",{"abc","bcd"},{1,2})', "#N/A"),
        ('=XMATCH("^b",{"ab","bc"},3)', 2.0),
    ],
)
def test_wildcards_match_whole_texts(formula, value):
    assert shown(formula) == value


@pytest.mark.parametrize(
    ("formula", "value"),
    [
        ('=VLOOKUP(2,{1,"a";2,"b"},3)', "#REF!"),
        ('=VLOOKUP(2,{1,"a";2,"b"},0)', "#VALUE!"),
        ('=HLOOKUP("b",{"a","b";1,2},2,FALSE)', 2.0),
        ('=VLOOKUP(2.5,{1,"a";2,"b";3,"c"},2)', "b"),
        ('=VLOOKUP(2.5,{1,"a";2,"b"},2,FALSE)', "#N/A"),
        ('=VLOOKUP(1,"x",1)', "#VALUE!"),
    ],
)
def test_a_column_outside_the_table_is_an_error_of_its_kind(formula, value):
    assert shown(formula) == value


@pytest.mark.parametrize(
    ("formula", "value"),
    [
        ("=LOOKUP(1,{1,2;3,4;5,6})", 2.0),
        ("=LOOKUP(2,{1,2,3;7,8,9})", 8.0),
        ('=LOOKUP(2.5,{1,2,3},{"a";"b";"c"})', "b"),
    ],
)
def test_lookup_takes_the_longer_side(formula, value):
    assert shown(formula) == value


@pytest.mark.parametrize(
    ("formula", "value"),
    [
        ('=XLOOKUP(2,{1,2,3},{"a","b","c"})', "b"),
        ('=XLOOKUP(5,{1,2,3},{"a","b","c"},"none")', "none"),
        ('=XLOOKUP(2.5,{1,2,3},{"a","b","c"},,-1)', "b"),
        ('=XLOOKUP(2.5,{1,2,3},{"a","b","c"},,1)', "c"),
        ("=XLOOKUP(2,{1,2,2,3},{1,2,3,4},,0,-1)", 3.0),
        ('=XLOOKUP(9,{1,"a",TRUE},{1,2,3},,1)', 2.0),
        ("=XLOOKUP(1,{1,2},{1,2,3})", "#VALUE!"),
        ("=XLOOKUP(1,{1,2},{3,4},,2,2)", "#VALUE!"),
        ('=XLOOKUP(2,{1;2},{1,"x";2,"y"})', [[2.0, "y"]]),
        ('=XLOOKUP({1,3},{1,2,3},{"a","b","c"})', [["a", "c"]]),
    ],
)
def test_xlookup_finds_exactly_or_the_next_one_from_either_end(formula, value):
    assert shown(formula) == value


@pytest.mark.parametrize(
    ("formula", "value"),
    [
        ("=XMATCH(2,{1,2,3},0,2)", 2.0),
        ("=XMATCH(2.5,{3,2,1},-1,-2)", 2.0),
        ("=XMATCH(2.5,{3,2,1},1,-2)", 1.0),
        ("=XMATCH(2.5,{1,2,3},0,2)", "#N/A"),
        ('=XMATCH("z",{"a","b"})', "#N/A"),
    ],
)
def test_xmatch_bisects_lists_in_order(formula, value):
    assert shown(formula) == value


@pytest.mark.parametrize(
    ("formula", "value"),
    [
        ("=INDEX({1,2;3,4},2,1)", 3.0),
        ("=INDEX({1,2;3,4},3,1)", "#REF!"),
        ("=INDEX({1,2;3,4},0,2)", [[2.0], [4.0]]),
        ("=INDEX({1,2,3},2)", 2.0),
        ("=INDEX({1;2;3},2)", 2.0),
        ("=INDEX({1,2;3,4},-1)", "#VALUE!"),
        ("=INDEX({1,2;3,4},1,1,2)", "#REF!"),
        ("=ROW(INDEX(B2:C9,3,1))", 4.0),
        ("=COLUMNS(INDEX(B2:D9,3,0))", 3.0),
    ],
)
def test_index_gives_cells_rows_and_columns(formula, value):
    assert shown(formula) == value


@pytest.mark.parametrize(
    ("formula", "value"),
    [
        ("=ROW(OFFSET(D3,3,-2))", 6.0),
        ("=COLUMN(OFFSET(D3,3,-2))", 2.0),
        ("=ROWS(OFFSET(A1:B2,1,1,5))", 5.0),
        ("=ROW(OFFSET(D5,0,0,-3,1))", [[3.0], [4.0], [5.0]]),
        ("=OFFSET(A1,-1,0)", "#REF!"),
        ("=OFFSET(A1,0,0,0)", "#REF!"),
        ('=ROW(INDIRECT("B7"))', 7.0),
        ('=ROW(INDIRECT("R3C2",FALSE))', 3.0),
        ('=INDIRECT("no such thing")', "#REF!"),
        ("=ROWS(A:A)", 1048576.0),
        ("=AREAS((A1:B2,C3))", 2.0),
        ("=ROW(B3:B5)", [[3.0], [4.0], [5.0]]),
        ("=COLUMN(B3:D3)", [[2.0, 3.0, 4.0]]),
    ],
)
def test_references_move_and_are_named(formula, value):
    assert shown(formula) == value


@pytest.mark.parametrize(
    ("formula", "value"),
    [
        ("=ADDRESS(1,1,4)", "A1"),
        ('=ADDRESS(1,27,1,TRUE,"My Sheet")', "'My Sheet'!$AA$1"),
        ("=ADDRESS(5,3,3,FALSE)", "R[5]C3"),
        ("=ADDRESS(0,1)", "#VALUE!"),
        ("=ADDRESS(1,1,5)", "#VALUE!"),
        ('=ADDRESS(1,1,,,"S")', "S!$A$1"),
    ],
)
def test_addresses_quote_sheets_that_need_it(formula, value):
    assert shown(formula) == value


@pytest.mark.parametrize(
    ("formula", "value"),
    [
        ('=CHOOSE(2,1/0,"b","c")', "b"),
        ('=CHOOSE(4,"a","b","c")', "#VALUE!"),
        ('=CHOOSE(2.9,"a","b","c")', "b"),
        ("=CHOOSE({1,2},{1;2},{10;20})", [[1.0, 10.0], [2.0, 20.0]]),
        ('=VLOOKUP("y",CHOOSE({1,2},{"x";"y"},{5;6}),2,0)', 6.0),
    ],
)
def test_choose_evaluates_what_it_takes(formula, value):
    assert shown(formula) == value


@pytest.mark.parametrize(
    ("formula", "value"),
    [
        ('=HYPERLINK("http://x.invalid","shown")', "shown"),
        ('=HYPERLINK("http://x.invalid")', "http://x.invalid"),
    ],
)
def test_a_link_shows_its_second_argument(formula, value):
    assert shown(formula) == value


@pytest.mark.parametrize(
    "formula", ['=WEBSERVICE("http://x.invalid")', '=GETPIVOTDATA("a",A1)', '=RTD("a",,"b")']
)
def test_what_reaches_outside_the_cells_is_refused_with_a_reason(formula):
    with pytest.raises(FormulaError, match="is not computed: it "):
        evaluate_text(formula)


@pytest.mark.parametrize(
    ("formula", "value"),
    [
        ("=MATCH(500,SEQUENCE(1000),0)", 500.0),
        ("=MATCH(0,SEQUENCE(1000),0)", "#N/A"),
        ("=MATCH(500.5,SEQUENCE(1000))", 500.0),
        ("=MATCH(500.5,SEQUENCE(1000,1,1000,-1),-1)", 500.0),
        ('=MATCH("X500","x"&SEQUENCE(1000),0)', 500.0),
        ('=MATCH("x*99","x"&SEQUENCE(1000),0)', 99.0),
        ('=MATCH("x?99","x"&SEQUENCE(1000),0)', 199.0),
        ("=MATCH(5,IF(SEQUENCE(1000)>100,5,1))", 1000.0),
        ("=MATCH(3,MOD(SEQUENCE(1000),10),0)", 3.0),
        ("=XMATCH(3,MOD(SEQUENCE(1000),10),0,-1)", 993.0),
        ("=XMATCH(500.5,SEQUENCE(1000),-1)", 500.0),
        ("=XMATCH(500.5,SEQUENCE(1000),1)", 501.0),
        ("=XMATCH(500,SEQUENCE(1000),0,2)", 500.0),
        ("=XMATCH(500,SEQUENCE(1000,1,1000,-1),0,-2)", 501.0),
        ('=XMATCH("x99*","x"&SEQUENCE(1000),2,-1)', 999.0),
        ("=SUM(XLOOKUP(SEQUENCE(1000),SEQUENCE(1000),SEQUENCE(1000)^2))", 333833500.0),
        ('=MATCH(7,IF(MOD(SEQUENCE(1000),2),"t",SEQUENCE(1000)))', 6.0),
    ],
)
def test_long_lists_are_searched_as_short_ones_are(formula, value):
    assert shown(formula) == value
