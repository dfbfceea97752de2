"""Evaluation as the spreadsheet does it: modes, references, chains, circles."""

from __future__ import annotations

import pytest

from tests.recalc.books import Block, at, book, fresh, result
from xleq.cells import BLANK, DIV0, NA, NAME, NULL, NUM, REF, SPILL, VALUE
from xleq.errors import InputError, LimitError
from xleq.workbook import Area, Calculation, DataTable, DefinedName, ExternalBook, Formula, FormulaKind, Table

COLUMN = {f"A{r}": r for r in range(1, 6)}


def test_a_plain_formula_takes_the_cell_of_its_row():
    got = fresh({**COLUMN, "B2": "=SUM(A1:A5*2)", "B3": "=A1:A5", "C9": "=A1:A5+1", "D2": '=A1:A5&"x"'})
    assert got == {"B2": 4.0, "B3": 3.0, "C9": VALUE, "D2": "2x"}


def test_an_array_formula_takes_the_whole_range():
    got = fresh({**COLUMN, "B2": Block("=SUM(A1:A5*2)", "B2"), "C1": "=SUMPRODUCT(A1:A5*2)"})
    assert got == {"B2": 30.0, "C1": 30.0}


def test_an_if_within_an_array_argument_stays_plain_in_a_plain_formula():
    wanted = "=SUMPRODUCT(IF(A1:A5>2,1,0))"
    got = fresh({**COLUMN, "B3": wanted, "B1": wanted, "B9": wanted, "C1": Block(wanted, "C1")})
    assert got == {"B3": 1.0, "B1": 0.0, "B9": VALUE, "C1": 3.0}
    assert fresh({**COLUMN, "B9": "=SUMPRODUCT(LEN(A1:A5)*(A1:A5>2))"}) == {"B9": 3.0}


def test_at_and_single_reduce_a_range_in_an_array_formula():
    got = fresh(
        {**COLUMN, "B2": Block("=@A1:A5*10", "B2", True), "B3": Block("=_xlfn.SINGLE(A1:A5)", "B3", True)}
    )
    assert got == {"B2": 20.0, "B3": 3.0}


def test_rows_and_columns_are_found_in_a_horizontal_range_too():
    assert fresh({"A1": 7, "B1": 8, "C1": 9, "B3": "=$A$1:$C$1*1", "A4": "=1:1"})["B3"] == 8.0


def test_an_array_formula_pads_with_not_available():
    got = fresh(
        {"A1": Block("={1,2;3,4}", "A1:C3"), "E1": Block("={1,2}", "E1:F2"), "H1": Block("=5", "H1:H2")}
    )
    assert [got[c] for c in ("A1", "B1", "C1", "A2", "B2", "C2", "A3")] == [1.0, 2.0, NA, 3.0, 4.0, NA, NA]
    assert [got[c] for c in ("E1", "F1", "E2", "F2", "H1", "H2")] == [1.0, 2.0, 1.0, 2.0, 5.0, 5.0]


def test_a_blank_result_is_zero_and_blanks_adapt():
    got = fresh({"B1": "=A1", "B2": '=A1=""', "B3": "=A1=0", "B4": '=A1&"x"', "B5": "=A1=FALSE"})
    assert got == {"B1": 0.0, "B2": True, "B3": True, "B4": "x", "B5": True}


