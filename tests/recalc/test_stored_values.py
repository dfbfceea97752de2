"""The stored-value check: what is kept, marked, changed and reported."""

from __future__ import annotations

from tests.recalc.books import Block, at, book, result
from xleq.cells import BLANK
from xleq.workbook import Calculation

CELLS = {"A1": 2, "B1": "=A1*3", "C1": "=B1+1", "D1": "=A1+100"}
WRONG = {"S!B1": 7.0, "S!C1": 8.0, "S!D1": 102.0}


def test_a_formula_that_disagrees_keeps_its_stored_value_and_marks_what_depends_on_it():
    done = result(book({"S": CELLS}, WRONG))
    assert [(d.address, d.stored, d.fresh) for d in done.disagreements] == [(at("B1"), 7.0, 6.0)]
    assert done.changed == []
    assert done.values[at("B1")] == 7.0
    assert [(m.address, m.because) for m in done.marked] == [(at("C1"), at("B1"))]


def test_fresh_values_are_taken_when_they_are_trusted():
    done = result(book({"S": CELLS}, WRONG), trust_fresh=True)
    assert {c.address: c.fresh for c in done.changed} == {at("B1"): 6.0, at("C1"): 7.0}
    assert done.disagreements == []


def test_a_file_that_asks_to_be_calculated_does_not_vouch_for_its_values():
    done = result(book({"S": CELLS}, WRONG, calculation=Calculation(full_calc_on_load=True)))
    assert [c.address for c in done.changed] == [at("B1"), at("C1")]


def test_where_the_inputs_changed_the_fresh_value_is_taken_and_the_check_uses_the_stored_inputs():
    done = result(book({"S": CELLS}, WRONG), overrides={at("A1"): 3.0})
    assert {c.address: c.fresh for c in done.changed} == {at("B1"): 9.0, at("C1"): 10.0, at("D1"): 103.0}
    assert [(d.address, d.stored, d.fresh) for d in done.disagreements] == [(at("B1"), 7.0, 6.0)]


def test_the_last_digits_of_a_stored_value_are_left_alone():
    done = result(book({"S": {"A1": "=1/3"}}, {"S!A1": 0.33333333333333337}))
    assert (done.changed, done.disagreements) == ([], [])
    assert done.values[at("A1")] == 0.33333333333333337


def test_small_numbers_are_compared_by_their_own_size():
    done = result(book({"S": {"A1": "=1E-14*2"}}, {"S!A1": 1e-14}))
    assert [d.address for d in done.disagreements] == [at("A1")]


def test_volatile_formulas_change_without_being_reported_and_their_dependents_follow():
    cells = {"A1": "=TODAY()", "B1": "=A1+1", "C1": "=RAND()"}
    done = result(book({"S": cells}, {"S!A1": 1.0, "S!B1": 2.0, "S!C1": 0.5}))
    assert done.disagreements == []
    assert [c.address for c in done.changed] == [at("A1"), at("B1"), at("C1")]
    assert done.followed == [at("B1")]


def test_worksheet_functions_that_were_passed_in_are_not_checked():
    made = book({"S": {"A1": "=XLEQ_TWO()", "B1": "=A1*2"}}, {"S!A1": 3.0, "S!B1": 6.0})
    done = result(made, functions={"XLEQ_TWO": lambda _: 2.0})
    assert {c.address: c.fresh for c in done.changed} == {at("A1"): 2.0, at("B1"): 4.0}
    assert done.disagreements == []


def test_a_change_that_does_not_matter_stops_there():
    made = book({"S": {"A1": 2, "B1": "=A1>0", "C1": "=IF(B1,5,6)"}}, {"S!B1": True, "S!C1": 5.0})
    done = result(made, overrides={at("A1"): 3.0})
    assert done.changed == []
    assert done.followed == [at("B1")]


def test_a_range_knows_that_one_of_its_cells_changed():
    cells = {f"A{r}": "=B1" if r == 50 else r for r in range(1, 101)}
    stored = {"S!A50": 1.0, "S!C1": 5001.0}
    done = result(book({"S": {**cells, "B1": 1, "C1": "=SUM(A1:A100)"}}, stored), overrides={at("B1"): 2.0})
    assert {c.address: c.fresh for c in done.changed} == {at("A50"): 2.0, at("C1"): 5002.0}
    assert done.disagreements == []


def test_cells_of_an_array_formula_are_checked_one_by_one():
    made = book({"S": {"A1": Block("={1;2}", "A1:A2")}}, {"S!A1": 1.0, "S!A2": 5.0})
    assert [d.address for d in result(made).disagreements] == [at("A2")]


def test_random_numbers_repeat_with_their_seed():
    cells = {"A1": "=RAND()", "A2": "=RAND()"}
    first, again, other = (result(cells, seed=s).values for s in (1, 1, 2))
    assert first == again
    assert first != other


def test_an_iterated_circle_within_the_files_limit_is_left_as_it_is_stored():
    settings = Calculation(iterate=True, max_change=0.001)
    cells = {"A1": "=B1/2+1", "B1": "=A1"}
    done = result(book({"S": cells}, {"S!A1": 2.0004, "S!B1": 2.0004}, calculation=settings))
    assert (done.changed, done.disagreements, done.kept) == ([], [], [])
    done = result(book({"S": cells}, {"S!A1": 3.0, "S!B1": 3.0}, calculation=settings))
    assert done.disagreements == []
    assert abs(done.values[at("A1")] - 2.0) < 0.002


def test_what_reads_a_cell_that_a_spill_has_left_follows():
    cells = {"A1": Block("=_xlfn.SEQUENCE(C1)", "A1:A3", True), "B1": "=SUM(A1:A3)", "B2": "=A3+1", "C1": 3}
    stored = {"S!A1": 1.0, "S!A2": 2.0, "S!A3": 3.0, "S!B1": 6.0, "S!B2": 4.0}
    done = result(book({"S": cells}, stored), overrides={at("C1"): 2.0})
    assert {c.address: c.fresh for c in done.changed} == {at("A3"): BLANK, at("B1"): 3.0, at("B2"): 1.0}
    assert done.disagreements == []
    done = result(book({"S": cells}, stored), overrides={at("C1"): 4.0})
    assert done.values[at("A4")] == 4.0
    assert [c.address for c in done.changed] == [at("A4")]


def test_formulas_without_a_stored_value_are_held_against_nothing():
    done = result(book({"S": {"A1": "=1/3", "B1": "=A1", "C1": "=A1&B1"}}))
    assert done.disagreements == []
    assert {c.address for c in done.changed} == {at("A1"), at("B1"), at("C1")}
