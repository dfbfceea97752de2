"""From a file through recalculation back into a file: what is read again is what was computed."""

from __future__ import annotations

import pytest
import xlsxwriter

from tests.recalc.books import NOW
from xleq.cells import CellAddress
from xleq.hosts.headless import recalculate_file
from xleq.recalc import recalculate
from xleq.workbook import open_book, write_book


@pytest.fixture
def made(tmp_path):
    """A workbook with plain, array and dynamic formulas whose spill is longer than the file says."""
    path = tmp_path / "made.xlsx"
    with xlsxwriter.Workbook(path) as file:
        sheet = file.add_worksheet("S")
        file.define_name("factor", "=S!$B$1")
        sheet.write_column("A1", [1, 2, 3, 4])
        sheet.write_number("B1", 10)
        sheet.write_dynamic_array_formula("C1", "=_xlfn._xlws.FILTER(A1:A4,A1:A4>1)*factor")
        sheet.write_array_formula("E1:E2", "{=A1:A2*2}")
        sheet.write_formula("F1", "=SUM(C1:C9)")
        sheet.write_formula("F2", "=SUM(_xlfn.ANCHORARRAY(C1))")
        sheet.write_formula("F3", '="total "&TEXT(F1,"0.0")')
        sheet.write_formula("F4", "=A1/0")
        sheet.write_formula("F5", "=A1>0")
    return path


def test_a_recalculated_file_reads_back_and_needs_no_change(made, tmp_path):
    book = open_book(made)
    first = recalculate(book, {}, now=NOW)
    copy = tmp_path / "copy.xlsx"
    write_book(book, first.results, copy)
    again = open_book(copy)
    stored = again.sheets[0].stored
    assert [stored.get((r, 3)) for r in (1, 2, 3, 4)] == [20.0, 30.0, 40.0, None]
    assert tuple(again.sheets[0].formulas[(1, 3)].area) == (1, 3, 3, 3)
    assert [stored[(r, 5)] for r in (1, 2)] == [2.0, 4.0]
    assert [stored[(r, 6)] for r in (1, 2, 3, 5)] == [90.0, 90.0, "total 90.0", True]
    assert stored[(4, 6)].code == "#DIV/0!"
    second = recalculate(again, {}, now=NOW, trust_fresh=False)
    assert (second.changed, second.disagreements, second.kept) == ([], [], [])


def test_a_changed_input_shrinks_the_spill_in_the_file(made, tmp_path):
    book = open_book(made)
    first, second = tmp_path / "first.xlsx", tmp_path / "second.xlsx"
    write_book(book, recalculate(book, {}, now=NOW).results, first)
    book = open_book(first)
    done = recalculate(book, {}, now=NOW, trust_fresh=False, overrides={CellAddress("S", 2, 1): 0.0})
    write_book(book, done.results, second)
    sheet = open_book(second).sheets[0]
    assert [sheet.stored.get((r, 3)) for r in (1, 2, 3)] == [30.0, 40.0, None]
    assert (sheet.stored[(1, 6)], sheet.stored[(2, 1)]) == (70.0, 0.0)
    assert done.disagreements == []


def test_newer_errors_written_as_value_errors_are_no_disagreement_and_no_change_the_next_time(tmp_path):
    path = tmp_path / "newer.xlsx"
    with xlsxwriter.Workbook(path) as file:
        sheet = file.add_worksheet("S")
        sheet.write_column("A1", [1, 2])
        sheet.write_number("D2", 5)
        sheet.write_dynamic_array_formula("C1", "=_xlfn._xlws.FILTER(A1:A2,A1:A2>9)")
        sheet.write_dynamic_array_formula("D1", "=_xlfn.SEQUENCE(3)")
        sheet.write_formula("E1", "=_xlfn.LAMBDA(_xlpm.x,_xlpm.x)")
        sheet.write_formula("F1", "=D1+1")
        sheet.write_formula("F2", "=ERROR.TYPE(C1)")
        sheet.write_formula("F3", "=IFERROR(D1,0)")
    first = recalculate_file(path, in_place=True, backup=False, trust_fresh=True, now=NOW)
    codes = {str(a): e.code for a, e in first.errors()}
    assert codes == {"S!C1": "#CALC!", "S!D1": "#SPILL!", "S!E1": "#CALC!"}
    second = recalculate_file(path, in_place=True, backup=False, now=NOW)
    assert second.complete
    assert second.found.changed == []
    assert {str(a): e.code for a, e in second.errors()} == codes
    third = recalculate(open_book(path), {}, now=NOW, trust_fresh=False)
    assert (third.changed, third.disagreements, third.kept) == ([], [], [])


def test_another_old_error_than_the_stored_one_is_a_disagreement(tmp_path):
    path = tmp_path / "old.xlsx"
    with xlsxwriter.Workbook(path) as file:
        file.add_worksheet("S").write_formula("A1", "=1/0", None, "#VALUE!")
    done = recalculate(open_book(path), {}, now=NOW, trust_fresh=False)
    assert [d.fresh.code for d in done.disagreements] == ["#DIV/0!"]