@pytest.mark.parametrize(
    ("formula", "value"),
    [
        ("=0.1+0.2=0.3", True),
        ("=0.5-0.4-0.1", 0.0),
        ("=(0.5-0.4-0.1)", 0.5 - 0.4 - 0.1),
        ("=-2^2", 4.0),
        ("=2^3^2", 64.0),
        ("=50%+1", 1.5),
        ("=1=1=TRUE", True),
        ('="a"<"B"', True),
        ('="10"+5', 15.0),
        ("=TRUE+TRUE", 2.0),
        ('=2<"1"', True),
        ('="z"<FALSE', True),
        ('=1&2&TRUE', "12TRUE"),
        ("=1/3&\"\"", "0.333333333333333"),
        ("=1E-5*1E5", 1.0),
        ("=SUM((A1:A2,A4))", 7.0),
        ("=SUM(A1:A3 A2:A5)", 5.0),
        ("=SUM(A1:INDEX(A1:A5,3))", 6.0),
        ("=SUM(A1:OFFSET(A1,1,0):A3)", 6.0),
        ("=SUM(A:A)", 15.0),
        ("=SUM(2:5)", 14.0),
        ("=IF(FALSE,1)", False),
        ("=IF(TRUE,,5)", 0.0),
        ("=ROW()", 1.0),
        ("=INDIRECT(\"R2C1\",FALSE)", 2.0),
        ("=SUM(INDIRECT(\"A2:A3\"))", 5.0),
        ("=LET(x,A2,y,x*3,x+y)", 8.0),
        ("=LAMBDA(x,[y],IF(ISOMITTED(y),x,x+y))(5)", 5.0),
        ("=SUM(MAP(A1:A5,LAMBDA(v,v^2)))", 55.0),
        ("=REDUCE(1,A1:A5,LAMBDA(a,v,a*v))", 120.0),
        ("=SUM(SCAN(0,A1:A5,LAMBDA(a,v,a+v)))", 35.0),
        ("=SUM(BYROW(A1:A5,LAMBDA(r,MAX(r))))", 15.0),
        ("=SUM(BYCOL(A1:A5,_xleta.SUM))", 15.0),
        ("=SUM(MAKEARRAY(2,3,LAMBDA(r,c,r*c)))", 18.0),
    ],
)  # fmt: skip
def test_formula(formula, value):
    got = fresh({**COLUMN, "Z1": formula})["Z1"]
    assert got == value
    assert type(got) is type(value)


@pytest.mark.parametrize(
    ("formula", "error"),
    [
        ("=0^0", "#NUM!"), ("=1/0", "#DIV/0!"), ('="x"*1', "#VALUE!"), ("=A1:A2 B1:B2", "#NULL!"),
        ("=nothing", "#NAME?"), ("=Gone!A1", "#REF!"), ("=#REF!+1", "#REF!"), ("=1E300*1E300", "#NUM!"),
        ("=LAMBDA(x,x)", "#CALC!"), ("=INDIRECT(\"A1+1\")", "#REF!"), ("=LAMBDA(x,x)(1,2)", "#VALUE!"),
        ("=SIN(1,2)", "#VALUE!"),
    ],
)  # fmt: skip
def test_failure(formula, error):
    assert fresh({"Z1": formula})["Z1"].code == error


def test_an_error_tells_where_it_arose_and_why():
    error = fresh({"A1": "=1/B1", "A2": "=A1+1", "A3": "=SUM(A1:A2)"})["A3"]
    assert (error, error.origin, error.reason) == (DIV0, "S!A1", "divided by zero")


def test_an_error_that_is_stored_as_a_constant_has_its_own_address():
    assert fresh({"A1": NA, "A2": "=A1+1"})["A2"].origin == "S!A1"


FILLED = [
    "=A1*2", "=$A1+B$1", "=SUM(A:A)", "=SUM(1:1)", "=SUM($A$1:A1)", "=SUM(B$1:$C1)", "=IF(A1>2,\"A1\",B1)",
    "=ROW(A1)+COLUMN(A1)", "=INDEX($A:$C,2,1)+A2", "=COUNTIF($A$1:$C$3,\">\"&A1)", "=SUM(A:B)-SUM(2:3)",
    "=TEXT(A1,\"A1\")&\"50%\"&B2", "=LOG10(A1)", "='it''s A1'!A1+1", "=SUM(A1:B2,C$3)",
]  # fmt: skip


@pytest.mark.parametrize("formula", FILLED)
def test_a_filled_formula_equals_the_same_typed_cell_by_cell(formula):
    from openpyxl.formula.translate import Translator

    numbers = {"A1": 1, "B1": 2, "C1": 3, "A2": 4, "B2": 5, "C2": 6, "A3": 7, "B3": 8, "C3": 9}
    other = {f"{c}{r}": 10 * r + k for r in range(1, 9) for k, c in enumerate("ABCDEFGH")}
    cells = {}
    for row in range(11, 15):
        for column in "JKLM":
            cells[f"{column}{row}"] = Translator(formula, "J11").translate_formula(f"{column}{row}")
    together = fresh(book({"S": {**numbers, **cells}, "it's A1": other}))
    for address, text in cells.items():
        alone = fresh(book({"S": {**numbers, address: text}, "it's A1": other}))
        # what stands in whole rows and columns is the same in both: the fill lies outside them
        assert together[address] == alone[address], (address, text)


def test_a_shared_group_is_the_same_as_its_cells_typed_out():
    shared = {f"B{r}": Formula("A1*2+$A$1", (1, 2), group=0) for r in range(1, 6)}
    assert fresh({**COLUMN, **shared}) == {f"B{r}": 2.0 * r + 1.0 for r in range(1, 6)}


def test_a_chain_of_100_000_cells_from_the_bottom_up_is_evaluated():
    n = 100_000
    cells = {f"A{r}": f"=A{r + 1}+1" for r in range(1, n)}
    got = fresh({**cells, f"A{n}": 5})
    assert got["A1"] == n + 4


def test_a_branch_not_taken_is_no_circle():
    assert fresh({"A1": "=IF(TRUE,1,A1)", "B1": "=IF(C1,B1,2)", "C1": False}) == {"A1": 1.0, "B1": 2.0}


def test_a_circle_is_kept_and_named():
    done = result(
        book({"S": {"A1": "=B1+1", "B1": "=A1*2", "C1": "=B1", "D1": "=1"}}, {"S!A1": 7.0, "S!B1": 14.0})
    )
    reasons = {k.address: k.reason for k in done.kept}
    assert "circular reference" in reasons[at("A1")]
    assert "circular reference" in reasons[at("B1")]
    assert reasons[at("C1")] == "depends on S!B1"
    assert done.values == {at("D1"): 1.0}


def test_a_circle_is_iterated_where_the_file_says_so():
    cells = {"A1": "=B1/2+1", "B1": "=A1", "C1": "=B1*10"}
    got = fresh(book({"S": cells}, calculation=Calculation(iterate=True, max_change=1e-9)))
    assert got["A1"] == pytest.approx(2.0, abs=1e-8)
    assert got["C1"] == pytest.approx(20.0, abs=1e-7)


def test_local_names_come_before_global_ones():
    names = (DefinedName("k", "10"), DefinedName("k", "20", scope=1), DefinedName("twice", "S!$A$1*2"))
    got = fresh(book({"S": {"A1": 3, "B1": "=K+1", "B2": "=twice"}, "T": {"A1": "=k"}}, names=names))
    assert got == {"B1": 11.0, "B2": 6.0, "T!A1": 20.0}


def test_a_relative_name_moves_with_the_formula():
    names = (DefinedName("left", "S!XFD1"), DefinedName("above", "S!A1048576"))
    got = fresh(book({"S": {"A1": 5, "B1": "=left*2", "C1": "=left+1", "A2": "=above+1"}}, names=names))
    assert got == {"B1": 10.0, "C1": 11.0, "A2": 6.0}


def test_a_name_may_be_a_recursive_function():
    names = (DefinedName("fact", "_xlfn.LAMBDA(_xlpm.n,IF(_xlpm.n<2,1,_xlpm.n*fact(_xlpm.n-1)))"),)
    assert fresh(book({"S": {"A1": "=fact(6)"}}, names=names)) == {"A1": 720.0}


def test_structured_references_take_all_forms():
    table = Table("Feed", 0, Area(1, 1, 5, 3), 1, 1, ("Species", "n [mol", "x"))
    cells = {
        "A1": "Species", "B1": "n [mol", "C1": "x", "A2": "N2", "B2": 1,
        "C2": "=Feed[[#This Row],[n '[mol]]*2",
        "A3": "H2", "B3": 3, "C3": "=[@x]+[@[n '[mol]]", "A4": "NH3", "B4": 0, "A5": "Sum",
        "B5": "=SUM(Feed[n '[mol])", "E1": "=Feed[[#Headers],[x]]", "E2": "=Feed[[#Totals],[n '[mol]]",
        "E3": "=ROWS(Feed[#All])", "E4": "=ROWS(Feed)", "E5": "=COLUMNS(Feed[[Species]:[n '[mol]])",
        "E6": "=SUM(Feed[[#Data],[n '[mol]])", "E7": "=Feed[nope]",
        "E8": "=ROWS(Feed[[#Headers],[#Data]])", "E9": "=Feed[[#This Row],[x]]", "F3": "=Feed[n '[mol]",
    }  # fmt: skip
    done = result(book({"S": cells}, tables=(table,)))
    got = {str(a).removeprefix("S!"): v for a, v in done.values.items()}
    assert [got[c] for c in ("C2", "B5", "E1", "E2", "E3", "E4")] == [2.0, 4.0, "x", 4.0, 5.0, 3.0]
    assert [got[c] for c in ("E5", "E6", "E7", "E8", "E9", "F3")] == [2.0, 4.0, REF, 4.0, VALUE, 3.0]
    assert "circular" in next(k.reason for k in done.kept if k.address == at("C3"))


def test_three_dimensional_references_go_from_sheet_to_sheet():
    sheets = {"S": {"A1": "=SUM(Jan:Mar!A1:A2)", "A2": "=SUM('Jan:Mar'!B1)"}}
    months = {m: {"A1": k, "A2": 10, "B1": 1} for k, m in enumerate(("Jan", "Feb", "Mar"))}
    assert fresh(book({**sheets, **months})) == {"A1": 33.0, "A2": 3.0}


def test_linked_books_are_read_from_the_values_in_the_file():
    link = ExternalBook(1, "other.xlsx", ("Data",), {("Data", 1, 1): 4.0}, {"rate": "Data!$A$1", "add": ""})
    cells = {
        "A1": "=[1]Data!A1*2",
        "A2": "=[1]!rate+1",
        "A3": "=[1]!add(1)",
        "A4": "=[2]Data!A1",
        "A5": "=A4+1",
    }
    done = result(book({"S": cells}, links=(link,)))
    assert done.values == {at("A1"): 8.0, at("A2"): 5.0}
    assert [k.address for k in done.kept] == [at("A3"), at("A4"), at("A5")]


def test_a_spill_grows_shrinks_and_is_blocked():
    grows = {
        "A1": Block("=_xlfn.SEQUENCE(3)", "A1", True),
        "C1": "=SUM(A1:A3)",
        "C2": "=COUNT(A1#)",
        "C3": "=COUNTA(A:A)",
    }
    done = result(grows)
    assert [done.values[at(c)] for c in ("A1", "A2", "A3", "C1", "C2", "C3")] == [
        1.0,
        2.0,
        3.0,
        6.0,
        3.0,
        3.0,
    ]
    assert done.results[0].areas == {(1, 1): Area(1, 1, 3, 1)}
    shrinks = book(
        {"S": {"A1": Block("=_xlfn.SEQUENCE(2)", "A1:A3", True)}}, {"S!A1": 1.0, "S!A2": 2.0, "S!A3": 3.0}
    )
    done = result(shrinks)
    assert done.values[at("A3")] is BLANK
    assert done.results[0].areas == {(1, 1): Area(1, 1, 2, 1)}
    blocked = result({"A1": Block("=_xlfn.SEQUENCE(3)", "A1", True), "A3": 9, "B1": "=A1"})
    assert blocked.values[at("A1")] == SPILL
    assert "S!A3" in blocked.values[at("A1")].reason
    assert blocked.values[at("B1")] == SPILL


def test_two_spills_that_meet_do_not_overwrite_each_other():
    got = fresh({"A1": Block("=_xlfn.SEQUENCE(3)", "A1", True), "A3": Block("={7;8}", "A3", True)})
    assert (got["A1"], got["A3"], got["A4"]) == (SPILL, 7.0, 8.0)


def test_a_data_table_evaluates_its_formula_for_every_input():
    one = Formula(
        None,
        (4, 2),
        FormulaKind.DATA_TABLE,
        Area(4, 2, 6, 2),
        table=DataTable(False, False, "A1", "", False, False),
    )
    two = Formula(
        None,
        (10, 2),
        FormulaKind.DATA_TABLE,
        Area(10, 2, 11, 3),
        table=DataTable(True, False, "A1", "A2", False, False),
    )
    cells = {
        "A1": 2, "A2": 5, "C1": "=A1*10+A2", "B3": "=C1", "A4": 1, "A5": 2, "A6": 3, "B4": one,
        "A9": "=C1", "B9": 7, "C9": 8, "A10": 100, "A11": 200, "B10": two,
    }  # fmt: skip
    got = fresh(cells)
    assert [got[c] for c in ("B4", "B5", "B6")] == [15.0, 25.0, 35.0]
    assert [got[c] for c in ("B10", "C10", "B11", "C11")] == [170.0, 180.0, 270.0, 280.0]


def test_an_unknown_function_keeps_its_cell_and_what_depends_on_it():
    cells = {"A1": "=ACME(1)+1", "B1": "=A1*2", "C1": "=IF(TRUE,1,A1)", "D1": "=SUM(A1:B1)"}
    done = result(book({"S": cells}, {"S!A1": 3.0, "S!B1": 6.0}))
    assert [(k.address, k.reason) for k in done.kept] == [
        (at("A1"), "the function ACME is not known"),
        (at("B1"), "depends on S!A1"),
        (at("D1"), "depends on S!A1"),
    ]
    assert done.values == {at("C1"): 1.0}


def test_text_that_is_no_formula_is_kept_with_the_position():
    done = result({"A1": "=1+*2", "A2": "=SUM(1"})
    assert "position 3" in done.kept[0].reason
    assert "position 6" in done.kept[1].reason


def test_worksheet_functions_get_values_rows_and_missing():
    seen = []

    def probe(arguments):
        seen.append(arguments)
        return [[1.0, 2.0], [3.0, "x"]]

    cells = {**COLUMN, "C1": Block('=probe(A1,A1:A2,,"t",B9)', "C1", True), "F1": "=_xll.PROBE()*2"}
    got = fresh(cells, functions={"PROBE": probe})
    assert len(seen[0]) == 5
    assert (seen[0][0], seen[0][1], seen[0][3], seen[0][4]) == (1.0, [[1.0], [2.0]], "t", BLANK)
    assert repr(seen[0][2]) == "MISSING"
    assert [got[c] for c in ("C1", "D1", "C2", "D2", "F1")] == [1.0, 2.0, 3.0, "x", 2.0]


def test_an_override_changes_what_depends_on_it_and_a_formula_is_refused():
    made = book({"S": {"A1": 2, "B1": "=A1*3", "C1": "=5"}}, {"S!B1": 6.0, "S!C1": 5.0})
    done = result(made, overrides={at("A1"): 4.0, at("A9"): 1.0})
    assert [(c.address, c.stored, c.fresh) for c in done.changed] == [(at("B1"), 6.0, 12.0)]
    assert done.results[0].inputs == {(1, 1): 4.0, (9, 1): 1.0}
    with pytest.raises(InputError, match="holds a formula"):
        result(made, overrides={at("B1"): 1.0})


def test_time_is_limited():
    cells = {f"A{r}": "=SUM(B1:B2)" for r in range(1, 3000)}
    with pytest.raises(LimitError, match=r"the limit .seconds. is 0"):
        result(cells, seconds=0.0)


def test_names_of_nothing_and_empty_intersections_are_errors():
    assert fresh({"A1": "=unknown_name", "A2": "=C1:C2 D1:D2"}) == {"A1": NAME, "A2": NULL}


def test_precedents_are_what_a_formula_names():
    from xleq.recalc import Precedents

    names = (DefinedName("rate", "T!$B$2"), DefinedName("twice", "S!$C$3*rate"))
    table = Table("Feed", 1, Area(1, 1, 3, 1), 1, 0, ("n",))
    cells = {"A1": "=IF(B1>0,SUM(C:C),twice)+T!A1:B2+SUM(Feed[n])", "A2": 5, "A3": "=1+"}
    found = Precedents(book({"S": cells, "T": {"A1": "n"}}, names=names, tables=(table,)))
    assert [(n.sheet, tuple(n.area)) for n in found.of(at("A1"))] == [
        ("S", (1, 2, 1, 2)), ("S", (1, 3, 1048576, 3)), ("S", (3, 3, 3, 3)), ("T", (2, 2, 2, 2)),
        ("T", (1, 1, 2, 2)), ("T", (2, 1, 3, 1)),
    ]  # fmt: skip
    assert found.of(at("A2")) == found.of(at("A3")) == []
    assert found.tree(at("A2")) is None


def test_the_longest_sum_is_evaluated_and_its_precedents_told():
    from xleq.recalc import Precedents, evaluate_text

    text = "=" + "+".join(["A1"] * 2700)
    made = book({"S": {"A1": 1, "B1": text, "B2": "=" + "-1" * 4000}})
    assert fresh(made) == {"B1": 2700.0, "B2": -4000.0}
    assert evaluate_text("=" + "1+" * 4000 + "1") == 4001.0
    assert len(Precedents(made).of(at("B1"))) == 1


def test_a_function_that_calls_itself_without_end_is_an_error():
    names = (DefinedName("down", "_xlfn.LAMBDA(_xlpm.n,IF(_xlpm.n=0,0,1+down(_xlpm.n-1)))"),)
    got = fresh(book({"S": {"A1": "=down(-1)", "A2": "=down(400)"}}, names=names))
    assert (got["A1"].code, got["A2"]) == ("#NUM!", 400.0)


@pytest.mark.parametrize(
    ("formula", "code", "reason"),
    [
        ("=LN(-1)", "#NUM!", "LN gives no value for these arguments"),
        ('=LN("-1")', "#NUM!", "LN gives no value for these arguments"),
        ("=EXP(1000)", "#NUM!", "EXP gives no value for these arguments"),
        ("=MOD(1,0)", "#DIV/0!", "MOD divides by zero with these arguments"),
        ("=SUM(SQRT({4,-1}))", "#NUM!", "SQRT gives no value for these arguments"),
        ("=IRR({1,1,1})", "#NUM!", "IRR gives no value for these arguments"),
        ("=AVERAGE(A1:A3)", "#DIV/0!", "AVERAGE divides by zero with these arguments"),
        ('=MATCH("x",{"a","b"},0)', "#N/A", "the value is not found"),
        ("=POWER(-8,0.3)", "#NUM!", "POWER gives no value for these arguments"),
        ('=LN("x")', "#VALUE!", "'x' is not a number"),
    ],
)
def test_errors_of_native_functions_have_a_reason(formula, code, reason):
    found = fresh({"B1": formula})["B1"]
    assert (found.code, found.reason) == (code, reason)


@pytest.mark.parametrize(
    "formula",
    ["=LN(A1)", "=SUM(A1:A3)", "=SUM(A1:A100)", "=NA()", "=LN(#NUM!)", "=ABS(LN(A1))", "=MAX({1,#NUM!})"],
)
def test_an_error_that_came_with_the_arguments_is_not_blamed_on_the_function(formula):
    assert fresh({"A1": NUM, "B1": formula})["B1"].reason == ""
    from_a_formula = fresh({"A1": "=LN(-1)", "B1": "=SQRT(A1)"})["B1"]
    assert (from_a_formula.reason, from_a_formula.origin) == ("LN gives no value for these arguments", "S!A1")
